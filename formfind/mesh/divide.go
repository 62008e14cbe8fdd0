package mesh

import (
	"math"
	"slices"

	"anticlast/formfind/canopy"
	"gonum.org/v1/gonum/spatial/r3"
)

// wantedTriangles is about how many triangles a model gets that gives no mesh size.
const wantedTriangles = 1600

// division relates the numbers of segments of edges: classes of edges that are
// divided alike (union-find), some of them evenly.
type division struct {
	parent []int
	even   []bool // at the root of a class
	least  []int  // at the root of a class, for numbers chosen here
	why    []*loop
}

func newDivision(n int) *division {
	d := &division{parent: make([]int, n), even: make([]bool, n), least: make([]int, n), why: make([]*loop, n)}
	for i := range d.parent {
		d.parent[i] = i
	}
	return d
}

func (d *division) root(e int) int {
	for d.parent[e] != e {
		d.parent[e] = d.parent[d.parent[e]]
		e = d.parent[e]
	}
	return e
}

// alike asks for the same number on edges e and f, for the sake of l.
func (d *division) alike(e, f int, l *loop) {
	a, b := d.root(e), d.root(f)
	if a > b {
		a, b = b, a
	}
	if a != b {
		d.parent[b] = a
		d.even[a] = d.even[a] || d.even[b]
		d.least[a] = max(d.least[a], d.least[b])
	}
	d.why[a] = l
}

func (d *division) evenly(e int, l *loop) {
	r := d.root(e)
	d.even[r] = true
	d.why[r] = l
}

func (d *division) atLeast(e, n int) {
	r := d.root(e)
	d.least[r] = max(d.least[r], n)
}

// stretch is how far the number of segments of an edge may be from what its
// length asks for, as a factor, before a patch that needs it so is meshed freely;
// twice that where the number is that of another edge with its own.
const stretch = 2.5

// relations relates the edges around all patches. A structured patch is meshed
// freely instead where it would divide an edge otherwise than its own number of
// segments says or much otherwise than its length asks for.
func (b *builder) relations() *division {
	for {
		d := newDivision(len(b.m.Edges))
		for _, l := range b.loop {
			l.patch.relate(d, l)
		}
		l := b.misfit(d)
		if l == nil {
			return d
		}
		l.patch = freePatch{}
	}
}

// misfit returns the first loop that is better meshed freely, nil when none is.
func (b *builder) misfit(d *division) *loop {
	n := len(b.m.Edges)
	given := make([]int, n) // per class
	wish := make([]float64, n)
	sum, num := make([]float64, n), make([]float64, n)
	byNet := b.netNumbers(d)
	bound := func(e int) *loop {
		for _, u := range b.users[e] {
			l := b.loop[u]
			switch l.patch.(type) {
			case radialPatch, freePatch:
			default:
				if !l.net && l.pattern != canopy.FabricSides {
					return l
				}
			}
		}
		return nil
	}
	for i, e := range b.m.Edges {
		r := d.root(i)
		for _, u := range b.users[i] {
			if l := b.loop[u]; !l.net {
				wish[i] = max(wish[i], b.curve[i].length/b.meshSize(l))
			}
		}
		if wish[i] > 0 {
			sum[r] += wish[i]
			num[r]++
		}
		switch s := e.Segments; {
		case s == 0:
		case given[r] > 0 && given[r] != s, d.even[r] && s%2 != 0:
			if l := bound(i); l != nil {
				return l
			}
		default:
			given[r] = s
		}
	}
	for i, e := range b.m.Edges {
		r := d.root(i)
		if e.Segments > 0 || wish[i] == 0 || num[r] < 2 {
			continue
		}
		count, most := sum[r]/num[r], stretch
		if byNet[r] > 0 {
			count = byNet[r]
		}
		if given[r] > 0 {
			count, most = float64(given[r]), 2*stretch
		}
		// An edge gets four segments in any case.
		if w := max(wish[i], 4); max(count, 4) > most*w || w > most*max(count, 4) {
			if l := bound(i); l != nil {
				return l
			}
		}
	}
	return nil
}

