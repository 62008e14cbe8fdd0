package sparse

import "math"

const (
	// pivotThreshold bounds the entries of L by 1/pivotThreshold (threshold
	// partial pivoting, Duff & Reid 1983; the value is common practice).
	pivotThreshold = 0.01
	// ldlBlock is the number of columns among which pivots are first sought.
	ldlBlock = 32
)

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
// zero to working precision and were replaced. Solutions are then those of a
// nearby matrix.
func (f *Factor) Perturbed() int { return f.perturbed }

// countPivots counts the negative eigenvalues of D.
func (f *Factor) countPivots() {
	for k := 0; k < f.a.n; k++ {
		d, e := f.diag[k], f.sub[k]
		if e == 0 {
			if d < 0 {
				f.negative++
			}
			continue
		}
		// One of each sign unless the determinant is positive; then both have
		// the sign of the diagonal.
		c := f.diag[k+1]
		switch {
		case (d/e)*(c/e) <= 1:
			f.negative++
		case d < 0:
			f.negative += 2
		}
		k++
	}
}

// rowSizes finds the largest magnitude in each row of the matrix, by place. A
// pivot is zero to working precision if nothing of its row is left.
func (f *Factor) rowSizes(values []float64) {
	a := f.a
	for k, i := range a.order {
		f.size[k] = math.Abs(values[i])
	}
	a.entry(values, func(i, j int32, v float64) {
		v = math.Abs(v)
		p, q := a.place[i], a.place[j]
		f.size[p], f.size[q] = max(f.size[p], v), max(f.size[q], v)
	})
	// Rounding leaves about this much of a row that cancels (measured on
	// singular nets).
	eps := 0x1p-52 * (50 + 10*math.Sqrt(float64(a.n)))
	for k := range f.size {
		f.size[k] *= eps
	}
}

// perturb replaces the pivots that are left in a root front from column n on,
// if they are all zero to working precision.
func (f *Factor) perturb(p []float64, ld, cols, n int, d, e []float64, piv []int32) bool {
	for k := n; k < cols; k++ {
		for j := k; j < cols; j++ {
			col := p[j*ld:][:ld]
			for i := j; i < cols; i++ {
				if math.Abs(col[i]) > max(f.size[piv[i]], f.size[piv[j]]) {
					return false
				}
			}
		}
	}
	for k := n; k < cols; k++ {
		clear(p[k*ld+k:][:ld-k])
		// The root of the relative rounding error of the row, as static
		// pivoting commonly takes.
		small := f.size[piv[k]] * 1e6
		if small == 0 {
			small = 1
		}
		d[k], e[k] = small, 0
		f.perturbed++
	}
	return true
}

// ldlUpdate forms u = −L·D·Lᵀ of the nu rows below the n eliminated of the
// cols columns of a front, a block of W = L·D at a time.
func ldlUpdate(u, f []float64, ld, below, nu, n int, d, e, scratch []float64) {
	if nu == 0 {
		return
	}
	fresh := true
	chunk := updateChunk(nu)
	for k := 0; k < n; {
		w := ldlWidth(e, k, n)
		ldlScale(scratch, f[k*ld+below:], ld, nu, w, d[k:], e[k:])
		for j := 0; j < nu; j += chunk {
			at, ldu := updateAt(nu, chunk, j)
			mulSub(u[at:], ldu, f[k*ld+below+j:], ld, scratch[j:], nu, nu-j, min(chunk, nu-j), w, fresh, true)
		}
		fresh = false
		k += w
	}
	if fresh {
		clear(u[:updateFloats(nu)])
	}
}

