package formfind

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// freeMasts lists the masts and struts whose force is not a force density and
// not found from balance afterwards, with an end that may move. A linear step
// would take such a force for a force density, which grows as the mast
// shortens.
func freeMasts(s *canopy.Structure) []int32 {
	var list []int32
	for k, e := range s.Ends {
		if !s.Kind[k].Pushes() || s.Law[k] == canopy.LawForceDensity {
			continue
		}
		if s.Law[k] == canopy.LawCable && s.Cables[s.CableOf[k]].Law == canopy.CableBalance {
			continue
		}
		for _, i := range e {
			if m := s.MasterOf(int(i)); m >= 0 {
				i = m
			}
			if s.FixedAt(int(i)) != canopy.DirAll {
				list = append(list, int32(k))
				break
			}
		}
	}
	return list
}

// thrusts are the pulls of free masts on the node at their first end, three
// numbers each: what the linear passes take for dead loads and correct from one
// to the next, until each mast pushes along its own line with the force its law
// asks for.
type thrusts struct {
	s     *canopy.Structure
	masts []int32
	fast  accelerator
}

// of returns the thrusts that the forces and positions of f ask for.
func (t *thrusts) of(f *canopy.Form) []float64 {
	w := make([]float64, 0, 3*len(t.masts))
	for _, k := range t.masts {
		e := t.s.Ends[k]
		v := r3.Scale(f.Force[k], r3.Unit(r3.Sub(f.Position[e[1]], f.Position[e[0]])))
		w = append(w, v.X, v.Y, v.Z)
	}
	return w
}

// load adds thrusts w to nodal loads.
func (t *thrusts) load(loads []r3.Vec, w []float64) {
	for j, k := range t.masts {
		e, v := t.s.Ends[k], r3.Vec{X: w[3*j], Y: w[3*j+1], Z: w[3*j+2]}
		loads[e[0]] = r3.Add(loads[e[0]], v)
		loads[e[1]] = r3.Sub(loads[e[1]], v)
	}
}

// correct sets the forces of the masts in f from the thrusts w that led to its
// positions, by their laws, and returns the thrusts to try next and how far w
// was from what f asks for, relative to its size.
func (t *thrusts) correct(f *canopy.Form, w []float64) (next []float64, off float64) {
	s := t.s
	size := 0.0
	for j, k := range t.masts {
		force := -r3.Norm(r3.Vec{X: w[3*j], Y: w[3*j+1], Z: w[3*j+2]})
		e := s.Ends[k]
		length := r3.Norm(r3.Sub(f.Position[e[1]], f.Position[e[0]]))
		want := length
		switch s.Law[k] {
		case canopy.LawForce:
			force = s.Given[k]
		case canopy.LawElastic:
			want = s.Unstressed[k] * (1 + force/s.Stiffness[k])
		case canopy.LawCable:
			if c := &s.Cables[s.CableOf[k]]; c.Law == canopy.CableLength && len(c.Members) == 1 {
				want = c.Value
			}
		}
		// Too long: less thrust.
		force -= force / length * (length - want)
		f.Force[k] = force
		size = math.Max(size, math.Abs(force))
	}
	asked := t.of(f)
	for i := range w {
		off = math.Max(off, math.Abs(asked[i]-w[i]))
	}
	return t.fast.next(w, asked), off / size
}
