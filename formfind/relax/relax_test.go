package relax_test

import (
	"context"
	"errors"
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
	"pgregory.net/rapid"

	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/relax"
)

// clone copies what the tests below change.
func clone(s *canopy.Structure) *canopy.Structure {
	c := *s
	c.Position = append([]r3.Vec(nil), s.Position...)
	c.Load = append([]r3.Vec(nil), s.Load...)
	c.Warp = append([]r3.Vec(nil), s.Warp...)
	c.Given = append([]float64(nil), s.Given...)
	c.Stress = append([][2]float64(nil), s.Stress...)
	c.Unstressed = append([]float64(nil), s.Unstressed...)
	return &c
}

// mixed is a small structure with a bit of everything: elastic net cables,
// given forces and force densities, a strut, loads and weight.
func mixed() *canopy.Structure {
	nodes := []r3.Vec{
		{}, {X: 4, Z: 1}, {X: 4, Y: 4}, {Y: 4, Z: 1},
		{X: 1, Y: 1, Z: 0.4}, {X: 3, Y: 1, Z: 0.4}, {X: 3, Y: 3, Z: 0.4}, {X: 1, Y: 3, Z: 0.4},
		{X: 2, Y: 2, Z: -0.6}, {X: 2, Y: 2, Z: 0.9},
	}
	ends := [][2]int32{
		{0, 4}, {1, 5}, {2, 6}, {3, 7}, {4, 5}, {5, 6}, {6, 7}, {7, 4},
		{4, 8}, {5, 8}, {6, 8}, {7, 8}, {4, 9}, {5, 9}, {6, 9}, {7, 9}, {8, 9},
	}
	s := net(nodes, []int32{0, 1, 2, 3}, ends)
	for k := range ends {
		switch {
		case k < 4:
			s.Law[k], s.Given[k] = canopy.LawForce, 6000
		case k < 8:
			s.Law[k], s.Given[k] = canopy.LawForceDensity, 1500
		case k < 16:
			s.Law[k], s.Stiffness[k], s.Unstressed[k] = canopy.LawElastic, 2e5, 1.6
		default:
			s.Law[k], s.Stiffness[k], s.Unstressed[k], s.Kind[k] = canopy.LawElastic, 1e6, 1.55, canopy.KindStrut
		}
		s.Weight[k] = 20
	}
	s.Load[9] = r3.Vec{X: 100, Y: 50, Z: -400}
	s.SelfWeight = true
	return s
}

func TestMixedStructureIsInBalanceAsReported(t *testing.T) {
	eachDamping(t, func(t *testing.T, e engine.Engine) {
		s := mixed()
		f := relaxed(t, e, s, nil, engine.Settings{})
		load := append([]r3.Vec(nil), s.Load...)
		for k, m := range s.Ends {
			l := length(s, f, k)
			if s.Unstressed[k] > 0 {
				l = s.Unstressed[k]
			}
			load[m[0]].Z -= s.Weight[k] * l / 2
			load[m[1]].Z -= s.Weight[k] * l / 2
		}
		assert.Less(t, imbalance(s, f, load), 1e-8)
		assert.Less(t, f.Force[16], -100.0, "the strut pushes")
		for k := range s.Ends {
			switch s.Law[k] {
			case canopy.LawForce:
				assert.InEpsilon(t, s.Given[k], f.Force[k], 1e-12)
			case canopy.LawForceDensity:
				assert.InEpsilon(t, s.Given[k], f.Force[k]/length(s, f, k), 1e-12)
			case canopy.LawElastic:
				want := s.Stiffness[k] * (length(s, f, k) - s.Unstressed[k]) / s.Unstressed[k]
				if want < 0 && !s.Kind[k].Pushes() {
					want = 0
				}
				assert.InDelta(t, want, f.Force[k], 1e-6)
			}
		}
	})
}

