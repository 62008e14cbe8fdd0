package mesh

import (
	"math"
	"slices"
	"testing"

	"anticlast/formfind/internal/sweep"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"
)

// source is where a nasty outline takes its choices from: rapid's or a fuzzer's.
type source interface {
	pick(n int) int                 // 0 … n−1
	between(lo, hi float64) float64 // lo … hi
}

type rapidSource struct{ t *rapid.T }

func (s rapidSource) pick(n int) int { return rapid.IntRange(0, n-1).Draw(s.t, "pick") }
func (s rapidSource) between(lo, hi float64) float64 {
	return rapid.Float64Range(lo, hi).Draw(s.t, "value")
}

// byteSource reads choices from the bytes of a fuzzer; zero when they run out.
type byteSource struct{ b []byte }

func (s *byteSource) next() byte {
	if len(s.b) == 0 {
		return 0
	}
	v := s.b[0]
	s.b = s.b[1:]
	return v
}
func (s *byteSource) pick(n int) int { return int(s.next()) % n }
func (s *byteSource) between(lo, hi float64) float64 {
	return lo + (hi-lo)*(float64(s.next())*256+float64(s.next()))/65535
}

// nasty draws an outline with what outlines have that breaks meshers: needle
// corners, collinear and cocircular points, sides that nearly touch, points
// twice, holes, lines and points inside, places far from the origin.
func nasty(s source) *flat {
	var rims, chains [][]xy
	var points []xy
	switch s.pick(6) {
	case 0: // star-shaped with needles and dents
		n := 3 + s.pick(10)
		var c []xy
		for i := range n {
			a := 2 * math.Pi * (float64(i) + s.between(-0.45, 0.45)) / float64(n)
			r := s.between(3, 10)
			if s.pick(5) == 0 {
				r *= 4
			}
			c = append(c, xy{r * math.Cos(a), r * math.Sin(a)})
		}
		rims = append(rims, c)
	case 1: // cocircular
		n := 3 + s.pick(20)
		var c []xy
		for i := range n {
			sin, cos := math.Sincos(2 * math.Pi * float64(i) / float64(n))
			c = append(c, xy{8 * cos, 8 * sin})
		}
		rims = append(rims, c)
	case 2: // steps and comb teeth on a grid, many points on one line
		var c []xy
		w := 1 + s.pick(6)
		for i := range w {
			y := float64(1 + s.pick(8))
			c = append(c, xy{float64(2 * i), y}, xy{float64(2*i + 1), y})
			if s.pick(2) == 0 {
				c = append(c, xy{float64(2*i + 1), 1}, xy{float64(2*i + 2), 1})
			}
		}
		c = append(c, xy{float64(2 * w), 0}, xy{0, 0})
		rims = append(rims, c)
	case 3: // a slot whose sides nearly touch
		gap := math.Pow(10, -s.between(0, 7))
		rims = append(rims, []xy{{0, 0}, {5, 0}, {5, s.between(1, 7)}, {5 + gap, s.between(1, 7)}, {5 + gap, 0}, {10, 0}, {10, 8}, {0, 8}})
	case 4: // a needle
		rims = append(rims, []xy{{0, 0}, {10, 0}, {10, math.Pow(10, -s.between(0, 6))}})
	case 5: // anything
		n := 3 + s.pick(5)
		var c []xy
		for range n {
			c = append(c, xy{float64(s.pick(9)), float64(s.pick(9))})
		}
		rims = append(rims, c)
	}
	if s.pick(3) == 0 { // a hole, which may lie anywhere
		x, y, r := s.between(-3, 6), s.between(-3, 6), s.between(0.2, 2)
		var c []xy
		for i := range 3 + s.pick(12) {
			sin, cos := math.Sincos(0.5 * float64(i))
			c = append(c, xy{x + r*cos, y + r*sin})
		}
		rims = append(rims, c)
	}
	if s.pick(3) == 0 {
		a := rims[0][s.pick(len(rims[0]))] // from a corner
		chains = append(chains, []xy{a, {s.between(-3, 6), s.between(-3, 6)}})
	}
	if s.pick(3) == 0 {
		points = append(points, xy{float64(s.pick(5)), float64(s.pick(5))})
	}
	h := s.between(0.5, 3)
	shift := [...]float64{0, 0, 1e7, -3e5}[s.pick(4)]
	scale := [...]float64{1, 1, 1e-3, 1e3}[s.pick(4)]
	f := &flat{lone: h * scale}
	index := map[xy]int{}
	add := func(p xy, fresh bool) int {
		p = xy{p.x*scale + shift, p.y*scale + shift}
		if i, ok := index[p]; ok && !fresh {
			return i
		}
		index[p] = len(f.p)
		f.p = append(f.p, p)
		return len(f.p) - 1
	}
	divide := func(a, b xy, first bool) (list []int) {
		k := max(1, int(math.Round(math.Hypot(a.x-b.x, a.y-b.y)/h)))
		for j := range k {
			s := float64(j) / float64(k)
			list = append(list, add(xy{a.x + s*(b.x-a.x), a.y + s*(b.y-a.y)}, first))
		}
		return list
	}
	for _, c := range rims {
		var rim []int
		for i, a := range c {
			rim = append(rim, divide(a, c[(i+1)%len(c)], true)...)
		}
		f.rims = append(f.rims, rim)
	}
	for _, c := range chains {
		f.chains = append(f.chains, append(divide(c[0], c[1], false), add(c[1], false)))
	}
	for _, p := range points {
		f.points = append(f.points, add(p, false))
	}
	return f
}

