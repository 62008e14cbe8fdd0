package mesh

import (
	"errors"
	"fmt"

	"anticlast/formfind/canopy"
	"gonum.org/v1/gonum/spatial/r3"
)

// maxErrors is how many faults of a structure are told.
const maxErrors = 20

// Validate checks that s can be solved as a mesh: that its arrays fit together
// (canopy.Structure.Validate), that it has something in it, that its members
// have length and its triangles area, and that the members of cables make
// chains. The error is an [Errors] with the first faults found.
func Validate(s *canopy.Structure) error {
	v := validator{s: s}
	if len(s.Ends)+len(s.Corners) == 0 {
		v.fail("", "", Missing, "add edges and fabrics, or list members or triangles", "the model has no members and no triangles")
		return v.errs.err()
	}
	if err := s.Validate(); err != nil {
		list := []error{err}
		if j, ok := err.(interface{ Unwrap() []error }); ok {
			list = j.Unwrap()
		}
		for _, e := range list {
			v.errs = append(v.errs, &Error{Reason: Mismatch, Problem: e.Error()})
		}
		return v.errs.err()
	}
	v.members()
	v.triangles()
	v.chains()
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

func (v *validator) members() {
	s := v.s
	for k, e := range s.Ends {
		if s.Position[e[0]] == s.Position[e[1]] {
			v.fail("member", s.MemberName.At(k), Degenerate, "move one of its nodes or remove it",
				"it has no length: nodes %s and %s are at the same place", s.NodeName.At(int(e[0])), s.NodeName.At(int(e[1])))
		}
	}
}

func (v *validator) triangles() {
	s := v.s
	for t, c := range s.Corners {
		if !hasArea(s.Position[c[0]], s.Position[c[1]], s.Position[c[2]]) {
			v.fail("triangle", fmt.Sprint(t), Degenerate, "move or remove its nodes", "it has no area: its corners %s, %s and %s lie on one line",
				s.NodeName.At(int(c[0])), s.NodeName.At(int(c[1])), s.NodeName.At(int(c[2])))
		}
	}
}

// hasArea reports whether a triangle is more than a line.
func hasArea(p, q, r r3.Vec) bool {
	u, w := r3.Sub(q, p), r3.Sub(r, p)
	return r3.Norm(r3.Cross(u, w)) > 1e-9*max(r3.Norm2(u), r3.Norm2(w), r3.Norm2(r3.Sub(r, q)))
}

// chains checks cables and rings.
func (v *validator) chains() {
	s := v.s
	for k, c := range s.Cables {
		for j, i := range c.Members {
			a, b := c.Nodes[j], c.Nodes[j+1]
			if e := s.Ends[i]; e != [2]int32{a, b} && e != [2]int32{b, a} {
				v.fail("cable", c.Name, Mismatch, "list its members in order", "its members do not make a chain")
				break
			}
			if s.CableOf != nil && int(s.CableOf[i]) != k {
				v.fail("cable", c.Name, Mismatch, "let each member belong to one cable", "member %s does not belong to it", s.MemberName.At(int(i)))
				break
			}
		}
	}
	for _, r := range s.Rings {
		if len(r.Nodes) < 3 {
			v.fail("ring", r.Name, Degenerate, "give it at least three", "it has %d nodes", len(r.Nodes))
		}
	}
}

// AsErrors returns the single errors in err, nil when it is not an [Errors].
func AsErrors(err error) Errors {
	var list Errors
	if errors.As(err, &list) {
		return list
	}
	return nil
}
