package export

import (
	"bytes"
	"context"
	"encoding/binary"
	"hash/crc32"
	"image"
	"image/color"
	"image/png"
	"io"
	"math"
	"slices"

	"anticlast/formfind/canopy"
	"anticlast/formfind/surface"

	"gonum.org/v1/gonum/spatial/r3"
)

// writePNG writes an axonometric picture, drawn here by a depth buffer: fabric
// in the colours of the default layer with contours, cables, masts and
// supports, a scale bar in metres and the scale of colours. The caution is in a
// text chunk of the file.
func writePNG(ctx context.Context, w io.Writer, r *canopy.Result, o Options) error {
	if err := ctx.Err(); err != nil {
		return err
	}
	const finer = 2
	width := o.pictureWidth()
	f := fit(r, axonometric(-60, 30), width, 0.75*width, 0.055*width)
	// Lines keep their share of the picture.
	p := newPicture(r, f.zoomed(finer), finer*width/1600)
	p.draw()
	m := p.smaller(finer)
	var b bytes.Buffer
	if err := png.Encode(&b, m); err != nil {
		return err
	}
	t := newText(ctx, w)
	// After the header chunk: 8 bytes of signature, 25 of IHDR.
	t.b = append(t.b, b.Bytes()[:33]...)
	for _, pair := range [][2]string{{"Title", latin(oneLine(r.Title))}, {"Disclaimer", canopy.Caution}, {"Software", latin(oneLine(r.Program.Name + " " + r.Program.Version))}} {
		t.b = appendChunk(t.b, "tEXt", pair[0]+"\x00"+pair[1])
	}
	t.b = append(t.b, b.Bytes()[33:]...)
	return t.close()
}

// appendChunk appends a PNG chunk (ISO/IEC 15948, section 5.3).
func appendChunk(b []byte, kind, data string) []byte {
	b = binary.BigEndian.AppendUint32(b, uint32(len(data)))
	start := len(b)
	b = append(b, kind...)
	b = append(b, data...)
	return binary.BigEndian.AppendUint32(b, crc32.ChecksumIEEE(b[start:]))
}

// latin writes what Latin-1 does not have as a question mark.
func latin(s string) string {
	var b []byte
	for _, r := range s {
		if r > 0xff {
			r = '?'
		}
		b = append(b, byte(r))
	}
	return string(b)
}

// picture is being drawn at a multiple of its size.
type picture struct {
	r     *canopy.Result
	f     *frame
	z     *zbuffer
	img   *image.RGBA
	unit  float64 // pixels to a pixel of the finished picture
	size  float64
	shown *layer
}

func newPicture(r *canopy.Result, f *frame, unit float64) *picture {
	w, h := int(math.Ceil(f.width/2))*2, int(math.Ceil(f.height/2))*2
	p := &picture{r: r, f: f, img: image.NewRGBA(image.Rect(0, 0, w, h)), unit: unit}
	for i := range p.img.Pix {
		p.img.Pix[i] = 255
	}
	lo, hi := canopy.Bounds(r.Form.Position)
	p.size = max(r3.Norm(r3.Sub(hi, lo)), 1e-9)
	if all := layers(r); len(all) > 0 {
		p.shown = &all[0]
		p.z = fabricIn(r, f, p.shown)
	}
	return p
}

