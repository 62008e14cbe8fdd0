package spec_test

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"anticlast/formfind/canopy"
	"anticlast/formfind/spec"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

const yard = `anticlast: 1
outline:
  file: yard.dxf
  snap: 5 mm
  layers:
    RIM: {cable: {sag: 9 %}, height: 3.5 m}
    WALL: {fixed: true, height: 3 m}
    TREE: {hole: true, height: 4 m}
    RIDGE: {ridge: {force: 30 kN}}
    MAST: {point: true, height: 6 m}
    PAVING: ignore
  heights:
    - {point: RIM:1, z: 3 m}
    - {at: [7, -1.4], z: 5.2 m}
  fabric: {name: sail, prestress: 2 kN/m}
`

// readBeside reads a model with files beside it.
func readBeside(text string, files map[string]string) (*canopy.Model, []string, error) {
	var warned []string
	tables := map[string][]byte{}
	for n, s := range files {
		tables[n] = []byte(s)
	}
	o := spec.WithTables(spec.Options{Warn: func(d spec.Diagnostic) { warned = append(warned, d.String()) }}, tables)
	m, err := spec.Read(context.Background(), spec.Source{Name: "m.yaml", Reader: strings.NewReader(text), Folder: "."}, o)
	return m, warned, err
}

func drawing(t testing.TB, name string) string {
	t.Helper()
	b, err := os.ReadFile("../outline/testdata/" + name)
	require.NoError(t, err)
	return string(b)
}

func TestAnOutlineBecomesAModel(t *testing.T) {
	m, warned, err := readBeside(yard, map[string]string{"yard.dxf": drawing(t, "yard.dxf")})
	require.NoError(t, err)
	require.Empty(t, warned)
	require.Len(t, m.Fabrics, 1)
	f := m.Fabrics[0]
	require.Equal(t, "sail", f.Name)
	require.Equal(t, []string{"RIM:1", "RIM:2", "RIM:3", "WALL:1", "WALL:2", "RIM:4"}, f.Boundary)
	require.Equal(t, [][]string{{"TREE:1", "TREE:2", "TREE:3", "TREE:4"}}, f.Holes)
	require.Equal(t, []string{"RIDGE:1"}, f.Lines)
	require.Equal(t, r3.Vec{X: 1}, f.WarpDir)
	point := map[string]r3.Vec{}
	for _, p := range m.Points {
		point[p.Name] = p.At
	}
	require.Equal(t, r3.Vec{Z: 3}, point["RIM:1"])
	require.Equal(t, r3.Vec{X: 7, Y: -1.5, Z: 5.2}, point["RIM:2"], "by the nearest place")
	require.Equal(t, r3.Vec{X: 4, Y: 4.5, Z: 6}, point["MAST:1"])
	require.Equal(t, r3.Vec{X: 13, Y: 11, Z: 3}, point["WALL:1"])
	edge := map[string]canopy.Edge{}
	for _, e := range m.Edges {
		edge[e.Name] = e
	}
	require.Equal(t, canopy.KindEdgeCable, edge["RIM:3"].Role)
	require.Equal(t, canopy.KindRidgeCable, edge["RIDGE:1"].Role)
	require.True(t, edge["TREE:1"].Arc)
	require.InDelta(t, 4, edge["TREE:1"].Through.Z, 1e-12, "arcs follow the heights of their ends")
	require.Equal(t, 0.09, m.Cables[0].Sag)
	require.NoError(t, compiled(t, "").Validate(plain(t, []byte(yard))))
}

func TestDigestCoversTheDrawing(t *testing.T) {
	text := drawing(t, "yard.dxf")
	a, _, err := readBeside(yard, map[string]string{"yard.dxf": text})
	require.NoError(t, err)
	b, _, err := readBeside(yard, map[string]string{"yard.dxf": text + "\n999\nafter the end\n"})
	require.NoError(t, err)
	require.NotEqual(t, a.Digest, b.Digest)
}

const table = `layer,x [m],y [m],z [m]
RIM,0,0,4
RIM,9,0,2
RIM,9,8,4
RIM,0,8,2
RIM,0,0,4

ARCH,0,0,4
ARCH,9,8,4

MAST,0,0,0
MAST,0,0,4

GUY,0,0,4
GUY,-3,-3,0

P,6,2,3
FEET,20,20,0
`

