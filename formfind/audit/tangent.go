package audit

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// memberStiffness returns the stiffness of member k across, T/L, and along,
// EA/L₀, in N/m, for the stability problem: force given, whatever decides it,
// plus what an elastic member adds when it stretches. Where a stiffness is
// given without unstressed length, the force found fixes that length,
// L₀ = L·EA/(EA + T).
func (c *audited) memberStiffness(k int) (acrossIt, along float64) {
	t, l := c.f.Force[k], c.length[k]
	if !(l > 0) {
		return 0, 0
	}
	acrossIt = t / l
	ea := c.stiffness(k)
	if !(ea > 0) || c.s.Law[k] == canopy.LawCable {
		return acrossIt, 0 // a common law stretches the whole cable, see rankOne
	}
	l0 := c.unstressed(k)
	if !(l0 > 0) {
		if ea+t <= 0 {
			return acrossIt, 0
		}
		l0 = l * ea / (ea + t)
	}
	if t == 0 && l < l0 && !c.s.Kind[k].Pushes() {
		return 0, 0 // slack
	}
	return acrossIt, ea / l0
}

// rankOne is a cable whose common force follows its whole length: it adds
// g·gᵀ/compliance to the tangent, with g the change of its length by each
// unknown.
type rankOne struct {
	g          []share1
	compliance float64 // m/N
}

type share1 struct {
	unknown int32
	value   float64
}

// tangent is the reduced tangent K of the prescribed-stress problem with the
// mass M by which its eigenvalues are measured.
type tangent struct {
	n      int
	diag   []float64
	pairs  [][2]int32
	off    []float64
	mass   []float64
	cables []rankOne // and air of given volume, of no compliance
}

// buildTangent assembles the tangent.
func (c *audited) buildTangent(d *freedoms) *tangent {
	s, x := c.s, c.x
	n := d.unknowns()
	k := &tangent{n: n, diag: make([]float64, n), mass: make([]float64, n)}
	var bufs [3][]share
	for i := range bufs {
		bufs[i] = make([]share, 0, 3)
	}
	put := func(p, q int32, v float64) {
		if p == q {
			k.diag[p] += v
			return
		}
		k.pairs = append(k.pairs, [2]int32{p, q})
		k.off = append(k.off, v)
	}
	weigh := func(sh []share, m float64) {
		for _, u := range sh {
			k.mass[u.unknown] += m * r3.Norm2(u.dir)
		}
	}
	for m, e := range s.Ends {
		a, b := c.memberStiffness(m)
		if a == 0 && b == 0 {
			continue
		}
		t := r3.Scale(1/c.length[m], r3.Sub(x[e[1]], x[e[0]]))
		ends := [2][]share{d.at(s, e[0], bufs[0]), d.at(s, e[1], bufs[1])}
		quarter := math.Abs(c.f.Force[m]) * c.length[m] / 4
		weigh(ends[0], quarter)
		weigh(ends[1], quarter)
		h := func(u, v r3.Vec) float64 { // uᵀ[a(I − ttᵀ) + b·ttᵀ]v
			ut, vt := r3.Dot(u, t), r3.Dot(v, t)
			return a*(r3.Dot(u, v)-ut*vt) + b*ut*vt
		}
		for _, own := range ends {
			for i, p := range own {
				k.diag[p.unknown] += h(p.dir, p.dir)
				for _, q := range own[i+1:] {
					put(p.unknown, q.unknown, h(p.dir, q.dir))
				}
			}
		}
		for _, p := range ends[0] {
			for _, q := range ends[1] {
				v := -h(p.dir, q.dir)
				if p.unknown == q.unknown { // both ends go with one ring: both orders
					v *= 2
				}
				put(p.unknown, q.unknown, v)
			}
		}
	}
	c.fabricTangent(d, k, put, weigh)
	c.cableTangent(d, k)
	c.volumeTangent(d, k)
	return k
}

// triangleForces are the nodal forces of triangle t for the stability problem
// with its corners at x: those of the audit itself, under the law that holds
// when the shape changes, with the pressure on the triangle.
//
// Fabric of prescribed stress keeps the magnitudes of its true stress while
// its warp is carried along without spinning in the surface: the direction
// found is projected again into the plane of the triangle. For equal warp and
// weft this is σ times the gradient of the area, whatever the direction.
// Elastic fabric follows its law; where it is wrinkled only the stress it
// carries counts, so that stability is never overstated.
func (c *audited) triangleForces(t int, el *elasticTri, fixedStress [3]float64, x *[3]r3.Vec) (p [3]r3.Vec, ok bool) {
	if el != nil {
		st := el.trial(x)
		if fixedStress != ([3]float64{}) {
			st = fixedStress
		}
		p, ok = el.pull(x, st), true
	} else {
		p, ok = stressPull(x[0], x[1], x[2], c.f.Warp[t], c.f.Stress[t])
	}
	if pr := c.s.Fabrics[c.s.FabricOf[t]].Pressure; pr != 0 {
		push := r3.Scale(pr/6, r3.Cross(r3.Sub(x[1], x[0]), r3.Sub(x[2], x[0])))
		for i := range p {
			p[i] = r3.Add(p[i], push)
		}
	}
	return p, ok
}

