package surface_test

import (
	"math"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
	"pgregory.net/rapid"

	"anticlast/formfind/canopy"
	"anticlast/formfind/surface"
)

// patch meshes the graph of z over [-b,b]² with n × n quadrilaterals halved by
// alternating diagonals; jitter moves inner nodes by a share of the spacing.
func patch(n int, b, jitter float64, z func(x, y float64) float64) ([]r3.Vec, [][3]int32) {
	var p []r3.Vec
	seed := uint64(7)
	random := func() float64 {
		seed = seed*6364136223846793005 + 1442695040888963407
		return float64(seed>>33)/(1<<31)*2 - 1
	}
	for j := 0; j <= n; j++ {
		for i := 0; i <= n; i++ {
			x, y := b*(2*float64(i)/float64(n)-1), b*(2*float64(j)/float64(n)-1)
			if i > 0 && j > 0 && i < n && j < n {
				x += jitter * 2 * b / float64(n) * random()
				y += jitter * 2 * b / float64(n) * random()
			}
			p = append(p, r3.Vec{X: x, Y: y, Z: z(x, y)})
		}
	}
	var c [][3]int32
	at := func(i, j int) int32 { return int32(j*(n+1) + i) }
	for j := range n {
		for i := range n {
			a, b, d, e := at(i, j), at(i+1, j), at(i+1, j+1), at(i, j+1)
			if (i+j)%2 == 0 {
				c = append(c, [3]int32{a, b, d}, [3]int32{a, d, e})
			} else {
				c = append(c, [3]int32{a, b, e}, [3]int32{b, d, e})
			}
		}
	}
	return p, c
}

func flat(x, y float64) float64 { return 0 }

func total(v []float64) (s float64) {
	for _, a := range v {
		s += a
	}
	return s
}

// Area of the bilinear hypar with corners ±2 on a square of 10 (recomputed
// from ∫√(1+k²r²), k = 0.08).
func TestHyparAreaConvergesSecondOrder(t *testing.T) {
	const exact = 105.149893899789
	var last float64
	for _, n := range []int{8, 16, 32} {
		p, c := patch(n, 5, 0, func(x, y float64) float64 { return 0.08 * x * y })
		e := total(surface.Areas(p, c)) - exact
		if last != 0 {
			require.InDelta(t, 2, math.Log2(math.Abs(last/e)), 0.1)
		}
		last = e
	}
	require.Less(t, math.Abs(last), 2e-2)
}

func TestAngles(t *testing.T) {
	a := surface.Angles(r3.Vec{}, r3.Vec{X: 4}, r3.Vec{Y: 3})
	require.InDelta(t, math.Pi/2, a[0], 1e-15)
	require.InDelta(t, math.Atan2(3, 4), a[1], 1e-15)
	// A needle keeps its digits.
	a = surface.Angles(r3.Vec{}, r3.Vec{X: 1}, r3.Vec{X: 1, Y: 1e-9})
	require.InEpsilon(t, 1e-9, a[0], 1e-12)
	rapid.Check(t, func(t *rapid.T) {
		v := func() r3.Vec {
			g := rapid.Float64Range(-10, 10)
			return r3.Vec{X: g.Draw(t, "x"), Y: g.Draw(t, "y"), Z: g.Draw(t, "z")}
		}
		p := [3]r3.Vec{v(), v(), v()}
		if ar, _ := surface.AreaNormal(p[0], p[1], p[2]); ar < 1e-6 {
			t.Skip("no triangle")
		}
		a := surface.Angles(p[0], p[1], p[2])
		require.InDelta(t, math.Pi, a[0]+a[1]+a[2], 1e-9)
		q := surface.MeasureQuality(p[:], [][3]int32{{0, 1, 2}})
		require.InDelta(t, min(a[0], a[1], a[2]), q.MinAngle, 1e-9)
	})
}

func TestQualityFindsTheWorstTriangle(t *testing.T) {
	p, c := patch(6, 1, 0, flat)
	q := surface.MeasureQuality(p, c)
	require.InDelta(t, math.Pi/4, q.MinAngle, 1e-12)
	require.InDelta(t, math.Pi/4, q.MeanMin, 1e-12)
	p[16] = p[17] // collapse
	q = surface.MeasureQuality(p, c)
	require.Zero(t, q.MinAngle)
	require.Contains(t, []int32{16, 17}, func() int32 {
		for _, i := range c[q.Triangle] {
			if i == 16 || i == 17 {
				return i
			}
		}
		return -1
	}())
	require.Equal(t, int32(-1), surface.MeasureQuality(nil, nil).Triangle)
}

