package outline

import (
	"cmp"
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"
)

// piece is a straight part of a line in plan.
type piece struct {
	item int
	a, b xy
}

// sieve finds pieces that are near each other: square cells over the plan, each
// with the pieces that pass through it.
type sieve struct {
	lo     xy
	size   float64
	nx, ny int
	cell   [][]int32
}

func newSieve(p []piece, margin float64) *sieve {
	lo, hi := p[0].a, p[0].a
	for _, q := range p {
		for _, v := range []xy{q.a, q.b} {
			lo = xy{min(lo.x, v.x), min(lo.y, v.y)}
			hi = xy{max(hi.x, v.x), max(hi.y, v.y)}
		}
	}
	lo = xy{lo.x - margin, lo.y - margin}
	w, h := hi.x+margin-lo.x, hi.y+margin-lo.y
	s := &sieve{lo: lo}
	s.size = max(math.Sqrt(w*h/float64(len(p))), max(w, h)/512, 4*margin, 1e-9)
	s.nx, s.ny = int(w/s.size)+1, int(h/s.size)+1
	s.cell = make([][]int32, s.nx*s.ny)
	for i, q := range p {
		s.visit(q, margin, func(c int) { s.cell[c] = append(s.cell[c], int32(i)) })
	}
	return s
}

func (s *sieve) column(x float64) int { return min(s.nx-1, max(0, int((x-s.lo.x)/s.size))) }
func (s *sieve) row(y float64) int    { return min(s.ny-1, max(0, int((y-s.lo.y)/s.size))) }

// visit calls do for every cell that a piece comes closer to than margin.
func (s *sieve) visit(q piece, margin float64, do func(cell int)) {
	r0, r1 := s.row(min(q.a.y, q.b.y)-margin), s.row(max(q.a.y, q.b.y)+margin)
	for r := r0; r <= r1; r++ {
		x0, x1 := min(q.a.x, q.b.x), max(q.a.x, q.b.x)
		if dy := q.b.y - q.a.y; dy != 0 {
			at := func(y float64) float64 {
				return q.a.x + (q.b.x-q.a.x)*min(1, max(0, (y-q.a.y)/dy))
			}
			y := s.lo.y + float64(r)*s.size
			u, v := at(y-margin), at(y+s.size+margin)
			x0, x1 = min(u, v), max(u, v)
		}
		for c := s.column(x0 - margin); c <= s.column(x1+margin); c++ {
			do(r*s.nx + c)
		}
	}
}

const maxTests = 20_000_000

// meetings finds lines that meet elsewhere than at their ends. Lines that are
// held all along are broken where others end on them.
func (t *tracer) meetings() {
	for range 3 { // a line broken may meet others at its new ends
		cuts := t.meet()
		if t.failed || len(cuts) == 0 {
			return
		}
		t.cut(cuts)
		if t.duplicates(); t.failed {
			return
		}
		if t.lay(); t.failed {
			return
		}
	}
	t.fail(0, "break lines where others end on them", "lines that end on each other could not be broken")
}

// cut is a place where a line is to be broken.
type cut struct {
	item, node int
	at         float64 // the part of the line before it
}

// cut breaks lines at nodes, in order along each.
func (t *tracer) cut(cuts []cut) {
	slices.SortFunc(cuts, func(a, b cut) int {
		return cmp.Or(cmp.Compare(a.item, b.item), cmp.Compare(a.at, b.at), cmp.Compare(a.node, b.node))
	})
	var out []item
	for i, it := range t.items {
		from, s := it.a, 0.0
		add := func(to int, e float64) {
			n := it
			n.path = nil
			n.a, n.b = from, to
			n.A, n.B = t.nodes[from].at, t.nodes[to].at
			if it.Arc {
				n.Through = arcPoint(it.A, it.Through, it.B, (s+e)/2)
				n.Arc = !straight(n.A, n.Through, n.B)
			}
			if from != to {
				out = append(out, n)
			}
			from, s = to, e
		}
		for ; len(cuts) > 0 && cuts[0].item == i; cuts = cuts[1:] {
			c := cuts[0]
			if c.node != from {
				add(c.node, c.at)
			}
			on := &t.nodes[c.node]
			by := "a point is"
			if len(on.items) > 0 {
				by = t.label(&t.items[on.items[0]]) + " ends"
			}
			t.warn(it.Line, "", "%s is broken at %s, where %s", t.label(&it), t.place(on.at), by)
		}
		add(it.b, 1)
	}
	t.items = out
}