// step of the central differences, as a share of the altitude that moves: the
// cube root of the rounding, at which truncation and rounding are least.
const step = 6e-6

// fabricTangent adds the triangles by differencing their nodal forces along
// each unknown; the halves are made equal, since only the work done by a
// disturbance decides stability (for equal warp and weft without pressure they
// are equal already, and pressure makes them so in sum unless it acts on a
// free edge).
func (c *audited) fabricTangent(d *freedoms, k *tangent, put func(p, q int32, v float64), weigh func([]share, float64)) {
	s := c.s
	var bufs [3][]share
	for i := range bufs {
		bufs[i] = make([]share, 0, 3)
	}
	var col [9][9]float64
	for t, t3 := range s.Corners {
		var sh [3][]share
		total := 0
		for a, i := range t3 {
			sh[a] = d.at(s, i, bufs[a])
			total += len(sh[a])
		}
		if total == 0 {
			continue
		}
		var el *elasticTri
		var frozen [3]float64
		if s.Fabrics[s.FabricOf[t]].Elastic {
			e, ok := c.elasticTriangle(t)
			if !ok {
				continue // said by the laws
			}
			el = &e
			if !tensile(e.trial(&e.x)) {
				frozen, _ = e.pulledBack(c.f.Stress[t], c.f.Warp[t])
				if frozen == ([3]float64{}) {
					continue // slack
				}
			}
		}
		x := [3]r3.Vec{c.x[t3[0]], c.x[t3[1]], c.x[t3[2]]}
		area, longest := heron(norm(r3.Sub(x[1], x[0])), norm(r3.Sub(x[2], x[1])), norm(r3.Sub(x[0], x[2])))
		if !(area > 0) {
			continue
		}
		st := c.f.Stress[t]
		third := (math.Abs(st.Warp) + math.Abs(st.Weft)) / 2 * area / 3
		for a := range sh {
			weigh(sh[a], third)
		}
		h := step * 2 * area / longest
		// About a corner, so that the step keeps its digits far from the origin.
		o := x[0]
		for i := range x {
			x[i] = r3.Sub(x[i], o)
		}
		row := 0
		for a := range sh {
			for _, u := range sh[a] {
				y := x
				y[a] = r3.Add(x[a], r3.Scale(h, u.dir))
				fwd, _ := c.triangleForces(t, el, frozen, &y)
				y[a] = r3.Sub(x[a], r3.Scale(h, u.dir))
				bwd, _ := c.triangleForces(t, el, frozen, &y)
				j := 0
				for b := range sh {
					diff := r3.Sub(bwd[b], fwd[b])
					for _, v := range sh[b] {
						col[row][j] = r3.Dot(diff, v.dir) / (2 * h)
						j++
					}
				}
				row++
			}
		}
		p := 0
		for a := range sh {
			for _, u := range sh[a] {
				q := 0
				for b := range sh {
					for _, v := range sh[b] {
						switch {
						case q == p:
							k.diag[u.unknown] += col[p][p]
						case q > p:
							w := (col[p][q] + col[q][p]) / 2
							if u.unknown == v.unknown {
								w *= 2
							}
							put(u.unknown, v.unknown, w)
						}
						q++
					}
				}
				p++
			}
		}
	}
}

// lengthCompliance is the compliance, in terms of length over force, given to
// a cable of prescribed length: ten thousand million times stiffer than
// tensioned cables are across, so that it acts as a constraint while two such
// cables may still depend on each other.
const lengthCompliance = 1e-8

// cableTangent adds the cables whose common force follows their length. A
// cable of given length is one of next to no compliance; one given by its sag
// carries the force found as a given one, which a disturbance does not change.
func (c *audited) cableTangent(d *freedoms, k *tangent) {
	s := c.s
	buf := make([]share, 0, 3)
	for q := range s.Cables {
		cb := &s.Cables[q]
		if cb.Law != canopy.CableLength && cb.Law != canopy.CableElastic {
			continue
		}
		var sum, most float64
		g := map[int32]float64{}
		var order []int32
		for _, m := range cb.Members {
			l := c.length[m]
			sum += l
			most = max(most, math.Abs(c.f.Force[m]))
			if !(l > 0) {
				continue
			}
			t := r3.Scale(1/l, r3.Sub(c.x[s.Ends[m][1]], c.x[s.Ends[m][0]]))
			for side, i := range s.Ends[m] {
				for _, u := range d.at(s, i, buf) {
					v := r3.Dot(t, u.dir)
					if side == 0 {
						v = -v
					}
					if _, ok := g[u.unknown]; !ok {
						order = append(order, u.unknown)
					}
					g[u.unknown] += v
				}
			}
		}
		r := rankOne{}
		size := 0.0
		for _, u := range order {
			size += g[u] * g[u]
			r.g = append(r.g, share1{u, g[u]})
		}
		if size < 1e-24 || sum == 0 {
			continue
		}
		switch {
		case cb.Law == canopy.CableElastic:
			if most == 0 && sum < cb.Unstressed && !cb.Kind.Pushes() {
				continue // slack
			}
			r.compliance = cb.Unstressed / cb.Stiffness
		case most > 0:
			r.compliance = lengthCompliance * sum / most
		default:
			continue
		}
		k.cables = append(k.cables, r)
	}
}
