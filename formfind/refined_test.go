package formfind_test

import (
	"fmt"
	"math"
	"slices"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind"
	"anticlast/formfind/canopy"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/internal/sweep"
)

// A structure without a coarser mesh is refined once for an estimate of its
// discretisation: between one and three times the true distance from the smooth surface
// (catenoid; cones sin α = (c/r)^m, axisymmetric membrane equilibrium), and falling with
// the square of the mesh size.
func TestSmallMeshesAreJudgedByOneRefinement(t *testing.T) {
	warned := false
	for _, at := range []func(n int) cases.Case{
		func(n int) cases.Case { return cases.Catenoid(0.5, 2*n, n, true, 1000) },
		func(n int) cases.Case { return cases.Cone(5, 0.5, 2, [2]float64{1000, 500}, 3*n, n) },
		func(n int) cases.Case { return cases.Cone(5, 1, 1, [2]float64{1000, 2000}, 3*n, n) },
	} {
		var estimates []float64
		for _, n := range []int{8, sweep.N(16, 24, 24)} {
			c := at(n)
			r := solve(t, c.S, formfind.Options{})
			trusted(t, r)
			worst := 0.0
			for _, p := range r.Form.Position {
				worst = math.Max(worst, math.Abs(c.Distance(p)))
			}
			estimate := r.Audit.Discretisation * c.S.Size()
			t.Logf("%s, %d triangles: %.2g m off, estimated %.2g m", c.Name, len(c.S.Corners), worst, estimate)
			assert.Greater(t, estimate, worst)
			assert.Less(t, estimate, 3*worst)
			coarse := slices.ContainsFunc(r.Findings, func(f canopy.Finding) bool { return f.ID == "mesh-coarse" })
			assert.Equal(t, r.Audit.Discretisation > 0.0025, coarse, "warned of")
			warned = warned || coarse
			estimates = append(estimates, estimate)
		}
		assert.Greater(t, estimates[0]/estimates[1], 2.7, "order")
	}
	assert.True(t, warned, "some of these meshes are coarse")
}

// Just above their height limit cones have a shape in balance on a coarse mesh, and
// none on finer ones: they are refused as any other beyond its limit.
func TestShapesThatOnlyACoarseMeshHasAreRefused(t *testing.T) {
	for _, k := range []struct{ ratio, top, divided, over float64 }{
		{1, 0.44, 6.3, 1.009}, {1, 0.4, 6.4, 1.031}, {2.51, 0.35, 5.9, 1.052}, {1.42, 0.26, 5.5, 1.034},
	} {
		exact := coneLimit(5, 5*k.top, k.ratio)
		_, err := formfind.Find(t.Context(), coneModel(5, 5*k.top, k.over*exact, k.ratio, 5/k.divided), formfind.Options{})
		none := noShape(t, err)
		require.True(t, none.Shown)
		require.Equal(t, byHeight, none.Quantity)
		t.Logf("weft:warp %g, %g of the limit: refused with %.4f of it", k.ratio, k.over, none.Limit/exact)
		require.InEpsilon(t, exact, none.Limit, 0.05)
		require.Less(t, none.Limit, k.over*exact)
	}
}

// Sails of unequal stress held all round cannot balance exactly in their plane. They
// are trusted on coarse meshes and fine ones, however steep.
func TestHeldSailsOfUnequalStressAreTrusted(t *testing.T) {
	for _, ratio := range []float64{3, 1.0 / 3} {
		for _, degrees := range []float64{0, 20, 45} {
			for _, rise := range []float64{2, 6} {
				for _, size := range []float64{1, 0.5} {
					m := &canopy.Model{MeshSize: size}
					for i, p := range []r3.Vec{{}, {X: 10, Z: rise}, {X: 11, Y: 9}, {Y: 10, Z: 0.8 * rise}} {
						m.Points = append(m.Points, canopy.Point{Name: fmt.Sprintf("P%d", i), At: p})
						m.Edges = append(m.Edges, canopy.Edge{Name: fmt.Sprintf("e%d", i), From: fmt.Sprintf("P%d", i), To: fmt.Sprintf("P%d", (i+1)%4), Kind: canopy.EdgeFixed})
					}
					sin, cos := math.Sincos(degrees * math.Pi / 180)
					m.Fabrics = []canopy.ModelFabric{{Name: "sail", Boundary: []string{"e0", "e1", "e2", "e3"},
						Warp: 2000 * math.Sqrt(ratio), Weft: 2000 / math.Sqrt(ratio), WarpDir: r3.Vec{X: cos, Y: sin}}}
					r, err := formfind.Find(t.Context(), m, formfind.Options{})
					require.NoError(t, err, "warp:weft %.2f at %g°, rise %g, mesh %g", ratio, degrees, rise, size)
					trusted(t, r)
				}
			}
		}
	}
}

// A tall cone rises from a flat mesh, whose nodes move along its normals only. On the
// coarsest mesh they are slid in the surface, so that its triangles stay triangles and
// refinement comes to rest soon.
func TestTallConesKeepTheirTriangles(t *testing.T) {
	m := coneModel(5, 1, 0.97*coneLimit(5, 1, 0.5), 0.5, 5.0/6)
	r, err := formfind.Find(t.Context(), m, formfind.Options{})
	require.NoError(t, err)
	trusted(t, r)
	angle := r.Audit.MinAngle * 180 / math.Pi
	t.Logf("%d triangles: smallest angle %.1f°, estimated %.2g of the size off", len(r.Structure.Corners), angle, r.Audit.Discretisation)
	require.Greater(t, angle, 20.0)
	require.Less(t, r.Audit.Discretisation, 5e-4)
}