func (p *picture) draw() {
	r, s, f := p.r, p.r.Structure, p.r.Form
	if p.z != nil {
		p.fabric()
		lo, hi := heights(r)
		if spacing := contourSpacing(hi - lo); spacing > 0 {
			for _, c := range surface.Contours(f.Position, s.Corners, levels(lo, hi, spacing)) {
				points := c.Points
				if c.Closed {
					points = append(slices.Clone(points), points[0])
				}
				p.line(points, 0.9, color.RGBA{130, 118, 104, 255})
			}
		}
	}
	for _, line := range silhouettes(r, p.f.view) {
		p.line(line, 1.6, color.RGBA{130, 118, 104, 255})
	}
	dark, grey, brass := color.RGBA{40, 48, 56, 255}, color.RGBA{88, 96, 104, 255}, color.RGBA{138, 106, 36, 255}
	for i := range s.Lines {
		l := &s.Lines[i]
		if l.Role == "seam" {
			p.line(p.places(l.Nodes), 1, color.RGBA{109, 98, 86, 255})
		} else {
			p.line(p.places(l.Nodes), 4, brass)
		}
	}
	for i := range s.Rings {
		if g := &s.Rings[i]; g.Rigid && len(g.Nodes) > 2 {
			p.line(p.places(append(slices.Clone(g.Nodes), g.Nodes[0])), 4.5, dark)
		}
	}
	most := 0.0
	for _, t := range f.Force {
		most = max(most, math.Abs(t))
	}
	thick := func(force float64) float64 {
		if most == 0 {
			return 1.5
		}
		return 1.2 + 3*math.Sqrt(math.Abs(force)/most)
	}
	chains, loose := chainsAndMembers(s)
	for _, i := range loose {
		w, c := thick(f.Force[i]), dark
		if s.Kind[i].Pushes() {
			w, c = 7, grey
		} else if len(loose) > 500 {
			w = 1.2
		}
		p.line(p.places(s.Ends[i][:]), w, c)
	}
	for _, i := range chains {
		c := &s.Cables[i]
		if c.Kind.Pushes() {
			p.line(p.places(c.Nodes), 7, grey)
		} else {
			p.line(p.places(c.Nodes), thick(f.Force[c.Members[0]]), dark)
		}
	}
	inner := innerNodes(s)
	for i, fixed := range s.Fixed {
		if fixed != 0 && !inner[i] {
			q := p.f.at(f.Position[i])
			if p.z != nil && !p.z.sees(q, 0.004*p.size) {
				continue
			}
			for k := 0.0; k < 15*p.unit; k++ {
				p.rect(q.x-0.55*k, q.y+k, 1.1*k+1, 1, brass)
			}
		}
	}
	p.scale()
}

func (p *picture) places(nodes []int32) []r3.Vec {
	out := make([]r3.Vec, len(nodes))
	for i, v := range nodes {
		out[i] = p.r.Form.Position[v]
	}
	return out
}

func (p *picture) fabric() {
	bottom, top := 0.0, p.shown.reach
	if p.shown.centred {
		bottom, top = 1-p.shown.reach, 1+p.shown.reach
	}
	const steps = 512
	var table [steps]color.RGBA
	for k := range table {
		c := p.shown.colour(bottom + (top-bottom)*(float64(k)+0.5)/steps).srgb()
		table[k] = color.RGBA{c[0], c[1], c[2], 255}
	}
	for y := range min(p.z.h, p.img.Rect.Dy()) {
		for x := range min(p.z.w, p.img.Rect.Dx()) {
			i := y*p.z.w + x
			if math.IsInf(float64(p.z.depth[i]), -1) {
				continue
			}
			c := color.RGBA{128, 128, 128, 255}
			if v := float64(p.z.value[i]); !math.IsNaN(v) {
				c = table[max(0, min(steps-1, int((v-bottom)/(top-bottom)*steps)))]
			}
			p.img.SetRGBA(x, y, c)
		}
	}
}

// line draws a line in space of a width in pixels of the finished picture where
// the fabric does not hide it.
func (p *picture) line(points []r3.Vec, width float64, c color.RGBA) {
	half := width * p.unit / 2
	tolerance := 0.004 * p.size
	for i := 1; i < len(points); i++ {
		a, b := p.f.at(points[i-1]), p.f.at(points[i])
		dx, dy := b.x-a.x, b.y-a.y
		l2 := dx*dx + dy*dy
		for y := int(min(a.y, b.y) - half); y <= int(max(a.y, b.y)+half)+1; y++ {
			// Only the part of the row that the line can reach.
			x0, x1 := min(a.x, b.x)-half, max(a.x, b.x)+half
			if math.Abs(dy) > 1e-9 {
				s0, s1 := (float64(y)-half-1-a.y)/dy, (float64(y)+half+2-a.y)/dy
				lo, hi := max(0, min(s0, s1)), min(1, max(s0, s1))
				if lo > hi {
					continue
				}
				x0, x1 = min(a.x+lo*dx, a.x+hi*dx)-half-1, max(a.x+lo*dx, a.x+hi*dx)+half+1
			}
			for x := int(x0); x <= int(x1)+1; x++ {
				px, py := float64(x)+0.5, float64(y)+0.5
				t := 0.0
				if l2 > 0 {
					t = max(0, min(1, ((px-a.x)*dx+(py-a.y)*dy)/l2))
				}
				if math.Hypot(px-a.x-t*dx, py-a.y-t*dy) > half {
					continue
				}
				at := point{a.x + t*dx, a.y + t*dy, a.depth + t*(b.depth-a.depth)}
				if p.z != nil && !p.z.sees(at, tolerance) {
					continue
				}
				if (image.Point{X: x, Y: y}).In(p.img.Rect) {
					p.img.SetRGBA(x, y, c)
				}
			}
		}
	}
}

