package sparse

import "math"

// minimumDegree orders the nodes of g by approximate minimum degree on the
// quotient graph and appends them to order, first eliminated first.
//
// The graph after some eliminations is kept as variables (not yet eliminated)
// and elements (eliminated; their clique is stored once as a list of
// variables), so that it never takes more room than the graph given. Degrees
// are the upper bound of Amestoy, Davis & Duff 1996; variables with equal
// neighbourhoods are merged, elements whose clique lies within the new one are
// absorbed.
//
// P. R. Amestoy, T. A. Davis & I. S. Duff: An approximate minimum degree
// ordering algorithm. SIAM J. Matrix Anal. Appl. 17 (1996), 886-905.
func minimumDegree(g graph, weight, order []int32, mem *pool) []int32 {
	n := g.n
	if n == 0 {
		return order
	}
	q := newQuotient(g, weight, mem)
	defer mem.put(q.slab, q.list, q.head)
	for q.left > 0 {
		me := q.popLeast()
		q.eliminate(me)
	}
	return q.collect(order)
}

// quotient is the state of the quotient graph. A node is a live variable
// (weight > 0), a variable merged into another (weight == 0 and not element),
// or an element. The list of node i is list[start[i]:start[i]+size[i]]; of a
// variable the first elems[i] entries are elements, the others variables; of an
// element all are variables.
type quotient struct {
	n       int
	left    int   // weight not yet eliminated
	total   int32 // weight altogether
	slab    []int32
	list    []int32
	free    int32
	start   []int32
	size    []int32
	elems   []int32
	weight  []int32 // number of unknowns a variable stands for, negative while in the current clique
	degree  []int32 // bound on the external degree of a variable; weight of the clique of an element
	mark    []int32 // of an element: 0 dead, else epoch or epoch + |clique \ current clique|
	epoch   int32
	head    []int32 // first variable of each degree
	next    []int32 // neighbours in the degree list, or in a hash bucket
	prev    []int32
	bucket  []int32 // first variable of each hash
	least   int32   // no variable has a smaller degree
	member  []int32 // chain of the unknowns merged into a variable
	last    []int32 // end of that chain
	pivots  []int32 // elements in the order of elimination
	delayed []int32 // nodes of very high degree, ordered last
}

const none = int32(-1)

func newQuotient(g graph, weight []int32, mem *pool) *quotient {
	n := g.n
	whole := mem.get(12 * n)
	slab := whole
	cut := func() []int32 {
		s := slab[:n:n]
		slab = slab[n:]
		return s
	}
	q := &quotient{
		n: n, slab: whole, list: mem.get(len(g.adj) + len(g.adj)/5 + n),
		start: cut(), size: cut(), elems: cut(), weight: cut(), degree: cut(), mark: cut(),
		next: cut(), prev: cut(), member: cut(), last: cut(),
		bucket: cut(), pivots: cut()[:0],
		epoch: 2,
	}
	copy(q.list, g.adj)
	q.free = int32(len(g.adj))
	for i := range n {
		q.bucket[i], q.member[i], q.elems[i] = none, none, 0
		q.last[i] = int32(i)
		q.start[i] = g.ptr[i]
		q.size[i] = g.ptr[i+1] - g.ptr[i]
		q.degree[i] = q.size[i]
		q.weight[i] = 1
		q.mark[i] = 1
	}
	q.total = int32(n)
	if weight != nil {
		copy(q.weight, weight)
		q.total = 0
		for _, w := range weight {
			q.total += w
		}
		for i := range int32(n) {
			q.degree[i] = 0
			for _, j := range g.row(i) {
				q.degree[i] += weight[j]
			}
		}
	}
	q.head = mem.get(int(q.total) + 1)
	for d := range q.head {
		q.head[d] = none
	}
	// A node tied to very many others would be touched at every step and is
	// last in any good order: take it out.
	dense := denseDegree(n)
	for i := int32(n) - 1; i >= 0; i-- {
		if q.size[i] > dense {
			q.delayed = append(q.delayed, i)
			q.weight[i], q.mark[i], q.size[i] = 0, 0, 0
			continue
		}
		q.insert(i, q.degree[i])
		q.left += int(q.weight[i])
	}
	return q
}

