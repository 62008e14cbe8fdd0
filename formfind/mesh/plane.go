package mesh

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"
)

// lay puts all nodes into the plane with unit normal n.
func (f *flat) lay(n r3.Vec) {
	f.n = n
	f.p, f.h = f.p[:0], f.h[:0]
	// Axes that turn with the outline.
	first := r3.Sub(f.at[1], f.at[0])
	if first = r3.Sub(first, r3.Scale(r3.Dot(first, n), n)); r3.Norm(first) > 0 {
		f.e1 = r3.Unit(first)
		f.e2 = r3.Cross(n, f.e1)
	} else {
		f.e1, f.e2 = frame(n)
	}
	// Places in the plane are rounded to a fine grid, so that a model that is
	// turned or moved has the same triangles in spite of rounding.
	grid := math.Exp2(math.Ceil(math.Log2(f.around)) - 36)
	for _, v := range f.at {
		q, h := f.drop(v)
		q = xy{math.Round(q.x/grid) * grid, math.Round(q.y/grid) * grid}
		f.p, f.h = append(f.p, q), append(f.h, h)
	}
}

func (f *flat) drop(v r3.Vec) (xy, float64) {
	d := r3.Sub(v, f.origin)
	return xy{r3.Dot(d, f.e1), r3.Dot(d, f.e2)}, r3.Dot(d, f.n)
}

// leastSeen is the least cosine between the vector area of an outline and the
// direction that it is laid out along: 75°.
const leastSeen = 0.26

// maxTilted is the largest number of nodes of an outline for which planes are
// tried out.
const maxTilted = 50_000

// choosePlane triangulates the outline in the plane that the model gives, or in
// the first of these in which it does not overlap itself: that of its vector
// area, where it looks largest, then ones tilted against that. Where all overlap
// it says what does in the first. A hole or line that lies wrongly in the first
// is at fault itself.
func (p *plot) choosePlane(f *flat) (d *delaunay, in []bool, ok bool) {
	l, n := p.l, f.n
	given := l.plane != (r3.Vec{})
	if given {
		v := r3.Unit(l.plane)
		seen := r3.Dot(v, r3.Unit(f.area))
		if math.Abs(seen) < leastSeen {
			p.b.fail(l.part(), l.name, l.line, Degenerate, "give a direction nearer to its normal, or none", "its plane is seen nearly edge-on from its own side: they are %.0f° apart", math.Acos(math.Abs(seen))*180/math.Pi)
			return nil, nil, false
		}
		n = r3.Scale(math.Copysign(1, seen), v)
		f.lay(n)
	}
	d, in, fault := f.outline()
	if fault == nil {
		return d, in, true
	}
	if !given && l.ring < 0 && fault.rim == 0 && len(f.p) <= maxTilted {
		for _, v := range f.tilted(n) {
			if p.b.ctx.Err() != nil {
				return nil, nil, false
			}
			f.lay(v)
			if d, in, fault := f.outline(); fault == nil {
				return d, in, true
			}
		}
		f.lay(n)
		_, _, fault = f.outline()
	}
	p.b.foldedOutline(l, f, fault)
	return nil, nil, false
}

// tilted returns directions up to 60° from n: first those along and across the
// first side of the outline, among them those first in which the side that is
// seen most edge-on is seen best.
func (f *flat) tilted(n r3.Vec) []r3.Vec {
	type view struct {
		n    r3.Vec
		rank float64
	}
	var list []view
	rim := f.rims[0]
	for _, tilt := range [4]float64{15, 30, 45, 60} {
		sin, cos := math.Sincos(tilt * math.Pi / 180)
		for k := range 8 {
			s, c := math.Sincos(float64(k) * math.Pi / 4)
			v := view{n: r3.Add(r3.Scale(cos, n), r3.Scale(sin, r3.Add(r3.Scale(c, f.e1), r3.Scale(s, f.e2))))}
			for j, i := range rim {
				d := r3.Unit(r3.Sub(f.at[rim[(j+1)%len(rim)]], f.at[i]))
				v.rank = max(v.rank, math.Abs(r3.Dot(d, v.n)))
			}
			// Rounding does not decide.
			v.rank = math.Round(v.rank*1e6)/1e6 + float64(k%2)
			list = append(list, v)
		}
	}
	slices.SortStableFunc(list, func(a, b view) int { return cmp.Compare(a.rank, b.rank) })
	out := make([]r3.Vec, len(list))
	for i, v := range list {
		out[i] = v.n
	}
	return out
}

