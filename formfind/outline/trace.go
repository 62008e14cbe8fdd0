package outline

import (
	"fmt"
	"math"
	"strings"

	"gonum.org/v1/gonum/spatial/r3"
)

// Class says what the lines or points of a layer are for.
type Class uint8

// Classes of layers.
const (
	Unused Class = iota // left out
	Border              // bounds the canopy; must not end in the open
	Inner               // bounds parts of the canopy, or ends freely inside it
	Stay                // masts and guys: not part of the surface
	Points              // single points
)

// Layer is a layer of the drawing that is used.
type Layer struct {
	Name  string
	Class Class
	// Hole says that a loop of lines on this layer is the rim of an opening.
	Hole bool
	// Apart says that the points of this layer do not touch the surface even
	// where they lie inside it.
	Apart bool
	// Whole says that lines of this layer are not broken where others end on
	// them; those of cables never are.
	Whole bool
	// Cable says that a line runs on through vertices where it hardly turns.
	Cable bool
}

// Options of Trace.
type Options struct {
	Unit   Unit    // of the drawing, for messages
	Snap   float64 // m: ends closer than this are one point
	Corner float64 // rad: a cable has a corner where it turns by more
}

// Outline is a network of edges traced from a drawing, in m.
type Outline struct {
	Points []Point
	Edges  []Edge
	Stays  []Edge
	Faces  []Face
	unit   Unit
}

// Point is an end of edges, or a single point.
type Point struct {
	Name  string // layer:number
	At    r3.Vec
	Layer int
	Line  int
}

// Edge runs from one point to another.
type Edge struct {
	Name     string // layer:number
	From, To int
	Arc      bool
	Through  r3.Vec
	Layer    int
	Line     int
}

// Face is a part of the plan that fabric fills.
type Face struct {
	Boundary []int   // edges in order, counter-clockwise seen from above
	Holes    [][]int // each the edges in order around an opening
	Lines    []int   // edges inside
	Inside   []int   // points inside
	region   []xy
	hollow   [][]xy
}

// maxLines is the number of lines that an outline may have.
const maxLines = 10_000

type xy struct{ x, y float64 }

func flat(v r3.Vec) xy { return xy{v.X, v.Y} }

func apart(a, b xy) float64 { return math.Hypot(a.x-b.x, a.y-b.y) }

// item is one line of the drawing.
type item struct {
	Segment
	layer int
	a, b  int // nodes
	path  []xy
	edge  int  // that it became part of
	loose bool // not part of a loop
}

// end returns the node at the other end.
func (it *item) other(n int) int {
	if it.a == n {
		return it.b
	}
	return it.a
}

// node is a place where lines end.
type node struct {
	at     r3.Vec
	mark   int // index into marks, −1
	point  int // that it became, −1
	smooth bool
	items  []int // of the surface
	stays  int
}

type tracer struct {
	Options
	d      *Drawing
	layers []Layer
	items  []item
	stays  []item
	marks  []Mark
	layer  []int // of the marks
	nodes  []node
	atMark []int // node of each mark
	faults []Fault
	failed bool
	faces  []*cycle
	above  map[[2]int]bool // nodes said to be above each other
	out    *Outline
}

// Trace makes a network of a drawing in metres. Layers that are not listed are
// left out. The faults say what does not fit together, with places in the unit of
// the drawing; unless all of them are warnings the outline is nil.
func Trace(d *Drawing, layers []Layer, o Options) (*Outline, []Fault) {
	t := &tracer{Options: o, d: d, layers: layers, out: &Outline{unit: o.Unit}}
	for _, step := range []func(){t.collect, t.snap, t.duplicates, t.lay, t.meetings, t.corners, t.name, t.trace, t.nest} {
		step()
		if t.failed {
			return nil, t.faults
		}
	}
	return t.out, t.faults
}

func (t *tracer) fail(line int, hint, format string, args ...any) {
	t.failed = true
	t.add(Fault{Line: line, Message: fmt.Sprintf(format, args...), Hint: hint})
}

