package formfile_test

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"reflect"
	"runtime"
	"slices"
	"strings"
	"testing"

	"anticlast/formfind/canopy"
	"anticlast/formfind/formfile"
	"anticlast/formfind/internal/sweep"

	"github.com/santhosh-tekuri/jsonschema/v6"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

// small is a result in which every field of every value says something.
func small() *canopy.Result {
	rnd := rand.New(rand.NewPCG(1, 2))
	num := func() float64 { return (rnd.Float64() - 0.3) * math.Pow(10, rnd.Float64()*12-6) }
	vec := func() r3.Vec { return r3.Vec{X: num(), Y: num(), Z: num()} }
	s := &canopy.Structure{SelfWeight: true, Groups: []string{"edge", "net"}}
	f := &canopy.Form{Converged: true, Why: "said \"so\"\n\u2028", Steps: []string{"one", "two"}, Engines: []string{"fdm", "newton"}}
	for i := range 6 {
		s.NodeName.Append([]string{"A", "B é", "C\\\"", "", "E", "\t"}[i])
		s.Position = append(s.Position, vec())
		s.Fixed = append(s.Fixed, canopy.Freedom(i))
		s.Held = append(s.Held, canopy.Freedom(7-i))
		s.Load = append(s.Load, vec())
		s.Master = append(s.Master, int32(i)-1)
		s.Reference = append(s.Reference, vec())
		f.Reaction = append(f.Reaction, vec())
	}
	f.Position = slices.Clone(s.Position)
	for i := range 9 {
		s.MemberName.Append(fmt.Sprintf("m%d", i))
		s.Ends = append(s.Ends, [2]int32{int32(i) % 6, int32(i+1) % 6})
		s.Kind = append(s.Kind, canopy.Kind(i))
		s.Law = append(s.Law, canopy.Law(i%4))
		s.Given = append(s.Given, num())
		s.Stiffness = append(s.Stiffness, 1e6+num())
		s.Unstressed = append(s.Unstressed, float64((i+1)%2)*3.25)
		s.Weight = append(s.Weight, num())
		s.Strength = append(s.Strength, num())
		s.Group = append(s.Group, int32(i)%2)
		s.CableOf = append(s.CableOf, int32(i)%2-1)
		f.Force = append(f.Force, num())
	}
	s.Cables = []canopy.Cable{
		{Name: "K", Kind: canopy.KindGuy, Members: []int32{0, 1}, Nodes: []int32{0, 1, 2}, Law: canopy.CableElastic, Value: 0.1, Stiffness: 5e6, Unstressed: 2.5},
		{Name: "L", Kind: canopy.KindRingCable, Members: []int32{2}, Nodes: []int32{2, 3}, Law: canopy.CableBalance},
	}
	s.Fabrics = []canopy.Fabric{{Name: "sail", Elastic: true, WarpModulus: 1, WeftModulus: 2, ShearModulus: 3, PoissonWarpWeft: 0.3, WarpStrength: 4, WeftStrength: 5, Weight: 6, Pressure: -7}, {Name: "two"}}
	for i := range 4 {
		s.Corners = append(s.Corners, [3]int32{int32(i), int32(i + 1), int32(i + 2)})
		s.FabricOf = append(s.FabricOf, int32(i+1)%2)
		s.Warp = append(s.Warp, vec())
		s.Stress = append(s.Stress, [2]float64{num(), num()})
		f.Warp = append(f.Warp, vec())
		f.Stress = append(f.Stress, canopy.Stress{Warp: num(), Weft: num(), Shear: num()})
	}
	s.Enclosures = []canopy.Enclosure{{Name: "sail \"1\"", Fabrics: []int32{1, 0}, Side: []int8{-1, 1}, Base: 3, Volume: num()}}
	f.Pressure = []float64{num()}
	s.Rings = []canopy.Ring{{Name: "R", Centre: 1, Nodes: []int32{2, 3, 4}, Rigid: true, Free: canopy.DirZ, Weight: 3, Cable: -1}, {Name: "Q", Centre: 2, Nodes: []int32{0}, Free: canopy.DirX, Cable: 1}}
	f.Couple = []r3.Vec{vec(), vec()}
	s.Lines = []canopy.Line{{Name: "arch", Role: "arch", Nodes: []int32{1, 2}}}
	p := func(v float64) *float64 { return &v }
	r := &canopy.Result{
		Program: canopy.Program{Name: "anticlast", Version: "0", Engines: []string{"fdm"}},
		Title:   "Quay & <market>", File: "quay.yaml", Digest: "sha256:" + strings.Repeat("0a", 32),
		Limits: canopy.Limits{Achieved: &[2]float64{0.9, 1.1}, Ratio: &[2]float64{0.5, 2}, StressMin: p(1), StressMax: p(2), CableMax: p(3), SlopeMin: p(0.05), ReactionMax: p(5), Utilisation: p(1),
			Headroom: []canopy.Headroom{{Name: "path", Height: 2.5, Region: []r3.Vec{vec(), vec(), vec()}}, {Name: "all", Height: 2.2}}},
		Factors:   canopy.Factors{Load: 1.35, Fabric: 1.4, Cable: 1.65},
		North:     new(0.3),
		Structure: s, Form: f,
		Findings: []canopy.Finding{{ID: "slope-low", Severity: canopy.Broken, Text: "flat", Value: 0.1, Limit: 0.2, Source: "model", Count: 3,
			Places: []canopy.Place{{Kind: "node", Index: 3, Name: "D", At: vec()}}}},
	}
	fill(reflect.ValueOf(&r.Audit).Elem(), rnd)
	r.Audit.ResidualNode, r.Audit.SoftestNode, r.Audit.MinAngleTri = 1, 2, 3
	fill(reflect.ValueOf(&r.Summary).Elem(), rnd)
	r.Summary.Enclosed = r.Summary.Enclosed[:1] // one for each enclosure
	return r
}