// ldlWidth is the width of a block of pivots from k that does not cut a 2×2
// pivot.
func ldlWidth(e []float64, k, n int) int {
	w := min(ldlBlock, n-k)
	if k+w < n && e[k+w-1] != 0 {
		w--
	}
	return w
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
				x, y := lk[i], ln[i]
				wk[i] = x*d[k] + y*e[k]
				wn[i] = x*e[k] + y*d[k+1]
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
// have an acceptable pivot among themselves, moving them to the front, and
// returns their number. piv names the places of the candidates; tiny[place] is
// the size below which an entry counts as zero.
//
// Pivots are sought in blocks of columns; columns without one wait at the end
// until another round, and in the last round the search is over all of them.
//
// J. R. Bunch & L. Kaufman: Some stable methods for calculating inertia and
// solving symmetric linear systems. Math. Comp. 31 (1977), 163-179.
// I. S. Duff & J. K. Reid: The multifrontal solution of indefinite sparse
// symmetric linear equations. ACM Trans. Math. Softw. 9 (1983), 302-325.
func ldlPanel(f []float64, ld, m, n int, d, e []float64, piv []int32, tiny, scratch []float64) int {
	l := ldlFront{f: f, ld: ld, m: m, n: n, d: d, e: e, piv: piv, tiny: tiny, scratch: scratch}
	k := 0
	for {
		start := k
		end := n // candidates from here on have failed in this round
		for k < end {
			b := min(k+ldlBlock, end)
			from := k
			k = l.block(k, b)
			l.apply(from, k, b)
			for b > k && b <= end {
				// Failed: to the end.
				b--
				end--
				l.swap(b, end)
				if end <= k {
					break
				}
			}
		}
		if k == n {
			return k
		}
		if k == start {
			// No progress by blocks.
			return l.block(k, n)
		}
	}
}

// ldlFront is a front under elimination.
type ldlFront struct {
	f             []float64
	ld, m, n      int
	d, e          []float64
	piv           []int32
	tiny, scratch []float64
}

// block eliminates candidates from k on with pivots among columns k to b,
// which alone (and all their rows) are kept up to date. It returns the first
// column left.
func (l *ldlFront) block(k, b int) int {
	f, ld := l.f, l.ld
	for j := k; j < b; {
		big, bigHere, r := l.columnMax(k, b, j, none)
		djj := math.Abs(f[j*ld+j])
		tj := l.tiny[l.piv[j]]
		if djj > tj && djj >= pivotThreshold*big {
			l.swap(k, j)
			l.one(k, b)
			k++
			j = k
			continue
		}
		if r != none && bigHere > min(tj, l.tiny[l.piv[r]]) && l.accept(k, b, j, int(r)) {
			l.swap(k, min(j, int(r)))
			l.swap(k+1, max(j, int(r)))
			l.two(k, b)
			k += 2
			j = k
			continue
		}
		j++
	}
	return k
}

// accept tells whether candidates j and r make a stable 2×2 pivot: |D⁻¹| times
// the largest entries of both columns is at most 1/pivotThreshold.
func (l *ldlFront) accept(k, b, j, r int) bool {
	f, ld := l.f, l.ld
	a, c := f[j*ld+j], f[r*ld+r]
	off := f[min(j, r)*ld+max(j, r)]
	scale := max(math.Abs(a), math.Abs(c), math.Abs(off))
	det := (a/scale)*c - (off/scale)*off
	if math.Abs(det) <= max(l.tiny[l.piv[j]], l.tiny[l.piv[r]]) {
		return false
	}
	// The determinant must not be all rounding.
	if math.Abs(det) <= 1e-10*max(math.Abs(a/scale*c), math.Abs(off/scale*off)) {
		return false
	}
	bigJ, _, _ := l.columnMax(k, b, j, int32(r))
	bigR, _, _ := l.columnMax(k, b, r, int32(j))
	ia, io, ic := math.Abs(c/scale/det), math.Abs(off/scale/det), math.Abs(a/scale/det)
	return max(ia*bigJ+io*bigR, io*bigJ+ic*bigR) <= 1/pivotThreshold
}

// columnMax returns the largest off-diagonal magnitude of column j of the
// remaining matrix (rows from k), leaving out row skip, and the largest within
// the block (rows k to b) with its row.
func (l *ldlFront) columnMax(k, b, j int, skip int32) (big, here float64, at int32) {
	at = none
	f, ld := l.f, l.ld
	for i := k; i < j; i++ {
		if v := math.Abs(f[i*ld+j]); v > here && int32(i) != skip {
			here, at = v, int32(i)
		}
	}
	col := f[j*ld:][:l.m]
	for i := j + 1; i < b; i++ {
		if v := math.Abs(col[i]); v > here && int32(i) != skip {
			here, at = v, int32(i)
		}
	}
	big = here
	for _, v := range col[b:] {
		big = max(big, math.Abs(v))
	}
	return big, here, at
}

// swap exchanges candidates i and j, the rows of eliminated columns included.
func (l *ldlFront) swap(i, j int) {
	if i == j {
		return
	}
	if i > j {
		i, j = j, i
	}
	f, ld := l.f, l.ld
	l.piv[i], l.piv[j] = l.piv[j], l.piv[i]
	for c := range i {
		f[c*ld+i], f[c*ld+j] = f[c*ld+j], f[c*ld+i]
	}
	f[i*ld+i], f[j*ld+j] = f[j*ld+j], f[i*ld+i]
	for c := i + 1; c < j; c++ {
		f[i*ld+c], f[c*ld+j] = f[c*ld+j], f[i*ld+c]
	}
	ci, cj := f[i*ld:][:l.m], f[j*ld:][:l.m]
	for r := j + 1; r < l.m; r++ {
		ci[r], cj[r] = cj[r], ci[r]
	}
}

// one eliminates column k with the 1×1 pivot on its diagonal from the columns
// of the block.
func (l *ldlFront) one(k, b int) {
	f, ld, m := l.f, l.ld, l.m
	col := f[k*ld:][:m]
	dk := col[k]
	l.d[k], l.e[k] = dk, 0
	for j := k + 1; j < b; j++ {
		if w := col[j] / dk; w != 0 {
			cj := f[j*ld:][:m]
			for i := j; i < m; i++ {
				cj[i] -= col[i] * w
			}
		}
	}
	inv := 1 / dk
	for i := k + 1; i < m; i++ {
		col[i] *= inv
	}
}

// two eliminates columns k and k+1 with the 2×2 pivot on their diagonal from
// the columns of the block.
func (l *ldlFront) two(k, b int) {
	f, ld, m := l.f, l.ld, l.m
	c0 := f[k*ld:][:m]
	c1 := f[(k+1)*ld:][:m]
	d0, off, d1 := c0[k], c0[k+1], c1[k+1]
	l.d[k], l.d[k+1], l.e[k], l.e[k+1] = d0, d1, off, 0
	inv := newInverse2(d0, off, d1)
	for j := k + 2; j < b; j++ {
		l0, l1 := inv.mul(c0[j], c1[j])
		if l0 == 0 && l1 == 0 {
			continue
		}
		cj := f[j*ld:][:m]
		for i := j; i < m; i++ {
			cj[i] -= c0[i]*l0 + c1[i]*l1
		}
	}
	for i := k + 2; i < m; i++ {
		c0[i], c1[i] = inv.mul(c0[i], c1[i])
	}
	// L is the identity within the pivot.
	c0[k+1] = 0
}

// inverse2 is the inverse of a symmetric 2×2 pivot.
type inverse2 struct{ a, b, c float64 }

func newInverse2(a, b, c float64) inverse2 {
	s := max(math.Abs(a), math.Abs(b), math.Abs(c))
	det := (a/s)*c - (b/s)*b
	return inverse2{c / s / det, -b / s / det, a / s / det}
}

func (v inverse2) mul(x, y float64) (float64, float64) { return v.a*x + v.b*y, v.b*x + v.c*y }

// apply subtracts the pivots from to k, found in a block that ends at b, from
// the candidates right of the block.
func (l *ldlFront) apply(from, k, b int) {
	right := l.n - b
	if k == from || right == 0 {
		return
	}
	f, ld := l.f, l.ld
	ldlScale(l.scratch, f[from*ld+b:], ld, right, k-from, l.d[from:], l.e[from:])
	mulSub(f[b*ld+b:], ld, f[from*ld+b:], ld, l.scratch, right, l.m-b, right, k-from, false, true)
}
