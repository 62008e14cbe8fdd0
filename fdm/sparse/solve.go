package sparse

import "slices"

// solveWidth is the number of right-hand sides solved together: inside, an
// unknown has four neighbouring floats, used or not, that one register takes.
const solveWidth = 4

// Solve replaces b by the solution X of A·X = B. Both are n×nrhs, row by row:
// b[i*nrhs+r] belongs to unknown i of right-hand side r. Up to four right-hand
// sides together cost no more than one. It allocates nothing.
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
	for r := 0; r < nrhs; r += solveWidth {
		f.solveSome(b, nrhs, r, min(solveWidth, nrhs-r))
	}
}

// solveSome solves for the columns r to r+w-1 of b. Inside, the unknowns stand
// in the order of elimination.
func (f *Factor) solveSome(b []float64, nrhs, r, w int) {
	f.permute(b, nrhs, r, w, false)
	m := int32(f.a.fronts())
	var v frontView
	for s := range m {
		f.view(s, &v)
		v.forward(f.x)
	}
	if f.kind == LDL {
		f.divide()
	}
	for s := m - 1; s >= 0; s-- {
		f.view(s, &v)
		v.backward(f.x)
	}
	f.permute(b, nrhs, r, w, true)
}

// permute copies w columns of b to x in the order of elimination, or back.
func (f *Factor) permute(b []float64, nrhs, r, w int, back bool) {
	order := f.a.order
	if w == 3 && f.kind == Cholesky {
		x := f.x
		for k, i := range order {
			p, q := (*[solveWidth]float64)(x[solveWidth*k:]), (*[3]float64)(b[int(i)*nrhs+r:])
			if back {
				q[0], q[1], q[2] = p[0], p[1], p[2]
			} else {
				p[0], p[1], p[2], p[3] = q[0], q[1], q[2], 0
			}
		}
		return
	}
	for k := range order {
		i := k
		if f.kind == LDL {
			i = int(f.pivots[k])
		}
		p, q := f.x[k*solveWidth:][:solveWidth], b[int(order[i])*nrhs+r:][:w]
		if back {
			copy(q, p)
		} else {
			clear(p[copy(p, q):])
		}
	}
}

// frontView is the part of L that one front holds.
type frontView struct {
	p     []float64
	ld    int
	cols  int
	first int     // number of the first pivot
	rows  []int32 // numbers of the pivots that eliminate the rows below
	unit  bool    // the diagonal of L is 1; otherwise it is stored inverted
}

func (f *Factor) view(s int32, v *frontView) {
	a := f.a
	if len(f.delayed) > 0 {
		d := &f.delayed[s]
		*v = frontView{p: d.panel, ld: len(d.rows), cols: d.cols, first: d.first, rows: f.pivotsOf(d.rows[d.cols:]), unit: true}
		return
	}
	first := a.first[s]
	v.first, v.cols = int(first), int(a.first[s+1]-first)
	v.rows = a.rows[a.rowPtr[s]:a.rowPtr[s+1]]
	v.ld = v.cols + len(v.rows)
	v.p = f.panels.panel(a.panel[s], a.panel[s+1])
	if f.kind == LDL {
		v.rows, v.unit = f.pivotsOf(v.rows), true
	}
}

// pivotsOf finds the pivots that eliminate the places.
func (f *Factor) pivotsOf(places []int32) []int32 {
	f.below = slices.Grow(f.below[:0], len(places))[:len(places)]
	for i, k := range places {
		f.below[i] = f.position[k]
	}
	return f.below
}

// solveWork bounds the entries of L that one call of a kernel reads to some 50 µs.
const solveWork = 1 << 16

// step is the number of columns to hand to a kernel at a time: all of them, or
// a multiple of four.
func (v *frontView) step() int {
	if v.cols*v.ld <= solveWork {
		return max(v.cols, 1)
	}
	return max(4, solveWork/v.ld&^3)
}

// forward does x = L⁻¹·x for the columns of one front.
func (v *frontView) forward(x []float64) {
	step := v.step()
	for k := 0; k < v.cols; k += step {
		solveForward(v.p[k*(v.ld+1):], v.ld, min(step, v.cols-k), v.cols-k, v.first+k, v.rows, x, v.unit)
	}
}

// backward does x = L⁻ᵀ·x for the columns of one front.
func (v *frontView) backward(x []float64) {
	if v.cols == 0 {
		return
	}
	step := v.step()
	k := 0
	if step < v.cols {
		k = (v.cols - 1) / step * step
	}
	for ; k >= 0; k -= step {
		solveBackward(v.p[k*(v.ld+1):], v.ld, min(step, v.cols-k), v.cols-k, v.first+k, v.rows, x, v.unit)
	}
}

// divide does x = D⁻¹·x.
func (f *Factor) divide() {
	x := f.x
	for k := 0; k < f.a.n; k++ {
		d, e := f.diag[k], f.sub[k]
		if e == 0 {
			for r := range solveWidth {
				x[k*solveWidth+r] /= d
			}
			continue
		}
		inv := newInverse2(d, e, f.diag[k+1])
		for r := range solveWidth {
			p, q := k*solveWidth+r, (k+1)*solveWidth+r
			x[p], x[q] = inv.mul(x[p], x[q])
		}
		k++
	}
}
