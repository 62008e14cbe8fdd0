package surface

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// Distance returns the largest distance of the points from the triangles of a
// surface, and the number of the point that is farthest (−1 without points or
// triangles). It compares shapes whatever their meshes: sliding nodes within
// the surface costs nothing.
func Distance(points, position []r3.Vec, corners [][3]int32) (far float64, at int) {
	at = -1
	if len(points) == 0 || len(corners) == 0 {
		return 0, at
	}
	g := newGrid(position, corners)
	for i, p := range points {
		if d := g.nearest(p); d > far || at < 0 {
			far, at = d, i
		}
	}
	return math.Sqrt(far), at
}

// grid sorts triangles into cubes.
type grid struct {
	position []r3.Vec
	corners  [][3]int32
	lo       r3.Vec
	cell     float64
	n        [3]int
	cells    map[int][]int32
}

func newGrid(position []r3.Vec, corners [][3]int32) *grid {
	lo := r3.Vec{X: math.Inf(1), Y: math.Inf(1), Z: math.Inf(1)}
	hi := r3.Scale(-1, lo)
	size := 0.0
	for _, c := range corners {
		for k, i := range c {
			p := position[i]
			lo = r3.Vec{X: min(lo.X, p.X), Y: min(lo.Y, p.Y), Z: min(lo.Z, p.Z)}
			hi = r3.Vec{X: max(hi.X, p.X), Y: max(hi.Y, p.Y), Z: max(hi.Z, p.Z)}
			size += norm(r3.Sub(position[c[(k+1)%3]], p))
		}
	}
	g := &grid{position: position, corners: corners, lo: lo, cells: map[int][]int32{}}
	g.cell = max(size/float64(3*len(corners)), 1e-3*norm(r3.Sub(hi, lo)), math.SmallestNonzeroFloat64)
	d := r3.Sub(hi, lo)
	for k, v := range [3]float64{d.X, d.Y, d.Z} {
		g.n[k] = int(v/g.cell) + 1
	}
	for t, c := range corners {
		a, b := g.at(position[c[0]]), g.at(position[c[0]])
		for _, i := range c[1:] {
			p := g.at(position[i])
			for k := range 3 {
				a[k], b[k] = min(a[k], p[k]), max(b[k], p[k])
			}
		}
		for x := a[0]; x <= b[0]; x++ {
			for y := a[1]; y <= b[1]; y++ {
				for z := a[2]; z <= b[2]; z++ {
					key := g.key(x, y, z)
					g.cells[key] = append(g.cells[key], int32(t))
				}
			}
		}
	}
	return g
}

func (g *grid) at(p r3.Vec) [3]int {
	d := r3.Sub(p, g.lo)
	var c [3]int
	for k, v := range [3]float64{d.X, d.Y, d.Z} {
		c[k] = min(max(int(v/g.cell), 0), g.n[k]-1)
	}
	return c
}

func (g *grid) key(x, y, z int) int { return (x*g.n[1]+y)*g.n[2] + z }

// nearest returns the square of the distance to the nearest triangle, looking
// through shells of cubes around the point's own.
func (g *grid) nearest(p r3.Vec) float64 {
	c := g.at(p)
	best := math.Inf(1)
	// The distance from p to its cube: nothing in shell r is nearer than
	// (r − 1) cubes less that.
	for r := 0; ; r++ {
		if reach := float64(r-1) * g.cell; r > 1 && best <= reach*reach {
			return best
		}
		if r > g.n[0] && r > g.n[1] && r > g.n[2] {
			return best
		}
		for x := max(c[0]-r, 0); x <= min(c[0]+r, g.n[0]-1); x++ {
			for y := max(c[1]-r, 0); y <= min(c[1]+r, g.n[1]-1); y++ {
				edge := x == c[0]-r || x == c[0]+r || y == c[1]-r || y == c[1]+r
				for z := max(c[2]-r, 0); z <= min(c[2]+r, g.n[2]-1); z++ {
					if !edge && z != c[2]-r && z != c[2]+r {
						continue
					}
					for _, t := range g.cells[g.key(x, y, z)] {
						k := g.corners[t]
						best = min(best, toTriangle(p, g.position[k[0]], g.position[k[1]], g.position[k[2]]))
					}
				}
			}
		}
	}
}

// toTriangle returns the square of the distance from p to the triangle abc.
//
// C. Ericson: Real-Time Collision Detection, Morgan Kaufmann 2005, 5.1.5.
func toTriangle(p, a, b, c r3.Vec) float64 {
	ab, ac, ap := r3.Sub(b, a), r3.Sub(c, a), r3.Sub(p, a)
	n := r3.Cross(ab, ac)
	nn := r3.Norm2(n)
	if nn > 0 {
		// Inside the prism over the triangle: the distance from its plane.
		v := r3.Dot(r3.Cross(ap, ac), n)
		w := r3.Dot(r3.Cross(ab, ap), n)
		if v >= 0 && w >= 0 && v+w <= nn {
			d := r3.Dot(ap, n)
			return d * d / nn
		}
	}
	return min(toSegment(p, a, b), toSegment(p, b, c), toSegment(p, c, a))
}

func toSegment(p, a, b r3.Vec) float64 {
	d, q := r3.Sub(b, a), r3.Sub(p, a)
	l := r3.Norm2(d)
	if l > 0 {
		q = r3.Sub(q, r3.Scale(min(max(r3.Dot(q, d)/l, 0), 1), d))
	}
	return r3.Norm2(q)
}
