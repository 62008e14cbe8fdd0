package outline

import (
	"math"
	"slices"
)

// cycle is a walk around a face, with the face on its left.
type cycle struct {
	half []int // half-edges: twice the item, one more when walked backwards
	area float64
	path []xy
	lo   xy
	hi   xy
	part int // connected part of the network
	hole bool
	face int // index into Outline.Faces, −1
}

func (t *tracer) from(h int) int {
	if h&1 == 0 {
		return t.items[h>>1].a
	}
	return t.items[h>>1].b
}

// trace finds the faces of the network. Lines that are not part of a loop are
// set aside as loose.
func (t *tracer) trace() {
	for {
		t.prune()
		t.faces = t.cycles()
		// A line with the same face on both sides joins two loops.
		left := make([]int, 2*len(t.items))
		for c, f := range t.faces {
			for _, h := range f.half {
				left[h] = c + 1
			}
		}
		again := false
		for i := range t.items {
			if it := &t.items[i]; !it.loose && left[2*i] == left[2*i+1] {
				it.loose, again = true, true
			}
		}
		if !again {
			return
		}
	}
}

// prune sets aside lines with an open end, again and again.
func (t *tracer) prune() {
	degree := make([]int, len(t.nodes))
	var open []int
	for n := range t.nodes {
		for _, i := range t.nodes[n].items {
			if !t.items[i].loose {
				degree[n]++
			}
		}
		if degree[n] == 1 {
			open = append(open, n)
		}
	}
	for len(open) > 0 {
		n := open[len(open)-1]
		open = open[:len(open)-1]
		for _, i := range t.nodes[n].items {
			it := &t.items[i]
			if it.loose || degree[n] != 1 {
				continue
			}
			it.loose = true
			degree[n]--
			o := it.other(n)
			if degree[o]--; degree[o] == 1 {
				open = append(open, o)
			}
		}
	}
}

// cycles walks around all faces of the lines that are in loops.
func (t *tracer) cycles() []*cycle {
	// Half-edges that leave each node, counter-clockwise.
	around := make([][]int, len(t.nodes))
	place := make([]int, 2*len(t.items))
	angle := make([]float64, 2*len(t.items))
	for i := range t.items {
		it := &t.items[i]
		if it.loose {
			continue
		}
		p := it.path
		n := len(p)
		angle[2*i] = math.Atan2(p[1].y-p[0].y, p[1].x-p[0].x)
		angle[2*i+1] = math.Atan2(p[n-2].y-p[n-1].y, p[n-2].x-p[n-1].x)
		around[it.a] = append(around[it.a], 2*i)
		around[it.b] = append(around[it.b], 2*i+1)
	}
	for _, a := range around {
		slices.SortFunc(a, func(g, h int) int {
			if angle[g] != angle[h] {
				if angle[g] < angle[h] {
					return -1
				}
				return 1
			}
			return g - h
		})
		for k, h := range a {
			place[h] = k
		}
	}
	part := t.parts()
	done := make([]bool, 2*len(t.items))
	var out []*cycle
	for h := range done {
		if t.items[h>>1].loose || done[h] {
			continue
		}
		c := &cycle{part: part[t.from(h)], face: -1}
		for g := h; !done[g]; {
			done[g] = true
			c.half = append(c.half, g)
			p := t.items[g>>1].path
			if g&1 == 0 {
				c.path = append(c.path, p[:len(p)-1]...)
			} else {
				for k := len(p) - 1; k > 0; k-- {
					c.path = append(c.path, p[k])
				}
			}
			// At its end turn to the next line clockwise from the way back.
			back := g ^ 1
			a := around[t.from(back)]
			g = a[(place[back]+len(a)-1)%len(a)]
		}
		c.measure()
		out = append(out, c)
	}
	return out
}

func (c *cycle) measure() {
	o := c.path[0]
	c.lo, c.hi = o, o
	for i, p := range c.path {
		q := c.path[(i+1)%len(c.path)]
		c.area += ((p.x-o.x)*(q.y-o.y) - (q.x-o.x)*(p.y-o.y)) / 2
		c.lo = xy{min(c.lo.x, p.x), min(c.lo.y, p.y)}
		c.hi = xy{max(c.hi.x, p.x), max(c.hi.y, p.y)}
	}
}

// parts numbers the connected parts of the lines that are in loops.
func (t *tracer) parts() []int {
	part := make([]int, len(t.nodes))
	n := 0
	for s := range part {
		if part[s] > 0 {
			continue
		}
		n++
		part[s] = n
		for todo := []int{s}; len(todo) > 0; {
			k := todo[len(todo)-1]
			todo = todo[:len(todo)-1]
			for _, i := range t.nodes[k].items {
				if t.items[i].loose {
					continue
				}
				if o := t.items[i].other(k); part[o] == 0 {
					part[o] = n
					todo = append(todo, o)
				}
			}
		}
	}
	return part
}

// inside reports whether p lies inside a closed path (odd number of crossings).
func inside(p xy, path []xy) bool {
	in := false
	for i, a := range path {
		b := path[(i+1)%len(path)]
		if (a.y > p.y) != (b.y > p.y) && p.x < a.x+(p.y-a.y)/(b.y-a.y)*(b.x-a.x) {
			in = !in
		}
	}
	return in
}

