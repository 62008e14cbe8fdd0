package mesh_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/mesh"
)

// Two films on one frame share its nodes and sides, nothing inside: no side has
// more than two triangles, and none of them is turned over. Narrow corners, in
// which both films would cut the same triangles off, included.
func TestFilmsOnOneFrameShareNothingInside(t *testing.T) {
	for seed := range uint64(60) {
		rnd := rand.New(rand.NewPCG(seed, 11))
		n := 3 + rnd.IntN(5)
		m := &canopy.Model{MeshSize: 0.4 + rnd.Float64()}
		var names []string
		for i := range n {
			a := 2 * math.Pi * (float64(i) + 0.7*(rnd.Float64()-0.5)) / float64(n)
			r := 3 + 3*rnd.Float64()
			m.Points = append(m.Points, canopy.Point{Name: fmt.Sprint("P", i), At: r3.Vec{X: r * math.Cos(a), Y: 0.5 * r * math.Sin(a), Z: 0.3 * rnd.Float64()}})
			m.Edges = append(m.Edges, canopy.Edge{Name: fmt.Sprint("e", i), From: fmt.Sprint("P", i), To: fmt.Sprint("P", (i+1)%n), Kind: canopy.EdgeFixed})
			names = append(names, fmt.Sprint("e", i))
		}
		pattern := canopy.FabricPattern(rnd.IntN(3))
		for _, name := range []string{"upper", "lower"} {
			m.Fabrics = append(m.Fabrics, canopy.ModelFabric{Name: name, Boundary: names, Warp: 1, Weft: 1, Pattern: pattern})
		}
		m.Fabrics[0].Volume, m.Fabrics[0].HasVolume, m.Fabrics[0].VolumeWith = 1, true, []string{"lower"}
		s, err := mesh.Build(t.Context(), m)
		require.NoError(t, err, "seed %d", seed)
		sides := map[[2]int32]int{}
		up := [2]float64{}
		for i, c := range s.Corners {
			for k := range 3 {
				a, b := c[k], c[(k+1)%3]
				sides[[2]int32{min(a, b), max(a, b)}]++
			}
			n := r3.Cross(r3.Sub(s.Position[c[1]], s.Position[c[0]]), r3.Sub(s.Position[c[2]], s.Position[c[0]]))
			require.NotZero(t, n.Z)
			f := s.FabricOf[i]
			if up[f] == 0 {
				up[f] = n.Z
			}
			require.Positive(t, up[f]*n.Z, "seed %d: a triangle of %s is turned over", seed, s.Fabrics[f].Name)
		}
		for side, n := range sides {
			require.Equal(t, 2, n, "seed %d: side %v", seed, side)
		}
		require.Len(t, s.Enclosures, 1)
		require.NotEqual(t, s.Enclosures[0].Side[0]*sign(up[0]), s.Enclosures[0].Side[1]*sign(up[1]), "one looks up, the other down")
		require.Equal(t, int8(1), s.Enclosures[0].Side[0]*sign(up[0]), "air is below the film that asks for it")
	}
}

func sign(v float64) int8 {
	if v < 0 {
		return -1
	}
	return 1
}

// The frame stays a frame on a finer mesh, also where no line says so, as in a
// listed structure.
func TestTheFrameOfTwoFilmsStaysSupported(t *testing.T) {
	m := &canopy.Model{MeshSize: 0.5}
	var names []string
	for i, p := range []r3.Vec{{}, {X: 3}, {X: 3, Y: 2, Z: 0.5}, {Y: 2}} {
		m.Points = append(m.Points, canopy.Point{Name: fmt.Sprint("P", i), At: p})
		m.Edges = append(m.Edges, canopy.Edge{Name: fmt.Sprint("e", i), From: fmt.Sprint("P", i), To: fmt.Sprint("P", (i+1)%4), Kind: canopy.EdgeFixed})
		names = append(names, fmt.Sprint("e", i))
	}
	for _, name := range []string{"upper", "lower"} {
		m.Fabrics = append(m.Fabrics, canopy.ModelFabric{Name: name, Boundary: names, Warp: 1, Weft: 1})
	}
	s, err := mesh.Build(t.Context(), m)
	require.NoError(t, err)
	for _, lines := range [][]canopy.Line{s.Lines, nil} {
		bare := *s
		bare.Lines = lines
		r, err := mesh.Refine(&bare)
		require.NoError(t, err)
		films := make([]uint8, len(r.Fine.Position))
		for i, c := range r.Fine.Corners {
			for _, k := range c {
				films[k] |= 1 << r.Fine.FabricOf[i]
			}
		}
		for i, f := range films {
			require.Equal(t, f == 3, r.Fine.Fixed[i] == canopy.DirAll, "node %d", i)
		}
	}
}
