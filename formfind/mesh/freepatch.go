package mesh

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"
)

// freePatch fills any outline, with a ring, holes, lines and points in it, by
// constrained Delaunay triangulation in the plane of the outline and refinement by
// circumcentres (Chew 1989, Ruppert 1995). The sides stay as they are divided,
// since neighbours share their nodes; which of them should be divided further is
// noted (see narrow.go). Inside, the size of triangles follows that of the sides
// nearby.
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
	d, in, ok := p.choosePlane(f)
	if !ok {
		return
	}
	if !p.allInside(f, d, in) {
		return
	}
	r := refinement{d: d, size: f.size, most: max(f.mean, p.b.meshSize(l)), in: in, rim: len(d.p)}
	r.run(max(0, MaxTriangles-len(p.b.s.Corners)))
	height := f.heights(&r)
	node := make([]int32, len(d.p))
	for i := range node {
		node[i] = -1
	}
	copy(node[3:], f.node)
	q := r.inspect()
	if q.thin > 0 {
		p.wishFor(r.obstacles(), node)
	}
	p.b.reserve(len(d.p)-r.rim, q.triangles, 12+len(l.name))
	for i := r.rim; i < len(d.p); i++ {
		if r.used[i] {
			node[i] = p.node(f.lift(d.p[i], height[i]))
		}
	}
	h := 0.0
	for _, z := range f.h {
		h += z / float64(len(f.h))
	}
	quality := Quality{Fabric: l.name, Triangles: q.triangles, Mean: q.mean, Worst: q.worst, LeastAngle: q.angle,
		Met: q.met, thin: q.thin, At: f.lift(q.at, h), Why: q.why, Sharp: q.sharp, Corner: -1, CornerAngle: q.cornerAngle}
	if q.corner >= 0 {
		quality.Corner = node[q.corner]
	}
	p.b.quality = append(p.b.quality, quality)
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

	at     []r3.Vec // per node: its place
	area   r3.Vec   // vector area of the outline
	around float64  // length of the outline
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
	f.area, f.around, f.at = area, around, pts
	f.lay(r3.Unit(area))
	return f
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
	if i, err := d.addAll(f.p); err != nil {
		return nil, nil, f.owner(i, err)
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
