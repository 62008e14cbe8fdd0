package mesh

import (
	"container/heap"
	"errors"
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"
)

// freePatch fills any outline, with or without a ring in it, by constrained
// Delaunay triangulation in the plane of the outline and refinement by
// circumcentres (Chew 1989, Ruppert 1995). The sides stay as they are divided,
// since neighbours share their nodes; inside, the size of triangles follows that
// of the sides nearby.
type freePatch struct{}

func (freePatch) relate(*division, *loop) {}

func (freePatch) triangles(b *builder, l *loop) float64 {
	n, length := 0, 0.0
	for _, e := range l.edges {
		n += b.count[e]
		length += b.curve[e].length
	}
	h := length / float64(n)
	return fanArea(b.sample(l)) / (h * h * math.Sqrt(3) / 4)
}

func (freePatch) fill(p *plot) {
	lines := [][]int32{p.b.outerNodes(p.l)}
	if p.l.ring >= 0 {
		lines = append(lines, p.b.ringNode[p.l.ring])
	}
	f := newFlat(p, lines)
	if f == nil {
		p.b.fail(p.l.part(), p.l.name, p.l.line, Degenerate, "move its points apart", "its boundary encloses no area: a mesh without area would come of it")
		return
	}
	d, err := f.outline()
	if err != nil {
		p.b.foldedOutline(p.l, f, err)
		return
	}
	mean := 0.0
	for _, h := range f.size[3:] {
		mean += h / float64(len(f.size)-3)
	}
	r := refinement{d: d, size: f.size, most: max(mean, p.b.meshSize(p.l)), in: d.inside(), rim: len(d.p)}
	r.run(MaxTriangles)
	r.smooth(4)
	// Nodes and triangles in space: offsets from the plane by mean value
	// coordinates (Floater 2003; Hormann and Floater 2006).
	node := make([]int32, len(d.p))
	for i := range node {
		node[i] = -1
	}
	copy(node[3:], f.node)
	for i := r.rim; i < len(d.p); i++ {
		if r.used[i] {
			node[i] = p.node(f.lift(d.p[i]))
		}
	}
	for t, in := range r.in {
		if in {
			v := d.v[t]
			p.tri(node[v[0]], node[v[1]], node[v[2]])
		}
	}
}

// flat is the outline of a patch seen along its normal.
type flat struct {
	origin, e1, e2, n r3.Vec
	node              []int32 // of all lines, one after the other
	p                 []xy
	h                 []float64 // offsets from the plane
	lines             [][2]int  // from, to in node
	size              []float64 // per point of the triangulation: length of the sides there
}

// newFlat lays lines of nodes, the outline first, into the plane of the outline,
// or of the ring in it; nil when the outline has no area there.
func newFlat(p *plot, lines [][]int32) *flat {
	f := &flat{}
	var pts []r3.Vec
	for _, l := range lines {
		from := len(f.node)
		f.node = append(f.node, l...)
		f.lines = append(f.lines, [2]int{from, len(f.node)})
	}
	for _, i := range f.node {
		pts = append(pts, p.at(i))
		f.origin = r3.Add(f.origin, r3.Scale(1/float64(len(f.node)), p.at(i)))
	}
	area := newell(pts[:len(lines[0])])
	if p.l.ring >= 0 {
		// Along the axis of the ring, as the ring is known to lie inside so.
		axis := p.b.ringAxis(p.l.ring)
		area = r3.Scale(r3.Dot(area, axis), axis)
	}
	around := 0.0
	for i := range lines[0] {
		around += dist(pts[i], pts[(i+1)%len(lines[0])])
	}
	if !(r3.Norm(area) > 1e-9*around*around) {
		return nil
	}
	f.n = r3.Unit(area)
	// Axes that turn with the outline.
	first := r3.Sub(pts[1], pts[0])
	if first = r3.Sub(first, r3.Scale(r3.Dot(first, f.n), f.n)); r3.Norm(first) > 0 {
		f.e1 = r3.Unit(first)
		f.e2 = r3.Cross(f.n, f.e1)
	} else {
		f.e1, f.e2 = frame(f.n)
	}
	for _, v := range pts {
		q, h := f.drop(v)
		f.p, f.h = append(f.p, q), append(f.h, h)
	}
	return f
}

func (f *flat) drop(v r3.Vec) (xy, float64) {
	d := r3.Sub(v, f.origin)
	return xy{r3.Dot(d, f.e1), r3.Dot(d, f.e2)}, r3.Dot(d, f.n)
}

