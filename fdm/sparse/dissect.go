package sparse

import (
	"context"
	"math"
	"slices"
)

// Nested dissection: find a small set of nodes that separates the graph into
// two parts, number it last, and go on in the parts (George 1973). Where the
// separators come from is our own: the graph is laid out once in a plane by
// breadth-first distances, and each part is cut across the best of four
// directions of that plane at the best of all places.
//
// J. A. George: Nested dissection of a regular finite element mesh. SIAM J.
// Numer. Anal. 10 (1973), 345-363.

const (
	// judgeFrom is the number of nodes from which a separator tells whether a
	// graph is like a surface.
	judgeFrom = 400
	// surfaceSeparator times the square root of a part is what a separator may
	// have for a graph to count as a surface: nets and meshes with some order
	// need 0.5 to 1.4 (measured; round ones most), a triangulation of random points 1.6.
	surfaceSeparator = 1.45
)

// point is the place of a node in the layout.
type point struct{ u, v int32 }

// keys are the four coordinates of a point that it may be cut across.
func (p point) keys() [4]int32 { return [4]int32{p.u, p.v, p.u + p.v, p.u - p.v} }

// direction has the factors of u and v of each key.
var direction = [4][2]int32{{1, 0}, {0, 1}, {1, 1}, {1, -1}}

// across is the direction along which a separator of each cut is sorted.
var across = [4]int{1, 0, 3, 2}

type dissector struct {
	g      graph
	mem    *pool
	weight []int32 // unknowns a node stands for; nil if one each
	at     []point
	region []int32 // part a node is in, by the place where the part starts; negative once numbered
	nodes  []int32 // the order being made
	queue  []int32
	pts    []point    // of nodes, in the same order
	lend   [3][]int32 // distances while laying out; afterwards the high side while dividing, and leaf.local
	sep    []int32
	// How far a key changes along an edge: at most, and at most per node on
	// average.
	reach [4]int32
	step  [4]float64
	// Histograms of the keys, and of the sizes of separators on either side.
	mass  [4][]int32
	open  [2][]int32
	taste taste
	leaf  leafOrder
	// Parts of at least judged nodes are looked at for whether the graph is
	// like a surface at all; rough says that it is not.
	judged int
	rough  bool
}

func newDissector(g graph, weight []int32, mem *pool) *dissector {
	n := g.n
	d := &dissector{g: g, mem: mem, weight: weight, at: mem.points(n), region: mem.get(n), queue: mem.get(n)}
	for k := range d.lend {
		d.lend[k] = mem.get(n)
	}
	d.leaf.local = d.lend[2]
	d.taste = tasteOfFewLinks
	if len(g.adj) >= manyLinks*g.n {
		d.taste = tasteOfManyLinks
	}
	return d
}

// bfs fills dist for the component of root and returns its nodes in the order
// met, the farthest last.
func (d *dissector) bfs(root int32, dist []int32) []int32 {
	if len(d.nodes) == d.g.n {
		for i := range dist {
			dist[i] = none
		}
	} else {
		for _, i := range d.nodes {
			dist[i] = none
		}
	}
	q := d.queue
	q[0] = root
	dist[root] = 0
	ptr, adj := d.g.ptr, d.g.adj
	met := 1
	for k := 0; k < met; k++ {
		i := q[k]
		next := dist[i] + 1
		for _, j := range adj[ptr[i]:ptr[i+1]] {
			if dist[j] == none {
				dist[j] = next
				q[met] = j
				met++
			}
		}
	}
	return q[:met]
}

