package spec

import (
	"fmt"

	"anticlast/formfind/canopy"

	"go.yaml.in/yaml/v4"
	"gonum.org/v1/gonum/spatial/r3"
)

// drawn is the drawn model while it is read: its parts and where they stand.
type drawn struct {
	r *reader
	m *canopy.Model

	point, edge, cable, ring map[string]int
	stay                     map[string]int
	pairs                    int   // of boundary pieces compared
	pointAt, edgeAt, ringAt  []ref // where each is defined
	cableAt, stayAt          []ref
	fabricAt, netAt          []ref
	used                     []bool // points that something refers to
	edgeGood                 []bool // both ends known and apart
	edgeHas                  []string
	edgeCableOf              []int // index of the cable an edge belongs to, −1
	edgeRole                 []string
	ringUsers                [][]ref
	boundaryRefs             [][]ref // of fabrics, then of nets
	air                      []air
	holeRefs                 []holeRefs
	lineRefs                 []insideRef // edges inside fabrics
	insideRefs               []insideRef // points inside fabrics
	pointsKey                *yaml.Node
	traced                   *traced // what an outline gave
}

// decode reads the root mapping.
func (r *reader) decode(root *yaml.Node) *canopy.Model {
	m := &canopy.Model{}
	n := r.resolve(root, nil)
	if n == nil {
		return m
	}
	if n.Kind != yaml.MappingNode {
		r.fail(n, nil, fmt.Sprintf("a model is a mapping of keys, not %s", what(n)), "it starts with anticlast: 1; see a sample")
		return m
	}
	f := r.section(n, modelSection, nil)
	r.version(f)
	m.Title = f.text("title")
	m.Description = f.text("description")
	m.North = f.optional("north")
	m.MeshSize = f.number("mesh")
	m.SelfWeight, _ = f.flag("self weight")
	r.limits(f, m)
	r.factors(f, m)
	if f.has("listed") {
		for _, k := range []string{"points", "edges", "cables", "fabrics", "nets", "rings", "masts", "guys", "mesh", "outline"} {
			if f.has(k) {
				r.fail(f.keyNode(k), f.p.down(k), fmt.Sprintf("%q does not go with \"listed\"", k), "a model is either drawn or listed; remove one of them")
			}
		}
		m.Listed = r.listed(f)
		if m.Listed != nil {
			m.Listed.SelfWeight = m.SelfWeight
		}
		return m
	}
	var drawing *fields
	if f.has("outline") {
		n, p := f.get("outline"), f.p.down("outline")
		if r.mapping(n, p, outlineSection) == nil {
			return m
		}
		drawing = r.section(n, outlineSection, p)
		if isMesh(drawing.text("file")) {
			r.outlineMesh(f, drawing, m)
			return m
		}
	}
	if !f.has("points") && !f.has("outline") {
		if len(f.got) > 0 || !r.diags.failed() {
			r.fail(n, nil, "the model has neither \"points\" nor \"outline\" nor \"listed\"", "for example points: "+modelExample("points"))
		}
		return m
	}
	d := &drawn{r: r, m: m, edge: map[string]int{}, cable: map[string]int{}, stay: map[string]int{}, pointsKey: f.keyNode("points")}
	d.points(f)
	d.outline(drawing)
	d.edges(f)
	d.cables(f)
	d.rings(f)
	d.stays(f, "masts", mastSection, true)
	d.stays(f, "guys", guySection, false)
	d.fabrics(f)
	d.nets(f)
	d.check()
	return m
}

// version checks the format's version.
func (r *reader) version(f *fields) {
	n := f.get("anticlast")
	if n == nil {
		if !f.listed(f.node, "anticlast") {
			r.fail(f.node, f.p.down("anticlast"), "the model does not say its format version", fmt.Sprintf("add the line anticlast: %d at the top", FormatVersion))
		}
		return
	}
	if n.Kind == yaml.ScalarNode && n.Value == fmt.Sprint(FormatVersion) {
		return
	}
	r.fail(n, f.p.down("anticlast"), fmt.Sprintf("format version %s is not known", what(n)), fmt.Sprintf("this program reads version %d", FormatVersion))
}

// line is the line of a node, 0 when it came from elsewhere.
func line(n *yaml.Node) int { return max(n.Line, 0) }

