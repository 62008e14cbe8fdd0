package outline

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"
)

// Replaced counts the ELLIPSE and SPLINE entities of a layer, in whose place
// arcs and straight lines are.
type Replaced struct {
	Layer  string
	Count  int
	Pieces int     // arcs and lines
	Off    float64 // greatest distance from the curves, in the unit of the drawing
	Line   int     // of the first
}

const (
	// curveTolerance is how far arcs may lie from the curve that they replace,
	// over its size.
	curveTolerance = 1e-3
	// Limits of one curve, and of all.
	maxHalvings = 12
	maxDegree   = 25
	maxPieces   = 20_000
)

// replace puts arcs, or lines where it is straight, in the place of the curve at(t)
// for t from the first to the last of breaks, with an end at each.
func (x *dxf) replace(p *props, at func(t float64) r3.Vec, breaks []float64, samples func(a, b float64) int, size float64) {
	g := x.replaced[p.layer]
	if g == nil {
		g = &Replaced{Layer: p.layer, Line: p.line}
		x.replaced[p.layer] = g
	}
	g.Count++
	tol := curveTolerance * size
	var piece func(a, b float64, pa, pb r3.Vec, halvings int)
	piece = func(a, b float64, pa, pb r3.Vec, halvings int) {
		m := (a + b) / 2
		pm := at(m)
		off := 0.0
		rise := fromChord(pa, pb, pm)
		line := rise <= tol/100
		n := samples(a, b)
		for i := 1; i < n && (off <= tol || halvings == maxHalvings); i++ {
			q := at(a + (b-a)*float64(i)/float64(n))
			if line {
				off = max(off, fromChord(pa, pb, q))
			} else {
				off = max(off, fromArc(pa, pm, pb, q))
			}
		}
		if halvings < maxHalvings && (off > tol || !line && r3.Dot(r3.Sub(pa, pm), r3.Sub(pb, pm)) > 0) {
			piece(a, m, pa, pm, halvings+1)
			piece(m, b, pm, pb, halvings+1)
			return
		}
		if x.pieces++; x.pieces > maxPieces {
			if !x.stopped {
				x.d.fail(p.line, "draw them as polylines or arcs", "the curves of the drawing need more than %d arcs", maxPieces)
			}
			x.stopped = true
			return
		}
		g.Pieces++
		g.Off = max(g.Off, off)
		switch {
		case pa == pb:
		case line:
			x.segment(p, pa, pb)
		default:
			x.arcSegment(p, pa, pm, pb)
		}
	}
	for k := 1; k < len(breaks) && !x.stopped; k++ {
		piece(breaks[k-1], breaks[k], at(breaks[k-1]), at(breaks[k]), 0)
	}
}

// fromChord is the distance of q from the segment a–b.
func fromChord(a, b, q r3.Vec) float64 {
	u, v := r3.Sub(b, a), r3.Sub(q, a)
	s := 0.0
	if l := r3.Norm2(u); l > 0 {
		s = min(1, max(0, r3.Dot(u, v)/l))
	}
	return r3.Norm(r3.Sub(v, r3.Scale(s, u)))
}

// fromArc is the distance of q from the circle through a, m and b.
func fromArc(a, m, b, q r3.Vec) float64 {
	u, v := r3.Sub(m, a), r3.Sub(b, a)
	w := r3.Cross(u, v)
	ww := r3.Norm2(w)
	if !(math.Sqrt(ww) > 1e-9*r3.Norm(u)*r3.Norm(v)) {
		return fromChord(a, b, q)
	}
	c := r3.Scale(1/(2*ww), r3.Add(r3.Scale(r3.Norm2(u), r3.Cross(v, w)), r3.Scale(r3.Norm2(v), r3.Cross(w, u))))
	d := r3.Sub(r3.Sub(q, a), c)
	up := r3.Dot(d, w) / math.Sqrt(ww)
	return math.Hypot(math.Sqrt(max(0, r3.Norm2(d)-up*up))-r3.Norm(c), up)
}

// ellipse has its centre at group 10, the end of its major axis from there at
// 11, the ratio of the axes at 40 and runs between the parameters 41 and 42.
func (x *dxf) ellipse(p *props) {
	centre := r3.Vec{X: p.x[0], Y: p.y[0], Z: p.z[0]}
	major := r3.Vec{X: p.x[1], Y: p.y[1], Z: p.z[1]}
	_, _, n := p.axes()
	minor := r3.Scale(p.radius, r3.Cross(n, major))
	if !(r3.Norm(major) > 0) || !(r3.Norm(minor) > 1e-6*r3.Norm(major)) || !(r3.Norm(minor) < 1e6*r3.Norm(major)) {
		x.d.fail(p.line, "", "the ELLIPSE has no width or no length")
		return
	}
	from, span := p.start, 2*math.Pi
	if p.hasEnd {
		span = math.Mod(p.end-p.start, 2*math.Pi)
		if span <= 1e-9 {
			span += 2 * math.Pi
		}
	}
	whole := span > 2*math.Pi-1e-6
	quarters := int(math.Ceil(span/(math.Pi/2) - 1e-9))
	at := func(t float64) r3.Vec {
		if whole && t == float64(quarters) {
			t = 0 // closed to the last bit
		}
		s, c := math.Sincos(from + span*t/float64(quarters))
		return r3.Add(centre, r3.Add(r3.Scale(c, major), r3.Scale(s, minor)))
	}
	breaks := make([]float64, quarters+1)
	for k := range breaks {
		breaks[k] = float64(k)
	}
	x.replace(p, at, breaks, func(_, _ float64) int { return 8 }, 2*max(r3.Norm(major), r3.Norm(minor)))
}

