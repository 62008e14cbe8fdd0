package mesh

import (
	"errors"
	"math"
)

// delaunay is a triangulation of points in the plane that is Delaunay but for
// the segments it must contain (a constrained Delaunay triangulation). Points
// are added one by one, with edge flips (Lawson 1977); segments are put in as in
// segment.go.
//
// The first three points are far corners around everything.
type delaunay struct {
	p    []xy
	v    [][3]int32 // corners of a triangle, counter-clockwise
	n    [][3]int32 // neighbour across the side opposite corner i, −1 = none
	held [][3]bool  // side opposite corner i is a segment
	at   []int32    // per point: a triangle at it
	last int32      // where the next search starts
	todo []int32    // triangles whose side opposite corner 0 may need a flip

	flips int // so far: what building it took
}

var (
	errTwice = errors.New("two points at the same place")
	errTouch = errors.New("a segment passes through a point")
	errCross = errors.New("two segments cross")
)

// newDelaunay prepares for points in the box from lo to hi.
func newDelaunay(lo, hi xy) *delaunay {
	c := xy{(lo.x + hi.x) / 2, (lo.y + hi.y) / 2}
	r := 64 * max(hi.x-lo.x, hi.y-lo.y, math.SmallestNonzeroFloat64)
	return &delaunay{
		p:    []xy{{c.x - 2*r, c.y - r}, {c.x + 2*r, c.y - r}, {c.x, c.y + 2*r}},
		v:    [][3]int32{{0, 1, 2}},
		n:    [][3]int32{{-1, -1, -1}},
		held: make([][3]bool, 1),
		at:   []int32{0, 0, 0},
	}
}

const farthest = 1000

// locate walks to the triangle that holds q. side is −1 when q is inside it, or
// the side it lies on, or 3 when q is one of its corners. With stop set the walk
// ends at a held side in its way, and blocked is true; as it is after farthest
// steps, which lead along a needle to what lies outside of it.
func (d *delaunay) locate(q xy, from int32, stop bool) (t int32, side int, blocked bool) {
	t = from
	prev := int32(-1)
	for step := 0; step < 2*len(d.v)+8; step++ {
		if stop && step == farthest {
			return t, -1, true
		}
		side = -1
		next := int32(-1)
		// Start at a side that changes with the step, so that the walk cannot
		// go round in circles where the mesh is not Delaunay.
		for k := range 3 {
			i := (k + step) % 3
			a, b := d.v[t][(i+1)%3], d.v[t][(i+2)%3]
			if d.n[t][i] == prev && prev >= 0 {
				continue
			}
			o := orient(d.p[a], d.p[b], q)
			if o < 0 {
				if stop && d.held[t][i] {
					return t, i, true
				}
				next = d.n[t][i]
				break
			}
		}
		if next < 0 {
			break
		}
		prev, t = t, next
		if step == 2*len(d.v)+7 {
			t = d.search(q) // no walk is that long
		}
	}
	zero := 0
	for i := range 3 {
		if orient(d.p[d.v[t][(i+1)%3]], d.p[d.v[t][(i+2)%3]], q) == 0 {
			side = i
			zero++
		}
	}
	if zero > 1 {
		return t, 3, false
	}
	return t, side, false
}

// search looks for q in every triangle.
func (d *delaunay) search(q xy) int32 {
	for t, v := range d.v {
		if orient(d.p[v[0]], d.p[v[1]], q) >= 0 && orient(d.p[v[1]], d.p[v[2]], q) >= 0 && orient(d.p[v[2]], d.p[v[0]], q) >= 0 {
			return int32(t)
		}
	}
	return 0
}

// insert adds q, which locate has found in t on side, and returns its number.
func (d *delaunay) insert(q xy, t int32, side int) int32 {
	i := int32(len(d.p))
	d.p = append(d.p, q)
	d.at = append(d.at, t)
	d.place(i, t, side)
	return i
}

// place makes point i a corner of triangles; locate has found it in t on side.
func (d *delaunay) place(i, t int32, side int) {
	if side < 0 {
		d.splitInside(i, t)
	} else {
		d.splitSide(i, t, side)
	}
	d.legalise()
	d.last = d.at[i]
}

