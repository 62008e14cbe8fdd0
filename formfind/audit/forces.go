package audit

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// ulp is the relative spacing of float64.
const ulp = 0x1p-52

// norm is the length of v. r3.Norm guards against overflow, which costs more
// than all else here; coordinates and forces are far from it.
func norm(v r3.Vec) float64 { return math.Sqrt(r3.Norm2(v)) }

// audited is a form under audit with what several checks need.
type audited struct {
	s *canopy.Structure
	f *canopy.Form
	x []r3.Vec

	size   float64 // diagonal of the box around the nodes, m
	reach  float64 // largest coordinate in size, m
	centre r3.Vec  // centroid of the nodes, about which moments are taken

	length []float64 // of members, m
	fabric []bool    // node touches fabric of prescribed stress

	// load is the external force on each node, dead load, pressure and
	// weights; pull the sum of element forces; meet the sum of the sizes of
	// all of them; short the smallest element length there (an altitude for
	// triangles).
	load, pull []r3.Vec
	meet       []float64
	short      []float64

	// virial sums of the elements, from reported stresses and forces alone.
	stressArea, forceLength float64
	virialSize              float64
}

func newCase(s *canopy.Structure, f *canopy.Form) *audited {
	n := len(f.Position)
	c := &audited{s: s, f: f, x: f.Position}
	lo, hi := canopy.Bounds(c.x)
	c.size = norm(r3.Sub(hi, lo))
	for _, v := range []r3.Vec{lo, hi} {
		c.reach = max(c.reach, math.Abs(v.X), math.Abs(v.Y), math.Abs(v.Z))
	}
	// The centroid is summed about a corner of the box, so that it keeps its
	// digits far from the origin.
	for _, p := range c.x {
		c.centre = r3.Add(c.centre, r3.Sub(p, lo))
	}
	if n > 0 {
		c.centre = r3.Add(lo, r3.Scale(1/float64(n), c.centre))
	}
	c.length = make([]float64, len(s.Ends))
	for k, e := range s.Ends {
		c.length[k] = norm(r3.Sub(c.x[e[1]], c.x[e[0]]))
	}
	c.fabric = make([]bool, n)
	for t, t3 := range s.Corners {
		if !s.Fabrics[s.FabricOf[t]].Elastic {
			for _, i := range t3 {
				c.fabric[i] = true
			}
		}
	}
	return c
}

// arm is the position of a point about the centroid.
func (c *audited) arm(p r3.Vec) r3.Vec { return r3.Sub(p, c.centre) }

// stressPull returns the forces by which a triangle of uniform true stress
// pulls at its corners a, b, d: fᵢ = −A·σ·∇φᵢ with ∇φᵢ = n × eᵢ/(2A), eᵢ the
// side opposite corner i counter-clockwise, and σ given in the axes w (unit,
// in the plane) and n × w. ok is false for a triangle without area.
func stressPull(a, b, d, warp r3.Vec, st canopy.Stress) (p [3]r3.Vec, ok bool) {
	e := [3]r3.Vec{r3.Sub(d, b), r3.Sub(a, d), r3.Sub(b, a)}
	n := r3.Cross(e[2], r3.Scale(-1, e[1]))
	twice := norm(n)
	if !(twice > 0) {
		return p, false
	}
	n = r3.Scale(1/twice, n)
	w := r3.Sub(warp, r3.Scale(r3.Dot(warp, n), n))
	l := norm(w)
	if !(l > 0) {
		return p, false
	}
	w = r3.Scale(1/l, w)
	f := r3.Cross(n, w)
	for i := range 3 {
		m := r3.Cross(n, e[i])
		mw, mf := r3.Dot(m, w), r3.Dot(m, f)
		p[i] = r3.Add(r3.Scale(-(st.Warp*mw+st.Shear*mf)/2, w), r3.Scale(-(st.Shear*mw+st.Weft*mf)/2, f))
	}
	return p, true
}

