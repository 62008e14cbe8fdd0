package export

import (
	"archive/zip"
	"context"
	"fmt"
	"io"
	"strings"

	"anticlast/formfind/canopy"
	"anticlast/formfind/load"

	"gonum.org/v1/gonum/spatial/r3"
)

// The analysis hand-over is a set of tables from which an engineer can rebuild
// the structure with its prestress in any finite-element program, and a text
// that says what stands in them. Everything is in N and m with all digits, and
// things are called by their numbers.

// handoverFiles are the files of the set in the order they are written.
var handoverFiles = []struct {
	name    string
	purpose string
	write   func(t *handTable, r *canopy.Result)
}{
	{"nodes.csv", "the nodes of the found shape", handNodes},
	{"supports.csv", "directions in which a foundation holds a node (1 = held)", handSupports},
	{"members.csv", "cables, masts, guys and struts with prestress and unstressed length", handMembers},
	{"cables.csv", "chains of members that are one cable, in order along it", handCables},
	{"triangles.csv", "fabric with local axes and membrane prestress", handTriangles},
	{"fabrics.csv", "what the triangles of one fabric have in common", handFabrics},
	{"rings.csv", "rings: nodes in order; a rigid ring moves as one body", handRings},
	{"loads.csv", "external forces on nodes that act in the found state, weights and pressure included where they act", handLoads},
	{"reactions.csv", "reactions and the actions on the foundations", handReactions},
}

// Handover writes the analysis hand-over into a folder, which is swapped in as
// by [Folder].
func Handover(ctx context.Context, dir string, r *canopy.Result, o Options) error {
	return swapIn(dir, o, func(create func(string, func(io.Writer) error) error) error {
		return handover(ctx, r, create)
	})
}

// writeHandover writes the analysis hand-over as a ZIP archive.
func writeHandover(ctx context.Context, w io.Writer, r *canopy.Result, _ Options) error {
	z := zip.NewWriter(w)
	err := handover(ctx, r, func(name string, write func(io.Writer) error) error {
		// No time of day: same result, same bytes.
		f, err := z.CreateHeader(&zip.FileHeader{Name: "handover/" + name, Method: zip.Deflate})
		if err != nil {
			return err
		}
		return write(f)
	})
	if err != nil {
		return err
	}
	return z.Close()
}

func handover(ctx context.Context, r *canopy.Result, create func(name string, write func(io.Writer) error) error) error {
	err := create("read-me.txt", func(w io.Writer) error {
		if err := ctx.Err(); err != nil {
			return err
		}
		_, err := io.WriteString(w, handoverText(r))
		return err
	})
	for _, f := range handoverFiles {
		if err != nil {
			return err
		}
		err = create(f.name, func(w io.Writer) error {
			t := &handTable{table{newText(ctx, w), true}}
			t.str("# ").str(canopy.Caution).line()
			f.write(t, r)
			return t.close()
		})
	}
	return err
}

// handTable writes numbers with all their digits.
type handTable struct{ table }

func (t *handTable) header(names ...string) {
	for _, n := range names {
		t.field(n)
	}
	t.line()
	t.first = true
}

func (t *handTable) row() bool {
	t.first = true
	return t.line()
}

func (t *handTable) number(v float64) {
	t.comma()
	t.exact(v)
}

// given leaves the field empty for 0.
func (t *handTable) given(v float64) {
	t.comma()
	if v != 0 {
		t.exact(v)
	}
}

func (t *handTable) vec(v r3.Vec) {
	t.number(v.X)
	t.number(v.Y)
	t.number(v.Z)
}

func (t *handTable) numbers(list []int32) {
	t.comma()
	for i, v := range list {
		if i > 0 {
			t.b = append(t.b, ' ')
		}
		t.int(int(v))
	}
}

func (t *handTable) yes(v bool) {
	if v {
		t.count(1)
	} else {
		t.count(0)
	}
}

func handNodes(t *handTable, r *canopy.Result) {
	t.header("node", "name", "x [m]", "y [m]", "z [m]")
	for i, p := range r.Form.Position {
		t.count(i)
		t.field(r.Structure.NodeName.At(i))
		t.vec(p)
		if !t.row() {
			return
		}
	}
}

func handSupports(t *handTable, r *canopy.Result) {
	t.header("node", "x", "y", "z")
	for i, f := range r.Structure.Fixed {
		if f == 0 {
			continue
		}
		t.count(i)
		for d := range 3 {
			t.yes(f.Has(d))
		}
		if !t.row() {
			return
		}
	}
}

