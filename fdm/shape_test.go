package fdm_test

import (
	"context"
	"encoding/json"
	"errors"
	"math"
	"math/rand/v2"
	"os"
	"testing"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/fdm"
)

// One node between four anchors moves to their mean weighted with the force
// densities: (0+20+10+0, 0+0+20+10, 0+4+0+4)/5. Follows directly from the
// equations of Schek 1974.
func TestSingleNodeIsWeightedMean(t *testing.T) {
	n := fdm.Network{
		Position: []r3.Vec{{}, vec(10, 0, 2), vec(10, 10, 0), vec(0, 10, 4), vec(-3, 77, 1)},
		Fixed:    []fdm.Directions{7, 7, 7, 7, 0},
		Ends:     [][2]int32{{0, 4}, {4, 1}, {4, 2}, {3, 4}},
	}
	x := shape(t, newSolver(t, n, nil), []float64{1, 1, 2, 1})
	if d := r3.Norm(r3.Sub(x[4], vec(6, 6, 1.2))); d > 1e-14 {
		t.Errorf("node at %v, want (6, 6, 1.2)", x[4])
	}
}

// A cable of n segments of equal force density q under nodal loads P hangs on
// z_i = −P i (n−i)/(2q): the difference equation q(z_{i−1} − 2z_i + z_{i+1}) = P.
func TestLoadedCableIsParabola(t *testing.T) {
	const (
		segments = 10
		q        = 5.0
		load     = 3.0
	)
	var n fdm.Network
	for i := 0; i <= segments; i++ {
		n.Position = append(n.Position, vec(float64(i), 0, 0))
		n.Fixed = append(n.Fixed, 0)
		n.Load = append(n.Load, vec(0, 0, -load))
		if i > 0 {
			n.Ends = append(n.Ends, [2]int32{int32(i - 1), int32(i)})
		}
	}
	n.Fixed[0], n.Fixed[segments] = fdm.DirAll, fdm.DirAll
	x := shape(t, newSolver(t, n, nil), uniform(segments, q))
	for i, p := range x {
		near(t, "z", p.Z, -load*float64(i)*float64(segments-i)/(2*q), 1e-13)
		near(t, "x", p.X, float64(i), 1e-13)
	}
	near(t, "centre", x[5].Z, -7.5, 1e-13)
}

// Three nets with edge cables of force density 2, 5 and 10; the source stands
// in the data file.
func TestNetsOfFiveByFive(t *testing.T) {
	text, err := os.ReadFile("testdata/nets_5x5.json")
	if err != nil {
		t.Fatal(err)
	}
	var file struct {
		Cases []struct {
			EdgeQ       float64      `json:"edge_q"`
			SumQL2      float64      `json:"sum_q_l2"`
			Fixed       []int32      `json:"fixed"`
			Members     [][2]int32   `json:"members"`
			Q           []float64    `json:"q"`
			Start       [][3]float64 `json:"start"`
			Equilibrium [][3]float64 `json:"equilibrium"`
		} `json:"cases"`
	}
	if err := json.Unmarshal(text, &file); err != nil {
		t.Fatal(err)
	}
	if len(file.Cases) != 3 {
		t.Fatalf("%d cases, want 3", len(file.Cases))
	}
	for _, c := range file.Cases {
		n := fdm.Network{Ends: c.Members, Fixed: make([]fdm.Directions, len(c.Start))}
		for _, p := range c.Start {
			n.Position = append(n.Position, vec(p[0], p[1], p[2]))
		}
		for _, i := range c.Fixed {
			n.Fixed[i] = fdm.DirAll
		}
		x := shape(t, newSolver(t, n, nil), c.Q)
		sum := 0.0
		for k, e := range c.Members {
			sum += c.Q[k] * r3.Norm2(r3.Sub(x[e[0]], x[e[1]]))
		}
		near(t, "Σ q L²", sum, c.SumQL2, 1e-12*c.SumQL2)
		near(t, "centre z", x[12].Z, 1, 1e-14)
		for i, p := range c.Equilibrium {
			if d := r3.Norm(r3.Sub(x[i], vec(p[0], p[1], p[2]))); d > 2e-10 {
				t.Errorf("edge q = %g: node %d off by %g", c.EdgeQ, i, d)
			}
		}
	}
}

