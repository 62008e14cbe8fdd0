package export

import (
	"fmt"
	"math"

	"anticlast/formfind/canopy"

	"github.com/qmuntal/gltf"
	"gonum.org/v1/gonum/spatial/r3"
)

// Colours of parts.
var (
	steelCable = fromScreen(58, 66, 74)
	mastPaint  = fromScreen(92, 98, 104)
	ringPaint  = fromScreen(70, 78, 86)
	footPaint  = fromScreen(150, 120, 60)
	heldPaint  = fromScreen(120, 90, 140)
)

// structure appends everything but the fabric, in named groups.
func (g *scene) structure() []int {
	var roots []int
	roots = append(roots, g.root("cables", g.cables())...)
	roots = append(roots, g.root("masts", g.masts())...)
	roots = append(roots, g.root("rings", g.rings())...)
	roots = append(roots, g.root("supports", g.supports())...)
	return roots
}

// tubeRadius draws forces: the section of a tube grows with the force, as that
// of a cable of one stress does. The scale is chosen to be seen, not built.
func (g *scene) tubeRadius(force float64) float64 {
	share := 1.0
	if g.most > 0 {
		share = math.Sqrt(math.Abs(force) / g.most)
	}
	return g.size * 0.0025 * max(0.3, share)
}

func (g *scene) sides() int {
	switch n := len(g.r.Structure.Ends); {
	case n > 5000:
		return 4
	case n > 1000:
		return 6
	}
	return 8
}

// cables appends a node for each chain of cables and one for each group of
// members that are in no chain.
func (g *scene) cables() []int {
	s, f := g.r.Structure, g.r.Form
	grey := g.material("cable", steelCable, 0.6, false)
	var nodes []int
	drawn := make([]bool, len(s.Ends))
	for i := range s.Cables {
		c := &s.Cables[i]
		if isStay(c.Kind) && c.Kind != canopy.KindGuy || len(c.Members) == 0 {
			continue
		}
		lo, hi, mean, length := math.Inf(1), math.Inf(-1), 0.0, 0.0
		for _, m := range c.Members {
			drawn[m] = true
			lo, hi = min(lo, f.Force[m]), max(hi, f.Force[m])
			l := memberLength(g.r, int(m))
			mean += f.Force[m] * l
			length += l
		}
		if length > 0 {
			mean /= length
		}
		points := make([]r3.Vec, len(c.Nodes))
		for k, v := range c.Nodes {
			points[k] = f.Position[v]
		}
		var m solid
		m.tube(points, g.tubeRadius(mean), g.sides())
		name := label(c.Kind.String(), c.Name)
		mesh, ok := g.solid(name, &m, grey)
		if !ok {
			continue
		}
		extras := map[string]any{"kind": c.Kind.String(), "name": c.Name, "length_m": rounded(length),
			"force_N": map[string]any{"min": rounded(lo), "mean": rounded(mean), "max": rounded(hi)}}
		nodes = append(nodes, g.node(&gltf.Node{Name: name, Mesh: gltf.Index(mesh), Extras: extras}))
	}
	// The others by kind and group, each a mesh.
	type family struct {
		kind  canopy.Kind
		group int32
	}
	var order []family
	members := map[family][]int32{}
	for i, k := range s.Kind {
		if drawn[i] || k == canopy.KindMast || k == canopy.KindStrut {
			continue
		}
		fam := family{k, -1}
		if s.Group != nil {
			fam.group = s.Group[i]
		}
		if members[fam] == nil {
			order = append(order, fam)
		}
		members[fam] = append(members[fam], int32(i))
	}
	for _, fam := range order {
		name := fam.kind.String() + "s"
		if fam.group >= 0 {
			name += " " + s.Groups[fam.group]
		}
		list := members[fam]
		lo, hi, length := math.Inf(1), math.Inf(-1), 0.0
		for _, m := range list {
			lo, hi = min(lo, f.Force[m]), max(hi, f.Force[m])
			length += memberLength(g.r, int(m))
		}
		mesh, ok := g.loose(name, list, grey)
		if !ok {
			continue
		}
		nodes = append(nodes, g.node(&gltf.Node{Name: name, Mesh: gltf.Index(mesh), Extras: map[string]any{
			"kind": fam.kind.String(), "members": len(list), "length_m": rounded(length),
			"force_N": map[string]any{"min": rounded(lo), "max": rounded(hi)}}}))
	}
	return nodes
}

// loose appends a mesh of members that form no chain: tubes, or lines when
// there are very many.
func (g *scene) loose(name string, list []int32, material int) (int, bool) {
	s, f := g.r.Structure, g.r.Form
	if len(list) <= manyMembers {
		var m solid
		for _, i := range list {
			e := s.Ends[i]
			m.tube([]r3.Vec{f.Position[e[0]], f.Position[e[1]]}, g.tubeRadius(f.Force[i]), 6)
		}
		return g.solid(name, &m, material)
	}
	vertex := make([]int32, len(f.Position)) // 0 = none yet
	var position []r3.Vec
	pairs := make([][2]int32, 0, len(list))
	for _, i := range list {
		var pair [2]int32
		for k, v := range s.Ends[i] {
			if vertex[v] == 0 {
				position = append(position, f.Position[v])
				vertex[v] = int32(len(position))
			}
			pair[k] = vertex[v] - 1
		}
		pairs = append(pairs, pair)
	}
	return g.lines(name, position, pairs, g.material("cable line", steelCable, 1, true))
}