func TestSlope(t *testing.T) {
	for _, deg := range []float64{0, 1e-3, 5, 45, 89, 90} {
		a := deg * math.Pi / 180
		n := r3.Vec{X: math.Sin(a), Z: math.Cos(a)}
		require.InDelta(t, a, surface.Slope(n), 1e-15)
		require.InDelta(t, a, surface.Slope(r3.Scale(-1, n)), 1e-15)
	}
}

// Principal values of N = (2, 2) with shear 0.92307692: 2.92307692 and
// 1.07692308 at 45° (Mohr's circle).
func TestPrincipal(t *testing.T) {
	a, b, g := surface.Principal(canopy.Stress{Warp: 2, Weft: 2, Shear: 0.92307692})
	require.InDelta(t, 2.92307692, a, 1e-12)
	require.InDelta(t, 1.07692308, b, 1e-12)
	require.InDelta(t, math.Pi/4, g, 1e-12)
	a, b, g = surface.Principal(canopy.Stress{Warp: 1, Weft: 3})
	require.Equal(t, []float64{3, 1}, []float64{a, b})
	require.InDelta(t, math.Pi/2, g, 1e-15)
	rapid.Check(t, func(t *rapid.T) {
		r := rapid.Float64Range(-100, 100)
		s := canopy.Stress{Warp: r.Draw(t, "w"), Weft: r.Draw(t, "f"), Shear: r.Draw(t, "s")}
		a, b, g := surface.Principal(s)
		require.InDelta(t, s.Warp+s.Weft, a+b, 1e-9)
		require.InDelta(t, s.Warp*s.Weft-s.Shear*s.Shear, a*b, 1e-7)
		// Normal stress across the direction g is the larger principal one.
		c, n := math.Cos(g), math.Sin(g)
		require.InDelta(t, a, s.Warp*c*c+s.Weft*n*n+2*s.Shear*c*n, 1e-9)
	})
}

func TestSpread(t *testing.T) {
	var v, w []float64
	for i := 1; i <= 100; i++ {
		v = append(v, float64(101-i))
		w = append(w, 2)
	}
	require.Equal(t, canopy.Spread{Min: 1, P5: 5, Mean: 50.5, P95: 95, Max: 100}, surface.Spread(v, w))
	// Weights count, not numbers of values.
	require.Equal(t, canopy.Spread{Min: 1, P5: 2, Mean: 1.99, P95: 2, Max: 2}, surface.Spread([]float64{2, 1}, []float64{99, 1}))
	require.Equal(t, canopy.Spread{}, surface.Spread([]float64{math.NaN(), 3}, []float64{1, 0}))
}

func rmsError(c []surface.Curvature, p []r3.Vec, f func(r3.Vec, surface.Curvature) float64) (rms float64, count int) {
	for i := range c {
		if !math.IsNaN(c[i].Gauss) {
			e := f(p[i], c[i])
			rms += e * e
			count++
		}
	}
	return math.Sqrt(rms / float64(count)), count
}

// The hypar z = kxy has K = −k²/(1+k²r²)² and, towards the upper side,
// H = −k³xy/(1+k²r²)^1.5 in the sense of a surface that bulges upwards being
// negative there (closed forms); K(0,0) = −0.0064, H(2.5,2.5) = 0.0028511124 in size.
func TestHyparCurvatureConverges(t *testing.T) {
	const k = 0.08
	var last [2]float64
	for _, n := range []int{10, 20, 40} {
		p, c := patch(n, 5, 0, func(x, y float64) float64 { return k * x * y })
		cv := surface.Curvatures(p, c)
		g, count := rmsError(cv, p, func(p r3.Vec, c surface.Curvature) float64 {
			r := 1 + k*k*(p.X*p.X+p.Y*p.Y)
			return c.Gauss + k*k/(r*r)
		})
		require.Equal(t, (n-1)*(n-1), count, "boundary nodes have no curvature")
		h, _ := rmsError(cv, p, func(p r3.Vec, c surface.Curvature) float64 {
			r := 1 + k*k*(p.X*p.X+p.Y*p.Y)
			return c.Mean - k*k*k*p.X*p.Y/math.Pow(r, 1.5)
		})
		if last[0] != 0 {
			// Second order where the neighbourhood is even, first beside the
			// boundary, where it is lopsided.
			require.Greater(t, last[0]/g, 1.8)
			require.Greater(t, last[1]/h, 1.8)
		}
		last = [2]float64{g, h}
	}
	require.Less(t, last[0], 2e-5) // 0.3 % of the largest
	require.Less(t, last[1], 1e-4)
	// The published values at two points.
	p, c := patch(40, 5, 0, func(x, y float64) float64 { return k * x * y })
	cv := surface.Curvatures(p, c)
	require.InDelta(t, -0.0064, cv[20*41+20].Gauss, 1e-5)
	require.InDelta(t, 0.0028511124, cv[30*41+30].Mean, 1e-5)
}

