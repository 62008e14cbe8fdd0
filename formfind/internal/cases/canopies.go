package cases

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// FourPoint is a sail on a square of the given side with corners alternately
// at ±rise/2, uniform stress and four edge cables of the given force, n cells
// a side. The rough shape has edges that sag towards the middle by the given
// share of their chord. No closed form is known; by symmetry the centre is at
// z = 0. With rise 0 it is the flat square, which has equilibrium only for
// force > stress·side/√2.
func FourPoint(side, rise, stress, force, sag float64, n int) Case {
	var b builder
	corner := func(u, v float64) r3.Vec {
		return r3.Vec{X: side * (u - 0.5), Y: side * (v - 0.5), Z: 0.5 * rise * (2*u - 1) * (2*v - 1)}
	}
	// Parabolic sag of opposite edges, blended over the patch.
	bow := func(u float64) float64 { return 4 * sag * side * u * (1 - u) }
	at := func(u, v float64) r3.Vec {
		p := corner(u, v)
		p.X -= bow(v) * (2*u - 1)
		p.Y -= bow(u) * (2*v - 1)
		return p
	}
	id := b.grid(n, n, false, at, func(i, j int) canopy.Freedom {
		if (i == 0 || i == n) && (j == 0 || j == n) {
			return canopy.DirAll
		}
		return 0
	}, along(r3.Vec{X: 1}), [2]float64{stress, stress})
	run := func(f func(k int) int32) []int32 {
		nodes := make([]int32, n+1)
		for k := range nodes {
			nodes[k] = f(k)
		}
		return nodes
	}
	b.chain("south", run(func(k int) int32 { return id(k, 0) }), canopy.KindEdgeCable, force)
	b.chain("east", run(func(k int) int32 { return id(n, k) }), canopy.KindEdgeCable, force)
	b.chain("north", run(func(k int) int32 { return id(n-k, n) }), canopy.KindEdgeCable, force)
	b.chain("west", run(func(k int) int32 { return id(0, n-k) }), canopy.KindEdgeCable, force)
	return Case{
		Name:   fmt.Sprintf("four-point sail %g×%g rise %g n=%d", side, side, rise, n),
		Source: "own geometry; the flat square's least edge force σL/(2 sin(corner angle/2)) by equilibrium of the corner",
		S:      &b.s,
	}
}

// EdgeCableStrip is a flat film whose one edge is a cable over a chord of the
// given length and whose other three edges are fixed straight lines, the film
// being depth deep. The cable takes the shape of a circular arc of radius
// R = force/stress (equilibrium of a cable against a uniform film), with
// sag = R − √(R² − chord²/4). Cable 0 is the edge.
func EdgeCableStrip(chord, depth, stress, force float64, nx, ny int) Case {
	r := force / stress
	sag := r - math.Sqrt(r*r-chord*chord/4)
	arc := func(x float64) float64 { return math.Sqrt(r*r-x*x) - (r - sag) } // height over the chord
	shape := func(f func(x float64) float64) func(u, v float64) r3.Vec {
		return func(u, v float64) r3.Vec {
			x := chord * (u - 0.5)
			// Fabric lies at y ≥ cable; the cable bows into it.
			y := f(x)
			return r3.Vec{X: x, Y: y + (depth-y)*v}
		}
	}
	fixed := func(i, j int) canopy.Freedom {
		if i == 0 || i == nx || j == ny {
			return canopy.DirAll
		}
		return 0
	}
	var b, e builder
	id := b.grid(nx, ny, false, shape(func(x float64) float64 { return 0.8 * sag * (1 - 4*x*x/(chord*chord)) }), fixed, along(r3.Vec{X: 1}), [2]float64{stress, stress})
	e.grid(nx, ny, false, shape(arc), fixed, along(r3.Vec{X: 1}), [2]float64{stress, stress})
	nodes := make([]int32, nx+1)
	for i := range nodes {
		nodes[i] = id(i, 0)
	}
	b.chain("edge", nodes, canopy.KindEdgeCable, force)
	return Case{
		Name:   fmt.Sprintf("edge cable strip R=%g", r),
		Source: "equilibrium of a cable against a uniform film: T = σR",
		S:      &b.s,
		Exact:  e.s.Position,
	}
}

