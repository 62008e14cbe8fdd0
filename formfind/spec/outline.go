package spec

import (
	"fmt"
	"io"
	"math"
	"path/filepath"
	"strings"

	"anticlast/formfind/canopy"
	"anticlast/formfind/outline"

	"go.yaml.in/yaml/v4"
	"gonum.org/v1/gonum/spatial/r3"
)

// traced is what came of an outline.
type traced struct {
	g     *fields
	o     *outline.Outline
	layer []outlineLayer
}

// outlineLayer is what the model says of a layer.
type outlineLayer struct {
	outline.Layer
	at     ref
	what   string // cable, ridge, valley, fixed, arch, seam, mast, guy, …
	cable  canopy.ModelCable
	stay   canopy.Stay
	rise   float64
	height *float64
}

const (
	defaultSnap       = 1e-3
	defaultCorner     = 10 * math.Pi / 180
	defaultMeshCorner = 30 * math.Pi / 180
)

// beside is a file named in the model while it is read.
type beside struct {
	io.Reader
	io.Closer
	r    *reader
	file string
	rank int
}

// beside opens a file named in the model; what is read of it goes into the
// digest.
func (r *reader) beside(n *yaml.Node, p *place) *beside {
	open := r.open
	if r.options.open != nil {
		open = r.options.open
	}
	f, size, c := open(n.Value)
	if c != nil {
		r.fail(n, p, c.message, c.hint)
		return nil
	}
	if size > r.options.MaxTableBytes {
		f.Close()
		r.fail(n, p, fmt.Sprintf("%q is larger than %d bytes", clip(n.Value), r.options.MaxTableBytes), "")
		return nil
	}
	r.tables++
	b := &beside{Reader: io.TeeReader(io.LimitReader(f, r.options.MaxTableBytes), r.hash), Closer: f, r: r, rank: r.tables}
	b.file = filepath.ToSlash(filepath.Join(filepath.Dir(r.file), filepath.FromSlash(n.Value)))
	if r.file == "-" || filepath.IsAbs(n.Value) {
		b.file = n.Value
	}
	return b
}

// say passes on what is wrong in the file.
func (b *beside) say(p *place, faults []outline.Fault) {
	for _, f := range faults {
		d := Diagnostic{File: b.file, Line: f.Line, Path: p.String(), Message: f.Message, Hint: f.Hint}
		switch {
		case !f.Warning:
			b.r.add(d, b.rank)
		case len(b.r.diags.warnings) < maxErrors:
			b.r.diags.warnings = append(b.r.diags.warnings, placed{d, b.rank})
		}
	}
}

// end reads what is left, so that the digest covers the whole file.
func (b *beside) end(err error) bool {
	if err == nil {
		_, err = io.Copy(io.Discard, b.Reader)
	}
	if err != nil && b.r.fatal == nil {
		b.r.fatal = fmt.Errorf("reading %s: %w", b.file, err)
	}
	return err == nil
}

// unit decides in what unit a file is drawn.
func (r *reader) unit(g *fields, stated outline.Unit, way string) (outline.Unit, bool) {
	u, given := outline.ParseUnit(g.word("units"))
	switch {
	case !given && g.has("units"):
		return u, false
	case !given && stated.Metres > 0:
		return stated, true
	case !given:
		r.fail(g.get("file"), g.p.down("file"), fmt.Sprintf("%q does not say the unit of its coordinates", clip(g.get("file").Value)), "add units, for example units: mm"+way)
		return u, false
	case stated.Metres > 0 && stated != u:
		r.warn(g.get("units"), g.p.down("units"), fmt.Sprintf("%q says that its unit is %s, but the model says %s", clip(g.get("file").Value), stated.Name, u.Name), "the model's is used")
	}
	return u, true
}