func TestSphereCurvature(t *testing.T) {
	const r = 5.
	p, c := patch(40, 2, 0, func(x, y float64) float64 { return math.Sqrt(r*r - x*x - y*y) })
	for i, v := range surface.Curvatures(p, c) {
		if math.IsNaN(v.Mean) {
			continue
		}
		require.InDelta(t, 1/r, v.Mean, 1e-3, "node %d", i) // bulges towards its upper, positive side
		require.InDelta(t, 1/r, v.K1, 6e-3)
		require.InDelta(t, 1/r, v.K2, 6e-3)
	}
}

func length(c surface.Contour) (l float64) {
	for i := range c.Points {
		if i+1 == len(c.Points) && !c.Closed {
			break
		}
		l += r3.Norm(r3.Sub(c.Points[(i+1)%len(c.Points)], c.Points[i]))
	}
	return l
}

func TestContours(t *testing.T) {
	// A bowl: closed circles.
	p, c := patch(60, 3, 0.2, func(x, y float64) float64 { return (x*x + y*y) / 4 })
	got := surface.Contours(p, c, []float64{0.25, 1})
	require.Len(t, got, 2)
	for _, g := range got {
		require.True(t, g.Closed)
		r := 2 * math.Sqrt(g.Level)
		require.InEpsilon(t, 2*math.Pi*r, length(g), 3e-3)
		for _, q := range g.Points {
			require.Equal(t, g.Level, q.Z)
			require.InDelta(t, r, math.Hypot(q.X, q.Y), 0.01)
		}
	}
	// A plane: one open line from side to side, also when nodes lie on it.
	p, c = patch(8, 1, 0, func(x, y float64) float64 { return x })
	for _, l := range []float64{0, 0.1} {
		got = surface.Contours(p, c, []float64{l})
		require.Len(t, got, 1)
		require.False(t, got[0].Closed)
		require.InDelta(t, 2, length(got[0]), 1e-12)
	}
	// A saddle: two branches.
	p, c = patch(20, 1, 0.2, func(x, y float64) float64 { return x * y })
	require.Len(t, surface.Contours(p, c, []float64{0.3}), 2)
	// A flat sheet has none.
	p, c = patch(4, 1, 0, flat)
	require.Empty(t, surface.Contours(p, c, []float64{0}))
	require.Equal(t, []float64{-0.5, 0, 0.5}, surface.Levels([]r3.Vec{{Z: -0.7}, {Z: 0.9}}, 0.5))
	require.Nil(t, surface.Levels(nil, 0.5))
}

