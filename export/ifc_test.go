package export

import (
	"encoding/json"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"testing"

	"anticlast/formfind/canopy"

	"github.com/stretchr/testify/require"
)

func TestIFCReadsBack(t *testing.T) {
	t.Parallel()
	node := tool(t, "node")
	if _, err := os.Stat(filepath.Join(os.Getenv("ANTICLAST_NODE_MODULES"), "node_modules", "web-ifc")); err != nil {
		absent(t, "npm package web-ifc (ANTICLAST_NODE_MODULES names the folder it was installed in)")
	}
	r := sail(8)
	r.Title = "Süd's sail"
	var got struct {
		Schema, Project                                          string
		Nodes, Supports, Members, Surfaces, Guids, Ends, Grouped int
		Length, Force                                            float64
		Lo, Hi                                                   []float64
	}
	out, err := exec.Command(node, "testdata/read_ifc.mjs", saved(t, "ifc", r)).CombinedOutput()
	require.NoError(t, err, string(out))
	require.NoError(t, json.Unmarshal(out, &got), string(out))
	s := r.Structure
	_, length := total(r)
	force := 0.0
	for _, v := range r.Form.Force {
		force += v
	}
	require.Equal(t, "IFC4", got.Schema)
	require.Equal(t, "Süd's sail", got.Project)
	require.Equal(t, len(s.Position), got.Nodes)
	require.Equal(t, 6, got.Supports)
	require.Equal(t, len(s.Ends), got.Members)
	require.Equal(t, len(s.Corners), got.Surfaces)
	require.Equal(t, got.Nodes+got.Members+got.Surfaces, got.Guids, "identifiers differ")
	require.Equal(t, got.Guids, got.Grouped)
	require.Equal(t, 2*got.Members, got.Ends)
	require.InEpsilon(t, length, got.Length, 1e-9)
	require.InEpsilon(t, force, got.Force, 1e-9)
	lo, hi := canopy.Bounds(r.Form.Position)
	require.InDeltaSlice(t, []float64{lo.X, lo.Y, lo.Z}, got.Lo, 1e-9)
	require.InDeltaSlice(t, []float64{hi.X, hi.Y, hi.Z}, got.Hi, 1e-9)
}

func TestIFCWords(t *testing.T) {
	require.Equal(t, "1.E+00", real(1))
	require.Equal(t, "-2.5E-03", real(-0.0025))
	require.Equal(t, `'it''s a \\ \X2\00FC\X0\'`, stepText("it's a \\ ü"))
	f := &ifc{seed: "x"}
	require.Regexp(t, regexp.MustCompile(`^'[0-3][0-9A-Za-z_$]{21}'$`), f.guid("node", 7))
	require.NotEqual(t, f.guid("node", 7), f.guid("node", 8))
}