// denseDegree is the degree above which a node of a graph of n nodes counts as
// tied to very many (common practice).
func denseDegree(n int) int32 { return int32(max(16, 10*math.Sqrt(float64(n)))) }

func (q *quotient) insert(i, d int32) {
	h := q.head[d]
	q.next[i], q.prev[i] = h, none
	if h != none {
		q.prev[h] = i
	}
	q.head[d] = i
	if d < q.least {
		q.least = d
	}
}

func (q *quotient) remove(i int32) {
	p, nx := q.prev[i], q.next[i]
	if nx != none {
		q.prev[nx] = p
	}
	if p != none {
		q.next[p] = nx
	} else {
		q.head[q.degree[i]] = nx
	}
}

func (q *quotient) popLeast() int32 {
	for q.head[q.least] == none {
		q.least++
	}
	i := q.head[q.least]
	q.remove(i)
	return i
}

// merge lets variable i stand for the unknowns of j too.
func (q *quotient) merge(i, j int32) {
	q.member[q.last[i]] = j
	q.last[i] = q.last[j]
}

// compact moves all live lists to the front of the store; the list being built
// at [from, free) goes behind them.
func (q *quotient) compact(from int32) int32 {
	// The first entry of each live list is swapped with a mark of its owner.
	for i := int32(0); i < int32(q.n); i++ {
		if q.size[i] > 0 && q.start[i] >= 0 {
			p := q.start[i]
			q.start[i] = q.list[p]
			q.list[p] = -2 - i
		}
	}
	var dst int32
	for src := int32(0); src < from; {
		v := q.list[src]
		src++
		if v > none {
			continue
		}
		i := -2 - v
		q.list[dst] = q.start[i]
		q.start[i] = dst
		dst++
		for k := int32(1); k < q.size[i]; k++ {
			q.list[dst] = q.list[src]
			dst++
			src++
		}
	}
	moved := dst
	copy(q.list[dst:], q.list[from:q.free])
	q.free = dst + q.free - from
	return moved
}