func TestEveryRoleOfLayers(t *testing.T) {
	m, warned, err := readBeside(`anticlast: 1
outline:
  file: plan.csv
  layers:
    RIM: {cable: {force: 20 kN}}
    ARCH: {arch: {rise: 3 m}}
    MAST: mast
    GUY: {guy: {force: 9 kN}}
    P: point
    FEET: anchor
  fabric: {prestress: {warp: 2, weft: 3}, warp: {from: "RIM:1", to: "RIM:2"}, weight: 10 N/m2, pattern: free}
guys:
  G2: {from: RIM:1, to: FEET:1}
`, map[string]string{"plan.csv": table})
	require.NoError(t, err)
	require.Empty(t, warned)
	require.Len(t, m.Fabrics, 2)
	require.Equal(t, "fabric:1", m.Fabrics[0].Name)
	require.Equal(t, "fabric:2", m.Fabrics[1].Properties.Name)
	require.Equal(t, []string{"P:1"}, m.Fabrics[0].Inside)
	require.Equal(t, canopy.FabricFree, m.Fabrics[1].Pattern)
	require.Equal(t, r3.Unit(r3.Vec{X: 9, Z: -2}), m.Fabrics[1].WarpDir)
	for _, e := range m.Edges {
		if e.Name == "ARCH:1" {
			require.True(t, e.Arch && e.Arc)
			require.Equal(t, r3.Vec{X: 4.5, Y: 4, Z: 7}, e.Through)
		}
	}
	require.Len(t, m.Stays, 3)
	require.Equal(t, canopy.Stay{Name: "MAST:1", Mast: true, From: "MAST:1", To: "RIM:1", Line: 7}, m.Stays[0])
	require.Equal(t, "RIM:1", m.Stays[1].From)
	require.Equal(t, 9e3, m.Stays[1].Force)
}

func TestRingsFindTheirFaces(t *testing.T) {
	m, _, err := readBeside(`anticlast: 1
outline:
  file: plan.csv
  layers: {RIM: {cable: {force: 20 kN}}, P: point}
  fabric: {prestress: 2}
rings: {top: {at: P:1, radius: 500 mm}}
`, map[string]string{"plan.csv": table})
	require.NoError(t, err)
	require.Equal(t, "top", m.Fabrics[0].Ring)
	require.Equal(t, canopy.WarpRadial, m.Fabrics[0].WarpRule)
	require.Empty(t, m.Fabrics[0].Inside)
}

func TestFaultsOfOutlinesAreToldWithFileAndLine(t *testing.T) {
	const rim = "layer,x [m],y [m],z\nRIM,0,0,4\nRIM,9,0,2\nRIM,9,8,4\nRIM,0,8,2\nRIM,0,0,4\n"
	model := func(lines string) string { return "anticlast: 1\noutline:\n  file: plan.csv\n" + lines }
	const good = "  layers: {RIM: {cable: {force: 20 kN}}}\n  fabric: {prestress: 2}\n"
	for name, c := range map[string]struct {
		model, table string
		want         []string
	}{
		"gap":               {model(good), strings.Replace(rim, "RIM,0,0,4\n", "RIM,0,-0.5,4\n", 1), []string{"plan.csv:3: the outline is open: RIM (line 3) ends at (0, -0.5, 4) m", "plan.csv:6: the outline is open: RIM (line 6) ends at (0, 0, 4) m"}},
		"bad number":        {model(good), strings.Replace(rim, "9,0,2", "9,O,2", 1), []string{`plan.csv:3: y is not a usable number: "O"`}},
		"no unit":           {model(good), strings.ReplaceAll(rim, " [m]", ""), []string{`m.yaml:3:9: "plan.csv" does not say the unit of its coordinates; add units`}},
		"no layer":          {model(strings.Replace(good, "RIM", "RIMS", 1)), rim, []string{`m.yaml:4:12: nothing is drawn on layer "RIMS"; did you mean "RIM"?`}},
		"unknown word":      {model(strings.Replace(good, "{cable: {force: 20 kN}}", "fxied", 1)), rim, []string{`m.yaml:4:17: RIM cannot be "fxied"; did you mean "fixed"?`}},
		"two roles":         {model(strings.Replace(good, "{cable: {force: 20 kN}}", "{fixed: true, seam: true}", 1)), rim, []string{`m.yaml:4:31: layer "RIM" is fixed and seam at once`}},
		"no role":           {model(strings.Replace(good, "{cable: {force: 20 kN}}", "{height: 3 m}", 1)), rim, []string{`m.yaml:4:17: layer "RIM" does not say what its lines are`}},
		"hole of ridge":     {model(strings.Replace(good, "{cable: {force: 20 kN}}", "{ridge: {force: 3 kN}, hole: true}", 1)), rim, []string{`layer "RIM" is a hole and ridge`}},
		"two rules":         {model(strings.Replace(good, "force: 20 kN", "force: 20 kN, sag: 8 %", 1)), rim, []string{`the force of the cable of layer "RIM" is decided twice`}},
		"no such point":     {model(good + "  heights: [{point: RIM:9, z: 2 m}]\n"), rim, []string{`m.yaml:6:21: the outline has no point "RIM:9"; did you mean "RIM:1"?`}},
		"unclear place":     {model(good + "  heights: [{at: [4.4, 0], z: 2 m}]\n"), rim, []string{`m.yaml:6:18: no point is clearly nearest to [4.4, 0] m: "RIM:1" at (0, 0, 4) m is 4.4 m away and another 4.6 m`}},
		"height twice":      {model(good + "  heights: [{at: [0, 0], z: 2 m}, {point: RIM:1, z: 3}]\n"), rim, []string{`m.yaml:6:35: the height of point "RIM:1" is given twice; remove entry 1 or 2`}},
		"height of nothing": {model(good + "  heights: [{z: 2 m}]\n"), rim, []string{`m.yaml:6:13: a height needs a point or a place`}},
		"edge":              {model(good + "  edge: fixed\n"), rim, []string{"m.yaml:6:3: edge is for OBJ and STL meshes"}},
		"other file":        {strings.ReplaceAll(model(good), "plan.csv", "plan.dwg"), rim, []string{`m.yaml:3:9: outlines are not read from "plan.dwg"`}},
		"listed":            {model(good) + "listed: {nodes: plan.csv, supports: plan.csv}\n", rim, []string{`"outline" does not go with "listed"`}},
		"radial":            {model(strings.Replace(good, "prestress: 2", "prestress: 2, warp: radial", 1)), rim, []string{"the warp of the outline's fabric is radial but there is no ring in it"}},
		"two rings":         {model(good) + "points: {A: [3, 3, 5], B: [6, 6, 5]}\nrings: {a: {at: A, radius: 500 mm}, b: {at: B, radius: 500 mm}}\n", rim, []string{`rings "a" and "b" lie in one face of the outline`}},
	} {
		t.Run(name, func(t *testing.T) {
			m, _, err := readBeside(c.model, map[string]string{"plan.csv": c.table, "plan.dwg": c.table})
			require.Nil(t, m)
			var all *spec.Errors
			require.True(t, errors.As(err, &all), "%v", err)
			if name == "listed" {
				require.Contains(t, err.Error(), c.want[0])
				return
			}
			require.Len(t, all.List, len(c.want), "%v", err)
			for i, w := range c.want {
				require.Contains(t, all.List[i].String(), w)
			}
		})
	}
}

