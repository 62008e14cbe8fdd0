package spec

import (
	"fmt"
	"strings"
)

// Reference returns the reference page of the model format in Markdown.
func Reference() string {
	var b strings.Builder
	b.WriteString("# The model file\n\n")
	fmt.Fprintf(&b, "A model file is YAML text, version %d of the format. It says what the designer wants; everything it says is checked, and all errors are reported at once with their places.\n\n", FormatVersion)
	b.WriteString("Keys and names are written exactly as here, words of one key with a space between (`force density`). Names are made of " + nameRule + ". Anchors and aliases of YAML (`&rim`, `*rim`) and merge keys (`<<`) may be used.\n\n")
	b.WriteString("## Quantities\n\nA quantity is a number with a unit: `25 kN`, `2.5 kN/m`, `600 mm`, `8 %`. A bare number has the first unit of its row. `m²` and `m^2` mean `m2`.\n\n")
	b.WriteString("| quantity | bare number | units |\n|---|---|---|\n")
	for _, d := range dimensions {
		bare := d.Bare()
		if bare == "" {
			bare = "(none)"
		}
		var u []string
		for _, x := range d.Units {
			if x.Name != "" {
				u = append(u, x.Name)
			}
		}
		fmt.Fprintf(&b, "| %s | %s | %s |\n", d.Name, bare, strings.Join(u, ", "))
	}
	b.WriteString("\nForces of cables and guys are tensions, those of masts thrusts, both positive. z is up. A mass given as a weight is multiplied by 9.80665 m/s².\n")
	for _, s := range sections() {
		title := s.id
		switch {
		case s == modelSection:
			title = "top of the file"
		case s.table:
			title += " (columns of a table)"
		}
		fmt.Fprintf(&b, "\n## %s\n\n%s\n\n", title, s.doc)
		first := "key"
		if s.table {
			first = "column"
		}
		fmt.Fprintf(&b, "| %s | value | meaning | default | example |\n|---|---|---|---|---|\n", first)
		for _, k := range s.keys {
			def := k.deflt
			if k.required {
				def = "required"
			} else if k.unless != "" {
				def = "required unless " + k.unless + " is given"
			}
			ex := "`" + k.name + ": " + k.example + "`"
			if s.table {
				ex = "`" + k.example + "`"
			}
			fmt.Fprintf(&b, "| `%s` | %s | %s | %s | %s |\n", k.name, cellText(k.shape.describe()), cellText(k.doc), cellText(def), cellText(ex))
		}
	}
	return b.String()
}

func cellText(s string) string { return strings.ReplaceAll(s, "|", `\|`) }

// describe says in a few words what a value looks like.
func (s *shape) describe() string {
	switch s.form {
	case formText:
		return "text"
	case formTexts:
		return "text, several lines allowed"
	case formVersion:
		return fmt.Sprint(FormatVersion)
	case formQuantity:
		return s.dim.Name + s.boundText()
	case formCount:
		return "whole number" + s.boundText()
	case formSwitch:
		return "true or false"
	case formWord:
		return list(s.words, "or")
	case formWords:
		return "list of " + list(s.words, "and")
	case formName:
		return "name of a " + s.thing
	case formNames:
		return "list of names of " + s.thing + "s"
	case formTriple:
		return "[x, y, z], each a " + s.dim.Name
	case formDirection:
		return "[x, y, z], bare numbers"
	case formRange:
		return "[least, greatest], each a " + s.dim.Name + s.boundText()
	case formPair:
		return "[x, y], each a " + s.dim.Name
	case formRegion:
		return "list of [x, y]"
	case formSection:
		return "mapping, see " + s.sec.id
	case formNamed:
		return fmt.Sprintf("mapping from names of %ss to: %s", s.thing, s.elem.describe())
	case formList:
		return "list of: " + s.elem.describe()
	case formTable:
		return "CSV file, rows, or CSV text; see " + s.sec.id
	case formEither:
		var of []string
		for _, o := range s.of {
			of = append(of, o.describe())
		}
		return strings.Join(of, "; or ")
	}
	return ""
}

// boundText says the bounds, in words.
func (s *shape) boundText() string {
	var parts []string
	show := func(v float64) string {
		if s.dim == nil || v == 0 {
			return fmt.Sprintf("%.6g", v)
		}
		return strings.TrimSpace(fmt.Sprintf("%.6g %s", v*s.dim.Units[0].Den/s.dim.Units[0].Num, s.dim.Bare()))
	}
	if s.lo.set {
		w := "at least "
		if s.lo.open {
			w = "above "
		}
		parts = append(parts, w+show(s.lo.v))
	}
	if s.hi.set {
		w := "at most "
		if s.hi.open {
			w = "below "
		}
		parts = append(parts, w+show(s.hi.v))
	}
	if len(parts) == 0 {
		return ""
	}
	return ", " + strings.Join(parts, ", ")
}
