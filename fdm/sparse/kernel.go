package sparse

// The dense work on fronts. All matrices are stored column by column; ld is
// the distance between columns.

// mulSub does C −= A·Bᵀ, or C = −A·Bᵀ if fresh, for C m×n, A m×k, B n×k.
// Each entry of C is summed over k in ascending order, whatever m and n are.
func mulSub(c []float64, ldc int, a []float64, lda int, b []float64, ldb int, m, n, k int, fresh bool) {
	if m <= 0 || n <= 0 {
		return
	}
	mulSubPortable(c, ldc, a, lda, b, ldb, m, n, k, fresh)
}

func mulSubPortable(c []float64, ldc int, a []float64, lda int, b []float64, ldb int, m, n, k int, fresh bool) {
	for j := range n {
		cj := c[j*ldc:][:m]
		if fresh {
			clear(cj)
		}
		l := 0
		for ; l+4 <= k; l += 4 {
			a0 := a[l*lda:][:len(cj)]
			a1 := a[(l+1)*lda:][:len(cj)]
			a2 := a[(l+2)*lda:][:len(cj)]
			a3 := a[(l+3)*lda:][:len(cj)]
			b0, b1, b2, b3 := b[l*ldb+j], b[(l+1)*ldb+j], b[(l+2)*ldb+j], b[(l+3)*ldb+j]
			for i := range cj {
				cj[i] -= a0[i]*b0 + a1[i]*b1 + a2[i]*b2 + a3[i]*b3
			}
		}
		for ; l < k; l++ {
			a0 := a[l*lda:][:len(cj)]
			b0 := b[l*ldb+j]
			for i := range cj {
				cj[i] -= a0[i] * b0
			}
		}
	}
}

// mulSubLower does the same for a square C of which only the lower triangle is
// wanted; parts of the upper one may be overwritten.
func mulSubLower(c []float64, ldc int, a []float64, lda int, b []float64, ldb int, n, k int, fresh bool) {
	const step = 32
	for j := 0; j < n; j += step {
		w := min(step, n-j)
		mulSub(c[j*ldc+j:], ldc, a[j:], lda, b[j:], ldb, n-j, w, k, fresh)
	}
}
