package sparse

import (
	"context"
	"math/bits"
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
	// leafSize is the number of nodes below which a part is ordered by exact
	// minimum degree.
	leafSize = 96
	// dissectFrom is the number of nodes below which approximate minimum
	// degree is as good and quicker.
	dissectFrom = 400
)

// point is the place of a node in the layout.
type point struct{ u, v int32 }

// keys are the four coordinates of a point that it may be cut across.
func (p point) keys() [4]int32 { return [4]int32{p.u, p.v, p.u + p.v, p.u - p.v} }

// across is the direction along which a separator of each cut is sorted.
var across = [4]int{1, 0, 3, 2}

type dissector struct {
	g      graph
	weight []int32 // unknowns a node stands for; nil if one each
	at     []point
	region []int32 // part a node is in, by the place where the part starts; negative once numbered
	nodes  []int32 // the order being made
	queue  []int32
	// Histograms of the sweep, one per direction and side.
	open [4][2][]int32
	mass [4][]int32
	leaf leafOrder
}

func newDissector(g graph, weight []int32) *dissector {
	n := g.n
	d := &dissector{g: g, weight: weight, at: make([]point, n), region: make([]int32, n), queue: make([]int32, n)}
	d.leaf.local = make([]int32, n)
	return d
}

// bfs fills dist for the component of root and returns its nodes in the order
// met, the farthest last.
func (d *dissector) bfs(root int32, dist []int32) []int32 {
	q := d.queue[:1]
	q[0] = root
	for _, i := range d.nodes {
		dist[i] = none
	}
	dist[root] = 0
	for k := 0; k < len(q); k++ {
		i := q[k]
		next := dist[i] + 1
		for _, j := range d.g.row(i) {
			if dist[j] == none {
				dist[j] = next
				q = append(q, j)
			}
		}
	}
	return q
}

// layout places the nodes of one component (in d.nodes) in a plane.
//
// With p and q far apart, dist(p) − dist(q) runs from one to the other nearly
// evenly over a net or mesh; where it is zero lies an equator, whose ends r and
// s give the second coordinate likewise. On a square grid this gives multiples
// of its diagonals, on a triangulated one its skew axes.
func (d *dissector) layout() {
	n := d.g.n
	slab := make([]int32, 3*n)
	dp, dq, dr := slab[:n], slab[n:2*n], slab[2*n:]
	farthest := func(root int32, dist []int32) int32 {
		q := d.bfs(root, dist)
		return q[len(q)-1]
	}
	p := farthest(d.nodes[0], dp)
	q := farthest(p, dp)
	d.bfs(q, dq)
	var lo, hi int32
	for _, i := range d.nodes {
		u := dp[i] - dq[i]
		d.at[i].u = u
		lo, hi = min(lo, u), max(hi, u)
	}
	span := hi - lo
	band := max(1, span/64)
	// The end of the equator as seen from root: the farthest node near it.
	end := func(root int32, dist []int32) int32 {
		far := root
		for _, i := range d.bfs(root, dist) {
			if u := d.at[i].u; u >= -band && u <= band {
				far = i
			}
		}
		return far
	}
	start := p
	best := int32(1) << 30
	for _, i := range d.nodes {
		if u := max(d.at[i].u, -d.at[i].u); u < best {
			start, best = i, u
		}
	}
	r := end(start, dr)
	s := end(r, dr)
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
	cost      float64
	size      int32
}

