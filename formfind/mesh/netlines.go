package mesh

import (
	"math"
	"slices"

	"anticlast/formfind/canopy"
	"gonum.org/v1/gonum/spatial/r3"
)

// lineNet is a net of straight or radial lines: nothing is asked of its edges,
// which are divided where lines end.
type lineNet struct{}

func (lineNet) relate(*division, *loop)           {}
func (lineNet) triangles(*builder, *loop) float64 { return 0 }
func (lineNet) fill(*plot)                        {}

// least is the length of the shortest link of a net of lines, and of the
// shortest side of an edge that it divides, over the spacing. A crossing nearer
// to the boundary than that is put on it; line ends nearer to each other, or to a
// corner, are put together.
const least = 1.0 / 3

// laidNet is a net whose lines have been laid in its plane.
type laidNet struct {
	lat    *lattice
	rim    *rim
	keep   []bool         // per crossing of the lattice: a node
	chains []chainOfStops // the lines, cut at the boundary
	least  float64        // m
	sag    map[int]r3.Vec // per edge: where its middle is expected off its chord
	radial *radialNet
	node   []int32 // per crossing, −1 = none
}

// chainOfStops is a stretch of a line: crossings of the lattice (≥ 0), and
// arrivals on edges as −1 − index.
type chainOfStops struct {
	family int
	stops  []int32
	long   []bool // per link: spans a crossing that was left out
}

// arrival is where a line ends on an edge.
type arrival struct {
	edge  int
	t     float64
	least float64 // m
	node  int     // number of the node along the edge, once that is divided
}

func (b *builder) arrive(on onRim, l *laidNet) int32 {
	b.arrival = append(b.arrival, arrival{edge: on.edge, t: min(1, max(0, on.t)), least: l.least})
	return -int32(len(b.arrival))
}

// freeEdge reports whether edge i bounds only nets that end where they like, so
// that it is divided where their lines end.
func (b *builder) freeEdge(i int) bool {
	if b.m.Edges[i].Segments > 0 {
		return false
	}
	for _, u := range b.users[i] {
		if _, lines := b.loop[u].patch.(lineNet); !lines {
			return false
		}
	}
	return len(b.users[i]) > 0
}

// nodeAt returns where node k of edge i is, by length.
func (b *builder) nodeAt(i, k int) float64 {
	if p := b.param[i]; p != nil {
		return p[k]
	}
	return float64(k) / float64(b.count[i])
}

// layNets lays the lines of nets that do not run along the sides of a patch, and
// divides edges where they end.
func (b *builder) layNets() {
	b.laid = make([]*laidNet, len(b.loop))
	b.param = make([][]float64, len(b.m.Edges))
	for i, l := range b.loop {
		if _, lines := l.patch.(lineNet); !lines {
			continue
		}
		if b.ctx.Err() != nil {
			return
		}
		n := &b.m.Nets[l.index]
		r := b.newRim(l)
		if r == nil {
			b.fail("net", l.name, l.line, Degenerate, "move its points apart", "its boundary encloses no area")
			continue
		}
		net := &laidNet{rim: r, sag: map[int]r3.Vec{}}
		for k, e := range l.edges {
			if b.sags(l, e) {
				net.sag[e] = b.netSagVector(l, r, e, (b.walkArea(l, r) > 0) != l.rev[k])
			}
		}
		b.laid[i] = net
		if n.Pattern == canopy.NetRadial {
			b.layRadial(l, net)
		} else {
			b.layStraight(l, net)
		}
	}
	if len(b.errs) > 0 {
		return
	}
	b.settle()
	for i, net := range b.laid {
		if net == nil {
			continue
		}
		if net.radial == nil {
			b.tidy(net)
		}
		if len(net.chains) == 0 && net.radial == nil {
			l := b.loop[i]
			h := netSpacings(&b.m.Nets[l.index])
			b.fail("net", l.name, l.line, Mismatch, "give a smaller spacing", "no line of it fits into its boundary with lines %.3g m apart", max(h[0], h[1]))
		}
	}
}

// walkArea is the area within the walk along l, seen in the plane of r.
func (b *builder) walkArea(l *loop, r *rim) float64 {
	pts := b.sample(l)
	area := 0.0
	for i, p := range pts {
		a, c := r.drop(p), r.drop(pts[(i+1)%len(pts)])
		area += (a.x*c.y - a.y*c.x) / 2
	}
	return area
}

// layStraight cuts the lines of a lattice at the rim.
func (b *builder) layStraight(l *loop, net *laidNet) {
	n := &b.m.Nets[l.index]
	if b.found != nil {
		net.lat = b.found.lattice(b, l, net.rim)
	}
	if net.lat == nil {
		net.lat = b.newLattice(n, net.rim)
	}
	if net.lat == nil {
		if f := n.Families; len(f) == 2 && f[0].HasAngle != f[1].HasAngle || f[0].HasAngle {
			b.fail("net", l.name, l.line, Mismatch, "let them cross at 10° or more, and give a spacing that suits the size", "its families run nearly the same way, or it would have more than the %d million crossings or %d lines of a family that are possible", maxLattice/1_000_000, maxLines)
			return
		}
		b.tooFineNet(l)
		return
	}
	net.least = least * net.lat.h
	net.cut(b)
}

