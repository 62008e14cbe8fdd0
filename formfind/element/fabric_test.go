package element_test

import (
	"errors"
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/spatial/r3"
	"pgregory.net/rapid"

	"anticlast/formfind/element"
)

// The woven fabric of the checks below: E_w = 600, E_f = 400, G = 20 kN/m,
// ν_wf = 0.3, so ν_fw = 0.2. All values recomputed from the compliance form of
// the orthotropic law (Lekhnitskii, Anisotropic Plates) with 20 digits.
var woven = element.Orthotropic{Warp: 600, Weft: 400, Shear: 20, PoissonWarpWeft: 0.3}

func times(c [3][3]float64, e [3]float64) (n [3]float64) {
	for i := range 3 {
		for j := range 3 {
			n[i] += c[i][j] * e[j]
		}
	}
	return n
}

func matrixInDelta(t *testing.T, want, got [3][3]float64, tol float64) {
	t.Helper()
	for i := range 3 {
		for j := range 3 {
			assert.InDelta(t, want[i][j], got[i][j], tol, "entry %d,%d", i, j)
		}
	}
}

func vectorInDelta(t *testing.T, want, got [3]float64, tol float64) {
	t.Helper()
	for i := range 3 {
		assert.InDelta(t, want[i], got[i], tol, "component %d", i)
	}
}

func TestOrthotropicStiffnessInFabricAxes(t *testing.T) {
	require.NoError(t, woven.Check())
	c := woven.Stiffness()
	matrixInDelta(t, [3][3]float64{
		{638.29787234, 127.65957447, 0}, {127.65957447, 425.53191489, 0}, {0, 0, 20},
	}, c, 1e-8)
	e := [3]float64{0.01, 0.004, 0.006}
	n := times(c, e)
	vectorInDelta(t, [3]float64{6.89361702, 2.97872340, 0.12}, n, 1e-8)
	assert.InDelta(t, 0.04078553191, (n[0]*e[0]+n[1]*e[1]+n[2]*e[2])/2, 1e-11)
	// ν_wf and ν_fw exchanged would give (0.0045, 0.00050, 0) or so here.
	vectorInDelta(t, [3]float64{0.0045, 0.001, 0}, times(woven.Compliance(), [3]float64{3, 1, 0}), 1e-15)
}

func TestOrthotropicStiffnessTurned(t *testing.T) {
	e := [3]float64{0.01, 0.004, 0.006}
	c30 := element.TurnStiffness(woven.Stiffness(), math.Pi/6)
	matrixInDelta(t, [3][3]float64{
		{448.5106383, 264.25531915, 124.92877101},
		{264.25531915, 342.12765957, -32.79840891},
		{124.92877101, -32.79840891, 156.59574468},
	}, c30, 1e-7)
	vectorInDelta(t, [3]float64{6.29170029, 3.81427338, 2.05766854}, times(c30, e), 1e-8)
	vectorInDelta(t, [3]float64{5.05617021, 4.81617021, 1.95744681},
		times(element.TurnStiffness(woven.Stiffness(), math.Pi/4), e), 1e-8)
}

// The modulus of a strip cut at an angle to the warp, 1/S₁₁, is far below
// those of warp and weft: the fabric shears.
func TestStripModulusOffAxis(t *testing.T) {
	for _, c := range []struct{ degrees, modulus float64 }{
		{0, 600}, {15, 221.01534346}, {30, 97.26443769}, {45, 75.23510972}, {90, 400},
	} {
		k := element.TurnStiffness(woven.Stiffness(), c.degrees*math.Pi/180)
		var s mat.Dense
		require.NoError(t, s.Inverse(mat.NewDense(3, 3, []float64{
			k[0][0], k[0][1], k[0][2], k[1][0], k[1][1], k[1][2], k[2][0], k[2][1], k[2][2],
		})))
		assert.InDelta(t, c.modulus, 1/s.At(0, 0), 1e-7, "%g°", c.degrees)
	}
}