// fill gives every field a value that is not zero.
func fill(v reflect.Value, rnd *rand.Rand) {
	switch v.Kind() {
	case reflect.Struct:
		for i := range v.NumField() {
			fill(v.Field(i), rnd)
		}
	case reflect.Slice:
		// Two, as there are fabrics, cables and so on in the test structure.
		v.Set(reflect.MakeSlice(v.Type(), 2, 2))
		fill(v.Index(0), rnd)
		fill(v.Index(1), rnd)
	case reflect.Array:
		for i := range v.Len() {
			fill(v.Index(i), rnd)
		}
	case reflect.Float64:
		v.SetFloat(rnd.Float64())
	case reflect.Int, reflect.Int32:
		v.SetInt(rnd.Int64N(1000) + 1)
	case reflect.Bool:
		v.SetBool(true)
	case reflect.String:
		v.SetString(fmt.Sprint("text ", rnd.IntN(1000)))
	default:
		panic(v.Kind())
	}
}

func write(t testing.TB, r *canopy.Result) []byte {
	t.Helper()
	var b bytes.Buffer
	require.NoError(t, formfile.Write(context.Background(), &b, r))
	return b.Bytes()
}

func read(t testing.TB, b []byte) *canopy.Result {
	t.Helper()
	r, err := formfile.Read(context.Background(), bytes.NewReader(b), "form.json")
	require.NoError(t, err)
	return r
}

