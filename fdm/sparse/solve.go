package sparse

// solveWidth is the number of right-hand sides solved together.
const solveWidth = 3

// Solve replaces b by the solution X of A·X = B. Both are n×nrhs, row by row:
// b[i*nrhs+r] belongs to unknown i of right-hand side r. Three right-hand
// sides together cost little more than one. The first solve allocates
// 4·n floats.
//
// Errors: [ErrNotFactored], [SizeError], [ValueError].
func (f *Factor) Solve(b []float64, nrhs int) error {
	if !f.ok {
		return ErrNotFactored
	}
	if nrhs < 0 {
		return &SizeError{What: "right-hand side", Got: nrhs, Want: 0}
	}
	if err := checkValues(b, f.a.n*nrhs, "right-hand side"); err != nil {
		return err
	}
	f.solve(b, nrhs)
	return nil
}

func (f *Factor) solve(b []float64, nrhs int) {
	if f.x == nil {
		f.x = large[float64](solveWidth*f.a.n + slack)
	}
	for r := 0; r < nrhs; r += solveWidth {
		f.solveSome(b, nrhs, r, min(solveWidth, nrhs-r))
	}
}

// solveSome solves for the columns r to r+w-1 of b. Inside, the unknowns stand
// in the order of elimination, row by row.
func (f *Factor) solveSome(b []float64, nrhs, r, w int) {
	a := f.a
	x := f.x[:a.n*w+slack]
	f.permute(x, b, nrhs, r, w, false)
	scratch := f.crew.workers[0].scratch
	m := int32(a.fronts())
	for s := range m {
		v := f.view(s)
		v.forward(x, w, f.position, scratch)
	}
	if f.kind == LDL {
		f.divide(x, w)
	}
	for s := m - 1; s >= 0; s-- {
		v := f.view(s)
		v.backward(x, w, f.position, scratch)
	}
	f.permute(x, b, nrhs, r, w, true)
}

// permute copies w columns of b to x in the order of elimination, or back.
func (f *Factor) permute(x, b []float64, nrhs, r, w int, back bool) {
	order := f.a.order
	if w == 3 && f.kind == Cholesky {
		for k, i := range order {
			p, q := x[3*k:3*k+3:3*k+3], b[int(i)*nrhs+r:][:3]
			if back {
				q[0], q[1], q[2] = p[0], p[1], p[2]
			} else {
				p[0], p[1], p[2] = q[0], q[1], q[2]
			}
		}
		return
	}
	for k := range order {
		i := k
		if f.kind == LDL {
			i = int(f.pivots[k])
		}
		p, q := x[k*w:][:w], b[int(order[i])*nrhs+r:][:w]
		if back {
			copy(q, p)
		} else {
			copy(p, q)
		}
	}
}

// frontView is the part of L that one front holds.
type frontView struct {
	p     []float64
	ld    int
	cols  int
	first int     // number of the first pivot
	rows  []int32 // places of the rows below
	unit  bool    // the diagonal of L is 1; otherwise it is stored inverted
}

func (f *Factor) view(s int32) frontView {
	a := f.a
	if len(f.delayed) > 0 {
		d := &f.delayed[s]
		return frontView{p: d.panel, ld: len(d.rows), cols: d.cols, first: d.first, rows: d.rows[d.cols:], unit: true}
	}
	cols, ld := a.shape(s)
	return frontView{
		p: f.panels[a.panel[s]:], ld: ld, cols: cols, first: int(a.first[s]),
		rows: a.rows[a.rowPtr[s]:a.rowPtr[s+1]], unit: f.kind == LDL,
	}
}

// solveBlock is the number of columns of a front solved one by one before the
// rest of the rows is updated.
const solveBlock = 16

// forward does x = L⁻¹·x for the columns of one front.
func (v *frontView) forward(x []float64, w int, position []int32, scratch []float64) {
	own := x[v.first*w:]
	for k := 0; k < v.cols; k += solveBlock {
		n := min(solveBlock, v.cols-k)
		p := v.p[k*v.ld+k:]
		y := own[k*w:]
		for j := range n {
			c := p[j*v.ld:][:n]
			inv := 1.0
			if !v.unit {
				inv = c[j]
			}
			if w == 3 {
				yj := y[3*j : 3*j+3 : 3*j+3]
				y0, y1, y2 := yj[0]*inv, yj[1]*inv, yj[2]*inv
				yj[0], yj[1], yj[2] = y0, y1, y2
				for i := j + 1; i < n; i++ {
					yi := y[3*i : 3*i+3 : 3*i+3]
					yi[0] -= c[i] * y0
					yi[1] -= c[i] * y1
					yi[2] -= c[i] * y2
				}
				continue
			}
			for r := range w {
				yj := y[j*w+r] * inv
				y[j*w+r] = yj
				for i := j + 1; i < n; i++ {
					y[i*w+r] -= c[i] * yj
				}
			}
		}
		if rest := v.cols - k - n; rest > 0 {
			mulSub(scratch, rest, p[n:], v.ld, y, w, rest, w, n, true, false)
			z := y[n*w:]
			for r := range w {
				for i, t := range scratch[r*rest:][:rest] {
					z[i*w+r] += t
				}
			}
		}
	}
	nu := len(v.rows)
	if nu == 0 || v.cols == 0 {
		return
	}
	mulSub(scratch, nu, v.p[v.cols:], v.ld, own, w, nu, w, v.cols, true, false)
	if w == 3 {
		t0, t1, t2 := scratch[:nu], scratch[nu:][:nu], scratch[2*nu:][:nu]
		for i, row := range v.rows {
			k := int(row)
			if position != nil {
				k = int(position[k])
			}
			xi := x[3*k : 3*k+3 : 3*k+3]
			xi[0] += t0[i]
			xi[1] += t1[i]
			xi[2] += t2[i]
		}
		return
	}
	for i, row := range v.rows {
		k := int(row)
		if position != nil {
			k = int(position[k])
		}
		for r := range w {
			x[k*w+r] += scratch[r*nu+i]
		}
	}
}

