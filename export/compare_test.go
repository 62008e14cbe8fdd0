package export

import (
	"bytes"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"anticlast/formfind/canopy"

	"github.com/qmuntal/gltf"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

func difference(t *testing.T, list []Difference, group, name string) Difference {
	t.Helper()
	for _, d := range list {
		if d.Group == group && d.Name == name {
			return d
		}
	}
	t.Fatalf("no %s %s", group, name)
	return Difference{}
}

func TestDifferencesMatchByName(t *testing.T) {
	a, b := sail(6), sail(6)
	for i := range b.Form.Position {
		b.Form.Position[i].Z += 0.25
	}
	b.Summary.Cables[0].ForceMean = 30e3
	b.Structure.Cables[5].Name = "G9"
	b.Form.Reaction[0].X *= 2
	list := Differences(a, b)
	d := difference(t, list, "highest point", "")
	require.InDelta(t, 6.5, d.A, 1e-12)
	require.InDelta(t, 6.75, d.B, 1e-12)
	require.InDelta(t, 0.25, difference(t, list, "largest move of a node", "").B, 1e-12)
	require.InDelta(t, 30, difference(t, list, "cable force, mean", "edge cable AB").B, 1e-12)
	require.True(t, math.IsNaN(difference(t, list, "cable force, mean", "guy G1").B))
	require.True(t, math.IsNaN(difference(t, list, "cable force, mean", "guy G9").A))
	d = difference(t, list, "reaction, size", "A")
	require.Greater(t, d.B, d.A)
	var s strings.Builder
	require.NoError(t, Compare(&s, a, b, Options{}))
	for _, want := range []string{"A  Quay market sail, trusted", "+0.250", "30.000", canopy.Caution[:40]} {
		require.Contains(t, s.String(), want)
	}
	// Other meshes have no common nodes.
	for _, d := range Differences(sail(6), sail(7)) {
		require.NotEqual(t, "largest move of a node", d.Group)
	}
	require.NoError(t, Compare(&s, sail(3), grid(4), Options{Width: 60, Colour: true}))
}

func TestAFormDoesNotDifferFromItself(t *testing.T) {
	for _, r := range []*canopy.Result{sail(5), cone(8), grid(4)} {
		for _, d := range Differences(r, r) {
			if d.Group == "largest move of a node" {
				require.Zero(t, d.B)
			} else {
				require.Equal(t, d.A, d.B, d)
			}
		}
	}
}

func TestCompareGLBValidates(t *testing.T) {
	t.Parallel()
	node := tool(t, "node")
	if _, err := os.Stat(filepath.Join(os.Getenv("ANTICLAST_NODE_MODULES"), "node_modules", "gltf-validator")); err != nil {
		absent(t, "npm package gltf-validator (ANTICLAST_NODE_MODULES names the folder it was installed in)")
	}
	b := sail(8)
	for i := range b.Form.Position {
		b.Form.Position[i].Z *= 1.1
	}
	far := cone(16)
	for i := range far.Form.Position {
		far.Form.Position[i].Z += 1
	}
	dir := t.TempDir()
	args := []string{"testdata/validate_glb.mjs"}
	for i, pair := range [][2]*canopy.Result{{sail(8), b}, {sail(6), sail(8)}, {grid(5), sail(5)}, {cone(16), far}} {
		var buf bytes.Buffer
		require.NoError(t, CompareGLB(background, &buf, pair[0], pair[1], Options{}))
		name := filepath.Join(dir, fmt.Sprint(i, ".glb"))
		require.NoError(t, os.WriteFile(name, buf.Bytes(), 0o644))
		args = append(args, name)
	}
	out, err := exec.Command(node, args...).CombinedOutput()
	require.NoError(t, err, string(out))
}

// The morph target of a form against a moved one is the move, in y-up axes.
func TestCompareGLBMorphsFromOneToTheOther(t *testing.T) {
	a, b := sail(6), sail(6)
	for i := range b.Form.Position {
		b.Form.Position[i].Z += 0.5
	}
	var buf bytes.Buffer
	require.NoError(t, CompareGLB(background, &buf, a, b, Options{}))
	var doc gltf.Document
	require.NoError(t, gltf.NewDecoder(&buf).Decode(&doc))
	require.Len(t, doc.Animations, 1)
	n, _ := nodeNamed(t, &doc, "A to B: fabric sail")
	target := doc.Accessors[doc.Meshes[*n.Mesh].Primitives[0].Targets[0][gltf.POSITION]]
	require.InDeltaSlice(t, []float64{0, 0.5, 0}, target.Min, 1e-6)
	require.InDeltaSlice(t, []float64{0, 0.5, 0}, target.Max, 1e-6)
}

func TestCompareReport(t *testing.T) {
	a, b := sail(6), sail(6)
	b.Title = "Sail <raised>"
	for i := range b.Form.Position {
		b.Form.Position[i] = r3.Scale(1.5, b.Form.Position[i])
	}
	var s strings.Builder
	require.NoError(t, CompareReport(background, &s, a, b, quick))
	for _, want := range []string{"Sail &lt;raised&gt;", "highest point, m", "+50.0 %", canopy.Caution} {
		require.Contains(t, s.String(), want)
	}
	require.Equal(t, 8, strings.Count(s.String(), "<svg"))
	// Both are drawn to one scale.
	large, small := draw(b, views()[0], quick).frame.scale, draw(a, views()[0], quick).frame.scale
	require.Greater(t, small, large)
	require.Equal(t, large, drawAt(a, views()[0], large, quick).frame.scale)
}
