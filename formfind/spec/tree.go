package spec

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"

	"anticlast/formfind/canopy"

	"go.yaml.in/yaml/v4"
	"gonum.org/v1/gonum/spatial/r3"
)

// place is where a value is in the model, as a chain of keys from the top.
type place struct {
	up   *place
	name string
}

func (p *place) down(name string) *place { return &place{p, name} }
func (p *place) item(i int) *place       { return &place{p, strconv.Itoa(i)} }

// String gives the path with dots.
func (p *place) String() string {
	if p == nil {
		return ""
	}
	if p.up == nil {
		return p.name
	}
	return p.up.String() + "." + p.name
}

// at returns the position of n and the file it came from.
func (r *reader) at(n *yaml.Node) (file string, line, col int) {
	if n == nil {
		return r.file, 0, 0
	}
	if n.Line < 0 { // from an entry of Options.Set
		return setLabel(r.options.Set[-n.Line-1]), 0, 0
	}
	return r.file, n.Line, n.Column
}

func (r *reader) diagnostic(n *yaml.Node, p *place, message, hint string) (Diagnostic, int) {
	file, line, col := r.at(n)
	d := Diagnostic{File: file, Line: line, Column: col, Path: p.String(), Message: message, Hint: hint}
	if n != nil && n.Kind == yaml.ScalarNode {
		d.Text = clip(n.Value)
	}
	rank := 0
	if n != nil && n.Line < 0 {
		rank = -1000 - n.Line
	}
	return d, rank
}

// fail records an error at node n.
func (r *reader) fail(n *yaml.Node, p *place, message, hint string) {
	d, rank := r.diagnostic(n, p, message, hint)
	r.add(d, rank)
}

// warn records a warning at node n.
func (r *reader) warn(n *yaml.Node, p *place, message, hint string) {
	if len(r.diags.warnings) < maxErrors {
		d, rank := r.diagnostic(n, p, message, hint)
		r.diags.warnings = append(r.diags.warnings, placed{d, rank})
	}
}

// resolve follows aliases and counts what is looked at, so that aliases of
// aliases cannot keep the reader busy. It returns nil after an error.
func (r *reader) resolve(n *yaml.Node, p *place) *yaml.Node {
	for i := 0; n != nil && n.Kind == yaml.AliasNode; i++ {
		if i > 10 {
			r.fail(n, p, "alias of an alias of an alias", "write the value itself")
			return nil
		}
		n = n.Alias
	}
	r.visits++
	if r.visits > maxVisits {
		if r.visits == maxVisits+1 {
			r.fail(n, p, "the model holds too many values", "put large tables into CSV files")
		}
		return nil
	}
	if n != nil && n.Style&yaml.TaggedStyle != 0 {
		r.fail(n, p, fmt.Sprintf("tag %q is not used in models", clip(n.Tag)), "remove it")
		return nil
	}
	return n
}

func isNull(n *yaml.Node) bool {
	return n.Kind == yaml.ScalarNode && n.Tag == "!!null" && n.Style&(yaml.SingleQuotedStyle|yaml.DoubleQuotedStyle|yaml.LiteralStyle|yaml.FoldedStyle) == 0
}

// what describes a node for a message.
func what(n *yaml.Node) string {
	switch n.Kind {
	case yaml.MappingNode:
		return "a mapping"
	case yaml.SequenceNode:
		return "a list"
	}
	if isNull(n) {
		return "nothing"
	}
	return strconv.Quote(clip(n.Value))
}

// entry is one key of a mapping with its value.
type entry struct {
	key  *key // nil in a mapping of names
	name string
	kn   *yaml.Node // the key
	n    *yaml.Node // the value
}

