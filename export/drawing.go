package export

import (
	"bytes"
	"cmp"
	"context"
	"encoding/base64"
	"encoding/xml"
	"fmt"
	"image"
	"image/color"
	"image/png"
	"io"
	"math"
	"slices"
	"strings"

	"anticlast/formfind/canopy"
	"anticlast/formfind/surface"

	"gonum.org/v1/gonum/spatial/r3"
)

// Sizes of a drawing, in its own units of which a page is a thousand wide.
const (
	paperWidth  = 1000.0
	paperMargin = 86.0
	letters     = 13.0
)

// writeSVG writes a sheet of drawings, one below the other: plan, two
// elevations, axonometric. Lines and letters are vectors; the fabric's colours
// are a picture beneath them, so that the size of the file does not grow with
// the mesh.
func writeSVG(ctx context.Context, w io.Writer, r *canopy.Result, o Options) error {
	var body strings.Builder
	y := 70.0
	for _, v := range views() {
		if err := ctx.Err(); err != nil {
			return err
		}
		d := draw(r, v, o)
		fmt.Fprintf(&body, "<g transform=\"translate(0 %s)\">\n<text class=\"ink\" x=\"24\" y=\"24\" font-size=\"17\">%s</text>\n%s</g>\n", px(y), v.title, d.body())
		y += d.frame.height + 30
	}
	t := newText(ctx, w)
	t.printf("<svg xmlns=\"http://www.w3.org/2000/svg\" viewBox=\"0 0 %.0f %.0f\" width=\"%.0f\" height=\"%.0f\" font-family=\"%s\">\n",
		paperWidth, y+20, paperWidth, y+20, fontFamily)
	t.str("<title>").str(escape(oneLine(r.Title))).str("</title>\n<desc>").str(escape(canopy.Caution)).str("</desc>\n")
	t.str("<style>" + drawingStyle + "</style>\n")
	t.printf("<rect width=\"%.0f\" height=\"%.0f\" fill=\"#fff\"/>\n", paperWidth, y+20)
	t.printf("<text x=\"24\" y=\"36\" font-size=\"22\" class=\"ink\">%s</text>\n", escape(oneLine(r.Title)))
	t.printf("<text x=\"24\" y=\"58\" font-size=\"11\" class=\"faint\">%s</text>\n", escape(canopy.Caution))
	t.str(body.String())
	t.str("</svg>\n")
	return t.close()
}

const fontFamily = "system-ui, 'Segoe UI', Roboto, 'Noto Sans', 'Liberation Sans', Arial, sans-serif"

// drawingStyle also serves the report, which sets the variables for dark pages.
const drawingStyle = `
.ink{fill:var(--ink,#1d252c)}.faint{fill:var(--faint,#5a646d)}
.l{fill:none;stroke-linecap:round;stroke-linejoin:round}
.cable{stroke:var(--ink,#1d252c)}.mast{stroke:var(--mast,#4c555d)}.ring{stroke:var(--ink,#1d252c)}.fixed{stroke:#8a6a24}
.contour{stroke:#6d6256;stroke-width:.7}.turn{stroke:#6d6256;stroke-width:1.2}.seam{stroke:#6d6256;stroke-width:.8;stroke-dasharray:5 4}
.hidden{stroke-dasharray:3 4;opacity:.55}
.dim{stroke:var(--faint,#5a646d);stroke-width:.8;fill:none}
.foot{fill:#8a6a24}.held{fill:#6b4a86}
.flow{stroke:#1c5d99;stroke-width:1.1;fill:none}
.mark{fill:#b3261e}.label{paint-order:stroke;stroke:var(--page,#fff);stroke-width:3px;stroke-linejoin:round}
`

func px(v float64) string { return string(appendNumber(nil, math.Round(v*10)/10, 6)) }

func escape(s string) string {
	var b strings.Builder
	_ = xml.EscapeText(&b, []byte(s))
	return b.String()
}

// drawing is one view being drawn.
type drawing struct {
	r     *canopy.Result
	frame *frame
	z     *zbuffer // nil without fabric
	fine  float64  // pixels of z per unit of paper
	shown *layer
	size  float64
	b     strings.Builder
	boxes [][4]float64 // places taken by labels
}

// draw draws a view of r as large as the paper allows.
func draw(r *canopy.Result, v view, o Options) *drawing { return drawAt(r, v, 0, o) }

