package fdm_test

import (
	"context"
	"flag"
	"math"
	"math/rand/v2"
	"os"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/fdm"
)

// The size of sweeping tests: small (seconds), middle or large. A sweep is the
// same test at another size.
var sweepSize = flag.String("sweep", os.Getenv("ANTICLAST_SWEEP"), "size of sweeping tests: small, middle or large")

func sweep(small, middle, large int) int {
	switch *sweepSize {
	case "middle":
		return middle
	case "large":
		return large
	}
	return small
}

func vec(x, y, z float64) r3.Vec { return r3.Vec{X: x, Y: y, Z: z} }

func newSolver(t testing.TB, n fdm.Network, panels []fdm.Panel) *fdm.Solver {
	t.Helper()
	s, err := fdm.New(context.Background(), n, panels)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func shape(t testing.TB, s *fdm.Solver, q []float64) []r3.Vec {
	t.Helper()
	x := make([]r3.Vec, s.Nodes())
	if err := s.Shape(context.Background(), x, q); err != nil {
		t.Fatal(err)
	}
	return x
}

func uniform(n int, v float64) []float64 {
	q := make([]float64, n)
	for i := range q {
		q[i] = v
	}
	return q
}

// grid is a net of (nx+1)×(ny+1) nodes, node (i, j) at number i+j(nx+1); the
// nodes for which fixed says so are held in all directions.
func grid(nx, ny int, place func(u, v float64) r3.Vec, fixed func(i, j int) bool) fdm.Network {
	var n fdm.Network
	w := nx + 1
	for j := 0; j <= ny; j++ {
		for i := 0; i <= nx; i++ {
			n.Position = append(n.Position, place(float64(i)/float64(nx), float64(j)/float64(ny)))
			var f fdm.Directions
			if fixed(i, j) {
				f = fdm.DirAll
			}
			n.Fixed = append(n.Fixed, f)
			if i < nx {
				n.Ends = append(n.Ends, [2]int32{int32(i + j*w), int32(i + 1 + j*w)})
			}
			if j < ny {
				n.Ends = append(n.Ends, [2]int32{int32(i + j*w), int32(i + (j+1)*w)})
			}
		}
	}
	return n
}

// saddle is a grid with all of its boundary held on a bilinear surface.
func saddle(nx, ny int, size, height float64) fdm.Network {
	return grid(nx, ny, func(u, v float64) r3.Vec {
		return vec(size*u, size*v, height*(u+v-2*u*v))
	}, func(i, j int) bool { return i == 0 || j == 0 || i == nx || j == ny })
}

func maxDistance(a, b []r3.Vec) float64 {
	d := 0.0
	for i := range a {
		d = max(d, r3.Norm(r3.Sub(a[i], b[i])))
		if math.IsNaN(a[i].X + a[i].Y + a[i].Z + b[i].X + b[i].Y + b[i].Z) {
			return math.NaN()
		}
	}
	return d
}

// near fails the test unless got is want to within tol.
func near(t testing.TB, what string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol) {
		t.Errorf("%s = %.12g, want %.12g (within %g, off by %.3g)", what, got, want, tol, got-want)
	}
}

// randomNetwork is a connected network of n nodes with random supports by
// direction: a spanning tree and some extra members.
func randomNetwork(r *rand.Rand, n int) fdm.Network {
	net := fdm.Network{Position: make([]r3.Vec, n), Fixed: make([]fdm.Directions, n)}
	for i := range n {
		net.Position[i] = vec(20*r.Float64()-10, 20*r.Float64()-10, 10*r.Float64())
		if i > 0 {
			net.Ends = append(net.Ends, [2]int32{int32(r.IntN(i)), int32(i)})
		}
		if r.IntN(6) == 0 {
			net.Fixed[i] = fdm.Directions(r.IntN(8))
		}
	}
	net.Fixed[r.IntN(n)] = fdm.DirAll
	for range r.IntN(2 * n) {
		a, b := int32(r.IntN(n)), int32(r.IntN(n))
		if a != b {
			net.Ends = append(net.Ends, [2]int32{a, b})
		}
	}
	if r.IntN(2) == 0 {
		net.Load = make([]r3.Vec, n)
		for i := range net.Load {
			net.Load[i] = vec(r.NormFloat64(), r.NormFloat64(), r.NormFloat64())
		}
	}
	return net
}
