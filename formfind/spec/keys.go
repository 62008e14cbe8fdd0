package spec

// The types of the one table that says what a model file may hold. The reader,
// the JSON Schema and the reference page all follow it.

// section is a mapping with known keys.
type section struct {
	id   string // name in the schema
	doc  string
	keys []*key
	// oneOf lists keys of which exactly one must be present; unstressed
	// comes with stiffness.
	oneOf []string
	table bool // the rows of a table: the keys are its columns
}

// key is one entry of a section.
type key struct {
	name     string
	doc      string // one or two plain sentences
	shape    *shape
	required bool
	unless   string // required unless the model has this key
	deflt    string // in words; "" = none
	example  string // as written in a model file
}

// form says what kind of value a shape is.
type form uint8

const (
	formText      form = iota // any text on one line
	formTexts                 // any text
	formQuantity              // number with unit
	formCount                 // whole number
	formSwitch                // true or false
	formWord                  // one of words
	formWords                 // list of words
	formName                  // name of a thing defined elsewhere
	formNames                 // list of such names
	formTriple                // [x, y, z] of quantities
	formPair                  // [a, b] of quantities
	formRange                 // [least, greatest] of quantities
	formRegion                // list of [x, y]
	formSection               // a mapping
	formNamed                 // mapping of names to elem
	formList                  // list of elem
	formTable                 // rows in the file or the name of a CSV file
	formEither                // one of several shapes
	formVersion               // the version of the format
	formDirection             // [x, y, z] of bare numbers, not all zero
)

// shape is what a value may look like.
type shape struct {
	form   form
	dim    *Dimension
	lo, hi bound
	words  []string
	thing  string // what a name names: "point", "edge", "ring"
	sec    *section
	elem   *shape
	of     []*shape
	least  int // entries of a list
	most   int // entries of a list, 0 = any number
}

// bound is one end of the permitted values, in SI units.
type bound struct {
	set  bool
	v    float64
	open bool // v itself is not permitted
}

func quantity(d *Dimension) *shape { return &shape{form: formQuantity, dim: d} }
func text() *shape                 { return &shape{form: formText} }
func count(lo, hi float64) *shape  { return (&shape{form: formCount}).from(lo).upTo(hi) }
func yesNo() *shape                { return &shape{form: formSwitch} }
func word(w ...string) *shape      { return &shape{form: formWord, words: w} }
func name(thing string) *shape     { return &shape{form: formName, thing: thing} }
func triple(d *Dimension) *shape   { return &shape{form: formTriple, dim: d} }
func rangeOf(d *Dimension) *shape  { return &shape{form: formRange, dim: d} }
func in(s *section) *shape         { return &shape{form: formSection, sec: s} }
func either(s ...*shape) *shape    { return &shape{form: formEither, of: s} }
func table(s *section) *shape      { return &shape{form: formTable, sec: s} }
func named(thing string, e *shape) *shape {
	return &shape{form: formNamed, thing: thing, elem: e}
}
func names(thing string, least int) *shape {
	return &shape{form: formNames, thing: thing, least: least}
}
func listOf(e *shape, least int) *shape { return &shape{form: formList, elem: e, least: least} }
func (s *shape) atMost(n int) *shape    { s.most = n; return s }
func wordList(w ...string) *shape       { return &shape{form: formWords, words: w, least: 1} }

func (s *shape) above(v float64) *shape { s.lo = bound{true, v, true}; return s }
func (s *shape) from(v float64) *shape  { s.lo = bound{true, v, false}; return s }
func (s *shape) below(v float64) *shape { s.hi = bound{true, v, true}; return s }
func (s *shape) upTo(v float64) *shape  { s.hi = bound{true, v, false}; return s }

// get returns the key with the given name.
func (s *section) get(name string) *key {
	for _, k := range s.keys {
		if k.name == name {
			return k
		}
	}
	return nil
}

// names lists the keys in order.
func (s *section) names() []string {
	n := make([]string, len(s.keys))
	for i, k := range s.keys {
		n[i] = k.name
	}
	return n
}