func (t *tracer) warn(line int, hint, format string, args ...any) {
	t.add(Fault{Line: line, Message: fmt.Sprintf(format, args...), Hint: hint, Warning: true})
}

func (t *tracer) add(f Fault) {
	if len(t.faults) < maxFaults {
		t.faults = append(t.faults, f)
	}
}

func (t *tracer) place(v r3.Vec) string { return place(v, t.Unit) }

func (t *tracer) length(l float64) string {
	p := place(r3.Vec{X: l}, t.Unit)
	return strings.TrimPrefix(p[:strings.Index(p, ",")], "(") + p[strings.Index(p, ")")+1:]
}

func (t *tracer) label(it *item) string {
	return fmt.Sprintf("%s (line %d)", t.layers[it.layer].Name, it.Line)
}

// collect sorts lines and points by layer: those of the first layer come first.
func (t *tracer) collect() {
	index := map[string]int{}
	of := func(name string) int {
		if i, ok := index[name]; ok {
			return i
		}
		at := -1
		for i, l := range t.layers {
			if l.Name == name {
				at = i
				break
			}
			if at < 0 && strings.EqualFold(l.Name, name) {
				at = i
			}
		}
		index[name] = at
		return at
	}
	lines, points := make([][]int, len(t.layers)), make([][]int, len(t.layers))
	for i, s := range t.d.Segments {
		if l := of(s.Layer); l >= 0 {
			lines[l] = append(lines[l], i)
		}
	}
	for i, m := range t.d.Points {
		if l := of(m.Layer); l >= 0 {
			points[l] = append(points[l], i)
		}
	}
	for l, lay := range t.layers {
		switch lay.Class {
		case Unused:
			continue
		case Points:
			if n := len(lines[l]); n > 0 {
				t.warn(t.d.Segments[lines[l][0]].Line, "give the layer another role, or draw points", "%d line%s on layer %s, which has points: left out", n, plural(n), lay.Name)
			}
			for _, i := range points[l] {
				t.marks = append(t.marks, t.d.Points[i])
				t.layer = append(t.layer, l)
			}
			continue
		}
		if n := len(points[l]); n > 0 {
			t.warn(t.d.Points[points[l][0]].Line, "put them on a layer of points", "%d point%s on layer %s, which has lines: left out", n, plural(n), lay.Name)
		}
		for _, i := range lines[l] {
			it := item{Segment: t.d.Segments[i], layer: l, edge: -1}
			if it.Arc && straight(it.A, it.Through, it.B) {
				it.Arc = false
			}
			if lay.Class == Stay {
				t.stays = append(t.stays, it)
			} else {
				t.items = append(t.items, it)
			}
		}
	}
	if n := len(t.items) + len(t.stays) + len(t.marks); n > maxLines {
		t.fail(0, "keep only the layers of the outline", "%d lines and points are more than the %d an outline may have", n, maxLines)
	}
}

func straight(a, m, b r3.Vec) bool {
	c, d := r3.Sub(b, a), r3.Sub(m, a)
	return r3.Norm(r3.Cross(c, d)) <= 1e-9*r3.Norm(c)*max(r3.Norm(c), r3.Norm(d))
}

func plural(n int) string {
	if n == 1 {
		return ""
	}
	return "s"
}

