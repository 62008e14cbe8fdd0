package limit

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/surface"
)

// cables checks cable forces and geometry.
func (c *check) cables() {
	if m := c.limits.CableMax; m != nil {
		var out list
		worst := *m
		for k, t := range c.f.Force {
			if c.s.Kind[k].Pushes() {
				continue
			}
			if t > *m*(1+1e-9) {
				out.add(k, t, 0)
				worst = max(worst, t)
			}
		}
		if len(out.at) > 0 {
			c.add(canopy.Finding{ID: "cable-force", Severity: canopy.Broken, Source: SourceModel, Value: worst, Limit: *m, Count: len(out.at),
				Text:   fmt.Sprintf("The greatest cable force is %s, above the %s that the model allows, in %s.", kN(worst), kN(*m), plural(len(out.at), "member", "members")),
				Places: out.places(c.member)})
		}
	}
	var off, uneven, sag list
	var offText, unevenText, sagText string
	for i := range c.s.Cables {
		cb, r := &c.s.Cables[i], &c.q.Cables[i]
		if len(cb.Members) == 0 {
			continue
		}
		if want, have, ok := c.givenMean(cb); ok && want != 0 {
			d := have/want - 1
			if math.Abs(d) > cableBand {
				if _, w := off.worst(); math.Abs(d) > w {
					offText = fmt.Sprintf("%s carries %s in the mean where %s is given", cb.Name, kN(have), kN(want))
				}
				off.add(i, math.Abs(d), 0)
			}
		}
		if len(cb.Members) > 1 && cb.Kind != canopy.KindNetCable && r.Evenness > evennessBand {
			if _, w := uneven.worst(); r.Evenness > w {
				unevenText = fmt.Sprintf("the force of %s runs from %s to %s along it", cb.Name, kN(r.ForceMin), kN(r.ForceMax))
			}
			uneven.add(i, r.Evenness, 0)
		}
		if cb.Kind == canopy.KindEdgeCable && len(cb.Members) > 1 && r.Chord > 0 && cb.Law != canopy.CableSag {
			v := r.Sag / r.Chord
			if d := max(sagLow-v, v-sagHigh); d > 1e-9 {
				if _, w := sag.worst(); d > w {
					sagText = fmt.Sprintf("%s has a sag of %s of its chord", cb.Name, percent(v))
				}
				sag.add(i, d, 0)
			}
		}
	}
	if at, w := off.worst(); at >= 0 {
		c.add(canopy.Finding{ID: "cable-off", Severity: canopy.Warning, Source: SourcePractice, Value: w, Limit: cableBand, Count: len(off.at),
			Text: fmt.Sprintf("Cable forces achieved are off: %s (%s more than 5 %% off).", offText, plural(len(off.at), "cable", "cables")), Places: off.places(c.cable)})
	}
	if at, w := uneven.worst(); at >= 0 {
		c.add(canopy.Finding{ID: "cable-uneven", Severity: canopy.Note, Source: SourcePractice, Value: w, Limit: evennessBand, Count: len(uneven.at),
			Text: fmt.Sprintf("Cable forces vary along their length: %s; a cable that can slide in its pocket would even out (%s in all).", unevenText, plural(len(uneven.at), "cable", "cables")), Places: uneven.places(c.cable)})
	}
	if at, _ := sag.worst(); at >= 0 {
		r := c.q.Cables[at]
		c.add(canopy.Finding{ID: "cable-sag", Severity: canopy.Note, Source: SourcePractice, Value: r.Sag / r.Chord, Limit: nearest(r.Sag/r.Chord, sagLow, sagHigh), Count: len(sag.at),
			Text: fmt.Sprintf("Edge cables usually sag by 8 to 12 %% of their chord: %s (%s in all outside).", sagText, plural(len(sag.at), "cable", "cables")), Places: sag.places(c.cable)})
	}
}

func nearest(v, lo, hi float64) float64 {
	if v < lo {
		return lo
	}
	return hi
}

// givenMean returns the mean force that the members of a cable are given and
// the one they carry, by length, when all of them are given one.
func (c *check) givenMean(cb *canopy.Cable) (want, have float64, ok bool) {
	var sum float64
	for _, k := range cb.Members {
		if c.s.Law[k] != canopy.LawForce {
			return 0, 0, false
		}
		l := c.length(k)
		want += c.s.Given[k] * l
		have += c.f.Force[k] * l
		sum += l
	}
	if !(sum > 0) {
		return 0, 0, false
	}
	return want / sum, have / sum, true
}

// slack finds cables and fabric that carry no tension, and masts that pull.
func (c *check) slack() {
	scale := surface.ForceScale(c.s, c.f)
	var cables, masts list
	for k, t := range c.f.Force {
		switch {
		case c.s.Kind[k] == canopy.KindMast && t > surface.SlackShare*scale:
			masts.add(k, t, 0)
		case !c.s.Kind[k].Pushes() && surface.Slack(c.s, c.f.Position, c.f, k, scale):
			cables.add(k, -t, 0)
		}
	}
	if at, w := cables.worst(); at >= 0 {
		c.add(canopy.Finding{ID: "slack-cable", Severity: canopy.Warning, Source: SourcePractice, Value: -w, Limit: surface.SlackShare, Count: len(cables.at),
			Text:   fmt.Sprintf("%s slack under prestress (less than a thousandth of the force specified, or of the mean force).", plural(len(cables.at), "cable member is", "cable members are")),
			Places: cables.places(c.member)})
	}
	if at, w := masts.worst(); at >= 0 {
		c.add(canopy.Finding{ID: "mast-pulls", Severity: canopy.Warning, Source: SourcePractice, Value: w, Limit: 0, Count: len(masts.at),
			Text:   fmt.Sprintf("%s in tension, %s at most: a guy would do, or its head is pulled up.", plural(len(masts.at), "mast is", "masts are"), kN(w)),
			Places: masts.places(c.member)})
	}
	var fabric list
	total, least := 0.0, math.Inf(1)
	for t := range c.s.Corners {
		a := c.area(t)
		total += a
		_, minor, _ := surface.Principal(c.f.Stress[t])
		want := min(c.s.Stress[t][0], c.s.Stress[t][1])
		if minor <= surface.SlackShare*max(want, 0) {
			fabric.add(t, -minor, a)
			least = min(least, minor)
		}
	}
	if len(fabric.at) > 0 {
		c.add(canopy.Finding{ID: "slack-fabric", Severity: canopy.Warning, Source: SourcePractice, Value: least, Limit: surface.SlackShare, Count: len(fabric.at),
			Text:   fmt.Sprintf("Fabric is slack or wrinkled in one direction under prestress, over %s of its area.", percent(fabric.area/total)),
			Places: fabric.places(c.triangle)})
	}
}

func (c *check) length(k int32) float64 {
	e := c.s.Ends[k]
	return r3.Norm(r3.Sub(c.f.Position[e[1]], c.f.Position[e[0]]))
}
