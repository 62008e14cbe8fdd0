package sparse

import (
	"context"
	"fmt"
	"math"
	"slices"
	"sync/atomic"
)

// Analysis is everything about a system that follows from its pattern: the
// order of elimination, the tree of fronts, the rows of each front, and where
// each value goes. It is not changed after [Analyze] and may be shared by any
// number of factors and goroutines.
type Analysis struct {
	n       int // unknowns
	entries int // len(pairs)
	opts    Options
	cost    Cost

	order []int32 // unknown eliminated at each place
	place []int32 // its inverse

	// Front s eliminates the columns first[s] to first[s+1]-1. Its rows are
	// these columns, then the update rows rows[rowPtr[s]:rowPtr[s+1]], ascending.
	first  []int32
	parent []int32 // front that takes the update matrix, none for a root; parent[s] > s
	rowPtr []int64
	rows   []int32
	// Where the update rows are among the rows of the parent's front.
	// The runs of front s are runs[runPtr[s]:runEnd[s]].
	runPtr, runEnd []int64
	runs           []run

	// The children of front s in the order in which they are eliminated.
	childPtr []int32
	children []int32

	// The panel of front s holds its eliminated columns, column by column, at
	// panel[s]. Entry k of the assembly list adds values[n+source[k]] to place
	// target[k] of the panel.
	panel     []int64
	sourcePtr []int64
	source    []int32
	target    []int32

	plan plan

	// The working memory of the analysis. The first factor takes it for its
	// panels.
	spare atomic.Pointer[[]float64]
}

// Analyze orders and plans the elimination of a symmetric matrix with n
// unknowns whose off-diagonal entries are at pairs. A pair stands for both
// (i, j) and (j, i); it may be given from either triangle and repeatedly, the
// values of repeated pairs are added up. A pair (i, i) adds to the diagonal,
// which is always part of the pattern.
//
// The cost is nearly linear in n + len(pairs). Errors: [PatternError] for a
// pair that is out of range, [ErrTooLarge], [BudgetError], or that of ctx.
func Analyze(ctx context.Context, n int, pairs [][2]int32, o Options) (*Analysis, error) {
	if n < 0 {
		return nil, fmt.Errorf("sparse: %d unknowns", n)
	}
	if n >= math.MaxInt32-8 || len(pairs) > 1<<30-1 {
		return nil, ErrTooLarge
	}
	for k, p := range pairs {
		if uint32(p[0]) >= uint32(n) || uint32(p[1]) >= uint32(n) {
			return nil, &PatternError{Entry: k, Pair: p, Unknowns: n}
		}
	}
	// The pattern itself takes about this much before anything else is known.
	if need := int64(n)*72 + int64(len(pairs))*24; o.MemoryBudget > 0 && need > o.MemoryBudget {
		return nil, &BudgetError{Need: need, Budget: o.MemoryBudget}
	}
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	mem := newPool(n, len(pairs))
	g := newGraph(n, pairs, mem)
	var s sweep
	swept := n >= sweepFrom && o.Ordering != OrderNatural || o.Ordering == OrderDissection
	if swept {
		s, g = newSweep(g, mem)
	} else {
		s = plainSweep(n)
	}
	order, chosen, err := orderGraph(ctx, g, s, o.Ordering, mem)
	if err != nil {
		return nil, err
	}
	a := &Analysis{n: n, entries: len(pairs), opts: o, order: order, place: large[int32](n)}
	a.cost.Ordering = chosen
	if err := a.symbolic(ctx, g, mem); err != nil {
		return nil, err
	}
	mem.put(g.ptr, g.adj)
	order, a.order = a.order, large[int32](n)
	if swept {
		for k, i := range order {
			a.order[k] = s.order[i]
		}
		invert(a.place, a.order)
	} else {
		copy(a.order, order)
	}
	mem.put(order)
	a.plan = a.newPlan()
	a.measure()
	if o.MemoryBudget > 0 && a.cost.Bytes > o.MemoryBudget {
		return nil, &BudgetError{Need: a.cost.Bytes, Budget: o.MemoryBudget}
	}
	if err := a.assembly(pairs, mem); err != nil {
		return nil, err
	}
	a.spare.Store(&mem.all)
	return a, nil
}