func TestBasins(t *testing.T) {
	// A paraboloid bowl in a rim that spills at its lowest, the middles of
	// the sides: depth b², plan area π b², volume ½π b⁴ for z = r².
	p, c := patch(60, 1, 0, func(x, y float64) float64 { return x*x + y*y })
	b := surface.Basins(p, c, 1e-3)
	require.Len(t, b, 1)
	require.InDelta(t, 1, b[0].Depth, 1e-12)
	require.InDelta(t, 1, b[0].Level, 1e-12)
	require.InEpsilon(t, math.Pi, b[0].Area, 3e-3)
	require.InEpsilon(t, math.Pi/2, b[0].Volume, 3e-3)
	require.Equal(t, r3.Vec{}, p[b[0].Lowest])

	// Two hollows, the deeper first.
	p, c = patch(60, 1, 0, func(x, y float64) float64 {
		return -math.Exp(-60*((x-0.5)*(x-0.5)+y*y)) - 0.5*math.Exp(-60*((x+0.5)*(x+0.5)+y*y)) + 0.2*math.Exp(-60*x*x)*(1-y*y)
	})
	b = surface.Basins(p, c, 1e-3)
	require.Len(t, b, 2)
	require.Greater(t, b[0].Depth, b[1].Depth)
	require.Greater(t, p[b[0].Lowest].X, 0.)
	require.Empty(t, surface.Basins(p, c, 2), "none so deep")

	// Nothing stands on a saddle, a dome or a tilted plane.
	for _, z := range []func(x, y float64) float64{
		func(x, y float64) float64 { return x * y },
		func(x, y float64) float64 { return -x*x - y*y },
		func(x, y float64) float64 { return 0.01 * x },
		flat,
	} {
		p, c = patch(30, 1, 0.2, z)
		require.Empty(t, surface.Basins(p, c, 1e-9))
	}
	// Tilted far enough, the bowl empties.
	p, c = patch(40, 1, 0, func(x, y float64) float64 { return 0.1*(x*x+y*y) + 0.3*x })
	require.Empty(t, surface.Basins(p, c, 1e-9))
	// A hole at the bottom is an outlet.
	p, c = patch(30, 1, 0, func(x, y float64) float64 { return x*x + y*y })
	var open [][3]int32
	for _, t := range c {
		if r3.Norm(surface.Centre(p, t)) > 0.2 {
			open = append(open, t)
		}
	}
	require.Empty(t, surface.Basins(p, open, 1e-3))
}

// The lowest point over a region, against a dense sampling of it.
func TestLowestOverRegion(t *testing.T) {
	p, c := patch(9, 3, 0.3, func(x, y float64) float64 { return 4 + math.Sin(2*x+0.5) + math.Cos(1.7*y) })
	height := func(q r3.Vec) float64 {
		z := math.Inf(1)
		for _, t := range c {
			a, b, d := p[t[0]], p[t[1]], p[t[2]]
			det := (b.X-a.X)*(d.Y-a.Y) - (b.Y-a.Y)*(d.X-a.X)
			u := ((q.X-a.X)*(d.Y-a.Y) - (q.Y-a.Y)*(d.X-a.X)) / det
			v := ((b.X-a.X)*(q.Y-a.Y) - (b.Y-a.Y)*(q.X-a.X)) / det
			if u >= -1e-12 && v >= -1e-12 && u+v <= 1+1e-12 {
				z = min(z, a.Z+u*(b.Z-a.Z)+v*(d.Z-a.Z))
			}
		}
		return z
	}
	rapid.Check(t, func(t *rapid.T) {
		g := rapid.Float64Range(-2.5, 2.5)
		var tri []r3.Vec
		for range 3 {
			tri = append(tri, r3.Vec{X: g.Draw(t, "x"), Y: g.Draw(t, "y"), Z: 99})
		}
		low := surface.LowestTriangle(p, c, tri)
		require.GreaterOrEqual(t, low.Part, int32(0))
		// It lies on the surface …
		require.InDelta(t, height(low.At), low.At.Z, 1e-9)
		// … and no sample of the region lies lower, but one lies near it.
		const n = 12
		for i := 0; i <= n; i++ {
			for j := 0; i+j <= n; j++ {
				u, v := float64(i)/n, float64(j)/n
				q := r3.Add(tri[0], r3.Add(r3.Scale(u, r3.Sub(tri[1], tri[0])), r3.Scale(v, r3.Sub(tri[2], tri[0]))))
				require.GreaterOrEqual(t, height(q), low.At.Z-1e-9)
			}
		}
		// In the region: barycentric coordinates, but for rounding.
		a := (tri[1].X-tri[0].X)*(tri[2].Y-tri[0].Y) - (tri[1].Y-tri[0].Y)*(tri[2].X-tri[0].X)
		if math.Abs(a) < 1e-3 {
			return
		}
		u := ((low.At.X-tri[0].X)*(tri[2].Y-tri[0].Y) - (low.At.Y-tri[0].Y)*(tri[2].X-tri[0].X)) / a
		v := ((tri[1].X-tri[0].X)*(low.At.Y-tri[0].Y) - (tri[1].Y-tri[0].Y)*(low.At.X-tri[0].X)) / a
		require.True(t, u > -1e-9 && v > -1e-9 && u+v < 1+1e-9)
	})
	// Everywhere.
	all := surface.LowestTriangle(p, c, nil)
	for _, q := range p {
		require.GreaterOrEqual(t, q.Z, all.At.Z)
	}
	// Not there at all.
	require.Equal(t, int32(-1), surface.LowestTriangle(p, c, []r3.Vec{{X: 50}, {X: 51}, {X: 51, Y: 1}}).Part)
	// A cable crossing a corner of a region with no node in it.
	l := surface.LowestSegment([]r3.Vec{{X: -10, Z: 0}, {X: 10, Z: 10}}, [][2]int32{{0, 1}}, nil, []r3.Vec{{X: 2, Y: -1}, {X: 4, Y: -1}, {X: 4, Y: 1}, {X: 2, Y: 1}})
	require.InDelta(t, 6, l.At.Z, 1e-12)
}