// Equal force densities take the node between three anchors to the centroid;
// that is not the Fermat point (0.957…, 1.066…), which belongs to equal forces.
func TestEqualForceDensitiesGiveCentroid(t *testing.T) {
	n := fdm.Network{
		Position: []r3.Vec{{}, vec(6, 0, 0), vec(0, 4, 0), vec(1, 1, 1)},
		Fixed:    []fdm.Directions{7, 7, 7, 0},
		Ends:     [][2]int32{{0, 3}, {1, 3}, {2, 3}},
	}
	s := newSolver(t, n, nil)
	x := shape(t, s, uniform(3, 2.5))
	if d := r3.Norm(r3.Sub(x[3], vec(2, 4.0/3, 0))); d > 1e-14 {
		t.Errorf("node at %v, want the centroid (2, 1.333, 0)", x[3])
	}
	length := 0.0
	for _, l := range lengths(n, x) {
		length += l
	}
	// Recomputed by hand: √(4+16/9) + √(16+16/9) + √(4+64/9).
	near(t, "length", length, 9.9534043972, 1e-10)
}

func lengths(n fdm.Network, x []r3.Vec) []float64 {
	l := make([]float64, len(n.Ends))
	for k, e := range n.Ends {
		l[k] = r3.Norm(r3.Sub(x[e[1]], x[e[0]]))
	}
	return l
}

// On a regular grid with straight edges equal force densities give the
// bilinear (hyperbolic paraboloid) surface exactly: the second differences of
// a bilinear function vanish along both families.
func TestStraightEdgedGridIsHypar(t *testing.T) {
	n := saddle(24, 17, 10, 3)
	want := append([]r3.Vec(nil), n.Position...)
	for i := range n.Position {
		if n.Fixed[i] == 0 {
			n.Position[i] = vec(1e3, -5, 7) // the start must not matter
		}
	}
	x := shape(t, newSolver(t, n, nil), uniform(len(n.Ends), 3))
	if d := maxDistance(x, want); d > 1e-13 {
		t.Errorf("off the bilinear surface by %g", d)
	}
}

// denseShape solves the same equations with gonum's dense LU decomposition.
func denseShape(n fdm.Network, q []float64) ([]r3.Vec, float64) {
	x := append([]r3.Vec(nil), n.Position...)
	worst := 0.0
	for axis := range 3 {
		get := func(v r3.Vec) float64 { return [3]float64{v.X, v.Y, v.Z}[axis] }
		number := make([]int, len(x))
		free := 0
		for i := range x {
			number[i] = -1
			if !n.Fixed[i].Has(axis) {
				number[i] = free
				free++
			}
		}
		if free == 0 {
			continue
		}
		d := mat.NewDense(free, free, nil)
		b := mat.NewVecDense(free, nil)
		for i := range x {
			if number[i] >= 0 && n.Load != nil {
				b.SetVec(number[i], get(n.Load[i]))
			}
		}
		for k, e := range n.Ends {
			for s := range 2 {
				i, j := number[e[s]], number[e[1-s]]
				if i < 0 {
					continue
				}
				d.Set(i, i, d.At(i, i)+q[k])
				if j >= 0 {
					d.Set(i, j, d.At(i, j)-q[k])
				} else {
					b.SetVec(i, b.AtVec(i)+q[k]*get(n.Position[e[1-s]]))
				}
			}
		}
		var lu mat.LU
		lu.Factorize(d)
		worst = max(worst, lu.Cond())
		var y mat.VecDense
		if lu.SolveVecTo(&y, false, b) != nil {
			return nil, math.Inf(1)
		}
		for i := range x {
			if number[i] < 0 {
				continue
			}
			switch v := y.AtVec(number[i]); axis {
			case 0:
				x[i].X = v
			case 1:
				x[i].Y = v
			default:
				x[i].Z = v
			}
		}
	}
	return x, worst
}

