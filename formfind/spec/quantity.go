package spec

import (
	"fmt"
	"math"
	"strings"
)

// Dimension is a kind of quantity with the units it may be written in. The
// first unit is the one a bare number has.
type Dimension struct {
	Name  string // as in "a length"
	Units []Unit
	// Limit is the largest size that is believed, in SI units.
	limit float64
}

// Unit is a unit of measurement: a value v written in it is v·Num/Den in SI.
type Unit struct {
	Name     string
	Num, Den float64
}

// standardGravity in m/s² turns the mass of a cable or a fabric into its
// weight. Exact by definition (3rd CGPM, 1901).
const standardGravity = 9.80665

// The dimensions of the model file. Num and Den are kept apart because a
// division by 1000 is rounded once: 700 mm is 0.7 m to the last bit.
var (
	Length = &Dimension{Name: "length", limit: 1e9, Units: []Unit{
		{"m", 1, 1}, {"mm", 1, 1000}, {"cm", 1, 100}, {"km", 1000, 1},
	}}
	Force = &Dimension{Name: "force", limit: 1e15, Units: []Unit{
		{"kN", 1e3, 1}, {"N", 1, 1}, {"MN", 1e6, 1}, {"GN", 1e9, 1},
	}}
	ForcePerLength = &Dimension{Name: "force per length", limit: 1e15, Units: []Unit{
		{"kN/m", 1e3, 1}, {"N/m", 1, 1}, {"MN/m", 1e6, 1}, {"N/mm", 1e3, 1}, {"N/cm", 100, 1},
		{"N/5cm", 20, 1}, {"daN/5cm", 200, 1}, {"kN/5cm", 20000, 1},
	}}
	Weight = &Dimension{Name: "weight", limit: 1e15, Units: []Unit{
		{"kN", 1e3, 1}, {"N", 1, 1}, {"MN", 1e6, 1}, {"kg", standardGravity, 1}, {"t", 1e3 * standardGravity, 1},
	}}
	WeightPerLength = &Dimension{Name: "weight per length", limit: 1e12, Units: []Unit{
		{"kN/m", 1e3, 1}, {"N/m", 1, 1}, {"kg/m", standardGravity, 1}, {"g/m", standardGravity, 1000},
	}}
	WeightPerArea = &Dimension{Name: "weight per area", limit: 1e12, Units: []Unit{
		{"kN/m2", 1e3, 1}, {"N/m2", 1, 1}, {"kg/m2", standardGravity, 1}, {"g/m2", standardGravity, 1000},
	}}
	Pressure = &Dimension{Name: "pressure", limit: 1e12, Units: []Unit{
		{"kN/m2", 1e3, 1}, {"N/m2", 1, 1}, {"Pa", 1, 1}, {"hPa", 100, 1}, {"kPa", 1e3, 1}, {"mbar", 100, 1}, {"bar", 1e5, 1},
	}}
	Volume = &Dimension{Name: "volume", limit: 1e18, Units: []Unit{
		{"m3", 1, 1}, {"l", 1, 1000}, {"cm3", 1, 1e6},
	}}
	Ratio = &Dimension{Name: "ratio", limit: 1e9, Units: []Unit{
		{"", 1, 1}, {"%", 1, 100},
	}}
	Angle = &Dimension{Name: "angle", limit: math.Pi, Units: []Unit{
		{"deg", math.Pi, 180}, {"°", math.Pi, 180}, {"rad", 1, 1},
	}}
	// Slope is an angle that may also be written as a percentage of rise
	// over run.
	Slope = &Dimension{Name: "slope", limit: math.Pi, Units: []Unit{
		{"deg", math.Pi, 180}, {"°", math.Pi, 180}, {"%", 1, 100}, {"rad", 1, 1},
	}}
)

var dimensions = []*Dimension{Length, Force, ForcePerLength, Weight, WeightPerLength, WeightPerArea, Pressure, Volume, Ratio, Angle, Slope}

// Bare names the unit of a number without one: "m", "kN", "" for a ratio.
func (d *Dimension) Bare() string { return d.Units[0].Name }

// unitNames lists the units for messages.
func (d *Dimension) unitNames() string {
	var names []string
	for _, u := range d.Units {
		if u.Name != "" {
			names = append(names, u.Name)
		}
	}
	return list(names, "or")
}

// find returns the unit with the given (tidied) name.
func (d *Dimension) find(name string) (Unit, bool) {
	if name == "" {
		return d.Units[0], true
	}
	for _, u := range d.Units {
		if u.Name == name {
			return u, true
		}
	}
	return Unit{}, false
}

var unitTidy = strings.NewReplacer(" /", "/", "/ ", "/", "5 cm", "5cm", "²", "2", "³", "3", "^2", "2", "^3", "3", "**2", "2", "º", "°", "degrees", "deg", "degree", "deg", "percent", "%")

// value turns v in unit u to SI.
func (d *Dimension) value(v float64, u Unit) float64 {
	if d == Slope && u.Name == "%" {
		return math.Atan(v / 100)
	}
	return v * u.Num / u.Den
}

