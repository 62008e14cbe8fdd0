package mesh

import (
	"strconv"

	"anticlast/formfind/canopy"
	"gonum.org/v1/gonum/spatial/r3"
)

// netGiven checks that a net has all that its pattern needs.
func (b *builder) netGiven(l *loop, n canopy.Net) bool {
	before := len(b.errs)
	if k := len(n.Families); k != 2 && k != 3 {
		b.fail("net", n.Name, n.Line, Missing, "give it two, or three", "it has %d families of lines", k)
		return false
	}
	for k, f := range n.Families {
		switch {
		case n.MeshLength > 0 && !(f.Stiffness > 0):
			b.fail("net", n.Name, n.Line, Missing, "give it in MN", "family %d has no stiffness, which an equal mesh needs", k+1)
		case n.MeshLength == 0 && k < 2 && !(f.Spacing > 0):
			b.fail("net", n.Name, n.Line, Missing, "give it in m or mm", "family %d has no spacing", k+1)
		case !(max(f.Force, f.ForceDensity, f.MeanForce) > 0):
			b.fail("net", n.Name, n.Line, Missing, "give it a force, force density or mean force", "nothing decides the force of family %d", k+1)
		}
	}
	if n.Pattern == canopy.NetRadial && (len(n.Holes) != 1 || len(n.Families) != 2) {
		b.fail("net", n.Name, n.Line, Mismatch, "give it one hole and two families", "it is radial and has %d holes and %d families", len(n.Holes), len(n.Families))
	}
	if n.MeshLength > 0 && (n.Pattern == canopy.NetRadial || n.Pattern == canopy.NetSides || len(n.Families) != 2) {
		b.fail("net", n.Name, n.Line, Mismatch, "give it two families of straight lines", "an equal mesh needs straight lines of two families")
	}
	for _, names := range n.Holes {
		if h := b.chain(&loop{net: true, index: l.index, name: n.Name, line: n.Line, ring: -1}, names); h != nil {
			l.holes = append(l.holes, h)
		}
	}
	if n.Pattern == canopy.NetSides {
		switch sides := b.corners(l); {
		case len(l.edges) < 3 || len(sides) != 3 && len(sides) != 4:
			b.fail("net", n.Name, n.Line, Mismatch, "let it have straight lines, or divide it into nets of three or four sides that share edges", "its boundary has %d corners, and lines along the sides need three or four", len(sides))
		case len(n.Holes) > 0:
			b.fail("net", n.Name, n.Line, Mismatch, "let it have straight lines", "lines along the sides leave no hole")
		}
	}
	return len(b.errs) == before
}

// alongSides reports whether a net runs along the sides of its boundary: where
// it asks for that, or leaves the choice and has a fair patch of three or four
// sides.
func (b *builder) alongSides(l *loop) bool {
	n := &b.m.Nets[l.index]
	if n.Pattern != canopy.NetAuto {
		return n.Pattern == canopy.NetSides
	}
	if len(n.Holes) > 0 || n.Direction != (r3.Vec{}) || len(n.Families) != 2 || n.MeshLength > 0 {
		return false
	}
	for _, f := range n.Families {
		if f.HasAngle {
			return false
		}
	}
	if k := len(l.sides); k != 3 && k != 4 {
		return false
	}
	return b.fairSides(l)
}

// fillSides lays the two families of a net along the sides of its patch. With
// four sides the lines of the first family join the second side to the fourth
// and those of the second the first to the third. With three sides the first
// family runs parallel to the first side and the second parallel to the second
// side; every division point of the third side ends one line of each.
func (b *builder) fillSides(l *loop) {
	p := &plot{b: b, l: l}
	var first, second [][]int32
	if len(l.sides) == 4 {
		g := p.grid(p.sides())
		nv, nu := len(g)-1, len(g[0])-1
		first = g[1:nv]
		for i := 1; i < nu; i++ {
			col := make([]int32, nv+1)
			for j := range col {
				col[j] = g[j][i]
			}
			second = append(second, col)
		}
	} else {
		g := p.triGrid(p.sides())
		n := len(g) - 1
		first = g[1:n]
		// Lines parallel to the second side: i + j constant.
		for d := 1; d < n; d++ {
			line := make([]int32, 0, d+1)
			for j := 0; j <= d; j++ {
				line = append(line, g[j][d-j])
			}
			second = append(second, line)
		}
	}
	for k, lines := range [2][][]int32{first, second} {
		mem := b.netMember(l, k)
		for i, nodes := range lines {
			b.chainMembers(numbered(mem.group, i+1), canopy.KindNetCable, nodes, mem)
		}
	}
}

// netMember is what the links of family k of a net have in common.
func (b *builder) netMember(l *loop, k int) member {
	f := b.m.Nets[l.index].Families[k]
	name := f.Name
	if name == "" {
		name = strconv.Itoa(k + 1)
	}
	mem := member{group: l.name + "/" + name, kind: canopy.KindNetCable, stiffness: f.Stiffness, weight: f.Weight, strength: f.Strength}
	switch {
	case f.Force != 0:
		mem.law, mem.given = canopy.LawForce, f.Force
	case f.ForceDensity != 0:
		mem.law, mem.given = canopy.LawForceDensity, f.ForceDensity
	default:
		mem.law, mem.mean = canopy.LawForceDensity, f.MeanForce
	}
	return mem
}

// chainMembers adds a member between each node of the list and the next, and
// the cable they make.
func (b *builder) chainMembers(name string, kind canopy.Kind, nodes []int32, m member) int32 {
	c := canopy.Cable{Name: name, Kind: kind, Nodes: nodes}
	for j := 1; j < len(nodes); j++ {
		m.a, m.b, m.name = nodes[j-1], nodes[j], numbered(name, j)
		c.Members = append(c.Members, b.addMember(m))
	}
	return b.addCable(c)
}

// numbered returns name:k.
func numbered(name string, k int) string { return name + ":" + strconv.Itoa(k) }