// drawAt draws a view of r at a scale that is not larger than the paper allows,
// in units of the paper to a metre; 0 = as large as it allows.
func drawAt(r *canopy.Result, v view, scale float64, o Options) *drawing {
	d := &drawing{r: r, frame: fit(r, v, paperWidth, 900, paperMargin), fine: o.pictureWidth() / paperWidth}
	if scale > 0 && scale < d.frame.scale {
		// About the middle of the paper.
		f, k := d.frame, scale/d.frame.scale
		f.x, f.y = f.width/2+k*(f.x-f.width/2), f.height/2+k*(f.y-f.height/2)
		f.scale = scale
	}
	lo, hi := canopy.Bounds(r.Form.Position)
	d.size = max(r3.Norm(r3.Sub(hi, lo)), 1e-9)
	if all := layers(r); len(all) > 0 {
		d.shown = &all[0]
		d.z = fabricIn(r, d.frame.zoomed(d.fine), d.shown)
	}
	d.underlay()
	d.contours()
	for _, line := range silhouettes(r, v) {
		d.path(line, "turn", 0, true)
	}
	d.lines()
	if v.name == "plan" {
		d.drainage()
	}
	d.members()
	d.supports()
	d.dimensions()
	d.findings()
	d.labels()
	return d
}

// body returns what stands inside the drawing's svg or g element.
func (d *drawing) body() string { return d.b.String() }

func (d *drawing) printf(format string, args ...any) { fmt.Fprintf(&d.b, format, args...) }

// underlay puts the colours of the fabric beneath the drawing as a picture.
func (d *drawing) underlay() {
	if d.z == nil {
		return
	}
	const steps = 63
	palette := color.Palette{color.NRGBA{}}
	bottom, top := 0.0, d.shown.reach
	if d.shown.centred {
		bottom, top = 1-d.shown.reach, 1+d.shown.reach
	}
	for k := range steps {
		c := d.shown.colour(bottom + (top-bottom)*(float64(k)+0.5)/steps).srgb()
		palette = append(palette, color.NRGBA{c[0], c[1], c[2], 255})
	}
	palette = append(palette, color.NRGBA{128, 128, 128, 255}) // not known
	m := image.NewPaletted(image.Rect(0, 0, d.z.w, d.z.h), palette)
	for i, depth := range d.z.depth {
		switch v := float64(d.z.value[i]); {
		case math.IsInf(float64(depth), -1):
		case math.IsNaN(v):
			m.Pix[i] = steps + 1
		default:
			m.Pix[i] = uint8(1 + max(0, min(steps-1, int(math.Floor((v-bottom)/(top-bottom)*steps)))))
		}
	}
	d.picture(m)
}

// path draws a line in space, its visible parts solid and the others dashed or,
// with drop, not at all.
func (d *drawing) path(points []r3.Vec, class string, width float64, drop bool) {
	if len(points) < 2 {
		return
	}
	tolerance := 0.004 * d.size
	// Pieces short enough for visibility to be judged at their middle.
	type piece struct {
		a, b    point
		visible bool
	}
	var pieces []piece
	for i := 1; i < len(points); i++ {
		a, b := d.frame.at(points[i-1]), d.frame.at(points[i])
		n := 1
		if d.z != nil {
			n = max(1, min(200, int(math.Hypot(b.x-a.x, b.y-a.y)/8)))
		}
		for k := range n {
			s, t := float64(k)/float64(n), float64(k+1)/float64(n)
			mix := func(u float64) point {
				return point{a.x + u*(b.x-a.x), a.y + u*(b.y-a.y), a.depth + u*(b.depth-a.depth)}
			}
			p := piece{mix(s), mix(t), true}
			if d.z != nil {
				m := mix((s + t) / 2)
				m.x, m.y = m.x*d.fine, m.y*d.fine
				p.visible = d.z.sees(m, tolerance)
			}
			pieces = append(pieces, p)
		}
	}
	// Straight pieces of the same visibility are joined.
	for i := 0; i < len(pieces); {
		k := i
		for k < len(pieces) && pieces[k].visible == pieces[i].visible {
			k++
		}
		if pieces[i].visible || !drop {
			extra := ""
			if !pieces[i].visible {
				extra = " hidden"
			}
			d.printf("<path class=\"l %s%s\"", class, extra)
			if width > 0 {
				d.printf(" stroke-width=\"%s\"", px(width))
			}
			d.b.WriteString(" d=\"M" + px(pieces[i].a.x) + " " + px(pieces[i].a.y))
			last := pieces[i].a
			for j := i; j < k; j++ {
				p := pieces[j].b
				// Leave out points on the way.
				if j+1 < k && onTheWay(last, p, pieces[j+1].b) {
					continue
				}
				d.b.WriteString("L" + px(p.x) + " " + px(p.y))
				last = p
			}
			d.b.WriteString("\"/>\n")
		}
		i = k
	}
}