// Every field of every value survives, whatever fields are added to them, but
// for those that Write documents as not written.
func TestEveryFieldReadsBackToTheSameBits(t *testing.T) {
	r := small()
	got := read(t, write(t, r))
	want := small()
	requireAllSet(t, reflect.ValueOf(want).Elem(), "Result", map[string]bool{
		"Result.Structure.Curves": true, "Result.Structure.OnCurve": true, "Result.Structure.Param": true,
	})
	require.Equal(t, want.Structure.NodeName.Len(), got.Structure.NodeName.Len())
	for i := range want.Structure.Position {
		require.Equal(t, want.Structure.NodeName.At(i), got.Structure.NodeName.At(i))
	}
	for i := range want.Structure.Ends {
		require.Equal(t, want.Structure.MemberName.At(i), got.Structure.MemberName.At(i))
	}
	for _, s := range []*canopy.Structure{want.Structure, got.Structure} {
		s.NodeName, s.MemberName = canopy.Names{}, canopy.Names{}
	}
	// Groups and fabrics are numbered as read.
	require.Equal(t, want, got)
}

// requireAllSet makes sure that the test value leaves no field at zero, so that
// a field added later cannot be forgotten in silence.
func requireAllSet(t *testing.T, v reflect.Value, path string, except map[string]bool) {
	if except[path] {
		return
	}
	switch v.Kind() {
	case reflect.Pointer:
		require.False(t, v.IsNil(), path)
		requireAllSet(t, v.Elem(), path, except)
	case reflect.Struct:
		if v.Type().PkgPath() != reflect.TypeFor[canopy.Result]().PkgPath() || v.Type() == reflect.TypeFor[canopy.Names]() {
			return
		}
		for i := range v.NumField() {
			requireAllSet(t, v.Field(i), path+"."+v.Type().Field(i).Name, except)
		}
	case reflect.Slice:
		require.NotZero(t, v.Len(), path)
		requireAllSet(t, v.Index(0), path, except)
	default:
		if v.Kind() == reflect.Float64 || v.Kind() == reflect.String {
			require.False(t, v.IsZero(), path)
		}
	}
}

func TestWritingTwiceGivesTheSameBytes(t *testing.T) {
	first := write(t, small())
	require.Equal(t, string(first), string(write(t, read(t, first))))
	require.True(t, json.Valid(first))
}

func TestBytesDoNotDependOnProcessors(t *testing.T) {
	r := net(sweep.N(60, 200, 1000))
	defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(1))
	one := write(t, r)
	runtime.GOMAXPROCS(3)
	require.True(t, bytes.Equal(one, write(t, r)))
}

// The least a result can be: no fabric, no names, nothing optional.
func TestBareResult(t *testing.T) {
	s := &canopy.Structure{Position: []r3.Vec{{}, {X: 1}}, Fixed: []canopy.Freedom{7, 7},
		Ends: [][2]int32{{0, 1}}, Kind: []canopy.Kind{0}, Law: []canopy.Law{0}, Given: []float64{2}}
	r := &canopy.Result{Structure: s, Form: canopy.NewForm(s)}
	r.Audit.Discretisation = math.NaN()
	got := read(t, write(t, r))
	require.True(t, math.IsNaN(got.Audit.Discretisation))
	require.Equal(t, s.Given, got.Structure.Given)
	require.Nil(t, got.Structure.Load)
	require.Nil(t, got.Structure.Held)
	require.Nil(t, got.Structure.Master)
	require.Nil(t, got.Structure.Stiffness)
	require.Nil(t, got.Structure.Group)
	require.Zero(t, got.Structure.NodeName.Len())
	require.Equal(t, "1", got.Structure.NodeName.At(1))
}

// The positions are the unstressed state of an elastic fabric without a
// reference of its own; they must not be lost.
func TestReferenceOfElasticFabricIsKept(t *testing.T) {
	r := small()
	r.Structure.Reference = nil
	start := slices.Clone(r.Structure.Position)
	r.Form.Position[3].Z += 1
	require.Equal(t, start, read(t, write(t, r)).Structure.Reference)
}