func (d *drawn) points(f *fields) {
	entries := f.named("points")
	d.point = make(map[string]int, len(entries))
	for _, e := range entries {
		p := f.p.down("points").down(e.name)
		pt := canopy.Point{Name: e.name, Line: line(e.kn)}
		switch e.n.Kind {
		case yaml.SequenceNode:
			pt.At, _ = d.r.vector(e.n, Length, p)
		case yaml.MappingNode:
			g := d.r.section(e.n, pointSection, p)
			pt.At = r3.Vec{X: g.number("x"), Y: g.number("y"), Z: g.number("z")}
			switch g.word("hold") {
			case "anchored":
				pt.Hold = canopy.HoldAnchored
			case "held":
				pt.Hold = canopy.HoldHeld
			case "free":
				pt.Hold = canopy.HoldFree
			}
			pt.Fixed, _ = g.freedom("support")
			if pt.Fixed != 0 {
				if pt.Hold == canopy.HoldHeld || pt.Hold == canopy.HoldFree {
					d.r.fail(g.keyNode("support"), p.down("support"), fmt.Sprintf("point %q has a support but is %s", e.name, g.get("hold").Value), "remove support or hold")
				}
				pt.Hold = canopy.HoldAnchored
			}
			pt.Load, _ = g.vector("load")
		default:
			d.r.fail(e.n, p, fmt.Sprintf("point %q takes [x, y, z] or a mapping, not %s", e.name, what(e.n)), "for example "+e.name+": [0, 0, 4.5]")
		}
		d.point[e.name] = len(d.m.Points)
		d.m.Points = append(d.m.Points, pt)
		d.pointAt = append(d.pointAt, ref{e.name, e.kn, p})
	}
	d.used = make([]bool, len(d.m.Points))
}

// maxCompared bounds the names looked at for suggestions in one model.
const maxCompared = 30000

// findPoint looks up a point and marks it as used; −1 after an error.
func (d *drawn) findPoint(q ref) int {
	if i, ok := d.point[q.name]; ok {
		d.used[i] = true
		return i
	}
	d.undefined(q, "point", len(d.m.Points), func(i int) string { return d.m.Points[i].Name })
	return -1
}

func (d *drawn) undefined(q ref, thing string, n int, nameOf func(i int) string) {
	if d.r.broken[thing+"\x00"+q.name] {
		return // its definition has been complained about
	}
	// Suggestions stop when they would cost more than they help.
	var names []string
	if d.r.compared += n; len(d.r.diags.errors) < maxErrors && d.r.compared <= maxCompared {
		names = make([]string, n)
		for i := range names {
			names[i] = nameOf(i)
		}
	}
	hint := fmt.Sprintf("define it under %ss", thing)
	if near := nearest(q.name, names); near != "" {
		hint = fmt.Sprintf("did you mean %q?", near)
	} else if len(names) > 0 && len(names) <= 12 {
		hint = fmt.Sprintf("the %ss are %s", thing, list(names, "and"))
	}
	d.r.fail(q.n, q.p, fmt.Sprintf("%s %q is not defined", thing, clip(q.name)), hint)
}

func (d *drawn) findEdge(q ref) int {
	if i, ok := d.edge[q.name]; ok {
		return i
	}
	d.undefined(q, "edge", len(d.m.Edges), func(i int) string { return d.m.Edges[i].Name })
	return -1
}

// ends reads two keys that name points and returns the points, "" after an
// error; good says that both are known and apart.
func (d *drawn) ends(g *fields, what, a, b string) (from, to string, good bool) {
	i, j := -1, -1
	qa, ok := g.ref(a)
	if ok {
		from = qa.name
		i = d.findPoint(qa)
	}
	qb, ok := g.ref(b)
	if ok {
		to = qb.name
		j = d.findPoint(qb)
	}
	if i < 0 || j < 0 {
		return from, to, false
	}
	if i == j {
		d.r.fail(qb.n, qb.p, fmt.Sprintf("%s starts and ends at the same point %q", what, from), "give two different points")
		return from, to, false
	}
	p, q := d.m.Points[i].At, d.m.Points[j].At
	if r3.Norm(r3.Sub(p, q)) <= 1e-9*(1+r3.Norm(p)) {
		d.r.fail(qb.n, qb.p, fmt.Sprintf("%s has no length: points %q and %q are at the same place", what, from, to), "move one of them")
		return from, to, false
	}
	return from, to, true
}