func TestOrthotropicCheckRefusesWhatHasNoEnergy(t *testing.T) {
	for _, o := range []element.Orthotropic{
		{Warp: 0, Weft: 1, Shear: 1},
		{Warp: 1, Weft: -1, Shear: 1},
		{Warp: 1, Weft: 1, Shear: 0},
		{Warp: 1, Weft: 1, Shear: math.NaN()},
		{Warp: math.Inf(1), Weft: 1, Shear: 1},
		{Warp: 400, Weft: 900, Shear: 20, PoissonWarpWeft: 0.6667}, // √(400/900) = 0.66667
		{Warp: 1, Weft: 1, Shear: 1, PoissonWarpWeft: math.NaN()},
	} {
		assert.Error(t, o.Check(), "%+v", o)
	}
	assert.NoError(t, element.Orthotropic{Warp: 400, Weft: 900, Shear: 20, PoissonWarpWeft: 0.666}.Check())
}

// Isotropic sheet Eh = 600 kN/m, ν = 0.3 with prestress (2, 2) kN/m in simple
// shear γ; recomputed. Compression would begin at γ* = N₀/G = 0.00866667.
func TestWrinklingInSimpleShear(t *testing.T) {
	const g = 600 / (2 * 1.3)
	law, err := element.NewFabricLaw(element.Orthotropic{Warp: 600, Weft: 600, Shear: g, PoissonWarpWeft: 0.3}, true)
	require.NoError(t, err)
	for _, c := range []struct {
		gamma float64
		want  [3]float64
		state element.FabricState
	}{
		{0.004, [3]float64{2, 2, 0.92307692}, element.Taut}, // principal 2.92307692, 1.07692308
		{2/g - 1e-9, [3]float64{2, 2, 2}, element.Taut},
		{2/g + 1e-9, [3]float64{2, 2, 2}, element.Wrinkled},
		{0.012, [3]float64{2.5, 2.5, 2.5}, element.Wrinkled}, // N₁ = 5.0 at 45°
		{0.02, [3]float64{3.7, 3.7, 3.7}, element.Wrinkled},  // N₁ = 7.4
	} {
		s, state := law.Stress([3]float64{2, 2, 0}, [3]float64{0, 0, c.gamma})
		assert.Equal(t, c.state, state, "γ = %g", c.gamma)
		vectorInDelta(t, c.want, s, 1e-6)
	}
	// Shortened in all directions by more than the prestress stretched it: slack.
	s, state := law.Stress([3]float64{2, 2, 0}, [3]float64{-0.01, -0.004, 0.001})
	assert.Equal(t, element.Slack, state)
	assert.Equal(t, [3]float64{}, s)
	// Shortened in one direction only: uniaxial, and no Poisson's ratio is left.
	s, state = law.Stress([3]float64{}, [3]float64{0.01, -0.02, 0})
	assert.Equal(t, element.Wrinkled, state)
	vectorInDelta(t, [3]float64{6, 0, 0}, s, 1e-12)
	// Tension in both would need less contraction: ε₂ = −ν·ε₁ is the border.
	_, state = law.Stress([3]float64{}, [3]float64{0.01, -0.00299, 0})
	assert.Equal(t, element.Taut, state)
}

func drawLaw(t *rapid.T) element.FabricLaw {
	w := rapid.Float64Range(50, 3000).Draw(t, "warp")
	f := rapid.Float64Range(50, 3000).Draw(t, "weft")
	law, err := element.NewFabricLaw(element.Orthotropic{
		Warp: w, Weft: f,
		Shear:           rapid.Float64Range(1, 1000).Draw(t, "shear"),
		PoissonWarpWeft: rapid.Float64Range(-0.9, 0.9).Draw(t, "nu") * math.Sqrt(w/f),
	}, true)
	if err != nil {
		t.Fatal(err)
	}
	return law
}

func drawThree(t *rapid.T, name string, size float64) (v [3]float64) {
	for i := range v {
		v[i] = rapid.Float64Range(-size, size).Draw(t, name)
	}
	return v
}

// leastPrincipal is the smaller eigenvalue of a tensor given as (11, 22, 12).
func leastPrincipal(s [3]float64) float64 {
	return (s[0]+s[1])/2 - math.Hypot((s[0]-s[1])/2, s[2])
}

