package fdm

import (
	"context"
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// Given is what members carry in [Solver.Natural]. Either slice has one entry
// for each member or is nil; a member with entries in both carries both.
type Given struct {
	// Force in N. In the system it is the natural force density of a member:
	// force over length in the reference shape. Its true force differs as far
	// as the found length does.
	Force []float64
	// Density is a force density in N/m, kept as it is.
	Density []float64
}

// NaturalResult is a shape found with natural force densities, and what it
// carries. The shape is in equilibrium with what is reported here, whatever
// that has to do with what was wanted.
type NaturalResult struct {
	// Position of each node, m.
	Position []r3.Vec
	// Force in each member, N, tension positive.
	Force []float64
	// Stress of each panel.
	Stress []PanelStress
	// Reaction of the support on each node, N: minus the sum of the other
	// forces on it, in the directions in which it is fixed.
	Reaction []r3.Vec
	// Residual is ‖r‖₂/‖s‖₂, Worst max|r|/max s over the free directions of
	// all nodes: r the sum of the forces that meet there, s the sum of their
	// sizes. Both are added up from Force and Stress as reported, in the found
	// shape.
	Residual, Worst float64
}

// Natural finds a shape with natural force densities (Pauletti & Pimenta 2008):
// the wanted stress of each panel acts as second Piola–Kirchhoff stress S on
// the reference shape ref. On linear triangles that makes one scalar matrix for
// x, y and z,
//
//	K_ij = A ∇φ_i·S∇φ_j   (A, ∇φ of the reference triangle),
//
// with the panel's Warp projected into the reference triangle; members with a
// given force T add T/L, L their length in ref. The result is in equilibrium
// with the stress and forces it reports: the true (Cauchy) stress of the
// deformed triangles, F·S·Fᵀ/J, and the force density times the found length.
// They differ from the wanted ones as far as the shape differs from ref.
//
// With updates > 1 this is repeated, each time with the last shape as
// reference. A few updates (3 to 8) bring the stress near what is wanted. Do
// not iterate to the end: a surface of uniform stress does not resist sliding
// in itself, and nodes would run together. With updates = 1 and a shape already
// found by other means as ref the stress found differs only slightly from the
// wanted one while the balance becomes exact in all directions.
//
// Errors: [ReferenceError] for a panel without area or with its warp along its
// normal (unless its stresses are equal), or a member with a force but no
// length; [SingularError], [InputError], that of ctx.
//
// R. M. O. Pauletti, P. M. Pimenta: The natural force density method for the
// shape finding of taut structures. Comput. Methods Appl. Mech. Eng. 197
// (2008), 4419-4428.
func (s *Solver) Natural(ctx context.Context, ref []r3.Vec, given Given, updates int) (NaturalResult, error) {
	var none NaturalResult
	if err := s.checkNatural(ref, given, updates); err != nil {
		return none, err
	}
	nodes, panels := len(s.position), len(s.panels)
	r := NaturalResult{
		Position: make([]r3.Vec, nodes),
		Force:    make([]float64, len(s.ends)),
		Stress:   make([]PanelStress, panels),
		Reaction: make([]r3.Vec, nodes),
	}
	laid := make([]flat, panels)
	reference := make([]r3.Vec, nodes)
	copy(reference, ref)
	for update := range updates {
		if update > 0 {
			copy(reference, r.Position)
		}
		kind, err := s.naturalWeights(reference, given, laid)
		if err != nil {
			err.Update = update
			return none, err
		}
		if update == 0 {
			if err := s.checkSupport(s.weight); err != nil {
				return none, err
			}
		}
		if err := s.factorise(ctx, kind, false); err != nil {
			return none, fmt.Errorf("natural force density update %d of %d: %w", update+1, updates, err)
		}
		copy(r.Position, s.start)
		s.linkForces(s.force, s.size, r.Position)
		if err := s.solve(s.move, s.force); err != nil {
			return none, err
		}
		shift(r.Position, s.move)
	}
	if err := s.carried(&r, laid); err != nil {
		err.Update = updates
		return none, err
	}
	s.weigh(&r)
	if err := s.polish(ctx, &r, laid); err != nil {
		return none, err
	}
	return r, nil
}

// polish takes the rounding of the solve out of the shape: once more with what
// is out of balance, kept if it helps.
func (s *Solver) polish(ctx context.Context, r *NaturalResult, laid []flat) error {
	enough := 4 * s.rounding(r.Position, false)
	for range 3 {
		if r.Residual <= enough {
			return nil
		}
		if err := ctx.Err(); err != nil {
			return err
		}
		// weigh has left what is out of balance, gathered, in s.force.
		if err := s.solve(s.move, s.force); err != nil {
			return err
		}
		before := r.Residual
		shift(r.Position, s.move)
		if err := s.reweigh(r, laid); err != nil {
			return err
		}
		if !(r.Residual < before) {
			unshift(r.Position, s.move)
			if err := s.reweigh(r, laid); err != nil {
				return err
			}
			break
		}
	}
	// As in settle: pivots may have been replaced.
	if r.Residual > enough && s.kind == mixed {
		if _, err := s.refine(ctx, r.Position, enough); err != nil {
			return err
		}
		if err := s.reweigh(r, laid); err != nil {
			return err
		}
	}
	if !s.acceptable(r.Residual, r.Position) {
		return s.lost(nil, r.Position)
	}
	return nil
}

func (s *Solver) reweigh(r *NaturalResult, laid []flat) error {
	if err := s.carried(r, laid); err != nil {
		return err
	}
	s.weigh(r)
	return nil
}

func (s *Solver) checkNatural(ref []r3.Vec, given Given, updates int) error {
	if len(ref) != len(s.position) {
		return &InputError{What: "reference shape", Index: -1, Why: fmt.Sprintf("it has %d positions for %d nodes", len(ref), len(s.position))}
	}
	if err := usablePositions(ref); err != nil {
		return err
	}
	if updates < 1 {
		return &InputError{What: "updates", Index: -1, Why: fmt.Sprintf("%d asked for; at least one is needed", updates)}
	}
	for _, g := range []struct {
		name   string
		values []float64
	}{{"given forces", given.Force}, {"given force densities", given.Density}} {
		if g.values != nil && len(g.values) != len(s.ends) {
			return &InputError{What: g.name, Index: -1, Why: fmt.Sprintf("there are %d of them for %d members", len(g.values), len(s.ends))}
		}
	}
	var bad []int32
	for k := range s.ends {
		if given.Force != nil && !usable(given.Force[k]) || given.Density != nil && !usable(given.Density[k]) {
			bad = append(bad, int32(k))
		}
	}
	if bad != nil {
		return &SingularError{Members: bad, Directions: DirAll, Cause: NotFinite}
	}
	return nil
}

// naturalWeights fills the weights of all links for the reference shape x, and
// the reference triangles.
func (s *Solver) naturalWeights(x []r3.Vec, given Given, laid []flat) (signs, *ReferenceError) {
	for k, e := range s.ends {
		w := 0.0
		if given.Density != nil {
			w = given.Density[k]
		}
		if given.Force != nil && given.Force[k] != 0 {
			l := r3.Norm(r3.Sub(x[e[1]], x[e[0]]))
			d := given.Force[k] / l
			if !usable(d) {
				return idle, &ReferenceError{Panel: -1, Member: k, Why: fmt.Sprintf("it has no length (%.3g m) to spread its force over", l)}
			}
			w += d
		}
		s.weight[k] = w
	}
	kind := signsOf(s.weight[:len(s.ends)])
	edges := s.weight[len(s.ends):]
	for k := range s.panels {
		p := &s.panels[k]
		f, wrong := p.lay(x)
		if wrong != "" {
			return idle, &ReferenceError{Panel: k, Member: -1, Why: wrong}
		}
		laid[k] = f
		w := f.densities(p.WarpStress, p.WeftStress)
		copy(edges[3*k:], w[:])
		// The edges may push although the panel pulls: what counts for the
		// matrix is the sign of its stresses.
		kind = kind.and(signsOf([]float64{p.WarpStress, p.WeftStress}))
	}
	return kind, nil
}

// carried fills in the forces and stresses of the shape in r.
func (s *Solver) carried(r *NaturalResult, laid []flat) *ReferenceError {
	for k, e := range s.ends {
		r.Force[k] = s.weight[k] * r3.Norm(r3.Sub(r.Position[e[1]], r.Position[e[0]]))
	}
	for k := range s.panels {
		p := &s.panels[k]
		c := p.Corners
		stress, wrong := laid[k].carry(p.WarpStress, p.WeftStress, r.Position[c[0]], r.Position[c[1]], r.Position[c[2]])
		if wrong != "" {
			return &ReferenceError{Panel: k, Member: -1, Why: wrong}
		}
		r.Stress[k] = stress
	}
	return nil
}

// weigh adds up the reported forces at the nodes and fills in reactions and
// residuals.
func (s *Solver) weigh(r *NaturalResult) {
	force, size := s.force, s.size
	s.loadForces(force, size)
	x := r.Position
	for k, e := range s.ends {
		if r.Force[k] == 0 {
			continue
		}
		d := r3.Sub(x[e[1]], x[e[0]])
		d = r3.Scale(r.Force[k]/r3.Norm(d), d) // a force has a length
		addForce(force, size, e[0], d)
		addForce(force, size, e[1], r3.Scale(-1, d))
	}
	for k := range s.panels {
		c := s.panels[k].Corners
		f := r.Stress[k].pulls(x[c[0]], x[c[1]], x[c[2]])
		for i := range 3 {
			addForce(force, size, c[i], f[i])
		}
	}
	s.reactions(r.Reaction, force)
	r.Residual, r.Worst = s.balance(force, size)
}

// loadForces starts the sums of forces with the loads.
func (s *Solver) loadForces(force, size []r3.Vec) {
	if s.load == nil {
		clear(force)
		clear(size)
		return
	}
	copy(force, s.load)
	for i, p := range s.load {
		size[i] = absVec(p)
	}
}

// reactions of the supports, from the sums of all other forces.
func (s *Solver) reactions(dst, force []r3.Vec) {
	for i, f := range force {
		dst[i] = r3.Vec{}
		for axis := range 3 {
			if s.fixed[i].Has(axis) {
				*at(&dst[i], axis) = -*at(&f, axis)
			}
		}
	}
}

func addForce(force, size []r3.Vec, i int32, f r3.Vec) {
	force[i] = r3.Add(force[i], f)
	size[i] = r3.Add(size[i], r3.Vec{X: math.Abs(f.X), Y: math.Abs(f.Y), Z: math.Abs(f.Z)})
}