func (d *drawn) edges(f *fields) {
	entries := f.named("edges")
	for _, e := range entries {
		p := f.p.down("edges").down(e.name)
		if d.r.mapping(e.n, p, edgeSection) == nil {
			d.r.breaks("edge", e.name)
			continue
		}
		g := d.r.section(e.n, edgeSection, p)
		ed := canopy.Edge{Name: e.name, Line: line(e.kn)}
		label := fmt.Sprintf("edge %q", e.name)
		var good bool
		ed.From, ed.To, good = d.ends(g, label, "from", "to")
		seam, _ := g.flag("seam")
		kinds := g.present([]string{"cable", "fixed"})
		if seam {
			kinds = append(kinds, "seam")
		}
		has := ""
		if len(kinds) > 0 {
			has = kinds[0]
		}
		if len(kinds) > 1 {
			d.r.fail(g.keyNode(kinds[1]), p.down(kinds[1]), fmt.Sprintf("%s is %s at once", label, list(kinds, "and")), "keep one of them")
			has = "several"
		}
		index := len(d.m.Edges)
		cableOf := -1
		switch has {
		case "cable":
			ed.Kind = canopy.EdgeCable
			ed.Cable = e.name
			cp := p.down("cable")
			if n := g.get("cable"); d.r.mapping(n, cp, edgeCableSection) != nil {
				cg := d.r.section(n, edgeCableSection, cp)
				c := canopy.ModelCable{Name: e.name, Edges: []string{e.name}, Line: line(e.kn)}
				d.cableRule(cg, &c, label)
				cableOf = d.addCable(c, ref{e.name, e.kn, p})
			}
		case "fixed":
			ed.Kind = canopy.EdgeFixed
			good = d.fixed(g, &ed, p) && good
		case "seam":
			ed.Kind = canopy.EdgeSeam
		}
		role := g.word("role")
		if role != "" && (has == "fixed" || has == "seam") {
			d.r.fail(g.keyNode("role"), p.down("role"), fmt.Sprintf("%s has a role but is no cable", label), "remove role")
			role = ""
		}
		if arch, _ := g.flag("arch"); arch {
			ed.Arch = true
			if has != "fixed" && has != "several" {
				d.r.fail(g.keyNode("arch"), p.down("arch"), fmt.Sprintf("%s is an arch but not fixed", label), "an arch is a fixed edge: add fixed: straight or fixed: {through: [x, y, z]}")
			}
		}
		ed.Segments = g.count("segments")
		d.edge[e.name] = index
		d.m.Edges = append(d.m.Edges, ed)
		d.edgeAt = append(d.edgeAt, ref{e.name, e.kn, p})
		d.edgeGood = append(d.edgeGood, good)
		d.edgeHas = append(d.edgeHas, has)
		d.edgeCableOf = append(d.edgeCableOf, cableOf)
		d.edgeRole = append(d.edgeRole, role)
	}
}

// fixed reads the value of an edge's key "fixed".
func (d *drawn) fixed(g *fields, ed *canopy.Edge, p *place) bool {
	n, fp := g.get("fixed"), p.down("fixed")
	if n.Kind != yaml.MappingNode {
		if n.Kind == yaml.ScalarNode && n.Value == "straight" {
			return true
		}
		d.r.fail(n, fp, fmt.Sprintf("fixed cannot be %s", what(n)), "write straight or {through: [x, y, z]}")
		return false
	}
	h := d.r.section(n, fixedSection, fp)
	t := h.get("through")
	if t == nil {
		return false
	}
	tp := fp.down("through")
	at, ok := d.placeOrPoint(t, tp)
	if !ok {
		return false
	}
	ed.Arc, ed.Through = true, at
	i, iok := d.point[ed.From]
	j, jok := d.point[ed.To]
	if !iok || !jok {
		return false
	}
	a, b := d.m.Points[i].At, d.m.Points[j].At
	chord, arm := r3.Sub(b, a), r3.Sub(at, a)
	if r3.Norm(r3.Cross(chord, arm)) <= 1e-9*r3.Norm(chord)*max(r3.Norm(chord), r3.Norm(arm)) {
		d.r.fail(t, tp, fmt.Sprintf("no arc: the place it runs through is on the straight line from %q to %q", ed.From, ed.To), "move it off the line, or write fixed: straight")
		return false
	}
	return true
}