// outline reads an outline and adds its points, edges, masts and guys to the
// model; its fabrics follow once rings are known.
func (d *drawn) outline(g *fields) {
	if g == nil {
		return
	}
	r := d.r
	t := &traced{g: g}
	t.layer = d.layers(g)
	n := g.get("file")
	if n == nil || n.Kind != yaml.ScalarNode {
		return
	}
	if g.has("edge") {
		r.fail(g.keyNode("edge"), g.p.down("edge"), "edge is for OBJ and STL meshes; the lines of a drawing are what their layers say", "remove it")
	}
	var read func(io.Reader) (*outline.Drawing, error)
	switch strings.ToLower(filepath.Ext(n.Value)) {
	case ".dxf":
		read = outline.ReadDXF
	case ".csv", ".txt":
		read = outline.ReadCSV
	default:
		r.fail(n, g.p.down("file"), fmt.Sprintf("outlines are not read from %q", clip(n.Value)), "give a .dxf drawing, a .csv table of points, or an .obj or .stl mesh")
		return
	}
	b := r.beside(n, g.p.down("file"))
	if b == nil {
		return
	}
	defer b.Close()
	dr, err := read(b)
	if !b.end(err) {
		return
	}
	b.say(g.p, dr.Faults)
	u, ok := r.unit(g, dr.Unit, "")
	if !ok || len(dr.Faults) > 0 {
		return
	}
	names := dr.Layers()
	b.say(g.p, t.unlisted(dr, names, u))
	missing := false
	for _, l := range t.layer {
		missing = d.missing(l, names) || missing
	}
	if missing || r.diags.failed() {
		return // what is not drawn yet cannot be traced
	}
	dr.Scale(u)
	o := outline.Options{Unit: u, Snap: defaultSnap, Corner: defaultCorner}
	if v, ok := g.quantity("snap"); ok {
		o.Snap = v
	}
	if v, ok := g.quantity("corner"); ok {
		o.Corner = v
	}
	var layers []outline.Layer
	for _, l := range t.layer {
		layers = append(layers, l.Layer)
	}
	found, faults := outline.Trace(dr, layers, o)
	b.say(g.p, faults)
	if found == nil {
		return
	}
	t.o = found
	d.heights(t)
	d.adopt(t)
	d.traced = t
}

// unlisted warns of layers and entities that are left out.
func (t *traced) unlisted(dr *outline.Drawing, names []string, unit outline.Unit) (out []outline.Fault) {
	type use struct{ n, line int }
	uses := map[string]*use{}
	count := func(layer string, line int) {
		if u := uses[layer]; u != nil {
			u.n++
		} else {
			uses[layer] = &use{1, line}
		}
	}
	for _, s := range dr.Segments {
		count(s.Layer, s.Line)
	}
	for _, p := range dr.Points {
		count(p.Layer, p.Line)
	}
	for _, name := range names {
		known := false
		for _, l := range t.layer {
			known = known || strings.EqualFold(l.Name, name)
		}
		if u := uses[name]; !known {
			out = append(out, outline.Fault{Line: u.line, Warning: true, Message: fmt.Sprintf("layer %q (%d line%s and points) is not in the model: left out", clip(name), u.n, plural(u.n)), Hint: "say what it is under layers, or ignore"})
		}
	}
	for _, c := range dr.Replaced {
		for _, l := range t.layer {
			if l.Class != outline.Unused && strings.EqualFold(l.Name, c.Layer) {
				out = append(out, outline.Fault{Line: c.Line, Warning: true, Message: fmt.Sprintf("%d ellipse%s or spline%s on layer %q drawn with %d arcs and lines, at most %.2g %s beside", c.Count, plural(c.Count), plural(c.Count), l.Name, c.Pieces, c.Off, unit.Name), Hint: "draw arcs where that is too far"})
			}
		}
	}
	for _, i := range dr.Ignored {
		for _, l := range t.layer {
			if l.Class != outline.Unused && strings.EqualFold(l.Name, i.Layer) {
				out = append(out, outline.Fault{Line: i.Line, Warning: true, Message: fmt.Sprintf("%d %s on layer %q left out, the first here", i.Count, clip(i.Kind), l.Name), Hint: "outlines are read from LINE, POLYLINE, LWPOLYLINE, ARC, CIRCLE, ELLIPSE, SPLINE (with control points) and POINT: break up blocks, draw other curves as polylines"})
			}
		}
	}
	return out
}

