package mesh

import (
	"math"

	"anticlast/formfind/canopy"
	"gonum.org/v1/gonum/spatial/r3"
)

// radialNet is a net between its boundary and one hole: radial lines from
// arrival inner[k] to arrival outer[k], and rings between.
type radialNet struct {
	inner, outer []int32
	layers       int // rings and one
}

// along is a place on a loop: at length s of its walk.
type along struct {
	s  float64
	at r3.Vec
	on onRim
}

// walked measures a loop by length.
type walked struct {
	b     *builder
	l     *loop
	start []float64 // per edge of the walk, and the whole length
}

func (b *builder) walked(l *loop) walked {
	w := walked{b: b, l: l, start: []float64{0}}
	for _, e := range l.edges {
		w.start = append(w.start, w.start[len(w.start)-1]+b.curve[e].length)
	}
	return w
}

func (w walked) length() float64 { return w.start[len(w.start)-1] }

// at returns the place at length s, which is taken around the loop.
func (w walked) at(s float64) along {
	whole := w.length()
	s -= whole * math.Floor(s/whole)
	k := 0
	for k < len(w.l.edges)-1 && s >= w.start[k+1] {
		k++
	}
	return w.onEdge(k, min(1, max(0, (s-w.start[k])/(w.start[k+1]-w.start[k]))))
}

// onEdge returns the place at part u of edge k of the walk.
func (w walked) onEdge(k int, u float64) along {
	e := w.l.edges[k]
	t := u
	if w.l.rev[k] {
		t = 1 - u
	}
	return along{w.start[k] + u*(w.start[k+1]-w.start[k]), w.b.curve[e].at(t), onRim{edge: e, t: t}}
}

// layRadial divides the outer boundary evenly edge by edge, and joins these
// places to places of the hole at the same parts of its length, turned so that
// the sum of the squares of the radial lines is least.
func (b *builder) layRadial(l *loop, net *laidNet) {
	n := &b.m.Nets[l.index]
	h := netSpacings(n)
	out, in := b.walked(l), b.walked(l.holes[0])
	var from []along
	// Each line is tried in some hundred turns.
	if !(out.length()/h[0] < maxLines) {
		b.tooFineNet(l)
		return
	}
	for k, e := range l.edges {
		num := int(math.Max(1, math.Round(math.Min(b.curve[e].length/h[0], maxLattice))))
		for i := range num {
			from = append(from, out.onEdge(k, float64(i)/float64(num)))
		}
	}
	if len(from) < 3 {
		b.fail("net", l.name, l.line, Mismatch, "give a smaller spacing", "it would have %d radial lines", len(from))
		return
	}
	turn := math.Copysign(1, b.walkArea(l, net.rim)*b.walkArea(l.holes[0], net.rim))
	scale := turn * in.length() / out.length()
	sum := func(shift float64) float64 {
		q := 0.0
		for _, f := range from {
			q += r3.Norm2(r3.Sub(f.at, in.at(shift+scale*f.s).at))
		}
		return q
	}
	const tries = 180
	best, shift := math.Inf(1), 0.0
	step := in.length() / tries
	for i := range tries {
		if q := sum(float64(i) * step); q < best {
			best, shift = q, float64(i)*step
		}
	}
	// Golden section about the best of them.
	const golden = 0.6180339887498949
	lo, hi := shift-step, shift+step
	for range 45 {
		p, q := hi-golden*(hi-lo), lo+golden*(hi-lo)
		if sum(p) <= sum(q) {
			hi = q
		} else {
			lo = p
		}
	}
	shift = (lo + hi) / 2
	rad := &radialNet{}
	mean := 0.0
	for _, f := range from {
		t := in.at(shift + scale*f.s)
		mean += dist(f.at, t.at) / float64(len(from))
		net.least = least * out.length() / float64(len(from))
		rad.outer = append(rad.outer, b.arrive(f.on, net))
		net.least = least * in.length() / float64(len(from))
		rad.inner = append(rad.inner, b.arrive(t.on, net))
	}
	rad.layers = int(math.Max(2, math.Round(math.Min(mean/h[1], maxLattice))))
	if !b.crossings(rad.layers, len(from)) {
		b.tooFineNet(l)
		return
	}
	net.radial = rad
}

// fillRadial makes the nodes and links of a radial net.
func (b *builder) fillRadial(p *plot, net *laidNet) {
	rad := net.radial
	n := len(rad.outer)
	node := func(s int32) int32 {
		a := b.arrival[-1-s]
		return b.edgeNode[a.edge][a.node]
	}
	rings := make([][]int32, rad.layers-1)
	lines := make([][]int32, n)
	for k := range lines {
		lines[k] = append(make([]int32, 0, rad.layers+1), node(rad.inner[k]))
	}
	for j := range rings {
		for k := range n {
			i, o := node(rad.inner[k]), node(rad.outer[k])
			v := p.node(lerp(p.at(i), p.at(o), float64(j+1)/float64(rad.layers)))
			rings[j] = append(rings[j], v)
			lines[k] = append(lines[k], v)
		}
		rings[j] = append(rings[j], rings[j][0])
	}
	for k := range lines {
		lines[k] = append(lines[k], node(rad.outer[k]))
	}
	for k, family := range [2][][]int32{lines, rings} {
		mem := b.netMember(p.l, k)
		for i, nodes := range family {
			b.chainMembers(numbered(mem.group, i+1), canopy.KindNetCable, nodes, mem)
		}
	}
}
