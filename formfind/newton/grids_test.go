package newton_test

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/mesh"
	"anticlast/formfind/newton"
)

// Steps solved with the help of coarser meshes lead to the same shape as steps by
// a factorisation, two levels deep, with edge cables, a sliding ring and pressure.
func TestCoarserMeshesHelpToTheSameShape(t *testing.T) {
	cone := cases.ConeConstant(5, 0.5, 1, 1)
	for _, k := range []cases.Case{
		cases.Catenoid(0.5, 44, 11, true, 1000),
		cases.FourPoint(10, 3, 2500, 30e3, 0.1, 22),
		cases.RingOnMast(5, 0.5, 0.8, 1000, 2*math.Pi*1000*cone, 36, 12),
		cases.SphereCap(5, 1, 5, 36, 12),
	} {
		t.Run(k.Name, func(t *testing.T) {
			s := k.S
			below, err := newton.New(t.Context(), s)
			require.NoError(t, err)
			f, out, err := below.Find(t.Context(), nil, engine.Settings{})
			require.NoError(t, err)
			require.Equal(t, engine.Converged, out.Status, out.Why)
			for range 2 {
				r, err := mesh.Refine(s)
				require.NoError(t, err)
				s = r.Fine
				at := r.Prolong(f)
				want, direct, err := newton.Engine{}.Find(t.Context(), s, at, engine.Settings{})
				require.NoError(t, err)
				require.Equal(t, engine.Converged, direct.Status, direct.Why)
				v, err := newton.New(t.Context(), s)
				require.NoError(t, err)
				v.Above(below, r.Parents)
				var got *canopy.Form
				got, out, err = v.Find(t.Context(), at, engine.Settings{})
				require.NoError(t, err)
				require.Equal(t, engine.Converged, out.Status, out.Why)
				worst := 0.0
				for i := range got.Position {
					worst = math.Max(worst, r3.Norm(r3.Sub(got.Position[i], want.Position[i])))
				}
				assert.Less(t, worst, 1e-8*s.Size(), "%d triangles", len(s.Corners))
				assert.LessOrEqual(t, out.Iterations, direct.Iterations+2)
				below, f = v, got
			}
			assert.Equal(t, -1, out.NegativePivots, "the last level was not solved with the help of the others")
		})
	}
}

// Where a mesh has no stable shape, coarser meshes do not make one: beyond the
// critical separation of a catenoid, started from the shape of a nearer pair of
// rings.
func TestCoarserMeshesMakeNoShapeWhereThereIsNone(t *testing.T) {
	near := cases.Catenoid(0.6, 44, 14, true, 1000)
	below, err := newton.New(t.Context(), near.S)
	require.NoError(t, err)
	f, out, err := below.Find(t.Context(), nil, engine.Settings{})
	require.NoError(t, err)
	require.Equal(t, engine.Converged, out.Status, out.Why)
	r, err := mesh.Refine(near.S)
	require.NoError(t, err)
	r2, err := mesh.Refine(r.Fine)
	require.NoError(t, err)
	at := r2.Prolong(r.Prolong(f))
	for i := range r2.Fine.Position {
		r2.Fine.Position[i].Z *= 0.7 / 0.6
		at.Position[i].Z *= 0.7 / 0.6
	}
	v, err := newton.New(t.Context(), r.Fine)
	require.NoError(t, err)
	_, out, err = v.Find(t.Context(), r.Prolong(f), engine.Settings{})
	require.NoError(t, err)
	require.Equal(t, engine.Converged, out.Status, out.Why)
	w, err := newton.New(t.Context(), r2.Fine)
	require.NoError(t, err)
	w.Above(v, r2.Parents)
	_, out, err = w.Find(t.Context(), at, engine.Settings{})
	require.NoError(t, err)
	assert.NotEqual(t, engine.Converged, out.Status)
}
