package newton_test

import (
	"context"
	"math"
	"runtime"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/newton"
)

// Same bits whatever GOMAXPROCS, for a fresh solver and a used one.
func TestSameBits(t *testing.T) {
	c := cases.FourPoint(10, 3, 2500, 30e3, 0.1, 24)
	defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(1))
	one, _ := find(t, c.S, nil)
	runtime.GOMAXPROCS(4)
	two, _ := find(t, c.S, nil)
	assert.Equal(t, one, two)
	v, err := newton.New(ctx, c.S)
	require.NoError(t, err)
	for range 2 {
		f, _, err := v.Find(ctx, nil, engine.Settings{})
		require.NoError(t, err)
		assert.Equal(t, one, f)
	}
}

// A solver that is used again after a corner moved and a force changed finds
// what a new one finds, in fewer steps than from scratch.
func TestWarmStart(t *testing.T) {
	c := cases.FourPoint(10, 3, 2500, 30e3, 0.1, 24)
	v, err := newton.New(ctx, c.S)
	require.NoError(t, err)
	f, _, err := v.Find(ctx, nil, engine.Settings{})
	require.NoError(t, err)
	for k := range 5 {
		for i := range c.S.Position {
			if c.S.Fixed[i] != 0 && c.S.Position[i].X > 0 && c.S.Position[i].Y > 0 {
				c.S.Position[i].Z += 0.3
				c.S.Position[i].X -= 0.1
			}
		}
		c.S.Given[0] *= 1.01
		var out engine.Outcome
		f, out, err = v.Find(ctx, f, engine.Settings{})
		require.NoError(t, err)
		require.Equal(t, engine.Converged, out.Status, out.Why)
		assert.LessOrEqual(t, out.Iterations, 4)
		assert.Greater(t, cases.MinAngle(c.S, f.Position), 0.2)
		t.Logf("move %d: %d steps, smallest angle %.2f rad", k, out.Iterations, cases.MinAngle(c.S, f.Position))
	}
}

func TestCancelled(t *testing.T) {
	c := cases.FourPoint(10, 3, 2500, 30e3, 0.1, 12)
	stop, cancel := context.WithCancel(ctx)
	n := 0
	_, _, err := newton.Engine{}.Find(stop, c.S, nil, engine.Settings{Progress: func(s engine.Step) {
		assert.Equal(t, newton.Name, s.Engine)
		if n++; n == 2 {
			cancel()
		}
	}})
	assert.ErrorIs(t, err, context.Canceled)
	assert.Equal(t, 2, n)
}

func TestRecorderKeepsEveryStep(t *testing.T) {
	c := cases.SchwarzD(12, 1000)
	rec := &engine.Recorder{}
	_, out, err := newton.Engine{}.Find(ctx, c.S, nil, engine.Settings{Recorder: rec})
	require.NoError(t, err)
	require.Len(t, rec.Rows, out.Iterations+1)
	assert.Equal(t, out.Residual, rec.Rows[out.Iterations].Residual)
}

func TestOutOfIterations(t *testing.T) {
	c := cases.Scherk(1, 12, 1000)
	f, out, err := newton.Engine{}.Find(ctx, c.S, c.Form(c.Disturbed(c.Exact, 0.02, 0)), engine.Settings{MaxIterations: 1})
	require.NoError(t, err)
	assert.Equal(t, engine.Stalled, out.Status)
	assert.Contains(t, out.Why, "not in balance after 1 steps")
	assert.False(t, f.Converged)
}

// A flat square film of side 1 under its own weight w hangs by
// 0.07367135328·w/T at its middle (series solution of T∇²z = w), and its
// supports carry the weight.
func TestSelfWeightOfFabric(t *testing.T) {
	c := cases.SchwarzD(32, 1000)
	s := c.S
	for i := range s.Position {
		s.Position[i].Z = 0
	}
	s.SelfWeight = true
	s.Fabrics[0].Weight = 5
	f, out := find(t, s, nil)
	mid := len(f.Position) / 2
	assert.InEpsilon(t, -0.07367135328*5/1000, f.Position[mid].Z, 3e-3)
	sum := 0.0
	for _, r := range f.Reaction {
		sum += r.Z
	}
	assert.InEpsilon(t, 5, sum, 1e-5)
	t.Log(out.Iterations, "steps")
}

// Weight of edge cables and fabric lowers a sail.
func TestSelfWeightOfSail(t *testing.T) {
	c := cases.FourPoint(10, 3, 2500, 30e3, 0.1, 16)
	g, _ := find(t, c.S, nil)
	s := c.S
	s.SelfWeight = true
	s.Fabrics[0].Weight = 12
	s.Weight = make([]float64, len(s.Ends))
	for m := range s.Weight {
		s.Weight[m] = 20
	}
	f, out := find(t, s, nil)
	for i := range f.Position {
		if s.Fixed[i] == 0 {
			assert.Less(t, f.Position[i].Z, g.Position[i].Z+1e-4)
		}
	}
	assert.Less(t, out.Iterations, 10)
}

// A flat film under a small pressure p: deflection p·a²/(4T) at the middle of
// a circle of radius a (linear membrane theory, T∇²w = −p).
func TestFlatFilmDeflection(t *testing.T) {
	const a, stress, p = 3.0, 2000.0, 1.0
	c := cases.SphereCap(a, p, stress, 48, 16)
	f, _ := find(t, c.S, nil)
	assert.InEpsilon(t, p*a*a/(4*stress), f.Position[0].Z, 3e-3)
}

// A node that may move along x only, on a film across x.
func TestSupportsByDirection(t *testing.T) {
	c := cases.FourPoint(10, 3, 2500, 30e3, 0.1, 16)
	s := c.S
	for i, p := range s.Position {
		if math.Abs(p.X) < 1e-9 { // symmetry plane x = 0
			s.Fixed[i] |= canopy.DirX
		}
	}
	ref := cases.FourPoint(10, 3, 2500, 30e3, 0.1, 16)
	// The plane x = 0 is no symmetry plane of the sail (its corners are
	// antisymmetric), so the film pushes sideways on it but the middle stays.
	f, _ := find(t, s, nil)
	g, _ := find(t, ref.S, nil)
	for i := range f.Position {
		if s.Fixed[i] == canopy.DirX {
			assert.Zero(t, f.Position[i].X-s.Position[i].X)
		}
	}
	mid := len(f.Position) / 2
	assert.InDelta(t, g.Position[mid].Z, f.Position[mid].Z, 1e-9)
	assert.InDelta(t, 0, r3.Norm(g.Position[mid]), 1e-8)
}
