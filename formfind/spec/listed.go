package spec

import (
	"bytes"
	"fmt"
	"hash/maphash"
	"math"
	"unicode/utf8"
	"unsafe"

	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

// listed reads a listed structure straight into flat arrays. It returns nil
// after errors that leave nothing to go on with.
func (r *reader) listed(f *fields) *canopy.Structure {
	n, p := f.get("listed"), f.p.down("listed")
	if r.mapping(n, p, listedSection) == nil {
		return nil
	}
	g := r.section(n, listedSection, p)
	l := &lister{r: r, g: g, s: &canopy.Structure{}}
	l.fabrics()
	if !l.nodes() {
		return nil
	}
	l.supports()
	l.members()
	l.triangles()
	l.loads()
	if r.fatal != nil || r.diags.failed() {
		return nil
	}
	l.cables()
	l.connected()
	l.enclose()
	return l.s
}

// lister fills a structure from tables.
type lister struct {
	r     *reader
	g     *fields
	s     *canopy.Structure
	ids   nodeIndex
	line  []int32 // of each node
	file  string  // of the nodes, for messages
	col   int     // of their rows, where that is known
	rank  int
	quiet bool // some nodes could not be read, so that others seem missing

	fabric map[string]int
	preset []preset
	cable  []span
	air    []air
}

// preset is what the triangles of a fabric have unless they say otherwise.
type preset struct {
	stress [2]float64
	warp   r3.Vec
}

// span is a run of members of one cable.
type span struct {
	name        string
	first, last int
	line, col   int
	file        string
	rank        int
}

func (l *lister) fabrics() {
	l.fabric = map[string]int{}
	for _, e := range l.g.named("fabrics") {
		p := l.g.p.down("fabrics").down(e.name)
		if l.r.mapping(e.n, p, listedFabricSection) == nil {
			continue
		}
		g := l.r.section(e.n, listedFabricSection, p)
		var pre preset
		pre.stress[0], pre.stress[1] = l.r.warpWeft(g, "prestress")
		l.r.plausiblePrestress(g, pre.stress[0], pre.stress[1])
		if n := g.get("warp"); n != nil {
			pre.warp, _ = l.r.direction(n, p.down("warp"))
		}
		fab := canopy.Fabric{Name: e.name}
		l.r.material(g, &fab)
		if a, ok := l.r.air(g, e.name); ok {
			l.air = append(l.air, a)
		}
		l.fabric[e.name] = len(l.s.Fabrics)
		l.s.Fabrics = append(l.s.Fabrics, fab)
		l.preset = append(l.preset, pre)
	}
}

// grow makes room for the rows that a table is expected to have.
func grow[T any](s []T, t *tableReader) []T {
	if t.count == 100 || t.count == 0 {
		if rows, certain := t.hint(); certain || t.count == 100 {
			want := min(rows+rows/50+16, 1<<26)
			if want > cap(s) {
				s = append(make([]T, 0, want), s...)
			}
		}
	}
	return s
}

func (l *lister) nodes() bool {
	s := l.s
	var index [4]int
	for i, k := range []string{"name", "x", "y", "z"} {
		index[i] = nodeColumns.index(k)
	}
	named := false
	count, ok := l.r.table(l.g, "nodes", func(t *tableReader) {
		w := &t.row
		l.file, l.rank = t.file, t.rank
		if len(s.Position) >= math.MaxInt32-1 {
			return
		}
		s.Position = grow(s.Position, t)
		l.line = grow(l.line, t)
		line, col := t.where(-1)
		l.line = append(l.line, int32(line))
		s.Position = append(s.Position, r3.Vec{X: w.value[index[1]], Y: w.value[index[2]], Z: w.value[index[3]]})
		if t.count == 0 {
			named, l.col = w.filled(index[0]), col
		}
		if w.filled(index[0]) != named {
			if !t.bad() {
				t.fail(index[0], "some nodes have a name and some have none", "name all of them or none")
			}
			return
		}
		if named {
			name := w.text[index[0]]
			if c := badLabel(name); c != "" {
				t.fail(index[0], fmt.Sprintf("%q cannot be the name of a node: %s", clip(string(name)), c), "")
				name = nil
			}
			// The list copies the letters, so the name may be a view.
			l.ids.names.Append(unsafe.String(unsafe.SliceData(name), len(name)))
		}
	})
	if len(s.Position) == 0 {
		if count == 0 && l.g.has("nodes") && !l.r.diags.failed() {
			l.r.fail(l.g.get("nodes"), l.g.p.down("nodes"), "there are no nodes", "")
		}
		return false
	}
	if l.r.fatal != nil {
		return false
	}
	l.quiet = !ok
	l.ids.n = len(s.Position)
	l.ids.named = named
	if named && l.ids.names.Len() != l.ids.n {
		return false // already complained about
	}
	twice := 0
	l.ids.build(func(i, j int) {
		twice++
		if twice > maxPerTable {
			l.r.diags.more++
			return
		}
		name := l.ids.names.At(j)
		l.r.add(Diagnostic{File: l.file, Line: max(int(l.line[j]), 0), Column: l.col, Text: name, Path: l.g.p.down("nodes").item(j).String(),
			Message: fmt.Sprintf("node %q is here twice", clip(name)), Hint: fmt.Sprintf("the first is in line %d; give each its own name", l.line[i])}, l.rank)
	})
	if l.ids.ordinal {
		l.ids.names = canopy.Names{}
		l.ids.named = false
	}
	s.NodeName = l.ids.names
	s.Fixed = make([]canopy.Freedom, len(s.Position))
	return true
}

// badLabel says what is wrong with a name in a table, "" when nothing.
func badLabel(b []byte) string {
	if len(b) > 64 {
		return "it is longer than 64 bytes"
	}
	ascii := true
	for _, c := range b {
		if c < 0x20 || c == 0x7f || c == ',' || c == '"' {
			return fmt.Sprintf("it has %q", string(rune(c)))
		}
		if c >= 0x80 {
			ascii = false
		}
	}
	if !ascii && !utf8.Valid(b) {
		return "it is not UTF-8 text"
	}
	return ""
}

// node finds the node that key k of the row names, −1 after an error.
func (l *lister) node(t *tableReader, k int) int32 {
	if !t.row.filled(k) {
		return -1
	}
	if i := l.ids.find(t.row.text[k]); i >= 0 {
		return i
	}
	t.row.has |= 1 << 31
	if l.quiet {
		return -1
	}
	name := string(t.row.text[k])
	hint := ""
	switch {
	case !l.ids.named:
		hint = fmt.Sprintf("nodes are called by number, 0 to %d", l.ids.n-1)
	case t.fails >= maxPerTable: // not shown
	case l.ids.n <= 2000:
		names := make([]string, l.ids.n)
		for i := range names {
			names[i] = l.ids.names.At(i)
		}
		if near := nearest(name, names); near != "" {
			hint = fmt.Sprintf("did you mean %q?", near)
		} else if l.ids.n <= 12 {
			hint = "the nodes are " + list(names, "and")
		}
	}
	t.fail(k, fmt.Sprintf("node %q is not defined", clip(name)), hint)
	return -1
}

func (l *lister) supports() {
	kn, kd := supportColumns.index("node"), supportColumns.index("directions")
	l.r.table(l.g, "supports", func(t *tableReader) {
		i := l.node(t, kn)
		f := canopy.DirAll
		if t.row.filled(kd) {
			f = 0
			if t.word(kd) < 0 {
				return
			}
			for _, c := range t.row.text[kd] {
				f |= canopy.DirX << (c - 'x')
			}
		}
		if i < 0 {
			return
		}
		if l.s.Fixed[i]&f != 0 {
			t.fail(kn, fmt.Sprintf("node %q is supported twice in the same direction", clip(string(t.row.text[kn]))), "remove one of the rows")
		}
		l.s.Fixed[i] |= f
	})
}

// word returns the position of the word that key k of the row holds, −1 after
// an error.
func (t *tableReader) word(k int) int {
	key := t.sec.keys[k]
	w := t.row.text[k]
	for i, x := range key.shape.words {
		if string(w) == x {
			return i
		}
	}
	hint := "write " + list(key.shape.words, "or")
	if near := nearest(string(w), key.shape.words); near != "" {
		hint = fmt.Sprintf("did you mean %q?", near)
	}
	t.fail(k, fmt.Sprintf("%s cannot be %q", key.name, clip(string(w))), hint)
	return -1
}

// put stores v at position i of a slice that exists only once something is in
// it.
func put[T comparable](s []T, i int, v, none T, t *tableReader) []T {
	if s == nil {
		if v == none {
			return nil
		}
		s = make([]T, i, i+1024)
		for j := range s {
			s[j] = none
		}
	}
	return append(grow(s, t), v)
}

func (l *lister) members() {
	s, sec := l.s, memberColumns
	kName, kFrom, kTo, kKind := sec.index("name"), sec.index("from"), sec.index("to"), sec.index("kind")
	kq, kf, ku, kea := sec.index("force density"), sec.index("force"), sec.index("unstressed"), sec.index("stiffness")
	kw, ks, kg, kc := sec.index("weight"), sec.index("strength"), sec.index("group"), sec.index("cable")
	groups := map[string]int32{}
	lastKind, lastKindText := canopy.KindCable, []byte(nil)
	lastCable := []byte(nil)
	cables := map[string]int{}
	named := false
	l.r.table(l.g, "members", func(t *tableReader) {
		w := &t.row
		i := len(s.Ends)
		a, b := l.node(t, kFrom), l.node(t, kTo)
		if a >= 0 && a == b {
			t.fail(kTo, fmt.Sprintf("the member starts and ends at the same node %q", clip(string(w.text[kTo]))), "give two different nodes")
			return
		}
		kind := canopy.KindCable
		if w.filled(kKind) {
			if lastKindText != nil && bytes.Equal(w.text[kKind], lastKindText) {
				kind = lastKind
			} else {
				k := t.word(kKind)
				if k < 0 {
					return
				}
				kind = canopy.Kind(k)
				lastKind, lastKindText = kind, append(lastKindText[:0], w.text[kKind]...)
			}
		}
		law, given, rules := canopy.LawForceDensity, 0.0, 0
		if w.filled(kq) {
			given = w.value[kq]
			rules++
		}
		if w.filled(kf) {
			law, given = canopy.LawForce, w.value[kf]
			rules++
		}
		if w.filled(ku) {
			law, given = canopy.LawElastic, 0
			rules++
		}
		switch {
		case t.bad() || a < 0 || b < 0:
			return
		case rules == 0:
			t.fail(-1, "nothing decides the force of the member", "fill force density, force, or unstressed and stiffness")
			return
		case rules > 1:
			t.fail(-1, "the force of the member is decided twice", "fill only one of force density, force and unstressed")
			return
		case law == canopy.LawElastic && !w.filled(kea):
			t.fail(ku, "the member has an unstressed length but no stiffness", "fill stiffness")
			return
		case given < 0 && !kind.Pushes():
			k := kq
			if law == canopy.LawForce {
				k = kf
			}
			t.fail(k, fmt.Sprintf("a %s cannot push: its %s is negative", kind, sec.keys[k].name), "make its kind strut or mast")
			return
		}
		if s.Fixed[a] == canopy.DirAll && s.Fixed[b] == canopy.DirAll {
			pa, pb := s.Position[a], s.Position[b]
			if r3.Norm(r3.Sub(pa, pb)) <= 1e-9*(1+r3.Norm(pa)) {
				t.fail(-1, fmt.Sprintf("the member has no length: nodes %q and %q are supported at the same place", clip(string(w.text[kFrom])), clip(string(w.text[kTo]))), "remove the member or move a node")
				return
			}
		}
		group := int32(-1)
		if w.filled(kg) {
			g, ok := groups[string(w.text[kg])]
			if !ok {
				if c := badLabel(w.text[kg]); c != "" {
					t.fail(kg, fmt.Sprintf("%q cannot be the name of a group: %s", clip(string(w.text[kg])), c), "")
					return
				}
				g = int32(len(s.Groups))
				name := string(w.text[kg])
				groups[name] = g
				s.Groups = append(s.Groups, name)
			}
			group = g
		}
		if w.filled(kc) {
			if n := len(l.cable); n > 0 && l.cable[n-1].last == i-1 && bytes.Equal(lastCable, w.text[kc]) {
				l.cable[n-1].last = i
			} else {
				name := string(w.text[kc])
				if c := badLabel(w.text[kc]); c != "" {
					t.fail(kc, fmt.Sprintf("%q cannot be the name of a cable: %s", clip(name), c), "")
					return
				}
				if _, twice := cables[name]; twice {
					t.fail(kc, fmt.Sprintf("the rows of cable %q do not follow each other", clip(name)), "put all rows of a cable together, in order from one end to the other")
					return
				}
				cables[name] = i
				line, col := t.where(kc)
				l.cable = append(l.cable, span{name, i, i, line, col, t.file, t.rank})
				lastCable = append(lastCable[:0], name...)
			}
		}
		if w.filled(kName) {
			if c := badLabel(w.text[kName]); c != "" {
				t.fail(kName, fmt.Sprintf("%q cannot be the name of a member: %s", clip(string(w.text[kName])), c), "")
				return
			}
			if !named {
				named = true
				for range i {
					s.MemberName.Append("")
				}
			}
		}
		if named {
			s.MemberName.Append(string(w.text[kName]))
		}
		s.Ends = append(grow(s.Ends, t), [2]int32{a, b})
		s.Kind = append(grow(s.Kind, t), kind)
		s.Law = append(grow(s.Law, t), law)
		s.Given = append(grow(s.Given, t), given)
		s.Stiffness = put(s.Stiffness, i, value(w, kea), 0, t)
		s.Unstressed = put(s.Unstressed, i, value(w, ku), 0, t)
		s.Weight = put(s.Weight, i, value(w, kw), 0, t)
		s.Strength = put(s.Strength, i, value(w, ks), 0, t)
		s.Group = put(s.Group, i, group, -1, t)
	})
}

func value(w *row, k int) float64 {
	if !w.filled(k) {
		return 0
	}
	return w.value[k]
}

// cables turns runs of members into cables.
func (l *lister) cables() {
	s := l.s
	if len(l.cable) == 0 {
		return
	}
	s.CableOf = make([]int32, len(s.Ends))
	for i := range s.CableOf {
		s.CableOf[i] = -1
	}
	for _, c := range l.cable {
		ends := s.Ends[c.first : c.last+1]
		nodes, broken := chainNodes(ends)
		if broken >= 0 {
			l.r.add(Diagnostic{File: c.file, Line: max(c.line+broken, 0), Column: c.col, Text: c.name,
				Message: fmt.Sprintf("member %d of cable %q does not go on where the one before it ends", broken+1, clip(c.name)), Hint: "put the rows in order from one end of the cable to the other"}, c.rank)
			continue
		}
		cable := canopy.Cable{Name: c.name, Kind: s.Kind[c.first], Nodes: nodes}
		for i := c.first; i <= c.last; i++ {
			cable.Members = append(cable.Members, int32(i))
			s.CableOf[i] = int32(len(s.Cables))
		}
		s.Cables = append(s.Cables, cable)
	}
}

// chainNodes returns the nodes along a chain of members, and the first member
// that does not go on from the one before, or −1.
func chainNodes(ends [][2]int32) ([]int32, int) {
	best := 0
	for flip := range 2 {
		cur := ends[0][1-flip]
		nodes := append(make([]int32, 0, len(ends)+1), ends[0][flip], cur)
		at := -1
		for k, e := range ends[1:] {
			switch cur {
			case e[0]:
				cur = e[1]
			case e[1]:
				cur = e[0]
			default:
				at = k + 1
			}
			if at >= 0 {
				break
			}
			nodes = append(nodes, cur)
		}
		if at < 0 {
			return nodes, -1
		}
		best = max(best, at)
	}
	return nil, best
}

func (l *lister) triangles() {
	s, sec := l.s, triangleColumns
	ka, kb, kc, kf := sec.index("a"), sec.index("b"), sec.index("c"), sec.index("fabric")
	kp, kq := sec.index("warp"), sec.index("weft")
	kx, ky, kz := sec.index("warp x"), sec.index("warp y"), sec.index("warp z")
	last := []byte(nil)
	lastFabric := -1
	l.r.table(l.g, "triangles", func(t *tableReader) {
		w := &t.row
		corner := [3]int32{l.node(t, ka), l.node(t, kb), l.node(t, kc)}
		if t.bad() || corner[0] < 0 || corner[1] < 0 || corner[2] < 0 {
			return
		}
		if corner[0] == corner[1] || corner[1] == corner[2] || corner[2] == corner[0] {
			t.fail(-1, "the triangle has a corner twice", "give three different nodes")
			return
		}
		fab := lastFabric
		if fab < 0 || w.filled(kf) != (last != nil) || !bytes.Equal(last, w.text[kf]) {
			fab = l.fabricOf(t, kf)
			if fab < 0 {
				return
			}
			lastFabric, last = fab, nil
			if w.filled(kf) {
				last = append([]byte{}, w.text[kf]...)
			}
		}
		stress, warp := l.preset[fab].stress, l.preset[fab].warp
		if w.filled(kp) {
			stress[0] = w.value[kp]
		}
		if w.filled(kq) {
			stress[1] = w.value[kq]
		}
		if stress[0] <= 0 || stress[1] <= 0 {
			t.fail(-1, "the triangle has no prestress", fmt.Sprintf("fill warp and weft, or give listed.fabrics.%s.prestress", s.Fabrics[fab].Name))
			return
		}
		if w.filled(kx) || w.filled(ky) || w.filled(kz) {
			warp = r3.Vec{X: value(w, kx), Y: value(w, ky), Z: value(w, kz)}
			n := r3.Norm(warp)
			if !(n > 1e-12) {
				t.fail(kx, "the warp direction has no length", "for example 1, 0, 0")
				return
			}
			warp = r3.Scale(1/n, warp)
		}
		p, q, o := s.Position[corner[0]], s.Position[corner[1]], s.Position[corner[2]]
		normal := r3.Cross(r3.Sub(q, p), r3.Sub(o, p))
		area := r3.Norm(normal)
		if warp == (r3.Vec{}) {
			if stress[0] != stress[1] {
				t.fail(-1, "warp and weft differ but the triangle has no warp direction", fmt.Sprintf("fill warp x, warp y and warp z, or give listed.fabrics.%s.warp", s.Fabrics[fab].Name))
				return
			}
			warp = r3.Vec{X: 1}
			if math.Abs(normal.X) > 0.9*area {
				warp = r3.Vec{Y: 1}
			}
		} else if area > 0 && r3.Norm(r3.Cross(warp, normal)) < 1e-6*area {
			t.fail(-1, "the warp direction is square to the triangle", "give a direction along the surface")
			return
		}
		s.Corners = append(grow(s.Corners, t), corner)
		s.FabricOf = append(grow(s.FabricOf, t), int32(fab))
		s.Warp = append(grow(s.Warp, t), warp)
		s.Stress = append(grow(s.Stress, t), stress)
	})
}

// fabricOf finds the fabric that key k of the row names, −1 after an error.
func (l *lister) fabricOf(t *tableReader, k int) int {
	if !t.row.filled(k) {
		switch len(l.s.Fabrics) {
		case 0:
			return l.newFabric("fabric")
		case 1:
			return 0
		}
		t.fail(-1, "the triangle does not say its fabric, and there are several", "fill the column fabric")
		return -1
	}
	name := string(t.row.text[k])
	if i, ok := l.fabric[name]; ok {
		return i
	}
	if c := checkName(name); c != "" {
		t.fail(k, fmt.Sprintf("%q cannot be the name of a fabric: %s", clip(name), c), "names are made of "+nameRule)
		return -1
	}
	if l.g.has("fabrics") {
		var names []string
		for _, f := range l.s.Fabrics {
			names = append(names, f.Name)
		}
		hint := "define it under listed.fabrics"
		if near := nearest(name, names); near != "" {
			hint = fmt.Sprintf("did you mean %q?", near)
		}
		t.fail(k, fmt.Sprintf("fabric %q is not defined", clip(name)), hint)
		return -1
	}
	return l.newFabric(name)
}

func (l *lister) newFabric(name string) int {
	i := len(l.s.Fabrics)
	l.fabric[name] = i
	l.s.Fabrics = append(l.s.Fabrics, canopy.Fabric{Name: name})
	l.preset = append(l.preset, preset{})
	return i
}

func (l *lister) loads() {
	sec := loadColumns
	kn := sec.index("node")
	kx, ky, kz := sec.index("fx"), sec.index("fy"), sec.index("fz")
	l.r.table(l.g, "loads", func(t *tableReader) {
		i := l.node(t, kn)
		if i < 0 || t.bad() {
			return
		}
		w := &t.row
		if !w.filled(kx) && !w.filled(ky) && !w.filled(kz) {
			t.fail(-1, "the row has no load", "fill fx, fy or fz")
			return
		}
		if l.s.Load == nil {
			l.s.Load = make([]r3.Vec, len(l.s.Position))
		}
		l.s.Load[i] = r3.Add(l.s.Load[i], r3.Vec{X: value(w, kx), Y: value(w, ky), Z: value(w, kz)})
	})
}

// connected finds parts without support and nodes that nothing is attached to.
func (l *lister) connected() {
	s := l.s
	n := len(s.Position)
	if len(s.Ends) == 0 && len(s.Corners) == 0 {
		l.r.fail(l.g.node, l.g.p, "the listed structure has neither members nor triangles", "give members, triangles or both")
		return
	}
	set := newSets(n)
	for _, e := range s.Ends {
		set.join(int(e[0]), int(e[1]))
	}
	for _, c := range s.Corners {
		set.join(int(c[0]), int(c[1]))
		set.join(int(c[1]), int(c[2]))
	}
	size := make([]int32, n)
	good := make([]bool, n)
	for i := range n {
		root := set.find(i)
		size[root]++
		if s.Fixed[i] != 0 {
			good[root] = true
		}
	}
	said := 0
	for i := range n {
		if set.find(i) != i || good[i] && size[i] > 1 {
			continue
		}
		said++
		if said > maxPerTable {
			l.r.diags.more++
			continue
		}
		name := s.NodeName.At(i)
		d := Diagnostic{File: l.file, Line: max(int(l.line[i]), 0), Column: l.col, Text: name, Path: l.g.p.down("nodes").item(i).String()}
		if good[i] {
			d.Message, d.Hint = fmt.Sprintf("node %q is supported but nothing is attached to it", name), "remove it"
			l.r.diags.warnings = append(l.r.diags.warnings, placed{d, l.rank})
			said--
			continue
		}
		if size[i] == 1 {
			d.Message, d.Hint = fmt.Sprintf("nothing is attached to node %q", name), "remove it, or attach a member or a triangle"
		} else {
			names := []string{}
			for j := i; j < n && len(names) < 4; j++ {
				if set.find(j) == i {
					names = append(names, s.NodeName.At(j))
				}
			}
			of := ""
			if int(size[i]) > len(names) {
				of = ", …"
			}
			d.Message, d.Hint = fmt.Sprintf("the part with node%s %s%s (%d nodes) has no support", plural(len(names)), quoted(names), of, size[i]), "support one of its nodes, or connect it to the rest"
		}
		l.r.add(d, l.rank)
	}
}

// nodeIndex finds nodes by name or number.
type nodeIndex struct {
	names   canopy.Names
	n       int
	named   bool
	ordinal bool    // the names are the numbers 0, 1, 2, …
	dense   []int32 // node by the number that is its name, −1 = none
	table   []int32 // hash table of names, −1 = empty
	mask    uint32
}

// build makes the index; twice is called with both nodes of a repeated name.
func (x *nodeIndex) build(twice func(i, j int)) {
	if !x.named {
		return
	}
	greatest, numeric, ordinal := int64(0), true, true
	for i := range x.n {
		v, ok := canonicalInt(x.names.Bytes(i))
		if !ok {
			numeric = false
			break
		}
		greatest = max(greatest, v)
		ordinal = ordinal && v == int64(i)
	}
	if numeric && ordinal {
		x.ordinal = true
		return
	}
	if numeric && greatest < 4*int64(x.n)+1024 {
		x.dense = make([]int32, greatest+1)
		for i := range x.dense {
			x.dense[i] = -1
		}
		for i := range x.n {
			v, _ := canonicalInt(x.names.Bytes(i))
			if j := x.dense[v]; j >= 0 {
				twice(int(j), i)
				continue
			}
			x.dense[v] = int32(i)
		}
		return
	}
	size := 16
	for size < 2*x.n {
		size *= 2
	}
	x.table = make([]int32, size)
	for i := range x.table {
		x.table[i] = -1
	}
	x.mask = uint32(size - 1)
	for i := range x.n {
		b := x.names.Bytes(i)
		if len(b) == 0 {
			continue // already complained about
		}
		h := hashName(b) & x.mask
		for x.table[h] >= 0 && !bytes.Equal(x.names.Bytes(int(x.table[h])), b) {
			h = (h + 1) & x.mask
		}
		if j := x.table[h]; j >= 0 {
			twice(int(j), i)
			continue
		}
		x.table[h] = int32(i)
	}
}

// find returns the node called name, −1 when there is none.
func (x *nodeIndex) find(name []byte) int32 {
	if !x.named || x.dense != nil {
		v, ok := canonicalInt(name)
		if !ok {
			return -1
		}
		if x.dense != nil {
			if v < int64(len(x.dense)) {
				return x.dense[v]
			}
			return -1
		}
		if v < int64(x.n) {
			return int32(v)
		}
		return -1
	}
	if len(name) == 0 {
		return -1
	}
	for h := hashName(name) & x.mask; x.table[h] >= 0; h = (h + 1) & x.mask {
		if bytes.Equal(x.names.Bytes(int(x.table[h])), name) {
			return x.table[h]
		}
	}
	return -1
}

// canonicalInt reads a whole number without leading zeros.
func canonicalInt(b []byte) (int64, bool) {
	if len(b) > 1 && b[0] == '0' {
		return 0, false
	}
	return scanInt(b)
}

var nameSeed = maphash.MakeSeed()

func hashName(b []byte) uint32 { return uint32(maphash.Bytes(nameSeed, b)) }
