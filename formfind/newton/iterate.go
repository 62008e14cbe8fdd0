package newton

import (
	"context"
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/fdm/sparse"
	"anticlast/formfind/canopy"
	"anticlast/formfind/element"
	"anticlast/formfind/engine"
)

const (
	// A triangle that has lost this share of its area, or a member of its
	// length, has collapsed.
	collapsed = 1e-3
	// One step may not take a triangle's area, seen along its normal, or a
	// member's length below this share.
	keep = 0.15
	// A step is not shortened below this share.
	shortest = 1.0 / 4096
	// A full step that leaves this share of the residual has come so close that
	// the next one finds the same tangent good enough.
	closeBy = 0.03
	// Steps that reduce neither residual nor energy taken before giving up.
	patience = 6
)

// step is a Newton step: moves by unknown, and changes of the common forces.
type step struct {
	u       []float64
	force   []float64
	slope   float64 // derivative of the energy along u at the new common forces
	shifted bool
}

// measure keeps the sizes of the elements at the start.
func (v *Solver) measure(at []r3.Vec) error {
	v.overTriangles(func(block, lo, hi int) {
		p := &v.pieces[block]
		p.energy, p.collapse = 0, none
		var tri element.Triangle
		for t := lo; t < hi; t++ {
			c := &v.s.Corners[t]
			if !tri.Span(&at[c[0]], &at[c[1]], &at[c[2]]) {
				p.collapse = int32(t)
				return
			}
			v.areaStart[t] = tri.Area
			p.energy += tri.Area
		}
	})
	area := 0.0
	for k := range (len(v.s.Corners) + patchSize - 1) / patchSize {
		if t := v.pieces[k].collapse; t != none {
			return &DegenerateError{Element: "triangle", Index: t, Name: fmt.Sprint(t)}
		}
		area += v.pieces[k].energy
	}
	v.meshSize = math.Sqrt(2 * area / float64(max(len(v.s.Corners), 1)))
	for m, e := range v.s.Ends {
		if !v.active[m] {
			continue
		}
		_, l, ok := element.Line(at[e[0]], at[e[1]])
		if !ok {
			return &DegenerateError{Element: "member", Index: int32(m), Name: v.s.MemberName.At(m)}
		}
		v.lengthStart[m] = l
	}
	return nil
}

// fits is how often the magnitude of unequal stress is fitted to the shape
// before the last, exact, run; each time the shape moves less.
const fits = 3

// refits is the same from the magnitudes of a shape nearby.
const refits = 2

// rounds iterates to balance, after an approach where members are elastic. For unequal stress it alternates with fits of the
// magnitude; the shape returned is in balance, along the normals, with the
// magnitude returned.
func (v *Solver) rounds(ctx context.Context, set engine.Settings, start *canopy.Form) (engine.Outcome, error) {
	first := 0
	if used, why, err := v.inflate(ctx, set, 0); err != nil || why != "" {
		return engine.Outcome{Status: engine.Stalled, Why: why, Iterations: used, NegativePivots: -1}, err
	} else if used > 0 {
		first = used
		set.MaxIterations += used
	}
	if v.hasElastic() {
		var err error
		if first, err = v.approach(ctx, set, start, first); err != nil {
			return engine.Outcome{NegativePivots: -1}, err
		}
	}
	if v.uneven {
		for t := range v.s.Corners {
			c := v.s.Corners[t]
			tri, ok := element.NewTriangle(v.now.at[c[0]], v.now.at[c[1]], v.now.at[c[2]])
			if !ok {
				continue
			}
			if _, _, err := v.axes(&v.now, t, &tri); err != nil {
				return engine.Outcome{NegativePivots: -1}, v.warpError(t, err)
			}
		}
		rough := set
		from := 0
		if v.resumed {
			from = fits - refits
		}
		for k := from; k < fits; k++ {
			// The shape moves before every fit, also when it starts closer than
			// that, on the surface of a coarser mesh: a fit to that surface
			// would keep its error.
			v.evaluate(&v.now)
			tol := min([]float64{1e-3, 1e-4, 1e-5}[k], 0.1*v.now.eta)
			rough.Residual, rough.Worst, rough.Move = max(set.Residual, tol), max(set.Worst, 10*tol), max(set.Move, tol)
			out, err := v.iterate(ctx, rough, first)
			if err != nil || out.Status != engine.Converged {
				return out, err
			}
			first = out.Iterations
			if err := v.fit(ctx, &v.now); err != nil {
				return out, err
			}
		}
	}
	out, err := v.iterate(ctx, set, first)
	if err != nil || !v.uneven || out.Status != engine.Converged || v.magnitude.sheared() {
		return out, err
	}
	if share, i := v.inPlane(); share > hanging {
		p := v.now.at[i]
		out.Status = engine.Stalled
		out.Why = fmt.Sprintf("the surface hangs on the triangles around node %s (x %.3f, y %.3f, z %.3f m): %.0f %% of the forces that meet there are out of balance in its plane, whatever the magnitude of the stress", v.s.NodeName.At(int(i)), p.X, p.Y, p.Z, 100*share)
	}
	return out, nil
}