// onTheWay reports whether b lies on the straight way from a to c.
func onTheWay(a, b, c point) bool {
	if (b.x-a.x)*(c.x-b.x)+(b.y-a.y)*(c.y-b.y) <= 0 {
		return false // turns back
	}
	cross := (b.x-a.x)*(c.y-a.y) - (c.x-a.x)*(b.y-a.y)
	return math.Abs(cross) < 0.05*math.Hypot(c.x-a.x, c.y-a.y)
}

func (d *drawing) contours() {
	s := d.r.Structure
	if len(s.Corners) == 0 {
		return
	}
	lo, hi := heights(d.r)
	spacing := contourSpacing(hi - lo)
	if spacing == 0 || d.frame.name == "front" || d.frame.name == "side" {
		return // they would be level lines
	}
	all := surface.Contours(d.r.Form.Position, s.Corners, levels(lo, hi, spacing))
	for _, c := range all {
		points := c.Points
		if c.Closed && len(points) > 2 {
			points = append(slices.Clone(points), points[0])
		}
		d.path(points, "contour", 0, true)
	}
	if d.frame.name != "plan" {
		return
	}
	// Heights on every other level, in the middle of its longest line.
	type labelled struct {
		at    point
		level float64
		long  int
	}
	best := map[int]labelled{}
	for _, c := range all {
		k := int(math.Round(c.Level / spacing))
		if k%2 == 0 && len(c.Points) > best[k].long {
			best[k] = labelled{d.frame.at(c.Points[len(c.Points)/2]), c.Level, len(c.Points)}
		}
	}
	order := make([]int, 0, len(best))
	for k := range best {
		order = append(order, k)
	}
	slices.Sort(order)
	for _, k := range order {
		d.label(best[k].at.x, best[k].at.y+3, fmt.Sprintf("%.2f", best[k].level), "middle", 9, "faint")
	}
}

func (d *drawing) lines() {
	s, f := d.r.Structure, d.r.Form
	for i := range s.Lines {
		l := &s.Lines[i]
		points := make([]r3.Vec, len(l.Nodes))
		for k, v := range l.Nodes {
			points[k] = f.Position[v]
		}
		if l.Role == "seam" {
			d.path(points, "seam", 0, true)
		} else {
			d.path(points, "fixed", 3, false)
		}
	}
	for i := range s.Rings {
		g := &s.Rings[i]
		if !g.Rigid {
			continue
		}
		var points []r3.Vec
		for _, v := range g.Nodes {
			points = append(points, f.Position[v])
		}
		if len(points) > 2 {
			d.path(append(points, points[0]), "ring", 3, false)
		}
	}
}

// stroke is the width of the line of a force.
func (d *drawing) stroke(force, most float64) float64 {
	if most == 0 {
		return 1
	}
	return 0.8 + 2.2*math.Sqrt(math.Abs(force)/most)
}

func (d *drawing) members() {
	s, f := d.r.Structure, d.r.Form
	most := 0.0
	for _, t := range f.Force {
		most = max(most, math.Abs(t))
	}
	chains, loose := chainsAndMembers(s)
	if len(loose) > mostDrawn {
		d.haze(loose)
		loose = nil
	} else if len(loose) > 200 {
		// Too many to tell apart: one thin path.
		d.b.WriteString("<path class=\"l cable\" stroke-width=\".8\" d=\"")
		for _, i := range loose {
			a, b := d.frame.at(f.Position[s.Ends[i][0]]), d.frame.at(f.Position[s.Ends[i][1]])
			d.b.WriteString("M" + px(a.x) + " " + px(a.y) + "L" + px(b.x) + " " + px(b.y))
		}
		d.b.WriteString("\"/>\n")
		loose = nil
	}
	for _, i := range loose {
		class := "cable"
		if s.Kind[i].Pushes() {
			class = "mast"
		}
		d.path([]r3.Vec{f.Position[s.Ends[i][0]], f.Position[s.Ends[i][1]]}, class, d.stroke(f.Force[i], most), false)
	}
	for _, i := range chains {
		c := &s.Cables[i]
		points := make([]r3.Vec, len(c.Nodes))
		for k, v := range c.Nodes {
			points[k] = f.Position[v]
		}
		class, width := "cable", d.stroke(f.Force[c.Members[0]], most)
		if c.Kind.Pushes() {
			class, width = "mast", 5
		}
		d.path(points, class, width, false)
	}
}

