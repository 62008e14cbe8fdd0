package spec

import "fmt"

// insideRef names something inside a fabric.
type insideRef struct {
	ref
	fabric int
}

// inside checks the lines and points inside fabrics. Where they lie is left to
// the mesher, which sees fabrics in their own planes.
func (d *drawn) inside() {
	rim := map[string]bool{} // edges of boundaries and holes
	for _, refs := range d.boundaryRefs {
		for _, q := range refs {
			rim[q.name] = true
		}
	}
	for _, h := range d.holeRefs {
		for _, q := range h.refs {
			rim[q.name] = true
		}
	}
	seen := map[string]bool{}
	for _, l := range d.lineRefs {
		if d.findEdge(l.ref) < 0 {
			continue
		}
		switch {
		case rim[l.name]:
			d.r.fail(l.n, l.p, fmt.Sprintf("edge %q is inside fabric %q and bounds a fabric or net", l.name, d.m.Fabrics[l.fabric].Name), "remove it from lines")
		case seen[l.name]:
			d.r.fail(l.n, l.p, fmt.Sprintf("edge %q is among the lines inside fabrics twice", l.name), "remove one of them")
		}
		seen[l.name] = true
	}
	clear(seen)
	for _, q := range d.insideRefs {
		if d.findPoint(q.ref) < 0 {
			continue
		}
		if seen[q.name] {
			d.r.fail(q.n, q.p, fmt.Sprintf("point %q is among the points inside fabrics twice", q.name), "remove one of them")
		}
		seen[q.name] = true
	}
}

// joinInside joins what is inside fabrics, and their holes, to their boundaries.
func (d *drawn) joinInside(set sets) {
	edge := func(name string) int { return d.point[d.m.Edges[d.edge[name]].From] }
	for _, f := range d.m.Fabrics {
		if len(f.Boundary) == 0 {
			continue
		}
		rim := edge(f.Boundary[0])
		for _, h := range f.Holes {
			set.join(rim, edge(h[0]))
		}
		for _, l := range f.Lines {
			set.join(rim, edge(l))
		}
		for _, p := range f.Inside {
			set.join(rim, d.point[p])
		}
	}
	for _, n := range d.m.Nets {
		for _, h := range n.Holes {
			if len(n.Boundary) > 0 {
				set.join(edge(n.Boundary[0]), edge(h[0]))
			}
		}
	}
}
