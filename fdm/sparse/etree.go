package sparse

// eliminationTree returns the parent of each column of L (none for a root) for
// the pattern g eliminated in the order given; columns are numbered in that
// order, place[i] being the column of node i.
//
// J. W. H. Liu: The role of elimination trees in sparse factorization. SIAM J.
// Matrix Anal. Appl. 11 (1990), 134-172.
func eliminationTree(g graph, order, place []int32, mem *pool) []int32 {
	parent, ancestor := mem.get(g.n), mem.get(g.n)
	defer mem.put(ancestor)
	for j := range int32(g.n) {
		parent[j], ancestor[j] = none, none
		for _, i := range g.row(order[j]) {
			k := place[i]
			for k != none && k < j {
				up := ancestor[k]
				ancestor[k] = j
				if up == none {
					parent[k] = j
				}
				k = up
			}
		}
	}
	return parent
}

// postorder returns the nodes of a forest with children before parents and
// each subtree contiguous; children keep their order.
func postorder(parent []int32, mem *pool) []int32 {
	n := len(parent)
	child, sibling := mem.filled(n, none), mem.get(n)
	defer mem.put(child, sibling)
	roots := none
	for i := int32(n) - 1; i >= 0; i-- {
		if p := parent[i]; p != none {
			sibling[i] = child[p]
			child[p] = i
		} else {
			sibling[i] = roots
			roots = i
		}
	}
	post := mem.get(n)[:0]
	stack := make([]int32, 0, 64)
	for r := roots; r != none; r = sibling[r] {
		stack = append(stack, r)
		for len(stack) > 0 {
			i := stack[len(stack)-1]
			if c := child[i]; c != none {
				child[i] = none
				// Push the first child last, by walking the chain downwards.
				at := len(stack)
				for ; c != none; c = sibling[c] {
					stack = append(stack, c)
				}
				for a, b := at, len(stack)-1; a < b; a, b = a+1, b-1 {
					stack[a], stack[b] = stack[b], stack[a]
				}
				continue
			}
			stack = stack[:len(stack)-1]
			post = append(post, i)
		}
	}
	return post
}

// columnCounts returns the number of entries of each column of L, diagonal
// included. The columns must be numbered in a postorder of parent.
//
// J. R. Gilbert, E. G. Ng & B. W. Peyton: An efficient algorithm to compute row
// and column counts for sparse Cholesky factorization. SIAM J. Matrix Anal.
// Appl. 15 (1994), 1075-1091.
func columnCounts(g graph, order, place, parent []int32, mem *pool) []int32 {
	n := int32(g.n)
	size := int(n)
	count := mem.filled(size, 0)
	first := mem.filled(size, none) // least descendant
	reach := mem.filled(size, none) // greatest first descendant met so far in a row's subtree
	leaf := mem.filled(size, none)  // last leaf met in a row's subtree
	set := mem.get(size)            // disjoint sets towards the tree's ancestors
	defer mem.put(first, reach, leaf, set)
	for j := range n {
		set[j] = j
	}
	for j := range n {
		if first[j] == none {
			count[j] = 1 // a leaf of the tree
		}
		for k := j; k != none && first[k] == none; k = parent[k] {
			first[k] = j
		}
	}
	for j := range n {
		p := parent[j]
		if p != none {
			count[p]--
		}
		for _, node := range g.row(order[j]) {
			i := place[node]
			if i <= j || first[j] <= reach[i] {
				continue // not below the diagonal, or j is no leaf of row i's subtree
			}
			reach[i] = first[j]
			prev := leaf[i]
			leaf[i] = j
			count[j]++
			if prev != none {
				// The path that prev already counted starts at their common ancestor.
				q := prev
				for q != set[q] {
					q = set[q]
				}
				for s := prev; s != q; {
					s, set[s] = set[s], q
				}
				count[q]--
			}
		}
		if p != none {
			set[j] = p
		}
	}
	for j := range n {
		if p := parent[j]; p != none {
			count[p] += count[j]
		}
	}
	return count
}