// The relaxed energy is a convex least; its stress is right exactly when stress
// and wrinkle strain E_w = C⁻¹S − E are both ⪰ 0 and do no work on each other
// (conditions of Karush, Kuhn and Tucker).
func TestWrinkledStressIsTheMinimiser(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		law := drawLaw(t)
		e := drawThree(t, "e", 0.05)
		s, _ := law.Stress([3]float64{}, e)
		scale := 0.05 * law.Bound()
		if leastPrincipal(s) < -1e-12*scale {
			t.Fatalf("compression %g in %v", leastPrincipal(s), s)
		}
		w := times(law.Inverse, s)
		for i := range w {
			w[i] -= e[i]
		}
		w[2] /= 2 // tensor component
		if leastPrincipal(w) < -1e-8 {
			t.Fatalf("wrinkle strain %v not a shortening: %g", w, leastPrincipal(w))
		}
		if work := s[0]*w[0] + s[1]*w[1] + 2*s[2]*w[2]; math.Abs(work) > 1e-8*scale {
			t.Fatalf("stress works on wrinkles: %g", work)
		}
	})
}

func TestFabricStressAndTangentAreDerivatives(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		law := drawLaw(t)
		law.TensionOnly = rapid.Bool().Draw(t, "tension only")
		s0 := drawThree(t, "s0", 5)
		s0[0], s0[1], s0[2] = math.Abs(s0[0]), math.Abs(s0[1]), 0
		e := drawThree(t, "e", 0.05)
		s, d, state := law.Tangent(s0, e)
		strain := 0.0
		for i := range 3 {
			strain = max(strain, math.Abs(e[i])+s0[i]/law.Bound())
		}
		if strain < 1e-9 {
			return
		}
		h := 1e-5 * strain
		for i := range 3 {
			up, down := e, e
			up[i] += h
			down[i] -= h
			su, stateUp := law.Stress(s0, up)
			sd, stateDown := law.Stress(s0, down)
			if stateUp != state || stateDown != state {
				return // across the border of two states the tangent jumps
			}
			scale := law.Bound() * strain
			if got := (law.Energy(s0, up) - law.Energy(s0, down)) / (2 * h); math.Abs(got-s[i]) > 1e-5*scale {
				t.Fatalf("%v: stress %d is %g, derivative of the energy %g", state, i, s[i], got)
			}
			for j := range 3 {
				soft := 0.0
				if state != element.Taut {
					soft = element.SoftTangent * law.C[i][j]
				}
				// The curvature of the direction of tension grows where it is
				// about to jump; leave those to the other properties.
				got := (su[j] - sd[j]) / (2 * h)
				mid := (su[j] + sd[j]) / 2
				if math.Abs(mid-s[j]) > 1e-7*scale {
					continue
				}
				if math.Abs(got-(d[i][j]-soft)) > 1e-3*law.Bound() {
					t.Fatalf("%v: tangent %d,%d is %g, difference %g", state, i, j, d[i][j], got)
				}
			}
		}
	})
}

func drawVecWithin(t *rapid.T, name string, size float64) r3.Vec {
	v := drawThree(t, name, size)
	return r3.Vec{X: v[0], Y: v[1], Z: v[2]}
}

func drawFabric(t *rapid.T) (element.FabricTriangle, [3]r3.Vec) {
	for {
		x := [3]r3.Vec{drawVecWithin(t, "a", 3), drawVecWithin(t, "b", 3), drawVecWithin(t, "c", 3)}
		g, ok := element.NewTriangle(x[0], x[1], x[2])
		if !ok || g.Area < 0.1 {
			x = [3]r3.Vec{{}, {X: 2}, {Y: 1, Z: 0.5}}
		}
		f, err := element.NewFabricTriangle(x, r3.Vec{X: 1, Y: 0.2, Z: -0.3})
		if err == nil {
			return f, x
		}
	}
}

func rotate(x [3]r3.Vec, r r3.Rotation) [3]r3.Vec {
	for i := range x {
		x[i] = r.Rotate(x[i])
	}
	return x
}

// Patch test: a rigid rotation by any angle strains nothing.
func TestFabricTriangleRigidMotionIsStrainFree(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		f, x := drawFabric(t)
		r := r3.NewRotation(rapid.Float64Range(-math.Pi, math.Pi).Draw(t, "angle"), r3.Vec{X: 1, Y: -2, Z: 0.7})
		y := rotate(x, r)
		shift := drawVecWithin(t, "shift", 100)
		for i := range y {
			y[i] = r3.Add(y[i], shift)
		}
		for _, e := range f.Strain(&y) {
			if math.Abs(e) > 1e-12 {
				t.Fatalf("strain %g", e)
			}
		}
	})
}

