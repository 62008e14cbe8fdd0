package fdm_test

import (
	"math"
	"runtime"
	"slices"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"
	"pgregory.net/rapid"

	"anticlast/fdm"
)

// drawNetwork is a random connected network held in all directions at some of
// its nodes (so that it can be turned), with loads and force densities.
func drawNetwork(t *rapid.T) (fdm.Network, []float64) {
	count := rapid.IntRange(2, 24).Draw(t, "nodes")
	coordinate := rapid.Float64Range(-10, 10)
	n := fdm.Network{}
	var q []float64
	density := rapid.Float64Range(0.1, 10)
	for i := range count {
		n.Position = append(n.Position, vec(coordinate.Draw(t, "x"), coordinate.Draw(t, "y"), coordinate.Draw(t, "z")))
		fixed := fdm.Directions(0)
		if i == 0 || rapid.IntRange(0, 3).Draw(t, "fixed") == 0 {
			fixed = fdm.DirAll
		}
		n.Fixed = append(n.Fixed, fixed)
		n.Load = append(n.Load, vec(coordinate.Draw(t, "px"), coordinate.Draw(t, "py"), coordinate.Draw(t, "pz")))
		for k := range rapid.IntRange(1, 3).Draw(t, "members") {
			if i == 0 {
				break
			}
			_ = k
			n.Ends = append(n.Ends, [2]int32{int32(rapid.IntRange(0, i-1).Draw(t, "end")), int32(i)})
			q = append(q, density.Draw(t, "q"))
		}
	}
	return n, q
}

func mustShape(t *rapid.T, n fdm.Network, q []float64) []r3.Vec {
	s, err := fdm.New(t.Context(), n, nil)
	if err != nil {
		t.Fatal(err)
	}
	x := make([]r3.Vec, len(n.Position))
	if err := s.Shape(t.Context(), x, q); err != nil {
		t.Fatal(err)
	}
	return x
}

func reach(x []r3.Vec) float64 {
	size := 1.0
	for _, p := range x {
		size = max(size, r3.Norm(p))
	}
	return size
}

func mapped(x []r3.Vec, f func(r3.Vec) r3.Vec) []r3.Vec {
	y := make([]r3.Vec, len(x))
	for i, p := range x {
		y[i] = f(p)
	}
	return y
}

// Turning and moving the network turns and moves the shape.
func TestShapeMovesWithTheNetwork(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n, q := drawNetwork(t)
		x := mustShape(t, n, q)
		turn := r3.NewRotation(rapid.Float64Range(0, 6).Draw(t, "angle"), vec(1, rapid.Float64Range(-2, 2).Draw(t, "axis y"), rapid.Float64Range(-2, 2).Draw(t, "axis z")))
		move := vec(rapid.Float64Range(-100, 100).Draw(t, "move"), 3, -20)
		n.Position = mapped(n.Position, func(p r3.Vec) r3.Vec { return r3.Add(turn.Rotate(p), move) })
		n.Load = mapped(n.Load, turn.Rotate)
		want := mapped(x, func(p r3.Vec) r3.Vec { return r3.Add(turn.Rotate(p), move) })
		if d := maxDistance(mustShape(t, n, q), want); !(d <= 1e-10*reach(want)) {
			t.Errorf("off by %g of %g", d, reach(want))
		}
	})
}

// Lengths times k with loads times k and equal force densities give the shape
// times k; force densities and loads times c change nothing.
func TestShapeScales(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n, q := drawNetwork(t)
		x := mustShape(t, n, q)
		k := math.Exp(rapid.Float64Range(-10, 10).Draw(t, "log k"))
		c := math.Exp(rapid.Float64Range(-10, 10).Draw(t, "log c"))
		n.Position = mapped(n.Position, func(p r3.Vec) r3.Vec { return r3.Scale(k, p) })
		n.Load = mapped(n.Load, func(p r3.Vec) r3.Vec { return r3.Scale(k*c, p) })
		q = slices.Clone(q)
		for i := range q {
			q[i] *= c
		}
		want := mapped(x, func(p r3.Vec) r3.Vec { return r3.Scale(k, p) })
		if d := maxDistance(mustShape(t, n, q), want); !(d <= 1e-11*k*reach(x)) {
			t.Errorf("off by %g of %g", d, k*reach(x))
		}
	})
}

// Renumbering nodes and members, and turning members round, renumbers the
// shape.
func TestShapeFollowsNumbers(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n, q := drawNetwork(t)
		x := mustShape(t, n, q)
		number := rapid.Permutation(ascending(len(x))).Draw(t, "numbers")
		order := rapid.Permutation(ascending(len(q))).Draw(t, "members")
		m := fdm.Network{
			Position: make([]r3.Vec, len(x)), Fixed: make([]fdm.Directions, len(x)), Load: make([]r3.Vec, len(x)),
		}
		want := make([]r3.Vec, len(x))
		for i, j := range number {
			m.Position[j], m.Fixed[j], m.Load[j], want[j] = n.Position[i], n.Fixed[i], n.Load[i], x[i]
		}
		var p []float64
		for _, k := range order {
			e := n.Ends[k]
			m.Ends = append(m.Ends, [2]int32{int32(number[e[1]]), int32(number[e[0]])})
			p = append(p, q[k])
		}
		if d := maxDistance(mustShape(t, m, p), want); !(d <= 1e-11*reach(want)) {
			t.Errorf("off by %g of %g", d, reach(want))
		}
	})
}

