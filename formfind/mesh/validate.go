package mesh

import (
	"fmt"
	"math"

	"anticlast/formfind/canopy"
	"gonum.org/v1/gonum/spatial/r3"
)

// maxErrors is how many faults of a listed structure are told.
const maxErrors = 20

// Validate checks that the arrays of s fit together: lengths, indices, finite
// numbers, members with length and triangles with area. The error is an
// [Errors] with the first faults found.
func Validate(s *canopy.Structure) error {
	v := validator{s: s}
	v.lengths()
	if len(v.errs) == 0 {
		v.nodes()
		v.members()
		v.triangles()
		v.groups()
	}
	return v.errs.err()
}

type validator struct {
	s    *canopy.Structure
	errs Errors
}

func (v *validator) fail(part, name string, r Reason, wayOut, format string, args ...any) {
	if len(v.errs) < maxErrors {
		v.errs = append(v.errs, &Error{Part: part, Name: name, Reason: r, Problem: fmt.Sprintf(format, args...), WayOut: wayOut})
	}
}

func (v *validator) full() bool { return len(v.errs) >= maxErrors }

func (v *validator) lengths() {
	s := v.s
	nodes, members, triangles := len(s.Position), len(s.Ends), len(s.Corners)
	if nodes == 0 {
		v.fail("", "", Missing, "draw points and edges, or list nodes", "the model has no nodes")
	}
	if members+triangles == 0 {
		v.fail("", "", Missing, "add edges and fabrics, or list members or triangles", "the model has no members and no triangles")
	}
	for _, c := range []struct {
		name      string
		got, want int
		optional  bool
	}{
		{"supports", len(s.Fixed), nodes, false},
		{"held directions", len(s.Held), nodes, true},
		{"loads", len(s.Load), nodes, true},
		{"masters", len(s.Master), nodes, true},
		{"node names", s.NodeName.Len(), nodes, true},
		{"curves of nodes", len(s.OnCurve), nodes, true},
		{"curve parameters", len(s.Param), len(s.OnCurve), false},
		{"kinds", len(s.Kind), members, false},
		{"laws", len(s.Law), members, false},
		{"given values", len(s.Given), members, false},
		{"stiffnesses", len(s.Stiffness), members, true},
		{"unstressed lengths", len(s.Unstressed), members, true},
		{"weights", len(s.Weight), members, true},
		{"strengths", len(s.Strength), members, true},
		{"groups", len(s.Group), members, true},
		{"member names", s.MemberName.Len(), members, true},
		{"cables of members", len(s.CableOf), members, true},
		{"fabrics of triangles", len(s.FabricOf), triangles, false},
		{"warp directions", len(s.Warp), triangles, false},
		{"stresses", len(s.Stress), triangles, false},
		{"reference positions", len(s.Reference), nodes, true},
	} {
		if c.got != c.want && !(c.optional && c.got == 0) {
			v.fail("", "", Mismatch, "", "%d %s do not go with %d", c.got, c.name, c.want)
		}
	}
}

func finite(v r3.Vec) bool {
	return !math.IsNaN(v.X-v.X) && !math.IsNaN(v.Y-v.Y) && !math.IsNaN(v.Z-v.Z)
}

func (v *validator) nodes() {
	s := v.s
	n := int32(len(s.Position))
	for i, p := range s.Position {
		if v.full() {
			return
		}
		if !finite(p) || !finite(s.LoadAt(i)) {
			v.fail("node", s.NodeName.At(i), Degenerate, "give numbers", "its position or load is not finite")
		}
		if m := s.MasterOf(i); m < -1 || m >= n || int(m) == i || m >= 0 && s.MasterOf(int(m)) >= 0 {
			v.fail("node", s.NodeName.At(i), Mismatch, "tie it to the centre of a ring", "it is tied to a node that does not exist or is tied itself")
		}
		if len(s.OnCurve) > 0 && int(s.OnCurve[i]) >= len(s.Curves) {
			v.fail("node", s.NodeName.At(i), Mismatch, "", "it lies on a curve that does not exist")
		}
	}
}