// hanging is the share of the forces that meet at a node inside fabric of
// unequal stress, out of balance in its plane after the fit, above which the
// mesh and not the fabric holds the shape: a neck thinner than its triangles
// shows 0.25 and more, sails held all round 0.02 at most and cones 1e-3. Where
// cables shear the fabric, ratios that the outline cannot hold show 0.25 as well.
const hanging = 0.2

// inPlane is the largest share of the forces that meet at a node inside the
// fabric which is out of balance, and that node.
func (v *Solver) inPlane() (share float64, node int32) {
	for i := range v.now.at {
		if v.cls[i] != normal || v.first[i] < 0 || v.s.FixedAt(i) != 0 || v.now.size[i] == 0 {
			continue
		}
		if q := norm(v.now.pull[i]) / v.now.size[i]; q > share {
			share, node = q, int32(i)
		}
	}
	return share, node
}

func (v *Solver) iterate(ctx context.Context, set engine.Settings, first int) (engine.Outcome, error) {
	out := engine.Outcome{NegativePivots: -1}
	v.mixing.forget()
	size := v.modelSize(v.now.at)
	hasEnergy := v.potential()
	mayReuse := !set.AllDirections && !v.uneven && !v.hasElastic() && !v.encloses()
	v.evaluate(&v.now)
	refused := 0
	v.target, v.reuse = set.Residual, false
	defer func() { v.reuse = false }()
	st := step{u: make([]float64, v.unknown), force: make([]float64, len(v.commons))}
	for it := first; ; it++ {
		if err := ctx.Err(); err != nil {
			return out, err
		}
		out.Iterations, out.Residual, out.Worst = it, v.now.eta, v.now.worst
		set.Recorder.Record(engine.Row{Engine: Name, Iteration: it, Residual: v.now.merit, Energy: v.now.energy})
		if set.Progress != nil {
			set.Progress(engine.Step{Engine: Name, Stage: "balancing", Iteration: it, Residual: v.now.merit, Target: set.Residual})
		}
		if v.now.collapse != none {
			out.Status, out.Why = engine.Diverged, v.collapseText(v.now.collapse)
			return out, nil
		}
		if v.unknown == 0 {
			out.Status, out.NegativePivots = engine.Converged, 0
			return out, nil
		}
		if !v.reuse {
			v.assemble(&v.now)
		}
		v.columnsOf(&v.now)
		err := v.newtonStep(ctx, &v.now, &st)
		if err != nil {
			return out, err
		}
		move := v.largestMove(&v.now, st.u)
		out.Move = move / size
		if v.now.eta <= max(set.Residual, v.now.noise) && v.now.worst <= max(set.Worst, v.now.noiseWorst) && v.gapsMet(set.Residual) && out.Move <= set.Move {
			out.Status = engine.Converged
			out.NegativePivots, err = v.negative(ctx)
			return out, err
		}
		if it >= set.MaxIterations {
			out.Status = engine.Stalled
			out.Why = fmt.Sprintf("not in balance after %d steps: residual %.2g of the forces that meet (wanted %.2g), largest at node %s", it, v.now.eta, set.Residual, v.s.NodeName.At(int(v.now.worstAt)))
			out.NegativePivots, err = v.negative(ctx)
			return out, err
		}
		if v.uneven {
			done, err := v.mixedStep(ctx, &st, size)
			if err != nil {
				return out, err
			}
			if done {
				continue
			}
		}
		// Take the step, or as much of it as helps.
		if v.along, err = v.slide(ctx, &v.now, st.u); err != nil {
			return out, err
		}
		alpha := 1.0
		if most := 0.25 * size; move > most {
			alpha = most / move
		}
		for alpha > shortest && !v.keepsShape(alpha, st.u) {
			alpha /= 2
		}
		if alpha <= shortest {
			out.Status = engine.Diverged
			out.Why = fmt.Sprintf("triangles or members near node %s fold over at the smallest step: there is no equilibrium nearby", v.s.NodeName.At(int(v.now.worstAt)))
			out.NegativePivots, err = v.negative(ctx)
			return out, err
		}
		longest := alpha
		taken := false
		// Energy at the present shape with the new common forces.
		energy := v.now.energy
		if hasEnergy {
			for k := range v.commons { // of cables: with air enclosed there is no energy
				energy += (st.force[k] - v.now.force[k]) * v.lengthOf(k, v.now.at)
			}
		}
		for ; alpha > longest/2048; alpha /= 2 {
			v.moveTrial(alpha, st.u)
			v.takeForces(alpha, &st)
			v.evaluate(&v.trial)
			if v.trial.collapse != none || math.IsInf(v.trial.merit, 1) {
				continue
			}
			if v.trial.merit <= (1-1e-4*alpha)*v.now.merit {
				taken = true
				break
			}
			if hasEnergy && st.slope < 0 && v.trial.energy <= energy+1e-4*alpha*st.slope && -alpha*st.slope > 1e-12*math.Abs(energy) {
				taken = true
				break
			}
		}
		if !taken {
			refused++
			if refused > patience {
				out.Status = engine.Stalled
				out.Why = fmt.Sprintf("no step reduces the residual below %.2g of the forces that meet, largest at node %s", v.now.merit, v.s.NodeName.At(int(v.now.worstAt)))
				out.NegativePivots, err = v.negative(ctx)
				return out, err
			}
			v.moveTrial(longest, st.u)
			v.takeForces(longest, &st)
			v.evaluate(&v.trial)
			if v.trial.collapse != none || math.IsInf(v.trial.merit, 1) {
				out.Status = engine.Diverged
				out.Why = v.collapseText(v.trial.collapse)
				return out, nil
			}
		}
		v.reuse = mayReuse && taken && alpha == 1 && !st.shifted && v.positive && v.trial.merit <= closeBy*v.now.merit
		v.now, v.trial = v.trial, v.now
	}
}

