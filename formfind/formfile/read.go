package formfile

import (
	"bytes"
	"context"
	"fmt"
	"io"
	"math"
	"slices"
	"strconv"

	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

// Read reads a form.json. name is what messages call the file. What is not a
// form.json of this version is a [*SyntaxError] with line, column and the thing
// concerned.
//
// In the result Structure.Position is Form.Position, for the starting guess is
// not in the file; arrays that say nothing are nil.
func Read(ctx context.Context, r io.Reader, name string) (*canopy.Result, error) {
	d := &reader{
		scanner: newScanner(ctx, r, name),
		result:  &canopy.Result{Structure: &canopy.Structure{}, Form: &canopy.Form{}},
		group:   make(map[string]int32),
		fabric:  make(map[string]int32),
	}
	if err := d.read(); err != nil {
		return nil, err
	}
	return d.result, nil
}

type reader struct {
	*scanner
	result *canopy.Result
	counts [3]int // as announced, not trusted

	group     map[string]int32 // into Structure.Groups
	fabric    map[string]int32 // into fabricOf, names in order of appearance
	usedNames []string
	// airFabrics are, per enclosure, the names of its fabrics.
	airFabrics [][]string
	named      [2]bool // some node, some member has a name that is not its number
	nameBytes  [2]int
}

// fields notes which keys of an object have been seen.
type fields uint64

// once marks bit; it is an error to meet a key twice.
func (d *reader) once(f *fields, bit uint) error {
	if *f>>bit&1 != 0 {
		return d.errorf("this key stands twice")
	}
	*f |= 1 << bit
	return nil
}

// A key of a record.
type key struct {
	name     string
	required bool
}

// record reads an object whose keys are listed in keys and calls field with
// each; keys not listed are skipped, and required ones must be there. It is
// quick when they come in the order of the list.
func (d *reader) record(keys []key, field func(key string) error) (fields, error) {
	var seen fields
	next := 0
	err := d.object(func(key []byte) error {
		for j := range keys {
			i := next + j
			if i >= len(keys) {
				i -= len(keys)
			}
			if k := keys[i].name; string(key) == k {
				next = i + 1
				if err := d.once(&seen, uint(i)); err != nil {
					return err
				}
				return field(k)
			}
		}
		return d.skip()
	})
	if err != nil {
		return seen, err
	}
	for i, k := range keys {
		if k.required && seen>>uint(i)&1 == 0 {
			d.key = d.key[:0]
			return seen, d.errorf("%q is missing", k.name)
		}
	}
	return seen, nil
}

// want checks that the keys with the given names, numbered from bit 0, are there.
func (d *reader) want(f fields, names ...string) error {
	for i, n := range names {
		if f>>uint(i)&1 == 0 {
			d.key = d.key[:0]
			return d.errorf("%q is missing", n)
		}
	}
	return nil
}

func (d *reader) read() error {
	if c := d.peek(); c != '{' {
		return d.errorf("not a form.json: want '{', found %s", describe(c))
	}
	var f fields
	err := d.object(func(key []byte) error {
		read, bit, section := d.top(key)
		if read == nil {
			return d.skip()
		}
		if err := d.once(&f, bit); err != nil {
			return err
		}
		d.section = section
		err := read()
		d.section, d.item = "", -1
		return err
	})
	if err != nil {
		return err
	}
	if c := d.peek(); c != 0 {
		return d.errorf("something follows the end of the form: %s", describe(c))
	}
	if d.readErr != nil {
		return d.readErr
	}
	if err := d.want(f, "format", "nodes", "members", "triangles", "program", "model", "audit"); err != nil {
		return err
	}
	return d.finish()
}

func (d *reader) top(key []byte) (read func() error, bit uint, section string) {
	switch string(key) {
	case "format":
		return d.format, 0, ""
	case "nodes":
		return d.nodes, 1, "node"
	case "members":
		return d.members, 2, "member"
	case "triangles":
		return d.triangles, 3, "triangle"
	case "program":
		return d.program, 4, "program"
	case "model":
		return d.model, 5, "model"
	case "audit":
		return d.audit, 6, "audit"
	case "counts":
		return d.readCounts, 7, "counts"
	case "form":
		return d.form, 8, "form"
	case "quantities":
		return d.quantities, 9, "quantities"
	case "findings":
		return d.findings, 10, "finding"
	case "fabrics":
		return d.fabrics, 11, "fabric"
	case "cables":
		return d.cables, 12, "cable"
	case "rings":
		return d.rings, 13, "ring"
	case "lines":
		return d.lines, 14, "line"
	case "loads":
		return d.loads, 15, "loads"
	case "air":
		return d.readAir, 16, "air"
	}
	return nil, 0, ""
}

func (d *reader) format() error {
	b, err := d.str()
	if err != nil {
		return err
	}
	if string(b) == Format {
		return nil
	}
	if bytes.HasPrefix(b, []byte("anticlast-form/")) {
		return d.errorf("%q was written by another version of the program; this one reads %q", b, Format)
	}
	return d.errorf("%.40q is not %q", b, Format)
}

// Small readers that fill a variable.

func (d *reader) setString(p *string) error {
	b, err := d.str()
	*p = string(b)
	return err
}

func (d *reader) setNumber(p *float64) (err error) {
	*p, err = d.number()
	return err
}

// setKnown reads a number or null for "not known", NaN.
func (d *reader) setKnown(p *float64) error {
	if d.null() {
		*p = math.NaN()
		return nil
	}
	return d.setNumber(p)
}

// setGiven reads a number or null for "not given", 0.
func (d *reader) setGiven(p *float64) error {
	if d.null() {
		*p = 0
		return nil
	}
	return d.setNumber(p)
}

func (d *reader) setBool(p *bool) (err error) {
	*p, err = d.boolean()
	return err
}

func (d *reader) setInt(p *int) (err error) {
	*p, err = d.integer()
	return err
}

func (d *reader) setIndex(p *int32) error {
	v, err := d.integer()
	*p = int32(v)
	return err
}

// setIndexOrNone reads an index or null, −1.
func (d *reader) setIndexOrNone(p *int32) error {
	if d.null() {
		*p = -1
		return nil
	}
	return d.setIndex(p)
}

func (d *reader) setStrings(p *[]string) error {
	*p = nil
	return d.array(func(int) error {
		b, err := d.str()
		*p = append(*p, string(b))
		return err
	})
}

func (d *reader) setIndices(p *[]int32) error {
	*p = nil
	return d.array(func(int) error {
		v, err := d.integer()
		*p = append(*p, int32(v))
		return err
	})
}

// tuple reads exactly n values.
func (d *reader) tuple(n int, element func(i int) error) error {
	got := 0
	err := d.array(func(i int) error {
		if i >= n {
			return d.errorf("want %d values, found more", n)
		}
		got++
		return element(i)
	})
	if err == nil && got != n {
		return d.errorf("want %d values, found %d", n, got)
	}
	return err
}

func (d *reader) setVec(p *r3.Vec) error {
	var v [3]float64
	err := d.tuple(3, func(i int) (err error) {
		v[i], err = d.number()
		return err
	})
	*p = r3.Vec{X: v[0], Y: v[1], Z: v[2]}
	return err
}

func (d *reader) setFreedom(p *canopy.Freedom) error {
	*p = 0
	return d.tuple(3, func(i int) error {
		v, err := d.boolean()
		if v {
			*p |= 1 << i
		}
		return err
	})
}

func (d *reader) setNodes(p []int32) error {
	return d.tuple(len(p), func(i int) error { return d.setIndex(&p[i]) })
}

// enum reads one of the words.
func (d *reader) enum(words []string) (int, error) {
	b, err := d.str()
	if err != nil {
		return 0, err
	}
	for i, w := range words {
		if string(b) == w {
			return i, nil
		}
	}
	return 0, d.errorf("unknown word %.40q", b)
}

func (d *reader) kind() (canopy.Kind, error) {
	b, err := d.str()
	if err != nil {
		return 0, err
	}
	k, ok := canopy.ParseKind(string(b))
	if !ok {
		return 0, d.errorf("unknown word %.40q", b)
	}
	return k, nil
}

func (d *reader) checkID(i int) error {
	id, err := d.integer()
	if err == nil && id != i {
		return d.errorf("want %d: ids count from 0 in the order of the list", i)
	}
	return err
}

// checkNode fails early, while the line is known, if the nodes came before.
func (d *reader) checkNode(v ...int32) error {
	n := int32(len(d.result.Form.Position))
	for _, i := range v {
		if n > 0 && (i < 0 || i >= n) {
			return d.errorf("node %d does not exist (%d nodes)", i, n)
		}
	}
	return nil
}

// addName appends a name, or an empty one if it is only the item's number.
func (d *reader) addName(names *canopy.Names, i int, which int) error {
	b, err := d.str()
	if err != nil {
		return err
	}
	var number [20]byte
	if bytes.Equal(b, strconv.AppendInt(number[:0], int64(i), 10)) {
		if d.named[which] {
			names.Append("")
		}
		return nil
	}
	if !d.named[which] {
		d.named[which] = true
		for range i {
			names.Append("")
		}
	}
	if d.nameBytes[which] += len(b); d.nameBytes[which] > math.MaxInt32 {
		return d.errorf("the names have more than %d letters together", math.MaxInt32)
	}
	names.Append(string(b))
	return nil
}

// room is how many items to make room for: as many as announced, within reason.
func (d *reader) room(which int) int { return max(0, min(d.counts[which], 1<<16)) }

func (d *reader) readCounts() error {
	return d.object(func(key []byte) error {
		switch string(key) {
		case "nodes":
			return d.setInt(&d.counts[0])
		case "members":
			return d.setInt(&d.counts[1])
		case "triangles":
			return d.setInt(&d.counts[2])
		}
		return d.skip()
	})
}

// Keys of the long lists in the order they are written. Those that are written
// for the convenience of others are listed too, so that they cost little.
var (
	nodeKeys = []key{
		{"id", true}, {"name", true}, {"position", true}, {"fixed", true}, {"load", true}, {"reaction", true}, {"held", false}, {"master", false}, {"reference", false},
	}
	memberKeys = []key{
		{"id", true}, {"name", true}, {"kind", true}, {"group", false}, {"nodes", true}, {"length", false}, {"unstressed_length", false}, {"force", true}, {"force_density", false}, {"specified", true}, {"stiffness", false}, {"weight", false}, {"resistance", false}, {"law", true}, {"strength", false}, {"cable", false}, {"unstressed_derived", false},
	}
	triangleKeys = []key{
		{"id", true}, {"fabric", true}, {"nodes", true}, {"area", false}, {"warp", true}, {"stress", true}, {"principal", false}, {"specified", true}, {"moduli", false}, {"resistance", false}, {"warp_wanted", false},
	}
)

// referenceKey and wantedKey are the bits of two keys that may be absent.
const (
	referenceKey = 8
	wantedKey    = 10
)

func (d *reader) nodes() error {
	s, f := d.result.Structure, d.result.Form
	n := d.room(0)
	s.Fixed = make([]canopy.Freedom, 0, n)
	f.Position, f.Reaction = make([]r3.Vec, 0, n), make([]r3.Vec, 0, n)
	err := d.array(func(i int) error {
		d.item = i
		var (
			position, load, reaction, unbuilt r3.Vec
			fixed, held                       canopy.Freedom
			master                            = int32(-1)
		)
		seen, err := d.record(nodeKeys, func(key string) error {
			switch key {
			case "id":
				return d.checkID(i)
			case "name":
				return d.addName(&s.NodeName, i, 0)
			case "position":
				return d.setVec(&position)
			case "fixed":
				return d.setFreedom(&fixed)
			case "reaction":
				return d.setVec(&reaction)
			case "load":
				return d.setVec(&load)
			case "held":
				return d.setFreedom(&held)
			case "master":
				return d.setIndexOrNone(&master)
			case "reference":
				return d.setVec(&unbuilt)
			}
			return d.skip()
		})
		if err != nil {
			return err
		}
		if i == math.MaxInt32 {
			return d.errorf("too many nodes")
		}
		f.Position = append(f.Position, position)
		f.Reaction = append(f.Reaction, reaction)
		s.Fixed = append(s.Fixed, fixed)
		s.Load = sparse(s.Load, i, load, r3.Vec{})
		s.Held = sparse(s.Held, i, held, 0)
		s.Master = sparse(s.Master, i, master, -1)
		if seen>>referenceKey&1 != 0 {
			if len(s.Reference) != i {
				return d.errorf("has a reference, others have none")
			}
			s.Reference = append(s.Reference, unbuilt)
		} else if s.Reference != nil {
			return d.errorf("\"reference\" is missing, others have one")
		}
		return nil
	})
	n = len(f.Position)
	s.Load, s.Held, s.Master = full(s.Load, n, r3.Vec{}), full(s.Held, n, 0), full(s.Master, n, -1)
	return err
}

// sparse appends v as element i of an array that stays nil as long as all
// elements are none.
func sparse[T comparable](a []T, i int, v, none T) []T {
	if v == none {
		if a == nil {
			return nil
		}
		return append(a, none)
	}
	return append(full2(a, i, none), v)
}

// full lengthens an array that is not nil to n elements.
func full[T any](a []T, n int, none T) []T {
	if a == nil {
		return nil
	}
	return full2(a, n, none)
}

func full2[T any](a []T, n int, none T) []T {
	for len(a) < n {
		a = append(a, none)
	}
	return a
}

func (d *reader) members() error {
	s, f := d.result.Structure, d.result.Form
	n := d.room(1)
	s.Ends, s.Kind, s.Law = make([][2]int32, 0, n), make([]canopy.Kind, 0, n), make([]canopy.Law, 0, n)
	s.Given, f.Force = make([]float64, 0, n), make([]float64, 0, n)
	err := d.array(func(i int) error {
		d.item = i
		var (
			ends                                                  [2]int32
			kind                                                  canopy.Kind
			law                                                   int
			group, cable                                          int32 = -1, -1
			force, given, stiffness, unstressed, weight, strength float64
			derived                                               bool
		)
		_, err := d.record(memberKeys, func(key string) (err error) {
			switch key {
			case "id":
				return d.checkID(i)
			case "name":
				return d.addName(&s.MemberName, i, 1)
			case "kind":
				kind, err = d.kind()
				return err
			case "nodes":
				if err := d.setNodes(ends[:]); err != nil {
					return err
				}
				return d.checkNode(ends[:]...)
			case "force":
				return d.setNumber(&force)
			case "specified":
				return d.setGiven(&given)
			case "law":
				law, err = d.enum(lawNames[:])
				return err
			case "stiffness":
				return d.setGiven(&stiffness)
			case "unstressed_length":
				return d.setGiven(&unstressed)
			case "weight":
				return d.setNumber(&weight)
			case "strength":
				return d.setNumber(&strength)
			case "group":
				if d.null() {
					return nil
				}
				b, err := d.str()
				if err != nil {
					return err
				}
				group = intern(d.group, &s.Groups, b)
				return nil
			case "cable":
				return d.setIndexOrNone(&cable)
			case "unstressed_derived":
				return d.setBool(&derived)
			}
			return d.skip()
		})
		if err != nil {
			return err
		}
		if derived {
			unstressed = 0
		}
		s.Ends = append(s.Ends, ends)
		s.Kind = append(s.Kind, kind)
		s.Law = append(s.Law, canopy.Law(law))
		s.Given = append(s.Given, given)
		f.Force = append(f.Force, force)
		s.Stiffness = sparse(s.Stiffness, i, stiffness, 0)
		s.Unstressed = sparse(s.Unstressed, i, unstressed, 0)
		s.Weight = sparse(s.Weight, i, weight, 0)
		s.Strength = sparse(s.Strength, i, strength, 0)
		s.Group = sparse(s.Group, i, group, -1)
		s.CableOf = sparse(s.CableOf, i, cable, -1)
		return nil
	})
	n = len(s.Ends)
	s.Stiffness, s.Unstressed = full(s.Stiffness, n, 0), full(s.Unstressed, n, 0)
	s.Weight, s.Strength = full(s.Weight, n, 0), full(s.Strength, n, 0)
	s.Group, s.CableOf = full(s.Group, n, -1), full(s.CableOf, n, -1)
	return err
}

// intern returns the number of the name b in list, which it may extend.
func intern(numbers map[string]int32, list *[]string, b []byte) int32 {
	if i, ok := numbers[string(b)]; ok {
		return i
	}
	name := string(b)
	i := int32(len(*list))
	*list = append(*list, name)
	numbers[name] = i
	return i
}

func (d *reader) triangles() error {
	s, f := d.result.Structure, d.result.Form
	n := d.room(2)
	s.Corners, s.FabricOf = make([][3]int32, 0, n), make([]int32, 0, n)
	s.Warp, s.Stress = make([]r3.Vec, 0, n), make([][2]float64, 0, n)
	f.Warp, f.Stress = make([]r3.Vec, 0, n), make([]canopy.Stress, 0, n)
	return d.array(func(i int) error {
		d.item = i
		var (
			corners      [3]int32
			fabric       int32
			warp, wanted r3.Vec
			stress       canopy.Stress
			specified    [2]float64
		)
		seen, err := d.record(triangleKeys, func(key string) error {
			switch key {
			case "id":
				return d.checkID(i)
			case "fabric":
				b, err := d.str()
				if err != nil {
					return err
				}
				fabric = intern(d.fabric, &d.usedNames, b)
				return nil
			case "nodes":
				if err := d.setNodes(corners[:]); err != nil {
					return err
				}
				return d.checkNode(corners[:]...)
			case "warp":
				return d.setVec(&warp)
			case "stress":
				return d.object(func(key []byte) error {
					switch string(key) {
					case "warp":
						return d.setNumber(&stress.Warp)
					case "weft":
						return d.setNumber(&stress.Weft)
					case "shear":
						return d.setNumber(&stress.Shear)
					}
					return d.skip()
				})
			case "specified":
				return d.warpWeft(&specified[0], &specified[1])
			case "warp_wanted":
				return d.setVec(&wanted)
			}
			return d.skip()
		})
		if err != nil {
			return err
		}
		if seen>>wantedKey&1 == 0 {
			wanted = warp
		}
		s.Corners = append(s.Corners, corners)
		s.FabricOf = append(s.FabricOf, fabric)
		s.Warp = append(s.Warp, wanted)
		s.Stress = append(s.Stress, specified)
		f.Warp = append(f.Warp, warp)
		f.Stress = append(f.Stress, stress)
		return nil
	})
}

func (d *reader) warpWeft(warp, weft *float64) error {
	return d.object(func(key []byte) error {
		switch string(key) {
		case "warp":
			return d.setNumber(warp)
		case "weft":
			return d.setNumber(weft)
		}
		return d.skip()
	})
}

func (d *reader) fabrics() error {
	s := d.result.Structure
	return d.array(func(i int) error {
		d.item = i
		var f canopy.Fabric
		err := d.object(func(key []byte) error {
			switch string(key) {
			case "name":
				return d.setString(&f.Name)
			case "elastic":
				return d.setBool(&f.Elastic)
			case "moduli":
				if d.null() {
					return nil
				}
				return d.object(func(key []byte) error {
					switch string(key) {
					case "warp":
						return d.setNumber(&f.WarpModulus)
					case "weft":
						return d.setNumber(&f.WeftModulus)
					case "shear":
						return d.setNumber(&f.ShearModulus)
					case "poisson_warp_weft":
						return d.setNumber(&f.PoissonWarpWeft)
					}
					return d.skip()
				})
			case "strength":
				if d.null() {
					return nil
				}
				return d.warpWeft(&f.WarpStrength, &f.WeftStrength)
			case "weight":
				return d.setNumber(&f.Weight)
			case "pressure":
				return d.setNumber(&f.Pressure)
			}
			return d.skip()
		})
		if err != nil {
			return err
		}
		s.Fabrics = append(s.Fabrics, f)
		return nil
	})
}

func (d *reader) cables() error {
	s := d.result.Structure
	return d.array(func(i int) error {
		d.item = i
		var c canopy.Cable
		var seen fields
		err := d.object(func(key []byte) (err error) {
			switch string(key) {
			case "id":
				return d.checkID(i)
			case "name":
				seen |= 1
				return d.setString(&c.Name)
			case "kind":
				seen |= 2
				c.Kind, err = d.kind()
				return err
			case "law":
				seen |= 4
				law, err := d.enum(cableLawNames[:])
				c.Law = canopy.CableLaw(law)
				return err
			case "value":
				return d.setGiven(&c.Value)
			case "stiffness":
				return d.setGiven(&c.Stiffness)
			case "unstressed_length":
				return d.setGiven(&c.Unstressed)
			case "members":
				seen |= 8
				return d.setIndices(&c.Members)
			case "nodes":
				seen |= 16
				return d.setIndices(&c.Nodes)
			}
			return d.skip()
		})
		if err != nil {
			return err
		}
		s.Cables = append(s.Cables, c)
		return d.want(seen, "name", "kind", "law", "members", "nodes")
	})
}

func (d *reader) rings() error {
	s, f := d.result.Structure, d.result.Form
	return d.array(func(i int) error {
		d.item = i
		g := canopy.Ring{Cable: -1}
		var couple r3.Vec
		var seen fields
		err := d.object(func(key []byte) error {
			switch string(key) {
			case "id":
				return d.checkID(i)
			case "name":
				seen |= 1
				return d.setString(&g.Name)
			case "centre":
				seen |= 2
				return d.setIndex(&g.Centre)
			case "nodes":
				seen |= 4
				return d.setIndices(&g.Nodes)
			case "rigid":
				seen |= 8
				return d.setBool(&g.Rigid)
			case "free":
				seen |= 16
				return d.setFreedom(&g.Free)
			case "weight":
				return d.setNumber(&g.Weight)
			case "cable":
				return d.setIndexOrNone(&g.Cable)
			case "couple":
				return d.setVec(&couple)
			}
			return d.skip()
		})
		if err != nil {
			return err
		}
		s.Rings = append(s.Rings, g)
		f.Couple = append(f.Couple, couple)
		return d.want(seen, "name", "centre", "nodes", "rigid", "free")
	})
}

func (d *reader) lines() error {
	s := d.result.Structure
	return d.array(func(i int) error {
		d.item = i
		var l canopy.Line
		err := d.object(func(key []byte) error {
			switch string(key) {
			case "id":
				return d.checkID(i)
			case "name":
				return d.setString(&l.Name)
			case "role":
				return d.setString(&l.Role)
			case "nodes":
				return d.setIndices(&l.Nodes)
			}
			return d.skip()
		})
		s.Lines = append(s.Lines, l)
		return err
	})
}

func (d *reader) loads() error {
	return d.object(func(key []byte) error {
		if string(key) == "self_weight" {
			return d.setBool(&d.result.Structure.SelfWeight)
		}
		return d.skip()
	})
}

// finish joins what could come in any order and checks every reference.
func (d *reader) finish() error {
	s, f := d.result.Structure, d.result.Form
	d.key = d.key[:0]
	byName := make(map[string]int32, len(s.Fabrics))
	for i := range s.Fabrics {
		if _, twice := byName[s.Fabrics[i].Name]; twice {
			return d.errorf("two fabrics are called %q", s.Fabrics[i].Name)
		}
		byName[s.Fabrics[i].Name] = int32(i)
	}
	number := make([]int32, len(d.usedNames))
	for i, name := range d.usedNames {
		k, ok := byName[name]
		if !ok {
			first := slices.Index(s.FabricOf, int32(i))
			return d.errorf("triangle %d: fabric %.40q is not in the list of fabrics", first, name)
		}
		number[i] = k
	}
	for i, v := range s.FabricOf {
		s.FabricOf[i] = number[v]
	}
	for i, n := range []int{len(f.Position), len(s.Ends), len(s.Corners)} {
		if c := d.counts[i]; c != 0 && c != n {
			what := [...]string{"nodes", "members", "triangles"}[i]
			return d.errorf("the file announces %d %s and holds %d: it is cut or edited", c, what, n)
		}
	}
	if err := d.joinAir(byName); err != nil {
		return err
	}
	s.Position = slices.Clone(f.Position)
	return references(d.result, func(what string, i int, problem string) error {
		return d.errorf("%s", fmt.Sprintf("%s %d: %s", what, i, problem))
	})
}