// entries lists the keys of mapping n, merge keys included, and complains
// about keys that are not plain text or come twice.
func (r *reader) entries(n *yaml.Node, p *place, depth int) []entry {
	out := make([]entry, 0, len(n.Content)/2)
	index := make(map[string]int, len(n.Content)/2)
	var merged []entry
	for i := 0; i+1 < len(n.Content); i += 2 {
		kn := r.resolve(n.Content[i], p)
		if kn == nil {
			continue
		}
		if kn.Kind != yaml.ScalarNode {
			r.fail(kn, p, what(kn)+" cannot be a key", "write key: value")
			continue
		}
		v := n.Content[i+1]
		if kn.Value == "<<" && kn.Style == 0 {
			merged = append(merged, r.merged(v, p, depth)...)
			continue
		}
		name := kn.Value
		if j, twice := index[name]; twice {
			hint := "remove one of them"
			if out[j].kn.Line > 0 {
				hint = fmt.Sprintf("the first is in line %d; %s", out[j].kn.Line, hint)
			}
			r.fail(kn, p.down(name), fmt.Sprintf("%q is here twice", clip(name)), hint)
			continue
		}
		index[name] = len(out)
		out = append(out, entry{name: name, kn: kn, n: v})
	}
	for _, e := range merged {
		if _, own := index[e.name]; !own {
			index[e.name] = len(out)
			out = append(out, e)
		}
	}
	return out
}

// merged returns the entries that a merge key brings in.
func (r *reader) merged(v *yaml.Node, p *place, depth int) []entry {
	v = r.resolve(v, p)
	if v == nil {
		return nil
	}
	if depth > 4 {
		r.fail(v, p, "merge keys nested too deep", "write the values themselves")
		return nil
	}
	switch v.Kind {
	case yaml.MappingNode:
		return r.entries(v, p, depth+1)
	case yaml.SequenceNode:
		var out []entry
		for _, c := range v.Content {
			c = r.resolve(c, p)
			if c == nil {
				return nil
			}
			if c.Kind != yaml.MappingNode {
				r.fail(c, p, "<< takes a mapping, not "+what(c), "")
				return nil
			}
			out = append(out, r.entries(c, p, depth+1)...)
			if len(out) > 10000 {
				r.fail(v, p, "<< brings in too many keys", "write the values themselves")
				return nil
			}
		}
		return out
	}
	r.fail(v, p, "<< takes a mapping, not "+what(v), "")
	return nil
}

// fields is a mapping with known keys.
type fields struct {
	r    *reader
	sec  *section
	node *yaml.Node
	p    *place
	got  []entry
	ok   bool // no unknown, missing or repeated key
}

// section reads n as a mapping with the keys of sec. It returns nil when n is
// not a mapping. Missing required keys are complained about.
func (r *reader) section(n *yaml.Node, sec *section, p *place) *fields {
	before := len(r.diags.errors) + r.diags.more
	f := &fields{r: r, sec: sec, node: n, p: p}
	meant := "" // required keys that are there, but misspelt
	for _, e := range r.entries(n, p, 0) {
		e.key = sec.get(e.name)
		if e.key == nil {
			meant += "\x00" + r.unknownKey(e, sec, p) + "\x00"
			continue
		}
		e.n = r.resolve(e.n, p)
		if e.n == nil {
			continue
		}
		if isNull(e.n) {
			if sec != modelSection || e.key.required {
				at := e.n
				if at.Line == 0 || at.Value == "" {
					at = e.kn
				}
				r.fail(at, p.down(e.name), fmt.Sprintf("%q has no value", e.name), "for example "+e.name+": "+e.key.example)
			}
			continue
		}
		f.got = append(f.got, e)
	}
	for _, k := range sec.keys {
		if !k.required || f.listed(n, k.name) || sec == modelSection || meant != "" && strings.Contains(meant, "\x00"+k.name+"\x00") {
			continue
		}
		r.fail(n, p, fmt.Sprintf("%s has no %q", sec.label(p), k.name), "for example "+k.name+": "+k.example)
	}
	f.ok = len(r.diags.errors)+r.diags.more == before
	return f
}

// listed reports whether the mapping has a key of that name, with a value that
// makes sense or not.
func (f *fields) listed(n *yaml.Node, name string) bool {
	if f.get(name) != nil {
		return true
	}
	for i := 0; i+1 < len(n.Content); i += 2 {
		if n.Content[i].Value == name {
			return true
		}
	}
	return false
}

