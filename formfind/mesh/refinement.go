package mesh

import (
	"math"
	"slices"
)

// refinement adds points to a constrained triangulation until its triangles are
// small and fat enough.
type refinement struct {
	d    *delaunay
	size []float64 // per point: wanted side there
	most float64   // largest wanted side
	in   []bool    // per triangle: inside the outline
	rim  int       // points of the outline and far corners
	used []bool    // per point: corner of a triangle inside
	good []bool    // per triangle: small enough to be left behind the front
	todo badQueue
	full bool // the budget ended it
}

const (
	// A triangle is split when its circumradius is more than fat times its
	// shortest side (least angle asin(1/2·fat) = 28°) …
	fat = 1.065
	// … or more than large times the wanted side; that of an equilateral
	// triangle is 0.577.
	large = 0.76
	// growth of the wanted side per distance from what is smaller.
	growth = 0.2
	// No point is put closer to another than apart times the wanted side.
	apart = 0.5
)

// bad is a triangle to be split, known by its corners: it is gone when they are
// no longer its own.
type bad struct {
	t int32
	v [3]int32
}

// badQueue gives out the largest triangles first, in steps of a 32nd of an
// octave of the circumradius, and within a step those first that came first: fronts
// advance evenly, and rounding hardly ever decides what comes first.
type badQueue struct {
	step [1024]struct {
		list []bad
		next int
	}
	top int // highest step with something in it
	len int
}

// push adds triangle t of the given circumradius over wanted side.
func (q *badQueue) push(radius float64, x bad) {
	// 0.0171 keeps sizes that are likely off the limits of a step.
	k := min(max(int(32*math.Log2(radius)+81.0171), 0), len(q.step)-1)
	s := &q.step[k]
	if len(s.list) == cap(s.list) && s.next > len(s.list)/2 {
		s.list = s.list[:copy(s.list, s.list[s.next:])]
		s.next = 0
	}
	s.list = append(s.list, x)
	q.top = max(q.top, k)
	q.len++
}

// pop removes the first; there must be one.
func (q *badQueue) pop() bad {
	for q.step[q.top].next == len(q.step[q.top].list) {
		q.top--
	}
	s := &q.step[q.top]
	x := s.list[s.next]
	s.next++
	q.len--
	if s.next == len(s.list) {
		s.list, s.next = s.list[:0], 0
	}
	return x
}

// circumcentre returns the centre and radius of the circle through a, b, c and
// the shortest side. Of needles the centre may be infinite or NaN.
func circumcentre(a, b, c xy) (o xy, r, shortest float64) {
	bx, by, cx, cy := b.x-a.x, b.y-a.y, c.x-a.x, c.y-a.y
	bl, cl := bx*bx+by*by, cx*cx+cy*cy
	det := 2 * (bx*cy - by*cx)
	ux, uy := (cy*bl-by*cl)/det, (bx*cl-cx*bl)/det
	return xy{a.x + ux, a.y + uy}, math.Sqrt(ux*ux + uy*uy),
		math.Sqrt(min(bl, cl, (bx-cx)*(bx-cx)+(by-cy)*(by-cy)))
}

func finite(q xy) bool { return !math.IsNaN(q.x-q.x) && !math.IsNaN(q.y-q.y) }

// run splits triangles until all are good or none of those left can be split: a
// new point that would come too close to a side of the outline or to another
// point is left out. It ends because no point is put closer to another than
// half of a wanted side, which leaves room for a finite number; budget bounds
// the number of triangles in any case.
//
// First a front advances from the outline (Rebay 1993): its points make nearly
// equilateral triangles. Where fronts have met, circumcentres do the rest
// (Chew 1989, Ruppert 1995).
func (r *refinement) run(budget int) {
	r.reserve(min(r.expected(), budget/2))
	r.advance(budget)
	r.improve(budget)
	r.good = nil
	r.arrange()
	r.smooth(4)
	r.mark()
}