// Turning about z under gravity, moving and renumbering a model turn, move and
// renumber the answer.
func TestInvariance(t *testing.T) {
	s := mixed()
	tight := engine.Settings{Residual: 1e-12, Worst: 1e-11, Move: 1e-12}
	want := relaxed(t, relax.New(), s, nil, tight)
	rapid.Check(t, func(rt *rapid.T) {
		r := r3.NewRotation(rapid.Float64Range(-3, 3).Draw(rt, "angle"), r3.Vec{Z: 1})
		by := r3.Vec{X: rapid.Float64Range(-1e3, 1e3).Draw(rt, "x"), Y: rapid.Float64Range(-1e3, 1e3).Draw(rt, "y"), Z: rapid.Float64Range(-50, 50).Draw(rt, "z")}
		perm := rapid.Permutation([]int32{0, 1, 2, 3, 4, 5, 6, 7, 8, 9}).Draw(rt, "order")
		c := clone(s)
		c.Fixed = make([]canopy.Freedom, len(s.Fixed))
		c.Ends = make([][2]int32, len(s.Ends))
		for i, to := range perm {
			c.Position[to] = r3.Add(r.Rotate(s.Position[i]), by)
			c.Load[to] = r.Rotate(s.Load[i])
			c.Fixed[to] = s.Fixed[i]
		}
		for k, e := range s.Ends {
			c.Ends[k] = [2]int32{perm[e[0]], perm[e[1]]}
		}
		f, out, err := relax.New().Find(context.Background(), c, nil, tight)
		if err != nil || out.Status != engine.Converged {
			rt.Fatal(err, out)
		}
		for i, to := range perm {
			if d := r3.Norm(r3.Sub(f.Position[to], r3.Add(r.Rotate(want.Position[i]), by))); d > 1e-9 {
				rt.Fatalf("node %d is %g m off", i, d)
			}
			if d := r3.Norm(r3.Sub(f.Reaction[to], r.Rotate(want.Reaction[i]))); d > 1e-5 {
				rt.Fatalf("reaction %d is %g N off", i, d)
			}
		}
	})
}

// Lengths × k with cable forces × k and stresses kept gives the shape × k;
// doubling all prestress leaves the shape and doubles the forces.
func TestScaling(t *testing.T) {
	c := cases.FourPoint(10, 4, 2000, 20000, 0.1, 10)
	start := linearStart(c.S, 4)
	want := relaxed(t, relax.New(), c.S, start, engine.Settings{})
	const k = 3.7
	s := clone(c.S)
	big := *start
	big.Position = append([]r3.Vec(nil), start.Position...)
	for i := range s.Position {
		s.Position[i] = r3.Scale(k, s.Position[i])
		big.Position[i] = r3.Scale(k, big.Position[i])
	}
	for m := range s.Given {
		s.Given[m] *= k
	}
	f := relaxed(t, relax.New(), s, &big, engine.Settings{})
	for i := range f.Position {
		assert.InDelta(t, 0, r3.Norm(r3.Sub(f.Position[i], r3.Scale(k, want.Position[i]))), 1e-6)
		assert.InDelta(t, 0, r3.Norm(r3.Sub(f.Reaction[i], r3.Scale(k, want.Reaction[i]))), 1e-2)
	}
	s = clone(c.S)
	for m := range s.Given {
		s.Given[m] *= 2
	}
	for m := range s.Stress {
		s.Stress[m] = [2]float64{2 * s.Stress[m][0], 2 * s.Stress[m][1]}
	}
	f = relaxed(t, relax.New(), s, start, engine.Settings{})
	for i := range f.Position {
		assert.InDelta(t, 0, r3.Norm(r3.Sub(f.Position[i], want.Position[i])), 1e-6)
		assert.InDelta(t, 0, r3.Norm(r3.Sub(f.Reaction[i], r3.Scale(2, want.Reaction[i]))), 1e-2)
	}
}

