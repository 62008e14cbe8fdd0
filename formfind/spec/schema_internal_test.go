package spec

import (
	"bytes"
	"encoding/json"
	"flag"
	"net/url"
	"os"
	"regexp"
	"testing"

	"github.com/santhosh-tekuri/jsonschema/v6"
	"github.com/stretchr/testify/require"
	"go.yaml.in/yaml/v4"
	"pgregory.net/rapid"
)

var update = flag.Bool("update", false, "write generated files anew")

func TestSchemaFileIsFresh(t *testing.T) {
	want, err := makeSchema()
	require.NoError(t, err)
	if *update {
		require.NoError(t, os.WriteFile("model.schema.json", want, 0o644))
		return
	}
	require.Equal(t, string(want), string(Schema()), "run: go test ./formfind/spec -run TestSchemaFileIsFresh -update")
}

// Every key shows an example that its own schema accepts, says what it means,
// and is in the reference page.
func TestKeysAreDocumented(t *testing.T) {
	doc, err := jsonschema.UnmarshalJSON(bytes.NewReader(Schema()))
	require.NoError(t, err)
	c := jsonschema.NewCompiler()
	require.NoError(t, c.AddResource("file:///s.json", doc))
	ref := Reference()
	seen := map[string]*section{}
	for _, s := range sections() {
		if other := seen[s.id]; other != nil && other != s {
			t.Errorf("two sections are called %q", s.id)
		}
		seen[s.id] = s
		at := "#"
		if s != modelSection {
			at = "#/$defs/" + s.id
		}
		require.NotEmpty(t, s.doc, s.id)
		if s.table {
			require.LessOrEqual(t, len(s.keys), 16, s.id)
		}
		for _, k := range s.keys {
			require.NotEmpty(t, k.doc, "%s %s", s.id, k.name)
			require.NotEmpty(t, k.example, "%s %s", s.id, k.name)
			require.Contains(t, ref, "| `"+k.name+"` |")
			var v any
			require.NoError(t, yaml.Load([]byte(k.example), &v), "%s %s", s.id, k.name)
			b, err := json.Marshal(v)
			require.NoError(t, err)
			value, err := jsonschema.UnmarshalJSON(bytes.NewReader(b))
			require.NoError(t, err)
			sch, err := c.Compile("file:///s.json" + at + "/properties/" + url.PathEscape(k.name))
			require.NoError(t, err)
			require.NoError(t, sch.Validate(value), "%s %s: %s", s.id, k.name, k.example)
		}
		for _, k := range s.oneOf {
			require.NotNil(t, s.get(k), "%s %s", s.id, k)
		}
	}
}

// The schema's pattern and the reader agree on what a quantity looks like.
func TestQuantityPatternsAgreeWithTheReader(t *testing.T) {
	for _, d := range dimensions {
		re := regexp.MustCompile(d.pattern())
		rapid.Check(t, func(t *rapid.T) {
			number := rapid.StringMatching(`-?(0|[1-9][0-9]{0,4})(\.[0-9]{1,3})?(e-?[0-9])?`).Draw(t, "number")
			unit := rapid.SampledFrom(d.Units).Draw(t, "unit").Name
			if rapid.Bool().Draw(t, "foreign") {
				unit = rapid.SampledFrom([]string{"ft", "kN", "m", "kN/m", "Pa", "%", "kg", "x", "KN", "N/m²", "g/m^2", "deg"}).Draw(t, "other")
			}
			text := number + rapid.SampledFrom([]string{"", " ", "  "}).Draw(t, "space") + unit
			v, err := ParseQuantity(text, d)
			if err == nil {
				require.True(t, re.MatchString(text), "%s: %q is %v", d.Name, text, v)
			} else if re.MatchString(text) {
				require.Contains(t, err.Error(), "out of any reasonable size", "%s: %q", d.Name, text)
			}
		})
	}
}
