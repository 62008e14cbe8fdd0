package audit_test

import (
	"math"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// Fabric of E_w = 600, E_f = 400, G = 20 kN/m and ν_wf = 0.3: the strain
// (0.01, 0.004, γ 0.006) gives (6.89361702, 2.97872340, 0.12) kN/m (plane
// stress by hand, C = [638.297872, 127.659574; 127.659574, 425.531915]).
var weave = canopy.Fabric{Name: "weave", Elastic: true, WarpModulus: 600e3, WeftModulus: 400e3, ShearModulus: 20e3, PoissonWarpWeft: 0.3}

// stretched is a flat patch with fixed edges, two free nodes and warp along
// the angle g from x, deformed everywhere by the symmetric stretch whose
// strain of Green in warp axes is e = (E_w, E_f, 2E_wf), and carrying the
// second Piola-Kirchhoff stress s there.
func stretched(g float64, e, s [3]float64, fab canopy.Fabric, s0 [2]float64) (*canopy.Structure, *canopy.Form) {
	st := structure()
	st.Fabrics = []canopy.Fabric{fab}
	for _, p := range [][3]float64{{0, 0, 1}, {4, 0, 1}, {4, 3, 1}, {0, 3, 1}, {1.3, 0.7, 0}, {2.9, 1.9, 0}} {
		fixed := canopy.Freedom(0)
		if p[2] == 1 {
			fixed = canopy.DirAll
		}
		node(st, p[0], p[1], 0, fixed)
	}
	w := r3.Vec{X: math.Cos(g), Y: math.Sin(g)}
	f := r3.Vec{X: -w.Y, Y: w.X}
	for _, c := range [][3]int32{{0, 1, 4}, {1, 5, 4}, {1, 2, 5}, {2, 3, 5}, {3, 4, 5}, {3, 0, 4}} {
		triangle(st, c[0], c[1], c[2], w, s0[0], s0[1])
	}
	st.Reference = append([]r3.Vec(nil), st.Position...)
	// U = √(I + 2E) of a symmetric 2×2 matrix: (A + √det·I)/√(tr + 2√det).
	a, b, c := 1+2*e[0], e[2], 1+2*e[1]
	d := math.Sqrt(a*c - b*b)
	k := math.Sqrt(a + c + 2*d)
	a, b, c = (a+d)/k, b/k, (c+d)/k
	for i, p := range st.Reference {
		pw, pf := r3.Dot(p, w), r3.Dot(p, f)
		st.Position[i] = r3.Add(r3.Scale(a*pw+b*pf, w), r3.Scale(b*pw+c*pf, f))
	}
	// σ = U·S·U/det, then into the axes of the image of the warp.
	p, q, r, t := a*s[0]+b*s[2], a*s[2]+b*s[1], b*s[0]+c*s[2], b*s[2]+c*s[1]
	x, y, z := (p*a+q*b)/d, (r*b+t*c)/d, (p*b+q*c)/d
	l := math.Hypot(a, b)
	u, v := a/l, b/l
	form := canopy.NewForm(st)
	for tr := range st.Corners {
		form.Warp[tr] = r3.Add(r3.Scale(u, w), r3.Scale(v, f))
		form.Stress[tr] = canopy.Stress{
			Warp:  x*u*u + 2*z*u*v + y*v*v,
			Weft:  x*v*v - 2*z*u*v + y*u*u,
			Shear: (y-x)*u*v + z*(u*u-v*v),
		}
	}
	react(st, form)
	return st, form
}

func TestElasticFabricFollowsItsLaw(t *testing.T) {
	e := [3]float64{0.01, 0.004, 0.006}
	n := [3]float64{6893.61702128, 2978.72340426, 120}
	for _, g := range []float64{0, math.Pi / 6, 2} {
		s, f := stretched(g, e, n, weave, [2]float64{})
		trusted(t, run(t, s, f))
		// With prestress on top.
		s, f = stretched(g, e, [3]float64{n[0] + 1000, n[1] + 500, n[2]}, weave, [2]float64{1000, 500})
		trusted(t, run(t, s, f))
	}
	// Poisson's ratio the other way round, the commonest mistake.
	s, f := stretched(0.5, e, n, weave, [2]float64{})
	s.Fabrics[0].PoissonWarpWeft = 0.2
	untrusted(t, run(t, s, f), "not what its elastic law gives")
	// Warp and weft moduli swapped.
	s, f = stretched(0.5, e, n, weave, [2]float64{})
	s.Fabrics[0].WarpModulus, s.Fabrics[0].WeftModulus = 400e3, 600e3
	untrusted(t, run(t, s, f), "not what its elastic law gives")
	// No reference: then the fabric is unstressed where it starts.
	s, f = stretched(0.5, e, n, weave, [2]float64{})
	s.Reference = nil
	untrusted(t, run(t, s, f), "not what its elastic law gives")
	// Moduli that give no energy.
	s, f = stretched(0.5, e, n, weave, [2]float64{})
	s.Fabrics[0].PoissonWarpWeft = 1.5
	untrusted(t, run(t, s, f), "cannot be evaluated")
}

// Wrinkled fabric carries tension in one direction only; it lengthens across
// its tension without stress, by less than Poisson would have it.
func TestWrinkledFabric(t *testing.T) {
	g := 0.4 // direction of tension from the warp
	c, n := math.Cos(g), math.Sin(g)
	const tension = 3000.
	s := [3]float64{tension * c * c, tension * n * n, tension * c * n}
	elastic := [3]float64{s[0]/600e3 - 0.3*s[1]/600e3, s[1]/400e3 - 0.3*s[0]/600e3, s[2] / 20e3}
	wrinkled := func(w float64) [3]float64 {
		return [3]float64{elastic[0] - w*n*n, elastic[1] - w*c*c, elastic[2] + 2*w*c*n}
	}
	st, f := stretched(0.3, wrinkled(0.02), s, weave, [2]float64{})
	a := run(t, st, f)
	require.Less(t, a.ForceMismatch, 1e-9)
	trusted(t, a)
	// The same stress where the fabric is stretched across instead: no wrinkle.
	st, f = stretched(0.3, wrinkled(-0.02), s, weave, [2]float64{})
	untrusted(t, run(t, st, f), "not what its elastic law gives")
	// Compression that wrinkles should have taken away.
	st, f = stretched(0.3, [3]float64{0.01, -0.01, 0}, [3]float64{600e3*0.01*1.047 - 0.3*400e3*0.01*1.047, -3000, 0}, weave, [2]float64{})
	require.False(t, run(t, st, f).Trusted)
	// Slack altogether.
	st, f = stretched(0.3, [3]float64{-0.01, -0.02, 0}, [3]float64{}, weave, [2]float64{})
	a = run(t, st, f)
	require.Less(t, a.ForceMismatch, 1e-9)
	untrusted(t, a, "nothing in the form carries any force")
}

// Fabric that claims to be slack although it is stretched one way.
func TestStretchedFabricIsNotSlack(t *testing.T) {
	st, f := stretched(0.3, [3]float64{0.01, -0.02, 0}, [3]float64{}, weave, [2]float64{})
	require.Greater(t, run(t, st, f).ForceMismatch, 1.)
}

// Compression that follows the law without wrinkles is still not allowed.
func TestFabricDoesNotPush(t *testing.T) {
	s := [3]float64{4000, -2000, 0}
	e := [3]float64{s[0]/600e3 - 0.3*s[1]/600e3, s[1]/400e3 - 0.3*s[0]/600e3, 0}
	st, f := stretched(0.3, e, s, weave, [2]float64{})
	require.Greater(t, run(t, st, f).ForceMismatch, 0.1)
}

// Elastic cables: tension when longer than unstressed, slack when shorter.
func TestElasticCableLaw(t *testing.T) {
	build := func(l0 float64, kind canopy.Kind, force float64) canopy.Audit {
		s := structure()
		node(s, 0, 0, 0, canopy.DirAll)
		node(s, 2, 0, 0, canopy.DirAll)
		node(s, 1, 1, 0, canopy.DirAll)
		member(s, 0, 1, kind, canopy.LawElastic, 0)
		member(s, 0, 2, canopy.KindCable, canopy.LawForce, 100)
		s.Stiffness, s.Unstressed = []float64{1e6, 0}, []float64{l0, 0}
		return run(t, s, report(s, force, 100))
	}
	trusted(t, build(1.99, canopy.KindCable, 1e6*0.01/1.99))
	untrusted(t, build(1.99, canopy.KindCable, 1e6*0.01/2), "where its law gives") // L₀ in the denominator, not L
	a := build(2.01, canopy.KindCable, 0)
	trusted(t, a)
	require.Equal(t, 1, a.SlackCables)
	untrusted(t, build(2.01, canopy.KindCable, -1e6*0.01/2.01), "push")
	trusted(t, build(2.01, canopy.KindStrut, -1e6*0.01/2.01))
}
