package outline_test

import (
	"bytes"
	"math"
	"os"
	"strings"
	"testing"

	"anticlast/formfind/outline"

	"gonum.org/v1/gonum/spatial/r3"
)

func finite(v r3.Vec) bool {
	s := v.X + v.Y + v.Z
	return !math.IsNaN(s) && !math.IsInf(s, 0)
}

// checkFaults holds faults against what they promise.
func checkFaults(t *testing.T, faults []outline.Fault) {
	if len(faults) > 100 {
		t.Fatalf("%d faults", len(faults))
	}
	for _, f := range faults {
		if f.Message == "" || strings.ContainsAny(f.String(), "\n\x00") {
			t.Fatalf("bad fault %q", f.String())
		}
	}
}

// checkLoop follows edges of a closed walk.
func checkLoop(t *testing.T, o *outline.Outline, list []int) {
	if len(list) < 2 {
		t.Fatalf("a loop of %d edges", len(list))
	}
	for _, flip := range []bool{false, true} {
		at, start := o.Edges[list[0]].To, o.Edges[list[0]].From
		if flip {
			at, start = start, at
		}
		good := true
		for _, e := range list[1:] {
			switch at {
			case o.Edges[e].From:
				at = o.Edges[e].To
			case o.Edges[e].To:
				at = o.Edges[e].From
			default:
				good = false
			}
		}
		if good && at == start {
			return
		}
	}
	t.Fatalf("edges %v are no closed loop", list)
}

// checkTrace traces a drawing and holds the result against what it promises.
func checkTrace(t *testing.T, d *outline.Drawing) {
	checkFaults(t, d.Faults)
	for _, s := range d.Segments {
		if !finite(s.A) || !finite(s.B) || !finite(s.Through) {
			t.Fatalf("segment %v", s)
		}
	}
	if len(d.Segments) > 2000 {
		return
	}
	var layers []outline.Layer
	for k, n := range append(d.Layers(), "RIM", "Dächer") {
		layers = append(layers, outline.Layer{Name: n, Class: []outline.Class{outline.Border, outline.Inner, outline.Border, outline.Points, outline.Stay}[k%5], Hole: k%5 == 2, Cable: k%2 == 0})
	}
	d.Scale(outline.Unit{Name: "mm", Metres: 1e-3})
	o, faults := outline.Trace(d, layers, outline.Options{Unit: outline.Unit{Name: "mm", Metres: 1e-3}, Snap: 1e-3, Corner: 0.2})
	checkFaults(t, faults)
	if o == nil {
		for _, f := range faults {
			if !f.Warning {
				return
			}
		}
		t.Fatal("nothing traced and no fault")
	}
	names := map[string]bool{}
	for _, p := range o.Points {
		if names[p.Name] || !finite(p.At) {
			t.Fatalf("point %v", p)
		}
		names[p.Name] = true
	}
	used := make([]int, len(o.Edges))
	for _, f := range o.Faces {
		checkLoop(t, o, f.Boundary)
		for _, h := range f.Holes {
			checkLoop(t, o, h)
			for _, e := range h {
				used[e]++
			}
		}
		for _, e := range f.Boundary {
			used[e]++
		}
		for _, e := range f.Lines {
			used[e] += 2
		}
	}
	for e, n := range used {
		if n > 2 {
			t.Fatalf("edge %v has fabric on %d sides", o.Edges[e], n)
		}
	}
}

func FuzzReadDXF(f *testing.F) {
	for _, n := range []string{"entities-r12.dxf", "entities-r2000.dxf", "entities-r2018.dxf", "yard.dxf", "curves.dxf"} {
		b, err := os.ReadFile("testdata/" + n)
		if err != nil {
			f.Fatal(err)
		}
		// The entities alone make shorter seeds.
		i := bytes.Index(b, []byte("\nENTITIES\n"))
		j := bytes.Index(b[i:], []byte("ENDSEC"))
		f.Add([]byte("  0\nSECTION\n  2" + string(b[i:i+j]) + "ENDSEC\n  0\nEOF\n"))
	}
	f.Add([]byte(dxf("LINE 8 RIM 10 0 20 0 11 9 21 0", "LWPOLYLINE 8 RIM 10 9 20 0 10 9 20 9 42 0.3 10 0 20 0", "CIRCLE 8 TREE 10 7 20 4 40 1", "POINT 8 MAST 10 6 20 3")))
	f.Add([]byte(dxf("SPLINE 8 RIM 71 2 40 0 40 0 40 0 40 1 40 1 40 1 41 1 41 0.7 41 1 10 0 20 0 10 9 20 0 10 9 20 9", "LINE 8 RIM 10 9 20 9 11 0 21 0", "ELLIPSE 8 TREE 10 7 20 4 11 1 21 0 40 0.5 41 0 42 6.283185307179586")))
	f.Add([]byte(dxf("POLYLINE 8 A 70 9", "VERTEX 10 0 20 0 30 1", "VERTEX 10 1000 20 0 42 1", "VERTEX 10 1000 20 1000", "SEQEND")))
	f.Fuzz(func(t *testing.T, b []byte) {
		d, err := outline.ReadDXF(bytes.NewReader(b))
		if err != nil {
			t.Fatal(err)
		}
		checkTrace(t, d)
	})
}