// layout places the nodes of one component (in d.nodes) in a plane.
//
// With p and q far apart, dist(p) − dist(q) runs from one to the other nearly
// evenly over a net or mesh; where it is zero lies an equator, whose ends r and
// s give the second coordinate likewise. On a square grid this gives multiples
// of its diagonals, on a triangulated one its skew axes. p is the first of the
// nodes, which are numbered by their distance from it: levels are the first
// nodes at each.
func (d *dissector) layout(levels []int32) {
	dp, dq, dr := d.lend[0], d.lend[1], d.lend[2]
	first, last := d.nodes[0], d.nodes[len(d.nodes)-1]
	for k, from := range levels {
		to := last + 1
		if k+1 < len(levels) {
			to = levels[k+1]
		}
		for i := from; i < to; i++ {
			dp[i] = int32(k)
		}
	}
	p, away := first, int32(len(levels)-1)
	q := slender(d.g, d.nodes[levels[away]-first:])
	for round := 0; ; round++ {
		met := d.bfs(q, dq)
		k := len(met) - 1
		further := dq[met[k]]
		if further <= away || round == 4 {
			break
		}
		for k > 0 && dq[met[k-1]] == further {
			k--
		}
		away = further
		p, q = q, slender(d.g, met[k:])
		dp, dq = dq, dp
	}
	var lo, hi int32
	for _, i := range d.nodes {
		u := dp[i] - dq[i]
		d.at[i].u = u
		lo, hi = min(lo, u), max(hi, u)
	}
	span := hi - lo
	band := max(1, span/64)
	// One end of the equator is the farthest from p and q. Of nodes equally far
	// it is the last: a search meets the nodes at one distance in the order in
	// which they lie. The other end is the farthest from the first.
	r := p
	away = -1
	for _, i := range d.nodes {
		if u := d.at[i].u; u >= -band && u <= band && dp[i]+dq[i] >= away {
			r, away = i, dp[i]+dq[i]
		}
	}
	s := r
	for _, i := range d.bfs(r, dr) {
		if u := d.at[i].u; u >= -band && u <= band {
			s = i
		}
	}
	d.bfs(s, dq)
	lo, hi = 0, 0
	for _, i := range d.nodes {
		v := dr[i] - dq[i]
		d.at[i].v = v
		lo, hi = min(lo, v), max(hi, v)
	}
	// Bring both coordinates to about one scale, so that their sum and
	// difference are directions in between.
	spanV := max(1, hi-lo)
	span = max(1, span)
	fu, fv := int32(1), int32(1)
	if span > spanV {
		fv = min(4, (span+spanV/2)/spanV)
	} else {
		fu = min(4, (spanV+span/2)/span)
	}
	if fu > 1 || fv > 1 {
		for _, i := range d.nodes {
			d.at[i].u *= fu
			d.at[i].v *= fv
		}
	}
	// Along an edge a distance changes by one at most, and a difference of two
	// by two. How much it does on average is told by some of the nodes.
	d.reach = [4]int32{2 * fu, 2 * fv, 2 * (fu + fv), 2 * (fu + fv)}
	for x, i := range d.nodes {
		d.pts[x] = d.at[i]
	}
	var sum [4]int64
	every := 1
	if len(d.nodes) > 2000 {
		every = 7
	}
	for x := 0; x < len(d.nodes); x += every {
		p := d.pts[x]
		var far [4]int32
		for _, j := range d.g.row(d.nodes[x]) {
			q := d.at[j]
			du, dv := q.u-p.u, q.v-p.v
			far[0], far[1] = max(far[0], du), max(far[1], dv)
			far[2], far[3] = max(far[2], du+dv), max(far[3], du-dv)
		}
		for k, f := range far {
			sum[k] += int64(f)
		}
	}
	for k := range 4 {
		d.step[k] = float64(sum[k]) / float64((len(d.nodes)+every-1)/every)
	}
}

func (d *dissector) weightOf(i int32) int32 {
	if d.weight == nil {
		return 1
	}
	return d.weight[i]
}

// cut is a way to divide a part: nodes with key ≤ at on one side, the others
// on the other, the separator taken from the low or the high side.
type cut struct {
	dir, side int
	at        int32
	size      int32   // unknowns in the separator
	count     float64 // nodes in it
	cost      float64
}

