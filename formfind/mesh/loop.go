package mesh

import (
	"math"
	"slices"

	"anticlast/formfind/canopy"
	"gonum.org/v1/gonum/spatial/r3"
)

// loop is the boundary of a fabric or net: a closed walk along edges.
type loop struct {
	net    bool
	index  int // into Model.Fabrics or Model.Nets
	name   string
	line   int
	edges  []int   // in order of the walk
	rev    []bool  // walked from its second point to its first
	sides  [][]int // positions in edges, grouped into sides by corners
	holes  []*loop // openings inside, each with its own walk
	lines  []int   // edges inside
	points []int   // points inside that are nodes
	ring   int     // ring inside, −1 = none
	patch  patcher
	// What the model asks of the mesh.
	pattern canopy.FabricPattern
	plane   r3.Vec
}

func (l *loop) part() string {
	if l.net {
		return "net"
	}
	return "fabric"
}

// loops chains the edges of each boundary into a walk and chooses how it is meshed.
func (b *builder) loops() {
	b.users = make([][]int32, len(b.m.Edges))
	b.ringUse = make([]int, len(b.m.Rings))
	for i := range b.ringUse {
		b.ringUse[i] = -1
	}
	for i, f := range b.m.Fabrics {
		l := b.chain(&loop{index: i, name: f.Name, line: f.Line, ring: -1, pattern: f.Pattern, plane: f.Plane}, f.Boundary)
		if l == nil {
			continue
		}
		if f.Ring != "" {
			l.ring = b.ring[f.Ring]
			if u := b.ringUse[l.ring]; u >= 0 {
				b.fail("fabric", f.Name, f.Line, Mismatch, "give each fabric its own ring", "its ring %s is already inside fabric %s", f.Ring, b.loop[u].name)
				continue
			}
			b.ringUse[l.ring] = len(b.loop)
		}
		b.inside(l, f)
		b.addLoop(l)
	}
	for i, n := range b.m.Nets {
		l := b.chain(&loop{net: true, index: i, name: n.Name, line: n.Line, ring: -1}, n.Boundary)
		if l == nil {
			continue
		}
		if !b.netGiven(l, n) {
			continue
		}
		b.addLoop(l)
	}
	for i, r := range b.m.Rings {
		if b.ringUse[i] < 0 {
			b.fail("ring", r.Name, r.Line, Mismatch, "name it as the ring of the fabric around it", "no fabric has this ring")
		}
	}
	b.edgeUse()
}

// inside notes the holes, lines and points inside a fabric.
func (b *builder) inside(l *loop, f canopy.ModelFabric) {
	for _, names := range f.Holes {
		if h := b.chain(&loop{index: l.index, name: f.Name, line: f.Line, ring: -1}, names); h != nil {
			l.holes = append(l.holes, h)
		}
	}
	for _, n := range f.Lines {
		e, ok := b.edge[n]
		if !ok {
			b.fail("fabric", f.Name, f.Line, Missing, "add it under edges", "its line %q is not defined", n)
			continue
		}
		if slices.Contains(l.lines, e) || slices.Contains(l.edges, e) || slices.ContainsFunc(l.holes, func(h *loop) bool { return slices.Contains(h.edges, e) }) {
			b.fail("fabric", f.Name, f.Line, Mismatch, "list it once", "its line %s is listed twice or bounds it", n)
			continue
		}
		l.lines = append(l.lines, e)
	}
	for _, n := range f.Inside {
		p, ok := b.point[n]
		if !ok {
			b.fail("fabric", f.Name, f.Line, Missing, "add it under points", "its point %q is not defined", n)
			continue
		}
		l.points = append(l.points, p)
	}
}

func (b *builder) addLoop(l *loop) {
	at := int32(len(b.loop))
	for _, e := range l.edges {
		b.users[e] = append(b.users[e], at)
	}
	for _, h := range l.holes {
		for _, e := range h.edges {
			b.users[e] = append(b.users[e], at)
		}
	}
	for _, e := range l.lines {
		// The fabric lies on both sides.
		b.users[e] = append(b.users[e], at, at)
	}
	l.sides = b.corners(l)
	b.loop = append(b.loop, l)
	l.patch = b.choosePatch(l)
}