// outline triangulates the nodes of the lines and holds their sides.
func (f *flat) outline() (*delaunay, error) {
	lo, hi := f.p[0], f.p[0]
	for _, q := range f.p {
		lo = xy{min(lo.x, q.x), min(lo.y, q.y)}
		hi = xy{max(hi.x, q.x), max(hi.y, q.y)}
	}
	d := newDelaunay(lo, hi)
	f.size = []float64{0, 0, 0}
	for _, q := range f.p {
		if _, err := d.add(q); err != nil {
			return nil, err
		}
	}
	for _, l := range f.lines {
		n := l[1] - l[0]
		for k := range n {
			i, j, before := l[0]+k, l[0]+(k+1)%n, l[0]+(k+n-1)%n
			if err := d.hold(int32(i+3), int32(j+3)); err != nil {
				return nil, err
			}
			a := math.Hypot(f.p[i].x-f.p[j].x, f.p[i].y-f.p[j].y)
			b := math.Hypot(f.p[i].x-f.p[before].x, f.p[i].y-f.p[before].y)
			f.size = append(f.size, (a+b)/2)
		}
	}
	d.settle()
	return d, nil
}

// lift returns the place in space over q.
func (f *flat) lift(q xy) r3.Vec {
	var sum, h float64
	at := func(w, height float64) r3.Vec {
		return r3.Add(f.origin, r3.Add(r3.Scale(q.x, f.e1), r3.Add(r3.Scale(q.y, f.e2), r3.Scale(height/w, f.n))))
	}
	for _, l := range f.lines {
		n := l[1] - l[0]
		dx := func(k int) (float64, float64, float64) {
			p := f.p[l[0]+k%n]
			x, y := p.x-q.x, p.y-q.y
			return x, y, math.Hypot(x, y)
		}
		x0, y0, r0 := dx(n - 1)
		x1, y1, r1 := dx(0)
		t0 := halfTan(x0, y0, r0, x1, y1, r1)
		for k := range n {
			x2, y2, r2 := dx(k + 1)
			if r1 == 0 {
				return at(1, f.h[l[0]+k])
			}
			t1 := halfTan(x1, y1, r1, x2, y2, r2)
			w := (t0 + t1) / r1
			sum += w
			h += w * f.h[l[0]+k]
			x1, y1, r1, t0 = x2, y2, r2, t1
		}
	}
	return at(sum, h)
}

// halfTan returns the tangent of half the signed angle from one vector to
// another, given with their lengths.
func halfTan(x0, y0, r0, x1, y1, r1 float64) float64 {
	cross, dot := x0*y1-y0*x1, x0*x1+y0*y1
	if cross == 0 {
		return 0
	}
	return (r0*r1 - dot) / cross
}

// refinement adds points to a constrained triangulation until its triangles are
// small and fat enough.
type refinement struct {
	d    *delaunay
	size []float64 // per point
	most float64   // largest wanted side
	in   []bool    // per triangle: inside the outline
	rim  int       // points of the outline and far corners
	used []bool    // per point: corner of a triangle inside
	heap badHeap
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
)

type bad struct {
	r float64
	t int32
	v [3]int32
}

type badHeap []bad

func (h badHeap) Len() int { return len(h) }
func (h badHeap) Less(i, j int) bool {
	if h[i].r != h[j].r {
		return h[i].r > h[j].r
	}
	return slices.Compare(h[i].v[:], h[j].v[:]) < 0
}
func (h badHeap) Swap(i, j int) { h[i], h[j] = h[j], h[i] }
func (h *badHeap) Push(x any)   { *h = append(*h, x.(bad)) }
func (h *badHeap) Pop() any {
	old := *h
	x := old[len(old)-1]
	*h = old[:len(old)-1]
	return x
}

// circumcentre returns the centre and radius of the circle through a, b, c and
// the shortest side.
func circumcentre(a, b, c xy) (o xy, r, shortest float64) {
	bx, by, cx, cy := b.x-a.x, b.y-a.y, c.x-a.x, c.y-a.y
	bl, cl := bx*bx+by*by, cx*cx+cy*cy
	det := 2 * (bx*cy - by*cx)
	ux, uy := (cy*bl-by*cl)/det, (bx*cl-cx*bl)/det
	return xy{a.x + ux, a.y + uy}, math.Hypot(ux, uy),
		math.Sqrt(min(bl, cl, (bx-cx)*(bx-cx)+(by-cy)*(by-cy)))
}

// look puts a triangle on the list if it is not good enough.
func (r *refinement) look(t int32) {
	if !r.in[t] {
		return
	}
	v := r.d.v[t]
	_, radius, shortest := circumcentre(r.d.p[v[0]], r.d.p[v[1]], r.d.p[v[2]])
	want := (r.size[v[0]] + r.size[v[1]] + r.size[v[2]]) / 3
	if radius > large*want || radius > fat*shortest {
		heap.Push(&r.heap, bad{radius / want, t, v})
	}
}