// placeOrPoint reads [x, y, z] or the name of a point.
func (d *drawn) placeOrPoint(n *yaml.Node, p *place) (r3.Vec, bool) {
	if n.Kind == yaml.ScalarNode {
		q, ok := d.r.ref(n, p)
		if !ok {
			return r3.Vec{}, false
		}
		i := d.findPoint(q)
		if i < 0 {
			return r3.Vec{}, false
		}
		return d.m.Points[i].At, true
	}
	return d.r.vector(n, Length, p)
}

// cableRule reads what decides the force of a cable.
func (d *drawn) cableRule(g *fields, c *canopy.ModelCable, label string) {
	rules := g.present(cableRules)
	keep := "keep one of them"
	for _, k := range rules {
		if g.keyNode(k).Line < 0 {
			keep = fmt.Sprintf("set them together: %s={%s: …}", g.p, k)
		}
	}
	switch {
	case len(rules) == 0 && g.ok:
		d.r.fail(g.node, g.p, fmt.Sprintf("the cable of %s has nothing that decides its force", label), "give force, force density, mean force, sag, length, or stiffness and unstressed")
	case len(rules) > 1:
		d.r.fail(g.keyNode(rules[1]), g.p.down(rules[1]), fmt.Sprintf("the force of the cable of %s is decided twice, by %s", label, list(rules, "and")), keep)
	}
	c.Force = g.number("force")
	c.ForceDensity = g.number("force density")
	c.MeanForce = g.number("mean force")
	c.Sag = g.number("sag")
	c.Length = g.number("length")
	c.Unstressed = g.number("unstressed")
	c.Stiffness = g.number("stiffness")
	c.Weight = g.number("weight")
	c.Strength = g.number("strength")
	if g.has("unstressed") && !g.has("stiffness") {
		d.r.fail(g.keyNode("unstressed"), g.p.down("unstressed"), fmt.Sprintf("the cable of %s has an unstressed length but no stiffness", label), "add stiffness, for example stiffness: 12 MN")
	}
	for _, k := range []string{"force", "force density"} {
		if v, ok := g.quantity(k); ok && v == 0 {
			d.r.fail(g.get(k), g.p.down(k), fmt.Sprintf("%s of the cable of %s is zero", k, label), "a cable without force does nothing; remove it or make it an edge with seam: true")
		}
	}
}

// addCable appends a cable, complaining when its name is taken.
func (d *drawn) addCable(c canopy.ModelCable, at ref) int {
	if j, twice := d.cable[c.Name]; twice {
		hint := "give one of them another name"
		if l := d.cableAt[j].n.Line; l > 0 {
			hint = fmt.Sprintf("the other is in line %d; %s", l, hint)
		}
		d.r.fail(at.n, at.p, fmt.Sprintf("there are two cables called %q", c.Name), hint)
	}
	i := len(d.m.Cables)
	d.cable[c.Name] = i
	d.m.Cables = append(d.m.Cables, c)
	d.cableAt = append(d.cableAt, at)
	return i
}

func (d *drawn) cables(f *fields) {
	for _, e := range f.named("cables") {
		p := f.p.down("cables").down(e.name)
		if d.r.mapping(e.n, p, cableSection) == nil {
			continue
		}
		g := d.r.section(e.n, cableSection, p)
		c := canopy.ModelCable{Name: e.name, Line: line(e.kn)}
		label := fmt.Sprintf("cable %q", e.name)
		d.cableRule(g, &c, label)
		role := g.word("role")
		refs, good := g.refs("edges")
		index := d.addCable(c, ref{e.name, e.kn, p})
		chain := make([]int, 0, len(refs))
		for _, q := range refs {
			i := d.findEdge(q)
			if i < 0 {
				good = false
				continue
			}
			c.Edges = append(c.Edges, q.name)
			chain = append(chain, i)
			good = good && d.edgeGood[i]
			switch {
			case d.edgeHas[i] == "cable" && d.edgeCableOf[i] != index:
				d.r.fail(q.n, q.p, fmt.Sprintf("edge %q has a cable of its own and is part of cable %q", q.name, e.name), "remove cable from the edge")
			case d.edgeHas[i] == "fixed" || d.edgeHas[i] == "seam":
				d.r.fail(q.n, q.p, fmt.Sprintf("edge %q is %s and cannot be part of cable %q", q.name, map[string]string{"fixed": "fixed", "seam": "a seam"}[d.edgeHas[i]], e.name), "remove it from the cable")
			case d.edgeCableOf[i] == index:
				d.r.fail(q.n, q.p, fmt.Sprintf("edge %q is in cable %q twice", q.name, e.name), "remove one of them")
			case d.edgeCableOf[i] >= 0:
				d.r.fail(q.n, q.p, fmt.Sprintf("edge %q is part of two cables, %q and %q", q.name, d.m.Cables[d.edgeCableOf[i]].Name, e.name), "remove it from one of them")
			default:
				d.edgeCableOf[i] = index
				d.edgeHas[i] = "cables"
				d.m.Edges[i].Kind = canopy.EdgeCable
				d.m.Edges[i].Cable = e.name
				if d.edgeRole[i] == "" {
					d.edgeRole[i] = role
				}
			}
		}
		if good {
			d.chain(chain, refs, &c, g)
		} else {
			for _, q := range d.clampRefs(g) {
				d.findPoint(q)
			}
		}
		d.m.Cables[index] = c
	}
}

