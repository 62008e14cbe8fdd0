package mesh

// order numbers the points in triangles inside, breadth first from the first
// point of the outline (Cuthill and McKee 1969), so that what is near in the mesh
// is near in memory, and lists the triangles inside by their first point.
func (r *refinement) order() (points, triangles []int32) {
	d := r.d
	rank := make([]int32, len(d.p))
	points = make([]int32, 0, len(d.p))
	visit := func(i int32) {
		if i >= 3 && r.used[i] && rank[i] == 0 {
			points = append(points, i)
			rank[i] = int32(len(points))
		}
	}
	done := 0
	for seed := range d.p {
		visit(int32(seed))
		for ; done < len(points); done++ {
			d.around(points[done], func(_, next, _ int32) { visit(next) })
		}
	}
	// By counting.
	first := make([]int32, len(points)+2)
	key := func(t int) int32 {
		v := d.v[t]
		return min(rank[v[0]], rank[v[1]], rank[v[2]])
	}
	for t, in := range r.in {
		if in {
			first[key(t)+1]++
		}
	}
	for k := 1; k < len(first); k++ {
		first[k] += first[k-1]
	}
	triangles = make([]int32, first[len(first)-1])
	for t, in := range r.in {
		if in {
			k := key(t)
			triangles[first[k]] = int32(t)
			first[k]++
		}
	}
	return points, triangles
}
