package canopy

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// WarpAt returns the wanted warp direction of triangle t with its corners at a, b
// and c: not zero, to be projected into the triangle.
//
// A warp radial or around a ring is defined on the surface, wherever that lies: by
// the axis plane through the triangle. A direction kept from a start would not do:
// a cone turns by more than a right angle on the way from a flat start to its neck,
// and where it has turned by just that, the direction of the start is normal to it.
func (s *Structure) WarpAt(t int, a, b, c r3.Vec) r3.Vec {
	start := s.Warp[t]
	f := &s.Fabrics[s.FabricOf[t]]
	if f.WarpRule == WarpAlong || f.Elastic {
		return start
	}
	normal := r3.Cross(r3.Sub(b, a), r3.Sub(c, a))
	offset := r3.Sub(r3.Scale(1.0/3, r3.Add(a, r3.Add(b, c))), f.WarpCentre)
	w := WarpAbout(f.WarpRule, f.WarpAxis, offset, normal)
	switch {
	case w == r3.Vec{}:
		return start
	case r3.Dot(w, start) < 0:
		return r3.Scale(-1, w)
	}
	return w
}

// WarpAbout returns the unit warp direction at an offset from a centre on the
// (unit) axis: around the axis, or radial, which is in the surface with the given
// normal and in the axis plane, outwards where that can be told. Zero where it is
// undefined.
func WarpAbout(rule WarpRule, axis, offset, normal r3.Vec) r3.Vec {
	// Triangles by the million ask: lengths without a guard against overflow.
	around := r3.Cross(axis, offset)
	l := math.Sqrt(r3.Norm2(around))
	if l == 0 {
		return r3.Vec{}
	}
	around = r3.Scale(1/l, around)
	if rule == WarpAround {
		return around
	}
	w := r3.Cross(around, normal)
	if l = math.Sqrt(r3.Norm2(w)); l == 0 {
		return r3.Vec{}
	}
	if r3.Dot(w, offset) < 0 {
		l = -l
	}
	return r3.Scale(1/l, w)
}
