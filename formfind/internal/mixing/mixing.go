// Package mixing has the small least squares problem of Anderson's mixing
// (J. ACM 12, 1965; in the form of Walker & Ni, SIAM J. Numer. Anal. 49, 2011).
package mixing

import "math"

// Weights returns γ that minimises |f − Σγⱼ·df[kept[j]]|, with kept the
// differences, newest (last) first, that do not depend on newer ones: what is
// left of such a difference is at most drop of its size. All vectors are as long
// as f; none is changed.
func Weights(df [][]float64, f []float64, drop float64) (gamma []float64, kept []int) {
	// Modified Gram-Schmidt.
	var q, r [][]float64
	for k := len(df) - 1; k >= 0; k-- {
		c := append([]float64(nil), df[k]...)
		size := math.Sqrt(dot(c, c))
		row := make([]float64, 0, len(df))
		for _, b := range q {
			h := dot(b, c)
			row = append(row, h)
			for i := range c {
				c[i] -= h * b[i]
			}
		}
		left := math.Sqrt(dot(c, c))
		if !(left > drop*size) {
			continue
		}
		for i := range c {
			c[i] /= left
		}
		q, r, kept = append(q, c), append(r, append(row, left)), append(kept, k)
	}
	gamma = make([]float64, len(q))
	for j := range q {
		gamma[j] = dot(q[j], f)
	}
	for j := len(q) - 1; j >= 0; j-- {
		for l := j + 1; l < len(q); l++ {
			gamma[j] -= r[l][j] * gamma[l]
		}
		gamma[j] /= r[j][j]
	}
	return gamma, kept
}

func dot(a, b []float64) float64 {
	sum := 0.0
	for i := range a {
		sum += float64(a[i] * b[i])
	}
	return sum
}
