// Package limit holds a found form against the limits that its model sets and
// against common practice, and says where it falls short.
//
// A limit of the model that is not met is a Broken finding. What is only
// common practice gives a Warning or a Note marked so: rules of thumb of the
// trade, each a reason to look, none a criterion of acceptance.
package limit

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/surface"
)

// Rules of thumb, all common practice without a single authority; where the
// model sets a limit of its own it takes the place of the rule.
const (
	ratioBand     = 0.10  // warp:weft stress ratio achieved over nominal
	principalBand = 0.05  // principal stresses achieved over specified
	cableBand     = 0.05  // mean cable force achieved over given
	evennessBand  = 0.10  // (max − min)/mean along a cable
	slopeLeast    = 5     // ° for drainage
	flatShare     = 0.05  // of the area that may be flatter: every saddle has a level spot
	pondLeast     = 1e-3  // m, shallower hollows are the mesh's
	sagLow        = 0.08  // of edge cables, over chord
	sagHigh       = 0.12  //
	ratioExtreme  = 3     // warp:weft between 1:3 and 3:1
	prestressLow  = 700.  // N/m, light fabrics
	prestressHigh = 5000. // N/m, heavy glass fabrics
	angleLeast    = 10    // ° in a triangle
	warpTurn      = 5     // ° between the warp asked for and the warp found
	limitShare    = 0.01  // share of area below which a slope limit of the model counts as met
)

// placesShown is how many places a finding names.
const placesShown = 5

// Sources of findings.
const (
	SourceModel    = "model"
	SourcePractice = "common practice"
)

// Check returns the findings on a form, the gravest first, in a stable order.
// q are the quantities of the form (audit.Quantities) and f must fit s.
func Check(s *canopy.Structure, f *canopy.Form, q *canopy.Quantities, limits canopy.Limits, factors canopy.Factors) []canopy.Finding {
	c := &check{s: s, f: f, q: q, limits: limits, factors: factors}
	c.prestress()
	c.stresses()
	c.warpDirections()
	c.cables()
	c.slack()
	c.equalMeshes()
	c.drainage()
	c.headroom()
	c.reactions()
	c.utilisation()
	c.mesh()
	return ordered(c.out)
}

// ordered sorts findings, the gravest first.
func ordered(findings []canopy.Finding) []canopy.Finding {
	slices.SortStableFunc(findings, func(a, b canopy.Finding) int {
		if a.Severity != b.Severity {
			return cmp.Compare(b.Severity, a.Severity)
		}
		return cmp.Compare(a.ID, b.ID)
	})
	return findings
}

type check struct {
	s       *canopy.Structure
	f       *canopy.Form
	q       *canopy.Quantities
	limits  canopy.Limits
	factors canopy.Factors
	out     []canopy.Finding
	areas   []float64
}

func (c *check) area(t int) float64 {
	if c.areas == nil {
		c.areas = surface.Areas(c.f.Position, c.s.Corners)
	}
	return c.areas[t]
}

// list gathers places with how bad they are.
type list struct {
	at    []int32
	worse []float64
	area  float64
}

func (l *list) add(i int, worse, area float64) {
	l.at = append(l.at, int32(i))
	l.worse = append(l.worse, worse)
	l.area += area
}

// places returns the worst few.
func (l *list) places(name func(int32) canopy.Place) []canopy.Place {
	idx := make([]int, len(l.at))
	for i := range idx {
		idx[i] = i
	}
	slices.SortStableFunc(idx, func(a, b int) int { return cmp.Compare(l.worse[b], l.worse[a]) })
	var out []canopy.Place
	for _, i := range idx[:min(len(idx), placesShown)] {
		out = append(out, name(l.at[i]))
	}
	return out
}

func (l *list) worst() (int32, float64) {
	at, w := int32(-1), math.Inf(-1)
	for i, v := range l.worse {
		if v > w {
			at, w = l.at[i], v
		}
	}
	return at, w
}

func (c *check) triangle(t int32) canopy.Place { return c.s.TrianglePlace(c.f.Position, t) }
func (c *check) member(k int32) canopy.Place   { return c.s.MemberPlace(c.f.Position, k) }
func (c *check) node(i int32) canopy.Place     { return c.s.NodePlace(c.f.Position, i) }
func (c *check) cable(k int32) canopy.Place    { return c.s.CablePlace(c.f.Position, k) }

func (c *check) fabricPlace(i int) canopy.Place {
	p := canopy.Place{Kind: "fabric", Index: int32(i), Name: c.s.Fabrics[i].Name}
	var sum r3.Vec
	n := 0
	for t, t3 := range c.s.Corners {
		if int(c.s.FabricOf[t]) == i {
			sum = r3.Add(sum, surface.Centre(c.f.Position, t3))
			n++
		}
	}
	if n > 0 {
		p.At = r3.Scale(1/float64(n), sum)
	}
	return p
}

func (c *check) add(f canopy.Finding) {
	if f.Count == 0 {
		f.Count = len(f.Places)
	}
	c.out = append(c.out, f)
}

// kN writes a force in kN with three or more significant digits.
func kN(v float64) string { return number(v/1e3) + " kN" }

// kNm writes a stress in kN/m.
func kNm(v float64) string { return number(v/1e3) + " kN/m" }

func metres(v float64) string {
	if math.Abs(v) < 1 {
		return fmt.Sprintf("%.0f mm", v*1e3)
	}
	return fmt.Sprintf("%.2f m", v)
}

func number(v float64) string {
	switch a := math.Abs(v); {
	case a >= 100:
		return fmt.Sprintf("%.0f", v)
	case a >= 10:
		return fmt.Sprintf("%.1f", v)
	case a >= 1 || a == 0:
		return fmt.Sprintf("%.2f", v)
	}
	return fmt.Sprintf("%.3g", v)
}

func percent(v float64) string {
	p := 100 * v
	if math.Abs(p) < 10 {
		return fmt.Sprintf("%.2g %%", p)
	}
	return fmt.Sprintf("%.0f %%", p)
}

func degrees(rad float64) string { return fmt.Sprintf("%.1f°", rad*180/math.Pi) }

// plural writes a count with its noun.
func plural(n int, one, many string) string {
	if n == 1 {
		return "1 " + one
	}
	return fmt.Sprintf("%d %s", n, many)
}
