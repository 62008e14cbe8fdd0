// Package surface measures a found surface: areas, normals, angles, slopes,
// principal stresses, curvature, contours, basins in which water would stand,
// and how values are distributed over it.
//
// Everything works on flat slices, positions in m and triangles as triples of
// node numbers, counter-clockwise seen from the positive side. Nothing is
// changed and nothing is kept between calls.
package surface

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// norm is the length of v. r3.Norm guards against overflow, which costs more
// than all else here.
func norm(v r3.Vec) float64 { return math.Sqrt(r3.Norm2(v)) }

// AreaNormal returns the area of the triangle abc (m²) and its unit normal
// towards the side from which a, b, c run counter-clockwise. The normal of a
// triangle without area is zero.
func AreaNormal(a, b, c r3.Vec) (area float64, normal r3.Vec) {
	w := r3.Cross(r3.Sub(b, a), r3.Sub(c, a))
	d := norm(w)
	if d == 0 || math.IsNaN(d) || math.IsInf(d, 0) {
		return d / 2, r3.Vec{}
	}
	return d / 2, r3.Scale(1/d, w)
}

// Areas returns the area of each triangle, m².
func Areas(position []r3.Vec, corners [][3]int32) []float64 {
	a := make([]float64, len(corners))
	for t, c := range corners {
		a[t], _ = AreaNormal(position[c[0]], position[c[1]], position[c[2]])
	}
	return a
}

// Centre returns the centroid of a triangle.
func Centre(position []r3.Vec, c [3]int32) r3.Vec {
	return r3.Scale(1./3, r3.Add(r3.Add(position[c[0]], position[c[1]]), position[c[2]]))
}

// VertexNormals returns at each node the unit normal of the surface, the mean
// of the normals of the triangles around it weighted by their areas; zero at
// nodes without triangles.
func VertexNormals(position []r3.Vec, corners [][3]int32) []r3.Vec {
	n := make([]r3.Vec, len(position))
	for _, c := range corners {
		a := position[c[0]]
		w := r3.Cross(r3.Sub(position[c[1]], a), r3.Sub(position[c[2]], a))
		for _, i := range c {
			n[i] = r3.Add(n[i], w)
		}
	}
	for i, v := range n {
		if d := norm(v); d > 0 {
			n[i] = r3.Scale(1/d, v)
		}
	}
	return n
}

// Angles returns the angles of triangle abc at a, b and c, rad. They are taken
// from sine and cosine together, so that needles keep their accuracy.
func Angles(a, b, c r3.Vec) [3]float64 {
	angle := func(p, q, r r3.Vec) float64 {
		u, v := r3.Sub(q, p), r3.Sub(r, p)
		return math.Atan2(norm(r3.Cross(u, v)), r3.Dot(u, v))
	}
	return [3]float64{angle(a, b, c), angle(b, c, a), angle(c, a, b)}
}

// Quality describes the shape of the triangles of a mesh.
type Quality struct {
	MinAngle float64 // smallest angle of all, rad; 0 when there are no triangles
	Triangle int32   // where it is; −1 when there are no triangles
	MeanMin  float64 // mean over the triangles of their smallest angle, rad
}

// MeasureQuality returns the quality of a mesh.
func MeasureQuality(position []r3.Vec, corners [][3]int32) Quality {
	q := Quality{Triangle: -1}
	if len(corners) == 0 {
		return q
	}
	q.MinAngle = math.Inf(1)
	for t, c := range corners {
		// The smallest angle lies opposite the shortest side: one angle is
		// enough, and sin = 2A/(product of the sides beside it).
		a, b, d := position[c[0]], position[c[1]], position[c[2]]
		e := [3]r3.Vec{r3.Sub(d, b), r3.Sub(a, d), r3.Sub(b, a)}
		l := [3]float64{r3.Norm2(e[0]), r3.Norm2(e[1]), r3.Norm2(e[2])}
		k := 0
		for j := 1; j < 3; j++ {
			if l[j] < l[k] {
				k = j
			}
		}
		u, v := e[(k+1)%3], e[(k+2)%3]
		m := math.Atan2(norm(r3.Cross(u, v)), -r3.Dot(u, v))
		if !(m >= q.MinAngle) { // also for NaN
			q.MinAngle, q.Triangle = m, int32(t)
		}
		q.MeanMin += m
	}
	q.MeanMin /= float64(len(corners))
	return q
}

// Slope returns the angle between a surface with the given unit normal and the
// horizontal, rad, from 0 (flat) to π/2 (vertical), whichever side is up.
func Slope(normal r3.Vec) float64 {
	return math.Atan2(math.Hypot(normal.X, normal.Y), math.Abs(normal.Z))
}