func (d *drawn) clampRefs(g *fields) []ref {
	refs, _ := g.refs("clamped")
	return refs
}

// chain checks that the edges of a cable follow each other, and reads where
// it is clamped.
func (d *drawn) chain(edges []int, refs []ref, c *canopy.ModelCable, g *fields) {
	ends := func(i int) [2]string { return [2]string{d.m.Edges[i].From, d.m.Edges[i].To} }
	nodes, broken := walk(ends, edges)
	if broken >= 0 {
		prev, next := refs[broken-1].name, refs[broken].name
		d.r.fail(refs[broken].n, refs[broken].p, fmt.Sprintf("the edges of cable %q do not follow each other: %q does not go on where %q ends", c.Name, next, prev), "list them in order from one end of the cable to the other")
	}
	inner := map[string]bool{}
	if broken < 0 {
		seen := map[string]bool{}
		closed := nodes[0] == nodes[len(nodes)-1] && len(nodes) > 1
		for i, n := range nodes {
			if seen[n] && !(closed && i == len(nodes)-1) {
				d.r.fail(refs[0].n, refs[0].p, fmt.Sprintf("cable %q passes point %q twice", c.Name, n), "split it into two cables")
				break
			}
			seen[n] = true
			if i > 0 && i < len(nodes)-1 {
				inner[n] = true
			}
		}
	}
	for _, q := range d.clampRefs(g) {
		if d.findPoint(q) < 0 {
			continue
		}
		if broken < 0 && !inner[q.name] {
			d.r.fail(q.n, q.p, fmt.Sprintf("cable %q cannot be clamped at %q, which is not between its ends", c.Name, q.name), "name a point between two of its edges")
			continue
		}
		c.Clamped = append(c.Clamped, q.name)
	}
}

// walk follows edges from end to end in the order given. It returns the points
// passed and the position of the first edge that does not go on from the one
// before, or −1.
func walk(ends func(int) [2]string, edges []int) (nodes []string, broken int) {
	best := -1
	for flip := range 2 {
		e := ends(edges[0])
		cur := e[1-flip]
		path := append(make([]string, 0, len(edges)+1), e[flip], cur)
		at := -1
		for k, i := range edges[1:] {
			e := ends(i)
			switch cur {
			case e[0]:
				cur = e[1]
			case e[1]:
				cur = e[0]
			default:
				at = k + 1
			}
			if at >= 0 {
				break
			}
			path = append(path, cur)
		}
		if at < 0 {
			return path, -1
		}
		if at > best {
			best, nodes = at, path
		}
	}
	return nodes, best
}

