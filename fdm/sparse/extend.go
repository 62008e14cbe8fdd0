package sparse

// run says that consecutive rows of a child's update matrix are consecutive
// rows of the parent's front: length rows from position on.
type run struct{ position, length int32 }

// appendRuns turns the positions of a child's update rows among the rows of its
// parent's front (ascending) into runs. No run crosses from the cols columns
// that the parent eliminates to its update rows.
func appendRuns(runs []run, rel []int32, cols int32) []run {
	for k, p := range rel {
		if k > 0 && p == rel[k-1]+1 && p != cols {
			runs[len(runs)-1].length++
			continue
		}
		runs = append(runs, run{p, 1})
	}
	return runs
}

// extendAdd adds those columns of a child's update u of n rows whose position
// in the parent is in [from, to) to dst, whose first row and column are position
// shift. Positions ascend, so that lower triangles go to lower triangles.
func extendAdd(dst []float64, ld, shift int, u []float64, n int, runs []run, from, to int) {
	j := 0 // column of u
	for len(runs) > 0 && int(runs[0].position) < from {
		j += int(runs[0].length)
		runs = runs[1:]
	}
	cols := 0
	last := 0
	for _, r := range runs {
		if int(r.position) >= to {
			break
		}
		cols += int(r.length)
		last = int(r.position + r.length)
	}
	if cols == 0 {
		return
	}
	if !haveStrips {
		extendAddPortable(dst, ld, shift, u, n, runs, j, cols)
		return
	}
	// The last entry of the last column, checked once.
	end := runs[len(runs)-1]
	_ = dst[(last-1-shift)*ld+int(end.position+end.length)-1-shift]
	_ = u[(j+cols)*n-1]
	// Not more than some 50 µs at a time.
	step, skip := max(1, stripWork/4/n), 0
	for {
		addRuns(&dst[0], &u[j*(n+1)], ld, n, min(step, cols), skip, shift, &runs[0], len(runs))
		if cols <= step {
			return
		}
		j += step
		cols -= step
		skip += step
		for skip >= int(runs[0].length) {
			skip -= int(runs[0].length)
			runs = runs[1:]
		}
	}
}

// extendAddPortable does it for cols columns of u from j on, the first of which
// is the first of runs.
func extendAddPortable(dst []float64, ld, shift int, u []float64, n int, runs []run, j, cols int) {
	for k := 0; cols > 0; k++ {
		position, length := int(runs[k].position), int(runs[k].length)
		for c := range length {
			d := dst[(position+c-shift)*ld:]
			src := u[j*(n+1):]
			first := position + c
			left := length - c
			for x := k; ; {
				e := d[first-shift:][:left]
				for i, v := range src[:left] {
					e[i] += v
				}
				src = src[left:]
				if x++; x == len(runs) {
					break
				}
				first, left = int(runs[x].position), int(runs[x].length)
			}
			j++
		}
		cols -= length
	}
}
