package mesh

import (
	"container/heap"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"
)

// freePatch fills any outline, with a ring, holes, lines and points in it, by constrained
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
	l := p.l
	rims := [][]int32{p.b.outerNodes(l)}
	if l.ring >= 0 {
		rims = append(rims, p.b.ringNode[l.ring])
	}
	for _, h := range l.holes {
		rims = append(rims, p.b.outerNodes(h))
	}
	var chains [][]int32
	for _, e := range l.lines {
		chains = append(chains, p.b.edgeNode[e])
	}
	var points []int32
	for _, q := range l.points {
		points = append(points, p.b.node[q])
	}
	f := newFlat(p, rims, chains, points)
	if f == nil {
		p.b.fail(l.part(), l.name, l.line, Degenerate, "move its points apart", "its boundary encloses no area: a mesh without area would come of it")
		return
	}
	d, in, err := f.outline()
	if err != nil {
		p.b.foldedOutline(l, f, err)
		return
	}
	if !p.allInside(f, d, in) {
		return
	}
	r := refinement{d: d, size: f.size, most: max(f.mean, p.b.meshSize(l)), in: in, rim: len(d.p)}
	r.run(MaxTriangles)
	r.smooth(4)
	height := f.heights(&r)
	node := make([]int32, len(d.p))
	for i := range node {
		node[i] = -1
	}
	copy(node[3:], f.node)
	for i := r.rim; i < len(d.p); i++ {
		if r.used[i] {
			node[i] = p.node(f.lift(d.p[i], height[i]))
		}
	}
	for t, in := range r.in {
		if in {
			v := d.v[t]
			p.tri(node[v[0]], node[v[1]], node[v[2]])
		}
	}
}

// allInside checks that holes, lines and points lie inside the outline.
func (p *plot) allInside(f *flat, d *delaunay, in []bool) bool {
	l := p.l
	ok := true
	outside := func(part, name string, line int, what string) {
		ok = false
		p.b.fail(part, name, line, Mismatch, "move it inside, or leave it out of the fabric", "it does not lie inside fabric %s, seen along (%.2f, %.2f, %.2f)%s", l.name, f.n.X, f.n.Y, f.n.Z, what)
	}
	beside := func(i, j int) (left, right bool) {
		t, side, _ := d.edge(int32(i+3), int32(j+3))
		left, right = in[t], in[d.n[t][side]]
		if d.v[t][(side+1)%3] != int32(i+3) {
			left, right = right, left
		}
		return left, right
	}
	for k, rim := range f.rims[1:] {
		k -= len(f.rims) - 1 - len(l.holes)
		if k < 0 {
			continue // a ring is known to lie inside
		}
		inner, outer := beside(rim[0], rim[1])
		if f.turn(rim) < 0 {
			inner, outer = outer, inner
		}
		if inner || !outer {
			e := p.b.m.Edges[l.holes[k].edges[0]]
			outside("edge", e.Name, e.Line, ": its hole has no fabric around it")
		}
	}
	for k, chain := range f.chains {
		for j := 1; j < len(chain); j++ {
			if a, b := beside(chain[j-1], chain[j]); !a || !b {
				e := p.b.m.Edges[l.lines[k]]
				outside("edge", e.Name, e.Line, "")
				break
			}
		}
	}
	for k, i := range f.points {
		if !in[d.at[i+3]] {
			q := p.b.m.Points[l.points[k]]
			outside("point", q.Name, q.Line, "")
		}
	}
	return ok
}

// turn returns the area within a closed line, positive when it runs
// counter-clockwise.
func (f *flat) turn(rim []int) float64 {
	a := 0.0
	o := f.p[rim[0]]
	for k, i := range rim {
		p, q := f.p[i], f.p[rim[(k+1)%len(rim)]]
		a += ((p.x-o.x)*(q.y-o.y) - (p.y-o.y)*(q.x-o.x)) / 2
	}
	return a
}

