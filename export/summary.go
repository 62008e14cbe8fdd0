package export

import (
	"cmp"
	"context"
	"fmt"
	"io"
	"math"
	"slices"
	"strings"
	"unicode/utf8"

	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

func writeSummary(ctx context.Context, w io.Writer, r *canopy.Result, o Options) error {
	if err := ctx.Err(); err != nil {
		return err
	}
	o.Colour = false // a file
	return Summary(w, r, o)
}

// Rows of each part of the summary: it is read in ten seconds, the tables have
// the rest.
const (
	mostFabrics   = 6
	mostCables    = 12
	mostStays     = 10
	mostReactions = 5
	mostFindings  = 8
)

// Summary writes what was found, for a person to read in ten seconds: prestress
// achieved against specified, cable forces, the largest reactions, areas and
// lengths, whether the audit trusts it and why not, findings and the caution.
func Summary(w io.Writer, r *canopy.Result, o Options) error {
	p := &page{width: o.Width, colour: o.Colour}
	if p.width <= 0 {
		p.width = 80
	}
	p.width = max(p.width, 48)
	p.head(r)
	p.fabrics(r)
	p.air(r)
	p.cables(r)
	p.stays(r)
	p.lines(r)
	p.lengths(r)
	p.reactions(r)
	p.audit(r)
	p.findings(r)
	p.blank()
	p.wrap("", canopy.Caution)
	_, err := io.WriteString(w, p.b.String())
	return err
}

// page gathers the text of a summary.
type page struct {
	b      strings.Builder
	width  int
	colour bool
}

// Terminal colours, by meaning.
const (
	bold  = "1"
	good  = "32"
	bad   = "1;31"
	doubt = "33"
	faint = "2"
)

func (p *page) paint(style, s string) string {
	if !p.colour || style == "" || s == "" {
		return s
	}
	return "\x1b[" + style + "m" + s + "\x1b[0m"
}

func (p *page) blank() { p.b.WriteByte('\n') }

func (p *page) heading(s string) {
	p.blank()
	inner := page{width: p.width}
	inner.wrap("", s)
	for line := range strings.Lines(inner.b.String()) {
		p.b.WriteString(p.paint(bold, strings.TrimSuffix(line, "\n")) + "\n")
	}
}

// wrap writes words in lines of the page's width, later lines indented.
func (p *page) wrap(indent, s string) {
	column := 0
	for i, word := range strings.Fields(s) {
		n := utf8.RuneCountInString(word)
		switch {
		case i == 0:
			p.b.WriteString(indent)
			column = len(indent)
		case column+1+n > p.width:
			p.b.WriteString("\n" + indent)
			column = len(indent)
		default:
			p.b.WriteByte(' ')
			column++
		}
		p.b.WriteString(word)
		column += n
	}
	p.blank()
}

// rows writes lines of cells in columns as wide as their widest cell. Cells of
// the columns named in left stand at the left, others at the right. What is
// wider than the page loses its last columns.
func (p *page) rows(header []string, rows [][]string, left ...int) {
	widths := make([]int, len(header))
	for _, row := range append([][]string{header}, rows...) {
		for i, c := range row {
			widths[i] = max(widths[i], utf8.RuneCountInString(c))
		}
	}
	columns, total := 0, 0
	for _, w := range widths {
		if total += 2 + w; total > p.width && columns > 1 {
			break
		}
		columns++
	}
	line := func(row []string, style string) {
		var b strings.Builder
		for i, c := range row[:columns] {
			b.WriteString("  ")
			pad := strings.Repeat(" ", widths[i]-utf8.RuneCountInString(c))
			if slices.Contains(left, i) {
				b.WriteString(c + pad)
			} else {
				b.WriteString(pad + c)
			}
		}
		p.b.WriteString(p.paint(style, strings.TrimRight(b.String(), " ")) + "\n")
	}
	line(header, faint)
	for _, row := range rows {
		line(row, "")
	}
}

func (p *page) more(shown, all int, where string) {
	if all > shown {
		fmt.Fprintf(&p.b, "  … and %d more in %s\n", all-shown, where)
	}
}

func (p *page) head(r *canopy.Result) {
	title := r.Title
	if title == "" {
		title = r.File
	}
	if title != "" {
		p.b.WriteString(p.paint(bold, oneLine(title)) + "\n")
	}
	if r.Audit.Trusted {
		p.b.WriteString(p.paint(good, "Found in equilibrium; the audit trusts it.") + "\n")
	} else {
		if len(r.Audit.Reasons) == 0 {
			p.b.WriteString(p.paint(bad, "NOT TRUSTED: no audit was made.") + "\n")
		} else {
			p.b.WriteString(p.paint(bad, "NOT TRUSTED. The audit says:") + "\n")
		}
		for _, reason := range r.Audit.Reasons {
			p.item("- ", reason)
		}
	}
	s := r.Structure
	var parts []string
	for _, c := range []struct {
		n    int
		what string
	}{{len(s.Position), "node"}, {len(s.Ends), "member"}, {len(s.Corners), "triangle"}} {
		if c.n > 0 {
			parts = append(parts, plural(c.n, c.what))
		}
	}
	line := strings.Join(parts, ", ")
	if len(r.Program.Engines) > 0 {
		line += "; engines: " + strings.Join(r.Program.Engines, ", ")
	}
	if line != "" {
		p.wrap("", line)
	}
}

// item writes a paragraph with a mark in front of its first line.
func (p *page) item(mark, s string) {
	inner := page{width: p.width - 2}
	inner.wrap(strings.Repeat(" ", utf8.RuneCountInString(mark)), s)
	text := inner.b.String()
	p.b.WriteString("  " + mark + strings.ReplaceAll(strings.TrimSuffix(strings.TrimLeft(text, " "), "\n"), "\n", "\n  ") + "\n")
}

func oneLine(s string) string { return strings.Join(strings.Fields(s), " ") }

func plural(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return thousands(n) + " " + what + "s"
}

func thousands(n int) string {
	s := fmt.Sprint(n)
	for i := len(s) - 3; i > 0; i -= 3 {
		s = s[:i] + "," + s[i:]
	}
	return s
}

// Numbers with the digits that a person wants.

// figure writes v with four significant digits and no exponent.
func figure(v float64) string {
	if math.IsNaN(v) {
		return "–"
	}
	a := math.Abs(v)
	switch {
	case a >= 999.95:
		return fmt.Sprintf("%.0f", v)
	case a >= 99.995:
		return fmt.Sprintf("%.1f", v)
	case a >= 0.00005 || v == 0:
		return fmt.Sprintf("%.2f", v)
	}
	return fmt.Sprintf("%.1e", v)
}

func kN(v float64) string { return figure(zero(v * kilo)) }

// zero turns noise of less than half of the last digit shown into 0.
func zero(v float64) float64 {
	if math.Abs(v) < 0.005 {
		return 0
	}
	return v
}

func share(v float64) string {
	if math.IsNaN(v) {
		return "–"
	}
	return fmt.Sprintf("%.3f", v)
}

func percent(v float64) string {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return "–"
	}
	return fmt.Sprintf("%.1f %%", 100*v)
}