// bestCut sweeps all cuts of the part nodes in all directions.
func (d *dissector) bestCut(nodes []int32, label int32) (cut, bool) {
	first := d.at[nodes[0]].keys()
	lo, hi := first, first
	for _, i := range nodes {
		for k, key := range d.at[i].keys() {
			lo[k], hi[k] = min(lo[k], key), max(hi[k], key)
		}
	}
	for k := range 4 {
		w := int(hi[k]-lo[k]) + 2
		for side := range 2 {
			d.open[k][side] = resize(d.open[k][side], w)
		}
		d.mass[k] = resize(d.mass[k], w)
	}
	var total int32
	for _, i := range nodes {
		w := d.weightOf(i)
		total += w
		own := d.at[i].keys()
		least, most := own, own
		for _, j := range d.g.row(i) {
			if d.region[j] != label {
				continue
			}
			p := d.at[j]
			u, v := p.u, p.v
			least[0], most[0] = min(least[0], u), max(most[0], u)
			least[1], most[1] = min(least[1], v), max(most[1], v)
			a, b := u+v, u-v
			least[2], most[2] = min(least[2], a), max(most[2], a)
			least[3], most[3] = min(least[3], b), max(most[3], b)
		}
		for k := range 4 {
			d.mass[k][own[k]-lo[k]] += w
			// Low side: a separator node of the cuts own ≤ at < most.
			if most[k] > own[k] {
				d.open[k][0][own[k]-lo[k]] += w
				d.open[k][0][most[k]-lo[k]] -= w
			}
			// High side: of the cuts least ≤ at < own.
			if least[k] < own[k] {
				d.open[k][1][least[k]-lo[k]] += w
				d.open[k][1][own[k]-lo[k]] -= w
			}
		}
	}
	best := cut{cost: -1}
	t := float64(total)
	for k := range 4 {
		var below, sepLow, sepHigh int32
		for x := range d.mass[k] {
			below += d.mass[k][x]
			sepLow += d.open[k][0][x]
			sepHigh += d.open[k][1][x]
			if d.mass[k][x] == 0 || below == total {
				continue
			}
			for side, sep := range [2]int32{sepLow, sepHigh} {
				a, b := below, total-below
				if side == 0 {
					a -= sep
				} else {
					b -= sep
				}
				if min(a, b) <= total/5 {
					continue
				}
				skew := float64(a-b) / t
				cost := (float64(sep) + 0.25) * (1 + 2*skew*skew)
				if best.cost < 0 || cost < best.cost {
					best = cut{dir: k, side: side, at: lo[k] + int32(x), cost: cost, size: sep}
				}
			}
		}
	}
	return best, best.cost >= 0
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
		nodes := d.nodes[from:to]
		if len(nodes) <= leafSize {
			d.leaf.order(d, nodes)
			return
		}
		if ctx.Err() != nil {
			return
		}
		c, ok := d.bestCut(nodes, int32(from))
		if !ok || int(c.size) > len(nodes)/3 && d.weight == nil {
			d.orderRest(nodes)
			return
		}
		// Divide into low side, high side, separator.
		label := int32(from)
		low, high := d.queue[:0], len(nodes)
		store := d.queue[:len(nodes)]
		sep := d.nodes[to:to] // filled from behind below
		_ = sep
		const isSep = -2
		for _, i := range nodes {
			own := d.at[i].keys()[c.dir]
			if (own <= c.at) != (c.side == 0) {
				continue
			}
			for _, j := range d.g.row(i) {
				if r := d.region[j]; r != label && r != isSep {
					continue
				}
				if (d.at[j].keys()[c.dir] <= c.at) != (own <= c.at) {
					d.region[i] = isSep
					break
				}
			}
		}
		for _, i := range nodes {
			switch {
			case d.region[i] == isSep:
				high--
				store[high] = i
			case d.at[i].keys()[c.dir] <= c.at:
				low = append(low, i)
			}
		}
		a := len(low)
		b := a
		for _, i := range nodes {
			if d.region[i] != isSep && d.at[i].keys()[c.dir] > c.at {
				store[b] = i
				b++
			}
		}
		copy(nodes, store)
		s := nodes[b:]
		along := across[c.dir]
		slices.SortFunc(s, func(x, y int32) int {
			if kx, ky := d.at[x].keys()[along], d.at[y].keys()[along]; kx != ky {
				return int(kx - ky)
			}
			return int(x - y)
		})
		for _, i := range s {
			d.region[i] = none
		}
		for _, i := range nodes[a:b] {
			d.region[i] = int32(from + a)
		}
		d.split(ctx, from, from+a)
		from, to = from+a, from+b
	}
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
	order := minimumDegree(sub, make([]int32, 0, sub.n))
	for k, i := range order {
		order[k] = nodes[i]
	}
	copy(nodes, order)
	for _, i := range nodes {
		d.region[i] = none
	}
}

