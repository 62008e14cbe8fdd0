package limit

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/surface"
)

// prestress compares the stress achieved with what is specified.
func (c *check) prestress() {
	if b := c.limits.Achieved; b != nil {
		c.band("stress-achieved", "stress achieved over specified", *b, func(t int) (float64, float64) {
			st, want := c.f.Stress[t], c.s.Stress[t]
			lo, hi := math.Inf(1), math.Inf(-1)
			for k, v := range [2]float64{st.Warp, st.Weft} {
				if want[k] != 0 {
					lo, hi = min(lo, v/want[k]), max(hi, v/want[k])
				}
			}
			return lo, hi
		}, func(v float64) string { return fmt.Sprintf("%.3f", v) })
	} else {
		for i := range c.s.Fabrics {
			lo := min(c.q.MajorAchieved[i].P5, c.q.MinorAchieved[i].P5)
			hi := max(c.q.MajorAchieved[i].P95, c.q.MinorAchieved[i].P95)
			if c.q.MajorAchieved[i] == (canopy.Spread{}) && c.q.MinorAchieved[i] == (canopy.Spread{}) {
				continue // nothing specified
			}
			worst, bound := lo, 1-principalBand
			if hi-1 > 1-lo {
				worst, bound = hi, 1+principalBand
			}
			if math.Abs(worst-1) > principalBand {
				c.add(canopy.Finding{ID: "prestress-off", Severity: canopy.Warning, Source: SourcePractice, Value: worst, Limit: bound,
					Text:   fmt.Sprintf("The prestress achieved in %s is off: over 90 %% of its area principal stresses lie between %.3f and %.3f of what is specified; usual is within ±5 %%.", c.s.Fabrics[i].Name, lo, hi),
					Places: []canopy.Place{c.fabricPlace(i)}})
			}
		}
	}
	for i := range c.s.Fabrics {
		if r := c.q.Ratio[i]; r != (canopy.Spread{}) && c.limits.Ratio == nil {
			worst, bound := r.P5, 1-ratioBand
			if r.P95-1 > 1-r.P5 {
				worst, bound = r.P95, 1+ratioBand
			}
			if math.Abs(worst-1) > ratioBand {
				c.add(canopy.Finding{ID: "ratio-off", Severity: canopy.Warning, Source: SourcePractice, Value: worst, Limit: bound,
					Text:   fmt.Sprintf("The warp:weft stress ratio of %s is off: over 90 %% of its area it lies between %.2f and %.2f of its nominal value; usual is within ±10 %%.", c.s.Fabrics[i].Name, r.P5, r.P95),
					Places: []canopy.Place{c.fabricPlace(i)}})
			}
		}
	}
	// What is specified, against practice.
	type range2 struct{ lo, hi, ratioLo, ratioHi float64 }
	given := make([]range2, len(c.s.Fabrics))
	for i := range given {
		given[i] = range2{math.Inf(1), math.Inf(-1), math.Inf(1), math.Inf(-1)}
	}
	for t := range c.s.Corners {
		g, w := &given[c.s.FabricOf[t]], c.s.Stress[t]
		g.lo, g.hi = min(g.lo, w[0], w[1]), max(g.hi, w[0], w[1])
		if w[1] > 0 {
			g.ratioLo, g.ratioHi = min(g.ratioLo, w[0]/w[1]), max(g.ratioHi, w[0]/w[1])
		}
	}
	for i, g := range given {
		if g.hi < g.lo || g.hi <= 0 {
			continue
		}
		if g.ratioHi > ratioExtreme*(1+1e-9) || g.ratioLo < (1-1e-9)/ratioExtreme {
			worst, bound := g.ratioHi, float64(ratioExtreme)
			if 1/g.ratioLo > worst {
				worst, bound = g.ratioLo, 1./ratioExtreme
			}
			c.add(canopy.Finding{ID: "ratio-extreme", Severity: canopy.Warning, Source: SourcePractice, Value: worst, Limit: bound,
				Text:   fmt.Sprintf("%s asks for a warp:weft prestress ratio of %.2f; fabrics are usually prestressed between 1:3 and 3:1.", c.s.Fabrics[i].Name, worst),
				Places: []canopy.Place{c.fabricPlace(i)}})
		}
		if g.lo < prestressLow || g.hi > prestressHigh {
			v, bound := g.lo, prestressLow
			if g.hi > prestressHigh {
				v, bound = g.hi, prestressHigh
			}
			c.add(canopy.Finding{ID: "prestress-range", Severity: canopy.Note, Source: SourcePractice, Value: v, Limit: bound,
				Text:   fmt.Sprintf("%s has a prestress of %s; usual are 0.7 to 5 kN/m, by material.", c.s.Fabrics[i].Name, kNm(v)),
				Places: []canopy.Place{c.fabricPlace(i)}})
		}
	}
}