// Random networks, supports and loads by direction, against gonum's dense LU.
// Signs: all tension, all compression, mixed.
func TestAgreesWithDenseSolver(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for trial := range sweep(400, 4000, 40000) {
		n := randomNetwork(r, 2+r.IntN(40))
		q := make([]float64, len(n.Ends))
		sign := r.IntN(3)
		for k := range q {
			q[k] = math.Exp(2 * r.NormFloat64())
			if sign == 1 || sign == 2 && r.IntN(3) == 0 {
				q[k] = -q[k]
			}
		}
		want, cond := denseShape(n, q)
		if cond > 1e9 {
			continue
		}
		s := newSolver(t, n, nil)
		x := make([]r3.Vec, len(n.Position))
		if err := s.Shape(context.Background(), x, q); err != nil {
			t.Fatalf("trial %d, condition %.2g: %v", trial, cond, err)
		}
		size := 0.0
		for _, p := range want {
			size = max(size, r3.Norm(p))
		}
		if d := maxDistance(x, want); !(d <= 1e-14*size*max(cond, 10)) {
			t.Errorf("trial %d (%d nodes, signs %d): off by %g, size %g, condition %.2g", trial, len(x), sign, d, size, cond)
		}
		if left := imbalance(n, x, q); !(left < 1e-14) {
			t.Errorf("trial %d (%d nodes, signs %d): forces out of balance by %g", trial, len(x), sign, left)
		}
	}
}

// imbalance is the largest component of the sum of forces at a node in a free
// direction, over the largest size of what was added up there (q times
// coordinates, so that rounding of positions is no failure).
func imbalance(n fdm.Network, x []r3.Vec, q []float64) float64 {
	worst, most := outOfBalance(n, x, q)
	if worst == 0 {
		return 0
	}
	return worst / most
}

func outOfBalance(n fdm.Network, x []r3.Vec, q []float64) (worst, most float64) {
	sum := make([]r3.Vec, len(x))
	size := make([]float64, len(x))
	if n.Load != nil {
		copy(sum, n.Load)
	}
	for k, e := range n.Ends {
		f := r3.Scale(q[k], r3.Sub(x[e[1]], x[e[0]]))
		s := math.Abs(q[k]) * (r3.Norm(x[e[0]]) + r3.Norm(x[e[1]]))
		sum[e[0]], size[e[0]] = r3.Add(sum[e[0]], f), size[e[0]]+s
		sum[e[1]], size[e[1]] = r3.Sub(sum[e[1]], f), size[e[1]]+s
	}
	for i, f := range sum {
		for axis, v := range [3]float64{f.X, f.Y, f.Z} {
			if !n.Fixed[i].Has(axis) {
				worst = max(worst, math.Abs(v))
			}
		}
		most = max(most, size[i])
	}
	return worst, most
}

// For positive force densities without loads the shape makes Σ q L² least
// (Schek 1974): every change of it makes the sum larger, by the second-order
// term alone.
func TestShapeMakesWeightedSquaresLeast(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	for range 50 {
		n := randomNetwork(r, 30)
		n.Load = nil
		q := make([]float64, len(n.Ends))
		for k := range q {
			q[k] = 0.1 + r.Float64()
		}
		x := shape(t, newSolver(t, n, nil), q)
		sum := func(x []r3.Vec) (s float64) {
			for k, e := range n.Ends {
				s += q[k] * r3.Norm2(r3.Sub(x[e[0]], x[e[1]]))
			}
			return s
		}
		least := sum(x)
		y := append([]r3.Vec(nil), x...)
		d := make([]r3.Vec, len(x))
		for i := range y {
			for axis, c := range []*float64{&d[i].X, &d[i].Y, &d[i].Z} {
				if !n.Fixed[i].Has(axis) {
					*c = 0.1 * r.NormFloat64()
				}
			}
			y[i] = r3.Add(y[i], d[i])
		}
		near(t, "Σ q L² of a changed shape", sum(y), least+sum(d), 1e-11*(least+sum(d)))
	}
}

