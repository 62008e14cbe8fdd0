package canopy

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"
)

// Enclosure is air shut in by fabric, of which the volume is given and the
// pressure is to be found: one pressure for all of its fabrics, so that they
// enclose Volume.
//
// The volume is ⅓∮(x − base)·n dA over the triangles of its fabrics, n out of
// the air. That is the volume between fabric and base plane where the fabric
// has a boundary, and that between films where they close by themselves. It
// does not depend on where in the plane, or at all, the base lies.
type Enclosure struct {
	Name    string  // of the fabric that asks for the volume
	Fabrics []int32 // index into Structure.Fabrics
	// Side is, for each of Fabrics, +1 where the positive side of its
	// triangles looks out of the air and −1 where it looks in. The pressure on
	// the fabric, towards its positive side, is Side times the pressure found.
	Side []int8
	// Base is a node of the plane that the boundary of the fabrics lies in; any
	// of their nodes when they close by themselves. Nodes of the boundary
	// cannot leave the plane.
	Base   int32
	Volume float64 // wanted, m³; negative: the fabrics bulge the other way
}

// EnclosureError says why fabrics do not enclose a volume.
type EnclosureError struct {
	Name    string // of the enclosure
	Problem string
	WayOut  string
}

func (e *EnclosureError) Error() string {
	return fmt.Sprintf("volume of fabric %s: %s; %s", e.Name, e.Problem, e.WayOut)
}

// flatness is how far the boundary of an enclosure may lie off its plane, over
// the size of the boundary.
const flatness = 1e-6

// Enclose makes the enclosure of the given fabrics of s, the first one named
// name and with its positive side out of the air when side is positive. The
// error is an [EnclosureError] when the fabrics do not enclose a volume that is
// defined: their boundary must be none, or one that lies in a plane and cannot
// leave it.
func (s *Structure) Enclose(name string, fabrics []int32, side int8, volume float64) (Enclosure, error) {
	e := Enclosure{Name: name, Fabrics: fabrics, Volume: volume, Base: -1}
	e.Side = make([]int8, len(fabrics))
	at := make([]int32, len(s.Fabrics))
	for i := range at {
		at[i] = -1
	}
	for k, f := range fabrics {
		at[f] = int32(k)
	}
	sides, err := s.sidesOf(name, at)
	if err != nil {
		return e, err
	}
	if len(sides) == 0 {
		return e, &EnclosureError{name, "its fabrics have no triangles", "give it a boundary"}
	}
	if err := e.orient(s, sides, side); err != nil {
		return e, err
	}
	if err := e.close(s, sides); err != nil {
		return e, err
	}
	return e, nil
}

// fabricSide is a side of triangles with the fabrics that meet there.
type fabricSide struct {
	a, b   int32    // a < b
	fabric [2]int32 // into Enclosure.Fabrics, the second −1 at the boundary
	same   bool     // both walk it in the same direction
}

// sidesOf lists the sides of all triangles of the fabrics with at[fabric] ≥ 0,
// in order.
func (s *Structure) sidesOf(name string, at []int32) ([]fabricSide, error) {
	type half struct {
		a, b, fabric int32
		back         bool
	}
	var halves []half
	for t, c := range s.Corners {
		k := at[s.FabricOf[t]]
		if k < 0 {
			continue
		}
		for j := range 3 {
			a, b := c[j], c[(j+1)%3]
			if a < b {
				halves = append(halves, half{a, b, k, false})
			} else {
				halves = append(halves, half{b, a, k, true})
			}
		}
	}
	slices.SortFunc(halves, func(p, q half) int {
		switch {
		case p.a != q.a:
			return int(p.a) - int(q.a)
		case p.b != q.b:
			return int(p.b) - int(q.b)
		}
		return int(p.fabric) - int(q.fabric)
	})
	var out []fabricSide
	for i := 0; i < len(halves); {
		j := i + 1
		for j < len(halves) && halves[j].a == halves[i].a && halves[j].b == halves[i].b {
			j++
		}
		// Two films on one boundary may cut the same corner: then the side is
		// inside each of them.
		var single []half
		for k := i; k < j; k++ {
			h := halves[k]
			if k+1 < j && halves[k+1].fabric == h.fabric {
				out = append(out, fabricSide{h.a, h.b, [2]int32{h.fabric, h.fabric}, h.back == halves[k+1].back})
				k++
				continue
			}
			single = append(single, h)
		}
		h := halves[i]
		switch n := j - i; {
		case len(single) == 0:
		case n == 1:
			out = append(out, fabricSide{h.a, h.b, [2]int32{h.fabric, -1}, false})
		case n == 2:
			out = append(out, fabricSide{h.a, h.b, [2]int32{h.fabric, single[1].fabric}, h.back == single[1].back})
		default:
			return nil, &EnclosureError{name, fmt.Sprintf("%d films of it meet between nodes %s and %s, so that it is more than one volume", n, s.NodeName.At(int(h.a)), s.NodeName.At(int(h.b))), "name only the fabrics around one volume"}
		}
		i = j
	}
	return out, nil
}

