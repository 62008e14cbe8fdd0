package mesh

import (
	"fmt"
	"math"
	"slices"
	"strconv"

	"anticlast/formfind/canopy"
)

// cables makes the members of cable edges and orders them into cables.
func (b *builder) cables() {
	m := b.m
	first := make([]int32, len(m.Edges)) // first member of an edge, −1 = none yet
	for i := range first {
		first[i] = -1
	}
	for ci := range m.Cables {
		c := &m.Cables[ci]
		edges, rev, ok := b.chainCable(c)
		if !ok {
			continue
		}
		// Points where it is clamped end one piece and start the next.
		var cuts []int // positions in edges that start a piece
		clamped := map[string]bool{}
		for _, p := range c.Clamped {
			clamped[p] = true
		}
		inside := 0
		total := 0.0
		for k, e := range edges {
			total += b.curve[e].length
			start := m.Edges[e].From
			if rev[k] {
				start = m.Edges[e].To
			}
			if k > 0 && clamped[start] {
				cuts = append(cuts, k)
				inside++
			}
		}
		if inside != len(clamped) {
			b.fail("cable", c.Name, c.Line, Mismatch, "name only points between two of its edges", "it is clamped at a point that is not inside it")
			continue
		}
		cuts = append([]int{0}, append(cuts, len(edges))...)
		for k := 1; k < len(cuts); k++ {
			name := c.Name
			if len(cuts) > 2 {
				name = c.Name + "/" + strconv.Itoa(k)
			}
			b.cablePiece(c, name, edges[cuts[k-1]:cuts[k]], rev[cuts[k-1]:cuts[k]], total)
		}
		for _, e := range edges {
			first[e] = 0
		}
	}
	for i, e := range m.Edges {
		if e.Kind == canopy.EdgeCable && first[i] < 0 && len(b.errs) == 0 {
			b.fail("edge", e.Name, e.Line, Mismatch, "list it among the cable's edges", "its cable %s does not run along it", e.Cable)
		}
	}
}

// chainCable orders the edges of a cable into a walk.
func (b *builder) chainCable(c *canopy.ModelCable) (edges []int, rev []bool, ok bool) {
	if len(c.Edges) == 0 {
		b.fail("cable", c.Name, c.Line, Missing, "list at least one", "it has no edges")
		return nil, nil, false
	}
	for _, n := range c.Edges {
		e, found := b.edge[n]
		switch {
		case !found:
			b.fail("cable", c.Name, c.Line, Missing, "add it under edges", "its edge %q is not defined", n)
			return nil, nil, false
		case b.m.Edges[e].Kind != canopy.EdgeCable || b.m.Edges[e].Cable != c.Name:
			b.fail("cable", c.Name, c.Line, Mismatch, "let the edge name this cable only", "edge %s is not an edge of this cable", n)
			return nil, nil, false
		case slices.Contains(edges, e):
			b.fail("cable", c.Name, c.Line, Mismatch, "list each edge once", "edge %s is listed twice", n)
			return nil, nil, false
		}
		edges = append(edges, e)
	}
	rev = make([]bool, len(edges))
	at := b.ends[edges[0]][1]
	if len(edges) > 1 {
		next := b.ends[edges[1]]
		if at != next[0] && at != next[1] {
			rev[0] = true
			at = b.ends[edges[0]][0]
		}
	}
	for k := 1; k < len(edges); k++ {
		switch e := b.ends[edges[k]]; at {
		case e[0]:
			at = e[1]
		case e[1]:
			rev[k] = true
			at = e[0]
		default:
			b.fail("cable", c.Name, c.Line, NotClosed, "list its edges in order along it", "edge %s does not start where edge %s ends", c.Edges[k], c.Edges[k-1])
			return nil, nil, false
		}
	}
	return edges, rev, true
}

