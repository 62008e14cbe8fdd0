package outline_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"anticlast/formfind/outline"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
	"pgregory.net/rapid"
)

// patchwork draws nx × ny panels, turned and moved, each side a line of its own
// drawn in any direction and order, with ends that miss their points by less
// than half the snap. Some panels have a hole.
func patchwork(seed uint64, nx, ny int, turn float64, holes bool) (d *outline.Drawing, inside []r3.Vec, nholes int) {
	rng := rand.New(rand.NewPCG(seed, 1))
	d = &outline.Drawing{}
	sin, cos := math.Sincos(turn)
	at := func(x, y float64) r3.Vec {
		return r3.Vec{X: 1e4 + cos*x - sin*y, Y: -3e3 + sin*x + cos*y, Z: 3 + 0.1*x}
	}
	miss := func(v r3.Vec) r3.Vec {
		return r3.Add(v, r3.Vec{X: 0.001 * (rng.Float64() - 0.5), Y: 0.001 * (rng.Float64() - 0.5), Z: 0.001 * (rng.Float64() - 0.5)})
	}
	grid := make([][]r3.Vec, ny+1)
	for j := range grid {
		for i := range nx + 1 {
			grid[j] = append(grid[j], at(3*float64(i)+0.8*rng.Float64(), 3*float64(j)+0.8*rng.Float64()))
		}
	}
	line := func(layer string, a, b r3.Vec) {
		if rng.IntN(2) == 0 {
			a, b = b, a
		}
		s := outline.Segment{Layer: layer, Path: len(d.Segments), A: miss(a), B: miss(b), Line: len(d.Segments) + 1}
		if rng.IntN(3) == 0 { // a flat arc
			m := r3.Scale(0.5, r3.Add(a, b))
			c := r3.Sub(b, a)
			s.Arc, s.Through = true, r3.Add(m, r3.Vec{X: -0.05 * c.Y, Y: 0.05 * c.X, Z: 0.1})
		}
		d.Segments = append(d.Segments, s)
	}
	for j := range ny + 1 {
		for i := range nx + 1 {
			if i < nx {
				line("WALL", grid[j][i], grid[j][i+1])
			}
			if j < ny {
				line("WALL", grid[j][i], grid[j+1][i])
			}
			if i < nx && j < ny {
				inside = append(inside, r3.Scale(0.25, r3.Add(r3.Add(grid[j][i], grid[j][i+1]), r3.Add(grid[j+1][i], grid[j+1][i+1]))))
			}
		}
	}
	for _, c := range inside {
		if holes && rng.IntN(2) == 0 {
			nholes++
			for k := range 3 {
				a, b := 2*math.Pi*float64(k)/3, 2*math.Pi*float64(k+1)/3
				line("TREE", r3.Add(c, r3.Vec{X: 0.4 * math.Cos(a), Y: 0.4 * math.Sin(a)}), r3.Add(c, r3.Vec{X: 0.4 * math.Cos(b), Y: 0.4 * math.Sin(b)}))
			}
		}
	}
	rng.Shuffle(len(d.Segments), func(i, j int) { d.Segments[i], d.Segments[j] = d.Segments[j], d.Segments[i] })
	return d, inside, nholes
}

// Euler: a patchwork has as many faces as panels, each place lies in one of
// them, every line bounds one or two, whatever the order, direction and place.
func TestPatchworksAreFoundWhole(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		nx, ny := rapid.IntRange(1, 6).Draw(rt, "nx"), rapid.IntRange(1, 6).Draw(rt, "ny")
		d, inside, holes := patchwork(rapid.Uint64().Draw(rt, "seed"), nx, ny, rapid.Float64Range(-4, 4).Draw(rt, "turn"), rapid.Bool().Draw(rt, "holes"))
		o, faults := outline.Trace(d, layers, outline.Options{Unit: metre, Snap: 0.005, Corner: 0.1})
		require.Empty(rt, faults)
		require.Len(rt, o.Faces, nx*ny)
		require.Len(rt, o.Points, (nx+1)*(ny+1)+3*holes)
		found := 0
		uses := make([]int, len(o.Edges))
		for _, f := range o.Faces {
			found += len(f.Holes)
			require.Len(rt, f.Boundary, 4)
			require.Empty(rt, f.Lines)
			for _, e := range f.Boundary {
				uses[e]++
			}
			for _, h := range f.Holes {
				require.Len(rt, h, 3)
				for _, e := range h {
					uses[e]++
				}
			}
		}
		require.Equal(rt, holes, found)
		for e, n := range uses {
			require.True(rt, n == 1 || n == 2, o.Edges[e])
		}
		for _, c := range inside {
			n := 0
			for i := range o.Faces {
				if o.Faces[i].Contains(c.X+0.7, c.Y) { // beside the holes
					n++
				}
			}
			require.Equal(rt, 1, n)
		}
	})
}

// One line taken out is a gap, or joins two panels; one too many that crosses is
// told.
func TestPatchworksWithAFaultAreRefused(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		d, inside, _ := patchwork(rapid.Uint64().Draw(rt, "seed"), 3, 3, 0.3, false)
		a, b := inside[rapid.IntRange(0, 8).Draw(rt, "a")], inside[rapid.IntRange(0, 8).Draw(rt, "b")]
		if a == b {
			return
		}
		d.Segments = append(d.Segments, outline.Segment{Layer: "RIDGE", Path: 999, A: a, B: b, Line: 999})
		o, faults := outline.Trace(d, layers, outline.Options{Unit: metre, Snap: 0.005, Corner: 0.1})
		require.Nil(rt, o)
		require.NotEmpty(rt, faults)
		for _, f := range faults {
			require.Contains(rt, f.String(), "RIDGE (line 999)")
		}
	})
}

func BenchmarkTrace(b *testing.B) {
	for _, n := range []int{10, 30, 60} {
		b.Run(fmt.Sprintf("%d panels", n*n), func(b *testing.B) {
			d, _, _ := patchwork(1, n, n, 0.3, false)
			for b.Loop() {
				if o, _ := outline.Trace(d, layers, outline.Options{Unit: metre, Snap: 0.005, Corner: 0.1}); o == nil {
					b.Fatal("not traced")
				}
			}
		})
	}
}
