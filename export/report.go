package export

import (
	"context"
	_ "embed"
	"encoding/base64"
	"encoding/binary"
	"encoding/json"
	"fmt"
	"io"
	"math"
	"slices"
	"strings"

	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

//go:embed report.css
var reportStyle string

//go:embed report.js
var reportScript string

// Numbers of triangles and of members up to which the report has a live view,
// and of rows up to which it has a table.
const (
	mostLive        = 200000
	mostLiveMembers = 20000
	mostRows        = 400
)

// writeReport writes one page of HTML that needs nothing else: what was asked
// and found, drawings, a live view, tables, findings and the audit in words.
// Without scripts a drawing stands in the place of the live view.
func writeReport(ctx context.Context, w io.Writer, r *canopy.Result, o Options) error {
	p := &report{newText(ctx, w), r}
	p.str("<!doctype html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\">\n<meta name=\"viewport\" content=\"width=device-width, initial-scale=1\">\n")
	// Nothing is loaded from anywhere.
	p.str(`<meta http-equiv="Content-Security-Policy" content="default-src 'none'; style-src 'unsafe-inline'; script-src 'unsafe-inline'; img-src data:">` + "\n")
	p.str("<link rel=\"icon\" href=\"data:,\">\n<title>").str(escape(p.title())).str("</title>\n<style>" + reportStyle + drawingStyle + "</style>\n</head>\n<body>\n<main>\n")
	p.head()
	p.found()
	if err := ctx.Err(); err != nil {
		return err
	}
	live := p.drawings(o)
	p.histogram()
	p.cables()
	p.stays()
	p.reactions()
	p.findings()
	p.audit()
	p.how()
	p.str("<p class=\"caution\">").str(escape(canopy.Caution)).str("</p>\n</main>\n")
	if live {
		p.script()
	}
	p.str("</body>\n</html>\n")
	return p.close()
}

type report struct {
	*text
	r *canopy.Result
}

func (p *report) title() string {
	for _, s := range []string{p.r.Title, p.r.File} {
		if s != "" {
			return oneLine(s)
		}
	}
	return "Form"
}

func (p *report) heading(s string) { p.str("<h2>").str(escape(s)).str("</h2>\n") }

func (p *report) head() {
	r := p.r
	p.str("<h1>").str(escape(p.title())).str("</h1>\n")
	if r.Audit.Trusted {
		p.str("<p class=\"verdict good\">✓ Found in equilibrium; the audit trusts it.</p>\n")
	} else {
		p.str("<p class=\"verdict bad\">✗ Not trusted.</p>\n")
		if len(r.Audit.Reasons) > 0 {
			p.str("<ul class=\"bad\">\n")
			for _, reason := range r.Audit.Reasons {
				p.str("<li>").str(escape(reason)).str("</li>\n")
			}
			p.str("</ul>\n")
		}
	}
	p.str("<p class=\"caution\">").str(escape(canopy.Caution)).str("</p>\n")
}

// table writes a table; the columns in left hold words.
func (p *report) table(header []string, rows [][]string, left ...int) {
	if len(rows) == 0 {
		return
	}
	class := func(i int) string {
		if slices.Contains(left, i) {
			return " class=\"t\""
		}
		return ""
	}
	p.str("<div class=\"scroll\"><table>\n<thead><tr>")
	for i, h := range header {
		p.str("<th scope=\"col\"" + class(i) + ">").str(escape(h)).str("</th>")
	}
	p.str("</tr></thead>\n<tbody>\n")
	for _, row := range rows {
		p.str("<tr>")
		for i, c := range row {
			p.str("<td" + class(i) + ">").str(escape(c)).str("</td>")
		}
		p.str("</tr>")
		p.line()
	}
	p.str("</tbody></table></div>\n")
}

// folded writes a table of which only the first rows are open.
func (p *report) folded(most int, header []string, rows [][]string, left ...int) {
	p.table(header, rows[:min(most, len(rows))], left...)
	if len(rows) > most {
		p.printf("<details><summary>%d more</summary>\n", len(rows)-most)
		p.table(header, rows[most:min(len(rows), mostRows)], left...)
		if len(rows) > mostRows {
			p.printf("<p>%d more are in form.json.</p>\n", len(rows)-mostRows)
		}
		p.str("</details>\n")
	}
}

func (p *report) found() {
	r := p.r
	s, q := r.Structure, &r.Summary
	p.heading("What was asked and what was found")
	var parts []string
	for _, c := range []struct {
		n    int
		what string
	}{{len(s.Position), "node"}, {len(s.Ends), "member"}, {len(s.Corners), "triangle"}} {
		if c.n > 0 {
			parts = append(parts, plural(c.n, c.what))
		}
	}
	lo, hi := canopy.Bounds(r.Form.Position)
	p.printf("<p>%s, within %s × %s m in plan and %s m in height.", strings.Join(parts, ", "), figure(hi.X-lo.X), figure(hi.Y-lo.Y), figure(hi.Z-lo.Z))
	if s.SelfWeight {
		p.str(" Weights act.")
	}
	p.str("</p>\n")
	low, high := specifiedRange(s)
	var rows [][]string
	for i := range min(len(q.FabricArea), len(s.Fabrics)) {
		span := func(k int) string {
			if low[i][k] > high[i][k] {
				return "–"
			}
			return rangeText(low[i][k], high[i][k])
		}
		rows = append(rows, []string{oneLine(s.Fabrics[i].Name), figure(q.FabricArea[i]), span(0), span(1),
			spreadText(q.WarpAchieved, i), spreadText(q.WeftAchieved, i), spreadText(q.Ratio, i), utilisationText(at(q.FabricUtilisation, i))})
	}
	if len(rows) > 0 {
		p.str("<p>Prestress of the fabric. Achieved over specified: mean, and in brackets the values below which 5 % and 95 % of the area lie.</p>\n")
		p.table([]string{"fabric", "area m²", "warp asked kN/m", "weft asked kN/m", "warp achieved", "weft achieved", "(warp:weft)/nominal", "utilisation, prestress only"}, rows)
	}
	p.air()
	var lengths []string
	for k, l := range q.KindLength {
		if l > 0 {
			lengths = append(lengths, fmt.Sprintf("%s %s m", canopy.Kind(k), figure(l)))
		}
	}
	if len(lengths) > 0 {
		p.str("<p>Lengths in all: " + strings.Join(lengths, ", ") + ".</p>\n")
	}
}

// drawings writes the plan, the live view with the axonometric in its place,
// and the elevations. It reports whether there is a live view.
func (p *report) drawings(o Options) bool {
	r := p.r
	live := len(r.Structure.Corners) <= mostLive && len(r.Structure.Ends) <= mostLiveMembers && len(r.Form.Position) > 0
	figures := map[string]string{
		"plan":        "Contours with heights in m; arrows show which way water runs. Numbers in red are findings.",
		"axonometric": "Dashed: hidden by fabric.",
	}
	all := views()
	// The plan first, then what shows the shape, then the elevations.
	order := []view{all[0], all[3], all[1], all[2]}
	for _, v := range order {
		d := draw(r, v, o)
		if v.name == "axonometric" {
			p.heading("The shape")
		} else {
			p.heading(v.title)
		}
		if v.name == "axonometric" && live {
			p.controls()
		}
		id := ""
		if v.name == "axonometric" {
			id = " id=\"still\""
		}
		p.printf("<figure%s><svg viewBox=\"0 0 %.0f %s\" role=\"img\" aria-label=\"%s of %s\">\n", id, paperWidth, px(d.frame.height), escape(v.title), escape(p.title()))
		p.str(d.body()).str("</svg>")
		if c := figures[v.name]; c != "" {
			p.str("<figcaption>" + c + "</figcaption>")
		}
		p.str("</figure>\n")
		p.more()
	}
	return live
}

func (p *report) controls() {
	p.str("<div id=\"bar\" hidden role=\"toolbar\" aria-label=\"View\">")
	for i, l := range layers(p.r) {
		p.printf("<button type=\"button\" data-layer=\"%d\" aria-pressed=\"%t\" title=\"%s\">%s</button>", i, i == 0, escape(l.title), l.name)
	}
	for _, v := range [][2]string{{"-90,89.9", "from above"}, {"-90,0", "from the front"}, {"0,0", "from the side"}, {"-60,26", "axonometric"}} {
		p.printf("<button type=\"button\" data-view=\"%s\">%s</button>", v[0], v[1])
	}
	p.str("<span id=\"scale\"></span></div>\n")
	p.printf("<div id=\"live\" hidden><canvas tabindex=\"0\" role=\"img\" aria-label=\"Live 3D view of %s. Arrow keys turn, plus and minus zoom, Shift and arrows move, Home resets, digits choose the colour layer.\"></canvas><div id=\"tip\" role=\"status\"></div></div>\n", escape(p.title()))
}

// script writes the data of the live view and the view itself.
func (p *report) script() {
	r := p.r
	s, f := r.Structure, r.Form
	lo, hi := canopy.Bounds(f.Position)
	centre := r3.Scale(0.5, r3.Add(lo, hi))
	half := max(hi.X-lo.X, hi.Y-lo.Y, hi.Z-lo.Z, 1e-9) / 2
	step := half / 32767
	type layerData struct {
		Name    string  `json:"name"`
		Title   string  `json:"title"`
		Short   string  `json:"short,omitempty"`
		Unit    string  `json:"unit,omitempty"`
		Centred bool    `json:"centred"`
		Reach   float64 `json:"reach"`
		Values  string  `json:"values"`
	}
	type part struct {
		Nodes  []int32 `json:"nodes"`
		Width  float64 `json:"width"`
		Kind   string  `json:"kind"`
		Pushes bool    `json:"pushes"`
		Text   string  `json:"text"`
	}
	type namedPoint struct {
		Node int32  `json:"node"`
		Foot bool   `json:"foot,omitempty"`
		Text string `json:"text"`
	}
	data := struct {
		Position string       `json:"position"`
		Step     float64      `json:"step"`
		Radius   float64      `json:"radius"`
		Zero     float64      `json:"zero"`
		Contour  float64      `json:"contour"`
		Wide     bool         `json:"wide"`
		Corners  string       `json:"corners"`
		Layers   []layerData  `json:"layers"`
		Fabrics  []string     `json:"fabrics"`
		FabricOf [][2]int     `json:"fabricOf"`
		Parts    []part       `json:"parts"`
		Points   []namedPoint `json:"points"`
		TwoHues  []string     `json:"twoHues"`
		OneHue   []string     `json:"oneHue"`
	}{Step: step, Radius: r3.Norm(r3.Sub(hi, lo)) / 2, Zero: centre.Z, Layers: []layerData{}, Parts: []part{}, Points: []namedPoint{}}

	var b []byte
	for _, v := range f.Position {
		d := r3.Sub(v, centre)
		for _, c := range [3]float64{d.X, d.Y, d.Z} {
			b = binary.LittleEndian.AppendUint16(b, uint16(int16(math.Round(c/step))))
		}
	}
	data.Position = base64.StdEncoding.EncodeToString(b)
	data.Wide = len(f.Position) > math.MaxUint16
	b = b[:0]
	for _, c := range s.Corners {
		for _, v := range c {
			if data.Wide {
				b = binary.LittleEndian.AppendUint32(b, uint32(v))
			} else {
				b = binary.LittleEndian.AppendUint16(b, uint16(v))
			}
		}
	}
	data.Corners = base64.StdEncoding.EncodeToString(b)
	if len(s.Corners) > 0 {
		low, high := heights(r)
		data.Contour = contourSpacing(high - low)
	}
	short := map[string][2]string{layerWarp: {"warp achieved", ""}, layerWeft: {"weft achieved", ""}, layerSlope: {"slope", "°"}, layerUtilisation: {"utilisation", ""}}
	for _, l := range layers(r) {
		b = b[:0]
		for i := range r.Structure.Corners {
			v := l.value(i)
			b = binary.LittleEndian.AppendUint32(b, math.Float32bits(float32(v)))
		}
		data.Layers = append(data.Layers, layerData{l.name, l.title, short[l.name][0], short[l.name][1], l.centred, l.reach, base64.StdEncoding.EncodeToString(b)})
	}
	for i := range s.Fabrics {
		data.Fabrics = append(data.Fabrics, oneLine(s.Fabrics[i].Name))
	}
	// Runs of triangles of one fabric: fabric and end.
	for i, k := range s.FabricOf {
		if n := len(data.FabricOf); n > 0 && data.FabricOf[n-1][0] == int(k) {
			data.FabricOf[n-1][1] = i + 1
		} else {
			data.FabricOf = append(data.FabricOf, [2]int{int(k), i + 1})
		}
	}
	most := 0.0
	for _, t := range f.Force {
		most = max(most, math.Abs(t))
	}
	width := func(force float64, pushes bool) float64 {
		if pushes {
			return 6
		}
		return math.Round(10*(1.2+2.8*math.Sqrt(math.Abs(force)/max(most, 1e-300)))) / 10
	}
	chains, loose := chainsAndMembers(s)
	for _, i := range chains {
		c := &s.Cables[i]
		low, high, length := math.Inf(1), math.Inf(-1), 0.0
		for _, m := range c.Members {
			low, high = min(low, f.Force[m]), max(high, f.Force[m])
			length += memberLength(r, int(m))
		}
		data.Parts = append(data.Parts, part{c.Nodes, width(high, c.Kind.Pushes()), c.Kind.String(), c.Kind.Pushes(),
			fmt.Sprintf("%s\nforce %s kN\nlength %s m", label(c.Kind.String(), oneLine(c.Name)), rangeText(low, high), figure(length))})
	}
	for _, i := range loose {
		k := s.Kind[i]
		data.Parts = append(data.Parts, part{s.Ends[i][:], width(f.Force[i], k.Pushes()), k.String(), k.Pushes(),
			fmt.Sprintf("%s\nforce %s kN\nlength %s m", label(k.String(), oneLine(s.MemberName.At(i))), kN(f.Force[i]), figure(memberLength(r, i)))})
	}
	for i := range s.Lines {
		if l := &s.Lines[i]; l.Role != "seam" {
			data.Parts = append(data.Parts, part{l.Nodes, 4, "fixed", false, label(l.Role, oneLine(l.Name))})
		}
	}
	for i := range s.Rings {
		if g := &s.Rings[i]; g.Rigid && len(g.Nodes) > 2 {
			data.Parts = append(data.Parts, part{append(slices.Clone(g.Nodes), g.Nodes[0]), 4, "ring", false, label("ring", oneLine(g.Name))})
		}
	}
	inner := innerNodes(s)
	for i := range s.Position {
		name := oneLine(string(s.NodeName.Bytes(i)))
		fixed := s.Fixed[i]
		if name == "" && fixed == 0 || strings.Contains(name, ":") || len(data.Points) >= 2000 {
			continue
		}
		q := f.Position[i]
		t := fmt.Sprintf("node %s\nx %.3f  y %.3f  z %.3f m", s.NodeName.At(i), q.X, q.Y, q.Z)
		if fixed != 0 {
			v := f.Reaction[i]
			t += fmt.Sprintf("\nreaction %s kN\n(%s, %s, %s)", kN(r3.Norm(v)), kN(v.X), kN(v.Y), kN(v.Z))
		}
		data.Points = append(data.Points, namedPoint{int32(i), fixed != 0 && !inner[i], t})
	}
	const shades = 64
	for k := range shades {
		t := (float64(k) + 0.5) / shades
		for _, c := range []struct {
			list *[]string
			rgb  rgb
		}{{&data.TwoHues, deviationColour(2*t - 1)}, {&data.OneHue, shareColour(t)}} {
			v := c.rgb.srgb()
			*c.list = append(*c.list, fmt.Sprintf("#%02x%02x%02x", v[0], v[1], v[2]))
		}
	}
	out, err := json.Marshal(data) // escapes <, > and &
	if err != nil {
		p.err = err
		return
	}
	p.str("<script type=\"application/json\" id=\"form\">").more()
	p.b = append(p.b, out...)
	p.str("</script>\n<script>" + reportScript + "</script>\n").more()
}

// histogram draws how the achieved prestress is distributed over the area.
func (p *report) histogram() {
	r := p.r
	if len(r.Structure.Corners) == 0 {
		return
	}
	all := layers(r)
	reach := all[0].reach
	const bins = 41
	var counts [2][bins]float64
	total, most := 0.0, 0.0
	for i := range r.Structure.Corners {
		_, area := triangleNormal(r, i)
		total += area
		for k := range 2 {
			v := all[1+k].value(i)
			if math.IsNaN(v) {
				continue
			}
			b := int(math.Floor((v - 1 + reach) / (2 * reach) * bins))
			counts[k][max(0, min(bins-1, b))] += area
		}
	}
	for k := range counts {
		most = max(most, slices.Max(counts[k][:]))
	}
	if total == 0 || most == 0 {
		return
	}
	p.heading("Achieved over specified prestress, by share of area")
	const w, h, left = 1000.0, 130.0, 70.0
	p.printf("<figure><svg viewBox=\"0 0 %.0f %.0f\" role=\"img\" aria-label=\"Histogram of achieved over specified prestress in warp and weft\">\n", w, 2*h+50)
	for k, name := range []string{"warp", "weft"} {
		base := h*float64(k+1) + 10*float64(k)
		p.printf("<text class=\"ink\" x=\"10\" y=\"%s\" font-size=\"15\">%s</text>\n", px(base-4), name)
		p.printf("<path class=\"dim\" d=\"M%.0f %sH%.0f\"/>\n", left, px(base), w-10)
		for i, c := range counts[k] {
			if c == 0 {
				continue
			}
			v := 1 - reach + 2*reach*(float64(i)+0.5)/bins
			rgb := all[0].colour(v).srgb()
			height := max(1, c/most*(h-22))
			p.printf("<rect x=\"%s\" y=\"%s\" width=\"%s\" height=\"%s\" fill=\"#%02x%02x%02x\" stroke=\"#6d6256\" stroke-width=\".6\"><title>%.3f to %.3f: %.1f %% of the area</title></rect>\n",
				px(left+(w-left-10)*float64(i)/bins), px(base-height), px((w-left-10)/bins-1), px(height), rgb[0], rgb[1], rgb[2],
				1-reach+2*reach*float64(i)/bins, 1-reach+2*reach*float64(i+1)/bins, 100*c/total)
		}
	}
	for _, t := range []float64{-1, -0.5, 0, 0.5, 1} {
		x := left + (w-left-10)*(t+1)/2
		anchor := "middle"
		if t == 1 {
			anchor = "end"
		}
		p.printf("<text class=\"faint\" x=\"%s\" y=\"%.0f\" font-size=\"13\" text-anchor=\"%s\">%s</text>\n", px(x), 2*h+32, anchor, string(appendNumber(nil, 1+t*reach, 5)))
	}
	p.str("</svg></figure>\n")
}

func (p *report) cables() {
	s, q := p.r.Structure, &p.r.Summary
	var rows [][]string
	for i := range min(len(q.Cables), len(s.Cables)) {
		k := s.Cables[i].Kind
		if isStay(k) {
			continue
		}
		c := &q.Cables[i]
		rows = append(rows, []string{oneLine(s.Cables[i].Name), k.String(), figure(c.Length), percent(ratio(c.Sag, c.Chord)),
			rangeText(c.ForceMin, c.ForceMax), percent(c.Evenness), utilisationText(c.Utilisation)})
	}
	if len(rows) > 0 {
		p.heading("Cables")
		p.folded(24, []string{"cable", "kind", "length m", "sag/chord", "force kN", "unevenness", "utilisation, prestress only"}, rows, 1)
	}
}

func (p *report) stays() {
	r := p.r
	s := r.Structure
	var rows [][]string
	for i, k := range s.Kind {
		if !isStay(k) {
			continue
		}
		name := s.MemberName.At(i)
		if c := cableOf(s, i); c >= 0 && s.Cables[c].Name != "" {
			name = s.Cables[c].Name
		}
		what := "tension"
		if r.Form.Force[i] < 0 {
			what = "compression"
		}
		rows = append(rows, []string{oneLine(name), k.String(), figure(memberLength(r, i)), kN(math.Abs(r.Form.Force[i])), what, utilisationText(memberUtilisation(r, i))})
	}
	if len(rows) > 0 {
		p.heading("Masts, guys and struts")
		p.folded(24, []string{"name", "kind", "length m", "force kN", "", "utilisation, prestress only"}, rows, 1, 4)
	}
}

func (p *report) reactions() {
	r := p.r
	s, f := r.Structure, r.Form
	lines := lineOf(s)
	var rows [][]string
	left := 0
	for i, fixed := range s.Fixed {
		if fixed == 0 {
			continue
		}
		if len(rows) == mostRows {
			left++
			continue
		}
		name := s.NodeName.At(i)
		if l, ok := lines[int32(i)]; ok {
			name += " on " + s.Lines[l].Name
		}
		v := f.Reaction[i]
		rows = append(rows, []string{oneLine(name), kN(r3.Norm(v)), kN(v.X), kN(v.Y), kN(v.Z), kN(-v.X), kN(-v.Y), kN(-v.Z)})
	}
	if len(rows) == 0 {
		return
	}
	p.heading("Reactions and actions on foundations, kN")
	p.str("<p>A reaction is the force of the support on the structure; the action on the foundation is its opposite. z is up.</p>\n")
	p.folded(24, []string{"node", "size", "reaction x", "y", "z", "action x", "y", "z"}, rows)
	if left > 0 {
		p.printf("<p>%d more are in reactions.csv.</p>\n", left)
	}
	var lineRows [][]string
	for i := range min(len(r.Summary.Lines), len(s.Lines)) {
		if s.Lines[i].Role == "seam" {
			continue
		}
		l := &r.Summary.Lines[i]
		lineRows = append(lineRows, []string{oneLine(s.Lines[i].Name), s.Lines[i].Role, figure(l.Length), kN(l.Mean), rangeText(l.Min, l.Max), kN(l.Total.X), kN(l.Total.Y), kN(l.Total.Z)})
	}
	if len(lineRows) > 0 {
		p.str("<p>Along fixed lines:</p>\n")
		p.table([]string{"line", "role", "length m", "mean kN/m", "kN/m", "total x kN", "y", "z"}, lineRows, 1)
	}
}

func (p *report) findings() {
	p.heading("Findings")
	if len(p.r.Findings) == 0 {
		p.str("<p>None.</p>\n")
		return
	}
	p.str("<ul>\n")
	class := map[canopy.Severity]string{canopy.Broken: "bad", canopy.Warning: "doubt", canopy.Note: "faint"}
	for i := range p.r.Findings {
		f := &p.r.Findings[i]
		p.printf("<li><span class=\"num\">%d</span><strong class=\"%s\">%s</strong> %s", i+1, class[f.Severity], f.Severity, escape(f.Text))
		if len(f.Places) > 0 {
			var places []string
			for _, pl := range f.Places[:min(4, len(f.Places))] {
				places = append(places, fmt.Sprintf("%s %s (%.2f, %.2f, %.2f)", pl.Kind, pl.Name, pl.At.X, pl.At.Y, pl.At.Z))
			}
			p.str(" <small>At ").str(escape(strings.Join(places, "; ")))
			if n := max(f.Count, len(f.Places)) - len(places); n > 0 {
				p.printf(" and %d more", n)
			}
			p.str(".</small>")
		}
		if f.Source != "" {
			p.str(" <small>[").str(escape(f.Source)).str("]</small>")
		}
		p.str("</li>\n")
	}
	p.str("</ul>\n")
}

// audit says in words what the audit found.
func (p *report) audit() {
	a, s := &p.r.Audit, p.r.Structure
	p.heading("The audit")
	p.str("<p>A separate part of the program, which shares no code with the one that found the shape, computed these from what is reported here.</p>\n<ul>\n")
	item := func(format string, args ...any) {
		p.str("<li>").str(escape(fmt.Sprintf(format, args...))).str("</li>\n")
	}
	item("Balance: at the worst node the forces fail to cancel by %s of the forces that meet there.", tiny(a.ResidualLargest))
	item("Whole structure: reactions and loads add up to zero to %s of the reactions, their moments to %s.", tiny(a.ForceBalance), tiny(a.MomentBalance))
	item("Stresses and reactions belong together: the virial identity holds to %s.", tiny(a.Virial))
	item("Reported against recomputed: reactions differ by %s, forces and stresses from their laws by %s.", tiny(a.ReactionMismatch), tiny(a.ForceMismatch))
	if len(s.Enclosures) > 0 {
		item("Volumes of air, measured anew on the mesh: they differ from what was asked by %s; the shape may change under a disturbance, the volumes not.", tiny(a.VolumeMismatch))
	}
	switch {
	case !a.StabilityKnown:
		item("Stability: not known. %s", a.StabilityNote)
	case a.Unstable > 0:
		item("Stability: UNSTABLE in %s: a small push grows.", plural(a.Unstable, "direction"))
	case math.IsNaN(a.Softest):
		item("Stability: stable for the prescribed prestress%s.", heldAir(p.r))
	default:
		item("Stability: stable for the prescribed prestress%s, firmness %s (0 would be on the brink).", heldAir(p.r), figure(a.Softest))
	}
	item("Tension: %s slack, %s pushed; %s in compression.", plural(a.SlackCables, "cable"), plural(a.PushedCables, "cable"), plural(a.CompressedTriangles, "triangle"))
	if len(s.Corners) > 0 {
		item("Mesh: the smallest angle is %.1f°.", degrees(a.MinAngle))
	}
	if len(s.Corners) > 0 && math.IsNaN(a.Discretisation) {
		item("Fineness: how far a finer mesh would move the surface was not judged.")
	}
	if a.Discretisation > 0 {
		item("Fineness: one refinement moved the surface by about %s of its size.", tiny(a.Discretisation))
	}
	p.str("</ul>\n")
}

func (p *report) how() {
	r := p.r
	p.heading("How it was found")
	if len(r.Form.Steps) > 0 {
		p.str("<ol>\n")
		for _, step := range r.Form.Steps {
			p.str("<li>").str(escape(step)).str("</li>\n")
		}
		p.str("</ol>\n")
	}
	p.str("<p class=\"faint\">").str(escape(fmt.Sprintf("%s %s; engines: %s; model %s, %s.", r.Program.Name, r.Program.Version, strings.Join(r.Program.Engines, ", "), r.File, r.Digest))).str("</p>\n")
}
