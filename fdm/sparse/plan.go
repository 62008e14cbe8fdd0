package sparse

// plan is how a factorisation runs through the tree: where each update matrix
// stands while it waits for its parent. It depends on the pattern only.
type plan struct {
	// update[s] is the place of front s's update matrix (square, full storage,
	// lower triangle used) in its stack.
	update []int64
	stack  int64 // floats of the stack
}

func (p *plan) stackFloats() int64 { return p.stack }

func (a *Analysis) newPlan() plan {
	m := int32(a.fronts())
	p := plan{update: make([]int64, m)}
	// Fronts of even depth put their updates at the bottom of the stack, those
	// of odd depth at its top: the updates of the children are then the last
	// ones on their side, whatever the parent puts down on the other.
	odd := make([]bool, m)
	for s := m - 1; s >= 0; s-- {
		if q := a.parent[s]; q != none {
			odd[s] = !odd[q]
		}
	}
	var used [2]int64
	side := func(s int32) int {
		if odd[s] {
			return 1
		}
		return 0
	}
	size := func(s int32) int64 {
		cols, rows := a.shape(s)
		return int64(rows-cols) * int64(rows-cols)
	}
	for s := range m {
		k := side(s)
		p.update[s] = used[k]
		used[k] += size(s)
		p.stack = max(p.stack, used[0]+used[1])
		for _, c := range a.children[a.childPtr[s]:a.childPtr[s+1]] {
			used[1-k] -= size(c)
		}
	}
	for s := range m {
		if odd[s] {
			p.update[s] = p.stack - p.update[s] - size(s)
		}
	}
	return p
}
