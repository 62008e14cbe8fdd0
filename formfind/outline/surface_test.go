package outline_test

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"anticlast/formfind/outline"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

// saddle is an invented mesh: n × n squares over a square of 6 m in mm, with a
// hole in the middle.
func saddle(n int) (v []r3.Vec, t [][3]int32) {
	for y := range n + 1 {
		for x := range n + 1 {
			a, b := 6000*float64(x)/float64(n), 6000*float64(y)/float64(n)
			v = append(v, r3.Vec{X: a, Y: b, Z: (a - 3000) * (b - 3000) / 6000})
		}
	}
	for y := range n {
		for x := range n {
			if 2*x+1 == n && 2*y+1 == n {
				continue
			}
			i := int32(y*(n+1) + x)
			j := i + int32(n) + 1
			t = append(t, [3]int32{i, i + 1, j + 1}, [3]int32{i, j + 1, j})
		}
	}
	return v, t
}

func area(s *outline.Surface) (a float64) {
	for _, c := range s.Triangle {
		a += r3.Norm(r3.Cross(r3.Sub(s.Vertex[c[1]], s.Vertex[c[0]]), r3.Sub(s.Vertex[c[2]], s.Vertex[c[0]]))) / 2
	}
	return a
}

func writeOBJ(v []r3.Vec, t [][3]int32) string {
	var b strings.Builder
	b.WriteString("o saddle\n")
	for _, p := range v {
		fmt.Fprintf(&b, "v %v %v %v\n", p.X, p.Y, p.Z)
	}
	for _, c := range t {
		fmt.Fprintf(&b, "f %d %d %d\n", c[0]+1, c[1]+1, c[2]+1)
	}
	return b.String()
}

var mm = outline.Unit{Name: "mm", Metres: 1e-3}

func settled(t *testing.T, s *outline.Surface, err error) *outline.Surface {
	t.Helper()
	require.NoError(t, err)
	require.Empty(t, s.Faults)
	s.Settle(mm, 1e-3)
	require.Empty(t, s.Faults)
	return s
}

func checkSaddle(t *testing.T, s *outline.Surface, n int) {
	t.Helper()
	v, tri := saddle(n)
	want := area(&outline.Surface{Vertex: v, Triangle: tri}) * 1e-6
	require.Len(t, s.Vertex, len(v))
	require.Len(t, s.Triangle, len(tri))
	require.InDelta(t, want, area(s), 1e-5*want)
	loops := s.Loops()
	require.Len(t, loops, 2, "the rim and the hole")
	require.Len(t, loops[0], 4*n)
	require.Len(t, loops[1], 4)
	for _, c := range s.Triangle {
		n := r3.Cross(r3.Sub(s.Vertex[c[1]], s.Vertex[c[0]]), r3.Sub(s.Vertex[c[2]], s.Vertex[c[0]]))
		require.Positive(t, n.Z, "up")
	}
}

// Files as python3-meshio, an independent library, writes them
// (testdata/make_meshes.py): OBJ and both kinds of STL, with saddle(5) in them.
func TestMeshesOfAnIndependentWriter(t *testing.T) {
	open := func(name string) *os.File {
		f, err := os.Open(filepath.Join("testdata", name))
		require.NoError(t, err)
		t.Cleanup(func() { f.Close() })
		return f
	}
	s, err := outline.ReadOBJ(open("saddle.obj"))
	checkSaddle(t, settled(t, s, err), 5)
	s, err = outline.ReadSTL(open("saddle.stl"))
	checkSaddle(t, settled(t, s, err), 5)
	s, err = outline.ReadSTL(open("saddle-binary.stl"))
	checkSaddle(t, settled(t, s, err), 5)
}

func TestTrianglesAreTurnedAlike(t *testing.T) {
	v, tri := saddle(7)
	for i := range tri {
		if i%3 == 1 {
			tri[i][0], tri[i][1] = tri[i][1], tri[i][0]
		}
	}
	s, err := outline.ReadOBJ(strings.NewReader(writeOBJ(v, tri)))
	checkSaddle(t, settled(t, s, err), 7)
}

