package outline_test

import (
	"fmt"
	"math"
	"os"
	"strings"
	"testing"

	"anticlast/formfind/outline"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

func readFile(t testing.TB, name string) *outline.Drawing {
	t.Helper()
	f, err := os.Open("testdata/" + name)
	require.NoError(t, err)
	defer f.Close()
	d, err := outline.ReadDXF(f)
	require.NoError(t, err)
	require.Empty(t, d.Faults)
	return d
}

func on(d *outline.Drawing, layer string) (out []outline.Segment) {
	for _, s := range d.Segments {
		if s.Layer == layer {
			out = append(out, s)
		}
	}
	return out
}

func near(t *testing.T, want, got r3.Vec, msg ...any) {
	t.Helper()
	require.InDelta(t, 0, r3.Norm(r3.Sub(want, got)), 1e-6, append([]any{"want %v, got %v", want, got}, msg...)...)
}

// The drawings are written by python3-ezdxf (testdata/make_drawings.py), an
// independent implementation of the published format; what they show is in that
// script.
func TestEveryEntityOfEveryRelease(t *testing.T) {
	for _, release := range []string{"r12", "r2000", "r2018"} {
		t.Run(release, func(t *testing.T) {
			d := readFile(t, "entities-"+release+".dxf")
			old := release == "r12"
			if old {
				require.Zero(t, d.Unit, "release 12 has no unit")
			} else {
				require.Equal(t, outline.Unit{Name: "mm", Metres: 1e-3}, d.Unit)
			}
			l := on(d, "LINES")
			require.Len(t, l, 1, "paper space is left out")
			near(t, r3.Vec{Z: 100}, l[0].A)
			near(t, r3.Vec{X: 3000, Z: 200}, l[0].B)
			require.False(t, l[0].Arc)
			text, err := os.ReadFile("testdata/entities-" + release + ".dxf")
			require.NoError(t, err)
			require.Equal(t, "LINE", strings.Split(string(text), "\n")[l[0].Line-1], "the line of the file that starts it")

			if !old {
				l = on(d, "LIGHT")
				require.Len(t, l, 3)
				// Bulge 0.5 over 2000: rise 500, to the right of the way.
				require.True(t, l[0].Arc)
				near(t, r3.Vec{X: 1000, Y: -500, Z: 4500}, l[0].Through)
				require.False(t, l[1].Arc)
				near(t, r3.Vec{Z: 4500}, l[2].B, "closed")
			}
			l = on(d, "HEAVY")
			require.Len(t, l, 2, "open")
			near(t, r3.Vec{X: 1000, Z: 250}, l[1].A)
			// Bulge −1: a half circle to the left of the way up.
			require.True(t, l[1].Arc)
			near(t, r3.Vec{Y: 1000, Z: 250}, l[1].Through)
			l = on(d, "SPACE")
			require.Len(t, l, 2)
			near(t, r3.Vec{X: 1000, Y: 1000, Z: 1500}, l[1].B)
			l = on(d, "ROUND")
			require.Len(t, l, 5, "an arc and four quarters")
			sin, cos := math.Sincos(75 * math.Pi / 180)
			near(t, r3.Vec{X: 1000 + 500*cos, Y: 1000 + 500*sin, Z: 30}, l[0].Through)
			near(t, r3.Vec{X: 1000, Y: 1000, Z: 30}, r3.Sub(l[0].A, r3.Vec{X: 500 * math.Sqrt(3) / 2, Y: 250}))
			require.Equal(t, l[1].A, l[4].B, "closed to the last bit")
			near(t, r3.Vec{X: 5000 - 800, Z: 60}, l[2].B)
			require.Len(t, d.Points, 1)
			near(t, r3.Vec{X: 7, Y: 8, Z: 9}, d.Points[0].At)
			l = on(d, "TURNED")
			near(t, r3.Vec{X: 4000}, l[0].A)
			near(t, r3.Vec{X: 2000, Z: 2000}, l[0].Through, "the arch stands upright")
			near(t, r3.Vec{}, l[0].B)
			// Normal −z: the axes are −x, y, −z.
			near(t, r3.Vec{X: 900, Y: 2000, Z: 300}, l[1].A)
			if !old {
				last := l[len(l)-1]
				near(t, r3.Vec{X: -1000}, last.B)
				near(t, r3.Vec{X: -500, Y: -500}, last.Through)
			}
			kinds := map[string]int{}
			for _, g := range d.Ignored {
				kinds[g.Kind] = g.Count
				require.Positive(t, g.Line)
			}
			want := map[string]int{"INSERT": 1, "TEXT": 1}
			if !old {
				want = map[string]int{"INSERT": 1, "TEXT": 1, "SPLINE without control points": 1, "entities in paper space": 1}
			}
			if !old {
				require.Equal(t, "REST", d.Replaced[0].Layer)
				l = on(d, "REST")
				require.Len(t, l, d.Replaced[0].Pieces)
				near(t, r3.Vec{X: 3}, l[0].A, "an ellipse")
			}
			for k, n := range want {
				require.Equal(t, n, kinds[k], k)
			}
		})
	}
}

// dxf writes a drawing of entities given as "KIND code value code value …".
func dxf(entities ...string) string {
	var b strings.Builder
	b.WriteString("  0\nSECTION\n  2\nENTITIES\n")
	for _, e := range entities {
		f := strings.Fields(e)
		fmt.Fprintf(&b, "  0\n%s\n", f[0])
		for i := 1; i+1 < len(f); i += 2 {
			fmt.Fprintf(&b, "%3s\n%s\n", f[i], f[i+1])
		}
	}
	b.WriteString("  0\nENDSEC\n  0\nEOF\n")
	return b.String()
}

func TestFaultsOfDrawings(t *testing.T) {
	for name, c := range map[string]struct {
		text string
		line int
		want string
	}{
		"empty":            {"", 0, "the drawing is empty"},
		"not a drawing":    {"solid tent\n", 1, "does not start like a DXF drawing"},
		"DWG":              {"AC1032\x00\x00\x00\n", 1, "is a DWG drawing"},
		"no entities":      {"0\nSECTION\n2\nHEADER\n0\nENDSEC\n0\nEOF\n", 8, "no section ENTITIES"},
		"cut off":          {strings.TrimSuffix(dxf("LINE 8 A 10 0 20 0 11 1 21 1"), "  0\nEOF\n"), 18, "without the group EOF"},
		"cut in a pair":    {"0\nSECTION\n2\nENTITIES\n0\nLINE\n10\n", 7, "the value of group 10 is missing"},
		"code":             {"0\nSECTION\n2\nENTITIES\nx\nLINE\n", 5, `a group code is expected, not "x"`},
		"number":           {dxf("LINE 8 A 10 1,5 20 0 11 1 21 1"), 10, `group 10 of LINE is not a usable number: "1,5"`},
		"not finite":       {dxf("LINE 8 A 10 nan 20 0 11 1 21 1"), 10, "not a usable number"},
		"huge":             {dxf("LINE 8 A 10 1e300 20 0 11 1 21 1"), 10, "not a usable number"},
		"flags":            {dxf("LWPOLYLINE 8 A 70 x 10 0 20 0 10 1 20 1"), 10, "not a whole number"},
		"one vertex":       {dxf("LWPOLYLINE 8 A 10 0 20 0"), 6, "the polyline has 1 vertices"},
		"no radius":        {dxf("CIRCLE 8 A 10 0 20 0 40 0"), 6, "the CIRCLE has no radius"},
		"no SEQEND":        {dxf("POLYLINE 8 A", "VERTEX 10 0 20 0", "LINE 8 A 10 0 20 0 11 1 21 1"), 16, "the POLYLINE of line 6 has no SEQEND"},
		"line without end": {"0\nSECTION\n2\n" + strings.Repeat("x", 70000), 4, "a line is longer than"},
	} {
		t.Run(name, func(t *testing.T) {
			d, err := outline.ReadDXF(strings.NewReader(c.text))
			require.NoError(t, err)
			require.NotEmpty(t, d.Faults)
			require.Contains(t, d.Faults[0].String(), c.want)
			require.Equal(t, c.line, d.Faults[0].Line)
		})
	}
}

func TestDrawingsInManyShapes(t *testing.T) {
	// DOS line ends, old encodings, escapes, a full circle as an arc.
	text := strings.ReplaceAll(dxf("ARC 8 D\xe4cher 10 0 20 0 40 5 50 90 51 450", `LINE 8 D\U+00E4cher 10 0 20 0 11 1 21 1`, "LINE 8 Dächer 10 0 20 0 11 2 21 1"), "\n", "\r\n")
	d, err := outline.ReadDXF(strings.NewReader(text))
	require.NoError(t, err)
	require.Empty(t, d.Faults)
	require.Equal(t, []string{"Dächer"}, d.Layers())
	require.Len(t, d.Segments, 6)
	// Two half circles make one of two vertices.
	d, err = outline.ReadDXF(strings.NewReader(dxf("LWPOLYLINE 8 A 70 1 10 0 20 0 42 1 10 2 20 0 42 1")))
	require.NoError(t, err)
	require.Len(t, d.Segments, 2)
	near(t, r3.Vec{X: 1, Y: -1}, d.Segments[0].Through)
	near(t, r3.Vec{X: 1, Y: 1}, d.Segments[1].Through)
	// A closed line whose last vertex is its first again.
	d, err = outline.ReadDXF(strings.NewReader(dxf("LWPOLYLINE 8 A 70 1 10 0 20 0 10 2 20 0 10 2 20 2 10 0 20 0")))
	require.NoError(t, err)
	require.Len(t, d.Segments, 3)
	// Meshes of POLYLINE are not outlines; spline frames are not vertices.
	d, err = outline.ReadDXF(strings.NewReader(dxf("POLYLINE 8 A 70 16", "VERTEX 10 0 20 0", "VERTEX 10 1 20 0", "SEQEND", "POLYLINE 8 A 70 4", "VERTEX 10 0 20 0", "VERTEX 10 9 20 9 70 16", "VERTEX 10 1 20 0", "SEQEND")))
	require.NoError(t, err)
	require.Len(t, d.Segments, 1)
	require.Equal(t, "POLYLINE that is a mesh", d.Ignored[0].Kind)
}

func BenchmarkReadDXF(b *testing.B) {
	var lines []string
	for i := range 100_000 {
		lines = append(lines, fmt.Sprintf("LINE 5 %X 8 PAVING 62 7 10 %d.5 20 %d.25 30 0.0 11 %d 21 %d 31 0.0", i, i, i%977, i+1, i%977))
	}
	text := dxf(lines...)
	b.SetBytes(int64(len(text)))
	b.ReportAllocs()
	for b.Loop() {
		d, err := outline.ReadDXF(strings.NewReader(text))
		if err != nil || len(d.Segments) != len(lines) {
			b.Fatal(err)
		}
	}
}
