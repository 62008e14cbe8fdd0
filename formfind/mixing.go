package formfind

import "math"

// mixer speeds up a fixed-point iteration z ← g(z) by mixing (Anderson, J. ACM
// 12, 1965; in the form of Walker & Ni, SIAM J. Numer. Anal. 49, 2011).
type mixer struct {
	dz, df   [][]float64
	lastZ    []float64
	residual []float64
}

const mixerDepth = 10

// step replaces z by the next iterate, from g = g(z).
func (a *mixer) step(z, g []float64) {
	f := make([]float64, len(z))
	for i := range f {
		f[i] = g[i] - z[i]
	}
	if a.residual != nil {
		dz, df := make([]float64, len(z)), make([]float64, len(z))
		for i := range z {
			dz[i], df[i] = z[i]-a.lastZ[i], f[i]-a.residual[i]
		}
		a.dz, a.df = append(a.dz, dz), append(a.df, df)
		if len(a.dz) > mixerDepth {
			a.dz, a.df = a.dz[1:], a.df[1:]
		}
	}
	a.lastZ, a.residual = append(a.lastZ[:0], z...), f
	// Least squares by modified Gram-Schmidt, newest difference first; what
	// depends on newer ones is left out.
	inner := func(u, v []float64) float64 {
		s := 0.0
		for i := range u {
			s += u[i] * v[i]
		}
		return s
	}
	var q, r [][]float64
	var kept []int
	for k := len(a.df) - 1; k >= 0; k-- {
		c := append([]float64(nil), a.df[k]...)
		size := math.Sqrt(inner(c, c))
		var row []float64
		for _, b := range q {
			h := inner(b, c)
			row = append(row, h)
			for i := range c {
				c[i] -= h * b[i]
			}
		}
		left := math.Sqrt(inner(c, c))
		if !(left > 1e-6*size) {
			continue
		}
		for i := range c {
			c[i] /= left
		}
		q, r, kept = append(q, c), append(r, append(row, left)), append(kept, k)
	}
	gamma := make([]float64, len(q))
	for j := range q {
		gamma[j] = inner(q[j], f)
	}
	for j := len(q) - 1; j >= 0; j-- {
		gamma[j] /= r[j][j]
		for i := range j {
			gamma[i] -= r[j][i] * gamma[j]
		}
	}
	copy(z, g)
	for j, k := range kept {
		for i := range z {
			z[i] -= gamma[j] * (a.dz[k][i] + a.df[k][i])
		}
	}
}