// Unknowns is the number n of unknowns.
func (a *Analysis) Unknowns() int { return a.n }

// Cost of one factorisation.
func (a *Analysis) Cost() Cost { return a.cost }

// Order returns a copy of the order of elimination: Order()[k] is the unknown
// eliminated k-th.
func (a *Analysis) Order() []int32 { return slices.Clone(a.order) }

func (a *Analysis) fronts() int { return len(a.parent) }

// shape of front s: columns eliminated and rows altogether.
func (a *Analysis) shape(s int32) (cols, rows int) {
	cols = int(a.first[s+1] - a.first[s])
	return cols, cols + int(a.rowPtr[s+1]-a.rowPtr[s])
}

func invert(place, order []int32) {
	for k, i := range order {
		place[i] = int32(k)
	}
}

// symbolic finds the fronts and their rows.
func (a *Analysis) symbolic(ctx context.Context, g graph, mem *pool) error {
	invert(a.place, a.order)
	parent := eliminationTree(g, a.order, a.place, mem)
	post := postorder(parent, mem)
	renumber(parent, post, mem)
	for k, j := range post {
		post[k] = a.order[j]
	}
	mem.put(a.order)
	a.order = post
	invert(a.place, a.order)
	count := columnCounts(g, a.order, a.place, parent, mem)
	if err := ctx.Err(); err != nil {
		return err
	}
	a.joinColumns(parent, count, mem)
	mem.put(parent, count)
	a.frontRows(g, mem)
	return ctx.Err()
}

// renumber rewrites parent for nodes numbered by post.
func renumber(parent, post []int32, mem *pool) {
	place, old := mem.get(len(post)), mem.get(len(post))
	defer mem.put(place, old)
	invert(place, post)
	copy(old, parent)
	for k, j := range post {
		if p := old[j]; p != none {
			parent[k] = place[p]
		} else {
			parent[k] = none
		}
	}
}

// frontCost estimates the time, in nanoseconds, that a front costs in one
// factorisation and one solve. The terms are: the front itself, its rows, the
// entries of its panel, adding its update matrix to its parent's front, and the
// arithmetic. Fitted roughly to one machine; only the balance matters.
func frontCost(cols, below int32) float64 {
	c, b := float64(cols), float64(below)
	return 200 + 6*(c+b) + 2.0*c*(c+b) + 0.4*b*b + 0.08*frontFlops(c, b)
}

