package mesh

import "math"

// Exact arithmetic on expansions (Priest 1991; Shewchuk 1997): a number is held
// as a sum of float64 that do not overlap, the smallest first, without zeros. Sums
// and products are exact as long as nothing over- or underflows, which
// expandable makes sure of.

// expandable reports whether the predicates below are exact on these points: no
// bit of a coordinate is below 10⁻³⁰·2⁻⁵³ > 10⁻⁴⁶ nor above 10⁵⁰, so that no bit
// of a product of four lies below 10⁻¹⁸⁴ and no sum above 10²⁰².
func expandable(p ...xy) bool {
	for _, q := range p {
		for _, v := range [2]float64{math.Abs(q.x), math.Abs(q.y)} {
			if !(v == 0 || v >= 1e-30 && v <= 1e50) {
				return false
			}
		}
	}
	return true
}

// twoSum returns a+b and the rounding error of it (Knuth 1969).
func twoSum(a, b float64) (s, e float64) {
	s = a + b
	bb := s - a
	return s, (a - (s - bb)) + (b - bb)
}

// twoProduct returns a·b and the rounding error of it.
func twoProduct(a, b float64) (p, e float64) {
	p = float64(a * b)
	return p, math.FMA(a, b, -p)
}

// difference appends a−b.
func difference(h []float64, a, b float64) []float64 {
	s, e := twoSum(a, -b)
	return pair(h, s, e)
}

func pair(h []float64, s, e float64) []float64 {
	if e != 0 {
		h = append(h, e)
	}
	if s != 0 {
		h = append(h, s)
	}
	return h
}

// plus appends e+f to h: each part of both, the smaller first, is added to a
// running sum, whose rounding errors are the parts of the answer.
func plus(h, e, f []float64) []float64 {
	sum, i, j := 0.0, 0, 0
	for i < len(e) || j < len(f) {
		var v float64
		if j >= len(f) || i < len(e) && math.Abs(e[i]) < math.Abs(f[j]) {
			v = e[i]
			i++
		} else {
			v = f[j]
			j++
		}
		var r float64
		if sum, r = twoSum(sum, v); r != 0 {
			h = append(h, r)
		}
	}
	if sum != 0 {
		h = append(h, sum)
	}
	return h
}

// scaled appends e·b to h.
func scaled(h, e []float64, b float64) []float64 {
	sum := 0.0
	for _, v := range e {
		p, r := twoProduct(v, b)
		var err float64
		if sum, err = twoSum(sum, r); err != 0 {
			h = append(h, err)
		}
		if sum, err = twoSum(p, sum); err != 0 {
			h = append(h, err)
		}
	}
	if sum != 0 {
		h = append(h, sum)
	}
	return h
}

// times returns e·f in room, with other to work in. Both must hold 2·len(e)·len(f)
// numbers; neither may be that of e or f.
func times(room, other, e, f []float64) []float64 {
	if len(e) < len(f) {
		e, f = f, e
	}
	sum, next := room[:0], other[:0]
	var part [32]float64
	for _, b := range f {
		sum, next = plus(next[:0], sum, scaled(part[:0], e, b)), sum
	}
	if len(f)%2 != 0 {
		return append(room[:0], sum...)
	}
	return sum
}

func negated(e []float64) []float64 {
	for i := range e {
		e[i] = -e[i]
	}
	return e
}

// signOf is that of the largest part.
func signOf(e []float64) int {
	switch {
	case len(e) == 0:
		return 0
	case e[len(e)-1] > 0:
		return 1
	}
	return -1
}

func expandedOrient(a, b, c xy) int {
	var r, s [8]float64
	var l, m [16]float64
	ax, ay := difference(r[0:0:2], a.x, c.x), difference(r[2:2:4], a.y, c.y)
	bx, by := difference(r[4:4:6], b.x, c.x), difference(r[6:6:8], b.y, c.y)
	left := times(l[:8], s[:], ax, by)
	return signOf(plus(m[:0], left, negated(times(l[8:], s[:], ay, bx))))
}

// expandedInCircle adds up three terms of at most 2·16·16 numbers each.
func expandedInCircle(a, b, c, d xy) int {
	var r [12]float64
	ax, ay := difference(r[0:0:2], a.x, d.x), difference(r[2:2:4], a.y, d.y)
	bx, by := difference(r[4:4:6], b.x, d.x), difference(r[6:6:8], b.y, d.y)
	cx, cy := difference(r[8:8:10], c.x, d.x), difference(r[10:10:12], c.y, d.y)
	var other [512]float64
	// p·p·(q × s) in room.
	term := func(room []float64, px, py, qx, qy, sx, sy []float64) []float64 {
		var s, u, v [8]float64
		var lift, cross [16]float64
		l := plus(lift[:0], times(u[:], s[:], px, px), times(v[:], s[:], py, py))
		x := plus(cross[:0], times(u[:], s[:], qx, sy), negated(times(v[:], s[:], sx, qy)))
		return times(room, other[:], l, x)
	}
	var one, two, three [512]float64
	var both [1024]float64
	var all [1536]float64
	sum := plus(both[:0], term(one[:], ax, ay, bx, by, cx, cy), term(two[:], bx, by, cx, cy, ax, ay))
	return signOf(plus(all[:0], sum, term(three[:], cx, cy, ax, ay, bx, by)))
}