func handMembers(t *handTable, r *canopy.Result) {
	s, f := r.Structure, r.Form
	t.header("member", "name", "kind", "node 1", "node 2", "may push", "length [m]", "unstressed length [m]",
		"prestress force [N]", "stiffness EA [N]", "weight [N/m]", "strength [N]", "cable")
	for i, e := range s.Ends {
		t.count(i)
		t.field(s.MemberName.At(i))
		t.field(s.Kind[i].String())
		t.count(int(e[0]))
		t.count(int(e[1]))
		t.yes(s.Kind[i].Pushes())
		t.number(memberLength(r, i))
		t.given(unstressedLength(r, i))
		t.number(f.Force[i])
		t.given(optional(s.Stiffness, i))
		t.given(optional(s.Weight, i))
		t.given(optional(s.Strength, i))
		t.comma()
		if c := cableOf(s, i); c >= 0 {
			t.int(int(c))
		}
		if !t.row() {
			return
		}
	}
}

func handCables(t *handTable, r *canopy.Result) {
	t.header("cable", "name", "kind", "nodes", "members")
	for i := range r.Structure.Cables {
		c := &r.Structure.Cables[i]
		t.count(i)
		t.field(c.Name)
		t.field(c.Kind.String())
		t.numbers(c.Nodes)
		t.numbers(c.Members)
		if !t.row() {
			return
		}
	}
}

func handTriangles(t *handTable, r *canopy.Result) {
	s, f := r.Structure, r.Form
	t.header("triangle", "fabric", "node 1", "node 2", "node 3", "area [m2]",
		"warp x", "warp y", "warp z", "weft x", "weft y", "weft z", "normal x", "normal y", "normal z",
		"prestress warp [N/m]", "prestress weft [N/m]", "prestress shear [N/m]")
	for i, c := range s.Corners {
		normal, area := triangleNormal(r, i)
		t.count(i)
		t.count(int(s.FabricOf[i]))
		for _, v := range c {
			t.count(int(v))
		}
		t.number(area)
		t.vec(f.Warp[i])
		t.vec(r3.Cross(normal, f.Warp[i]))
		t.vec(normal)
		t.number(f.Stress[i].Warp)
		t.number(f.Stress[i].Weft)
		t.number(f.Stress[i].Shear)
		if !t.row() {
			return
		}
	}
}

func handFabrics(t *handTable, r *canopy.Result) {
	t.header("fabric", "name", "modulus warp [N/m]", "modulus weft [N/m]", "modulus shear [N/m]", "Poisson warp-weft [-]",
		"strength warp [N/m]", "strength weft [N/m]", "weight [N/m2]", "internal pressure [N/m2]")
	for i := range r.Structure.Fabrics {
		f := &r.Structure.Fabrics[i]
		t.count(i)
		t.field(f.Name)
		for _, v := range []float64{f.WarpModulus, f.WeftModulus, f.ShearModulus, f.PoissonWarpWeft, f.WarpStrength, f.WeftStrength, f.Weight, f.Pressure} {
			t.given(v)
		}
		if !t.row() {
			return
		}
	}
}

func handRings(t *handTable, r *canopy.Result) {
	t.header("ring", "name", "rigid", "centre node", "nodes", "couple x [N m]", "couple y [N m]", "couple z [N m]")
	for i := range r.Structure.Rings {
		g := &r.Structure.Rings[i]
		t.count(i)
		t.field(g.Name)
		t.yes(g.Rigid)
		t.count(int(g.Centre))
		t.numbers(g.Nodes)
		var couple r3.Vec
		if i < len(r.Form.Couple) {
			couple = r.Form.Couple[i]
		}
		t.vec(couple)
		if !t.row() {
			return
		}
	}
}

func handLoads(t *handTable, r *canopy.Result) {
	t.header("node", "force x [N]", "force y [N]", "force z [N]")
	for i, v := range load.Nodal(r.Structure, r.Form.Position) {
		if v == (r3.Vec{}) {
			continue
		}
		t.count(i)
		t.vec(v)
		if !t.row() {
			return
		}
	}
}