func ascending(n int) []int {
	v := make([]int, n)
	for i := range v {
		v[i] = i
	}
	return v
}

// Changing the sign of all force densities and loads leaves the shape: an arch
// is a hanging net upside down.
func TestPushingNetIsPullingNet(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n, q := drawNetwork(t)
		x := mustShape(t, n, q)
		n.Load = mapped(n.Load, func(p r3.Vec) r3.Vec { return r3.Scale(-1, p) })
		q = slices.Clone(q)
		for i := range q {
			q[i] = -q[i]
		}
		if d := maxDistance(mustShape(t, n, q), x); !(d <= 1e-11*reach(x)) {
			t.Errorf("off by %g of %g", d, reach(x))
		}
	})
}

// Natural force densities: turning, moving and scaling (forces times k with
// lengths times k, stresses kept) carry over, renumbering corners does not
// matter, doubling all prestress leaves the shape and doubles what it carries.
func TestNaturalMovesWithTheCanopy(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n, panels, force := sail(5, 6)
		for k := range panels {
			panels[k].WarpStress = rapid.SampledFrom([]float64{1000, 2500, 4000}).Draw(t, "warp")
		}
		ref := slices.Clone(n.Position)
		for i := range ref {
			ref[i] = r3.Add(ref[i], vec(0, 0, rapid.Float64Range(-0.2, 0.2).Draw(t, "disturbance")))
		}
		run := func(n fdm.Network, panels []fdm.Panel, ref []r3.Vec, force []float64) fdm.NaturalResult {
			s, err := fdm.New(t.Context(), n, panels)
			if err != nil {
				t.Fatal(err)
			}
			r, err := s.Natural(t.Context(), ref, fdm.Given{Force: force}, 3)
			if err != nil {
				t.Fatal(err)
			}
			return r
		}
		base := run(n, panels, ref, force)
		turn := r3.NewRotation(rapid.Float64Range(0, 6).Draw(t, "angle"), vec(1, 2, rapid.Float64Range(-2, 2).Draw(t, "axis")))
		k := math.Exp(rapid.Float64Range(-3, 3).Draw(t, "log k"))
		carry := func(p r3.Vec) r3.Vec { return r3.Add(r3.Scale(k, turn.Rotate(p)), vec(7, -8, 9)) }
		m := n
		m.Position = mapped(n.Position, carry)
		turned := slices.Clone(panels)
		for i := range turned {
			p := &turned[i]
			p.Warp = turn.Rotate(p.Warp)
			c := p.Corners
			r := rapid.IntRange(0, 2).Draw(t, "first corner")
			p.Corners = [3]int32{c[r], c[(r+1)%3], c[(r+2)%3]}
			p.WarpStress, p.WeftStress = 2*p.WarpStress, 2*p.WeftStress
		}
		scaled := slices.Clone(force)
		for i := range scaled {
			scaled[i] *= 2 * k
		}
		got := run(m, turned, mapped(ref, carry), scaled)
		if d := maxDistance(got.Position, mapped(base.Position, carry)); !(d <= 1e-11*k*10) {
			t.Errorf("shape off by %g", d)
		}
		for i := range force {
			if d := math.Abs(got.Force[i] - 2*k*base.Force[i]); !(d <= 1e-9*k*base.Force[i]) {
				t.Errorf("force %d: %g, want %g", i, got.Force[i], 2*k*base.Force[i])
			}
		}
		for i, s := range base.Stress {
			g := got.Stress[i]
			if d := math.Abs(g.Warp-2*s.Warp) + math.Abs(g.Weft-2*s.Weft) + math.Abs(g.Shear-2*s.Shear); !(d <= 1e-9*5000) {
				t.Errorf("stress %d: %+v, want twice %+v", i, g, s)
			}
			if d := r3.Norm(r3.Sub(g.Axis, turn.Rotate(s.Axis))); !(d <= 1e-10) {
				t.Errorf("warp %d off by %g", i, d)
			}
		}
	})
}

// The same bits whatever the number of processors.
func TestSameBitsOnAnyNumberOfProcessors(t *testing.T) {
	run := func(procs int) ([]r3.Vec, fdm.NaturalResult, fdm.FitResult) {
		defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(procs))
		n := saddle(60, 60, 10, 3)
		q := uniform(len(n.Ends), 1)
		for k := range q {
			q[k] += 0.3 * float64(k%7)
		}
		s := newSolver(t, n, nil)
		x := shape(t, s, q)
		small := saddle(14, 14, 10, 3)
		var targets []fdm.Target
		for k := 100; k < 300; k++ {
			targets = append(targets, fdm.Target{Quantity: fdm.Force, Members: []int32{int32(k)}, Value: 1})
		}
		f := fit(t, newSolver(t, small, nil), uniform(len(small.Ends), 1), targets, fdm.FitSettings{})
		c, panels, force := sail(40, 8)
		canopy := newSolver(t, c, panels)
		return x, natural(t, canopy, shape(t, canopy, uniform(len(force), 1e5)), fdm.Given{Force: force}, 3), f
	}
	x1, n1, f1 := run(1)
	x2, n2, f2 := run(3)
	if !slices.Equal(x1, x2) || !slices.Equal(n1.Position, n2.Position) || !slices.Equal(n1.Stress, n2.Stress) || !slices.Equal(f1.Q, f2.Q) {
		t.Error("results depend on GOMAXPROCS")
	}
}
