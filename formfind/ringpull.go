package formfind

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// checkRingPull refuses rings that are pulled harder than the fabric around them
// can hold. Along a ring of perimeter L a film of uniform stress σ pulls with σ
// per length whatever its slope, so that its resultant is σL at most: 2πrσ for
// a circle, reached where the film leaves it along the axis.
func checkRingPull(s *canopy.Structure) error {
	for r := range s.Rings {
		g := &s.Rings[r]
		if !g.Rigid || g.Centre < 0 || s.MasterOf(int(g.Nodes[0])) != g.Centre {
			continue
		}
		free := canopy.DirAll &^ s.FixedAt(int(g.Centre))
		pull, known := knownPull(s, g)
		if pull = only(pull, free); free == 0 || !known || pull == (r3.Vec{}) {
			continue
		}
		hold, perimeter, known := ringHold(s, g)
		given := r3.Norm(pull)
		if !known || given <= hold {
			continue
		}
		return &NoEquilibriumError{Shown: true, Quantity: "pull on a ring", Given: given, Limit: hold,
			Text: fmt.Sprintf("no equilibrium with ring %s pulled by %.4g kN: fabric of this prestress around a ring of radius %.3g m holds at most 2πrσ = %.4g kN, reached where it leaves the ring along the axis; beyond, the ring runs away. Lower the force of the mast, widen the ring, raise the prestress, or give the height instead of the force",
				g.Name, given/1e3, perimeter/(2*math.Pi), hold/1e3)}
	}
	return nil
}

// knownPull is what acts on a ring besides its fabric, when that does not
// depend on the shape: loads, and members of given force.
func knownPull(s *canopy.Structure, g *canopy.Ring) (r3.Vec, bool) {
	tied := func(i int32) bool { return i == g.Centre || s.MasterOf(int(i)) == g.Centre }
	pull := s.LoadAt(int(g.Centre))
	for _, i := range g.Nodes {
		pull = r3.Add(pull, s.LoadAt(int(i)))
	}
	if s.SelfWeight {
		pull.Z -= g.Weight
	}
	for k, e := range s.Ends {
		if tied(e[0]) == tied(e[1]) {
			continue
		}
		if s.Law[k] != canopy.LawForce {
			return r3.Vec{}, false
		}
		v := r3.Sub(s.Position[e[1]], s.Position[e[0]])
		if tied(e[1]) {
			v = r3.Scale(-1, v)
		}
		if l := r3.Norm(v); l > 0 {
			pull = r3.Add(pull, r3.Scale(s.Given[k]/l, v))
		}
	}
	return pull, true
}

// ringHold is the most that uniform fabric around a ring can pull with, and the
// ring's perimeter; unknown where warp and weft differ.
func ringHold(s *canopy.Structure, g *canopy.Ring) (hold, perimeter float64, known bool) {
	on := make(map[[2]int32]bool, len(g.Nodes))
	for j, a := range g.Nodes {
		b := g.Nodes[(j+1)%len(g.Nodes)]
		on[[2]int32{min(a, b), max(a, b)}] = true
	}
	for t, c := range s.Corners {
		for k := range c {
			a, b := c[k], c[(k+1)%3]
			if !on[[2]int32{min(a, b), max(a, b)}] {
				continue
			}
			f := int(s.FabricOf[t])
			if s.Stress[t][0] != s.Stress[t][1] || s.Fabrics[f].Elastic || s.Fabrics[f].Pressure != 0 || s.EnclosureOf(f) >= 0 {
				return 0, 0, false
			}
			l := r3.Norm(r3.Sub(s.Position[b], s.Position[a]))
			perimeter += l
			hold += s.Stress[t][0] * l
		}
	}
	return hold, perimeter, perimeter > 0
}