func tiny(v float64) string {
	if math.IsNaN(v) {
		return "not known"
	}
	return fmt.Sprintf("%.1e", v)
}

// spreadText shows the 5 % to 95 % range around the mean.
func spreadText(s []canopy.Spread, i int) string {
	if i >= len(s) || math.IsNaN(s[i].Mean) {
		return "–"
	}
	return fmt.Sprintf("%s (%s … %s)", share(s[i].Mean), share(s[i].P5), share(s[i].P95))
}

// specifiedRange is the range of the specified stresses of each fabric, in warp
// and weft.
func specifiedRange(s *canopy.Structure) (lo, hi [][2]float64) {
	lo, hi = make([][2]float64, len(s.Fabrics)), make([][2]float64, len(s.Fabrics))
	for i := range lo {
		lo[i] = [2]float64{math.Inf(1), math.Inf(1)}
		hi[i] = [2]float64{math.Inf(-1), math.Inf(-1)}
	}
	for i, f := range s.FabricOf {
		for k, v := range s.Stress[i] {
			lo[f][k], hi[f][k] = min(lo[f][k], v), max(hi[f][k], v)
		}
	}
	return lo, hi
}

func (p *page) fabrics(r *canopy.Result) {
	s, q := r.Structure, &r.Summary
	if len(s.Fabrics) == 0 || len(s.Corners) == 0 {
		return
	}
	area := 0.0
	for _, a := range q.FabricArea {
		area += a
	}
	p.heading(fmt.Sprintf("Fabric, %s m²: achieved over specified prestress, mean (5 %% … 95 %%)", figure(area)))
	lo, hi := specifiedRange(s)
	specified := func(i, k int) string {
		if lo[i][k] > hi[i][k] {
			return "–"
		}
		if lo[i][k] == hi[i][k] {
			return kN(lo[i][k])
		}
		return kN(lo[i][k]) + "–" + kN(hi[i][k])
	}
	header := []string{"fabric", "area m²", "specified kN/m", "warp", "weft"}
	ratio, utilised := false, false
	for i := range q.FabricArea {
		ratio = ratio || i < len(lo) && lo[i][0] != lo[i][1]
		utilised = utilised || i < len(q.FabricUtilisation) && q.FabricUtilisation[i] > 0
	}
	if utilised {
		header = append(header, "utilisation*")
	}
	if ratio {
		header = append(header, "warp:weft / nominal")
	}
	var rows [][]string
	for i := range min(len(q.FabricArea), len(s.Fabrics), mostFabrics) {
		row := []string{oneLine(s.Fabrics[i].Name), figure(q.FabricArea[i]),
			specified(i, 0) + " / " + specified(i, 1),
			spreadText(q.WarpAchieved, i), spreadText(q.WeftAchieved, i)}
		if utilised {
			row = append(row, utilisationText(at(q.FabricUtilisation, i)))
		}
		if ratio {
			row = append(row, spreadText(q.Ratio, i))
		}
		rows = append(rows, row)
	}
	p.rows(header, rows, 0)
	p.more(len(rows), len(q.FabricArea), "form.json")
	if utilised {
		p.b.WriteString("  * prestress only, no load cases\n")
	}
}