// around returns the smallest face of another part that contains p, nil when
// none does.
func (t *tracer) around(p xy, part int) *cycle {
	var best *cycle
	for _, c := range t.faces {
		if c.area <= 0 || c.part == part || p.x < c.lo.x || p.x > c.hi.x || p.y < c.lo.y || p.y > c.hi.y {
			continue
		}
		if (best == nil || c.area < best.area) && inside(p, c.path) {
			best = c
		}
	}
	return best
}

// edges lists the edges along a cycle, each once.
func (t *tracer) edges(c *cycle, reverse bool) []int {
	var out []int
	for _, h := range c.half {
		if e := t.items[h>>1].edge; len(out) == 0 || out[len(out)-1] != e {
			out = append(out, e)
		}
	}
	if len(out) > 1 && out[0] == out[len(out)-1] {
		out = out[:len(out)-1]
	}
	if reverse {
		slices.Reverse(out)
	}
	// The same start whatever the walk.
	least := 0
	for i, e := range out {
		if e < out[least] {
			least = i
		}
	}
	return append(slices.Clone(out[least:]), out[:least]...)
}

// nest puts holes, lines and points into the faces they lie in.
func (t *tracer) nest() {
	t.openEnds()
	if t.failed {
		return
	}
	found := false
	for _, c := range t.faces {
		if c.area <= 0 {
			continue
		}
		found = true
		c.hole = true
		for _, h := range c.half {
			c.hole = c.hole && t.layers[t.items[h>>1].layer].Hole
		}
		if c.hole {
			continue
		}
		c.face = len(t.out.Faces)
		t.out.Faces = append(t.out.Faces, Face{Boundary: t.edges(c, false), region: c.path})
	}
	if !found {
		t.fail(0, "", "the lines of the outline enclose nothing")
		return
	}
	for _, c := range t.faces {
		if c.area > 0 {
			continue
		}
		it := &t.items[c.half[0]>>1]
		host := t.around(c.path[0], c.part)
		switch {
		case host != nil && host.face >= 0:
			f := &t.out.Faces[host.face]
			f.Holes = append(f.Holes, t.edges(c, true))
			f.hollow = append(f.hollow, c.path)
		case t.layers[it.layer].Hole && t.allHoles(c.part):
			t.fail(it.Line, "draw the outline around it, or give the layer another role", "the hole of %s at %s lies in no outline", t.label(it), t.place(it.A))
		}
	}
	if t.failed {
		return
	}
	t.looseLines()
	for n := range t.nodes {
		at := &t.nodes[n]
		if at.mark < 0 || len(at.items) > 0 || t.layers[t.layer[at.mark]].Apart {
			continue
		}
		if host := t.around(flat(at.at), 0); host != nil && host.face >= 0 {
			f := &t.out.Faces[host.face]
			f.Inside = append(f.Inside, at.point)
		}
	}
	for i := range t.out.Faces {
		slices.Sort(t.out.Faces[i].Inside)
	}
}

// allHoles reports whether a part of the network has no face that is filled.
func (t *tracer) allHoles(part int) bool {
	for _, c := range t.faces {
		if c.part == part && c.face >= 0 {
			return false
		}
	}
	return true
}

// openEnds reports lines of the border that end in the open.
func (t *tracer) openEnds() {
	for n := range t.nodes {
		at := &t.nodes[n]
		if len(at.items) != 1 {
			continue
		}
		it := &t.items[at.items[0]]
		if t.layers[it.layer].Class != Border {
			continue
		}
		// The nearest other end, in space.
		best, bestD := -1, math.Inf(1)
		for m := range t.nodes {
			if m == n || len(t.nodes[m].items) == 0 {
				continue
			}
			if d := apart3(t.nodes[m].at, at.at); d < bestD && m != it.other(n) {
				best, bestD = m, d
			}
		}
		hint := "draw the line that is missing"
		near := ""
		if best >= 0 {
			o := &t.items[t.nodes[best].items[0]]
			near = ": the nearest other end, of " + t.label(o) + ", is " + t.length(bestD) + " away at " + t.place(t.nodes[best].at)
			hint = "join them, or draw the line that is missing; ends closer than snap (" + t.length(t.Snap) + ") are joined"
		}
		t.fail(it.Line, hint, "the outline is open: %s ends at %s%s", t.label(it), t.place(at.at), near)
	}
}

// looseLines puts lines that are in no loop into the faces around them.
func (t *tracer) looseLines() {
	seen := map[int]bool{}
	for i := range t.items {
		it := &t.items[i]
		if !it.loose || seen[it.edge] {
			continue
		}
		seen[it.edge] = true
		k := len(it.path) / 2
		m := xy{(it.path[k-1].x + it.path[k].x) / 2, (it.path[k-1].y + it.path[k].y) / 2}
		host := t.around(m, 0)
		switch {
		case host == nil:
			t.fail(it.Line, "draw the outline around it, or give the layer another role", "%s from %s to %s lies in no outline", t.label(it), t.place(it.A), t.place(it.B))
		case host.face < 0:
			t.fail(it.Line, "remove it", "%s from %s to %s lies in a hole", t.label(it), t.place(it.A), t.place(it.B))
		default:
			f := &t.out.Faces[host.face]
			f.Lines = append(f.Lines, it.edge)
		}
	}
}

// Contains reports whether a place lies in the face, seen from above.
func (f *Face) Contains(x, y float64) bool {
	p := xy{x, y}
	for _, h := range f.hollow {
		if inside(p, h) {
			return false
		}
	}
	return inside(p, f.region)
}
