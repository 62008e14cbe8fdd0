package newton

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/element"
)

// class says which directions of a node are unknown.
type class uint8

const (
	still  class = iota // none: fixed, or nothing is attached
	normal              // the normal of its triangles
	across              // the directions across a line
	axes                // all free directions
	tied                // those of its ring's centre
)

// line is where the direction of an across node comes from: the nodes before
// and after it.
type line struct{ before, after int32 }

// classify decides the class of every node and, for across nodes, its line.
// at are positions, used only to tell a line that runs through from a corner
// where cables are not named.
func (v *Solver) classify(at []r3.Vec, all bool) ([]class, map[int32]line, error) {
	s := v.s
	n := len(s.Position)
	cls := make([]class, n)
	lines := map[int32]line{}
	for i := range n {
		if s.MasterOf(i) >= 0 {
			cls[i] = tied
			continue
		}
		f := s.FixedAt(i)
		if f == canopy.DirAll {
			continue
		}
		members := v.membersAt(int32(i))
		film := v.filmAt[i]
		switch {
		case v.hasTied[i]:
			cls[i] = axes
		case len(members) == 0 && !film:
			// nothing attached
		case all:
			cls[i] = axes
		case len(members) == 0:
			switch seam := v.seamAt[int32(i)]; len(seam) {
			case 0:
				cls[i] = normal
			case 2:
				cls[i] = across
				lines[int32(i)] = line{seam[0], seam[1]}
			default:
				cls[i] = axes
			}
		case len(members) == 2 && v.throughLine(int32(i), members, at) && (film || v.unloaded(int32(i))):
			cls[i] = across
			lines[int32(i)] = line{v.otherEnd(members[0], int32(i)), v.otherEnd(members[1], int32(i))}
		default:
			cls[i] = axes
		}
	}
	if !all {
		for _, e := range v.openEdges {
			i, j := e[0], e[1]
			if cls[i] != normal || cls[j] != normal || s.FixedAt(int(i)) != 0 || s.FixedAt(int(j)) != 0 {
				continue
			}
			return nil, nil, &FreeEdgeError{Nodes: e, Names: [2]string{s.NodeName.At(int(i)), s.NodeName.At(int(j))}}
		}
	}
	return cls, lines, nil
}

// throughLine reports whether the two members at node i are one line without
// stiffness along itself.
func (v *Solver) throughLine(i int32, members []int32, at []r3.Vec) bool {
	s := v.s
	a, b := members[0], members[1]
	stiff := func(m int32) bool { return s.Law[m] == canopy.LawElastic || s.Law[m] == canopy.LawForceDensity }
	if stiff(a) || stiff(b) {
		return false
	}
	if s.CableOf != nil && s.CableOf[a] >= 0 && s.CableOf[a] == s.CableOf[b] {
		return true
	}
	ta, _, oka := element.Line(at[v.otherEnd(a, i)], at[i])
	tb, _, okb := element.Line(at[i], at[v.otherEnd(b, i)])
	return oka && okb && r3.Dot(ta, tb) > 0.5
}

func (v *Solver) unloaded(i int32) bool {
	if v.s.LoadAt(int(i)) != (r3.Vec{}) {
		return false
	}
	if v.s.SelfWeight && v.s.Weight != nil {
		for _, m := range v.membersAt(i) {
			if v.s.Weight[m] != 0 {
				return false
			}
		}
	}
	return true
}

func (v *Solver) otherEnd(m, i int32) int32 {
	e := v.s.Ends[m]
	if e[0] == i {
		return e[1]
	}
	return e[0]
}

// free are the unit vectors of the directions in which node i is free.
func free(f canopy.Freedom) []r3.Vec {
	out := make([]r3.Vec, 0, 3)
	for d, e := range [3]r3.Vec{{X: 1}, {Y: 1}, {Z: 1}} {
		if !f.Has(d) {
			out = append(out, e)
		}
	}
	return out
}

