package outline

import (
	"bufio"
	"bytes"
	"errors"
	"fmt"
	"io"
	"math"
	"slices"
	"sort"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"

	"gonum.org/v1/gonum/spatial/r3"
)

// ReadDXF reads an ASCII DXF drawing. What is wrong in the drawing is in
// Drawing.Faults; the error is one of reading r.
func ReadDXF(r io.Reader) (*Drawing, error) {
	x := &dxf{in: bufio.NewReaderSize(r, 1<<16), d: &Drawing{}, ignored: map[[2]string]*Ignored{}, replaced: map[string]*Replaced{}}
	err := x.read()
	for _, g := range x.replaced {
		x.d.Replaced = append(x.d.Replaced, *g)
	}
	slices.SortFunc(x.d.Replaced, func(a, b Replaced) int { return strings.Compare(a.Layer, b.Layer) })
	for _, g := range x.ignored {
		x.d.Ignored = append(x.d.Ignored, *g)
	}
	sort.Slice(x.d.Ignored, func(i, j int) bool {
		a, b := x.d.Ignored[i], x.d.Ignored[j]
		if a.Kind != b.Kind {
			return a.Kind < b.Kind
		}
		return a.Layer < b.Layer
	})
	return x.d, err
}

// group is one pair of lines.
type group struct {
	code  int
	value string
	line  int // of the value
}

// dxf goes through the groups of a file.
type dxf struct {
	in       *bufio.Reader
	d        *Drawing
	line     int
	back     *group // read once more
	ignored  map[[2]string]*Ignored
	replaced map[string]*Replaced // by layer
	count    int
	pieces   int // in the place of curves
	path     int
	stopped  bool
}

const longest = 1 << 16 // of a line

// text reads one line without its end. What it returns holds until the next one
// is read.
func (x *dxf) text() ([]byte, error) {
	b, err := x.in.ReadSlice('\n')
	if errors.Is(err, bufio.ErrBufferFull) {
		return nil, fmt.Errorf("longer than %d bytes", longest)
	}
	if err != nil && (err != io.EOF || len(b) == 0) {
		return nil, err
	}
	x.line++
	return bytes.TrimRight(b, "\r\n"), nil
}

// used reports whether the value of a group matters to the reader.
func used(code int) bool {
	switch code {
	case 0, 2, 8, 9, 10, 11, 20, 21, 30, 31, 38, 40, 41, 42, 50, 51, 67, 70, 71, 210, 220, 230:
		return true
	}
	return false
}

// decode makes text of bytes: UTF-8 as newer drawings have it, else Latin-1,
// with the escapes \U+XXXX of older ones.
func decode(b []byte) string {
	s := string(b)
	if !utf8.Valid(b) {
		r := make([]rune, len(b))
		for i, c := range b {
			r[i] = rune(c)
		}
		s = string(r)
	}
	for {
		before, after, found := strings.Cut(s, `\U+`)
		if !found || len(after) < 4 || len(s) > 1024 {
			return s
		}
		v, err := strconv.ParseUint(after[:4], 16, 16)
		if err != nil {
			return s
		}
		s = before + string(rune(v)) + after[4:]
	}
}

// next returns the next group; false at the end of the file or after a fault.
func (x *dxf) next() (group, bool, error) {
	if x.back != nil {
		g := *x.back
		x.back = nil
		return g, true, nil
	}
	if x.stopped {
		return group{}, false, nil
	}
	stop := func(hint, format string, args ...any) (group, bool, error) {
		x.stopped = true
		x.d.fail(x.line, hint, format, args...)
		return group{}, false, nil
	}
	code, err := x.text()
	if err == io.EOF {
		return group{}, false, nil
	}
	if err != nil {
		return x.broken(err)
	}
	c, err := strconv.Atoi(string(bytes.TrimSpace(bytes.TrimPrefix(code, []byte("\ufeff")))))
	if err != nil || c < -5 || c > 1071 {
		if x.line == 1 {
			return stop("save it as an ASCII DXF drawing (release 12 to 2018)", "%s", notDXF(decode(code)))
		}
		return stop("the file is damaged, or not a DXF drawing", "a group code is expected, not %q", short(decode(code)))
	}
	value, err := x.text()
	if err == io.EOF {
		return stop("the file is cut off", "the value of group %d is missing", c)
	}
	if err != nil {
		return x.broken(err)
	}
	g := group{code: c, line: x.line}
	if used(c) {
		g.value = decode(value)
	}
	return g, true, nil
}

