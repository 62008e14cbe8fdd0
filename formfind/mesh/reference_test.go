package mesh

import (
	"bufio"
	"bytes"
	"encoding/json"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"

	"anticlast/formfind/internal/sweep"
	"github.com/stretchr/testify/require"
)

// External references: gmsh, a general mesh generator, and SciPy's Delaunay
// triangulation (Qhull). Both are Debian packages. Where they are not installed
// the tests are skipped, unless ANTICLAST_REQUIRE_TOOLS says that they must be.

func tool(t testing.TB, path string, probe ...string) {
	if exec.Command(path, probe...).Run() == nil {
		return
	}
	if os.Getenv("ANTICLAST_REQUIRE_TOOLS") != "" {
		t.Fatalf("%s is needed", path)
	}
	t.Skipf("%s is not installed", path)
}

// drawing is a set of closed polygons, the outline first, with the wanted side.
type drawing struct {
	name string
	rims [][]xy
	h    float64
}

func drawings(scale float64) []drawing {
	circle := func(x, y, r float64, n int) (p []xy) {
		for i := range n {
			sin, cos := math.Sincos(2 * math.Pi * float64(i) / float64(n))
			p = append(p, xy{x + r*cos, y + r*sin})
		}
		return p
	}
	star := func(n int, out, in float64) (p []xy) {
		for i := range 2 * n {
			r := out
			if i%2 == 1 {
				r = in
			}
			sin, cos := math.Sincos(math.Pi * float64(i) / float64(n))
			p = append(p, xy{r * cos, r * sin})
		}
		return p
	}
	return []drawing{
		{"square", [][]xy{{{0, 0}, {10, 0}, {10, 10}, {0, 10}}}, 0.5 * scale},
		{"L", [][]xy{{{0, 0}, {12, 0}, {12, 4}, {4, 4}, {4, 12}, {0, 12}}}, 0.4 * scale},
		{"star", [][]xy{star(5, 10, 4.5)}, 0.6 * scale},
		{"court with a hole", [][]xy{{{0, 0}, {14, 0}, {14, 9}, {0, 9}}, circle(5, 4, 1.5, 24)}, 0.5 * scale},
		{"nine corners", [][]xy{{{0, 0}, {5, -1}, {10, 1}, {13, 5}, {12, 9}, {8, 11}, {5, 9.5}, {1, 10}, {-2, 5}}}, 0.5 * scale},
	}
}

// divided puts the drawing's sides, divided by the wanted side, into a flat.
func (d drawing) divided() *flat {
	f := &flat{lone: d.h}
	for _, c := range d.rims {
		var rim []int
		for i, a := range c {
			b := c[(i+1)%len(c)]
			k := max(1, int(math.Round(math.Hypot(a.x-b.x, a.y-b.y)/d.h)))
			for j := range k {
				s := float64(j) / float64(k)
				rim = append(rim, len(f.p))
				f.p = append(f.p, xy{a.x + s*(b.x-a.x), a.y + s*(b.y-a.y)})
			}
		}
		f.rims = append(f.rims, rim)
	}
	return f
}

func (d drawing) mesh(t testing.TB, f *flat) *refinement {
	tri, in, err := f.outline()
	if err != nil {
		t.Fatal(err)
	}
	r := &refinement{d: tri, size: f.size, most: f.mean, in: in, rim: len(tri.p)}
	r.run(MaxTriangles)
	return r
}

// quality of a set of triangles: number, mean and worst of the ratio 2·inradius/
// circumradius (1 for an equilateral triangle), and least angle in degrees.
type quality struct {
	n                  int
	mean, worst, angle float64
}

func (q *quality) add(a, b, c xy) {
	la, lb, lc := math.Hypot(b.x-c.x, b.y-c.y), math.Hypot(c.x-a.x, c.y-a.y), math.Hypot(a.x-b.x, a.y-b.y)
	area := math.Abs((b.x-a.x)*(c.y-a.y)-(b.y-a.y)*(c.x-a.x)) / 2
	s := (la + lb + lc) / 2
	ratio := 2 * (area / s) / (la * lb * lc / (4 * area))
	short := min(la, lb, lc)
	angle := math.Asin(min(1, 2*area*short/(la*lb*lc))) * 180 / math.Pi
	if q.n == 0 {
		q.worst, q.angle = ratio, angle
	}
	q.mean = (q.mean*float64(q.n) + ratio) / float64(q.n+1)
	q.n++
	q.worst, q.angle = min(q.worst, ratio), min(q.angle, angle)
}

