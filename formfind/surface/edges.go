package surface

import (
	"slices"
)

// Edge is a side of one or more triangles.
type Edge struct {
	Nodes     [2]int32 // the smaller number first
	Triangles int      // how many triangles share it: 1 on a boundary, 2 inside, 3 or more where sheets branch
	First     int32    // the lowest-numbered triangle that has it
	Second    int32    // the next, −1 on a boundary
}

// Edges returns the sides of the triangles, each once, ordered by their nodes.
// Cost O(T) where few triangles meet at a node.
func Edges(corners [][3]int32) []Edge {
	n := int32(0)
	for _, c := range corners {
		n = max(n, c[0]+1, c[1]+1, c[2]+1)
	}
	// Sides by their lower node.
	ptr := make([]int32, n+1)
	for _, c := range corners {
		for k := range 3 {
			ptr[min(c[k], c[(k+1)%3])+1]++
		}
	}
	for i := range n {
		ptr[i+1] += ptr[i]
	}
	end := make([]int32, n)
	copy(end, ptr)
	type half struct{ far, tri int32 }
	halves := make([]half, ptr[n])
	for t, c := range corners {
		for k := range 3 {
			i, j := c[k], c[(k+1)%3]
			i, j = min(i, j), max(i, j)
			halves[end[i]] = half{j, int32(t)}
			end[i]++
		}
	}
	out := make([]Edge, 0, len(halves)/2+8)
	for i := range n {
		list := halves[ptr[i]:ptr[i+1]]
		slices.SortFunc(list, func(x, y half) int {
			if x.far != y.far {
				return int(x.far) - int(y.far)
			}
			return int(x.tri) - int(y.tri)
		})
		for len(list) > 0 {
			k := 1
			for k < len(list) && list[k].far == list[0].far {
				k++
			}
			e := Edge{Nodes: [2]int32{i, list[0].far}, Triangles: k, First: list[0].tri, Second: -1}
			if k > 1 {
				e.Second = list[1].tri
			}
			out = append(out, e)
			list = list[k:]
		}
	}
	return out
}

// BoundaryNodes reports for each of n nodes whether it lies on a side that has
// just one triangle.
func BoundaryNodes(n int, edges []Edge) []bool {
	b := make([]bool, n)
	for _, e := range edges {
		if e.Triangles == 1 {
			b[e.Nodes[0]], b[e.Nodes[1]] = true, true
		}
	}
	return b
}