func TestNumbersThatAreNotFiniteAreRefusedByName(t *testing.T) {
	for _, c := range []struct {
		want  string
		spoil func(r *canopy.Result)
	}{
		{"node 1 (B é): position is NaN", func(r *canopy.Result) { r.Form.Position[1].Y = math.NaN() }},
		{"node 0 (A): reaction is +Inf", func(r *canopy.Result) { r.Form.Reaction[0].X = math.Inf(1) }},
		{"member 8 (m8): force is -Inf", func(r *canopy.Result) { r.Form.Force[8] = math.Inf(-1) }},
		{"member 2 (m2): specified is NaN", func(r *canopy.Result) { r.Structure.Given[2] = math.NaN() }},
		{"triangle 3 (of fabric sail): shear is NaN", func(r *canopy.Result) { r.Form.Stress[3].Shear = math.NaN() }},
		{"ring 1 (Q): couple is NaN", func(r *canopy.Result) { r.Form.Couple[1].X = math.NaN() }},
		{"audit: virial is +Inf", func(r *canopy.Result) { r.Audit.Virial = math.Inf(1) }},
		{"fabrics: pressure is NaN", func(r *canopy.Result) { r.Structure.Fabrics[0].Pressure = math.NaN() }},
		{"member 0: node 6 does not exist", func(r *canopy.Result) { r.Structure.Ends[0][1] = 6 }},
		{"Form.Force has 8 entries, want 9", func(r *canopy.Result) { r.Form.Force = r.Form.Force[:8] }},
		{`two fabrics are called "sail"`, func(r *canopy.Result) { r.Structure.Fabrics[1].Name = "sail" }},
		{"the result holds no shape", func(r *canopy.Result) { r.Form = nil }},
	} {
		r := small()
		c.spoil(r)
		require.ErrorContains(t, formfile.Write(context.Background(), &bytes.Buffer{}, r), c.want)
	}
}

