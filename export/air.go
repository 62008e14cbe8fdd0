package export

import (
	"strings"

	"anticlast/formfind/canopy"
)

// airHeader names the columns of airRows.
var airHeader = []string{"air below", "closed by", "asked m³", "encloses m³", "pressure Pa"}

// airRows say, for each volume of air that was given, what was asked and found.
func airRows(r *canopy.Result) [][]string {
	s := r.Structure
	var rows [][]string
	for i := range s.Enclosures {
		e := &s.Enclosures[i]
		var with []string
		for _, f := range e.Fabrics[1:] {
			with = append(with, oneLine(s.Fabrics[f].Name))
		}
		others := strings.Join(with, ", ")
		if others == "" {
			others = "its boundary's plane"
		}
		enclosed, pressure := "–", "–"
		if i < len(r.Summary.Enclosed) {
			enclosed = figure(zero(r.Summary.Enclosed[i]))
		}
		if i < len(r.Form.Pressure) {
			pressure = figure(zero(r.Form.Pressure[i]))
		}
		rows = append(rows, []string{oneLine(s.Fabrics[e.Fabrics[0]].Name), others, figure(e.Volume), enclosed, pressure})
	}
	return rows
}

// heldAir says what stability assumes where volumes of air were given: a bubble
// past the hemisphere would run away if a fan held its pressure instead.
func heldAir(r *canopy.Result) string {
	if len(r.Structure.Enclosures) == 0 {
		return ""
	}
	return " while the volume of air is held, not its pressure"
}

func (p *page) air(r *canopy.Result) {
	rows := airRows(r)
	if len(rows) == 0 {
		return
	}
	p.heading("Air of given volume, and the pressure found")
	p.rows(airHeader, rows[:min(len(rows), mostFabrics)], 0, 1)
	p.more(min(len(rows), mostFabrics), len(rows), "form.json")
}

func (p *report) air() {
	rows := airRows(p.r)
	if len(rows) == 0 {
		return
	}
	p.str("<p>Air of given volume. The pressure is the one at which the shape encloses what was asked; it acts outwards on all fabrics around the air.</p>\n")
	p.table(airHeader, rows, 0, 1)
}

// airDifferences compares volumes and pressures of two forms, by the name of
// the fabric above.
func airDifferences(a, b *canopy.Result, add func(group, name, unit string, va, vb float64)) {
	for _, of := range []struct {
		group, unit string
		list        func(r *canopy.Result) []float64
	}{
		{"enclosed volume", "m³", func(r *canopy.Result) []float64 { return r.Summary.Enclosed }},
		{"pressure found", "Pa", func(r *canopy.Result) []float64 { return r.Form.Pressure }},
	} {
		both(a, b, func(r *canopy.Result) *named {
			m := newNamed()
			for i := range min(len(of.list(r)), len(r.Structure.Enclosures)) {
				m.put(r.Structure.Enclosures[i].Name, of.list(r)[i])
			}
			return m
		}, func(name string, va, vb float64) { add(of.group, name, of.unit, va, vb) })
	}
}