// joinColumns finds the supernodes: runs of columns with one structure, and
// relaxed ones that accept a few zeros. It renumbers the columns so that each
// supernode is a run and the supernodes are in postorder.
func (a *Analysis) joinColumns(parent, count []int32, mem *pool) {
	n := int32(a.n)
	first := mem.get(a.n + 1)[:0] // first column of each run
	super := mem.get(a.n)
	for j := range n {
		if j == 0 || parent[j-1] != j || count[j-1] != count[j]+1 {
			first = append(first, j)
		}
		super[j] = int32(len(first)) - 1
	}
	ns := int32(len(first))
	first = append(first, n)
	size := int(ns)
	up := mem.get(size)
	cols := mem.get(size)
	below := mem.get(size)
	zeros := make([]int64, ns)
	into := mem.get(size)    // itself, or the supernode it was joined into
	child := mem.get(size)   // children, as chains
	tail := mem.get(size)    // last child
	sibling := mem.get(size) // next child of the same parent
	defer mem.put(first, super, up, cols, below, into, child, tail, sibling)
	for s := range ns {
		last := first[s+1] - 1
		up[s] = none
		if p := parent[last]; p != none {
			up[s] = super[p]
		}
		cols[s] = first[s+1] - first[s]
		below[s] = count[last] - 1
		into[s], child[s], tail[s], sibling[s] = s, none, none, none
	}
	area := func(c, b int32) int64 { return int64(c)*int64(c+1)/2 + int64(c)*int64(b) }
	for s := range ns {
		// The children of s are complete: they come before it.
		var keepHead, keepTail = none, none
		keep := func(c int32) {
			if keepTail == none {
				keepHead = c
			} else {
				sibling[keepTail] = c
			}
			keepTail = c
			sibling[c] = none
		}
		for c := child[s]; c != none; {
			nextChild := sibling[c]
			nc := cols[c] + cols[s]
			all := area(nc, below[s])
			z := zeros[c] + zeros[s] + all - area(cols[c], below[c]) - area(cols[s], below[s])
			if z == 0 || 2*z < all && frontCost(nc, below[s]) < frontCost(cols[c], below[c])+frontCost(cols[s], below[s]) {
				into[c] = s
				cols[s], zeros[s] = nc, z
				for gc := child[c]; gc != none; {
					ng := sibling[gc]
					keep(gc)
					gc = ng
				}
			} else {
				keep(c)
			}
			c = nextChild
		}
		child[s], tail[s] = keepHead, keepTail
		if p := up[s]; p != none {
			if child[p] == none {
				child[p] = s
			} else {
				sibling[tail[p]] = s
			}
			tail[p] = s
		}
	}
	// Resolve chains of joins from the top down, then number what is left.
	for s := ns - 1; s >= 0; s-- {
		if into[s] != s {
			into[s] = into[into[s]]
		}
	}
	tree := mem.get(size)
	for s := range ns {
		tree[s] = none
		if into[s] == s && up[s] != none {
			tree[s] = into[up[s]]
		}
	}
	number := a.orderFronts(tree, into, cols, below, mem) // kept supernodes in a new postorder
	newNum := mem.get(size)
	for k, s := range number {
		newNum[s] = int32(k)
	}
	m := len(number)
	a.first = make([]int32, m+1)
	a.parent = make([]int32, m)
	a.rowPtr = make([]int64, m+1)
	for k, s := range number {
		a.first[k+1] = a.first[k] + cols[s]
		a.rowPtr[k+1] = a.rowPtr[k] + int64(below[s])
		a.parent[k] = none
		if p := tree[s]; p != none {
			a.parent[k] = newNum[p]
		}
	}
	at := append(mem.get(m)[:0], a.first[:m]...)
	order := mem.get(a.n)
	for s := range ns {
		k := newNum[into[s]]
		for j := first[s]; j < first[s+1]; j++ {
			order[at[k]] = a.order[j]
			at[k]++
		}
	}
	mem.put(a.order)
	a.order = order
	invert(a.place, a.order)
	mem.put(tree, newNum, number, at)
	a.childPtr = make([]int32, m+1)
	a.children = childLists(a.parent, a.childPtr, make([]int32, m))
}

// childLists fills ptr and list, those of front s being
// list[ptr[s]:ptr[s+1]], and returns the used part of list.
func childLists(parent, ptr, list []int32) []int32 {
	m := len(parent)
	clear(ptr)
	for _, p := range parent {
		if p != none {
			ptr[p]++
		}
	}
	var sum int32
	for s := range m {
		sum += ptr[s]
		ptr[s] = sum
	}
	ptr[m] = sum
	for s := m - 1; s >= 0; s-- {
		if p := parent[s]; p != none {
			ptr[p]--
			list[ptr[p]] = int32(s)
		}
	}
	return list[:sum]
}