func (q quality) String() string {
	return fmt.Sprintf("%7d triangles, quality mean %.4f worst %.3f, least angle %.1f°", q.n, q.mean, q.worst, q.angle)
}

func (r *refinement) measure() (q quality) {
	for t, in := range r.in {
		if in {
			v := r.d.v[t]
			q.add(r.d.p[v[0]], r.d.p[v[1]], r.d.p[v[2]])
		}
	}
	return q
}

// gmsh meshes the same divided outline and returns the quality and the processor
// time that it reports for the meshing alone.
func gmsh(t testing.TB, f *flat, h float64, algorithm string) (q quality, seconds float64) {
	dir := t.TempDir()
	var b strings.Builder
	for i, p := range f.p {
		fmt.Fprintf(&b, "Point(%d)={%.17g,%.17g,0,%.17g};\n", i+1, p.x, p.y, h)
	}
	line := 0
	var loops []string
	for k, rim := range f.rims {
		var names []string
		for j, i := range rim {
			line++
			fmt.Fprintf(&b, "Line(%d)={%d,%d};\n", line, i+1, rim[(j+1)%len(rim)]+1)
			names = append(names, strconv.Itoa(line))
		}
		fmt.Fprintf(&b, "Curve Loop(%d)={%s};\n", k+1, strings.Join(names, ","))
		loops = append(loops, strconv.Itoa(k+1))
	}
	fmt.Fprintf(&b, "Transfinite Curve{1:%d}=2;\nPlane Surface(1)={%s};\n", line, strings.Join(loops, ","))
	geo, msh := filepath.Join(dir, "a.geo"), filepath.Join(dir, "a.msh")
	require.NoError(t, os.WriteFile(geo, []byte(b.String()), 0o644))
	out, err := exec.Command("gmsh", "-2", "-nt", "1", "-format", "msh2", "-algo", algorithm, geo, "-o", msh).CombinedOutput()
	require.NoError(t, err, string(out))
	_, rest, found := strings.Cut(string(out), "Done meshing 2D (Wall ")
	require.True(t, found)
	_, cpu, _ := strings.Cut(rest, "CPU ")
	seconds, err = strconv.ParseFloat(cpu[:strings.IndexByte(cpu, 's')], 64)
	require.NoError(t, err)
	data, err := os.ReadFile(msh)
	require.NoError(t, err)
	at := map[string]xy{}
	scan := bufio.NewScanner(bytes.NewReader(data))
	section := ""
	for scan.Scan() {
		w := strings.Fields(scan.Text())
		switch {
		case strings.HasPrefix(w[0], "$"):
			section = w[0]
		case section == "$Nodes" && len(w) == 4:
			x, _ := strconv.ParseFloat(w[1], 64)
			y, _ := strconv.ParseFloat(w[2], 64)
			at[w[0]] = xy{x, y}
		case section == "$Elements" && len(w) > 5 && w[1] == "2":
			n := len(w)
			q.add(at[w[n-3]], at[w[n-2]], at[w[n-1]])
		}
	}
	return q, seconds
}

// On the same divided outlines our triangles are at worst no worse than those of
// both of gmsh's usual algorithms, and on average no worse over all outlines (and
// by less than a thousandth on each).
func TestQualityAgainstGmsh(t *testing.T) {
	tool(t, "gmsh", "--version")
	ahead := map[string]float64{}
	for _, d := range drawings(0.5)[:sweep.N(3, 5, 5)] {
		f := d.divided()
		ours := d.mesh(t, f).measure()
		t.Logf("%-18s ours    %v", d.name, ours)
		for _, algorithm := range []string{"del2d", "front2d"} {
			q, _ := gmsh(t, f, f.mean, algorithm)
			t.Logf("%-18s %-7s %v", d.name, algorithm, q)
			require.GreaterOrEqual(t, ours.worst, q.worst)
			require.GreaterOrEqual(t, ours.angle, q.angle)
			require.Greater(t, ours.mean, q.mean-0.001)
			ahead[algorithm] += ours.mean - q.mean
		}
	}
	for algorithm, by := range ahead {
		require.Positive(t, by, algorithm)
	}
}