func TestFaultsAreNamedWithLineAndThing(t *testing.T) {
	good := string(write(t, small()))
	line := func(part string) int { return 1 + strings.Count(good[:strings.Index(good, part)], "\n") }
	for _, c := range []struct{ name, old, new, want string }{
		{"empty", good, "", "form.json:1:1: not a form.json: want '{', found the end of the file"},
		{"yaml", good, "anticlast: 1", "not a form.json"},
		{"format", "anticlast-form/1", "anticlast-form/2", "written by another version"},
		{"other format", "anticlast-form/1", "x", `format: "x" is not "anticlast-form/1"`},
		{"missing nodes", `"nodes":[` + "\n", `"knots":[` + "\n", `"nodes" is missing`},
		{"missing key", `"fixed":[true,false,false],`, "", fmt.Sprintf(`form.json:%d:`, line(`"name":"B é"`))},
		{"missing key, thing", `"fixed":[true,false,false],`, "", `node 1: "fixed" is missing`},
		{"twice", `"id":2,"name":"C`, `"id":2,"id":2,"name":"C`, "node 2: id: this key stands twice"},
		{"ids", `"id":1,"name":"B é"`, `"id":7,"name":"B é"`, "node 1: id: want 1"},
		{"NaN", `"force":`, `"force":NaN,"x":`, "want a"},
		{"infinite", `"position":[`, `"position":[1e999,`, "1e999 is too large"},
		{"hex", `"position":[`, `"position":[0x10,`, "node 0: position"},
		{"leading zero", `"position":[`, `"position":[01,`, `"01" is not a number`},
		{"plus", `"position":[`, `"position":[+1,`, "want a number"},
		{"four", `"position":[`, `"position":[1,`, "want 3 values, found more"},
		{"two", `"fixed":[true,false,false]`, `"fixed":[true,false]`, "want 3 values, found 2"},
		{"kind", `"kind":"mast"`, `"kind":"pole"`, `member 7: kind: unknown word "pole"`},
		{"law", `"law":"elastic"`, `"law":"plastic"`, "unknown word"},
		{"node of member", `"nodes":[1,2],"length"`, `"nodes":[1,99],"length"`, "member 1: nodes: node 99 does not exist (6 nodes)"},
		{"node of triangle", `"nodes":[1,2,3],"area"`, `"nodes":[1,-2,3],"area"`, "triangle 1: nodes: node -2 does not exist"},
		{"node of line", `"role":"arch","nodes":[1,2]`, `"role":"arch","nodes":[1,99]`, "line 0: node 99 does not exist"},
		{"huge index", `"nodes":[1,2],"length"`, `"nodes":[1,9999999999],"length"`, "whole number of at most 32 bits"},
		{"fabric", `"fabric":"two","nodes"`, `"fabric":"three","nodes"`, `fabric "three" is not in the list`},
		{"cut", good[strings.Index(good, `"master"`)-1:], "", "the end of the file"},
		{"cut list", good[strings.Index(good, `{"id":3,"fabric"`)-2 : strings.Index(good, `"cables":[`+"\n")-4], "", "announces 4 triangles and holds 3"},
		{"air fabric", `"fabrics":["two"`, `"fabrics":["three"`, `air 0: fabric "three" is not in the list`},
		{"air side", `"sides":[-1,1]`, `"sides":[-1,2]`, "a side is 1 or -1, not 2"},
		{"air sides", `"sides":[-1,1]`, `"sides":[-1]`, "2 fabrics need as many sides, not 1"},
		{"air twice", `"fabrics":["two","sail"]`, `"fabrics":["two","two"]`, `fabric "two" is named twice`},
		{"air base", `"base":3`, `"base":99`, "node 99 does not exist"},
		{"tail", good, good + "x", "something follows"},
		{"escape", `"title":"Quay`, `"title":"\x`, "unknown escape"},
		{"surrogate", `"title":"Quay`, `"title":"\ud800`, "half a surrogate"},
		{"utf8", `"title":"Quay`, "\"title\":\"\xff", "not UTF-8"},
		{"control", `"title":"Quay`, "\"title\":\"\x01", "control character"},
		{"deep", `"units":`, `"x":` + strings.Repeat("[", 100) + strings.Repeat("]", 100) + `,"units":`, "nested more than"},
		{"bool", `"trusted":true`, `"trusted":tru`, "audit: trusted: want true or false"},
		{"no comma", `"trusted":true,`, `"trusted":true `, "want ',' or '}'"},
	} {
		bad := strings.Replace(good, c.old, c.new, 1)
		require.NotEqual(t, good, bad, c.name)
		_, err := formfile.Read(context.Background(), strings.NewReader(bad), "form.json")
		require.ErrorContains(t, err, c.want, c.name)
		var syntax *formfile.SyntaxError
		require.True(t, errors.As(err, &syntax), c.name)
	}
}

// Other programs may sort the keys, indent or escape.
func TestOrderAndLayoutDoNotMatter(t *testing.T) {
	first := write(t, small())
	dec := json.NewDecoder(bytes.NewReader(first))
	dec.UseNumber()
	var v any
	require.NoError(t, dec.Decode(&v))
	sorted, err := json.MarshalIndent(v, "", "\t")
	require.NoError(t, err)
	require.Equal(t, string(first), string(write(t, read(t, sorted))))
	// One byte at a time.
	r, err := formfile.Read(context.Background(), oneByte{bytes.NewReader(first)}, "form.json")
	require.NoError(t, err)
	require.Equal(t, string(first), string(write(t, r)))
}

type oneByte struct{ r *bytes.Reader }

func (o oneByte) Read(p []byte) (int, error) {
	if len(p) > 1 {
		p = p[:1]
	}
	return o.r.Read(p)
}

func TestCancelling(t *testing.T) {
	ctx, stop := context.WithCancel(context.Background())
	b := write(t, small())
	stop()
	require.ErrorIs(t, formfile.Write(ctx, &bytes.Buffer{}, small()), context.Canceled)
	_, err := formfile.Read(ctx, bytes.NewReader(b), "form.json")
	require.ErrorIs(t, err, context.Canceled)
}