// orderFronts returns the kept supernodes (into[s] == s) in a postorder of
// tree in which the subtree that needs most stack comes first among siblings
// (Liu 1986, "On the storage requirement in the out-of-core multifrontal
// method").
func (a *Analysis) orderFronts(tree, into, cols, below []int32, mem *pool) []int32 {
	ns := len(tree)
	peak := make([]int64, ns) // largest stack of the subtree
	held := make([]int64, ns) // sum of the updates of the children handled so far
	ptr, list := mem.get(ns+1), mem.get(ns)
	defer mem.put(ptr, list)
	list = childLists(tree, ptr, list)
	size := func(s int) int64 { return int64(updateFloats(int(below[s]))) }
	gain := func(s int32) int64 { return peak[s] - size(int(s)) }
	for s := range ns {
		if into[s] != int32(s) {
			continue
		}
		kids := list[ptr[s]:ptr[s+1]]
		if len(kids) > 1 {
			slices.SortStableFunc(kids, func(x, y int32) int {
				gx, gy := gain(x), gain(y)
				switch {
				case gx > gy:
					return -1
				case gx < gy:
					return 1
				}
				return 0
			})
		}
		for _, c := range kids {
			peak[s] = max(peak[s], held[s]+peak[c])
			held[s] += size(int(c))
		}
		peak[s] = max(peak[s], held[s]+size(s))
	}
	out := mem.get(ns)[:0]
	var stack []int32
	for r := range ns {
		if into[r] != int32(r) || tree[r] != none {
			continue
		}
		stack = append(stack, int32(r))
		for len(stack) > 0 {
			s := stack[len(stack)-1]
			if s < 0 {
				stack = stack[:len(stack)-1]
				out = append(out, ^s)
				continue
			}
			stack[len(stack)-1] = ^s
			kids := list[ptr[s]:ptr[s+1]]
			for i := len(kids) - 1; i >= 0; i-- {
				stack = append(stack, kids[i])
			}
		}
	}
	return out
}

// frontRows fills rows, runs and panel.
func (a *Analysis) frontRows(g graph, mem *pool) {
	m := int32(a.fronts())
	a.rows = large[int32](int(a.rowPtr[m]))
	a.panel = make([]int64, m+1)
	a.runPtr = make([]int64, m)
	a.runEnd = make([]int64, m)
	a.runs = make([]run, 0, 4*m)
	stamp := mem.filled(a.n, none)
	local := mem.get(a.n) // position of a row in the front at hand
	spare := mem.get(a.n)
	defer mem.put(stamp, local, spare)
	for s := range m {
		last := a.first[s+1] - 1
		out := a.rows[a.rowPtr[s]:a.rowPtr[s]:a.rowPtr[s+1]]
		kids := a.children[a.childPtr[s]:a.childPtr[s+1]]
		parts := 0
		for _, c := range kids {
			rows := a.rows[a.rowPtr[c]:a.rowPtr[c+1]]
			for len(rows) > 0 && rows[0] <= last {
				rows = rows[1:]
			}
			sorted := len(out)
			for _, i := range rows {
				if stamp[i] != s {
					stamp[i] = s
					out = append(out, i)
				}
			}
			if parts++; parts <= maxMerges {
				mergeTail(out, sorted, spare)
			}
		}
		sorted := len(out)
		for j := a.first[s]; j <= last; j++ {
			for _, node := range g.row(a.order[j]) {
				if i := a.place[node]; i > last && stamp[i] != s {
					stamp[i] = s
					out = append(out, i)
				}
			}
		}
		if parts <= maxMerges {
			slices.Sort(out[sorted:])
			mergeTail(out, sorted, spare)
		} else {
			slices.Sort(out)
		}
		cols, rows := a.shape(s)
		a.panel[s+1] = a.panel[s] + int64(cols)*int64(rows)
		for k, i := range out {
			local[i] = int32(cols + k)
		}
		for _, c := range kids {
			a.runPtr[c] = int64(len(a.runs))
			a.findRuns(c, s, local)
			a.runEnd[c] = int64(len(a.runs))
		}
	}
}

// maxMerges is the number of sorted lists from which sorting their union beats
// merging them one by one.
const maxMerges = 8

// mergeTail merges out[:mid] and out[mid:], both ascending, by way of spare.
func mergeTail(out []int32, mid int, spare []int32) {
	if mid == 0 || mid == len(out) || out[mid-1] < out[mid] {
		return
	}
	tail := spare[:copy(spare, out[mid:])]
	i, k := mid-1, len(out)-1
	for j := len(tail) - 1; j >= 0; k-- {
		if i >= 0 && out[i] > tail[j] {
			out[k] = out[i]
			i--
		} else {
			out[k] = tail[j]
			j--
		}
	}
}

