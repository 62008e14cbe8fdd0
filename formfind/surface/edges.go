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
// Cost O(T log T).
func Edges(corners [][3]int32) []Edge {
	type half struct {
		key uint64
		tri int32
	}
	halves := make([]half, 0, 3*len(corners))
	for t, c := range corners {
		for k := range 3 {
			a, b := c[k], c[(k+1)%3]
			if a > b {
				a, b = b, a
			}
			halves = append(halves, half{uint64(uint32(a))<<32 | uint64(uint32(b)), int32(t)})
		}
	}
	slices.SortFunc(halves, func(x, y half) int {
		switch {
		case x.key < y.key:
			return -1
		case x.key > y.key:
			return 1
		}
		return int(x.tri) - int(y.tri)
	})
	out := make([]Edge, 0, len(halves)/2+8)
	for i := 0; i < len(halves); {
		j := i + 1
		for j < len(halves) && halves[j].key == halves[i].key {
			j++
		}
		e := Edge{
			Nodes:     [2]int32{int32(halves[i].key >> 32), int32(halves[i].key & 0xffffffff)},
			Triangles: j - i, First: halves[i].tri, Second: -1,
		}
		if j-i > 1 {
			e.Second = halves[i+1].tri
		}
		out = append(out, e)
		i = j
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
