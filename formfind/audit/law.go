package audit

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/surface"
)

// axisTolerance bounds how far a reported warp direction may be from a unit
// vector in the plane of its triangle.
const axisTolerance = 1e-9

// checkAxes judges the reported warp directions.
func (c *audited) checkAxes(why *reasons) {
	bad, count := -1, 0
	for t, t3 := range c.s.Corners {
		area, n := surface.AreaNormal(c.x[t3[0]], c.x[t3[1]], c.x[t3[2]])
		w := c.f.Warp[t]
		// The plane of a small triangle far from the origin is known only to
		// the rounding of its corners.
		tol := axisTolerance
		if area > 0 {
			tol += 8 * ulp * c.reach / math.Sqrt(area)
		}
		if math.Abs(norm(w)-1) > axisTolerance || math.Abs(r3.Dot(w, n)) > tol {
			count++
			if bad < 0 {
				bad = t
			}
		}
	}
	if count > 0 {
		why.add("the reported warp of %s is not a unit direction in its plane (%d triangles in all)", c.s.TrianglePlace(c.x, int32(bad)).Name, count)
	}
}

// inFabric reports whether member k runs along, or ends at, fabric of
// prescribed stress.
func (c *audited) inFabric(k int) bool {
	e := c.s.Ends[k]
	return c.fabric[e[0]] || c.fabric[e[1]]
}

func (c *audited) stiffness(k int) float64 {
	if len(c.s.Stiffness) == 0 {
		return 0
	}
	return c.s.Stiffness[k]
}

func (c *audited) unstressed(k int) float64 {
	if len(c.s.Unstressed) == 0 {
		return 0
	}
	return c.s.Unstressed[k]
}

// elasticForce is EA(L − L₀)/L₀, zero when a cable is shorter than L₀.
func elasticForce(ea, l, l0 float64, pushes bool) float64 {
	t := ea * (l - l0) / l0
	if t < 0 && !pushes {
		return 0
	}
	return t
}

// laws compares reported forces and stresses with the laws that decide them.
func (c *audited) laws(a *canopy.Audit, o Options, why *reasons) {
	s := c.s
	scale := 0.0
	for _, t := range c.f.Force {
		scale = max(scale, math.Abs(t))
	}
	var worstName string
	var worstHave, worstWant float64
	over, count := 1.0, 0
	// note records a force that differs from its law; noise is what rounding
	// of positions can explain.
	note := func(have, want, noise float64, loose bool, name func() string) {
		d := math.Abs(have - want)
		if d == 0 {
			return
		}
		ref := max(math.Abs(have), math.Abs(want), 1e-3*scale)
		tol := o.Law
		if loose {
			tol = o.LawInFabric
		} else {
			a.ForceMismatch = max(a.ForceMismatch, max(d-noise, 0)/ref)
		}
		if v := d / (tol*ref + noise); !(v <= 1) {
			count++
			if !(v <= over) {
				over, worstName, worstHave, worstWant = v, name(), have, want
			}
		}
	}
	member := func(k int) func() string {
		return func() string { return "member " + s.MemberName.At(k) }
	}
	cable := func(q int) func() string {
		return func() string { return s.Cables[q].Kind.String() + " " + s.Cables[q].Name }
	}
	noiseOf := func(ea, l float64) float64 { return 4 * ulp * ea * (1 + c.reach/max(l, math.SmallestNonzeroFloat64)) }

	// Members whose given force is the mean along their cable are judged
	// with it below.
	along := make([]bool, len(s.Ends))
	for q := range s.Cables {
		cb := &s.Cables[q]
		var have, want, sum float64
		loose := false
		for _, k := range cb.Members {
			if s.Law[k] == canopy.LawForce && c.inFabric(int(k)) {
				along[k], loose = true, true
				have += c.f.Force[k] * c.length[k]
				want += s.Given[k] * c.length[k]
				sum += c.length[k]
			}
		}
		if loose && sum > 0 {
			note(have/sum, want/sum, 0, true, cable(q))
		}
	}
	for k := range s.Ends {
		if along[k] {
			continue
		}
		t, l := c.f.Force[k], c.length[k]
		loose := c.inFabric(k)
		switch s.Law[k] {
		case canopy.LawForceDensity:
			note(t, s.Given[k]*l, noiseOf(math.Abs(s.Given[k])*l, l), loose, member(k))
		case canopy.LawForce:
			note(t, s.Given[k], 0, loose, member(k))
		case canopy.LawElastic:
			note(t, elasticForce(c.stiffness(k), l, c.unstressed(k), s.Kind[k].Pushes()), noiseOf(c.stiffness(k), l), loose, member(k))
		}
	}
	for q := range s.Cables {
		c.cableLaw(q, o, why, note, noiseOf)
	}
	if count > 0 {
		why.add("%s carries %.4g kN where its law gives %.4g kN (%d in all)", worstName, worstHave/1e3, worstWant/1e3, count)
	}
	c.fabricLaws(a, o, why)
}