// Patch test: under one linear map every triangle of a plane has the strain of
// the map, in axes turned with the warp.
func TestFabricTriangleReproducesUniformStrain(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		angle := rapid.Float64Range(-3, 3).Draw(t, "warp")
		s, c := math.Sincos(angle)
		a := drawThree(t, "map", 0.2)
		// F = I + [[a0, a2], [0, a1]] in x, y.
		image := func(p r3.Vec) r3.Vec {
			return r3.Vec{X: p.X*(1+a[0]) + p.Y*a[2], Y: p.Y * (1 + a[1])}
		}
		e := [3]float64{
			((1+a[0])*(1+a[0]) - 1) / 2,
			(a[2]*a[2] + (1+a[1])*(1+a[1]) - 1) / 2,
			(1 + a[0]) * a[2],
		}
		want := [3]float64{
			c*c*e[0] + s*s*e[1] + s*c*e[2],
			s*s*e[0] + c*c*e[1] - s*c*e[2],
			2*s*c*(e[1]-e[0]) + (c*c-s*s)*e[2],
		}
		x := [3]r3.Vec{{X: 0.1, Y: 0.2}, {X: 2, Y: -0.5}, {X: rapid.Float64Range(-2, 2).Draw(t, "x"), Y: 1.5}}
		f, err := element.NewFabricTriangle(x, r3.Vec{X: c, Y: s})
		if err != nil {
			t.Fatal(err)
		}
		y := [3]r3.Vec{image(x[0]), image(x[1]), image(x[2])}
		got := f.Strain(&y)
		for i := range got {
			if math.Abs(got[i]-want[i]) > 1e-12 {
				t.Fatalf("strain %v, want %v", got, want)
			}
		}
	})
}

// Patch test: the pulls are minus the gradient of the energy, the tangent is
// minus the gradient of the pulls.
func TestFabricTriangleForcesAndTangentAreDerivatives(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		law := drawLaw(t)
		law.TensionOnly = rapid.Bool().Draw(t, "tension only")
		f, x := drawFabric(t)
		s0 := [3]float64{2, 3, 0}
		for i := range x {
			x[i] = r3.Add(x[i], drawVecWithin(t, "u", 0.05))
		}
		s, d, state := law.Tangent(s0, f.Strain(&x))
		if state != element.Taut {
			for i := range 3 {
				for j := range 3 {
					d[i][j] -= element.SoftTangent * law.C[i][j]
				}
			}
		}
		pull := f.Pull(&x, s)
		k := f.Tangent(&x, s, &d)
		const h = 1e-6
		scale := law.Bound() * 10
		for j := range 3 {
			for c := range 3 {
				move := func(by float64) ([3]r3.Vec, float64, element.FabricState) {
					y := x
					y[j] = r3.Add(y[j], unit(c, by))
					e := f.Strain(&y)
					s, state := law.Stress(s0, e)
					return f.Pull(&y, s), f.Area * law.Energy(s0, e), state
				}
				pu, eu, stu := move(h)
				pd, ed, std := move(-h)
				if stu != state || std != state {
					return
				}
				if got := -(eu - ed) / (2 * h); math.Abs(got-at(pull[j], c)) > 1e-5*scale {
					t.Fatalf("pull %d,%d is %g, energy says %g", j, c, at(pull[j], c), got)
				}
				if state == element.Wrinkled {
					continue // curvature of the direction: covered above
				}
				for i := range 3 {
					for r := range 3 {
						want := -(at(pu[i], r) - at(pd[i], r)) / (2 * h)
						if got := k[i][j][3*r+c]; math.Abs(got-want) > 1e-5*scale {
							t.Fatalf("tangent %d,%d (%d,%d) is %g, want %g", i, j, r, c, got, want)
						}
						if k[i][j][3*r+c] != k[j][i][3*c+r] && math.Abs(k[i][j][3*r+c]-k[j][i][3*c+r]) > 1e-10*scale {
							t.Fatal("tangent not symmetric")
						}
					}
				}
			}
		}
	})
}

// The true stress on the deformed triangle pulls exactly as the reference
// stress on the unstressed one, computed by the independent film element.
func TestFabricTriangleCauchyStressPullsTheSame(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		f, x := drawFabric(t)
		for i := range x {
			x[i] = r3.Add(x[i], drawVecWithin(t, "u", 0.3))
		}
		s := drawThree(t, "s", 5)
		g, ok := element.NewTriangle(x[0], x[1], x[2])
		if !ok || g.Area < 0.01 {
			return
		}
		warp, c := f.Cauchy(&x, s)
		want := f.Pull(&x, s)
		got := g.StressPull(warp, r3.Cross(g.Normal, warp), c[0], c[1], c[2])
		for i := range got {
			if r3.Norm(r3.Sub(got[i], want[i])) > 1e-9 {
				t.Fatalf("pull %v, want %v", got, want)
			}
		}
	})
}

