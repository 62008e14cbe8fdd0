package mesh

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"
)

// rim is the outline of a net and the holes in it, in the plane in which its
// lines are laid: the plan, or where the boundary stands upright the plane of
// its vector area.
type rim struct {
	origin, e1, e2, n r3.Vec
	sides             []rimSide
	lo, hi            xy
	area              float64
	up                *flat // for heights

	cell   float64 // of the grid of cells
	nx, ny int
	first  []int32   // per cell: first entry in list
	list   []int32   // sides that pass through or near each cell
	bands  [][]int32 // sides in each of even bands across y
}

// rimSide is a straight piece of a rim with the net on its left.
type rimSide struct {
	a, b   xy
	edge   int
	ta, tb float64 // where on the edge, by length
}

func (r *rim) drop(v r3.Vec) xy {
	d := r3.Sub(v, r.origin)
	return xy{r3.Dot(d, r.e1), r3.Dot(d, r.e2)}
}

// upright is the least cosine of the slope of a boundary that is seen in plan.
const upright = 0.5

// rimPieces is into how many pieces a curved edge is divided to be clipped at.
const rimPieces = 24

// newRim lays the boundary of net l and its holes into a plane; nil when it has
// no area there.
func (b *builder) newRim(l *loop) *rim {
	area := newell(b.sample(l))
	if r3.Norm(area) == 0 {
		return nil
	}
	r := &rim{n: r3.Unit(area)}
	if math.Abs(r.n.Z) >= upright {
		r.n = r3.Vec{Z: 1}
	} else {
		for _, c := range [3]float64{r.n.X, r.n.Y, r.n.Z} {
			if math.Abs(c) > 1e-6 {
				if c < 0 {
					r.n = r3.Scale(-1, r.n)
				}
				break
			}
		}
	}
	along := b.m.Nets[l.index].Direction
	if along == (r3.Vec{}) {
		c := &b.curve[l.edges[0]]
		along = r3.Sub(c.End, c.Start)
	}
	level := r3.Sub(along, r3.Scale(r3.Dot(along, r.n), r.n))
	if r3.Norm(level) > 1e-6*r3.Norm(along) {
		r.e1 = r3.Unit(level)
		r.e2 = r3.Cross(r.n, r.e1)
	} else {
		r.e1, r.e2 = frame(r.n)
	}
	pts := b.sample(l)
	for _, p := range pts {
		r.origin = r3.Add(r.origin, r3.Scale(1/float64(len(pts)), p))
	}
	up := &flat{origin: r.origin, e1: r.e1, e2: r.e2, n: r.n}
	for k, w := range append([]*loop{l}, l.holes...) {
		ring := b.pieces(w)
		area := 0.0
		for _, p := range ring {
			a, c := r.drop(p.a), r.drop(p.b)
			area += (a.x*c.y - a.y*c.x) / 2
		}
		if k == 0 {
			r.area = math.Abs(area)
		}
		if (area > 0) != (k == 0) {
			slices.Reverse(ring)
			for i, p := range ring {
				ring[i] = piece{p.b, p.a, p.edge, p.tb, p.ta}
			}
		}
		if k == 0 && b.found == nil {
			b.sagged(l, ring, r)
		}
		var rim []int
		for _, p := range ring {
			s := rimSide{r.drop(p.a), r.drop(p.b), p.edge, p.ta, p.tb}
			if s.a != s.b {
				r.sides = append(r.sides, s)
				rim = append(rim, len(up.p))
				up.p = append(up.p, s.a)
				up.h = append(up.h, r3.Dot(r3.Sub(p.a, r.origin), r.n))
			}
		}
		if len(rim) > 0 {
			up.rims = append(up.rims, rim)
		}
	}
	r.up = up
	if !(r.area > 0) || len(r.sides) < 3 {
		return nil
	}
	r.lo, r.hi = r.sides[0].a, r.sides[0].a
	for _, s := range r.sides {
		r.lo = xy{min(r.lo.x, s.a.x), min(r.lo.y, s.a.y)}
		r.hi = xy{max(r.hi.x, s.a.x), max(r.hi.y, s.a.y)}
	}
	return r
}

// piece is a straight piece of a boundary in the order of its walk.
type piece struct {
	a, b   r3.Vec
	edge   int
	ta, tb float64
}