// missing complains about a layer of the model that the drawing does not have.
func (d *drawn) missing(l outlineLayer, names []string) bool {
	if l.Class == outline.Unused {
		return false
	}
	for _, n := range names {
		if strings.EqualFold(n, l.Name) {
			return false
		}
	}
	hint := "the layers with lines or points are " + quotedList(names, "and")
	if near := nearest(l.Name, names); near != "" {
		hint = fmt.Sprintf("did you mean %q?", near)
	} else if len(names) == 0 {
		hint = "the drawing has no lines or points"
	}
	d.r.fail(l.at.n, l.at.p, fmt.Sprintf("nothing is drawn on layer %q", clip(l.Name)), hint)
	return true
}

// layers reads what the layers are.
func (d *drawn) layers(g *fields) (out []outlineLayer) {
	if !g.has("layers") {
		return []outlineLayer{{Layer: outline.Layer{Name: outline.PlainLayer, Class: outline.Border}, what: "fixed", at: ref{outline.PlainLayer, g.node, g.p}}}
	}
	for _, e := range g.named("layers") {
		p := g.p.down("layers").down(e.name)
		l := outlineLayer{Layer: outline.Layer{Name: e.name}, at: ref{e.name, e.kn, p}}
		if e.n.Kind == yaml.MappingNode {
			d.layer(e.n, p, &l)
		} else if l.what = d.r.word(e.n, layerWords, p); l.what == "hole" {
			l.what, l.Hole = "fixed", true
		}
		switch l.what {
		case "cable", "fixed":
			l.Class = outline.Border
		case "ridge", "valley", "arch", "seam":
			l.Class = outline.Inner
		case "mast", "guy":
			l.Class = outline.Stay
		case "point", "anchor":
			l.Class = outline.Points
		}
		l.Cable = l.what == "cable" || l.what == "ridge" || l.what == "valley"
		l.Apart = l.what == "anchor"
		l.Whole = l.rise != 0
		out = append(out, l)
	}
	return out
}

// layer reads the long form of a layer.
func (d *drawn) layer(n *yaml.Node, p *place, l *outlineLayer) {
	h := d.r.section(n, layerSection, p)
	var is []string
	for _, k := range []string{"cable", "ridge", "valley", "fixed", "arch", "seam", "point", "anchor", "mast", "guy"} {
		v := h.get(k)
		if v == nil {
			continue
		}
		kp := p.down(k)
		if v.Kind != yaml.MappingNode && k != "cable" && k != "ridge" && k != "valley" {
			if yes, _ := h.flag(k); yes {
				is = append(is, k)
			}
			continue
		}
		is = append(is, k)
		switch k {
		case "cable", "ridge", "valley":
			if d.r.mapping(v, kp, edgeCableSection) != nil {
				d.cableRule(d.r.section(v, edgeCableSection, kp), &l.cable, fmt.Sprintf("layer %q", l.Name))
			}
		case "arch":
			l.rise = d.r.section(v, outlineArchSection, kp).number("rise")
		case "mast":
			l.stay = d.stayRule(d.r.section(v, layerMastSection, kp), "mast", l.Name)
		case "guy":
			l.stay = d.stayRule(d.r.section(v, layerGuySection, kp), "guy", l.Name)
		default:
			d.r.fail(v, kp, fmt.Sprintf("%s cannot be %s", k, what(v)), "write true")
		}
	}
	l.Hole, _ = h.flag("hole")
	if len(is) == 0 && l.Hole {
		is = []string{"fixed"}
	}
	l.height = h.optional("height")
	switch {
	case len(is) == 0 && h.ok:
		d.r.fail(n, p, fmt.Sprintf("layer %q does not say what its lines are", l.Name), "for example cable: {sag: 10 %}, or fixed: true")
	case len(is) > 1:
		d.r.fail(h.keyNode(is[1]), p.down(is[1]), fmt.Sprintf("layer %q is %s at once", l.Name, list(is, "and")), "keep one of them")
	case l.Hole && is[0] != "fixed" && is[0] != "cable":
		d.r.fail(h.keyNode("hole"), p.down("hole"), fmt.Sprintf("layer %q is a hole and %s", l.Name, is[0]), "the rim of a hole is fixed or a cable")
	}
	if len(is) > 0 {
		l.what = is[0]
	}
}

