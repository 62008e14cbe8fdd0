package sparse

import "math"

// Solve replaces b by the solution X of A·X = B. Both are n×nrhs, row by row:
// b[i*nrhs+r] belongs to unknown i of right-hand side r. Three right-hand
// sides together cost little more than one.
//
// Errors: [ErrNotFactored], [SizeError], [ValueError].
func (f *Factor) Solve(b []float64, nrhs int) error {
	if !f.ok {
		return ErrNotFactored
	}
	if nrhs < 0 || len(b) != f.a.n*nrhs {
		return &SizeError{What: "right-hand side", Got: len(b), Want: f.a.n * max(nrhs, 0)}
	}
	for i, v := range b {
		if !(math.Abs(v) <= math.MaxFloat64) {
			return &ValueError{Entry: i, Value: v}
		}
	}
	for r := 0; r < nrhs; r += 4 {
		f.solveSome(b, nrhs, r, min(4, nrhs-r))
	}
	return nil
}

// solveSome solves for the columns r to r+w-1 of b.
func (f *Factor) solveSome(b []float64, nrhs, r, w int) {
	a := f.a
	x := f.work[:a.n*w]
	for k, i := range a.order {
		copy(x[k*w:k*w+w], b[int(i)*nrhs+r:])
	}
	m := int32(a.fronts())
	for s := range m {
		f.forward(s, x, w)
	}
	if f.kind == LDL {
		f.divide(x, w)
	}
	for s := m - 1; s >= 0; s-- {
		f.backward(s, x, w)
	}
	for k, i := range a.order {
		copy(b[int(i)*nrhs+r:][:w], x[k*w:k*w+w])
	}
}

// pivotPlace is the place of the unknown eliminated in column j of front s.
func (f *Factor) pivotPlace(s int32, j int) int {
	if f.pivots != nil {
		return int(f.pivots[int(f.a.first[s])+j])
	}
	return int(f.a.first[s]) + j
}

func (f *Factor) forward(s int32, x []float64, w int) {
	a := f.a
	cols, ld := a.shape(s)
	p := f.panels[a.panel[s]:a.panel[s+1]]
	rows := a.rows[a.rowPtr[s]:a.rowPtr[s+1]]
	for j := range cols {
		c := p[j*ld:][:ld]
		k := f.pivotPlace(s, j)
		for r := range w {
			v := x[k*w+r]
			if f.kind == Cholesky {
				v /= c[j]
				x[k*w+r] = v
			}
			if v == 0 {
				continue
			}
			for i := j + 1; i < cols; i++ {
				x[f.pivotPlace(s, i)*w+r] -= c[i] * v
			}
			for i, row := range rows {
				x[int(row)*w+r] -= c[cols+i] * v
			}
		}
	}
}

func (f *Factor) backward(s int32, x []float64, w int) {
	a := f.a
	cols, ld := a.shape(s)
	p := f.panels[a.panel[s]:a.panel[s+1]]
	rows := a.rows[a.rowPtr[s]:a.rowPtr[s+1]]
	for j := cols - 1; j >= 0; j-- {
		c := p[j*ld:][:ld]
		k := f.pivotPlace(s, j)
		for r := range w {
			v := x[k*w+r]
			for i := j + 1; i < cols; i++ {
				v -= c[i] * x[f.pivotPlace(s, i)*w+r]
			}
			for i, row := range rows {
				v -= c[cols+i] * x[int(row)*w+r]
			}
			if f.kind == Cholesky {
				v /= c[j]
			}
			x[k*w+r] = v
		}
	}
}

// divide does x = D⁻¹·x.
func (f *Factor) divide(x []float64, w int) {
	for k := 0; k < f.a.n; k++ {
		i := int(f.pivots[k]) * w
		d := f.diag[k]
		b := f.sub[k]
		if b == 0 {
			for r := range w {
				x[i+r] /= d
			}
			continue
		}
		j := int(f.pivots[k+1]) * w
		ab, cb := d/b, f.diag[k+1]/b
		t := 1 / (ab*cb - 1) / b
		for r := range w {
			u, v := x[i+r], x[j+r]
			x[i+r], x[j+r] = (cb*u-v)*t, (ab*v-u)*t
		}
		k++
	}
}
