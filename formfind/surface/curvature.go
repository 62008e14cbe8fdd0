package surface

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// Curvature of the surface at a node, in 1/m and 1/m². Positive mean curvature
// bulges towards the positive side. All are NaN where there is none to speak
// of: on boundaries, on lines where sheets branch, at nodes without triangles.
type Curvature struct {
	Mean   float64 // ½(k₁ + k₂)
	Gauss  float64 // k₁·k₂: negative on an anticlastic surface
	K1, K2 float64 // principal curvatures, K1 ≥ K2; their inverses are the principal radii
}

// Curvatures returns the curvature at each node, from the quadratic height
// function over the tangent plane that fits its neighbours and their
// neighbours best. Unlike sums of angles around the node, this converges on
// any mesh. A crease (a ridge cable) is smeared over its two neighbours.
//
// F. Cazals & M. Pouget: Estimating differential quantities using polynomial
// fitting of osculating jets. Computer Aided Geometric Design 22 (2005),
// 121-146.
func Curvatures(position []r3.Vec, corners [][3]int32) []Curvature {
	n := len(position)
	out := make([]Curvature, n)
	normal := VertexNormals(position, corners)
	edges := Edges(corners)
	inside := make([]bool, n)
	for _, c := range corners {
		for _, i := range c {
			inside[i] = true
		}
	}
	for _, e := range edges {
		if e.Triangles != 2 {
			inside[e.Nodes[0]], inside[e.Nodes[1]] = false, false
		}
	}
	start, adj := neighbours(n, edges)
	seen := make([]int32, n)
	var ring []int32
	nan := math.NaN()
	for i := range int32(n) {
		out[i] = Curvature{nan, nan, nan, nan}
		if !inside[i] || normal[i] == (r3.Vec{}) {
			continue
		}
		ring = ring[:0]
		seen[i] = i + 1
		add := func(k int32) {
			for _, j := range adj[start[k]:start[k+1]] {
				if seen[j] != i+1 {
					seen[j] = i + 1
					ring = append(ring, j)
				}
			}
		}
		add(i)
		for _, k := range ring[:len(ring):len(ring)] {
			add(k)
		}
		if c, ok := fitQuadric(position, i, ring, normal[i]); ok {
			out[i] = c
		}
	}
	return out
}

// neighbours lists the nodes joined to each by a side.
func neighbours(n int, edges []Edge) (start, adj []int32) {
	start = make([]int32, n+1)
	for _, e := range edges {
		start[e.Nodes[0]]++
		start[e.Nodes[1]]++
	}
	var sum int32
	for i, d := range start {
		start[i] = sum
		sum += d
	}
	adj = make([]int32, sum)
	fill := append([]int32(nil), start...)
	for _, e := range edges {
		i, j := e.Nodes[0], e.Nodes[1]
		adj[fill[i]], adj[fill[j]] = j, i
		fill[i]++
		fill[j]++
	}
	return start, adj
}

// fitQuadric fits h = d·u + e·v + ½a·u² + b·uv + ½c·v² through node i to the
// ring in the least-squares sense, h along the normal.
func fitQuadric(position []r3.Vec, i int32, ring []int32, n r3.Vec) (Curvature, bool) {
	if len(ring) < 5 {
		return Curvature{}, false
	}
	ax := r3.Vec{X: 1}
	if math.Abs(n.X) > 0.7 {
		ax = r3.Vec{Y: 1}
	}
	eu := r3.Unit(r3.Cross(ax, n))
	ev := r3.Cross(n, eu)
	scale := 0.0
	for _, j := range ring {
		scale = max(scale, norm(r3.Sub(position[j], position[i])))
	}
	if !(scale > 0) {
		return Curvature{}, false
	}
	var m [5][6]float64
	for _, j := range ring {
		w := r3.Scale(1/scale, r3.Sub(position[j], position[i]))
		u, v, h := r3.Dot(w, eu), r3.Dot(w, ev), r3.Dot(w, n)
		row := [6]float64{u, v, u * u / 2, u * v, v * v / 2, h}
		for p := range 5 {
			for q := range 6 {
				m[p][q] += row[p] * row[q]
			}
		}
	}
	x, ok := solve5(&m)
	if !ok {
		return Curvature{}, false
	}
	d, e, a, b, c := x[0], x[1], x[2]/scale, x[3]/scale, x[4]/scale
	g := 1 + d*d + e*e
	mean := -((1+e*e)*a - 2*d*e*b + (1+d*d)*c) / (2 * g * math.Sqrt(g))
	gauss := (a*c - b*b) / (g * g)
	r := math.Sqrt(max(mean*mean-gauss, 0))
	return Curvature{Mean: mean, Gauss: gauss, K1: mean + r, K2: mean - r}, true
}

// solve5 solves five equations by elimination with partial pivoting.
func solve5(m *[5][6]float64) (x [5]float64, ok bool) {
	for k := range 5 {
		p := k
		for i := k + 1; i < 5; i++ {
			if math.Abs(m[i][k]) > math.Abs(m[p][k]) {
				p = i
			}
		}
		if !(math.Abs(m[p][k]) > 1e-12) {
			return x, false
		}
		m[k], m[p] = m[p], m[k]
		for i := k + 1; i < 5; i++ {
			f := m[i][k] / m[k][k]
			for j := k; j < 6; j++ {
				m[i][j] -= f * m[k][j]
			}
		}
	}
	for k := 4; k >= 0; k-- {
		x[k] = m[k][5]
		for j := k + 1; j < 5; j++ {
			x[k] -= m[k][j] * x[j]
		}
		x[k] /= m[k][k]
	}
	return x, true
}
