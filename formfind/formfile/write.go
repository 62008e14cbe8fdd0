package formfile

import (
	"context"
	"fmt"
	"io"
	"math"
	"strconv"
	"unsafe"

	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

// Format is the value of the key "format" in the files this package writes.
const Format = "anticlast-form/1"

// Write writes r as form.json. The bytes depend on r only. A number that is
// not finite is an error that says where it stands; in the audit, the findings
// and the quantities NaN stands for "not known" and is written as null.
// Structure.Curves, OnCurve and Param, which serve refinement, are not written,
// nor is the starting guess in Structure.Position.
func Write(ctx context.Context, w io.Writer, r *canopy.Result) error {
	if err := write(ctx, w, r); err != nil {
		return fmt.Errorf("writing form.json: %w", err)
	}
	return nil
}

// head are the parts before the long lists, in their order.
var head = []struct {
	key   string
	write func(t *text, r *canopy.Result)
}{
	{"format", func(t *text, r *canopy.Result) { t.string(Format) }},
	{"caution", func(t *text, r *canopy.Result) { t.string(canopy.Caution) }},
	{"program", writeProgram},
	{"model", writeModel},
	{"units", writeUnits},
	{"counts", writeCounts},
	{"form", writeForm},
	{"quantities", writeQuantities},
	{"audit", writeAudit},
	{"findings", writeFindings},
	{"fabrics", writeFabrics},
	{"air", writeAir},
}

// AppendHead appends what stands before the long lists of form.json (program,
// model, units, counts, form, quantities, audit, findings, fabrics, air) to b as the
// members of a JSON object without its braces, for those who want the result
// without the shape.
func AppendHead(b []byte, r *canopy.Result) ([]byte, error) {
	if err := consistent(r); err != nil {
		return b, err
	}
	t := &text{b: b}
	for i, p := range head {
		if i > 0 {
			t.b = append(t.b, ",\n"...)
		}
		t.k(p.key)
		p.write(t, r)
		if t.bad != "" {
			return b, fmt.Errorf("%s: %s", p.key, t.bad)
		}
	}
	return t.b, nil
}

func write(ctx context.Context, w io.Writer, r *canopy.Result) error {
	if err := consistent(r); err != nil {
		return err
	}
	t := &text{}
	t.b = append(t.b, "{\n"...)
	for _, p := range head {
		t.k(p.key)
		p.write(t, r)
		t.b = append(t.b, ",\n"...)
		if t.bad != "" {
			return fmt.Errorf("%s: %s", p.key, t.bad)
		}
	}
	flush := func() error {
		_, err := w.Write(t.b)
		t.b = t.b[:0]
		return err
	}
	s := r.Structure
	lists := []struct {
		key  string
		n    int
		item func(*text, int) error
	}{
		{"nodes", len(s.Position), nodeItem(r)},
		{"members", len(s.Ends), memberItem(r)},
		{"triangles", len(s.Corners), triangleItem(r)},
		{"cables", len(s.Cables), cableItem(r)},
		{"rings", len(s.Rings), ringItem(r)},
		{"lines", len(s.Lines), lineItem(r)},
	}
	for _, l := range lists {
		t.k(l.key)
		if err := flush(); err != nil {
			return err
		}
		if err := list(ctx, w, l.n, l.item); err != nil {
			return err
		}
		t.b = append(t.b, ",\n"...)
	}
	t.k("loads")
	writeLoads(t, r)
	if t.bad != "" {
		return fmt.Errorf("loads: %s", t.bad)
	}
	t.b = append(t.b, "\n}\n"...)
	return flush()
}

// consistent checks what indexing relies on.
func consistent(r *canopy.Result) error {
	s, f := r.Structure, r.Form
	if s == nil || f == nil {
		return fmt.Errorf("the result holds no shape")
	}
	n, m, c := len(s.Position), len(s.Ends), len(s.Corners)
	for _, v := range []struct {
		what      string
		got, want int
		optional  bool
	}{
		{"Structure.Fixed", len(s.Fixed), n, false},
		{"Structure.Held", len(s.Held), n, true},
		{"Structure.Load", len(s.Load), n, true},
		{"Structure.Master", len(s.Master), n, true},
		{"Structure.Reference", len(s.Reference), n, true},
		{"Form.Position", len(f.Position), n, false},
		{"Form.Reaction", len(f.Reaction), n, false},
		{"Structure.Kind", len(s.Kind), m, false},
		{"Structure.Law", len(s.Law), m, false},
		{"Structure.Given", len(s.Given), m, false},
		{"Structure.Stiffness", len(s.Stiffness), m, true},
		{"Structure.Unstressed", len(s.Unstressed), m, true},
		{"Structure.Weight", len(s.Weight), m, true},
		{"Structure.Strength", len(s.Strength), m, true},
		{"Structure.Group", len(s.Group), m, true},
		{"Structure.CableOf", len(s.CableOf), m, true},
		{"Form.Force", len(f.Force), m, false},
		{"Structure.FabricOf", len(s.FabricOf), c, false},
		{"Structure.Warp", len(s.Warp), c, false},
		{"Structure.Stress", len(s.Stress), c, false},
		{"Form.Warp", len(f.Warp), c, false},
		{"Form.Stress", len(f.Stress), c, false},
		{"Form.Couple", len(f.Couple), len(s.Rings), true},
	} {
		if v.got != v.want && !(v.optional && v.got == 0) {
			return fmt.Errorf("%s has %d entries, want %d", v.what, v.got, v.want)
		}
	}
	seen := make(map[string]bool, len(s.Fabrics))
	for _, fabric := range s.Fabrics {
		if seen[fabric.Name] {
			return fmt.Errorf("two fabrics are called %q", fabric.Name)
		}
		seen[fabric.Name] = true
	}
	return references(r, func(what string, i int, problem string) error {
		return fmt.Errorf("%s %d: %s", what, i, problem)
	})
}

func writeProgram(t *text, r *canopy.Result) {
	t.open('{')
	t.k("name").string(r.Program.Name)
	t.k("version").string(r.Program.Version)
	t.k("engines").strings(r.Program.Engines)
	t.close('}')
}

func writeModel(t *text, r *canopy.Result) {
	t.open('{')
	t.k("title").string(r.Title)
	t.k("file").string(r.File)
	t.k("digest").string(r.Digest)
	l := &r.Limits
	bounds := func(v *[2]float64) {
		if v == nil {
			t.null()
			return
		}
		t.open('[')
		t.number(v[0])
		t.number(v[1])
		t.close(']')
	}
	bound := func(v *float64) {
		if v == nil {
			t.null()
			return
		}
		t.number(*v)
	}
	t.k("limits").open('{')
	t.k("achieved")
	bounds(l.Achieved)
	t.k("ratio")
	bounds(l.Ratio)
	t.k("stress_min")
	bound(l.StressMin)
	t.k("stress_max")
	bound(l.StressMax)
	t.k("cable_max")
	bound(l.CableMax)
	t.k("slope_min")
	bound(l.SlopeMin)
	t.k("reaction_max")
	bound(l.ReactionMax)
	t.k("utilisation")
	bound(l.Utilisation)
	t.k("headroom").open('[')
	for _, h := range l.Headroom {
		t.open('{')
		t.k("name").string(h.Name)
		t.k("height").number(h.Height)
		t.k("region").open('[')
		for _, p := range h.Region {
			t.vec(p)
		}
		t.close(']')
		t.close('}')
	}
	t.close(']')
	t.close('}')
	t.k("factors").open('{')
	t.k("load").given(r.Factors.Load)
	t.k("fabric").given(r.Factors.Fabric)
	t.k("cable").given(r.Factors.Cable)
	t.close('}')
	if r.North != nil {
		t.k("north").number(*r.North)
	}
	t.close('}')
}

func writeUnits(t *text, r *canopy.Result) {
	t.open('{')
	for _, u := range [][2]string{
		{"length", "m"},
		{"area", "m2"},
		{"force", "N, tension positive"},
		{"force_density", "N/m"},
		{"stress", "N/m of fabric width, in the deformed triangle"},
		{"weight", "N/m of members, N/m2 of fabric, N of rings"},
		{"pressure", "N/m2"},
		{"volume", "m3"},
		{"stiffness", "N (EA) of members, N/m of fabric"},
		{"angle", "rad"},
		{"couple", "N m"},
		{"axes", "right-handed, z up"},
		{"reaction", "force of the support on the structure; the action on the foundation is its opposite"},
	} {
		t.k(u[0]).string(u[1])
	}
	t.close('}')
}

func writeCounts(t *text, r *canopy.Result) {
	t.open('{')
	t.k("nodes").integer(len(r.Structure.Position))
	t.k("members").integer(len(r.Structure.Ends))
	t.k("triangles").integer(len(r.Structure.Corners))
	t.close('}')
}

func writeForm(t *text, r *canopy.Result) {
	t.open('{')
	t.k("converged").boolean(r.Form.Converged)
	t.k("why").string(r.Form.Why)
	t.k("steps").strings(r.Form.Steps)
	t.k("engines").strings(r.Form.Engines)
	t.close('}')
}

func spread(t *text, v []canopy.Spread, i int) {
	if i >= len(v) {
		t.null()
		return
	}
	t.open('{')
	t.k("min").known(v[i].Min)
	t.k("p5").known(v[i].P5)
	t.k("mean").known(v[i].Mean)
	t.k("p95").known(v[i].P95)
	t.k("max").known(v[i].Max)
	t.close('}')
}

func writeQuantities(t *text, r *canopy.Result) {
	s, q := r.Structure, &r.Summary
	t.open('{')
	t.k("fabrics").open('[')
	for i := range q.FabricArea {
		t.open('{')
		name := ""
		if i < len(s.Fabrics) {
			name = s.Fabrics[i].Name
		}
		t.k("fabric").string(name)
		t.k("area").known(q.FabricArea[i])
		t.k("warp_achieved")
		spread(t, q.WarpAchieved, i)
		t.k("weft_achieved")
		spread(t, q.WeftAchieved, i)
		t.k("major_achieved")
		spread(t, q.MajorAchieved, i)
		t.k("minor_achieved")
		spread(t, q.MinorAchieved, i)
		t.k("ratio")
		spread(t, q.Ratio, i)
		t.k("shear")
		spread(t, q.Shear, i)
		t.k("utilisation")
		if i < len(q.FabricUtilisation) {
			t.given(q.FabricUtilisation[i])
		} else {
			t.null()
		}
		t.close('}')
	}
	t.close(']')
	t.k("cables").open('[')
	for i := range q.Cables {
		c := &q.Cables[i]
		t.open('{')
		name := ""
		if i < len(s.Cables) {
			name = s.Cables[i].Name
		}
		t.k("cable").string(name)
		t.k("length").known(c.Length)
		t.k("chord").known(c.Chord)
		t.k("sag").known(c.Sag)
		t.k("force").open('{')
		t.k("min").known(c.ForceMin)
		t.k("mean").known(c.ForceMean)
		t.k("max").known(c.ForceMax)
		t.close('}')
		t.k("evenness").known(c.Evenness)
		t.k("utilisation").given(c.Utilisation)
		t.close('}')
	}
	t.close(']')
	t.k("lines").open('[')
	for i := range q.Lines {
		l := &q.Lines[i]
		t.open('{')
		name := ""
		if i < len(s.Lines) {
			name = s.Lines[i].Name
		}
		t.k("line").string(name)
		t.k("length").known(l.Length)
		t.k("per_metre").open('{')
		t.k("min").known(l.Min)
		t.k("mean").known(l.Mean)
		t.k("max").known(l.Max)
		t.close('}')
		t.k("total").vec(l.Total)
		t.close('}')
	}
	t.close(']')
	t.k("lengths").open('{')
	for k, v := range q.KindLength {
		t.k(canopy.Kind(k).String()).known(v)
	}
	t.close('}')
	t.close('}')
}

func writeAudit(t *text, r *canopy.Result) {
	a := &r.Audit
	t.open('{')
	t.k("trusted").boolean(a.Trusted)
	t.k("reasons").strings(a.Reasons)
	t.k("residual_rms").known(a.ResidualRMS)
	t.k("residual_worst").known(a.ResidualWorst)
	t.k("residual_node").integer(int(a.ResidualNode))
	t.k("residual_largest").known(a.ResidualLargest)
	t.k("force_balance").known(a.ForceBalance)
	t.k("moment_balance").known(a.MomentBalance)
	t.k("virial").known(a.Virial)
	t.k("reaction_mismatch").known(a.ReactionMismatch)
	t.k("force_mismatch").known(a.ForceMismatch)
	t.k("volume_mismatch").known(a.VolumeMismatch)
	t.k("stability_known").boolean(a.StabilityKnown)
	t.k("unstable").integer(a.Unstable)
	t.k("softest").known(a.Softest)
	t.k("softest_node").integer(int(a.SoftestNode))
	t.k("stability_note").string(a.StabilityNote)
	t.k("slack_cables").integer(a.SlackCables)
	t.k("pushed_cables").integer(a.PushedCables)
	t.k("compressed_triangles").integer(a.CompressedTriangles)
	t.k("min_angle").known(a.MinAngle)
	t.k("min_angle_triangle").integer(int(a.MinAngleTri))
	t.k("mean_min_angle").known(a.MeanAngleMin)
	t.k("shortest_over_mean").known(a.ShortestOver)
	t.k("discretisation").known(a.Discretisation)
	t.close('}')
}

func writeFindings(t *text, r *canopy.Result) {
	t.open('[')
	for i := range r.Findings {
		f := &r.Findings[i]
		t.open('{')
		t.k("id").string(f.ID)
		t.k("severity").string(f.Severity.String())
		t.k("text").string(f.Text)
		t.k("value").known(f.Value)
		t.k("limit").known(f.Limit)
		t.k("source").string(f.Source)
		t.k("count").integer(f.Count)
		t.k("places").open('[')
		for _, p := range f.Places {
			t.open('{')
			t.k("kind").string(p.Kind)
			t.k("index").integer(int(p.Index))
			t.k("name").string(p.Name)
			t.k("at").vec(p.At)
			t.close('}')
		}
		t.close(']')
		t.close('}')
	}
	t.close(']')
}

func moduli(t *text, f *canopy.Fabric) {
	if f.WarpModulus == 0 && f.WeftModulus == 0 && f.ShearModulus == 0 && f.PoissonWarpWeft == 0 {
		t.null()
		return
	}
	t.open('{')
	t.k("warp").number(f.WarpModulus)
	t.k("weft").number(f.WeftModulus)
	t.k("shear").number(f.ShearModulus)
	t.k("poisson_warp_weft").number(f.PoissonWarpWeft)
	t.close('}')
}

func warpWeft(t *text, warp, weft float64) {
	t.open('{')
	t.k("warp").number(warp)
	t.k("weft").number(weft)
	t.close('}')
}

func writeFabrics(t *text, r *canopy.Result) {
	t.open('[')
	for i := range r.Structure.Fabrics {
		f := &r.Structure.Fabrics[i]
		t.open('{')
		t.k("name").string(f.Name)
		t.k("elastic").boolean(f.Elastic)
		t.k("moduli")
		moduli(t, f)
		t.k("strength")
		if f.WarpStrength == 0 && f.WeftStrength == 0 {
			t.null()
		} else {
			warpWeft(t, f.WarpStrength, f.WeftStrength)
		}
		t.k("weight").number(f.Weight)
		t.k("pressure").number(f.Pressure)
		t.close('}')
	}
	t.close(']')
}

func freedom(t *text, f canopy.Freedom) {
	t.open('[')
	for d := range 3 {
		t.boolean(f.Has(d))
	}
	t.close(']')
}

// done turns what the text could not say into an error that names the item.
func (t *text) done(what string, i int, name func() string) error {
	if t.bad == "" {
		return nil
	}
	return fmt.Errorf("%s %d (%s): %s", what, i, name(), t.bad)
}

// name writes name i of the list, its number when it has none.
func (t *text) name(names *canopy.Names, i int) {
	t.sep()
	if b := names.Bytes(i); len(b) > 0 {
		t.b = appendString(t.b, unsafe.String(&b[0], len(b)))
		return
	}
	t.b = append(t.b, '"')
	t.b = strconv.AppendInt(t.b, int64(i), 10)
	t.b = append(t.b, '"')
}

func nodeItem(r *canopy.Result) func(*text, int) error {
	s, f := r.Structure, r.Form
	reference := s.Reference
	if reference == nil {
		for i := range s.Fabrics {
			if s.Fabrics[i].Elastic {
				// The unstressed state is then that of the starting positions,
				// which are not written otherwise.
				reference = s.Position
			}
		}
	}
	return func(t *text, i int) error {
		t.open('{')
		t.k("id").integer(i)
		t.k("name").name(&s.NodeName, i)
		t.k("position").vec(f.Position[i])
		t.k("fixed")
		freedom(t, s.Fixed[i])
		t.k("load").vec(s.LoadAt(i))
		t.k("reaction").vec(f.Reaction[i])
		if s.Held != nil && s.Held[i] != 0 {
			t.k("held")
			freedom(t, s.Held[i])
		}
		if m := s.MasterOf(i); m >= 0 {
			t.k("master").integer(int(m))
		}
		if reference != nil {
			t.k("reference").vec(reference[i])
		}
		t.close('}')
		return t.done("node", i, func() string { return s.NodeName.At(i) })
	}
}

var lawNames = [...]string{"force density", "force", "elastic", "cable"}

// at returns v[i], 0 when v is not there.
func at(v []float64, i int) float64 {
	if v == nil {
		return 0
	}
	return v[i]
}

func memberItem(r *canopy.Result) func(*text, int) error {
	s, f := r.Structure, r.Form
	return func(t *text, i int) error {
		e := s.Ends[i]
		length := r3.Norm(r3.Sub(f.Position[e[1]], f.Position[e[0]]))
		t.open('{')
		t.k("id").integer(i)
		t.k("name").name(&s.MemberName, i)
		t.k("kind").string(s.Kind[i].String())
		t.k("group")
		if s.Group != nil && s.Group[i] >= 0 {
			t.string(s.Groups[s.Group[i]])
		} else {
			t.null()
		}
		t.k("nodes").ints(e[:])
		t.k("length").number(length)
		stiffness, unstressed := at(s.Stiffness, i), at(s.Unstressed, i)
		derived := unstressed == 0 && stiffness > 0
		if derived {
			// From force = EA·(length − unstressed)/unstressed.
			unstressed = length / (1 + f.Force[i]/stiffness)
		}
		t.k("unstressed_length").given(unstressed)
		t.k("force").number(f.Force[i])
		t.k("force_density")
		if length > 0 {
			t.number(f.Force[i] / length)
		} else {
			t.null()
		}
		t.k("specified")
		if s.Given[i] == 0 && (s.Law[i] == canopy.LawElastic || s.Law[i] == canopy.LawCable) {
			t.null()
		} else {
			t.number(s.Given[i])
		}
		t.k("stiffness").given(stiffness)
		t.k("weight").number(at(s.Weight, i))
		strength := at(s.Strength, i)
		t.k("resistance")
		if strength != 0 && r.Factors.Cable != 0 {
			t.number(strength / r.Factors.Cable)
		} else {
			t.null()
		}
		t.k("law").string(lawNames[s.Law[i]])
		if strength != 0 {
			t.k("strength").number(strength)
		}
		if s.CableOf != nil && s.CableOf[i] >= 0 {
			t.k("cable").integer(int(s.CableOf[i]))
		}
		if derived {
			t.k("unstressed_derived").boolean(true)
		}
		t.close('}')
		return t.done("member", i, func() string { return s.MemberName.At(i) })
	}
}

func triangleItem(r *canopy.Result) func(*text, int) error {
	s, f := r.Structure, r.Form
	return func(t *text, i int) error {
		c := s.Corners[i]
		a := f.Position[c[0]]
		area := 0.5 * r3.Norm(r3.Cross(r3.Sub(f.Position[c[1]], a), r3.Sub(f.Position[c[2]], a)))
		fabric := &s.Fabrics[s.FabricOf[i]]
		t.open('{')
		t.k("id").integer(i)
		t.k("fabric").string(fabric.Name)
		t.k("nodes").ints(c[:])
		t.k("area").number(area)
		t.k("warp").vec(f.Warp[i])
		stress := f.Stress[i]
		t.k("stress").open('{')
		t.k("warp").number(stress.Warp)
		t.k("weft").number(stress.Weft)
		t.k("shear").number(stress.Shear)
		t.close('}')
		mean, half := (stress.Warp+stress.Weft)/2, math.Hypot((stress.Warp-stress.Weft)/2, stress.Shear)
		t.k("principal").open('[')
		t.number(mean + half)
		t.number(mean - half)
		t.close(']')
		t.k("specified")
		warpWeft(t, s.Stress[i][0], s.Stress[i][1])
		t.k("moduli")
		moduli(t, fabric)
		t.k("resistance")
		if g := r.Factors.Fabric; g != 0 && (fabric.WarpStrength != 0 || fabric.WeftStrength != 0) {
			warpWeft(t, fabric.WarpStrength/g, fabric.WeftStrength/g)
		} else {
			t.null()
		}
		if s.Warp[i] != f.Warp[i] {
			t.k("warp_wanted").vec(s.Warp[i])
		}
		t.close('}')
		return t.done("triangle", i, func() string { return "of fabric " + fabric.Name })
	}
}

var cableLawNames = [...]string{"per member", "sag", "length", "elastic", "balance"}

func cableItem(r *canopy.Result) func(*text, int) error {
	s := r.Structure
	return func(t *text, i int) error {
		c := &s.Cables[i]
		t.open('{')
		t.k("id").integer(i)
		t.k("name").string(c.Name)
		t.k("kind").string(c.Kind.String())
		t.k("law").string(cableLawNames[c.Law])
		t.k("value").given(c.Value)
		t.k("stiffness").given(c.Stiffness)
		t.k("unstressed_length").given(c.Unstressed)
		t.k("members").ints(c.Members)
		t.k("nodes").ints(c.Nodes)
		t.close('}')
		return t.done("cable", i, func() string { return c.Name })
	}
}

func ringItem(r *canopy.Result) func(*text, int) error {
	s, f := r.Structure, r.Form
	return func(t *text, i int) error {
		g := &s.Rings[i]
		t.open('{')
		t.k("id").integer(i)
		t.k("name").string(g.Name)
		t.k("centre").integer(int(g.Centre))
		t.k("nodes").ints(g.Nodes)
		t.k("rigid").boolean(g.Rigid)
		t.k("free")
		freedom(t, g.Free)
		t.k("weight").number(g.Weight)
		t.k("cable")
		if g.Cable >= 0 {
			t.integer(int(g.Cable))
		} else {
			t.null()
		}
		t.k("couple")
		if len(f.Couple) > 0 {
			t.vec(f.Couple[i])
		} else {
			t.vec(r3.Vec{})
		}
		t.close('}')
		return t.done("ring", i, func() string { return g.Name })
	}
}

func lineItem(r *canopy.Result) func(*text, int) error {
	s := r.Structure
	return func(t *text, i int) error {
		l := &s.Lines[i]
		t.open('{')
		t.k("id").integer(i)
		t.k("name").string(l.Name)
		t.k("role").string(l.Role)
		t.k("nodes").ints(l.Nodes)
		t.close('}')
		return t.done("line", i, func() string { return l.Name })
	}
}

func writeLoads(t *text, r *canopy.Result) {
	t.open('{')
	t.k("self_weight").boolean(r.Structure.SelfWeight)
	var total r3.Vec
	for _, v := range r.Structure.Load {
		total = r3.Add(total, v)
	}
	t.k("total").vec(total)
	t.close('}')
}
