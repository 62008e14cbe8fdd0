package canopy

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"
)

// Validate checks that the slices of s fit together, that every index is in
// range and every number finite. It returns all that is wrong, joined, up to
// a handful of each kind; engines and writers may rely on a structure that
// passes.
func (s *Structure) Validate() error {
	v := validator{}
	n, m, t := len(s.Position), len(s.Ends), len(s.Corners)
	v.length("Fixed", len(s.Fixed), n)
	v.optional("Held", len(s.Held), n)
	v.optional("Load", len(s.Load), n)
	v.optional("Master", len(s.Master), n)
	v.optional("OnCurve", len(s.OnCurve), n)
	v.optional("Param", len(s.Param), n)
	v.optional("Reference", len(s.Reference), n)
	v.length("Kind", len(s.Kind), m)
	v.length("Law", len(s.Law), m)
	v.length("Given", len(s.Given), m)
	v.optional("Stiffness", len(s.Stiffness), m)
	v.optional("Unstressed", len(s.Unstressed), m)
	v.optional("Weight", len(s.Weight), m)
	v.optional("Strength", len(s.Strength), m)
	v.optional("Group", len(s.Group), m)
	v.optional("CableOf", len(s.CableOf), m)
	v.length("FabricOf", len(s.FabricOf), t)
	v.length("Warp", len(s.Warp), t)
	v.length("Stress", len(s.Stress), t)
	if len(v.errs) > 0 {
		return errors.Join(v.errs...)
	}
	for i, p := range s.Position {
		if !finite(p) {
			v.add("position of node %s is not finite", s.NodeName.At(i))
		}
	}
	for i := range s.Load {
		if !finite(s.Load[i]) {
			v.add("load on node %s is not finite", s.NodeName.At(i))
		}
	}
	for i, j := range s.Master {
		if j < -1 || int(j) >= n || int(j) == i {
			v.add("node %s is tied to node %d, which cannot be", s.NodeName.At(i), j)
		} else if j >= 0 && s.Master[j] >= 0 {
			v.add("node %s is tied to a node that is itself tied", s.NodeName.At(i))
		}
	}
	for k, e := range s.Ends {
		for _, i := range e {
			if i < 0 || int(i) >= n {
				v.add("member %s: there is no node %d", s.MemberName.At(k), i)
			}
		}
		if e[0] == e[1] {
			v.add("member %s runs from a node to itself", s.MemberName.At(k))
		}
		if math.IsNaN(s.Given[k]) || math.IsInf(s.Given[k], 0) {
			v.add("member %s: its force or force density is not finite", s.MemberName.At(k))
		}
		if s.Law[k] == LawElastic && (s.Stiffness == nil || s.Unstressed == nil || !(s.Stiffness[k] > 0) || !(s.Unstressed[k] > 0)) {
			v.add("member %s is elastic and needs a positive stiffness and unstressed length", s.MemberName.At(k))
		}
		if s.Law[k] == LawCable && (s.CableOf == nil || s.CableOf[k] < 0) {
			v.add("member %s takes its force from a cable but belongs to none", s.MemberName.At(k))
		}
		if s.CableOf != nil && (s.CableOf[k] < -1 || int(s.CableOf[k]) >= len(s.Cables)) {
			v.add("member %s: there is no cable %d", s.MemberName.At(k), s.CableOf[k])
		}
		if s.Group != nil && (s.Group[k] < -1 || int(s.Group[k]) >= len(s.Groups)) {
			v.add("member %s: there is no group %d", s.MemberName.At(k), s.Group[k])
		}
	}
	for c := range s.Cables {
		cb := &s.Cables[c]
		for _, k := range cb.Members {
			if k < 0 || int(k) >= m {
				v.add("cable %s: there is no member %d", cb.Name, k)
			}
		}
		for _, i := range cb.Nodes {
			if i < 0 || int(i) >= n {
				v.add("cable %s: there is no node %d", cb.Name, i)
			}
		}
		if len(cb.Members) > 0 && len(cb.Nodes) != len(cb.Members)+1 {
			v.add("cable %s has %d members and %d nodes", cb.Name, len(cb.Members), len(cb.Nodes))
		}
		if cb.Law == CableElastic && !(cb.Stiffness > 0 && cb.Unstressed > 0) {
			v.add("cable %s is elastic and needs a positive stiffness and unstressed length", cb.Name)
		}
	}
	for t, c := range s.Corners {
		for _, i := range c {
			if i < 0 || int(i) >= n {
				v.add("triangle %d: there is no node %d", t, i)
			}
		}
		if c[0] == c[1] || c[1] == c[2] || c[2] == c[0] {
			v.add("triangle %d has the same node at two corners", t)
		}
		if f := s.FabricOf[t]; f < 0 || int(f) >= len(s.Fabrics) {
			v.add("triangle %d: there is no fabric %d", t, f)
		}
		if !finite(s.Warp[t]) || r3.Norm(s.Warp[t]) == 0 {
			v.add("triangle %d: its warp direction is not usable", t)
		}
		for _, p := range s.Stress[t] {
			if math.IsNaN(p) || math.IsInf(p, 0) {
				v.add("triangle %d: its stress is not finite", t)
			}
		}
	}
	v.enclosures(s)
	for r := range s.Rings {
		rg := &s.Rings[r]
		if rg.Centre < -1 || int(rg.Centre) >= n {
			v.add("ring %s: there is no node %d", rg.Name, rg.Centre)
		}
		for _, i := range rg.Nodes {
			if i < 0 || int(i) >= n {
				v.add("ring %s: there is no node %d", rg.Name, i)
			}
		}
	}
	for l := range s.Lines {
		for _, i := range s.Lines[l].Nodes {
			if i < 0 || int(i) >= n {
				v.add("line %s: there is no node %d", s.Lines[l].Name, i)
			}
		}
	}
	if v.more > 0 {
		v.errs = append(v.errs, fmt.Errorf("and %d more", v.more))
	}
	return errors.Join(v.errs...)
}

