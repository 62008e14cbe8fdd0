package main

import (
	"math/rand/v2"
)

// triangulation is a Delaunay mesh made by inserting points one by one and
// flipping edges (Lawson 1977). It relies on the points being random: nothing
// here is exact.
type triangulation struct {
	x, y []float64
	tri  [][3]int32 // corners, counter-clockwise
	adj  [][3]int32 // triangle across the edge opposite each corner, -1 outside
}

// newTriangulation triangulates side² random points and drops the three
// corners of the triangle around them all.
func newTriangulation(side int, rng *rand.Rand) *triangulation {
	n := side * side
	m := &triangulation{x: make([]float64, n, n+3), y: make([]float64, n, n+3)}
	// One point in each cell, rows walked to and fro, keeps the search short.
	for k := range n {
		i, j := k/side, k%side
		if i%2 == 1 {
			j = side - 1 - j
		}
		m.x[k] = (float64(j) + rng.Float64()) / float64(side)
		m.y[k] = (float64(i) + rng.Float64()) / float64(side)
	}
	m.x = append(m.x, -10, 30, -10)
	m.y = append(m.y, -10, -10, 30)
	m.tri = append(m.tri, [3]int32{int32(n), int32(n + 1), int32(n + 2)})
	m.adj = append(m.adj, [3]int32{-1, -1, -1})
	at := int32(0)
	for p := range int32(n) {
		at = m.insert(p, at)
	}
	return m
}

func (m *triangulation) orient(a, b, c int32) float64 {
	return (m.x[b]-m.x[a])*(m.y[c]-m.y[a]) - (m.y[b]-m.y[a])*(m.x[c]-m.x[a])
}

// inCircle tells whether d is inside the circle through a, b, c.
func (m *triangulation) inCircle(a, b, c, d int32) bool {
	ax, ay := m.x[a]-m.x[d], m.y[a]-m.y[d]
	bx, by := m.x[b]-m.x[d], m.y[b]-m.y[d]
	cx, cy := m.x[c]-m.x[d], m.y[c]-m.y[d]
	return (ax*ax+ay*ay)*(bx*cy-cx*by)-(bx*bx+by*by)*(ax*cy-cx*ay)+(cx*cx+cy*cy)*(ax*by-bx*ay) > 1e-30
}

// insert adds point p, looking for its triangle from t, and returns one of the
// new triangles.
func (m *triangulation) insert(p, t int32) int32 {
walk:
	for {
		for k := range 3 {
			v := m.tri[t]
			if m.orient(v[(k+1)%3], v[(k+2)%3], p) < 0 {
				t = m.adj[t][k]
				continue walk
			}
		}
		break
	}
	v, a := m.tri[t], m.adj[t]
	u, w := int32(len(m.tri)), int32(len(m.tri)+1)
	// t, u, w have p as corner 0 and the old edges opposite to it.
	m.tri[t] = [3]int32{p, v[1], v[2]}
	m.adj[t] = [3]int32{a[0], u, w}
	m.tri = append(m.tri, [3]int32{p, v[2], v[0]}, [3]int32{p, v[0], v[1]})
	m.adj = append(m.adj, [3]int32{a[1], w, t}, [3]int32{a[2], t, u})
	m.relink(a[1], t, u)
	m.relink(a[2], t, w)
	for _, s := range []int32{t, u, w} {
		m.legalize(s)
	}
	return t
}

func (m *triangulation) relink(t, from, to int32) {
	if t < 0 {
		return
	}
	for k := range 3 {
		if m.adj[t][k] == from {
			m.adj[t][k] = to
			return
		}
	}
}

// legalize flips the edge opposite corner 0 of t until it is Delaunay.
func (m *triangulation) legalize(t int32) {
	o := m.adj[t][0]
	if o < 0 {
		return
	}
	k := 0
	for m.adj[o][k] != t {
		k++
	}
	d := m.tri[o][k]
	p, a, b := m.tri[t][0], m.tri[t][1], m.tri[t][2]
	if !m.inCircle(p, a, b, d) {
		return
	}
	// t = (p, a, d), o = (p, d, b).
	oa, ob := m.adj[o][(k+1)%3], m.adj[o][(k+2)%3] // across (d, a)... by corner order of o: d, b, a
	tb := m.adj[t][1]                              // across (b, p)
	ta := m.adj[t][2]                              // across (p, a)
	m.tri[t] = [3]int32{p, a, d}
	m.adj[t] = [3]int32{oa, o, ta}
	m.tri[o] = [3]int32{p, d, b}
	m.adj[o] = [3]int32{ob, tb, t}
	m.relink(oa, o, t)
	m.relink(tb, t, o)
	m.legalize(t)
	m.legalize(o)
}

// edges lists each edge between the points once.
func (m *triangulation) edges() [][2]int32 {
	n := int32(len(m.x) - 3)
	var e [][2]int32
	for t, v := range m.tri {
		for k := range 3 {
			a, b := v[(k+1)%3], v[(k+2)%3]
			if a < n && b < n && (m.adj[t][k] < int32(t)) {
				e = append(e, [2]int32{a, b})
			}
		}
	}
	return e
}
