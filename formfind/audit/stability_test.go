package audit_test

import (
	"context"
	"math"
	"testing"

	"github.com/stretchr/testify/require"

	"anticlast/formfind/audit"
)

// Both branches of the catenoid between rings of radius 1 at ±0.5: the roots a
// of a·cosh(0.5/a) = 1 (Euler 1744; J. C. C. Nitsche, Minimal
// Surfaces, vol. 1, 1989; recomputed).
const (
	stableWaist   = 0.848337938094979
	unstableWaist = 0.235094990234533
)

func TestCatenoidBranches(t *testing.T) {
	for _, c := range []struct {
		name     string
		waist    float64
		unstable bool
	}{{"stable", stableWaist, false}, {"unstable", unstableWaist, true}} {
		for _, rows := range []int{8, 16, 32} {
			s := catenoid(c.waist, 0.5, rows, 3*rows, 2000)
			f := solveForm(t, s, nil)
			a := run(t, s, f)
			t.Logf("%s %d rows: η %.2g largest %.2g force %.2g moment %.2g virial %.2g reaction %.2g unstable %d softest %.5g", c.name, rows,
				a.ResidualRMS, a.ResidualLargest, a.ForceBalance, a.MomentBalance, a.Virial, a.ReactionMismatch, a.Unstable, a.Softest)
			require.True(t, a.StabilityKnown)
			require.Less(t, a.ResidualLargest, 1e-9)
			if c.unstable {
				require.Equal(t, 1, a.Unstable)
				require.False(t, a.Trusted)
				require.Negative(t, a.Softest)
			} else {
				require.Zero(t, a.Unstable)
				require.True(t, a.Trusted, "%v", a.Reasons)
				require.Positive(t, a.Softest)
			}
		}
	}
}

// shoot returns w at the end v = end of the equation of the lowest disturbance
// of a catenoid of waist a under fixed rings, d²w/dv² + 2w/cosh²v + λ·a²·cosh²v·w = 0
// with v = z/a: the operator −Δ + 2K of its second variation of area (Nitsche
// 1989), even about the waist. Fourth-order steps.
func shoot(lambda, a, end float64) float64 {
	const n = 2000
	h := end / n
	slope := func(v, w float64) float64 {
		c := math.Cosh(v)
		return -(2/(c*c) + lambda*a*a*c*c) * w
	}
	w, u := 1., 0.
	for i := range n {
		v := h * float64(i)
		k1, l1 := u, slope(v, w)
		k2, l2 := u+h/2*l1, slope(v+h/2, w+h/2*k1)
		k3, l3 := u+h/2*l2, slope(v+h/2, w+h/2*k2)
		k4, l4 := u+h*l3, slope(v+h, w+h*k3)
		w += h / 6 * (k1 + 2*k2 + 2*k3 + k4)
		u += h / 6 * (l1 + 2*l2 + 2*l3 + l4)
	}
	return w
}

// lowest is the smallest λ at which w vanishes on the rings.
func lowest(a, lo, hi float64) float64 {
	for range 100 {
		mid := (lo + hi) / 2
		if shoot(mid, a, 0.5/a) > 0 {
			lo = mid
		} else {
			hi = mid
		}
	}
	return lo
}

// Ring radius 1, separation 1: the smallest eigenvalue is 6.88334 on the
// stable catenoid and negative on the unstable one.
func TestCatenoidSmallestEigenvalueConvergesSecondOrder(t *testing.T) {
	exact := lowest(stableWaist, 0, 20)
	require.InDelta(t, 6.88334, exact, 5e-6)
	var last float64
	for _, rows := range []int{8, 16, 32} {
		s := catenoid(stableWaist, 0.5, rows, 4*rows, 1)
		f := solveForm(t, s, nil)
		r, err := audit.Stability(context.Background(), s, f, audit.Options{})
		require.NoError(t, err)
		e := r.Eigenvalue/exact - 1
		t.Logf("%d rows: λ = %.6f, off by %.3f %%", rows, r.Eigenvalue, 100*e)
		if last != 0 {
			require.Greater(t, math.Log2(math.Abs(last/e)), 1.8)
		}
		last = e
	}
	require.Less(t, math.Abs(last), 2e-3)

	below := lowest(unstableWaist, -50, 0)
	require.Negative(t, below)
	s := catenoid(unstableWaist, 0.5, 48, 60, 1)
	r, err := audit.Stability(context.Background(), s, solveForm(t, s, nil), audit.Options{})
	require.NoError(t, err)
	t.Logf("unstable branch: λ = %.5f, exact %.5f", r.Eigenvalue, below)
	require.InEpsilon(t, below, r.Eigenvalue, 2e-2)
}