// label names the thing at p for a message.
func (s *section) label(p *place) string {
	switch s {
	case modelSection:
		return "the model"
	case limitsSection, factorsSection, listedSection:
		return s.id
	case edgeCableSection, fixedSection, fabricStiffnessSection, warpBetweenSection, equalMeshSection:
		return p.String()
	case pointSection, edgeSection, cableSection, fabricSection, netSection, ringSection, mastSection, guySection, listedFabricSection:
		id := s.id
		if s == listedFabricSection {
			id = "fabric"
		}
		return fmt.Sprintf("%s %q", id, p.name)
	}
	return p.String()
}

// unknownKey complains about a key and returns the one that was meant, "" when
// there is none like it.
func (r *reader) unknownKey(e entry, sec *section, p *place) string {
	hint := ""
	near := nearest(e.name, sec.names())
	if near != "" {
		hint = fmt.Sprintf("did you mean %q?", near)
	} else {
		hint = sec.label(p) + " may have " + list(sec.names(), "and")
	}
	r.fail(e.kn, p.down(e.name), fmt.Sprintf("unknown key %q", clip(e.name)), hint)
	return near
}

// get returns the value of a key, nil when it is not there.
func (f *fields) get(name string) *yaml.Node {
	for i := range f.got {
		if f.got[i].name == name {
			return f.got[i].n
		}
	}
	return nil
}

// keyNode returns the node of the key itself.
func (f *fields) keyNode(name string) *yaml.Node {
	for i := range f.got {
		if f.got[i].name == name {
			return f.got[i].kn
		}
	}
	return f.node
}

func (f *fields) has(name string) bool { return f.get(name) != nil }

// shape returns the table's shape of a key.
func (f *fields) shape(name string) *shape {
	k := f.sec.get(name)
	if k == nil {
		panic("spec: section " + f.sec.id + " has no key " + name)
	}
	return k.shape
}

// present lists which of the keys are there.
func (f *fields) present(keys []string) []string {
	var out []string
	for _, k := range keys {
		if f.has(k) {
			out = append(out, k)
		}
	}
	return out
}

// quantity reads a key as a number with unit in SI; ok is false when it is not
// there or wrong.
func (f *fields) quantity(name string) (v float64, ok bool) {
	s, n := f.shape(name), f.get(name)
	if n == nil {
		return 0, false
	}
	return f.r.quantity(n, s, f.p.down(name))
}

// number is quantity with 0 for what is not there.
func (f *fields) number(name string) float64 {
	v, _ := f.quantity(name)
	return v
}

func (r *reader) quantity(n *yaml.Node, s *shape, p *place) (float64, bool) {
	n = r.resolve(n, p)
	if n == nil {
		return 0, false
	}
	if n.Kind != yaml.ScalarNode {
		r.fail(n, p, fmt.Sprintf("%s takes %s, not %s", p.name, article(s.dim.Name), what(n)), "give "+s.dim.example())
		return 0, false
	}
	v, c := parseQuantity(n.Value, s.dim)
	if c == nil {
		c = s.check(v, n.Value, p.name)
	}
	if c != nil {
		r.fail(n, p, c.message, c.hint)
		return 0, false
	}
	return v, true
}

// check holds v against the bounds of the shape.
func (s *shape) check(v float64, text, name string) *complaint {
	d := s.dim
	show := func(v float64) string {
		switch {
		case d == nil:
			return strconv.FormatFloat(v, 'g', -1, 64)
		case (d == Angle || d == Slope) && v != 0:
			return strconv.FormatFloat(math.Round(v*180/math.Pi*1e6)/1e6, 'g', -1, 64) + " deg"
		case d.Bare() == "" || v == 0:
			return strconv.FormatFloat(v, 'g', -1, 64)
		}
		return strconv.FormatFloat(v*d.Units[0].Den/d.Units[0].Num, 'g', -1, 64) + " " + d.Bare()
	}
	if s.lo.set && (v < s.lo.v || s.lo.open && v == s.lo.v) {
		want := "at least "
		if s.lo.open {
			want = "greater than "
		}
		return &complaint{fmt.Sprintf("%s is %q but must be %s%s", name, clip(text), want, show(s.lo.v)), ""}
	}
	if s.hi.set && (v > s.hi.v || s.hi.open && v == s.hi.v) {
		want := "at most "
		if s.hi.open {
			want = "less than "
		}
		return &complaint{fmt.Sprintf("%s is %q but must be %s%s", name, clip(text), want, show(s.hi.v)), ""}
	}
	return nil
}