// pieces returns the pieces of a loop: as drawn, or as found.
func (b *builder) pieces(l *loop) []piece {
	var ring []piece
	for k, e := range l.edges {
		var t []float64
		var at []r3.Vec
		if b.found != nil {
			t, at = b.found.edge(e)
		} else {
			n := 1
			if b.curve[e].Arc || b.sags(l, e) {
				n = rimPieces
			}
			for i := range n + 1 {
				s := float64(i) / float64(n)
				t, at = append(t, s), append(at, b.curve[e].at(s))
			}
		}
		last := len(t) - 1
		for i := range last {
			if l.rev[k] {
				ring = append(ring, piece{at[last-i], at[last-i-1], e, t[last-i], t[last-i-1]})
			} else {
				ring = append(ring, piece{at[i], at[i+1], e, t[i], t[i+1]})
			}
		}
	}
	return ring
}

// sags reports whether edge e of the loop l of a net is a cable that this net
// alone pulls at.
func (b *builder) sags(l *loop, e int) bool {
	return l.net && !b.m.Edges[e].Arc && b.m.Edges[e].Cable != "" && len(b.users[e]) == 1
}

// sagged pulls the cables of an outline, which has the net on its left, about
// as far into the net as its forces will, so that lines are laid in an outline
// like that of the found shape. Cables around holes find their own shape.
func (b *builder) sagged(l *loop, ring []piece, r *rim) {
	for i, p := range ring {
		if !b.sags(l, p.edge) {
			continue
		}
		into := b.netSagVector(l, r, p.edge, p.tb > p.ta)
		sag := func(t float64) r3.Vec { return r3.Scale(4*t*(1-t), into) }
		ring[i].a, ring[i].b = r3.Add(p.a, sag(p.ta)), r3.Add(p.b, sag(p.tb))
	}
}

// netSagVector returns where the middle of cable edge e at the outline of net l
// is expected off its chord; forward says that the net is on the left of the
// edge as it is drawn.
func (b *builder) netSagVector(l *loop, r *rim, e int, forward bool) r3.Vec {
	c := &b.curve[e]
	across := r3.Cross(r.n, r3.Sub(c.End, c.Start))
	if !forward {
		across = r3.Scale(-1, across)
	}
	if r3.Norm(across) == 0 {
		return across
	}
	return r3.Scale(min(b.netSag(l, e), b.sagRoom(e, l))*c.length/r3.Norm(across), across)
}

// netSag estimates the sag over chord of a cable at the rim of a net.
func (b *builder) netSag(l *loop, e int) float64 {
	n := &b.m.Nets[l.index]
	stress := 0.0 // force per width
	for k := range n.Families {
		f := &n.Families[k]
		h := n.MeshLength
		if h == 0 {
			h = n.Families[min(k, 1)].Spacing
		}
		force := max(f.Force, f.MeanForce)
		if f.ForceDensity > 0 {
			force = f.ForceDensity * h
		}
		stress += force / h / 2
	}
	h := n.MeshLength
	if h == 0 {
		h = n.Families[0].Spacing
	}
	return b.cableSag(e, stress, h)
}

// sort puts the sides into the cells of a grid, each into all cells within
// reach of it.
func (r *rim) sort(cell float64) {
	// Links of a shape that was found may have shrunk to nothing.
	w, h := r.hi.x-r.lo.x, r.hi.y-r.lo.y
	cell = max(cell, (w+h)/maxLines, math.Sqrt(w*h/maxLattice))
	r.cell = cell
	r.nx, r.ny = int(w/cell)+1, int(h/cell)+1
	count := make([]int32, r.nx*r.ny+1)
	visit := func(do func(c int, s int32)) {
		for s := range r.sides {
			a, b := r.sides[s].a, r.sides[s].b
			x0, x1 := r.column(min(a.x, b.x)), r.column(max(a.x, b.x))
			y0, y1 := r.row(min(a.y, b.y)), r.row(max(a.y, b.y))
			for y := y0; y <= y1; y++ {
				for x := x0; x <= x1; x++ {
					cx, cy := r.lo.x+(float64(x)+0.5)*cell, r.lo.y+(float64(y)+0.5)*cell
					if segmentDistance(a.x-cx, a.y-cy, b.x-cx, b.y-cy) <= 0.72*cell {
						do(y*r.nx+x, int32(s))
					}
				}
			}
		}
	}
	visit(func(c int, _ int32) { count[c+1]++ })
	for c := range r.nx * r.ny {
		count[c+1] += count[c]
	}
	r.first = append([]int32(nil), count...)
	r.list = make([]int32, count[r.nx*r.ny])
	visit(func(c int, s int32) { r.list[count[c]] = s; count[c]++ })
	r.bands = make([][]int32, max(1, min(r.ny, maxBands/len(r.sides))))
	for s := range r.sides {
		a, b := r.sides[s].a, r.sides[s].b
		for k := r.band(min(a.y, b.y)); k <= r.band(max(a.y, b.y)); k++ {
			r.bands[k] = append(r.bands[k], int32(s))
		}
	}
}

