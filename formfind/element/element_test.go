package element_test

import (
	"errors"
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
	"pgregory.net/rapid"

	"anticlast/formfind/element"
)

func drawVec(t *rapid.T, name string) r3.Vec {
	f := rapid.Float64Range(-2, 2)
	return r3.Vec{X: f.Draw(t, name+"x"), Y: f.Draw(t, name+"y"), Z: f.Draw(t, name+"z")}
}

func drawTriangle(t *rapid.T) [3]r3.Vec {
	x := [3]r3.Vec{drawVec(t, "a"), drawVec(t, "b"), drawVec(t, "c")}
	tri, ok := element.NewTriangle(x[0], x[1], x[2])
	if !ok || tri.Area < 0.05 {
		t.Skip("too thin for finite differences")
	}
	return x
}

func unit(d int, h float64) r3.Vec {
	return [3]r3.Vec{{X: h}, {Y: h}, {Z: h}}[d]
}

func at(v r3.Vec, d int) float64 { return [3]float64{v.X, v.Y, v.Z}[d] }

func area(x [3]r3.Vec) float64 {
	t, _ := element.NewTriangle(x[0], x[1], x[2])
	return t.Area
}

// The pull is minus the derivative of the energy σ·A, the tangent minus the
// derivative of the pull: central differences.
func TestFilmPullAndTangentAreDerivatives(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		x := drawTriangle(t)
		const s, h = 1.7, 1e-6
		tri, ok := element.NewTriangle(x[0], x[1], x[2])
		require.True(t, ok)
		pull := tri.FilmPull(s)
		// Rounding of the differences, eps·force/h, and their h² error on thin triangles.
		tol := 2e-8 + 1e-7/tri.Area/tri.Area
		for j := range 3 {
			for d := range 3 {
				p, m := x, x
				p[j], m[j] = r3.Add(x[j], unit(d, h)), r3.Sub(x[j], unit(d, h))
				assert.InDelta(t, -s*(area(p)-area(m))/(2*h), at(pull[j], d), tol)
				tp, _ := element.NewTriangle(p[0], p[1], p[2])
				tm, _ := element.NewTriangle(m[0], m[1], m[2])
				fp, fm := tp.FilmPull(s), tm.FilmPull(s)
				for i := range 3 {
					k := tri.FilmTangent(s, i, j)
					want := r3.Scale(-1/(2*h), r3.Sub(fp[i], fm[i]))
					for e := range 3 {
						assert.InDelta(t, at(want, e), k[3*e+d], tol, "block %d,%d", i, j)
					}
				}
			}
		}
	})
}

func TestPressureTangentIsDerivative(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		x := drawTriangle(t)
		const p0, h = 3.1, 1e-5
		tri, _ := element.NewTriangle(x[0], x[1], x[2])
		for j := range 3 {
			k := tri.PressureTangent(p0, j)
			for d := range 3 {
				p, m := x, x
				p[j], m[j] = r3.Add(x[j], unit(d, h)), r3.Sub(x[j], unit(d, h))
				tp, _ := element.NewTriangle(p[0], p[1], p[2])
				tm, _ := element.NewTriangle(m[0], m[1], m[2])
				want := r3.Scale(-1/(2*h), r3.Sub(tp.PressurePush(p0), tm.PressurePush(p0)))
				for e := range 3 {
					assert.InDelta(t, at(want, e), k[3*e+d], 1e-8)
				}
			}
		}
	})
}