// enclosures checks that enclosures are what [Structure.Enclose] makes of their
// fabrics.
func (v *validator) enclosures(s *Structure) {
	if len(s.Enclosures) == 0 || len(v.errs) > 0 {
		return
	}
	used := make([]bool, len(s.Fabrics))
	for i := range s.Enclosures {
		e := &s.Enclosures[i]
		if len(e.Fabrics) == 0 || len(e.Side) != len(e.Fabrics) {
			v.add("volume of fabric %s: it has %d fabrics and %d sides", e.Name, len(e.Fabrics), len(e.Side))
			return
		}
		for _, f := range e.Fabrics {
			if f < 0 || int(f) >= len(s.Fabrics) {
				v.add("volume of fabric %s: there is no fabric %d", e.Name, f)
				return
			}
			if used[f] {
				v.add("volume of fabric %s: fabric %s bounds two volumes", e.Name, s.Fabrics[f].Name)
				return
			}
			used[f] = true
		}
		if math.IsNaN(e.Volume) || math.IsInf(e.Volume, 0) {
			v.add("volume of fabric %s: it is not finite", e.Name)
		}
		want, err := s.Enclose(e.Name, e.Fabrics, e.Side[0], e.Volume)
		switch {
		case err != nil:
			v.errs = append(v.errs, err)
		case !slices.Equal(want.Side, e.Side):
			v.add("volume of fabric %s: its sides do not look out of the air", e.Name)
		case e.Base < 0 || int(e.Base) >= len(s.Position):
			v.add("volume of fabric %s: there is no node %d", e.Name, e.Base)
		}
	}
}

const maxProblems = 20

type validator struct {
	errs []error
	more int
}

func (v *validator) add(format string, a ...any) {
	if len(v.errs) >= maxProblems {
		v.more++
		return
	}
	v.errs = append(v.errs, fmt.Errorf(format, a...))
}

func (v *validator) length(name string, got, want int) {
	if got != want {
		v.add("%s has %d entries where %d are needed", name, got, want)
	}
}

func (v *validator) optional(name string, got, want int) {
	if got != 0 {
		v.length(name, got, want)
	}
}

func finite(p r3.Vec) bool {
	s := p.X + p.Y + p.Z // NaN and ±Inf survive a sum; a sum that overflows is refused too
	return !math.IsNaN(s) && !math.IsInf(s, 0)
}
