package cases_test

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"anticlast/formfind/canopy"
	"anticlast/formfind/internal/cases"
)

// Values of the catenoid between rings of radius 1: recomputed from
// a·cosh(h/a) = 1 to 15 digits (Nitsche 1989 for the formulas).
func TestCatenoidNumbers(t *testing.T) {
	for _, v := range []struct{ h, stable, unstable, area float64 }{
		{0.1, 0.994970493751908, 0.0222242150072597, 1.254535275185},
		{0.5, 0.848337938094979, 0.235094990234533, 5.99179697580228},
		{0.65, 0.641607601777805, 0.461688844828455, 7.4397813773939},
	} {
		assert.InDelta(t, v.stable, cases.Waist(v.h, true), 1e-12)
		assert.InDelta(t, v.unstable, cases.Waist(v.h, false), 1e-12)
		assert.InDelta(t, v.area, cases.Catenoid(v.h, 8, 4, true, 1).Area, 1e-11)
	}
	assert.True(t, math.IsNaN(cases.Waist(0.67, true)))
	assert.Nil(t, cases.Catenoid(0.67, 8, 4, true, 1).Exact)
}

// Heights of constant-ratio cones, base radius 5, top radius 0.5: recomputed by
// adaptive and by high-precision quadrature; m = 1 is 0.5·acosh 10, m = ½ is 3.
func TestConeNumbers(t *testing.T) {
	for _, v := range []struct{ m, limit float64 }{
		{0.2, 5.856495485}, {1.0 / 3, 4.134863565}, {0.5, 3}, {1, 0.5 * math.Acosh(10)},
		{1.25, 1.139772882}, {2, 0.605513889}, {3, 0.348045526},
	} {
		assert.InDelta(t, v.limit, cases.ConeHeight(5, 0.5, 0.5, v.m), 2e-9, "m=%g", v.m)
	}
	assert.InDelta(t, 0.3969597160, cases.ConeConstant(5, 0.5, 1, 1), 1e-9)
	assert.InDelta(t, 0.3278140100, cases.ConeConstant(5, 0.5, 2, 0.5), 1e-9)
	assert.InDelta(t, 0.994398385, cases.ConeHeight(5, 2, 0.3278140100, 0.5), 1e-8)
	assert.True(t, math.IsNaN(cases.ConeConstant(5, 0.5, 1.5, 1)))
}

func TestCasesAreSound(t *testing.T) {
	for _, c := range []cases.Case{
		cases.Catenoid(0.5, 32, 16, true, 1),
		cases.Catenoid(0.5, 32, 16, false, 1),
		cases.Catenoid(0.7, 32, 16, true, 1),
		cases.Scherk(1, 24, 1),
		cases.SchwarzD(16, 1),
		cases.SphereCap(5, 1.6, 5, 24, 12),
		cases.FourPoint(10, 3, 2500, 30e3, 0.1, 12),
		cases.EdgeCableStrip(10, 4, 3, 39, 20, 8),
		cases.Cone(5, 0.5, 1, [2]float64{1, 2}, 24, 12),
		cases.RingOnMast(5, 0.5, 1, 1, 2, 24, 12),
		cases.ThreeFilms([3]float64{0, 2, 4.5}, 1, 1, 6),
		cases.QuadNet(8, 2, 1, 6),
		cases.SquareNetwork(1, 1),
		cases.FermatPoint(canopy.LawForce, 1),
		cases.HangingChain(100, 20, 105, 1e6, 10, 10),
		cases.Wire(5, 1e6, 1e4, 1e3),
	} {
		t.Run(c.Name, func(t *testing.T) {
			require.NoError(t, c.S.Validate())
			if len(c.S.Corners) > 0 {
				assert.Greater(t, cases.MinAngle(c.S, c.S.Position), 0.05)
			}
			if c.Exact == nil {
				return
			}
			for i := range c.S.Position {
				if c.S.FixedAt(i) == canopy.DirAll {
					assert.Equal(t, c.S.Position[i], c.Exact[i])
				}
				if c.Distance != nil {
					assert.InDelta(t, 0, c.Distance(c.Exact[i]), 1e-12)
				}
			}
			if c.Area > 0 {
				assert.InEpsilon(t, c.Area, cases.Area(c.S, c.Exact), 0.02)
			}
		})
	}
}