// snap joins ends that are closer than Snap.
func (t *tracer) snap() {
	type end struct {
		at   r3.Vec
		line int
		mark int
	}
	var ends []end
	for _, list := range [][]item{t.items, t.stays} {
		for _, it := range list {
			ends = append(ends, end{it.A, it.Line, -1}, end{it.B, it.Line, -1})
		}
	}
	for i, m := range t.marks {
		ends = append(ends, end{m.At, m.Line, i})
	}
	cell := max(t.Snap, 1e-9)
	key := func(v r3.Vec) [3]int64 {
		return [3]int64{int64(math.Floor(v.X / cell)), int64(math.Floor(v.Y / cell)), int64(math.Floor(v.Z / cell))}
	}
	// The first of the ends that are one point is where it is: an end joins
	// the nearest point there is.
	grid := map[[3]int64][]int{}
	of := make([]int, len(ends))
	for i, e := range ends {
		k := key(e.at)
		best, bestD := -1, t.Snap
		for dx := int64(-1); dx <= 1; dx++ {
			for dy := int64(-1); dy <= 1; dy++ {
				for dz := int64(-1); dz <= 1; dz++ {
					for _, n := range grid[[3]int64{k[0] + dx, k[1] + dy, k[2] + dz}] {
						d := r3.Norm(r3.Sub(t.nodes[n].at, e.at))
						if d <= bestD && (best < 0 || d < bestD) {
							best, bestD = n, d
						}
					}
				}
			}
		}
		if best < 0 {
			best = len(t.nodes)
			t.nodes = append(t.nodes, node{at: e.at, mark: -1, point: -1})
			grid[k] = append(grid[k], best)
		}
		of[i] = best
		if e.mark >= 0 {
			n := &t.nodes[best]
			if n.mark < 0 {
				n.mark = e.mark
			} else {
				t.warn(e.line, "remove one of them", "points of lines %d and %d are both at %s", t.marks[n.mark].Line, e.line, t.place(e.at))
			}
			t.atMark = append(t.atMark, best)
		}
	}
	for i := range t.items {
		t.items[i].a, t.items[i].b = of[2*i], of[2*i+1]
	}
	from := 2 * len(t.items)
	for i := range t.stays {
		t.stays[i].a, t.stays[i].b = of[from+2*i], of[from+2*i+1]
	}
	keep := func(list []item) []item {
		out := list[:0]
		for _, it := range list {
			if it.a == it.b {
				t.warn(it.Line, "", "a line of %s at %s is shorter than the snap of %s: left out", t.layers[it.layer].Name, t.place(it.A), t.length(t.Snap))
				continue
			}
			out = append(out, it)
		}
		return out
	}
	t.items, t.stays = keep(t.items), keep(t.stays)
	// Drawn ends go where their points are.
	for _, list := range [][]item{t.items, t.stays} {
		for i := range list {
			it := &list[i]
			a, b := t.nodes[it.a].at, t.nodes[it.b].at
			if it.Arc {
				d := r3.Scale(0.5, r3.Add(r3.Sub(a, it.A), r3.Sub(b, it.B)))
				it.Through = r3.Add(it.Through, d)
				it.Arc = !straight(a, it.Through, b)
			}
			it.A, it.B = a, b
		}
	}
}

// duplicates drops lines that are drawn twice.
func (t *tracer) duplicates() {
	seen := map[[2]int][]int{}
	out := t.items[:0]
	for _, it := range t.items {
		k := [2]int{min(it.a, it.b), max(it.a, it.b)}
		twin := -1
		for _, j := range seen[k] {
			o := out[j]
			if o.Arc == it.Arc && (!o.Arc || r3.Norm(r3.Sub(arcPoint(o.A, o.Through, o.B, 0.5), arcPoint(it.A, it.Through, it.B, 0.5))) <= 2*t.Snap) {
				twin = j
			}
		}
		if twin < 0 {
			seen[k] = append(seen[k], len(out))
			out = append(out, it)
			continue
		}
		o := &out[twin]
		where := fmt.Sprintf("from %s to %s", t.place(it.A), t.place(it.B))
		if o.layer != it.layer {
			t.fail(it.Line, "remove one of them", "the same line %s is on two layers, %s and %s", where, t.label(o), t.label(&it))
			continue
		}
		t.warn(it.Line, "", "the line %s is drawn twice, as %s and %s: one is left out", where, t.label(o), t.label(&it))
	}
	t.items = out
	kept := t.stays[:0]
	twice := map[[2]int]bool{}
	for _, it := range t.stays {
		k := [2]int{min(it.a, it.b), max(it.a, it.b)}
		if twice[k] {
			t.warn(it.Line, "", "a line of %s from %s to %s is drawn twice: one is left out", t.layers[it.layer].Name, t.place(it.A), t.place(it.B))
			continue
		}
		twice[k] = true
		kept = append(kept, it)
	}
	t.stays = kept
}

