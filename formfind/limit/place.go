package limit

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/surface"
)

func (c *check) length(k int32) float64 {
	e := c.s.Ends[k]
	return r3.Norm(r3.Sub(c.f.Position[e[1]], c.f.Position[e[0]]))
}

// drainage looks for flat parts and for hollows in which water would stand.
func (c *check) drainage() {
	if len(c.s.Corners) == 0 {
		return
	}
	least, share, sev, source := slopeLeast*math.Pi/180, flatShare, canopy.Warning, SourcePractice
	if m := c.limits.SlopeMin; m != nil {
		least, share, sev, source = *m, limitShare, canopy.Broken, SourceModel
	}
	var flat list
	total, worst := 0.0, least
	for t, t3 := range c.s.Corners {
		a := c.area(t)
		total += a
		_, n := surface.AreaNormal(c.f.Position[t3[0]], c.f.Position[t3[1]], c.f.Position[t3[2]])
		if sl := surface.Slope(n); sl < least-1e-9 {
			flat.add(t, least-sl, a)
			worst = min(worst, sl)
		}
	}
	if len(flat.at) > 0 && flat.area > share*total {
		c.add(canopy.Finding{ID: "slope-low", Severity: sev, Source: source, Value: worst, Limit: least, Count: len(flat.at),
			Text:   fmt.Sprintf("%s of the surface is flatter than the %s wanted for drainage, %s at the flattest.", percent(flat.area/total), degrees(least), degrees(worst)),
			Places: flat.places(c.triangle)})
	}
	basins := surface.Basins(c.f.Position, c.s.Corners, pondLeast)
	if len(basins) > 0 {
		b := basins[0]
		var places []canopy.Place
		for _, v := range basins[:min(len(basins), placesShown)] {
			places = append(places, c.node(v.Lowest))
		}
		c.add(canopy.Finding{ID: "ponding", Severity: canopy.Warning, Source: SourcePractice, Value: b.Depth, Limit: pondLeast, Count: len(basins), Places: places,
			Text: fmt.Sprintf("Water would stand in %s: closed contours, the deepest %s deep and %s m² in plan before the surface gives under the water; have ponding checked.", plural(len(basins), "hollow", "hollows"), metres(b.Depth), number(b.Area))})
	}
}

// headroom compares the lowest point over regions of the plan with what the
// model asks for. Masts, guys and struts, which reach the ground, do not count.
func (c *check) headroom() {
	for _, h := range c.limits.Headroom {
		tri := surface.LowestTriangle(c.f.Position, c.s.Corners, h.Region)
		mem := surface.LowestSegment(c.f.Position, c.s.Ends, func(k int) bool {
			kind := c.s.Kind[k]
			return !kind.Pushes() && kind != canopy.KindGuy
		}, h.Region)
		name := h.Name
		if name == "" {
			name = "the plan"
		}
		if tri.Part < 0 && mem.Part < 0 {
			c.add(canopy.Finding{ID: "headroom-none", Severity: canopy.Note, Source: SourceModel, Limit: h.Height,
				Text: fmt.Sprintf("Nothing of the canopy lies over %s, for which the model asks a headroom of %.2f m.", name, h.Height)})
			continue
		}
		low, place := tri.At, canopy.Place{}
		if tri.Part >= 0 {
			place = c.triangle(tri.Part)
		}
		if tri.Part < 0 || mem.Part >= 0 && mem.At.Z < tri.At.Z {
			low, place = mem.At, c.member(mem.Part)
		}
		place.At = low
		if low.Z < h.Height-1e-9*max(1, math.Abs(h.Height)) {
			c.add(canopy.Finding{ID: "headroom", Severity: canopy.Broken, Source: SourceModel, Value: low.Z, Limit: h.Height, Places: []canopy.Place{place},
				Text: fmt.Sprintf("The headroom over %s is %.3f m at (%.2f, %.2f), less than the %.2f m that the model asks for.", name, low.Z, low.X, low.Y, h.Height)})
		}
	}
}

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

// mesh points at triangles too thin to be believed in detail.
func (c *check) mesh() {
	q := surface.MeasureQuality(c.f.Position, c.s.Corners)
	if q.Triangle >= 0 && q.MinAngle < angleLeast*math.Pi/180 {
		c.add(canopy.Finding{ID: "mesh-thin", Severity: canopy.Note, Source: SourcePractice, Value: q.MinAngle, Limit: angleLeast * math.Pi / 180,
			Text:   fmt.Sprintf("The smallest angle of a triangle is %s; stresses in such thin triangles are rough.", degrees(q.MinAngle)),
			Places: []canopy.Place{c.triangle(q.Triangle)}})
	}
}