func at(v []float64, i int) float64 {
	if i < len(v) {
		return v[i]
	}
	return 0
}

func utilisationText(v float64) string {
	if v == 0 || math.IsNaN(v) {
		return "–"
	}
	return percent(v)
}

func isStay(k canopy.Kind) bool {
	return k == canopy.KindMast || k == canopy.KindGuy || k == canopy.KindStrut
}

func (p *page) cables(r *canopy.Result) {
	s, q := r.Structure, &r.Summary
	var chains, nets []int
	for i := range min(len(q.Cables), len(s.Cables)) {
		switch k := s.Cables[i].Kind; {
		case isStay(k):
		case k == canopy.KindNetCable:
			nets = append(nets, i)
		default:
			chains = append(chains, i)
		}
	}
	if len(chains) > 0 {
		p.heading("Cables")
		header := []string{"cable", "kind", "length m", "sag/chord", "force kN", "unevenness"}
		utilised := slices.ContainsFunc(chains, func(i int) bool { return q.Cables[i].Utilisation > 0 })
		if utilised {
			header = append(header, "utilisation*")
		}
		// The most loaded first when not all can be shown.
		shown := chains
		if len(shown) > mostCables+3 { // three more are shown before they are counted
			shown = slices.Clone(chains)
			slices.SortStableFunc(shown, func(a, b int) int { return cmp.Compare(q.Cables[b].ForceMax, q.Cables[a].ForceMax) })
			shown = shown[:mostCables]
		}
		var rows [][]string
		for _, i := range shown {
			c := &q.Cables[i]
			row := []string{oneLine(s.Cables[i].Name), s.Cables[i].Kind.String(), figure(c.Length),
				percent(ratio(c.Sag, c.Chord)), rangeText(c.ForceMin, c.ForceMax), percent(c.Evenness)}
			if utilised {
				row = append(row, utilisationText(c.Utilisation))
			}
			rows = append(rows, row)
		}
		p.rows(header, rows, 0, 1)
		p.more(len(rows), len(chains), "form.json")
		if utilised {
			p.b.WriteString("  * prestress only, no load cases\n")
		}
	}
	if len(nets) > 0 || len(s.Cables) == 0 && len(s.Corners) == 0 {
		p.net(r)
	}
}

