package sparse

import "math"

// blockColumns is the width of the column blocks of a front.
const blockColumns = 64

// choleskyPanel factors the first n columns of a front of m rows in place:
// lower triangle of the n×n top, and the rows below. It returns the column of
// the first pivot that is not positive and its value, or -1.
func choleskyPanel(f []float64, ld, m, n int) (int, float64) {
	for k := 0; k < n; k += blockColumns {
		w := min(blockColumns, n-k)
		for j := k; j < k+w; j += 4 {
			v := min(4, k+w-j)
			if j > k {
				mulSub(f[j*ld+j:], ld, f[k*ld+j:], ld, f[k*ld+j:], ld, m-j, v, j-k, false)
			}
			if bad, pivot := choleskyStrip(f[j*ld+j:], ld, m-j, v); bad >= 0 {
				return j + bad, pivot
			}
		}
		if r := k + w; r < n {
			// Columns of the panel right of the block.
			for j := r; j < n; j += blockColumns {
				v := min(blockColumns, n-j)
				mulSub(f[j*ld+j:], ld, f[k*ld+j:], ld, f[k*ld+j:], ld, m-j, v, w, false)
			}
		}
	}
	return -1, 0
}

// choleskyStrip factors n ≤ 4 columns of m rows.
func choleskyStrip(f []float64, ld, m, n int) (int, float64) {
	if haveStrips && n == 4 && m >= 8 {
		if bad, pivot := choleskyColumns(f, ld, 4, 4); bad >= 0 {
			return bad, pivot
		}
		c0, c1, c2, c3 := f[:4], f[ld:][:4], f[2*ld:][:4], f[3*ld:][:4]
		t := [10]float64{1 / c0[0], c0[1], 1 / c1[1], c0[2], c1[2], 1 / c2[2], c0[3], c1[3], c2[3], 1 / c3[3]}
		rest := m - 4
		whole := rest &^ 3
		_ = f[3*ld+m-1]
		scaleStrip(&f[4], ld, whole, &t)
		for i := 4 + whole; i < m; i++ {
			x0 := f[i] * t[0]
			x1 := (f[ld+i] - x0*t[1]) * t[2]
			x2 := (f[2*ld+i] - x0*t[3] - x1*t[4]) * t[5]
			x3 := (f[3*ld+i] - x0*t[6] - x1*t[7] - x2*t[8]) * t[9]
			f[i], f[ld+i], f[2*ld+i], f[3*ld+i] = x0, x1, x2, x3
		}
		return -1, 0
	}
	return choleskyColumns(f, ld, m, n)
}

// choleskyColumns factors n columns of m rows one by one.
func choleskyColumns(f []float64, ld, m, n int) (int, float64) {
	for j := range n {
		d := f[j*ld+j]
		if !(d > 0) || d > math.MaxFloat64 {
			return j, d
		}
		root := math.Sqrt(d)
		inv := 1 / root
		cj := f[j*ld:][:m]
		cj[j] = root
		for i := j + 1; i < m; i++ {
			cj[i] *= inv
		}
		for k := j + 1; k < n; k++ {
			ck := f[k*ld:][:m]
			l := cj[k]
			for i := k; i < m; i++ {
				ck[i] -= cj[i] * l
			}
		}
	}
	return -1, 0
}