// expected is about how many points will be added if all triangles become as
// large as they may.
func (r *refinement) expected() int {
	area := 0.0
	for t, in := range r.in {
		if in {
			v := r.d.v[t]
			a, b, c := r.d.p[v[0]], r.d.p[v[1]], r.d.p[v[2]]
			area += (b.x-a.x)*(c.y-a.y) - (b.y-a.y)*(c.x-a.x)
		}
	}
	// Two triangles a point; equilateral ones have √3/4·most².
	return int(1.02 * min(area/2/(r.most*r.most*math.Sqrt(3)/2), MaxTriangles))
}

// reserve makes room for n more points and the triangles that come with them.
// Room that doubles costs less than room that grows by a quarter.
func (r *refinement) reserve(n int) {
	d := r.d
	n += 8
	d.p, d.at, r.size = slices.Grow(d.p, n), slices.Grow(d.at, n), slices.Grow(r.size, n)
	d.v, d.n, d.held = slices.Grow(d.v, 2*n), slices.Grow(d.n, 2*n), slices.Grow(d.held, 2*n)
	r.in, r.good = slices.Grow(r.in, 2*n), slices.Grow(r.good, 2*n)
}

// shape returns the circumradius of t over the wanted side, and whether t is
// small enough and fat enough.
func (r *refinement) shape(t int32) (o xy, radius float64, small, thick bool) {
	v := &r.d.v[t]
	o, circle, shortest := circumcentre(r.d.p[v[0]], r.d.p[v[1]], r.d.p[v[2]])
	want := (r.size[v[0]] + r.size[v[1]] + r.size[v[2]]) / 3
	radius = circle / want
	if !(radius < math.MaxFloat32) {
		radius = math.MaxFloat32
	}
	return o, radius, radius <= large, circle <= fat*shortest
}

// advance puts points in front of sides of the outline and of good triangles.
func (r *refinement) advance(budget int) {
	d := r.d
	r.good = append(r.good, make([]bool, len(d.v))...)
	for t := range d.v {
		if r.in[t] {
			_, _, r.good[t], _ = r.shape(int32(t))
		}
	}
	for t := range d.v {
		r.front(int32(t))
	}
	for r.todo.len > 0 && !r.spent(budget) {
		x := r.todo.pop()
		if d.v[x.t] != x.v || r.good[x.t] {
			continue
		}
		q, ok := r.ahead(x.t)
		if !ok || !finite(q) { // sides so short that their squares vanish
			continue
		}
		t, side, blocked := d.locate(q, x.t, true)
		if blocked || side == 3 || !r.in[t] || r.crowds(q, t) {
			continue
		}
		i, ok := r.insert(q, t, side)
		if !ok {
			continue
		}
		d.around(i, func(t, _, _ int32) { _, _, r.good[t], _ = r.shape(t) })
		d.around(i, func(t, _, _ int32) {
			if !r.good[t] {
				r.front(t)
				return
			}
			for _, o := range d.n[t] {
				if o >= 0 {
					r.front(o)
				}
			}
		})
	}
	r.todo = badQueue{}
}

// open reports whether side i of t is one that the front starts from.
func (r *refinement) open(t int32, i int) bool {
	return r.d.held[t][i] || r.good[r.d.n[t][i]]
}

// front puts t on the list if it is too large and has an open side.
func (r *refinement) front(t int32) {
	if !r.in[t] || r.good[t] {
		return
	}
	for i := range 3 {
		if r.open(t, i) {
			_, radius, _, _ := r.shape(t)
			r.todo.push(radius, bad{t, r.d.v[t]})
			return
		}
	}
}

// ahead returns the point before the shortest open side of t that makes a
// triangle of the wanted size with it (Rebay 1993): on the line from the middle
// of the side to the circumcentre, no farther than that allows.
func (r *refinement) ahead(t int32) (q xy, ok bool) {
	d := r.d
	o, _, _, _ := r.shape(t)
	if !finite(o) {
		return q, false
	}
	shortest := math.Inf(1)
	for i := range 3 {
		if !r.open(t, i) {
			continue
		}
		va, vb := d.v[t][(i+1)%3], d.v[t][(i+2)%3]
		a, b := d.p[va], d.p[vb]
		m := xy{(a.x + b.x) / 2, (a.y + b.y) / 2}
		// Inwards, at right angles to the side.
		nx, ny := a.y-b.y, b.x-a.x
		l := math.Sqrt(nx*nx + ny*ny)
		far := ((o.x-m.x)*nx + (o.y-m.y)*ny) / l
		if far <= 0 || l >= shortest {
			continue
		}
		shortest = l
		half := l / 2
		circle := (r.size[va] + r.size[vb]) / 2 / math.Sqrt(3)
		circle = min(max(circle, half), (half*half+far*far)/(2*far))
		step := (circle + math.Sqrt(max(0, circle*circle-half*half))) / l
		q, ok = xy{m.x + step*nx, m.y + step*ny}, true
	}
	return q, ok
}