// cableLaw checks the common law of cable q.
func (c *audited) cableLaw(q int, o Options, why *reasons,
	note func(have, want, noise float64, loose bool, name func() string), noiseOf func(ea, l float64) float64) {
	s := c.s
	cb := &s.Cables[q]
	if len(cb.Members) == 0 || cb.Law == canopy.CablePerMember || cb.Law == canopy.CableBalance {
		return
	}
	name := func() string { return cb.Kind.String() + " " + cb.Name }
	loose := false
	var sum, mean float64
	shortest := math.Inf(1)
	for _, k := range cb.Members {
		loose = loose || c.inFabric(int(k))
		sum += c.length[k]
		mean += c.f.Force[k] * c.length[k]
		shortest = min(shortest, c.length[k])
	}
	if !(sum > 0) {
		return
	}
	mean /= sum
	if !loose { // one force along the cable
		for _, k := range cb.Members {
			if s.Law[k] == canopy.LawCable {
				note(c.f.Force[k], mean, 0, false, name)
			}
		}
	}
	geometry := func(what string, have, want, tol float64) {
		if math.Abs(have-want) > tol*math.Abs(want)+8*ulp*c.reach {
			why.add("%s %s has %s %.6g where %.6g is given", cb.Kind, cb.Name, what, have, want)
		}
	}
	tol := o.Law
	switch cb.Law {
	case canopy.CableSag:
		if loose {
			tol = o.LawInFabric
		}
		if sag, chord := surface.Sag(c.x, cb.Nodes); chord > 0 {
			geometry("a sag over chord of", sag/chord, cb.Value, tol)
		}
	case canopy.CableLength:
		if loose {
			tol = o.LawInFabric / 10 // lengths move far less than forces
		}
		geometry("a length in m of", sum, cb.Value, tol)
	case canopy.CableElastic:
		note(mean, elasticForce(cb.Stiffness, sum, cb.Unstressed, cb.Kind.Pushes()), noiseOf(cb.Stiffness, shortest), loose, name)
	}
}

// fabricLaws compares the stress of elastic fabric with its law.
func (c *audited) fabricLaws(a *canopy.Audit, o Options, why *reasons) {
	worst, bad, count := 1.0, -1, 0
	for t := range c.s.Corners {
		if !c.s.Fabrics[c.s.FabricOf[t]].Elastic {
			continue
		}
		l, ok := c.elasticTriangle(t)
		if !ok {
			why.add("the elastic law of %s cannot be evaluated: no unstressed area, or moduli that give no positive energy", c.s.TrianglePlace(c.x, int32(t)).Name)
			return
		}
		st := c.f.Stress[t]
		d, scale, noise := l.misfit(st, c.f.Warp[t])
		if d == 0 {
			continue
		}
		noise *= 4 * ulp * c.reach
		a.ForceMismatch = max(a.ForceMismatch, max(d-noise, 0)/scale)
		if v := d / (o.Law*scale + noise); !(v <= 1) {
			count++
			if !(v <= worst) {
				worst, bad = v, t
			}
		}
	}
	if bad >= 0 {
		st := c.f.Stress[bad]
		why.add("the stress of %s (warp %.4g, weft %.4g, shear %.3g kN/m) is not what its elastic law gives (%d triangles in all)",
			c.s.TrianglePlace(c.x, int32(bad)).Name, st.Warp/1e3, st.Weft/1e3, st.Shear/1e3, count)
	}
}

// tension counts what should pull and does not.
func (c *audited) tension(a *canopy.Audit, why *reasons) {
	s := c.s
	scale, most := surface.ForceScale(s, c.f), 0.0
	for _, t := range c.f.Force {
		most = max(most, math.Abs(t))
	}
	pushed := int32(-1)
	for k := range s.Ends {
		if s.Kind[k].Pushes() {
			continue
		}
		t := c.f.Force[k]
		if surface.Slack(s, c.x, c.f, k, scale) {
			a.SlackCables++
		}
		if t < -1e-9*most {
			a.PushedCables++
			if pushed < 0 || t < c.f.Force[pushed] {
				pushed = int32(k)
			}
		}
	}
	if pushed >= 0 {
		why.add("%d cables or guys would have to push; most of all member %s (%s) with %.3g kN", a.PushedCables, s.MemberName.At(int(pushed)), s.Kind[pushed], -c.f.Force[pushed]/1e3)
	}
	mean, area := 0.0, 0.0
	for t, t3 := range s.Corners {
		ar, _ := surface.AreaNormal(c.x[t3[0]], c.x[t3[1]], c.x[t3[2]])
		st := c.f.Stress[t]
		mean += ar * (math.Abs(st.Warp) + math.Abs(st.Weft)) / 2
		area += ar
	}
	if area > 0 {
		mean /= area
	}
	worst, least := -1, 0.0
	for t := range s.Corners {
		_, minor, _ := surface.Principal(c.f.Stress[t])
		if minor < -1e-6*mean {
			a.CompressedTriangles++
			if minor < least {
				worst, least = t, minor
			}
		}
	}
	if worst >= 0 {
		why.add("%d triangles of fabric are in compression, most of all %s with %.3g kN/m", a.CompressedTriangles, s.TrianglePlace(c.x, int32(worst)).Name, -least/1e3)
	}
}
