package spec

import (
	"bytes"
	_ "embed"
	"encoding/json"
	"fmt"
	"regexp"
	"strings"
)

//go:embed model.schema.json
var schemaFile []byte

// Schema returns the JSON Schema (draft 2020-12) of the model format, for
// editors and other programs. What it says about structure is what [Read]
// says; relations between parts (names, geometry, supports) only Read checks.
func Schema() []byte { return bytes.Clone(schemaFile) }

// object is a JSON object that keeps the order of its members.
type object []member

type member struct {
	name  string
	value any
}

// MarshalJSON writes the members in order.
func (o object) MarshalJSON() ([]byte, error) {
	var b bytes.Buffer
	b.WriteByte('{')
	for i, m := range o {
		if i > 0 {
			b.WriteByte(',')
		}
		k, err := plainJSON(m.name)
		if err != nil {
			return nil, err
		}
		v, err := plainJSON(m.value)
		if err != nil {
			return nil, err
		}
		b.Write(k)
		b.WriteByte(':')
		b.Write(v)
	}
	b.WriteByte('}')
	return b.Bytes(), nil
}

// plainJSON is json.Marshal without escapes for HTML.
func plainJSON(v any) ([]byte, error) {
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	err := e.Encode(v)
	return bytes.TrimSpace(b.Bytes()), err
}

// makeSchema builds the schema from the table of keys.
func makeSchema() ([]byte, error) {
	root := modelSection.schema()
	root = append(object{
		{"$schema", "https://json-schema.org/draft/2020-12/schema"},
		{"$id", fmt.Sprintf("urn:anticlast:model:%d", FormatVersion)},
		{"title", fmt.Sprintf("Anticlast model, version %d", FormatVersion)},
	}, root...)
	root = append(root, member{"anyOf", []object{
		{{"required", []string{"points"}}},
		{{"required", []string{"listed"}}},
		{{"required", []string{"outline"}}},
	}})
	defs := object{}
	for _, d := range dimensions {
		defs = append(defs, member{d.id(), object{
			{"description", d.describe()},
			{"anyOf", []object{{{"type", "number"}}, {{"type", "string"}, {"pattern", d.pattern()}}}},
		}})
	}
	for _, s := range sections() {
		if s != modelSection {
			defs = append(defs, member{s.id, s.schema()})
		}
	}
	root = append(root, member{"$defs", defs})
	raw, err := plainJSON(root)
	if err != nil {
		return nil, err
	}
	var b bytes.Buffer
	if err := json.Indent(&b, raw, "", "  "); err != nil {
		return nil, err
	}
	b.WriteByte('\n')
	return b.Bytes(), nil
}

func (d *Dimension) id() string { return strings.ReplaceAll(d.Name, " ", "-") }

// describe says how the quantity is written.
func (d *Dimension) describe() string {
	if d == Ratio {
		return "A ratio: a bare number, or a percentage such as 10 %."
	}
	a := []byte(article(d.Name))
	a[0] -= 'a' - 'A'
	return fmt.Sprintf("%s in %s. A bare number is in %s.", a, d.unitNames(), d.Bare())
}

// pattern is a regular expression for a number with a unit.
func (d *Dimension) pattern() string {
	var units []string
	for _, u := range d.Units {
		if u.Name == "" {
			continue
		}
		q := regexp.QuoteMeta(u.Name)
		if strings.HasSuffix(q, "/m2") {
			q = strings.TrimSuffix(q, "2") + `(2|²|\^2)`
		}
		units = append(units, q)
	}
	return `^\s*[-+]?([0-9]+\.?[0-9]*|\.[0-9]+)([eE][-+]?[0-9]+)?\s*(` + strings.Join(units, "|") + `)?\s*$`
}

