package spec_test

import (
	"bytes"
	"context"
	"errors"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"anticlast/formfind/canopy"
	"anticlast/formfind/spec"
)

// checkOutcome holds what Read returns against what it promises.
func checkOutcome(t *testing.T, m *canopy.Model, err error) {
	if err != nil {
		var all *spec.Errors
		if !errors.As(err, &all) {
			t.Fatalf("not an error of the model: %v", err)
		}
		if len(all.List) == 0 || m != nil {
			t.Fatalf("%d errors with model %v", len(all.List), m)
		}
		for _, d := range all.List {
			if d.Message == "" || d.File == "" || strings.ContainsAny(d.String(), "\n\x00") {
				t.Fatalf("bad diagnostic %q", d.String())
			}
		}
		return
	}
	for _, p := range m.Points {
		if v := p.At.X + p.At.Y + p.At.Z; math.IsNaN(v) || math.IsInf(v, 0) {
			t.Fatalf("point %v", p)
		}
	}
	if s := m.Listed; s != nil {
		n := int32(len(s.Position))
		for _, e := range s.Ends {
			if e[0] < 0 || e[0] >= n || e[1] < 0 || e[1] >= n || e[0] == e[1] {
				t.Fatalf("member %v of %d nodes", e, n)
			}
		}
		for i, c := range s.Corners {
			for _, k := range c {
				if k < 0 || k >= n {
					t.Fatalf("triangle %v of %d nodes", c, n)
				}
			}
			if int(s.FabricOf[i]) >= len(s.Fabrics) {
				t.Fatalf("fabric %d of %d", s.FabricOf[i], len(s.Fabrics))
			}
		}
		for _, o := range [][]float64{s.Given, s.Stiffness, s.Unstressed, s.Weight, s.Strength} {
			if o != nil && len(o) != len(s.Ends) {
				t.Fatalf("%d values for %d members", len(o), len(s.Ends))
			}
		}
		if len(s.Kind) != len(s.Ends) || len(s.Law) != len(s.Ends) || len(s.Warp) != len(s.Corners) || len(s.Stress) != len(s.Corners) {
			t.Fatal("slices of different lengths")
		}
	}
}

func FuzzRead(f *testing.F) {
	for _, s := range spec.Samples() {
		f.Add([]byte(s.Text), "")
		f.Add([]byte(s.Text), "points.A.z=7.5")
	}
	files, _ := filepath.Glob("../../testdata/broken/*.yaml")
	for _, path := range files {
		b, err := os.ReadFile(path)
		if err != nil {
			f.Fatal(err)
		}
		set := ""
		if i := bytes.Index(b, []byte("# set: ")); i >= 0 {
			set, _, _ = strings.Cut(string(b[i+7:]), "\n")
		}
		f.Add(b, set)
	}
	folder := f.TempDir()
	f.Fuzz(func(t *testing.T, text []byte, set string) {
		o := spec.Options{MaxBytes: 1 << 16, Warn: func(spec.Diagnostic) {}}
		if set != "" {
			o.Set = []string{set}
		}
		m, err := spec.Read(context.Background(), spec.Input(bytes.NewReader(text), folder), o)
		checkOutcome(t, m, err)
	})
}

func FuzzListedCSV(f *testing.F) {
	nodes := "name,x,y,z\na,0,0,0\nb,4,0,0\nc,2,1,1\n"
	supports := "node,directions\na,xyz\nb,xy\n"
	f.Add([]byte(nodes), []byte(supports), []byte("from,to,force density\na,c,3\nb,c,3\n"), []byte("a,b,c,warp,weft\na,b,c,2,2\n"))
	f.Add([]byte("x [mm];y [mm];z [mm]\n0;0;0\r\n1e3;0;0\n# end\n"), []byte("node\n0\n"), []byte("from;to;force [N];cable;group;kind\n0;1;\"3\";K;\"g\"\"h\";strut\n"), []byte("a,b,c\n"))
	f.Add([]byte("\xef\xbb\xbfname\tx\ty\tz\n7\t0\t0\t0\n9\t1\t1\t1\n"), []byte("node\n7\n9\n"), []byte("name,from,to,unstressed,stiffness,weight,strength\nm,7,9,1,2,3,4\n"), []byte("a,b,c,fabric,warp x\n7,9,7,s,1\n"))
	f.Add([]byte(nodes), []byte("node\n\"a\n"), []byte("from,to\n"), []byte(""))
	model := "anticlast: 1\nlisted: {nodes: n.csv, supports: s.csv, members: m.csv, triangles: t.csv, fabrics: {s: {prestress: 2 kN/m, warp: [1, 0, 0]}}}\n"
	f.Fuzz(func(t *testing.T, n, s, m, tri []byte) {
		o := spec.WithTables(spec.Options{Warn: func(spec.Diagnostic) {}}, map[string][]byte{"n.csv": n, "s.csv": s, "m.csv": m, "t.csv": tri})
		got, err := spec.Read(context.Background(), spec.Input(strings.NewReader(model), "."), o)
		checkOutcome(t, got, err)
	})
}