// net tells the forces of the net cables together.
func (p *page) net(r *canopy.Result) {
	s := r.Structure
	lo, hi, n := math.Inf(1), math.Inf(-1), 0
	for i, k := range s.Kind {
		if k == canopy.KindNetCable || len(s.Cables) == 0 && !isStay(k) {
			lo, hi = min(lo, r.Form.Force[i]), max(hi, r.Form.Force[i])
			n++
		}
	}
	if n > 0 {
		p.heading("Net")
		fmt.Fprintf(&p.b, "  %s, forces %s kN\n", plural(n, "member"), rangeText(lo, hi))
	}
}

func rangeText(lo, hi float64) string {
	a, b := kN(lo), kN(hi)
	if a == b {
		return a
	}
	return a + " … " + b
}

func (p *page) stays(r *canopy.Result) {
	s, f := r.Structure, r.Form
	var rows [][]string
	count := 0
	for i, k := range s.Kind {
		if !isStay(k) {
			continue
		}
		if count++; count > mostStays {
			continue
		}
		name := s.MemberName.At(i)
		if c := cableOf(s, i); c >= 0 && s.Cables[c].Name != "" {
			name = s.Cables[c].Name
		}
		force := kN(f.Force[i]) + " tension"
		if f.Force[i] < 0 {
			force = kN(-f.Force[i]) + " compression"
		}
		rows = append(rows, []string{oneLine(name), k.String(), figure(memberLength(r, i)), force})
	}
	if count == 0 {
		return
	}
	p.heading("Masts, guys and struts")
	p.rows([]string{"name", "kind", "length m", "force kN"}, rows, 0, 1, 3)
	p.more(len(rows), count, "members.csv")
}

func (p *page) lines(r *canopy.Result) {
	s, q := r.Structure, &r.Summary
	var rows [][]string
	count := 0
	for i := range min(len(q.Lines), len(s.Lines)) {
		if s.Lines[i].Role == "seam" {
			continue
		}
		if count++; count > mostStays {
			continue
		}
		l := &q.Lines[i]
		rows = append(rows, []string{oneLine(s.Lines[i].Name), s.Lines[i].Role, figure(l.Length),
			fmt.Sprintf("%s (%s)", kN(l.Mean), rangeText(l.Min, l.Max)), kN(r3.Norm(l.Total))})
	}
	if count == 0 {
		return
	}
	p.heading("Fixed lines")
	p.rows([]string{"line", "role", "length m", "reaction kN/m", "total kN"}, rows, 0, 1)
	p.more(len(rows), count, "form.json")
}

func (p *page) lengths(r *canopy.Result) {
	var parts []string
	for k, l := range r.Summary.KindLength {
		if l > 0 {
			parts = append(parts, fmt.Sprintf("%s %s m", canopy.Kind(k), figure(l)))
		}
	}
	if len(parts) > 0 {
		p.heading("Lengths")
		p.wrap("  ", strings.Join(parts, ", "))
	}
}

