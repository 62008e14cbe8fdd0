package export

import (
	"io"
	"math"
	"strings"

	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

// A Difference is one value of two forms. A value that one of them does not
// have is NaN.
type Difference struct {
	Group string  // e.g. "cable force"
	Name  string  // of the thing, "" for the whole
	Unit  string  // of A and B, in the units of files for people
	A, B  float64 // in that unit
}

// Differences lists what two forms have, side by side, things matched by name:
// heights, areas, achieved prestress, forces, lengths, sags, reactions. Rows are
// in the order of a, what only b has follows.
func Differences(a, b *canopy.Result) []Difference {
	var out []Difference
	add := func(group, name, unit string, va, vb float64) {
		if !math.IsNaN(va) || !math.IsNaN(vb) {
			out = append(out, Difference{group, name, unit, va, vb})
		}
	}
	top := func(r *canopy.Result, sign float64) float64 {
		v := math.NaN()
		each := func(z float64) {
			if math.IsNaN(v) || sign*z > sign*v {
				v = z
			}
		}
		if len(r.Structure.Corners) > 0 {
			lo, hi := heights(r)
			each(lo)
			each(hi)
			return v
		}
		for _, p := range r.Form.Position {
			each(p.Z)
		}
		return v
	}
	add("highest point", "", "m", top(a, 1), top(b, 1))
	add("lowest point", "", "m", top(a, -1), top(b, -1))
	if moved, ok := moved(a, b); ok {
		add("largest move of a node", "", "m", math.NaN(), moved)
	}
	both(a, b, func(r *canopy.Result) *named {
		m := newNamed()
		for i := range min(len(r.Summary.FabricArea), len(r.Structure.Fabrics)) {
			m.put(r.Structure.Fabrics[i].Name, r.Summary.FabricArea[i])
		}
		return m
	}, func(name string, va, vb float64) { add("fabric area", name, "m²", va, vb) })
	airDifferences(a, b, add)
	for _, of := range []struct {
		group string
		list  func(r *canopy.Result) []canopy.Spread
	}{
		{"warp achieved/specified, mean", func(r *canopy.Result) []canopy.Spread { return r.Summary.WarpAchieved }},
		{"weft achieved/specified, mean", func(r *canopy.Result) []canopy.Spread { return r.Summary.WeftAchieved }},
	} {
		both(a, b, func(r *canopy.Result) *named {
			m := newNamed()
			for i, s := range of.list(r) {
				if i < len(r.Structure.Fabrics) {
					m.put(r.Structure.Fabrics[i].Name, s.Mean)
				}
			}
			return m
		}, func(name string, va, vb float64) { add(of.group, name, "", va, vb) })
	}
	for _, of := range []struct {
		group, unit string
		value       func(c *canopy.CableReport) float64
	}{
		{"cable force, mean", "kN", func(c *canopy.CableReport) float64 { return c.ForceMean * kilo }},
		{"cable length", "m", func(c *canopy.CableReport) float64 { return c.Length }},
		{"cable sag", "m", func(c *canopy.CableReport) float64 { return c.Sag }},
	} {
		both(a, b, func(r *canopy.Result) *named {
			m := newNamed()
			for i := range min(len(r.Summary.Cables), len(r.Structure.Cables)) {
				c := &r.Structure.Cables[i]
				if of.group == "cable sag" && isStay(c.Kind) || c.Kind == canopy.KindNetCable {
					continue
				}
				m.put(label(c.Kind.String(), c.Name), of.value(&r.Summary.Cables[i]))
			}
			return m
		}, func(name string, va, vb float64) { add(of.group, name, of.unit, va, vb) })
	}
	both(a, b, func(r *canopy.Result) *named {
		m := newNamed()
		for k, l := range r.Summary.KindLength {
			if l > 0 {
				m.put(canopy.Kind(k).String(), l)
			}
		}
		return m
	}, func(name string, va, vb float64) { add("length in all", name, "m", va, vb) })
	both(a, b, func(r *canopy.Result) *named {
		m := newNamed()
		inner := innerNodes(r.Structure)
		for i, fixed := range r.Structure.Fixed {
			if name := string(r.Structure.NodeName.Bytes(i)); fixed != 0 && name != "" && !inner[i] {
				m.put(name, r3.Norm(r.Form.Reaction[i])*kilo)
			}
		}
		return m
	}, func(name string, va, vb float64) { add("reaction, size", name, "kN", va, vb) })
	return out
}

// named is a list of values by name that keeps its order.
type named struct {
	order []string
	value map[string]float64
}

func newNamed() *named { return &named{value: map[string]float64{}} }

func (n *named) put(name string, v float64) {
	if _, twice := n.value[name]; !twice {
		n.order = append(n.order, name)
	}
	n.value[name] = v
}

func (n *named) get(name string) float64 {
	if v, ok := n.value[name]; ok {
		return v
	}
	return math.NaN()
}

func both(a, b *canopy.Result, list func(*canopy.Result) *named, row func(name string, va, vb float64)) {
	la, lb := list(a), list(b)
	for _, name := range la.order {
		row(name, la.get(name), lb.get(name))
	}
	for _, name := range lb.order {
		if _, there := la.value[name]; !there {
			row(name, math.NaN(), lb.get(name))
		}
	}
}

// moved is the largest distance between the places of one node in two forms of
// the same topology.
func moved(a, b *canopy.Result) (float64, bool) {
	if !sameTopology(a, b) {
		return 0, false
	}
	most := 0.0
	for i, p := range a.Form.Position {
		most = max(most, r3.Norm(r3.Sub(b.Form.Position[i], p)))
	}
	return most, true
}

func sameTopology(a, b *canopy.Result) bool {
	s, t := a.Structure, b.Structure
	if len(s.Position) != len(t.Position) || len(s.Ends) != len(t.Ends) || len(s.Corners) != len(t.Corners) || len(s.Fabrics) != len(t.Fabrics) {
		return false
	}
	for i, e := range s.Ends {
		if t.Ends[i] != e {
			return false
		}
	}
	for i, c := range s.Corners {
		if t.Corners[i] != c || t.FabricOf[i] != s.FabricOf[i] {
			return false
		}
	}
	return true
}

// Compare writes two forms side by side, for a person.
func Compare(w io.Writer, a, b *canopy.Result, o Options) error {
	p := &page{width: o.Width, colour: o.Colour}
	if p.width <= 0 {
		p.width = 80
	}
	p.width = max(p.width, 48)
	for k, r := range []*canopy.Result{a, b} {
		verdict, style := "trusted", good
		if !r.Audit.Trusted {
			verdict, style = "NOT TRUSTED", bad
		}
		title := oneLine(r.Title)
		if title == "" {
			title = r.File
		}
		p.b.WriteString(p.paint(bold, string(rune('A'+k))) + "  " + title + ", " + p.paint(style, verdict) + "\n")
	}
	group := ""
	var rows [][]string
	flush := func() {
		if len(rows) > 0 {
			p.heading(group)
			p.rows([]string{"", "A", "B", "B − A", "change"}, rows, 0)
		}
		rows = nil
	}
	for _, d := range Differences(a, b) {
		g := d.Group
		if d.Unit != "" {
			g += ", " + d.Unit
		}
		if g != group {
			flush()
			group = g
		}
		rows = append(rows, append([]string{oneLine(d.Name)}, differenceCells(d)...))
	}
	flush()
	p.blank()
	p.wrap("", canopy.Caution)
	_, err := io.WriteString(w, strings.ReplaceAll(p.b.String(), " \n", "\n"))
	return err
}