// netNumbers returns, per class, how many segments the spacing of nets asks for.
func (b *builder) netNumbers(d *division) []float64 {
	byNet := make([]float64, len(b.m.Edges))
	for _, l := range b.loop {
		if _, lines := l.patch.(lineNet); !l.net || lines {
			continue
		}
		for k, side := range l.sides {
			for _, pos := range side {
				e := l.edges[pos]
				r := d.root(e)
				byNet[r] = max(byNet[r], b.curve[e].length/b.netSpacing(l, k))
			}
		}
	}
	return byNet
}

// divide decides the number of segments of every edge.
func (b *builder) divide() {
	m := b.m
	b.chooseSize()
	d := b.relations()
	given := make([]int, len(m.Edges)) // per class: edge that gives the number, −1
	byNet := b.netNumbers(d)
	sum := make([]float64, len(m.Edges))
	num := make([]int, len(m.Edges))
	for i := range given {
		given[i] = -1
	}
	for i, e := range m.Edges {
		r := d.root(i)
		if e.Segments > 0 {
			if g := given[r]; g < 0 {
				given[r] = i
			} else if m.Edges[g].Segments != e.Segments {
				who := ""
				if l := d.why[r]; l != nil {
					who = " for the sake of " + l.part() + " " + l.name
				}
				b.fail("edge", e.Name, e.Line, Conflict, "give both the same number, or give it to one of them only",
					"it has %d segments but must be divided like edge %s with %d%s", e.Segments, m.Edges[g].Name, m.Edges[g].Segments, who)
			}
		}
		for _, u := range b.users[i] {
			if !b.loop[u].net {
				sum[r] += b.curve[i].length / b.meshSize(b.loop[u])
				num[r]++
			}
		}
	}
	b.count = make([]int, len(m.Edges))
	least := make([]int, len(m.Edges)) // per class, for numbers chosen here
	for i, e := range m.Edges {
		r := d.root(i)
		if least[r] = max(least[r], 2); e.Kind == canopy.EdgeCable || b.curve[i].Arc {
			least[r] = 4 // it will be curved
		}
	}
	for i := range m.Edges {
		r := d.root(i)
		if r == i {
			d.atLeast(i, least[i])
			b.count[i] = b.classCount(d, i, given[i], byNet[i], sum[i], num[i])
		} else {
			b.count[i] = b.count[r]
		}
		if b.curve[i].Arc && len(b.users[i]) > 0 && b.count[i] < 2 && !b.freeEdge(i) {
			e := m.Edges[i]
			b.fail("edge", e.Name, e.Line, Conflict, "give at least 2 segments", "an arc cannot be a single straight segment")
		}
	}
	if len(b.errs) > 0 {
		return
	}
	total, crossings := 0.0, 0.0
	for _, l := range b.loop {
		if !l.net {
			total += l.patch.triangles(b, l)
		} else if crossings += l.patch.triangles(b, l) / 2; crossings > maxLattice {
			b.tooFineNet(l)
			return
		}
	}
	if !(total <= MaxTriangles) {
		b.tooManyTriangles()
		return
	}
	nodes := 0.0
	for _, n := range b.count {
		nodes += float64(n)
	}
	if nodes > maxEdgeNodes {
		b.fail("", "", 0, TooFine, "give a larger mesh size or spacing, or fewer segments",
			"its edges would be divided into %.3g segments, more than the %d that are possible", nodes, maxEdgeNodes)
		return
	}
}

func (b *builder) tooManyTriangles() {
	fine := 1.1 * math.Sqrt(2*b.area()/MaxTriangles)
	b.fail("", "", 0, TooFine, formatWay("give a mesh size of %s or more, or fewer segments", fine),
		"the model would have more triangles than the %d million that are possible", MaxTriangles/1_000_000)
}

// classCount decides the number of segments of a class of edges.
func (b *builder) classCount(d *division, class, given int, byNet, sum float64, num int) int {
	even := d.even[class]
	if given >= 0 {
		e := b.m.Edges[given]
		if even && e.Segments%2 != 0 {
			l := d.why[class]
			b.fail("edge", e.Name, e.Line, Conflict, "give an even number", "it has %d segments but %s %s needs an even number on its sides", e.Segments, l.part(), l.name)
		}
		return e.Segments
	}
	if byNet > 0 {
		n := max(2, int(math.Round(min(byNet, 1e6))))
		if even {
			n += n % 2
		}
		return n
	}
	if num == 0 {
		return 1 // a cable in space
	}
	n := 2 * int(math.Round(min(sum/float64(num), 1e6)/2))
	return max(n, d.least[class]+d.least[class]%2)
}

