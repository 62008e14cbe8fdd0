package spec

import (
	"errors"
	"fmt"
	"io"
	"math"
	"path/filepath"
	"strings"

	"anticlast/formfind/canopy"
	"anticlast/formfind/outline"

	"go.yaml.in/yaml/v4"
	"gonum.org/v1/gonum/spatial/r3"
)

// outlineMesh takes the triangles of an OBJ or STL file as the topology.
func (r *reader) outlineMesh(f, g *fields, m *canopy.Model) {
	for _, k := range []string{"points", "edges", "cables", "fabrics", "nets", "rings", "masts", "guys", "mesh"} {
		if f.has(k) {
			r.fail(f.keyNode(k), f.p.down(k), fmt.Sprintf("%q does not go with the mesh of an outline", k), "a mesh is the whole structure; remove it, or draw the outline as DXF")
		}
	}
	for _, k := range []string{"layers", "heights"} {
		if g.has(k) {
			r.fail(g.keyNode(k), g.p.down(k), k+" are for drawings; a mesh has none", "remove it")
		}
	}
	if g.has("net") {
		r.fail(g.keyNode("net"), g.p.down("net"), "a net goes into a drawing; a mesh is one of fabric", "remove it, or draw the outline as DXF")
	}
	fab, volume, ok := r.meshFabric(g)
	edge, cables := r.meshEdge(g)
	n := g.get("file")
	b := r.beside(n, g.p.down("file"))
	if b == nil {
		return
	}
	defer b.Close()
	read := outline.ReadOBJ
	if strings.EqualFold(filepath.Ext(n.Value), ".stl") {
		read = outline.ReadSTL
	}
	s, err := read(io.Reader(b))
	if !b.end(err) {
		return
	}
	u, unitOK := r.unit(g, outline.Unit{}, ": OBJ and STL files have none")
	if s.Failed() || !unitOK || !ok {
		b.say(g.p, s.Faults)
		return
	}
	snap, corner := defaultSnap, defaultMeshCorner
	if v, ok := g.quantity("snap"); ok {
		snap = v
	}
	if v, ok := g.quantity("corner"); ok {
		corner = v
	}
	s.Settle(u, snap)
	var loops [][]int32
	if !s.Failed() {
		loops = s.Loops()
	}
	b.say(g.p, s.Faults)
	if s.Failed() || r.diags.failed() {
		return
	}
	if len(loops) == 0 {
		r.fail(n, g.p.down("file"), fmt.Sprintf("the mesh of %q is closed: it has no edge that could be held", clip(n.Value)), "leave out the part where it is open")
		return
	}
	st := meshStructure(s, fab)
	for k, loop := range loops {
		if !cables {
			for _, i := range loop {
				st.Fixed[i] = canopy.DirAll
			}
			st.Lines = append(st.Lines, canopy.Line{Name: fmt.Sprintf("edge:%d", k+1), Role: "fixed edge", Nodes: append(loop, loop[0])})
			continue
		}
		if !addEdgeCables(st, edge, loop, corner) {
			r.fail(g.keyNode("edge"), g.p.down("edge"), fmt.Sprintf("the edge of the mesh has no corner by which its cables could be held (round %s)", meshPlace(st.Position[loop[0]], u)), "lower corner, or make it fixed")
		}
	}
	for _, c := range st.Cables {
		if c.Law == canopy.CableSag && len(c.Members) == 1 {
			a, z := st.Position[c.Nodes[0]], st.Position[c.Nodes[1]]
			r.fail(g.keyNode("edge"), g.p.down("edge"), fmt.Sprintf("cable %s from %s to %s is one side of the mesh and cannot sag", c.Name, meshPlace(a, u), meshPlace(z, u)), "give the force, or use a finer mesh")
			return
		}
	}
	if fab.HasVolume {
		e, err := st.Enclose(fab.Name, []int32{0}, 1, fab.Volume)
		var wrong *canopy.EnclosureError
		if errors.As(err, &wrong) {
			r.fail(volume, g.p.down("fabric").down("volume"), fmt.Sprintf("fabric %q cannot have a volume: %s", fab.Name, wrong.Problem), wrong.WayOut)
			return
		}
		st.Enclosures = append(st.Enclosures, e)
	}
	m.Listed = st
}

func meshPlace(v r3.Vec, u outline.Unit) string {
	return fmt.Sprintf("(%.6g, %.6g, %.6g) %s", v.X/u.Metres, v.Y/u.Metres, v.Z/u.Metres, u.Name)
}

