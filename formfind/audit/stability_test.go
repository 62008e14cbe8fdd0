package audit_test

import (
	"context"
	"math"
	"testing"

	"github.com/stretchr/testify/require"

	"anticlast/formfind/audit"
)

// Both branches of the catenoid between rings of radius 1 at ±0.5: the roots a
// of a·cosh(0.5/a) = 1 (Euler 1744; J. C. C. Nitsche, Lectures on Minimal
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

// The smallest eigenvalue of −Δ + 2K on the catenoid of ring radius 1 and
// separation 1 with fixed rings is 6.88334 (recomputed: with z = a·v it is the
// smallest λ of −w” − 2w/cosh²v = λ·a²·cosh²v·w, w(±0.5/a) = 0).
func TestCatenoidSmallestEigenvalueConvergesSecondOrder(t *testing.T) {
	const exact = 6.88334
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
}