// band checks a value of every triangle, given by its least and greatest,
// against bounds that the model sets.
func (c *check) band(id, what string, bounds [2]float64, value func(t int) (lo, hi float64), write func(float64) string) {
	var out list
	worst, bound := 0.0, 0.0
	over, total := 0.0, 0.0
	for t := range c.s.Corners {
		total += c.area(t)
		lo, hi := value(t)
		d := max(bounds[0]-lo, hi-bounds[1])
		if !(d > 1e-9*(math.Abs(bounds[0])+math.Abs(bounds[1]))) || math.IsInf(d, 0) {
			continue
		}
		out.add(t, d, c.area(t))
		if d > over {
			over = d
			if worst, bound = lo, bounds[0]; hi-bounds[1] > bounds[0]-lo {
				worst, bound = hi, bounds[1]
			}
		}
	}
	if len(out.at) == 0 {
		return
	}
	c.add(canopy.Finding{ID: id, Severity: canopy.Broken, Source: SourceModel, Value: worst, Limit: bound, Count: len(out.at),
		Text: fmt.Sprintf("The %s is %s at worst, outside the %s to %s that the model allows, in %s (%s of the area).",
			what, write(worst), write(bounds[0]), write(bounds[1]), plural(len(out.at), "triangle", "triangles"), percent(out.area/total)),
		Places: out.places(c.triangle)})
}

// stresses holds principal stresses and the ratio against the model's limits.
func (c *check) stresses() {
	if b := c.limits.Ratio; b != nil {
		c.band("ratio-limit", "warp:weft stress ratio", *b, func(t int) (float64, float64) {
			st := c.f.Stress[t]
			if st.Weft == 0 {
				return 0, math.Inf(1)
			}
			return st.Warp / st.Weft, st.Warp / st.Weft
		}, func(v float64) string { return fmt.Sprintf("%.2f", v) })
	}
	if m := c.limits.StressMin; m != nil {
		c.oneSided("stress-low", "The least principal stress is %s, below the %s that the model asks for", *m, func(t int) float64 {
			_, minor, _ := surface.Principal(c.f.Stress[t])
			return minor
		}, -1)
	}
	if m := c.limits.StressMax; m != nil {
		c.oneSided("stress-high", "The greatest principal stress is %s, above the %s that the model allows", *m, func(t int) float64 {
			major, _, _ := surface.Principal(c.f.Stress[t])
			return major
		}, 1)
	}
}

func (c *check) oneSided(id, text string, bound float64, value func(t int) float64, sign float64) {
	var out list
	total, worst := 0.0, bound
	for t := range c.s.Corners {
		total += c.area(t)
		v := value(t)
		if d := sign * (v - bound); d > 1e-9*math.Abs(bound) {
			out.add(t, d, c.area(t))
			if sign*(v-worst) > 0 {
				worst = v
			}
		}
	}
	if len(out.at) > 0 {
		c.add(canopy.Finding{ID: id, Severity: canopy.Broken, Source: SourceModel, Value: worst, Limit: bound, Count: len(out.at),
			Text:   fmt.Sprintf(text+", in %s (%s of the area).", kNm(worst), kNm(bound), plural(len(out.at), "triangle", "triangles"), percent(out.area/total)),
			Places: out.places(c.triangle)})
	}
}

// warpDirections compares the warp found with the one asked for, where it
// matters: with unequal stresses or unequal properties.
func (c *check) warpDirections() {
	var out list
	total, worst := 0.0, 0.0
	for t, t3 := range c.s.Corners {
		a := c.area(t)
		total += a
		fab := &c.s.Fabrics[c.s.FabricOf[t]]
		if fab.Elastic || c.s.Stress[t][0] == c.s.Stress[t][1] {
			continue
		}
		_, n := surface.AreaNormal(c.f.Position[t3[0]], c.f.Position[t3[1]], c.f.Position[t3[2]])
		w := r3.Sub(c.s.Warp[t], r3.Scale(r3.Dot(c.s.Warp[t], n), n))
		if r3.Norm(w) < 1e-6*r3.Norm(c.s.Warp[t]) {
			continue
		}
		g := math.Atan2(r3.Norm(r3.Cross(w, c.f.Warp[t])), math.Abs(r3.Dot(w, c.f.Warp[t])))
		if g > warpTurn*math.Pi/180 {
			out.add(t, g, a)
			worst = max(worst, g)
		}
	}
	if len(out.at) > 0 && out.area > flatShare*total {
		c.add(canopy.Finding{ID: "warp-turned", Severity: canopy.Warning, Source: SourcePractice, Value: worst, Limit: warpTurn * math.Pi / 180, Count: len(out.at),
			Text:   fmt.Sprintf("The warp has turned by more than %d° from the direction asked for over %s of the fabric, %s at most.", warpTurn, percent(out.area/total), degrees(worst)),
			Places: out.places(c.triangle)})
	}
}
