package relax

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// mode says in which directions a node relaxes, among those in which it is free.
type mode uint8

const (
	still  mode = iota // does not move by itself
	every              // all directions
	normal             // along the normal of the fabric
	across             // at right angles to the line of cable or boundary through it
)

// lineEnds are the neighbours of a node along the line through it.
type lineEnds struct {
	node     int32
	from, to int32
}

// chooseDirections finds the shape-changing directions. A fabric of given
// stress does not resist sliding in itself, nor does a cable of given force
// along itself: nodes that relax in those directions wander until triangles
// collapse, without changing the shape. A fabric node inside is left its
// normal, a node on one line of constant force the plane across it, all others
// all directions.
func (p *problem) chooseDirections(x []r3.Vec, all bool) {
	p.mode = make([]mode, p.n)
	var sides [][]int32
	if !all {
		sides = p.sides()
	}
	for i := range p.n {
		switch {
		case p.tied[i] >= 0 || p.free[i] == 0:
			p.mode[i] = still
		case all:
			p.mode[i] = every
		default:
			p.mode[i] = p.modeOf(i, sides, x)
		}
		if p.mode[i] == every && p.linkAt[i] == p.linkAt[i+1] && p.cornerAt[i] == p.cornerAt[i+1] {
			p.mode[i] = still // attached to nothing
		}
	}
}

func (p *problem) modeOf(i int, sides [][]int32, x []r3.Vec) mode {
	fabric := p.cornerAt[i+1] > p.cornerAt[i]
	for _, c := range p.around[p.cornerAt[i]:p.cornerAt[i+1]] {
		if p.triLaw[c.at>>2] >= elastic {
			return every
		}
	}
	links := p.links[p.linkAt[i]:p.linkAt[i+1]]
	// Lines through the node: members, and sides of fabric that are not shared
	// by exactly two triangles.
	var ends []int32
	for _, l := range links {
		if !slices.Contains(ends, l.other) {
			ends = append(ends, l.other)
		}
	}
	if fabric {
		for _, j := range sides[i] {
			if !slices.Contains(ends, j) {
				ends = append(ends, j)
			}
		}
	}
	if fabric && len(ends) == 0 {
		return normal
	}
	if len(ends) != 2 || len(links) == 1 || len(links) > 2 {
		return every
	}
	if len(links) == 2 && !p.slides(x, i, links[0], links[1]) {
		return every
	}
	if !fabric && (p.lead[i] != (r3.Vec{}) || p.hang != nil) {
		return every // a pulley with a load on it finds its own place
	}
	p.line = append(p.line, lineEnds{int32(i), ends[0], ends[1]})
	return across
}

// slides reports whether two members carry one given force, so that the node
// between them may be anywhere along the line: members of one cable, or
// members of the same force in about the same direction.
func (p *problem) slides(x []r3.Vec, i int, a, b link) bool {
	given := func(m int32) bool { return p.law[m] == byForce || p.law[m] == byCable }
	if !given(a.member) || !given(b.member) {
		return false
	}
	if of := p.s.CableOf; of != nil {
		if c := of[p.src[a.member]]; c >= 0 && c == of[p.src[b.member]] {
			return true
		}
	}
	t, u := p.given[a.member], p.given[b.member]
	if p.law[a.member] != byForce || p.law[b.member] != byForce || math.Abs(t-u) > 1e-6*math.Abs(t) {
		return false
	}
	return r3.Dot(unit(r3.Sub(x[i], x[a.other])), unit(r3.Sub(x[b.other], x[i]))) > 0.5
}

// sides returns for each node of fabric its neighbours along sides that are
// the border of the fabric or where three triangles and more meet.
func (p *problem) sides() [][]int32 {
	out := make([][]int32, p.n)
	var near []int32
	for i := range p.n {
		cs := p.around[p.cornerAt[i]:p.cornerAt[i+1]]
		if len(cs) == 0 || p.free[i] == 0 {
			continue
		}
		near = near[:0]
		for _, c := range cs {
			near = append(near, c.next, c.prev)
		}
		slices.Sort(near)
		for k := 0; k < len(near); {
			e := k + 1
			for e < len(near) && near[e] == near[k] {
				e++
			}
			if e-k != 2 {
				out[i] = append(out[i], near[k])
			}
			k = e
		}
	}
	return out
}

// along returns the unit direction of the line through a node, zero when it
// has none: the bisector of the two directions to its neighbours, along which
// two equal forces cancel exactly.
func along(a, i, b r3.Vec) r3.Vec {
	u, v := r3.Sub(i, a), r3.Sub(b, i)
	lu, lv := norm(u), norm(v)
	if !(lu > 0) || !(lv > 0) {
		return r3.Vec{}
	}
	return unit(r3.Add(r3.Scale(1/lu, u), r3.Scale(1/lv, v)))
}

// norm is the length of v; r3.Norm guards against overflow, at ten times the cost.
func norm(v r3.Vec) float64 { return math.Sqrt(v.X*v.X + v.Y*v.Y + v.Z*v.Z) }

// unit returns v scaled to length 1, zero for vectors that are zero or not
// finite.
func unit(v r3.Vec) r3.Vec {
	l := norm(v)
	if !(l > 0) || math.IsInf(l, 0) {
		return r3.Vec{}
	}
	return r3.Vec{X: v.X / l, Y: v.Y / l, Z: v.Z / l}
}

// masked returns the components of v in the directions d.
func masked(v r3.Vec, d canopy.Freedom) r3.Vec {
	return choose(d, v, r3.Vec{})
}
