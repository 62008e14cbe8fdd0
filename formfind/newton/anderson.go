package newton

import "anticlast/formfind/internal/mixing"

// anderson mixes the steps of an iteration whose tangent is not exact with
// those before (Anderson, J. ACM 12, 1965; in the form of Walker & Ni, SIAM J.
// Numer. Anal. 49, 2011): with f the step proposed at each shape and Δx, Δf the
// differences of the last depth shapes and proposals, it takes
// f − Σγ(Δx + Δf), where γ minimises |f − ΣγΔf|.
type anderson struct {
	dx, df [][]float64
	last   []float64 // proposal before, nil at the start
	taken  []float64 // step taken from there
}

const depth = 5

// forget drops the history.
func (a *anderson) forget() { a.dx, a.df, a.last = nil, nil, nil }

// mix replaces the proposal u by the mixed step. took must follow.
func (a *anderson) mix(u []float64) {
	f := append([]float64(nil), u...)
	if a.last != nil {
		df := make([]float64, len(u))
		for i := range u {
			df[i] = f[i] - a.last[i]
		}
		a.dx = append(a.dx, a.taken)
		a.df = append(a.df, df)
		if len(a.dx) > depth {
			a.dx, a.df = a.dx[1:], a.df[1:]
		}
	}
	a.last = f
	gamma, kept := mixing.Weights(a.df, f, 1e-8)
	for j, k := range kept {
		for i := range u {
			u[i] -= gamma[j] * (a.dx[k][i] + a.df[k][i])
		}
	}
}

// took notes the step taken, alpha·u.
func (a *anderson) took(alpha float64, u []float64) {
	a.taken = make([]float64, len(u))
	for i := range u {
		a.taken[i] = alpha * u[i]
	}
}

func dot(a, b []float64) float64 {
	sum := 0.0
	for i := range a {
		sum += float64(a[i] * b[i])
	}
	return sum
}