func handReactions(t *handTable, r *canopy.Result) {
	t.header("node", "reaction x [N]", "reaction y [N]", "reaction z [N]",
		"action on foundation x [N]", "action on foundation y [N]", "action on foundation z [N]")
	for i, f := range r.Structure.Fixed {
		if f == 0 {
			continue
		}
		v := r.Form.Reaction[i]
		t.count(i)
		t.vec(v)
		t.vec(r3.Scale(-1, v))
		if !t.row() {
			return
		}
	}
}

func handoverText(r *canopy.Result) string {
	var b strings.Builder
	p := func(format string, args ...any) { fmt.Fprintf(&b, format+"\n", args...) }
	p("ANALYSIS HAND-OVER")
	p("")
	p("%s", canopy.Caution)
	p("")
	p("Project    %s", oneLine(r.Title))
	p("Model      %s %s", r.File, r.Digest)
	p("Made by    %s %s, engines: %s", r.Program.Name, r.Program.Version, strings.Join(r.Program.Engines, ", "))
	if r.Audit.Trusted {
		p("Audit      trusted: largest nodal residual %s of the forces meeting there", tiny(r.Audit.ResidualLargest))
	} else {
		p("Audit      NOT TRUSTED")
		for _, reason := range r.Audit.Reasons {
			p("           - %s", reason)
		}
	}
	p("")
	p("UNITS AND SIGNS")
	p("")
	p("SI throughout: m, N, N/m, N/m2; angles do not occur. Axes are right-handed, z up.")
	p("Tension is positive, compression negative.")
	p("Membrane prestress is true stress times thickness: N per metre of width as it is in")
	p("the found shape. Numbers are in the shortest form that reads back to the same 64-bit")
	p("value. Nodes, members, triangles and so on are called by their numbers, from 0. Lines")
	p("that begin with # are comments. An empty field means: not given.")
	p("")
	p("FILES")
	p("")
	for _, f := range handoverFiles {
		p("%-14s %s", f.name, f.purpose)
	}
	p("")
	p("WHAT STANDS IN THEM")
	p("")
	p("members.csv    A member is straight, hinged at both ends, and carries its prestress force.")
	p("               Members that may not push go slack instead of being compressed. Where a")
	p("               stiffness is given, force = EA (length - unstressed) / unstressed. Members")
	p("               of one cable (see cables.csv) have one force where the cable slides freely")
	p("               over what it bounds.")
	p("triangles.csv  Nodes run counter-clockwise around the normal. Local axes: warp, weft =")
	p("               normal x warp, normal. Prestress is the plane tensor (warp, weft, shear)")
	p("               in these axes, constant over the triangle.")
	p("rings.csv      All nodes of a rigid ring move as its centre node does, without rotation:")
	p("               tie them to it. The couple is the moment about the centre with which what")
	p("               carries the ring holds it.")
	p("supports.csv   All other nodes are free. Points whose place was given by the designer and")
	p("               that masts and guys balance are not supports: they stand by equilibrium.")
	p("fabrics.csv    Internal pressure pushes along the normals of the triangles.")
	p("loads.csv      Forces that act in the found state beside prestress. Do not add the weights")
	p("               of members and fabrics again when they stand here, nor pressure.")
	if len(r.Structure.Enclosures) > 0 {
		p("               The pressure was found from the volume of air it encloses; the shape is")
		p("               stable while that volume is held, which a constant pressure need not do.")
	}
	if r.Structure.SelfWeight {
		p("               The weights act here.")
	} else {
		p("               No weights act here: the shape was found without them.")
	}
	p("reactions.csv  Force of the support on the structure, and its opposite, the action of the")
	p("               structure on the foundation.")
	p("")
	p("HOW TO CHECK A REBUILT MODEL")
	p("")
	p("Put in nodes, members and triangles with their prestress, supports, ties and loads, and")
	p("ask for equilibrium: nodes should not move, and reactions should be those listed. By")
	p("hand: a triangle with area A and plane stress tensor S pulls its node i by -A S grad(N_i),")
	p("N_i being the linear shape function; a member pulls its ends towards each other by its")
	p("force; at every free node these and the loads add up to zero, at supports to minus the")
	p("reaction, at rigid rings over the whole ring.")
	p("")
	p("NUMBERS")
	p("")
	s := r.Structure
	p("%d nodes, %d members, %d triangles, %d cables, %d fabrics, %d rings", len(s.Position), len(s.Ends), len(s.Corners), len(s.Cables), len(s.Fabrics), len(s.Rings))
	return b.String()
}
