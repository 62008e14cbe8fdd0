package export

import (
	"bytes"
	"encoding/json"
	"maps"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"anticlast/formfind/canopy"

	"github.com/qmuntal/gltf"
	"github.com/qmuntal/gltf/modeler"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

// scenes are the results on which the writer is tried.
func scenes() map[string]*canopy.Result {
	collapsed := sail(4)
	for i := range 10 {
		collapsed.Form.Position[i] = r3.Vec{X: 1}
	}
	two := sail(4)
	two.Structure.Fabrics = append(two.Structure.Fabrics, canopy.Fabric{Name: "second"}, canopy.Fabric{Name: "unused"})
	for i := range 10 {
		two.Structure.FabricOf[i] = 1
	}
	point := &canopy.Result{Structure: &canopy.Structure{Position: []r3.Vec{{}}, Fixed: []canopy.Freedom{7}}}
	point.Form = canopy.NewForm(point.Structure)
	return map[string]*canopy.Result{
		"sail": sail(8), "cone": cone(24), "net": grid(6),
		"collapsed triangles": collapsed, "two fabrics": two, "one point": point,
		"nothing": {Structure: &canopy.Structure{}, Form: &canopy.Form{}},
	}
}

// The Khronos validator finds no error, warning, info or hint.
func TestGLBValidates(t *testing.T) {
	t.Parallel()
	node := tool(t, "node")
	home := os.Getenv("ANTICLAST_NODE_MODULES")
	if _, err := os.Stat(filepath.Join(home, "node_modules", "gltf-validator")); err != nil {
		absent(t, "npm package gltf-validator (ANTICLAST_NODE_MODULES names the folder it was installed in)")
	}
	all := scenes()
	all["large net"], all["large sail"] = grid(120), sail(300)
	names := slices.Sorted(maps.Keys(all))
	args := []string{"testdata/validate_glb.mjs"}
	for _, name := range names {
		args = append(args, saved(t, "glb", all[name]))
	}
	f, err := Lookup("glb")
	require.NoError(t, err)
	names = append(names, "with ground")
	args = append(args, filepath.Join(t.TempDir(), "ground.glb"))
	require.NoError(t, File(background, args[len(args)-1], sail(6), f, Options{Ground: true}))
	out, err := exec.Command(node, args...).CombinedOutput()
	require.NoError(t, err, string(out))
	dec := json.NewDecoder(bytes.NewReader(out))
	for _, name := range names {
		var report struct{ Errors, Warnings, Infos, Hints int }
		require.NoError(t, dec.Decode(&report))
		require.Zero(t, report, name)
	}
}

func open(t *testing.T, r *canopy.Result) *gltf.Document {
	t.Helper()
	var b bytes.Buffer
	require.NoError(t, writeGLB(background, &b, r, Options{}))
	var doc gltf.Document
	require.NoError(t, gltf.NewDecoder(&b).Decode(&doc))
	return &doc
}

func nodeNamed(t *testing.T, doc *gltf.Document, name string) (*gltf.Node, int) {
	t.Helper()
	for i, n := range doc.Nodes {
		if n.Name == name {
			return n, i
		}
	}
	t.Fatalf("no node %q", name)
	return nil, 0
}

// Read back, the fabric has the form's box, area and count, in y-up axes.
func TestGLBHoldsTheFabric(t *testing.T) {
	r := sail(12)
	doc := open(t, r)
	n, _ := nodeNamed(t, doc, "fabric sail")
	p := doc.Meshes[*n.Mesh].Primitives[0]
	position, err := modeler.ReadPosition(doc, doc.Accessors[p.Attributes[gltf.POSITION]], nil)
	require.NoError(t, err)
	normal, err := modeler.ReadNormal(doc, doc.Accessors[p.Attributes[gltf.NORMAL]], nil)
	require.NoError(t, err)
	index, err := modeler.ReadIndices(doc, doc.Accessors[*p.Indices], nil)
	require.NoError(t, err)
	require.Len(t, index, 3*len(r.Structure.Corners))
	vec := func(v [3]float32) r3.Vec { return r3.Vec{X: float64(v[0]), Y: float64(v[1]), Z: float64(v[2])} }
	area := 0.0
	for i := 0; i < len(index); i += 3 {
		a, b, c := vec(position[index[i]]), vec(position[index[i+1]]), vec(position[index[i+2]])
		cross := r3.Cross(r3.Sub(b, a), r3.Sub(c, a))
		area += r3.Norm(cross) / 2
		require.Positive(t, r3.Dot(cross, vec(normal[index[i]])), "normals and winding agree")
	}
	require.InEpsilon(t, r.Summary.FabricArea[0], area, 1e-6)
	lo, hi := canopy.Bounds(r.Form.Position[:13*13])
	acc := doc.Accessors[p.Attributes[gltf.POSITION]]
	require.InDeltaSlice(t, []float64{lo.X, lo.Z, -hi.Y}, acc.Min, 1e-6)
	require.InDeltaSlice(t, []float64{hi.X, hi.Z, -lo.Y}, acc.Max, 1e-6)
	for _, v := range normal {
		require.InDelta(t, 1, r3.Norm(vec(v)), 1e-6)
	}
}

func TestGLBNamesItsParts(t *testing.T) {
	doc := open(t, sail(6))
	for _, name := range []string{"cables", "masts", "supports", "edge cable AB", "guy G1", "mast M1", "support A", "support G2 anchor", "held point C", "contours", "reactions", "reaction at A", "yarns", "legend, achieved"} {
		nodeNamed(t, doc, name)
	}
	n, _ := nodeNamed(t, doc, "edge cable AB")
	extras := n.Extras.(map[string]any)
	require.InDelta(t, 25e3, extras["force_N"].(map[string]any)["min"], 1)
	n, _ = nodeNamed(t, doc, "support A")
	require.Equal(t, []any{-18000.0, -10000.0, -10000.0}, n.Extras.(map[string]any)["reaction_on_structure_N"])
	require.Equal(t, canopy.Caution, doc.Asset.Extras.(map[string]any)["caution"])
	var names []string
	for _, s := range doc.Scenes {
		names = append(names, s.Name)
	}
	require.Equal(t, []string{"achieved", "warp", "weft", "ratio", "utilisation", "slope", "plain", "reactions"}, names)
	doc = open(t, cone(16))
	nodeNamed(t, doc, "ring top")
	nodeNamed(t, doc, "fixed edge base")
}

// Coordinates of a national grid do not fit single precision: they are moved to
// a local origin, which the root nodes carry.
func TestGLBFarFromTheOriginKeepsItsShape(t *testing.T) {
	r := cone(32)
	doc := open(t, r)
	root, at := nodeNamed(t, doc, "fabric, achieved")
	require.Contains(t, doc.Scenes[0].Nodes, at)
	require.Equal(t, [3]float64{432100, 12, -5712300}, root.Translation)
	n, _ := nodeNamed(t, doc, "fabric cone")
	acc := doc.Accessors[doc.Meshes[*n.Mesh].Primitives[0].Attributes[gltf.POSITION]]
	position, err := modeler.ReadPosition(doc, acc, nil)
	require.NoError(t, err)
	for i, p := range position[:4] {
		want := upY(r.Form.Position[sheets(r)[0].node[i]])
		for k := range 3 {
			require.InDelta(t, want[k], root.Translation[k]+float64(p[k]), 1e-6)
		}
	}
}

// Shared buffers: a layer costs its colours only. The fabric with one layer of
// colour, lengths along the yarns and stresses at the vertices included, stays
// under 40 bytes a triangle, whether 16 bits do for an index or not; the whole
// file of 10,000 triangles, with six layers and all that is not fabric, under 80.
func TestGLBIsSmall(t *testing.T) {
	for _, n := range []int{71, 260} {
		r := sail(n)
		var b bytes.Buffer
		require.NoError(t, writeGLB(background, &b, r, Options{}))
		file := b.Len()
		var doc gltf.Document
		require.NoError(t, gltf.NewDecoder(&b).Decode(&doc))
		of := map[int]int{} // bytes of buffer views of the fabric in one layer
		positions := map[int]bool{}
		for _, m := range doc.Meshes {
			p := m.Primitives[0]
			if !strings.HasPrefix(m.Name, "fabric") {
				continue
			}
			positions[p.Attributes[gltf.POSITION]] = true
			if strings.HasSuffix(m.Name, ", achieved") || strings.HasSuffix(m.Name, ", plain") {
				for _, a := range append(slices.Collect(maps.Values(p.Attributes)), *p.Indices) {
					view := *doc.Accessors[a].BufferView
					of[view] = doc.BufferViews[view].ByteLength
				}
			}
		}
		require.Len(t, positions, 1)
		require.Len(t, of, 7)
		size := 0
		for _, l := range of {
			size += l
		}
		triangles := float64(len(r.Structure.Corners))
		t.Logf("%.0f triangles: %.1f bytes each for geometry and a layer, %.1f for the whole file", triangles, float64(size)/triangles, float64(file)/triangles)
		require.Less(t, float64(size)/triangles, 40.0)
		require.Less(t, float64(file)/triangles, 80.0)
		// Nothing is there twice.
		seen := map[string]bool{}
		for i, v := range doc.BufferViews {
			data := string(doc.Buffers[0].Data[v.ByteOffset : v.ByteOffset+v.ByteLength])
			if v.ByteLength > 4096 {
				require.False(t, seen[data], "buffer view %d is there twice", i)
			}
			seen[data] = true
		}
	}
}

func TestColoursOfLayers(t *testing.T) {
	// The middle is pale, both ends are dark and equally so.
	l := func(c rgb) float64 { return 0.2126*c[0] + 0.7152*c[1] + 0.0722*c[2] }
	require.Greater(t, l(deviationColour(0)), 0.8)
	require.InDelta(t, l(deviationColour(-1)), l(deviationColour(1)), 0.03)
	for t1 := -1.0; t1 < 0.99; t1 += 0.05 {
		a, b := l(deviationColour(t1)), l(deviationColour(t1+0.05))
		if t1 < -0.04 {
			require.Less(t, a, b)
		} else if t1 > 0.01 {
			require.Greater(t, a, b)
		}
	}
	// Blue below, orange above.
	lo, hi := deviationColour(-1), deviationColour(1)
	require.Greater(t, lo[2], lo[0])
	require.Greater(t, hi[0], hi[2])
	// The ends stay apart for dichromats. Simulation in linear RGB after
	// Viénot, Brettel & Mollon 1999, "Digital video colourmaps for checking the
	// legibility of displays by dichromats" (matrices from memory).
	protan := [3][3]float64{{0.11238, 0.88762, 0}, {0.11238, 0.88762, 0}, {0.00401, -0.00401, 1}}
	deutan := [3][3]float64{{0.29275, 0.70725, 0}, {0.29275, 0.70725, 0}, {-0.02234, 0.02234, 1}}
	for _, m := range [][3][3]float64{protan, deutan} {
		see := func(c rgb) rgb {
			var out rgb
			for i := range out {
				for k := range c {
					out[i] += m[i][k] * c[k]
				}
			}
			return out
		}
		for _, t1 := range []float64{0.25, 0.5, 1} {
			a, b := see(deviationColour(-t1)).srgb(), see(deviationColour(t1)).srgb()
			d := 0.0
			for i := range a {
				d += math.Pow(float64(a[i])-float64(b[i]), 2)
			}
			require.Greater(t, math.Sqrt(d), 50*math.Sqrt(t1))
		}
	}
	// Screen and linear are inverse.
	require.Equal(t, [3]uint8{12, 128, 250}, fromScreen(12, 128, 250).srgb())
}

func TestDeviationReachIsRoundAndCovers(t *testing.T) {
	list := func(v ...float64) func(i int) float64 { return func(i int) float64 { return v[i] } }
	require.Equal(t, 0.05, deviationReach(2, list(1, 1.001)))
	require.Equal(t, 0.2, deviationReach(2, list(1, 0.85)))
	require.Equal(t, 0.5, deviationReach(3, list(4, math.NaN(), math.Inf(1))))
}

func TestContourSpacingIsRound(t *testing.T) {
	for _, c := range []struct{ height, want float64 }{{4, 0.2}, {3, 0.2}, {1, 0.05}, {40, 2}, {0, 0}, {25, 2}, {45, 2.5}} {
		require.InDelta(t, c.want, contourSpacing(c.height), 1e-12, c.height)
	}
	require.Equal(t, []float64{-0.5, 0, 0.5}, levels(-1, 1, 0.5))
}

func BenchmarkGLB(b *testing.B) {
	r := sail(sweepN(100, 300, 700))
	b.ReportMetric(float64(len(r.Structure.Corners)), "triangles")
	for b.Loop() {
		var n counter
		if err := writeGLB(background, &n, r, Options{}); err != nil {
			b.Fatal(err)
		}
		b.SetBytes(int64(n))
	}
}
