package audit

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// gathered returns, for each node, the sum of element forces and loads and of
// their sizes and roundings, after tied nodes have passed theirs to the centre
// of their ring.
func (c *audited) gathered() (sum []r3.Vec, meet, round []float64) {
	n := len(c.x)
	sum, meet, round = make([]r3.Vec, n), make([]float64, n), make([]float64, n)
	for i := range sum {
		sum[i] = r3.Add(c.pull[i], c.load[i])
		meet[i] = c.meet[i]
		round[i] = c.rounding(i) * c.meet[i]
	}
	for i, m := range c.s.Master {
		if m < 0 {
			continue
		}
		p := c.passed(i, sum[i])
		sum[i] = r3.Sub(sum[i], p)
		sum[m] = r3.Add(sum[m], p)
		meet[m] += meet[i]
		round[m] += round[i]
	}
	return sum, meet, round
}

// Residuals returns, for each node, the sum in N of the forces of members and
// triangles, from their reported forces and true stresses, and of the loads, in
// the directions in which no support holds the node. Nodes tied to the centre of
// a rigid ring pass theirs on to it. f must fit s.
func Residuals(s *canopy.Structure, f *canopy.Form) []r3.Vec {
	c := newCase(s, f)
	c.forces()
	sum, _, _ := c.gathered()
	for i := range sum {
		sum[i] = masked(sum[i], canopy.DirAll&^s.Fixed[i])
		if s.MasterOf(i) >= 0 {
			sum[i] = r3.Vec{}
		}
	}
	return sum
}

// residuals judges the balance of every node in the directions in which no
// support holds it; held points are among them: their masts and guys must
// balance them.
func (c *audited) residuals(a *canopy.Audit, o Options, why *reasons) {
	sum, meet, round := c.gathered()
	most := 0.0
	for _, m := range meet {
		most = max(most, m)
	}
	var rr, ss, tt, worst float64
	largestOver := 0.0 // over what rounding excuses
	largestNode := int32(-1)
	var worstRound float64
	for i := range sum {
		if c.s.Fixed[i] == canopy.DirAll || c.s.MasterOf(i) >= 0 {
			continue
		}
		r := norm(masked(sum[i], canopy.DirAll&^c.s.Fixed[i]))
		rr += r * r
		ss += meet[i] * meet[i]
		tt += round[i] * round[i]
		worst = max(worst, r)
		worstRound = max(worstRound, round[i])
		if r == 0 {
			continue
		}
		// Forces far below the rest of the structure's are rounding
		// themselves.
		eta := r / max(meet[i], 1e-12*most)
		if largestNode < 0 || eta > a.ResidualLargest {
			a.ResidualLargest, largestNode = eta, int32(i)
		}
		if over := eta / max(o.Largest, round[i]/max(meet[i], 1e-12*most)); over > largestOver {
			largestOver = over
		}
	}
	a.ResidualNode = largestNode
	if ss > 0 {
		a.ResidualRMS = math.Sqrt(rr / ss)
	}
	if most > 0 {
		a.ResidualWorst = worst / most
	}
	switch {
	case ss == 0 && most == 0:
		why.add("nothing in the form carries any force")
	case !(a.ResidualRMS <= max(o.Residual, math.Sqrt(tt/max(ss, math.SmallestNonzeroFloat64)))):
		why.add("the forces do not balance: the mean residual is %.2g of the forces that meet at a node, allowed is %.2g; the largest is at node %s", a.ResidualRMS, o.Residual, c.s.NodeName.At(int(largestNode)))
	case !(a.ResidualWorst <= max(o.Worst, worstRound/max(most, math.SmallestNonzeroFloat64))):
		why.add("the forces do not balance: the largest residual is %.2g of the largest forces, allowed is %.2g; see node %s", a.ResidualWorst, o.Worst, c.s.NodeName.At(int(largestNode)))
	case !(largestOver <= 1):
		why.add("the forces do not balance at node %s: %.2g of what meets there is left over, allowed is %.2g", c.s.NodeName.At(int(largestNode)), a.ResidualLargest, o.Largest)
	}
}

