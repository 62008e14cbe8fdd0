package main

import (
	"encoding/json"
	"encoding/xml"
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"
)

func TestMeshShowsCountsQualityAndPoints(t *testing.T) {
	dir := t.TempDir()
	m := write(t, dir, "sail.yaml", small)
	r := run(t, "", "mesh", m)
	require.Equal(t, exitFine, r.code, r.err)
	for _, want := range []string{"Trial\n", "nodes (", "of edge cable", "Smallest angle of each triangle", "  A         0.000     0.000     4.000  supported", "No problems found."} {
		require.Contains(t, r.out, want)
	}
	entries, err := os.ReadDir(dir)
	require.NoError(t, err)
	require.Len(t, entries, 1, "nothing is solved or written")

	r = run(t, small, "mesh", "-", "--json", "--set", "mesh=500mm")
	require.Equal(t, exitFine, r.code, r.err)
	var got meshReport
	require.NoError(t, json.Unmarshal([]byte(r.out), &got))
	require.Equal(t, got.Triangles, got.Fabrics[0].Triangles)
	total := 0
	for _, c := range got.Angles {
		total += c.Count
	}
	require.Equal(t, got.Triangles, total)
	require.InDelta(t, 0.5, got.Fabrics[0].Mean, 0.2)
	require.Len(t, got.Points, 4)
}

func TestMeshDrawsItself(t *testing.T) {
	dir := t.TempDir()
	svg := filepath.Join(dir, "mesh.svg")
	r := run(t, small, "mesh", "-", "--svg", svg)
	require.Equal(t, exitFine, r.code, r.err)
	require.Contains(t, r.out, "Drawn to "+svg)
	b, err := os.ReadFile(svg)
	require.NoError(t, err)
	labels, paths := 0, 0
	for d := xml.NewDecoder(strings.NewReader(string(b))); ; {
		tok, err := d.Token()
		if err == io.EOF {
			break
		}
		require.NoError(t, err, "well-formed")
		if e, ok := tok.(xml.StartElement); ok {
			switch e.Name.Local {
			case "text":
				labels++
			case "path":
				paths++
			}
		}
	}
	require.Equal(t, 2+4+1, labels, "two titles, four corners, one scale")
	require.Greater(t, paths, 20)
	r = run(t, small, "mesh", "-", "--svg", "-")
	require.Equal(t, exitFine, r.code, r.err)
	require.Equal(t, string(b), r.out)
	require.Equal(t, exitBadInput, run(t, small, "mesh", "-", "--svg", "-", "--json").code)
}

func TestMeshSaysWhereItIsPoor(t *testing.T) {
	// A corner of 8°.
	thin := strings.NewReplacer("B: [8, 0, 2]", "B: [8, 7, 2]", "D: [0, 8, 2]", "D: [7, 8, 2]").Replace(small)
	r := run(t, thin, "mesh", "-")
	require.Equal(t, exitFine, r.code, r.err)
	require.Contains(t, r.out, "Problems\n")
	require.Regexp(t, `\(\d+\.\d\d, \d+\.\d\d, \d+\.\d\d\) m`, r.out)
	r = run(t, "anticlast: 1\n", "mesh", "-")
	require.Equal(t, exitBadInput, r.code)
	folded := strings.Replace(small, "boundary: [AB, BC, CD, DA]", "boundary: [AB, BC, CD]", 1)
	require.Equal(t, exitBadInput, run(t, folded, "mesh", "-").code)
}

// What is exported as OBJ or STL is read back as the same surface.
func TestExportedMeshesAreReadBack(t *testing.T) {
	dir := t.TempDir()
	m := write(t, dir, "sail.yaml", small)
	require.Equal(t, exitFine, run(t, "", "form", m).code)
	var form struct {
		Triangles []struct {
			Area float64 `json:"area"`
		} `json:"triangles"`
	}
	b, err := os.ReadFile(filepath.Join(dir, "sail-form", "form.json"))
	require.NoError(t, err)
	require.NoError(t, json.Unmarshal(b, &form))
	area := 0.0
	for _, c := range form.Triangles {
		area += c.Area
	}
	for _, ext := range []string{"obj", "stl"} {
		r := run(t, "", "export", filepath.Join(dir, "sail-form"), "--to", ext, "-o", filepath.Join(dir, "sail."+ext))
		require.Equal(t, exitFine, r.code, r.err)
		back := write(t, dir, ext+".yaml", "anticlast: 1\noutline: {file: sail."+ext+", units: m, snap: 0.1 mm, fabric: {prestress: 2}}\n")
		r = run(t, "", "mesh", back, "--json")
		require.Equal(t, exitFine, r.code, r.err)
		var got meshReport
		require.NoError(t, json.Unmarshal([]byte(r.out), &got))
		require.Equal(t, len(form.Triangles), got.Triangles, ext)
		require.InEpsilon(t, area, got.Fabrics[0].Area, 1e-5, ext)
		require.Equal(t, "given", got.Fabrics[0].Mesh)
		require.Equal(t, exitFine, run(t, "", "form", back).code, "and formed, held along its edge")
	}
}
