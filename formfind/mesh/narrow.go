package mesh

import (
	"math"
	"slices"

	"anticlast/formfind/canopy"
)

// Where an outline is narrower than the sides it is divided into, no mesh of
// fat triangles fits between them. Ruppert (1995) and Chew (1993) then halve the
// side that stands between a thin triangle and the centre of its circle. Here
// a side belongs to all fabrics along its edge, so all fabrics are meshed first,
// then the sides in the way of any are divided, at places of the curve itself,
// and all are meshed again, until nothing stands in the way or nothing can be
// divided.

const (
	// narrowRounds is how often fabrics are meshed again at most. A round
	// divides a side by up to narrowParts.
	narrowRounds = 8
	narrowParts  = 8
	// narrowest is the least length of a side made so, over the wanted one.
	narrowest = 1.0 / 50
)

// obstacle is a side of the outline, by its points in the triangulation, that
// should be divided into parts.
type obstacle struct {
	a, b  int32
	parts int
}

// obstacles lists the sides in the way of triangles with an angle below the
// bound, but for those in sharp corners, where dividing would not end.
func (r *refinement) obstacles() []obstacle {
	d := r.d
	sharp := r.sharpCorners(&verdict{cornerAngle: math.Pi})
	var list []obstacle
	at := map[[2]int32]int{}
	add := func(t int32, side, parts int) {
		a, b := d.v[t][(side+1)%3], d.v[t][(side+2)%3]
		if a > b {
			a, b = b, a
		}
		if r.within(sharp, [3]int32{a, a, a}) && r.within(sharp, [3]int32{b, b, b}) {
			return
		}
		k, ok := at[[2]int32{a, b}]
		if !ok {
			k = len(list)
			at[[2]int32{a, b}] = k
			list = append(list, obstacle{a, b, 2})
		}
		list[k].parts = max(list[k].parts, parts)
	}
	for t, in := range r.in {
		if !in {
			continue
		}
		c := d.v[t]
		p := [3]xy{d.p[c[0]], d.p[c[1]], d.p[c[2]]}
		if _, angle := fatness(p[0], p[1], p[2]); angle >= AngleBound || r.within(sharp, c) {
			continue
		}
		t := int32(t)
		if int(max(c[0], c[1], c[2])) < r.rim {
			// From rim to rim: sides as long as it is wide there, or not much longer.
			long := 0.0
			for i := range 3 {
				long = max(long, math.Hypot(p[i].x-p[(i+1)%3].x, p[i].y-p[(i+1)%3].y))
			}
			wide := triangleHeight(p, long)
			for i := range 3 {
				q, s := p[(i+1)%3], p[(i+2)%3]
				if l := math.Hypot(q.x-s.x, q.y-s.y); d.held[t][i] && l > 1.5*wide {
					add(t, i, int(min(math.Ceil(l/(1.5*wide)), narrowParts)))
				}
			}
		}
		o, _, _ := circumcentre(p[0], p[1], p[2])
		if !finite(o) {
			continue
		}
		if s, side, blocked := d.locate(o, t, true); blocked && side >= 0 {
			add(s, side, 2)
		} else if !blocked {
			r.seen(o, s, func(t int32, side int) { add(t, side, 2) })
		}
	}
	return list
}

// triangleHeight is the height over the longest side.
func triangleHeight(p [3]xy, long float64) float64 {
	return math.Abs((p[1].x-p[0].x)*(p[2].y-p[0].y)-(p[1].y-p[0].y)*(p[2].x-p[0].x)) / long
}

// seen calls do for the held sides of triangle t, which holds o, and of its
// neighbours that o sees under more than a right angle; without one, for the
// longest that it has.
func (r *refinement) seen(o xy, t int32, do func(t int32, side int)) {
	d := r.d
	found := false
	longest, at, side := 0.0, int32(-1), 0
	for _, n := range [4]int32{t, d.n[t][0], d.n[t][1], d.n[t][2]} {
		if n < 0 {
			continue
		}
		for i := range 3 {
			if !d.held[n][i] {
				continue
			}
			a, b := d.p[d.v[n][(i+1)%3]], d.p[d.v[n][(i+2)%3]]
			if (a.x-o.x)*(b.x-o.x)+(a.y-o.y)*(b.y-o.y) < 0 {
				do(n, i)
				found = true
			}
			if l := math.Hypot(a.x-b.x, a.y-b.y); l > longest {
				longest, at, side = l, n, i
			}
		}
	}
	if !found && at >= 0 {
		do(at, side)
	}
}

// wish is the division that the fabrics along an edge ask for: into how many
// parts each of its segments, 0 = as it is.
type wish map[int][]int8

