package fdm

// Parts without support are found by graph search, not by a zero pivot: in
// floating point a singular part usually ends with a pivot of rounding noise,
// and a shape somewhere near infinity.

// unsupported returns the nodes that are free in the directions of sys and from
// which no chain of links of weight other than zero leads to a node fixed in
// them, ascending. A nil weight takes every link.
func (s *Solver) unsupported(sys *system, weight []float64) []int32 {
	parts := newParts(sys.n)
	for k, l := range s.links {
		if weight == nil || weight[k] != 0 {
			parts.link(sys.unknown[l[0]], sys.unknown[l[1]])
		}
	}
	var nodes []int32
	for i, u := range sys.unknown {
		if u >= 0 && !parts.held[parts.find(u)] {
			nodes = append(nodes, int32(i))
		}
	}
	return nodes
}

// checkSupport looks for parts without support in all systems.
func (s *Solver) checkSupport(weight []float64) error {
	var found *SingularError
	for _, sys := range s.systems {
		nodes := s.unsupported(sys, weight)
		switch {
		case len(nodes) == 0:
		case found == nil:
			found = &SingularError{Nodes: nodes, Directions: sys.directions(), Cause: NoSupport}
		case equal(found.Nodes, nodes):
			found.Directions |= sys.directions()
		}
	}
	if found != nil {
		return found
	}
	return nil
}

func equal(a, b []int32) bool {
	if len(a) != len(b) {
		return false
	}
	for i := range a {
		if a[i] != b[i] {
			return false
		}
	}
	return true
}

// parts are disjoint sets of unknowns (Tarjan 1975: union with path halving).
type parts struct {
	parent []int32
	held   []bool // of the root: a support has been met
}

func newParts(n int) parts {
	p := parts{parent: make([]int32, n), held: make([]bool, n)}
	for i := range p.parent {
		p.parent[i] = int32(i)
	}
	return p
}

func (p *parts) find(i int32) int32 {
	for p.parent[i] != i {
		p.parent[i] = p.parent[p.parent[i]]
		i = p.parent[i]
	}
	return i
}

// link joins two unknowns; −1 stands for a support.
func (p *parts) link(a, b int32) {
	switch {
	case a < 0 && b < 0:
	case a < 0:
		p.held[p.find(b)] = true
	case b < 0:
		p.held[p.find(a)] = true
	default:
		ra, rb := p.find(a), p.find(b)
		if ra == rb {
			return
		}
		// The smaller number stays root; with path halving that is fast
		// enough and does not depend on the order of visits.
		if rb < ra {
			ra, rb = rb, ra
		}
		p.parent[rb] = ra
		p.held[ra] = p.held[ra] || p.held[rb]
	}
}
