package formfind

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// closedCorner reports whether two edge cables cross where they leave a corner.
// The polygons of a mesh leave it at a wider angle than the cables do, by half
// the turn at their first nodes; a corner may look open while the curves through
// the nodes have closed it.
func closedCorner(s *canopy.Structure, f *canopy.Form) bool {
	type end struct {
		out  r3.Vec  // along the first member
		turn float64 // there to the second, rad
	}
	ends := map[int32][]end{}
	var order []int32
	for c := range s.Cables {
		cb := &s.Cables[c]
		n := len(cb.Nodes)
		if cb.Kind != canopy.KindEdgeCable || n < 3 || cb.Nodes[0] == cb.Nodes[n-1] {
			continue
		}
		add := func(i, j, k int32) {
			a, b := r3.Sub(f.Position[j], f.Position[i]), r3.Sub(f.Position[k], f.Position[j])
			if len(ends[i]) == 0 {
				order = append(order, i)
			}
			ends[i] = append(ends[i], end{a, angleBetween(a, b)})
		}
		add(cb.Nodes[0], cb.Nodes[1], cb.Nodes[2])
		add(cb.Nodes[n-1], cb.Nodes[n-2], cb.Nodes[n-3])
	}
	for _, i := range order {
		if e := ends[i]; len(e) == 2 && s.FixedAt(int(i)) == canopy.DirAll &&
			angleBetween(e[0].out, e[1].out) <= (e[0].turn+e[1].turn)/2 {
			return true
		}
	}
	return false
}

func angleBetween(a, b r3.Vec) float64 { return math.Atan2(r3.Norm(r3.Cross(a, b)), r3.Dot(a, b)) }