// mixedStep takes the step mixed with those before when it is small enough and
// reduces the residual. It leaves st as it is when it does not.
func (v *Solver) mixedStep(ctx context.Context, st *step, size float64) (bool, error) {
	u := append([]float64(nil), st.u...)
	v.mixing.mix(u)
	if v.largestMove(&v.now, u) > 0.1*size {
		v.mixing.forget()
		return false, nil
	}
	var err error
	if v.along, err = v.slide(ctx, &v.now, u); err != nil {
		return false, err
	}
	if v.keepsShape(1, u) {
		copy(v.trial.force, st.force)
		v.evaluate(&v.trial)
		if v.trial.collapse == none && v.trial.merit < 0.9*v.now.merit {
			v.mixing.took(1, u)
			v.now, v.trial = v.trial, v.now
			return true, nil
		}
	}
	v.mixing.forget()
	return false, nil
}

// encloses reports whether the pressure of some air is an unknown.
func (v *Solver) encloses() bool {
	for k := range v.commons {
		if v.commons[k].pocket != nil {
			return true
		}
	}
	return false
}

func (v *Solver) gapsMet(tol float64) bool {
	for k := range v.commons {
		if math.Abs(v.now.cond[k].gap) > tol*v.now.cond[k].scale {
			return false
		}
	}
	return true
}

