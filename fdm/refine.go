package fdm

import (
	"context"
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// refine improves the shape x by generalised conjugate residuals with the
// systems factorised last as preconditioner (Eisenstat, Elman & Schultz 1983).
// A factorisation that had to replace k pivots differs from the matrix by rank
// k, so about k steps end it where simple iterative refinement would creep or
// grow. It returns the imbalance at x, as settle counts it.
func (s *Solver) refine(ctx context.Context, x []r3.Vec, enough float64) (float64, error) {
	const (
		rounds = 4
		steps  = 24
	)
	n := len(x)
	var moves, pulls [][]r3.Vec // pulls[k] = D·moves[k], orthonormal
	best := append([]r3.Vec(nil), x...)
	left := s.imbalance(x)
	r := make([]r3.Vec, n)
	for range rounds {
		moves, pulls = moves[:0], pulls[:0]
		s.imbalance(x)
		copy(r, s.force)
		for range steps {
			if err := ctx.Err(); err != nil {
				return left, err
			}
			move, pull := make([]r3.Vec, n), make([]r3.Vec, n)
			if err := s.solve(move, r); err != nil {
				return left, s.lost(err, x)
			}
			s.apply(pull, move)
			for k := range pulls {
				c := dot(pulls[k], pull)
				accumulate(pull, -c, pulls[k])
				accumulate(move, -c, moves[k])
			}
			norm := math.Sqrt(dot(pull, pull))
			if !(norm > 0) || !finite(1/norm) {
				break
			}
			scale(pull, 1/norm)
			scale(move, 1/norm)
			c := dot(pull, r)
			accumulate(r, -c, pull)
			accumulate(x, c, move)
			moves, pulls = append(moves, move), append(pulls, pull)
			if dot(r, r) == 0 || math.Abs(c) <= 1e-17*norm {
				break
			}
		}
		now := s.imbalance(x)
		if !(now < left) {
			break
		}
		gained := now < 0.1*left
		left = now
		copy(best, x)
		if left <= enough || !gained {
			break
		}
	}
	copy(x, best)
	return s.imbalance(x), nil
}

// apply does pull = D·move, gathered.
func (s *Solver) apply(pull, move []r3.Vec) {
	clear(pull)
	for k, l := range s.links {
		w := s.weight[k]
		f := r3.Scale(w, r3.Sub(move[l[0]], move[l[1]]))
		pull[l[0]] = r3.Add(pull[l[0]], f)
		pull[l[1]] = r3.Sub(pull[l[1]], f)
	}
	s.gather(pull)
}

func dot(a, b []r3.Vec) (sum float64) {
	for i := range a {
		sum += r3.Dot(a[i], b[i])
	}
	return sum
}

func accumulate(y []r3.Vec, c float64, x []r3.Vec) {
	for i := range y {
		y[i] = r3.Add(y[i], r3.Scale(c, x[i]))
	}
}

func scale(x []r3.Vec, c float64) {
	for i := range x {
		x[i] = r3.Scale(c, x[i])
	}
}
