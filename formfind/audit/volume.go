package audit

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// air is what the audit finds out about an enclosure by itself, from the
// reported mesh.
type air struct {
	volume float64 // m³
	area   float64 // of the fabrics, m²
	rise   float64 // largest height over the plane, m
	// rim is how far the boundary lies off its plane, m.
	rim float64
	// grows is the derivative of the volume by each node, m².
	grows map[int32]r3.Vec
	order []int32
}

// measureAir adds up prisms between triangles and a plane: the one of the
// boundary, or a level one where fabrics close by themselves. (The divergence
// theorem for the field that is the height over the plane, along its normal.
// Engines add up tetrahedra about a node.)
func (c *audited) measureAir(e *canopy.Enclosure) air {
	s := c.s
	side := make([]float64, len(s.Fabrics))
	for k, f := range e.Fabrics {
		side[f] = float64(e.Side[k])
	}
	// Sides walked once belong to the boundary; those between triangles that
	// agree on their outer side are walked in both directions.
	type walked struct{ a, b, n int32 }
	var sides []walked
	for t, c3 := range s.Corners {
		w := side[s.FabricOf[t]]
		if w == 0 {
			continue
		}
		for k := range 3 {
			a, b, n := c3[k], c3[(k+1)%3], int32(1)
			if w < 0 {
				n = -1
			}
			if a > b {
				a, b, n = b, a, -n
			}
			sides = append(sides, walked{a, b, n})
		}
	}
	slices.SortFunc(sides, func(p, q walked) int {
		if p.a != q.a {
			return int(p.a) - int(q.a)
		}
		return int(p.b) - int(q.b)
	})
	// The vector area of what closes the boundary gives the plane.
	var around r3.Vec
	var rim []int32
	for i := 0; i < len(sides); {
		n, j := int32(0), i
		for ; j < len(sides) && sides[j].a == sides[i].a && sides[j].b == sides[i].b; j++ {
			n += sides[j].n
		}
		if n != 0 {
			a, b := c.arm(c.x[sides[i].a]), c.arm(c.x[sides[i].b])
			around = r3.Add(around, r3.Scale(float64(n)/2, r3.Cross(a, b)))
			rim = append(rim, sides[i].a, sides[i].b)
		}
		i = j
	}
	up, at := r3.Vec{Z: 1}, c.centre
	if len(rim) > 0 {
		if l := norm(around); l > 0 {
			up = r3.Scale(1/l, around)
		}
		at = c.x[rim[0]]
	}
	out := air{grows: map[int32]r3.Vec{}}
	height := func(i int32) float64 { return r3.Dot(up, r3.Sub(c.x[i], at)) }
	for _, i := range rim {
		out.rim = max(out.rim, math.Abs(height(i)))
	}
	for t, c3 := range s.Corners {
		w := side[s.FabricOf[t]]
		if w == 0 {
			continue
		}
		n := r3.Scale(w/2, r3.Cross(r3.Sub(c.x[c3[1]], c.x[c3[0]]), r3.Sub(c.x[c3[2]], c.x[c3[0]])))
		h := (height(c3[0]) + height(c3[1]) + height(c3[2])) / 3
		out.volume += h * r3.Dot(n, up)
		out.area += norm(n)
		out.rise = max(out.rise, math.Abs(h))
		for _, i := range c3 {
			g, seen := out.grows[i]
			if !seen {
				out.order = append(out.order, i)
			}
			out.grows[i] = r3.Add(g, r3.Scale(1.0/3, n))
		}
	}
	return out
}

// volumes checks that the fabrics of every enclosure shut in the volume that
// was asked for, and that the pressures on them are the one reported.
func (c *audited) volumes(a *canopy.Audit, o Options, why *reasons) {
	s := c.s
	if len(s.Enclosures) == 0 {
		return
	}
	if len(c.f.Pressure) != len(s.Enclosures) {
		why.add("the form reports %d pressures for %d volumes of air", len(c.f.Pressure), len(s.Enclosures))
		return
	}
	for i := range s.Enclosures {
		e := &s.Enclosures[i]
		m := c.measureAir(e)
		rounding := 64 * ulp * m.area * (m.rise + c.reach)
		d := math.Abs(m.volume - e.Volume)
		if scale := max(math.Abs(e.Volume), 1e-5*m.area*math.Sqrt(m.area)); scale > 0 {
			a.VolumeMismatch = max(a.VolumeMismatch, max(d-rounding, 0)/scale)
			if !(d <= o.Volume*scale+rounding) {
				why.add("fabric %s encloses %.9g m³ where %.9g m³ are given", e.Name, m.volume, e.Volume)
			}
		}
		if !(m.rim <= 1e-6*c.size) {
			why.add("the boundary of the volume below fabric %s has left its plane by %.3g m", e.Name, m.rim)
		}
		for k, f := range e.Fabrics {
			want := float64(e.Side[k]) * c.f.Pressure[i]
			have := s.Fabrics[f].Pressure
			if !(math.Abs(have-want) <= 1e-12*math.Abs(want)) {
				why.add("fabric %s carries a pressure of %.6g Pa where its volume has %.6g Pa", s.Fabrics[f].Name, have, want)
			}
		}
	}
}

// volumeTangent adds the air whose volume is given: a disturbance may change
// its shape, not its volume. The pressure is one more unknown without stiffness
// of its own, K bordered by the change g of the volume,
//
//	[K g; gᵀ 0],
//
// whose negative eigenvalues are one more than those of K on the motions that
// keep the volume.
func (c *audited) volumeTangent(d *freedoms, k *tangent) {
	buf := make([]share, 0, 3)
	for i := range c.s.Enclosures {
		a := c.measureAir(&c.s.Enclosures[i])
		sum := map[int32]float64{}
		var order []int32
		most := 0.0
		for _, node := range a.order {
			for _, u := range d.at(c.s, node, buf) {
				if _, seen := sum[u.unknown]; !seen {
					order = append(order, u.unknown)
				}
				sum[u.unknown] += r3.Dot(a.grows[node], u.dir)
				most = max(most, math.Abs(sum[u.unknown]))
			}
		}
		if !(most > 0) {
			continue // every node of it is fixed
		}
		r := rankOne{}
		for _, u := range order {
			if v := sum[u]; v != 0 {
				r.g = append(r.g, share1{u, v / most})
			}
		}
		k.cables = append(k.cables, r)
	}
}