// meet returns where lines are to be broken, and fails where they may not be.
func (t *tracer) meet() (cuts []cut) {
	var p []piece
	for i, it := range t.items {
		for k := 1; k < len(it.path); k++ {
			p = append(p, piece{i, it.path[k-1], it.path[k]})
		}
	}
	margin := 1.01 * t.Snap
	s := newSieve(p, margin)
	said := map[[2]int]bool{}
	tests := 0
	over := func() bool {
		if tests++; tests > maxTests && !t.failed {
			t.fail(0, "keep only the layers of the outline", "too many lines lie close together")
		}
		return tests > maxTests
	}
	// Ends of lines, and points, that touch other lines.
	for n := range t.nodes {
		at := flat(t.nodes[n].at)
		if len(t.nodes[n].items) == 0 && t.nodes[n].mark < 0 {
			continue
		}
		for _, k := range s.cell[s.row(at.y)*s.nx+s.column(at.x)] {
			if over() {
				return nil
			}
			q := p[k]
			it := &t.items[q.item]
			if it.a == n || it.b == n || distance(at, q.a, q.b) > t.Snap || said[[2]int{-1 - n, q.item}] {
				continue
			}
			said[[2]int{-1 - n, q.item}] = true
			if u, on := it.cutAt(t.nodes[n].at, q, t.Snap); on && !t.layers[it.layer].Cable && !t.layers[it.layer].Whole {
				cuts = append(cuts, cut{q.item, n, u})
				continue
			}
			t.touches(n, it)
		}
	}
	if len(cuts) > 0 || t.failed {
		return cuts
	}
	// Lines that cross.
	for _, c := range s.cell {
		for i, k := range c {
			for _, l := range c[i+1:] {
				if over() {
					return nil
				}
				a, b := p[min(k, l)], p[max(k, l)]
				key := [2]int{a.item, b.item}
				if a.item == b.item || said[key] {
					continue
				}
				x, u, ok := crossing(a, b)
				if !ok || t.atEnd(&t.items[a.item], x) || t.atEnd(&t.items[b.item], x) {
					continue
				}
				said[key] = true
				m, n := &t.items[a.item], &t.items[b.item]
				t.fail(n.Line, "break both lines there, or draw one of them elsewhere", "%s and %s cross at %s", t.label(m), t.label(n), t.place(r3.Vec{X: x.x, Y: x.y, Z: m.heightAt(a, u)}))
			}
		}
	}
	return nil
}

// cutAt returns the part of a line before v, which is near its piece q in plan;
// on says that it is near in space, too, and not at an end.
func (it *item) cutAt(v r3.Vec, q piece, snap float64) (u float64, on bool) {
	k, n := 0, len(it.path)-1
	for it.path[k] != q.a {
		k++
	}
	dx, dy := q.b.x-q.a.x, q.b.y-q.a.y
	s := 0.0
	if l := dx*dx + dy*dy; l > 0 {
		s = min(1, max(0, ((v.X-q.a.x)*dx+(v.Y-q.a.y)*dy)/l))
	}
	u = (float64(k) + s) / float64(n)
	at := r3.Add(it.A, r3.Scale(u, r3.Sub(it.B, it.A)))
	if it.Arc {
		at = arcPoint(it.A, it.Through, it.B, u)
	}
	return u, apart3(at, v) <= 2*snap && apart3(v, it.A) > snap && apart3(v, it.B) > snap
}

// heightAt returns the height of a line at the part u of one of its pieces.
func (it *item) heightAt(p piece, u float64) float64 {
	if !it.Arc {
		return it.A.Z + u*(it.B.Z-it.A.Z)
	}
	for k := 1; k < len(it.path); k++ {
		if it.path[k-1] == p.a && it.path[k] == p.b {
			return arcPoint(it.A, it.Through, it.B, (float64(k-1)+u)/float64(len(it.path)-1)).Z
		}
	}
	return it.A.Z
}

// touches reports that a line ends, or a point is, between the ends of another.
func (t *tracer) touches(n int, it *item) {
	at := t.nodes[n].at
	for _, e := range []int{it.a, it.b} {
		o := t.nodes[e].at
		if apart(flat(at), flat(o)) > t.Snap {
			continue
		}
		if len(t.nodes[n].items) == 0 || e < n || t.above[[2]int{n, e}] {
			return // a point above or below, or said already
		}
		if t.above == nil {
			t.above = map[[2]int]bool{}
		}
		t.above[[2]int{n, e}] = true
		own := &t.items[t.nodes[n].items[0]]
		t.fail(own.Line, "draw both ends at the same height", "%s and %s end above each other at %s: one is %s higher", t.label(it), t.label(own), t.place(at), t.length(math.Abs(at.Z-o.Z)))
		return
	}
	if len(t.nodes[n].items) == 0 {
		m := t.marks[t.nodes[n].mark]
		t.fail(m.Line, "break the line at the point", "the point of %s (line %d) at %s lies on %s between its ends", m.Layer, m.Line, t.place(at), t.label(it))
		return
	}
	own := &t.items[t.nodes[n].items[0]]
	t.fail(own.Line, "break the line there, so that both end at one point", "%s ends at %s on %s, between its ends", t.label(own), t.place(at), t.label(it))
}

// atEnd reports whether a place in plan is at an end of a line.
func (t *tracer) atEnd(it *item, x xy) bool {
	return apart(x, flat(it.A)) <= t.Snap || apart(x, flat(it.B)) <= t.Snap
}

// distance from p to the segment from a to b.
func distance(p, a, b xy) float64 {
	dx, dy := b.x-a.x, b.y-a.y
	s := 0.0
	if l := dx*dx + dy*dy; l > 0 {
		s = min(1, max(0, ((p.x-a.x)*dx+(p.y-a.y)*dy)/l))
	}
	return math.Hypot(a.x+s*dx-p.x, a.y+s*dy-p.y)
}

// crossing returns where two pieces cross, and the part of the first.
func crossing(p, q piece) (x xy, u float64, ok bool) {
	ax, ay, bx, by := p.b.x-p.a.x, p.b.y-p.a.y, q.b.x-q.a.x, q.b.y-q.a.y
	det := ax*by - ay*bx
	if math.Abs(det) <= 1e-12*math.Hypot(ax, ay)*math.Hypot(bx, by) {
		return xy{}, 0, false // parallel: their ends touch if they meet
	}
	cx, cy := q.a.x-p.a.x, q.a.y-p.a.y
	u = (cx*by - cy*bx) / det
	v := (cx*ay - cy*ax) / det
	if u < 0 || u > 1 || v < 0 || v > 1 {
		return xy{}, 0, false
	}
	return xy{p.a.x + u*ax, p.a.y + u*ay}, u, true
}

func apart3(a, b r3.Vec) float64 { return r3.Norm(r3.Sub(a, b)) }
