package mesh

import (
	"math"
	"slices"

	"anticlast/formfind/canopy"
	"gonum.org/v1/gonum/spatial/r3"
)

// sagVector returns where the middle of edge i lies off its chord in the start
// mesh: for a cable at the rim of one fabric about where the prestress will
// pull it, so that the mesh of the found shape is about as even as that of the
// start; zero for any other edge.
func (b *builder) sagVector(i int) r3.Vec {
	e := b.m.Edges[i]
	if e.Kind == canopy.EdgeCable && len(b.users[i]) == 1 && b.laid[b.users[i][0]] != nil {
		return b.laid[b.users[i][0]].sag[i]
	}
	if e.Kind != canopy.EdgeCable || len(b.users[i]) != 1 || b.loop[b.users[i][0]].net {
		return r3.Vec{}
	}
	l := b.loop[b.users[i][0]]
	chord := r3.Sub(b.curve[i].End, b.curve[i].Start)
	c := r3.Norm(chord)
	pts := b.sample(l)
	var middle r3.Vec
	for _, p := range pts {
		middle = r3.Add(middle, r3.Scale(1/float64(len(pts)), p))
	}
	in := r3.Sub(middle, b.curve[i].at(0.5))
	for _, h := range l.holes {
		if slices.Contains(h.edges, i) {
			// Away from the hole.
			hole := b.sample(h)
			middle = r3.Vec{}
			for _, p := range hole {
				middle = r3.Add(middle, r3.Scale(1/float64(len(hole)), p))
			}
			in = r3.Sub(b.curve[i].at(0.5), middle)
		}
	}
	in = r3.Sub(in, r3.Scale(r3.Dot(in, chord)/(c*c), chord))
	if r3.Norm(in) < 1e-3*c {
		return r3.Vec{}
	}
	s := min(b.expectedSag(i, l, c), b.sagRoom(i, l))
	if l.ring >= 0 {
		// Clear of the ring.
		d := r3.Sub(b.curve[i].at(0.5), b.ringAt(l))
		axis := b.ringAxis(l.ring)
		flat := r3.Norm(r3.Sub(d, r3.Scale(r3.Dot(d, axis), axis)))
		s = min(s, max(0, flat-2*b.m.Rings[l.ring].Radius)/c)
	}
	return r3.Scale(s*c/r3.Norm(in), in)
}

// expectedSag estimates the sag of a rim cable over its chord c.
func (b *builder) expectedSag(i int, l *loop, c float64) float64 {
	f := b.m.Fabrics[l.index]
	return b.cableSag(i, (f.Warp+f.Weft)/2, c/float64(b.asked[i]))
}

// cableSag estimates the sag over its chord of the cable along edge i where it
// is pulled by a stress in N/m across; link is the length of its sides.
func (b *builder) cableSag(i int, stress, link float64) float64 {
	cable := b.m.Cables[b.cable[b.m.Edges[i].Cable]]
	c := r3.Norm(r3.Sub(b.curve[i].End, b.curve[i].Start))
	arc := func(force float64) float64 {
		// A uniform pull bends the cable to an arc of radius force/stress.
		r := force / stress
		if r <= c/2 {
			return 0.5
		}
		return (r - math.Sqrt(r*r-c*c/4)) / c
	}
	const common = 0.1 // sag of an edge cable, common practice
	switch {
	case cable.Force > 0 && stress > 0:
		return arc(cable.Force)
	case cable.MeanForce > 0 && stress > 0:
		return arc(cable.MeanForce)
	case cable.ForceDensity > 0 && stress > 0:
		return arc(cable.ForceDensity * link)
	case cable.Sag > 0:
		return cable.Sag
	case cable.Length > 0 || cable.Unstressed > 0:
		// Length of a flat arc: 1 + 8/3·sag².
		total := 0.0
		for _, n := range cable.Edges {
			total += b.curve[b.edge[n]].length
		}
		return math.Sqrt(3.0 / 8 * max(0, max(cable.Length, cable.Unstressed)/total-1))
	}
	return common
}

// sagRoom returns the largest sag that leaves the corners at the ends of edge i
// open, if the neighbours there sag as much.
func (b *builder) sagRoom(i int, l *loop) float64 {
	const open = 25 * math.Pi / 180
	room := 0.25
	n := len(l.edges)
	for k, e := range l.edges {
		if e != i {
			continue
		}
		for _, j := range [2]int{(k + n - 1) % n, k} {
			in, out := b.tangent(l, j, true), b.tangent(l, (j+1)%n, false)
			corner := math.Pi - math.Acos(max(-1, min(1, r3.Dot(in, out))))
			room = min(room, math.Tan(max(0, (corner-open)/2))/4)
		}
	}
	return room
}