// maxBands bounds the entries of all bands.
const maxBands = 2_000_000

// band is the band at y, a function that never falls.
func (r *rim) band(y float64) int {
	n := len(r.bands)
	return min(n-1, max(0, int((y-r.lo.y)/(r.hi.y-r.lo.y)*float64(n))))
}

func (r *rim) column(x float64) int { return min(r.nx-1, max(0, int((x-r.lo.x)/r.cell))) }
func (r *rim) row(y float64) int    { return min(r.ny-1, max(0, int((y-r.lo.y)/r.cell))) }

// near calls do for the sides that may be within reach of the box lo–hi, some
// of them several times.
func (r *rim) near(lo, hi xy, reach float64, do func(s *rimSide)) {
	if lo.x > r.hi.x+reach || hi.x < r.lo.x-reach || lo.y > r.hi.y+reach || hi.y < r.lo.y-reach {
		return
	}
	for y := r.row(lo.y - reach); y <= r.row(hi.y+reach); y++ {
		for x := r.column(lo.x - reach); x <= r.column(hi.x+reach); x++ {
			c := y*r.nx + x
			for _, s := range r.list[r.first[c]:r.first[c+1]] {
				do(&r.sides[s])
			}
		}
	}
}

// onRim is a place on an edge.
type onRim struct {
	edge int
	t    float64
	d    float64 // distance from where it was looked for, or part of the way to it
}

// nearest returns the place of the rim that is nearest to p, within one cell,
// and the nearest on any other edge.
func (r *rim) nearest(p xy) (on, other onRim, ok bool) {
	on.d, other.d = math.Inf(1), math.Inf(1)
	r.near(p, p, r.cell, func(s *rimSide) {
		dx, dy := s.b.x-s.a.x, s.b.y-s.a.y
		u := min(1, max(0, ((p.x-s.a.x)*dx+(p.y-s.a.y)*dy)/(dx*dx+dy*dy)))
		c := onRim{s.edge, s.ta + u*(s.tb-s.ta), math.Hypot(s.a.x+u*dx-p.x, s.a.y+u*dy-p.y)}
		switch {
		case c.d < on.d:
			if c.edge != on.edge {
				other = on
			}
			on = c
		case c.edge != on.edge && c.d < other.d:
			other = c
		}
	})
	return on, other, on.d <= r.cell
}

// inside reports whether p is inside the outline and outside all holes.
func (r *rim) inside(p xy) bool {
	in := false
	for _, i := range r.bands[r.band(p.y)] {
		a, b := r.sides[i].a, r.sides[i].b
		if (a.y > p.y) != (b.y > p.y) && (orient(a, b, p) > 0) == (b.y > a.y) {
			in = !in
		}
	}
	return in
}

// crossings returns where the way from p to q meets the rim, in order; d is the
// part of the way.
func (r *rim) crossings(p, q xy, out []onRim) []onRim {
	out = out[:0]
	dx, dy := q.x-p.x, q.y-p.y
	ll := dx*dx + dy*dy
	lo, hi := xy{min(p.x, q.x), min(p.y, q.y)}, xy{max(p.x, q.x), max(p.y, q.y)}
	r.near(lo, hi, 0, func(s *rimSide) {
		ca := dx*(s.a.y-p.y) - dy*(s.a.x-p.x)
		cb := dx*(s.b.y-p.y) - dy*(s.b.x-p.x)
		if (ca >= 0) == (cb >= 0) {
			return
		}
		v := ca / (ca - cb)
		x, y := s.a.x+v*(s.b.x-s.a.x), s.a.y+v*(s.b.y-s.a.y)
		u := ((x-p.x)*dx + (y-p.y)*dy) / ll
		if u < 0 || u >= 1 {
			return
		}
		c := onRim{s.edge, s.ta + v*(s.tb-s.ta), u}
		at := len(out)
		for at > 0 && out[at-1].d >= u {
			if out[at-1] == c {
				return // the same side from another cell
			}
			at--
		}
		out = append(out, onRim{})
		copy(out[at+1:], out[at:])
		out[at] = c
	})
	return out
}