// spline is a curve of rational B-splines.
type spline struct {
	degree int
	knot   []float64
	point  []r3.Vec
	weight []float64 // nil = all alike
}

// spline has its degree at group 71, knots at 40, weights at 41 and control points
// at 10.
func (x *dxf) spline(p *props) {
	s := spline{p.degree, p.knot, p.control, p.weight}
	n := len(s.point)
	if n == 0 {
		x.ignore("SPLINE without control points", p.layer, p.line)
		return
	}
	bad := func(format string, args ...any) {
		x.d.fail(p.line, "save the drawing again", format, args...)
	}
	switch {
	case s.degree < 1 || s.degree > maxDegree:
		bad("the SPLINE has degree %d, not 1 to %d", s.degree, maxDegree)
		return
	case n <= s.degree || len(s.knot) != n+s.degree+1:
		bad("the SPLINE of degree %d has %d control points and %d knots, which do not go together", s.degree, n, len(s.knot))
		return
	case !slices.IsSorted(s.knot) || !(s.knot[n] > s.knot[s.degree]):
		bad("the knots of the SPLINE do not rise")
		return
	case len(s.weight) != 0 && len(s.weight) != n:
		bad("the SPLINE has %d control points and %d weights", n, len(s.weight))
		return
	}
	for _, w := range s.weight {
		if !(w >= 1e-6 && w <= 1e6) {
			bad("the SPLINE has a weight of %g", w)
			return
		}
	}
	lo, hi := s.point[0], s.point[0]
	for _, v := range s.point {
		lo = r3.Vec{X: min(lo.X, v.X), Y: min(lo.Y, v.Y), Z: min(lo.Z, v.Z)}
		hi = r3.Vec{X: max(hi.X, v.X), Y: max(hi.Y, v.Y), Z: max(hi.Z, v.Z)}
	}
	size := r3.Norm(r3.Sub(hi, lo))
	if !(size > 0) {
		bad("the control points of the SPLINE are all at one place")
		return
	}
	// Where as many knots as the degree coincide the curve may have a corner.
	breaks := []float64{s.knot[s.degree]}
	for k, run := s.degree+1, 1; k < n; k++ {
		if run++; s.knot[k] != s.knot[k-1] {
			run = 1
		}
		if t := s.knot[k]; run >= s.degree && t > breaks[len(breaks)-1] && t < s.knot[n] {
			breaks = append(breaks, t)
		}
	}
	breaks = append(breaks, s.knot[n])
	spans := func(a, b float64) int {
		i, _ := slices.BinarySearch(s.knot, a)
		j, _ := slices.BinarySearch(s.knot, b)
		return min(8+4*(j-i), 400)
	}
	x.replace(p, s.at, breaks, spans, size)
}

// at evaluates the curve (de Boor 1972, with the weights as a fourth coordinate).
func (s *spline) at(t float64) r3.Vec {
	// The span of t; the last one for its end.
	k, _ := slices.BinarySearchFunc(s.knot[s.degree:len(s.point)], t, func(u, t float64) int {
		if u <= t {
			return -1
		}
		return 1
	})
	k += s.degree - 1
	for k > s.degree && s.knot[k] == s.knot[k+1] {
		k--
	}
	var d [maxDegree + 1]struct {
		v r3.Vec
		w float64
	}
	for j := range s.degree + 1 {
		i := k - s.degree + j
		d[j].v, d[j].w = s.point[i], 1
		if len(s.weight) > 0 {
			d[j].w = s.weight[i]
			d[j].v = r3.Scale(d[j].w, d[j].v)
		}
	}
	for r := 1; r <= s.degree; r++ {
		for j := s.degree; j >= r; j-- {
			i := k - s.degree + j
			a := 0.0
			if w := s.knot[i+s.degree-r+1] - s.knot[i]; w > 0 {
				a = (t - s.knot[i]) / w
			}
			d[j].v = r3.Add(r3.Scale(1-a, d[j-1].v), r3.Scale(a, d[j].v))
			d[j].w = (1-a)*d[j-1].w + a*d[j].w
		}
	}
	e := d[s.degree]
	return r3.Scale(1/e.w, e.v)
}
