package fdm_test

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/fdm"
)

func fit(t testing.TB, s *fdm.Solver, q []float64, targets []fdm.Target, set fdm.FitSettings) fdm.FitResult {
	t.Helper()
	r, err := s.Fit(context.Background(), q, targets, set)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// met fails the test unless the fit met its targets and its shape is that of
// its force densities.
func met(t *testing.T, n fdm.Network, r fdm.FitResult) {
	t.Helper()
	if r.Status != fdm.FitMet || r.Worst > 1e-9 || r.Why != "" {
		t.Errorf("status %v after %d iterations, off by %.3g: %s", r.Status, r.Iterations, r.Worst, r.Why)
	}
	balanced(t, n, r)
}

func balanced(t *testing.T, n fdm.Network, r fdm.FitResult) {
	t.Helper()
	if left := imbalance(n, r.Position, r.Q); left > 1e-13 {
		t.Errorf("out of balance by %g", left)
	}
}

// A node between two anchors: equal forces wanted in its two members and twice
// that in a third make angles that statics fixes: with forces 1, 1 and √2 the
// two make a right angle (triangle of forces).
func TestGivenForcesMakeTheTriangleOfForces(t *testing.T) {
	n := fdm.Network{
		Position: []r3.Vec{vec(-3, 0, 0), vec(3, 0, 0), vec(0, -9, 0), {}},
		Fixed:    []fdm.Directions{7, 7, 7, 0},
		Ends:     [][2]int32{{0, 3}, {1, 3}, {2, 3}},
	}
	s := newSolver(t, n, nil)
	r := fit(t, s, []float64{1, 1, 1}, []fdm.Target{
		{Quantity: fdm.Force, Members: []int32{0}, Value: 10},
		{Quantity: fdm.Force, Members: []int32{1}, Value: 10},
		{Quantity: fdm.Force, Members: []int32{2}, Value: 10 * math.Sqrt2},
	}, fdm.FitSettings{})
	met(t, n, r)
	// Right angle at the node over a base of 6: 3 below it.
	near(t, "y", r.Position[3].Y, -3, 1e-7)
	near(t, "x", r.Position[3].X, 0, 1e-7)
}

// Forces that no shape can bring into balance: 1 and 1 cannot hold 3 (triangle
// inequality of forces). The report says what was reached, and that is in
// balance.
func TestInfeasibleForcesAreReported(t *testing.T) {
	n := fdm.Network{
		Position: []r3.Vec{vec(-3, 0, 0), vec(3, 0, 0), vec(0, -9, 0), {}},
		Fixed:    []fdm.Directions{7, 7, 7, 0},
		Ends:     [][2]int32{{0, 3}, {1, 3}, {2, 3}},
	}
	s := newSolver(t, n, nil)
	targets := []fdm.Target{
		{Quantity: fdm.Force, Members: []int32{0}, Value: 1},
		{Quantity: fdm.Force, Members: []int32{1}, Value: 1},
		{Quantity: fdm.Force, Members: []int32{2}, Value: 3},
	}
	r := fit(t, s, []float64{1, 1, 1}, targets, fdm.FitSettings{})
	t.Log(r.Status, r.Iterations, r.Why)
	if r.Status == fdm.FitMet || r.Why == "" || r.Worst < 0.05 {
		t.Errorf("status %v, off by %g: %s", r.Status, r.Worst, r.Why)
	}
	balanced(t, n, r)
	for i, l := range lengths(n, r.Position) {
		near(t, "reported force", r.Reached[i], r.Q[i]*l, 1e-14*r.Reached[i])
		near(t, "reported difference", r.Off[i], r.Reached[i]/targets[i].Value-1, 1e-14)
	}
}

// Contradicting lengths: the least squares compromise is stationary.
func TestContradictingLengthsEndNearest(t *testing.T) {
	n := chain(3)
	n.Fixed[0], n.Fixed[2] = fdm.DirAll, fdm.DirAll
	n.Ends = append(n.Ends, [2]int32{1, 2})
	s := newSolver(t, n, nil)
	// Both members lie between the anchors 2 m apart; 1.5 m each cannot be, and
	// without load there is no way out of the line. By symmetry 1 m each is
	// the best.
	r := fit(t, s, []float64{1, 3, 1}, []fdm.Target{
		{Quantity: fdm.Length, Members: []int32{0}, Value: 1.5},
		{Quantity: fdm.Length, Members: []int32{1}, Value: 1.5},
	}, fdm.FitSettings{Group: []int32{0, 1, 1}})
	if r.Status != fdm.FitNearest || !strings.Contains(r.Why, "1.5 wanted") {
		t.Errorf("status %v: %s", r.Status, r.Why)
	}
	near(t, "x", r.Position[1].X, 1, 1e-4)
	near(t, "reached", r.Reached[0]+r.Reached[1], 2, 1e-12)
}

// Every member of a net brought to forces that belong to a shape: they are met
// from a uniform start. Forces of a statically determinate choice may belong to
// more than one shape, so forces are compared, not positions.
func TestNetWithGivenForces(t *testing.T) {
	r := rand.New(rand.NewPCG(2, 3))
	cells := sweep(8, 16, 24)
	n := saddle(cells, cells, 10, 3)
	s := newSolver(t, n, nil)
	q := make([]float64, len(n.Ends))
	for k := range q {
		q[k] = math.Exp(0.5 * r.NormFloat64())
	}
	x := shape(t, s, q)
	var targets []fdm.Target
	for k, l := range lengths(n, x) {
		if n.Fixed[n.Ends[k][0]] == 0 || n.Fixed[n.Ends[k][1]] == 0 {
			targets = append(targets, fdm.Target{Quantity: fdm.Force, Members: []int32{int32(k)}, Value: q[k] * l})
		}
	}
	got := fit(t, s, uniform(len(q), 1), targets, fdm.FitSettings{})
	t.Logf("%d force targets met in %d iterations", len(targets), got.Iterations)
	met(t, n, got)
	if got.Iterations > 20 {
		t.Errorf("%d iterations", got.Iterations)
	}
}

// Equal forces in all members make the shortest net on its boundary: the
// balance of equal forces is the condition for the least total length, which is
// a convex problem (the principle behind Plateau's laws for networks). All
// members are targets; every changed net is longer.
func TestEqualForcesMakeTheShortestNet(t *testing.T) {
	cells := sweep(12, 24, 71)
	n := saddle(cells, cells, 10, 3)
	s := newSolver(t, n, nil)
	var targets []fdm.Target
	free := func(k int) bool { return n.Fixed[n.Ends[k][0]] == 0 || n.Fixed[n.Ends[k][1]] == 0 }
	for k := range n.Ends {
		if free(k) {
			targets = append(targets, fdm.Target{Quantity: fdm.Force, Members: []int32{int32(k)}, Value: 1000})
		}
	}
	r := fit(t, s, uniform(len(n.Ends), 1), targets, fdm.FitSettings{})
	t.Logf("%d force targets met in %d iterations", len(targets), r.Iterations)
	met(t, n, r)
	if r.Iterations > 20 {
		t.Errorf("%d iterations", r.Iterations)
	}
	total := func(x []r3.Vec) (sum float64) {
		for k, l := range lengths(n, x) {
			if free(k) {
				sum += l
			}
		}
		return sum
	}
	shortest := total(r.Position)
	random := rand.New(rand.NewPCG(8, 8))
	for range 20 {
		x := append([]r3.Vec(nil), r.Position...)
		for i := range x {
			if n.Fixed[i] == 0 {
				x[i] = r3.Add(x[i], r3.Scale(0.01, vec(random.NormFloat64(), random.NormFloat64(), random.NormFloat64())))
			}
		}
		if d := total(x) - shortest; !(d > 0) {
			t.Errorf("a changed net is shorter by %g", -d)
		}
	}
}

// All free lengths of a net given.
func TestNetWithGivenLengths(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 3))
	cells := sweep(6, 12, 24)
	n := saddle(cells, cells, 10, 3)
	n.Load = make([]r3.Vec, len(n.Position))
	for i := range n.Load {
		n.Load[i] = vec(0, 0, -0.3)
	}
	s := newSolver(t, n, nil)
	q := make([]float64, len(n.Ends))
	for k := range q {
		q[k] = math.Exp(0.3 * r.NormFloat64())
	}
	x := shape(t, s, q)
	var targets []fdm.Target
	for k, l := range lengths(n, x) {
		if n.Fixed[n.Ends[k][0]] == 0 || n.Fixed[n.Ends[k][1]] == 0 {
			targets = append(targets, fdm.Target{Quantity: fdm.Length, Members: []int32{int32(k)}, Value: l})
		}
	}
	got := fit(t, s, uniform(len(q), 1), targets, fdm.FitSettings{Tolerance: 1e-9})
	t.Logf("%d length targets met in %d iterations", len(targets), got.Iterations)
	met(t, n, got)
}

