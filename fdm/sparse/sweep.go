package sparse

// sweep is a numbering of a graph from one end to the other: each connected
// part breadth first from a node far from another. What is near in the graph
// is then near in memory, and what has to choose among equals goes along a line
// that sweeps over the net.
type sweep struct {
	order  []int32 // node of the graph given at each place
	levels []int32 // first place of each level of the search, part by part
	parts  []int32 // first level of each part
	// Places from here on have hubs, nodes with so many neighbours that
	// everything would be near through them: the search did not go there.
	end int32
}

// newSweep numbers g and returns g so numbered. The arrays of g go to mem.
func newSweep(g graph, mem *pool) (sweep, graph) {
	n := int32(g.n)
	order, place := mem.get(g.n), mem.get(g.n)
	s := sweep{order: order, end: n, levels: make([]int32, 0, 256)}
	const met = -2
	hub := denseDegree(g.n)
	for i := n - 1; i >= 0; i-- {
		place[i] = none
		if g.ptr[i+1]-g.ptr[i] > hub {
			s.end--
			order[s.end], place[i] = i, s.end
		}
	}
	from := int32(0)
	for root := range n {
		if place[root] != none {
			continue
		}
		// Once to find the nodes farthest away; of these the one with least
		// neighbours is likely a corner. Once from there.
		q := order[from:s.end]
		q[0], place[root] = root, met
		to, level, levelEnd := 1, 0, 1
		for k := 0; k < to; k++ {
			if k == levelEnd {
				level, levelEnd = k, to
			}
			for _, j := range g.row(q[k]) {
				if place[j] == none {
					place[j] = met
					q[to] = j
					to++
				}
			}
		}
		start := slender(g, q[level:to])
		q[0], place[start] = start, from
		s.parts = append(s.parts, int32(len(s.levels)))
		s.levels = append(s.levels, from)
		to, levelEnd = 1, 1
		for k := 0; k < to; k++ {
			if k == levelEnd {
				s.levels = append(s.levels, from+int32(k))
				levelEnd = to
			}
			for _, j := range g.row(q[k]) {
				if place[j] == met {
					place[j] = from + int32(to)
					q[to] = j
					to++
				}
			}
		}
		from += int32(to)
	}
	h := graph{n: g.n, ptr: mem.get(g.n + 1), adj: mem.get(len(g.adj))}
	at := int32(0)
	for k, i := range order {
		h.ptr[k] = at
		for _, j := range g.row(i) {
			h.adj[at] = place[j]
			at++
		}
	}
	h.ptr[n] = at
	mem.put(place, g.ptr, g.adj)
	return s, h
}

// slender is the first of those nodes that have least neighbours.
func slender(g graph, nodes []int32) int32 {
	best := nodes[0]
	for _, i := range nodes[1:] {
		if g.ptr[i+1]-g.ptr[i] < g.ptr[best+1]-g.ptr[best] {
			best = i
		}
	}
	return best
}

// part returns the places from and to of part k and its levels.
func (s *sweep) part(k int) (from, to int32, levels []int32) {
	levels = s.levels[s.parts[k]:]
	to = s.end
	if k+1 < len(s.parts) {
		levels = s.levels[s.parts[k]:s.parts[k+1]]
		to = s.levels[s.parts[k+1]]
	}
	return levels[0], to, levels
}

// largest is the number of nodes in the largest part.
func (s *sweep) largest() int {
	size := int32(0)
	for k := range s.parts {
		from, to, _ := s.part(k)
		size = max(size, to-from)
	}
	return int(size)
}

// plainSweep is for n nodes whose numbering is kept.
func plainSweep(n int) sweep { return sweep{end: int32(n)} }