// mostDrawn is the number of members up to which they are lines of a drawing;
// more are a picture, so that the file stays small.
const mostDrawn = 20000

// haze puts a great many members into the drawing as a picture of thin lines.
func (d *drawing) haze(members []int) {
	f := d.frame.zoomed(d.fine)
	m := image.NewPaletted(image.Rect(0, 0, int(f.width)+1, int(f.height)+1), color.Palette{color.NRGBA{}, color.NRGBA{70, 78, 86, 255}})
	for _, i := range members {
		e := d.r.Structure.Ends[i]
		a, b := f.at(d.r.Form.Position[e[0]]), f.at(d.r.Form.Position[e[1]])
		n := max(1, int(math.Ceil(max(math.Abs(b.x-a.x), math.Abs(b.y-a.y)))))
		for k := range n + 1 {
			t := float64(k) / float64(n)
			if x, y := int(a.x+t*(b.x-a.x)), int(a.y+t*(b.y-a.y)); (image.Point{X: x, Y: y}).In(m.Rect) {
				m.Pix[y*m.Stride+x] = 1
			}
		}
	}
	d.picture(m)
}

// picture embeds an image of the drawing's fine pixels.
func (d *drawing) picture(m *image.Paletted) {
	var b bytes.Buffer
	if png.Encode(&b, m) != nil {
		return // a picture in memory cannot fail
	}
	d.printf("<image width=\"%s\" height=\"%s\" href=\"data:image/png;base64,%s\"/>\n", px(float64(m.Rect.Dx())/d.fine), px(float64(m.Rect.Dy())/d.fine),
		base64.StdEncoding.EncodeToString(b.Bytes()))
}

func (d *drawing) supports() {
	s, f := d.r.Structure, d.r.Form
	inner := innerNodes(s)
	drawn := 0
	for i, fixed := range s.Fixed {
		held := s.FixedAt(i) != fixed
		if fixed == 0 && !held || inner[i] {
			continue
		}
		if drawn++; drawn > 2000 {
			break
		}
		p := d.frame.at(f.Position[i])
		hidden := ""
		if d.z != nil && !d.z.sees(point{p.x * d.fine, p.y * d.fine, p.depth}, 0.004*d.size) {
			hidden = " hidden"
		}
		switch {
		case fixed == 0:
			d.printf("<circle class=\"held%s\" cx=\"%s\" cy=\"%s\" r=\"3\"/>\n", hidden, px(p.x), px(p.y))
		case d.frame.name == "plan":
			d.printf("<rect class=\"foot%s\" x=\"%s\" y=\"%s\" width=\"7\" height=\"7\"/>\n", hidden, px(p.x-3.5), px(p.y-3.5))
		default:
			d.printf("<path class=\"foot%s\" d=\"M%s %sl5 9h-10z\"/>\n", hidden, px(p.x), px(p.y))
		}
	}
}

// drainage draws which way water runs, at places on a grid.
func (d *drawing) drainage() {
	if d.z == nil {
		return
	}
	const step = 62.0
	taken := map[[2]int]bool{}
	type arrow struct {
		cell [2]int
		text string
	}
	var arrows []arrow
	for i, c := range d.r.Structure.Corners {
		p := d.frame.at(surface.Centre(d.r.Form.Position, c))
		cell := [2]int{int(p.x / step), int(p.y / step)}
		// The triangle at the middle of the cell speaks for it.
		if taken[cell] || math.Abs(p.x/step-math.Floor(p.x/step)-0.5) > 0.25 || math.Abs(p.y/step-math.Floor(p.y/step)-0.5) > 0.25 {
			continue
		}
		n, area := triangleNormal(d.r, i)
		if area == 0 {
			continue
		}
		if n.Z < 0 {
			n = r3.Scale(-1, n)
		}
		h := math.Hypot(n.X, n.Y)
		if h < 1e-3 {
			continue // level: no way to run
		}
		taken[cell] = true
		// The normal leans downhill. Longer where steeper.
		length := 8 + 16*min(1, slope(n)/(math.Pi/4))
		ux, uy := n.X/h, -n.Y/h // y of paper is down
		x0, y0, x1, y1 := p.x-ux*length/2, p.y-uy*length/2, p.x+ux*length/2, p.y+uy*length/2
		arrows = append(arrows, arrow{cell, fmt.Sprintf("<path class=\"flow\" d=\"M%s %sL%s %sM%s %sL%s %sL%s %s\"/>\n", px(x0), px(y0), px(x1), px(y1),
			px(x1-5*ux+3*uy), px(y1-5*uy-3*ux), px(x1), px(y1), px(x1-5*ux-3*uy), px(y1-5*uy+3*ux))})
	}
	slices.SortFunc(arrows, func(a, b arrow) int {
		return cmp.Or(cmp.Compare(a.cell[1], b.cell[1]), cmp.Compare(a.cell[0], b.cell[0]))
	})
	for _, a := range arrows {
		d.b.WriteString(a.text)
	}
}

