package audit

import (
	"context"
	"errors"
	"math"

	"gonum.org/v1/gonum/mat"

	"anticlast/fdm/sparse"
)

// spectrum answers questions about the eigenvalues of K·u = λ·M·u, with K
// bordered by the cables of common force.
type spectrum struct {
	k      *tangent
	n      int // unknowns with the borders
	an     *sparse.Analysis
	values []float64
	chol   *sparse.Factor
	ldl    *sparse.Factor

	// Each border is scaled by the mean stiffness, so that its entries are of
	// the size of K's; inertia does not change by it.
	scale float64

	// What was factorised last.
	last    *sparse.Factor
	lastAt  float64
	lastNeg int
	lastOK  bool
}

func newSpectrum(ctx context.Context, k *tangent, o Options) (*spectrum, error) {
	sp := &spectrum{k: k, n: k.n + len(k.cables), scale: 1}
	if k.n > 0 {
		sum := 0.0
		for _, v := range k.diag {
			sum += math.Abs(v)
		}
		if sum > 0 {
			sp.scale = sum / float64(k.n)
		}
	}
	pairs := k.pairs
	for b, cb := range k.cables {
		for _, g := range cb.g {
			pairs = append(pairs, [2]int32{int32(k.n + b), g.unknown})
		}
	}
	an, err := sparse.Analyze(ctx, sp.n, pairs, sparse.Options{MemoryBudget: o.MemoryBudget})
	if err != nil {
		return nil, err
	}
	sp.an = an
	sp.values = make([]float64, sp.n+len(pairs))
	copy(sp.values[sp.n:], k.off)
	at := sp.n + len(k.off)
	for _, cb := range k.cables {
		for _, g := range cb.g {
			sp.values[at] = sp.scale * g.value
			at++
		}
	}
	return sp, nil
}

// shifted writes K + s·M into values.
func (sp *spectrum) shifted(s float64) {
	for i := range sp.k.diag {
		sp.values[i] = sp.k.diag[i] + s*sp.k.mass[i]
	}
	for b, cb := range sp.k.cables {
		sp.values[sp.k.n+b] = -sp.scale * sp.scale * cb.compliance
	}
}

// factor factorises K + s·M: positive is true when it has no negative
// eigenvalue; otherwise neg counts them. ok is false when the matrix is
// singular to working precision.
func (sp *spectrum) factor(ctx context.Context, s float64) (f *sparse.Factor, neg int, ok bool, err error) {
	if sp.last != nil && sp.lastAt == s {
		return sp.last, sp.lastNeg, sp.lastOK, nil
	}
	sp.last = nil
	defer func() {
		if err == nil {
			sp.last, sp.lastAt, sp.lastNeg, sp.lastOK = f, s, neg, ok
		}
	}()
	sp.shifted(s)
	if len(sp.k.cables) == 0 {
		if sp.chol == nil {
			if sp.chol, err = sp.an.NewFactor(sparse.Cholesky); err != nil {
				return nil, 0, false, err
			}
		}
		err = sp.chol.Refactor(ctx, sp.values)
		if err == nil {
			return sp.chol, 0, true, nil
		}
		var pivot *sparse.PivotError
		var value *sparse.ValueError
		switch {
		case errors.As(err, &value):
			return nil, 0, false, nil
		case !errors.As(err, &pivot):
			return nil, 0, false, err
		}
	}
	if sp.ldl == nil {
		if sp.ldl, err = sp.an.NewFactor(sparse.LDL); err != nil {
			return nil, 0, false, err
		}
	}
	if err = sp.ldl.Refactor(ctx, sp.values); err != nil {
		var value *sparse.ValueError
		if errors.As(err, &value) { // overflow of the shift or of a border
			return nil, 0, false, nil
		}
		return nil, 0, false, err
	}
	neg, _, _, ok = sp.ldl.Inertia()
	return sp.ldl, neg - len(sp.k.cables), ok, nil
}

// below counts the eigenvalues below the given one.
func (sp *spectrum) below(ctx context.Context, lambda float64) (int, bool, error) {
	_, neg, ok, err := sp.factor(ctx, -lambda)
	return neg, ok, err
}

