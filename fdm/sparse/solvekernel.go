package sparse

// solveForward does x = L⁻¹·x for cols ≥ 1 columns of a front. p starts at their
// first diagonal entry; their rows are own ≥ cols unknowns from first on, then
// those in rows. Unless unit, the diagonal is stored inverted. An unknown is
// solveWidth floats of x.
func solveForward(p []float64, ld, cols, own, first int, rows []int32, x []float64, unit bool) {
	y := x[solveWidth*first:][:solveWidth*own]
	if haveStrips {
		// The accesses, checked once; rows are places of x by construction.
		_ = p[(cols-1)*ld+own+len(rows)-1]
		forwardFront(&p[0], &y[0], &x[0], ld, cols, own, rowsOf(rows), len(rows), unit)
		return
	}
	for j := range cols {
		c := p[j*ld+j:][:own-j+len(rows)]
		a := (*[solveWidth]float64)(y[solveWidth*j:])
		if !unit {
			for r := range a {
				a[r] *= c[0]
			}
		}
		at := c[1:]
		for i := j + 1; i < own; i++ {
			subtract(y, i, at[0], a)
			at = at[1:]
		}
		for i, k := range rows {
			subtract(x, int(k), at[i], a)
		}
	}
}

// subtract does x[k] -= l·a for one unknown.
func subtract(x []float64, k int, l float64, a *[solveWidth]float64) {
	b := (*[solveWidth]float64)(x[solveWidth*k:])
	b[0] -= l * a[0]
	b[1] -= l * a[1]
	b[2] -= l * a[2]
	b[3] -= l * a[3]
}

// solveBackward does x = L⁻ᵀ·x for the same columns.
func solveBackward(p []float64, ld, cols, own, first int, rows []int32, x []float64, unit bool) {
	y := x[solveWidth*first:][:solveWidth*own]
	if haveStrips {
		_ = p[(cols-1)*ld+own+len(rows)-1]
		backwardFront(&p[0], &y[0], &x[0], ld, cols, own, rowsOf(rows), len(rows), unit)
		return
	}
	for j := cols - 1; j >= 0; j-- {
		c := p[j*ld+j:][:own-j+len(rows)]
		var s [solveWidth]float64
		at := c[1:]
		for i := j + 1; i < own; i++ {
			collect(&s, y, i, at[0])
			at = at[1:]
		}
		for i, k := range rows {
			collect(&s, x, int(k), at[i])
		}
		a := (*[solveWidth]float64)(y[solveWidth*j:])
		inv := 1.0
		if !unit {
			inv = c[0]
		}
		for r := range a {
			a[r] = (a[r] - s[r]) * inv
		}
	}
}

// collect does s += l·x[k] for one unknown.
func collect(s *[solveWidth]float64, x []float64, k int, l float64) {
	b := (*[solveWidth]float64)(x[solveWidth*k:])
	s[0] += l * b[0]
	s[1] += l * b[1]
	s[2] += l * b[2]
	s[3] += l * b[3]
}

func rowsOf(rows []int32) *int32 {
	if len(rows) == 0 {
		return nil
	}
	return &rows[0]
}