// addAll adds points along lines, before any segment is held: every 2ᵏth of them
// first, then those half-way between, and so on. In the order of the lines a
// long side would see all points of the one opposite again and again, which
// takes quadratic time. Of two at one place it returns the later.
func (d *delaunay) addAll(p []xy) (bad int, err error) {
	n := len(p)
	d.p = append(d.p, p...)
	d.at = append(d.at, make([]int32, n)...)
	top := 1
	for 2*top < n {
		top *= 2
	}
	for step := top; step > 0; step /= 2 {
		for i := 0; i < n; i += step {
			if step < top && i%(2*step) == 0 {
				continue
			}
			t, side, _ := d.locate(p[i], d.last, false)
			if side == 3 {
				for _, j := range d.v[t] {
					if d.p[j] == p[i] {
						return max(i, int(j)-3), errTwice
					}
				}
			}
			d.place(int32(i+3), t, side)
		}
	}
	return 0, nil
}

func (d *delaunay) newTriangle() int32 {
	d.v = append(d.v, [3]int32{})
	d.n = append(d.n, [3]int32{-1, -1, -1})
	d.held = append(d.held, [3]bool{})
	return int32(len(d.v) - 1)
}

// set makes t the triangle q, a, b whose side a–b has neighbour n.
func (d *delaunay) set(t, q, a, b, n int32, held bool) {
	d.v[t] = [3]int32{q, a, b}
	d.n[t] = [3]int32{n, -1, -1}
	d.held[t] = [3]bool{held, false, false}
	d.at[q], d.at[a], d.at[b] = t, t, t
	if n >= 0 {
		d.n[n][d.sideTo(n, a, b)] = t
	}
}

// sideTo returns the side of t with the ends a and b.
func (d *delaunay) sideTo(t, a, b int32) int {
	for i, c := range d.v[t] {
		if c != a && c != b {
			return i
		}
	}
	return 0
}

func (d *delaunay) splitInside(i, t int32) {
	v, n, h := d.v[t], d.n[t], d.held[t]
	u, w := d.newTriangle(), d.newTriangle()
	d.set(t, i, v[0], v[1], n[2], h[2])
	d.set(u, i, v[1], v[2], n[0], h[0])
	d.set(w, i, v[2], v[0], n[1], h[1])
	// Corner 1 of t is opposite the side to w, corner 2 … see set: (q, a, b).
	d.n[t][1], d.n[t][2] = u, w
	d.n[u][1], d.n[u][2] = w, t
	d.n[w][1], d.n[w][2] = t, u
	d.todo = append(d.todo, t, u, w)
}

func (d *delaunay) splitSide(i, t int32, side int) {
	a, b, c := d.v[t][side], d.v[t][(side+1)%3], d.v[t][(side+2)%3]
	nb, nc := d.n[t][(side+1)%3], d.n[t][(side+2)%3]
	hb, hc := d.held[t][(side+1)%3], d.held[t][(side+2)%3]
	o := d.n[t][side]
	keep := d.held[t][side]
	t2 := d.newTriangle()
	// t: a, b, i and t2: c, a, i with i first.
	d.set(t, i, a, b, nc, hc)
	d.set(t2, i, c, a, nb, hb)
	d.n[t][2], d.n[t2][1] = t2, t
	d.todo = append(d.todo, t, t2)
	if o < 0 {
		d.held[t][1], d.held[t2][2] = keep, keep
		return
	}
	k := d.sideTo(o, b, c)
	e := d.v[o][k] // o: e, c, b
	oc, ob := d.n[o][d.sideTo(o, e, b)], d.n[o][d.sideTo(o, e, c)]
	hoc, hob := d.held[o][d.sideTo(o, e, b)], d.held[o][d.sideTo(o, e, c)]
	o2 := d.newTriangle()
	d.set(o, i, b, e, oc, hoc)
	d.set(o2, i, e, c, ob, hob)
	d.n[o][1], d.n[o2][2] = o2, o
	// Across the two halves of the old side b–c.
	d.n[t][1], d.n[o][2] = o, t
	d.n[t2][2], d.n[o2][1] = o2, t2
	d.held[t][1], d.held[o][2] = keep, keep
	d.held[t2][2], d.held[o2][1] = keep, keep
	d.todo = append(d.todo, o, o2)
}

// legalise flips sides opposite the newest point until all are Delaunay.
func (d *delaunay) legalise() {
	for len(d.todo) > 0 {
		t := d.todo[len(d.todo)-1]
		d.todo = d.todo[:len(d.todo)-1]
		o := d.n[t][0]
		if o < 0 || d.held[t][0] {
			continue
		}
		q, a, b := d.v[t][0], d.v[t][1], d.v[t][2]
		e := d.v[o][d.sideTo(o, a, b)]
		if inCircle(d.p[q], d.p[a], d.p[b], d.p[e]) > 0 {
			d.flip(t, 0)
			d.todo = append(d.todo, t, o)
		}
	}
}