func TestReactionsBalanceLoads(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 6))
	for range 50 {
		n := randomNetwork(r, 25)
		n.Load = make([]r3.Vec, 25)
		q := make([]float64, len(n.Ends))
		for i := range n.Load {
			n.Load[i] = vec(r.NormFloat64(), r.NormFloat64(), r.NormFloat64())
		}
		for k := range q {
			q[k] = 0.1 + r.Float64()
		}
		s := newSolver(t, n, nil)
		x := shape(t, s, q)
		reaction := make([]r3.Vec, 25)
		s.Reactions(reaction, x, q)
		var force, size float64
		var sum, moment r3.Vec
		for i := range x {
			f := r3.Add(reaction[i], n.Load[i])
			sum = r3.Add(sum, f)
			moment = r3.Add(moment, r3.Cross(x[i], f))
			force += r3.Norm(f)
			size += r3.Norm(f) * r3.Norm(x[i])
			for axis := range 3 {
				if v := [3]float64{reaction[i].X, reaction[i].Y, reaction[i].Z}[axis]; v != 0 && !n.Fixed[i].Has(axis) {
					t.Errorf("node %d reacts along %d, where it is free", i, axis)
				}
			}
		}
		near(t, "sum of forces", r3.Norm(sum), 0, 1e-12*force)
		near(t, "sum of moments", r3.Norm(moment), 0, 1e-12*size)
	}
}

// Far from the origin only the last digits of the coordinates themselves go.
func TestFarFromOrigin(t *testing.T) {
	n := saddle(20, 20, 10, 3)
	q := uniform(len(n.Ends), 1)
	x := shape(t, newSolver(t, n, nil), q)
	const far = 1 << 20
	for i := range n.Position {
		n.Position[i] = r3.Add(n.Position[i], vec(far, -far, far/2))
	}
	y := shape(t, newSolver(t, n, nil), q)
	for i := range y {
		y[i] = r3.Sub(y[i], vec(far, -far, far/2))
	}
	if d := maxDistance(x, y); d > 4e-9 { // a few times 2⁻³²
		t.Errorf("the shape moved by %g", d)
	}
}

func TestNothingFree(t *testing.T) {
	n := saddle(1, 1, 1, 1)
	x := shape(t, newSolver(t, n, nil), uniform(len(n.Ends), 1))
	if d := maxDistance(x, n.Position); d != 0 {
		t.Errorf("moved by %g", d)
	}
	empty := newSolver(t, fdm.Network{}, nil)
	if x := shape(t, empty, nil); len(x) != 0 {
		t.Error("nodes from nowhere")
	}
	alone := fdm.Network{Position: []r3.Vec{vec(1, 2, 3)}, Fixed: []fdm.Directions{fdm.DirAll}}
	if x := shape(t, newSolver(t, alone, nil), nil); x[0] != vec(1, 2, 3) {
		t.Errorf("moved to %v", x[0])
	}
}

// Two members between the same nodes count as one of the sum.
func TestDuplicateMembersAddUp(t *testing.T) {
	n := saddle(6, 6, 5, 1)
	q := uniform(len(n.Ends), 1)
	q[20] = 3
	want := shape(t, newSolver(t, n, nil), q)
	n.Ends = append(n.Ends, n.Ends[20], [2]int32{n.Ends[20][1], n.Ends[20][0]})
	q = uniform(len(n.Ends), 1)
	if d := maxDistance(shape(t, newSolver(t, n, nil), q), want); d > 1e-14 {
		t.Errorf("off by %g", d)
	}
}

// Parts that do not touch are found each by itself.
func TestDisconnectedParts(t *testing.T) {
	a, b := saddle(5, 5, 4, 1), saddle(7, 4, 9, -2)
	shift := int32(len(a.Position))
	both := fdm.Network{
		Position: append(append([]r3.Vec(nil), a.Position...), b.Position...),
		Fixed:    append(append([]fdm.Directions(nil), a.Fixed...), b.Fixed...),
		Ends:     append([][2]int32(nil), a.Ends...),
	}
	for _, e := range b.Ends {
		both.Ends = append(both.Ends, [2]int32{e[0] + shift, e[1] + shift})
	}
	r := rand.New(rand.NewPCG(7, 8))
	q := make([]float64, len(both.Ends))
	for k := range q {
		q[k] = 0.5 + r.Float64()
	}
	want := append(shape(t, newSolver(t, a, nil), q[:len(a.Ends)]), shape(t, newSolver(t, b, nil), q[len(a.Ends):])...)
	if d := maxDistance(shape(t, newSolver(t, both, nil), q), want); d > 1e-14 {
		t.Errorf("off by %g", d)
	}
}