// processor returns the processor time of this process.
func processor() float64 {
	var u syscall.Rusage
	if syscall.Getrusage(syscall.RUSAGE_SELF, &u) != nil {
		return 0
	}
	return (time.Duration(u.Utime.Nano()) + time.Duration(u.Stime.Nano())).Seconds()
}

// BenchmarkAgainstGmsh reports the processor time of about 100,000 triangles and
// its ratio to gmsh's for the same outline.
func BenchmarkAgainstGmsh(b *testing.B) {
	tool(b, "gmsh", "--version")
	for _, d := range drawings(1.0 / 11) {
		b.Run(strings.ReplaceAll(d.name, " ", "_"), func(b *testing.B) {
			f := d.divided()
			start, n := processor(), 0
			for b.Loop() {
				n = d.mesh(b, f).measure().n
			}
			ours := (processor() - start) / float64(b.N)
			b.ReportMetric(float64(n), "triangles")
			b.ReportMetric(ours, "cpu-s")
			for _, algorithm := range []string{"del2d", "front2d"} {
				q, s := gmsh(b, f, f.mean, algorithm)
				b.ReportMetric(ours/float64(n)/(s/float64(q.n)), "of-"+algorithm)
			}
		})
	}
}

// The triangulation before refinement against SciPy's: the same triangles,
// whatever the order of points. With the convex hull held the constrained
// triangulation is the Delaunay triangulation, which is unique for points in
// general position.
func TestTriangulationAgainstSciPy(t *testing.T) {
	const python = "/usr/bin/python3"
	tool(t, python, "-c", "import scipy.spatial")
	rnd := rand.New(rand.NewPCG(7, 7))
	for _, n := range []int{3, 10, 100, 3000} {
		var list [][2]float64
		lo, hi := xy{math.Inf(1), math.Inf(1)}, xy{math.Inf(-1), math.Inf(-1)}
		for range n {
			x, y := 100*rnd.Float64(), 40*rnd.Float64()
			if n == 100 { // dense in one place
				x, y = x*x/100, y*y/40
			}
			list = append(list, [2]float64{x, y})
			lo, hi = xy{min(lo.x, x), min(lo.y, y)}, xy{max(hi.x, x), max(hi.y, y)}
		}
		in, err := json.Marshal(list)
		require.NoError(t, err)
		cmd := exec.Command(python, "-c", "import json,sys\nfrom scipy.spatial import Delaunay\nd=Delaunay(json.load(sys.stdin))\njson.dump({'t':d.simplices.tolist(),'h':d.convex_hull.tolist()},sys.stdout)")
		cmd.Stdin = bytes.NewReader(in)
		out, err := cmd.Output()
		require.NoError(t, err)
		var want struct {
			T [][3]int32
			H [][2]int32
		}
		require.NoError(t, json.Unmarshal(out, &want))
		d := newDelaunay(lo, hi)
		for _, p := range list {
			_, err := d.add(xy{p[0], p[1]})
			require.NoError(t, err)
		}
		for _, e := range want.H {
			require.NoError(t, d.hold(e[0]+3, e[1]+3))
		}
		d.settle()
		sound(t, d)
		var got [][3]int32
		for k, in := range d.inside() {
			if v := d.v[k]; in {
				got = append(got, [3]int32{v[0] - 3, v[1] - 3, v[2] - 3})
			}
		}
		require.Equal(t, sorted(want.T), sorted(got))
	}
}

func sorted(list [][3]int32) [][3]int32 {
	for i := range list {
		slices.Sort(list[i][:])
	}
	slices.SortFunc(list, func(a, b [3]int32) int { return slices.Compare(a[:], b[:]) })
	return list
}
