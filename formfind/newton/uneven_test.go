package newton_test

import (
	"fmt"
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/fdm"
	"anticlast/formfind/canopy"
	"anticlast/formfind/element"
	"anticlast/formfind/engine"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/internal/sweep"
	"anticlast/formfind/newton"
)

// balanced is the pass that balances in all directions: f as reference, its
// stresses and forces as second Piola-Kirchhoff stress and natural force
// densities.
func balanced(t testing.TB, s *canopy.Structure, f *canopy.Form) fdm.NaturalResult {
	t.Helper()
	net := fdm.Network{Position: s.Position, Ends: s.Ends, Master: s.Master, Load: s.Load}
	for i := range s.Position {
		net.Fixed = append(net.Fixed, fdm.Directions(s.FixedAt(i)))
	}
	panels := make([]fdm.Panel, len(s.Corners))
	for k := range panels {
		panels[k] = fdm.Panel{Corners: s.Corners[k], Warp: f.Warp[k], WarpStress: f.Stress[k].Warp, WeftStress: f.Stress[k].Weft}
	}
	v, err := fdm.New(ctx, net, panels)
	require.NoError(t, err)
	r, err := v.Natural(ctx, f.Position, fdm.Given{Force: f.Force}, 1)
	require.NoError(t, err)
	require.Less(t, r.Residual, 1e-12)
	return r
}

// ratios returns the least and greatest warp:weft stress over the wanted one.
func ratios(s *canopy.Structure, r fdm.NaturalResult) (least, most float64) {
	least = math.Inf(1)
	for k, p := range r.Stress {
		q := p.Warp / p.Weft / (s.Stress[k][0] / s.Stress[k][1])
		least, most = min(least, q), max(most, q)
	}
	return least, most
}

// Cones of constant ratio m = hoop : meridian between rings of radius 5 and
// 0.5: sin α = (c/r)^m, stress ∝ r^(m−1) (axisymmetric membrane equilibrium,
// recomputed). The places converge to second order for ratios 1:3 to 3:1, the
// magnitude follows the law, and balancing in all directions keeps the ratio.
func TestConesOfConstantRatio(t *testing.T) {
	sizes := []int{12, 24}
	if sweep.N(0, 1, 1) > 0 {
		sizes = []int{12, 24, 48, 96}
	}
	for _, k := range []struct{ h, m, law, ratio float64 }{
		{1, 0.5, 0.03, 1e-3}, {2, 0.5, 0.02, 1e-3}, {3, 1.0 / 3, 0.01, 1e-3}, {0.5, 2, 0.04, 1e-3}, {0.3, 3, 0.04, 1e-3},
	} {
		t.Run(fmt.Sprintf("h=%g m=%.3g", k.h, k.m), func(t *testing.T) {
			var place []float64
			for _, n := range sizes {
				c := cases.Cone(5, 0.5, k.h, [2]float64{1000, 1000 * k.m}, 3*n, n)
				f, out := find(t, c.S, nil)
				place = append(place, worstDistance(&c, f.Position))
				least, most := math.Inf(1), 0.0
				for i, tr := range c.S.Corners {
					p := r3.Scale(1.0/3, r3.Add(r3.Add(f.Position[tr[0]], f.Position[tr[1]]), f.Position[tr[2]]))
					v := f.Stress[i].Warp / math.Pow(math.Hypot(p.X, p.Y), k.m-1)
					least, most = min(least, v), max(most, v)
					assert.InEpsilon(t, k.m, f.Stress[i].Weft/f.Stress[i].Warp, 1e-12)
				}
				r := balanced(t, c.S, f)
				lo, hi := ratios(c.S, r)
				t.Logf("%d triangles: %d steps, place %.2g m, law within %.1f %%, then balanced ratio %.4f to %.4f", len(c.S.Corners), out.Iterations, place[len(place)-1], 100*(most/least-1), lo, hi)
				if n >= 24 {
					assert.Less(t, most/least-1, k.law)
					assert.InDelta(t, 1, lo, k.ratio)
					assert.InDelta(t, 1, hi, k.ratio)
				}
			}
			last := len(place) - 1
			assert.Greater(t, math.Log2(place[0]/place[last])/float64(last), 1.9, "order")
		})
	}
}

