package spec_test

import (
	"bytes"
	"encoding/json"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"anticlast/formfind/spec"

	"github.com/santhosh-tekuri/jsonschema/v6"
	"github.com/stretchr/testify/require"
	"go.yaml.in/yaml/v4"
)

func compiled(t testing.TB, fragment string) *jsonschema.Schema {
	t.Helper()
	doc, err := jsonschema.UnmarshalJSON(bytes.NewReader(spec.Schema()))
	require.NoError(t, err)
	c := jsonschema.NewCompiler()
	const at = "file:///model.schema.json"
	require.NoError(t, c.AddResource(at, doc))
	s, err := c.Compile(at + fragment)
	require.NoError(t, err)
	return s
}

// plain turns YAML text into the values a JSON parser gives.
func plain(t testing.TB, text []byte) any {
	t.Helper()
	var v any
	require.NoError(t, yaml.Load(text, &v))
	b, err := json.Marshal(v)
	require.NoError(t, err)
	out, err := jsonschema.UnmarshalJSON(bytes.NewReader(b))
	require.NoError(t, err)
	return out
}

func TestSchemaAcceptsSamplesAndExamples(t *testing.T) {
	s := compiled(t, "")
	for _, m := range spec.Samples() {
		require.NoError(t, s.Validate(plain(t, []byte(m.Text))), m.Name)
	}
	files, err := filepath.Glob("../../examples/*.yaml")
	require.NoError(t, err)
	for _, f := range files {
		b, err := os.ReadFile(f)
		require.NoError(t, err)
		require.NoError(t, s.Validate(plain(t, b)), f)
	}
}

// An editor that follows the schema marks these without running the program.
func TestSchemaRefusesBrokenStructure(t *testing.T) {
	s := compiled(t, "")
	for _, name := range strings.Fields(`
		version-2 no-version unknown-top-key unknown-key underscore-key unknown-limit bad-name names-as-list
		neither-points-nor-listed list-for-mapping unknown-unit unit-case wrong-dimension imperial comma-decimal
		word-for-number two-coordinates scalar-point missing-coordinate zero-mesh mapping-for-number number-list
		fractional-segments edge-without-end edge-says-nothing bent-word arc-without-place unknown-role support-word
		support-twice cable-two-rules cable-no-rule unstressed-alone no-prestress half-prestress
		net-one-family net-two-rules net-no-rule listed-no-nodes listed-rows`) {
		b, err := os.ReadFile("../../testdata/broken/" + name + ".yaml")
		require.NoError(t, err)
		require.Error(t, s.Validate(plain(t, b)), name)
	}
}

// What the reader refuses may pass the schema; what it accepts never fails it.
func TestSchemaAcceptsAllThatIsRead(t *testing.T) {
	s := compiled(t, "")
	for _, text := range []string{
		sail,
		strings.Replace(sail, "prestress: 2 kN/m", "prestress: {warp: 2.5, weft: 2 kN/m}, warp: [1, 0, 0], strength: 80, mesh: .5 m", 1),
		strings.Replace(sail, "*edge}\n  CD", "{sag: 8 %, strength: 90 kN, weight: 1.2 kg/m}}\n  CD", 1),
		strings.Replace(sail, "*edge}\n  CD", "{stiffness: 12 MN, unstressed: 8 m}}\n  CD", 1),
		sail + "limits: {slope min: 3°, headroom: [{height: 2.5, region: [[0, 0], [4, 0], [4, 3 m]]}]}\nfactors: {load: 1.5}\n",
		sail + "title: 2024\ndescription: 3\nself weight: true\n",
	} {
		read(t, text)
		require.NoError(t, s.Validate(plain(t, []byte(text))), text)
	}
}

func TestReferenceHasEverySample(t *testing.T) {
	ref := spec.Reference()
	for _, w := range []string{"# The model file", "`force density`", "daN/5cm", "## listed-member (columns of a table)", "required unless listed or outline is given", "`points: {A: [0, 0, 4.5], B: [9, 0, 3]}`"} {
		require.Contains(t, ref, w)
	}
}
