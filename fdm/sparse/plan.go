package sparse

import (
	"cmp"
	"runtime"
	"slices"
)

// plan is how a factorisation runs through the tree: where each update matrix
// stands while it waits for its parent, and what may run side by side. It
// depends on the pattern only, so that the result does not depend on how many
// processors there are.
type plan struct {
	// update[s] is the place of front s's update matrix when one worker runs through the whole tree with a
	// stack of the given number of floats.
	update []int64
	stack  int64

	// For several workers the tree is cut into subtrees, each run by one worker
	// with its own stack of taskStack floats, and a top. The subtrees are
	// fronts taskFirst[t] to taskRoot[t], all before the fronts in top. Update
	// matrices of roots of subtrees and of top fronts stand in a common store
	// of topStore floats. local[s] is the place of the update within whichever
	// of the two is meant by shared[s].
	taskFirst, taskRoot []int32
	top                 []int32
	local               []int64
	shared              []bool
	taskStack, topStore int64

	scratch int // floats of scratch space a worker needs
}

// parallelFlops is the work below which a second goroutine does not pay.
const parallelFlops = 4e6

// newPlan lays out the stacks.
func (a *Analysis) newPlan() plan {
	m := int32(a.fronts())
	p := plan{update: make([]int64, m)}
	all := make([]int32, m)
	for s := range m {
		all[s] = s
	}
	odd := a.depthParity()
	p.stack = a.layStack(p.update, all, odd, nil)
	for s := range m {
		_, rows := a.shape(s)
		p.scratch = max(p.scratch, rows)
	}
	// The scratch holds packed rows, a block of W = L·D, or the three columns of
	// a solve.
	if p.scratch >= packFrom {
		p.scratch = (p.scratch + packRows) * packDepth
	} else {
		p.scratch *= ldlBlock
	}
	a.planTasks(&p, odd)
	return p
}

// depthParity tells the fronts of odd depth. Fronts of even depth put their
// updates at the bottom of a stack, those of odd depth at its top: the updates
// of the children are then the last ones on their side, whatever the parent
// puts down on the other.
func (a *Analysis) depthParity() []bool {
	odd := make([]bool, a.fronts())
	for s := len(odd) - 1; s >= 0; s-- {
		if q := a.parent[s]; q != none {
			odd[s] = !odd[q]
		}
	}
	return odd
}

func (a *Analysis) updateSize(s int32) int64 {
	n := a.rowPtr[s+1] - a.rowPtr[s]
	if n < packFrom {
		return n * n
	}
	return int64(updateFloats(int(n)))
}

// layStack gives the updates of fronts (in order of elimination) their places
// in at and returns the size of the stack. Children for which skip holds have
// their updates elsewhere.
func (a *Analysis) layStack(at []int64, fronts []int32, odd []bool, skip func(int32) bool) int64 {
	var used [2]int64
	var size int64
	for _, s := range fronts {
		k := 0
		if odd[s] {
			k = 1
		}
		at[s] = used[k]
		used[k] += a.updateSize(s)
		size = max(size, used[0]+used[1])
		for _, c := range a.children[a.childPtr[s]:a.childPtr[s+1]] {
			if skip == nil || !skip(c) {
				used[1-k] -= a.updateSize(c)
			}
		}
	}
	for _, s := range fronts {
		if odd[s] {
			at[s] = size - at[s] - a.updateSize(s)
		}
	}
	return size
}

// planTasks cuts the tree into subtrees of at most a sixteenth of the work.
func (a *Analysis) planTasks(p *plan, odd []bool) {
	m := int32(a.fronts())
	work := make([]float64, m)
	least := make([]int32, m) // first front of the subtree
	total := 0.0
	for s := range m {
		cols, rows := a.shape(s)
		w := frontFlops(float64(cols), float64(rows-cols)) + 50*float64(rows)
		total += w
		work[s] += w
		least[s] = s
		for _, c := range a.children[a.childPtr[s]:a.childPtr[s+1]] {
			work[s] += work[c]
			least[s] = min(least[s], least[c])
		}
	}
	if total < 2*parallelFlops {
		return
	}
	limit := max(total/16, parallelFlops)
	p.local = make([]int64, m)
	p.shared = make([]bool, m)
	for s := m - 1; s >= 0; s-- {
		up := a.parent[s]
		if up != none && work[up] <= limit {
			continue // inside a subtree
		}
		p.shared[s] = true
		if work[s] <= limit {
			p.taskFirst = append(p.taskFirst, least[s])
			p.taskRoot = append(p.taskRoot, s)
		} else {
			p.top = append(p.top, s)
		}
	}
	for i, j := 0, len(p.top)-1; i < j; i, j = i+1, j-1 {
		p.top[i], p.top[j] = p.top[j], p.top[i]
	}
	if len(p.top) == 0 && len(p.taskRoot) < 2 {
		*p = plan{update: p.update, stack: p.stack, scratch: p.scratch}
		return
	}
	isRoot := make([]bool, m)
	for _, r := range p.taskRoot {
		isRoot[r] = true
	}
	inside := make([]int32, 0, m)
	for t, r := range p.taskRoot {
		inside = inside[:0]
		for s := p.taskFirst[t]; s < r; s++ {
			inside = append(inside, s)
		}
		p.taskStack = max(p.taskStack, a.layStack(p.local, inside, odd, nil))
	}
	p.topStore = a.layStack(p.local, p.top, odd, func(c int32) bool { return isRoot[c] })
	for _, r := range p.taskRoot {
		p.local[r] = p.topStore
		p.topStore += a.updateSize(r)
	}
	// Largest tasks first: the last to finish is then a small one.
	type task struct {
		first, root int32
	}
	tasks := make([]task, len(p.taskRoot))
	for t := range tasks {
		tasks[t] = task{p.taskFirst[t], p.taskRoot[t]}
	}
	slices.SortStableFunc(tasks, func(x, y task) int { return cmp.Compare(work[y.root], work[x.root]) })
	for t := range tasks {
		p.taskFirst[t], p.taskRoot[t] = tasks[t].first, tasks[t].root
	}
}

// workers is the number of goroutines a factorisation uses.
func (a *Analysis) workers() int {
	if len(a.plan.taskRoot) == 0 {
		return 1
	}
	n := a.opts.Workers
	if n <= 0 {
		n = runtime.GOMAXPROCS(0)
	}
	return max(1, min(n, len(a.plan.taskRoot)+1))
}

// floats is the number of floats in stacks and scratch of so many workers for n
// unknowns. A solve takes the stack of the first.
func (p *plan) floats(workers, n int) int64 {
	x := int64(solveWidth * n)
	if workers <= 1 {
		return max(p.stack, x) + int64(p.scratch)
	}
	return p.topStore + max(p.taskStack, x) + int64(workers-1)*p.taskStack + int64(workers)*int64(p.scratch)
}