// Near its height limit a cone turns by more than a right angle from the straight
// cone it starts from. The warp stays in the axis plane, the surface found carries a
// stress that balances it in its plane the better the finer the mesh, and a walk up
// from below gets to the limit (with a neck below the top ring, sin α = (c/r)^m;
// recomputed: 1.31345 for 5 m to 1 m and m = 2).
func TestConeNearItsLimit(t *testing.T) {
	const limit = 1.31345
	var off []float64
	for n := range sweep.N(2, 3, 3) {
		k := 1 << n
		c := cases.Cone(5, 1, 0.75*limit, [2]float64{1000, 2000}, 48*k, 16*k)
		v, err := newton.New(ctx, c.S)
		require.NoError(t, err)
		f, out, err := v.Find(ctx, nil, engine.Settings{})
		require.NoError(t, err)
		for _, share := range []float64{0.9, 0.97, 0.99} {
			require.Equal(t, engine.Converged, out.Status, out.Why)
			require.Zero(t, out.NegativePivots)
			for i := range c.S.Position {
				c.S.Position[i].Z *= share * limit / c.S.Position[len(c.S.Position)-1].Z
			}
			f, out, err = v.Find(ctx, f, engine.Settings{})
			require.NoError(t, err)
		}
		require.Equal(t, engine.Converged, out.Status, out.Why)
		turned := 0.0
		for i, tr := range c.S.Corners {
			p := r3.Add(f.Position[tr[0]], r3.Add(f.Position[tr[1]], f.Position[tr[2]]))
			around := r3.Unit(r3.Vec{X: -p.Y, Y: p.X})
			turned = max(turned, math.Abs(r3.Dot(f.Warp[i], around)))
		}
		assert.Less(t, turned, 1e-9, "the warp has left the axis plane")
		off = append(off, imbalance(c.S, f))
		t.Logf("%d triangles: out of balance in all directions by %.2g", len(c.S.Corners), off[n])
	}
	last := len(off) - 1
	assert.Less(t, off[0], 5e-5)
	assert.Greater(t, math.Log2(off[0]/off[last])/float64(last), 2.5, "order")
}

// imbalance is ‖r‖/‖s‖ over the free nodes in all directions, of the stresses of f.
func imbalance(s *canopy.Structure, f *canopy.Form) float64 {
	sum, size := make([]r3.Vec, len(s.Position)), make([]float64, len(s.Position))
	for t, c := range s.Corners {
		tri, _ := element.NewTriangle(f.Position[c[0]], f.Position[c[1]], f.Position[c[2]])
		pull := tri.StressPull(f.Warp[t], r3.Cross(tri.Normal, f.Warp[t]), f.Stress[t].Warp, f.Stress[t].Weft, 0)
		for k, i := range c {
			sum[i], size[i] = r3.Add(sum[i], pull[k]), size[i]+r3.Norm(pull[k])
		}
	}
	rr, ss := 0.0, 0.0
	for i, r := range sum {
		if s.FixedAt(i) == 0 {
			rr, ss = rr+r3.Norm2(r), ss+size[i]*size[i]
		}
	}
	return math.Sqrt(rr / ss)
}

// A cone too tall for its ratio has no shape without a neck, and soon none at
// all; it must not be called found. Limits with a neck for m = ½: √10,
// for m = 2: 0.69558 (recomputed).
func TestConeTooTall(t *testing.T) {
	for _, k := range []struct{ h, m float64 }{{3.4, 0.5}, {0.75, 2}, {1.75, 1}} {
		c := cases.Cone(5, 0.5, k.h, [2]float64{1000, 1000 * k.m}, 48, 24)
		_, out, err := newton.Engine{}.Find(ctx, c.S, nil, engine.Settings{})
		require.NoError(t, err)
		assert.NotEqual(t, engine.Converged, out.Status, "h=%g m=%g", k.h, k.m)
		t.Logf("h=%g m=%g: %v: %s", k.h, k.m, out.Status, out.Why)
	}
}

// A sail with warp and weft 3:1 to 1:3: the surface is found, cables keep the
// mean of their given force, which must vary along a cable to which the fabric
// is bonded, and balancing in all directions keeps the ratio within 10 % (no
// surface holds a constant ratio in its own plane in general).
func TestSailOfUnequalStress(t *testing.T) {
	for _, p := range [][2]float64{{3000, 2000}, {2000, 3000}, {4000, 2000}, {4500, 1500}, {1500, 4500}} {
		c := cases.FourPoint(10, 2.5, 2500, 40e3, 0.1, 16)
		for k := range c.S.Stress {
			c.S.Stress[k] = p
			c.S.Warp[k] = r3.Vec{X: 1, Y: 0.4}
		}
		f, out := find(t, c.S, nil)
		for q := range c.S.Cables {
			sum, l, least, most := 0.0, 0.0, math.Inf(1), 0.0
			for _, m := range c.S.Cables[q].Members {
				e := c.S.Ends[m]
				d := r3.Norm(r3.Sub(f.Position[e[1]], f.Position[e[0]]))
				sum, l = sum+f.Force[m]*d, l+d
				least, most = min(least, f.Force[m]), max(most, f.Force[m])
			}
			assert.InEpsilon(t, 40e3, sum/l, 1e-3)
			assert.Greater(t, most/least, 1.02)
		}
		r := balanced(t, c.S, f)
		lo, hi := ratios(c.S, r)
		assert.InDelta(t, 1, lo, 0.1)
		assert.InDelta(t, 1, hi, 0.1)
		t.Logf("%g:%g: %d steps, balanced ratio %.3f to %.3f", p[0], p[1], out.Iterations, lo, hi)
	}
}