// window is the range of cuts of one direction that leave both sides large
// enough, with the cheapest by the estimate.
type window struct {
	lo, hi int32
	cost   float64
}

// bestCut finds a cheap cut of the part nodes at pts. How large the separator
// across a direction is follows, nearly, from how many nodes lie within the
// reach of one edge along it; the directions that look best are then swept
// exactly, all places in one pass.
func (d *dissector) bestCut(nodes []int32, pts []point, label int32) (cut, bool) {
	lo := pts[0].keys()
	hi := lo
	for _, p := range pts {
		u, v := p.u, p.v
		a, b := u+v, u-v
		lo[0], hi[0] = min(lo[0], u), max(hi[0], u)
		lo[1], hi[1] = min(lo[1], v), max(hi[1], v)
		lo[2], hi[2] = min(lo[2], a), max(hi[2], a)
		lo[3], hi[3] = min(lo[3], b), max(hi[3], b)
	}
	for k := range 4 {
		d.mass[k] = resize(d.mass[k], int(hi[k]-lo[k])+1)
	}
	m0, m1, m2, m3 := d.mass[0], d.mass[1], d.mass[2], d.mass[3]
	total := int32(len(nodes))
	if d.weight == nil {
		for _, p := range pts {
			m0[p.u-lo[0]]++
			m1[p.v-lo[1]]++
			m2[p.u+p.v-lo[2]]++
			m3[p.u-p.v-lo[3]]++
		}
	} else {
		total = 0
		for x, p := range pts {
			w := d.weight[nodes[x]]
			total += w
			m0[p.u-lo[0]] += w
			m1[p.v-lo[1]] += w
			m2[p.u+p.v-lo[2]] += w
			m3[p.u-p.v-lo[3]] += w
		}
	}
	share := 0.38
	if len(nodes) < 2000 {
		share = 0.32
	}
	var win [4]window
	least := -1.0
	for k := range 4 {
		win[k] = d.taste.estimate(d.mass[k], lo[k], d.reach[k], d.step[k], float64(total), share)
		if k >= 2 {
			win[k].cost *= d.taste.diagonal
		}
		if c := win[k].cost; c >= 0 && (least < 0 || c < least) {
			least = c
		}
	}
	best := cut{cost: -1}
	if least < 0 {
		return best, false
	}
	for k := range 4 {
		if win[k].cost >= 0 && win[k].cost <= least {
			d.sweep(&best, k, win[k], nodes, pts, label, d.mass[k], lo[k], total)
		}
	}
	return best, best.cost >= 0
}

// taste says what a good cut is, beyond few nodes in the separator.
type taste struct {
	skew     float64 // weight of uneven sides
	diagonal float64 // weight of separators across u+v and u-v
}

// The separators across u and v of a quadrilateral net have no links in
// themselves, and leave parts that are better cut again (measured on nets of
// seven outlines: flops 0.84 to 1.03 times those without, 0.97 on average).
var (
	tasteOfFewLinks  = taste{skew: 1.5, diagonal: 1.15}
	tasteOfManyLinks = taste{skew: 2, diagonal: 1}
)

// cost weighs the size of a separator by how uneven the sides are.
func (t taste) cost(size, below, total float64) float64 {
	skew := (2*below - total) / total
	return (size + 0.25) * (1 + t.skew*skew*skew)
}

// estimate looks at the cuts of one direction whose smaller side has at least
// the share of the total, and returns those nearly as cheap as the cheapest
// among them.
func (t taste) estimate(mass []int32, lo, reach int32, step, total, share float64) window {
	w := window{cost: -1}
	scale := step / float64(reach)
	var below, near int32
	best := 0
	for x, m := range mass {
		below += m
		near += m
		if x >= int(reach) {
			near -= mass[x-int(reach)]
		}
		b := float64(below)
		if m == 0 || b < share*total {
			continue
		}
		if b > (1-share)*total {
			if w.cost < 0 && below < int32(total) && b <= 0.8*total {
				// One place holds more than the window: cut there if at all.
				w.cost, best = t.cost(float64(near)*scale, b, total), x
			}
			break
		}
		if c := t.cost(float64(near)*scale, b, total); w.cost < 0 || c < w.cost {
			w.cost, best = c, x
		}
	}
	w.lo, w.hi = lo+int32(best)-reach, lo+int32(best)+reach
	w.lo, w.hi = max(w.lo, lo), min(w.hi, lo+int32(len(mass))-1)
	return w
}

