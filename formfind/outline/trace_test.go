package outline_test

import (
	"math"
	"strings"
	"testing"

	"anticlast/formfind/outline"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

var layers = []outline.Layer{
	{Name: "RIM", Class: outline.Border, Cable: true},
	{Name: "WALL", Class: outline.Border},
	{Name: "TREE", Class: outline.Border, Hole: true},
	{Name: "RIDGE", Class: outline.Inner, Cable: true},
	{Name: "MAST", Class: outline.Points},
	{Name: "GUY", Class: outline.Stay},
}

var metre = outline.Unit{Name: "m", Metres: 1}

func trace(t testing.TB, d *outline.Drawing, u outline.Unit) (*outline.Outline, []outline.Fault) {
	t.Helper()
	d.Scale(u)
	return outline.Trace(d, layers, outline.Options{Unit: u, Snap: 0.005, Corner: 10 * math.Pi / 180})
}

// draw makes a drawing in metres of lines "LAYER x y x y …" or "LAYER x,y,z …".
func draw(t testing.TB, lines ...string) *outline.Drawing {
	t.Helper()
	var b strings.Builder
	b.WriteString("layer,x [m],y [m],z [m]\n")
	for _, l := range lines {
		f := strings.Fields(l)
		for _, p := range f[1:] {
			if strings.Count(p, ",") == 1 {
				p += ",0"
			}
			b.WriteString(f[0] + "," + p + "\n")
		}
		b.WriteString("\n")
	}
	d, err := outline.ReadCSV(strings.NewReader(b.String()))
	require.NoError(t, err)
	require.Empty(t, d.Faults)
	return d
}

func edgeNames(o *outline.Outline, list []int) (out []string) {
	for _, e := range list {
		out = append(out, o.Edges[e].Name)
	}
	return out
}

func TestAYardDrawnElsewhere(t *testing.T) {
	o, faults := trace(t, readFile(t, "yard.dxf"), outline.Unit{Name: "mm", Metres: 1e-3})
	require.Empty(t, faults)
	require.Len(t, o.Faces, 1)
	f := o.Faces[0]
	require.Equal(t, []string{"RIM:1", "RIM:2", "RIM:3", "WALL:1", "WALL:2", "RIM:4"}, edgeNames(o, f.Boundary))
	require.Equal(t, [][]string{{"TREE:1", "TREE:2", "TREE:3", "TREE:4"}}, [][]string{edgeNames(o, f.Holes[0])})
	// The ridge turns by little at (7, 4) and runs through.
	require.Equal(t, []string{"RIDGE:1"}, edgeNames(o, f.Lines))
	r := o.Edges[f.Lines[0]]
	require.Equal(t, "MAST:1", o.Points[r.From].Name)
	require.Equal(t, "MAST:2", o.Points[r.To].Name)
	require.Empty(t, f.Inside, "the masts are at the ends of the ridge")
	near(t, r3.Vec{X: 15.5, Y: 6}, o.Points[o.Edges[2].To].At, "snapped to the first of both ends")
	require.True(t, o.Edges[f.Holes[0][0]].Arc)
	require.True(t, f.Contains(2, 5))
	require.False(t, f.Contains(9.5, 7.2), "the hole")
	require.False(t, f.Contains(-1, 5))
}

func TestFacesHolesLinesAndPoints(t *testing.T) {
	o, faults := trace(t, draw(t,
		"RIM 0,0 10,0 10,8 0,8 0,0",
		"RIDGE 0,0 4,3.4 10,8",             // from corner to corner, with a bend
		"TREE 6,2 8,2 8,3 6,3 6,2",         // a hole
		"WALL 1,4 3,4 3,6 1,6 1,4",         // a wall around a fabric of its own
		"RIDGE 8,3 9,4",                    // from the hole, ending inside
		"MAST 0,0", "MAST 5,1", "MAST 2,5", // a corner, and two inside
		"GUY 0,0,0 -3,-3,-2", "OTHER 0,0 9,9", // not used
	), metre)
	require.Empty(t, faults)
	require.Len(t, o.Faces, 3)
	require.Equal(t, [][]string{{"RIM:1", "RIM:2", "RIDGE:1"}, {"RIM:3", "RIM:4", "RIDGE:1"}, {"WALL:1", "WALL:2", "WALL:3", "WALL:4"}},
		[][]string{edgeNames(o, o.Faces[0].Boundary), edgeNames(o, o.Faces[1].Boundary), edgeNames(o, o.Faces[2].Boundary)})
	require.Equal(t, []string{"TREE:1", "TREE:2", "TREE:3", "TREE:4"}, edgeNames(o, o.Faces[0].Holes[0]))
	require.Equal(t, []string{"RIDGE:2"}, edgeNames(o, o.Faces[0].Lines))
	require.Equal(t, []string{"WALL:1", "WALL:2", "WALL:3", "WALL:4"}, edgeNames(o, o.Faces[1].Holes[0]))
	require.Equal(t, "MAST:2", o.Points[o.Faces[0].Inside[0]].Name)
	require.Equal(t, "MAST:3", o.Points[o.Faces[2].Inside[0]].Name)
	require.Equal(t, "MAST:1", o.Points[o.Edges[0].From].Name, "a point names the corner it is at")
	require.Equal(t, "GUY:1", o.Stays[0].Name)
	require.Equal(t, o.Edges[0].From, o.Stays[0].From)
}

// A ridge between the rim and the hole is a line inside one fabric.
func TestABridgeDividesNothing(t *testing.T) {
	o, faults := trace(t, draw(t, "RIM 0,0 10,0 10,8 0,8 0,0", "TREE 6,2 8,2 8,3 6,3 6,2", "RIDGE 8,3 10,8", "RIDGE 0,8 6,3"), metre)
	require.Empty(t, faults)
	require.Len(t, o.Faces, 2, "two bridges do divide it")
	o, faults = trace(t, draw(t, "RIM 0,0 10,0 10,8 0,8 0,0", "TREE 6,2 8,2 8,3 6,3 6,2", "RIDGE 8,3 10,8"), metre)
	require.Empty(t, faults)
	require.Len(t, o.Faces, 1)
	require.Len(t, o.Faces[0].Holes, 1)
	require.Equal(t, []string{"RIDGE:1"}, edgeNames(o, o.Faces[0].Lines))
}

func TestFaultsHaveTheirPlaces(t *testing.T) {
	const rim = "RIM 0,0 10,0 10,8 0,8 0,0"
	for name, c := range map[string]struct {
		lines []string
		want  []string
		warns bool
	}{
		"gap": {[]string{"RIM 0,0 10,0 10,8 0,8 0,0.02"}, []string{
			"the outline is open: RIM (line 3) ends at (0, 0, 0) m: the nearest other end, of RIM (line 6), is 0.02 m away at (0, 0.02, 0) m",
			"the outline is open: RIM (line 6) ends at (0, 0.02, 0) m"}, false},
		"T-junction":       {[]string{rim, "RIDGE 5,0 5,4"}, []string{"RIDGE (line 9) ends at (5, 0, 0) m on RIM (line 3), between its ends"}, false},
		"nearly a T":       {[]string{rim, "RIDGE 5,0.003 5,4"}, []string{"RIDGE (line 9) ends at (5, 0.003, 0) m on RIM (line 3), between its ends"}, false},
		"crossing":         {[]string{rim, "RIDGE 5,-1 5,4"}, []string{"RIM (line 3) and RIDGE (line 9) cross at (5, 0, 0) m"}, false},
		"crossing heights": {[]string{"RIM 0,0,1 10,0,3 10,8 0,8 0,0,1", "RIDGE 5,-1 5,4"}, []string{"cross at (5, 0, 2) m"}, false},
		"overlap":          {[]string{rim, "WALL 10,0 6,0"}, []string{"WALL (line 9) ends at (6, 0, 0) m on RIM (line 3)"}, false},
		"twice":            {[]string{rim, "RIM 10,0 0,0"}, []string{"the line from (10, 0, 0) m to (0, 0, 0) m is drawn twice, as RIM (line 3) and RIM (line 9)"}, true},
		"on two layers":    {[]string{rim, "WALL 10,0 0,0"}, []string{"is on two layers, RIM (line 3) and WALL (line 9)"}, false},
		"heights":          {[]string{rim, "RIDGE 0,0,3 5,4,3"}, []string{"RIDGE (line 9) and RIM (line 3) end above each other at (0, 0, 0) m: one is 3 m higher"}, false},
		"upright":          {[]string{rim, "RIDGE 5,4,0 5,4,3"}, []string{"a line of RIDGE stands upright at (5, 4, 0) m"}, false},
		"point on line":    {[]string{rim, "MAST 5,8"}, []string{"the point of MAST (line 8) at (5, 8, 0) m lies on RIM (line 5) between its ends"}, false},
		"short":            {[]string{rim, "RIDGE 5,4 5,4.001"}, []string{"a line of RIDGE at (5, 4, 0) m is shorter than the snap of 0.005 m: left out"}, true},
		"points twice":     {[]string{rim, "MAST 5,4", "MAST 5,4.001"}, []string{"points of lines 8 and 10 are both at (5, 4.001, 0) m"}, true},
		"hole alone":       {[]string{rim, "TREE 20,0 22,0 22,2 20,0"}, []string{"the hole of TREE (line 9) at (20, 0, 0) m lies in no outline"}, false},
		"ridge outside":    {[]string{rim, "RIDGE 20,0 22,0"}, []string{"RIDGE (line 9) from (20, 0, 0) m to (22, 0, 0) m lies in no outline"}, false},
		"ridge in hole":    {[]string{rim, "TREE 2,2 6,2 6,6 2,2", "RIDGE 4,3 5,3"}, []string{"lies in a hole"}, false},
		"nothing":          {[]string{"OTHER 0,0 1,1"}, []string{"there is no line on any layer of the outline (RIM, WALL, TREE, RIDGE)"}, false},
		"encloses nothing": {[]string{"RIDGE 0,0 1,1"}, []string{"the lines of the outline enclose nothing"}, false},
		"no corner":        {[]string{"RIM 0,0 1,0.03 2,0.2 2.7,0.7 2.8,0.9 2.85,1.1 2.87,1.3 2.87,1.5 2.87,2 0,2 0,0"}, nil, false},
	} {
		t.Run(name, func(t *testing.T) {
			o, faults := trace(t, draw(t, c.lines...), metre)
			require.Len(t, faults, len(c.want), "%v", faults)
			for i, w := range c.want {
				require.Contains(t, faults[i].String(), w)
				require.Equal(t, c.warns, faults[i].Warning)
				require.True(t, c.warns || faults[i].Line > 0 || name == "nothing" || name == "encloses nothing")
			}
			require.Equal(t, len(c.want) == 0 || c.warns, o != nil)
		})
	}
}

// A wall is held all along: what ends on it breaks it, and says so.
func TestWallsAreBrokenWhereLinesEndOnThem(t *testing.T) {
	o, faults := trace(t, draw(t, "WALL 0,0,3 10,0,3 10,8,5 0,8 0,0,3", "RIDGE 4,0.003,3 5,8,2.5", "RIDGE 7,0,3 8,4", "MAST 2,0,3"), metre)
	require.Len(t, faults, 4, "%v", faults)
	for i, w := range []string{"WALL (line 3) is broken at (2, 0, 3) m, where a point is", "WALL (line 3) is broken at (4, 0.003, 3) m, where RIDGE (line 9) ends", "WALL (line 3) is broken at (7, 0, 3) m, where RIDGE (line 12) ends", "WALL (line 5) is broken at (5, 8, 2.5) m"} {
		require.True(t, faults[i].Warning)
		require.Contains(t, faults[i].String(), w)
	}
	require.Len(t, o.Faces, 2)
	require.Equal(t, []string{"WALL:1", "WALL:2", "RIDGE:1", "WALL:7", "WALL:8"}, edgeNames(o, o.Faces[0].Boundary))
	require.Equal(t, []string{"RIDGE:2"}, edgeNames(o, o.Faces[1].Lines))
	// Not where it passes above.
	_, faults = trace(t, draw(t, "WALL 0,0,3 10,0,3 10,8 0,8 0,0,3", "RIDGE 4,0 5,8"), metre)
	require.Contains(t, faults[len(faults)-1].String(), "between its ends")
	// An arc is broken into two arcs of one circle.
	d, err := outline.ReadDXF(strings.NewReader(dxf("LWPOLYLINE 8 WALL 70 1 10 -5 20 0 42 1 10 5 20 0", "LINE 8 RIDGE 10 -5 20 0 11 3 21 -4")))
	require.NoError(t, err)
	o, faults = trace(t, d, metre)
	require.Len(t, faults, 1)
	require.Len(t, o.Faces, 2)
	for _, e := range o.Edges {
		if e.Arc {
			require.InDelta(t, 5, math.Hypot(e.Through.X, e.Through.Y), 1e-6)
		}
	}
}

func TestACableWithoutCorners(t *testing.T) {
	d, err := outline.ReadDXF(strings.NewReader(dxf("CIRCLE 8 RIM 10 0 20 0 40 5")))
	require.NoError(t, err)
	_, faults := trace(t, d, metre)
	require.Len(t, faults, 1)
	require.Contains(t, faults[0].String(), "has no corner")
}

// The network does not depend on the order in which lines are drawn, nor on
// their direction, but for names.
func TestOrderAndDirectionDoNotMatter(t *testing.T) {
	a, fa := trace(t, draw(t, "RIM 0,0 10,0 10,8 0,8 0,0", "TREE 6,2 8,2 8,3 6,3 6,2", "RIDGE 0,0 4,3.4 10,8"), metre)
	b, fb := trace(t, draw(t, "RIDGE 10,8 4,3.4 0,0", "TREE 6,3 8,3 8,2 6,2 6,3", "RIM 10,0 0,0", "RIM 0,8 0,0", "RIM 0,8 10,8", "RIM 10,8 10,0"), metre)
	require.Empty(t, fa)
	require.Empty(t, fb)
	shape := func(o *outline.Outline) (out [][3]int) {
		for _, f := range o.Faces {
			out = append(out, [3]int{len(f.Boundary), len(f.Holes), len(f.Lines)})
		}
		return out
	}
	require.ElementsMatch(t, shape(a), shape(b))
	require.Len(t, b.Edges, len(a.Edges))
	require.Len(t, b.Points, len(a.Points))
}

func TestHeightsTakeArcsAlong(t *testing.T) {
	d, err := outline.ReadDXF(strings.NewReader(dxf("LWPOLYLINE 8 WALL 70 1 10 0 20 0 42 0.3 10 10 20 0 10 10 20 8")))
	require.NoError(t, err)
	o, faults := trace(t, d, metre)
	require.Empty(t, faults)
	i, near0, next := o.Nearest(r3.Vec{X: 9.8, Y: 0.1, Z: 77})
	require.InDelta(t, math.Hypot(0.2, 0.1), near0, 1e-12)
	require.Greater(t, next, 5.0)
	o.Raise(i, 4)
	require.Equal(t, 4.0, o.Points[i].At.Z)
	require.Equal(t, 2.0, o.Edges[0].Through.Z)
}
