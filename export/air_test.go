package export

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"

	"anticlast/formfind"
	"anticlast/formfind/canopy"
	"anticlast/formfind/spec"
)

// Pressures found are said wherever a person looks, with the volume asked and
// enclosed; the hand-over has them on the fabrics and in the loads.
func TestPressuresFoundAreReported(t *testing.T) {
	find := func(volume string) *canopy.Result {
		m, err := spec.Read(background, spec.File(filepath.Join("..", "examples", "cushion.yaml")), spec.Options{Set: []string{"fabrics.upper.volume=" + volume, "mesh=600 mm"}})
		require.NoError(t, err)
		r, err := formfind.Find(background, m, formfind.Options{})
		require.NoError(t, err)
		return r
	}
	r := find("14 m3")
	var b bytes.Buffer
	require.NoError(t, Summary(&b, r, Options{}))
	require.Regexp(t, `upper +lower +14\.00 +14\.00 +5[0-9]{2}\.[0-9]\n`, b.String())
	require.Contains(t, strings.Join(strings.Fields(b.String()), " "), "stable while the volume of air is held, not its pressure, firmness")
	for _, f := range Formats() {
		if f.Name == "report" {
			b.Reset()
			require.NoError(t, f.Write(background, &b, r, Options{}))
			require.Contains(t, b.String(), "Air of given volume.")
			require.Contains(t, b.String(), "Volumes of air, measured anew")
			require.Contains(t, b.String(), "prestress while the volume of air is held, not its pressure")
			require.Regexp(t, `<td[^>]*>14\.00</td><td[^>]*>5[0-9]{2}\.[0-9]</td>`, b.String())
		}
	}
	less := find("10 m3")
	groups := map[string]Difference{}
	for _, d := range Differences(r, less) {
		groups[d.Group+" "+d.Name] = d
	}
	require.InDelta(t, 14, groups["enclosed volume upper"].A, 1e-6)
	require.InDelta(t, 10, groups["enclosed volume upper"].B, 1e-6)
	require.Less(t, groups["pressure found upper"].B, groups["pressure found upper"].A)
	require.Equal(t, "Pa", groups["pressure found upper"].Unit)

	dir := filepath.Join(t.TempDir(), "handover")
	require.NoError(t, Handover(background, dir, r, Options{}))
	csv, err := os.ReadFile(filepath.Join(dir, "fabrics.csv"))
	require.NoError(t, err)
	require.Equal(t, r.Form.Pressure[0], r.Structure.Fabrics[0].Pressure*float64(r.Structure.Enclosures[0].Side[0]))
	require.Contains(t, string(csv), "internal pressure [N/m2]")
	require.Len(t, strings.Split(strings.TrimSpace(string(csv)), "\n"), 4)
	text, err := os.ReadFile(filepath.Join(dir, "read-me.txt"))
	require.NoError(t, err)
	require.Contains(t, string(text), "stable while that volume is held")
}
