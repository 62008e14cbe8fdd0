package fdm

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/fdm/sparse"
)

// system is the equilibrium of one or several directions in which the same
// nodes are free, so that they share one matrix
//
//	D = Σ w (e_a − e_b)(e_a − e_b)ᵀ   over all links a–b of weight w,
//
// rows and columns of fixed nodes left out, tied nodes added to their master.
type system struct {
	axes     []int   // directions it serves: 0 = x, 1 = y, 2 = z
	n        int     // number of unknowns
	unknown  []int32 // of each node, −1 where fixed
	node     []int32 // the node each unknown belongs to
	analysis *sparse.Analysis

	cholesky, ldl *sparse.Factor // made when first needed
	factor        *sparse.Factor // that of the last factorise
	sign          float64        // factor is that of sign·D

	values []float64 // diagonal, then one entry for each link that joins two unknowns
	rhs    []float64 // n × len(axes), row by row
}

func (sys *system) directions() (d Directions) {
	for _, a := range sys.axes {
		d |= 1 << uint(a)
	}
	return d
}

// newSystems groups the directions by equal unknowns. Directions in which no
// node is free have no system.
func newSystems(n *Network) []*system {
	var systems []*system
	for axis := range 3 {
		unknown, node := numberUnknowns(n, axis)
		if len(node) == 0 {
			continue
		}
		known := slices.IndexFunc(systems, func(s *system) bool { return equal(s.unknown, unknown) })
		if known >= 0 {
			systems[known].axes = append(systems[known].axes, axis)
			continue
		}
		systems = append(systems, &system{axes: []int{axis}, n: len(node), unknown: unknown, node: node})
	}
	return systems
}

// numberUnknowns numbers the nodes that move by themselves along axis, and
// gives tied nodes the number of the node they follow.
func numberUnknowns(n *Network, axis int) (unknown, node []int32) {
	count := len(n.Position)
	const later = -2
	unknown = make([]int32, count)
	for i := range count {
		switch {
		case n.Fixed[i].Has(axis):
			unknown[i] = -1
		case n.Master != nil && n.Master[i] >= 0:
			unknown[i] = later
		default:
			unknown[i] = int32(len(node))
			node = append(node, int32(i))
		}
	}
	if n.Master == nil {
		return unknown, node
	}
	// checkMasters has seen to it that the chains end.
	for i := range unknown {
		end := int32(i)
		for unknown[end] == later {
			end = n.Master[end]
		}
		for j, next := int32(i), int32(0); unknown[j] == later; j = next {
			next = n.Master[j]
			unknown[j] = unknown[end]
		}
	}
	return unknown, node
}

// analyse plans the elimination once.
func (sys *system) analyse(ctx context.Context, links [][2]int32) error {
	entries := 0
	for _, l := range links {
		a, b := sys.unknown[l[0]], sys.unknown[l[1]]
		if a >= 0 && b >= 0 && a != b {
			entries++
		}
	}
	pairs := make([][2]int32, 0, entries)
	for _, l := range links {
		a, b := sys.unknown[l[0]], sys.unknown[l[1]]
		if a >= 0 && b >= 0 && a != b {
			pairs = append(pairs, [2]int32{a, b})
		}
	}
	var err error
	sys.analysis, err = sparse.Analyze(ctx, sys.n, pairs, sparse.Options{})
	if err != nil {
		return fmt.Errorf("fdm: %w", err)
	}
	sys.values = make([]float64, sys.n+entries)
	sys.rhs = make([]float64, sys.n*len(sys.axes))
	return nil
}

// assemble fills values with sign·D.
func (sys *system) assemble(links [][2]int32, weight []float64) {
	diag, entry := sys.values[:sys.n], sys.values[sys.n:]
	clear(diag)
	unknown := sys.unknown
	k := 0
	for i, l := range links {
		a, b := unknown[l[0]], unknown[l[1]]
		w := sys.sign * weight[i]
		switch {
		case a == b: // both fixed, or tied to one master
		case a < 0:
			diag[b] += w
		case b < 0:
			diag[a] += w
		default:
			diag[a] += w
			diag[b] += w
			entry[k] = -w
			k++
		}
	}
}