// lay draws the lines in plan and joins them to their nodes.
func (t *tracer) lay() {
	for i := range t.nodes {
		t.nodes[i].items, t.nodes[i].stays = nil, 0
	}
	for i := range t.items {
		it := &t.items[i]
		if apart(flat(it.A), flat(it.B)) <= t.Snap && !it.Arc {
			t.fail(it.Line, "masts and guys belong on a layer of that role", "a line of %s stands upright at %s: seen from above it has no length", t.layers[it.layer].Name, t.place(it.A))
			continue
		}
		it.path = planPath(it.A, it.Through, it.B, it.Arc)
		t.nodes[it.a].items = append(t.nodes[it.a].items, i)
		t.nodes[it.b].items = append(t.nodes[it.b].items, i)
	}
	for _, it := range t.stays {
		t.nodes[it.a].stays++
		t.nodes[it.b].stays++
	}
	if len(t.items) == 0 && !t.failed {
		var layers []string
		for _, l := range t.layers {
			if l.Class == Border || l.Class == Inner {
				layers = append(layers, l.Name)
			}
		}
		t.fail(0, "check the names of the layers", "there is no line on any layer of the outline (%s)", strings.Join(layers, ", "))
	}
}

// planPath lays a line in plan: an arc in pieces of about a degree and a half.
func planPath(a, m, b r3.Vec, arc bool) []xy {
	if !arc {
		return []xy{flat(a), flat(b)}
	}
	u, v := r3.Sub(a, m), r3.Sub(b, m)
	// The angle of the arc is twice what the angle at its middle lacks to 180°.
	angle := 2 * (math.Pi - math.Atan2(r3.Norm(r3.Cross(u, v)), r3.Dot(u, v)))
	n := int(min(240, max(8, math.Ceil(angle/0.026))))
	p := make([]xy, n+1)
	for i := range p {
		p[i] = flat(arcPoint(a, m, b, float64(i)/float64(n)))
	}
	p[0], p[n] = flat(a), flat(b)
	return p
}

// arcPoint returns the place at the part s of the circular arc from a through m
// to b.
func arcPoint(a, m, b r3.Vec, s float64) r3.Vec {
	u, v := r3.Sub(m, a), r3.Sub(b, a)
	w := r3.Cross(u, v)
	ww := r3.Norm2(w)
	if ww == 0 {
		return r3.Add(a, r3.Scale(s, v))
	}
	// From a to the centre of the circle through three points.
	c := r3.Scale(1/(2*ww), r3.Add(r3.Scale(r3.Norm2(u), r3.Cross(v, w)), r3.Scale(r3.Norm2(v), r3.Cross(w, u))))
	ex := r3.Unit(r3.Scale(-1, c))
	ey := r3.Cross(r3.Scale(1/math.Sqrt(ww), w), ex)
	end := r3.Sub(v, c)
	angle := math.Atan2(r3.Dot(end, ey), r3.Dot(end, ex))
	if angle <= 0 {
		angle += 2 * math.Pi
	}
	sin, cos := math.Sincos(angle * s)
	r := r3.Norm(c)
	return r3.Add(r3.Add(a, c), r3.Add(r3.Scale(r*cos, ex), r3.Scale(r*sin, ey)))
}

