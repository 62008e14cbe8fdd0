package relax_test

import (
	"context"
	"runtime"
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

// balanced takes a shape that is in balance across itself to one in balance in
// all directions: one linear pass with the shape as reference and the wanted
// stress as second Piola-Kirchhoff stress, which then is reported as the true
// stress of the deformed triangles.
func balanced(t testing.TB, s *canopy.Structure, f *canopy.Form) *canopy.Form {
	t.Helper()
	out := *f
	out.Position = append([]r3.Vec(nil), f.Position...)
	out.Force = append([]float64(nil), f.Force...)
	out.Warp = append([]r3.Vec(nil), f.Warp...)
	out.Stress = append([]canopy.Stress(nil), f.Stress...)
	naturalUpdate(s, &out, true)
	for k, c := range s.Corners {
		ft, err := element.NewFabricTriangle([3]r3.Vec{f.Position[c[0]], f.Position[c[1]], f.Position[c[2]]}, s.Warp[k])
		require.NoError(t, err)
		x := [3]r3.Vec{out.Position[c[0]], out.Position[c[1]], out.Position[c[2]]}
		w, n := ft.Cauchy(&x, [3]float64{s.Stress[k][0], s.Stress[k][1], 0})
		out.Warp[k], out.Stress[k] = w, canopy.Stress{Warp: n[0], Weft: n[1], Shear: n[2]}
	}
	for k, e := range s.Ends {
		q := f.Force[k] / r3.Norm(r3.Sub(f.Position[e[0]], f.Position[e[1]]))
		out.Force[k] = q * length(s, &out, k)
	}
	return &out
}

// The second opinion on fabric: with the field of tension frozen, relaxation
// from disturbed nodes returns to the same nodes.
func TestFrozenFieldReturnsToTheSameNodes(t *testing.T) {
	for _, c := range []cases.Case{
		cases.Catenoid(0.5, 32, 12, true, 1000),
		cases.Scherk(1, 16, 2500),
		cases.FourPoint(10, 4, 2000, 20000, 0.1, 12),
		cases.EdgeCableStrip(10, 8, 3000, 39000, 16, 12),
	} {
		found := balanced(t, c.S, relaxed(t, relax.New(), c.S, linearStart(c.S, 4), engine.Settings{}))
		size := c.S.Size()
		eachDamping(t, func(t *testing.T, e engine.Engine) {
			frozen := relax.Frozen(found)
			frozen.Viscous = e.(*relax.Engine).Viscous
			start := relax.Disturb(c.S, found, 7, 0.02*size)
			require.Greater(t, farthest(start.Position, found.Position), 0.01*size)
			back := relaxed(t, frozen, c.S, start, engine.Settings{})
			assert.Less(t, farthest(back.Position, found.Position), 1e-7*size, c.Name)
			for k := range found.Stress {
				assert.InDelta(t, found.Stress[k].Warp, back.Stress[k].Warp, 1e-5*c.S.Stress[0][0])
			}
			for k := range found.Force {
				assert.InDelta(t, found.Force[k], back.Force[k], 1e-5*found.Force[k])
			}
		})
		// A stress that is wrong by a per cent in a few triangles is found out.
		wrong := *found
		wrong.Stress = append([]canopy.Stress(nil), found.Stress...)
		for k := range 3 {
			wrong.Stress[len(wrong.Stress)/2+k].Warp *= 1.01
		}
		back := relaxed(t, relax.Frozen(&wrong), c.S, found, engine.Settings{})
		assert.Greater(t, farthest(back.Position, found.Position), 1e-6*size, c.Name)
	}
}

// A cushion with weight: loads are frozen as they act on the found shape.
func TestFrozenFieldKeepsItsLoads(t *testing.T) {
	f := sheet
	f.Pressure, f.Weight = 1000, 50
	s := disc(5, 6, f, 2000)
	s.SelfWeight = true
	tight := engine.Settings{Residual: 1e-12, Worst: 1e-11, Move: 1e-12}
	found := relaxed(t, relax.New(), s, nil, tight)
	back := relaxed(t, relax.Frozen(found), s, relax.Disturb(s, found, 1, 0.1), tight)
	assert.Less(t, farthest(back.Position, found.Position), 1e-8)
	assert.Less(t, r3.Norm(r3.Sub(sumOf(found.Reaction), sumOf(back.Reaction))), 1e-4)
}

func TestDisturbIsRepeatableAndKeepsSupports(t *testing.T) {
	c := cases.RingOnMast(5, 0.5, 1, 2000, 3000, 16, 6)
	f := canopy.NewForm(c.S)
	a, b := relax.Disturb(c.S, f, 5, 0.1), relax.Disturb(c.S, f, 5, 0.1)
	assert.Equal(t, a.Position, b.Position)
	assert.NotEqual(t, a.Position, relax.Disturb(c.S, f, 6, 0.1).Position)
	moved := 0
	for i := range f.Position {
		d := r3.Sub(a.Position[i], f.Position[i])
		if d != (r3.Vec{}) {
			moved++
		}
		assert.LessOrEqual(t, max(d.X, d.Y, d.Z, -d.X, -d.Y, -d.Z), 0.1)
		if c.S.FixedAt(i) == canopy.DirAll {
			assert.Equal(t, f.Position[i], a.Position[i])
		}
	}
	assert.Greater(t, moved, len(f.Position)/2)
	// The ring moved as one.
	centre := c.S.Rings[0].Centre
	for _, i := range c.S.Rings[0].Nodes {
		assert.InDelta(t, a.Position[centre].Z-f.Position[centre].Z, a.Position[i].Z-f.Position[i].Z, 1e-15)
	}
}

// The same bytes whatever the number of workers.
func TestSameBitsForAnyNumberOfWorkers(t *testing.T) {
	c := cases.FourPoint(10, 4, 2000, 20000, 0.1, 80)
	set := engine.Settings{MaxIterations: 60}
	find := func() *canopy.Form {
		f, _, err := relax.New().Find(context.Background(), c.S, nil, set)
		require.NoError(t, err)
		return f
	}
	before := runtime.GOMAXPROCS(1)
	defer runtime.GOMAXPROCS(before)
	one := find()
	runtime.GOMAXPROCS(4)
	four := find()
	assert.Equal(t, one, four)
}