// broken tells a fault of the file from one of reading it.
func (x *dxf) broken(err error) (group, bool, error) {
	x.stopped = true
	if strings.HasPrefix(err.Error(), "longer than") {
		x.d.fail(x.line+1, "the file is damaged, or not a DXF drawing", "a line is %s", err.Error())
		return group{}, false, nil
	}
	return group{}, false, err
}

// notDXF says what a file is that does not start with a group code.
func notDXF(first string) string {
	switch {
	case strings.HasPrefix(first, "AC10"):
		return "the file is a DWG drawing"
	case strings.Contains(first, "Binary DXF"):
		return "the file is a binary DXF drawing"
	}
	return fmt.Sprintf("the file does not start like a DXF drawing: %q", short(first))
}

// short makes text fit a message.
func short(s string) string {
	s = strings.TrimSpace(s)
	if r := []rune(s); len(r) > 30 {
		s = string(r[:29]) + "…"
	}
	return printable(s)
}

// printable replaces control characters.
func printable(s string) string {
	return strings.Map(func(r rune) rune {
		if unicode.IsPrint(r) {
			return r
		}
		return '\uFFFD'
	}, s)
}

func (x *dxf) read() error {
	section, entities, ended := "", false, false
	for {
		g, ok, err := x.next()
		if err != nil {
			return err
		}
		if !ok {
			break
		}
		if g.code != 0 {
			if section == "HEADER" && g.code == 9 {
				if err := x.variable(g.value); err != nil {
					return err
				}
			}
			continue
		}
		switch name := strings.TrimSpace(g.value); {
		case name == "SECTION":
			t, ok, err := x.next()
			if err != nil {
				return err
			}
			if ok && t.code == 2 {
				section = strings.TrimSpace(t.value)
				entities = entities || section == "ENTITIES"
			}
		case name == "ENDSEC":
			section = ""
		case name == "EOF":
			ended = true
		case section == "ENTITIES":
			if err := x.entity(name, g.line); err != nil {
				return err
			}
		}
		if ended {
			break
		}
	}
	switch {
	case x.stopped:
	case x.line == 0:
		x.d.fail(0, "", "the drawing is empty")
	case !entities:
		x.d.fail(x.line, "save the drawing again as ASCII DXF", "there is no section ENTITIES")
	case !ended:
		x.d.fail(x.line, "the file is cut off; save the drawing again", "the file ends without the group EOF")
	}
	return nil
}

// insUnits are the values of $INSUNITS that are lengths we know.
var insUnits = map[int]string{1: "in", 2: "ft", 4: "mm", 5: "cm", 6: "m", 7: "km", 14: "dm"}

func (x *dxf) variable(name string) error {
	if strings.TrimSpace(name) != "$INSUNITS" {
		return nil
	}
	g, ok, err := x.next()
	if err != nil || !ok {
		return err
	}
	if g.code != 70 {
		x.back = &g
		return nil
	}
	if v, err := strconv.Atoi(strings.TrimSpace(g.value)); err == nil {
		x.d.Unit, _ = ParseUnit(insUnits[v])
	}
	return nil
}

// props are the groups of one entity that matter.
type props struct {
	line       int
	layer      string
	paper, bad bool
	x, y, z    [2]float64 // groups 10, 20, 30 and 11, 21, 31
	radius     float64    // of an ellipse: minor over major axis
	start, end float64    // degrees; of an ellipse radians
	hasEnd     bool
	flags      int
	elevation  float64
	normal     r3.Vec
	vertex     []vertex
	// Of a spline.
	degree  int
	knot    []float64
	weight  []float64
	control []r3.Vec
}

// vertex is one corner of a polyline; its bulge is the tangent of a quarter of
// the angle of the arc to the next.
type vertex struct {
	at    r3.Vec
	bulge float64
}

