package relax_test

import (
	"context"
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/element"
	"anticlast/formfind/engine"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/relax"
)

// A single triangle between three supports: the reactions are the opposite of
// what the element's own functions, written another way, say.
func TestReactionsOfOneTriangle(t *testing.T) {
	x := [3]r3.Vec{{X: 0.1, Y: 0.2, Z: 0.3}, {X: 2, Y: 0.4, Z: -0.2}, {X: 0.5, Y: 1.7, Z: 0.6}}
	g, ok := element.NewTriangle(x[0], x[1], x[2])
	require.True(t, ok)
	dir := r3.Vec{X: 1, Y: 0.3}
	warp, weft, err := g.ProjectWarp(dir)
	require.NoError(t, err)
	for name, c := range map[string]struct {
		stress [2]float64
		fabric canopy.Fabric
	}{
		"uniform":          {[2]float64{2000, 2000}, canopy.Fabric{}},
		"warp and weft":    {[2]float64{3000, 1000}, canopy.Fabric{}},
		"with pressure":    {[2]float64{3000, 1000}, canopy.Fabric{Pressure: 400}},
		"with weight":      {[2]float64{2000, 2000}, canopy.Fabric{Weight: 12}},
		"elastic, relaxed": {[2]float64{3000, 1000}, canopy.Fabric{Elastic: true, WarpModulus: 5e5, WeftModulus: 3e5, ShearModulus: 2e4}},
	} {
		s := &canopy.Structure{
			Position: x[:], Fixed: []canopy.Freedom{canopy.DirAll, canopy.DirAll, canopy.DirAll},
			Corners: [][3]int32{{0, 1, 2}}, FabricOf: []int32{0}, Warp: []r3.Vec{dir}, Stress: [][2]float64{c.stress},
			Fabrics: []canopy.Fabric{c.fabric}, SelfWeight: true,
		}
		f := relaxed(t, relax.New(), s, nil, engine.Settings{})
		pull := g.StressPull(warp, weft, c.stress[0], c.stress[1], 0)
		for i := range pull {
			want := r3.Add(pull[i], g.PressurePush(c.fabric.Pressure))
			want.Z -= c.fabric.Weight * g.Area / 3
			assert.InDelta(t, 0, r3.Norm(r3.Add(f.Reaction[i], want)), 1e-9, name)
		}
		assert.InDelta(t, 0, r3.Norm(r3.Sub(warp, f.Warp[0])), 1e-12, name)
		assert.InDelta(t, c.stress[0], f.Stress[0].Warp, 1e-9, name)
		assert.InDelta(t, c.stress[1], f.Stress[0].Weft, 1e-9, name)
	}
}

// A rigid ring that may only rise, pulled askew by four cables: its height is
// that of vertical balance, and reported reactions with the couple that keeps
// it level balance in force and moment.
func TestRigidRingReportsTheCoupleThatKeepsItLevel(t *testing.T) {
	eachDamping(t, func(t *testing.T, e engine.Engine) {
		s := net([]r3.Vec{
			{Z: 1}, {X: 0.5, Z: 1}, {Y: 0.5, Z: 1}, {X: -0.5, Z: 1}, {Y: -0.5, Z: 1},
			{X: 4}, {X: 1, Y: 5, Z: 0.5}, {X: -3, Z: -1}, {Y: -6},
		}, []int32{5, 6, 7, 8}, [][2]int32{{1, 5}, {2, 6}, {3, 7}, {4, 8}})
		copy(s.Given, []float64{1000, 700, 1500, 900})
		s.Fixed[0] = canopy.DirX | canopy.DirY
		s.Master = []int32{-1, 0, 0, 0, 0, -1, -1, -1, -1}
		s.Load[0].Z = 3000
		s.Rings = []canopy.Ring{{Name: "top", Centre: 0, Nodes: []int32{1, 2, 3, 4}, Rigid: true, Free: canopy.DirZ, Weight: 500, Cable: -1}}
		s.SelfWeight = true
		f := relaxed(t, e, s, nil, engine.Settings{Residual: 1e-12, Worst: 1e-12, Move: 1e-12})
		// Σq(z − z_end) = load − weight.
		assert.InDelta(t, (2500+700*0.5-1500)/4100, f.Position[0].Z, 1e-9)
		for _, i := range s.Rings[0].Nodes {
			assert.InDelta(t, f.Position[0].Z, f.Position[i].Z, 1e-14)
		}
		force := r3.Vec{Z: 2500}
		moment := r3.Add(f.Couple[0], r3.Cross(f.Position[0], force))
		for i, r := range f.Reaction {
			force = r3.Add(force, r)
			moment = r3.Add(moment, r3.Cross(f.Position[i], r))
		}
		assert.InDelta(t, 0, r3.Norm(force), 1e-7)
		assert.InDelta(t, 0, r3.Norm(moment), 1e-7)
		assert.Greater(t, r3.Norm(f.Couple[0]), 100.0)
	})
}

