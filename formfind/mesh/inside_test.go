package mesh_test

import (
	"context"
	"fmt"
	"math"
	"testing"

	"anticlast/formfind/canopy"
	"anticlast/formfind/mesh"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

// courtyard is a fabric with a hole for a tree, a ridge, a seam that ends inside
// and a point.
func courtyard() *canopy.Model {
	m := &canopy.Model{MeshSize: 0.6}
	corner := [][3]float64{{0, 0, 3}, {14, 0, 4}, {14, 9, 3}, {0, 9, 4}}
	var names []string
	for i, c := range corner {
		m.Points = append(m.Points, pt(fmt.Sprintf("P%d", i), c[0], c[1], c[2]))
	}
	for i := range corner {
		e := fmt.Sprintf("e%d", i)
		cableEdge(m, e, fmt.Sprintf("P%d", i), fmt.Sprintf("P%d", (i+1)%4), canopy.ModelCable{Sag: 0.08})
		names = append(names, e)
	}
	var hole []string
	for i := range 6 {
		sin, cos := math.Sincos(2 * math.Pi * float64(i) / 6)
		m.Points = append(m.Points, pt(fmt.Sprintf("H%d", i), 4+1.2*cos, 4.5+1.2*sin, 3.5))
		m.Points[len(m.Points)-1].Hold = canopy.HoldFree
	}
	for i := range 6 {
		h := fmt.Sprintf("h%d", i)
		// Clockwise, as good as any.
		cableEdge(m, h, fmt.Sprintf("H%d", (7-i)%6), fmt.Sprintf("H%d", 6-1-i+1-1), canopy.ModelCable{Force: 3e3})
		hole = append(hole, h)
	}
	for i := range hole {
		e := &m.Edges[4+i]
		e.From, e.To = fmt.Sprintf("H%d", (6-i)%6), fmt.Sprintf("H%d", 5-i)
	}
	m.Points = append(m.Points, pt("R0", 8, 2, 6), pt("R1", 11, 6, 6), pt("X", 6.5, 7.5, 4.2))
	cableEdge(m, "ridge", "R0", "R1", canopy.ModelCable{Force: 20e3})
	m.Edges[len(m.Edges)-1].Role = canopy.KindRidgeCable
	m.Edges = append(m.Edges, canopy.Edge{Name: "seam", From: "P2", To: "R1", Kind: canopy.EdgeSeam})
	f := sail("sail", names...)
	f.Holes, f.Lines, f.Inside = [][]string{hole}, []string{"ridge", "seam"}, []string{"X"}
	m.Fabrics = []canopy.ModelFabric{f}
	return m
}

func TestHolesLinesAndPointsInside(t *testing.T) {
	s := build(t, courtyard())
	v, e, f := topology(t, s)
	require.Equal(t, 0, v-e+f, "an annulus")
	require.Greater(t, angles(s), 20*math.Pi/180)
	used := map[int32]int{}
	for _, c := range s.Corners {
		for _, i := range c {
			used[i]++
		}
	}
	require.Positive(t, used[int32(nodeNamed(t, s, "X"))])
	// All sides of lines and holes are sides of triangles, of two and of one.
	count := map[[2]int32]int{}
	for _, c := range s.Corners {
		for k := range 3 {
			a, b := c[k], c[(k+1)%3]
			count[[2]int32{min(a, b), max(a, b)}]++
		}
	}
	sides := func(nodes []int32, want int) {
		for j := 1; j < len(nodes); j++ {
			a, b := nodes[j-1], nodes[j]
			require.Equal(t, want, count[[2]int32{min(a, b), max(a, b)}])
		}
	}
	sides(cableNamed(t, s, "ridge").Nodes, 2)
	sides(cableNamed(t, s, "h2").Nodes, 1)
	sides(cableNamed(t, s, "e1").Nodes, 1)
	for _, l := range s.Lines {
		require.Equal(t, "seam", l.Role)
		sides(l.Nodes, 2)
	}
	// The surface rises to the ridge: heights are means of their neighbours'.
	for _, c := range s.Corners {
		for _, i := range c {
			require.Less(t, s.Position[i].Z, 6+1e-9)
			require.Greater(t, s.Position[i].Z, 2.5)
		}
	}
	high := 0.0
	ridge := map[int32]bool{}
	for _, i := range cableNamed(t, s, "ridge").Nodes {
		ridge[i] = true
	}
	for _, c := range s.Corners {
		if ridge[c[0]] != ridge[c[1]] {
			high = max(high, s.Position[c[0]].Z, s.Position[c[1]].Z)
			require.Greater(t, min(s.Position[c[0]].Z, s.Position[c[1]].Z), 4.2)
		}
	}
	// Hole cables start bulged into the fabric, away from the hole.
	h := cableNamed(t, s, "h0")
	a, z := s.Position[h.Nodes[0]], s.Position[h.Nodes[len(h.Nodes)-1]]
	middle := s.Position[h.Nodes[len(h.Nodes)/2]]
	centre := r3.Vec{X: 4, Y: 4.5, Z: 3.5}
	require.Greater(t, r3.Norm(r3.Sub(middle, centre)), r3.Norm(r3.Sub(r3.Scale(0.5, r3.Add(a, z)), centre)))

	r, err := mesh.Refine(s)
	require.NoError(t, err)
	v, e, f = topology(t, r.Fine)
	require.Equal(t, 0, v-e+f)
}

// A fabric that fills the hole of another looks the same way.
func TestPatchInAHole(t *testing.T) {
	m := courtyard()
	hole := m.Fabrics[0].Holes[0]
	m.Fabrics = append(m.Fabrics, sail("patch", hole...))
	s := build(t, m)
	v, e, f := topology(t, s)
	require.Equal(t, 1, v-e+f)
	for _, c := range s.Corners {
		n := r3.Cross(r3.Sub(s.Position[c[1]], s.Position[c[0]]), r3.Sub(s.Position[c[2]], s.Position[c[0]]))
		require.Greater(t, n.Z, 0.0)
	}
}

func TestInsideIsRefusedOutside(t *testing.T) {
	for name, c := range map[string]struct {
		change func(*canopy.Model)
		text   string
	}{
		"point outside":  {func(m *canopy.Model) { m.Points[len(m.Points)-1].At.X = 30 }, "point X: it does not lie inside fabric sail"},
		"point in hole":  {func(m *canopy.Model) { m.Points[len(m.Points)-1].At = r3.Vec{X: 4, Y: 4.5, Z: 3} }, "point X: it does not lie inside fabric sail"},
		"ridge outside":  {func(m *canopy.Model) { m.Points[10].At.X, m.Points[11].At.X = 20, 21 }, "edge ridge: it does not lie inside fabric sail"},
		"ridge crossing": {func(m *canopy.Model) { m.Points[10].At = r3.Vec{X: 1.5, Y: 4.5, Z: 5} }, "edge ridge: it crosses another line or the rim of fabric sail"},
		"hole outside": {func(m *canopy.Model) {
			for i := 4; i < 10; i++ {
				m.Points[i].At.X += 30
				m.Points[i].Hold = canopy.HoldAnchored
			}
		}, "its hole has no fabric around it"},
		"line twice":    {func(m *canopy.Model) { m.Fabrics[0].Lines = []string{"ridge", "ridge"} }, "its line ridge is listed twice"},
		"unknown line":  {func(m *canopy.Model) { m.Fabrics[0].Lines = []string{"ridg"} }, `its line "ridg" is not defined`},
		"unknown point": {func(m *canopy.Model) { m.Fabrics[0].Inside = []string{"Y"} }, `its point "Y" is not defined`},
	} {
		t.Run(name, func(t *testing.T) {
			m := courtyard()
			c.change(m)
			_, err := mesh.Build(context.Background(), m)
			require.ErrorContains(t, err, c.text)
		})
	}
}
