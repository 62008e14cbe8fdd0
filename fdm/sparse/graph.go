package sparse

// graph is the adjacency of a symmetric pattern without its diagonal: the
// neighbours of node i are adj[ptr[i]:ptr[i+1]], each once, both directions.
type graph struct {
	n   int
	ptr []int32
	adj []int32
}

// newGraph builds the adjacency of n nodes from pairs given in either
// direction, dropping loops and duplicates. Cost O(n + len(pairs)).
func newGraph(n int, pairs [][2]int32, mem *pool) graph {
	ptr := mem.filled(n+1, 0)
	for _, p := range pairs {
		if p[0] != p[1] {
			ptr[p[0]]++
			ptr[p[1]]++
		}
	}
	var sum int32
	for i, d := range ptr {
		ptr[i] = sum
		sum += d
	}
	adj := mem.get(int(sum))
	for _, p := range pairs {
		i, j := p[0], p[1]
		if i != j {
			adj[ptr[i]] = j
			adj[ptr[j]] = i
			ptr[i]++
			ptr[j]++
		}
	}
	// ptr[i] is now the end of row i: compact while dropping duplicates.
	// seen[j] = i+1 marks j as met in row i.
	seen := mem.filled(n, 0)
	defer mem.put(seen)
	var out, from int32
	for i := range n {
		end := ptr[i]
		ptr[i] = out
		for _, j := range adj[from:end] {
			if seen[j] != int32(i)+1 {
				seen[j] = int32(i) + 1
				adj[out] = j
				out++
			}
		}
		from = end
	}
	ptr[n] = out
	return graph{n: n, ptr: ptr, adj: adj[:out]}
}

func (g *graph) row(i int32) []int32 { return g.adj[g.ptr[i]:g.ptr[i+1]] }