// chooseSize sets the length of a mesh side where nothing else is said.
func (b *builder) chooseSize() {
	if b.size = b.m.MeshSize; b.size > 0 {
		return
	}
	b.size = math.Sqrt(2 * b.area() / wantedTriangles)
	if b.m.Coarser > 0 {
		b.size *= b.m.Coarser
	}
	if !(b.size > 0) {
		b.size = 1 // only nets and cables: not used
	}
}

// area estimates the area of all fabrics, those around rings weighted for the
// triangles that grading costs: n around the ring and n/2π·ln(R/r) layers.
func (b *builder) area() float64 {
	area := 0.0
	for _, l := range b.loop {
		if l.net {
			continue
		}
		a := fanArea(b.sample(l))
		if l.ring >= 0 {
			r := b.m.Rings[l.ring].Radius
			a *= max(1, 2*math.Log(math.Sqrt(a/math.Pi)/r))
		}
		area += a
	}
	return area
}

// meshSize is the wanted length of a mesh side in a fabric.
func (b *builder) meshSize(l *loop) float64 {
	if h := b.m.Fabrics[l.index].MeshSize; h > 0 {
		return h
	}
	return b.size
}

// netSpacing returns the spacing of the lines that end on side k of a net.
func (b *builder) netSpacing(l *loop, k int) float64 {
	// The first family runs along the first side and ends on the second and
	// fourth; the second the other way round. With three sides the second
	// family runs along the second side and ends on the first and third.
	return b.m.Nets[l.index].Families[(k+1)%2].Spacing
}

// edgeNodes divides the edges.
func (b *builder) edgeNodes() {
	m, s := b.m, b.s
	b.edgeNode = make([][]int32, len(m.Edges))
	for i, e := range m.Edges {
		n := b.count[i]
		list := make([]int32, 0, n+1)
		list = append(list, b.node[b.ends[i][0]])
		on := int32(-1)
		if e.Kind == canopy.EdgeFixed {
			on = int32(len(s.Curves))
			s.Curves = append(s.Curves, b.curve[i].Curve)
		}
		sag := b.sagVector(i)
		for k := 1; k < n; k++ {
			t := b.nodeAt(i, k)
			at := r3.Add(b.curve[i].at(t), r3.Scale(4*t*(1-t), sag))
			if b.found != nil && e.Kind == canopy.EdgeCable {
				at = b.found.at(i, t)
			}
			v := b.addNode(at, numbered(e.Name, k))
			if on >= 0 {
				s.Fixed[v], s.OnCurve[v], s.Param[v] = canopy.DirAll, on, t
			}
			list = append(list, v)
		}
		b.edgeNode[i] = append(list, b.node[b.ends[i][1]])
		switch {
		case e.Kind == canopy.EdgeSeam:
			s.Lines = append(s.Lines, canopy.Line{Name: e.Name, Role: "seam", Nodes: b.edgeNode[i]})
		case e.Arch:
			s.Lines = append(s.Lines, canopy.Line{Name: e.Name, Role: "arch", Nodes: b.edgeNode[i]})
		case e.Kind == canopy.EdgeFixed:
			s.Lines = append(s.Lines, canopy.Line{Name: e.Name, Role: "fixed edge", Nodes: b.edgeNode[i]})
		}
	}
}

// along returns the nodes of the walk over positions ks of l, both ends included.
func (b *builder) along(l *loop, ks []int) []int32 {
	var list []int32
	for _, k := range ks {
		part := b.edgeNode[l.edges[k]]
		if l.rev[k] {
			part = slices.Clone(part)
			slices.Reverse(part)
		}
		if len(list) > 0 {
			part = part[1:]
		}
		list = append(list, part...)
	}
	return list
}

// segments returns the number of segments of side ks.
func (b *builder) segments(l *loop, ks []int) int {
	n := 0
	for _, k := range ks {
		n += b.count[l.edges[k]]
	}
	return n
}
