package mesh

// arrange numbers the inner points breadth first from the outline (Cuthill and
// McKee 1969) and the triangles by their first point, those outside last, so
// that what is near in the mesh is near in memory. The far corners and the
// points of the outline keep their numbers.
func (r *refinement) arrange() {
	d := r.d
	rank := make([]int32, len(d.p)) // place in the order, of all points
	to := make([]int32, len(d.p))   // new number
	list := make([]int32, 0, len(d.p))
	fresh := int32(r.rim)
	visit := func(i int32) {
		if i >= 3 && rank[i] == 0 {
			list = append(list, i)
			rank[i] = int32(len(list))
			if to[i] = i; int(i) >= r.rim {
				to[i] = fresh
				fresh++
			}
		}
	}
	to[1], to[2] = 1, 2
	done := 0
	for seed := range d.p {
		visit(int32(seed))
		for ; done < len(list); done++ {
			d.around(list[done], func(_, next, _ int32) { visit(next) })
		}
	}
	p, size := make([]xy, len(d.p)), make([]float64, len(d.p))
	for i, k := range to {
		p[k], size[k] = d.p[i], r.size[i]
	}
	d.p, r.size = p, size

	// Triangles by counting. What is outside comes last.
	first := make([]int32, len(list)+2)
	key := func(t int) int {
		if v := d.v[t]; r.in[t] {
			return int(min(rank[v[0]], rank[v[1]], rank[v[2]]))
		}
		return len(list)
	}
	for t := range d.v {
		first[key(t)+1]++
	}
	for k := 1; k < len(first); k++ {
		first[k] += first[k-1]
	}
	place := make([]int32, len(d.v)) // new number
	in := make([]bool, len(d.v))
	for t := range d.v {
		k := key(t)
		place[t] = first[k]
		in[first[k]] = r.in[t]
		first[k]++
	}
	r.in = in
	v, n, held := make([][3]int32, len(d.v)), make([][3]int32, len(d.v)), make([][3]bool, len(d.v))
	for t, k := range place {
		held[k] = d.held[t]
		for j := range 3 {
			c := to[d.v[t][j]]
			v[k][j], n[k][j] = c, -1
			d.at[c] = k
			if o := d.n[t][j]; o >= 0 {
				n[k][j] = place[o]
			}
		}
	}
	d.v, d.n, d.held, d.last = v, n, held, 0
}
