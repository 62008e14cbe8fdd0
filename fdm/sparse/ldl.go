package sparse

import "math"

// pivotThreshold bounds the entries of L by 1/pivotThreshold (threshold partial
// pivoting of Duff & Reid 1983; the value is common practice).
const pivotThreshold = 0.01

// Inertia returns the numbers of negative, zero and positive eigenvalues of
// the matrix of the last [Factor.Refactor] (Sylvester's law of inertia: they
// are those of D). ok is false, and the counts are not to be trusted, if there
// is no factorisation or if pivots had to be perturbed because the matrix is
// singular to working precision; zero then counts the perturbed pivots. For
// Cholesky all eigenvalues are positive.
func (f *Factor) Inertia() (neg, zero, pos int, ok bool) {
	if !f.ok {
		return 0, 0, 0, false
	}
	return f.negative, f.perturbed, f.a.n - f.negative - f.perturbed, f.perturbed == 0
}

// Perturbed is the number of pivots of the last LDL factorisation that were
// too small and were replaced. Solutions are then those of a nearby matrix.
func (f *Factor) Perturbed() int { return f.perturbed }

// eliminateLDL factors the first cols columns of the front p and forms its
// update matrix u.
func (f *Factor) eliminateLDL(s int32, p []float64, rows, cols int, u []float64) {
	a := f.a
	first := int(a.first[s])
	d := f.diag[first : first+cols]
	e := f.sub[first : first+cols]
	piv := f.pivots[first : first+cols]
	for j := range piv {
		piv[j] = int32(first + j)
	}
	n := ldlPanel(p, rows, rows, cols, d, e, piv, f.scale*1e-15)
	for k := n; k < cols; k++ {
		// No acceptable pivot is left: take what there is, made large enough.
		small := 1e-8 * max(f.scale, math.SmallestNonzeroFloat64/1e-16)
		dk := p[k*(rows+1)]
		if math.Abs(dk) < small {
			dk = math.Copysign(small, dk)
			f.perturbed++
		}
		p[k*(rows+1)] = dk
		ldlStep1(p, rows, rows, cols, k, d, e)
	}
	for k := 0; k < cols; k++ {
		switch {
		case e[k] != 0:
			f.negative++ // a 2×2 pivot accepted here has one eigenvalue of each sign, or two of d's
			if d[k]*d[k+1]-e[k]*e[k] > 0 {
				if d[k] < 0 {
					f.negative++
				} else {
					f.negative--
				}
			}
			k++
		case d[k] < 0:
			f.negative++
		}
	}
	nu := rows - cols
	if nu == 0 {
		return
	}
	// u = −L·D·Lᵀ, a few columns of L at a time with W = L·D.
	w := make([]float64, nu*cols)
	ldlScale(w, p[cols:], rows, nu, cols, d, e)
	mulSubLower(u, nu, p[cols:], rows, w, nu, nu, cols, true)
}

// ldlScale does W = L·D for nu rows.
func ldlScale(w, l []float64, ld, nu, cols int, d, e []float64) {
	for k := 0; k < cols; k++ {
		lk := l[k*ld:][:nu]
		wk := w[k*nu:][:nu]
		if e[k] != 0 {
			ln := l[(k+1)*ld:][:nu]
			wn := w[(k+1)*nu:][:nu]
			for i := range wk {
				wk[i] = lk[i]*d[k] + ln[i]*e[k]
				wn[i] = lk[i]*e[k] + ln[i]*d[k+1]
			}
			k++
			continue
		}
		for i := range wk {
			wk[i] = lk[i] * d[k]
		}
	}
}

