package newton

import "slices"

// sides calls f for every distinct side of a triangle, from the lower node i to
// the higher j, in order of i and then of j, with the number of triangles on it.
func sides(nodes int, corners [][3]int32, f func(i, j int32, uses int)) {
	ptr := make([]int32, nodes+1)
	for _, c := range corners {
		for k := range 3 {
			ptr[min(c[k], c[(k+1)%3])+1]++
		}
	}
	for i := range nodes {
		ptr[i+1] += ptr[i]
	}
	end := make([]int32, nodes)
	copy(end, ptr)
	far := make([]int32, ptr[nodes])
	for _, c := range corners {
		for k := range 3 {
			i, j := c[k], c[(k+1)%3]
			i, j = min(i, j), max(i, j)
			far[end[i]] = j
			end[i]++
		}
	}
	for i := range int32(nodes) {
		list := far[ptr[i]:ptr[i+1]]
		slices.Sort(list)
		for len(list) > 0 {
			j, n := list[0], 1
			for n < len(list) && list[n] == j {
				n++
			}
			f(i, j, n)
			list = list[n:]
		}
	}
}
