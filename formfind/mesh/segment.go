package mesh

// hold makes the segment a–b part of the triangulation: the triangles that it
// crosses are taken away, and what they leave on either side is filled anew.
// Neither side is Delaunay then; settle makes it so.
func (d *delaunay) hold(a, b int32) error {
	if t, side, ok := d.edge(a, b); ok {
		d.mark(t, side)
		return nil
	}
	t, i, err := d.leave(a, b)
	if err != nil {
		return err
	}
	left, right, gone, err := d.crossed(a, b, t, i)
	if err != nil {
		return err
	}
	fresh := cover(d.p, left, -1, nil)
	fresh = cover(d.p, right, 1, fresh)
	if len(fresh) != len(gone) {
		return errCross // chains that are not seen from the segment: never
	}
	// Sides of the new triangles, each with the one or two that have it.
	type place struct {
		t    int32
		side int
	}
	sides := make(map[[2]int32][2]place, 2*len(fresh))
	key := func(u, w int32) [2]int32 { return [2]int32{min(u, w), max(u, w)} }
	for k, v := range fresh {
		t := gone[k]
		d.v[t], d.n[t], d.held[t] = v, [3]int32{-1, -1, -1}, [3]bool{}
		for i := range 3 {
			d.at[v[i]] = t
			s := key(v[(i+1)%3], v[(i+2)%3])
			p, twice := sides[s]
			if !twice {
				sides[s] = [2]place{{t, i}, {-1, 0}}
				continue
			}
			p[1] = place{t, i}
			sides[s] = p
			d.n[t][i], d.n[p[0].t][p[0].side] = p[0].t, t
		}
	}
	for _, chain := range [2][]outer{left, right} {
		for k := 1; k < len(chain); k++ {
			u, w, o := chain[k-1].v, chain[k].v, chain[k]
			p := sides[key(u, w)]
			d.held[p[0].t][p[0].side] = o.held
			if p[1].t >= 0 { // a side with triangles that were crossed on both its sides
				d.held[p[1].t][p[1].side] = o.held
				continue
			}
			d.n[p[0].t][p[0].side] = o.n
			if o.n >= 0 {
				d.n[o.n][d.sideTo(o.n, u, w)] = p[0].t
			}
		}
	}
	base := sides[key(a, b)]
	d.mark(base[0].t, base[0].side)
	return nil
}

// leave finds the triangle at a that the segment to b leaves through the side
// opposite its corner i, which is a.
func (d *delaunay) leave(a, b int32) (t int32, i int, err error) {
	start := d.at[a]
	for t = start; ; {
		i = d.corner(t, a)
		u, w := d.v[t][(i+1)%3], d.v[t][(i+2)%3]
		ou, ow := orient(d.p[a], d.p[b], d.p[u]), orient(d.p[a], d.p[b], d.p[w])
		ahead := func(k int32) bool {
			return (d.p[k].x-d.p[a].x)*(d.p[b].x-d.p[a].x)+(d.p[k].y-d.p[a].y)*(d.p[b].y-d.p[a].y) > 0
		}
		if ou == 0 && ahead(u) || ow == 0 && ahead(w) {
			return t, i, errTouch
		}
		if ou < 0 && ow > 0 {
			return t, i, nil
		}
		if t = d.n[t][(i+1)%3]; t < 0 || t == start {
			return t, i, errCross
		}
	}
}

// outer is a point beside a segment, and what lies beyond the side to it from the
// point before.
type outer struct {
	v, n int32
	held bool
}

// crossed lists the triangles between a and b, and the points left and right of
// the segment in their order from a to b. It changes nothing.
func (d *delaunay) crossed(a, b, t int32, i int) (left, right []outer, gone []int32, err error) {
	beyond := func(v, t int32, side int) outer { return outer{v, d.n[t][side], d.held[t][side]} }
	u, w := d.v[t][(i+1)%3], d.v[t][(i+2)%3]
	right = []outer{{v: a}, beyond(u, t, (i+2)%3)}
	left = []outer{{v: a}, beyond(w, t, (i+1)%3)}
	gone = []int32{t}
	for {
		if d.held[t][i] {
			return nil, nil, nil, errCross
		}
		o := d.n[t][i]
		gone = append(gone, o)
		e := d.v[o][d.sideTo(o, u, w)]
		atU, atW := d.corner(o, u), d.corner(o, w)
		if e == b {
			return append(left, beyond(b, o, atU)), append(right, beyond(b, o, atW)), gone, nil
		}
		switch side := orient(d.p[a], d.p[b], d.p[e]); {
		case side == 0:
			return nil, nil, nil, errTouch
		case side > 0:
			left = append(left, beyond(e, o, atU))
			w, t, i = e, o, atW
		default:
			right = append(right, beyond(e, o, atW))
			u, t, i = e, o, atU
		}
	}
}

// cover appends triangles between a chain of points and the segment from its
// first to its last, all of which see the segment: corners that bend towards it
// are cut off as the chain is walked (Graham's scan, which fills a polygon that is
// seen from one of its sides: Toussaint and Avis 1982). bend is −1 for a chain on
// the left of the segment and 1 for one on the right.
func cover(p []xy, chain []outer, bend float64, fresh [][3]int32) [][3]int32 {
	var stack []int32
	for _, c := range chain {
		v := c.v
		for len(stack) > 1 {
			o, q := stack[len(stack)-2], stack[len(stack)-1]
			if !(bend*orient(p[o], p[q], p[v]) > 0) {
				break
			}
			if bend < 0 {
				fresh = append(fresh, [3]int32{o, v, q})
			} else {
				fresh = append(fresh, [3]int32{o, q, v})
			}
			stack = stack[:len(stack)-1]
		}
		stack = append(stack, v)
	}
	return fresh
}
