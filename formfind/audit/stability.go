package audit

import (
	"context"
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/fdm/sparse"
	"anticlast/formfind/canopy"
	"anticlast/formfind/surface"
)

// StabilityResult says whether a form in equilibrium would stay.
type StabilityResult struct {
	// Known is false when stability could not be judged; Note says why.
	Known bool
	// Unstable is the number of independent disturbances under which the form
	// runs away.
	Unstable int
	// Eigenvalue is the smallest λ of K·u = λ·M·u in 1/m², with K the tangent
	// and M the tension tributary to the nodes: half the trace of stress times
	// area for fabric, half of force times length for cables, shared among
	// their nodes. A membrane of stress σ under the pressure λ·σ·u is moved
	// by u in that shape. NaN when not computed.
	Eigenvalue float64
	// Firmness is λ·d², d twice the largest distance of a node from the
	// centroid of the tension: a number that does not depend on mesh,
	// position, scale, units or level of prestress. Surfaces held on all sides
	// have tens; below zero the form is unstable.
	Firmness float64
	// Threshold is the Firmness in size below which a direction counts as
	// without stiffness instead of unstable.
	Threshold float64
	// Node is where the softest mode moves most, Mode that motion, largest 1;
	// −1 and nil when not computed.
	Node int32
	Mode []r3.Vec
	// Loose are nodes in some direction of which nothing resists.
	Loose []int32
	// Convex says that instability is excluded without factorising.
	Convex bool
	// Unknowns is the size of the problem.
	Unknowns int
	// Note explains in plain words what is not known or not computed.
	Note string
}

// Stability judges the stability of f for the problem of prescribed (true)
// stress, with its loads, in the directions that change the shape.
//
// # The problem
//
// A cable keeps its force T whatever its length and adds (T/L)(I − ttᵀ) to the
// tangent; where a stiffness is given it also stretches, EA/L₀·ttᵀ. Fabric of
// prescribed stress keeps its true stress: for equal warp and weft that is
// σ times the second derivative of area. Elastic fabric follows its law. Dead
// loads and weights do not change, pressure follows the surface; air of given
// volume keeps its volume. A force density is never taken as one: the matrix of
// force densities, and that of any fixed reference, is positive definite for
// every field of tension and would pass the unstable catenoid.
//
// The energy's second derivative at an equilibrium is a quadratic form on all
// motions; looking at it on the shape-changing ones (see freedoms) leaves out
// only motions within the surface or along a line, under which a prescribed
// stress does no work to second order either.
//
// # The proof
//
// When every element is in tension, no stress of fabric is prescribed and no
// pressure acts, the energy ΣT·L + elastic energy − loads is convex: a length
// is a convex function of its ends (its second derivative (I − ttᵀ)/L has no
// negative eigenvalue), elastic elements in tension add a square and their
// stress times a positive form, dead loads are linear. No disturbance can then
// lower it: no unstable direction exists, for nets of any size, without
// factorising anything. Otherwise the number of negative eigenvalues of
// K + δM is counted from a factorisation (Sylvester's law of inertia), with δ
// a hundred-thousand-millionth of the mean stiffness: |λ| below it is no
// stiffness at all, and said so.
//
// A cable of common force that follows its length (given length, or elastic
// and sliding) adds g·gᵀ/c with g the change of its length and c its
// compliance. It enters as one more unknown, its force: the matrix [K g; gᵀ −c]
// has exactly one more negative eigenvalue than K + g·gᵀ/c (Schur complement),
// and stays sparse.
//
// The tangent of unequal warp and weft need not be symmetric; its symmetric
// part is judged (Hill's criterion): no negative eigenvalue proves stability,
// a negative one means that some disturbance finds no resistance.
func Stability(ctx context.Context, s *canopy.Structure, f *canopy.Form, o Options) (StabilityResult, error) {
	if err := fits(s, f); err != nil {
		return StabilityResult{}, err
	}
	return stability(ctx, newCase(s, f), o.withDefaults())
}