func TestFailingWriter(t *testing.T) {
	want := errors.New("disk full")
	whole := len(write(t, net(120)))
	for _, n := range []int{0, 10, whole / 3, whole / 2, whole - 1} {
		require.ErrorIs(t, formfile.Write(context.Background(), &failing{n, want}, net(120)), want)
	}
}

type failing struct {
	left int
	err  error
}

func (f *failing) Write(p []byte) (int, error) {
	if f.left -= len(p); f.left < 0 {
		return 0, f.err
	}
	return len(p), nil
}

func compileSchema(t *testing.T) *jsonschema.Schema {
	doc, err := jsonschema.UnmarshalJSON(bytes.NewReader(formfile.Schema()))
	require.NoError(t, err)
	c := jsonschema.NewCompiler()
	require.NoError(t, c.AddResource("form.schema.json", doc))
	s, err := c.Compile("form.schema.json")
	require.NoError(t, err)
	return s
}

func TestSchemaHoldsForWhatIsWritten(t *testing.T) {
	schema := compileSchema(t)
	bare := &canopy.Result{Structure: &canopy.Structure{}, Form: &canopy.Form{}}
	for _, r := range []*canopy.Result{small(), net(5), bare} {
		v, err := jsonschema.UnmarshalJSON(bytes.NewReader(write(t, r)))
		require.NoError(t, err)
		require.NoError(t, schema.Validate(v))
	}
	// It bites.
	v, err := jsonschema.UnmarshalJSON(strings.NewReader(strings.Replace(string(write(t, small())), `"kind":"mast"`, `"kind":"pole"`, 1)))
	require.NoError(t, err)
	require.Error(t, schema.Validate(v))
}

// net is a square net of n×n nodes with irregular coordinates.
func net(n int) *canopy.Result {
	rnd := rand.New(rand.NewPCG(3, 4))
	s := &canopy.Structure{}
	for i := range n {
		for j := range n {
			s.Position = append(s.Position, r3.Vec{X: float64(i) + rnd.Float64(), Y: float64(j) + rnd.Float64(), Z: rnd.Float64()})
			var fixed canopy.Freedom
			if i == 0 || j == 0 || i == n-1 || j == n-1 {
				fixed = canopy.DirAll
			}
			s.Fixed = append(s.Fixed, fixed)
			if j > 0 {
				s.Ends = append(s.Ends, [2]int32{int32(i*n + j - 1), int32(i*n + j)})
			}
			if i > 0 {
				s.Ends = append(s.Ends, [2]int32{int32(i*n + j - n), int32(i*n + j)})
			}
		}
	}
	m := len(s.Ends)
	s.Kind, s.Law, s.Given = make([]canopy.Kind, m), make([]canopy.Law, m), make([]float64, m)
	for i := range m {
		s.Kind[i] = canopy.KindNetCable
		s.Given[i] = 1000 + rnd.Float64()
	}
	f := canopy.NewForm(s)
	for i := range m {
		f.Force[i] = 1e4 * rnd.Float64()
	}
	return &canopy.Result{Structure: s, Form: f}
}

func BenchmarkWrite(b *testing.B) {
	r := net(sweep.N(316, 1000, 1000))
	n := len(write(b, r))
	b.SetBytes(int64(n))
	for b.Loop() {
		if err := formfile.Write(context.Background(), discard{}, r); err != nil {
			b.Fatal(err)
		}
	}
}

type discard struct{}

func (discard) Write(p []byte) (int, error) { return len(p), nil }

func BenchmarkRead(b *testing.B) {
	data := write(b, net(sweep.N(316, 1000, 1000)))
	b.SetBytes(int64(len(data)))
	for b.Loop() {
		if _, err := formfile.Read(context.Background(), bytes.NewReader(data), "form.json"); err != nil {
			b.Fatal(err)
		}
	}
}