// eliminate makes variable me an element.
func (q *quotient) eliminate(me int32) {
	list, weight, start, size, elems := q.list, q.weight, q.start, q.size, q.elems
	mark, degree := q.mark, q.degree
	own := weight[me]
	q.left -= int(own)
	q.pivots = append(q.pivots, me)
	weight[me] = -own

	// The clique of me: its variables and those of its elements, which die.
	var cliqueWeight int32
	var from, to int32
	if elems[me] == 0 {
		from = start[me]
		to = from
		for _, i := range list[from : from+size[me]] {
			if w := weight[i]; w > 0 {
				cliqueWeight += w
				weight[i] = -w
				list[to] = i
				to++
				q.remove(i)
			}
		}
	} else {
		from = q.free
		gather := func(k, end int32) (int32, int32) {
			for ; k < end; k++ {
				i := list[k]
				w := weight[i]
				if w <= 0 {
					continue
				}
				cliqueWeight += w
				weight[i] = -w
				list[q.free] = i
				q.free++
				q.remove(i)
			}
			return k, end
		}
		ne := elems[me]
		for k := int32(0); k <= ne; k++ {
			// Room for the worst case of this source.
			var need int32
			if k < ne {
				need = size[list[start[me]+k]]
			} else {
				need = size[me] - ne
			}
			if int(q.free+need) > len(list) {
				from = q.compact(from)
			}
			if k < ne {
				e := list[start[me]+k]
				gather(start[e], start[e]+size[e])
				mark[e] = 0
				size[e] = 0
			} else {
				p := start[me] + ne
				gather(p, p+need)
			}
		}
		to = q.free
	}
	size[me] = to - from
	start[me] = from
	elems[me] = none
	degree[me] = cliqueWeight
	clique := list[from:to]

	// mark[e] - epoch becomes the weight of e's clique outside the new one.
	if q.epoch > math.MaxInt32-2*q.total-2 {
		for i := range mark {
			if mark[i] != 0 {
				mark[i] = 1
			}
		}
		q.epoch = 2
	}
	epoch := q.epoch
	var span int32
	for _, i := range clique {
		ne := elems[i]
		if ne == 0 {
			continue
		}
		w := -weight[i]
		base := epoch - w
		for _, e := range list[start[i] : start[i]+ne] {
			m := mark[e]
			if m >= epoch {
				m -= w
			} else if m != 0 {
				m = degree[e] + base
				span = max(span, degree[e])
			}
			mark[e] = m
		}
	}

	// Degrees of the clique's variables, their lists cleaned on the way.
	for _, i := range clique {
		p := start[i]
		out := p
		var deg int32
		var hash uint32
		for _, e := range list[p : p+elems[i]] {
			m := mark[e]
			if m == 0 {
				continue
			}
			if outside := m - epoch; outside > 0 {
				deg += outside
				list[out] = e
				out++
				hash += uint32(e)
			} else {
				mark[e] = 0 // its clique lies within the new one: absorbed
				size[e] = 0
			}
		}
		ne := out - p + 1
		varsAt := out
		for _, j := range list[p+elems[i] : p+size[i]] {
			if w := weight[j]; w > 0 {
				deg += w
				list[out] = j
				out++
				hash += uint32(j)
			}
		}
		if ne == 1 && out == varsAt {
			// Nothing outside the clique: eliminated together with me.
			w := -weight[i]
			cliqueWeight -= w
			own += w
			q.left -= int(w)
			weight[i] = 0
			size[i] = 0
			elems[i] = none
			q.merge(me, i)
			continue
		}
		degree[i] = min(degree[i], deg)
		// me becomes the first element of i. A place is free, because i lost
		// either me itself or an element that was absorbed into me.
		list[out] = list[varsAt]
		list[varsAt] = list[p]
		list[p] = me
		size[i] = out - p + 1
		elems[i] = ne
		hash = (hash + uint32(me)) % uint32(q.n)
		q.next[i] = q.bucket[hash]
		q.bucket[hash] = i
		q.prev[i] = int32(hash)
	}
	degree[me] = cliqueWeight
	q.epoch += span + 1

	// Variables of one hash with equal lists become one.
	for _, i := range clique {
		if weight[i] >= 0 {
			continue
		}
		h := q.prev[i]
		first := q.bucket[h]
		q.bucket[h] = none
		for a := first; a != none && q.next[a] != none; a = q.next[a] {
			if weight[a] == 0 {
				continue
			}
			ln, ne := size[a], elems[a]
			epoch := q.epoch
			for _, e := range list[start[a]+1 : start[a]+ln] {
				mark[e] = epoch
			}
			before := a
			for b := q.next[a]; b != none; b = q.next[b] {
				same := size[b] == ln && elems[b] == ne
				if same {
					for _, e := range list[start[b]+1 : start[b]+ln] {
						if mark[e] != epoch {
							same = false
							break
						}
					}
				}
				if same {
					weight[a] += weight[b]
					weight[b] = 0
					size[b] = 0
					elems[b] = none
					q.merge(a, b)
					q.next[before] = q.next[b]
				} else {
					before = b
				}
			}
			q.epoch++
		}
	}

	// Back into the degree lists, and out of the clique if merged.
	to = from
	for _, i := range clique {
		w := -weight[i]
		if w <= 0 {
			continue
		}
		weight[i] = w
		d := min(degree[i]+cliqueWeight-w, int32(q.left)-w)
		degree[i] = d
		q.insert(i, d)
		list[to] = i
		to++
	}
	weight[me] = 0
	size[me] = to - from
	if size[me] == 0 {
		mark[me] = 0
	} else {
		mark[me] = 1
	}
	if elemsEnd := from + size[me]; q.free > elemsEnd && q.free == from+int32(len(clique)) && len(clique) > 0 {
		q.free = elemsEnd
	}
}

// collect writes the unknowns in the order of elimination.
func (q *quotient) collect(order []int32) []int32 {
	for _, p := range q.pivots {
		for i := p; i != none; i = q.member[i] {
			order = append(order, i)
		}
	}
	return append(order, q.delayed...)
}