// modelSize is the diagonal of the box around all nodes.
func (v *Solver) modelSize(at []r3.Vec) float64 {
	lo, hi := canopy.Bounds(at)
	return max(norm(r3.Sub(hi, lo)), math.SmallestNonzeroFloat64)
}

func (v *Solver) collapseText(k int32) string {
	switch {
	case k == none:
		return "the shape has left the range of numbers"
	case k < 0:
		return fmt.Sprintf("member %s has shrunk to nothing: no equilibrium with these forces was found", v.s.MemberName.At(int(-1-k)))
	}
	c := v.s.Corners[k]
	p := r3.Scale(1.0/3, r3.Add(r3.Add(v.now.at[c[0]], v.now.at[c[1]]), v.now.at[c[2]]))
	return fmt.Sprintf("the surface necks: triangles collapse near node %s (x %.3f, y %.3f, z %.3f m), so no equilibrium with these stresses was found", v.s.NodeName.At(int(c[0])), p.X, p.Y, p.Z)
}

// moveTrial puts the trial's nodes alpha·u away from those of now.
func (v *Solver) moveTrial(alpha float64, u []float64) {
	now, to := &v.now, &v.trial
	v.overNodes(func(_, lo, hi int) {
		for i := lo; i < hi; i++ {
			p := now.at[i]
			if v.first[i] >= 0 && v.cls[i] != tied {
				for a, b := range now.basis[v.start[i]:v.start[i+1]] {
					p = r3.Add(p, r3.Scale(alpha*u[int(v.first[i])+a], b))
				}
				if v.along != nil {
					p = r3.Add(p, r3.Scale(alpha, v.along[i]))
				}
			}
			to.at[i] = p
		}
	})
	v.follow(to.at)
}

// keepsShape reports whether no triangle is turned over or crushed and no
// member crushed by alpha·u.
func (v *Solver) keepsShape(alpha float64, u []float64) bool {
	v.moveTrial(alpha, u)
	at, to := v.now.at, v.trial.at
	v.overTriangles(func(block, lo, hi int) {
		v.pieces[block].collapse = none
		for t := lo; t < hi; t++ {
			c := &v.s.Corners[t]
			a := r3.Cross(r3.Sub(at[c[1]], at[c[0]]), r3.Sub(at[c[2]], at[c[0]]))
			b := r3.Cross(r3.Sub(to[c[1]], to[c[0]]), r3.Sub(to[c[2]], to[c[0]]))
			if !(r3.Dot(a, b) >= keep*r3.Norm2(a)) {
				v.pieces[block].collapse = int32(t)
				return
			}
		}
	})
	for k := range (len(v.s.Corners) + patchSize - 1) / patchSize {
		if v.pieces[k].collapse != none {
			return false
		}
	}
	for m, e := range v.s.Ends {
		if !v.active[m] {
			continue
		}
		if !(r3.Norm2(r3.Sub(to[e[1]], to[e[0]])) >= keep*keep*r3.Norm2(r3.Sub(at[e[1]], at[e[0]]))) {
			return false
		}
	}
	return true
}