// leafOrder orders small parts by exact minimum degree, with the neighbourhoods
// as sets of bits. Neighbours outside the part are eliminated later and count
// for the degrees.
type leafOrder struct {
	local []int32 // place of a node among members
	out   []int32
	nodes []int32 // members: the part, then its neighbours
	bits  []uint64
	deg   []int32
	w     []int32
}

func (l *leafOrder) order(d *dissector, part []int32) {
	if len(part) == 0 {
		return
	}
	label := d.region[part[0]]
	const met = -3
	k := len(part)
	l.nodes = append(l.nodes[:0], part...)
	for x, i := range part {
		l.local[i] = int32(x)
	}
	for _, i := range part {
		for _, j := range d.g.row(i) {
			if d.region[j] == none {
				d.region[j] = met
				l.local[j] = int32(len(l.nodes))
				l.nodes = append(l.nodes, j)
			}
		}
	}
	m := len(l.nodes)
	words := (m + 63) / 64
	if cap(l.bits) < m*words {
		l.bits = make([]uint64, m*words*2)
	}
	set := l.bits[:m*words]
	clear(set)
	for x, i := range part {
		row := set[x*words:][:words]
		for _, j := range d.g.row(i) {
			if r := d.region[j]; r == label || r == met {
				y := l.local[j]
				row[y>>6] |= 1 << (y & 63)
				if r == met {
					set[int(y)*words+x>>6] |= 1 << (x & 63)
				}
			}
		}
	}
	for _, j := range l.nodes[k:] {
		d.region[j] = none
	}
	if cap(l.deg) < k {
		l.deg = make([]int32, 2*k)
	}
	deg := l.deg[:k]
	degree := func(row []uint64) int32 {
		if d.weight == nil {
			var c int
			for _, b := range row {
				c += bits.OnesCount64(b)
			}
			return int32(c)
		}
		var c int32
		for w, b := range row {
			for ; b != 0; b &= b - 1 {
				c += d.weight[l.nodes[w<<6+bits.TrailingZeros64(b)]]
			}
		}
		return c
	}
	for x := range k {
		deg[x] = degree(set[x*words:][:words])
	}
	l.out = l.out[:0]
	for range k {
		best, least := 0, int32(1)<<30
		for x, v := range deg {
			if v < least {
				best, least = x, v
			}
		}
		deg[best] = 1 << 30
		l.out = append(l.out, part[best])
		pivot := set[best*words:][:words]
		// The neighbours become a clique.
		for w, b := range pivot {
			for ; b != 0; b &= b - 1 {
				y := w<<6 + bits.TrailingZeros64(b)
				if y >= k {
					break
				}
				row := set[y*words:][:words]
				for z, pb := range pivot {
					row[z] |= pb
				}
				row[y>>6] &^= 1 << (y & 63)
				row[best>>6] &^= 1 << (best & 63)
				deg[y] = degree(row)
			}
		}
	}
	copy(part, l.out)
	for _, i := range part {
		d.region[i] = none
	}
}

// dissect orders all nodes of g. Components too small to be worth cutting are
// left to minimum degree together.
func dissect(ctx context.Context, g graph, weight []int32, order []int32) []int32 {
	d := newDissector(g, weight)
	for i := range d.region {
		d.region[i] = -4 // not met
	}
	d.nodes = make([]int32, g.n)
	done := 0
	all := d.nodes
	for root := range int32(g.n) {
		if d.region[root] != -4 {
			continue
		}
		part := all[done:done]
		part = append(part, root)
		d.region[root] = int32(done)
		for k := 0; k < len(part); k++ {
			for _, j := range g.row(part[k]) {
				if d.region[j] == -4 {
					d.region[j] = int32(done)
					part = append(part, j)
				}
			}
		}
		if len(part) > leafSize {
			d.nodes = part
			d.layout()
		}
		d.nodes = all
		d.split(ctx, done, done+len(part))
		done += len(part)
	}
	return append(order, all...)
}
