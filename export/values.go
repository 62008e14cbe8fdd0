package export

import (
	"math"

	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

// Small quantities that several formats need.

// optional returns v[i], 0 when v is not there.
func optional(v []float64, i int) float64 {
	if v == nil {
		return 0
	}
	return v[i]
}

func cableOf(s *canopy.Structure, member int) int32 {
	if s.CableOf == nil {
		return -1
	}
	return s.CableOf[member]
}

func memberLength(r *canopy.Result, i int) float64 {
	e, p := r.Structure.Ends[i], r.Form.Position
	return r3.Norm(r3.Sub(p[e[1]], p[e[0]]))
}

// unstressedLength is the given one or, for a member with a stiffness, the one
// that goes with force and length: force = EA·(length − unstressed)/unstressed.
// 0 without stiffness.
func unstressedLength(r *canopy.Result, i int) float64 {
	s := r.Structure
	if l := optional(s.Unstressed, i); l != 0 {
		return l
	}
	if ea := optional(s.Stiffness, i); ea > 0 {
		return memberLength(r, i) / (1 + r.Form.Force[i]/ea)
	}
	return 0
}

// memberUtilisation is γ·|T|/(F/γM) under prestress only, 0 when strength or
// factors are not given.
func memberUtilisation(r *canopy.Result, i int) float64 {
	strength := optional(r.Structure.Strength, i)
	if strength == 0 || r.Factors.Load == 0 || r.Factors.Cable == 0 {
		return 0
	}
	return r.Factors.Load * math.Abs(r.Form.Force[i]) * r.Factors.Cable / strength
}

// triangleNormal returns the unit normal (zero for a triangle without area)
// and the area of triangle i.
func triangleNormal(r *canopy.Result, i int) (r3.Vec, float64) {
	c, p := r.Structure.Corners[i], r.Form.Position
	n := r3.Cross(r3.Sub(p[c[1]], p[c[0]]), r3.Sub(p[c[2]], p[c[0]]))
	l := r3.Norm(n)
	if l == 0 {
		return r3.Vec{}, 0
	}
	return r3.Scale(1/l, n), l / 2
}

// principal returns the larger and the smaller principal stress.
func principal(s canopy.Stress) (major, minor float64) {
	mean := (s.Warp + s.Weft) / 2
	half := math.Hypot((s.Warp-s.Weft)/2, s.Shear)
	return mean + half, mean - half
}

// slope is the angle of a surface with this normal to the horizontal, rad.
func slope(normal r3.Vec) float64 {
	return math.Atan2(math.Hypot(normal.X, normal.Y), math.Abs(normal.Z))
}

func degrees(rad float64) float64 { return rad * 180 / math.Pi }

// ratio is a/b, NaN when b is zero.
func ratio(a, b float64) float64 {
	if b == 0 {
		return math.NaN()
	}
	return a / b
}

// lineOf maps nodes to the first line they are on.
func lineOf(s *canopy.Structure) map[int32]int {
	m := make(map[int32]int)
	for i := range s.Lines {
		for _, v := range s.Lines[i].Nodes {
			if _, ok := m[v]; !ok {
				m[v] = i
			}
		}
	}
	return m
}

// innerNodes are the nodes between the ends of fixed lines and seams.
func innerNodes(s *canopy.Structure) []bool {
	inner := make([]bool, len(s.Position))
	for i := range s.Lines {
		l := &s.Lines[i]
		for k := 1; k < len(l.Nodes)-1; k++ {
			inner[l.Nodes[k]] = true
		}
	}
	return inner
}