func stability(ctx context.Context, c *audited, o Options) (StabilityResult, error) {
	res := StabilityResult{Eigenvalue: math.NaN(), Firmness: math.NaN(), Node: -1}
	res.Convex = c.convex()
	if res.Convex {
		res.Known = true
		free := 0
		for i := range c.x {
			if c.s.MasterOf(i) < 0 {
				for d := range 3 {
					if freeOf(c.s, i).Has(d) {
						free++
					}
				}
			}
		}
		if free > o.ConvexUnknowns {
			res.Unknowns = free
			res.Loose = c.looseNodes()
			res.Note = fmt.Sprintf("no direction can be unstable: everything is in tension and no fabric stress is prescribed; how firmly the shape sits is not computed beyond %d unknowns", o.ConvexUnknowns)
			return res, nil
		}
	}
	d, err := c.findFreedoms(ctx)
	if err != nil {
		return res, err
	}
	res.Unknowns = d.unknowns()
	if d.unknowns() == 0 {
		res.Known = true
		res.Note = "no node is free to move"
		return res, nil
	}
	k := c.buildTangent(d)
	if err := ctx.Err(); err != nil {
		return res, err
	}
	if !k.finite() {
		res.Known = false
		res.Note = "not judged: the tangent is not finite"
		return res, nil
	}
	res.Loose = k.loosen(d)
	sol, err := newSpectrum(ctx, k, o)
	var budget *sparse.BudgetError
	if errors.As(err, &budget) {
		if res.Convex {
			res.Note = "no direction can be unstable: everything is in tension and no fabric stress is prescribed; how firmly the shape sits is not computed: " + budget.Error()
			return res, nil
		}
		res.Note = "not judged: " + budget.Error()
		return res, nil
	}
	if err != nil {
		return res, err
	}
	size2 := c.diameter2()
	delta := 1e-11 * k.meanStiffness()
	res.Threshold = delta * size2
	neg, ok, err := sol.below(ctx, -delta)
	if err != nil {
		return res, err
	}
	if !ok {
		if res.Convex {
			res.Note = "no direction can be unstable: everything is in tension and no fabric stress is prescribed; the tangent is too nearly singular to say how firmly the shape sits"
			return res, nil
		}
		res.Note = "not judged: the tangent is singular to working precision"
		return res, nil
	}
	res.Known = true
	res.Unstable = neg
	if res.Convex {
		res.Unstable = 0 // proved; anything else would be rounding
	}
	lambda, mode, ok, err := sol.smallest(ctx, delta, neg > 0)
	if err != nil {
		return res, err
	}
	if !ok {
		res.Note = "the smallest eigenvalue was not found"
		return res, nil
	}
	res.Eigenvalue, res.Firmness = lambda, lambda*size2
	res.Mode, res.Node = d.motion(c.s, mode)
	return res, nil
}

// diameter2 is the square of twice the largest distance of a node from the
// centroid of the tension.
func (c *audited) diameter2() float64 {
	w := make([]float64, len(c.x))
	for k, e := range c.s.Ends {
		m := math.Abs(c.f.Force[k]) * c.length[k] / 4
		w[e[0]] += m
		w[e[1]] += m
	}
	for t, t3 := range c.s.Corners {
		a, _ := surface.AreaNormal(c.x[t3[0]], c.x[t3[1]], c.x[t3[2]])
		m := a * (math.Abs(c.f.Stress[t].Warp) + math.Abs(c.f.Stress[t].Weft)) / 6
		for _, i := range t3 {
			w[i] += m
		}
	}
	var sum r3.Vec
	var total, far float64
	for i, m := range w {
		sum = r3.Add(sum, r3.Scale(m, c.arm(c.x[i])))
		total += m
	}
	if total > 0 {
		sum = r3.Scale(1/total, sum)
	}
	for i := range c.x {
		if w[i] > 0 {
			far = max(far, r3.Norm2(r3.Sub(c.arm(c.x[i]), sum)))
		}
	}
	return 4 * far
}

// convex reports whether the energy is convex by construction.
func (c *audited) convex() bool {
	s := c.s
	for t, t3 := range s.Corners {
		fab := &s.Fabrics[s.FabricOf[t]]
		moves := false
		for _, i := range t3 {
			moves = moves || c.moves(i)
		}
		if !moves {
			continue
		}
		st := c.f.Stress[t]
		if !fab.Elastic || fab.Pressure != 0 || !tensile([3]float64{st.Warp, st.Weft, st.Shear}) {
			return false
		}
	}
	for k, e := range s.Ends {
		if c.f.Force[k] < 0 && (c.moves(e[0]) || c.moves(e[1])) {
			return false
		}
	}
	return true
}

// moves reports whether node i can move at all.
func (c *audited) moves(i int32) bool {
	if m := c.s.MasterOf(int(i)); m >= 0 {
		return freeOf(c.s, int(m))&freeOf(c.s, int(i)) != 0
	}
	return freeOf(c.s, int(i)) != 0
}

// looseNodes lists free nodes at which nothing at all resists in some free
// direction, other than sliding along a straight line: nodes whose own block
// of the tangent vanishes. It is the cheap stand-in for the spectrum of large
// nets.
func (c *audited) looseNodes() []int32 {
	n := len(c.x)
	stiff := make([]float64, n)
	for k, e := range c.s.Ends {
		a, b := c.memberStiffness(k)
		for _, i := range e {
			stiff[i] += a + b
		}
	}
	for t, t3 := range c.s.Corners {
		for _, i := range t3 {
			stiff[i] += math.Abs(c.f.Stress[t].Warp) + math.Abs(c.f.Stress[t].Weft)
		}
	}
	for i, m := range c.s.Master {
		if m >= 0 {
			stiff[m] += stiff[i]
		}
	}
	most := 0.0
	for _, v := range stiff {
		most = max(most, v)
	}
	var out []int32
	for i := range n {
		if c.s.MasterOf(i) < 0 && freeOf(c.s, i) != 0 && stiff[i] <= 1e-13*most && c.meet[i] > 0 {
			out = append(out, int32(i))
		}
	}
	return out
}

