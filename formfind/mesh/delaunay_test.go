package mesh

import (
	"fmt"
	"math"
	"math/big"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"
)

// The predicates give the sign of the exact determinant, on points chosen to
// make it zero or nearly so, near the origin and far from it.
func TestPredicatesAreExact(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		far := rapid.SampledFrom([]float64{0, 1, 1e7, 1e12, 1e60}).Draw(rt, "far")
		grid := rapid.SampledFrom([]float64{1, 0.1, 1.0 / 3, 1e-9, 1e-90, 1e-200}).Draw(rt, "grid")
		point := func(name string) xy {
			v := func(d string) float64 { return far + grid*float64(rapid.IntRange(-4, 4).Draw(rt, name+d)) }
			p := xy{v("x"), v("y")}
			if rapid.Bool().Draw(rt, name+"nudge") {
				p.x = math.Nextafter(p.x, math.Inf(1))
			}
			return p
		}
		a, b, c, d := point("a"), point("b"), point("c"), point("d")
		require.Equal(t, exactOrient(a, b, c), sign(orient(a, b, c)))
		require.Equal(t, -exactOrient(a, b, c), sign(orient(b, a, c)))
		require.Equal(t, exactInCircle(a, b, c, d), sign(inCircle(a, b, c, d)))
		if expandable(a, b, c, d) {
			require.Equal(t, exactOrient(a, b, c), expandedOrient(a, b, c))
			require.Equal(t, exactInCircle(a, b, c, d), expandedInCircle(a, b, c, d))
		}
		// The exact value once more, by the 4×4 determinant of Guibas and
		// Stolfi (1985) in rational numbers.
		require.Equal(t, lifted(a, b, c, d), exactInCircle(a, b, c, d))
	})
}

// Points as nearly on a line or circle as rounding allows: here the plain
// floating-point determinant has the wrong sign every so often.
func TestPredicatesOnRoundedLinesAndCircles(t *testing.T) {
	rnd := rand.New(rand.NewPCG(1, 2))
	for range 2000 {
		v := func() float64 { return 200*rnd.Float64() - 100 }
		a, b, s := xy{v(), v()}, xy{v(), v()}, 4*rnd.Float64()-2
		c := xy{a.x + s*(b.x-a.x), a.y + s*(b.y-a.y)}
		require.Equal(t, exactOrient(a, b, c), sign(orient(a, b, c)))
		require.Equal(t, exactOrient(a, b, c), expandedOrient(a, b, c))
		o, r := xy{v(), v()}, 100*rnd.Float64()
		on := func() xy {
			sin, cos := math.Sincos(7 * rnd.Float64())
			return xy{o.x + r*cos, o.y + r*sin}
		}
		p, q, u, w := on(), on(), on(), on()
		require.Equal(t, exactInCircle(p, q, u, w), sign(inCircle(p, q, u, w)))
		require.Equal(t, exactInCircle(p, q, u, w), expandedInCircle(p, q, u, w))
	}
}

func sign(v float64) int {
	switch {
	case v > 0:
		return 1
	case v < 0:
		return -1
	}
	return 0
}

func lifted(p ...xy) int {
	m := make([][]*big.Rat, 4)
	for i, q := range p {
		x, y := rat(q.x), rat(q.y)
		m[i] = []*big.Rat{x, y, new(big.Rat).Add(mul(x, x), mul(y, y)), big.NewRat(1, 1)}
	}
	return determinant(m).Sign()
}

func determinant(m [][]*big.Rat) *big.Rat {
	if len(m) == 1 {
		return m[0][0]
	}
	sum := new(big.Rat)
	for k := range m {
		var minor [][]*big.Rat
		for i, row := range m {
			if i != k {
				minor = append(minor, row[1:])
			}
		}
		term := mul(m[k][0], determinant(minor))
		if k%2 == 1 {
			term.Neg(term)
		}
		sum.Add(sum, term)
	}
	return sum
}

// sound checks neighbours, orientation and the Delaunay property.
func sound(t require.TestingT, d *delaunay) {
	must := func(ok bool, what string, i int) {
		if !ok {
			require.Fail(t, what, "triangle or point %d", i)
		}
	}
	for i, v := range d.v {
		must(orient(d.p[v[0]], d.p[v[1]], d.p[v[2]]) > 0, "turned over or without area", i)
		for k := range 3 {
			o := d.n[i][k]
			if o < 0 {
				continue
			}
			j := d.sideTo(o, v[(k+1)%3], v[(k+2)%3])
			must(d.n[o][j] == int32(i), "neighbours disagree", i)
			must(d.held[i][k] == d.held[o][j], "neighbours disagree on a held side", i)
			if !d.held[i][k] {
				e := d.v[o][j]
				must(inCircle(d.p[v[0]], d.p[v[1]], d.p[v[2]], d.p[e]) <= 0, "not Delaunay", i)
			}
		}
	}
	for i, at := range d.at {
		v := d.v[at]
		must(v[0] == int32(i) || v[1] == int32(i) || v[2] == int32(i), "no triangle at a point", i)
	}
}