// label writes text where it covers no other label; else it is left out.
func (d *drawing) label(x, y float64, s, anchor string, size float64, class string) {
	w := 0.56 * size * float64(len([]rune(s)))
	x0 := x
	switch anchor {
	case "middle":
		x0 -= w / 2
	case "end":
		x0 -= w
	}
	box := [4]float64{x0 - 2, y - size, x0 + w + 2, y + 3}
	if box[0] < 0 || box[2] > d.frame.width || box[1] < 0 || box[3] > d.frame.height {
		return
	}
	for _, b := range d.boxes {
		if box[0] < b[2] && b[0] < box[2] && box[1] < b[3] && b[1] < box[3] {
			return
		}
	}
	d.boxes = append(d.boxes, box)
	d.printf("<text class=\"label %s\" x=\"%s\" y=\"%s\" font-size=\"%s\" text-anchor=\"%s\">%s</text>\n", class, px(x), px(y), px(size), anchor, escape(s))
}

// labels names points and cables and says forces.
func (d *drawing) labels() {
	s, f := d.r.Structure, d.r.Form
	count := 0
	for i := range s.Position {
		name := string(s.NodeName.Bytes(i))
		if name == "" || strings.Contains(name, ":") || s.FixedAt(i) == 0 {
			continue
		}
		if count++; count > 60 {
			break
		}
		p := d.frame.at(f.Position[i])
		// Away from the middle of the paper.
		dx, anchor := 8.0, "start"
		if p.x < d.frame.width/2 {
			dx, anchor = -8, "end"
		}
		d.label(p.x+dx, p.y+4, oneLine(name), anchor, letters, "ink")
	}
	chains, _ := chainsAndMembers(s)
	count = 0
	for _, i := range chains {
		c := &s.Cables[i]
		if c.Kind == canopy.KindNetCable {
			continue
		}
		if count++; count > 60 {
			break
		}
		force := 0.0
		for _, m := range c.Members {
			force += f.Force[m] / float64(len(c.Members))
		}
		e := s.Ends[c.Members[len(c.Members)/2]]
		p := d.frame.at(r3.Scale(0.5, r3.Add(f.Position[e[0]], f.Position[e[1]])))
		d.label(p.x, p.y-5, strings.Replace(kN(force), "-", "−", 1)+" kN", "middle", 11, "ink")
	}
}