// simple reports, by looking at every pair with exact predicates, whether no
// point is there twice and no two sides have more than an end in common.
func simple(f *flat) bool {
	seen := map[xy]bool{}
	for _, p := range f.p {
		if seen[p] {
			return false
		}
		seen[p] = true
	}
	var sides [][2]int
	for _, rim := range f.rims {
		for k, i := range rim {
			sides = append(sides, [2]int{i, rim[(k+1)%len(rim)]})
		}
	}
	for _, c := range f.chains {
		for k := 1; k < len(c); k++ {
			sides = append(sides, [2]int{c[k-1], c[k]})
		}
	}
	for i, s := range sides {
		a, b := f.p[s[0]], f.p[s[1]]
		if s[0] == s[1] {
			return false
		}
		lo, hi := xy{min(a.x, b.x), min(a.y, b.y)}, xy{max(a.x, b.x), max(a.y, b.y)}
		for k, p := range f.p { // a point within a side
			if lo.x <= p.x && p.x <= hi.x && lo.y <= p.y && p.y <= hi.y && k != s[0] && k != s[1] && exactOrient(a, b, p) == 0 {
				return false
			}
		}
		for _, u := range sides[i+1:] {
			c, d := f.p[u[0]], f.p[u[1]]
			if max(c.x, d.x) < lo.x || min(c.x, d.x) > hi.x || max(c.y, d.y) < lo.y || min(c.y, d.y) > hi.y {
				continue
			}
			if exactOrient(a, b, c)*exactOrient(a, b, d) < 0 && exactOrient(c, d, a)*exactOrient(c, d, b) < 0 {
				return false
			}
		}
	}
	return true
}

const nastyBudget = 3000

// checkNasty refines f and checks everything that must hold of it; then it divides
// the sides in the way of fat triangles, a few times, and does so again.
func checkNasty(t require.TestingT, f *flat) (v verdict, ok bool) {
	for range 4 {
		w, obstacles, sound := checkFilled(t, f)
		if !sound {
			return v, ok // rounding may fold what is divided
		}
		if v, ok = w, true; len(obstacles) == 0 || len(f.p) > 400 {
			break
		}
		f = f.finer(obstacles)
	}
	return v, ok
}

