package newton

import (
	"context"
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/internal/cases"
)

// everything is a structure with all that the tangent treats: film, pressure,
// members of every law, a rigid ring, partial supports, common forces.
func everything() *canopy.Structure {
	s := cases.RingOnMast(3, 0.8, 1.5, 1000, 2000, 9, 4).S
	s.Fabrics[0].Pressure = 150
	centre := s.Rings[0].Centre
	foot := int32(len(s.Position))
	s.Position = append(s.Position, r3.Vec{X: 0.2, Y: 0.1, Z: -2})
	s.Fixed = append(s.Fixed, canopy.DirAll)
	s.Master = append(s.Master, -1)
	s.Load = append(s.Load, r3.Vec{})
	add := func(i, j int32, kind canopy.Kind, law canopy.Law, given, ea, l0 float64, cable int32) {
		s.Ends = append(s.Ends, [2]int32{i, j})
		s.Kind = append(s.Kind, kind)
		s.Law = append(s.Law, law)
		s.Given = append(s.Given, given)
		s.Stiffness = append(s.Stiffness, ea)
		s.Unstressed = append(s.Unstressed, l0)
		s.CableOf = append(s.CableOf, cable)
	}
	add(foot, centre, canopy.KindMast, canopy.LawForce, -900, 0, 0, -1)
	add(9, 18, canopy.KindCable, canopy.LawForceDensity, 300, 0, 0, -1) // along a meridian
	add(18, 27, canopy.KindCable, canopy.LawElastic, 0, 5e4, 0.5, -1)
	add(12, 13, canopy.KindValleyCable, canopy.LawCable, 400, 0, 0, 0) // a loop's part
	add(13, 14, canopy.KindValleyCable, canopy.LawCable, 400, 0, 0, 0)
	add(14, 15, canopy.KindValleyCable, canopy.LawCable, 400, 0, 0, 0)
	add(15, 16, canopy.KindValleyCable, canopy.LawCable, 400, 0, 0, 0)
	add(11, foot, canopy.KindGuy, canopy.LawCable, 250, 0, 0, 1)
	s.Cables = []canopy.Cable{
		{Name: "V", Kind: canopy.KindValleyCable, Members: []int32{3, 4, 5, 6}, Nodes: []int32{12, 13, 14, 15, 16}, Law: canopy.CableSag, Value: 0.1},
		{Name: "G", Kind: canopy.KindGuy, Members: []int32{7}, Nodes: []int32{11, foot}, Law: canopy.CableElastic, Stiffness: 3e4, Unstressed: 2},
	}
	s.Fixed[20] = canopy.DirY // a node on the symmetry plane y = 0, roughly
	return s
}