// improve splits what is too large or too thin at circumcentres.
func (r *refinement) improve(budget int) {
	for t := range r.d.v {
		r.look(int32(t))
	}
	for r.todo.len > 0 && !r.spent(budget) {
		x := r.todo.pop()
		if r.d.v[x.t] != x.v {
			continue
		}
		o, _, _, _ := r.shape(x.t)
		if !finite(o) {
			continue
		}
		t, side, blocked := r.d.locate(o, x.t, true)
		if blocked || side == 3 || !r.in[t] || r.crowds(o, t) {
			continue
		}
		if i, ok := r.insert(o, t, side); ok {
			r.d.around(i, func(t, _, _ int32) { r.look(t) })
		}
	}
	r.todo = badQueue{}
}

// look puts a triangle on the list if it is not good enough.
func (r *refinement) look(t int32) {
	if !r.in[t] {
		return
	}
	if _, radius, small, thick := r.shape(t); !small || !thick {
		r.todo.push(radius, bad{t, r.d.v[t]})
	}
}

// spent reports whether the budget of triangles is.
func (r *refinement) spent(budget int) bool {
	r.full = r.full || len(r.d.v) >= 2*budget
	return r.full
}

// crowds reports whether o lies so near a side of the outline at triangle t that
// it sees it under more than 120° (Chew 1993), or too close to a point.
func (r *refinement) crowds(o xy, t int32) bool {
	d := r.d
	for _, i := range d.v[t] {
		if x, y, s := d.p[i].x-o.x, d.p[i].y-o.y, apart*r.size[i]; x*x+y*y < s*s {
			return true
		}
	}
	if r.sees(o, t) {
		return true
	}
	for _, n := range d.n[t] {
		if n >= 0 && r.sees(o, n) {
			return true
		}
	}
	return false
}

// sees reports whether o sees a held side of t under more than 120°.
func (r *refinement) sees(o xy, t int32) bool {
	d := r.d
	for i := range 3 {
		if !d.held[t][i] {
			continue
		}
		a, b := d.p[d.v[t][(i+1)%3]], d.p[d.v[t][(i+2)%3]]
		ax, ay, bx, by := a.x-o.x, a.y-o.y, b.x-o.x, b.y-o.y
		if dot := ax*bx + ay*by; dot < 0 && dot*dot > 0.25*(ax*ax+ay*ay)*(bx*bx+by*by) {
			return true
		}
	}
	return false
}

// insert adds o in t, or on a side of it that is not held.
func (r *refinement) insert(o xy, t int32, side int) (int32, bool) {
	d := r.d
	if side >= 0 && d.held[t][side] {
		return -1, false
	}
	want := r.most
	for _, i := range d.v[t] {
		x, y := d.p[i].x-o.x, d.p[i].y-o.y
		want = min(want, r.size[i]+growth*math.Sqrt(x*x+y*y))
	}
	if n := len(d.p); n == cap(d.p) || len(d.v)+2 > cap(d.v) {
		r.reserve(n)
	}
	i := d.insert(o, t, side)
	r.size = append(r.size, want)
	for len(r.in) < len(d.v) {
		r.in = append(r.in, true)
		r.good = append(r.good, false)
	}
	return i, true
}

// mark notes which points are corners of triangles inside.
func (r *refinement) mark() {
	r.used = make([]bool, len(r.d.p))
	for t, in := range r.in {
		if in {
			for _, i := range r.d.v[t] {
				r.used[i] = true
			}
		}
	}
}
