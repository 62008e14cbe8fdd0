package export

import (
	"math"
	"testing"

	"anticlast/formfind/canopy"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

// A ball is seen to end on a circle of its radius, from everywhere; a surface
// seen from above that nowhere overhangs has no such line.
func TestSilhouettes(t *testing.T) {
	const n, m = 60, 40
	s := &canopy.Structure{}
	f := &canopy.Form{}
	add := func(theta, phi float64) int32 {
		f.Position = append(f.Position, r3.Vec{X: math.Sin(theta) * math.Cos(phi), Y: math.Sin(theta) * math.Sin(phi), Z: math.Cos(theta)})
		return int32(len(f.Position) - 1)
	}
	top, bottom := add(0, 0), add(math.Pi, 0)
	at := make([][]int32, m)
	for i := 1; i < m; i++ {
		for j := range n {
			at[i] = append(at[i], add(math.Pi*float64(i)/m, 2*math.Pi*float64(j)/n))
		}
	}
	for j := range n {
		k := (j + 1) % n
		s.Corners = append(s.Corners, [3]int32{top, at[1][j], at[1][k]}, [3]int32{bottom, at[m-1][k], at[m-1][j]})
		for i := 1; i < m-1; i++ {
			s.Corners = append(s.Corners, [3]int32{at[i][j], at[i+1][j], at[i+1][k]}, [3]int32{at[i][j], at[i+1][k], at[i][k]})
		}
	}
	ball := &canopy.Result{Structure: s, Form: f}
	for _, v := range views() {
		lines := silhouettes(ball, v)
		require.Len(t, lines, 1, v.name)
		turn := 0.0
		for i, p := range lines[0] {
			require.InDelta(t, 1, math.Hypot(r3.Dot(p, v.right), r3.Dot(p, v.up)), 0.02, v.name)
			if i > 0 {
				turn += r3.Dot(r3.Cross(lines[0][i-1], p), v.toward)
			}
		}
		require.InDelta(t, 2*math.Pi, math.Abs(turn), 0.05, "once around, seen as the %s", v.name)
	}
	require.Empty(t, silhouettes(sail(12), views()[0]))
	require.Contains(t, draw(cut(ball), views()[0], quick).body(), `"l turn"`)
}

// cut gives a bare surface what a drawing needs to have.
func cut(r *canopy.Result) *canopy.Result {
	s, f := r.Structure, r.Form
	s.Fabrics = []canopy.Fabric{{Name: "ball"}}
	s.Position = f.Position
	s.Fixed = make([]canopy.Freedom, len(f.Position))
	s.Held = make([]canopy.Freedom, len(f.Position))
	f.Reaction = make([]r3.Vec, len(f.Position))
	for range s.Corners {
		s.FabricOf = append(s.FabricOf, 0)
		s.Warp = append(s.Warp, r3.Vec{X: 1})
		s.Stress = append(s.Stress, [2]float64{1000, 1000})
		f.Warp = append(f.Warp, r3.Vec{X: 1})
		f.Stress = append(f.Stress, canopy.Stress{Warp: 1000, Weft: 1000})
	}
	return r
}
