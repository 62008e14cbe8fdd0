// Package load turns what acts on a canopy into nodal forces.
package load

import (
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// Nodal returns the external force on every node of s in N at positions x:
// dead loads, the internal pressure of fabrics (follower: p·A·n/3 on each
// corner) and, where s.SelfWeight asks for them, the weights as documented
// there. Forces on tied nodes stay on those nodes.
func Nodal(s *canopy.Structure, x []r3.Vec) []r3.Vec {
	f := make([]r3.Vec, len(x))
	copy(f, s.Load)
	for t, c := range s.Corners {
		fab := &s.Fabrics[s.FabricOf[t]]
		if fab.Pressure == 0 && (!s.SelfWeight || fab.Weight == 0) {
			continue
		}
		a, b, d := x[c[0]], x[c[1]], x[c[2]]
		twice := r3.Cross(r3.Sub(b, a), r3.Sub(d, a)) // 2·A·n
		third := r3.Scale(fab.Pressure/6, twice)
		if s.SelfWeight {
			third.Z -= fab.Weight * r3.Norm(twice) / 6
		}
		for _, i := range c {
			f[i] = r3.Add(f[i], third)
		}
	}
	if !s.SelfWeight {
		return f
	}
	if s.Weight != nil {
		for k, e := range s.Ends {
			w := s.Weight[k]
			if w == 0 {
				continue
			}
			if s.Unstressed != nil && s.Unstressed[k] > 0 {
				w *= s.Unstressed[k]
			} else {
				w *= r3.Norm(r3.Sub(x[e[1]], x[e[0]]))
			}
			f[e[0]].Z -= w / 2
			f[e[1]].Z -= w / 2
		}
	}
	for r := range s.Rings {
		rg := &s.Rings[r]
		switch {
		case rg.Weight == 0:
		case rg.Rigid && rg.Centre >= 0:
			f[rg.Centre].Z -= rg.Weight
		default:
			for _, i := range rg.Nodes {
				f[i].Z -= rg.Weight / float64(len(rg.Nodes))
			}
		}
	}
	return f
}
