package formfile

import (
	"fmt"
	"math"
	"slices"

	"anticlast/formfind/canopy"
)

// writeAir writes the volumes of air that were given and the pressures found.
func writeAir(t *text, r *canopy.Result) {
	s := r.Structure
	t.open('[')
	for i := range s.Enclosures {
		e := &s.Enclosures[i]
		t.open('{')
		t.k("name").string(e.Name)
		names, sides := make([]string, len(e.Fabrics)), make([]int32, len(e.Fabrics))
		for k, f := range e.Fabrics {
			names[k], sides[k] = s.Fabrics[f].Name, int32(e.Side[k])
		}
		t.k("fabrics").strings(names)
		t.k("sides").ints(sides)
		t.k("base").integer(int(e.Base))
		t.k("volume").number(e.Volume)
		t.k("enclosed")
		if i < len(r.Summary.Enclosed) {
			t.known(r.Summary.Enclosed[i])
		} else {
			t.null()
		}
		t.k("pressure")
		if i < len(r.Form.Pressure) {
			t.number(r.Form.Pressure[i])
		} else {
			t.number(0)
		}
		t.close('}')
	}
	t.close(']')
}

// readAir reads them; the names of fabrics are resolved at the end.
func (d *reader) readAir() error {
	s, f := d.result.Structure, d.result.Form
	return d.array(func(i int) error {
		d.item = i
		var e canopy.Enclosure
		var names []string
		var sides []int32
		pressure, enclosed := 0.0, math.NaN()
		var seen fields
		err := d.object(func(key []byte) error {
			switch string(key) {
			case "name":
				seen |= 1
				return d.setString(&e.Name)
			case "fabrics":
				seen |= 2
				return d.setStrings(&names)
			case "sides":
				seen |= 4
				return d.array(func(int) error {
					var v float64
					if err := d.setNumber(&v); err != nil {
						return err
					}
					if v != 1 && v != -1 {
						return d.errorf("a side is 1 or -1, not %g", v)
					}
					sides = append(sides, int32(v))
					return nil
				})
			case "base":
				seen |= 8
				return d.setIndex(&e.Base)
			case "volume":
				seen |= 16
				return d.setNumber(&e.Volume)
			case "enclosed":
				return d.setKnown(&enclosed)
			case "pressure":
				seen |= 32
				return d.setNumber(&pressure)
			}
			return d.skip()
		})
		if err != nil {
			return err
		}
		if err := d.want(seen, "name", "fabrics", "sides", "base", "volume", "pressure"); err != nil {
			return err
		}
		for _, v := range sides {
			e.Side = append(e.Side, int8(v))
		}
		s.Enclosures = append(s.Enclosures, e)
		d.airFabrics = append(d.airFabrics, names)
		f.Pressure = append(f.Pressure, pressure)
		d.result.Summary.Enclosed = append(d.result.Summary.Enclosed, enclosed)
		return nil
	})
}

// joinAir turns the names of fabrics around air into numbers.
func (d *reader) joinAir(byName map[string]int32) error {
	s := d.result.Structure
	for i := range s.Enclosures {
		e := &s.Enclosures[i]
		for _, name := range d.airFabrics[i] {
			k, ok := byName[name]
			if !ok {
				return d.errorf("air %d: fabric %.40q is not in the list of fabrics", i, name)
			}
			e.Fabrics = append(e.Fabrics, k)
		}
	}
	return nil
}

// airReferences checks the indices of enclosures.
func airReferences(s *canopy.Structure, fail func(what string, i int, problem string) error) error {
	for i := range s.Enclosures {
		e := &s.Enclosures[i]
		if len(e.Fabrics) == 0 || len(e.Side) != len(e.Fabrics) {
			return fail("air", i, fmt.Sprintf("%d fabrics need as many sides, not %d", len(e.Fabrics), len(e.Side)))
		}
		for _, f := range e.Fabrics {
			if f < 0 || int(f) >= len(s.Fabrics) {
				return fail("air", i, fmt.Sprintf("fabric %d does not exist", f))
			}
		}
		for k, f := range e.Fabrics {
			if slices.Contains(e.Fabrics[:k], f) {
				return fail("air", i, fmt.Sprintf("fabric %q is named twice", s.Fabrics[f].Name))
			}
		}
		if e.Base < 0 || int(e.Base) >= len(s.Position) {
			return fail("air", i, fmt.Sprintf("node %d does not exist (%d nodes)", e.Base, len(s.Position)))
		}
	}
	return nil
}