// The assembled tangent, the columns of the common forces and the rows of
// their conditions are the derivatives of what evaluate computes, with the
// directions held: central differences. Pressure is compared in its symmetric
// part, which is all that the tangent has.
func TestAssembledTangentIsDerivative(t *testing.T) {
	s := everything()
	v, err := New(context.Background(), s)
	require.NoError(t, err)
	require.NoError(t, v.measure(s.Position))
	copy(v.now.at, s.Position)
	v.startForces(nil)
	v.evaluate(&v.now)
	v.assemble(&v.now)
	v.columnsOf(&v.now)
	n, m := v.unknown, len(v.commons)
	require.Equal(t, 2, m)

	dense := make([]float64, n*n)
	for i := range n {
		dense[i*n+i] = v.values[i]
	}
	for k, p := range v.pattern.pairs {
		dense[int(p[0])*n+int(p[1])] += v.values[n+k]
		dense[int(p[1])*n+int(p[0])] += v.values[n+k]
	}
	held := append([]r3.Vec(nil), v.now.basis...)
	at := func(u []float64, force []float64) (reduced, gap []float64) {
		v.along = nil
		v.moveTrial(1, u)
		copy(v.trial.force, force)
		v.evaluate(&v.trial)
		reduced, gap = make([]float64, n), make([]float64, m)
		for k := range gap {
			gap[k] = v.trial.cond[k].gap
		}
		for i := range s.Position {
			if v.first[i] < 0 {
				continue
			}
			for a, b := range held[v.start[i]:v.start[i+1]] {
				reduced[int(v.first[i])+a] += r3.Dot(b, v.trial.pull[i])
			}
		}
		return reduced, gap
	}
	const h = 1e-6
	u := make([]float64, n)
	num := make([]float64, n*n)
	for j := range n {
		u[j] = h
		rp, gp := at(u, v.now.force)
		u[j] = -h
		rm, gm := at(u, v.now.force)
		u[j] = 0
		for i := range n {
			num[i*n+j] = -(rp[i] - rm[i]) / (2 * h)
		}
		for k := range m {
			d := 0.0
			v.conditionRow(&v.now, k, func(i int, x float64) {
				if i == j {
					d += x
				}
			})
			assert.InDelta(t, (gp[k]-gm[k])/(2*h), d, 1e-6, "condition %d by unknown %d", k, j)
		}
	}
	scale := v.meanDiagonal()
	for i := range n {
		for j := range n {
			assert.InDelta(t, 0.5*(num[i*n+j]+num[j*n+i]), dense[i*n+j], 1e-6*scale, "unknowns %d, %d", i, j)
		}
	}
	for k := range m {
		f := append([]float64(nil), v.now.force...)
		f[k] += 1
		rp, gp := at(u, f)
		f[k] -= 2
		rm, gm := at(u, f)
		for i := range n {
			assert.InDelta(t, 0.5*(rp[i]-rm[i]), v.columns[i*m+k], 1e-9)
		}
		assert.InDelta(t, 0.5*(gp[k]-gm[k]), v.conditionSlope(&v.now, k), 1e-12)
	}
	// Directions are unit vectors, normal to each other, and leave out what
	// is fixed.
	for i := range s.Position {
		b := held[v.start[i]:v.start[i+1]]
		if v.cls[i] == tied {
			continue
		}
		for p := range b {
			assert.InDelta(t, 1, r3.Norm(b[p]), 1e-12)
			assert.Equal(t, b[p], mask(s.FixedAt(i), b[p]))
			for q := range p {
				assert.InDelta(t, 0, r3.Dot(b[p], b[q]), 1e-12)
			}
		}
	}
}

// Without pressure the pulls are minus the gradient of the energy.
func TestPullsAreGradientOfEnergy(t *testing.T) {
	s := everything()
	s.Fabrics[0].Pressure = 0
	v, err := New(context.Background(), s)
	require.NoError(t, err)
	copy(v.now.at, s.Position)
	v.startForces(nil)
	v.evaluate(&v.now)
	require.True(t, v.potential())
	const h = 1e-5
	u := make([]float64, v.unknown)
	copy(v.trial.force, v.now.force)
	for j := range u {
		u[j] = h
		v.moveTrial(1, u)
		v.evaluate(&v.trial)
		up := v.trial.energy
		u[j] = -h
		v.moveTrial(1, u)
		v.evaluate(&v.trial)
		down := v.trial.energy
		u[j] = 0
		assert.InDelta(t, -(up-down)/(2*h), v.now.reduced[j], 1e-4)
	}
}

func TestNegativeEigenvalues(t *testing.T) {
	// Signs by construction: Q·diag(−3,−1e-3,2,5)·Qᵀ with Q a product of turns.
	d := []float64{-3, -1e-3, 2, 5}
	q := []float64{1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1}
	for k, p := range [][2]int{{0, 1}, {1, 2}, {2, 3}, {0, 3}, {1, 3}} {
		c, s := math.Cos(float64(k)+0.4), math.Sin(float64(k)+0.4)
		for r := range 4 {
			x, y := q[r*4+p[0]], q[r*4+p[1]]
			q[r*4+p[0]], q[r*4+p[1]] = c*x-s*y, s*x+c*y
		}
	}
	a := make([]float64, 16)
	for i := range 4 {
		for j := range 4 {
			for k := range 4 {
				a[i*4+j] += q[i*4+k] * d[k] * q[j*4+k]
			}
		}
	}
	assert.Equal(t, 2, negativeEigenvalues(a, 4))
	x := []float64{3, 1, 2}
	solveDense([]float64{0, 2, 0, 1, 0, 0, 0, 0, 4}, x, 3)
	assert.Equal(t, []float64{1, 1.5, 0.5}, x)
}