// A rigid ring of nodes tied to its centre is one node: it moves along z as if
// all members were attached to one point of the sum of their pulls.
func TestRigidRingMovesAsOne(t *testing.T) {
	const (
		around = 8
		load   = 7.0
		q      = 2.0
	)
	var n fdm.Network
	add := func(p r3.Vec, f fdm.Directions, master int32) int32 {
		n.Position = append(n.Position, p)
		n.Fixed = append(n.Fixed, f)
		n.Master = append(n.Master, master)
		n.Load = append(n.Load, r3.Vec{})
		return int32(len(n.Position) - 1)
	}
	centre := add(vec(0, 0, 1), fdm.DirX|fdm.DirY, -1)
	for k := range around {
		sin, cos := math.Sincos(2 * math.Pi * float64(k) / around)
		ring := add(vec(cos, sin, 1.25), 0, centre) // a quarter above the centre
		foot := add(vec(4*cos, 4*sin, 0), fdm.DirAll, -1)
		n.Ends = append(n.Ends, [2]int32{ring, foot})
	}
	// Members of the ring itself change nothing: both ends move together.
	n.Ends = append(n.Ends, [2]int32{1, 3}, [2]int32{3, 5})
	n.Load[3] = vec(0, 0, load) // on a tied node
	q8 := append(uniform(around, q), 100, 100)
	x := shape(t, newSolver(t, n, nil), q8)
	// Σ q (0 − z_ring) + load = 0.
	want := load / (around * q)
	for k := range around {
		near(t, "z of the ring", x[1+2*k].Z, want, 1e-14)
		near(t, "x of the ring", x[1+2*k].X, n.Position[1+2*k].X, 1e-15)
	}
	near(t, "z of the centre", x[centre].Z, want-0.25, 1e-14)
}

func TestAllocatesNothingLater(t *testing.T) {
	n := saddle(30, 30, 10, 2)
	s := newSolver(t, n, nil)
	q := uniform(len(n.Ends), 1)
	x := make([]r3.Vec, s.Nodes())
	ctx := context.Background()
	allocs := testing.AllocsPerRun(10, func() {
		if err := s.Shape(ctx, x, q); err != nil {
			t.Fatal(err)
		}
	})
	if allocs > 0 {
		t.Errorf("%g allocations for a shape", allocs)
	}
}

func TestCancelled(t *testing.T) {
	n := saddle(30, 30, 10, 2)
	ctx, cancel := context.WithCancel(context.Background())
	s := newSolver(t, n, nil)
	cancel()
	if _, err := fdm.New(ctx, n, nil); !errors.Is(err, context.Canceled) {
		t.Errorf("New: %v", err)
	}
	x := make([]r3.Vec, s.Nodes())
	if err := s.Shape(ctx, x, uniform(len(n.Ends), 1)); !errors.Is(err, context.Canceled) {
		t.Errorf("Shape: %v", err)
	}
	if _, err := s.Natural(ctx, n.Position, fdm.Given{Density: uniform(len(n.Ends), 1)}, 1); !errors.Is(err, context.Canceled) {
		t.Errorf("Natural: %v", err)
	}
}

// In Shape a panel is three links of the force density of an equilateral
// triangle's edges under the mean stress σ: half the cotangent of 60° times σ
// (the weights of the linear triangle, Pinkall & Polthier 1993).
func TestPanelsAreEquilateralInShape(t *testing.T) {
	n, panels, force := sail(6, 8)
	for k := range panels {
		panels[k].WarpStress, panels[k].WeftStress = 1000, 3000
	}
	q := uniform(len(force), 5e3)
	x := shape(t, newSolver(t, n, panels), q)
	links := n
	for _, p := range panels {
		for i := range 3 {
			links.Ends = append(links.Ends, [2]int32{p.Corners[i], p.Corners[(i+1)%3]})
			q = append(q, 2000/(2*math.Tan(math.Pi/3)))
		}
	}
	if d := maxDistance(shape(t, newSolver(t, links, nil), q), x); d > 1e-13 {
		t.Errorf("off by %g", d)
	}
}