func TestWarningsOfOutlines(t *testing.T) {
	_, warned, err := readBeside("anticlast: 1\noutline:\n  file: plan.csv\n  units: mm\n  layers: {RIM: {cable: {force: 20 kN}}, ARCH: ignore}\n  fabric: {prestress: 2}\n", map[string]string{"plan.csv": table})
	require.NoError(t, err)
	all := strings.Join(warned, "\n")
	require.Contains(t, all, `m.yaml:4:10: "plan.csv" says that its unit is m, but the model says mm; the model's is used`)
	require.Contains(t, all, `plan.csv:12: layer "MAST" (1 line and points) is not in the model: left out`)
	require.NotContains(t, all, "ARCH")
	_, warned, err = readBeside(strings.Replace(yard, "    PAVING: ignore\n", "", 1), map[string]string{"yard.dxf": drawing(t, "yard.dxf")})
	require.NoError(t, err)
	require.Len(t, warned, 1)
	require.Regexp(t, `^yard.dxf:\d+: layer "PAVING" \(5 lines`, warned[0])
}

func TestEntitiesThatAreNotReadAreTold(t *testing.T) {
	text := "0\nSECTION\n2\nENTITIES\n0\nLWPOLYLINE\n8\nRIM\n70\n1\n10\n0\n20\n0\n10\n9\n20\n0\n10\n9\n20\n9\n0\nSPLINE\n8\nrim\n0\nINSERT\n8\nTREES\n0\nENDSEC\n0\nEOF\n"
	_, warned, err := readBeside("anticlast: 1\noutline: {file: a.dxf, units: m, layers: {RIM: fixed}, fabric: {prestress: 2}}\n", map[string]string{"a.dxf": text})
	require.NoError(t, err)
	require.Len(t, warned, 1, "what is on layers that are not used does not matter")
	require.Contains(t, warned[0], `a.dxf:24: 1 SPLINE without control points on layer "RIM" left out`)
}

func TestDrawingsStayInTheModelsFolder(t *testing.T) {
	dir := t.TempDir()
	require.NoError(t, os.WriteFile(filepath.Join(dir, "plan.csv"), []byte(table), 0o644))
	sub := filepath.Join(dir, "sub")
	require.NoError(t, os.Mkdir(sub, 0o755))
	for _, name := range []string{"../plan.csv", filepath.Join(dir, "plan.csv"), "plam.csv"} {
		p := filepath.Join(sub, "m.yaml")
		require.NoError(t, os.WriteFile(p, []byte(fmt.Sprintf("anticlast: 1\noutline: {file: %s, layers: {RIM: fixed}, fabric: {prestress: 2}}\n", name)), 0o644))
		_, err := spec.Read(context.Background(), spec.File(p), spec.Options{})
		require.Error(t, err)
		if name == "plam.csv" {
			require.ErrorContains(t, err, "there is no file")
		} else {
			require.ErrorContains(t, err, "outside the model's folder")
		}
	}
}

