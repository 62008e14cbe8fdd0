package sparse

// compression joins nodes with the same closed neighbourhood, as the unknowns
// of one point of a structure have: they can be eliminated together, and the
// ordering has a ninth of the edges to look at if there are three directions.
type compression struct {
	g      graph
	weight []int32 // nodes joined
	ptr    []int32 // members of group k: member[ptr[k]:ptr[k+1]]
	member []int32
}

// closedHash is the same for nodes with the same closed neighbourhood.
func closedHash(g graph, i int32) uint32 {
	mix := func(j int32) uint32 {
		h := uint32(j) * 0x9E3779B1
		return h ^ h>>15
	}
	h := mix(i)
	for _, j := range g.row(i) {
		h += mix(j)
	}
	return h
}

// compressible looks at some nodes for a neighbour with the same closed
// neighbourhood.
func compressible(g graph) bool {
	const samples = 64
	found := 0
	step := max(1, g.n/samples)
	for i := step / 2; i < g.n; i += step {
		h := closedHash(g, int32(i))
		for _, j := range g.row(int32(i)) {
			if len(g.row(j)) == len(g.row(int32(i))) && closedHash(g, j) == h {
				found++
				break
			}
		}
	}
	return found > 0 && found*4 >= min(samples, g.n/step)
}

// compress joins what can be joined, in order of the nodes.
func compress(g graph) compression {
	n := int32(g.n)
	hash := make([]uint32, n)
	for i := range n {
		hash[i] = closedHash(g, i)
	}
	group := make([]int32, n)
	mark := make([]int32, n)
	for i := range n {
		group[i], mark[i] = none, none
	}
	c := compression{ptr: []int32{0}, member: make([]int32, 0, n)}
	for i := range n {
		if group[i] != none {
			continue
		}
		k := int32(len(c.weight))
		group[i] = k
		c.member = append(c.member, i)
		row := g.row(i)
		marked := false
		for _, j := range row {
			if group[j] != none || hash[j] != hash[i] || len(g.row(j)) != len(row) {
				continue
			}
			if !marked {
				marked = true
				mark[i] = i
				for _, x := range row {
					mark[x] = i
				}
			}
			same := true
			for _, x := range g.row(j) {
				same = same && mark[x] == i
			}
			if same {
				group[j] = k
				c.member = append(c.member, j)
			}
		}
		c.ptr = append(c.ptr, int32(len(c.member)))
		c.weight = append(c.weight, c.ptr[k+1]-c.ptr[k])
	}
	m := len(c.weight)
	c.g = graph{n: m, ptr: make([]int32, m+1)}
	for i := range n {
		mark[i] = none
	}
	for k := range int32(m) {
		mark[k] = k
		for _, j := range g.row(c.member[c.ptr[k]]) {
			if q := group[j]; mark[q] != k {
				mark[q] = k
				c.g.adj = append(c.g.adj, q)
			}
		}
		c.g.ptr[k+1] = int32(len(c.g.adj))
	}
	return c
}

// expand turns an order of groups into one of nodes.
func (c *compression) expand(order []int32) []int32 {
	out := make([]int32, 0, len(c.member))
	for _, k := range order {
		out = append(out, c.member[c.ptr[k]:c.ptr[k+1]]...)
	}
	return out
}