// A mast cut to length pushes the middle of two cables up until it fits.
func TestMastOfGivenLength(t *testing.T) {
	eachDamping(t, func(t *testing.T, e engine.Engine) {
		s := net([]r3.Vec{{X: -5}, {X: 5}, {Y: -5}, {Y: 5}, {Z: 0.5}, {Z: -2}},
			[]int32{0, 1, 2, 3, 5}, [][2]int32{{0, 4}, {1, 4}, {2, 4}, {3, 4}, {5, 4}})
		for k := range 4 {
			s.Law[k], s.Given[k] = canopy.LawForceDensity, 1000
		}
		s.Law[4], s.Kind[4] = canopy.LawCable, canopy.KindMast
		s.CableOf = []int32{-1, -1, -1, -1, 0}
		s.Cables = []canopy.Cable{{Name: "M", Kind: canopy.KindMast, Members: []int32{4}, Nodes: []int32{5, 4}, Law: canopy.CableLength, Value: 3.25}}
		f := relaxed(t, e, s, nil, engine.Settings{})
		assert.InDelta(t, 1.25, f.Position[4].Z, 1e-8)
		assert.InDelta(t, -4*1000*1.25, f.Force[4], 1e-4) // four times q·z
		assert.InDelta(t, -f.Force[4], f.Reaction[5].Z, 1e-4)
	})
}

// Members of a cable that is balanced afterwards are left out, with no force.
func TestMembersBalancedAfterwardsAreLeftOut(t *testing.T) {
	s := net([]r3.Vec{{X: -5}, {X: 5}, {Z: 1}, {Z: -4}}, []int32{0, 1, 3}, [][2]int32{{0, 2}, {1, 2}, {3, 2}})
	s.Given[0], s.Given[1] = 1000, 1000
	s.Law[2], s.Kind[2] = canopy.LawCable, canopy.KindMast
	s.CableOf = []int32{-1, -1, 0}
	s.Cables = []canopy.Cable{{Members: []int32{2}, Nodes: []int32{3, 2}, Law: canopy.CableBalance}}
	f := relaxed(t, relax.New(), s, nil, engine.Settings{})
	assert.InDelta(t, 0, f.Position[2].Z, 1e-7)
	assert.Zero(t, f.Force[2])
	// Held in place it stays where the designer put it and gets no reaction.
	s.Held = []canopy.Freedom{0, 0, canopy.DirAll, 0}
	f = relaxed(t, relax.New(), s, nil, engine.Settings{})
	assert.Equal(t, s.Position[2], f.Position[2])
	assert.Equal(t, r3.Vec{}, f.Reaction[2])
}

func TestNothingFreeIsAlreadyAtRest(t *testing.T) {
	s := net([]r3.Vec{{}, {X: 1}}, []int32{0, 1}, [][2]int32{{0, 1}})
	s.Given[0] = 5
	eachDamping(t, func(t *testing.T, e engine.Engine) {
		f := relaxed(t, e, s, nil, engine.Settings{})
		assert.InDelta(t, 5, f.Force[0], 1e-12)
		assert.InDelta(t, -5, f.Reaction[0].X, 1e-12)
	})
}

