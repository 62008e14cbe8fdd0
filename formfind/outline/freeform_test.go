package outline_test

import (
	"encoding/csv"
	"math"
	"os"
	"strconv"
	"strings"
	"testing"

	"anticlast/formfind/outline"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

// fromSegment is the distance of q from a segment of a drawing.
func fromSegment(s outline.Segment, q r3.Vec) float64 {
	if s.Arc {
		u, v := r3.Sub(s.Through, s.A), r3.Sub(s.B, s.A)
		w := r3.Cross(u, v)
		c := r3.Scale(1/(2*r3.Norm2(w)), r3.Add(r3.Scale(r3.Norm2(u), r3.Cross(v, w)), r3.Scale(r3.Norm2(v), r3.Cross(w, u))))
		d := r3.Sub(r3.Sub(q, s.A), c)
		n := r3.Unit(w)
		flat := r3.Sub(d, r3.Scale(r3.Dot(d, n), n))
		// Within the arc, which runs counter-clockwise about n.
		a, b := r3.Scale(-1, c), r3.Sub(v, c)
		angle := func(x r3.Vec) float64 {
			t := math.Atan2(r3.Dot(n, r3.Cross(a, x)), r3.Dot(a, x))
			return math.Mod(t+2*math.Pi, 2*math.Pi)
		}
		if t := angle(flat); t <= angle(b) {
			return math.Hypot(r3.Norm(flat)-r3.Norm(c), r3.Dot(d, n))
		}
		return min(r3.Norm(r3.Sub(q, s.A)), r3.Norm(r3.Sub(q, s.B)))
	}
	u, v := r3.Sub(s.B, s.A), r3.Sub(q, s.A)
	t := min(1, max(0, r3.Dot(u, v)/r3.Norm2(u)))
	return r3.Norm(r3.Sub(v, r3.Scale(t, u)))
}

// Places on ellipses and splines by an independent implementation (python3-ezdxf,
// testdata/make_drawings.py) lie within a thousandth of their size from the arcs
// that replace them, and no farther than is said.
func TestEllipsesAndSplines(t *testing.T) {
	d := readFile(t, "curves.dxf")
	f, err := os.Open("testdata/curves.csv")
	require.NoError(t, err)
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	require.NoError(t, err)
	places := map[string][]r3.Vec{}
	for _, r := range rows[1:] {
		var v [3]float64
		for k := range v {
			v[k], err = strconv.ParseFloat(r[1+k], 64)
			require.NoError(t, err)
		}
		places[r[0]] = append(places[r[0]], r3.Vec{X: v[0], Y: v[1], Z: v[2]})
	}
	require.Len(t, places, 8)
	require.Len(t, d.Replaced, 8)
	most := map[string]int{"WHOLE": 16, "PART": 12, "TILTED": 8, "FREE": 16, "ROUND": 1, "CORNER": 16, "CLOSED": 24, "SPACE": 32}
	for _, g := range d.Replaced {
		s := on(d, g.Layer)
		require.Len(t, s, g.Pieces, g.Layer)
		require.Equal(t, 1, g.Count)
		require.LessOrEqual(t, g.Pieces, most[g.Layer], g.Layer)
		for k := 1; k < len(s); k++ {
			require.Equal(t, s[k-1].B, s[k].A)
			require.Equal(t, s[0].Path, s[k].Path)
		}
		lo, hi := places[g.Layer][0], places[g.Layer][0]
		worst := 0.0
		for _, q := range places[g.Layer] {
			lo = r3.Vec{X: min(lo.X, q.X), Y: min(lo.Y, q.Y), Z: min(lo.Z, q.Z)}
			hi = r3.Vec{X: max(hi.X, q.X), Y: max(hi.Y, q.Y), Z: max(hi.Z, q.Z)}
			off := math.Inf(1)
			for _, s := range s {
				off = min(off, fromSegment(s, q))
			}
			worst = max(worst, off)
		}
		size := r3.Norm(r3.Sub(hi, lo))
		t.Logf("%-7s %2d arcs, %.3f off, %.3f said, size %.0f", g.Layer, g.Pieces, worst, g.Off, size)
		require.LessOrEqual(t, worst, 1.05*g.Off+1e-5, g.Layer)
		require.LessOrEqual(t, worst, 2e-3*size, g.Layer) // of control points, which lie farther out
		ends := places[g.Layer]
		near(t, ends[0], s[0].A)
		near(t, ends[len(ends)-1], s[len(s)-1].B)
		if g.Layer == "WHOLE" {
			require.Equal(t, s[0].A, s[len(s)-1].B, "closed to the last bit")
		}
	}
}

func TestFaultsOfCurves(t *testing.T) {
	knots := func(k ...string) string { return " 40 " + strings.Join(k, " 40 ") }
	const square = " 10 0 20 0 10 1 20 0 10 1 20 1"
	for name, c := range map[string]struct{ entity, want string }{
		"flat ellipse":    {"ELLIPSE 8 A 10 0 20 0 11 1 21 0 40 0", "no width or no length"},
		"no axis":         {"ELLIPSE 8 A 10 0 20 0 11 0 21 0 40 0.5", "no width or no length"},
		"degree":          {"SPLINE 8 A 71 99" + knots("0", "0", "1", "1") + square, "has degree 99"},
		"no degree":       {"SPLINE 8 A" + knots("0", "0", "1", "1") + square, "has degree 0"},
		"few knots":       {"SPLINE 8 A 71 2" + knots("0", "0", "1", "1") + square, "3 control points and 4 knots"},
		"falling knots":   {"SPLINE 8 A 71 2" + knots("0", "0", "1", "0", "1", "1") + square, "do not rise"},
		"one knot":        {"SPLINE 8 A 71 2" + knots("1", "1", "1", "1", "1", "1") + square, "do not rise"},
		"weights":         {"SPLINE 8 A 71 2 41 1 41 1" + knots("0", "0", "0", "1", "1", "1") + square, "3 control points and 2 weights"},
		"negative weight": {"SPLINE 8 A 71 2 41 1 41 -1 41 1" + knots("0", "0", "0", "1", "1", "1") + square, "a weight of -1"},
		"one place":       {"SPLINE 8 A 71 1" + knots("0", "0", "1", "1") + " 10 3 20 3 10 3 20 3", "all at one place"},
	} {
		t.Run(name, func(t *testing.T) {
			d, err := outline.ReadDXF(strings.NewReader(dxf(c.entity)))
			require.NoError(t, err)
			require.NotEmpty(t, d.Faults)
			require.Contains(t, d.Faults[0].String(), c.want)
			require.Equal(t, 6, d.Faults[0].Line)
		})
	}
	// By fit points alone a spline is not defined; it is left out.
	d, err := outline.ReadDXF(strings.NewReader(dxf("SPLINE 8 A 71 3 11 0 21 0 11 1 21 1 11 2 21 0")))
	require.NoError(t, err)
	require.Empty(t, d.Faults)
	require.Equal(t, "SPLINE without control points", d.Ignored[0].Kind)
}

// A file of splines that need ever more arcs is refused.
func TestTooManyCurves(t *testing.T) {
	var list []string
	for range 3000 {
		list = append(list, "ELLIPSE 8 A 10 0 20 0 11 1 21 0 40 0.3")
	}
	d, err := outline.ReadDXF(strings.NewReader(dxf(list...)))
	require.NoError(t, err)
	require.Len(t, d.Faults, 1)
	require.Contains(t, d.Faults[0].String(), "more than 20000 arcs")
	require.LessOrEqual(t, len(d.Segments), 20000)
}