// Sags of the four edges of a net on corner anchors, with one force density
// for each edge: lighter edge cables hang in deeper.
func TestEdgeSags(t *testing.T) {
	const cells = 10
	n := grid(cells, cells, func(u, v float64) r3.Vec { return vec(10*u, 10*v, 2*(u+v-2*u*v)) },
		func(i, j int) bool { return (i == 0 || i == cells) && (j == 0 || j == cells) })
	group := make([]int32, len(n.Ends))
	edge := make([][]int32, 4)
	w := int32(cells + 1)
	for k, e := range n.Ends {
		group[k] = -1
		for side, on := range []func(i int32) bool{
			func(i int32) bool { return i < w }, func(i int32) bool { return i >= w*cells },
			func(i int32) bool { return i%w == 0 }, func(i int32) bool { return i%w == w-1 },
		} {
			if on(e[0]) && on(e[1]) {
				group[k] = int32(side)
				edge[side] = append(edge[side], int32(k))
			}
		}
	}
	s := newSolver(t, n, nil)
	q := uniform(len(n.Ends), 1)
	var targets []fdm.Target
	for side := range edge {
		for _, k := range edge[side] {
			q[k] = 5
		}
		targets = append(targets, fdm.Target{Quantity: fdm.Sag, Members: edge[side], Value: 0.06 + 0.02*float64(side)})
	}
	r := fit(t, s, q, targets, fdm.FitSettings{Group: group})
	met(t, n, r)
	for side := range edge {
		first := r.Q[edge[side][0]]
		for _, k := range edge[side] {
			if r.Q[k] != first {
				t.Errorf("edge %d: force densities %g and %g in one group", side, first, r.Q[k])
			}
		}
	}
	// The sag of edge 0 by hand: its chord runs from (0,0,0) to (10,0,2).
	sag := 0.0
	chord := r3.Unit(vec(10, 0, 2))
	for i := range w {
		p := r.Position[i]
		sag = max(sag, r3.Norm(r3.Cross(p, chord))/math.Hypot(10, 2))
	}
	near(t, "sag of edge 0", sag, 0.06, 1e-10)
}

