package sparse

// The dense work on fronts. All matrices are stored column by column; ld is
// the distance between columns. slack floats behind every store of fronts may
// be read, never written, by the strip kernel.
const slack = 8

// stripWork bounds m·k of one call of the strip kernel to some 50 µs.
const stripWork = 1 << 17

// mulSub does C −= A·Bᵀ, or C = −A·Bᵀ if fresh, for C m×n, A m×k, B n×k. Each
// entry of C is summed over k in ascending order, whatever m and n are. With
// lower, only C's lower trapezoid (rows ≥ column) is wanted; some of the
// entries above may be overwritten.
func mulSub(c []float64, ldc int, a []float64, lda int, b []float64, ldb int, m, n, k int, fresh, lower bool) {
	if m <= 0 || n <= 0 {
		return
	}
	if k <= 0 {
		if fresh {
			for j := range n {
				clear(c[j*ldc:][:m])
			}
		}
		return
	}
	if !haveStrips {
		mulSubPortable(c, ldc, a, lda, b, ldb, m, n, k, fresh, lower)
		return
	}
	// The accesses of the strips, checked once.
	_ = c[(n-1)*ldc+m-1]
	_ = a[(k-1)*lda+m-1]
	_ = b[(k-1)*ldb+n-1]
	flag, down := 0, 0
	if fresh {
		flag = 1
	}
	if lower {
		down = 1
	}
	if m*k <= stripWork {
		for j := 0; j < n; j += 4 {
			i := j * down
			mulSubStrip(&c[j*ldc+i], &a[i], &b[j], ldc, lda, ldb, m-i, min(4, n-j), k, 8, flag)
		}
		return
	}
	for l := 0; l < k; l += 256 {
		kl := min(256, k-l)
		for i := 0; i < m; i += 512 {
			for j := 0; j < n; j += 4 {
				if top := max(i, j*down); top < min(i+512, m) {
					mulSubStrip(&c[j*ldc+top], &a[l*lda+top], &b[l*ldb+j], ldc, lda, ldb, min(i+512, m)-top, min(4, n-j), kl, 8, flag)
				}
			}
		}
		flag = 0
	}
}

// mulSubPortable is the same in plain Go.
func mulSubPortable(c []float64, ldc int, a []float64, lda int, b []float64, ldb int, m, n, k int, fresh, lower bool) {
	for j := range n {
		i := 0
		if lower {
			i = j
		}
		cj := c[j*ldc+i:][:m-i]
		if fresh {
			clear(cj)
		}
		l := 0
		for ; l+4 <= k; l += 4 {
			a0 := a[l*lda+i:][:len(cj)]
			a1 := a[(l+1)*lda+i:][:len(cj)]
			a2 := a[(l+2)*lda+i:][:len(cj)]
			a3 := a[(l+3)*lda+i:][:len(cj)]
			b0, b1, b2, b3 := b[l*ldb+j], b[(l+1)*ldb+j], b[(l+2)*ldb+j], b[(l+3)*ldb+j]
			for i := range cj {
				cj[i] -= a0[i]*b0 + a1[i]*b1 + a2[i]*b2 + a3[i]*b3
			}
		}
		for ; l < k; l++ {
			a0 := a[l*lda+i:][:len(cj)]
			b0 := b[l*ldb+j]
			for i := range cj {
				cj[i] -= a0[i] * b0
			}
		}
	}
}