// loosen takes out unknowns that nothing resists, so that what is left can be
// factorised, and lists their nodes.
func (k *tangent) loosen(d *freedoms) []int32 {
	size := append([]float64(nil), k.diag...)
	for i := range size {
		size[i] = math.Abs(size[i])
	}
	for i, p := range k.pairs {
		v := math.Abs(k.off[i])
		size[p[0]] = max(size[p[0]], v)
		size[p[1]] = max(size[p[1]], v)
	}
	for _, cb := range k.cables {
		if cb.compliance == 0 {
			continue // a volume holds no node by itself
		}
		for _, g := range cb.g {
			size[g.unknown] = max(size[g.unknown], g.value*g.value/cb.compliance)
		}
	}
	most, heavy := 0.0, 0.0
	for i, v := range size {
		most = max(most, v)
		heavy = max(heavy, k.mass[i])
	}
	loose := make([]bool, k.n)
	var out []int32
	for i, v := range size {
		if v <= 1e-13*most {
			loose[i] = true
			k.diag[i], k.mass[i] = max(most, 1), 0
			if m := d.node[i]; len(out) == 0 || out[len(out)-1] != m {
				out = append(out, m)
			}
		}
	}
	if heavy == 0 {
		heavy = 1
	}
	for i, m := range k.mass {
		if m < 1e-9*heavy && !loose[i] {
			k.mass[i] = 1e-9 * heavy
		}
	}
	for i, p := range k.pairs {
		if loose[p[0]] || loose[p[1]] {
			k.off[i] = 0
		}
	}
	return out
}

// finite reports whether the tangent can be factorised at all.
func (k *tangent) finite() bool {
	sum := 0.0 // of products with zero: zero, or not a number
	for i, v := range k.diag {
		sum += 0*v + 0*k.mass[i]
	}
	for _, v := range k.off {
		sum += 0 * v
	}
	for _, cb := range k.cables {
		sum += 0 * cb.compliance
		for _, g := range cb.g {
			sum += 0 * g.value
		}
	}
	return sum == 0
}

// meanStiffness is the mean of the diagonal over the mean mass, 1/m².
func (k *tangent) meanStiffness() float64 {
	var a, b float64
	for i, m := range k.mass {
		if m > 0 {
			a += math.Abs(k.diag[i])
			b += m
		}
	}
	if b == 0 {
		return 0
	}
	return a / b
}

// motion turns a mode into the motion of every node, largest 1.
func (d *freedoms) motion(s *canopy.Structure, u []float64) ([]r3.Vec, int32) {
	v := make([]r3.Vec, len(d.first)-1)
	at, most := int32(-1), 0.0
	buf := make([]share, 0, 3)
	for i := range v {
		for _, h := range d.at(s, int32(i), buf) {
			v[i] = r3.Add(v[i], r3.Scale(u[h.unknown], h.dir))
		}
		if l := norm(v[i]); l > most*(1+1e-9) { // the first of equals, whatever the rounding
			at, most = int32(i), l
		}
	}
	if most > 0 {
		for i := range v {
			v[i] = r3.Scale(1/most, v[i])
		}
	}
	return v, at
}

// judgeStability writes the result into the audit.
func (c *audited) judgeStability(a *canopy.Audit, r StabilityResult, why *reasons) {
	a.StabilityKnown, a.Unstable, a.StabilityNote = r.Known, r.Unstable, r.Note
	a.Softest, a.SoftestNode = r.Firmness, r.Node
	where := func() string {
		if r.Node < 0 {
			return ""
		}
		return fmt.Sprintf("; the shape would run away at node %s along (%.2f, %.2f, %.2f)", c.s.NodeName.At(int(r.Node)), r.Mode[r.Node].X, r.Mode[r.Node].Y, r.Mode[r.Node].Z)
	}
	switch {
	case r.Unstable == 1:
		why.add("the equilibrium is unstable in one direction%s", where())
	case r.Unstable > 1:
		why.add("the equilibrium is unstable in %d directions%s", r.Unstable, where())
	case !r.Known:
		why.add("stability is not known: %s", r.Note)
	case len(r.Loose) > 0:
		why.add("nothing holds node %s in some direction (%d nodes in all)", c.s.NodeName.At(int(r.Loose[0])), len(r.Loose))
	case !math.IsNaN(r.Firmness) && r.Firmness <= r.Threshold && r.Convex:
		// Members turn nowhere in this motion, they only change their
		// length. Real ones resist that; these have no stiffness given.
		a.StabilityNote = fmt.Sprintf("the prestress alone does not hold node %s along (%.2f, %.2f, %.2f): only the stretching of cables does, whose stiffness is not given",
			c.s.NodeName.At(int(r.Node)), r.Mode[r.Node].X, r.Mode[r.Node].Y, r.Mode[r.Node].Z)
	case !math.IsNaN(r.Firmness) && r.Firmness <= r.Threshold:
		why.add("part of the structure has no stiffness: node %s can be moved along (%.2f, %.2f, %.2f) without resistance", c.s.NodeName.At(int(r.Node)), r.Mode[r.Node].X, r.Mode[r.Node].Y, r.Mode[r.Node].Z)
	}
}