// stayRule reads the force of masts or guys of a layer.
func (d *drawn) stayRule(g *fields, what, layer string) (s canopy.Stay) {
	d.stayKeys(g, &s, fmt.Sprintf("%s of layer %q", what, layer))
	return s
}

// heights puts points to the heights that layers and the model give them.
func (d *drawn) heights(t *traced) {
	for i, p := range t.o.Points {
		if h := t.layer[p.Layer].height; h != nil {
			t.o.Raise(i, *h)
		}
	}
	n := t.g.get("heights")
	if n == nil {
		return
	}
	p := t.g.p.down("heights")
	if n.Kind != yaml.SequenceNode {
		d.r.fail(n, p, "heights takes a list, not "+what(n), "for example heights: "+outlineSection.get("heights").example)
		return
	}
	index := map[string]int{}
	for i, q := range t.o.Points {
		index[q.Name] = i
	}
	given := map[int]int{}
	for k, c := range n.Content {
		cp := p.item(k)
		if c = d.r.mapping(c, cp, heightSection); c == nil {
			continue
		}
		g := d.r.section(c, heightSection, cp)
		z, ok := g.quantity("z")
		i := d.whichPoint(g, t, index)
		if !ok || i < 0 {
			continue
		}
		if j, twice := given[i]; twice {
			d.r.fail(c, cp, fmt.Sprintf("the height of point %q is given twice", t.o.Points[i].Name), fmt.Sprintf("remove entry %d or %d", j+1, k+1))
		}
		given[i] = k
		t.o.Raise(i, z)
	}
}

// whichPoint finds the point whose height is given, −1 after an error.
func (d *drawn) whichPoint(g *fields, t *traced, index map[string]int) int {
	switch {
	case g.has("point") == g.has("at"):
		if g.ok {
			d.r.fail(g.node, g.p, "a height needs a point or a place", "give one of point and at")
		}
		return -1
	case g.has("point"):
		q, ok := g.ref("point")
		if !ok {
			return -1
		}
		if i, ok := index[q.name]; ok {
			return i
		}
		names := make([]string, 0, len(t.o.Points))
		for _, p := range t.o.Points {
			names = append(names, p.Name)
		}
		hint := "the points are " + quotedList(names, "and")
		if near := nearest(q.name, names); near != "" {
			hint = fmt.Sprintf("did you mean %q?", near)
		}
		d.r.fail(q.n, q.p, fmt.Sprintf("the outline has no point %q", clip(q.name)), hint)
		return -1
	}
	n, p := g.get("at"), g.p.down("at")
	if n.Kind != yaml.SequenceNode || len(n.Content) != 2 {
		d.r.fail(n, p, "at takes [x, y], not "+what(n), "for example at: [0, 9.2]")
		return -1
	}
	sh := &shape{dim: Length}
	x, ok1 := d.r.quantity(n.Content[0], sh, &place{p, "x"})
	y, ok2 := d.r.quantity(n.Content[1], sh, &place{p, "y"})
	if !ok1 || !ok2 {
		return -1
	}
	i, near, next := t.o.Nearest(r3.Vec{X: x, Y: y})
	if i < 0 {
		return -1
	}
	if near > 0.5*next {
		q := t.o.Points[i]
		d.r.fail(n, p, fmt.Sprintf("no point is clearly nearest to [%.6g, %.6g] m: %q at %s is %.3g m away and another %.3g m", x, y, q.Name, t.o.Place(q.At), near, next), "give a place nearer to the point, or its name")
		return -1
	}
	return i
}