func (v *Solver) largestMove(st *state, u []float64) float64 {
	most := 0.0
	for i := range st.at {
		if v.first[i] < 0 || v.cls[i] == tied {
			continue
		}
		n2 := 0.0
		for a, b := range st.basis[v.start[i]:v.start[i+1]] {
			x := u[int(v.first[i])+a]
			n2 += x * x * r3.Norm2(b)
		}
		most = max(most, n2)
	}
	return math.Sqrt(most)
}

// newtonStep solves for a step at st from the assembled tangent, adding to its
// diagonal what makes it positive definite on the shapes that the conditions
// allow.
func (v *Solver) newtonStep(ctx context.Context, st *state, out *step) error {
	done, err := v.gridsStep(ctx, st, out)
	if done || err != nil {
		return err
	}
	mean := v.meanDiagonal()
	shift := 0.0
	for try := 0; ; try++ {
		ok, err := v.tryStep(ctx, st, shift, out)
		if err != nil {
			return err
		}
		if ok {
			out.shifted = shift > 0
			if shift > 0 {
				v.lastShift = shift / mean
			} else {
				v.lastShift = 0
			}
			return nil
		}
		if shift == 0 {
			shift = max(1e-3, v.lastShift/8) * mean
		} else {
			shift *= 4
		}
		if try > 40 {
			return errors.New("newton: the tangent cannot be made positive definite")
		}
	}
}

// tryStep factors the tangent plus shift and solves for the step; ok is false
// when it is not positive definite.
func (v *Solver) tryStep(ctx context.Context, st *state, shift float64, out *step) (ok bool, err error) {
	values := v.values
	if shift > 0 {
		copy(v.shifted, v.values)
		for i := range v.unknown {
			v.shifted[i] += shift
		}
		values = v.shifted
	}
	factor, err := v.factorOf(ctx, &v.chol, sparse.Cholesky)
	if err != nil {
		return false, err
	}
	if shift > 0 || !v.reuse {
		err = factor.Refactor(ctx, values)
	}
	positive := err == nil
	v.positive = positive && shift == 0
	if err != nil {
		var pe *sparse.PivotError
		if !errors.As(err, &pe) {
			return false, fmt.Errorf("newton: %w", err)
		}
		// A mast of given length pushes: the tangent at constant force is
		// indefinite though the mast itself holds the shape.
		held := false
		for k := range v.commons {
			held = held || v.symmetric(st, k)
		}
		if !held {
			return false, nil
		}
		if factor, err = v.factorOf(ctx, &v.ldl, sparse.LDL); err != nil {
			return false, err
		}
		if err = factor.Refactor(ctx, values); err != nil {
			if ctx.Err() != nil {
				return false, ctx.Err()
			}
			return false, nil
		}
	}
	m := len(v.commons)
	w := 1 + m
	x := v.rhs
	for i := range v.unknown {
		x[i*w] = st.reduced[i]
		for k := range m {
			x[i*w+1+k] = v.columns[i*m+k]
		}
	}
	if err := factor.Solve(x, w); err != nil {
		return false, fmt.Errorf("newton: %w", err)
	}
	copy(out.force, st.force)
	if m > 0 {
		schur, right := v.schur(st, x)
		if !positive {
			neg, _, _, known := factor.Inertia()
			if !known || neg+v.negativeOf(st, schur)-v.countSymmetric(st) > 0 {
				return false, nil
			}
		}
		solveDense(schur, right, m)
		v.limitForces(st, right)
		for k := range m {
			out.force[k] = st.force[k] + right[k]
		}
		for i := range v.unknown {
			u := x[i*w]
			for k := range m {
				u += x[i*w+1+k] * right[k]
			}
			out.u[i] = u
		}
	} else {
		for i := range v.unknown {
			out.u[i] = x[i*w]
		}
	}
	out.slope = 0
	for i, u := range out.u {
		r := st.reduced[i]
		for k := range m {
			r += v.columns[i*m+k] * (out.force[k] - st.force[k])
		}
		out.slope -= u * r
	}
	return true, nil
}