func (b *builder) tooFineNet(l *loop) {
	b.fail("net", l.name, l.line, TooFine, "give a larger spacing", "it would have more crossings than the %d million, or more lines of a family than the %d, that are possible", maxLattice/1_000_000, maxLines)
}

// states of a crossing.
const (
	outside int8 = iota
	kept         // a node of the net
	onEdge       // put on the boundary
)

// cut finds which crossings are nodes and where lines end.
func (net *laidNet) cut(b *builder) {
	lat, r := net.lat, net.rim
	r.sort(lat.link)
	state := make([]int8, len(lat.at))
	far := make([]float64, len(lat.at)) // distance from the boundary, up to a link
	stop := make([]int32, len(lat.at))
	net.keep = make([]bool, len(lat.at))
	for p, q := range lat.at {
		stop[p] = int32(p)
		if !lat.has(int32(p)) {
			continue
		}
		on, other, near := r.nearest(q)
		far[p] = lat.link
		if near {
			far[p] = on.d
		}
		switch {
		case !r.inside(q):
		case near && on.d < net.least:
			state[p] = onEdge
			if other.d < net.least {
				on = b.cornerOf(on, other, q, net)
			}
			stop[p] = b.arrive(on, net)
		default:
			state[p] = kept
			net.keep[p] = true
		}
	}
	var cross []onRim
	var way []int32
	lat.walk(func(family int, line []int32) {
		var cur []int32
		end := func() {
			if len(cur) > 1 {
				net.chains = append(net.chains, chainOfStops{family: family, stops: cur})
			}
			cur = nil
		}
		for k := 1; k < len(line); k++ {
			p, q := line[k-1], line[k]
			if !lat.has(p) || !lat.has(q) {
				end()
				continue
			}
			a, c := lat.at[p], lat.at[q]
			cross = cross[:0]
			if min(far[p], far[q]) < math.Hypot(c.x-a.x, c.y-a.y) {
				cross = r.crossings(a, c, cross)
			}
			in, out := state[p] != outside, state[q] != outside
			if (in != out) != (len(cross)%2 == 1) {
				// One end is on the boundary, as nearly as rounding allows.
				edge := p
				if far[q] < far[p] {
					edge = q
				}
				on, other, near := r.nearest(lat.at[edge])
				switch {
				case len(cross) > 0:
					cross = cross[:len(cross)-1]
				case near:
					if other.d < net.least {
						on = b.cornerOf(on, other, lat.at[edge], net)
					}
					cross = append(cross, on)
				default:
					end()
					continue
				}
			}
			// Every other stretch of the way lies inside.
			way = way[:0]
			if in {
				way = append(way, stop[p])
			}
			for _, x := range cross {
				way = append(way, b.arrive(x, net))
			}
			if out {
				way = append(way, stop[q])
			}
			for i := 0; i+1 < len(way); i += 2 {
				if i > 0 || !in || len(cur) == 0 {
					end()
					cur = append(cur, way[i])
				}
				cur = append(cur, way[i+1])
			}
			if !out {
				end()
			}
		}
		end()
	})
}

// cornerOf returns the corner between two edges that are both near to q, so that
// neither is preferred; on itself when they do not meet nearby.
func (b *builder) cornerOf(on, other onRim, q xy, net *laidNet) onRim {
	for t, p := range b.ends[on.edge] {
		if p != b.ends[other.edge][0] && p != b.ends[other.edge][1] {
			continue
		}
		c := net.rim.drop(b.onEdge(on.edge, float64(t), net))
		if math.Hypot(c.x-q.x, c.y-q.y) < 1.5*net.least/least {
			return onRim{edge: on.edge, t: float64(t)}
		}
	}
	return on
}

// settle divides edges where lines arrive, and puts arrivals that are close
// together on one node.
func (b *builder) settle() {
	byEdge := make([][]int, len(b.m.Edges))
	for i := range b.arrival {
		byEdge[b.arrival[i].edge] = append(byEdge[b.arrival[i].edge], i)
	}
	for e, list := range byEdge {
		if b.users[e] == nil {
			continue
		}
		if !b.freeEdge(e) {
			for _, i := range list {
				b.arrival[i].node = int(math.Round(b.arrival[i].t * float64(b.count[e])))
			}
			continue
		}
		slices.SortStableFunc(list, func(i, j int) int {
			switch d := b.arrival[i].t - b.arrival[j].t; {
			case d < 0:
				return -1
			case d > 0:
				return 1
			}
			return 0
		})
		b.divideAt(e, list)
	}
}

