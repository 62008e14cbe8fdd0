package fdm_test

import (
	"context"
	"errors"
	"math"
	"slices"
	"strings"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/fdm"
)

// singular runs Shape and expects a SingularError.
func singular(t *testing.T, n fdm.Network, q []float64) *fdm.SingularError {
	t.Helper()
	s, err := fdm.New(context.Background(), n, nil)
	if err == nil {
		x := slices.Repeat([]r3.Vec{vec(1, 2, 3)}, len(n.Position))
		err = s.Shape(context.Background(), x, q)
		if err != nil && !slices.Equal(x, slices.Repeat([]r3.Vec{vec(1, 2, 3)}, len(x))) {
			t.Error("an error has changed the positions")
		}
	}
	var e *fdm.SingularError
	if !errors.As(err, &e) {
		t.Fatalf("got %v, want a SingularError", err)
	}
	t.Log(err)
	return e
}

func chain(nodes int) fdm.Network {
	var n fdm.Network
	for i := range nodes {
		n.Position = append(n.Position, vec(float64(i), 0, 0))
		n.Fixed = append(n.Fixed, 0)
		if i > 0 {
			n.Ends = append(n.Ends, [2]int32{int32(i - 1), int32(i)})
		}
	}
	return n
}

func TestIsolatedNodeIsNamed(t *testing.T) {
	n := chain(4)
	n.Fixed[0] = fdm.DirAll
	n.Ends = n.Ends[:2] // node 3 hangs on nothing
	e := singular(t, n, uniform(2, 1))
	if e.Cause != fdm.NoSupport || !slices.Equal(e.Nodes, []int32{3}) || e.Directions != fdm.DirAll {
		t.Errorf("got %+v", e)
	}
}

func TestPartWithoutSupportIsNamed(t *testing.T) {
	n := chain(9)
	n.Fixed[0] = fdm.DirAll
	q := uniform(8, 1)
	q[3], q[6] = 0, 0 // nodes 4 to 6 and 7, 8 come loose
	e := singular(t, n, q)
	if e.Cause != fdm.NoSupport || !slices.Equal(e.Nodes, []int32{4, 5, 6, 7, 8}) {
		t.Errorf("got %+v", e)
	}
	for _, part := range []string{"nodes 4, 5, 6, 7 and 8", "x, y and z", "support"} {
		if !strings.Contains(e.Error(), part) {
			t.Errorf("the message does not say %q: %v", part, e)
		}
	}
}

// A part may be held along z and loose along x and y.
func TestSupportIsJudgedByDirection(t *testing.T) {
	n := chain(5)
	n.Fixed[0], n.Fixed[4] = fdm.DirZ, fdm.DirZ|fdm.DirX
	e := singular(t, n, uniform(4, 1))
	if e.Cause != fdm.NoSupport || e.Directions != fdm.DirY || len(e.Nodes) != 5 {
		t.Errorf("got %+v", e)
	}
	n.Fixed[2] = fdm.DirY
	q := uniform(4, 1)
	shape(t, newSolver(t, n, nil), q)
	q[1] = 0 // nodes 0 and 1 lose x and y
	e = singular(t, n, q)
	if e.Cause != fdm.NoSupport || !slices.Equal(e.Nodes, []int32{0, 1}) || e.Directions != fdm.DirX|fdm.DirY {
		t.Errorf("got %+v", e)
	}
}

// Tension and compression that add up to nothing at one node.
func TestCancellingNodeIsNamed(t *testing.T) {
	n := chain(6)
	n.Fixed[0], n.Fixed[5] = fdm.DirAll, fdm.DirAll
	n.Ends = append(n.Ends, [2]int32{0, 2}, [2]int32{2, 5}, [2]int32{0, 3}, [2]int32{3, 5})
	// Node 2 is cut off from 1 and 3 and hangs between +1 and −1.
	q := []float64{1, 0, 0, 1, 1, 1, -1, 1, 1}
	n.Ends = append(n.Ends, [2]int32{1, 5})
	q = append(q, 1)
	e := singular(t, n, q)
	if e.Cause != fdm.Cancel || !slices.Equal(e.Nodes, []int32{2}) || e.Directions != fdm.DirAll {
		t.Errorf("got %+v", e)
	}
	// With a load there would be no equilibrium either; half a per cent more
	// tension and there is.
	q[5] = 1.005
	shape(t, newSolver(t, n, nil), q)
}

