package sparse

import "math"

const (
	// blockColumns is the width of the column blocks of a front: 64 columns of
	// 128 rows fit a second-level cache and leave room for the rest.
	blockColumns = 64
	// groupColumns is the number of columns, a multiple of blockColumns, after
	// which those beyond are brought up to date: they come from memory each time.
	groupColumns = 192
	// blockRows is the height of the pieces in which a block is worked on.
	blockRows = 128
	// shareFlops is the work below which helpers are not woken.
	shareFlops = 400e3
)

// blockJob is one step in the elimination of a front, in pieces that helpers
// may take.
type blockJob struct {
	// Solving the rows below a block of w columns at column k of a front f of
	// m rows.
	f    []float64
	ld   int
	m    int
	k, w int
	// The product C −= A·Bᵀ, B the first n rows of A: its lower trapezoid, in
	// chunks if ldc is 0.
	c, a    []float64
	ldc     int
	rows, n int
	depth   int
	fresh   bool
	packed  []float64 // A packed, or nil
}

// choleskyPanel factors the first n columns of a front of m rows in place:
// lower triangle of the n×n top, with the diagonal of L inverted since it is
// only ever divided by, and the rows below. It returns the column of the first
// pivot that is not positive and its value, or -1.
func choleskyPanel(f []float64, ld, m, n int, w *worker) (int, float64) {
	if n <= blockColumns && m <= 2*blockRows {
		return choleskyBlock(f, ld, m, n)
	}
	b := w.job()
	b.f, b.ld, b.m = f, ld, m
	for k := 0; k < n; k += blockColumns {
		b.k, b.w = k, min(blockColumns, n-k)
		if bad, pivot := choleskyBlock(f[k*ld+k:], ld, b.w, b.w); bad >= 0 {
			return k + bad, pivot
		}
		r := k + b.w
		w.each(jobRows, (m-r+blockRows-1)/blockRows, float64(m-r)*float64(b.w*b.w))
		// The columns of the same group now, the rest after the last of the group.
		if end := min(k/groupColumns*groupColumns+groupColumns, n); r < end {
			w.lowerProduct(f[r*ld+r:], ld, f[k*ld+r:], ld, m-r, end-r, b.w, false)
		} else if r < n {
			from := k / groupColumns * groupColumns
			w.lowerProduct(f[r*ld+r:], ld, f[from*ld+r:], ld, m-r, n-r, r-from, false)
		}
	}
	return -1, 0
}

// choleskyUpdate forms u = −L·Lᵀ of the nu rows below the n columns.
func choleskyUpdate(u, f []float64, ld, n, nu int, w *worker) {
	if nu < packFrom {
		mulSub(u, nu, f[n:], ld, f[n:], ld, nu, nu, n, true, true)
		return
	}
	w.lowerProduct(u, 0, f[n:], ld, nu, nu, n, true)
}

// lowerProduct does C −= A·Bᵀ (C = −A·Bᵀ if fresh) for the lower trapezoid of
// m×n C, A m×k, B the first n rows of A. If ldc is 0, C is an update matrix in
// chunks.
func (w *worker) lowerProduct(c []float64, ldc int, a []float64, lda, m, n, k int, fresh bool) {
	b := w.job()
	b.c, b.ldc, b.ld, b.rows, b.n = c, ldc, lda, m, n
	packs := haveStrips && m >= packFrom && k >= packThick
	depth := k
	if packs {
		depth = packDepth
	}
	for l := 0; l < k; l += depth {
		b.a, b.depth, b.fresh, b.packed = a[l*lda:], min(depth, k-l), fresh && l == 0, nil
		if packs {
			b.packed = w.scratch
			pack(b.packed, b.a, lda, m, b.depth)
		}
		w.each(jobProduct, (n+packColumns-1)/packColumns, float64(2*m-n)*float64(n)*float64(b.depth))
	}
}

// rowsPiece solves piece i of the rows below the diagonal block.
func (b *blockJob) rowsPiece(i int) {
	f, ld := b.f, b.ld
	from := b.k + b.w + i*blockRows
	to := min(from+blockRows, b.m)
	for j := b.k; j < b.k+b.w; j += 4 {
		v := min(4, b.k+b.w-j)
		mulSub(f[j*ld+from:], ld, f[b.k*ld+from:], ld, f[b.k*ld+j:], ld, to-from, v, j-b.k, false, false)
		scaleRows(f[j*ld+from:], ld, to-from, v, f[j*ld+j:], ld)
	}
}