func article(noun string) string {
	if strings.ContainsRune("aeiou", rune(noun[0])) {
		return "an " + noun
	}
	return "a " + noun
}

// flag reads true or false.
func (f *fields) flag(name string) (v, ok bool) {
	_, n := f.shape(name), f.get(name)
	if n == nil {
		return false, false
	}
	p := f.p.down(name)
	if n.Kind == yaml.ScalarNode {
		switch n.Value {
		case "true", "True", "TRUE":
			return true, true
		case "false", "False", "FALSE":
			return false, true
		case "yes", "Yes", "on", "On", "y":
			f.r.fail(n, p, fmt.Sprintf("%q is neither true nor false", n.Value), "write true")
			return false, false
		case "no", "No", "off", "Off", "n":
			f.r.fail(n, p, fmt.Sprintf("%q is neither true nor false", n.Value), "write false")
			return false, false
		}
	}
	f.r.fail(n, p, fmt.Sprintf("%s is neither true nor false", what(n)), "write true or false")
	return false, false
}

// count reads a whole number.
func (f *fields) count(name string) int {
	s, n := f.shape(name), f.get(name)
	if n == nil {
		return 0
	}
	p := f.p.down(name)
	if n.Kind == yaml.ScalarNode {
		if v, ok := scanInt([]byte(n.Value)); ok && (n.Value == "0" || n.Value[0] != '0') {
			if c := s.check(float64(v), n.Value, name); c != nil {
				f.r.fail(n, p, c.message, c.hint)
				return 0
			}
			return int(v)
		}
	}
	f.r.fail(n, p, fmt.Sprintf("%s takes a whole number, not %s", name, what(n)), "for example "+f.sec.get(name).example)
	return 0
}

// text reads one line of text.
func (f *fields) text(name string) string {
	s, n := f.shape(name), f.get(name)
	if n == nil {
		return ""
	}
	p := f.p.down(name)
	if n.Kind != yaml.ScalarNode {
		f.r.fail(n, p, fmt.Sprintf("%s takes text, not %s", name, what(n)), "put text with special characters in quotes")
		return ""
	}
	if s.form == formTexts {
		return n.Value
	}
	t := strings.TrimSpace(n.Value)
	if strings.ContainsAny(t, "\n\r") {
		f.r.fail(n, p, name+" takes one line of text", "")
		return ""
	}
	if utf8.RuneCountInString(t) > 200 {
		f.r.fail(n, p, name+" is longer than 200 characters", "put the rest into description")
		return ""
	}
	return t
}

// word reads one of the permitted words, "" when not there or wrong.
func (f *fields) word(name string) string {
	s, n := f.shape(name), f.get(name)
	if n == nil {
		return ""
	}
	return f.r.word(n, s.words, f.p.down(name))
}

func (r *reader) word(n *yaml.Node, words []string, p *place) string {
	if n.Kind == yaml.ScalarNode {
		for _, w := range words {
			if n.Value == w {
				return w
			}
		}
		if near := nearest(n.Value, words); near != "" {
			r.fail(n, p, fmt.Sprintf("%s cannot be %q", p.name, clip(n.Value)), fmt.Sprintf("did you mean %q?", near))
			return ""
		}
	}
	r.fail(n, p, fmt.Sprintf("%s cannot be %s", p.name, what(n)), "write "+list(words, "or"))
	return ""
}