// A part that could be moved without cost although no node of it has a zero
// diagonal: springs in series of 1 and −1/2 and −1, whose flexibilities
// 1 − 2 + 1 cancel.
func TestCancellingPartIsNamed(t *testing.T) {
	n := chain(4)
	n.Fixed[0], n.Fixed[3] = fdm.DirAll, fdm.DirAll
	// 1/q sums: 1/2 + 1/2 − 1 = 0: the chain as a whole resists nothing.
	e := singular(t, n, []float64{2, 2, -1})
	if e.Cause != fdm.Cancel {
		t.Errorf("got %+v", e)
	}
	slices.Sort(e.Nodes)
	if !slices.Equal(e.Nodes, []int32{1, 2}) {
		t.Errorf("nodes %v, want 1 and 2", e.Nodes)
	}
}

func TestNonFiniteDensityIsNamed(t *testing.T) {
	n := saddle(4, 4, 1, 1)
	for _, bad := range []float64{math.NaN(), math.Inf(1), math.Inf(-1), 1e300} {
		q := uniform(len(n.Ends), 1)
		q[7], q[11] = bad, bad
		e := singular(t, n, q)
		if e.Cause != fdm.NotFinite || !slices.Equal(e.Members, []int32{7, 11}) {
			t.Errorf("%g: got %+v", bad, e)
		}
	}
}

// Force densities of very different size still give a shape, or say that they
// do not; never something in between.
func TestWideRangeOfDensities(t *testing.T) {
	n := chain(5)
	n.Fixed[0], n.Fixed[4] = fdm.DirAll, fdm.DirAll
	s := newSolver(t, n, nil)
	x := make([]r3.Vec, 5)
	for p := 1; p < 60; p++ {
		q := []float64{1, math.Pow(10, float64(p)), 1, math.Pow(10, float64(-p))}
		err := s.Shape(context.Background(), x, q)
		var e *fdm.SingularError
		if err != nil && (!errors.As(err, &e) || e.Cause != fdm.Weak) {
			t.Errorf("10^%d: %v", p, err)
		}
		if err != nil {
			continue
		}
		// Springs in series: shares of the way are as 1/q.
		total := 0.0
		for _, v := range q {
			total += 1 / v
		}
		at := 0.0
		for k := range 3 {
			at += 4 / q[k] / total
			near(t, "x", x[k+1].X, at, 1e-9*4)
		}
	}
}