// masts appends a node for each member that pushes.
func (g *scene) masts() []int {
	s, f := g.r.Structure, g.r.Form
	paint := g.material("mast", mastPaint, 0.5, false)
	var nodes []int
	for i, k := range s.Kind {
		if k != canopy.KindMast && k != canopy.KindStrut {
			continue
		}
		name := s.MemberName.At(i)
		if c := cableOf(s, i); c >= 0 && s.Cables[c].Name != "" {
			name = s.Cables[c].Name
		}
		e := s.Ends[i]
		var m solid
		m.tube([]r3.Vec{f.Position[e[0]], f.Position[e[1]]}, 0.005*g.size, 12)
		mesh, ok := g.solid(label(k.String(), name), &m, paint)
		if !ok {
			continue
		}
		nodes = append(nodes, g.node(&gltf.Node{Name: label(k.String(), name), Mesh: gltf.Index(mesh), Extras: map[string]any{
			"kind": k.String(), "length_m": rounded(memberLength(g.r, i)), "force_N": rounded(f.Force[i])}}))
	}
	return nodes
}

// rings appends the rigid rings; those of cable are among the cables.
func (g *scene) rings() []int {
	s, f := g.r.Structure, g.r.Form
	var nodes []int
	for i := range s.Rings {
		ring := &s.Rings[i]
		if !ring.Rigid || len(ring.Nodes) < 3 {
			continue
		}
		var points []r3.Vec
		for _, v := range ring.Nodes {
			points = append(points, f.Position[v])
		}
		points = append(points, points[0])
		var m solid
		m.tube(points, 0.003*g.size, 8)
		mesh, ok := g.solid(label("ring", ring.Name), &m, g.material("ring", ringPaint, 0.5, false))
		if !ok {
			continue
		}
		nodes = append(nodes, g.node(&gltf.Node{Name: label("ring", ring.Name), Mesh: gltf.Index(mesh), Extras: map[string]any{
			"weight_N": rounded(ring.Weight)}}))
	}
	return nodes
}

// label joins the kind of a thing and its name.
func label(kind, name string) string {
	if name == "" {
		return kind
	}
	return kind + " " + name
}

// supports appends a marker for each supported or held point and a rail for
// each fixed line.
func (g *scene) supports() []int {
	s, f := g.r.Structure, g.r.Form
	size := 0.012 * g.size
	brass := g.material("support", footPaint, 0.8, false)
	var nodes []int
	onLine := make([]bool, len(s.Position)) // between the ends of a fixed line
	for i := range s.Lines {
		l := &s.Lines[i]
		if l.Role == "seam" {
			continue
		}
		points := make([]r3.Vec, len(l.Nodes))
		var total r3.Vec
		for k, v := range l.Nodes {
			points[k] = f.Position[v]
			onLine[v] = onLine[v] || k > 0 && k < len(l.Nodes)-1
			if k == 0 || v != l.Nodes[0] {
				total = r3.Add(total, f.Reaction[v])
			}
		}
		var m solid
		m.tube(points, 0.25*size, 6)
		if mesh, ok := g.solid(label(l.Role, l.Name), &m, brass); ok {
			nodes = append(nodes, g.node(&gltf.Node{Name: label(l.Role, l.Name), Mesh: gltf.Index(mesh),
				Extras: map[string]any{"role": l.Role, "reaction_on_structure_N": upExtras(total)}}))
		}
	}
	// Named points share one mesh each at its place; nameless ones, which may
	// be thousands, make one mesh.
	shared := map[bool]int{}
	marker := func(held bool) int {
		if _, ok := shared[held]; !ok {
			var m solid
			if held {
				for _, d := range []r3.Vec{{X: 1}, {Y: 1}, {Z: 1}} {
					m.tube([]r3.Vec{r3.Add(g.origin, r3.Scale(-0.6*size, d)), r3.Add(g.origin, r3.Scale(0.6*size, d))}, 0.15*size, 6)
				}
				shared[held], _ = g.solid("held point", &m, g.material("held", heldPaint, 0.8, false))
			} else {
				m.foot(g.origin, size)
				shared[held], _ = g.solid("support", &m, brass)
			}
		}
		return shared[held]
	}
	var rest solid
	for i := range s.Position {
		fixed := s.Fixed[i]
		held := s.FixedAt(i) != fixed
		named := len(s.NodeName.Bytes(i)) > 0
		switch {
		case fixed == 0 && !held, onLine[i]:
		case named:
			what := "support "
			if fixed == 0 {
				what = "held point "
			}
			p := upY(r3.Sub(f.Position[i], g.origin))
			n := &gltf.Node{Name: what + s.NodeName.At(i), Mesh: gltf.Index(marker(fixed == 0)), Translation: p,
				Extras: map[string]any{"position_m": upExtras(f.Position[i])}}
			if fixed != 0 {
				n.Extras.(map[string]any)["supported"] = directions(fixed)
				n.Extras.(map[string]any)["reaction_on_structure_N"] = upExtras(f.Reaction[i])
			}
			nodes = append(nodes, g.node(n))
		case fixed != 0 && len(rest.corners) < 6*manyMembers:
			rest.foot(f.Position[i], 0.5*size)
		}
	}
	if mesh, ok := g.solid("supports", &rest, brass); ok {
		nodes = append(nodes, g.node(&gltf.Node{Name: fmt.Sprintf("%d more supports", len(rest.corners)/6), Mesh: gltf.Index(mesh)}))
	}
	return nodes
}

func directions(f canopy.Freedom) string {
	var b []byte
	for d := range 3 {
		if f.Has(d) {
			b = append(b, "xyz"[d])
		}
	}
	return string(b)
}

// upExtras is a vector in the model's own axes, z up.
func upExtras(v r3.Vec) []float64 { return []float64{rounded(v.X), rounded(v.Y), rounded(v.Z)} }