// Reactions carry the weight of an elastic sheet and its cables to the last
// digits, whatever the shape.
func TestWeightIsCarriedToTheSupports(t *testing.T) {
	f := sheet
	f.Weight = 30
	s := disc(5, 6, f, 2000)
	s.SelfWeight = true
	form := relaxed(t, relax.New(), s, nil, engine.Settings{Residual: 1e-13, Worst: 1e-12, Move: 1e-12})
	weight := 30 * cases.Area(s, form.Position)
	assert.InEpsilon(t, weight, sumOf(form.Reaction).Z, 1e-12)
}

// All four edge cables of a sail by sag at once, from a bad start and a worse
// first guess; and the same sail by the forces that were found.
func TestFourCablesBySag(t *testing.T) {
	eachDamping(t, func(t *testing.T, e engine.Engine) {
		c := cases.FourPoint(10, 4, 2000, 20000, 0.1, 16)
		s := clone(c.S)
		s.Law = append([]canopy.Law(nil), s.Law...)
		s.Cables = append([]canopy.Cable(nil), s.Cables...)
		s.CableOf = make([]int32, len(s.Ends))
		for k := range s.Cables {
			for _, m := range s.Cables[k].Members {
				s.CableOf[m], s.Law[m], s.Given[m] = int32(k), canopy.LawCable, 0
			}
			s.Cables[k].Law, s.Cables[k].Value = canopy.CableSag, 0.09
		}
		f := relaxed(t, e, s, linearStart(c.S, 3), engine.Settings{})
		for k := range s.Cables {
			assert.InEpsilon(t, 0.09, cases.CableSag(s, k, f.Position), 1e-8)
			assert.InEpsilon(t, f.Force[0], f.Force[s.Cables[k].Members[0]], 1e-6, "by symmetry")
		}
		for m := range c.S.Given {
			c.S.Given[m] = f.Force[m]
		}
		g := relaxed(t, e, c.S, f, engine.Settings{})
		assert.Less(t, farthest(f.Position, g.Position), 1e-5)
	})
}

// A sag that no force gives ends stalled or diverged, and says so.
func TestSagOutOfReachIsNotConverged(t *testing.T) {
	c := cases.EdgeCableStrip(10, 8, 3000, 39000, 12, 8)
	s := c.S
	s.CableOf = make([]int32, len(s.Ends))
	for k := range s.Ends {
		s.Law[k] = canopy.LawCable
	}
	s.Cables[0].Law, s.Cables[0].Value = canopy.CableSag, 0.7 // beyond the half circle
	f, out, err := relax.New().Find(context.Background(), s, nil, engine.Settings{MaxIterations: 20000})
	require.NoError(t, err)
	assert.NotEqual(t, engine.Converged, out.Status)
	assert.NotEmpty(t, out.Why)
	assertFinite(t, f)
}

// Slack cables do not push and are allowed: only one of two parallel hangers
// carries.
func TestSlackCableCarriesNothing(t *testing.T) {
	eachDamping(t, func(t *testing.T, e engine.Engine) {
		s := net([]r3.Vec{{}, {Z: -1}}, []int32{0}, [][2]int32{{0, 1}, {1, 0}})
		elastic(s, 1e5, func(k int) float64 { return []float64{1, 1.5}[k] })
		s.Load[1] = r3.Vec{Z: -100}
		f := relaxed(t, e, s, nil, engine.Settings{})
		assert.InDelta(t, 100, f.Force[0], 1e-5)
		assert.Zero(t, f.Force[1])
		assert.InDelta(t, -1.001, f.Position[1].Z, 1e-8)
	})
}

// Far from the origin the same shape is found to nearly the same digits.
func TestFarFromTheOrigin(t *testing.T) {
	c := cases.FourPoint(10, 4, 2000, 20000, 0.1, 10)
	start := linearStart(c.S, 4)
	near := relaxed(t, relax.New(), c.S, start, engine.Settings{})
	by := r3.Vec{X: 4e6, Y: 5e5, Z: 300}
	s := clone(c.S)
	far := *start
	far.Position = append([]r3.Vec(nil), start.Position...)
	for i := range s.Position {
		s.Position[i] = r3.Add(s.Position[i], by)
		far.Position[i] = r3.Add(far.Position[i], by)
	}
	f := relaxed(t, relax.New(), s, &far, engine.Settings{})
	for i := range f.Position {
		assert.Less(t, r3.Norm(r3.Sub(r3.Sub(f.Position[i], by), near.Position[i])), 1e-6)
		if s.Fixed[i] == canopy.DirAll {
			assert.Equal(t, s.Position[i], f.Position[i])
		}
	}
	assert.False(t, math.IsNaN(f.Reaction[0].X))
}
