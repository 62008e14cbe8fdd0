package export

import (
	"fmt"
	"math"

	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

// sail is an invented four-point sail over n×n squares with edge cables, a
// seam, a mast and two guys. Its forces are plausible, not in equilibrium: no
// writer depends on that.
func sail(n int) *canopy.Result {
	s := &canopy.Structure{Fabrics: []canopy.Fabric{{Name: "sail", WarpStrength: 6e4, WeftStrength: 5e4, Weight: 10}}}
	f := &canopy.Form{Converged: true, Engines: []string{"fdm", "newton"}, Steps: []string{"one linear solve"}}
	at := func(i, j int) int32 { return int32(i*(n+1) + j) }
	node := func(p r3.Vec, fixed canopy.Freedom, name string) int32 {
		s.Position = append(s.Position, p)
		s.Fixed = append(s.Fixed, fixed)
		s.NodeName.Append(name)
		f.Reaction = append(f.Reaction, r3.Vec{})
		return int32(len(s.Position) - 1)
	}
	for i := range n + 1 {
		for j := range n + 1 {
			u, v := 2*float64(i)/float64(n)-1, 2*float64(j)/float64(n)-1
			p := r3.Vec{X: 6 * u * (1 - 0.12*(1-v*v)), Y: 5 * v * (1 - 0.12*(1-u*u)), Z: 4.5 + 2*u*v}
			name, fixed := "", canopy.Freedom(0)
			if (i == 0 || i == n) && (j == 0 || j == n) {
				name = map[[2]bool]string{{false, false}: "A", {true, false}: "B", {true, true}: "C", {false, true}: "D"}[[2]bool{i == n, j == n}]
				fixed = canopy.DirAll
				if name == "C" {
					fixed = 0
				}
			}
			node(p, fixed, name)
		}
	}
	for i := range n {
		for j := range n {
			a, b, c, d := at(i, j), at(i+1, j), at(i+1, j+1), at(i, j+1)
			s.Corners = append(s.Corners, [3]int32{a, b, c}, [3]int32{a, c, d})
			for range 2 {
				u, v := float64(i)/float64(n)-0.5, float64(j)/float64(n)-0.5
				s.FabricOf = append(s.FabricOf, 0)
				s.Warp = append(s.Warp, r3.Vec{X: 1})
				s.Stress = append(s.Stress, [2]float64{2500, 2000})
				f.Warp = append(f.Warp, r3.Unit(r3.Vec{X: 1, Z: 0.4 * v}))
				f.Stress = append(f.Stress, canopy.Stress{
					Warp: 2500 * (1 + 0.12*math.Sin(5*u)), Weft: 2000 * (1 - 0.15*math.Sin(4*v)), Shear: 40 * u * v})
			}
		}
	}
	member := func(a, b int32, k canopy.Kind, name string, force, given float64, law canopy.Law, cable int32) int32 {
		s.Ends = append(s.Ends, [2]int32{a, b})
		s.Kind = append(s.Kind, k)
		s.MemberName.Append(name)
		s.Law = append(s.Law, law)
		s.Given = append(s.Given, given)
		s.Strength = append(s.Strength, 2e5)
		s.Stiffness = append(s.Stiffness, 1.2e7)
		s.CableOf = append(s.CableOf, cable)
		f.Force = append(f.Force, force)
		return int32(len(s.Ends) - 1)
	}
	edge := func(name string, corner func(k int) int32, force float64) {
		c := canopy.Cable{Name: name, Kind: canopy.KindEdgeCable, Nodes: []int32{corner(0)}}
		for k := range n {
			m := member(corner(k), corner(k+1), c.Kind, "", force*(1+0.002*float64(k)/float64(n)), force, canopy.LawForce, int32(len(s.Cables)))
			c.Members = append(c.Members, m)
			c.Nodes = append(c.Nodes, corner(k+1))
		}
		s.Cables = append(s.Cables, c)
	}
	edge("AB", func(k int) int32 { return at(k, 0) }, 25e3)
	edge("BC", func(k int) int32 { return at(n, k) }, 22e3)
	edge("CD", func(k int) int32 { return at(n-k, n) }, 25e3)
	edge("DA", func(k int) int32 { return at(0, n-k) }, 22e3)
	stay := func(name string, k canopy.Kind, a, b int32, force float64) {
		c := int32(len(s.Cables))
		m := member(a, b, k, name, force, 0, canopy.LawCable, c)
		s.Cables = append(s.Cables, canopy.Cable{Name: name, Kind: k, Members: []int32{m}, Nodes: []int32{a, b}, Law: canopy.CableBalance})
	}
	head := at(n, n)
	stay("M1", canopy.KindMast, node(r3.Vec{X: 5.5, Y: 4.5}, canopy.DirAll, "M1 foot"), head, -58.4e3)
	stay("G1", canopy.KindGuy, head, node(r3.Vec{X: 10.5, Y: 5}, canopy.DirAll, "G1 anchor"), 31.2e3)
	stay("G2", canopy.KindGuy, head, node(r3.Vec{X: 6, Y: 10}, canopy.DirAll, "G2 anchor"), 28.7e3)
	s.Held = make([]canopy.Freedom, len(s.Position))
	s.Held[head] = canopy.DirAll
	seam := canopy.Line{Name: "S1", Role: "seam"}
	for i := range n + 1 {
		seam.Nodes = append(seam.Nodes, at(i, n/2))
	}
	s.Lines = append(s.Lines, seam)
	for i, fixed := range s.Fixed {
		if fixed != 0 {
			p := s.Position[i]
			f.Reaction[i] = r3.Vec{X: 3e3 * p.X, Y: 2e3 * p.Y, Z: -4e3 * (p.Z - 4)}
		}
	}
	f.Position = append([]r3.Vec(nil), s.Position...)
	r := &canopy.Result{
		Program: canopy.Program{Name: "anticlast", Version: "test", Engines: f.Engines},
		Title:   "Quay market sail", File: "sail.yaml", Digest: "sha256:" + fmt.Sprintf("%064x", 1),
		Factors:   canopy.Factors{Load: 1.35, Fabric: 1.4, Cable: 1.65},
		Structure: s, Form: f,
		Audit: canopy.Audit{Trusted: true, ResidualLargest: 3.1e-14, ForceBalance: 2e-15, MomentBalance: 4e-15, Virial: 1e-14,
			StabilityKnown: true, Softest: 0.013, MinAngle: 0.6, Discretisation: 2e-4},
		Findings: []canopy.Finding{{ID: "slope-low", Severity: canopy.Warning, Text: "The flattest place slopes 4.1°, under the 5° that drainage wants.", Source: "common practice",
			Count: 7, Places: []canopy.Place{{Kind: "triangle", Index: 3, Name: "3", At: r3.Vec{X: 1}}}}},
	}
	area := 0.0
	for i := range s.Corners {
		_, a := triangleNormal(r, i)
		area += a
	}
	r.Summary.FabricArea = []float64{area}
	spread := []canopy.Spread{{Min: 0.94, P5: 0.95, Mean: 1.001, P95: 1.05, Max: 1.06}}
	r.Summary.WarpAchieved, r.Summary.WeftAchieved, r.Summary.Ratio = spread, spread, spread
	r.Summary.FabricUtilisation = []float64{0.081}
	for i := range s.Cables {
		c := canopy.CableReport{ForceMin: math.Inf(1), ForceMax: math.Inf(-1)}
		for _, m := range s.Cables[i].Members {
			l := memberLength(r, int(m))
			c.Length += l
			c.ForceMin, c.ForceMax = min(c.ForceMin, f.Force[m]), max(c.ForceMax, f.Force[m])
			c.ForceMean += f.Force[m] / float64(len(s.Cables[i].Members))
			r.Summary.KindLength[s.Kind[m]] += l
		}
		ns := s.Cables[i].Nodes
		c.Chord = r3.Norm(r3.Sub(s.Position[ns[len(ns)-1]], s.Position[ns[0]]))
		c.Sag = 0.12 * c.Chord
		c.Evenness = (c.ForceMax - c.ForceMin) / c.ForceMean
		r.Summary.Cables = append(r.Summary.Cables, c)
	}
	return r
}

// cone is an invented cone of fabric between a circle of anchors and a rigid
// ring, n triangles around, far from the origin.
func cone(n int) *canopy.Result {
	origin := r3.Vec{X: 432100, Y: 5712300, Z: 12}
	s := &canopy.Structure{Fabrics: []canopy.Fabric{{Name: "cone"}}}
	f := &canopy.Form{}
	rows := max(2, n/4)
	for i := range rows + 1 {
		t := float64(i) / float64(rows)
		radius := 0.6 * math.Cosh(math.Acosh(8)*(1-t))
		for j := range n {
			a := 2 * math.Pi * float64(j) / float64(n)
			s.Position = append(s.Position, r3.Add(origin, r3.Vec{X: radius * math.Cos(a), Y: radius * math.Sin(a), Z: 3.2 * t}))
			s.Fixed = append(s.Fixed, map[bool]canopy.Freedom{true: canopy.DirAll}[i == 0])
		}
	}
	centre := int32(len(s.Position))
	s.Position = append(s.Position, r3.Add(origin, r3.Vec{Z: 3.2}))
	s.Fixed = append(s.Fixed, canopy.DirAll)
	ring := canopy.Ring{Name: "top", Centre: centre, Rigid: true, Free: canopy.DirZ, Weight: 1200, Cable: -1}
	line := canopy.Line{Name: "base", Role: "fixed edge"}
	for j := range n {
		ring.Nodes = append(ring.Nodes, int32(rows*n+j))
		line.Nodes = append(line.Nodes, int32(j))
	}
	line.Nodes = append(line.Nodes, 0)
	s.Rings, s.Lines = []canopy.Ring{ring}, []canopy.Line{line}
	f.Couple = make([]r3.Vec, 1)
	f.Position = append([]r3.Vec(nil), s.Position...)
	f.Reaction = make([]r3.Vec, len(s.Position))
	r := &canopy.Result{Program: canopy.Program{Name: "anticlast"}, Title: "Cone", Structure: s, Form: f}
	for i := range rows {
		for j := range n {
			a, b := int32(i*n+j), int32(i*n+(j+1)%n)
			c, d := a+int32(n), b+int32(n)
			for _, t := range [][3]int32{{a, b, d}, {a, d, c}} {
				s.Corners = append(s.Corners, t)
				s.FabricOf = append(s.FabricOf, 0)
				p := r3.Sub(s.Position[c], s.Position[a])
				s.Warp = append(s.Warp, r3.Unit(p))
				s.Stress = append(s.Stress, [2]float64{2000, 2000})
				f.Warp = append(f.Warp, r3.Unit(p))
				f.Stress = append(f.Stress, canopy.Stress{Warp: 2000 * (1 + 0.1*float64(i)/float64(rows)), Weft: 2000})
			}
		}
	}
	for i := range n {
		p := r3.Sub(s.Position[i], origin)
		f.Reaction[i] = r3.Scale(1500, r3.Vec{X: p.X, Y: p.Y, Z: -1})
	}
	f.Reaction[centre] = r3.Vec{Z: 9000}
	r.Summary.FabricArea = []float64{0}
	for i := range s.Corners {
		_, a := triangleNormal(r, i)
		r.Summary.FabricArea[0] += a
	}
	return r
}

// grid is an invented cable net of n×n nodes.
func grid(n int) *canopy.Result {
	s, f := &canopy.Structure{Groups: []string{"across", "along"}}, &canopy.Form{}
	for i := range n {
		for j := range n {
			u, v := 2*float64(i)/float64(n-1)-1, 2*float64(j)/float64(n-1)-1
			s.Position = append(s.Position, r3.Vec{X: 10 * u, Y: 10 * v, Z: 2*u*u - 2*v*v})
			edge := i == 0 || j == 0 || i == n-1 || j == n-1
			s.Fixed = append(s.Fixed, map[bool]canopy.Freedom{true: canopy.DirAll}[edge])
			for k, back := range [2]int{n, 1} {
				if (k == 0 && i == 0) || (k == 1 && j == 0) {
					continue
				}
				s.Ends = append(s.Ends, [2]int32{int32(i*n + j - back), int32(i*n + j)})
				s.Kind = append(s.Kind, canopy.KindNetCable)
				s.Law = append(s.Law, canopy.LawForceDensity)
				s.Given = append(s.Given, 4000)
				s.Group = append(s.Group, int32(k))
				f.Force = append(f.Force, 4000+100*u+50*v)
			}
		}
	}
	f.Position = append([]r3.Vec(nil), s.Position...)
	f.Reaction = make([]r3.Vec, len(s.Position))
	for i, fixed := range s.Fixed {
		if fixed != 0 {
			f.Reaction[i] = r3.Scale(400, s.Position[i])
		}
	}
	r := &canopy.Result{Program: canopy.Program{Name: "anticlast"}, Title: "Net", Structure: s, Form: f}
	for i := range s.Ends {
		r.Summary.KindLength[canopy.KindNetCable] += memberLength(r, i)
	}
	return r
}