// productPiece does piece i of the columns of the product.
func (b *blockJob) productPiece(i int) {
	j := i * packColumns
	at, ldc := j*(b.ldc+1), b.ldc
	if ldc == 0 {
		at, ldc = updateAt(b.rows, packColumns, j)
	}
	if b.packed != nil {
		mulSubPacked(b.c[at:], ldc, b.packed, b.rows, b.n, b.depth, j, b.fresh)
		return
	}
	v := min(packColumns, b.n-j)
	mulSub(b.c[at:], ldc, b.a[j:], b.ld, b.a[j:], b.ld, b.rows-j, v, b.depth, b.fresh, true)
}

// choleskyBlock factors n columns of m rows, four columns at a time.
func choleskyBlock(f []float64, ld, m, n int) (int, float64) {
	for j := 0; j < n; j += 4 {
		v := min(4, n-j)
		if j > 0 {
			mulSub(f[j*ld+j:], ld, f[j:], ld, f[j:], ld, m-j, v, j, false, false)
		}
		c := f[j*ld+j:]
		if bad, pivot := choleskyTop(c, ld, v); bad >= 0 {
			return j + bad, pivot
		}
		if m > j+v {
			scaleRows(c[v:], ld, m-j-v, v, c, ld)
		}
	}
	return -1, 0
}

// choleskyTop factors an n×n block, n ≤ 4. Of the block of four first L·D·Lᵀ is
// found, so that each pivot waits for one division only; the roots come after.
func choleskyTop(f []float64, ld, n int) (int, float64) {
	if n == 4 {
		f0, f1, f2, f3 := (*[4]float64)(f), (*[4]float64)(f[ld:]), (*[4]float64)(f[2*ld:]), (*[4]float64)(f[3*ld:])
		d0, c1, c2, c3 := f0[0], f0[1], f0[2], f0[3]
		r0 := 1 / d0
		l1, l2, l3 := c1*r0, c2*r0, c3*r0
		d1, e2, e3 := f1[1]-c1*l1, f1[2]-c2*l1, f1[3]-c3*l1
		r1 := 1 / d1
		m2, m3 := e2*r1, e3*r1
		d2, g3 := f2[2]-c2*l2-e2*m2, f2[3]-c3*l2-e3*m2
		r2 := 1 / d2
		d3 := f3[3] - c3*l3 - e3*m3 - g3*(g3*r2)
		const most = math.MaxFloat64
		if d0 > 0 && d1 > 0 && d2 > 0 && d3 > 0 && d0 <= most && d1 <= most && d2 <= most && d3 <= most {
			i0, i1, i2, i3 := math.Sqrt(d0)*r0, math.Sqrt(d1)*r1, math.Sqrt(d2)*r2, 1/math.Sqrt(d3)
			*f0 = [4]float64{i0, c1 * i0, c2 * i0, c3 * i0}
			f1[1], f1[2], f1[3] = i1, e2*i1, e3*i1
			f2[2], f2[3], f3[3] = i2, g3*i2, i3
			return -1, 0
		}
	}
	for j := range n {
		cj := f[j*ld:][:n]
		d := cj[j]
		if !(d > 0) || d > math.MaxFloat64 {
			return j, d
		}
		d = 1 / math.Sqrt(d)
		cj[j] = d
		for i := j + 1; i < n; i++ {
			cj[i] *= d
		}
		for k := j + 1; k < n; k++ {
			ck := f[k*ld:][:n]
			for i := k; i < n; i++ {
				ck[i] -= cj[i] * cj[k]
			}
		}
	}
	return -1, 0
}

// scaleRows solves X·Tᵀ = C in place for m rows of n ≤ 4 columns, T the lower
// triangle of an n×n block with its diagonal inverted.
func scaleRows(c []float64, ldc, m, n int, t []float64, ldt int) {
	if haveStrips {
		_ = c[(n-1)*ldc+m-1]
		_ = t[(n-1)*ldt+n-1]
		scaleStrip(&c[0], &t[0], ldc, ldt, m, n)
		return
	}
	// By columns, left of each those already solved.
	for j := range n {
		cj := c[j*ldc:][:m]
		for k := range j {
			ck := c[k*ldc:][:m]
			w := t[k*ldt+j]
			for i := range cj {
				cj[i] -= ck[i] * w
			}
		}
		inv := t[j*ldt+j]
		for i := range cj {
			cj[i] *= inv
		}
	}
}