// adopt adds points, edges, masts and guys to the model.
func (d *drawn) adopt(t *traced) {
	used := make([]bool, len(t.o.Points))
	first := len(d.m.Points)
	for _, p := range t.o.Points {
		at := t.layer[p.Layer].at
		d.point[p.Name] = len(d.m.Points)
		d.m.Points = append(d.m.Points, canopy.Point{Name: p.Name, At: p.At, Line: line(at.n)})
		d.pointAt = append(d.pointAt, ref{p.Name, at.n, at.p})
	}
	for _, e := range t.o.Edges {
		used[e.From], used[e.To] = true, true
		l := t.layer[e.Layer]
		at := ref{e.Name, l.at.n, l.at.p}
		a, b := t.o.Points[e.From], t.o.Points[e.To]
		ed := canopy.Edge{Name: e.Name, From: a.Name, To: b.Name, Line: line(l.at.n)}
		cable, has, role := -1, l.what, ""
		switch l.what {
		case "cable", "ridge", "valley":
			ed.Kind, ed.Cable, has = canopy.EdgeCable, e.Name, "cable"
			if l.what != "cable" {
				role = l.what
			}
			c := l.cable
			c.Name, c.Edges, c.Line = e.Name, []string{e.Name}, ed.Line
			cable = d.addCable(c, at)
		case "seam":
			ed.Kind = canopy.EdgeSeam
		default:
			ed.Kind, has = canopy.EdgeFixed, "fixed"
			ed.Arch, ed.Arc, ed.Through = l.what == "arch", e.Arc, e.Through
			if l.rise != 0 && !e.Arc {
				m := r3.Scale(0.5, r3.Add(a.At, b.At))
				ed.Arc, ed.Through = true, r3.Add(m, r3.Vec{Z: l.rise})
			}
		}
		d.edge[e.Name] = len(d.m.Edges)
		d.m.Edges = append(d.m.Edges, ed)
		d.edgeAt = append(d.edgeAt, at)
		d.edgeGood = append(d.edgeGood, true)
		d.edgeHas = append(d.edgeHas, has)
		d.edgeCableOf = append(d.edgeCableOf, cable)
		d.edgeRole = append(d.edgeRole, role)
	}
	for _, e := range t.o.Stays {
		used[e.From], used[e.To] = true, true
		l := t.layer[e.Layer]
		s := l.stay
		s.Name, s.Mast, s.Line = e.Name, l.what == "mast", line(l.at.n)
		low, high := t.o.Points[e.From], t.o.Points[e.To]
		if low.At.Z > high.At.Z {
			low, high = high, low
		}
		s.From, s.To = low.Name, high.Name
		if !s.Mast {
			s.From, s.To = high.Name, low.Name
		}
		d.stay[s.Name] = len(d.m.Stays)
		d.m.Stays = append(d.m.Stays, s)
		d.stayAt = append(d.stayAt, ref{s.Name, l.at.n, l.at.p})
	}
	d.used = append(d.used[:first:first], used...)
}