// Cone is a fabric between a ring of radius rTop at height h and one of radius
// rBase at z = 0, both fixed, warp along the meridian, weft around. For equal
// stresses it is a catenoid r = c·cosh((z−z₀)/c). For the ratio
// m = weft:warp it is the cone of constant ratio, sin α = (c/r)^m with α the
// slope, and its stress varies as r^(m−1) (axisymmetric membrane equilibrium).
// See ConeConstant and ConeHeight. The rough shape is a straight cone. Rows
// are graded so that cells keep their shape.
func Cone(rBase, rTop, h float64, stress [2]float64, around, rows int) Case {
	var b builder
	q := rTop / rBase
	at := func(u, v float64) r3.Vec {
		sin, cos := math.Sincos(2 * math.Pi * u)
		r := rBase * math.Pow(q, v)
		z := h * (rBase - r) / (rBase - rTop)
		return r3.Vec{X: r * cos, Y: r * sin, Z: z}
	}
	b.grid(around, rows, true, at, func(_, j int) canopy.Freedom {
		if j == 0 || j == rows {
			return canopy.DirAll
		}
		return 0
	}, func(c r3.Vec) r3.Vec { // axis plane
		return r3.Vec{X: c.X, Y: c.Y, Z: -math.Hypot(c.X, c.Y) * h / (rBase - rTop)}
	}, stress)
	b.s.Fabrics[0].WarpRule, b.s.Fabrics[0].WarpAxis = canopy.WarpRadial, r3.Vec{Z: 1}
	c := Case{
		Name:   fmt.Sprintf("cone %g/%g h=%g warp:weft %g:%g", rBase, rTop, h, stress[0], stress[1]),
		Source: "axisymmetric membrane equilibrium: d(r·Ns)/dr = Nh, r·Ns·sin α = constant",
		S:      &b.s,
	}
	m := stress[1] / stress[0]
	if k := ConeConstant(rBase, rTop, h, m); k == k {
		c.Distance = func(p r3.Vec) float64 {
			r := math.Hypot(p.X, p.Y)
			sin := math.Pow(k/r, m)
			return (p.Z - ConeHeight(rBase, r, k, m)) * math.Sqrt(max(0, 1-sin*sin))
		}
	}
	return c
}

// ConeHeight is the height at radius r above the base radius of the cone
// sin α = (c/r)^m: ∫ dr/√((r/c)^{2m} − 1) from r to the base, by quadrature.
func ConeHeight(rBase, r, c, m float64) float64 {
	// r = c·cosh^{1/m}(t) turns the integrand into c/m·cosh^{1/m−1}(t), which
	// is smooth at the vertical tangent r = c.
	t := func(r float64) float64 { return math.Acosh(max(1, math.Pow(r/c, m))) }
	a, b := t(r), t(rBase)
	f := func(t float64) float64 { return c / m * math.Pow(math.Cosh(t), 1/m-1) }
	const n = 400 // Simpson
	step := (b - a) / n
	sum := f(a) + f(b)
	for i := 1; i < n; i++ {
		w := 2.0
		if i%2 == 1 {
			w = 4
		}
		sum += w * f(a+float64(i)*step)
	}
	return sum * step / 3
}

// ConeConstant returns c of the cone sin α = (c/r)^m of height h without a
// neck, by bisection; NaN when h is beyond the neck-free limit (c = rTop).
func ConeConstant(rBase, rTop, h, m float64) float64 {
	lo, hi := 1e-9*rTop, rTop
	if ConeHeight(rBase, rTop, hi, m) < h {
		return math.NaN()
	}
	for range 100 {
		mid := 0.5 * (lo + hi)
		if ConeHeight(rBase, rTop, mid, m) < h {
			lo = mid
		} else {
			hi = mid
		}
	}
	return 0.5 * (lo + hi)
}