// add locates and inserts q.
func (d *delaunay) add(q xy) (int32, error) {
	t, side, _ := d.locate(q, d.last, false)
	if side == 3 {
		return -1, errTwice
	}
	if side >= 0 && d.held[t][side] {
		return -1, errTouch
	}
	return d.insert(q, t, side), nil
}

// The sides of a strip, of a wedge and of a circle are triangulated with a few
// flips a point, however many points there are.
func TestLongSidesTakeFewFlips(t *testing.T) {
	const n = 20_000
	strip, wedge, circle := make([]xy, n), make([]xy, n), make([]xy, n)
	for i := range n {
		u := float64(i)
		if i < n/2 {
			strip[i], wedge[i] = xy{u, 0}, xy{u, 0}
		} else {
			strip[i], wedge[i] = xy{n - u, 2}, xy{n - u, 0.003 * (u - n/2)}
		}
		sin, cos := math.Sincos(2 * math.Pi * u / n)
		circle[i] = xy{1000 * cos, 1000 * sin}
	}
	for _, p := range [][]xy{strip, wedge, circle} {
		lo, hi := p[0], p[0]
		for _, q := range p {
			lo, hi = xy{min(lo.x, q.x), min(lo.y, q.y)}, xy{max(hi.x, q.x), max(hi.y, q.y)}
		}
		d := newDelaunay(lo, hi)
		_, err := d.addAll(p)
		require.NoError(t, err)
		t.Logf("%.1f flips a point", float64(d.flips)/n)
		require.Less(t, d.flips, 10*n)
		require.Len(t, d.v, 1+2*n)
	}
}

// A segment along a strip crosses all sides between its two rows of points, even
// ones and ones in waves, and is recovered with a few flips each.
func TestLongSegmentsTakeFewFlips(t *testing.T) {
	const n = 3_000
	rnd := rand.New(rand.NewPCG(5, 5))
	for _, wave := range []float64{0, 0.3, 0.9} {
		for _, random := range []bool{false, true} {
			p := []xy{{-5, 0}, {n + 5, 0}}
			for i := range n {
				up, down := wave*math.Sin(0.01*float64(i)), wave*math.Cos(0.013*float64(i))
				if random {
					up, down = wave*rnd.Float64(), wave*rnd.Float64()
				}
				p = append(p, xy{float64(i), 1 + up}, xy{float64(i) + 0.5, -1 - down})
			}
			d := newDelaunay(xy{-5, -2}, xy{n + 5, 2})
			_, err := d.addAll(p)
			require.NoError(t, err)
			before := d.flips
			require.NoError(t, d.hold(3, 4))
			d.settle()
			t.Logf("%.2f flips a point", float64(d.flips-before)/(2*n))
			require.Less(t, d.flips-before, 80*n)
			sound(t, d)
		}
	}
}

// Points on a small grid: collinear, cocircular and duplicate ones abound.
func TestDelaunayOfNastyPoints(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		far := rapid.SampledFrom([]float64{0, 1e7}).Draw(rt, "far")
		n := rapid.IntRange(1, 60).Draw(rt, "points")
		d := newDelaunay(xy{far, far}, xy{far + 9, far + 9})
		seen := map[xy]bool{}
		for range n {
			q := xy{far + float64(rapid.IntRange(0, 9).Draw(rt, "x")), far + float64(rapid.IntRange(0, 9).Draw(rt, "y"))}
			_, err := d.add(q)
			require.Equal(t, seen[q], err != nil)
			seen[q] = true
		}
		require.Len(t, d.v, 2*len(seen)+1)
		sound(rt, d)
		// Hold random segments: held, or refused because something is in the way.
		for range rapid.IntRange(0, 12).Draw(rt, "segments") {
			a, b := rapid.IntRange(3, len(d.p)-1).Draw(rt, "a"), rapid.IntRange(3, len(d.p)-1).Draw(rt, "b")
			if a == b {
				continue
			}
			switch err := d.hold(int32(a), int32(b)); err {
			case nil:
				tri, side, ok := d.edge(int32(a), int32(b))
				require.True(t, ok)
				require.True(t, d.held[tri][side])
			case errTouch:
				touched := false
				for k := 3; k < len(d.p); k++ {
					p, q, s := d.p[a], d.p[b], d.p[k]
					on := orient(p, q, s) == 0 && (s.x-p.x)*(s.x-q.x)+(s.y-p.y)*(s.y-q.y) < 0
					touched = touched || k != a && k != b && on
				}
				require.True(t, touched)
			default:
				require.ErrorIs(t, err, errCross)
			}
		}
		d.settle()
		sound(rt, d)
	})
}

