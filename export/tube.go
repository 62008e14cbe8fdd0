package export

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// solid is a triangle mesh with normals, as tubes and markers are made of.
type solid struct {
	position, normal []r3.Vec
	corners          [][3]int32
}

// tube appends a tube of the given radius and number of sides along the points.
// A tube that comes back to its first point is closed, others get flat caps.
// Points that repeat are dropped; fewer than two make nothing.
func (m *solid) tube(points []r3.Vec, radius float64, sides int) {
	var p []r3.Vec
	for _, v := range points {
		if len(p) == 0 || r3.Norm(r3.Sub(v, p[len(p)-1])) > 1e-3*radius {
			p = append(p, v)
		}
	}
	closed := len(p) > 3 && r3.Norm(r3.Sub(p[0], p[len(p)-1])) <= 1e-3*radius
	if closed {
		p = p[:len(p)-1]
	}
	if len(p) < 2 || radius <= 0 {
		return
	}
	n := len(p)
	// Unit direction at each point: that of the two neighbours' mean.
	direction := make([]r3.Vec, n)
	segment := func(i int) r3.Vec { return r3.Unit(r3.Sub(p[(i+1)%n], p[i])) }
	for i := range p {
		var d r3.Vec
		if closed || i > 0 {
			d = r3.Add(d, segment((i+n-1)%n))
		}
		if closed || i < n-1 {
			d = r3.Add(d, segment(i))
		}
		if r3.Norm(d) < 1e-6 { // turns straight back
			d = segment(min(i, n-2))
		}
		direction[i] = r3.Unit(d)
	}
	// A normal carried along without twist: each time the component across
	// the new direction.
	across := r3.Vec{Z: 1}
	if math.Abs(direction[0].Z) > 0.9 {
		across = r3.Vec{X: 1}
	}
	base := int32(len(m.position))
	ring := func(i int) {
		across = r3.Sub(across, r3.Scale(r3.Dot(across, direction[i]), direction[i]))
		if r3.Norm(across) < 1e-6 {
			across = perpendicular(direction[i])
		}
		across = r3.Unit(across)
		side := r3.Cross(direction[i], across)
		for k := range sides {
			a := 2 * math.Pi * float64(k) / float64(sides)
			normal := r3.Add(r3.Scale(math.Cos(a), across), r3.Scale(math.Sin(a), side))
			m.position = append(m.position, r3.Add(p[i], r3.Scale(radius, normal)))
			m.normal = append(m.normal, normal)
		}
	}
	for i := range p {
		ring(i)
	}
	bands := n - 1
	if closed {
		bands = n
	}
	for i := range bands {
		a, b := base+int32(i*sides), base+int32((i+1)%n*sides)
		for k := range int32(sides) {
			l := (k + 1) % int32(sides)
			m.corners = append(m.corners, [3]int32{a + k, a + l, b + l}, [3]int32{a + k, b + l, b + k})
		}
	}
	if closed {
		return
	}
	m.cap(m.position[base:base+int32(sides)], r3.Scale(-1, direction[0]), true)
	m.cap(m.position[len(m.position)-sides-sides:len(m.position)-sides], direction[n-1], false)
}

// cap closes a ring of positions by a flat fan.
func (m *solid) cap(ring []r3.Vec, normal r3.Vec, turn bool) {
	base := int32(len(m.position))
	m.position = append(m.position, ring...)
	for range ring {
		m.normal = append(m.normal, normal)
	}
	for k := int32(1); k < int32(len(ring))-1; k++ {
		if turn {
			m.corners = append(m.corners, [3]int32{base, base + k + 1, base + k})
		} else {
			m.corners = append(m.corners, [3]int32{base, base + k, base + k + 1})
		}
	}
}

func perpendicular(d r3.Vec) r3.Vec {
	if math.Abs(d.X) < 0.6 {
		return r3.Cross(d, r3.Vec{X: 1})
	}
	return r3.Cross(d, r3.Vec{Y: 1})
}

// facets appends flat triangles with the given corners, each with its own
// normal.
func (m *solid) facets(triangles ...[3]r3.Vec) {
	for _, t := range triangles {
		n := r3.Unit(r3.Cross(r3.Sub(t[1], t[0]), r3.Sub(t[2], t[0])))
		base := int32(len(m.position))
		m.position = append(m.position, t[0], t[1], t[2])
		m.normal = append(m.normal, n, n, n)
		m.corners = append(m.corners, [3]int32{base, base + 1, base + 2})
	}
}

// foot appends a pyramid with its tip at the point, the sign of a support.
func (m *solid) foot(at r3.Vec, size float64) {
	var c [4]r3.Vec
	for k := range c {
		a := math.Pi/4 + math.Pi/2*float64(k)
		c[k] = r3.Add(at, r3.Vec{X: size * math.Cos(a), Y: size * math.Sin(a), Z: -1.3 * size})
	}
	for k := range c {
		m.facets([3]r3.Vec{at, c[k], c[(k+1)%4]})
	}
	m.facets([3]r3.Vec{c[0], c[2], c[1]}, [3]r3.Vec{c[0], c[3], c[2]})
}

// arrow appends an arrow from one point to another.
func (m *solid) arrow(from, to r3.Vec, radius float64, sides int) {
	d := r3.Sub(to, from)
	l := r3.Norm(d)
	head := min(6*radius, 0.6*l)
	if l == 0 {
		return
	}
	u := r3.Scale(1/l, d)
	neck := r3.Sub(to, r3.Scale(head, u))
	m.tube([]r3.Vec{from, neck}, radius, sides)
	side := r3.Unit(perpendicular(u))
	other := r3.Cross(u, side)
	rim := make([]r3.Vec, sides)
	for k := range rim {
		a := 2 * math.Pi * float64(k) / float64(sides)
		rim[k] = r3.Add(neck, r3.Scale(2.5*radius, r3.Add(r3.Scale(math.Cos(a), side), r3.Scale(math.Sin(a), other))))
	}
	for k := range rim {
		m.facets([3]r3.Vec{rim[k], rim[(k+1)%sides], to})
	}
	m.cap(rim, r3.Scale(-1, u), true)
}