// Patch test: material axes turned with the triangle, nothing changes.
func TestFabricTriangleTurnedWithItsWarp(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		r := r3.NewRotation(rapid.Float64Range(-3, 3).Draw(t, "angle"), r3.Vec{X: 0.3, Y: 1, Z: 2})
		x := [3]r3.Vec{{}, {X: 2, Z: 0.3}, {X: 0.4, Y: 1.2}}
		y := [3]r3.Vec{{}, {X: 2.1, Z: 0.3}, {X: 0.4, Y: 1.25, Z: 0.1}}
		warp := r3.Vec{X: 1, Y: 0.4}
		f, err := element.NewFabricTriangle(x, warp)
		if err != nil {
			t.Fatal(err)
		}
		fr, err := element.NewFabricTriangle(rotate(x, r), r.Rotate(warp))
		if err != nil {
			t.Fatal(err)
		}
		yr := rotate(y, r)
		e, er := f.Strain(&y), fr.Strain(&yr)
		for i := range e {
			if math.Abs(e[i]-er[i]) > 1e-13 {
				t.Fatalf("%v against %v", e, er)
			}
		}
	})
}

func TestFabricTriangleRefusesFlatAndNormalWarp(t *testing.T) {
	_, err := element.NewFabricTriangle([3]r3.Vec{{}, {X: 1}, {X: 2}}, r3.Vec{X: 1})
	assert.True(t, errors.Is(err, element.ErrFlatTriangle))
	_, err = element.NewFabricTriangle([3]r3.Vec{{}, {X: 1}, {Y: 2}}, r3.Vec{Z: 1})
	assert.True(t, errors.Is(err, element.ErrNormalToWarp))
}

func FuzzFabricLawGivesNumbers(f *testing.F) {
	f.Add(600.0, 400.0, 20.0, 0.3, 2.0, 2.0, 0.0, 0.01, -0.01, 0.02, true)
	f.Add(1.0, 1e6, 1e-3, 0.0005, 0.0, 0.0, 0.0, 1e-300, -1.0, 0.0, true)
	f.Add(1.0, 1.0, 1.0, 0.999999, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, true)
	f.Fuzz(func(t *testing.T, w, e, g, nu, a, b, c, p, q, r float64, tension bool) {
		for _, m := range []float64{w, e, g} {
			if !(m > 1e-6 && m < 1e12) {
				return
			}
		}
		for _, m := range []float64{a, b, c, p, q, r} {
			if !(math.Abs(m) < 1e9) {
				return
			}
		}
		law, err := element.NewFabricLaw(element.Orthotropic{Warp: w, Weft: e, Shear: g, PoissonWarpWeft: nu}, tension)
		if err != nil {
			return
		}
		s, d, _ := law.Tangent([3]float64{a, b, c}, [3]float64{p, q, r})
		for i := range 3 {
			if math.IsNaN(s[i]) {
				t.Fatalf("stress %v", s)
			}
			for j := range 3 {
				if math.IsNaN(d[i][j]) {
					t.Fatalf("tangent %v", d)
				}
			}
		}
		if v := law.Energy([3]float64{a, b, c}, [3]float64{p, q, r}); math.IsNaN(v) {
			t.Fatal("energy not a number")
		}
	})
}

func BenchmarkFabricLaw(b *testing.B) {
	law, err := element.NewFabricLaw(woven, true)
	if err != nil {
		b.Fatal(err)
	}
	for _, c := range []struct {
		name string
		e    [3]float64
	}{{"taut", [3]float64{0.01, 0.01, 0.001}}, {"wrinkled", [3]float64{0.01, -0.02, 0.003}}, {"slack", [3]float64{-0.01, -0.02, 0}}} {
		b.Run(c.name, func(b *testing.B) {
			sum := 0.0
			for b.Loop() {
				s, _ := law.Stress([3]float64{}, c.e)
				sum += s[0]
			}
			_ = sum
		})
	}
}