func TestErrorsSayWhatIsWrong(t *testing.T) {
	for name, c := range map[string]struct {
		change func(s *canopy.Structure)
		say    string
	}{
		"no nodes":        {func(s *canopy.Structure) { s.Position = nil }, "no nodes"},
		"not a number":    {func(s *canopy.Structure) { s.Position[4].X = math.NaN() }, "node 4 has no finite position"},
		"infinite load":   {func(s *canopy.Structure) { s.Load[5].Z = math.Inf(1) }, "load on node 5"},
		"no such node":    {func(s *canopy.Structure) { s.Ends[3][1] = 99 }, "member 3 ends at node 99"},
		"loop":            {func(s *canopy.Structure) { s.Ends[3][1] = s.Ends[3][0] }, "ends where it begins"},
		"no stiffness":    {func(s *canopy.Structure) { s.Stiffness[9] = 0 }, "member 9 needs a positive stiffness"},
		"no length":       {func(s *canopy.Structure) { s.Unstressed[9] = -1 }, "member 9 needs a positive stiffness"},
		"force":           {func(s *canopy.Structure) { s.Given[0] = math.NaN() }, "member 0 has the force NaN"},
		"no cable":        {func(s *canopy.Structure) { s.Law[0] = canopy.LawCable }, "belongs to none"},
		"law":             {func(s *canopy.Structure) { s.Law[0] = 77 }, "unknown law"},
		"one place":       {func(s *canopy.Structure) { clear(s.Position) }, "in one place"},
		"supports":        {func(s *canopy.Structure) { s.Fixed = s.Fixed[:3] }, "3 supports"},
		"load on nothing": {func(s *canopy.Structure) { addLoose(s) }, "nothing is attached"},
		"sag": {func(s *canopy.Structure) {
			s.Law[0] = canopy.LawCable
			s.CableOf = make([]int32, len(s.Ends))
			s.Cables = []canopy.Cable{{Name: "edge", Members: []int32{0}, Nodes: []int32{0, 4}, Law: canopy.CableSag, Value: 0.1}}
		}, "cable edge has no node between its ends"},
		"tied": {func(s *canopy.Structure) {
			s.Master = make([]int32, len(s.Position))
		}, "is tied to node 0"},
	} {
		s := mixed()
		c.change(s)
		_, out, err := relax.New().Find(context.Background(), s, nil, engine.Settings{})
		if assert.Error(t, err, name) {
			assert.ErrorContains(t, err, c.say, name)
		}
		assert.Equal(t, engine.NotRun, out.Status)
	}
}

func addLoose(s *canopy.Structure) {
	s.Position = append(s.Position, r3.Vec{X: 1, Y: 1, Z: 5})
	s.Fixed = append(s.Fixed, 0)
	s.Load = append(s.Load, r3.Vec{Z: -1})
}

func TestCancelledContextStops(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	for _, e := range []*relax.Engine{relax.New(), {Viscous: true}} {
		_, _, err := e.Find(ctx, mixed(), nil, engine.Settings{})
		assert.True(t, errors.Is(err, context.Canceled))
	}
	// On the way too.
	ctx, cancel = context.WithCancel(context.Background())
	c := cases.FourPoint(10, 4, 2000, 20000, 0.1, 24)
	steps := 0
	_, _, err := relax.New().Find(ctx, c.S, nil, engine.Settings{Residual: 1e-30, Progress: func(s engine.Step) {
		steps++
		assert.Equal(t, "dynamic relaxation", s.Engine)
		cancel()
	}})
	assert.True(t, errors.Is(err, context.Canceled))
	assert.Equal(t, 1, steps)
}

func TestRecorderHasEveryIteration(t *testing.T) {
	rec := &engine.Recorder{}
	f, out, err := relax.New().Find(context.Background(), mixed(), nil, engine.Settings{Recorder: rec})
	require.NoError(t, err)
	require.True(t, f.Converged)
	require.Len(t, rec.Rows, out.Iterations)
	assert.Equal(t, out.Iterations, rec.Rows[len(rec.Rows)-1].Iteration)
	assert.InDelta(t, out.Residual, rec.Rows[len(rec.Rows)-1].Residual, 1e-10)
	assert.Greater(t, rec.Rows[3].Energy, 0.0)
}