// chain orders the edges of a boundary into a closed walk.
func (b *builder) chain(l *loop, names []string) *loop {
	if len(names) < 2 {
		b.fail(l.part(), l.name, l.line, NotClosed, "list the edges around it in order", "its boundary has %d edges", len(names))
		return nil
	}
	for _, n := range names {
		e, ok := b.edge[n]
		if !ok {
			b.fail(l.part(), l.name, l.line, Missing, "add it under edges", "its edge %q is not defined", n)
			return nil
		}
		if slices.Contains(l.edges, e) {
			b.fail(l.part(), l.name, l.line, NotClosed, "list each edge once", "edge %s is listed twice", n)
			return nil
		}
		l.edges = append(l.edges, e)
	}
	n := len(l.edges)
	l.rev = make([]bool, n)
	first, second := b.ends[l.edges[0]], b.ends[l.edges[1]]
	if n > 2 && (first[0] == second[0] || first[0] == second[1]) {
		l.rev[0] = true
	}
	at := b.walkEnd(l, 0)
	seen := map[int]bool{at: true}
	for k := 1; k < n; k++ {
		e := b.ends[l.edges[k]]
		switch at {
		case e[0]:
		case e[1]:
			l.rev[k] = true
		default:
			b.fail(l.part(), l.name, l.line, NotClosed, "list the edges in order around it",
				"edge %s does not start where edge %s ends (point %s)", b.m.Edges[l.edges[k]].Name, b.m.Edges[l.edges[k-1]].Name, b.m.Points[at].Name)
			return nil
		}
		at = b.walkEnd(l, k)
		if seen[at] {
			b.fail(l.part(), l.name, l.line, NotClosed, "divide it into fabrics that touch there", "its boundary passes point %s twice", b.m.Points[at].Name)
			return nil
		}
		seen[at] = true
	}
	if start := b.walkStart(l, 0); at != start {
		b.fail(l.part(), l.name, l.line, NotClosed, "add the edge that is missing",
			"its boundary is not closed: it starts at point %s and ends at point %s", b.m.Points[start].Name, b.m.Points[at].Name)
		return nil
	}
	return l
}

func (b *builder) walkStart(l *loop, k int) int {
	e := b.ends[l.edges[k]]
	if l.rev[k] {
		return e[1]
	}
	return e[0]
}

func (b *builder) walkEnd(l *loop, k int) int {
	e := b.ends[l.edges[k]]
	if l.rev[k] {
		return e[0]
	}
	return e[1]
}

// reverse turns the walk around; the first edge stays first.
func (l *loop) reverse() {
	slices.Reverse(l.edges[1:])
	slices.Reverse(l.rev[1:])
	for k := range l.rev {
		l.rev[k] = !l.rev[k]
	}
	n := len(l.edges)
	sides := make([][]int, 0, len(l.sides))
	for _, s := range l.sides {
		t := make([]int, len(s))
		for j, k := range s {
			t[len(s)-1-j] = (n - k) % n
		}
		sides = append(sides, t)
	}
	slices.Reverse(sides[1:])
	l.sides = sides
}

// sample returns points along the walk, each edge by n steps.
func (b *builder) sample(l *loop) []r3.Vec {
	var p []r3.Vec
	for k, e := range l.edges {
		c := &b.curve[e]
		n := 1
		if c.Arc {
			n = 16
		}
		for i := range n {
			t := float64(i) / float64(n)
			if l.rev[k] {
				t = 1 - t
			}
			p = append(p, c.at(t))
		}
	}
	return p
}

// cornerTurn is the least change of direction that makes a point of the
// boundary a corner of the patch.
const cornerTurn = 30 * math.Pi / 180

// corners groups the edges of the walk into sides. Up to four edges are a side
// each. More are grouped at points where the walk turns by more than
// cornerTurn, if that gives three or four sides that can be divided alike;
// otherwise each edge is a side.
func (b *builder) corners(l *loop) [][]int {
	n := len(l.edges)
	single := make([][]int, n)
	for k := range single {
		single[k] = []int{k}
	}
	if n <= 4 || l.ring >= 0 {
		return single
	}
	first := -1
	var groups [][]int
	for k := range n {
		prev := (k + n - 1) % n
		in, out := b.tangent(l, prev, true), b.tangent(l, k, false)
		if r3.Dot(in, out) < math.Cos(cornerTurn) {
			if first < 0 {
				first = k
			}
		}
	}
	if first < 0 {
		return single
	}
	for j := range n {
		k := (first + j) % n
		prev := (k + n - 1) % n
		in, out := b.tangent(l, prev, true), b.tangent(l, k, false)
		if j == 0 || r3.Dot(in, out) < math.Cos(cornerTurn) {
			groups = append(groups, nil)
		}
		groups[len(groups)-1] = append(groups[len(groups)-1], k)
	}
	// The side with the first edge stays first.
	if !slices.Contains(groups[0], 0) {
		last := len(groups) - 1
		groups = append([][]int{groups[last]}, groups[:last]...)
	}
	if len(groups) == 4 && len(groups[0]) == len(groups[2]) && len(groups[1]) == len(groups[3]) {
		return groups
	}
	if len(groups) == 3 && len(groups[0]) == len(groups[1]) && len(groups[1]) == len(groups[2]) {
		return groups
	}
	return single
}