// wishFor notes the sides of a patch that stand in its way. node has the nodes
// of the points of the triangulation.
func (p *plot) wishFor(list []obstacle, node []int32) {
	if len(list) == 0 {
		return
	}
	b, l := p.b, p.l
	type place struct{ edge, segment int }
	where := map[[2]int32]place{}
	lines := slices.Clone(l.edges)
	for _, h := range l.holes {
		lines = append(lines, h.edges...)
	}
	for _, e := range append(lines, l.lines...) {
		nodes := b.edgeNode[e]
		for k := 1; k < len(nodes); k++ {
			where[[2]int32{min(nodes[k-1], nodes[k]), max(nodes[k-1], nodes[k])}] = place{e, k - 1}
		}
	}
	least := narrowest * b.meshSize(l)
	for _, o := range list {
		i, j := node[o.a], node[o.b]
		length := dist(p.at(i), p.at(j))
		at, ok := where[[2]int32{min(i, j), max(i, j)}]
		if !ok { // of the ring
			if l.ring >= 0 && length/2 >= least && len(b.ringNode[l.ring]) <= maxEdgeNodes/2 {
				b.ringWish[l.ring] = true
			}
			continue
		}
		parts := min(o.parts, int(length/least))
		if parts < 2 || !b.divisible(at.edge) {
			continue
		}
		if b.wish == nil {
			b.wish = wish{}
		}
		w := b.wish[at.edge]
		if w == nil {
			w = make([]int8, b.count[at.edge])
			b.wish[at.edge] = w
		}
		w[at.segment] = max(w[at.segment], int8(parts))
	}
}

// divisible reports whether edge e may get more nodes than it was divided into:
// where nobody said how many, nothing along it must have as many, and its
// mechanics do not hang on their number.
func (b *builder) divisible(e int) bool {
	ed := &b.m.Edges[e]
	if ed.Segments > 0 || ed.Kind == canopy.EdgeCable && b.m.Cables[b.cable[ed.Cable]].ForceDensity != 0 {
		return false
	}
	for _, u := range b.users[e] {
		if _, free := b.loop[u].patch.(freePatch); !free || b.loop[u].net {
			return false
		}
	}
	return true
}

// divided is a division of all edges and rings.
type divided struct {
	count []int
	param [][]float64
	times []int
}

func (b *builder) division() divided {
	return divided{slices.Clone(b.count), slices.Clone(b.param), slices.Clone(b.ringTimes)}
}

// divideNarrow divides the sides that stand in the way of fabrics and reports
// whether there were any.
func (b *builder) divideNarrow() bool {
	any := false
	total := 0
	for _, n := range b.count {
		total += n
	}
	for e := range b.m.Edges {
		w := b.wish[e]
		if w == nil {
			continue
		}
		n := b.count[e]
		par := make([]float64, 0, 2*n+1)
		for k := range n {
			t, next := b.nodeAt(e, k), b.nodeAt(e, k+1)
			parts := max(1, int(w[k]))
			if total+parts > maxEdgeNodes {
				parts = 1
			}
			total += parts - 1
			any = any || parts > 1
			for i := range parts {
				par = append(par, t+(next-t)*float64(i)/float64(parts))
			}
		}
		b.param[e] = append(par, 1)
		b.count[e] = len(par)
	}
	for i, more := range b.ringWish {
		if more {
			b.ringTimes[i] *= 2
			any = true
		}
	}
	return any
}

// clearFill takes back all nodes and what was made of them.
func (b *builder) clearFill() {
	b.s = &canopy.Structure{SelfWeight: b.m.SelfWeight}
	b.quality, b.group, b.wish = nil, nil, nil
	b.ringWish = make([]bool, len(b.m.Rings))
}

// fillFinely makes the nodes of edges and all in between, and divides what is
// narrow until every fabric meets its bound, three rounds in a row bring it no
// nearer, or there are several times as many triangles.
func (b *builder) fillFinely(run func(...func()) error) error {
	b.ringTimes = make([]int, len(b.m.Rings))
	for i := range b.ringTimes {
		b.ringTimes[i] = 1
	}
	b.asked = slices.Clone(b.count)
	fill := func() error {
		b.clearFill()
		return run(b.pointNodes, b.edgeNodes, b.ringNodes, b.fill)
	}
	if err := fill(); err != nil {
		return err
	}
	best, least := b.division(), b.thin()
	most := 4*len(b.s.Corners) + 10_000
	stalled := 0
	for round := 1; round <= narrowRounds && least > 0 && stalled < 3 && len(b.s.Corners) < most && b.divideNarrow(); round++ {
		if err := fill(); err != nil {
			if b.ctx.Err() != nil {
				return err
			}
			b.errs = nil // what was found wrong is of our own making
			break
		}
		stalled++
		if n := b.thin(); n < least {
			best, least, stalled = b.division(), n, 0
		}
	}
	if slices.Equal(b.count, best.count) && slices.Equal(b.ringTimes, best.times) {
		return nil
	}
	b.count, b.param, b.ringTimes = best.count, best.param, best.times
	return fill()
}

// thin is the number of triangles below the bound that dividing might cure.
func (b *builder) thin() int {
	n := 0
	for i := range b.quality {
		n += b.quality[i].thin
	}
	return n
}