// findRuns appends the runs of front c in the front of its parent s, whose
// rows have the positions local. No run crosses from the columns that the
// parent eliminates to its update rows.
func (a *Analysis) findRuns(c, s int32, local []int32) {
	first, end := a.first[s], a.first[s+1]
	next := int32(-1)
	for _, i := range a.rows[a.rowPtr[c]:a.rowPtr[c+1]] {
		p := i - first
		if i >= end {
			p = local[i]
			if next == end-first {
				next = -1
			}
		}
		if p == next {
			a.runs[len(a.runs)-1].length++
		} else {
			a.runs = append(a.runs, run{p, 1})
		}
		next = p + 1
	}
}

// runsOf front c in its parent's front.
func (a *Analysis) runsOf(c int32) []run { return a.runs[a.runPtr[c]:a.runEnd[c]] }

// assembly lists for each front where its values go.
func (a *Analysis) assembly(pairs [][2]int32, mem *pool) error {
	m := a.fronts()
	for s := range int32(m) {
		if a.panel[s+1]-a.panel[s] > math.MaxInt32 {
			return ErrTooLarge
		}
	}
	super := mem.get(a.n)
	front := mem.get(len(pairs))
	defer mem.put(super, front)
	for s := range int32(m) {
		for j := a.first[s]; j < a.first[s+1]; j++ {
			super[j] = s
		}
	}
	place := a.place
	a.sourcePtr = make([]int64, m+1)
	for k, p := range pairs {
		s := super[min(place[p[0]], place[p[1]])]
		front[k] = s
		a.sourcePtr[s+1]++
	}
	for s := range m {
		a.sourcePtr[s+1] += a.sourcePtr[s]
	}
	a.source = large[int32](len(pairs))
	a.target = large[int32](len(pairs))
	at := slices.Clone(a.sourcePtr[:m])
	for k, s := range front {
		a.source[at[s]] = int32(k)
		at[s]++
	}
	local := super // reused: super of later columns is not needed again
	for s := range int32(m) {
		c0, c1 := a.first[s], a.first[s+1]
		cols, ld := a.shape(s)
		for i := c0; i < c1; i++ {
			local[i] = i - c0
		}
		for k, i := range a.rows[a.rowPtr[s]:a.rowPtr[s+1]] {
			local[i] = int32(cols + k)
		}
		target := a.target[a.sourcePtr[s]:a.sourcePtr[s+1]]
		for x, k := range a.source[a.sourcePtr[s]:a.sourcePtr[s+1]] {
			p := pairs[k]
			i, j := place[p[0]], place[p[1]]
			target[x] = (min(i, j)-c0)*int32(ld) + local[max(i, j)]
		}
	}
	return nil
}

// measure fills in the cost.
func (a *Analysis) measure() {
	c := &a.cost
	c.Fronts = a.fronts()
	for s := range int32(c.Fronts) {
		cols, rows := a.shape(s)
		nc, nu := float64(cols), float64(rows-cols)
		c.Nonzeros += int64(cols)*int64(cols+1)/2 + int64(cols)*int64(rows-cols)
		c.Flops += frontFlops(nc, nu)
		c.LargestFront = max(c.LargestFront, rows)
	}
	c.Bytes = 8*a.panel[c.Fronts] + 8*a.plan.floats(a.workers(), a.n) +
		4*(3*int64(a.n)+int64(len(a.rows))+4*int64(c.Fronts)+2*int64(a.entries)) + 8*int64(len(a.runs)) + 40*int64(c.Fronts) +
		32*int64(a.n) // L·D·Lᵀ only
}

// frontFlops counts the multiplications and additions of eliminating nc columns
// with nu update rows, lower triangle only: Σ (r² + r) for r rows below each pivot.
func frontFlops(nc, nu float64) float64 {
	sum := func(m float64) float64 { return m*(m+1)*(2*m+1)/6 + m*(m+1)/2 }
	return sum(nc+nu-1) - sum(nu-1)
}
