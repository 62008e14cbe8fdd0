package relax_test

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"anticlast/formfind/engine"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/relax"
)

// Spherical caps over a circle of radius a: V = πh(3a² + h²)/6, p = 2σ/R
// (Laplace-Young; elementary geometry). At a given pressure those past the
// hemisphere would run away.
func TestCapsOfGivenVolumeAreFoundFromAFlatFilm(t *testing.T) {
	const a, stress = 5, 5000
	hemisphere := 2 * math.Pi / 3 * a * a * a
	for _, viscous := range []bool{false, true} {
		for _, volume := range []float64{0, 1e-3, 60, -60, 1.15 * hemisphere, 3 * hemisphere} {
			c := cases.VolumeCap(a, volume, stress, 12)
			f, out, err := (&relax.Engine{Viscous: viscous}).Find(t.Context(), c.S, nil, engine.Settings{})
			require.NoError(t, err)
			require.Equal(t, engine.Converged, out.Status, "volume %g: %s", volume, out.Why)
			h := cases.CapRise(a, volume)
			assert.InDelta(t, 4*stress*h/(a*a+h*h), f.Pressure[0], 1e-2*stress/a, "volume %g", volume)
			assert.InDelta(t, volume, cases.Enclosed(c.S, 0, f.Position), 1.1e-9*math.Max(math.Abs(volume), 1e-5*math.Pow(math.Pi*a*a, 1.5)))
		}
	}
}

func TestAirOfGivenVolumeGetsTheSamePressureOnBothFilmsOfACushion(t *testing.T) {
	c, pressure, rise := cases.Lens(5, 60, 5000, 3000, 12)
	f, out, err := relax.New().Find(t.Context(), c.S, nil, engine.Settings{})
	require.NoError(t, err)
	require.Equal(t, engine.Converged, out.Status, out.Why)
	assert.InEpsilon(t, pressure, f.Pressure[0], 0.01)
	assert.InEpsilon(t, rise[0], f.Position[0].Z, 0.01)
	lower := c.S.Corners[len(c.S.Corners)/2][0]
	assert.InEpsilon(t, -rise[1], f.Position[lower].Z, 0.01)
}