// schema describes a section.
func (s *section) schema() object {
	props := object{}
	var required []string
	for _, k := range s.keys {
		o := object{{"description", k.describe()}}
		props = append(props, member{k.name, append(o, k.shape.schema()...)})
		if k.required {
			required = append(required, k.name)
		}
	}
	o := object{{"type", "object"}, {"description", s.doc}, {"properties", props}, {"additionalProperties", false}}
	if required != nil {
		o = append(o, member{"required", required})
	}
	if s.oneOf != nil {
		var one []object
		for _, k := range s.oneOf {
			need := []string{k}
			if k == "unstressed" {
				need = append(need, "stiffness")
			}
			one = append(one, object{{"required", need}})
		}
		o = append(o, member{"oneOf", one})
	}
	return o
}

// describe is the text an editor shows for a key.
func (k *key) describe() string {
	t := k.doc
	if k.deflt != "" {
		t += " Default: " + k.deflt + "."
	}
	if k.example != "" {
		t += " Example: " + k.name + ": " + k.example
	}
	return t
}

const namePattern = `^[\p{L}\p{Nd}\p{M}_-]([\p{L}\p{Nd}\p{M} _-]{0,62}[\p{L}\p{Nd}\p{M}_-])?$`

// scalar is any single value, which the reader takes as text.
var scalar = []string{"string", "number", "boolean"}

// schema describes a shape.
func (s *shape) schema() object {
	ref := func(id string) object { return object{{"$ref", "#/$defs/" + id}} }
	items := func(e object, lo, hi int) object {
		o := object{{"type", "array"}, {"items", e}}
		if lo > 0 {
			o = append(o, member{"minItems", lo})
		}
		if hi > 0 {
			o = append(o, member{"maxItems", hi})
		}
		return o
	}
	switch s.form {
	case formText:
		return object{{"type", scalar}}
	case formTexts:
		return object{{"type", scalar}}
	case formVersion:
		return object{{"const", FormatVersion}}
	case formQuantity:
		return append(ref(s.dim.id()), s.bounds()...)
	case formCount:
		return append(object{{"type", "integer"}}, s.bounds()...)
	case formSwitch:
		return object{{"type", "boolean"}}
	case formWord:
		return object{{"enum", s.words}}
	case formWords:
		return append(items(object{{"enum", s.words}}, s.least, 0), member{"uniqueItems", true})
	case formName:
		return object{{"type", scalar}}
	case formNames:
		return items(object{{"type", scalar}}, s.least, 0)
	case formTriple:
		return items(ref(s.dim.id()), 3, 3)
	case formDirection:
		return items(ref(Ratio.id()), 3, 3)
	case formRange:
		return items(append(ref(s.dim.id()), s.bounds()...), 2, 2)
	case formPair:
		return items(ref(s.dim.id()), 2, 2)
	case formRegion:
		return items(items(ref(s.dim.id()), 2, 2), s.least, 0)
	case formSection:
		return ref(s.sec.id)
	case formNamed:
		return object{{"type", "object"}, {"propertyNames", object{{"pattern", namePattern}}}, {"additionalProperties", s.elem.schema()}}
	case formList:
		return items(s.elem.schema(), s.least, s.most)
	case formTable:
		return object{{"anyOf", []object{{{"type", "string"}}, items(ref(s.sec.id), 0, 0)}}}
	case formEither:
		var of []object
		for _, o := range s.of {
			of = append(of, o.schema())
		}
		return object{{"anyOf", of}}
	}
	panic(fmt.Sprintf("spec: no schema for form %d", s.form))
}

// bounds gives the bounds of bare numbers in their bare unit. Text with a unit
// is not bounded by the schema, only by the reader.
func (s *shape) bounds() object {
	bare := func(v float64) float64 {
		if s.dim == nil {
			return v
		}
		return v * s.dim.Units[0].Den / s.dim.Units[0].Num
	}
	var o object
	if s.lo.set {
		if s.lo.open {
			o = append(o, member{"exclusiveMinimum", bare(s.lo.v)})
		} else {
			o = append(o, member{"minimum", bare(s.lo.v)})
		}
	}
	if s.hi.set {
		if s.hi.open {
			o = append(o, member{"exclusiveMaximum", bare(s.hi.v)})
		} else {
			o = append(o, member{"maximum", bare(s.hi.v)})
		}
	}
	return o
}