// Random outlines, star-shaped with needles and dents, with a hole: every side
// is there, the area adds up, nothing is turned over, and where the outline
// is not sharp no angle is.
func TestRefinementOfRandomOutlines(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		n := rapid.IntRange(3, 12).Draw(rt, "corners")
		h := rapid.Float64Range(0.8, 2.5).Draw(rt, "size")
		shift := rapid.SampledFrom([]float64{0, 1e7}).Draw(rt, "far")
		var corner []xy
		for i := range n {
			a := 2 * math.Pi * (float64(i) + rapid.Float64Range(-0.4, 0.4).Draw(rt, "angle")) / float64(n)
			r := rapid.Float64Range(3, 10).Draw(rt, "radius")
			corner = append(corner, xy{shift + r*math.Cos(a), shift + r*math.Sin(a)})
		}
		f := &flat{}
		line := func(c []xy) {
			var rim []int
			for i, a := range c {
				b := c[(i+1)%len(c)]
				k := max(1, int(math.Round(math.Hypot(a.x-b.x, a.y-b.y)/h)))
				for j := range k {
					s := float64(j) / float64(k)
					rim = append(rim, len(f.p))
					f.p = append(f.p, xy{a.x + s*(b.x-a.x), a.y + s*(b.y-a.y)})
				}
			}
			f.rims = append(f.rims, rim)
		}
		line(corner)
		if rapid.Bool().Draw(rt, "hole") && n >= 5 { // the middle lies inside
			var hole []xy
			for i := range 16 {
				sin, cos := math.Sincos(2 * math.Pi * float64(i) / 16)
				hole = append(hole, xy{shift + 0.8*cos, shift + 0.8*sin})
			}
			line(hole)
		}
		d, in, err := f.outline()
		if err != nil {
			return // a needle went through the hole, or rounding far away made points meet
		}
		want := 0.0
		for k, rim := range f.rims {
			a := 0.0
			for j, i := range rim {
				p, q := f.p[i], f.p[rim[(j+1)%len(rim)]]
				a += ((p.x-shift)*(q.y-shift) - (p.y-shift)*(q.x-shift)) / 2
			}
			if k > 0 {
				a = -math.Abs(a)
			}
			want += a
		}
		r := refinement{d: d, size: f.size, most: h, in: in, rim: len(d.p)}
		r.run(100000)
		sound(rt, d)
		for _, rim := range f.rims {
			for k, i := range rim {
				j := rim[(k+1)%len(rim)]
				tri, side, ok := d.edge(int32(i+3), int32(j+3))
				require.True(t, ok)
				require.True(t, d.held[tri][side])
				require.NotEqual(t, r.in[tri], r.in[d.n[tri][side]])
			}
		}
		got, fine := 0.0, 0
		for i, in := range r.in {
			if !in {
				continue
			}
			v := d.v[i]
			got += orient(d.p[v[0]], d.p[v[1]], d.p[v[2]]) / 2
			if _, radius, shortest := circumcentre(d.p[v[0]], d.p[v[1]], d.p[v[2]]); shortest/(2*radius) > math.Sin(20*math.Pi/180) {
				fine++
			}
		}
		require.InDelta(t, want, got, 1e-9*math.Abs(want)+1e-6*shift*1e-7)
	})
}

// A square of even sides: all angles above 28°, about as many triangles as
// equilateral ones of the wanted side would be.
func TestRefinementOfASquare(t *testing.T) {
	for _, n := range []int{4, 10, 80} {
		t.Run(fmt.Sprint(n), func(t *testing.T) {
			r := square(n)
			sound(t, r.d)
			least, count := math.Pi, 0
			for i, in := range r.in {
				if in {
					count++
					v := r.d.v[i]
					_, radius, shortest := circumcentre(r.d.p[v[0]], r.d.p[v[1]], r.d.p[v[2]])
					least = min(least, math.Asin(shortest/(2*radius)))
				}
			}
			ideal := float64(n*n) / (math.Sqrt(3) / 4)
			t.Logf("%d triangles (%.2f of ideal), least angle %.1f°", count, float64(count)/ideal, least*180/math.Pi)
			require.Greater(t, least, 28*math.Pi/180)
			require.InDelta(t, 1, float64(count)/ideal, 0.35)
		})
	}
}

func square(n int) *refinement {
	f := &flat{}
	var rim []int
	for side := range 4 {
		for j := range n {
			a, b := float64(j), 0.0
			for range side {
				a, b = -b, a
			}
			c := [4]xy{{0, 0}, {float64(n), 0}, {float64(n), float64(n)}, {0, float64(n)}}[side]
			rim = append(rim, len(f.p))
			f.p = append(f.p, xy{c.x + a, c.y + b})
		}
	}
	f.rims = [][]int{rim}
	d, in, err := f.outline()
	if err != nil {
		panic(err)
	}
	r := &refinement{d: d, size: f.size, most: 1, in: in, rim: len(d.p)}
	r.run(MaxTriangles)
	return r
}

func BenchmarkRefinement(b *testing.B) {
	for _, n := range []int{50, 200} {
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			for b.Loop() {
				square(n)
			}
		})
	}
}
