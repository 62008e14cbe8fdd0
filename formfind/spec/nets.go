package spec

import (
	"fmt"

	"anticlast/formfind/canopy"

	"go.yaml.in/yaml/v4"
	"gonum.org/v1/gonum/spatial/r3"
)

func (d *drawn) nets(f *fields) {
	d.outlineNets()
	for _, e := range f.named("nets") {
		p := f.p.down("nets").down(e.name)
		if d.r.mapping(e.n, p, netSection) == nil {
			continue
		}
		d.net(e, d.r.section(e.n, netSection, p))
	}
}

func (d *drawn) net(e entry, g *fields) {
	p := g.p
	net := canopy.Net{Name: e.name, Line: line(e.kn)}
	d.netLines(g, &net)
	refs, _ := g.refs("boundary")
	for _, q := range refs {
		net.Boundary = append(net.Boundary, q.name)
	}
	d.boundaryRefs = append(d.boundaryRefs, refs)
	net.Holes = d.holes(g, fmt.Sprintf("net %q", net.Name))
	d.netFits(g, &net)
	d.m.Nets = append(d.m.Nets, net)
	d.netAt = append(d.netAt, ref{e.name, e.kn, p})
}

// netLines reads how the lines of a net run.
func (d *drawn) netLines(g *fields, net *canopy.Net) {
	switch g.word("pattern") {
	case "along sides":
		net.Pattern = canopy.NetSides
	case "straight":
		net.Pattern = canopy.NetStraight
	case "radial":
		net.Pattern = canopy.NetRadial
	}
	if n := g.get("direction"); n != nil {
		net.Direction = d.netDirection(n, g, net.Name)
	}
	d.equalMesh(g, net)
	if n := g.get("families"); n != nil {
		d.families(n, g, net)
	}
}

// netDirection reads a direction or the points it runs between.
func (d *drawn) netDirection(n *yaml.Node, g *fields, net string) r3.Vec {
	p := g.p.down("direction")
	if n.Kind != yaml.MappingNode {
		v, _ := d.r.direction(n, p)
		return v
	}
	from, to, good := d.ends(d.r.section(n, warpBetweenSection, p), fmt.Sprintf("the direction of net %q", net), "from", "to")
	if !good {
		return r3.Vec{}
	}
	return r3.Unit(r3.Sub(d.m.Points[d.point[to]].At, d.m.Points[d.point[from]].At))
}

func (d *drawn) equalMesh(g *fields, net *canopy.Net) {
	s, n := g.shape("equal mesh"), g.get("equal mesh")
	if n == nil {
		return
	}
	p := g.p.down("equal mesh")
	if n.Kind == yaml.MappingNode {
		h := d.r.section(n, equalMeshSection, p)
		net.MeshLength, net.MarkTension = h.number("length"), h.number("at tension")
		return
	}
	net.MeshLength, _ = d.r.quantity(n, s.of[0], p)
}

func (d *drawn) families(n *yaml.Node, g *fields, net *canopy.Net) {
	p := g.p.down("families")
	if n.Kind != yaml.SequenceNode || len(n.Content) != 2 && len(n.Content) != 3 {
		got := what(n)
		if n.Kind == yaml.SequenceNode {
			got = fmt.Sprint(len(n.Content))
		}
		d.r.fail(n, p, fmt.Sprintf("net %q needs a list of two or three families, not %s", net.Name, got), "for example families: "+netSection.get("families").example)
		return
	}
	for i, c := range n.Content {
		cp := p.item(i)
		if c = d.r.mapping(c, cp, familySection); c != nil {
			net.Families = append(net.Families, d.family(c, cp, i, net))
		}
	}
	if len(net.Families) < len(n.Content) {
		net.Families = nil
	}
}