// flat is the outline of a patch, and what lies in it, seen along its normal.
type flat struct {
	origin, e1, e2, n r3.Vec
	node              []int32 // of all that follows, each once
	p                 []xy
	h                 []float64 // offsets from the plane
	rims              [][]int   // closed lines, the outline first: indices into node
	chains            [][]int   // open lines inside
	points            []int     // single points inside
	size              []float64 // per point of the triangulation: length of the sides there
	mean              float64   // mean side
	lone              float64   // wanted side at single points
}

// newFlat lays lines of nodes, the outline first, into the plane of the outline,
// or of the ring in it; nil when the outline has no area there.
func newFlat(p *plot, rims, chains [][]int32, points []int32) *flat {
	f := &flat{lone: p.b.meshSize(p.l)}
	local := map[int32]int{}
	var pts []r3.Vec
	index := func(list []int32) []int {
		out := make([]int, len(list))
		for k, i := range list {
			j, ok := local[i]
			if !ok {
				j = len(f.node)
				local[i] = j
				f.node = append(f.node, i)
				pts = append(pts, p.at(i))
			}
			out[k] = j
		}
		return out
	}
	for _, l := range rims {
		f.rims = append(f.rims, index(l))
	}
	for _, l := range chains {
		f.chains = append(f.chains, index(l))
	}
	f.points = index(points)
	for _, v := range pts {
		f.origin = r3.Add(f.origin, r3.Scale(1/float64(len(pts)), v))
	}
	// The nodes of the outline come first.
	outer := pts[:len(rims[0])]
	area := newell(outer)
	if p.l.ring >= 0 {
		// Along the axis of the ring, as the ring is known to lie inside so.
		axis := p.b.ringAxis(p.l.ring)
		area = r3.Scale(r3.Dot(area, axis), axis)
	}
	around := 0.0
	for i := range outer {
		around += dist(outer[i], outer[(i+1)%len(outer)])
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

// lift returns the place in space at height h over q.
func (f *flat) lift(q xy, h float64) r3.Vec {
	return r3.Add(f.origin, r3.Add(r3.Scale(q.x, f.e1), r3.Add(r3.Scale(q.y, f.e2), r3.Scale(h, f.n))))
}

// outline triangulates all nodes and holds the sides of all lines. in says which
// triangles lie between the rims.
func (f *flat) outline() (d *delaunay, in []bool, fault *flatError) {
	lo, hi := f.p[0], f.p[0]
	for _, q := range f.p {
		lo = xy{min(lo.x, q.x), min(lo.y, q.y)}
		hi = xy{max(hi.x, q.x), max(hi.y, q.y)}
	}
	d = newDelaunay(lo, hi)
	for i, q := range f.p {
		if _, err := d.add(q); err != nil {
			return nil, nil, f.owner(i, err)
		}
	}
	sum, num := make([]float64, len(f.p)), make([]float64, len(f.p))
	total, sides := 0.0, 0.0
	hold := func(i, j int) error {
		s := math.Hypot(f.p[i].x-f.p[j].x, f.p[i].y-f.p[j].y)
		for _, k := range [2]int{i, j} {
			sum[k] += s
			num[k]++
		}
		total += s
		sides++
		return d.hold(int32(i+3), int32(j+3))
	}
	for r, rim := range f.rims {
		for k, i := range rim {
			if err := hold(i, rim[(k+1)%len(rim)]); err != nil {
				return nil, nil, &flatError{err: err, rim: r, chain: -1}
			}
		}
	}
	// Lines inside part nothing: what is inside is known before they are held,
	// and flips do not lead out of it.
	in = d.inside()
	for c, chain := range f.chains {
		for k := 1; k < len(chain); k++ {
			if err := hold(chain[k-1], chain[k]); err != nil {
				return nil, nil, &flatError{err: err, rim: -1, chain: c}
			}
		}
	}
	f.mean = total / sides
	f.size = []float64{0, 0, 0}
	for i := range f.p {
		if num[i] > 0 {
			f.size = append(f.size, sum[i]/num[i])
		} else {
			f.size = append(f.size, f.lone)
		}
	}
	d.settle()
	return d, in, nil
}

// heights returns the height over the plane of every point of r. Between rims
// alone they follow from mean value coordinates (Floater 2003; Hormann and
// Floater 2006), with lines and points inside, or very many points, each inner
// height is the mean of its neighbours'.
func (f *flat) heights(r *refinement) []float64 {
	h := make([]float64, len(r.d.p))
	copy(h[3:], f.h)
	inner := len(r.d.p) - r.rim
	if len(f.chains)+len(f.points) > 0 || inner*len(f.p) > 2e8 {
		r.relaxHeights(h)
		return h
	}
	for i := r.rim; i < len(r.d.p); i++ {
		h[i] = f.meanValue(r.d.p[i])
	}
	return h
}

// relaxHeights makes each height from r.rim on the mean of its neighbours', by
// conjugate gradients.
func (r *refinement) relaxHeights(h []float64) {
	n := len(h) - r.rim
	if n == 0 {
		return
	}
	start := make([]int32, n+1)
	var near []int32
	for i := range n {
		if p := int32(r.rim + i); r.used[p] {
			r.d.around(p, func(_, q, _ int32) { near = append(near, q) })
		}
		start[i+1] = int32(len(near))
	}
	apply := func(out, x []float64) (dot float64) {
		for i := range n {
			s := float64(start[i+1]-start[i]) * x[i]
			for _, q := range near[start[i]:start[i+1]] {
				if int(q) >= r.rim {
					s -= x[int(q)-r.rim]
				}
			}
			out[i] = s
			dot += s * x[i]
		}
		return dot
	}
	x, res, dir, tmp := h[r.rim:], make([]float64, n), make([]float64, n), make([]float64, n)
	rr := 0.0
	for i := range n {
		for _, q := range near[start[i]:start[i+1]] {
			if int(q) < r.rim {
				res[i] += h[q]
			}
		}
		dir[i] = res[i]
		rr += res[i] * res[i]
	}
	for first, step := rr, 0; step < 20*int(math.Sqrt(float64(n)))+50 && rr > 1e-16*first; step++ {
		alpha := rr / apply(tmp, dir)
		next := 0.0
		for i := range n {
			x[i] += alpha * dir[i]
			res[i] -= alpha * tmp[i]
			next += res[i] * res[i]
		}
		for i := range n {
			dir[i] = res[i] + next/rr*dir[i]
		}
		rr = next
	}
}

// meanValue returns the height over q.
func (f *flat) meanValue(q xy) float64 {
	var sum, h float64
	for _, rim := range f.rims {
		n := len(rim)
		at := func(k int) (float64, float64, float64) {
			p := f.p[rim[k%n]]
			x, y := p.x-q.x, p.y-q.y
			return x, y, math.Hypot(x, y)
		}
		x0, y0, r0 := at(n - 1)
		x1, y1, r1 := at(0)
		t0 := halfTan(x0, y0, r0, x1, y1, r1)
		for k := range n {
			x2, y2, r2 := at(k + 1)
			if r1 == 0 {
				return f.h[rim[k]]
			}
			t1 := halfTan(x1, y1, r1, x2, y2, r2)
			w := (t0 + t1) / r1
			sum += w
			h += w * f.h[rim[k]]
			x1, y1, r1, t0 = x2, y2, r2, t1
		}
	}
	return h / sum
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

// flatError is a fault of an outline with the line it was found at.
type flatError struct {
	err        error
	rim, chain int // index, −1 = none
}

func (e *flatError) Error() string { return e.err.Error() }

// owner returns err as the fault of the line that has node i.
func (f *flat) owner(i int, err error) *flatError {
	for k, rim := range f.rims {
		if slices.Contains(rim, i) {
			return &flatError{err: err, rim: k, chain: -1}
		}
	}
	for k, chain := range f.chains {
		if slices.Contains(chain, i) {
			return &flatError{err: err, rim: -1, chain: k}
		}
	}
	return &flatError{err: err, rim: -1, chain: -1}
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
		b.fail(l.part(), l.name, l.line, Degenerate, "divide it with a seam or cable into parts that are seen whole from one side",
			"its boundary %s itself %s", what, seen)
	}
}
