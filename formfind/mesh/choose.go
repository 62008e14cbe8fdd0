package mesh

import (
	"math"

	"anticlast/formfind/canopy"
	"gonum.org/v1/gonum/spatial/r3"
)

// choosePatch decides how a boundary is meshed: by a structured patch, whose
// lines follow the yarn and mirror as the model does, where its shape allows
// that without thin triangles, and freely otherwise.
func (b *builder) choosePatch(l *loop) patcher {
	var p patcher
	n := len(l.sides)
	switch {
	case l.net && !b.alongSides(l):
		return lineNet{}
	case l.pattern == canopy.FabricFree:
		return freePatch{}
	case len(l.holes)+len(l.lines)+len(l.points) > 0:
		if l.pattern == canopy.FabricSides {
			b.fail(l.part(), l.name, l.line, Mismatch, "leave out the pattern", "it has holes, lines or points inside and cannot be meshed along its sides")
		}
		return freePatch{}
	case l.ring >= 0:
		if l.pattern != canopy.FabricSides && !b.seesOutline(l) {
			return freePatch{}
		}
		return radialPatch{}
	case n == 2:
		return lensPatch{}
	case n == 3:
		p = triPatch{}
	case n == 4:
		p = gridPatch{}
	default:
		p = starPatch{}
	}
	if !l.net && l.pattern != canopy.FabricSides && !b.fairSides(l) {
		return freePatch{}
	}
	return p
}

// fairSides reports whether a structured patch between the sides of l has no
// thin triangles.
func (b *builder) fairSides(l *loop) bool {
	n := len(l.sides)
	c, m := b.sideEnds(l)
	var centre xy
	for _, q := range m {
		centre = xy{centre.x + q.x/float64(n), centre.y + q.y/float64(n)}
	}
	good := true
	switch n {
	case 3:
		good = fair(20, 135, c...)
	case 4:
		good = fair(25, 155, c...) && alike(3, c[0], c[1], c[2], c[3]) && alike(3, c[1], c[2], c[3], c[0])
	default:
		for k := range c {
			before := (k + n - 1) % n
			good = good && fair(25, 155, m[before], c[k], m[k], centre)
			good = good && alike(2.5, c[k], c[(k+1)%n], c[before], c[k])
		}
	}
	return good
}

// sideEnds returns the corner at which each side starts and its middle, seen
// along the normal of the boundary.
func (b *builder) sideEnds(l *loop) (corner, middle []xy) {
	n := newell(b.sample(l))
	if r3.Norm(n) == 0 {
		n = r3.Vec{Z: 1}
	}
	e1, e2 := frame(r3.Unit(n))
	flat := func(v r3.Vec) xy { return xy{r3.Dot(v, e1), r3.Dot(v, e2)} }
	for _, s := range l.sides {
		k := s[0]
		corner = append(corner, flat(b.m.Points[b.walkStart(l, k)].At))
		if len(s)%2 == 0 {
			middle = append(middle, flat(b.m.Points[b.walkStart(l, s[len(s)/2])].At))
		} else {
			middle = append(middle, flat(b.curve[l.edges[s[len(s)/2]]].at(0.5)))
		}
	}
	return corner, middle
}

// fair reports whether all angles of a counter-clockwise polygon lie between two
// bounds in degrees.
func fair(least, most float64, p ...xy) bool {
	for i := range p {
		a, o, c := p[(i+len(p)-1)%len(p)], p[i], p[(i+1)%len(p)]
		ux, uy, vx, vy := c.x-o.x, c.y-o.y, a.x-o.x, a.y-o.y
		angle := math.Atan2(ux*vy-uy*vx, ux*vx+uy*vy) * 180 / math.Pi
		if !(angle >= least && angle <= most) {
			return false
		}
	}
	return true
}

// alike reports whether a–b and c–d differ in length by less than the factor most.
func alike(most float64, a, b, c, d xy) bool {
	l, m := math.Hypot(a.x-b.x, a.y-b.y), math.Hypot(c.x-d.x, c.y-d.y)
	return l < most*m && m < most*l
}

// seesOutline reports whether radial lines from the ring of l reach its whole
// boundary without crossing and without great differences in length.
func (b *builder) seesOutline(l *loop) bool {
	centre, axis := b.ringAt(l), b.ringAxis(l.ring)
	e1, e2 := frame(axis)
	var p []xy
	for _, v := range b.sample(l) {
		d := r3.Sub(v, centre)
		p = append(p, xy{r3.Dot(d, e1), r3.Dot(d, e2)})
	}
	sign, near, far := 0.0, math.Inf(1), 0.0
	for i, a := range p {
		c := p[(i+1)%len(p)]
		turn := a.x*c.y - a.y*c.x
		// The angle between a side and the line to the ring, as its sine.
		if sign == 0 {
			sign = turn
		}
		for _, q := range [2]xy{a, c} {
			if turn*math.Copysign(1, sign) < 0.6*math.Hypot(q.x, q.y)*math.Hypot(c.x-a.x, c.y-a.y) {
				return false
			}
		}
		near = min(near, segmentDistance(a.x, a.y, c.x, c.y))
		far = max(far, math.Hypot(a.x, a.y))
	}
	r := b.m.Rings[l.ring].Radius
	return near > 1.5*r && far < 2.5*near
}