func FuzzReadCSV(f *testing.F) {
	f.Add([]byte("layer,x [m],y [m],z [m]\nRIM,0,0,4\nRIM,9,0,2\nRIM,9,8,4\nRIM,0,0,4\n\nTREE,6,2,3\nTREE,7,2,3\nTREE,7,3,3\nTREE,6,2,3\n\nMAST,8,1,3\n"))
	f.Add([]byte("x;y\n0;0\n1000;0\n1000;1000\n0;0\n"))
	f.Add([]byte("x\ty\tlayer\n0\t0\t\"a\"\n# c\n5e3\t0\ta\n5e3\t5e3\ta\n0\t0\ta\n0\t0\tb\n5e3\t5e3\tb\n"))
	f.Fuzz(func(t *testing.T, b []byte) {
		d, err := outline.ReadCSV(bytes.NewReader(b))
		if err != nil {
			t.Fatal(err)
		}
		checkTrace(t, d)
	})
}

// checkSurface settles a mesh and follows its edges.
func checkSurface(t *testing.T, s *outline.Surface) {
	checkFaults(t, s.Faults)
	if s.Failed() || len(s.Triangle) > 5000 {
		return
	}
	s.Settle(outline.Unit{Name: "mm", Metres: 1e-3}, 1e-3)
	checkFaults(t, s.Faults)
	if s.Failed() {
		return
	}
	for _, c := range s.Triangle {
		for _, i := range c {
			if i < 0 || int(i) >= len(s.Vertex) || !finite(s.Vertex[i]) {
				t.Fatalf("triangle %v of %d vertices", c, len(s.Vertex))
			}
		}
	}
	for _, l := range s.Loops() {
		if len(l) < 3 {
			t.Fatalf("an edge of %d vertices", len(l))
		}
	}
}

func FuzzReadOBJ(f *testing.F) {
	f.Add([]byte("v 0 0 0\nv 1000 0 0\nv 1000 1000 5\nv 0 1000 0\nf 1 2 3 4\n"))
	f.Add([]byte("# c\no tent\nv 0 0 0 1\nv 1e3 0 0\nv 0 1e3 0\nvt 0 0\nvn 0 0 1\nf -3/1/1 -2//1 \\\n -1\nl 1 2\n"))
	f.Add([]byte("v 0 0 0\nv 9 0 0\nv 9 9 0\nv 0 9 0\nv 5 5 9\nf 1 2 5\nf 3 2 5\nf 3 4 5\nf 4 1 5\n"))
	f.Fuzz(func(t *testing.T, b []byte) {
		s, err := outline.ReadOBJ(bytes.NewReader(b))
		if err != nil {
			t.Fatal(err)
		}
		checkSurface(t, s)
	})
}

func FuzzReadSTL(f *testing.F) {
	f.Add([]byte("solid t\nfacet normal 0 0 1\nouter loop\nvertex 0 0 0\nvertex 1000 0 0\nvertex 0 1000 0\nendloop\nendfacet\nendsolid t\n"))
	b := make([]byte, 84+50)
	b[80] = 1
	copy(b[84+12:], []byte{0, 0, 0x80, 0x3f})
	copy(b[84+40:], []byte{0, 0, 0x80, 0x3f})
	f.Add(b)
	f.Fuzz(func(t *testing.T, b []byte) {
		s, err := outline.ReadSTL(bytes.NewReader(b))
		if err != nil {
			t.Fatal(err)
		}
		checkSurface(t, s)
	})
}