func TestMemberTangentIsDerivative(t *testing.T) {
	laws := map[string]func(l float64) element.Tension{
		"density": func(l float64) element.Tension { return element.GivenDensity(2.3, l) },
		"force":   func(l float64) element.Tension { return element.GivenForce(-1.2, l) },
		"elastic": func(l float64) element.Tension { return element.Elastic(90, 0.4, l, true) },
	}
	for name, law := range laws {
		t.Run(name, func(t *testing.T) {
			rapid.Check(t, func(t *rapid.T) {
				a, b := drawVec(t, "a"), drawVec(t, "b")
				if r3.Norm(r3.Sub(a, b)) < 0.5 {
					t.Skip("too short for finite differences")
				}
				energy := func(b r3.Vec) float64 {
					_, l, _ := element.Line(a, b)
					return law(l).Energy
				}
				pull := func(b r3.Vec) r3.Vec { // on end b
					dir, l, _ := element.Line(a, b)
					return r3.Scale(-law(l).Force, dir)
				}
				dir, l, ok := element.Line(a, b)
				require.True(t, ok)
				k := element.MemberTangent(dir, l, law(l))
				const h = 1e-6
				for d := range 3 {
					bp, bm := r3.Add(b, unit(d, h)), r3.Sub(b, unit(d, h))
					assert.InDelta(t, -(energy(bp)-energy(bm))/(2*h), at(pull(b), d), 1e-5)
					want := r3.Scale(-1/(2*h), r3.Sub(pull(bp), pull(bm)))
					for e := range 3 {
						assert.InDelta(t, at(want, e), k[3*e+d], 1e-5)
					}
				}
			})
		})
	}
}

func TestSlackCableDoesNotPush(t *testing.T) {
	assert.Equal(t, element.Tension{Slack: true}, element.Elastic(100, 2, 1.9, false))
	assert.InDelta(t, -5, element.Elastic(100, 2, 1.9, true).Force, 1e-12)
	assert.InDelta(t, 5, element.Elastic(100, 2, 2.1, false).Force, 1e-12)
}

// A uniform Cauchy stress gives the film's pulls; any stress gives pulls
// without resultant and without moment.
func TestStressPull(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		x := drawTriangle(t)
		tri, _ := element.NewTriangle(x[0], x[1], x[2])
		warp, weft, err := tri.ProjectWarp(drawVec(t, "w"))
		if err != nil {
			t.Skip(err)
		}
		film, same := tri.FilmPull(2.5), tri.StressPull(warp, weft, 2.5, 2.5, 0)
		f := tri.StressPull(warp, weft, 1.1, 0.3, 0.2)
		var sum, moment r3.Vec
		for i := range 3 {
			assert.InDelta(t, 0, r3.Norm(r3.Sub(film[i], same[i])), 1e-13)
			sum = r3.Add(sum, f[i])
			moment = r3.Add(moment, r3.Cross(x[i], f[i]))
		}
		assert.InDelta(t, 0, r3.Norm(sum), 1e-13)
		assert.InDelta(t, 0, r3.Norm(moment), 1e-12)
		// Virial of one element: −Σ f·x = A·tr σ.
		v := 0.0
		for i := range 3 {
			v -= r3.Dot(f[i], x[i])
		}
		assert.InDelta(t, tri.Area*1.4, v, 1e-12)
	})
}

func TestWarpAcrossTheFabricIsRefused(t *testing.T) {
	tri, _ := element.NewTriangle(r3.Vec{}, r3.Vec{X: 1}, r3.Vec{Y: 1})
	for _, dir := range []r3.Vec{{Z: 3}, {}, {X: 1e-9, Z: 1}, {X: math.NaN()}} {
		_, _, err := tri.ProjectWarp(dir)
		assert.True(t, errors.Is(err, element.ErrNormalToWarp), "%v", dir)
	}
	warp, weft, err := tri.ProjectWarp(r3.Vec{X: 2, Z: 7})
	require.NoError(t, err)
	assert.Equal(t, r3.Vec{X: 1}, warp)
	assert.Equal(t, r3.Vec{Y: 1}, weft)
}

func TestDegenerateGeometryIsSaid(t *testing.T) {
	p := r3.Vec{X: 1, Y: 2, Z: 3}
	_, _, ok := element.Line(p, p)
	assert.False(t, ok)
	_, _, ok = element.Line(p, r3.Vec{X: math.NaN()})
	assert.False(t, ok)
	for _, x := range [][3]r3.Vec{
		{p, p, p},
		{{}, {X: 1}, {X: 2}},
		{{X: 1e6}, {X: 1e6 + 1, Y: 1}, {X: 1e6 + 2, Y: 2}},
		{{}, {X: 1}, {Y: math.Inf(1)}},
		{{}, {X: 1}, {Y: math.NaN()}},
	} {
		_, ok := element.NewTriangle(x[0], x[1], x[2])
		assert.False(t, ok, "%v", x)
	}
}

