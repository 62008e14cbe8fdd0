package newton

import "slices"

// pattern maps blocks between nodes to the values of the sparse matrix.
// Unknown directions a of node i and b of node j, with first[i] < first[j], are
// at values[block + a·(directions of j) + b]; the off-diagonal pairs (0,1),
// (0,2), (1,2) of one node at values[own…].
type pattern struct {
	pairs    [][2]int32
	own      []int32    // by node, index into values of its off-diagonal pairs, −1
	member   []int32    // by member, index of its block, −1 none, sameNode
	triangle [][3]int32 // by triangle, blocks of corners (0,1), (1,2), (2,0)
}

// sameNode marks two nodes that move as one.
const sameNode = -2

func (v *Solver) directions(i int32) int { return int(v.start[i+1] - v.start[i]) }

func (v *Solver) newPattern() *pattern {
	s := v.s
	n := len(s.Position)
	p := &pattern{own: make([]int32, n), member: make([]int32, len(s.Ends)), triangle: make([][3]int32, len(s.Corners))}

	// A node stands for its unknowns: tied nodes for those of their centre.
	rep := make([]int32, n)
	for i := range rep {
		rep[i] = int32(i)
		if m := s.MasterOf(i); m >= 0 {
			rep[i] = m
		}
	}
	each := func(f func(i, j int32)) {
		for m, e := range s.Ends {
			if v.active[m] {
				f(rep[e[0]], rep[e[1]])
			}
		}
		for _, c := range s.Corners {
			f(rep[c[0]], rep[c[1]])
			f(rep[c[1]], rep[c[2]])
			f(rep[c[2]], rep[c[0]])
		}
	}
	// Neighbours of each node with a higher number, sorted.
	ptr := make([]int32, n+1)
	each(func(i, j int32) {
		if i != j && v.first[i] >= 0 && v.first[j] >= 0 {
			ptr[min(i, j)+1]++
		}
	})
	for i := range n {
		ptr[i+1] += ptr[i]
	}
	adj := make([]int32, ptr[n])
	fill := slices.Clone(ptr[:n])
	each(func(i, j int32) {
		if i != j && v.first[i] >= 0 && v.first[j] >= 0 {
			lo, hi := min(i, j), max(i, j)
			adj[fill[lo]] = hi
			fill[lo]++
		}
	})
	at := make([]int32, ptr[n]) // value index of the block of adj
	end := make([]int32, n)     // end of the distinct neighbours
	for i := range int32(n) {
		p.own[i] = -1
		if v.first[i] < 0 || rep[i] != i {
			end[i] = ptr[i]
			continue
		}
		d := v.directions(i)
		p.own[i] = int32(v.unknown + len(p.pairs))
		for a := range d {
			for b := a + 1; b < d; b++ {
				p.pairs = append(p.pairs, [2]int32{v.first[i] + int32(a), v.first[i] + int32(b)})
			}
		}
		row := adj[ptr[i]:ptr[i+1]]
		slices.Sort(row)
		row = slices.Compact(row)
		end[i] = ptr[i] + int32(len(row))
		for k, j := range row {
			at[int(ptr[i])+k] = int32(v.unknown + len(p.pairs))
			for a := range d {
				for b := range v.directions(j) {
					p.pairs = append(p.pairs, [2]int32{v.first[i] + int32(a), v.first[j] + int32(b)})
				}
			}
		}
	}
	for i, r := range rep {
		p.own[i] = p.own[r]
	}
	block := func(i, j int32) int32 {
		i, j = rep[i], rep[j]
		if v.first[i] < 0 || v.first[j] < 0 {
			return -1
		}
		if i == j {
			return sameNode
		}
		lo, hi := min(i, j), max(i, j)
		k, _ := slices.BinarySearch(adj[ptr[lo]:end[lo]], hi)
		return at[int(ptr[lo])+k]
	}
	for m, e := range s.Ends {
		p.member[m] = block(e[0], e[1])
	}
	for t, c := range s.Corners {
		p.triangle[t] = [3]int32{block(c[0], c[1]), block(c[1], c[2]), block(c[2], c[0])}
	}
	return p
}