// meshFabric reads the fabric of a mesh; volume is the key of its volume, if any.
func (r *reader) meshFabric(g *fields) (fab canopy.ModelFabric, volume *yaml.Node, ok bool) {
	n, p := g.get("fabric"), g.p.down("fabric")
	if n == nil {
		r.fail(g.node, g.p, "the mesh has no fabric", "add fabric: {prestress: 2.5 kN/m}")
		return fab, nil, false
	}
	if r.mapping(n, p, outlineFabricSection) == nil {
		return fab, nil, false
	}
	h := r.section(n, outlineFabricSection, p)
	fab.Name = h.text("name")
	if fab.Name == "" {
		fab.Name = "fabric"
	}
	fab.Properties.Name = fab.Name
	fab.Warp, fab.Weft = r.warpWeft(h, "prestress")
	r.plausiblePrestress(h, fab.Warp, fab.Weft)
	r.material(h, &fab.Properties)
	if h.has("volume") {
		volume = h.keyNode("volume")
		fab.Volume, fab.HasVolume = r.outlineVolume(h)
	}
	for _, k := range []string{"mesh", "pattern"} {
		if h.has(k) {
			r.fail(h.keyNode(k), p.down(k), "the mesh is that of the file", "remove "+k)
		}
	}
	fab.WarpDir = r3.Vec{X: 1}
	if w := h.get("warp"); w != nil {
		if w.Kind != yaml.SequenceNode {
			r.fail(w, p.down("warp"), "the warp of a mesh is a direction", "for example warp: [1, 0, 0]")
			return fab, nil, false
		}
		fab.WarpDir, _ = r.direction(w, p.down("warp"))
	}
	return fab, volume, fab.Warp > 0 && fab.Weft > 0
}

// meshEdge reads what the edges of a mesh are.
func (r *reader) meshEdge(g *fields) (c canopy.ModelCable, cables bool) {
	n, p := g.get("edge"), g.p.down("edge")
	if n == nil {
		return c, false
	}
	if n.Kind != yaml.MappingNode {
		r.word(n, []string{"fixed"}, p)
		return c, false
	}
	h := r.section(n, meshEdgeSection, p)
	rules := h.present(meshEdgeSection.oneOf)
	switch {
	case len(rules) == 0 && h.ok:
		r.fail(n, p, "nothing decides the force of the cables", "give force, force density or sag")
	case len(rules) > 1:
		r.fail(h.keyNode(rules[1]), p.down(rules[1]), fmt.Sprintf("the force of the cables is decided twice, by %s", list(rules, "and")), "keep one of them")
	}
	c.Force, c.ForceDensity, c.Sag = h.number("force"), h.number("force density"), h.number("sag")
	c.Weight, c.Strength = h.number("weight"), h.number("strength")
	return c, true
}

// meshStructure makes a structure of a surface, without supports.
func meshStructure(s *outline.Surface, fab canopy.ModelFabric) *canopy.Structure {
	st := &canopy.Structure{Position: s.Vertex, Fixed: make([]canopy.Freedom, len(s.Vertex)), Corners: s.Triangle, Fabrics: []canopy.Fabric{fab.Properties}}
	for _, c := range s.Triangle {
		st.FabricOf = append(st.FabricOf, 0)
		st.Stress = append(st.Stress, [2]float64{fab.Warp, fab.Weft})
		p, q, o := s.Vertex[c[0]], s.Vertex[c[1]], s.Vertex[c[2]]
		n := r3.Unit(r3.Cross(r3.Sub(q, p), r3.Sub(o, p)))
		w := fab.WarpDir
		if math.Abs(r3.Dot(n, w)) > 1-1e-6 { // square to the triangle: any direction in it
			w = r3.Vec{Y: 1}
			if math.Abs(n.Y) > 0.9 {
				w = r3.Vec{X: 1}
			}
		}
		st.Warp = append(st.Warp, w)
	}
	return st
}

// addEdgeCables makes cables of an edge, from corner to corner, and anchors the
// corners. It reports whether there are any.
func addEdgeCables(st *canopy.Structure, c canopy.ModelCable, loop []int32, corner float64) bool {
	n := len(loop)
	var corners []int
	for k := range loop {
		u := r3.Sub(st.Position[loop[k]], st.Position[loop[(k+n-1)%n]])
		v := r3.Sub(st.Position[loop[(k+1)%n]], st.Position[loop[k]])
		if math.Atan2(r3.Norm(r3.Cross(u, v)), r3.Dot(u, v)) > corner {
			corners = append(corners, k)
		}
	}
	if len(corners) < 2 {
		return false
	}
	for i, from := range corners {
		to := corners[(i+1)%len(corners)]
		if to <= from {
			to += n
		}
		st.Fixed[loop[from]] = canopy.DirAll
		at := len(st.Cables)
		cable := canopy.Cable{Name: fmt.Sprintf("edge:%d", at+1), Kind: canopy.KindEdgeCable, Nodes: []int32{loop[from]}}
		law, given := canopy.LawForce, c.Force
		switch {
		case c.ForceDensity > 0:
			law, given = canopy.LawForceDensity, c.ForceDensity
		case c.Sag > 0:
			law, given = canopy.LawCable, 0
			cable.Law, cable.Value = canopy.CableSag, c.Sag
		}
		st.Groups = append(st.Groups, cable.Name)
		for k := from; k < to; k++ {
			cable.Members = append(cable.Members, int32(len(st.Ends)))
			cable.Nodes = append(cable.Nodes, loop[(k+1)%n])
			st.MemberName.Append(fmt.Sprintf("%s:%d", cable.Name, k-from+1))
			st.Ends = append(st.Ends, [2]int32{loop[k%n], loop[(k+1)%n]})
			st.Kind = append(st.Kind, canopy.KindEdgeCable)
			st.Law = append(st.Law, law)
			st.Given = append(st.Given, given)
			st.Weight = append(st.Weight, c.Weight)
			st.Strength = append(st.Strength, c.Strength)
			st.Group = append(st.Group, int32(at))
			st.CableOf = append(st.CableOf, int32(at))
		}
		st.Cables = append(st.Cables, cable)
	}
	return true
}