func (x *dxf) entity(kind string, line int) error {
	x.count++
	if x.count > maxEntities {
		if !x.stopped {
			x.d.fail(line, "keep only the layers of the outline", "the drawing has more than %d entities", maxEntities)
		}
		x.stopped = true
		return nil
	}
	p := &props{line: line, normal: r3.Vec{Z: 1}}
	if err := x.props(kind, p); err != nil {
		return err
	}
	if kind == "POLYLINE" {
		if err := x.vertices(p); err != nil {
			return err
		}
	}
	switch kind {
	case "SEQEND", "ATTRIB", "VERTEX": // parts of what was counted already
		return nil
	}
	switch {
	case p.bad:
		return nil
	case p.paper:
		x.ignore("entities in paper space", "", line)
		return nil
	}
	if kind == "POLYLINE" && p.flags&(16|64) != 0 {
		x.ignore("POLYLINE that is a mesh", p.layer, line)
		return nil
	}
	before := len(x.d.Segments)
	switch kind {
	case "LINE":
		x.segment(p, r3.Vec{X: p.x[0], Y: p.y[0], Z: p.z[0]}, r3.Vec{X: p.x[1], Y: p.y[1], Z: p.z[1]})
	case "POINT":
		x.d.Points = append(x.d.Points, Mark{p.layer, r3.Vec{X: p.x[0], Y: p.y[0], Z: p.z[0]}, line})
	case "CIRCLE":
		x.circle(p)
	case "ARC":
		x.arc(p)
	case "ELLIPSE":
		x.ellipse(p)
	case "SPLINE":
		x.spline(p)
	case "LWPOLYLINE":
		for i := range p.vertex {
			p.vertex[i].at.Z = p.elevation
		}
		x.polyline(p, true)
	case "POLYLINE":
		flat := p.flags&8 == 0
		if flat {
			for i := range p.vertex {
				p.vertex[i].at.Z = p.z[0]
			}
		}
		x.polyline(p, flat)
	default:
		x.ignore(kind, p.layer, line)
	}
	if len(x.d.Segments) > before {
		x.path++
	}
	return nil
}

func (x *dxf) ignore(kind, layer string, line int) {
	k := [2]string{short(kind), layer}
	if g := x.ignored[k]; g != nil {
		g.Count++
	} else if len(x.ignored) < 1000 {
		x.ignored[k] = &Ignored{k[0], layer, 1, line}
	}
}

// props reads the groups of an entity up to the next one.
func (x *dxf) props(kind string, p *props) error {
	known := kind == "ELLIPSE" || kind == "SPLINE" || kind == "LINE" || kind == "POINT" || kind == "CIRCLE" || kind == "ARC" || kind == "LWPOLYLINE" || kind == "POLYLINE" || kind == "VERTEX"
	for {
		g, ok, err := x.next()
		if err != nil {
			return err
		}
		if !ok {
			p.bad = p.bad || x.stopped
			return nil
		}
		if g.code == 0 {
			x.back = &g
			return nil
		}
		if !known && g.code != 8 && g.code != 67 {
			continue
		}
		number := func(to *float64) {
			v, err := strconv.ParseFloat(strings.TrimSpace(g.value), 64)
			if err != nil || !usable(v) {
				if !p.bad {
					x.d.fail(g.line, "save the drawing again", "group %d of %s is not a usable number: %q", g.code, kind, short(g.value))
				}
				p.bad = true
				return
			}
			*to = v
		}
		whole := func(to *int) {
			v, err := strconv.Atoi(strings.TrimSpace(g.value))
			if err != nil {
				if !p.bad {
					x.d.fail(g.line, "save the drawing again", "group %d of %s is not a whole number: %q", g.code, kind, short(g.value))
				}
				p.bad = true
				return
			}
			*to = v
		}
		light := kind == "LWPOLYLINE"
		last := func() *vertex {
			if len(p.vertex) == 0 {
				p.vertex = append(p.vertex, vertex{})
			}
			return &p.vertex[len(p.vertex)-1]
		}
		if kind == "SPLINE" {
			if full := p.splineGroup(g, number, whole); full {
				x.d.fail(g.line, "", "a SPLINE has more than %d numbers", maxEntities)
				x.stopped, p.bad = true, true
				return nil
			}
			if g.code != 8 && g.code != 67 {
				continue
			}
		}
		switch g.code {
		case 8:
			p.layer = printable(strings.TrimSpace(g.value))
		case 67:
			var v int
			whole(&v)
			p.paper = v == 1
		case 10:
			if light {
				if len(p.vertex) >= maxEntities {
					x.d.fail(g.line, "", "a polyline has more than %d vertices", maxEntities)
					x.stopped, p.bad = true, true
					return nil
				}
				p.vertex = append(p.vertex, vertex{})
				number(&last().at.X)
			} else {
				number(&p.x[0])
			}
		case 20:
			if light {
				number(&last().at.Y)
			} else {
				number(&p.y[0])
			}
		case 30:
			number(&p.z[0])
		case 11:
			number(&p.x[1])
		case 21:
			number(&p.y[1])
		case 31:
			number(&p.z[1])
		case 38:
			number(&p.elevation)
		case 40:
			if kind == "CIRCLE" || kind == "ARC" || kind == "ELLIPSE" {
				number(&p.radius)
			}
		case 41:
			if kind == "ELLIPSE" {
				number(&p.start)
			}
		case 42:
			if kind == "ELLIPSE" {
				number(&p.end)
				p.hasEnd = true
			} else if light {
				number(&last().bulge)
			} else {
				number(&p.start)
			}
		case 50:
			number(&p.start)
		case 51:
			number(&p.end)
		case 70:
			whole(&p.flags)
		case 210:
			number(&p.normal.X)
		case 220:
			number(&p.normal.Y)
		case 230:
			number(&p.normal.Z)
		}
	}
}