// reactions compares the reported reactions and ring couples with what the
// elements and loads ask of the supports.
func (c *audited) reactions(a *canopy.Audit, o Options, why *reasons) {
	sum, meet, round := c.gathered()
	most := 0.0
	for _, m := range meet {
		most = max(most, m)
	}
	if most == 0 {
		return
	}
	bad := int32(-1)
	over := 1.0
	for i := range sum {
		want := masked(r3.Scale(-1, sum[i]), c.s.Fixed[i])
		d := norm(r3.Sub(c.f.Reaction[i], want))
		if d == 0 {
			continue
		}
		scale := max(meet[i], 1e-6*most)
		a.ReactionMismatch = max(a.ReactionMismatch, d/scale)
		if v := d / (scale * max(o.Reaction, round[i]/scale)); !(v <= over) {
			over, bad = v, int32(i)
		}
	}
	if bad >= 0 {
		want := masked(r3.Scale(-1, sum[bad]), c.s.Fixed[bad])
		why.add("the reported reaction at node %s, (%.4g, %.4g, %.4g) kN, is not what the forces there ask for, (%.4g, %.4g, %.4g) kN", c.s.NodeName.At(int(bad)),
			c.f.Reaction[bad].X/1e3, c.f.Reaction[bad].Y/1e3, c.f.Reaction[bad].Z/1e3, want.X/1e3, want.Y/1e3, want.Z/1e3)
	}
	for r := range c.s.Rings {
		want, scale, rnd := c.couple(r)
		d := norm(r3.Sub(c.f.Couple[r], want))
		if d == 0 {
			continue
		}
		scale = max(scale, 1e-6*most*c.size)
		a.ReactionMismatch = max(a.ReactionMismatch, d/scale)
		if !(d <= max(o.Reaction*scale, rnd)) {
			why.add("the reported couple of ring %s, %.4g kNm, is not what its forces ask for, %.4g kNm", c.s.Rings[r].Name, norm(c.f.Couple[r])/1e3, norm(want)/1e3)
		}
	}
}

// couple returns the moment about its centre by which what carries a rigid
// ring must restrain its rotation, the size of the moments that meet there,
// and their rounding.
func (c *audited) couple(r int) (m r3.Vec, scale, round float64) {
	g := &c.s.Rings[r]
	if !g.Rigid || g.Centre < 0 {
		return
	}
	for _, i := range g.Nodes {
		if c.s.MasterOf(int(i)) != g.Centre {
			continue
		}
		p := c.passed(int(i), r3.Add(c.pull[i], c.load[i]))
		arm := r3.Sub(c.x[i], c.x[g.Centre])
		m = r3.Sub(m, r3.Cross(arm, p))
		scale += norm(arm) * c.meet[i]
		round += norm(arm) * c.meet[i] * c.rounding(int(i))
	}
	return m, scale, round
}

// globalRounding is the rounding that sums over the whole structure may show.
func (c *audited) globalRounding() float64 {
	var tt, ss float64
	for i, m := range c.meet {
		r := c.rounding(i) * m
		tt += r * r
		ss += m * m
	}
	if ss == 0 {
		return 0
	}
	return math.Sqrt(tt / ss)
}

// balance sums the reported reactions and the loads: forces, and moments about
// the centroid, with the couples of rigid rings.
func (c *audited) balance(a *canopy.Audit, o Options, why *reasons) {
	var f, m r3.Vec
	var size float64
	for i := range c.x {
		v := r3.Add(c.f.Reaction[i], c.load[i])
		f = r3.Add(f, v)
		m = r3.Add(m, r3.Cross(c.arm(c.x[i]), v))
		size += norm(c.f.Reaction[i])
	}
	for r := range c.s.Rings {
		m = r3.Add(m, c.f.Couple[r])
	}
	if size == 0 {
		for _, v := range c.load {
			size += norm(v)
		}
	}
	if size == 0 || c.size == 0 {
		return
	}
	a.ForceBalance = norm(f) / size
	a.MomentBalance = norm(m) / (size * c.size)
	allowed := max(o.Balance, c.globalRounding())
	if !(a.ForceBalance <= allowed) {
		why.add("the reported reactions do not balance the loads: %.3g kN is left over (%.2g of all reactions)", norm(f)/1e3, a.ForceBalance)
	}
	if !(a.MomentBalance <= allowed) {
		why.add("the moments of the reported reactions do not balance those of the loads: %.3g kNm is left over", norm(m)/1e3)
	}
}

// virial checks ΣA·tr σ + ΣT·L + Σ over rigid rings = ΣR·x + ΣF·x about the
// centroid: the first moment of equilibrium, which holds for every structure
// at rest (Clausius 1870). The left side comes from reported stresses, forces
// and side lengths only, the right from reported reactions. The rigid ring
// carries Σ f·(x − x_centre) inside itself.
func (c *audited) virial(a *canopy.Audit, o Options, why *reasons) {
	left := c.stressArea + c.forceLength
	for i, m := range c.s.Master {
		if m >= 0 {
			left += r3.Dot(c.passed(i, r3.Add(c.pull[i], c.load[i])), r3.Sub(c.x[i], c.x[m]))
		}
	}
	right, size := 0.0, c.virialSize
	for i := range c.x {
		arm := c.arm(c.x[i])
		right += r3.Dot(c.f.Reaction[i], arm) + r3.Dot(c.load[i], arm)
	}
	if size == 0 {
		return
	}
	a.Virial = math.Abs(left-right) / size
	if !(a.Virial <= max(o.Balance, c.globalRounding())) {
		why.add("the reported stresses do not belong to the reported reactions: the virial identity is off by %.2g", a.Virial)
	}
}