// sweep measures all cuts of direction k within the window and keeps the best.
func (d *dissector) sweep(best *cut, k int, win window, nodes []int32, pts []point, label int32, mass []int32, lo, total int32) {
	w := win.hi - win.lo + 2
	d.open[0] = resize(d.open[0], int(w))
	d.open[1] = resize(d.open[1], int(w))
	low, high := d.open[0], d.open[1]
	reach := d.reach[k]
	cu, cv := direction[k][0], direction[k][1]
	for x, p := range pts {
		own := cu*p.u + cv*p.v
		if own <= win.lo-reach || own > win.hi+reach {
			continue
		}
		i := nodes[x]
		least, most := own, own
		for _, j := range d.g.row(i) {
			if d.region[j] == label {
				q := d.at[j]
				key := cu*q.u + cv*q.v
				least, most = min(least, key), max(most, key)
			}
		}
		wi := d.weightOf(i)
		// A node of the low separator for cuts own ≤ at < most.
		if a, b := max(own, win.lo)-win.lo, min(most, win.hi+1)-win.lo; a < b {
			low[a] += wi
			low[b] -= wi
		}
		// A node of the high separator for cuts least ≤ at < own.
		if a, b := max(least, win.lo)-win.lo, min(own, win.hi+1)-win.lo; a < b {
			high[a] += wi
			high[b] -= wi
		}
	}
	var below, sepLow, sepHigh int32
	for x := range win.lo - lo {
		below += mass[x]
	}
	for x := range w - 1 {
		m := mass[win.lo+x-lo]
		below += m
		sepLow += low[x]
		sepHigh += high[x]
		if m == 0 || below == total {
			continue
		}
		for side, sep := range [2]int32{sepLow, sepHigh} {
			if cost := d.taste.cost(float64(sep), float64(below), float64(total)); best.cost < 0 || cost < best.cost {
				*best = cut{dir: k, side: side, at: win.lo + x, cost: cost, size: sep, count: float64(sep) * float64(len(nodes)) / float64(total)}
			}
		}
	}
}

func resize(s []int32, n int) []int32 {
	if cap(s) < n {
		return make([]int32, n, n+n/2)
	}
	s = s[:n]
	clear(s)
	return s
}

// split orders d.nodes[from:to], which all have region from.
func (d *dissector) split(ctx context.Context, from, to int) {
	for {
		nodes, pts := d.nodes[from:to], d.pts[from:to]
		if len(nodes) <= leafSize {
			d.leaf.run(d, nodes)
			return
		}
		if ctx.Err() != nil {
			return
		}
		c, ok := d.bestCut(nodes, pts, int32(from))
		if d.judged > 0 && len(nodes) >= d.judged && (!ok || float64(c.count) > surfaceSeparator*math.Sqrt(float64(len(nodes)))) {
			d.rough = true
		}
		if d.rough {
			return
		}
		if !ok || int(c.count) > len(nodes)/3 {
			d.orderRest(nodes)
			return
		}
		a, b := d.divide(c, nodes, pts, int32(from))
		for _, i := range nodes[b:] {
			d.region[i] = none
		}
		for _, i := range nodes[a:b] {
			d.region[i] = int32(from + a)
		}
		d.split(ctx, from, from+a)
		from, to = from+a, from+b
	}
}

