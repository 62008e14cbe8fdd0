package mesh

import (
	"errors"
	"math"

	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

// enclosures makes the volumes that fabrics ask for. Positive is the volume
// below the fabric that asks, for an upright one that on the far side of +x.
func (b *builder) enclosures() {
	index := make(map[string]int32, len(b.m.Fabrics))
	for i, f := range b.m.Fabrics {
		index[f.Name] = int32(i)
	}
	inside := map[int32]string{} // fabric → the one that asks for the volume it bounds
	for i, f := range b.m.Fabrics {
		if !f.HasVolume {
			continue
		}
		fabrics := []int32{int32(i)}
		for _, name := range f.VolumeWith {
			j, ok := index[name]
			if !ok {
				b.fail("fabric", f.Name, f.Line, Missing, "add it under fabrics", "its volume is shut in with fabric %q, which is not defined", name)
				return
			}
			fabrics = append(fabrics, j)
		}
		for _, j := range fabrics {
			if by, twice := inside[j]; twice {
				b.fail("fabric", f.Name, f.Line, Mismatch, "a fabric bounds one volume only: leave it out of the other, or give one of them by its pressure", "fabric %s already bounds the volume of fabric %s", b.m.Fabrics[j].Name, by)
				return
			}
			inside[j] = f.Name
		}
		e, err := b.s.Enclose(f.Name, fabrics, b.upper(int32(i)), f.Volume)
		var wrong *canopy.EnclosureError
		if errors.As(err, &wrong) {
			b.fail("fabric", f.Name, f.Line, Mismatch, wrong.WayOut, "it cannot have a volume: %s", wrong.Problem)
			return
		}
		b.s.Enclosures = append(b.s.Enclosures, e)
	}
}

// pressUp lets positive pressures push up on each of several films that close by
// themselves: their positive sides look all out or all in.
func (b *builder) pressUp() {
	for _, i := range b.closed {
		if f := &b.s.Fabrics[i]; f.Pressure != 0 {
			f.Pressure *= float64(b.upper(int32(i)))
		}
	}
}

// upper is +1 where the positive side of a fabric looks up, or towards +x, else
// +y, when it is upright, −1 where it looks the other way.
func (b *builder) upper(fabric int32) int8 {
	var sum r3.Vec
	size := 0.0
	for t, c := range b.s.Corners {
		if b.s.FabricOf[t] == fabric {
			x := b.s.Position
			a := r3.Cross(r3.Sub(x[c[1]], x[c[0]]), r3.Sub(x[c[2]], x[c[0]]))
			sum = r3.Add(sum, a)
			size += r3.Norm(a)
		}
	}
	for _, c := range [3]float64{sum.Z, sum.X, sum.Y} {
		if math.Abs(c) > 1e-6*size {
			if c < 0 {
				return -1
			}
			return 1
		}
	}
	return 1
}