func (p *page) reactions(r *canopy.Result) {
	s, f := r.Structure, r.Form
	// The largest few without sorting all.
	var top []int
	count := 0
	for i, fixed := range s.Fixed {
		if fixed == 0 {
			continue
		}
		count++
		at, _ := slices.BinarySearchFunc(top, i, func(a, b int) int {
			return cmp.Or(cmp.Compare(r3.Norm(f.Reaction[b]), r3.Norm(f.Reaction[a])), cmp.Compare(a, b))
		})
		if at < mostReactions {
			top = slices.Insert(top, at, i)
			top = top[:min(len(top), mostReactions)]
		}
	}
	if count == 0 {
		return
	}
	p.heading("Largest reactions (support on structure; foundations feel the opposite)")
	lines := lineOf(s)
	var rows [][]string
	for _, i := range top {
		name := s.NodeName.At(i)
		if l, ok := lines[int32(i)]; ok && len(s.NodeName.Bytes(i)) == 0 {
			name += " on " + s.Lines[l].Name
		}
		v := f.Reaction[i]
		rows = append(rows, []string{oneLine(name), kN(r3.Norm(v)), kN(v.X), kN(v.Y), kN(v.Z)})
	}
	p.rows([]string{"node", "size kN", "x kN", "y kN", "z kN"}, rows, 0)
	p.more(len(rows), count, "reactions.csv")
}

func (p *page) audit(r *canopy.Result) {
	a := &r.Audit
	p.heading("Audit")
	p.wrap("  ", fmt.Sprintf("largest nodal residual %s of the forces meeting there; reactions balance to %s (moments %s); virial identity to %s",
		tiny(a.ResidualLargest), tiny(a.ForceBalance), tiny(a.MomentBalance), tiny(a.Virial)))
	switch {
	case !a.StabilityKnown:
		note := a.StabilityNote
		if note == "" {
			note = "not known"
		}
		p.wrap("  ", "stability: "+note)
	case a.Unstable > 0:
		p.wrap("  ", fmt.Sprintf("UNSTABLE in %s", plural(a.Unstable, "direction")))
	case math.IsNaN(a.Softest):
		p.wrap("  ", "stable"+heldAir(r))
	default:
		p.wrap("  ", fmt.Sprintf("stable%s, firmness %s (0 would be on the brink)", heldAir(r), figure(a.Softest)))
	}
	if len(r.Structure.Corners) > 0 && a.MinAngle > 0 {
		line := fmt.Sprintf("smallest mesh angle %.1f°", degrees(a.MinAngle))
		switch {
		case math.IsNaN(a.Discretisation):
			line += "; how far a finer mesh would move the surface was not judged"
		case a.Discretisation > 0:
			line += fmt.Sprintf("; a finer mesh would move the surface by about %s of its size", tiny(a.Discretisation))
		}
		p.wrap("  ", line)
	}
}

func (p *page) findings(r *canopy.Result) {
	if len(r.Findings) == 0 {
		return
	}
	p.heading("Findings")
	order := make([]int, len(r.Findings))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int { return cmp.Compare(r.Findings[b].Severity, r.Findings[a].Severity) })
	for n, i := range order {
		if n == mostFindings {
			p.more(n, len(order), "form.json")
			break
		}
		f := &r.Findings[i]
		style := map[canopy.Severity]string{canopy.Broken: bad, canopy.Warning: doubt}[f.Severity]
		text := f.Text
		if f.Source != "" {
			text += " [" + f.Source + "]"
		}
		if len(f.Places) > 0 {
			var places []string
			for _, pl := range f.Places[:min(3, len(f.Places))] {
				places = append(places, pl.Kind+" "+pl.Name)
			}
			text += " At " + strings.Join(places, ", ")
			if n := max(f.Count, len(f.Places)) - len(places); n > 0 {
				text += fmt.Sprintf(" and %d more", n)
			}
			text += "."
		}
		mark := f.Severity.String() + ": "
		before := p.b.Len()
		p.item(mark, text)
		if style != "" && p.colour {
			s := p.b.String()
			p.b.Reset()
			p.b.WriteString(s[:before] + strings.Replace(s[before:], mark, p.paint(style, mark), 1))
		}
	}
}
