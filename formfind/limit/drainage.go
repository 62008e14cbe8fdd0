package limit

import (
	"fmt"
	"math"

	"anticlast/formfind/canopy"
	"anticlast/formfind/surface"
)

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

// mesh points at triangles too thin to be believed in detail.
func (c *check) mesh() {
	q := surface.MeasureQuality(c.f.Position, c.s.Corners)
	if q.Triangle >= 0 && q.MinAngle < angleLeast*math.Pi/180 {
		c.add(canopy.Finding{ID: "mesh-thin", Severity: canopy.Note, Source: SourcePractice, Value: q.MinAngle, Limit: angleLeast * math.Pi / 180,
			Text:   fmt.Sprintf("The smallest angle of a triangle is %s; stresses in such thin triangles are rough.", degrees(q.MinAngle)),
			Places: []canopy.Place{c.triangle(q.Triangle)}})
	}
}