// outlineFabrics fills the faces of the outline.
func (d *drawn) outlineFabrics() {
	t := d.traced
	if t == nil || !t.g.has("fabric") {
		return
	}
	n, p := t.g.get("fabric"), t.g.p.down("fabric")
	if d.r.mapping(n, p, outlineFabricSection) == nil {
		return
	}
	g := d.r.section(n, outlineFabricSection, p)
	name := g.text("name")
	if name == "" {
		name = "fabric"
	} else if c := checkName(name); c != "" {
		d.r.fail(g.get("name"), p.down("name"), fmt.Sprintf("%q cannot be the name of a fabric: %s", clip(name), c), "names are made of "+nameRule)
	}
	var common canopy.ModelFabric
	common.Line = line(n)
	common.Warp, common.Weft = d.r.warpWeft(g, "prestress")
	d.r.plausiblePrestress(g, common.Warp, common.Weft)
	common.MeshSize = g.number("mesh")
	switch g.word("pattern") {
	case "along sides":
		common.Pattern = canopy.FabricSides
	case "free":
		common.Pattern = canopy.FabricFree
	}
	d.r.material(g, &common.Properties)
	rule := d.outlineWarp(g, &common)
	radial := false
	for k, face := range t.o.Faces {
		fab := common
		fab.Name = name
		if len(t.o.Faces) > 1 {
			fab.Name = fmt.Sprintf("%s:%d", name, k+1)
		}
		fab.Properties.Name = fab.Name
		at := ref{fab.Name, n, p}
		edges := func(list []int) (names []string, refs []ref) {
			for _, e := range list {
				q := t.o.Edges[e]
				names = append(names, q.Name)
				refs = append(refs, ref{q.Name, n, p})
			}
			return names, refs
		}
		var refs []ref
		fab.Boundary, refs = edges(face.Boundary)
		d.boundaryRefs = append(d.boundaryRefs, refs)
		for i, h := range face.Holes {
			names, refs := edges(h)
			fab.Holes = append(fab.Holes, names)
			d.holeRefs = append(d.holeRefs, holeRefs{what: fmt.Sprintf("hole %d of fabric %q", i+1, fab.Name), refs: refs})
		}
		fab.Lines, refs = edges(face.Lines)
		for _, q := range refs {
			d.lineRefs = append(d.lineRefs, insideRef{q, len(d.m.Fabrics)})
		}
		d.faceRing(&fab, &face)
		for _, i := range face.Inside {
			q := t.o.Points[i].Name
			if fab.Ring != "" && d.m.Rings[d.ring[fab.Ring]].At == q {
				continue // the centre of a ring is in its opening
			}
			fab.Inside = append(fab.Inside, q)
			d.insideRefs = append(d.insideRefs, insideRef{ref{q, n, p}, len(d.m.Fabrics)})
		}
		if fab.Ring != "" {
			radial = true
			if fab.WarpRule = rule; rule == canopy.WarpAlong && !g.has("warp") {
				fab.WarpRule = canopy.WarpRadial
			}
		}
		d.m.Fabrics = append(d.m.Fabrics, fab)
		d.fabricAt = append(d.fabricAt, at)
	}
	d.outlineAir(g, len(t.o.Faces))
	if rule != canopy.WarpAlong && !radial {
		d.r.fail(g.get("warp"), p.down("warp"), fmt.Sprintf("the warp of the outline's fabric is %s but there is no ring in it", g.get("warp").Value), "give a direction such as [1, 0, 0]")
	}
}

// outlineWarp reads the warp direction.
func (d *drawn) outlineWarp(g *fields, fab *canopy.ModelFabric) canopy.WarpRule {
	fab.WarpDir = r3.Vec{X: 1}
	n, p := g.get("warp"), g.p.down("warp")
	switch {
	case n == nil:
	case n.Kind == yaml.SequenceNode:
		fab.WarpDir, _ = d.r.direction(n, p)
	case n.Kind == yaml.MappingNode:
		from, to, good := d.ends(d.r.section(n, warpBetweenSection, p), "the warp direction", "from", "to")
		if good {
			fab.WarpDir = r3.Unit(r3.Sub(d.m.Points[d.point[to]].At, d.m.Points[d.point[from]].At))
		}
	default:
		switch d.r.word(n, g.shape("warp").of[0].words, p) {
		case "radial":
			return canopy.WarpRadial
		case "around":
			return canopy.WarpAround
		}
	}
	return canopy.WarpAlong
}

// faceRing finds the ring in a face.
func (d *drawn) faceRing(fab *canopy.ModelFabric, face *outline.Face) {
	for i, ring := range d.m.Rings {
		k, ok := d.point[ring.At]
		if !ok {
			continue
		}
		at := d.m.Points[k].At
		if !face.Contains(at.X, at.Y) {
			continue
		}
		w := d.ringAt[i]
		if fab.Ring != "" {
			d.r.fail(w.n, w.p, fmt.Sprintf("rings %q and %q lie in one face of the outline", fab.Ring, ring.Name), "draw a line between them that divides it")
			continue
		}
		fab.Ring = ring.Name
		d.ringUsers[i] = append(d.ringUsers[i], ref{fab.Name, w.n, w.p})
	}
}

// isMesh tells from its name whether a file is a mesh.
func isMesh(file string) bool {
	e := strings.ToLower(filepath.Ext(file))
	return e == ".obj" || e == ".stl"
}
