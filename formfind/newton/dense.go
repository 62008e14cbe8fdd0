package newton

import "math"

// solveDense solves the m×m system a·x = b in place by elimination with row
// pivoting. An unknown whose pivot vanishes is left at zero: its condition
// cannot be influenced from here.
func solveDense(a, b []float64, m int) {
	scale := 0.0
	for _, x := range a {
		scale = max(scale, math.Abs(x))
	}
	rows := make([]int, m)
	for i := range rows {
		rows[i] = i
	}
	dead := make([]bool, m)
	for c := range m {
		p := c
		for r := c; r < m; r++ {
			if math.Abs(a[rows[r]*m+c]) > math.Abs(a[rows[p]*m+c]) {
				p = r
			}
		}
		rows[c], rows[p] = rows[p], rows[c]
		pivot := a[rows[c]*m+c]
		if !(math.Abs(pivot) > 1e-14*scale) {
			dead[c] = true
			continue
		}
		for r := c + 1; r < m; r++ {
			f := a[rows[r]*m+c] / pivot
			if f == 0 {
				continue
			}
			for k := c; k < m; k++ {
				a[rows[r]*m+k] -= f * a[rows[c]*m+k]
			}
			b[rows[r]] -= f * b[rows[c]]
		}
	}
	x := make([]float64, m)
	for c := m - 1; c >= 0; c-- {
		if dead[c] {
			continue
		}
		sum := b[rows[c]]
		for k := c + 1; k < m; k++ {
			sum -= a[rows[c]*m+k] * x[k]
		}
		x[c] = sum / a[rows[c]*m+c]
	}
	copy(b, x)
}

// negativeEigenvalues counts the negative eigenvalues of the symmetric n×n
// matrix a by cyclic Jacobi rotations (Jacobi 1846; Golub & Van Loan). It
// destroys a.
func negativeEigenvalues(a []float64, n int) int {
	for range 60 {
		off, on := 0.0, 0.0
		for i := range n {
			for j := range n {
				if i == j {
					on += a[i*n+j] * a[i*n+j]
				} else {
					off += a[i*n+j] * a[i*n+j]
				}
			}
		}
		if off <= 1e-28*on {
			break
		}
		for p := range n {
			for q := p + 1; q < n; q++ {
				if a[p*n+q] == 0 {
					continue
				}
				theta := (a[q*n+q] - a[p*n+p]) / (2 * a[p*n+q])
				t := 1 / (math.Abs(theta) + math.Sqrt(theta*theta+1))
				if theta < 0 {
					t = -t
				}
				c := 1 / math.Sqrt(t*t+1)
				s := t * c
				for k := range n {
					x, y := a[k*n+p], a[k*n+q]
					a[k*n+p], a[k*n+q] = c*x-s*y, s*x+c*y
				}
				for k := range n {
					x, y := a[p*n+k], a[q*n+k]
					a[p*n+k], a[q*n+k] = c*x-s*y, s*x+c*y
				}
			}
		}
	}
	neg := 0
	for i := range n {
		if a[i*n+i] < 0 {
			neg++
		}
	}
	return neg
}