// Chord 10, sag 1.
func TestSag(t *testing.T) {
	var p []r3.Vec
	var nodes []int32
	for i := 0; i <= 20; i++ { // the arc of radius 13 through chord 10 with sag 1
		a := math.Asin(5./13) * (float64(i)/10 - 1)
		p = append(p, r3.Vec{X: 13 * math.Sin(a), Y: 3, Z: 13 * math.Cos(a)})
		nodes = append(nodes, int32(i))
	}
	sag, chord := surface.Sag(p, nodes)
	require.InDelta(t, 1, sag, 1e-12)
	require.InDelta(t, 10, chord, 1e-12)
	sag, chord = surface.Sag(p, []int32{0, 5, 0})
	require.Zero(t, sag)
	require.Zero(t, chord)
}

func BenchmarkBasins(b *testing.B) {
	p, c := patch(175, 5, 0.2, func(x, y float64) float64 { return math.Sin(x) * math.Cos(y) })
	for b.Loop() {
		surface.Basins(p, c, 1e-3)
	}
}

func BenchmarkContours(b *testing.B) {
	p, c := patch(175, 5, 0.2, func(x, y float64) float64 { return math.Sin(x) * math.Cos(y) })
	levels := surface.Levels(p, 0.05)
	for b.Loop() {
		surface.Contours(p, c, levels)
	}
}

// The distance of points from a surface, against looking at every triangle.
func TestDistance(t *testing.T) {
	p, c := patch(12, 3, 0.3, func(x, y float64) float64 { return 0.3 * x * y })
	brute := func(q r3.Vec) float64 { // dense sampling of every triangle
		best := math.Inf(1)
		for _, k := range c {
			const n = 12
			for i := 0; i <= n; i++ {
				for j := 0; i+j <= n; j++ {
					u, v := float64(i)/n, float64(j)/n
					w := r3.Add(p[k[0]], r3.Add(r3.Scale(u, r3.Sub(p[k[1]], p[k[0]])), r3.Scale(v, r3.Sub(p[k[2]], p[k[0]]))))
					best = min(best, r3.Norm(r3.Sub(q, w)))
				}
			}
		}
		return best
	}
	rapid.Check(t, func(t *rapid.T) {
		g := rapid.Float64Range(-6, 6)
		q := r3.Vec{X: g.Draw(t, "x"), Y: g.Draw(t, "y"), Z: g.Draw(t, "z")}
		d, at := surface.Distance([]r3.Vec{q}, p, c)
		require.Zero(t, at)
		b := brute(q)
		require.LessOrEqual(t, d, b+1e-12)
		require.Greater(t, d, b-0.06)
	})
	// Points of the surface itself, and one that is not.
	d, _ := surface.Distance(p, p, c)
	require.InDelta(t, 0, d, 1e-12)
	d, at := surface.Distance([]r3.Vec{p[3], {Z: 2}, p[5]}, p, c)
	require.Equal(t, 1, at)
	require.InDelta(t, 2, d, 0.2)
	_, at = surface.Distance(nil, p, c)
	require.Equal(t, -1, at)
	// A finer mesh of the same surface is near.
	fine, _ := patch(24, 3, 0, func(x, y float64) float64 { return 0.3 * x * y })
	d, _ = surface.Distance(fine, p, c)
	require.Less(t, d, 0.06)
}

func BenchmarkDistance(b *testing.B) {
	p, c := patch(175, 5, 0.2, func(x, y float64) float64 { return 0.1 * x * y })
	q, _ := patch(170, 5, 0.2, func(x, y float64) float64 { return 0.1 * x * y })
	for b.Loop() {
		surface.Distance(q, p, c)
	}
}