// forces sums up what acts at every node.
func (c *audited) forces() {
	s, x := c.s, c.x
	n := len(x)
	c.load, c.pull = make([]r3.Vec, n), make([]r3.Vec, n)
	c.meet, c.short = make([]float64, n), make([]float64, n)
	for i := range c.short {
		c.short[i] = math.Inf(1)
	}
	for k, e := range s.Ends {
		l, t := c.length[k], c.f.Force[k]
		if !(l > 0) {
			continue
		}
		v := r3.Scale(t/l, r3.Sub(x[e[1]], x[e[0]]))
		c.pull[e[0]] = r3.Add(c.pull[e[0]], v)
		c.pull[e[1]] = r3.Sub(c.pull[e[1]], v)
		for _, i := range e {
			c.meet[i] += math.Abs(t)
			c.short[i] = min(c.short[i], l)
		}
		c.forceLength += t * l
		c.virialSize += math.Abs(t) * l
	}
	for t, t3 := range s.Corners {
		p, ok := stressPull(x[t3[0]], x[t3[1]], x[t3[2]], c.f.Warp[t], c.f.Stress[t])
		if !ok {
			continue
		}
		// Area from the sides alone (Heron, in Kahan's stable order), so
		// that the virial sum shares nothing with the nodal forces.
		area, longest := heron(
			norm(r3.Sub(x[t3[1]], x[t3[0]])),
			norm(r3.Sub(x[t3[2]], x[t3[1]])),
			norm(r3.Sub(x[t3[0]], x[t3[2]])))
		for k, i := range t3 {
			c.pull[i] = r3.Add(c.pull[i], p[k])
			c.meet[i] += norm(p[k])
			c.short[i] = min(c.short[i], 2*area/longest)
		}
		st := c.f.Stress[t]
		c.stressArea += area * (st.Warp + st.Weft)
		c.virialSize += area * (math.Abs(st.Warp) + math.Abs(st.Weft))
	}
	c.loads()
	for i, v := range c.load {
		c.meet[i] += norm(v)
	}
}

// heron returns the area of a triangle and its longest side from its sides.
//
// W. Kahan: Miscalculating area and angles of a needle-like triangle, 1986-2014.
func heron(a, b, c float64) (area, longest float64) {
	if a < b {
		a, b = b, a
	}
	if a < c {
		a, c = c, a
	}
	if b < c {
		b, c = c, b
	}
	q := (a + (b + c)) * (c - (a - b)) * (c + (a - b)) * (a + (b - c))
	return math.Sqrt(max(q, 0)) / 4, a
}

// loads recomputes what acts from outside: dead loads, the pressure of
// cushions on the triangles as they stand, and weights where they act, as
// canopy.Structure documents them.
func (c *audited) loads() {
	s, x := c.s, c.x
	for i := range c.load {
		c.load[i] = s.LoadAt(i)
	}
	down := func(i int32, w float64) { c.load[i].Z -= w }
	for t, t3 := range s.Corners {
		fab := &s.Fabrics[s.FabricOf[t]]
		weight := fab.Weight
		if !s.SelfWeight {
			weight = 0
		}
		if fab.Pressure == 0 && weight == 0 {
			continue
		}
		v := r3.Cross(r3.Sub(x[t3[1]], x[t3[0]]), r3.Sub(x[t3[2]], x[t3[0]]))
		push := r3.Scale(fab.Pressure/6, v)
		w := weight * norm(v) / 6
		for _, i := range t3 {
			c.load[i] = r3.Add(c.load[i], push)
			down(i, w)
		}
	}
	if !s.SelfWeight {
		return
	}
	if len(s.Weight) > 0 {
		for k, e := range s.Ends {
			l := c.length[k]
			if len(s.Unstressed) > 0 && s.Unstressed[k] > 0 {
				l = s.Unstressed[k]
			}
			w := s.Weight[k] * l / 2
			down(e[0], w)
			down(e[1], w)
		}
	}
	for r := range s.Rings {
		g := &s.Rings[r]
		if g.Rigid && g.Centre >= 0 {
			down(g.Centre, g.Weight)
		} else {
			for _, i := range g.Nodes {
				down(i, g.Weight/float64(len(g.Nodes)))
			}
		}
	}
}

// masked returns the components of v in the directions of d.
func masked(v r3.Vec, d canopy.Freedom) r3.Vec {
	if !d.Has(0) {
		v.X = 0
	}
	if !d.Has(1) {
		v.Y = 0
	}
	if !d.Has(2) {
		v.Z = 0
	}
	return v
}

// passed returns the part of v, a force at node i, that goes to the centre of
// the rigid ring that the node is tied to: the directions in which no
// support of its own holds the node.
func (c *audited) passed(i int, v r3.Vec) r3.Vec {
	return masked(v, canopy.DirAll&^c.s.Fixed[i])
}

// rounding is the share of the forces at node i that the rounding of its
// coordinates and its neighbours' can put out of balance.
func (c *audited) rounding(i int) float64 {
	if math.IsInf(c.short[i], 1) || !(c.short[i] > 0) {
		return 8 * ulp
	}
	return 8 * ulp * (1 + c.reach/c.short[i])
}