// splineGroup takes a group of a SPLINE; full says that there are too many.
func (p *props) splineGroup(g group, number func(*float64), whole func(*int)) (full bool) {
	var v float64
	switch g.code {
	case 71:
		whole(&p.degree)
	case 40:
		number(&v)
		p.knot = append(p.knot, v)
	case 41:
		number(&v)
		p.weight = append(p.weight, v)
	case 10:
		number(&v)
		p.control = append(p.control, r3.Vec{X: v})
	case 20, 30:
		if number(&v); len(p.control) == 0 {
			break
		}
		if c := &p.control[len(p.control)-1]; g.code == 20 {
			c.Y = v
		} else {
			c.Z = v
		}
	}
	return len(p.knot)+len(p.weight)+len(p.control) > maxEntities
}

// vertices reads the VERTEX entities of a POLYLINE up to SEQEND.
func (x *dxf) vertices(p *props) error {
	for {
		g, ok, err := x.next()
		if err != nil {
			return err
		}
		if !ok {
			p.bad = true
			return nil
		}
		kind := strings.TrimSpace(g.value)
		if g.code != 0 || kind != "VERTEX" && kind != "SEQEND" {
			x.back = &g
			x.d.fail(g.line, "save the drawing again", "the POLYLINE of line %d has no SEQEND", p.line)
			p.bad = true
			return nil
		}
		v := &props{line: g.line}
		if err := x.props(kind, v); err != nil {
			return err
		}
		p.bad = p.bad || v.bad
		if kind == "SEQEND" {
			return nil
		}
		if v.flags&16 != 0 { // control point of a spline frame
			continue
		}
		if x.count++; x.count > maxEntities {
			if !x.stopped {
				x.d.fail(g.line, "keep only the layers of the outline", "the drawing has more than %d entities", maxEntities)
			}
			x.stopped, p.bad = true, true
			return nil
		}
		p.vertex = append(p.vertex, vertex{r3.Vec{X: v.x[0], Y: v.y[0], Z: v.z[0]}, v.start})
	}
}

// axes returns the directions of an object's own coordinates in the world, by
// the arbitrary axis rule of the DXF reference.
func (p *props) axes() (ax, ay, az r3.Vec) {
	az = r3.Vec{Z: 1}
	if n := r3.Norm(p.normal); n > 1e-12 {
		az = r3.Scale(1/n, p.normal)
	}
	const near = 1.0 / 64
	if math.Abs(az.X) < near && math.Abs(az.Y) < near {
		ax = r3.Unit(r3.Cross(r3.Vec{Y: 1}, az))
	} else {
		ax = r3.Unit(r3.Cross(r3.Vec{Z: 1}, az))
	}
	return ax, r3.Cross(az, ax), az
}