func (p *picture) rect(x, y, w, h float64, c color.RGBA) {
	for j := int(y); float64(j) < y+h; j++ {
		for i := int(x); float64(i) < x+w; i++ {
			if (image.Point{X: i, Y: j}).In(p.img.Rect) {
				p.img.SetRGBA(i, j, c)
			}
		}
	}
}

// scale draws a bar of a round length and the scale of colours.
func (p *picture) scale() {
	u := p.unit
	ink := color.RGBA{90, 100, 109, 255}
	length := roundLength(0.2 * p.f.width / p.f.scale)
	w := length * p.f.scale
	x, y := float64(p.img.Rect.Dx())-30*u-w, float64(p.img.Rect.Dy())-24*u
	p.rect(x, y, w, 2*u, ink)
	p.rect(x, y-6*u, 2*u, 6*u, ink)
	p.rect(x+w-2*u, y-6*u, 2*u, 6*u, ink)
	p.write(string(appendNumber(nil, length, 6))+"m", x+w/2, y-18*u, ink)
	if p.shown == nil {
		return
	}
	lo, hi := 0.0, p.shown.reach
	if p.shown.centred {
		lo, hi = 1-p.shown.reach, 1+p.shown.reach
	}
	const n = 120
	left, top, wide := 30*u, float64(p.img.Rect.Dy())-30*u, 240*u
	for k := range n {
		c := p.shown.colour(lo + (hi-lo)*(float64(k)+0.5)/n).srgb()
		p.rect(left+wide*float64(k)/n, top, wide/n+1, 10*u, color.RGBA{c[0], c[1], c[2], 255})
	}
	for k, v := range []float64{lo, (lo + hi) / 2, hi} {
		p.write(string(appendNumber(nil, v, 4)), left+wide*float64(k)/2, top-16*u, ink)
	}
}

// smaller averages squares of k×k pixels.
func (p *picture) smaller(k int) *image.RGBA {
	w, h := p.img.Rect.Dx()/k, p.img.Rect.Dy()/k
	out := image.NewRGBA(image.Rect(0, 0, w, h))
	for y := range h {
		for x := range w {
			var sum [4]int
			for j := range k {
				row := p.img.Pix[p.img.PixOffset(x*k, y*k+j):]
				for i := range 4 * k {
					sum[i%4] += int(row[i])
				}
			}
			o := out.PixOffset(x, y)
			for i := range sum {
				out.Pix[o+i] = uint8((sum[i] + k*k/2) / (k * k))
			}
		}
	}
	return out
}

// figures are the signs that a picture needs, three wide and five high.
var figures = map[rune][5]uint8{
	'0': {7, 5, 5, 5, 7}, '1': {2, 6, 2, 2, 7}, '2': {7, 1, 7, 4, 7}, '3': {7, 1, 7, 1, 7}, '4': {5, 5, 7, 1, 1},
	'5': {7, 4, 7, 1, 7}, '6': {7, 4, 7, 5, 7}, '7': {7, 1, 2, 2, 2}, '8': {7, 5, 7, 5, 7}, '9': {7, 5, 7, 1, 7},
	'.': {0, 0, 0, 0, 2}, 'm': {0, 0, 7, 7, 5}, '-': {0, 0, 7, 0, 0},
}

// write writes figures around x with their top at y.
func (p *picture) write(s string, x, y float64, c color.RGBA) {
	dot := 2 * p.unit
	x -= float64(len(s))*4*dot/2 - dot/2
	for _, r := range s {
		for j, row := range figures[r] {
			for i := range 3 {
				if row>>(2-i)&1 != 0 {
					p.rect(x+float64(i)*dot, y+float64(j)*dot, dot, dot, c)
				}
			}
		}
		x += 4 * dot
	}
}