// freedom reads a list of directions.
func (f *fields) freedom(name string) (canopy.Freedom, bool) {
	s, n := f.shape(name), f.get(name)
	if n == nil {
		return 0, false
	}
	p := f.p.down(name)
	if n.Kind != yaml.SequenceNode {
		f.r.fail(n, p, fmt.Sprintf("%s takes a list of directions, not %s", name, what(n)), "for example "+name+": [x, y]")
		return 0, false
	}
	if len(n.Content) < s.least {
		f.r.fail(n, p, name+" is an empty list", "give directions, or leave the key out")
		return 0, false
	}
	var fr canopy.Freedom
	for i, c := range n.Content {
		c = f.r.resolve(c, p)
		if c == nil {
			return 0, false
		}
		w := f.r.word(c, s.words, &place{p.up, name})
		if w == "" {
			return 0, false
		}
		d := canopy.DirX << (w[0] - 'x')
		if fr&d != 0 {
			f.r.fail(c, p.item(i), fmt.Sprintf("direction %q is here twice", w), "")
			return 0, false
		}
		fr |= d
	}
	return fr, true
}

// ref is a name that refers to something, and where it stands.
type ref struct {
	name string
	n    *yaml.Node
	p    *place
}

func (f *fields) ref(name string) (ref, bool) {
	_, n := f.shape(name), f.get(name)
	if n == nil {
		return ref{}, false
	}
	return f.r.ref(n, f.p.down(name))
}

func (r *reader) ref(n *yaml.Node, p *place) (ref, bool) {
	n = r.resolve(n, p)
	if n == nil {
		return ref{}, false
	}
	if n.Kind != yaml.ScalarNode || isNull(n) || n.Value == "" {
		r.fail(n, p, fmt.Sprintf("expected a name, not %s", what(n)), "")
		return ref{}, false
	}
	return ref{n.Value, n, p}, true
}

// refs reads a list of names.
func (f *fields) refs(name string) ([]ref, bool) {
	s, n := f.shape(name), f.get(name)
	if n == nil {
		return nil, false
	}
	p := f.p.down(name)
	if n.Kind != yaml.SequenceNode {
		f.r.fail(n, p, fmt.Sprintf("%s takes a list of %ss, not %s", name, s.thing, what(n)), "for example "+name+": "+f.sec.get(name).example)
		return nil, false
	}
	if len(n.Content) < s.least {
		f.r.fail(n, p, fmt.Sprintf("%s needs at least %d %s%s, not %d", name, s.least, s.thing, plural(s.least), len(n.Content)), "")
		return nil, false
	}
	out, ok := make([]ref, 0, len(n.Content)), true
	for i, c := range n.Content {
		q, good := f.r.ref(c, p.item(i))
		if good {
			out = append(out, q)
		}
		ok = ok && good
	}
	return out, ok
}

func plural(n int) string {
	if n == 1 {
		return ""
	}
	return "s"
}

// vector reads [a, b, c] of quantities.
func (r *reader) vector(n *yaml.Node, d *Dimension, p *place) (r3.Vec, bool) {
	n = r.resolve(n, p)
	if n == nil {
		return r3.Vec{}, false
	}
	if n.Kind != yaml.SequenceNode || len(n.Content) != 3 {
		got := what(n)
		if n.Kind == yaml.SequenceNode {
			got = fmt.Sprintf("%d values", len(n.Content))
		}
		r.fail(n, p, fmt.Sprintf("%s takes three values [x, y, z], not %s", p.name, got), "")
		return r3.Vec{}, false
	}
	var v [3]float64
	ok := true
	sh := &shape{dim: d}
	for i, c := range n.Content {
		q, good := r.quantity(c, sh, &place{p, directionWords[i]})
		v[i] = q
		ok = ok && good
	}
	return r3.Vec{X: v[0], Y: v[1], Z: v[2]}, ok
}

func (f *fields) vector(name string) (r3.Vec, bool) {
	s, n := f.shape(name), f.get(name)
	if n == nil {
		return r3.Vec{}, false
	}
	return f.r.vector(n, s.dim, f.p.down(name))
}

// direction reads [x, y, z] of bare numbers as a unit vector.
func (r *reader) direction(n *yaml.Node, p *place) (r3.Vec, bool) {
	v, ok := r.vector(n, Ratio, p)
	if !ok {
		return v, false
	}
	l := r3.Norm(v)
	if !(l > 1e-12) {
		r.fail(n, p, p.name+" is a direction of no length", "for example [1, 0, 0]")
		return v, false
	}
	return r3.Scale(1/l, v), true
}