// On a closed surface a uniform film pulls by −σ ∂A/∂x and a pressure pushes by
// p ∂V/∂x, so that neither has a resultant or a moment, and the assembled
// pressure tangent is symmetric. Octahedron with displaced corners.
func TestClosedSurface(t *testing.T) {
	x := []r3.Vec{{X: 1.1}, {Y: 0.9, Z: 0.1}, {X: -1, Y: 0.2}, {Y: -1.2}, {Z: 1.3, X: 0.1}, {Z: -0.8}}
	faces := [][3]int{{0, 1, 4}, {1, 2, 4}, {2, 3, 4}, {3, 0, 4}, {1, 0, 5}, {2, 1, 5}, {3, 2, 5}, {0, 3, 5}}
	shift := r3.Vec{X: 3, Y: -2, Z: 5}
	for i := range x {
		x[i] = r3.Add(x[i], shift)
	}
	volume := func(x []r3.Vec) (v float64) {
		for _, f := range faces {
			v += element.Volume(shift, x[f[0]], x[f[1]], x[f[2]])
		}
		return v
	}
	const p = 2.0
	push := make([]r3.Vec, len(x))
	k := map[[2]int]*element.Block{}
	for _, f := range faces {
		tri, ok := element.NewTriangle(x[f[0]], x[f[1]], x[f[2]])
		require.True(t, ok)
		for i := range 3 {
			push[f[i]] = r3.Add(push[f[i]], tri.PressurePush(p))
			for j := range 3 {
				b := tri.PressureTangent(p, j)
				key := [2]int{f[i], f[j]}
				if k[key] == nil {
					k[key] = &element.Block{}
				}
				k[key].Add(&b)
			}
		}
	}
	var sum, moment r3.Vec
	for i := range x {
		sum = r3.Add(sum, push[i])
		moment = r3.Add(moment, r3.Cross(x[i], push[i]))
		for d := range 3 {
			const h = 1e-5
			up, down := append([]r3.Vec(nil), x...), append([]r3.Vec(nil), x...)
			up[i], down[i] = r3.Add(x[i], unit(d, h)), r3.Sub(x[i], unit(d, h))
			assert.InDelta(t, p*(volume(up)-volume(down))/(2*h), at(push[i], d), 1e-8)
		}
	}
	assert.InDelta(t, 0, r3.Norm(sum), 1e-13)
	assert.InDelta(t, 0, r3.Norm(moment), 1e-12)
	for key, b := range k {
		bt := k[[2]int{key[1], key[0]}].Transpose()
		for e := range b {
			assert.InDelta(t, bt[e], b[e], 1e-13, "%v", key)
		}
	}
}

// On a needle of 1e-4 width the pulls still add up and stay in the plane to
// rounding, also a kilometre away from the origin (where positions themselves
// are only good to 1e-13 m).
func TestSliverFarFromOrigin(t *testing.T) {
	o := r3.Vec{X: 1000, Y: -2000, Z: 300}
	tri, ok := element.NewTriangle(o, r3.Add(o, r3.Vec{X: 1, Y: 0.2}), r3.Add(o, r3.Vec{X: 0.5, Y: 0.1, Z: 1e-4}))
	require.True(t, ok)
	f := tri.FilmPull(1)
	var sum r3.Vec
	for i := range 3 {
		sum = r3.Add(sum, f[i])
		assert.InDelta(t, 0.5*r3.Norm(tri.Edge[i]), r3.Norm(f[i]), 1e-12)
	}
	assert.InDelta(t, 0, r3.Norm(sum), 1e-12)
}

func BenchmarkFilmPull(b *testing.B) {
	tri, _ := element.NewTriangle(r3.Vec{}, r3.Vec{X: 1}, r3.Vec{Y: 1, Z: 0.3})
	var s r3.Vec
	for b.Loop() {
		f := tri.FilmPull(2)
		s = r3.Add(s, f[0])
	}
	_ = s
}