// RingOnMast is a cone of uniform stress whose top is a rigid ring that slides
// along z, pulled up by force (N, upwards): sliding needs
// force = 2π·σ·c with c the catenoid's parameter, so that of the two heights of
// a given force the lower one is stable, and none exists above 2π·rTop·σ.
// Exact height by ConeHeight with m = 1. The ring's centre is the last node.
func RingOnMast(rBase, rTop, start, stress, force float64, around, rows int) Case {
	c := Cone(rBase, rTop, start, [2]float64{stress, stress}, around, rows)
	s := c.S
	centre := int32(len(s.Position))
	s.Position = append(s.Position, r3.Vec{Z: start})
	s.Fixed = append(s.Fixed, canopy.DirX|canopy.DirY)
	s.Master = make([]int32, len(s.Position))
	s.Load = make([]r3.Vec, len(s.Position))
	for i := range s.Master {
		s.Master[i] = -1
	}
	ring := canopy.Ring{Name: "ring", Centre: centre, Rigid: true, Free: canopy.DirZ, Cable: -1}
	for i := rows * around; i < (rows+1)*around; i++ {
		s.Fixed[i] = canopy.DirX | canopy.DirY
		s.Master[i] = centre
		ring.Nodes = append(ring.Nodes, int32(i))
	}
	s.Rings = append(s.Rings, ring)
	s.Load[centre] = r3.Vec{Z: force}
	c.Name = "ring on a mast"
	c.Distance = nil
	return c
}

// ThreeFilms are three films of equal stress that meet on a line from (0,0,0)
// to (0,0,length), clamped at its ends, and are held along three vertical
// lines at distance 1 m and at the given angles around z (rad), n cells each
// way. On a straight seam the films are flat and at 120° to each other
// (Plateau 1873; proof J. Taylor, Ann. Math. 103 (1976) 489-539): the seam
// goes to the Fermat point of the three lines in plan. The seam's ends are
// free in x and y and the films' top and bottom edges free to slide in x and y.
func ThreeFilms(angles [3]float64, length, stress float64, n int) Case {
	var b builder
	b.s.Fabrics = make([]canopy.Fabric, 3)
	horizontal := canopy.DirZ
	seam := make([]int32, n+1)
	for j := range seam {
		f := canopy.Freedom(0)
		if j == 0 || j == n {
			f = horizontal
		}
		seam[j] = b.node(r3.Vec{Z: length * float64(j) / float64(n)}, f)
	}
	for k, a := range angles {
		b.s.Fabrics[k].Name = fmt.Sprintf("film %d", k+1)
		sin, cos := math.Sincos(a)
		row := make([][]int32, n+1)
		for j := range row {
			row[j] = []int32{seam[j]}
			for i := 1; i <= n; i++ {
				f := canopy.Freedom(0)
				if j == 0 || j == n {
					f = horizontal
				}
				if i == n {
					f = canopy.DirAll
				}
				u := float64(i) / float64(n)
				row[j] = append(row[j], b.node(r3.Vec{X: u * cos, Y: u * sin, Z: length * float64(j) / float64(n)}, f))
			}
		}
		for j := range n {
			for i := range n {
				p, q, r, s := row[j][i], row[j][i+1], row[j+1][i+1], row[j+1][i]
				w, st := r3.Vec{Z: 1}, [2]float64{stress, stress}
				if (i+j)%2 == 0 {
					b.triangle(p, q, r, int32(k), w, st)
					b.triangle(p, r, s, int32(k), w, st)
				} else {
					b.triangle(p, q, s, int32(k), w, st)
					b.triangle(q, r, s, int32(k), w, st)
				}
			}
		}
	}
	return Case{Name: "three films", Source: "Plateau 1873; J. Taylor, Ann. Math. 103 (1976) 489-539", S: &b.s}
}
