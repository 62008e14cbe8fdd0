package sparse

import "math"

// SolveRefined is [Factor.Solve] followed by at most steps rounds of iterative
// refinement with the values that the factorisation was made from. It returns
// the largest backward error ‖b−A·x‖∞/(‖A‖∞·‖x‖∞+‖b‖∞) of the right-hand sides,
// which is some 1e-16 for a solution as good as the arithmetic allows, and stops
// early when a round no longer halves it. Repeated pairs count one by one in
// ‖A‖∞. It allocates three arrays of the size of b.
//
// J. H. Wilkinson: Rounding Errors in Algebraic Processes. 1963. N. J. Higham:
// Accuracy and Stability of Numerical Algorithms. 2nd ed. 2002, chapter 12.
func (f *Factor) SolveRefined(values, b []float64, nrhs, steps int) (float64, error) {
	if err := checkValues(values, f.a.n+f.a.entries, "values"); err != nil {
		return 0, err
	}
	rhs := append([]float64(nil), b...)
	if err := f.Solve(b, nrhs); err != nil {
		return 0, err
	}
	if nrhs == 0 {
		return 0, nil
	}
	norm := f.a.norm(values)
	r, before := make([]float64, len(b)), make([]float64, len(b))
	residual := func() float64 {
		copy(r, rhs)
		f.a.subtract(r, values, b, nrhs)
		worst := 0.0
		for k := range nrhs {
			var nr, nx, nb float64
			for i := k; i < len(b); i += nrhs {
				nr, nx, nb = max(nr, math.Abs(r[i])), max(nx, math.Abs(b[i])), max(nb, math.Abs(rhs[i]))
			}
			if nr > 0 {
				worst = max(worst, nr/(norm*nx+nb))
			}
		}
		return worst
	}
	e := residual()
	for range steps {
		if e == 0 {
			break
		}
		f.solve(r, nrhs)
		copy(before, b)
		for i, d := range r {
			b[i] += d
		}
		better := residual()
		if !(better < e) {
			// The last correction did harm or nothing: take it back.
			copy(b, before)
			return e, nil
		}
		if better > e/2 {
			return better, nil
		}
		e = better
	}
	return e, nil
}

// Condition estimates the condition number ‖A‖₁·‖A⁻¹‖₁ of the matrix with the
// values that the factorisation was made from. The estimate is a lower bound,
// seldom by more than a factor of three. It costs about five solves.
//
// W. W. Hager: Condition estimates. SIAM J. Sci. Stat. Comput. 5 (1984),
// 311-316. N. J. Higham: FORTRAN codes for estimating the one-norm of a real or
// complex matrix. ACM Trans. Math. Softw. 14 (1988), 381-396.
func (f *Factor) Condition(values []float64) (float64, error) {
	if !f.ok {
		return 0, ErrNotFactored
	}
	n := f.a.n
	if err := checkValues(values, n+f.a.entries, "values"); err != nil {
		return 0, err
	}
	if n == 0 {
		return 1, nil
	}
	x := make([]float64, n)
	sign := make([]float64, n)
	for i := range x {
		x[i] = 1 / float64(n)
	}
	var best float64
	last := -1
	for range 5 {
		f.solve(x, 1)
		var sum float64
		for _, v := range x {
			sum += math.Abs(v)
		}
		if sum <= best {
			break
		}
		best = sum
		for i, v := range x {
			sign[i] = math.Copysign(1, v)
		}
		f.solve(sign, 1) // A is symmetric
		at := 0
		for i, v := range sign {
			if math.Abs(v) > math.Abs(sign[at]) {
				at = i
			}
		}
		if at == last {
			break
		}
		last = at
		clear(x)
		x[at] = 1
	}
	// Higham's second guess, for matrices that fool the first.
	for i := range x {
		x[i] = 1
		if n > 1 {
			x[i] += float64(i) / float64(n-1)
		}
		if i%2 == 1 {
			x[i] = -x[i]
		}
	}
	f.solve(x, 1)
	var sum float64
	for _, v := range x {
		sum += math.Abs(v)
	}
	best = max(best, 2*sum/(3*float64(n)))
	return best * f.a.norm(values), nil
}

// entry calls do with the unknowns and the value of each pair.
func (a *Analysis) entry(values []float64, do func(i, j int32, v float64)) {
	off := values[a.n:]
	for s := range int32(a.fronts()) {
		cols, ld := a.shape(s)
		rows := a.rows[a.rowPtr[s]:a.rowPtr[s+1]]
		for k := a.sourcePtr[s]; k < a.sourcePtr[s+1]; k++ {
			c := int(a.target[k]) / ld
			r := int(a.target[k]) - c*ld
			i, j := a.first[s]+int32(c), a.first[s]+int32(r)
			if r >= cols {
				j = rows[r-cols]
			}
			do(a.order[i], a.order[j], off[a.source[k]])
		}
	}
}

// norm is ‖A‖∞ = ‖A‖₁, repeated pairs one by one.
func (a *Analysis) norm(values []float64) float64 {
	sum := make([]float64, a.n)
	for i := range sum {
		sum[i] = math.Abs(values[i])
	}
	a.entry(values, func(i, j int32, v float64) {
		sum[i] += math.Abs(v)
		if i != j {
			sum[j] += math.Abs(v)
		}
	})
	top := 0.0
	for _, v := range sum {
		top = max(top, v)
	}
	return top
}

// subtract does y −= A·x, both n×w row by row.
func (a *Analysis) subtract(y, values, x []float64, w int) {
	for i := range a.n {
		for r := range w {
			y[i*w+r] -= values[i] * x[i*w+r]
		}
	}
	a.entry(values, func(i, j int32, v float64) {
		for r := range w {
			y[int(i)*w+r] -= v * x[int(j)*w+r]
			if i != j {
				y[int(j)*w+r] -= v * x[int(i)*w+r]
			}
		}
	})
}