// dimensions draws the extent of the view, a scale bar and the title.
func (d *drawing) dimensions() {
	f := d.frame
	left, right, top, bottom := math.Inf(1), math.Inf(-1), math.Inf(1), math.Inf(-1)
	for _, p := range d.r.Form.Position {
		q := f.at(p)
		left, right = min(left, q.x), max(right, q.x)
		top, bottom = min(top, q.y), max(bottom, q.y)
	}
	if f.name != "axonometric" && right > left {
		y, x := f.height-38, 36.0
		tick := func(x, y float64) {
			d.printf("<path class=\"dim\" d=\"M%s %sl8 -8\"/>\n", px(x-4), px(y+4))
		}
		d.printf("<path class=\"dim\" d=\"M%s %sH%s\"/>\n", px(left), px(y), px(right))
		tick(left, y)
		tick(right, y)
		d.label((left+right)/2, y-4, fmt.Sprintf("%.2f m", (right-left)/f.scale), "middle", letters, "ink")
		d.printf("<path class=\"dim\" d=\"M%s %sV%s\"/>\n", px(x), px(top), px(bottom))
		tick(x, top)
		tick(x, bottom)
		d.printf("<text class=\"ink\" transform=\"translate(%s %s) rotate(-90)\" font-size=\"%s\" text-anchor=\"middle\">%.2f m</text>\n",
			px(x-5), px((top+bottom)/2), px(letters), (bottom-top)/f.scale)
	}
	// A scale bar of about a fifth of the page.
	length := roundLength(0.2 * f.width / f.scale)
	x, y := f.width-24-length*f.scale, f.height-14
	d.printf("<path class=\"dim\" d=\"M%s %sv4h%sv-4\"/>\n", px(x), px(y-4), px(length*f.scale))
	d.printf("<text class=\"faint\" x=\"%s\" y=\"%s\" font-size=\"11\" text-anchor=\"end\">%s m</text>\n", px(x-6), px(y), string(appendNumber(nil, length, 6)))
	if f.name == "plan" {
		// Where x and y point.
		d.printf("<g transform=\"translate(24 %s)\"><path class=\"dim\" d=\"M0 0h26m-4 -3l4 3l-4 3M0 0v-26m-3 4l3 -4l3 4\"/><text class=\"faint\" x=\"30\" y=\"4\" font-size=\"11\">x</text><text class=\"faint\" x=\"-3\" y=\"-30\" font-size=\"11\">y</text></g>\n", px(f.height-14))
	}
	if f.name == "plan" && d.r.North != nil {
		// The letter stays upright beyond the tip.
		n := *d.r.North
		d.printf("<g class=\"north\" transform=\"translate(%s 78)\"><title>north</title><path class=\"dim\" transform=\"rotate(%s)\" d=\"M0 18V-18M-5 -8L0 -18L5 -8\"/><text class=\"ink\" x=\"%s\" y=\"%s\" font-size=\"12\" text-anchor=\"middle\">N</text></g>\n",
			px(f.width-44), px(degrees(n)), px(26*math.Sin(n)), px(4-26*math.Cos(n)))
	}
	if d.shown != nil {
		d.legend(f.width-24, 14)
	}
}

// legend draws the scale of colours with its right end at x.
func (d *drawing) legend(x, y float64) {
	const w, n = 150.0, 30
	lo, hi := 0.0, d.shown.reach
	if d.shown.centred {
		lo, hi = 1-d.shown.reach, 1+d.shown.reach
	}
	for k := range n {
		c := d.shown.colour(lo + (hi-lo)*(float64(k)+0.5)/n).srgb()
		d.printf("<rect x=\"%s\" y=\"%s\" width=\"%s\" height=\"9\" fill=\"#%02x%02x%02x\"/>", px(x-w+w*float64(k)/n), px(y), px(w/n+0.5), c[0], c[1], c[2])
	}
	d.b.WriteByte('\n')
	for _, m := range []struct{ at, v float64 }{{0, lo}, {0.5, (lo + hi) / 2}, {1, hi}} {
		anchor := [...]string{"start", "middle", "end"}[int(2*m.at)]
		d.printf("<text class=\"faint\" x=\"%s\" y=\"%s\" font-size=\"10\" text-anchor=\"%s\">%s</text>\n", px(x-w+m.at*w), px(y+20), anchor, string(appendNumber(nil, m.v, 4)))
	}
	d.printf("<text class=\"faint\" x=\"%s\" y=\"%s\" font-size=\"10\" text-anchor=\"end\">%s</text>\n", px(x-w-8), px(y+8), escape(d.shown.title))
}

// roundLength is 1, 2 or 5 times a power of ten, not above v.
func roundLength(v float64) float64 {
	if v <= 0 || math.IsInf(v, 0) || math.IsNaN(v) {
		return 1
	}
	unit := math.Pow(10, math.Floor(math.Log10(v)))
	for _, k := range []float64{5, 2} {
		if k*unit <= v {
			return k * unit
		}
	}
	return unit
}

// findings marks the places of findings with their numbers.
func (d *drawing) findings() {
	for i := range d.r.Findings {
		for _, p := range d.r.Findings[i].Places[:min(1, len(d.r.Findings[i].Places))] {
			q := d.frame.at(p.At)
			if q.x < 0 || q.y < 0 || q.x > d.frame.width || q.y > d.frame.height {
				continue
			}
			d.printf("<g><title>%s</title><circle class=\"mark\" cx=\"%s\" cy=\"%s\" r=\"7\"/><text x=\"%s\" y=\"%s\" font-size=\"10\" text-anchor=\"middle\" fill=\"#fff\">%d</text></g>\n",
				escape(d.r.Findings[i].Text), px(q.x), px(q.y), px(q.x), px(q.y+3.5), i+1)
		}
	}
}
