package formfind

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/element"
	"anticlast/formfind/engine"
	"anticlast/formfind/load"
	"anticlast/formfind/newton"
)

// lawful reports whether the linear fixed-reference pass would leave members
// off their laws: it takes every force for a force density, which a stiff
// cable, a mast of given length or a free mast head feels at once.
func lawful(s *canopy.Structure) bool {
	for k, l := range s.Law {
		if l == canopy.LawElastic {
			return true
		}
		if l == canopy.LawCable {
			switch s.Cables[s.CableOf[k]].Law {
			case canopy.CableLength, canopy.CableElastic:
				return true
			}
		}
	}
	return len(freeMasts(s)) > 0
}

// bonded marks members along the side of a triangle.
func bonded(s *canopy.Structure) []bool {
	sides := map[[2]int32]bool{}
	for _, c := range s.Corners {
		for k := range 3 {
			i, j := c[k], c[(k+1)%3]
			sides[[2]int32{min(i, j), max(i, j)}] = true
		}
	}
	out := make([]bool, len(s.Ends))
	for k, e := range s.Ends {
		out[k] = sides[[2]int32{min(e[0], e[1]), max(e[0], e[1])}]
	}
	return out
}

// settle is the fixed-reference pass for structures whose members have laws of
// their own. The stress found acts on the surface found as second
// Piola–Kirchhoff stress, which makes three links of constant force density of
// every triangle (Pauletti & Pimenta 2008); the net of these links and the
// members under their laws is solved by Newton in all directions. Cables along
// fabric whose force is given or follows from a sag keep the force densities
// found, which hold that force as a mean.
func (c *chain) settle(ctx context.Context) (bool, error) {
	s, found := c.s, c.f
	ref := found.Position
	tri := make([]element.FabricTriangle, len(s.Corners))
	links := map[[2]int32]int{}
	var ends [][2]int32
	var q []float64
	for t, n := range s.Corners {
		corners := [3]r3.Vec{ref[n[0]], ref[n[1]], ref[n[2]]}
		var err error
		if tri[t], err = element.NewFabricTriangle(corners, s.WarpAt(t, corners[0], corners[1], corners[2])); err != nil {
			return false, nil // the linear pass names it
		}
		d := tri[t].Densities([3]float64{found.Stress[t].Warp, found.Stress[t].Weft, 0})
		for k := range 3 {
			i, j := n[(k+1)%3], n[(k+2)%3]
			key := [2]int32{min(i, j), max(i, j)}
			at, ok := links[key]
			if !ok {
				at = len(ends)
				links[key] = at
				ends, q = append(ends, key), append(q, 0)
			}
			q[at] += d[k]
		}
	}
	net := *s
	members, extra := len(s.Ends), len(ends)
	net.Ends = append(slices.Clone(s.Ends), ends...)
	net.Law = append(slices.Clone(s.Law), make([]canopy.Law, extra)...) // force densities
	net.Given = append(slices.Clone(s.Given), q...)
	net.Kind = slices.Clone(s.Kind)
	for range extra {
		net.Kind = append(net.Kind, canopy.KindStrut)
	}
	grow := func(v []float64) []float64 {
		if v == nil {
			return nil
		}
		return append(slices.Clone(v), make([]float64, extra)...)
	}
	net.Stiffness, net.Unstressed, net.Weight, net.Strength = grow(s.Stiffness), grow(s.Unstressed), grow(s.Weight), nil
	net.Group, net.Groups = nil, nil
	if s.CableOf != nil {
		net.CableOf = slices.Clone(s.CableOf)
		for range extra {
			net.CableOf = append(net.CableOf, -1)
		}
	}
	net.Cables = slices.Clone(s.Cables)
	for k, along := range bonded(s) {
		cable := canopy.CablePerMember
		if s.CableOf != nil && s.CableOf[k] >= 0 {
			cable = s.Cables[s.CableOf[k]].Law
		}
		if !along || s.Law[k] == canopy.LawElastic || cable == canopy.CableElastic || cable == canopy.CableLength || cable == canopy.CableBalance {
			continue
		}
		if l := r3.Norm(r3.Sub(ref[s.Ends[k][1]], ref[s.Ends[k][0]])); l > 0 {
			net.Law[k], net.Given[k] = canopy.LawForceDensity, found.Force[k]/l
			if cable == canopy.CableSag {
				net.Cables[s.CableOf[k]].Law = canopy.CablePerMember
			}
		}
	}
	net.Corners, net.FabricOf, net.Warp, net.Stress, net.Fabrics, net.Lines = nil, nil, nil, nil, nil, nil
	net.Enclosures = nil

	start := canopy.NewForm(&net)
	copy(start.Position, ref)
	copy(start.Force, found.Force)
	fabricOnly := *s
	fabricOnly.Load, fabricOnly.Weight, fabricOnly.Rings = nil, nil, nil
	set := c.settings(true)
	set.Residual, set.Worst = 1e-13, 1e-13
	loadsAt := func(x []r3.Vec, p []float64) []r3.Vec {
		loads := load.Nodal(fabricOnly.Carrying(&canopy.Form{Pressure: p}), x)
		for i := range loads {
			loads[i] = r3.Add(loads[i], s.LoadAt(i))
		}
		return loads
	}
	stuck := errors.New("not in balance")
	rest := func(loads []r3.Vec) ([]r3.Vec, error) {
		net.Load = loads
		g, out, err := newton.Engine{}.Find(ctx, &net, start, set)
		if err != nil {
			return nil, fmt.Errorf("newton: %w", err)
		}
		if out.Status != engine.Converged && !(out.Residual <= 1e-10) {
			c.say("fixed-reference pass with the members' own laws %s: %s", out.Status, out.Why)
			return nil, stuck
		}
		start = g
		return g.Position, nil
	}
	pressure := found.Pressure
	var err error
	if steadyLoads(s) {
		_, err = rest(loadsAt(ref, nil))
	} else {
		pressure, err = followLoads(ctx, s, ref, pressure, loadsAt, rest)
	}
	if err != nil {
		if errors.Is(err, stuck) {
			err = nil
		}
		return false, err
	}
	f := canopy.NewForm(s)
	copy(f.Pressure, pressure)
	copy(f.Position, start.Position)
	copy(f.Force, start.Force[:members])
	for t, n := range s.Corners {
		corners := [3]r3.Vec{f.Position[n[0]], f.Position[n[1]], f.Position[n[2]]}
		warp, st := tri[t].Cauchy(&corners, [3]float64{found.Stress[t].Warp, found.Stress[t].Weft, 0})
		f.Warp[t], f.Stress[t] = warp, canopy.Stress{Warp: st[0], Weft: st[1], Shear: st[2]}
	}
	if !finiteForm(f) || math.IsNaN(f.Position[0].X) {
		return false, nil
	}
	c.f = f
	c.f.Converged = true
	c.used("newton")
	c.say("fixed-reference pass with the members' own laws: balance in all directions")
	return true, nil
}
