package cases

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// CapRise is the rise of the spherical cap of the given volume over a circle of
// radius a, V = πh(3a² + h²)/6, from Cardano's formula.
func CapRise(a, volume float64) float64 {
	// h³ + 3a²h = 6V/π has one real root, 2a·sinh(asinh(3V/(πa³))/3).
	return 2 * a * math.Sinh(math.Asinh(3*volume/(math.Pi*a*a*a))/3)
}

// VolumeCap is a film on a flat ring of radius a over the plane of which it
// encloses a given volume: the spherical cap of rise h, V = πh(3a² + h²)/6,
// radius R = (a² + h²)/(2h), pressure 2σ/R, area π(a² + h²) (Laplace-Young for
// one membrane; elementary geometry). Past the hemisphere, V > 2πa³/3, it is
// stable because its volume is given and would not be at its pressure. The
// rough shape is flat. Exact has its rows where bipolar coordinates carry those
// of the flat one.
func VolumeCap(a, volume, stress float64, rows int) Case {
	h := CapRise(a, volume)
	radius := (a*a + h*h) / (2 * h)
	c := Case{
		Name:   fmt.Sprintf("cap V=%g", volume),
		Source: "Laplace-Young p = 2T/R for one membrane; elementary geometry",
		Area:   math.Pi * (a*a + h*h),
	}
	var b builder
	evenDisc(&b, a, rows, 0, stress)
	c.S = &b.s
	e, err := c.S.Enclose("fabric", []int32{0}, 1, volume)
	if err != nil {
		panic(err)
	}
	c.S.Enclosures = []canopy.Enclosure{e}
	mid := r3.Vec{Z: h - radius}
	c.Distance = func(q r3.Vec) float64 {
		if h == 0 {
			return q.Z
		}
		return r3.Norm(r3.Sub(q, mid)) - math.Abs(radius)
	}
	// Bipolar coordinates about the ring: on a circle through it every point is
	// given by the logarithm τ of the ratio of its distances from the ring's two
	// points in the meridian, and the cap by the angle under which it sees them.
	angle := math.Pi - 2*math.Atan2(h, a)
	for i, p := range c.S.Position {
		if c.S.Fixed[i] != 0 {
			c.Exact = append(c.Exact, p)
			continue
		}
		r := math.Hypot(p.X, p.Y)
		tau := math.Log((a + r) / (a - r))
		f := math.Cosh(tau) - math.Cos(angle)
		to := r3.Vec{Z: a * math.Sin(angle) / f}
		if r > 0 {
			s := a * math.Sinh(tau) / f / r
			to.X, to.Y = s*p.X, s*p.Y
		}
		c.Exact = append(c.Exact, to)
	}
	return c
}

// evenDisc adds a level disc of radius a in a film of its own, of even triangles:
// row j has 6j nodes.
func evenDisc(b *builder, a float64, rows int, fabric int32, stress float64) {
	b.s.Fabrics = append(b.s.Fabrics, canopy.Fabric{Name: [2]string{"fabric", "lower"}[fabric]})
	w, st := r3.Vec{X: 1}, [2]float64{stress, stress}
	pole := int32(len(b.s.Position))
	rim := map[int]int32{} // of the film below, which has the same
	id := func(j, i int) int32 {
		if j == 0 {
			return pole
		}
		i %= 6 * j
		if k, shared := rim[i]; shared && j == rows {
			return k
		}
		return pole + 1 + int32(3*j*(j-1)+i)
	}
	if fabric > 0 {
		for i := range 6 * rows {
			rim[i] = int32(1 + 3*rows*(rows-1) + i)
		}
	}
	for j := range rows + 1 {
		for i := range max(1, 6*j) {
			if j == rows && fabric > 0 {
				break
			}
			fixed := canopy.Freedom(0)
			if j == rows {
				fixed = canopy.DirAll
			}
			r := a * float64(j) / float64(rows)
			sin, cos := math.Sincos(2 * math.Pi * float64(i) / float64(max(1, 6*j)))
			b.node(r3.Vec{X: r * cos, Y: r * sin}, fixed)
		}
	}
	add := func(i, j, k int32) {
		if fabric > 0 { // looks down
			j, k = k, j
		}
		b.triangle(i, j, k, fabric, w, st)
	}
	for j := 1; j <= rows; j++ {
		for sector := range 6 {
			for k := range j {
				out, in := sector*j+k, sector*(j-1)+k
				add(id(j-1, in), id(j, out), id(j, out+1))
				if k < j-1 {
					add(id(j-1, in), id(j, out+1), id(j-1, in+1))
				}
			}
		}
	}
}

// Lens is a cushion of two films of different stress on one ring of radius a,
// that enclose a given volume between them: two spherical caps under one
// pressure p, of radii 2σ/p, whose volumes add up (Laplace-Young). Rises are
// those of the upper and the lower film; the rough shape is flat.
func Lens(a, volume, upper, lower float64, rows int) (c Case, pressure float64, rise [2]float64) {
	var b builder
	evenDisc(&b, a, rows, 0, upper)
	evenDisc(&b, a, rows, 1, lower)
	c = Case{
		Name:   fmt.Sprintf("lens V=%g", volume),
		Source: "Laplace-Young p = 2T/R for each film; elementary geometry",
		S:      &b.s,
	}
	e, err := c.S.Enclose("fabric", []int32{0, 1}, 1, volume)
	if err != nil {
		panic(err)
	}
	c.S.Enclosures = []canopy.Enclosure{e}
	// Both films are shallower than a hemisphere: p from the volumes by
	// bisection.
	caps := func(p float64) float64 {
		sum := 0.0
		for i, s := range [2]float64{upper, lower} {
			radius := 2 * s / p
			rise[i] = a * a / (radius + math.Sqrt(radius*radius-a*a))
			sum += math.Pi * rise[i] * (3*a*a + rise[i]*rise[i]) / 6
		}
		return sum
	}
	lo, hi := 0.0, 2*min(upper, lower)/a
	for range 200 {
		pressure = (lo + hi) / 2
		if caps(pressure) < volume {
			lo = pressure
		} else {
			hi = pressure
		}
	}
	c.Area = 2*math.Pi*a*a + math.Pi*(rise[0]*rise[0]+rise[1]*rise[1])
	return c, pressure, rise
}

// Enclosed is the volume that enclosure e of s holds at the positions at, by
// tetrahedra about its base.
func Enclosed(s *canopy.Structure, e int, at []r3.Vec) float64 {
	sum := 0.0
	o := at[s.Enclosures[e].Base]
	for k, f := range s.Enclosures[e].Fabrics {
		for t, c := range s.Corners {
			if s.FabricOf[t] == f {
				a, b, d := r3.Sub(at[c[0]], o), r3.Sub(at[c[1]], o), r3.Sub(at[c[2]], o)
				sum += float64(s.Enclosures[e].Side[k]) * r3.Dot(a, r3.Cross(b, d)) / 6
			}
		}
	}
	return sum
}