// mask removes the directions of f from d.
func mask(f canopy.Freedom, d r3.Vec) r3.Vec {
	if f.Has(0) {
		d.X = 0
	}
	if f.Has(1) {
		d.Y = 0
	}
	if f.Has(2) {
		d.Z = 0
	}
	return d
}

// tangentOf is the direction of the line at node i.
func tangentOf(l line, i int32, at []r3.Vec) r3.Vec {
	a, _, _ := element.Line(at[l.before], at[i])
	b, _, _ := element.Line(at[i], at[l.after])
	t := r3.Add(a, b)
	if n := norm(t); n > 1e-9 {
		return r3.Scale(1/n, t)
	}
	return r3.Vec{}
}

// countDirections is the number of unknowns of node i.
func (v *Solver) countDirections(i int32, at []r3.Vec) int {
	f := v.s.FixedAt(int(i))
	n := len(free(f))
	switch v.cls[i] {
	case normal:
		return 1
	case across:
		t := mask(f, tangentOf(v.lines[i], i, at))
		if r3.Dot(t, t) > 0.5 {
			return n - 1
		}
		return n
	case axes:
		return n
	}
	return 0
}

// refreshBasis computes the directions of the nodes lo to hi at the positions at,
// from the vector areas at the nodes in v.normalSum.
// A direction that does not exist there (say, the normal of a node that may
// only move along its fabric) is zero; assembly then keeps the node in place.
func (v *Solver) refreshBasis(at []r3.Vec, basis []r3.Vec, lo, hi int) {
	s := v.s
	for i := lo; i < hi; i++ {
		b := basis[v.start[i]:v.start[i+1]]
		switch v.cls[i] {
		case normal:
			a := v.normalSum[i]
			p := mask(s.FixedAt(i), a)
			if l := norm(p); l > 1e-3*norm(a) && l > 0 {
				b[0] = r3.Scale(1/l, p)
			} else {
				b[0] = r3.Vec{}
			}
		case across:
			f := s.FixedAt(i)
			t := mask(f, tangentOf(v.lines[int32(i)], int32(i), at))
			if f == 0 {
				b[0], b[1] = perpendicular(t)
				continue
			}
			e := free(f)
			if len(b) == len(e) {
				copy(b, e)
				continue
			}
			// One fewer than free: those across t.
			switch len(e) {
			case 2:
				d := r3.Sub(r3.Scale(r3.Dot(t, e[1]), e[0]), r3.Scale(r3.Dot(t, e[0]), e[1]))
				if l := norm(d); l > 0 {
					b[0] = r3.Scale(1/l, d)
				} else {
					b[0] = e[0]
				}
			}
		case axes:
			copy(b, free(s.FixedAt(i)))
		case tied:
			for k, d := range free(s.FixedAt(int(s.MasterOf(i)))) {
				b[k] = mask(s.FixedAt(i), d)
			}
		}
	}
}

// norm is the length of a. (The library's guards against overflow, at several
// times the cost; sizes here are far from it.)
func norm(a r3.Vec) float64 { return math.Sqrt(a.X*a.X + a.Y*a.Y + a.Z*a.Z) }

// perpendicular returns two unit vectors normal to the unit vector t and to
// each other, without branches that depend on anything but t.
func perpendicular(t r3.Vec) (a, b r3.Vec) {
	if t == (r3.Vec{}) {
		return r3.Vec{X: 1}, r3.Vec{Y: 1}
	}
	var e r3.Vec
	x, y, z := math.Abs(t.X), math.Abs(t.Y), math.Abs(t.Z)
	switch {
	case x <= y && x <= z:
		e = r3.Vec{X: 1}
	case y <= z:
		e = r3.Vec{Y: 1}
	default:
		e = r3.Vec{Z: 1}
	}
	a = r3.Sub(e, r3.Scale(r3.Dot(e, t), t))
	a = r3.Scale(1/norm(a), a)
	return a, r3.Cross(t, a)
}