func (d *drawn) rings(f *fields) {
	d.ring = map[string]int{}
	for _, e := range f.named("rings") {
		p := f.p.down("rings").down(e.name)
		if d.r.mapping(e.n, p, ringSection) == nil {
			d.r.breaks("ring", e.name)
			continue
		}
		g := d.r.section(e.n, ringSection, p)
		ring := canopy.ModelRing{Name: e.name, Rigid: true, Axis: r3.Vec{Z: 1}, Line: line(e.kn)}
		if q, ok := g.ref("at"); ok {
			ring.At = q.name
			d.findPoint(q)
		}
		ring.Radius = g.number("radius")
		if n := g.get("axis"); n != nil {
			if a, ok := d.r.direction(n, p.down("axis")); ok {
				ring.Axis = a
			}
		}
		if v, ok := g.flag("rigid"); ok {
			ring.Rigid = v
		}
		ring.Free, _ = g.freedom("free")
		ring.Weight = g.number("weight")
		ring.Force = g.number("force")
		ring.Hangers = g.count("hangers")
		ring.HangerForce = g.number("hanger force")
		ring.Strength = g.number("strength")
		label := fmt.Sprintf("ring %q", e.name)
		if ring.Rigid {
			for _, k := range []string{"force", "hangers", "hanger force", "strength"} {
				if g.has(k) {
					d.r.fail(g.keyNode(k), p.down(k), fmt.Sprintf("%s is rigid and has no %s", label, k), "remove it, or add rigid: false")
				}
			}
		} else if g.ok {
			if !g.has("force") {
				d.r.fail(e.kn, p, fmt.Sprintf("%s is a cable ring and has no force", label), "add force, for example force: 18 kN")
			}
			if (ring.Hangers > 0) != (ring.HangerForce > 0) {
				d.r.fail(e.kn, p, fmt.Sprintf("%s needs hangers and hanger force together", label), "give both or neither")
			}
		}
		d.ring[e.name] = len(d.m.Rings)
		d.m.Rings = append(d.m.Rings, ring)
		d.ringAt = append(d.ringAt, ref{e.name, e.kn, p})
	}
	d.ringUsers = make([][]ref, len(d.m.Rings))
}

func (d *drawn) stays(f *fields, key string, sec *section, mast bool) {
	a, b := "from", "to"
	if mast {
		a, b = "foot", "head"
	}
	for _, e := range f.named(key) {
		p := f.p.down(key).down(e.name)
		if d.r.mapping(e.n, p, sec) == nil {
			continue
		}
		g := d.r.section(e.n, sec, p)
		label := fmt.Sprintf("%s %q", sec.id, e.name)
		s := canopy.Stay{Name: e.name, Mast: mast, Line: line(e.kn)}
		s.From, s.To, _ = d.ends(g, label, a, b)
		d.stayKeys(g, &s, label)
		if i, twice := d.stay[e.name]; twice {
			d.r.fail(e.kn, p, fmt.Sprintf("there are two masts or guys called %q", e.name), fmt.Sprintf("the other is in line %d; give one of them another name", d.stayAt[i].n.Line))
		} else {
			d.stay[e.name] = len(d.m.Stays)
		}
		d.m.Stays = append(d.m.Stays, s)
		d.stayAt = append(d.stayAt, ref{e.name, e.kn, p})
	}
}

// stayKeys reads what decides the force of a mast or guy.
func (d *drawn) stayKeys(g *fields, s *canopy.Stay, label string) {
	rules := g.present([]string{"force", "length", "unstressed"})
	if len(rules) > 1 {
		d.r.fail(g.keyNode(rules[1]), g.p.down(rules[1]), fmt.Sprintf("the force of %s is decided twice, by %s", label, list(rules, "and")), "keep one of them")
	}
	s.Force, s.HasForce = g.quantity("force")
	s.Length = g.number("length")
	s.Unstressed = g.number("unstressed")
	s.Stiffness = g.number("stiffness")
	s.Weight = g.number("weight")
	s.Strength = g.number("strength")
	if g.has("unstressed") && !g.has("stiffness") {
		d.r.fail(g.keyNode("unstressed"), g.p.down("unstressed"), fmt.Sprintf("%s has an unstressed length but no stiffness", label), "add stiffness, for example stiffness: 90 MN")
	}
}

// warpWeft reads a value that is one quantity or {warp, weft}.
func (r *reader) warpWeft(f *fields, name string) (warp, weft float64) {
	s, n := f.shape(name), f.get(name)
	if n == nil {
		return 0, 0
	}
	p := f.p.down(name)
	if n.Kind == yaml.MappingNode {
		g := r.section(n, s.of[1].sec, p)
		return g.number("warp"), g.number("weft")
	}
	v, _ := r.quantity(n, s.of[0], p)
	return v, v
}

