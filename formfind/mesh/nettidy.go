package mesh

import "math"

// tidy removes from the lines of a net what merging has made useless: links that
// have shrunk, that double another, run along the boundary or leave the net; and
// crossings with fewer than three links: a line goes straight on there, or ends
// before. That may make others useless. In each round only what the one before
// has touched is looked at.
func (b *builder) tidy(net *laidNet) {
	t := b.newTidier(net)
	for len(t.fresh) > 0 || len(t.touched) > 0 {
		for _, r := range t.fresh {
			t.check(r)
		}
		t.fresh = t.fresh[:0]
		weak := t.weak[:0]
		for _, p := range t.touched {
			t.isTouched[p] = false
			if t.links[p] < 3 {
				weak = append(weak, p)
			}
		}
		t.weak, t.touched = weak, t.touched[:0]
		// Which go on straight is known before any is removed.
		straight := make([]bool, len(weak))
		for k, p := range weak {
			straight[k] = t.links[p] == 2
		}
		for k, p := range weak {
			for _, r := range t.at[p] {
				if r >= 0 {
					t.remove(r, straight[k])
				}
			}
			t.at[p] = [3]int32{-1, -1, -1}
		}
	}
	net.chains = t.chains()
	for p := range net.keep {
		net.keep[p] = t.links[p] > 2
	}
}

// tidier holds the lines of a net as chains of records, one a stop of a line.
type tidier struct {
	b    *builder
	net  *laidNet
	stop []record
	at   [][3]int32 // per crossing: its records by family, −1 = none
	// Pairs of places that are linked, but for links between two crossings,
	// which are one line's alone.
	seen      map[[2]int]bool
	links     []int8 // per crossing
	fresh     []int32
	touched   []int32 // crossings whose links have changed
	isTouched []bool
	weak      []int32
	base      []int // see rimKey
	keys      int
	cross     []onRim
}

type record struct {
	stop       int32
	prev, next int32 // −1 = none
	family     int8
	long       bool // the link to the next spans a crossing that was left out
	good       bool // the link to the next was looked at and counted
}

func (b *builder) newTidier(net *laidNet) *tidier {
	n := len(net.lat.at)
	t := &tidier{b: b, net: net, seen: map[[2]int]bool{}, at: make([][3]int32, n), links: make([]int8, n), isTouched: make([]bool, n), base: make([]int, len(b.m.Edges))}
	total := 0
	for e := range t.base {
		t.base[e] = total
		total += b.count[e]
	}
	t.keys = len(b.m.Points) + total
	for p := range t.at {
		t.at[p] = [3]int32{-1, -1, -1}
	}
	for _, c := range net.chains {
		for k, s := range c.stops {
			r := int32(len(t.stop))
			rec := record{stop: s, prev: -1, next: -1, family: int8(c.family)}
			if k > 0 {
				rec.prev = r - 1
				t.stop[r-1].next = r
				t.stop[r-1].long = c.long != nil && c.long[k-1]
				t.fresh = append(t.fresh, r-1)
			}
			t.stop = append(t.stop, rec)
			if s >= 0 {
				t.at[s][c.family] = r
				t.touch(s)
			}
		}
	}
	return t
}

func (t *tidier) touch(s int32) {
	if s >= 0 && !t.isTouched[s] {
		t.isTouched[s] = true
		t.touched = append(t.touched, s)
	}
}

// pair is the key of a link; ok is false for one between crossings.
func (t *tidier) pair(s, u int32) (key [2]int, ok bool) {
	if s >= 0 && u >= 0 {
		return key, false
	}
	of := func(s int32) int {
		if s >= 0 {
			return t.keys + int(s)
		}
		return t.b.rimKey(t.b.arrival[-1-s], t.base)
	}
	a, z := of(s), of(u)
	return [2]int{min(a, z), max(a, z)}, true
}

// check counts the link from record r to the next, or cuts it.
func (t *tidier) check(r int32) {
	rec := &t.stop[r]
	if rec.next < 0 || rec.good {
		return
	}
	s, u := rec.stop, t.stop[rec.next].stop
	if key, ok := t.pair(s, u); ok {
		if key[0] == key[1] || t.seen[key] || !t.useful(s, u) {
			t.stop[rec.next].prev, rec.next = -1, -1
			t.touch(s)
			t.touch(u)
			return
		}
		t.seen[key] = true
	}
	rec.good = true
	for _, x := range [2]int32{s, u} {
		if x >= 0 {
			t.links[x]++
		}
	}
}

// cut takes the link from record r to the next away.
func (t *tidier) cut(r int32) {
	rec := &t.stop[r]
	if rec.good {
		rec.good = false
		s, u := rec.stop, t.stop[rec.next].stop
		if key, ok := t.pair(s, u); ok {
			delete(t.seen, key)
		}
		for _, x := range [2]int32{s, u} {
			if x >= 0 {
				t.links[x]--
				t.touch(x)
			}
		}
	}
	t.stop[rec.next].prev, rec.next = -1, -1
}

// remove takes record r out of its line, which goes on straight or ends.
func (t *tidier) remove(r int32, straight bool) {
	prev, next := t.stop[r].prev, t.stop[r].next
	if prev >= 0 {
		t.cut(prev)
	}
	if next >= 0 {
		t.cut(r)
	}
	if straight && prev >= 0 && next >= 0 {
		t.stop[prev].next, t.stop[prev].long = next, true
		t.stop[next].prev = prev
		t.fresh = append(t.fresh, prev)
	}
	t.stop[r].stop = gone
}

// gone is the stop of a record that was taken out.
const gone = math.MinInt32

// chains lists the lines that are left.
func (t *tidier) chains() []chainOfStops {
	var list []chainOfStops
	for r := range t.stop {
		rec := &t.stop[r]
		if rec.stop == gone || rec.prev >= 0 || rec.next < 0 {
			continue
		}
		c := chainOfStops{family: int(rec.family), stops: []int32{rec.stop}}
		for rec.next >= 0 {
			c.long = append(c.long, rec.long)
			rec = &t.stop[rec.next]
			c.stops = append(c.stops, rec.stop)
		}
		list = append(list, c)
	}
	return list
}

// place returns where a stop is.
func (t *tidier) place(s int32) xy {
	if s >= 0 {
		return t.net.lat.at[s]
	}
	a := t.b.arrival[-1-s]
	return t.net.rim.drop(t.b.onEdge(a.edge, t.b.nodeAt(a.edge, a.node), t.net))
}

// useful reports whether a link that ends on the boundary has length, is not
// beside the boundary and does not leave the net.
func (t *tidier) useful(s, u int32) bool {
	r := t.net.rim
	p, q := t.place(s), t.place(u)
	length := math.Hypot(q.x-p.x, q.y-p.y)
	if s < 0 && u < 0 {
		m := xy{(p.x + q.x) / 2, (p.y + q.y) / 2}
		if length < t.net.least || !r.inside(m) {
			return false
		}
		if on, _, near := r.nearest(m); near && on.d < 0.2*length {
			return false
		}
	}
	const touch = 0.02
	t.cross = r.crossings(p, q, t.cross)
	for _, c := range t.cross {
		if (s >= 0 || c.d > touch) && (u >= 0 || c.d < 1-touch) {
			return false
		}
	}
	return true
}