// Unstressed lengths by hand: L₀ = L/(1 + q L/EA), so that the force q L is
// EA (L − L₀)/L₀.
func TestUnstressedLengths(t *testing.T) {
	n := saddle(5, 5, 6, 1)
	s := newSolver(t, n, nil)
	ea := uniform(len(n.Ends), 40)
	x := shape(t, s, uniform(len(n.Ends), 2))
	l := lengths(n, x)
	var targets []fdm.Target
	for k := range n.Ends {
		if k%3 == 0 && (n.Fixed[n.Ends[k][0]] == 0 || n.Fixed[n.Ends[k][1]] == 0) {
			targets = append(targets, fdm.Target{Quantity: fdm.Unstressed, Members: []int32{int32(k)}, Value: 0.97 * l[k] / (1 + 2*l[k]/40)})
		}
	}
	r := fit(t, s, uniform(len(n.Ends), 2), targets, fdm.FitSettings{Stiffness: ea})
	met(t, n, r)
	l = lengths(n, r.Position)
	for _, p := range targets {
		k := p.Members[0]
		near(t, "force by elasticity", ea[k]*(l[k]-p.Value)/p.Value, r.Q[k]*l[k], 1e-6*r.Q[k]*l[k])
	}
}

// With fewer targets than force densities the change is small: what has
// nothing to do with the target stays.
func TestFitChangesLittle(t *testing.T) {
	a := saddle(4, 4, 4, 1)
	n := fdm.Network{Position: append([]r3.Vec(nil), a.Position...), Fixed: append([]fdm.Directions(nil), a.Fixed...), Ends: append([][2]int32(nil), a.Ends...)}
	for i, p := range a.Position {
		n.Position = append(n.Position, r3.Add(p, vec(100, 0, 0)))
		n.Fixed = append(n.Fixed, a.Fixed[i])
	}
	for _, e := range a.Ends {
		n.Ends = append(n.Ends, [2]int32{e[0] + 25, e[1] + 25})
	}
	s := newSolver(t, n, nil)
	r := fit(t, s, uniform(len(n.Ends), 1), []fdm.Target{{Quantity: fdm.Force, Members: []int32{12}, Value: 2}}, fdm.FitSettings{})
	met(t, n, r)
	for k := len(a.Ends); k < len(n.Ends); k++ {
		if r.Q[k] != 1 {
			t.Errorf("member %d of the other net changed to %g", k, r.Q[k])
		}
	}
}