// material reads the keys that drawn and listed fabrics share.
func (r *reader) material(g *fields, fab *canopy.Fabric) {
	fab.WarpStrength, fab.WeftStrength = r.warpWeft(g, "strength")
	fab.Weight = g.number("weight")
	fab.Pressure = g.number("pressure")
	if fab.Weight > 500 {
		r.warn(g.get("weight"), g.p.down("weight"), fmt.Sprintf("a fabric of %q is heavier than any", clip(g.get("weight").Value)), "a bare number is in kN/m2; fabrics weigh some 10 N/m2 (1 kg/m2)")
	}
	n := g.get("stiffness")
	if n == nil {
		return
	}
	p := g.p.down("stiffness")
	if r.mapping(n, p, fabricStiffnessSection) == nil {
		return
	}
	h := r.section(n, fabricStiffnessSection, p)
	fab.WarpModulus, fab.WeftModulus = h.number("warp"), h.number("weft")
	fab.ShearModulus, fab.PoissonWarpWeft = h.number("shear"), h.number("poisson")
	nu := fab.PoissonWarpWeft
	// Positive strain energy asks for ν_wf·ν_fw < 1 with ν_fw = ν_wf·E_f/E_w
	// (Lempriere 1968, for plane orthotropy).
	if nu > 0 && fab.WarpModulus > 0 && !(nu*nu*fab.WeftModulus/fab.WarpModulus < 1) {
		r.fail(h.get("poisson"), p.down("poisson"), fmt.Sprintf("poisson %q gives a fabric that creates energy: poisson² · weft/warp is %.3g but must be less than 1", clip(h.get("poisson").Value), nu*nu*fab.WeftModulus/fab.WarpModulus), "poisson is the contraction in weft caused by stress in warp")
	}
}

func (d *drawn) fabrics(f *fields) {
	d.outlineFabrics()
	for _, e := range f.named("fabrics") {
		p := f.p.down("fabrics").down(e.name)
		if d.r.mapping(e.n, p, fabricSection) == nil {
			continue
		}
		g := d.r.section(e.n, fabricSection, p)
		fab := canopy.ModelFabric{Name: e.name, Line: line(e.kn)}
		fab.Properties.Name = e.name
		fab.Warp, fab.Weft = d.r.warpWeft(g, "prestress")
		d.r.plausiblePrestress(g, fab.Warp, fab.Weft)
		fab.MeshSize = g.number("mesh")
		d.r.material(g, &fab.Properties)
		if a, ok := d.r.air(g, e.name); ok {
			d.air = append(d.air, a)
		}
		if q, ok := g.ref("ring"); ok {
			fab.Ring = q.name
			if i, known := d.ring[q.name]; known {
				d.ringUsers[i] = append(d.ringUsers[i], ref{e.name, q.n, q.p})
			} else {
				d.undefined(q, "ring", len(d.m.Rings), func(i int) string { return d.m.Rings[i].Name })
			}
		}
		d.warp(g, &fab, e.name)
		refs, _ := g.refs("boundary")
		for _, q := range refs {
			fab.Boundary = append(fab.Boundary, q.name)
		}
		d.boundaryRefs = append(d.boundaryRefs, refs)
		fab.Holes = d.holes(g, fmt.Sprintf("fabric %q", e.name))
		switch g.word("pattern") {
		case "along sides":
			fab.Pattern = canopy.FabricSides
		case "free":
			fab.Pattern = canopy.FabricFree
		}
		if n := g.get("plane"); n != nil {
			fab.Plane, _ = d.r.direction(n, p.down("plane"))
		}
		lines, _ := g.refs("lines")
		for _, q := range lines {
			fab.Lines = append(fab.Lines, q.name)
			d.lineRefs = append(d.lineRefs, insideRef{q, len(d.m.Fabrics)})
		}
		points, _ := g.refs("inside")
		for _, q := range points {
			fab.Inside = append(fab.Inside, q.name)
			d.insideRefs = append(d.insideRefs, insideRef{q, len(d.m.Fabrics)})
		}
		d.m.Fabrics = append(d.m.Fabrics, fab)
		d.fabricAt = append(d.fabricAt, ref{e.name, e.kn, p})
	}
}

// plausiblePrestress warns of a prestress that no fabric carries.
func (r *reader) plausiblePrestress(g *fields, warp, weft float64) {
	if n := g.get("prestress"); n != nil && max(warp, weft) > 100e3 {
		r.warn(n, g.p.down("prestress"), fmt.Sprintf("a prestress of %.4g kN/m is more than any fabric carries", max(warp, weft)/1e3), "a bare number is in kN/m; common practice is 1 to 10 kN/m")
	}
}