// orient finds which side of every fabric looks out of the air.
func (e *Enclosure) orient(s *Structure, sides []fabricSide, side int8) error {
	e.Side[0] = 1
	if side < 0 {
		e.Side[0] = -1
	}
	for grown := true; grown; {
		grown = false
		for _, d := range sides {
			p, q := d.fabric[0], d.fabric[1]
			if q < 0 {
				continue
			}
			if e.Side[p] == 0 {
				p, q = q, p
			}
			if e.Side[p] == 0 {
				continue
			}
			want := e.Side[p]
			if d.same {
				want = -want
			}
			switch e.Side[q] {
			case 0:
				e.Side[q], grown = want, true
			case want:
			default:
				return &EnclosureError{e.Name, fmt.Sprintf("fabric %s has its inner and its outer side on one side of it", s.Fabrics[e.Fabrics[q]].Name), "turn the triangles that face the other way, or leave the fabric out"}
			}
		}
	}
	for k, v := range e.Side {
		if v == 0 {
			return &EnclosureError{e.Name, fmt.Sprintf("fabric %s does not touch the others", s.Fabrics[e.Fabrics[k]].Name), "leave it out, or give it a volume of its own"}
		}
	}
	return nil
}

// close looks at the boundary and chooses the base.
func (e *Enclosure) close(s *Structure, sides []fabricSide) error {
	e.Base = sides[0].a
	on := map[int32]bool{}
	var rim []int32
	for _, d := range sides {
		if d.fabric[1] >= 0 {
			continue
		}
		for _, i := range [2]int32{d.a, d.b} {
			if !on[i] {
				on[i] = true
				rim = append(rim, i)
			}
		}
	}
	if len(rim) == 0 {
		return nil
	}
	e.Base = rim[0]
	normal, off, far, size := flattest(s.Position, rim)
	if !(size > 0) {
		return &EnclosureError{e.Name, "its boundary has no size", "give it a boundary with an area"}
	}
	if off > flatness*size {
		p := s.Position[far]
		return &EnclosureError{e.Name,
			fmt.Sprintf("the boundary around it does not lie in a plane: node %s at [%.3f, %.3f, %.3f] is %.3g m off", s.NodeName.At(int(far)), p.X, p.Y, p.Z, off),
			"move its points into one plane, or name the fabrics that close the volume under volume with"}
	}
	for _, i := range rim {
		j := i
		if m := s.MasterOf(int(i)); m >= 0 {
			j = m
		}
		fixed := s.FixedAt(int(i)) | s.FixedAt(int(j))
		for d, c := range [3]float64{normal.X, normal.Y, normal.Z} {
			if !fixed.Has(d) && math.Abs(c) > 1e-9 {
				p := s.Position[i]
				return &EnclosureError{e.Name,
					fmt.Sprintf("its boundary can move out of its plane at node %s [%.3f, %.3f, %.3f], so that nothing says where the volume ends", s.NodeName.At(int(i)), p.X, p.Y, p.Z),
					"fix that edge, give the pressure instead, or name the fabrics that close the volume under volume with"}
			}
		}
	}
	return nil
}

// flattest returns the unit normal of the plane through the centroid of the
// points that fits a flat set of them exactly, the largest distance from it
// with its point, and the size of the set.
func flattest(x []r3.Vec, of []int32) (normal r3.Vec, off float64, far int32, size float64) {
	o := x[of[0]]
	var u r3.Vec
	for _, i := range of {
		if d := r3.Sub(x[i], o); r3.Norm2(d) > r3.Norm2(u) {
			u = d
		}
	}
	size = r3.Norm(u)
	if size == 0 {
		return r3.Vec{}, 0, of[0], 0
	}
	// The direction at right angles to the longest, and to the farthest from it.
	for _, i := range of {
		if n := r3.Cross(u, r3.Sub(x[i], o)); r3.Norm2(n) > r3.Norm2(normal) {
			normal = n
		}
	}
	if !(r3.Norm(normal) > 1e-9*size*size) {
		return r3.Vec{}, 0, of[0], 0
	}
	normal = r3.Unit(normal)
	far = of[0]
	for _, i := range of {
		if d := math.Abs(r3.Dot(normal, r3.Sub(x[i], o))); d > off {
			off, far = d, i
		}
	}
	return normal, off, far, size
}

// EnclosureOf returns the enclosure that a fabric bounds, −1 for none.
func (s *Structure) EnclosureOf(fabric int) int {
	for i := range s.Enclosures {
		if slices.Contains(s.Enclosures[i].Fabrics, int32(fabric)) {
			return i
		}
	}
	return -1
}

// Carrying returns s with the pressures that f has found on the fabrics of its
// enclosures; s itself where it has none. Nothing but the fabrics is copied.
func (s *Structure) Carrying(f *Form) *Structure {
	if len(s.Enclosures) == 0 || len(f.Pressure) != len(s.Enclosures) {
		return s
	}
	out := *s
	out.Fabrics = slices.Clone(s.Fabrics)
	for i := range s.Enclosures {
		e := &s.Enclosures[i]
		for k, fab := range e.Fabrics {
			out.Fabrics[fab].Pressure = float64(e.Side[k]) * f.Pressure[i]
		}
	}
	return &out
}
