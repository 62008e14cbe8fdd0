package mesh_test

import (
	"math"
	"slices"
	"testing"

	"anticlast/formfind/canopy"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

// A fabric between a steep arch and low corners, with a hole walked in either
// direction, starts at heights between those of its rims, and without thin
// triangles.
func TestHeightsStayBetweenThoseOfTheRims(t *testing.T) {
	for _, turned := range []bool{false, true} {
		m := &canopy.Model{MeshSize: 0.5}
		m.Points = append(m.Points, pt("A", 0, 0, 3), pt("B", 8, 1, 3), pt("C", 7.5, 10, 4.5), pt("D", 0, 10, 4.5))
		fixedEdge(m, "AB", "A", "B")
		fixedEdge(m, "BC", "B", "C")
		fixedEdge(m, "CD", "C", "D")
		m.Edges = append(m.Edges, canopy.Edge{Name: "DA", From: "D", To: "A", Arc: true, Through: r3.Vec{Y: 5, Z: 7}})
		m.Points = append(m.Points, pt("E", 3, 5, 4), pt("F", 5, 5, 4), pt("G", 4, 6.5, 4))
		fixedEdge(m, "EF", "E", "F")
		fixedEdge(m, "FG", "F", "G")
		fixedEdge(m, "GE", "G", "E")
		hole := []string{"EF", "FG", "GE"}
		if turned {
			slices.Reverse(hole)
		}
		f := sail("sail", "AB", "BC", "CD", "DA")
		f.Holes = [][]string{hole}
		m.Fabrics = []canopy.ModelFabric{f}
		s := build(t, m)
		for _, p := range s.Position {
			require.Greater(t, p.Z, 2.9)
			require.Less(t, p.Z, 7.1)
		}
		require.Greater(t, angles(s), 20*math.Pi/180)
	}
}