func (d *drawn) family(n *yaml.Node, p *place, i int, net *canopy.Net) canopy.Family {
	g := d.r.section(n, familySection, p)
	fam := canopy.Family{
		Name: g.text("name"), Spacing: g.number("spacing"),
		Force: g.number("force"), ForceDensity: g.number("force density"), MeanForce: g.number("mean force"),
		Stiffness: g.number("stiffness"), Weight: g.number("weight"), Strength: g.number("strength"),
	}
	fam.Angle, fam.HasAngle = g.quantity("angle")
	switch rules := g.present(familyRules); {
	case len(rules) == 0 && g.ok:
		d.r.fail(n, p, fmt.Sprintf("a family of net %q has nothing that decides its force", net.Name), "give force, force density or mean force")
	case len(rules) > 1:
		d.r.fail(g.keyNode(rules[1]), p.down(rules[1]), fmt.Sprintf("the force of a family of net %q is decided twice", net.Name), "keep one of force, force density and mean force")
	}
	switch {
	case net.MeshLength > 0 && g.has("spacing"):
		d.r.fail(g.keyNode("spacing"), p.down("spacing"), fmt.Sprintf("net %q has an equal mesh, which is the spacing of its lines", net.Name), "remove spacing")
	case net.MeshLength > 0 && !g.has("stiffness") && g.ok:
		d.r.fail(n, p, fmt.Sprintf("a family of net %q has no stiffness, and so no length without stress", net.Name), "an equal mesh needs it, for example stiffness: 8 MN")
	case net.MeshLength == 0 && i < 2 && !g.has("spacing") && g.ok:
		d.r.fail(n, p, fmt.Sprintf("a family of net %q has no \"spacing\"", net.Name), "for example spacing: 1 m")
	case i == 2:
		for _, k := range []string{"spacing", "angle"} {
			if g.has(k) {
				d.r.fail(g.keyNode(k), p.down(k), fmt.Sprintf("the third family of net %q has its %s from the other two: it joins their crossings", net.Name, k), "remove "+k)
			}
		}
	}
	return fam
}

// holes reads the loops of edges inside a net or fabric.
func (d *drawn) holes(g *fields, of string) (holes [][]string) {
	n := g.get("holes")
	if n == nil {
		return nil
	}
	p := g.p.down("holes")
	bad := func(n *yaml.Node, p *place) {
		d.r.fail(n, p, fmt.Sprintf("holes takes a list of lists of edges, not %s", what(n)), "for example holes: "+netSection.get("holes").example)
	}
	if n.Kind != yaml.SequenceNode || len(n.Content) == 0 {
		bad(n, p)
		return nil
	}
	for i, c := range n.Content {
		cp := p.item(i)
		if c = d.r.resolve(c, cp); c == nil {
			continue
		}
		if c.Kind != yaml.SequenceNode || len(c.Content) < 2 {
			bad(c, cp)
			continue
		}
		h := holeRefs{what: fmt.Sprintf("hole %d of %s", i+1, of)}
		var names []string
		for j, q := range c.Content {
			if q, ok := d.r.ref(q, cp.item(j)); ok {
				h.refs = append(h.refs, q)
				names = append(names, q.name)
			}
		}
		holes = append(holes, names)
		d.holeRefs = append(d.holeRefs, h)
	}
	return holes
}

// holeRefs are the edges around a hole.
type holeRefs struct {
	refs []ref
	what string
}

// netFits checks that what is said of a net goes together.
func (d *drawn) netFits(g *fields, net *canopy.Net) {
	fail := func(key, message, hint string) {
		d.r.fail(g.keyNode(key), g.p.down(key), fmt.Sprintf("net %q ", net.Name)+message, hint)
	}
	angle := false
	for _, f := range net.Families {
		angle = angle || f.HasAngle
	}
	straight := ""
	switch {
	case len(net.Families) == 3:
		straight = "a third family"
	case angle:
		straight = "an angle"
	case g.has("direction"):
		straight = "a direction"
	case g.has("equal mesh"):
		straight = "an equal mesh"
	}
	switch net.Pattern {
	case canopy.NetSides:
		if straight != "" {
			fail("pattern", "runs along its sides and has "+straight, "only straight lines do; use pattern: straight, or remove it")
		} else if len(net.Holes) > 0 {
			fail("holes", "runs along its sides and has a hole", "use pattern: straight, or remove the hole")
		}
	case canopy.NetRadial:
		if straight != "" {
			fail("pattern", "is radial and has "+straight, "only straight lines do; use pattern: straight, or remove it")
		} else if len(net.Holes) != 1 && g.ok {
			fail("pattern", fmt.Sprintf("is radial and has %d holes", len(net.Holes)), "give it one hole, from which its radial lines start")
		}
	}
	if net.MeshLength > 0 && len(net.Families) == 3 {
		fail("equal mesh", "has an equal mesh and three families", "links of one length cannot make triangles on a curved net; remove the third family")
	}
}
