package formfind

import "anticlast/formfind/internal/mixing"

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
	gamma, kept := mixing.Weights(a.df, f, 1e-6)
	copy(z, g)
	for j, k := range kept {
		for i := range z {
			z[i] -= gamma[j] * (a.dz[k][i] + a.df[k][i])
		}
	}
}