// backward does x = L⁻ᵀ·x for the columns of one front.
func (v *frontView) backward(x []float64, w int, position []int32, scratch []float64) {
	own := x[v.first*w:]
	nu := len(v.rows)
	var dot [12]float64
	if nu > 0 {
		// The values at the rows below, column by column.
		if w == 3 {
			t0, t1, t2 := scratch[:nu], scratch[nu:][:nu], scratch[2*nu:][:nu]
			for i, row := range v.rows {
				k := int(row)
				if position != nil {
					k = int(position[k])
				}
				xi := x[3*k : 3*k+3 : 3*k+3]
				t0[i], t1[i], t2[i] = xi[0], xi[1], xi[2]
			}
		} else {
			for i, row := range v.rows {
				k := int(row)
				if position != nil {
					k = int(position[k])
				}
				for r := range w {
					scratch[r*nu+i] = x[k*w+r]
				}
			}
		}
		for j := 0; j < v.cols; j += 4 {
			n := min(4, v.cols-j)
			mulTrans(&dot, v.p[j*v.ld+v.cols:], v.ld, scratch, nu, nu, n, w)
			if w == 3 {
				o := own[3*j:][:3*n]
				for c := 0; 3*c+2 < len(o); c++ {
					o[3*c] -= dot[c]
					o[3*c+1] -= dot[4+c]
					o[3*c+2] -= dot[8+c]
				}
				continue
			}
			for c := range n {
				for r := range w {
					own[(j+c)*w+r] -= dot[4*r+c]
				}
			}
		}
	}
	last := (v.cols - 1) / solveBlock * solveBlock
	for k := last; k >= 0 && v.cols > 0; k -= solveBlock {
		n := min(solveBlock, v.cols-k)
		p := v.p[k*v.ld+k:]
		y := own[k*w:]
		if rest := v.cols - k - n; rest > 0 {
			z := y[n*w:]
			for r := range w {
				t := scratch[r*rest:][:rest]
				for i := range t {
					t[i] = z[i*w+r]
				}
			}
			for j := 0; j < n; j += 4 {
				nj := min(4, n-j)
				mulTrans(&dot, p[j*v.ld+n:], v.ld, scratch, rest, rest, nj, w)
				for c := range nj {
					for r := range w {
						y[(j+c)*w+r] -= dot[4*r+c]
					}
				}
			}
		}
		for j := n - 1; j >= 0; j-- {
			c := p[j*v.ld:][:n]
			inv := 1.0
			if !v.unit {
				inv = c[j]
			}
			if w == 3 {
				yj := y[3*j : 3*j+3 : 3*j+3]
				y0, y1, y2 := yj[0], yj[1], yj[2]
				for i := j + 1; i < n; i++ {
					yi := y[3*i : 3*i+3 : 3*i+3]
					y0 -= c[i] * yi[0]
					y1 -= c[i] * yi[1]
					y2 -= c[i] * yi[2]
				}
				yj[0], yj[1], yj[2] = y0*inv, y1*inv, y2*inv
				continue
			}
			for r := range w {
				s := y[j*w+r]
				for i := j + 1; i < n; i++ {
					s -= c[i] * y[i*w+r]
				}
				y[j*w+r] = s * inv
			}
		}
	}
}

// divide does x = D⁻¹·x.
func (f *Factor) divide(x []float64, w int) {
	for k := 0; k < f.a.n; k++ {
		d, e := f.diag[k], f.sub[k]
		if e == 0 {
			for r := range w {
				x[k*w+r] /= d
			}
			continue
		}
		inv := newInverse2(d, e, f.diag[k+1])
		for r := range w {
			p, q := k*w+r, (k+1)*w+r
			x[p], x[q] = inv.mul(x[p], x[q])
		}
		k++
	}
}