func (p *props) world() func(v r3.Vec) r3.Vec {
	ax, ay, az := p.axes()
	if az == (r3.Vec{Z: 1}) {
		return func(v r3.Vec) r3.Vec { return v }
	}
	return func(v r3.Vec) r3.Vec {
		return r3.Add(r3.Scale(v.X, ax), r3.Add(r3.Scale(v.Y, ay), r3.Scale(v.Z, az)))
	}
}

func (x *dxf) segment(p *props, a, b r3.Vec) {
	x.d.Segments = append(x.d.Segments, Segment{Layer: p.layer, Path: x.path, A: a, B: b, Line: p.line})
}

func (x *dxf) arcSegment(p *props, a, m, b r3.Vec) {
	x.d.Segments = append(x.d.Segments, Segment{Layer: p.layer, Path: x.path, A: a, B: b, Arc: true, Through: m, Line: p.line})
}

func (p *props) at(degrees float64) r3.Vec {
	s, c := math.Sincos(degrees * math.Pi / 180)
	// Quarters exactly, so that circles close and mirror.
	switch math.Mod(degrees, 360) {
	case 0:
		s, c = 0, 1
	case 90, -270:
		s, c = 1, 0
	case 180, -180:
		s, c = 0, -1
	case 270, -90:
		s, c = -1, 0
	}
	return r3.Vec{X: p.x[0] + p.radius*c, Y: p.y[0] + p.radius*s, Z: p.z[0]}
}

// circle becomes four quarters.
func (x *dxf) circle(p *props) {
	if !(p.radius > 0) {
		x.d.fail(p.line, "", "the CIRCLE has no radius")
		return
	}
	w := p.world()
	for k := range 4 {
		a := 90 * float64(k)
		x.arcSegment(p, w(p.at(a)), w(p.at(a+45)), w(p.at(a+90)))
	}
}

func (x *dxf) arc(p *props) {
	if !(p.radius > 0) {
		x.d.fail(p.line, "", "the ARC has no radius")
		return
	}
	span := math.Mod(p.end-p.start, 360)
	if span <= 0 {
		span += 360
	}
	if span > 359.999999 {
		x.circle(p)
		return
	}
	w := p.world()
	x.arcSegment(p, w(p.at(p.start)), w(p.at(p.start+span/2)), w(p.at(p.start+span)))
}

// polyline becomes a segment for each pair of vertices.
func (x *dxf) polyline(p *props, flat bool) {
	n := len(p.vertex)
	if n < 2 {
		x.d.fail(p.line, "remove it or use a POINT", "the polyline has %d vertices", n)
		return
	}
	w := p.world()
	if !flat {
		w = func(v r3.Vec) r3.Vec { return v }
	}
	last := n - 1
	if p.flags&1 != 0 && n > 2 {
		last = n
	}
	if p.flags&1 != 0 && n == 2 && (p.vertex[0].bulge != 0 || p.vertex[1].bulge != 0) {
		last = n // two arcs that make a circle
	}
	for k := range last {
		a, b := p.vertex[k], p.vertex[(k+1)%n]
		if a.at == b.at {
			continue // a vertex twice, as many programs close a line
		}
		if !flat || a.bulge == 0 {
			x.segment(p, w(a.at), w(b.at))
			continue
		}
		// The rise of the arc over its chord is half the bulge times the
		// chord; a positive bulge turns left, so it lies to the right.
		dx, dy := b.at.X-a.at.X, b.at.Y-a.at.Y
		m := r3.Scale(0.5, r3.Add(a.at, b.at))
		m.X += a.bulge / 2 * dy
		m.Y -= a.bulge / 2 * dx
		if !usable(m.X, m.Y) {
			x.d.fail(p.line, "", "the arc of a polyline is too large: bulge %g", a.bulge)
			continue
		}
		x.arcSegment(p, w(a.at), w(m), w(b.at))
	}
}