// signs tells what kind of factorisation a set of weights allows.
type signs uint8

const (
	pulling signs = iota // D is positive semidefinite by construction
	pushing              // −D is
	mixed                // neither
	idle                 // all weights are zero
)

// and is what two sets of links allow together.
func (s signs) and(t signs) signs {
	switch {
	case s == idle:
		return t
	case t == idle || s == t:
		return s
	}
	return mixed
}

// factorise assembles and factorises D. Unless the weights are of mixed sign
// only rounding can make a supported system fail; wide says that the weights
// differ so much in size that it may.
func (sys *system) factorise(ctx context.Context, links [][2]int32, weight []float64, kind signs, wide bool) error {
	var err error
	sys.sign = 1
	if kind == pushing {
		sys.sign = -1
	}
	if kind == mixed {
		if sys.ldl == nil {
			if sys.ldl, err = sys.analysis.NewFactor(sparse.LDL); err != nil {
				return fmt.Errorf("fdm: %w", err)
			}
		}
		sys.factor = sys.ldl
	} else {
		if sys.cholesky == nil {
			if sys.cholesky, err = sys.analysis.NewFactor(sparse.Cholesky); err != nil {
				return fmt.Errorf("fdm: %w", err)
			}
		}
		sys.factor = sys.cholesky
	}
	sys.assemble(links, weight)
	err = sys.factor.Refactor(ctx, sys.values)
	if err != nil {
		return sys.refused(ctx, err, kind)
	}
	if kind == mixed {
		return sys.checkRegular(links, weight, 1e-13, Cancel)
	}
	if wide {
		return sys.checkRegular(links, weight, 1e-15, Weak)
	}
	return nil
}

// refused says what an error of the factorisation means here.
func (sys *system) refused(ctx context.Context, err error, kind signs) error {
	if ctx.Err() != nil {
		return ctx.Err()
	}
	var pivot *sparse.PivotError
	if !errors.As(err, &pivot) {
		return fmt.Errorf("fdm: %w", err)
	}
	cause := Weak
	if kind == mixed {
		cause = Cancel
	}
	return &SingularError{Nodes: []int32{sys.node[pivot.Unknown]}, Directions: sys.directions(), Cause: cause}
}

// checkRegular looks for a displacement that D does not resist. Three steps of
// inverse iteration on S·D·S, S the inverse roots of the sums of |w| around each
// node, find the vector v nearest to that; the system counts as singular when
// ‖S·D·S·v‖ ≤ limit·‖v‖ (the norm of S·D·S is at most 2). D·v is formed from the
// links, not from the factor, since a factorisation may have replaced tiny
// pivots.
func (sys *system) checkRegular(links [][2]int32, weight []float64, limit float64, cause Cause) error {
	const steps = 3
	n := sys.n
	scale := make([]float64, n)
	for i, l := range links {
		a, b := sys.unknown[l[0]], sys.unknown[l[1]]
		if a == b {
			continue
		}
		if a >= 0 {
			scale[a] += math.Abs(weight[i])
		}
		if b >= 0 {
			scale[b] += math.Abs(weight[i])
		}
	}
	for i, s := range scale {
		scale[i] = 1 / math.Sqrt(s) // s > 0: every unknown has an active link, see checkSupport
	}
	v := make([]float64, n)
	state := uint64(0x9e3779b97f4a7c15)
	for i := range v {
		// A fixed pseudo-random start (xorshift, Marsaglia 2003).
		state ^= state << 13
		state ^= state >> 7
		state ^= state << 17
		v[i] = 0.5 + float64(state>>11)/(1<<53)
		if state&1 == 0 {
			v[i] = -v[i]
		}
	}
	z := make([]float64, n)
	for range steps {
		norm := norm2(v)
		for i := range v {
			z[i] = v[i] / norm / scale[i]
		}
		if err := sys.factor.Solve(z, 1); err != nil {
			break // not finite: as singular as can be
		}
		for i := range z {
			z[i] /= scale[i]
		}
		if grown := norm2(z); !finite(grown) {
			break
		}
		v, z = z, v
	}
	for i := range v {
		v[i] *= scale[i]
	}
	resist := func() float64 { // ‖S·D·v‖/‖S⁻¹·v‖, and D·v in z
		sys.apply(z, v, links, weight)
		var have, size float64
		for i := range z {
			have = math.Hypot(have, z[i]*scale[i])
			size = math.Hypot(size, v[i]/scale[i])
		}
		return have / size
	}
	left := resist()
	// Where pivots were replaced v is the softest displacement of a nearby
	// matrix; v − M⁻¹·D·v has what D does not resist in it unchanged, and less
	// of all the rest.
	for round := 0; round < 2 && left > limit && sys.factor.Perturbed() > 0; round++ {
		if sys.factor.Solve(z, 1) != nil {
			break
		}
		for i := range v {
			v[i] -= sys.sign * z[i]
		}
		if norm := norm2(v); norm == 0 || !finite(norm) {
			return nil
		}
		left = resist()
	}
	if !(left <= limit) {
		return nil
	}
	return &SingularError{Nodes: sys.movers(v), Directions: sys.directions(), Cause: cause}
}