// ldlPanel eliminates as many of the first n columns of a front of m rows as
// have an acceptable pivot among them, in the order of piv, and returns their
// number. Pivots are 1×1 or 2×2; tiny is the size below which a column counts
// as zero.
//
// J. R. Bunch & L. Kaufman: Some stable methods for calculating inertia and
// solving symmetric linear systems. Math. Comp. 31 (1977), 163-179.
// I. S. Duff & J. K. Reid: The multifrontal solution of indefinite sparse
// symmetric linear equations. ACM Trans. Math. Softw. 9 (1983), 302-325.
func ldlPanel(f []float64, ld, m, n int, d, e []float64, piv []int32, tiny float64) int {
	k := 0
	for k < n {
		found := false
		for j := k; j < n && !found; j++ {
			// Largest off-diagonal entry of column j, and where.
			big, bigCandidate, at := columnMax(f, ld, m, n, k, j)
			if big <= tiny && math.Abs(f[j*ld+j]) <= tiny {
				continue // a zero column: no pivot here
			}
			djj := f[j*ld+j]
			if math.Abs(djj) > tiny && math.Abs(djj) >= pivotThreshold*big {
				ldlSwap(f, ld, m, k, j, piv)
				ldlStep1(f, ld, m, n, k, d, e)
				k++
				found = true
				break
			}
			if bigCandidate <= tiny {
				continue
			}
			r := at
			bigR, _, _ := columnMaxBut(f, ld, m, n, k, r, j)
			bigJ, _, _ := columnMaxBut(f, ld, m, n, k, j, r)
			drr := f[r*ld+r]
			off := f[min(j, r)*ld+max(j, r)]
			// The determinant computed from scaled entries.
			scale := max(math.Abs(djj), math.Abs(drr), math.Abs(off))
			det := (djj/scale)*drr - (off/scale)*off
			if math.Abs(det) <= 1e-2*scale*0.01 && math.Abs(det) <= tiny {
				continue
			}
			// |D⁻¹|·(bigJ, bigR) ≤ 1/threshold.
			ia, ib, ic := math.Abs(drr/det/scale), math.Abs(off/det/scale), math.Abs(djj/det/scale)
			if det == 0 || max(ia*bigJ+ib*bigR, ib*bigJ+ic*bigR) > 1/pivotThreshold {
				continue
			}
			lo, hi := min(j, r), max(j, r)
			ldlSwap(f, ld, m, k, lo, piv)
			ldlSwap(f, ld, m, k+1, hi, piv)
			ldlStep2(f, ld, m, n, k, d, e)
			k += 2
			found = true
		}
		if !found {
			break
		}
	}
	return k
}

// columnMax returns the largest off-diagonal magnitude of column j of the
// remaining matrix (rows k to m), and the largest among the candidates (rows k
// to n) with its row.
func columnMax(f []float64, ld, m, n, k, j int) (big, candidate float64, at int) {
	return columnMaxBut(f, ld, m, n, k, j, j)
}

func columnMaxBut(f []float64, ld, m, n, k, j, skip int) (big, candidate float64, at int) {
	at = -1
	for i := k; i < j; i++ {
		if v := math.Abs(f[i*ld+j]); i != skip && v > candidate {
			candidate, at = v, i
		}
	}
	col := f[j*ld:][:m]
	for i := j + 1; i < n; i++ {
		if v := math.Abs(col[i]); i != skip && v > candidate {
			candidate, at = v, i
		}
	}
	big = candidate
	for _, v := range col[n:] {
		if v = math.Abs(v); v > big {
			big = v
		}
	}
	return big, candidate, at
}

// ldlSwap exchanges the candidates i ≤ j of the remaining matrix, the rows of
// the columns already eliminated included.
func ldlSwap(f []float64, ld, m, i, j int, piv []int32) {
	if i == j {
		return
	}
	piv[i], piv[j] = piv[j], piv[i]
	for c := range i {
		f[c*ld+i], f[c*ld+j] = f[c*ld+j], f[c*ld+i]
	}
	f[i*ld+i], f[j*ld+j] = f[j*ld+j], f[i*ld+i]
	for c := i + 1; c < j; c++ {
		f[i*ld+c], f[c*ld+j] = f[c*ld+j], f[i*ld+c]
	}
	for r := j + 1; r < m; r++ {
		f[i*ld+r], f[j*ld+r] = f[j*ld+r], f[i*ld+r]
	}
}

// ldlStep1 eliminates column k with the 1×1 pivot on its diagonal.
func ldlStep1(f []float64, ld, m, n, k int, d, e []float64) {
	col := f[k*ld:][:m]
	dk := col[k]
	d[k], e[k] = dk, 0
	for j := k + 1; j < n; j++ {
		if w := col[j]; w != 0 {
			w /= dk
			cj := f[j*ld:][:m]
			for i := j; i < m; i++ {
				cj[i] -= col[i] * w
			}
		}
	}
	for i := k + 1; i < m; i++ {
		col[i] /= dk
	}
}

// ldlStep2 eliminates columns k and k+1 with the 2×2 pivot on their diagonal.
func ldlStep2(f []float64, ld, m, n, k int, d, e []float64) {
	c0 := f[k*ld:][:m]
	c1 := f[(k+1)*ld:][:m]
	a, b, c := c0[k], c0[k+1], c1[k+1]
	d[k], d[k+1], e[k], e[k+1] = a, c, b, 0
	// L = C·D⁻¹ with the inverse scaled by b, which is not small here.
	ab, cb := a/b, c/b
	t := 1 / (ab*cb - 1) / b
	for j := k + 2; j < n; j++ {
		x, y := c0[j], c1[j]
		if x == 0 && y == 0 {
			continue
		}
		l0, l1 := (cb*x-y)*t, (ab*y-x)*t
		cj := f[j*ld:][:m]
		for i := j; i < m; i++ {
			cj[i] -= c0[i]*l0 + c1[i]*l1
		}
	}
	for i := k + 2; i < m; i++ {
		x, y := c0[i], c1[i]
		c0[i], c1[i] = (cb*x-y)*t, (ab*y-x)*t
	}
}