// run splits triangles until all are good or none of those left can be split:
// a new point that would come too close to the outline is left out. It ends
// because new points are never closer to others than the shortest side there
// was, and budget bounds the number of triangles in any case.
func (r *refinement) run(budget int) {
	for t := range r.d.v {
		r.look(int32(t))
	}
	for len(r.heap) > 0 && len(r.d.v) < 2*budget {
		x := heap.Pop(&r.heap).(bad)
		if r.d.v[x.t] != x.v || !r.in[x.t] {
			continue
		}
		a, b, c := r.d.p[x.v[0]], r.d.p[x.v[1]], r.d.p[x.v[2]]
		o, _, _ := circumcentre(a, b, c)
		t, side, blocked := r.d.locate(o, x.t, true)
		if blocked || side == 3 || !r.in[t] || r.crowds(o, t) {
			continue
		}
		r.insert(o, t, side)
	}
	r.mark()
}

// crowds reports whether o lies so near a side of the outline at triangle t that
// it sees it under more than 120° (Chew 1993), or closer to a point than half the
// wanted side.
func (r *refinement) crowds(o xy, t int32) bool {
	d := r.d
	near := []int32{t}
	for _, n := range d.n[t] {
		if n >= 0 {
			near = append(near, n)
		}
	}
	for _, t := range near {
		for i := range 3 {
			a, b := d.p[d.v[t][(i+1)%3]], d.p[d.v[t][(i+2)%3]]
			if !d.held[t][i] {
				continue
			}
			la, lb := math.Hypot(a.x-o.x, a.y-o.y), math.Hypot(b.x-o.x, b.y-o.y)
			if (a.x-o.x)*(b.x-o.x)+(a.y-o.y)*(b.y-o.y) < -0.5*la*lb {
				return true
			}
		}
	}
	for _, i := range d.v[t] {
		if math.Hypot(d.p[i].x-o.x, d.p[i].y-o.y) < 0.5*r.size[i] {
			return true
		}
	}
	return false
}

func (r *refinement) insert(o xy, t int32, side int) {
	d := r.d
	want := r.most
	for _, i := range d.v[t] {
		want = min(want, r.size[i]+growth*math.Hypot(d.p[i].x-o.x, d.p[i].y-o.y))
	}
	if side >= 0 && d.held[t][side] {
		return
	}
	i := d.insert(o, t, side)
	r.size = append(r.size, want)
	for len(r.in) < len(d.v) {
		r.in = append(r.in, true)
	}
	for start, k := d.at[i], d.at[i]; ; {
		r.look(k)
		if k = d.n[k][(d.corner(k, i)+1)%3]; k == start || k < 0 {
			break
		}
	}
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

// smooth moves each inner point to the mean of its neighbours where that does
// not make the least angle around it smaller, and makes the mesh Delaunay again.
func (r *refinement) smooth(rounds int) {
	d := r.d
	for range rounds {
		for i := r.rim; i < len(d.p); i++ {
			var sum xy
			n := 0
			before := r.least(int32(i), d.p[i])
			for start, t := d.at[i], d.at[i]; ; {
				k := d.corner(t, int32(i))
				q := d.p[d.v[t][(k+1)%3]]
				sum = xy{sum.x + q.x, sum.y + q.y}
				n++
				if t = d.n[t][(k+1)%3]; t == start {
					break
				}
			}
			to := xy{sum.x / float64(n), sum.y / float64(n)}
			if r.least(int32(i), to) > before {
				d.p[i] = to
			}
		}
		d.settle()
	}
}

// least returns the least angle of the triangles around point i if it were at q,
// as its tangent-like measure: negative when one is turned over.
func (r *refinement) least(i int32, q xy) float64 {
	d := r.d
	worst := math.Inf(1)
	for start, t := d.at[i], d.at[i]; ; {
		k := d.corner(t, i)
		a, b := d.p[d.v[t][(k+1)%3]], d.p[d.v[t][(k+2)%3]]
		area := (a.x-q.x)*(b.y-q.y) - (a.y-q.y)*(b.x-q.x)
		l0 := (a.x-q.x)*(a.x-q.x) + (a.y-q.y)*(a.y-q.y)
		l1 := (b.x-q.x)*(b.x-q.x) + (b.y-q.y)*(b.y-q.y)
		l2 := (a.x-b.x)*(a.x-b.x) + (a.y-b.y)*(a.y-b.y)
		// Sine of the smallest angle: twice the area over the two longer sides.
		worst = min(worst, area/math.Sqrt(l0*l1*l2/min(l0, l1, l2)))
		if t = d.n[t][(k+1)%3]; t == start || t < 0 {
			break
		}
	}
	return worst
}

// foldedOutline says why an outline cannot be triangulated.
func (b *builder) foldedOutline(l *loop, f *flat, err error) {
	what := "crosses itself"
	if errors.Is(err, errTouch) || errors.Is(err, errTwice) {
		what = "touches itself"
	}
	b.fail(l.part(), l.name, l.line, Degenerate, "divide it with a seam or cable into parts that are seen whole from one side",
		"its boundary %s when seen along its normal (%.2f, %.2f, %.2f)", what, f.n.X, f.n.Y, f.n.Z)
}