// cablePiece adds one cable that slides along all of the given edges.
func (b *builder) cablePiece(c *canopy.ModelCable, name string, edges []int, rev []bool, total float64) {
	s := b.s
	length := 0.0
	for _, e := range edges {
		length += b.curve[e].length
	}
	share := length / total
	kind := b.m.Edges[edges[0]].Role
	cable := canopy.Cable{Name: name, Kind: kind}
	mem := member{group: c.Name, weight: c.Weight, strength: c.Strength, stiffness: c.Stiffness}
	switch {
	case c.Force != 0:
		mem.law, mem.given = canopy.LawForce, c.Force
	case c.ForceDensity != 0:
		mem.law, mem.given = canopy.LawForceDensity, c.ForceDensity
	case c.MeanForce != 0:
		mem.law, mem.mean = canopy.LawForceDensity, c.MeanForce
	case c.Sag != 0:
		mem.law = canopy.LawCable
		cable.Law, cable.Value = canopy.CableSag, c.Sag
	case c.Stiffness != 0 && c.Unstressed != 0:
		mem.law = canopy.LawCable
		cable.Law, cable.Stiffness, cable.Unstressed = canopy.CableElastic, c.Stiffness, c.Unstressed*share
	case c.Length != 0:
		mem.law = canopy.LawCable
		cable.Law, cable.Value = canopy.CableLength, c.Length*share
	default:
		b.fail("cable", c.Name, c.Line, Missing, "give a force, force density, mean force, sag, length, or stiffness and unstressed length", "nothing says what force it has")
		return
	}
	for k, e := range edges {
		nodes := b.edgeNode[e]
		mem.kind = b.m.Edges[e].Role
		members := make([]int32, 0, len(nodes)-1)
		for j := 1; j < len(nodes); j++ {
			mem.a, mem.b, mem.name = nodes[j-1], nodes[j], numbered(b.m.Edges[e].Name, j)
			if cable.Law == canopy.CableElastic {
				// What its length would be without stress, in proportion.
				mem.unstressed = cable.Unstressed * dist(s.Position[mem.a], s.Position[mem.b]) / length
			}
			members = append(members, b.addMember(mem))
		}
		if rev[k] {
			nodes = slices.Clone(nodes)
			slices.Reverse(nodes)
			slices.Reverse(members)
		}
		if k > 0 {
			nodes = nodes[1:]
		}
		cable.Nodes = append(cable.Nodes, nodes...)
		cable.Members = append(cable.Members, members...)
	}
	if cable.Law == canopy.CableSag {
		a, z := cable.Nodes[0], cable.Nodes[len(cable.Nodes)-1]
		if a == z || len(cable.Nodes) < 3 {
			b.fail("cable", c.Name, c.Line, Mismatch, "give its force instead", "it has no chord to measure a sag from")
			return
		}
	}
	b.addCable(cable)
}

// stays makes the masts and guys.
func (b *builder) stays() {
	for _, st := range b.m.Stays {
		i, j := b.node[b.point[st.From]], b.node[b.point[st.To]]
		length := dist(b.s.Position[i], b.s.Position[j])
		if !(length > 0) {
			b.fail(stayPart(st), st.Name, st.Line, Degenerate, "move one of them", "its ends %s and %s are at the same place", st.From, st.To)
			continue
		}
		m := member{a: i, b: j, name: st.Name, group: "guys", kind: canopy.KindGuy, weight: st.Weight, strength: st.Strength, stiffness: st.Stiffness}
		sign := 1.0
		if st.Mast {
			m.kind, m.group, sign = canopy.KindMast, "masts", -1
		}
		c := canopy.Cable{Name: st.Name, Kind: m.kind, Nodes: []int32{i, j}}
		switch {
		case st.HasForce || st.Force != 0:
			m.law, m.given = canopy.LawForce, sign*math.Abs(st.Force)
		case st.Length != 0:
			m.law = canopy.LawCable
			c.Law, c.Value = canopy.CableLength, st.Length
		case st.Unstressed != 0:
			if !(st.Stiffness > 0) {
				b.fail(stayPart(st), st.Name, st.Line, Missing, "give it too", "it has an unstressed length but no stiffness")
				continue
			}
			m.law, m.unstressed = canopy.LawElastic, st.Unstressed
		default:
			m.law = canopy.LawCable
			c.Law = canopy.CableBalance
		}
		c.Members = []int32{b.addMember(m)}
		b.addCable(c)
	}
}

// formatWay prints a length in a suggestion with a round number of mm.
func formatWay(format string, size float64) string {
	mm := size * 1000
	step := math.Pow(10, math.Floor(math.Log10(mm))-1)
	return fmt.Sprintf(format, strconv.FormatFloat(math.Ceil(mm/step)*step, 'f', -1, 64)+" mm")
}