// tangent returns the unit direction of the walk at an end of its edge k.
func (b *builder) tangent(l *loop, k int, end bool) r3.Vec {
	c := &b.curve[l.edges[k]]
	t0, t1 := 0.0, 1e-3
	if end != l.rev[k] {
		t0, t1 = 1-1e-3, 1.0
	}
	d := r3.Unit(r3.Sub(c.at(t1), c.at(t0)))
	if l.rev[k] {
		d = r3.Scale(-1, d)
	}
	return d
}

// edgeUse checks that every edge has what it needs on its sides.
func (b *builder) edgeUse() {
	for i, e := range b.m.Edges {
		n := len(b.users[i])
		switch {
		case n == 0 && e.Kind == canopy.EdgeFixed:
			b.fail("edge", e.Name, e.Line, Mismatch, "add it to a boundary or remove it", "a fixed edge that bounds nothing has no purpose")
		case n < 2 && e.Kind == canopy.EdgeSeam:
			b.fail("edge", e.Name, e.Line, Mismatch, "make it a cable or a fixed edge, or add it to the boundary of the fabric on its other side", "a seam joins two fabrics, this one bounds %d", n)
		}
	}
}

// orient turns the walks of fabrics so that neighbours agree on which side is
// the positive one and that side looks up.
func (b *builder) orient() {
	n := len(b.m.Fabrics)
	if n == 0 {
		return
	}
	area := make([]r3.Vec, n)
	for i := range n {
		area[i] = newell(b.sample(b.loop[i]))
	}
	dir := make(map[[2]int]bool) // (loop, edge) → walked backwards
	for i := range n {
		for k, e := range b.loop[i].edges {
			dir[[2]int{i, e}] = b.loop[i].rev[k]
		}
		for _, h := range b.loop[i].holes {
			// Walked the other way round than the outline.
			same := r3.Dot(newell(b.sample(h)), area[i]) > 0
			for k, e := range h.edges {
				dir[[2]int{i, e}] = h.rev[k] != same
			}
		}
	}
	flip := make([]int8, n) // 0 = not seen, ±1
	for seed := range n {
		if flip[seed] != 0 {
			continue
		}
		flip[seed] = 1
		queue := []int{seed}
		for h := 0; h < len(queue); h++ {
			i := queue[h]
			edges := slices.Clone(b.loop[i].edges)
			for _, h := range b.loop[i].holes {
				edges = append(edges, h.edges...)
			}
			for _, e := range edges {
				fabrics := b.users[e][:0:0]
				for _, u := range b.users[e] {
					if !b.loop[u].net {
						fabrics = append(fabrics, u)
					}
				}
				if len(fabrics) != 2 || fabrics[0] == fabrics[1] {
					continue
				}
				j := int(fabrics[0] + fabrics[1] - int32(i))
				want := flip[i]
				if dir[[2]int{i, e}] == dir[[2]int{j, e}] {
					want = -want
				}
				switch flip[j] {
				case 0:
					flip[j] = want
					queue = append(queue, j)
				case want:
				default:
					l := b.loop[j]
					b.fail("fabric", l.name, l.line, Mismatch, "leave one of the shared edges out, or make it two edges side by side", "with its neighbours it makes a surface with only one side")
					return
				}
			}
		}
		var sum r3.Vec
		size := 0.0
		for _, i := range queue {
			sum = r3.Add(sum, r3.Scale(float64(flip[i]), area[i]))
			size += r3.Norm(area[i])
		}
		// Looks up; a closed or upright part looks towards +x, else +y, else as drawn.
		up := 0.0
		for _, c := range [3]float64{sum.Z, sum.X, sum.Y} {
			if math.Abs(c) > 1e-6*size {
				up = c
				break
			}
		}
		if up == 0 { // films that close by themselves
			b.closed = append(b.closed, queue...)
		}
		for _, i := range queue {
			if (flip[i] < 0) != (up < 0) {
				b.loop[i].reverse()
			}
		}
	}
}
