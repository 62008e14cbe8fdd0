package audit

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/surface"
)

// Quantities sums up a form: areas, lengths, prestress achieved over
// specified, what cables and fixed lines carry. Utilisation, γ·demand over
// (strength/γ_M), is filled in where the strength and both factors are given;
// the demand is that of prestress (and the loads of form finding) only. f must
// fit s, as for [Run].
func Quantities(s *canopy.Structure, f *canopy.Form, factors canopy.Factors) canopy.Quantities {
	var q canopy.Quantities
	fabrics(s, f, factors, &q)
	for k, e := range s.Ends {
		q.KindLength[min(s.Kind[k], canopy.KindStrut)] += norm(r3.Sub(f.Position[e[1]], f.Position[e[0]]))
	}
	q.Cables = make([]canopy.CableReport, len(s.Cables))
	for c := range s.Cables {
		q.Cables[c] = cableReport(s, f, factors, &s.Cables[c])
	}
	if len(s.Enclosures) > 0 {
		c := newCase(s, f)
		for i := range s.Enclosures {
			q.Enclosed = append(q.Enclosed, c.measureAir(&s.Enclosures[i]).volume)
		}
	}
	q.Lines = make([]canopy.LineReport, len(s.Lines))
	for l := range s.Lines {
		q.Lines[l] = lineReport(f, s.Lines[l].Nodes)
	}
	return q
}

// fabrics fills in the reports on fabric.
func fabrics(s *canopy.Structure, f *canopy.Form, factors canopy.Factors, q *canopy.Quantities) {
	n := len(s.Fabrics)
	q.FabricArea = make([]float64, n)
	q.FabricUtilisation = make([]float64, n)
	spreads := []*[]canopy.Spread{&q.WarpAchieved, &q.WeftAchieved, &q.MajorAchieved, &q.MinorAchieved, &q.Ratio, &q.Shear}
	values := make([][][]float64, len(spreads))
	for i, sp := range spreads {
		*sp = make([]canopy.Spread, n)
		values[i] = make([][]float64, n)
	}
	weights := make([][]float64, n)
	count := make([]int, n)
	for _, fab := range s.FabricOf {
		count[fab]++
	}
	for fab := range n {
		weights[fab] = make([]float64, 0, count[fab])
		for i := range values {
			values[i][fab] = make([]float64, 0, count[fab])
		}
	}
	over := func(a, b float64) float64 { // not a number where nothing is specified
		if b == 0 {
			return math.NaN()
		}
		return a / b
	}
	for t, c := range s.Corners {
		fab := s.FabricOf[t]
		area, _ := surface.AreaNormal(f.Position[c[0]], f.Position[c[1]], f.Position[c[2]])
		q.FabricArea[fab] += area
		st, want := f.Stress[t], s.Stress[t]
		major, minor, _ := surface.Principal(st)
		weights[fab] = append(weights[fab], area)
		for i, v := range [...]float64{
			over(st.Warp, want[0]),
			over(st.Weft, want[1]),
			over(major, max(want[0], want[1])),
			over(minor, min(want[0], want[1])),
			over(over(st.Warp, st.Weft), over(want[0], want[1])),
			over(math.Abs(st.Shear), (want[0]+want[1])/2),
		} {
			values[i][fab] = append(values[i][fab], v)
		}
		q.FabricUtilisation[fab] = max(q.FabricUtilisation[fab],
			utilisation(st.Warp, s.Fabrics[fab].WarpStrength, factors.Load, factors.Fabric),
			utilisation(st.Weft, s.Fabrics[fab].WeftStrength, factors.Load, factors.Fabric))
	}
	for i, sp := range spreads {
		for fab := range n {
			(*sp)[fab] = surface.Spread(values[i][fab], weights[fab])
		}
	}
}

// utilisation is γ·demand/(strength/γ_M), 0 where one of them is not given.
func utilisation(demand, strength, load, material float64) float64 {
	if !(strength > 0) || !(load > 0) || !(material > 0) {
		return 0
	}
	return max(0, load*demand*material/strength)
}

func cableReport(s *canopy.Structure, f *canopy.Form, factors canopy.Factors, c *canopy.Cable) canopy.CableReport {
	var r canopy.CableReport
	if len(c.Members) == 0 {
		return r
	}
	r.ForceMin, r.ForceMax = math.Inf(1), math.Inf(-1)
	for _, k := range c.Members {
		e := s.Ends[k]
		l := norm(r3.Sub(f.Position[e[1]], f.Position[e[0]]))
		t := f.Force[k]
		r.Length += l
		r.ForceMean += t * l
		r.ForceMin, r.ForceMax = min(r.ForceMin, t), max(r.ForceMax, t)
		if len(s.Strength) > 0 && !s.Kind[k].Pushes() {
			r.Utilisation = max(r.Utilisation, utilisation(t, s.Strength[k], factors.Load, factors.Cable))
		}
	}
	if r.Length > 0 {
		r.ForceMean /= r.Length
	}
	// A mean of equal forces can leave their range by rounding.
	r.ForceMean = min(max(r.ForceMean, r.ForceMin), r.ForceMax)
	if r.ForceMean != 0 {
		r.Evenness = (r.ForceMax - r.ForceMin) / math.Abs(r.ForceMean)
	}
	r.Sag, r.Chord = surface.Sag(f.Position, c.Nodes)
	return r
}

// lineReport spreads the reactions of the nodes of a line over the half sides
// beside them. The two ends of an open line belong to what else meets there
// and are left out, unless the line has nothing else.
func lineReport(f *canopy.Form, nodes []int32) canopy.LineReport {
	var r canopy.LineReport
	n := len(nodes)
	if n < 2 {
		return r
	}
	side := make([]float64, n-1)
	for i := range side {
		side[i] = norm(r3.Sub(f.Position[nodes[i+1]], f.Position[nodes[i]]))
		r.Length += side[i]
	}
	closed := nodes[0] == nodes[n-1]
	r.Min = math.Inf(1)
	var sum, along float64
	take := func(i int, width float64) {
		v := f.Reaction[nodes[i]]
		r.Total = r3.Add(r.Total, v)
		size := norm(v)
		if width > 0 {
			r.Min, r.Max = min(r.Min, size/width), max(r.Max, size/width)
			sum += size
			along += width
		}
	}
	for i := 1; i < n-1; i++ {
		take(i, (side[i-1]+side[i])/2)
	}
	switch {
	case closed:
		take(0, (side[0]+side[n-2])/2)
	case n == 2:
		take(0, side[0]/2)
		take(1, side[0]/2)
	}
	if along > 0 {
		r.Mean = sum / along
	} else {
		r.Min = 0
	}
	r.Mean = min(max(r.Mean, r.Min), max(r.Max, r.Min))
	return r
}