// pair reads [least, greatest].
func (f *fields) pair(name string) *[2]float64 {
	s, n := f.shape(name), f.get(name)
	if n == nil {
		return nil
	}
	p := f.p.down(name)
	if n.Kind != yaml.SequenceNode || len(n.Content) != 2 {
		f.r.fail(n, p, fmt.Sprintf("%s takes [least, greatest], not %s", name, what(n)), "for example "+f.sec.get(name).example)
		return nil
	}
	lo, ok1 := f.r.quantity(n.Content[0], s, p)
	hi, ok2 := f.r.quantity(n.Content[1], s, p)
	if !ok1 || !ok2 {
		return nil
	}
	if lo > hi {
		f.r.fail(n, p, fmt.Sprintf("the least %s is greater than the greatest", name), "write the smaller value first")
		return nil
	}
	return &[2]float64{lo, hi}
}

// optional reads a key as a pointer, nil when not given.
func (f *fields) optional(name string) *float64 {
	if v, ok := f.quantity(name); ok {
		return &v
	}
	return nil
}

// mapping resolves n and complains when it is not a mapping.
func (r *reader) mapping(n *yaml.Node, p *place, sec *section) *yaml.Node {
	n = r.resolve(n, p)
	if n == nil {
		return nil
	}
	if n.Kind != yaml.MappingNode {
		r.fail(n, p, fmt.Sprintf("%s takes a mapping, not %s", p.name, what(n)), "it may have the keys "+list(sec.names(), "and"))
		return nil
	}
	return n
}

// named lists the entries of a mapping of names.
func (f *fields) named(key string) []entry {
	s, n := f.shape(key), f.get(key)
	if n == nil {
		return nil
	}
	p := f.p.down(key)
	if n.Kind != yaml.MappingNode {
		hint := fmt.Sprintf("write one %s per line: its name, a colon, and what it is", s.thing)
		f.r.fail(n, p, fmt.Sprintf("%s takes a mapping of names, not %s", key, what(n)), hint)
		return nil
	}
	all := f.r.entries(n, p, 0)
	out := all[:0]
	for _, e := range all {
		if c := checkName(e.name); c != "" {
			f.r.fail(e.kn, p.down(e.name), fmt.Sprintf("%q cannot be the name of a %s: %s", clip(e.name), s.thing, c), "names are made of "+nameRule)
			f.r.breaks(s.thing, e.name)
			continue
		}
		e.n = f.r.resolve(e.n, p)
		if e.n == nil {
			f.r.breaks(s.thing, e.name)
			continue
		}
		if isNull(e.n) {
			f.r.breaks(s.thing, e.name)
			f.r.fail(e.kn, p.down(e.name), fmt.Sprintf("%s %q says nothing", s.thing, e.name), "for example "+s.thing+"s: "+modelExample(key))
			continue
		}
		out = append(out, e)
	}
	return out
}

// breaks notes that the definition of a thing is wrong, so that nobody is told
// that it is missing.
func (r *reader) breaks(thing, name string) {
	if r.broken == nil {
		r.broken = map[string]bool{}
	}
	r.broken[thing+"\x00"+name] = true
}

func modelExample(key string) string {
	if k := modelSection.get(key); k != nil {
		return k.example
	}
	return ""
}

// checkName says what is wrong with a name, "" when nothing.
func checkName(s string) string {
	if s == "" {
		return "it is empty"
	}
	if s != strings.TrimSpace(s) {
		return "it starts or ends with a space"
	}
	if utf8.RuneCountInString(s) > 64 {
		return "it is too long"
	}
	for _, c := range s {
		if !unicode.IsLetter(c) && !unicode.IsDigit(c) && !unicode.IsMark(c) && c != ' ' && c != '-' && c != '_' {
			return fmt.Sprintf("it has %q", string(c))
		}
	}
	return ""
}
