package surface

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// Curvature of the surface at a node, in 1/m and 1/m². Positive mean curvature
// bulges towards the positive side. All are NaN at nodes on a boundary, on a
// branching line, and at nodes without triangles.
type Curvature struct {
	Mean   float64 // ½(k₁ + k₂)
	Gauss  float64 // k₁·k₂: negative on an anticlastic surface
	K1, K2 float64 // principal curvatures, K1 ≥ K2; their inverses are the principal radii
}

// Curvatures returns the curvature at each node from the triangles around it:
// mean curvature from the cotangent formula, Gaussian curvature from the angle
// missing to 2π, both over the node's mixed Voronoi area.
//
// M. Meyer, M. Desbrun, P. Schröder & A. H. Barr: Discrete
// differential-geometry operators for triangulated 2-manifolds. Visualization
// and Mathematics III, Springer 2003, 35-57.
func Curvatures(position []r3.Vec, corners [][3]int32) []Curvature {
	n := len(position)
	out := make([]Curvature, n)
	lap := make([]r3.Vec, n) // Σ (cot α + cot β)(x_j − x_i)/2
	area := make([]float64, n)
	deficit := make([]float64, n)
	for _, c := range corners {
		p := [3]r3.Vec{position[c[0]], position[c[1]], position[c[2]]}
		a, _ := AreaNormal(p[0], p[1], p[2])
		if !(a > 0) {
			continue
		}
		ang := Angles(p[0], p[1], p[2])
		var cot [3]float64
		for k := range 3 {
			u, v := r3.Sub(p[(k+1)%3], p[k]), r3.Sub(p[(k+2)%3], p[k])
			cot[k] = r3.Dot(u, v) / (2 * a)
		}
		obtuse := -1
		for k, g := range ang {
			if g > math.Pi/2 {
				obtuse = k
			}
		}
		for k := range 3 {
			i, j, l := c[k], (k+1)%3, (k+2)%3
			deficit[i] += ang[k]
			toJ, toL := r3.Sub(p[j], p[k]), r3.Sub(p[l], p[k])
			lap[i] = r3.Add(lap[i], r3.Add(r3.Scale(cot[l]/2, toJ), r3.Scale(cot[j]/2, toL)))
			switch obtuse {
			case -1:
				area[i] += (r3.Norm2(toJ)*cot[l] + r3.Norm2(toL)*cot[j]) / 8
			case k:
				area[i] += a / 2
			default:
				area[i] += a / 4
			}
		}
	}
	normal := VertexNormals(position, corners)
	inside := make([]bool, n)
	for _, c := range corners {
		for _, i := range c {
			inside[i] = true
		}
	}
	for _, e := range Edges(corners) {
		if e.Triangles != 2 {
			inside[e.Nodes[0]], inside[e.Nodes[1]] = false, false
		}
	}
	nan := math.NaN()
	for i := range out {
		if !inside[i] || !(area[i] > 0) {
			out[i] = Curvature{nan, nan, nan, nan}
			continue
		}
		// The Laplacian of the position is −2H n for H positive where the
		// surface bulges towards n.
		h := -r3.Dot(lap[i], normal[i]) / (2 * area[i])
		g := (2*math.Pi - deficit[i]) / area[i]
		d := math.Sqrt(max(h*h-g, 0))
		out[i] = Curvature{Mean: h, Gauss: g, K1: h + d, K2: h - d}
	}
	return out
}
