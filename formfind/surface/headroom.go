package surface

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// Lowest is the lowest point found over a region of the plan.
type Lowest struct {
	At   r3.Vec
	Part int32 // number of the triangle or segment it lies on; −1 when nothing lies over the region
}

// LowestTriangle returns the lowest point of the triangles over a region of
// the plan (corners in order, z ignored; fewer than three corners: everywhere).
//
// The height is linear on each triangle, so its least value over the part
// above the region is at a corner of that part: a node over the region, a
// corner of the region under the triangle, or a crossing of their sides in
// plan. All are looked at; the answer is exact but for rounding, for regions
// of any shape.
func LowestTriangle(position []r3.Vec, corners [][3]int32, region []r3.Vec) Lowest {
	low := Lowest{At: r3.Vec{Z: math.Inf(1)}, Part: -1}
	box := planBox(region)
	for t, c := range corners {
		p := [3]r3.Vec{position[c[0]], position[c[1]], position[c[2]]}
		low.segmentsAndNodes(p[:], true, region, box, int32(t))
		if len(region) < 3 || !box.touches(p[:]) {
			continue
		}
		for _, r := range region {
			if z, ok := heightOver(p, r); ok {
				low.offer(r3.Vec{X: r.X, Y: r.Y, Z: z}, int32(t))
			}
		}
	}
	return low
}

// LowestSegment is [LowestTriangle] for straight segments.
func LowestSegment(position []r3.Vec, ends [][2]int32, use func(int) bool, region []r3.Vec) Lowest {
	low := Lowest{At: r3.Vec{Z: math.Inf(1)}, Part: -1}
	box := planBox(region)
	for m, e := range ends {
		if use != nil && !use(m) {
			continue
		}
		p := [2]r3.Vec{position[e[0]], position[e[1]]}
		low.segmentsAndNodes(p[:], false, region, box, int32(m))
	}
	return low
}

func (l *Lowest) offer(p r3.Vec, part int32) {
	if p.Z < l.At.Z || l.Part < 0 {
		l.At, l.Part = p, part
	}
}

func (l *Lowest) segmentsAndNodes(p []r3.Vec, loop bool, region []r3.Vec, box box, part int32) {
	if len(region) < 3 {
		for _, v := range p {
			l.offer(v, part)
		}
		return
	}
	if !box.touches(p) {
		return
	}
	for _, v := range p {
		if insidePlan(region, v) {
			l.offer(v, part)
		}
	}
	n := len(p) - 1
	if loop {
		n++
	}
	for k := range n {
		a, b := p[k], p[(k+1)%len(p)]
		for i := range region {
			c, d := region[i], region[(i+1)%len(region)]
			if u, ok := crossPlan(a, b, c, d); ok {
				l.offer(r3.Add(a, r3.Scale(u, r3.Sub(b, a))), part)
			}
		}
	}
}

type box struct{ x0, y0, x1, y1 float64 }

func planBox(p []r3.Vec) box {
	b := box{math.Inf(1), math.Inf(1), math.Inf(-1), math.Inf(-1)}
	for _, v := range p {
		b.x0, b.y0 = min(b.x0, v.X), min(b.y0, v.Y)
		b.x1, b.y1 = max(b.x1, v.X), max(b.y1, v.Y)
	}
	return b
}

func (b box) touches(p []r3.Vec) bool {
	o := planBox(p)
	return o.x0 <= b.x1 && b.x0 <= o.x1 && o.y0 <= b.y1 && b.y0 <= o.y1
}

// insidePlan reports whether v lies in the polygon in plan (even-odd rule).
func insidePlan(poly []r3.Vec, v r3.Vec) bool {
	in := false
	for i := range poly {
		a, b := poly[i], poly[(i+1)%len(poly)]
		if (a.Y > v.Y) != (b.Y > v.Y) && v.X < a.X+(v.Y-a.Y)/(b.Y-a.Y)*(b.X-a.X) {
			in = !in
		}
	}
	return in
}

// crossPlan returns where along ab, 0 to 1, it meets cd in plan.
func crossPlan(a, b, c, d r3.Vec) (float64, bool) {
	rx, ry := b.X-a.X, b.Y-a.Y
	sx, sy := d.X-c.X, d.Y-c.Y
	det := rx*sy - ry*sx
	if det == 0 {
		return 0, false // parallel: the ends are looked at on their own
	}
	u := ((c.X-a.X)*sy - (c.Y-a.Y)*sx) / det
	v := ((c.X-a.X)*ry - (c.Y-a.Y)*rx) / det
	return u, u >= 0 && u <= 1 && v >= 0 && v <= 1
}

// heightOver returns the height of the triangle's plane over v when v lies
// under the triangle.
func heightOver(p [3]r3.Vec, v r3.Vec) (float64, bool) {
	det := (p[1].X-p[0].X)*(p[2].Y-p[0].Y) - (p[1].Y-p[0].Y)*(p[2].X-p[0].X)
	if det == 0 {
		return 0, false
	}
	b := ((v.X-p[0].X)*(p[2].Y-p[0].Y) - (v.Y-p[0].Y)*(p[2].X-p[0].X)) / det
	c := ((p[1].X-p[0].X)*(v.Y-p[0].Y) - (p[1].Y-p[0].Y)*(v.X-p[0].X)) / det
	if b < 0 || c < 0 || b+c > 1 {
		return 0, false
	}
	return p[0].Z + b*(p[1].Z-p[0].Z) + c*(p[2].Z-p[0].Z), true
}
