package cases

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// CriticalHalfSeparation is the largest h/R at which two equal coaxial rings
// of radius R at z = ±h still carry a catenoid: u*/cosh u* with u* tanh u* = 1
// (Goldschmidt 1831; Nitsche, Minimal Surfaces, vol. 1, 1989).
const CriticalHalfSeparation = 0.662743419349182

// Waist returns the waist radius a of a catenoid between rings of radius 1 at
// z = ±h: the larger (stable) or the smaller (unstable) root of
// a·cosh(h/a) = 1, by bisection. NaN beyond the critical separation.
func Waist(h float64, stable bool) float64 {
	const turn = 1.19967864025773 // u*, where a·cosh(h/a) has its minimum over a
	f := func(a float64) float64 { return a*math.Cosh(h/a) - 1 }
	lo, hi := h/turn, 1.0 // f(lo) < 0 < f(hi)
	if !stable {
		lo, hi = h/turn, h/50
	}
	if !(f(lo) < 0) {
		return math.NaN()
	}
	for range 200 {
		mid := 0.5 * (lo + hi)
		if f(mid) < 0 {
			lo = mid
		} else {
			hi = mid
		}
	}
	return 0.5 * (lo + hi)
}

// Catenoid is a film of uniform stress between two rings of radius 1 m at
// z = ±h, around nodes on each ring and along rows between. The rough shape is
// a cylinder. Exact is on the stable branch, or on the unstable one.
//
// Radius a·cosh(z/a), area π·a·(2h + a·sinh(2h/a)), axial force 2π·a·σ (Euler
// 1744; Nitsche 1989). Beyond the critical separation there is no exact shape.
func Catenoid(h float64, around, along int, stable bool, stress float64) Case {
	c := Case{
		Name:   fmt.Sprintf("catenoid h=%g %d×%d", h, around, along),
		Source: "Euler 1744; J. C. C. Nitsche, Minimal Surfaces, vol. 1, Cambridge 1989",
	}
	fixed := func(_, j int) canopy.Freedom {
		if j == 0 || j == along {
			return canopy.DirAll
		}
		return 0
	}
	// Meridian is counter-clockwise seen from outside with u around z and v up.
	build := func(radius, z func(v float64) float64) *canopy.Structure {
		var b builder
		b.grid(around, along, true, func(u, v float64) r3.Vec {
			sin, cos := math.Sincos(2 * math.Pi * u)
			return r3.Vec{X: radius(v) * cos, Y: radius(v) * sin, Z: z(v)}
		}, fixed, func(r3.Vec) r3.Vec { return r3.Vec{Z: 1} }, [2]float64{stress, stress})
		return &b.s
	}
	c.S = build(func(float64) float64 { return 1 }, func(v float64) float64 { return h * (2*v - 1) })
	a := Waist(h, stable)
	if math.IsNaN(a) {
		return c
	}
	// Rows at equal distances along the meridian, whose length from the waist
	// is a·sinh(z/a).
	top := a * math.Sinh(h/a)
	z := func(v float64) float64 { return a * math.Asinh((2*v-1)*top/a) }
	c.Exact = build(func(v float64) float64 { return a * math.Cosh(z(v)/a) }, z).Position
	for i := range c.S.Position { // rings exactly at radius 1 in both
		if c.S.Fixed[i] != 0 {
			c.Exact[i] = c.S.Position[i]
		}
	}
	c.Area = math.Pi * a * (2*h + a*math.Sinh(2*h/a))
	c.Distance = func(p r3.Vec) float64 {
		return (math.Hypot(p.X, p.Y) - a*math.Cosh(p.Z/a)) / math.Cosh(p.Z/a)
	}
	return c
}

// Scherk is a film of uniform stress on the square |x|, |y| ≤ half whose edges
// lie on z = ln(cos y/cos x) (Scherk 1835), n cells a side. The rough shape is
// flat inside. The surface is a graph, hence of least area. Areas by
// quadrature of √(1 + tan²x + tan²y) over the square, known for half = 0.5
// and 1.
func Scherk(half float64, n int, stress float64) Case {
	z := func(x, y float64) float64 { return math.Log(math.Cos(y) / math.Cos(x)) }
	var b builder
	edge := func(i, j int) canopy.Freedom {
		if i == 0 || j == 0 || i == n || j == n {
			return canopy.DirAll
		}
		return 0
	}
	var exact []r3.Vec
	b.grid(n, n, false, func(u, v float64) r3.Vec {
		p := r3.Vec{X: half * (2*u - 1), Y: half * (2*v - 1)}
		e := r3.Vec{X: p.X, Y: p.Y, Z: z(p.X, p.Y)}
		exact = append(exact, e)
		if u == 0 || v == 0 || u == 1 || v == 1 {
			return e
		}
		return p
	}, edge, along(r3.Vec{X: 1}), [2]float64{stress, stress})
	c := Case{
		Name:   fmt.Sprintf("Scherk half=%g n=%d", half, n),
		Source: "H. F. Scherk, J. reine angew. Math. 13 (1835); area recomputed by quadrature",
		S:      &b.s,
		Exact:  exact,
		Distance: func(p r3.Vec) float64 {
			tx, ty := math.Tan(p.X), math.Tan(p.Y)
			return (p.Z - z(p.X, p.Y)) / math.Sqrt(1+tx*tx+ty*ty)
		},
	}
	switch half {
	case 0.5:
		c.Area = 1.08724596383764
	case 1:
		c.Area = 5.69751221158706
	}
	return c
}

