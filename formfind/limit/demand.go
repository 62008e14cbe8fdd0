package limit

import (
	"fmt"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// reactions holds the force at each support against the model's limit.
func (c *check) reactions() {
	m := c.limits.ReactionMax
	if m == nil {
		return
	}
	var out list
	worst := *m
	for i, r := range c.f.Reaction {
		if v := r3.Norm(r); v > *m*(1+1e-9) {
			out.add(i, v, 0)
			worst = max(worst, v)
		}
	}
	if len(out.at) > 0 {
		c.add(canopy.Finding{ID: "reaction-high", Severity: canopy.Broken, Source: SourceModel, Value: worst, Limit: *m, Count: len(out.at),
			Text:   fmt.Sprintf("The greatest reaction is %s, above the %s that the model allows, at %s.", kN(worst), kN(*m), plural(len(out.at), "support", "supports")),
			Places: out.places(c.node)})
	}
}

// utilisation compares demand with design resistance where strengths and
// factors are given. The demand is that of prestress only.
func (c *check) utilisation() {
	bound, sev, source := 1., canopy.Warning, SourceModel
	if m := c.limits.Utilisation; m != nil {
		bound, sev = *m, canopy.Broken
	}
	var cables list
	if c.factors.Load > 0 && c.factors.Cable > 0 && len(c.s.Strength) > 0 {
		for k, t := range c.f.Force {
			if c.s.Kind[k].Pushes() || !(c.s.Strength[k] > 0) {
				continue
			}
			if u := c.factors.Load * t * c.factors.Cable / c.s.Strength[k]; u > bound*(1+1e-9) {
				cables.add(k, u, 0)
			}
		}
	}
	if at, u := cables.worst(); at >= 0 {
		c.add(canopy.Finding{ID: "utilisation-cable", Severity: sev, Source: source, Value: u, Limit: bound, Count: len(cables.at),
			Text:   fmt.Sprintf("The utilisation of cables, prestress only, is %.2f at most, above %.2f, in %s.", u, bound, plural(len(cables.at), "member", "members")),
			Places: cables.places(c.member)})
	}
	var fabric list
	if c.factors.Load > 0 && c.factors.Fabric > 0 {
		for t := range c.s.Corners {
			fab := &c.s.Fabrics[c.s.FabricOf[t]]
			u := 0.0
			if fab.WarpStrength > 0 {
				u = c.f.Stress[t].Warp / fab.WarpStrength
			}
			if fab.WeftStrength > 0 {
				u = max(u, c.f.Stress[t].Weft/fab.WeftStrength)
			}
			if u *= c.factors.Load * c.factors.Fabric; u > bound*(1+1e-9) {
				fabric.add(t, u, c.area(t))
			}
		}
	}
	if at, u := fabric.worst(); at >= 0 {
		c.add(canopy.Finding{ID: "utilisation-fabric", Severity: sev, Source: source, Value: u, Limit: bound, Count: len(fabric.at),
			Text:   fmt.Sprintf("The utilisation of fabric, prestress only, is %.2f at most, above %.2f, in %s.", u, bound, plural(len(fabric.at), "triangle", "triangles")),
			Places: fabric.places(c.triangle)})
	}
}