// A force that can only be reached in the limit stops at the bound and says so.
func TestBoundsHold(t *testing.T) {
	n := chain(3)
	n.Fixed[0], n.Fixed[2] = fdm.DirAll, fdm.DirAll
	s := newSolver(t, n, nil)
	r := fit(t, s, []float64{1, 1}, []fdm.Target{{Quantity: fdm.Force, Members: []int32{1}, Value: 1e6}}, fdm.FitSettings{Range: 10})
	if r.Status == fdm.FitMet || len(r.AtBound) != 2 {
		t.Errorf("status %v, at bound %v: %s", r.Status, r.AtBound, r.Why)
	}
	for k, v := range r.Q {
		near(t, "q", v, 10, 1e-9)
		_ = k
	}
	// A wrong sign is reported, not crossed.
	r = fit(t, s, []float64{1, 1}, []fdm.Target{{Quantity: fdm.Force, Members: []int32{1}, Value: -2}}, fdm.FitSettings{Range: 10})
	if r.Status == fdm.FitMet || !strings.Contains(r.Why, "sign") || r.Q[1] <= 0 {
		t.Errorf("status %v, q %v: %s", r.Status, r.Q, r.Why)
	}
}

// Struts: mixed signs keep their signs.
func TestFitWithStruts(t *testing.T) {
	// A flying strut between two cables: its thrust is given.
	n := fdm.Network{
		Position: []r3.Vec{vec(-5, 0, 0), vec(5, 0, 0), vec(0, 0, 1), vec(0, 0, -1), vec(0, 5, 0), vec(0, -5, 0)},
		Fixed:    []fdm.Directions{7, 7, 0, 0, 7, 7},
		Ends:     [][2]int32{{0, 2}, {1, 2}, {4, 2}, {5, 2}, {0, 3}, {1, 3}, {4, 3}, {5, 3}, {2, 3}},
	}
	n.Load = make([]r3.Vec, 6)
	n.Load[2] = vec(0, 0, -3)
	s := newSolver(t, n, nil)
	q := append(uniform(8, 2), -1)
	r := fit(t, s, q, []fdm.Target{
		{Quantity: fdm.Force, Members: []int32{8}, Value: -1.2},
	}, fdm.FitSettings{})
	met(t, n, r)
	for k, v := range r.Q {
		if (v < 0) != (k == 8) {
			t.Errorf("member %d changed sign: %g", k, v)
		}
	}
}

func TestTargetsAreChecked(t *testing.T) {
	ctx := context.Background()
	n := saddle(3, 3, 1, 1)
	s := newSolver(t, n, nil)
	q := uniform(len(n.Ends), 1)
	for _, c := range []struct {
		name   string
		target fdm.Target
		set    fdm.FitSettings
	}{
		{"no members", fdm.Target{Value: 1}, fdm.FitSettings{}},
		{"no such member", fdm.Target{Members: []int32{99}, Value: 1}, fdm.FitSettings{}},
		{"negative member", fdm.Target{Members: []int32{-1}, Value: 1}, fdm.FitSettings{}},
		{"NaN", fdm.Target{Members: []int32{1}, Value: math.NaN()}, fdm.FitSettings{}},
		{"no force", fdm.Target{Members: []int32{1}}, fdm.FitSettings{}},
		{"negative length", fdm.Target{Quantity: fdm.Length, Members: []int32{1}, Value: -1}, fdm.FitSettings{}},
		{"no stiffness", fdm.Target{Quantity: fdm.Unstressed, Members: []int32{1}, Value: 1}, fdm.FitSettings{}},
		{"short chain", fdm.Target{Quantity: fdm.Sag, Members: []int32{1}, Value: 1}, fdm.FitSettings{}},
		{"broken chain", fdm.Target{Quantity: fdm.Sag, Members: []int32{0, 20}, Value: 1}, fdm.FitSettings{}},
		{"unknown", fdm.Target{Quantity: 77, Members: []int32{0}, Value: 1}, fdm.FitSettings{}},
		{"short group", fdm.Target{Members: []int32{0}, Value: 1}, fdm.FitSettings{Group: []int32{1}}},
		{"bad range", fdm.Target{Members: []int32{0}, Value: 1}, fdm.FitSettings{Range: 0.5}},
	} {
		var e *fdm.InputError
		if _, err := s.Fit(ctx, q, []fdm.Target{c.target}, c.set); !errors.As(err, &e) {
			t.Errorf("%s: %v", c.name, err)
		}
	}
	if r := fit(t, s, q, nil, fdm.FitSettings{}); r.Status != fdm.FitMet || r.WorstTarget != -1 {
		t.Errorf("no targets: %+v", r.Status)
	}
	cancelled, cancel := context.WithCancel(ctx)
	cancel()
	if _, err := s.Fit(cancelled, q, nil, fdm.FitSettings{}); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
}