// schur returns the matrix S = E + D·H⁻¹·C of the common forces and the right
// side −(gap + D·H⁻¹·r), from x = H⁻¹[r | C].
func (v *Solver) schur(st *state, x []float64) (s, right []float64) {
	m := len(v.commons)
	w := 1 + m
	s = make([]float64, m*m)
	right = make([]float64, m)
	for k := range m {
		right[k] = -st.cond[k].gap
		v.conditionRow(st, k, func(i int, d float64) {
			right[k] -= d * x[i*w]
			for l := range m {
				s[k*m+l] += d * x[i*w+1+l]
			}
		})
		s[k*m+k] += v.conditionSlope(st, k)
	}
	return s, right
}

func (v *Solver) countSymmetric(st *state) int {
	n := 0
	for k := range v.commons {
		if v.symmetric(st, k) {
			n++
		}
	}
	return n
}

// negativeOf counts the negative eigenvalues of the part of the Schur
// complement that belongs to symmetric conditions.
func (v *Solver) negativeOf(st *state, schur []float64) int {
	m := len(v.commons)
	var keep []int
	for k := range m {
		if v.symmetric(st, k) {
			keep = append(keep, k)
		}
	}
	n := len(keep)
	a := make([]float64, n*n)
	for i, k := range keep {
		for j, l := range keep {
			a[i*n+j] = 0.5 * (schur[k*m+l] + schur[l*m+k])
		}
	}
	return negativeEigenvalues(a, n)
}

// limitForces keeps the change of tensions within a factor of three: a cable
// that lets go at once takes the fabric with it. An elastic cable that is too
// long at a thousandth of its first force goes slack.
func (v *Solver) limitForces(st *state, change []float64) {
	for k := range change {
		if v.pushes(k) {
			continue
		}
		t := st.force[k]
		to := t + change[k]
		if t > 0 {
			to = min(max(to, t/3), 3*t)
		} else {
			to = max(to, 0)
		}
		if v.cableOf(k).Law == canopy.CableElastic && st.cond[k].gap < 0 && to < 1e-3*v.firstForce[k] {
			to = 0
		}
		change[k] = to - t
	}
}

// negative counts the negative pivots of the unshifted tangent in v.values on
// the shapes that symmetric conditions allow; −1 when rounding hides it.
func (v *Solver) negative(ctx context.Context) (int, error) {
	if v.byGrids && v.positive {
		return -1, nil
	}
	if v.unknown == 0 || v.positive {
		return 0, nil
	}
	chol, err := v.factorOf(ctx, &v.chol, sparse.Cholesky)
	if err != nil {
		return -1, err
	}
	if err = chol.Refactor(ctx, v.values); err == nil {
		return 0, nil
	}
	var pe *sparse.PivotError
	if !errors.As(err, &pe) {
		return -1, fmt.Errorf("newton: %w", err)
	}
	if _, err = v.factorOf(ctx, &v.ldl, sparse.LDL); err != nil {
		return -1, err
	}
	if err := v.ldl.Refactor(ctx, v.values); err != nil {
		if ctx.Err() != nil {
			return -1, ctx.Err()
		}
		return -1, nil
	}
	neg, _, _, known := v.ldl.Inertia()
	if !known {
		return -1, nil
	}
	if sym := v.countSymmetric(&v.now); sym > 0 {
		m := len(v.commons)
		w := 1 + m
		for i := range v.unknown {
			v.rhs[i*w] = 0
			for k := range m {
				v.rhs[i*w+1+k] = v.columns[i*m+k]
			}
		}
		if err := v.ldl.Solve(v.rhs, w); err != nil {
			return -1, fmt.Errorf("newton: %w", err)
		}
		s, _ := v.schur(&v.now, v.rhs)
		neg += v.negativeOf(&v.now, s) - sym
	}
	return neg, nil
}
