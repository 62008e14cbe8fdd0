package canopy

import (
	"strconv"

	"gonum.org/v1/gonum/spatial/r3"
)

// NodePlace names node i as the tables do.
func (s *Structure) NodePlace(x []r3.Vec, i int32) Place {
	return Place{Kind: "node", Index: i, Name: s.NodeName.At(int(i)), At: x[i]}
}

// MemberPlace names member k as the tables do; its place is its middle.
func (s *Structure) MemberPlace(x []r3.Vec, k int32) Place {
	e := s.Ends[k]
	return Place{Kind: "member", Index: k, Name: s.MemberName.At(int(k)), At: r3.Scale(0.5, r3.Add(x[e[0]], x[e[1]]))}
}

// TrianglePlace names triangle t by its fabric and its number in the tables,
// "sail:17"; its place is its centroid.
func (s *Structure) TrianglePlace(x []r3.Vec, t int32) Place {
	c := s.Corners[t]
	return Place{
		Kind: "triangle", Index: t, Name: s.Fabrics[s.FabricOf[t]].Name + ":" + strconv.Itoa(int(t)),
		At: r3.Scale(1./3, r3.Add(r3.Add(x[c[0]], x[c[1]]), x[c[2]])),
	}
}

// CablePlace names cable c; its place is its middle node.
func (s *Structure) CablePlace(x []r3.Vec, c int32) Place {
	p := Place{Kind: "cable", Index: c, Name: s.Cables[c].Name}
	if n := s.Cables[c].Nodes; len(n) > 0 {
		p.At = x[n[len(n)/2]]
	}
	return p
}
