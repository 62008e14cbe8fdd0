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
// shift. Positions ascend, so that lower triangles go to lower triangles. u is
// cut into chunks, see [updateAt].
func extendAdd(dst []float64, ld, shift int, u []float64, n, chunk int, runs []run, from, to int) {
	j := 0 // column of u
	for len(runs) > 0 && int(runs[0].position+runs[0].length) <= from {
		j += int(runs[0].length)
		runs = runs[1:]
	}
	cols, last := 0, 0
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
	skip := max(0, from-int(runs[0].position))
	j += skip
	over := max(0, last-to)
	cols -= skip + over
	last -= over
	// The last entry of the last column, checked once.
	end := runs[len(runs)-1]
	_ = dst[(last-1-shift)*ld+int(end.position+end.length)-1-shift]
	// Not more than some 50 µs at a time.
	step := cols
	if cols*n > stripWork/4 {
		step = max(1, stripWork/4/n)
	}
	for {
		at, ldu := updateAt(n, chunk, j)
		some := min(step, cols)
		if chunk < n {
			some = min(some, chunk-j%chunk)
		}
		src := u[at:]
		if haveStrips {
			_ = src[(some-1)*(ldu+1)+n-j-some]
			addRuns(&dst[0], &src[0], ld, ldu, some, skip, shift, &runs[0], len(runs))
		} else {
			addRunsPortable(dst, src, ld, ldu, some, skip, shift, runs)
		}
		if some == cols {
			return
		}
		j += some
		cols -= some
		skip += some
		for skip >= int(runs[0].length) {
			skip -= int(runs[0].length)
			runs = runs[1:]
		}
	}
}

// extendUpdate adds what is left of a child's update u of n rows to the update
// matrix dst of nu rows of a front that eliminates cols columns.
func extendUpdate(dst []float64, nu int, u []float64, n int, runs []run, cols int) {
	chunk := updateChunk(nu)
	if nu <= chunk {
		extendAdd(dst, nu, cols, u, n, updateChunk(n), runs, cols, cols+nu)
		return
	}
	for j := 0; j < nu; j += chunk {
		at, ld := updateAt(nu, chunk, j)
		extendAdd(dst[at:], ld, cols+j, u, n, updateChunk(n), runs, cols+j, min(cols+j+chunk, cols+nu))
	}
}

// updateAt finds the diagonal entry of column j of an update matrix of n rows and
// the distance of the columns there. An update matrix is a lower triangle in
// chunks of so many columns, each with the rows from its first column on.
func updateAt(n, chunk, j int) (at, ld int) {
	if j < chunk {
		return j * (n + 1), n
	}
	k := j / chunk
	ld = n - k*chunk
	return chunk*(k*n-chunk*(k*(k-1)/2)) + (j-k*chunk)*(ld+1), ld
}

// updateChunk is the width of the chunks of an update matrix: small ones are a
// square.
func updateChunk(n int) int {
	if n < packFrom {
		return packFrom
	}
	return packColumns
}

// updateFloats is the size of an update matrix.
func updateFloats(n int) int {
	chunk := updateChunk(n)
	if n <= chunk {
		return n * n
	}
	whole := n / chunk * chunk
	at, ld := updateAt(n, chunk, whole)
	return at + (n-whole)*ld
}

// addRunsPortable is addRuns in plain Go.
func addRunsPortable(dst, src []float64, ld, n, cols, skip, shift int, runs []run) {
	for range cols {
		if skip == int(runs[0].length) {
			skip = 0
			runs = runs[1:]
		}
		d := dst[(int(runs[0].position)+skip-shift)*ld:]
		s := src
		for k, r := range runs {
			first, left := int(r.position)-shift, int(r.length)
			if k == 0 {
				first, left = first+skip, left-skip
			}
			e := d[first:][:left]
			for i, v := range s[:left] {
				e[i] += v
			}
			s = s[left:]
		}
		if len(src) > n {
			src = src[n+1:]
		}
		skip++
	}
}