// finer returns f with the sides in the list divided.
func (f *flat) finer(list []obstacle) *flat {
	parts := map[[2]int32]int{}
	for _, o := range list {
		parts[[2]int32{o.a - 3, o.b - 3}] = o.parts
	}
	g := &flat{p: slices.Clone(f.p), points: f.points, lone: f.lone}
	divide := func(i, j int) (list []int) {
		list = []int{i}
		n := parts[[2]int32{int32(min(i, j)), int32(max(i, j))}]
		for k := 1; k < n; k++ {
			s := float64(k) / float64(n)
			a, b := f.p[i], f.p[j]
			list = append(list, len(g.p))
			g.p = append(g.p, xy{a.x + s*(b.x-a.x), a.y + s*(b.y-a.y)})
		}
		return list
	}
	for _, rim := range f.rims {
		var r []int
		for k, i := range rim {
			r = append(r, divide(i, rim[(k+1)%len(rim)])...)
		}
		g.rims = append(g.rims, r)
	}
	for _, c := range f.chains {
		var r []int
		for k := 1; k < len(c); k++ {
			r = append(r, divide(c[k-1], c[k])...)
		}
		g.chains = append(g.chains, append(r, c[len(c)-1]))
	}
	return g
}

// checkFilled refines f and checks everything that must hold of it.
func checkFilled(t require.TestingT, f *flat) (v verdict, obstacles []obstacle, ok bool) {
	d, in, fault := f.outline()
	if fault != nil {
		require.False(t, simple(f), "a sound outline was refused: %v", fault)
		return v, nil, false
	}
	require.True(t, simple(f), "a faulty outline was not refused")
	want, extent := 0.0, 0.0
	inside := func(t int) bool { return in[t] }
	for i := range in {
		if inside(i) {
			want += triangleArea(d, i)
		}
	}
	// The area inside is that of the outline less that of holes within it, and
	// more that of holes outside (seen from there, they are islands).
	for _, p := range f.p {
		extent = max(extent, math.Abs(p.x-f.p[0].x), math.Abs(p.y-f.p[0].y))
	}
	if len(f.rims) == 1 {
		require.InDelta(t, math.Abs(f.turn(f.rims[0])), want, 1e-9*extent*extent)
	}
	r := refinement{d: d, size: f.size, most: max(f.mean, f.lone), in: in, rim: len(d.p)}
	r.run(nastyBudget)
	sound(t, d)
	held := func(i, j int) {
		tri, side, ok := d.edge(int32(i+3), int32(j+3))
		require.True(t, ok, "a side is missing")
		require.True(t, d.held[tri][side])
	}
	for _, rim := range f.rims {
		for k, i := range rim {
			held(i, rim[(k+1)%len(rim)])
		}
	}
	for _, c := range f.chains {
		for k := 1; k < len(c); k++ {
			held(c[k-1], c[k])
		}
	}
	got := 0.0
	for i, in := range r.in {
		if in {
			got += triangleArea(d, i)
		}
	}
	require.InDelta(t, want, got, 1e-9*extent*extent)
	require.LessOrEqual(t, len(d.v), 2*nastyBudget+16)
	v = r.inspect()
	if v.met {
		sharp := r.sharpCorners(&verdict{cornerAngle: math.Pi})
		for i, in := range r.in {
			c := d.v[i]
			if in && !r.within(sharp, c) {
				_, angle := fatness(d.p[c[0]], d.p[c[1]], d.p[c[2]])
				require.GreaterOrEqual(t, angle, AngleBound)
			}
		}
	} else {
		require.NotEmpty(t, v.why)
	}
	for _, o := range r.obstacles() {
		require.Less(t, o.a, o.b)
		require.Less(t, int(o.b), r.rim)
		require.GreaterOrEqual(t, o.parts, 2)
		require.LessOrEqual(t, o.parts, narrowParts)
		held(int(o.a)-3, int(o.b)-3)
		obstacles = append(obstacles, o)
	}
	if v.thin == 0 && !r.full {
		require.Empty(t, obstacles)
	}
	return v, obstacles, true
}

