package cases

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// QuadNet is a net of (n+1)×(n+1) nodes on a square of the given side, corners
// at alternate heights 0 and rise, the four edges fixed on straight lines, all
// links of force density q. With equal q on a regular grid the answer is
// exactly the bilinear surface (Schek 1974: the equations decouple into
// z = mean of the neighbours, which the bilinear form satisfies). The rough
// shape is flat.
func QuadNet(side, rise, q float64, n int) Case {
	var b builder
	c := Case{Name: fmt.Sprintf("quad net n=%d", n), Source: "H.-J. Schek, Comput. Methods Appl. Mech. Eng. 3 (1974) 115-134; bilinear form by insertion"}
	id := func(i, j int) int32 { return int32(j*(n+1) + i) }
	for j := range n + 1 {
		for i := range n + 1 {
			u, v := float64(i)/float64(n), float64(j)/float64(n)
			e := r3.Vec{X: side * u, Y: side * v, Z: rise * (u + v - 2*u*v)}
			c.Exact = append(c.Exact, e)
			if i == 0 || j == 0 || i == n || j == n {
				b.node(e, canopy.DirAll)
			} else {
				b.node(r3.Vec{X: e.X, Y: e.Y}, 0)
			}
		}
	}
	for j := 1; j < n; j++ {
		for i := range n {
			b.member(id(i, j), id(i+1, j), canopy.KindNetCable, canopy.LawForceDensity, q)
		}
	}
	for i := 1; i < n; i++ {
		for j := range n {
			b.member(id(i, j), id(i, j+1), canopy.KindNetCable, canopy.LawForceDensity, q)
		}
	}
	c.S = &b.s
	return c
}

// SquareNetwork connects the corners of a square of side d by five members of
// equal force through two inner points. The least network has length
// (1+√3)·d and 120° at both points (Plateau's laws; recomputed).
func SquareNetwork(d, force float64) Case {
	var b builder
	for _, p := range []r3.Vec{{}, {X: d}, {X: d, Y: d}, {Y: d}} {
		b.node(p, canopy.DirAll)
	}
	p, q := b.node(r3.Vec{X: 0.25 * d, Y: 0.4 * d, Z: 0.1 * d}, 0), b.node(r3.Vec{X: 0.8 * d, Y: 0.6 * d, Z: -0.2 * d}, 0)
	for _, e := range [][2]int32{{0, p}, {3, p}, {p, q}, {1, q}, {2, q}} {
		b.member(e[0], e[1], canopy.KindCable, canopy.LawForce, force)
	}
	// The inner points sit on the axis at d/(2√3) from the sides.
	x := d / (2 * math.Sqrt(3))
	exact := append([]r3.Vec(nil), b.s.Position...)
	exact[p], exact[q] = r3.Vec{X: x, Y: d / 2}, r3.Vec{X: d - x, Y: d / 2}
	return Case{Name: "least network of a square", Source: "Plateau's laws; length (1+√3)d recomputed", S: &b.s, Exact: exact}
}

// FermatPoint ties the corners (0,0), (6,0), (0,4) to one free node by members
// of one law. Equal forces lead to the Fermat point
// (0.957250899105, 1.065658275019) with total length 9.67311838972588
// (recomputed: 120° condition), equal force densities to the centroid
// (2, 4/3).
func FermatPoint(law canopy.Law, given float64) Case {
	var b builder
	for _, p := range []r3.Vec{{}, {X: 6}, {Y: 4}} {
		b.node(p, canopy.DirAll)
	}
	p := b.node(r3.Vec{X: 1.5, Y: 1.5, Z: 0.5}, 0)
	for i := range int32(3) {
		b.member(i, p, canopy.KindCable, law, given)
	}
	exact := append([]r3.Vec(nil), b.s.Position...)
	exact[p] = r3.Vec{X: 0.957250899105, Y: 1.065658275019}
	if law == canopy.LawForceDensity {
		exact[p] = r3.Vec{X: 2, Y: 4.0 / 3}
	}
	return Case{Name: "Fermat point", Source: "120° condition of the Fermat point, recomputed", S: &b.s, Exact: exact}
}

// HangingChain is an elastic cable of n links between supports at (0,0,0) and
// (span,0,rise), unstressed length, stiffness ea (N) and self weight w (N per
// m of unstressed length). As n grows it tends to the elastic catenary (H. M.
// Irvine, Cable Structures, MIT Press 1981). The rough shape is a parabola.
func HangingChain(span, rise, unstressed, ea, w float64, n int) Case {
	var b builder
	sag := 0.0
	if d := math.Hypot(span, rise); unstressed > d {
		sag = math.Sqrt(3.0 / 8 * d * (unstressed - d))
	} else {
		sag = 0.02 * d
	}
	for i := range n + 1 {
		u := float64(i) / float64(n)
		f := canopy.Freedom(0)
		if i == 0 || i == n {
			f = canopy.DirAll
		}
		b.node(r3.Vec{X: span * u, Z: rise*u - 4*sag*u*(1-u)}, f)
	}
	for i := range int32(n) {
		b.elastic(i, i+1, canopy.KindCable, ea, unstressed/float64(n))
		b.s.Weight = append(b.s.Weight, w)
	}
	b.s.SelfWeight = true
	return Case{Name: "hanging chain", Source: "H. M. Irvine, Cable Structures, MIT Press 1981", S: &b.s}
}

// Wire is a straight wire over twice half (m), unstressed so that its force
// is n0 when straight, with a transverse load p at its middle node.
func Wire(half, ea, n0, p float64) Case {
	var b builder
	l0 := half / (1 + n0/ea)
	b.node(r3.Vec{X: -half}, canopy.DirAll)
	b.node(r3.Vec{X: half}, canopy.DirAll)
	m := b.node(r3.Vec{Z: -1e-3 * half}, 0)
	b.elastic(0, m, canopy.KindCable, ea, l0)
	b.elastic(m, 1, canopy.KindCable, ea, l0)
	b.s.Load = make([]r3.Vec, 3)
	b.s.Load[m] = r3.Vec{Z: -p}
	return Case{Name: "wire", Source: "statics of two elastic links, recomputed", S: &b.s}
}