func FuzzOutline(f *testing.F) {
	const layers = "  layers: {RIM: {cable: {sag: 9 %}, height: 3 m}, WALL: fixed, TREE: hole, RIDGE: {ridge: {force: 3 kN}}, MAST: point}\n"
	const fabric = "  fabric: {prestress: 2 kN/m}\n"
	f.Add([]byte("anticlast: 1\noutline:\n  file: a.csv\n"+layers+"  heights: [{point: RIM:1, z: 4}, {at: [9, 0], z: 2}]\n"+fabric), []byte("layer,x [m],y [m]\nRIM,0,0\nRIM,9,0\nRIM,9,8\nRIM,0,0\n\nTREE,6,2\nTREE,7,2\nTREE,7,3\nTREE,6,2\n\nMAST,8,1\n\nWALL,0,0\nWALL,9,8\n\nRIDGE,9,0\nRIDGE,9,8\n"))
	f.Add([]byte("anticlast: 1\noutline:\n  file: a.dxf\n  units: mm\n"+layers+fabric), []byte("0\nSECTION\n2\nENTITIES\n0\nLWPOLYLINE\n8\nRIM\n70\n1\n10\n0\n20\n0\n42\n0.2\n10\n9000\n20\n0\n10\n9000\n20\n9000\n0\nCIRCLE\n8\nTREE\n10\n7000\n20\n3000\n40\n900\n0\nENDSEC\n0\nEOF\n"))
	f.Add([]byte("anticlast: 1\noutline: {file: a.obj, units: m, edge: {force: 3 kN}, fabric: {prestress: 2}}\n"), []byte("v 0 0 0\nv 1 0 0\nv 1 1 0\nv 0 1 1\nf 1 2 3 4\n"))
	f.Add([]byte("anticlast: 1\noutline: {file: a.stl, units: m, fabric: {prestress: 2, warp: [0, 1, 0]}}\n"), []byte("solid\nfacet\nouter loop\nvertex 0 0 0\nvertex 1 0 0\nvertex 0 1 0\nendloop\nendfacet\nendsolid\n"))
	f.Fuzz(func(t *testing.T, text, file []byte) {
		if len(text) > 1<<12 || len(file) > 1<<14 {
			return
		}
		o := spec.WithTables(spec.Options{Warn: func(spec.Diagnostic) {}}, map[string][]byte{"a.csv": file, "a.dxf": file, "a.obj": file, "a.stl": file})
		m, err := spec.Read(context.Background(), spec.Input(bytes.NewReader(text), "."), o)
		checkOutcome(t, m, err)
	})
}

func FuzzQuantity(f *testing.F) {
	for _, s := range []string{"25 kN", "2.5kN/m", "600 mm", "8 %", "3°", "1e-3 m", "-0.5", "2 kN/m²", "1_000", "0x10", "1:30", ".5", "5.", "+7 t", "daN/5cm", "NaN", "9007199254740993 N", "0.1e-400 m"} {
		for d := range 10 {
			f.Add(s, uint8(d))
		}
	}
	dims := []*spec.Dimension{spec.Length, spec.Force, spec.ForcePerLength, spec.Weight, spec.WeightPerLength, spec.WeightPerArea, spec.Pressure, spec.Ratio, spec.Angle, spec.Slope}
	f.Fuzz(func(t *testing.T, text string, which uint8) {
		d := dims[int(which)%len(dims)]
		v, err := spec.ParseQuantity(text, d)
		if err != nil {
			if err.Error() == "" || strings.ContainsAny(err.Error(), "\n") {
				t.Fatalf("bad message %q", err)
			}
			return
		}
		if math.IsNaN(v) || math.IsInf(v, 0) || math.Abs(v) > 1e15 {
			t.Fatalf("%q is %v", text, v)
		}
	})
}