// complaint is what is wrong with a text, and the way out.
type complaint struct{ message, hint string }

func (c *complaint) Error() string {
	if c.hint == "" {
		return c.message
	}
	return c.message + "; " + c.hint
}

// ParseQuantity reads text such as "25 kN", "600mm" or "8 %" as a quantity of
// dimension d and returns it in SI units. A bare number has the unit d.Bare().
func ParseQuantity(text string, d *Dimension) (float64, error) {
	v, c := parseQuantity(text, d)
	if c != nil {
		return 0, c
	}
	return v, nil
}

func parseQuantity(text string, d *Dimension) (float64, *complaint) {
	t := strings.TrimSpace(text)
	v, unitText, c := splitQuantity(t)
	if c != nil {
		if c.hint == "" {
			c.hint = "give " + d.example()
		}
		return 0, c
	}
	unit, c := d.parseUnit(unitText, text)
	if c != nil {
		return 0, c
	}
	si := d.value(v, unit)
	if !finite(si) || math.Abs(si) > d.limit {
		return 0, &complaint{fmt.Sprintf("%q is out of any reasonable size for a %s", clip(text), d.Name), "give " + d.example()}
	}
	return si, nil
}

// parseUnit finds the unit named unitText, which came from text.
func (d *Dimension) parseUnit(unitText, text string) (Unit, *complaint) {
	name := unitTidy.Replace(unitText)
	if u, ok := d.find(name); ok {
		return u, nil
	}
	expected := "a " + d.Name + " is written in " + d.unitNames()
	if d == Ratio {
		expected = "a ratio is a bare number or has %"
	}
	// A unit of something else?
	for _, other := range dimensions {
		if _, ok := other.find(name); ok {
			return Unit{}, &complaint{fmt.Sprintf("%q is a %s, not a %s", clip(text), other.Name, d.Name), expected}
		}
	}
	var names []string
	for _, u := range d.Units {
		names = append(names, u.Name)
	}
	if near := nearest(name, names); near != "" {
		return Unit{}, &complaint{fmt.Sprintf("unknown unit %q in %q", clip(unitText), clip(text)), fmt.Sprintf("did you mean %q?", near)}
	}
	return Unit{}, &complaint{fmt.Sprintf("unknown unit %q in %q", clip(unitText), clip(text)), expected}
}

// example shows how a quantity of dimension d is written.
func (d *Dimension) example() string {
	switch d {
	case Ratio:
		return "a number such as 0.1 or 10 %"
	case Angle, Slope:
		return "a number of degrees such as 3 deg"
	}
	return fmt.Sprintf("a %s such as 2.5 %s", d.Name, d.Bare())
}

// splitQuantity reads the number at the start of t; the rest is the unit.
func splitQuantity(t string) (v float64, unit string, c *complaint) {
	bad := func(message, hint string) (float64, string, *complaint) {
		return 0, "", &complaint{message, hint}
	}
	quoted := fmt.Sprintf("%q", clip(t))
	v, n := scanNumber([]byte(t))
	if n == 0 {
		switch l := strings.TrimLeft(strings.ToLower(t), "+-."); {
		case t == "":
			return bad("no value", "")
		case l == "nan" || l == "inf" || l == "infinity":
			return bad(quoted+" is not a finite number", "")
		case strings.HasPrefix(t, "−") || strings.HasPrefix(t, "–"):
			return bad(quoted+" starts with a dash that is not a minus sign", "write - for minus")
		case strings.HasPrefix(t, ",") && len(t) > 1:
			return bad(quoted+" is not a number", "write a decimal point: "+clip("0."+t[1:]))
		}
		return bad(quoted+" is not a number", "")
	}
	if !finite(v) {
		return bad(quoted+" is not a finite number", "")
	}
	rest := t[n:]
	if d := strings.TrimLeft(t[:n], "+-"); len(d) > 1 && d[0] == '0' && d[1] >= '0' && d[1] <= '9' {
		return bad(quoted+" has a leading zero, which some programs read as an octal number", "write "+clip(strings.TrimLeft(d, "0")+rest))
	}
	if rest != "" {
		next := byte(0)
		if len(rest) > 1 {
			next = rest[1]
		}
		digit := next >= '0' && next <= '9'
		switch {
		case rest[0] == ',' && digit:
			return bad(quoted+" has a comma in its number", "write a decimal point, and no thousands separators: "+clip(t[:n]+"."+rest[1:]))
		case (rest[0] == '_' || rest[0] == '\'') && digit:
			return bad(quoted+" has its digits grouped", "write "+clip(strings.NewReplacer("_", "", "'", "").Replace(t)))
		case rest[0] == ':' && digit:
			return bad(quoted+" is not a decimal number", "write degrees and lengths as decimals: 1.5")
		case rest[0] == '.' || digit && rest[0] == ' ':
			return bad(quoted+" is not one number", "")
		case (rest[0] == 'x' || rest[0] == 'o' || rest[0] == 'b') && digit:
			return bad(quoted+" is not a decimal number", "write it with decimal digits")
		}
	}
	return v, strings.TrimSpace(rest), nil
}
