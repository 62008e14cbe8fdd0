package mesh_test

import (
	"fmt"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// A positive pressure pushes up on each of two films in one frame, in whatever
// order and direction they are drawn: which side of both together looks up
// nothing says.
func TestPressurePushesUpOnBothFilms(t *testing.T) {
	corner := []r3.Vec{{}, {X: 6, Z: 1}, {X: 6, Y: 4}, {Y: 4, Z: 1}}
	for _, names := range [][]string{{"e0", "e1", "e2", "e3"}, {"e3", "e2", "e1", "e0"}} {
		m := &canopy.Model{MeshSize: 1}
		for i, p := range corner {
			m.Points = append(m.Points, canopy.Point{Name: fmt.Sprint("P", i), At: p})
			fixedEdge(m, fmt.Sprint("e", i), fmt.Sprint("P", i), fmt.Sprint("P", (i+1)%4))
		}
		for _, name := range []string{"one", "two"} {
			m.Fabrics = append(m.Fabrics, canopy.ModelFabric{Name: name, Boundary: names, Warp: 1, Weft: 1, Properties: canopy.Fabric{Pressure: 300}})
		}
		s := build(t, m)
		push := make([]float64, 2)
		for k, c := range s.Corners {
			x := s.Position
			f := s.FabricOf[k]
			push[f] += s.Fabrics[f].Pressure * r3.Cross(r3.Sub(x[c[1]], x[c[0]]), r3.Sub(x[c[2]], x[c[0]])).Z / 2
		}
		require.InDelta(t, 300*24, push[0], 1e-6)
		require.InDelta(t, 300*24, push[1], 1e-6)
	}
}