func triangleArea(d *delaunay, t int) float64 {
	v := d.v[t]
	a, b, c := d.p[v[0]], d.p[v[1]], d.p[v[2]]
	return ((b.x-a.x)*(c.y-a.y) - (b.y-a.y)*(c.x-a.x)) / 2
}

// Every sound outline is filled, every other one refused: an oracle that looks at
// all pairs of sides with rational numbers says which is which.
func TestNastyOutlines(t *testing.T) {
	var refused, met, capped int
	rapid.Check(t, func(rt *rapid.T) {
		for range sweep.N(1, 8, 100) {
			switch v, ok := checkNasty(rt, nasty(rapidSource{rt})); {
			case !ok:
				refused++
			case v.met:
				met++
			default:
				capped++
			}
		}
	})
	t.Logf("%d filled to the angle bound, %d capped with a reason, %d refused", met, capped, refused)
}

// Points so near to each other that squares of their distance vanish.
func TestVanishingSides(t *testing.T) {
	f := &flat{lone: 1, rims: [][]int{{0, 1, 2, 3, 4}}}
	f.p = []xy{{0, 0}, {5, 0}, {5, 5}, {1e-162, 5}, {0, 5}}
	_, ok := checkNasty(t, f)
	require.True(t, ok)
	f = &flat{lone: 1, rims: [][]int{{0, 1, 2, 3}}, chains: [][]int{{0, 4, 5}}}
	f.p = []xy{{0, 0}, {5, 0}, {5, 5}, {0, 5}, {1e-162, 1e-162}, {3e-162, 2e-162}}
	_, ok = checkNasty(t, f)
	require.True(t, ok)
}

func FuzzOutline(f *testing.F) {
	f.Add([]byte{0, 9, 1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 12})
	for k := range 6 {
		f.Add([]byte{byte(k), 3, 200, 100, 50, 25, 12, 6, 3, 1, 0, 0, 0, 128, 7, 9, 2, 2, 0, 1})
	}
	f.Fuzz(func(t *testing.T, b []byte) { checkNasty(t, nasty(&byteSource{b})) })
}

// The first crossing of a rim is the one that looking at all pairs finds.
func TestFirstCrossing(t *testing.T) {
	found := 0
	rapid.Check(t, func(rt *rapid.T) {
		n := rapid.IntRange(3, 30).Draw(rt, "n")
		f := &flat{}
		var rim []int
		for i := range n {
			f.p = append(f.p, xy{float64(rapid.IntRange(0, 12).Draw(rt, "x")), float64(rapid.IntRange(0, 12).Draw(rt, "y"))})
			rim = append(rim, i)
		}
		f.rims = [][]int{rim}
		wi, wj, want := n, n, false
		for i := range n {
			for j := i + 2; j < n && !want; j++ {
				a, c, u, w := f.p[i], f.p[(i+1)%n], f.p[j], f.p[(j+1)%n]
				apart := max(u.x, w.x) < min(a.x, c.x) || min(u.x, w.x) > max(a.x, c.x) || max(u.y, w.y) < min(a.y, c.y) || min(u.y, w.y) > max(a.y, c.y)
				if i == 0 && j == n-1 || apart || exactOrient(a, c, u)*exactOrient(a, c, w) > 0 || exactOrient(u, w, a)*exactOrient(u, w, c) > 0 {
					continue
				}
				wi, wj, want = i, j, true
			}
		}
		i, j, ok := f.crossing()
		require.Equal(rt, want, ok)
		require.Equal(rt, [2]int{wi, wj}, [2]int{i, j})
		if ok {
			found++
		}
	})
	require.Positive(t, found)
}
