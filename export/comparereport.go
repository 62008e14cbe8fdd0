package export

import (
	"context"
	"fmt"
	"io"
	"math"
	"strings"

	"anticlast/formfind/canopy"
)

// CompareReport writes one page of HTML with two forms side by side: drawings of
// both to one scale and the table of what changed.
func CompareReport(ctx context.Context, w io.Writer, a, b *canopy.Result, o Options) error {
	p := &report{newText(ctx, w), a}
	other := &report{p.text, b}
	title := p.title() + " and " + other.title()
	p.str("<!doctype html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\">\n<meta name=\"viewport\" content=\"width=device-width, initial-scale=1\">\n")
	p.str(`<meta http-equiv="Content-Security-Policy" content="default-src 'none'; style-src 'unsafe-inline'; img-src data:">` + "\n")
	p.str("<link rel=\"icon\" href=\"data:,\">\n<title>").str(escape(title)).str("</title>\n<style>" + reportStyle + drawingStyle +
		".pair{display:grid;grid-template-columns:1fr 1fr;gap:1rem}@media (max-width:40rem){.pair{grid-template-columns:1fr}}</style>\n</head>\n<body>\n<main>\n")
	p.str("<h1>").str(escape(title)).str("</h1>\n")
	for k, r := range []*report{p, other} {
		verdict := "<span class=\"good\">✓ trusted</span>"
		if !r.r.Audit.Trusted {
			verdict = "<span class=\"bad\">✗ not trusted</span>"
		}
		p.printf("<p class=\"verdict\">%c: %s, %s</p>\n", 'A'+k, escape(r.title()), verdict)
	}
	p.str("<p class=\"caution\">").str(escape(canopy.Caution)).str("</p>\n")
	for _, v := range []view{views()[0], views()[3], views()[1], views()[2]} {
		if err := ctx.Err(); err != nil {
			return err
		}
		p.heading(v.title)
		p.str("<div class=\"pair\">\n")
		// One scale for both: that of the one that needs the smaller.
		scale := math.Inf(1)
		for _, r := range []*canopy.Result{a, b} {
			scale = min(scale, fit(r, v, paperWidth, 900, paperMargin).scale)
		}
		for k, r := range []*canopy.Result{a, b} {
			d := drawAt(r, v, scale, o)
			p.printf("<figure><svg viewBox=\"0 0 %.0f %s\" role=\"img\" aria-label=\"%s of %c\">\n", paperWidth, px(d.frame.height), escape(v.title), 'A'+k)
			p.str(d.body()).printf("</svg><figcaption>%c</figcaption></figure>\n", 'A'+k).more()
		}
		p.str("</div>\n")
	}
	group := ""
	var rows [][]string
	flush := func() {
		if len(rows) > 0 {
			p.heading(group)
			p.folded(24, []string{"", "A", "B", "B − A", "change"}, rows)
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
		row := []string{oneLine(d.Name)}
		row = append(row, differenceCells(d)...)
		rows = append(rows, row)
	}
	flush()
	p.str("</main>\n</body>\n</html>\n")
	return p.close()
}

// differenceCells are A, B, B − A and the change in per cent as text.
func differenceCells(d Difference) []string {
	value := func(v float64) string {
		if math.IsNaN(v) {
			return "–"
		}
		return fmt.Sprintf("%.3f", v)
	}
	diff, change := "–", "–"
	if !math.IsNaN(d.A) && !math.IsNaN(d.B) {
		diff = signed(d.B-d.A, 3)
		if d.A != 0 {
			change = signed(100*(d.B-d.A)/math.Abs(d.A), 1) + " %"
		}
	}
	return []string{value(d.A), value(d.B), diff, change}
}

// signed writes v with its sign and the given decimals, and what rounds to
// nothing without.
func signed(v float64, decimals int) string {
	s := fmt.Sprintf("%+.*f", decimals, v)
	if strings.Trim(s, "+-0.") == "" {
		return s[1:]
	}
	return s
}