// SchwarzD is a film of uniform stress spanning four edges of a regular
// tetrahedron: face diagonals of a cube of side 1 m with corners at heights
// 0, 1, 0, 1. The rough shape is the bilinear patch z = x + y − 2xy.
//
// Area K(3/4)/K(1/4) = 1.27926157117 m² with K the complete elliptic integral
// of parameter m = k² (Schwarz 1865; recomputed). By symmetry the centre stays
// at half height.
func SchwarzD(n int, stress float64) Case {
	var b builder
	b.grid(n, n, false, func(u, v float64) r3.Vec {
		return r3.Vec{X: u, Y: v, Z: u + v - 2*u*v}
	}, func(i, j int) canopy.Freedom {
		if i == 0 || j == 0 || i == n || j == n {
			return canopy.DirAll
		}
		return 0
	}, along(r3.Vec{X: 1, Y: 1}), [2]float64{stress, stress})
	return Case{
		Name:   fmt.Sprintf("Schwarz D n=%d", n),
		Source: "H. A. Schwarz, Gesammelte Mathematische Abhandlungen I (1865/1890); value recomputed from complete elliptic integrals",
		S:      &b.s,
		Area:   1.27926157117,
	}
}

// SphereCap is a film on a flat ring of radius a under internal pressure p
// (N/m²) towards +z, rows from the ring to the pole. For p < 2σ/a it is the
// lower spherical cap: R = 2σ/p, rise R − √(R² − a²), area π(a² + rise²)
// (Laplace-Young for one membrane; elementary geometry). Above there is none.
func SphereCap(a, p, stress float64, around, rows int) Case {
	c := Case{
		Name:   fmt.Sprintf("cap p=%g", p),
		Source: "Laplace-Young p = 2T/R for one membrane; elementary geometry",
	}
	radius := 2 * stress / p
	rise := radius - math.Sqrt(radius*radius-a*a)
	var b builder
	rough := 0.3 * a
	if rise == rise {
		rough = rise
	}
	c.S = disc(&b, a, around, rows, func(r float64) float64 { return rough * (1 - r*r/(a*a)) }, stress)
	c.S.Fabrics[0].Pressure = p
	if rise == rise {
		var e builder
		c.Exact = disc(&e, a, around, rows, func(r float64) float64 { return math.Sqrt(radius*radius-r*r) - (radius - rise) }, stress).Position
		c.Area = math.Pi * (a*a + rise*rise)
		c.Distance = func(q r3.Vec) float64 {
			return r3.Norm(r3.Sub(q, r3.Vec{Z: rise - radius})) - radius
		}
	}
	return c
}

// disc meshes a disc of radius a in rings with one node at the centre; the
// number of nodes around stays the same from ring to ring.
func disc(b *builder, a float64, around, rows int, z func(r float64) float64, stress float64) *canopy.Structure {
	b.s.Fabrics = append(b.s.Fabrics, canopy.Fabric{Name: "fabric"})
	w, st := r3.Vec{X: 1}, [2]float64{stress, stress}
	pole := b.node(r3.Vec{Z: z(0)}, 0)
	id := func(i, j int) int32 { return pole + 1 + int32((j-1)*around+i%around) }
	for j := 1; j <= rows; j++ {
		r := a * float64(j) / float64(rows)
		f := canopy.Freedom(0)
		if j == rows {
			f = canopy.DirAll
		}
		for i := range around {
			sin, cos := math.Sincos(2 * math.Pi * float64(i) / float64(around))
			b.node(r3.Vec{X: r * cos, Y: r * sin, Z: z(r)}, f)
		}
	}
	for i := range around {
		b.triangle(pole, id(i, 1), id(i+1, 1), 0, w, st)
	}
	for j := 1; j < rows; j++ {
		for i := range around {
			p, q, r, s := id(i, j), id(i, j+1), id(i+1, j+1), id(i+1, j)
			if (i+j)%2 == 0 {
				b.triangle(p, q, r, 0, w, st)
				b.triangle(p, r, s, 0, w, st)
			} else {
				b.triangle(p, q, s, 0, w, st)
				b.triangle(q, r, s, 0, w, st)
			}
		}
	}
	return &b.s
}
