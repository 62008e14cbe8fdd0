package formfile

import (
	"fmt"

	"anticlast/formfind/canopy"
)

// references checks that every index of r's structure points at something and
// every enumeration has a known value. The first fault is handed to fail with
// the kind of thing, its number and what is wrong.
func references(r *canopy.Result, fail func(what string, i int, problem string) error) error {
	s := r.Structure
	nodes, members := int32(len(s.Position)), int32(len(s.Ends))
	noNode := func(v int32) string { return fmt.Sprintf("node %d does not exist (%d nodes)", v, nodes) }
	for i := range s.Master {
		if v := s.Master[i]; v < -1 || v >= nodes {
			return fail("node", i, "master: "+noNode(v))
		}
	}
	for i, e := range s.Ends {
		for _, v := range e {
			if v < 0 || v >= nodes {
				return fail("member", i, noNode(v))
			}
		}
		if int(s.Kind[i]) > int(canopy.KindStrut) {
			return fail("member", i, "unknown kind")
		}
		if int(s.Law[i]) >= len(lawNames) {
			return fail("member", i, "unknown law")
		}
		if s.Group != nil && (s.Group[i] < -1 || int(s.Group[i]) >= len(s.Groups)) {
			return fail("member", i, fmt.Sprintf("group %d does not exist", s.Group[i]))
		}
		if s.CableOf != nil && (s.CableOf[i] < -1 || int(s.CableOf[i]) >= len(s.Cables)) {
			return fail("member", i, fmt.Sprintf("cable %d does not exist (%d cables)", s.CableOf[i], len(s.Cables)))
		}
	}
	for i, c := range s.Corners {
		for _, v := range c {
			if v < 0 || v >= nodes {
				return fail("triangle", i, noNode(v))
			}
		}
		if v := s.FabricOf[i]; v < 0 || int(v) >= len(s.Fabrics) {
			return fail("triangle", i, fmt.Sprintf("fabric %d does not exist", v))
		}
	}
	for i := range s.Cables {
		c := &s.Cables[i]
		if int(c.Kind) > int(canopy.KindStrut) {
			return fail("cable", i, "unknown kind")
		}
		if int(c.Law) >= len(cableLawNames) {
			return fail("cable", i, "unknown law")
		}
		for _, v := range c.Members {
			if v < 0 || v >= members {
				return fail("cable", i, fmt.Sprintf("member %d does not exist (%d members)", v, members))
			}
		}
		for _, v := range c.Nodes {
			if v < 0 || v >= nodes {
				return fail("cable", i, noNode(v))
			}
		}
		if len(c.Members) > 0 && len(c.Nodes) != len(c.Members)+1 {
			return fail("cable", i, fmt.Sprintf("%d members need %d nodes, not %d", len(c.Members), len(c.Members)+1, len(c.Nodes)))
		}
	}
	if err := airReferences(s, fail); err != nil {
		return err
	}
	for i := range s.Rings {
		g := &s.Rings[i]
		for _, v := range append([]int32{g.Centre}, g.Nodes...) {
			if v < 0 || v >= nodes {
				return fail("ring", i, noNode(v))
			}
		}
		if g.Cable < -1 || int(g.Cable) >= len(s.Cables) {
			return fail("ring", i, fmt.Sprintf("cable %d does not exist (%d cables)", g.Cable, len(s.Cables)))
		}
	}
	for i := range s.Lines {
		for _, v := range s.Lines[i].Nodes {
			if v < 0 || v >= nodes {
				return fail("line", i, noNode(v))
			}
		}
	}
	return nil
}