// flip replaces the diagonal opposite corner i of t. Afterwards t and the old
// neighbour o both have that corner first: t = (q, a, e), o = (q, e, b).
func (d *delaunay) flip(t int32, i int) {
	d.flips++
	o := d.n[t][i]
	q, a, b := d.v[t][i], d.v[t][(i+1)%3], d.v[t][(i+2)%3]
	k := d.sideTo(o, a, b)
	e := d.v[o][k]
	// Outer sides: of t b–q and q–a; of o a–e and e–b.
	nbq, hbq := d.n[t][(i+1)%3], d.held[t][(i+1)%3]
	nqa, hqa := d.n[t][(i+2)%3], d.held[t][(i+2)%3]
	ka, kb := d.sideTo(o, e, b), d.sideTo(o, a, e)
	neb, heb := d.n[o][ka], d.held[o][ka]
	nae, hae := d.n[o][kb], d.held[o][kb]
	d.set(t, q, a, e, nae, hae)
	d.set(o, q, e, b, neb, heb)
	d.n[t][1], d.n[o][2] = o, t
	d.n[t][2], d.held[t][2] = nqa, hqa
	d.n[o][1], d.held[o][1] = nbq, hbq
	if nqa >= 0 {
		d.n[nqa][d.sideTo(nqa, q, a)] = t
	}
	if nbq >= 0 {
		d.n[nbq][d.sideTo(nbq, b, q)] = o
	}
}

// edge returns the triangle and side between points a and b, ok false when they
// are not joined.
func (d *delaunay) edge(a, b int32) (t int32, side int, ok bool) {
	// Turn around a; around a far corner, which has an end to that, both ways.
	for turn := 1; turn <= 2; turn++ {
		for t = d.at[a]; ; {
			i := d.corner(t, a)
			if d.v[t][(i+1)%3] == b {
				return t, (i + 2) % 3, true
			}
			if d.v[t][(i+2)%3] == b {
				return t, (i + 1) % 3, true
			}
			if t = d.n[t][(i+turn)%3]; t == d.at[a] {
				return -1, 0, false
			}
			if t < 0 {
				break
			}
		}
	}
	return -1, 0, false
}

func (d *delaunay) corner(t, a int32) int {
	for i, c := range d.v[t] {
		if c == a {
			return i
		}
	}
	return 0
}

func (d *delaunay) mark(t int32, side int) {
	d.held[t][side] = true
	if o := d.n[t][side]; o >= 0 {
		a, b := d.v[t][(side+1)%3], d.v[t][(side+2)%3]
		d.held[o][d.sideTo(o, a, b)] = true
	}
}

// settle flips until every side that is not held is Delaunay.
func (d *delaunay) settle() {
	for t := range d.v {
		d.todo = append(d.todo[:0], int32(t))
		for len(d.todo) > 0 {
			t := d.todo[len(d.todo)-1]
			d.todo = d.todo[:len(d.todo)-1]
			for i := range 3 {
				o := d.n[t][i]
				if o < 0 || d.held[t][i] {
					continue
				}
				q, a, b := d.v[t][i], d.v[t][(i+1)%3], d.v[t][(i+2)%3]
				e := d.v[o][d.sideTo(o, a, b)]
				if inCircle(d.p[q], d.p[a], d.p[b], d.p[e]) > 0 {
					d.flip(t, i)
					d.todo = append(d.todo, t, o)
					break
				}
			}
		}
	}
}

// inside marks the triangles that an odd number of held lines encloses.
func (d *delaunay) inside() []bool {
	const unseen = 2
	depth := make([]uint8, len(d.v))
	for t := range depth {
		depth[t] = unseen
	}
	start := d.at[0]
	depth[start] = 0
	queue := []int32{start}
	for h := 0; h < len(queue); h++ {
		t := queue[h]
		for i, o := range d.n[t] {
			if o < 0 || depth[o] != unseen {
				continue
			}
			depth[o] = depth[t]
			if d.held[t][i] {
				depth[o] ^= 1
			}
			queue = append(queue, o)
		}
	}
	in := make([]bool, len(d.v))
	for t := range in {
		in[t] = depth[t] == 1
	}
	return in
}

// around calls visit for each triangle at point a, with the corners that follow
// a in it. Points inside the triangulation only, not the far corners.
func (d *delaunay) around(a int32, visit func(t, next, after int32)) {
	for start, t := d.at[a], d.at[a]; ; {
		k := d.corner(t, a)
		visit(t, d.v[t][(k+1)%3], d.v[t][(k+2)%3])
		if t = d.n[t][(k+1)%3]; t == start || t < 0 {
			return
		}
	}
}