// apply does z = D·v for one direction.
func (sys *system) apply(z, v []float64, links [][2]int32, weight []float64) {
	clear(z)
	for i, l := range links {
		a, b := sys.unknown[l[0]], sys.unknown[l[1]]
		if a == b {
			continue
		}
		var va, vb float64
		if a >= 0 {
			va = v[a]
		}
		if b >= 0 {
			vb = v[b]
		}
		f := weight[i] * (va - vb)
		if a >= 0 {
			z[a] += f
		}
		if b >= 0 {
			z[b] -= f
		}
	}
}

// movers are the nodes that move most in the displacement v, worst first.
func (sys *system) movers(v []float64) []int32 {
	const most = 32
	largest := 0.0
	for _, x := range v {
		largest = max(largest, math.Abs(x))
	}
	var at []int
	for i, x := range v {
		if math.Abs(x) >= 0.1*largest {
			at = append(at, i)
		}
	}
	slices.SortStableFunc(at, func(i, j int) int {
		switch a, b := math.Abs(v[i]), math.Abs(v[j]); {
		case a > b*(1+1e-6):
			return -1
		case b > a*(1+1e-6):
			return 1
		}
		return i - j
	})
	nodes := make([]int32, 0, most)
	for _, i := range at[:min(most, len(at))] {
		nodes = append(nodes, sys.node[i])
	}
	return nodes
}

// solve turns nodal forces into the displacements D⁻¹·force, along the axes of
// the system. Forces on tied nodes act on their masters; entries of move for
// nodes that are fixed are left alone.
func (sys *system) solve(force, move []r3.Vec) error {
	rhs := sys.rhs
	clear(rhs)
	if len(sys.axes) == 3 {
		for i, u := range sys.unknown {
			if u >= 0 {
				b := rhs[3*u : 3*u+3]
				b[0] += force[i].X
				b[1] += force[i].Y
				b[2] += force[i].Z
			}
		}
	} else {
		k := len(sys.axes)
		for i, u := range sys.unknown {
			if u >= 0 {
				for c, axis := range sys.axes {
					rhs[int(u)*k+c] += *at(&force[i], axis)
				}
			}
		}
	}
	if err := sys.factor.Solve(rhs, len(sys.axes)); err != nil {
		return fmt.Errorf("fdm: %w", err)
	}
	k := len(sys.axes)
	for i, u := range sys.unknown {
		if u >= 0 {
			for c, axis := range sys.axes {
				*at(&move[i], axis) = sys.sign * rhs[int(u)*k+c]
			}
		}
	}
	return nil
}

// at is component axis of v.
func at(v *r3.Vec, axis int) *float64 {
	switch axis {
	case 0:
		return &v.X
	case 1:
		return &v.Y
	}
	return &v.Z
}

// norm2 is the Euclidean norm, safe from overflow.
func norm2(v []float64) float64 {
	largest := 0.0
	for _, x := range v {
		largest = max(largest, math.Abs(x))
	}
	if largest == 0 || !finite(largest) {
		return largest
	}
	sum := 0.0
	for _, x := range v {
		sum += (x / largest) * (x / largest)
	}
	return largest * math.Sqrt(sum)
}