// divideAt divides edge e at the arrivals in list, which are in order.
func (b *builder) divideAt(e int, list []int) {
	length := b.curve[e].length
	gap := 0.0
	for _, i := range list {
		gap = max(gap, b.arrival[i].least)
	}
	gap /= length
	t := make([]float64, len(list))
	for k, i := range list {
		t[k] = b.arrival[i].t
	}
	c := clusters(t, gap*(1-1e-9))
	par := make([]float64, 0, len(c))
	for k, x := range c {
		if k > 0 && b.curve[e].Arc {
			// An arc is never a single straight side.
			before := par[len(par)-1]
			n := int(math.Ceil((x.t-before)*b.curve[e].sweep/arcStep - 1e-9))
			if len(c) == 2 {
				n = max(n, 2)
			}
			for i := 1; i < n; i++ {
				par = append(par, before+(x.t-before)*float64(i)/float64(n))
			}
		}
		for _, i := range list[x.first:x.last] {
			b.arrival[i].node = len(par)
		}
		par = append(par, x.t)
	}
	b.param[e] = par
	b.count[e] = len(par) - 1
}

// arcStep is the largest angle of a side of an arc between the ends of lines.
const arcStep = math.Pi / 12

// rimKey numbers the nodes on edges: points first, then those along each edge.
func (b *builder) rimKey(a arrival, base []int) int {
	switch a.node {
	case 0:
		return b.ends[a.edge][0]
	case b.count[a.edge]:
		return b.ends[a.edge][1]
	}
	return len(b.m.Points) + base[a.edge] + a.node
}

// onEdge returns the place at t of an edge at the rim of a net.
func (b *builder) onEdge(e int, t float64, net *laidNet) r3.Vec {
	if b.found != nil {
		return b.found.at(e, t)
	}
	return r3.Add(b.curve[e].at(t), r3.Scale(4*t*(1-t), net.sag[e]))
}

// fillLines makes the nodes and links of a net that has been laid.
func (b *builder) fillLines(l *loop, net *laidNet) {
	p := &plot{b: b, l: l}
	if net.radial != nil {
		b.fillRadial(p, net)
		return
	}
	n := &b.m.Nets[l.index]
	net.rim.coarsen(len(net.keep))
	net.node = make([]int32, len(net.keep))
	for i, k := range net.keep {
		net.node[i] = -1
		if k {
			net.node[i] = p.node(net.rise(i))
		}
	}
	at := func(s int32) int32 {
		if s >= 0 {
			return net.node[s]
		}
		a := b.arrival[-1-s]
		return b.edgeNode[a.edge][a.node]
	}
	lines := make([][][]int32, len(n.Families))
	inner := make([][][]bool, len(n.Families)) // per link: one mesh of an equal-mesh net
	for _, c := range net.chains {
		nodes := make([]int32, len(c.stops))
		mesh := make([]bool, len(c.stops)-1)
		for k, s := range c.stops {
			nodes[k] = at(s)
			if k > 0 {
				mesh[k-1] = n.MeshLength > 0 && s >= 0 && c.stops[k-1] >= 0 && !c.long[k-1]
			}
		}
		lines[c.family] = append(lines[c.family], nodes)
		inner[c.family] = append(inner[c.family], mesh)
	}
	for k := range lines {
		mem := b.netMember(l, k)
		equal := mem
		if n.MeshLength > 0 {
			equal.law, equal.given, equal.mean = canopy.LawElastic, 0, 0
			equal.unstressed = n.MeshLength / (1 + n.MarkTension/mem.stiffness)
		}
		for i, nodes := range lines[k] {
			c := canopy.Cable{Name: numbered(mem.group, i+1), Kind: canopy.KindNetCable, Nodes: nodes}
			for j := 1; j < len(nodes); j++ {
				link := mem
				if inner[k][i][j-1] {
					link = equal
				} else if b.soft && link.law == canopy.LawForce {
					link.law, link.mean = canopy.LawForceDensity, link.given
				}
				link.a, link.b, link.name = nodes[j-1], nodes[j], numbered(c.Name, j)
				c.Members = append(c.Members, b.addMember(link))
			}
			b.addCable(c)
		}
	}
}

// maxMeans bounds the terms of all mean values over one rim.
const maxMeans = 100_000_000

// coarsen leaves so many points of the rim that mean values over it at n places
// are within bounds. They are only a start.
func (r *rim) coarsen(n int) {
	every := (n*len(r.sides) + maxMeans - 1) / maxMeans
	for k, rim := range r.up.rims {
		var few []int
		for j := 0; j < len(rim); j += max(1, min(every, len(rim)/4)) {
			few = append(few, rim[j])
		}
		r.up.rims[k] = few
	}
}

// rise returns the place in space of crossing i.
func (net *laidNet) rise(i int) r3.Vec {
	if net.lat.space != nil {
		return net.lat.space[i]
	}
	q, r := net.lat.at[i], net.rim
	h := r.up.meanValue(q)
	if math.IsNaN(h) || math.IsInf(h, 0) {
		h = 0 // a hole without area
	}
	return r3.Add(r.origin, r3.Add(r3.Scale(q.x, r.e1), r3.Add(r3.Scale(q.y, r.e2), r3.Scale(h, r.n))))
}
