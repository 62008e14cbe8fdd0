package fdm

import (
	"context"
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// equilateral is the natural force density of the edges of an equilateral
// triangle under a uniform stress of 1: half the cotangent of 60°.
const equilateral = 0.28867513459481288225 // 1/(2√3)

// Shape finds the one shape in which every free node is in balance when the
// force in each member is q times its length: linear force density (Schek
// 1974). It is the solution of
//
//	Σ q (x_j − x_i) + load_i = 0   for every free node i and each direction,
//
// depends on nothing but the fixed nodes, the loads and q, and for positive q
// without loads makes Σ q L² least.
//
// q is in N/m, one for each member, tension positive; it may be negative
// (struts) or zero (no member). Panels take part as if they were equilateral:
// each of their edges pulls with the force density (warp + weft)/(4√3). That
// gives a fabric a sound first shape whatever its start; see [Solver.Natural]
// for the next steps.
//
// The shape is written to dst, which has one entry for each node, in m. Nothing
// is allocated after the first call unless signs are mixed. Errors:
// [SingularError], [InputError], that of ctx; dst is then as before.
//
// H.-J. Schek: The force density method for form finding and computation of
// general networks. Comput. Methods Appl. Mech. Eng. 3 (1974), 115-134.
func (s *Solver) Shape(ctx context.Context, dst []r3.Vec, q []float64) error {
	if len(dst) != len(s.position) {
		return &InputError{What: "dst", Index: -1, Why: fmt.Sprintf("it has length %d, there are %d nodes", len(dst), len(s.position))}
	}
	if err := s.prepare(ctx, q); err != nil {
		return err
	}
	return s.settle(ctx, dst)
}

// prepare checks q, fills the weights and factorises.
func (s *Solver) prepare(ctx context.Context, q []float64) error {
	if err := ctx.Err(); err != nil {
		return err
	}
	if err := s.checkDensities(q); err != nil {
		return err
	}
	copy(s.weight, q)
	kind := signsOf(q)
	flat := s.weight[len(s.ends):]
	for k := range s.panels {
		w := (s.panels[k].WarpStress + s.panels[k].WeftStress) * (equilateral / 2)
		flat[3*k], flat[3*k+1], flat[3*k+2] = w, w, w
	}
	kind = kind.and(signsOf(flat))
	if hasZero(s.weight) {
		if err := s.checkSupport(s.weight); err != nil {
			return err
		}
	}
	return s.factorise(ctx, kind, isWide(s.weight))
}

// checkDensities looks for what is not a finite number.
func (s *Solver) checkDensities(q []float64) error {
	if len(q) != len(s.ends) {
		return &InputError{What: "force densities", Index: -1, Why: fmt.Sprintf("there are %d of them for %d members", len(q), len(s.ends))}
	}
	var bad []int32
	for k, v := range q {
		if !usable(v) {
			bad = append(bad, int32(k))
		}
	}
	if bad == nil {
		return nil
	}
	e := &SingularError{Members: bad, Directions: DirAll, Cause: NotFinite}
	for _, k := range bad[:min(len(bad), 32)] {
		e.Nodes = append(e.Nodes, s.ends[k][0], s.ends[k][1])
	}
	return e
}

func signsOf(w []float64) signs {
	neg, pos := false, false
	for _, v := range w {
		neg = neg || v < 0
		pos = pos || v > 0
	}
	switch {
	case neg && pos:
		return mixed
	case neg:
		return pushing
	case pos:
		return pulling
	}
	return idle
}

// isWide reports whether sizes other than zero differ by more than ten orders
// of magnitude.
func isWide(w []float64) bool {
	most, least := 0.0, math.Inf(1)
	for _, v := range w {
		if v = math.Abs(v); v > 0 {
			most, least = max(most, v), min(least, v)
		}
	}
	return most > 1e10*least
}

func hasZero(w []float64) bool {
	for _, v := range w {
		if v == 0 {
			return true
		}
	}
	return false
}

// settle solves for the shape with the systems factorised last, looks at the
// balance that is left at the nodes of that very shape, and improves it while
// that helps.
func (s *Solver) settle(ctx context.Context, dst []r3.Vec) error {
	x := s.trial
	copy(x, s.start)
	s.imbalance(x)
	if err := s.solve(s.move, s.force); err != nil {
		return s.lost(err, x)
	}
	shift(x, s.move)
	left := s.imbalance(x)
	enough := 4 * s.rounding(x, false)
	for left > enough {
		if err := ctx.Err(); err != nil {
			return err
		}
		if err := s.solve(s.move, s.force); err != nil {
			return s.lost(err, x)
		}
		shift(x, s.move)
		now := s.imbalance(x)
		if !(now < left) {
			unshift(x, s.move)
			break
		}
		gained := now < 0.1*left
		left = now
		if !gained {
			break
		}
	}
	// A factorisation of mixed signs may have replaced pivots, or grown.
	if left > enough && (s.kind == mixed || left > 1e-12) {
		var err error
		if left, err = s.refine(ctx, x, enough); err != nil {
			return err
		}
	}
	if !s.acceptable(left, x) {
		return s.lost(nil, x)
	}
	copy(dst, x)
	return nil
}

// stillBalanced is the imbalance ‖r‖₂/‖s‖₂ beyond which a shape is none, unless
// the forces themselves are lost in rounding.
const stillBalanced = 1e-6

// rounding is about the imbalance that rounding the positions x to floating
// point causes by itself: in a fine net members are short beside coordinates.
// It belongs to the sizes that the last imbalance left in s.size. Each node's
// own coordinates count, or, when far, the largest of all.
func (s *Solver) rounding(x []r3.Vec, far bool) float64 {
	const unit = 1.0 / (1 << 53)
	var reach r3.Vec
	if far {
		for _, p := range x {
			p = absVec(p)
			reach = r3.Vec{X: max(reach.X, p.X), Y: max(reach.Y, p.Y), Z: max(reach.Z, p.Z)}
		}
	}
	coordinate := func(sys *system, u, axis int) float64 {
		if far {
			return *at(&reach, axis)
		}
		return math.Abs(*at(&x[sys.node[u]], axis))
	}
	// Both norms are taken over their largest entry: squares of tiny numbers
	// vanish.
	var have, size, top, most float64
	for _, sys := range s.systems {
		for u, d := range sys.values[:sys.n] {
			for _, axis := range sys.axes {
				top = max(top, math.Abs(d)*coordinate(sys, u, axis))
			}
		}
	}
	for _, p := range s.size {
		most = max(most, p.X, p.Y, p.Z)
	}
	if most == 0 || top == 0 {
		return 0
	}
	for _, sys := range s.systems {
		for u, d := range sys.values[:sys.n] {
			for _, axis := range sys.axes {
				p := d / top * coordinate(sys, u, axis)
				have += p * p
			}
		}
	}
	for _, p := range s.size {
		size += r3.Norm2(r3.Scale(1/most, p))
	}
	return unit * (top / most) * math.Sqrt(have/size)
}

// acceptable reports whether the imbalance left at x is one that rounding
// explains, or small.
func (s *Solver) acceptable(left float64, x []r3.Vec) bool {
	return left <= stillBalanced || left <= 256*s.rounding(x, true)
}

// lost says why a system that passed all checks still gave no shape x: by the
// node that has gone farthest.
func (s *Solver) lost(err error, x []r3.Vec) error {
	worst, where, axes := 0.0, int32(-1), DirAll
	for _, sys := range s.systems {
		for i, u := range sys.unknown {
			if u < 0 {
				continue
			}
			for _, axis := range sys.axes {
				v := math.Abs(*at(&x[i], axis) - *at(&s.start[i], axis))
				if where < 0 || v > worst || !finite(v) && finite(worst) {
					worst, where, axes = v, sys.node[u], sys.directions()
				}
			}
		}
	}
	if where < 0 {
		return err
	}
	return &SingularError{Nodes: []int32{where}, Directions: axes, Cause: Weak}
}

// linkForces adds up at each node the forces of the links at x and the load
// (force), and the sizes of these forces by direction (size).
func (s *Solver) linkForces(force, size, x []r3.Vec) {
	s.loadForces(force, size)
	for k, l := range s.links {
		w := s.weight[k]
		if w == 0 {
			continue
		}
		a, b := l[0], l[1]
		p, q := &x[a], &x[b]
		f := r3.Vec{X: w * (q.X - p.X), Y: w * (q.Y - p.Y), Z: w * (q.Z - p.Z)}
		g := absVec(f)
		fa, fb, sa, sb := &force[a], &force[b], &size[a], &size[b]
		fa.X += f.X
		fa.Y += f.Y
		fa.Z += f.Z
		fb.X -= f.X
		fb.Y -= f.Y
		fb.Z -= f.Z
		sa.X += g.X
		sa.Y += g.Y
		sa.Z += g.Z
		sb.X += g.X
		sb.Y += g.Y
		sb.Z += g.Z
	}
}

// imbalance leaves the nodal forces at x in s.force and returns ‖r‖₂/‖s‖₂: r
// what is out of balance, s the sizes of the forces that meet, over all free
// directions. Zero when no forces meet anywhere, NaN when x is not finite.
func (s *Solver) imbalance(x []r3.Vec) float64 {
	s.linkForces(s.force, s.size, x)
	rms, _ := s.balance(s.force, s.size)
	return rms
}

// balance gathers force and size in place and returns ‖r‖₂/‖s‖₂ and max|r|/max s
// over the free directions.
func (s *Solver) balance(force, size []r3.Vec) (rms, worst float64) {
	s.gather(force)
	s.gather(size)
	var r2, s2, rMax, sMax, unit float64
	for _, z := range size {
		unit = max(unit, z.X, z.Y, z.Z)
	}
	if unit == 0 {
		return 0, 0
	}
	for i := range force {
		r, z := r3.Norm2(r3.Scale(1/unit, force[i])), r3.Norm2(r3.Scale(1/unit, size[i]))
		r2 += r
		s2 += z
		rMax = max(rMax, r)
		sMax = max(sMax, z)
	}
	return math.Sqrt(r2 / s2), math.Sqrt(rMax / sMax)
}

func shift(x, move []r3.Vec) {
	for i := range x {
		x[i] = r3.Add(x[i], move[i])
	}
}

func unshift(x, move []r3.Vec) {
	for i := range x {
		x[i] = r3.Sub(x[i], move[i])
	}
}

func absVec(v r3.Vec) r3.Vec {
	return r3.Vec{X: math.Abs(v.X), Y: math.Abs(v.Y), Z: math.Abs(v.Z)}
}
