package spec

import (
	"fmt"
	"slices"

	"anticlast/formfind/canopy"
)

// outlineNetSection has the keys of a net but for what the drawing says.
var outlineNetSection = &section{id: "outline-net", doc: "The cable net in every face of the outline.", keys: append([]*key{
	{name: "name", shape: text(), deflt: "net", example: "roof", doc: "What it is called; with a colon and a number where there are several."},
}, slices.DeleteFunc(slices.Clone(netSection.keys), func(k *key) bool { return k.name == "boundary" || k.name == "holes" })...)}

// outlineNets lays a net in each face of the outline.
func (d *drawn) outlineNets() {
	t := d.traced
	if t == nil || !t.g.has("net") {
		return
	}
	n, p := t.g.get("net"), t.g.p.down("net")
	if t.g.has("fabric") {
		d.r.fail(t.g.keyNode("net"), p, "the faces of the outline have a fabric and a net", "remove one of them, or list nets in the model")
		return
	}
	if d.r.mapping(n, p, outlineNetSection) == nil {
		return
	}
	g := d.r.section(n, outlineNetSection, p)
	name := g.text("name")
	if name == "" {
		name = "net"
	} else if c := checkName(name); c != "" {
		d.r.fail(g.get("name"), p.down("name"), fmt.Sprintf("%q cannot be the name of a net: %s", clip(name), c), "names are made of "+nameRule)
	}
	common := canopy.Net{Name: name, Line: line(n)}
	d.netLines(g, &common)
	for k, face := range t.o.Faces {
		net := common
		if len(t.o.Faces) > 1 {
			net.Name = fmt.Sprintf("%s:%d", name, k+1)
		}
		edges := func(list []int) (names []string, refs []ref) {
			for _, e := range list {
				names = append(names, t.o.Edges[e].Name)
				refs = append(refs, ref{t.o.Edges[e].Name, n, p})
			}
			return names, refs
		}
		var refs []ref
		net.Boundary, refs = edges(face.Boundary)
		d.boundaryRefs = append(d.boundaryRefs, refs)
		for i, h := range face.Holes {
			names, refs := edges(h)
			net.Holes = append(net.Holes, names)
			d.holeRefs = append(d.holeRefs, holeRefs{what: fmt.Sprintf("hole %d of net %q", i+1, net.Name), refs: refs})
		}
		inside := ""
		if len(face.Lines) > 0 {
			inside = "edge " + t.o.Edges[face.Lines[0]].Name
		} else if len(face.Inside) > 0 {
			inside = "point " + t.o.Points[face.Inside[0]].Name
		}
		if inside != "" {
			d.r.fail(n, p, fmt.Sprintf("%s lies inside net %q, whose cables would not be joined to it", inside, net.Name), "draw lines across from edge to edge, which divide the net, or ignore the layer")
		}
		d.netFits(g, &net)
		d.m.Nets = append(d.m.Nets, net)
		d.netAt = append(d.netAt, ref{net.Name, n, p})
	}
}