// A flat square of 3×3 vertices as an OBJ with quads.
func square() string {
	var b strings.Builder
	for y := range 3 {
		for x := range 3 {
			fmt.Fprintf(&b, "v %d %d %d\n", 1000*x, 1000*y, 300*(x%2)*(y%2))
		}
	}
	for y := range 2 {
		for x := range 2 {
			i := 3*y + x + 1
			fmt.Fprintf(&b, "f %d %d %d %d\n", i, i+1, i+4, i+3)
		}
	}
	return b.String()
}

func TestAMeshIsTakenAsTheTopology(t *testing.T) {
	const model = "anticlast: 1\noutline: {file: tent.obj, units: mm, fabric: {name: sail, prestress: 2, warp: [0, 1, 0]}, edge: EDGE}\n"
	m, _, err := readBeside(strings.Replace(model, "EDGE", "{force: 9 kN}", 1), map[string]string{"tent.obj": square()})
	require.NoError(t, err)
	s := m.Listed
	require.NoError(t, s.Validate())
	require.Len(t, s.Position, 9)
	require.Len(t, s.Corners, 8)
	require.Len(t, s.Ends, 8)
	require.Len(t, s.Cables, 4)
	require.Equal(t, []canopy.Freedom{canopy.DirAll, 0, canopy.DirAll, 0, 0, 0, canopy.DirAll, 0, canopy.DirAll}, s.Fixed)
	require.Equal(t, 9e3, s.Given[0])
	require.Equal(t, canopy.LawForce, s.Law[0])
	require.Equal(t, r3.Vec{Y: 1}, s.Warp[0])
	m, _, err = readBeside(strings.Replace(model, "EDGE", "{sag: 8 %}", 1), map[string]string{"tent.obj": square()})
	require.NoError(t, err)
	require.NoError(t, m.Listed.Validate())
	require.Equal(t, canopy.CableSag, m.Listed.Cables[0].Law)
	m, _, err = readBeside(strings.Replace(model, ", edge: EDGE", "", 1), map[string]string{"tent.obj": square()})
	require.NoError(t, err)
	require.NoError(t, m.Listed.Validate())
	require.Empty(t, m.Listed.Ends)
	require.Equal(t, "fixed edge", m.Listed.Lines[0].Role)
	require.Equal(t, canopy.Freedom(0), m.Listed.Fixed[4])

	for name, c := range map[string]struct{ model, obj, want string }{
		"no unit":      {strings.Replace(model, "units: mm, ", "", 1), square(), "does not say the unit of its coordinates; add units, for example units: mm: OBJ and STL files have none"},
		"no fabric":    {"anticlast: 1\noutline: {file: tent.obj, units: mm}\n", square(), "the mesh has no fabric"},
		"points":       {model + "points: {A: [0, 0, 0]}\n", square(), `"points" does not go with the mesh of an outline`},
		"layers":       {strings.Replace(model, "units: mm", "units: mm, layers: {A: fixed}", 1), square(), "layers are for drawings"},
		"its own mesh": {strings.Replace(model, "prestress: 2", "prestress: 2, mesh: 1 m", 1), square(), "the mesh is that of the file; remove mesh"},
		"bad face":     {model, square() + "f 1 2 99\n", `tent.obj:14: there is no vertex "99"`},
		"three at one": {model, square() + "v 500 0 900\nf 1 2 10\nf 2 1 10\n", "triangles meet along the side from (0, 0, 0) mm to (1000, 0, 0) mm"},
		"no sag":       {strings.Replace(model, "EDGE", "{sag: 8 %}", 1), "v 0 0 0\nv 1000 0 0\nv 1000 1000 0\nv 0 1000 0\nf 1 2 3 4\n", "cable edge:1 from (0, 0, 0) mm to (1000, 0, 0) mm is one side of the mesh and cannot sag"},
		"closed":       {model, "v 0 0 0\nv 1000 0 0\nv 0 1000 0\nv 0 0 1000\nf 1 3 2\nf 1 2 4\nf 2 3 4\nf 3 1 4\n", "is closed: it has no edge"},
		"two rules":    {strings.Replace(model, "EDGE", "{force: 3, sag: 0.1}", 1), square(), "the force of the cables is decided twice"},
	} {
		t.Run(name, func(t *testing.T) {
			_, _, err := readBeside(strings.Replace(c.model, "EDGE", "{force: 9 kN}", 1), map[string]string{"tent.obj": c.obj})
			require.ErrorContains(t, err, c.want)
		})
	}
}
