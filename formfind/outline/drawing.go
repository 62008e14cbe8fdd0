package outline

import (
	"fmt"
	"math"
	"sort"
	"strconv"

	"gonum.org/v1/gonum/spatial/r3"
)

// Unit is a unit of length in which drawings are made.
type Unit struct {
	Name   string
	Metres float64 // length of one unit
}

// Units that a drawing may have. The inch is 25.4 mm exactly (ISO 31-1 annex A).
var units = []Unit{{"mm", 1e-3}, {"cm", 1e-2}, {"dm", 1e-1}, {"m", 1}, {"km", 1e3}, {"in", 0.0254}, {"ft", 0.3048}}

// ParseUnit returns the unit of that name.
func ParseUnit(name string) (Unit, bool) {
	for _, u := range units {
		if u.Name == name {
			return u, true
		}
	}
	return Unit{}, false
}

// UnitNames lists the names of all units of drawings.
func UnitNames() []string {
	var n []string
	for _, u := range units {
		n = append(n, u.Name)
	}
	return n
}

// Drawing is what a file shows, in its own unit.
type Drawing struct {
	// Unit is the one the file states; the zero Unit when it states none.
	Unit     Unit
	Segments []Segment
	Points   []Mark
	Ignored  []Ignored  // in the order of their kinds, then layers
	Replaced []Replaced // in the order of their layers
	Faults   []Fault    // what could not be read
}

// Segment is a straight line or a circular arc.
type Segment struct {
	Layer string
	Path  int // segments of one entity have one number, counted up through the file
	A, B  r3.Vec
	// Arc says that it is the circular arc from A to B through Through.
	Arc     bool
	Through r3.Vec
	Line    int // of the entity in the file
}

// Mark is a single point.
type Mark struct {
	Layer string
	At    r3.Vec
	Line  int
}

// Ignored counts entities of a kind on a layer that are not read.
type Ignored struct {
	Kind  string
	Layer string
	Count int
	Line  int // of the first
}

// Fault is something wrong or doubtful in a drawing.
type Fault struct {
	Line    int // in the file, 0 = the file as a whole
	Warning bool
	Message string
	Hint    string
}

// String gives the message, with the line in front.
func (f Fault) String() string {
	s := f.Message
	if f.Line > 0 {
		s = "line " + strconv.Itoa(f.Line) + ": " + s
	}
	if f.Hint != "" {
		s += "; " + f.Hint
	}
	return s
}

// Limits of what is read, so that no file can keep the reader busy.
const (
	maxFaults   = 50
	maxEntities = 1_000_000
	maxValue    = 1e12 // greatest coordinate
)

func (d *Drawing) fail(line int, hint, format string, args ...any) {
	if len(d.Faults) < maxFaults {
		d.Faults = append(d.Faults, Fault{Line: line, Message: fmt.Sprintf(format, args...), Hint: hint})
	}
}

// Layers lists the layers in use in the order of their names.
func (d *Drawing) Layers() []string {
	seen := map[string]bool{}
	for _, s := range d.Segments {
		seen[s.Layer] = true
	}
	for _, p := range d.Points {
		seen[p.Layer] = true
	}
	out := make([]string, 0, len(seen))
	for n := range seen {
		out = append(out, n)
	}
	sort.Strings(out)
	return out
}

// Scale turns a drawing in the given unit into one in metres.
func (d *Drawing) Scale(u Unit) {
	k := u.Metres
	for i := range d.Segments {
		s := &d.Segments[i]
		s.A, s.B, s.Through = r3.Scale(k, s.A), r3.Scale(k, s.B), r3.Scale(k, s.Through)
	}
	for i := range d.Points {
		d.Points[i].At = r3.Scale(k, d.Points[i].At)
	}
}

func usable(v ...float64) bool {
	for _, x := range v {
		if math.IsNaN(x) || math.Abs(x) > maxValue {
			return false
		}
	}
	return true
}
