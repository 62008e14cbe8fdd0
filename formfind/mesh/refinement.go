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
	heap badHeap
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

// bad is a triangle to be split. Its key is of single precision and ties are
// broken by its corners, so that rounding does not decide what comes first.
type bad struct {
	key float32
	t   int32
	v   [3]int32
}

func (x bad) before(y bad) bool {
	if x.key != y.key {
		return x.key > y.key
	}
	return slices.Compare(x.v[:], y.v[:]) < 0
}

// badHeap is a binary heap, the worst triangle first.
type badHeap []bad

func (h *badHeap) push(x bad) {
	a := append(*h, x)
	i := len(a) - 1
	for i > 0 {
		up := (i - 1) / 2
		if !x.before(a[up]) {
			break
		}
		a[i] = a[up]
		i = up
	}
	a[i] = x
	*h = a
}

func (h *badHeap) pop() bad {
	a := *h
	top, x := a[0], a[len(a)-1]
	a = a[:len(a)-1]
	*h = a
	if len(a) == 0 {
		return top
	}
	i := 0
	for {
		down := 2*i + 1
		if down >= len(a) {
			break
		}
		if down+1 < len(a) && a[down+1].before(a[down]) {
			down++
		}
		if !a[down].before(x) {
			break
		}
		a[i] = a[down]
		i = down
	}
	a[i] = x
	return top
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
	r.advance(budget)
	r.improve(budget)
	r.smooth(4)
	r.mark()
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
	r.good = make([]bool, len(d.v), 2*len(d.v))
	for t := range d.v {
		if r.in[t] {
			_, _, r.good[t], _ = r.shape(int32(t))
		}
	}
	for t := range d.v {
		r.front(int32(t))
	}
	for len(r.heap) > 0 && !r.spent(budget) {
		x := r.heap.pop()
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
	r.heap = r.heap[:0]
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
			r.heap.push(bad{float32(radius), t, r.d.v[t]})
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
	for len(r.heap) > 0 && !r.spent(budget) {
		x := r.heap.pop()
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
	r.heap = r.heap[:0]
}

// look puts a triangle on the list if it is not good enough.
func (r *refinement) look(t int32) {
	if !r.in[t] {
		return
	}
	if _, radius, small, thick := r.shape(t); !small || !thick {
		r.heap.push(bad{float32(radius), t, r.d.v[t]})
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
