package formfind

import (
	"gonum.org/v1/gonum/mat"
)

// accelerator speeds up a fixed-point iteration z ← g(z) of few unknowns by
// combining its last answers so that the change they would make is least
// (Anderson 1965).
type accelerator struct {
	z, g [][]float64 // last arguments and answers, newest last
}

const accelerateDepth = 6

// next returns the argument to try after g(z) was seen. It keeps both.
func (a *accelerator) next(z, g []float64) []float64 {
	a.z, a.g = append(a.z, z), append(a.g, g)
	if len(a.z) > accelerateDepth {
		a.z, a.g = a.z[1:], a.g[1:]
	}
	n, m := len(z), len(a.z)-1
	out := append([]float64(nil), g...)
	m = min(m, n)
	if m == 0 {
		return out
	}
	// Least squares: changes of the residual r = g − z against the last one.
	last := len(a.z) - 1
	d := mat.NewDense(n, m, nil)
	b := mat.NewDense(n, 1, nil)
	for i := range n {
		b.Set(i, 0, g[i]-z[i])
		for j := range m {
			k := last - 1 - j
			d.Set(i, j, (g[i]-z[i])-(a.g[k][i]-a.z[k][i]))
		}
	}
	var svd mat.SVD
	if !svd.Factorize(d, mat.SVDThin) {
		return out
	}
	rank := 0
	for _, s := range svd.Values(nil) {
		if s > 1e-10*svd.Values(nil)[0] {
			rank++
		}
	}
	if rank == 0 {
		return out
	}
	var c mat.Dense
	svd.SolveTo(&c, b, rank)
	for i := range n {
		for j := range m {
			out[i] -= c.At(j, 0) * (g[i] - a.g[last-1-j][i])
		}
	}
	return out
}