// Out of iterations or of what rounding allows: stalled, with a reason and the
// best shape seen.
func TestStalledSaysWhy(t *testing.T) {
	f, out, err := relax.New().Find(context.Background(), mixed(), nil, engine.Settings{MaxIterations: 5})
	require.NoError(t, err)
	assert.Equal(t, engine.Stalled, out.Status)
	assert.Contains(t, out.Why, "after 5 iterations")
	assert.Equal(t, out.Why, f.Why)
	assertFinite(t, f)
	f, out, err = relax.New().Find(context.Background(), mixed(), nil, engine.Settings{Residual: 1e-19, Worst: 1e-19})
	require.NoError(t, err)
	assert.Equal(t, engine.Stalled, out.Status)
	assert.Contains(t, out.Why, "the residual stays at")
	assert.Less(t, out.Residual, 1e-11)
	assertFinite(t, f)
}

// A net whose force densities cancel flies apart.
func TestPushingForceDensitiesDiverge(t *testing.T) {
	for _, e := range []*relax.Engine{relax.New(), {Viscous: true}} {
		s := net([]r3.Vec{{}, {X: 2}, {X: 1, Z: 0.1}}, []int32{0, 1}, [][2]int32{{0, 2}, {2, 1}})
		s.Given[0], s.Given[1] = 1000, -1100
		s.Load[2].Z = -10
		f, out, err := e.Find(context.Background(), s, nil, engine.Settings{MaxIterations: 30000})
		require.NoError(t, err)
		assert.Equal(t, engine.Diverged, out.Status, e.Name())
		assert.NotEmpty(t, out.Why)
		assertFinite(t, f)
	}
}

// Nobody's numbers make it panic or return what is not a number.
func TestRandomNetsStayFinite(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		n := rapid.IntRange(2, 9).Draw(rt, "nodes")
		nodes := make([]r3.Vec, n)
		for i := range nodes {
			c := rapid.Float64Range(-10, 10)
			nodes[i] = r3.Vec{X: c.Draw(rt, "x"), Y: c.Draw(rt, "y"), Z: c.Draw(rt, "z")}
		}
		m := rapid.IntRange(0, 14).Draw(rt, "members")
		var ends [][2]int32
		for range m {
			a := rapid.Int32Range(0, int32(n)-1).Draw(rt, "a")
			b := rapid.Int32Range(0, int32(n)-1).Draw(rt, "b")
			if a != b {
				ends = append(ends, [2]int32{a, b})
			}
		}
		s := net(nodes, nil, ends)
		for i := range nodes {
			s.Fixed[i] = canopy.Freedom(rapid.IntRange(0, 7).Draw(rt, "fixed"))
			if rapid.Bool().Draw(rt, "loaded") {
				s.Load[i] = r3.Vec{Z: rapid.Float64Range(-100, 100).Draw(rt, "load")}
			}
		}
		for k := range ends {
			s.Law[k] = canopy.Law(rapid.IntRange(0, 2).Draw(rt, "law"))
			s.Kind[k] = canopy.Kind(rapid.IntRange(0, 8).Draw(rt, "kind"))
			s.Given[k] = rapid.Float64Range(-50, 500).Draw(rt, "given")
			s.Stiffness[k] = rapid.Float64Range(1, 1e6).Draw(rt, "ea")
			s.Unstressed[k] = rapid.Float64Range(0.01, 20).Draw(rt, "l0")
		}
		e := &relax.Engine{Viscous: rapid.Bool().Draw(rt, "viscous")}
		f, out, err := e.Find(context.Background(), s, nil, engine.Settings{MaxIterations: 2000})
		if err != nil {
			return
		}
		for _, p := range f.Position {
			if v := p.X + p.Y + p.Z; math.IsNaN(v) || math.IsInf(v, 0) {
				rt.Fatal("position is not finite: ", out)
			}
		}
		for _, v := range f.Force {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				rt.Fatal("force is not finite: ", out)
			}
		}
		if math.IsNaN(out.Residual) || math.IsNaN(out.Worst) || math.IsNaN(out.Move) {
			rt.Fatal("outcome is not finite: ", out)
		}
		if out.Status == engine.NotRun || (out.Status != engine.Converged) != (out.Why != "") {
			rt.Fatal("no status: ", out)
		}
	})
}