func TestQuadsAndOtherPolygons(t *testing.T) {
	// A pentagon by numbers counted back, with texture and normals, continued.
	s, err := outline.ReadOBJ(strings.NewReader("v 0 0 0\nv 4000 0 0\nv 4000 2000 0\nv 2000 3000 0\nv 0 2000 0\nf -5 -4// -3/1 \\\n-2/2/2 5\n"))
	s = settled(t, s, err)
	require.Len(t, s.Triangle, 3)
	require.InDelta(t, 10, area(s), 1e-12)
	s, err = outline.ReadOBJ(strings.NewReader("v 0 0 0\nv 4000 0 0\nv 3000 1000 0\nv 0 1000 0\nf 1 2 3 4\n"))
	s = settled(t, s, err)
	require.Len(t, s.Triangle, 2)
	require.InDelta(t, 3.5, area(s), 1e-12)
	require.Equal(t, [3]int32{0, 1, 2}, s.Triangle[0], "along the shorter diagonal")
	s, err = outline.ReadOBJ(strings.NewReader("v 0 0 0\nv 3000 0 0\nv 4000 1000 0\nv 1000 1000 0\nf 1 2 3 4\n"))
	require.Equal(t, [3]int32{1, 2, 3}, settled(t, s, err).Triangle[0])
}

func TestFaultsOfMeshes(t *testing.T) {
	binarySTL := func(n uint32, facets int) string {
		b := make([]byte, 84+50*facets)
		binary.LittleEndian.PutUint32(b[80:], n)
		return string(b)
	}
	nan := []byte(binarySTL(1, 1))
	binary.LittleEndian.PutUint32(nan[84+12:], math.Float32bits(float32(math.NaN())))
	for name, c := range map[string]struct {
		text, want string
		stl        bool
	}{
		"empty":           {"", "the mesh has no triangles", false},
		"coordinate":      {"v 0 0 x\n", `line 1: not a usable coordinate: "x"`, false},
		"two coordinates": {"v 0 0\n", "line 1: a vertex has 2 coordinates", false},
		"before":          {"f 1 2 3\nv 0 0 0\n", `line 1: there is no vertex "1"`, false},
		"two corners":     {"v 0 0 0\nv 1 0 0\nf 1 2\n", "line 3: a face has 2 corners", false},
		"short":           {"not a mesh", "shorter than 84 bytes", true},
		"too many":        {binarySTL(4e9, 1), "4000000000 triangles", true},
		"cut":             {binarySTL(7, 3), "says that it has 7 triangles and ends after 3", true},
		"not finite":      {string(nan), "triangle 1 has a coordinate that is not usable", true},
		"word":            {"solid a\nfacit\n", `line 2: unknown word "facit"`, true},
		"no end":          {"solid a\nfacet normal 0 0 1\nouter loop\nvertex 0 0 0\n", "ends without endsolid", true},
		"two vertices":    {"solid a\nfacet normal 0 0 1\nouter loop\nvertex 0 0 0\nvertex 1 0 0\nendloop\nendfacet\nendsolid\n", "line 2: a facet has 2 vertices", true},
	} {
		t.Run(name, func(t *testing.T) {
			read := outline.ReadOBJ
			if c.stl {
				read = outline.ReadSTL
			}
			s, err := read(strings.NewReader(c.text))
			require.NoError(t, err)
			require.Len(t, s.Faults, 1)
			require.Contains(t, s.Faults[0].String(), c.want)
		})
	}
	for name, c := range map[string]struct{ text, want string }{
		"flat":  {"v 0 0 0\nv 1 0 0\nv 2 0 0\nf 1 2 3\n", "the mesh has no triangles"},
		"fin":   {"v 0 0 0\nv 1000 0 0\nv 500 900 0\nv 500 -900 0\nv 500 0 900\nf 1 2 3\nf 1 2 4\nf 1 2 5\n", "3 triangles meet along the side from (0, 0, 0) mm to (1000, 0, 0) mm"},
		"twist": {mobius(9), "has one side only"},
	} {
		t.Run(name, func(t *testing.T) {
			s, err := outline.ReadOBJ(strings.NewReader(c.text))
			require.NoError(t, err)
			s.Settle(mm, 1e-6)
			require.True(t, s.Failed())
			require.Contains(t, s.Faults[len(s.Faults)-1].String(), c.want)
		})
	}
}

// mobius is a band of n quads with half a twist.
func mobius(n int) string {
	var b bytes.Buffer
	for i := range n {
		a := 2 * math.Pi * float64(i) / float64(n)
		for _, w := range []float64{-500, 500} {
			r := 2000 + w*math.Cos(a/2)
			fmt.Fprintf(&b, "v %v %v %v\n", r*math.Cos(a), r*math.Sin(a), w*math.Sin(a/2))
		}
	}
	for i := range n {
		p, q := 2*i+1, 2*i+2
		r, s := 2*i+3, 2*i+4
		if i == n-1 {
			r, s = 2, 1
		}
		fmt.Fprintf(&b, "f %d %d %d\nf %d %d %d\n", p, r, s, p, s, q)
	}
	return b.String()
}
