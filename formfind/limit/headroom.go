package limit

import (
	"fmt"
	"math"

	"anticlast/formfind/canopy"
	"anticlast/formfind/surface"
)

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