// warp reads the warp direction of a fabric.
func (d *drawn) warp(g *fields, fab *canopy.ModelFabric, name string) {
	n := g.get("warp")
	if n == nil {
		if g.has("ring") {
			fab.WarpRule = canopy.WarpRadial
		}
		return
	}
	p := g.p.down("warp")
	switch n.Kind {
	case yaml.SequenceNode:
		fab.WarpDir, _ = d.r.direction(n, p)
	case yaml.MappingNode:
		h := d.r.section(n, warpBetweenSection, p)
		from, to, good := d.ends(h, "the warp direction", "from", "to")
		if good {
			fab.WarpDir = r3.Unit(r3.Sub(d.m.Points[d.point[to]].At, d.m.Points[d.point[from]].At))
		}
	default:
		switch d.r.word(n, g.shape("warp").of[0].words, p) {
		case "radial":
			fab.WarpRule = canopy.WarpRadial
		case "around":
			fab.WarpRule = canopy.WarpAround
		default:
			return
		}
		if !g.has("ring") {
			d.r.fail(n, p, fmt.Sprintf("the warp of fabric %q is %s but it has no ring", name, n.Value), "name its ring, or give a direction such as [1, 0, 0]")
		}
	}
}

func (r *reader) limits(f *fields, m *canopy.Model) {
	n := f.get("limits")
	if n == nil || r.mapping(n, f.p.down("limits"), limitsSection) == nil {
		return
	}
	p := f.p.down("limits")
	g := r.section(n, limitsSection, p)
	l := &m.Limits
	l.Achieved, l.Ratio = g.pair("achieved"), g.pair("ratio")
	l.StressMin, l.StressMax = g.optional("stress min"), g.optional("stress max")
	if l.StressMin != nil && l.StressMax != nil && *l.StressMin > *l.StressMax {
		r.fail(g.get("stress min"), p.down("stress min"), "stress min is greater than stress max", "")
	}
	l.CableMax, l.SlopeMin = g.optional("cable max"), g.optional("slope min")
	l.ReactionMax, l.Utilisation = g.optional("reaction max"), g.optional("utilisation")
	h := g.get("headroom")
	if h == nil {
		return
	}
	hp := p.down("headroom")
	if h.Kind != yaml.SequenceNode {
		r.fail(h, hp, "headroom takes a list of regions, not "+what(h), "for example headroom: "+limitsSection.get("headroom").example)
		return
	}
	for i, c := range h.Content {
		cp := hp.item(i)
		if c = r.mapping(c, cp, headroomSection); c == nil {
			continue
		}
		g := r.section(c, headroomSection, cp)
		hr := canopy.Headroom{Name: g.text("name"), Height: g.number("height")}
		if reg := g.get("region"); reg != nil {
			hr.Region = r.region(reg, cp.down("region"))
		}
		if hr.Name == "" {
			hr.Name = fmt.Sprint(i + 1)
		}
		l.Headroom = append(l.Headroom, hr)
	}
}

// region reads the corners of a region in plan.
func (r *reader) region(n *yaml.Node, p *place) []r3.Vec {
	if n.Kind != yaml.SequenceNode || len(n.Content) < 3 {
		r.fail(n, p, "region takes a list of at least three corners [x, y], not "+what(n), "for example [[0, 0], [4, 0], [4, 3], [0, 3]]")
		return nil
	}
	var out []r3.Vec
	sh := &shape{dim: Length}
	for i, c := range n.Content {
		cp := p.item(i)
		if c = r.resolve(c, cp); c == nil {
			return nil
		}
		if c.Kind != yaml.SequenceNode || len(c.Content) != 2 {
			r.fail(c, cp, "a corner of a region is [x, y], not "+what(c), "")
			continue
		}
		x, ok1 := r.quantity(c.Content[0], sh, &place{cp, "x"})
		y, ok2 := r.quantity(c.Content[1], sh, &place{cp, "y"})
		if ok1 && ok2 {
			out = append(out, r3.Vec{X: x, Y: y})
		}
	}
	if len(out) == len(n.Content) {
		area := 0.0
		for i, a := range out {
			b := out[(i+1)%len(out)]
			area += (a.X-out[0].X)*(b.Y-out[0].Y) - (b.X-out[0].X)*(a.Y-out[0].Y)
		}
		if area == 0 {
			r.fail(n, p, "the region has no area", "list its corners in order around it")
		}
	}
	return out
}

func (r *reader) factors(f *fields, m *canopy.Model) {
	n := f.get("factors")
	if n == nil || r.mapping(n, f.p.down("factors"), factorsSection) == nil {
		return
	}
	g := r.section(n, factorsSection, f.p.down("factors"))
	m.Factors = canopy.Factors{Load: g.number("load"), Fabric: g.number("fabric"), Cable: g.number("cable")}
}