func TestInputIsChecked(t *testing.T) {
	ctx := context.Background()
	good := func() fdm.Network {
		n := saddle(3, 3, 1, 1)
		n.Load = make([]r3.Vec, len(n.Position))
		n.Master = slices.Repeat([]int32{-1}, len(n.Position))
		return n
	}
	panel := fdm.Panel{Corners: [3]int32{0, 1, 5}, Warp: vec(1, 0, 0), WarpStress: 1, WeftStress: 1}
	for _, c := range []struct {
		name  string
		what  string
		index int
		spoil func(n *fdm.Network, p *fdm.Panel)
	}{
		{"short Fixed", "network", -1, func(n *fdm.Network, _ *fdm.Panel) { n.Fixed = n.Fixed[1:] }},
		{"short Load", "network", -1, func(n *fdm.Network, _ *fdm.Panel) { n.Load = n.Load[1:] }},
		{"short Master", "network", -1, func(n *fdm.Network, _ *fdm.Panel) { n.Master = n.Master[1:] }},
		{"NaN position", "node", 4, func(n *fdm.Network, _ *fdm.Panel) { n.Position[4].Y = math.NaN() }},
		{"infinite load", "node", 5, func(n *fdm.Network, _ *fdm.Panel) { n.Load[5].Z = math.Inf(1) }},
		{"end beyond", "member", 3, func(n *fdm.Network, _ *fdm.Panel) { n.Ends[3][1] = 16 }},
		{"end below", "member", 3, func(n *fdm.Network, _ *fdm.Panel) { n.Ends[3][0] = -1 }},
		{"loop", "member", 2, func(n *fdm.Network, _ *fdm.Panel) { n.Ends[2] = [2]int32{5, 5} }},
		{"master beyond", "node", 6, func(n *fdm.Network, _ *fdm.Panel) { n.Master[6] = 99 }},
		{"master below", "node", 6, func(n *fdm.Network, _ *fdm.Panel) { n.Master[6] = -2 }},
		{"own master", "node", 6, func(n *fdm.Network, _ *fdm.Panel) { n.Master[6] = 6 }},
		{"circle", "node", 5, func(n *fdm.Network, _ *fdm.Panel) { n.Master[5], n.Master[6], n.Master[9] = 6, 9, 5 }},
		{"corner beyond", "panel", 0, func(_ *fdm.Network, p *fdm.Panel) { p.Corners[2] = 16 }},
		{"same corners", "panel", 0, func(_ *fdm.Network, p *fdm.Panel) { p.Corners[2] = 0 }},
		{"infinite stress", "panel", 0, func(_ *fdm.Network, p *fdm.Panel) { p.WeftStress = math.Inf(1) }},
		{"NaN warp", "panel", 0, func(_ *fdm.Network, p *fdm.Panel) { p.Warp.X = math.NaN() }},
	} {
		n, p := good(), panel
		if _, err := fdm.New(ctx, n, []fdm.Panel{p}); err != nil {
			t.Fatal(err)
		}
		c.spoil(&n, &p)
		_, err := fdm.New(ctx, n, []fdm.Panel{p})
		var e *fdm.InputError
		if !errors.As(err, &e) || e.What != c.what || e.Index != c.index {
			t.Errorf("%s: got %v, want an error about %s %d", c.name, err, c.what, c.index)
		}
	}
	n := good()
	s := newSolver(t, n, nil)
	var e *fdm.InputError
	if err := s.Shape(ctx, make([]r3.Vec, 3), uniform(len(n.Ends), 1)); !errors.As(err, &e) {
		t.Errorf("short dst: %v", err)
	}
	if err := s.Shape(ctx, make([]r3.Vec, 16), uniform(3, 1)); !errors.As(err, &e) {
		t.Errorf("short q: %v", err)
	}
	if err := s.SetPosition(n.Position[1:]); !errors.As(err, &e) {
		t.Errorf("short positions: %v", err)
	}
	if err := s.SetLoad(n.Load[1:]); !errors.As(err, &e) {
		t.Errorf("short loads: %v", err)
	}
}

// Moving an anchor or changing the load in place is the same as a new solver.
func TestSettersEqualNewSolver(t *testing.T) {
	n := saddle(6, 5, 8, 2)
	q := uniform(len(n.Ends), 2)
	s := newSolver(t, n, nil)
	shape(t, s, q)
	n.Position = slices.Clone(n.Position)
	n.Position[0] = vec(-3, 1, 9)
	n.Load = make([]r3.Vec, len(n.Position))
	for i := range n.Load {
		n.Load[i] = vec(0, 1, -float64(i))
	}
	if err := s.SetPosition(n.Position); err != nil {
		t.Fatal(err)
	}
	if err := s.SetLoad(n.Load); err != nil {
		t.Fatal(err)
	}
	if d := maxDistance(shape(t, s, q), shape(t, newSolver(t, n, nil), q)); d != 0 {
		t.Errorf("differs by %g", d)
	}
	n.Load = nil
	if err := s.SetLoad(nil); err != nil {
		t.Fatal(err)
	}
	if d := maxDistance(shape(t, s, q), shape(t, newSolver(t, n, nil), q)); d != 0 {
		t.Errorf("without loads: differs by %g", d)
	}
}
