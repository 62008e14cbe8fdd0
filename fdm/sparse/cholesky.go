package sparse

import "math"

const (
	// blockColumns is the width of the column blocks of a front: 64 columns of
	// 128 rows fit a second-level cache and leave room for the rest.
	blockColumns = 64
	// blockRows is the height of the pieces in which a block is worked on.
	blockRows = 128
	// shareFlops is the work below which helpers are not woken.
	shareFlops = 400e3
)

// blockJob is one step in the elimination of a front f of m rows with n
// columns to eliminate, at the block of w columns from column k.
type blockJob struct {
	f       []float64
	ld      int
	m, n    int
	k, w    int
	u       []float64
	ldu, nu int
}

// choleskyPanel factors the first n columns of a front of m rows in place:
// lower triangle of the n×n top, with the diagonal of L inverted since it is
// only ever divided by, and the rows below. It returns the column of
// the first pivot that is not positive and its value, or -1.
func choleskyPanel(f []float64, ld, m, n int, help *crew) (int, float64) {
	if n <= blockColumns && m <= 2*blockRows {
		return choleskyBlock(f, ld, m, n)
	}
	var own blockJob
	b := &own
	if help != nil {
		b = &help.block
	}
	*b = blockJob{f: f, ld: ld, m: m, n: n}
	for k := 0; k < n; k += blockColumns {
		b.k, b.w = k, min(blockColumns, n-k)
		if bad, pivot := choleskyBlock(f[k*ld+k:], ld, b.w, b.w); bad >= 0 {
			return k + bad, pivot
		}
		right := n - k - b.w
		each(help, b, jobRows, (m-k-b.w+blockRows-1)/blockRows, float64(m-k-b.w)*float64(b.w*b.w))
		each(help, b, jobColumns, (right+blockColumns-1)/blockColumns, 2*float64(m-k-b.w)*float64(b.w)*float64(right))
	}
	return -1, 0
}

// choleskyUpdate forms u = −L·Lᵀ of the rows below the n columns.
func choleskyUpdate(u, f []float64, ld, n, nu int, help *crew) {
	if help == nil || nu <= blockColumns {
		mulSub(u, nu, f[n:], ld, f[n:], ld, nu, nu, n, true, true)
		return
	}
	b := &help.block
	*b = blockJob{f: f, ld: ld, m: n + nu, n: n, u: u, ldu: nu, nu: nu}
	each(help, b, jobUpdate, (nu+lowerStep-1)/lowerStep, float64(nu)*float64(nu)*float64(n))
}

// each runs the parts of a job, with helpers if it is worth it.
func each(help *crew, b *blockJob, kind jobKind, parts int, flops float64) {
	if help != nil && parts > 1 && flops > shareFlops {
		help.split(kind, parts)
		return
	}
	for i := range parts {
		switch kind {
		case jobRows:
			b.rows(i)
		case jobColumns:
			b.columns(i)
		case jobUpdate:
			b.update(i)
		}
	}
}

// rows solves piece i of the rows below the diagonal block.
func (b *blockJob) rows(i int) {
	f, ld := b.f, b.ld
	from := b.k + b.w + i*blockRows
	to := min(from+blockRows, b.m)
	for j := b.k; j < b.k+b.w; j += 4 {
		v := min(4, b.k+b.w-j)
		mulSub(f[j*ld+from:], ld, f[b.k*ld+from:], ld, f[b.k*ld+j:], ld, to-from, v, j-b.k, false, false)
		scaleRows(f[j*ld+from:], ld, to-from, v, f[j*ld+j:], ld)
	}
}

// columns subtracts the block from piece i of the columns to its right.
func (b *blockJob) columns(i int) {
	f, ld := b.f, b.ld
	j := b.k + b.w + i*blockColumns
	v := min(blockColumns, b.n-j)
	mulSub(f[j*ld+j:], ld, f[b.k*ld+j:], ld, f[b.k*ld+j:], ld, b.m-j, v, b.w, false, true)
}

// update forms piece i of the columns of the update matrix.
func (b *blockJob) update(i int) {
	j := i * lowerStep
	v := min(lowerStep, b.nu-j)
	l := b.f[b.n+j:]
	mulSub(b.u[j*b.ldu+j:], b.ldu, l, b.ld, l, b.ld, b.nu-j, v, b.n, true, true)
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

// choleskyTop factors an n×n block, n ≤ 4.
func choleskyTop(f []float64, ld, n int) (int, float64) {
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
	switch n {
	case 4:
		w := [10]float64{
			t[0],
			t[1], t[ldt+1],
			t[2], t[ldt+2], t[2*ldt+2],
			t[3], t[ldt+3], t[2*ldt+3], t[3*ldt+3],
		}
		i := 0
		if haveStrips && m >= 4 {
			i = m &^ 3
			_ = c[3*ldc+m-1]
			scaleStrip(&c[0], ldc, i, &w)
		}
		c0, c1, c2, c3 := c[:m], c[ldc:][:m], c[2*ldc:][:m], c[3*ldc:][:m]
		for ; i < m; i++ {
			x0 := c0[i] * w[0]
			x1 := (c1[i] - x0*w[1]) * w[2]
			x2 := (c2[i] - x0*w[3] - x1*w[4]) * w[5]
			x3 := (c3[i] - x0*w[6] - x1*w[7] - x2*w[8]) * w[9]
			c0[i], c1[i], c2[i], c3[i] = x0, x1, x2, x3
		}
	case 3:
		w0, w1, w2, w3, w4, w5 := t[0], t[1], t[ldt+1], t[2], t[ldt+2], t[2*ldt+2]
		c0, c1, c2 := c[:m], c[ldc:][:m], c[2*ldc:][:m]
		for i := range c0 {
			x0 := c0[i] * w0
			x1 := (c1[i] - x0*w1) * w2
			c0[i], c1[i], c2[i] = x0, x1, (c2[i]-x0*w3-x1*w4)*w5
		}
	case 2:
		w0, w1, w2 := t[0], t[1], t[ldt+1]
		c0, c1 := c[:m], c[ldc:][:m]
		for i := range c0 {
			x0 := c0[i] * w0
			c0[i], c1[i] = x0, (c1[i]-x0*w1)*w2
		}
	case 1:
		w0 := t[0]
		c0 := c[:m]
		for i := range c0 {
			c0[i] *= w0
		}
	}
}
