package formfind_test

import (
	"math"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/internal/sweep"
)

func noShape(t *testing.T, err error) *formfind.NoEquilibriumError {
	t.Helper()
	var none *formfind.NoEquilibriumError
	require.ErrorAs(t, err, &none)
	t.Log(none.Text)
	return none
}

// Equal coaxial rings of radius R have a catenoid between them up to the
// separation 1.32548683869836 R: u tanh u = 1, h/R = u/cosh u = 0.662743419349182
// (J. C. C. Nitsche, Lectures on Minimal Surfaces 1, Cambridge 1989; recomputed).
func TestCriticalSeparationOfRings(t *testing.T) {
	n := sweep.N(1, 2, 3)
	around, along := 32*n, 16*n
	tol := 0.02 / float64(n*n)
	c := cases.Catenoid(0.5, around, along, true, 1000)
	stretch := func(h float64) *formfind.NoEquilibriumError {
		s := *c.S
		s.Position = append([]r3.Vec(nil), s.Position...)
		for i := range s.Position {
			s.Position[i].Z *= h / 0.5
		}
		r, err := formfind.Solve(t.Context(), &s, formfind.Options{})
		if err == nil {
			require.True(t, r.Audit.Trusted, "h = %g: %v", h, r.Audit.Reasons)
			return nil
		}
		return noShape(t, err)
	}
	const critical = 0.662743419349182
	require.Nil(t, stretch(critical*(1-2*tol)), "from below")
	none := stretch(critical * (1 + 2*tol))
	require.NotNil(t, none, "from above")
	require.True(t, none.Shown)
	require.InEpsilon(t, 2*critical, none.Limit, 2*tol)
	none = stretch(0.9)
	require.NotNil(t, none)
	require.InEpsilon(t, 2*critical, none.Limit, 2*tol)
}

// A flat square of side L at stress σ needs edge cables of more than
// σL/(2 sin 45°) = 0.7071 σL (equilibrium of a corner: arcs of radius T/σ over
// the sides must not meet).
func TestLeastEdgeForceOfAFlatSquare(t *testing.T) {
	const side, stress = 8.0, 2000.0
	least := stress * side / (2 * math.Sin(math.Pi/4))
	n := sweep.N(12, 20, 32)
	good := cases.FourPoint(side, 0, stress, 1.08*least, 0.15, n)
	r, err := formfind.Solve(t.Context(), good.S, formfind.Options{})
	require.NoError(t, err)
	require.True(t, r.Audit.Trusted, "%v", r.Audit.Reasons)
	weak := cases.FourPoint(side, 0, stress, 0.6*least, 0.15, n)
	_, err = formfind.Solve(t.Context(), weak.S, formfind.Options{})
	none := noShape(t, err)
	require.True(t, none.Shown)
	require.Equal(t, "edge cable force", none.Quantity)
	t.Logf("least edge force %.4f of the exact", none.Limit/least)
	require.InEpsilon(t, least, none.Limit, 0.1)
}
