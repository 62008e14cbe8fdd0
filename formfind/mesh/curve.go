package mesh

import (
	"math"

	"anticlast/formfind/canopy"
	"gonum.org/v1/gonum/spatial/r3"
)

// curve is a straight line or a circular arc, measured by arc length.
type curve struct {
	canopy.Curve
	length float64
	// For an arc: centre, and two unit vectors at right angles with the arc at
	// centre + radius·(cos φ·e1 + sin φ·e2), φ from 0 to sweep.
	centre, e1, e2 r3.Vec
	radius, sweep  float64
}

// newCurve prepares c; ok is false when it has no length or its three points
// do not make an arc.
func newCurve(c canopy.Curve) (k curve, ok bool) {
	k.Curve = c
	v := r3.Sub(c.End, c.Start)
	if !c.Arc {
		k.length = r3.Norm(v)
		return k, k.length > 0 && !math.IsInf(k.length, 0)
	}
	u := r3.Sub(c.Through, c.Start)
	n := r3.Cross(u, v)
	nn := r3.Norm2(n)
	if !(math.Sqrt(nn) > 1e-9*r3.Norm(u)*r3.Norm(v)) {
		return k, false
	}
	// Circumcentre of the triangle 0, u, v.
	w := r3.Sub(r3.Scale(r3.Norm2(u), v), r3.Scale(r3.Norm2(v), u))
	rel := r3.Scale(1/(2*nn), r3.Cross(w, n))
	k.centre = r3.Add(c.Start, rel)
	k.radius = r3.Norm(rel)
	k.e1 = r3.Scale(-1/k.radius, rel)
	k.e2 = r3.Cross(r3.Unit(n), k.e1)
	b := r3.Sub(c.End, k.centre)
	k.sweep = math.Atan2(r3.Dot(b, k.e2), r3.Dot(b, k.e1))
	if k.sweep <= 0 {
		k.sweep += 2 * math.Pi
	}
	k.length = k.radius * k.sweep
	return k, k.length > 0 && !math.IsInf(k.length, 0)
}

// at returns the point at t between 0 and 1 of the length.
func (k *curve) at(t float64) r3.Vec {
	if !k.Arc {
		return lerp(k.Start, k.End, t)
	}
	// Measured from the nearer end, so that both halves are mirror images to
	// the last bit but one.
	switch t {
	case 0:
		return k.Start
	case 1:
		return k.End
	}
	s, c := math.Sincos(t * k.sweep)
	return r3.Add(k.centre, r3.Add(r3.Scale(k.radius*c, k.e1), r3.Scale(k.radius*s, k.e2)))
}

// lerp returns (1−t)·a + t·b.
func lerp(a, b r3.Vec, t float64) r3.Vec {
	return r3.Add(r3.Scale(1-t, a), r3.Scale(t, b))
}

func mid(a, b r3.Vec) r3.Vec { return r3.Scale(0.5, r3.Add(a, b)) }

func dist(a, b r3.Vec) float64 { return r3.Norm(r3.Sub(a, b)) }

// newell returns the vector area of the closed polygon p: its size is the area
// when flat, its direction the normal from which p runs counter-clockwise.
func newell(p []r3.Vec) r3.Vec {
	var n r3.Vec
	if len(p) < 3 {
		return n
	}
	o := p[0]
	for i := 1; i+1 < len(p); i++ {
		n = r3.Add(n, r3.Cross(r3.Sub(p[i], o), r3.Sub(p[i+1], o)))
	}
	return r3.Scale(0.5, n)
}

// fanArea returns the area of the fan of triangles from the mean of p to its
// sides: a fair estimate of the area of a surface spanned by the polygon.
func fanArea(p []r3.Vec) float64 {
	var c r3.Vec
	for _, v := range p {
		c = r3.Add(c, v)
	}
	c = r3.Scale(1/float64(len(p)), c)
	a := 0.0
	for i := range p {
		q := p[(i+1)%len(p)]
		a += r3.Norm(r3.Cross(r3.Sub(p[i], c), r3.Sub(q, c))) / 2
	}
	return a
}

// frame returns two unit vectors at right angles to the unit vector n and each
// other, such that e1 × e2 = n. For n = z they are x and y.
func frame(n r3.Vec) (e1, e2 r3.Vec) {
	ref := r3.Vec{X: 1}
	if math.Abs(n.X) > 0.9 {
		ref = r3.Vec{Y: 1}
	}
	e1 = r3.Unit(r3.Sub(ref, r3.Scale(r3.Dot(ref, n), n)))
	return e1, r3.Cross(n, e1)
}