func (v *validator) members() {
	s := v.s
	n := int32(len(s.Position))
	for k, e := range s.Ends {
		if v.full() {
			return
		}
		name := s.MemberName.At(k)
		switch {
		case e[0] < 0 || e[1] < 0 || e[0] >= n || e[1] >= n:
			v.fail("member", name, Missing, "end it at listed nodes", "it ends at a node that does not exist")
			continue
		case e[0] == e[1] || s.Position[e[0]] == s.Position[e[1]]:
			v.fail("member", name, Degenerate, "move one of its nodes or remove it", "it has no length: its ends are at the same place")
		}
		if g := s.Given[k]; math.IsNaN(g - g) {
			v.fail("member", name, Degenerate, "give a number", "its force or force density is not finite")
		}
		switch s.Law[k] {
		case canopy.LawForceDensity, canopy.LawForce:
		case canopy.LawElastic:
			if len(s.Stiffness) == 0 || len(s.Unstressed) == 0 || !(s.Stiffness[k] > 0) || !(s.Unstressed[k] > 0) {
				v.fail("member", name, Missing, "give both, above 0", "an elastic member needs a stiffness and an unstressed length")
			}
		case canopy.LawCable:
			if len(s.CableOf) == 0 || s.CableOf[k] < 0 {
				v.fail("member", name, Missing, "give it a force, a force density, or a stiffness and unstressed length", "nothing says what force it has")
			}
		default:
			v.fail("member", name, Mismatch, "", "its law is not known")
		}
		if len(s.CableOf) > 0 && int(s.CableOf[k]) >= len(s.Cables) {
			v.fail("member", name, Mismatch, "", "its cable does not exist")
		}
		if len(s.Group) > 0 && (s.Group[k] < 0 || int(s.Group[k]) >= len(s.Groups)) {
			v.fail("member", name, Mismatch, "", "its group does not exist")
		}
	}
}

func (v *validator) triangles() {
	s := v.s
	n := int32(len(s.Position))
	for t, c := range s.Corners {
		if v.full() {
			return
		}
		name := fmt.Sprint(t)
		if f := s.FabricOf[t]; f < 0 || int(f) >= len(s.Fabrics) {
			v.fail("triangle", name, Mismatch, "name a fabric of the model", "its fabric does not exist")
		}
		if c[0] < 0 || c[1] < 0 || c[2] < 0 || c[0] >= n || c[1] >= n || c[2] >= n {
			v.fail("triangle", name, Missing, "use listed nodes", "it has a corner that does not exist")
			continue
		}
		p, q, r := s.Position[c[0]], s.Position[c[1]], s.Position[c[2]]
		u, w := r3.Sub(q, p), r3.Sub(r, p)
		area := r3.Norm(r3.Cross(u, w))
		if !(area > 1e-9*max(r3.Norm2(u), r3.Norm2(w), r3.Norm2(r3.Sub(r, q)))) {
			v.fail("triangle", name, Degenerate, "move or remove its nodes", "it has no area: its corners lie on one line")
		}
		if w := s.Warp[t]; !finite(w) || w == (r3.Vec{}) {
			v.fail("triangle", name, NoWarp, "give one that is not zero", "it has no warp direction")
		}
		if a := s.Stress[t]; math.IsNaN(a[0]-a[0]) || math.IsNaN(a[1]-a[1]) {
			v.fail("triangle", name, Degenerate, "give numbers", "its prestress is not finite")
		}
	}
}

// groups checks cables, rings and lines.
func (v *validator) groups() {
	s := v.s
	n, m := int32(len(s.Position)), int32(len(s.Ends))
	for k, c := range s.Cables {
		if v.full() {
			return
		}
		if len(c.Members) == 0 || len(c.Nodes) != len(c.Members)+1 {
			v.fail("cable", c.Name, Mismatch, "", "it has %d members and %d nodes", len(c.Members), len(c.Nodes))
			continue
		}
		for j, i := range c.Members {
			a, b := c.Nodes[j], c.Nodes[j+1]
			if i < 0 || i >= m || a < 0 || a >= n || b < 0 || b >= n {
				v.fail("cable", c.Name, Mismatch, "", "it names a member or node that does not exist")
				break
			}
			if e := s.Ends[i]; e != [2]int32{a, b} && e != [2]int32{b, a} {
				v.fail("cable", c.Name, Mismatch, "list its members in order", "its members do not make a chain")
				break
			}
			if len(s.CableOf) > 0 && int(s.CableOf[i]) != k {
				v.fail("cable", c.Name, Mismatch, "", "member %s does not belong to it", s.MemberName.At(int(i)))
				break
			}
		}
	}
	for _, r := range s.Rings {
		if r.Centre < 0 || r.Centre >= n || len(r.Nodes) < 3 || !inside(r.Nodes, n) {
			v.fail("ring", r.Name, Mismatch, "", "it names nodes that do not exist or has fewer than three")
		}
	}
	for _, l := range s.Lines {
		if !inside(l.Nodes, n) {
			v.fail("edge", l.Name, Mismatch, "", "it names nodes that do not exist")
		}
	}
}

func inside(list []int32, n int32) bool {
	for _, i := range list {
		if i < 0 || i >= n {
			return false
		}
	}
	return true
}
