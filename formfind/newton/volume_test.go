package newton_test

import (
	"context"
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/newton"
)

// Spherical caps over a circle of radius a: V = πh(3a² + h²)/6, p = 2σ/R with
// R = (a² + h²)/2h (Laplace-Young for one membrane; elementary geometry), from
// none to three times the hemisphere's volume, all from a flat film.
func TestCapsOfGivenVolumeConverge(t *testing.T) {
	const a, stress = 5.0, 5000.0
	hemisphere := 2 * math.Pi / 3 * a * a * a
	for _, volume := range []float64{60, -60, hemisphere, 1.2 * hemisphere, 3 * hemisphere} {
		h := cases.CapRise(a, volume)
		pressure := 4 * stress * h / (a*a + h*h)
		var offP, offX []float64
		for _, rows := range []int{12, 24} {
			c := cases.VolumeCap(a, volume, stress, rows)
			f, out, err := newton.Engine{}.Find(t.Context(), c.S, nil, engine.Settings{})
			require.NoError(t, err)
			require.Equal(t, engine.Converged, out.Status, "volume %g: %s", volume, out.Why)
			assert.Zero(t, out.NegativePivots, "volume %g", volume)
			assert.InEpsilon(t, volume, cases.Enclosed(c.S, 0, f.Position), 1e-9)
			worst := 0.0
			for _, p := range f.Position {
				worst = math.Max(worst, math.Abs(c.Distance(p)))
			}
			offP, offX = append(offP, math.Abs(f.Pressure[0]-pressure)), append(offX, worst)
		}
		assert.Greater(t, math.Log2(offP[0]/offP[1]), 1.8, "pressure at volume %g: %v", volume, offP)
		assert.Greater(t, math.Log2(offX[0]/offX[1]), 1.8, "place at volume %g: %v", volume, offX)
	}
}

func TestNoVolumeIsAFlatFilmWithoutPressure(t *testing.T) {
	c := cases.VolumeCap(5, 0, 5000, 8)
	for i, p := range c.S.Position {
		if c.S.Fixed[i] == 0 {
			c.S.Position[i].Z = 0.2 * (25 - p.X*p.X - p.Y*p.Y) / 25
		}
	}
	f, out, err := newton.Engine{}.Find(t.Context(), c.S, nil, engine.Settings{})
	require.NoError(t, err)
	require.Equal(t, engine.Converged, out.Status, out.Why)
	assert.InDelta(t, 0, f.Pressure[0], 1e-6)
	for _, p := range f.Position {
		assert.InDelta(t, 0, p.Z, 1e-9)
	}
}

// The same bubble past the hemisphere, from its very nodes: stable while its
// volume is given, with one direction to run away in while its pressure is.
func TestABubblePastTheHemisphereIsStableByVolumeOnly(t *testing.T) {
	const a, stress = 5.0, 5000.0
	for _, part := range []float64{0.8, 1.2, 3} {
		c := cases.VolumeCap(a, part*2*math.Pi/3*a*a*a, stress, 12)
		f, out, err := newton.Engine{}.Find(t.Context(), c.S, nil, engine.Settings{})
		require.NoError(t, err)
		require.Equal(t, engine.Converged, out.Status, out.Why)
		require.Zero(t, out.NegativePivots)
		given := *c.S
		given.Enclosures = nil
		given.Fabrics = []canopy.Fabric{{Name: "film", Pressure: f.Pressure[0]}}
		start := canopy.NewForm(&given)
		copy(start.Position, f.Position)
		_, out, err = newton.Engine{}.Find(t.Context(), &given, start, engine.Settings{})
		require.NoError(t, err)
		require.Equal(t, engine.Converged, out.Status, out.Why)
		require.Zero(t, out.Iterations, "these nodes are in balance already")
		want := 0
		if part > 1 {
			want = 1
		}
		assert.Equal(t, want, out.NegativePivots, "%g hemispheres", part)
	}
}

func TestACushionOfTwoFilmsHasOnePressure(t *testing.T) {
	var off []float64
	for _, rows := range []int{12, 24} {
		c, pressure, rise := cases.Lens(5, 60, 5000, 3000, rows)
		f, out, err := newton.Engine{}.Find(t.Context(), c.S, nil, engine.Settings{})
		require.NoError(t, err)
		require.Equal(t, engine.Converged, out.Status, out.Why)
		assert.Zero(t, out.NegativePivots)
		off = append(off, math.Abs(f.Pressure[0]/pressure-1))
		assert.InEpsilon(t, rise[0], f.Position[0].Z, 0.01)
		lower := c.S.Corners[len(c.S.Corners)/2][0]
		assert.InEpsilon(t, -rise[1], f.Position[lower].Z, 0.01)
	}
	assert.Greater(t, math.Log2(off[0]/off[1]), 1.8, "%v", off)
}

// Two bubbles side by side, two pressures; and again after both volumes have
// been changed in place, as an explorer does.
func TestASolverFollowsVolumesThatChange(t *testing.T) {
	c, far := cases.VolumeCap(5, 60, 5000, 8), cases.VolumeCap(3, 90, 2000, 8)
	n := int32(len(c.S.Position))
	for i, p := range far.S.Position {
		c.S.Position = append(c.S.Position, r3.Add(p, r3.Vec{X: 20}))
		c.S.Fixed = append(c.S.Fixed, far.S.Fixed[i])
	}
	c.S.Fabrics = append(c.S.Fabrics, canopy.Fabric{Name: "far"})
	for i, t := range far.S.Corners {
		c.S.Corners = append(c.S.Corners, [3]int32{t[0] + n, t[1] + n, t[2] + n})
		c.S.FabricOf, c.S.Warp, c.S.Stress = append(c.S.FabricOf, 1), append(c.S.Warp, far.S.Warp[i]), append(c.S.Stress, far.S.Stress[i])
	}
	e, err := c.S.Enclose("far", []int32{1}, 1, 90)
	require.NoError(t, err)
	c.S.Enclosures = append(c.S.Enclosures, e)
	v, err := newton.New(t.Context(), c.S)
	require.NoError(t, err)
	var f *canopy.Form
	for _, volume := range [][2]float64{{60, 90}, {70, 100}, {50, 20}} {
		c.S.Enclosures[0].Volume, c.S.Enclosures[1].Volume = volume[0], volume[1]
		var out engine.Outcome
		f, out, err = v.Find(context.Background(), f, engine.Settings{})
		require.NoError(t, err)
		require.Equal(t, engine.Converged, out.Status, out.Why)
		assert.Zero(t, out.NegativePivots)
		for i, k := range []struct{ a, stress float64 }{{5, 5000}, {3, 2000}} {
			h := cases.CapRise(k.a, volume[i])
			assert.InEpsilon(t, 4*k.stress*h/(k.a*k.a+h*h), f.Pressure[i], 0.02)
			assert.InEpsilon(t, volume[i], cases.Enclosed(c.S, i, f.Position), 1e-9)
		}
	}
}

func TestAVolumeThatNothingCanChangeIsTold(t *testing.T) {
	c := cases.VolumeCap(5, 60, 5000, 8)
	for i := range c.S.Fixed {
		c.S.Fixed[i] = canopy.DirAll
	}
	_, out, err := newton.Engine{}.Find(t.Context(), c.S, nil, engine.Settings{})
	require.NoError(t, err)
	require.Equal(t, engine.Stalled, out.Status)
	require.Contains(t, out.Why, "60 m³, but all of its nodes are fixed where they enclose 0 m³")
}