// divide moves the low side of a cut to nodes[:a], the high side to nodes[a:b]
// and the separator, sorted along its length, to nodes[b:].
func (d *dissector) divide(c cut, nodes []int32, pts []point, label int32) (a, b int) {
	reach := d.reach[c.dir]
	cu, cv := direction[c.dir][0], direction[c.dir][1]
	high, highU, highV := d.queue, d.lend[0], d.lend[1]
	nh := 0
	sep := d.sep[:0]
	for x, p := range pts {
		i := nodes[x]
		key := cu*p.u + cv*p.v
		isLow := key <= c.at
		if (isLow && c.side == 0 && key > c.at-reach) || (!isLow && c.side == 1 && key <= c.at+reach) {
			separates := false
			for _, j := range d.g.row(i) {
				if d.region[j] == label {
					q := d.at[j]
					if (cu*q.u+cv*q.v <= c.at) != isLow {
						separates = true
						break
					}
				}
			}
			if separates {
				sep = append(sep, i)
				continue
			}
		}
		if isLow {
			nodes[a], pts[a] = i, p
			a++
		} else {
			high[nh], highU[nh], highV[nh] = i, p.u, p.v
			nh++
		}
	}
	b = a + nh
	copy(nodes[a:], high[:nh])
	for k := range nh {
		pts[a+k] = point{highU[k], highV[k]}
	}
	au, av := direction[across[c.dir]][0], direction[across[c.dir]][1]
	slices.SortFunc(sep, func(x, y int32) int {
		p, q := d.at[x], d.at[y]
		if k := au*(p.u-q.u) + av*(p.v-q.v); k != 0 {
			return int(k)
		}
		return int(x - y)
	})
	copy(nodes[b:], sep)
	d.sep = sep
	return a, b
}

// orderRest orders a part that no direction cuts well by minimum degree.
func (d *dissector) orderRest(nodes []int32) {
	local := d.leaf.local
	for k, i := range nodes {
		local[i] = int32(k)
	}
	label := d.region[nodes[0]]
	sub := graph{n: len(nodes), ptr: make([]int32, len(nodes)+1)}
	for k, i := range nodes {
		for _, j := range d.g.row(i) {
			if d.region[j] == label {
				sub.adj = append(sub.adj, local[j])
			}
		}
		sub.ptr[k+1] = int32(len(sub.adj))
	}
	var weight []int32
	if d.weight != nil {
		weight = make([]int32, sub.n)
		for k, i := range nodes {
			weight[k] = d.weight[i]
		}
	}
	order := minimumDegree(sub, weight, make([]int32, 0, sub.n), d.mem)
	for k, i := range order {
		order[k] = nodes[i]
	}
	copy(nodes, order)
	for _, i := range nodes {
		d.region[i] = none
	}
}

// dissect orders all nodes of g, which are numbered by the sweep s. If picky, it
// gives up on graphs whose separators are not as small as those of a surface.
func dissect(ctx context.Context, g graph, s sweep, weight []int32, picky bool, mem *pool) ([]int32, bool) {
	d := newDissector(g, weight, mem)
	defer mem.put(d.region, d.queue, d.lend[0], d.lend[1], d.lend[2])
	all, pts := mem.get(g.n), mem.points(g.n)
	defer func() {
		mem.putPoints(d.at)
		mem.putPoints(pts)
	}()
	for i := range all {
		all[i] = int32(i)
	}
	for i := s.end; i < int32(g.n); i++ {
		d.region[i] = none // hubs: last, and in nobody's way
	}
	for k := range s.parts {
		from, to, levels := s.part(k)
		for i := from; i < to; i++ {
			d.region[i] = from
		}
		if to-from > leafSize {
			d.nodes, d.pts = all[from:to], pts[from:to]
			d.layout(levels)
		}
		d.nodes, d.pts = all, pts
		if picky {
			d.judged = max(judgeFrom, int(to-from)/8)
		}
		d.split(ctx, int(from), int(to))
		if d.rough {
			mem.put(all)
			return nil, false
		}
	}
	return all, true
}
