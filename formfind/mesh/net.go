package mesh

import (
	"strconv"

	"anticlast/formfind/canopy"
)

// fillNet lays the two families of a net over its patch. With four sides the
// lines of the first family join the second side to the fourth and those of the
// second the first to the third. With three sides the first family runs
// parallel to the first side and the second parallel to the second side; every
// division point of the third side ends one line of each.
func (b *builder) fillNet(l *loop) {
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
		f := b.m.Nets[l.index].Families[k]
		name := f.Name
		if name == "" {
			name = strconv.Itoa(k + 1)
		}
		group := l.name + "/" + name
		for i, nodes := range lines {
			mem := member{group: group, kind: canopy.KindNetCable, stiffness: f.Stiffness, weight: f.Weight, strength: f.Strength}
			if f.Force != 0 {
				mem.law, mem.given = canopy.LawForce, f.Force
			} else {
				mem.law, mem.given = canopy.LawForceDensity, f.ForceDensity
			}
			b.chainMembers(numbered(group, i+1), canopy.KindNetCable, nodes, mem)
		}
	}
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