// smallest finds the smallest eigenvalue and its mode by Lanczos iteration
// with the inverse of K + s·M (C. Lanczos 1950; T. Ericsson & A. Ruhe, Math.
// Comp. 35, 1980), s raised until the matrix is positive definite. first is
// the shift to begin with.
func (sp *spectrum) smallest(ctx context.Context, first float64, negative bool) (lambda float64, mode []float64, ok bool, err error) {
	s := first
	f, neg, ok, err := sp.factor(ctx, s)
	if err != nil {
		return 0, nil, false, err
	}
	if negative || neg > 0 || !ok {
		// Raise the shift until nothing is below it. Begin well under the
		// mean stiffness: the softest modes are the smooth ones.
		s = max(first, 1e-6*sp.k.meanStiffness())
		for range 40 {
			f, neg, ok, err = sp.factor(ctx, s)
			if err != nil {
				return 0, nil, false, err
			}
			if ok && neg == 0 {
				break
			}
			s *= 4
		}
	}
	if neg != 0 || !ok {
		return 0, nil, false, nil
	}
	theta, mode, ok, err := sp.lanczos(ctx, f)
	if err != nil || !ok || !(theta > 0) {
		return 0, nil, false, err
	}
	return 1/theta - s, mode, true, nil
}

const (
	lanczosSteps = 100
	// lanczosResidual ends the iteration: the error of the eigenvalue is of
	// the order of its square.
	lanczosResidual = 1e-3
)

// lanczos returns the largest eigenvalue of A⁻¹·M and its vector, A given by
// its factorisation. The basis is kept orthogonal in the inner product of M.
func (sp *spectrum) lanczos(ctx context.Context, f *sparse.Factor) (theta float64, vec []float64, ok bool, err error) {
	n := sp.k.n
	m := sp.k.mass
	dot := func(a, b []float64) float64 {
		s := 0.0
		for i, v := range m {
			s += a[i] * v * b[i]
		}
		return s
	}
	// A fixed start without symmetry.
	q := make([]float64, n)
	seed := uint64(0x9e3779b97f4a7c15)
	for i := range q {
		seed ^= seed << 13
		seed ^= seed >> 7
		seed ^= seed << 17
		q[i] = 0.5 + float64(seed>>11)/(1<<53)
	}
	norm := math.Sqrt(dot(q, q))
	if !(norm > 0) {
		return 0, nil, false, nil
	}
	for i := range q {
		q[i] /= norm
	}
	work := make([]float64, sp.n)
	var basis [][]float64
	var alpha, beta []float64
	for j := 0; j < min(lanczosSteps, n); j++ {
		if err := ctx.Err(); err != nil {
			return 0, nil, false, err
		}
		basis = append(basis, q)
		for i := range n {
			work[i] = m[i] * q[i]
		}
		clear(work[n:])
		if err := f.Solve(work, 1); err != nil {
			var value *sparse.ValueError
			if errors.As(err, &value) {
				return 0, nil, false, nil
			}
			return 0, nil, false, err
		}
		w := append([]float64(nil), work[:n]...)
		alpha = append(alpha, dot(w, q))
		for range 2 { // twice is enough (Parlett)
			for _, b := range basis {
				h := dot(w, b)
				for i := range w {
					w[i] -= h * b[i]
				}
			}
		}
		b := math.Sqrt(max(dot(w, w), 0))
		last := j == min(lanczosSteps, n)-1 || !(b > 1e-14*math.Abs(alpha[0]))
		if last || j%4 == 3 {
			t, y, good := largestRitz(alpha, beta)
			if !good {
				return 0, nil, false, nil
			}
			// Residual of the pair, and the error of the value by its square.
			res := b * math.Abs(y[len(y)-1])
			if last || res <= lanczosResidual*math.Abs(t) {
				if res > 0.05*math.Abs(t) {
					return 0, nil, false, nil
				}
				vec = make([]float64, n)
				for k, c := range y {
					for i, v := range basis[k] {
						vec[i] += c * v
					}
				}
				return t, vec, true, nil
			}
		}
		beta = append(beta, b)
		for i := range w {
			w[i] /= b
		}
		q = w
	}
	return 0, nil, false, nil
}

// largestRitz returns the largest eigenvalue of the tridiagonal matrix and its
// eigenvector.
func largestRitz(alpha, beta []float64) (float64, []float64, bool) {
	n := len(alpha)
	t := mat.NewSymDense(n, nil)
	for i, a := range alpha {
		t.SetSym(i, i, a)
		if i+1 < n {
			t.SetSym(i, i+1, beta[i])
		}
	}
	var e mat.EigenSym
	if !e.Factorize(t, true) {
		return 0, nil, false
	}
	v := e.Values(nil)
	var q mat.Dense
	e.VectorsTo(&q)
	y := make([]float64, n)
	for i := range y {
		y[i] = q.At(i, n-1)
	}
	return v[n-1], y, true
}