// fold finds the first two sides of the outline that cross or touch, and the
// corner between them that turns back: the cause of the overlap.
func (b *builder) fold(l *loop, f *flat) (where, wayOut string) {
	wayOut = "divide it with a seam or cable into parts that are seen whole from one side, or give the plane to lay it out in"
	i, j, ok := f.crossing()
	if !ok {
		return "", wayOut
	}
	rim := f.rims[0]
	place := mid(f.at[rim[i]], f.at[rim[(i+1)%len(rim)]])
	where = fmt.Sprintf(": edges %s and %s do near [%.2f, %.2f, %.2f]", b.edgeAt(l, i), b.edgeAt(l, j), place.X, place.Y, place.Z)
	if c := b.turningCorner(l, f, i, j); c != "" {
		where += fmt.Sprintf("; it is folded at corner %s", c)
		wayOut = "move that corner, " + wayOut
	}
	return where, wayOut
}

// crossing returns the first two sides of the outline that cross or touch, but
// for neighbours. Sides are looked at from left to right.
func (f *flat) crossing() (i, j int, ok bool) {
	rim := f.rims[0]
	n := len(rim)
	node := func(k int) xy { return f.p[rim[k%n]] }
	left := func(k int) float64 { return min(node(k).x, node(k+1).x) }
	right := func(k int) float64 { return max(node(k).x, node(k+1).x) }
	order := make([]int, n)
	for k := range order {
		order[k] = k
	}
	slices.SortStableFunc(order, func(a, b int) int { return cmp.Compare(left(a), left(b)) })
	i, j = n, n
	for k, s := range order {
		a, c := node(s), node(s+1)
		for _, t := range order[k+1:] {
			if left(t) > right(s) {
				break
			}
			p, q := min(s, t), max(s, t)
			if q == p+1 || p == 0 && q == n-1 || p > i || p == i && q >= j {
				continue
			}
			u, w := node(t), node(t+1)
			if max(u.y, w.y) < min(a.y, c.y) || min(u.y, w.y) > max(a.y, c.y) {
				continue
			}
			if sgn(orient(a, c, u))*sgn(orient(a, c, w)) <= 0 && sgn(orient(u, w, a))*sgn(orient(u, w, c)) <= 0 {
				i, j = p, q
			}
		}
	}
	return i, j, i < n
}

func sgn(v float64) int {
	switch {
	case v > 0:
		return 1
	case v < 0:
		return -1
	}
	return 0
}

// edgeAt names the edge that node k of the outline is on, counted around it.
func (b *builder) edgeAt(l *loop, k int) string {
	for _, e := range l.edges {
		if k < b.count[e] {
			return b.m.Edges[e].Name
		}
		k -= b.count[e]
	}
	return ""
}

// turningCorner names the corner with the sharpest turn on the shorter way
// around the outline from its side i to its side j.
func (b *builder) turningCorner(l *loop, f *flat, i, j int) string {
	rim := f.rims[0]
	n := len(rim)
	from, to := i+1, j
	if j-i > n/2 {
		from, to = j+1, i+n
	}
	at := map[int]int{} // position around the outline of each corner
	k := 0
	for pos, e := range l.edges {
		at[k] = b.walkStart(l, pos)
		k += b.count[e]
	}
	name, sharpest := "", 2.0
	for k := from; k <= to; k++ {
		c, ok := at[k%n]
		if !ok {
			continue
		}
		p, q, r := f.p[rim[(k+n-1)%n]], f.p[rim[k%n]], f.p[rim[(k+1)%n]]
		ux, uy, wx, wy := q.x-p.x, q.y-p.y, r.x-q.x, r.y-q.y
		if cos := (ux*wx + uy*wy) / (math.Hypot(ux, uy) * math.Hypot(wx, wy)); cos < sharpest {
			name, sharpest = b.m.Points[c].Name, cos
		}
	}
	return name
}

// foldedOutline says why an outline cannot be triangulated.
func (b *builder) foldedOutline(l *loop, f *flat, err *flatError) {
	what := "crosses"
	if err.err == errTouch || err.err == errTwice {
		what = "touches"
	}
	seen := fmt.Sprintf("when seen along (%.2f, %.2f, %.2f)", f.n.X, f.n.Y, f.n.Z)
	hole := err.rim - (len(f.rims) - len(l.holes))
	switch {
	case err.chain >= 0:
		e := b.m.Edges[l.lines[err.chain]]
		b.fail("edge", e.Name, e.Line, Degenerate, "let lines inside a fabric meet at points only",
			"it %s another line or the rim of fabric %s %s", what, l.name, seen)
	case hole >= 0:
		e := b.m.Edges[l.holes[hole].edges[0]]
		b.fail("edge", e.Name, e.Line, Degenerate, "move the hole inside, or let it bound the fabric",
			"its hole %s the rim of fabric %s or another hole %s", what, l.name, seen)
	case err.rim < 0:
		b.fail(l.part(), l.name, l.line, Degenerate, "remove the point or let the line end there", "a point inside it lies on a line or on another point %s", seen)
	default:
		where, wayOut := b.fold(l, f)
		b.fail(l.part(), l.name, l.line, Degenerate, wayOut, "its boundary %s itself %s%s", what, seen, where)
	}
}
