package fdm

import "gonum.org/v1/gonum/spatial/r3"

// Forces writes the force of each member in the shape x, q times length, in N
// and tension positive, to dst. All slices must have the right lengths: one
// entry for each member in dst and q, one for each node in x.
func (s *Solver) Forces(dst []float64, x []r3.Vec, q []float64) {
	for k, e := range s.ends {
		dst[k] = q[k] * r3.Norm(r3.Sub(x[e[1]], x[e[0]]))
	}
}

// Reactions writes the force of the support on each node in N to dst: minus
// the sum of load and member forces there, in the directions in which the node
// is fixed, for the force densities q in the shape x. It returns ‖r‖₂/‖s‖₂ over
// the free directions, r what is out of balance there and s the sum of the
// sizes of the forces that meet. It speaks of members and loads only; a solver
// with panels reports theirs in [NaturalResult].
func (s *Solver) Reactions(dst, x []r3.Vec, q []float64) (residual float64) {
	force, size := s.force, s.size
	s.loadForces(force, size)
	for k, e := range s.ends {
		f := r3.Scale(q[k], r3.Sub(x[e[1]], x[e[0]]))
		addForce(force, size, e[0], f)
		addForce(force, size, e[1], r3.Scale(-1, f))
	}
	s.reactions(dst, force)
	residual, _ = s.balance(force, size)
	return residual
}