// corners finds the vertices through which a cable runs on, and makes edges of
// the lines between the others.
func (t *tracer) corners() {
	for i := range t.nodes {
		n := &t.nodes[i]
		if len(n.items) != 2 || n.mark >= 0 || n.stays > 0 {
			continue
		}
		p, q := &t.items[n.items[0]], &t.items[n.items[1]]
		if p.layer != q.layer || !t.layers[p.layer].Cable {
			continue
		}
		u, v := p.tangent(i), q.tangent(i)
		turn := math.Pi - math.Atan2(r3.Norm(r3.Cross(u, v)), r3.Dot(u, v))
		n.smooth = turn < t.Corner
	}
	for i := range t.items {
		it := &t.items[i]
		if it.edge >= 0 {
			continue
		}
		e := Edge{From: it.a, To: it.b, Layer: it.layer, Line: it.Line, Arc: it.Arc && !t.layers[it.layer].Cable, Through: it.Through}
		it.edge = len(t.out.Edges)
		merged := false
		for _, back := range []bool{false, true} {
			at := it.b
			if back {
				at = it.a
			}
			cur := i
			for t.nodes[at].smooth {
				n := t.nodes[at].items
				next := n[0]
				if next == cur {
					next = n[1]
				}
				if next == i {
					t.fail(it.Line, "draw it with corners that are held, lower corner, or make it fixed or a ring", "the cable of %s through %s has no corner", t.label(it), t.place(it.A))
					return
				}
				merged = true
				t.items[next].edge = it.edge
				at, cur = t.items[next].other(at), next
			}
			if back {
				e.From = at
			} else {
				e.To = at
			}
		}
		if e.From == e.To {
			t.fail(it.Line, "break it at another point", "the cable of %s starts and ends at the same corner %s", t.label(it), t.place(t.nodes[e.From].at))
			return
		}
		if merged {
			e.Arc = false
		}
		if !e.Arc {
			e.Through = r3.Vec{}
		}
		t.out.Edges = append(t.out.Edges, e)
	}
}

// tangent returns the direction in which a line leaves one of its nodes.
func (it *item) tangent(n int) r3.Vec {
	a, b := it.A, it.B
	if it.b == n {
		a, b = b, a
	}
	if !it.Arc {
		return r3.Sub(b, a)
	}
	return r3.Sub(arcPoint(a, it.Through, b, 1e-4), a)
}

// name makes points of the nodes that are left and names everything.
func (t *tracer) name() {
	number := make([]int, len(t.layers))
	give := func(n, layer, line int) int {
		at := &t.nodes[n]
		if at.point < 0 {
			number[layer]++
			at.point = len(t.out.Points)
			t.out.Points = append(t.out.Points, Point{Name: fmt.Sprintf("%s:%d", t.layers[layer].Name, number[layer]), At: at.at, Layer: layer, Line: line})
		}
		return at.point
	}
	for i, m := range t.marks {
		give(t.atMark[i], t.layer[i], m.Line)
	}
	edges := make([]int, len(t.layers))
	label := func(list []Edge) {
		for i := range list {
			e := &list[i]
			edges[e.Layer]++
			e.Name = fmt.Sprintf("%s:%d", t.layers[e.Layer].Name, edges[e.Layer])
			e.From, e.To = give(e.From, e.Layer, e.Line), give(e.To, e.Layer, e.Line)
		}
	}
	label(t.out.Edges)
	for _, it := range t.stays {
		e := Edge{From: it.a, To: it.b, Layer: it.layer, Line: it.Line}
		t.out.Stays = append(t.out.Stays, e)
	}
	label(t.out.Stays)
}

// Nearest returns the point nearest to v in plan and how far it is, with the
// distance of the next one.
func (o *Outline) Nearest(v r3.Vec) (point int, near, next float64) {
	point, near, next = -1, math.Inf(1), math.Inf(1)
	for i, p := range o.Points {
		d := apart(flat(p.At), flat(v))
		switch {
		case d < near:
			point, near, next = i, d, near
		case d < next:
			next = d
		}
	}
	return point, near, next
}

// Raise puts a point to height z and takes arcs that end there along.
func (o *Outline) Raise(point int, z float64) {
	d := z - o.Points[point].At.Z
	o.Points[point].At.Z = z
	for i := range o.Edges {
		if e := &o.Edges[i]; e.Arc && (e.From == point || e.To == point) {
			e.Through.Z += d / 2
		}
	}
}

// Place words a place in the unit of the drawing.
func (o *Outline) Place(v r3.Vec) string { return place(v, o.unit) }
