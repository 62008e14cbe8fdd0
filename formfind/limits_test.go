package formfind_test

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind"
	"anticlast/formfind/canopy"
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
// (J. C. C. Nitsche, Minimal Surfaces 1, Cambridge 1989; recomputed).
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

// limitOf asks for what cannot be and returns the number in the refusal.
func limitOf(t *testing.T, s *canopy.Structure, quantity string) float64 {
	t.Helper()
	_, err := formfind.Solve(t.Context(), s, formfind.Options{})
	none := noShape(t, err)
	require.True(t, none.Shown)
	require.Equal(t, quantity, none.Quantity)
	return none.Limit
}

const byHeight = "height between the lowest and the highest support"

// The critical separation at 6,000 triangles (from the middle size on).
func TestCriticalSeparationWithinAThousandth(t *testing.T) {
	around, along, tol := 56, 26, 4e-3
	if sweep.N(0, 1, 1) > 0 {
		around, along, tol = 112, 28, 1e-3
	}
	const critical = 0.662743419349182
	below := cases.Catenoid(critical*(1-tol), around, along, true, 1000)
	trusted(t, solve(t, below.S, formfind.Options{}))
	above := limitOf(t, cases.Catenoid(critical*(1+tol), around, along, true, 1000).S, byHeight)
	t.Logf("%d triangles: %.5f of the exact separation", len(below.S.Corners), above/(2*critical))
	require.InEpsilon(t, 2*critical, above, tol)
}

// Cones between rings of 5 m and 1 m have their height limit at H(5, c) + H(1, c),
// greatest over the waist c (sin α = (c/r)^m, axisymmetric membrane equilibrium).
func TestHeightLimitsOfCones(t *testing.T) {
	k := sweep.N(1, 2, 2)
	for _, m := range []float64{1, 0.5, 2} {
		exact := coneLimit(5, 1, m)
		make := func(h float64) *canopy.Structure {
			return cases.Cone(5, 1, h, [2]float64{1000, 1000 * m}, 48*k, 16*k).S
		}
		found := limitOf(t, make(1.3*exact), byHeight)
		t.Logf("weft:warp %.2f: %.4f of the exact height", m, found/exact)
		assert.InEpsilon(t, exact, found, 0.01, "weft:warp %g", m)
	}
}

// A raised sail has no closed form: the least edge force is found by bisection on
// two meshes, and the refusal's number must agree with it.
func TestLeastEdgeForceOfARaisedSail(t *testing.T) {
	const side, rise, stress = 8.0, 3.0, 2000.0
	least := func(n int) float64 {
		lo, hi := 0.5*stress*side, 1.2*stress*side
		for hi-lo > 0.004*hi {
			mid := (lo + hi) / 2
			r, err := formfind.Solve(t.Context(), cases.FourPoint(side, rise, stress, mid, 0.15, n).S, formfind.Options{})
			if err == nil && r.Audit.Trusted {
				hi = mid
			} else {
				lo = mid
			}
		}
		return hi
	}
	a, b := least(16), least(sweep.N(20, 32, 48))
	said := limitOf(t, cases.FourPoint(side, rise, stress, 0.8*b, 0.15, 16).S, "edge cable force")
	t.Logf("least force by bisection %.4f and %.4f σL on two meshes; the refusal says %.4f σL", a/(stress*side), b/(stress*side), said/(stress*side))
	require.InEpsilon(t, b, a, 0.03)
	require.InEpsilon(t, b, said, 0.03)
}

// A bubble on a ring of radius a exists up to p = 2σ/a, the hemisphere.
func TestBubbleUpToTheHemisphere(t *testing.T) {
	n := sweep.N(16, 24, 48)
	at := func(p float64) *canopy.Structure { return disc(5, 3, p, 5, n) }
	trusted(t, solve(t, at(1.96), formfind.Options{}))
	found := limitOf(t, at(2.2), "internal pressure")
	t.Logf("%.4f of the pressure of the hemisphere", found/2)
	require.InEpsilon(t, 2, found, 0.01)
}
