package export

import (
	"context"
	"io"
	"math"
	"strings"

	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

// digits is how many significant digits tables for people carry. form.json has
// them all.
const digits = 10

// table writes comma-separated values (RFC 4180) under a comment line with the
// caution and a header that states units.
type table struct {
	*text
	first bool
}

func newTable(ctx context.Context, w io.Writer, header ...string) *table {
	t := &table{newText(ctx, w), true}
	t.str("# ").str(canopy.Caution).str("\r\n")
	for _, h := range header {
		t.field(h)
	}
	t.row()
	return t
}

func (t *table) comma() {
	if !t.first {
		t.b = append(t.b, ',')
	}
	t.first = false
}

func (t *table) row() bool {
	t.first = true
	t.b = append(t.b, '\r')
	return t.line()
}

// field writes text, in quotes where the text needs them.
func (t *table) field(s string) {
	t.comma()
	if strings.ContainsAny(s, ",\"\r\n#") || s != strings.TrimSpace(s) {
		t.b = append(t.b, '"')
		t.str(strings.ReplaceAll(s, `"`, `""`))
		t.b = append(t.b, '"')
		return
	}
	t.str(s)
}

func (t *table) count(v int) {
	t.comma()
	t.int(v)
}

func (t *table) number(v float64) {
	t.comma()
	t.num(v, digits)
}

// given writes a number that may be absent: an empty field for 0 and NaN.
func (t *table) given(v float64) {
	t.comma()
	if v != 0 && !math.IsNaN(v) {
		t.num(v, digits)
	}
}

func (t *table) vec(v r3.Vec, scale float64) {
	t.number(v.X * scale)
	t.number(v.Y * scale)
	t.number(v.Z * scale)
}

// directions writes a freedom as letters.
func (t *table) directions(f canopy.Freedom) {
	t.comma()
	for d := range 3 {
		if f.Has(d) {
			t.b = append(t.b, "xyz"[d])
		}
	}
}

// Files for people are in kN.
const kilo = 1e-3

func writeNodes(ctx context.Context, w io.Writer, r *canopy.Result, _ Options) error {
	s, f := r.Structure, r.Form
	t := newTable(ctx, w, "id", "name", "x [m]", "y [m]", "z [m]", "supported", "held",
		"load x [kN]", "load y [kN]", "load z [kN]")
	for i, p := range f.Position {
		t.count(i)
		t.field(s.NodeName.At(i))
		t.vec(p, 1)
		t.directions(s.Fixed[i])
		t.directions(s.FixedAt(i) &^ s.Fixed[i])
		t.vec(s.LoadAt(i), kilo)
		if !t.row() {
			break
		}
	}
	return t.close()
}

func writeMembers(ctx context.Context, w io.Writer, r *canopy.Result, _ Options) error {
	s, f := r.Structure, r.Form
	t := newTable(ctx, w, "id", "name", "kind", "group", "cable", "from", "to", "length [m]",
		"unstressed length [m]", "force [kN]", "force density [kN/m]", "given force [kN]", "given force density [kN/m]",
		"stiffness EA [kN]", "weight [kN/m]", "strength [kN]", "utilisation (prestress only) [-]")
	for i, e := range s.Ends {
		length := memberLength(r, i)
		t.count(i)
		t.field(s.MemberName.At(i))
		t.field(s.Kind[i].String())
		if s.Group != nil && s.Group[i] >= 0 {
			t.field(s.Groups[s.Group[i]])
		} else {
			t.field("")
		}
		if c := cableOf(s, i); c >= 0 {
			t.field(s.Cables[c].Name)
		} else {
			t.field("")
		}
		t.field(s.NodeName.At(int(e[0])))
		t.field(s.NodeName.At(int(e[1])))
		t.number(length)
		t.given(unstressedLength(r, i))
		t.number(f.Force[i] * kilo)
		t.given(f.Force[i] / length * kilo)
		var force, density float64
		switch s.Law[i] {
		case canopy.LawForce:
			force = s.Given[i]
		case canopy.LawForceDensity:
			density = s.Given[i]
		}
		t.given(force * kilo)
		t.given(density * kilo)
		t.given(optional(s.Stiffness, i) * kilo)
		t.given(optional(s.Weight, i) * kilo)
		t.given(optional(s.Strength, i) * kilo)
		t.given(memberUtilisation(r, i))
		if !t.row() {
			break
		}
	}
	return t.close()
}

func writeTriangles(ctx context.Context, w io.Writer, r *canopy.Result, _ Options) error {
	s, f := r.Structure, r.Form
	t := newTable(ctx, w, "id", "fabric", "node 1", "node 2", "node 3", "area [m2]",
		"warp x [-]", "warp y [-]", "warp z [-]",
		"warp stress [kN/m]", "weft stress [kN/m]", "shear stress [kN/m]", "major principal [kN/m]", "minor principal [kN/m]",
		"specified warp [kN/m]", "specified weft [kN/m]", "warp achieved/specified [-]", "weft achieved/specified [-]", "slope [deg]")
	for i, c := range s.Corners {
		normal, area := triangleNormal(r, i)
		t.count(i)
		t.field(s.Fabrics[s.FabricOf[i]].Name)
		for _, v := range c {
			t.field(s.NodeName.At(int(v)))
		}
		t.number(area)
		t.vec(f.Warp[i], 1)
		stress, want := f.Stress[i], s.Stress[i]
		major, minor := principal(stress)
		t.number(stress.Warp * kilo)
		t.number(stress.Weft * kilo)
		t.number(stress.Shear * kilo)
		t.number(major * kilo)
		t.number(minor * kilo)
		t.number(want[0] * kilo)
		t.number(want[1] * kilo)
		t.given(ratio(stress.Warp, want[0]))
		t.given(ratio(stress.Weft, want[1]))
		t.number(degrees(slope(normal)))
		if !t.row() {
			break
		}
	}
	return t.close()
}

func writeReactions(ctx context.Context, w io.Writer, r *canopy.Result, _ Options) error {
	s, f := r.Structure, r.Form
	t := newTable(ctx, w, "node", "name", "line", "x [m]", "y [m]", "z [m]", "supported",
		"reaction x [kN]", "reaction y [kN]", "reaction z [kN]", "reaction [kN]",
		"action on foundation x [kN]", "action on foundation y [kN]", "action on foundation z [kN]")
	lines := lineOf(s)
	for i, fixed := range s.Fixed {
		if fixed == 0 {
			continue
		}
		t.count(i)
		t.field(s.NodeName.At(i))
		if l, ok := lines[int32(i)]; ok {
			t.field(s.Lines[l].Name)
		} else {
			t.field("")
		}
		t.vec(f.Position[i], 1)
		t.directions(fixed)
		t.vec(f.Reaction[i], kilo)
		t.number(r3.Norm(f.Reaction[i]) * kilo)
		t.vec(f.Reaction[i], -kilo)
		if !t.row() {
			break
		}
	}
	return t.close()
}
