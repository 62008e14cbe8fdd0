package export

import (
	"bytes"
	"context"
	"crypto/sha256"
	"encoding/binary"
	"fmt"
	"io"
	"math"
	"slices"

	"anticlast/formfind/canopy"
	"anticlast/formfind/surface"

	"github.com/qmuntal/gltf"
	"gonum.org/v1/gonum/spatial/r3"
)

// writeGLB writes a binary glTF 2.0 scene (Khronos glTF 2.0 Specification).
//
// glTF has y up, so (x, y, z) becomes (x, z, −y), a rotation. Positions are
// relative to a local origin where coordinates are large against the model, for
// they are single precision; the root nodes carry it.
//
// Values in colour must not be shaded or they would be read wrongly, so the
// fabric is unlit (KHR_materials_unlit) and contour lines give it relief. Each
// layer of colour is a scene of its own over the same buffers; one more scene
// shows plain fabric in light.
func writeGLB(ctx context.Context, w io.Writer, r *canopy.Result, o Options) error {
	g := newScene(r)
	structure := g.structure()
	if o.Ground {
		structure = append(structure, g.ground()...)
	}
	if err := ctx.Err(); err != nil {
		return err
	}
	contours := g.contours()
	var layers []glbLayer
	for _, l := range g.fabric() {
		layers = append(layers, l)
		if err := ctx.Err(); err != nil {
			return err
		}
	}
	plain := -1
	for _, l := range layers {
		roots := append([]int{l.root}, structure...)
		if l.name != "plain" {
			roots = append(append(roots, contours...), l.legend...)
		} else {
			plain = l.root
			roots = append(roots, g.yarns()...)
		}
		g.doc.Scenes = append(g.doc.Scenes, &gltf.Scene{Name: l.name, Nodes: roots, Extras: l.extras})
	}
	if len(layers) == 0 {
		g.doc.Scenes = []*gltf.Scene{{Name: "structure", Nodes: structure}}
	}
	if arrows := g.reactions(); len(arrows) > 0 {
		roots := append(slices.Clone(structure), arrows...)
		if plain >= 0 {
			roots = append(roots, plain)
		}
		g.doc.Scenes = append(g.doc.Scenes, &gltf.Scene{Name: "reactions", Nodes: roots,
			Extras: map[string]any{"layer": "reactions: forces of the supports on the structure", "caution": canopy.Caution}})
	}
	return g.write(ctx, w)
}

// write writes the document and its buffer.
func (g *scene) write(ctx context.Context, w io.Writer) error {
	if g.length > 0 {
		g.doc.Buffers = []*gltf.Buffer{{ByteLength: g.length}}
	}
	g.dropUnusedMaterials()
	if int64(g.length) > math.MaxUint32-1<<24 {
		return fmt.Errorf("form.glb: %d bytes are more than a GLB can hold", g.length)
	}
	var description bytes.Buffer
	e := gltf.NewEncoder(&description)
	e.AsBinary = false
	if err := e.Encode(g.doc); err != nil {
		return err
	}
	for description.Len()%4 != 0 {
		description.WriteByte(' ')
	}
	// glTF 2.0, section 4.4: a header of three numbers, then chunks of a length,
	// a type and their bytes.
	t := newText(ctx, w)
	number := func(v int) { t.b = binary.LittleEndian.AppendUint32(t.b, uint32(v)) }
	total := 12 + 8 + description.Len()
	if g.length > 0 {
		total += 8 + g.length
	}
	t.str("glTF")
	number(2)
	number(total)
	number(description.Len())
	t.str("JSON")
	t.flush()
	t.b = append(t.b, description.Bytes()...)
	if g.length > 0 {
		number(g.length)
		t.str("BIN\x00")
	}
	for _, c := range g.chunks {
		t.flush()
		if t.err != nil {
			break
		}
		c(t)
	}
	return t.close()
}

// glbLayer is the root node of a way to show the fabric.
type glbLayer struct {
	name   string
	root   int
	legend []int
	extras map[string]any
}

// scene gathers a glTF document and how to write its binary buffer. The numbers
// in the buffer are as many times as large as the model: first only their places
// are laid out, and what fills them is made while it is written.
type scene struct {
	r      *canopy.Result
	doc    *gltf.Document
	length int           // of the buffer in bytes
	chunks []func(*text) // write the buffer, part by part
	origin r3.Vec        // of the positions in the buffers
	size   float64       // of the model
	most   float64       // largest size of a member force
	unlit  map[string]int
	lit    map[string]int
	// corners are the accessors of indices of solids by what is in them.
	corners map[string]int
}

// manyMembers is the number of members without a chain from which on they are
// drawn as lines; tubes would make the file unwieldy.
const manyMembers = 20000

func newScene(r *canopy.Result) *scene {
	lo, hi := canopy.Bounds(r.Form.Position)
	g := &scene{r: r, size: r3.Norm(r3.Sub(hi, lo)), lit: map[string]int{}, unlit: map[string]int{}, corners: map[string]int{}}
	if g.size == 0 {
		g.size = 1
	}
	for _, t := range r.Form.Force {
		g.most = max(g.most, math.Abs(t))
	}
	g.origin = localOrigin(r)
	g.doc = &gltf.Document{
		Asset: gltf.Asset{Version: "2.0", Generator: oneLine(r.Program.Name + " " + r.Program.Version),
			Extras: map[string]any{
				"title": r.Title, "caution": canopy.Caution, "model": r.File, "digest": r.Digest,
				"trusted": r.Audit.Trusted, "units": "m, N, N/m, degrees where said; tension positive",
			}},
		Scene: gltf.Index(0),
	}
	return g
}

// node appends a node.
func (g *scene) node(n *gltf.Node) int {
	g.doc.Nodes = append(g.doc.Nodes, n)
	return len(g.doc.Nodes) - 1
}

// root appends a root node that carries the local origin, nil children are no
// root.
func (g *scene) root(name string, children []int) []int {
	if len(children) == 0 {
		return nil
	}
	return []int{g.node(&gltf.Node{Name: name, Children: children, Translation: upY(g.origin)})}
}

// upY turns a vector into glTF's axes.
func upY(v r3.Vec) [3]float64 { return [3]float64{v.X, v.Z, -v.Y} }

// view appends a buffer view over n elements of the given size in bytes, each
// appended by what start returns; the buffer stays aligned to four bytes.
func (g *scene) view(target gltf.Target, stride, n, size int, start func() func(b []byte, i int) []byte) int {
	v := &gltf.BufferView{ByteOffset: g.length, ByteLength: n * size, ByteStride: stride, Target: target}
	g.doc.BufferViews = append(g.doc.BufferViews, v)
	padding := -n * size & 3
	g.length += n*size + padding
	g.chunks = append(g.chunks, func(t *text) {
		put := start()
		for i := range n {
			t.b = put(t.b, i)
			if !t.more() {
				return
			}
		}
		for range padding {
			t.b = append(t.b, 0)
		}
	})
	return len(g.doc.BufferViews) - 1
}

// floats is a view over numbers in single precision, per from each of n elements.
func (g *scene) floats(target gltf.Target, n, per int, start func() func(i int, out []float64)) int {
	return g.view(target, 0, n, 4*per, func() func(b []byte, i int) []byte {
		put, out := start(), make([]float64, per)
		return func(b []byte, i int) []byte {
			put(i, out)
			for _, v := range out {
				b = appendFloat32(b, v)
			}
			return b
		}
	})
}

func (g *scene) accessor(a *gltf.Accessor) int {
	g.doc.Accessors = append(g.doc.Accessors, a)
	return len(g.doc.Accessors) - 1
}

// positions appends an accessor of n positions relative to the origin.
func (g *scene) positions(n int, at func(i int) r3.Vec) int {
	lo := [3]float32{math.MaxFloat32, math.MaxFloat32, math.MaxFloat32}
	hi := [3]float32{-math.MaxFloat32, -math.MaxFloat32, -math.MaxFloat32}
	origin := g.origin
	for i := range n {
		for k, c := range upY(r3.Sub(at(i), origin)) {
			f := float32(c)
			lo[k], hi[k] = min(lo[k], f), max(hi[k], f)
		}
	}
	a := g.vectors(n, func(i int) r3.Vec { return r3.Sub(at(i), origin) })
	// The bounds must be those of the rounded numbers.
	wide := func(v [3]float32) []float64 { return []float64{float64(v[0]), float64(v[1]), float64(v[2])} }
	g.doc.Accessors[a].Min, g.doc.Accessors[a].Max = wide(lo), wide(hi)
	return a
}

// vectors appends an accessor of n vectors in glTF's axes.
func (g *scene) vectors(n int, at func(i int) r3.Vec) int {
	view := g.floats(gltf.TargetArrayBuffer, n, 3, func() func(i int, out []float64) {
		return func(i int, out []float64) {
			v := upY(at(i))
			copy(out, v[:])
		}
	})
	return g.accessor(&gltf.Accessor{BufferView: gltf.Index(view), ComponentType: gltf.ComponentFloat, Type: gltf.AccessorVec3, Count: n})
}

func appendFloat32(b []byte, v float64) []byte {
	return binary.LittleEndian.AppendUint32(b, math.Float32bits(float32(v)))
}

// colours appends an accessor of linear colours in 16 bits, in which dark
// shades stay apart.
func (g *scene) colours(n int, start func() func(i int) rgb) int {
	view := g.view(gltf.TargetArrayBuffer, 8, n, 8, func() func(b []byte, i int) []byte {
		at := start()
		return func(b []byte, i int) []byte {
			for _, c := range at(i) {
				b = binary.LittleEndian.AppendUint16(b, uint16(math.Round(65535*c)))
			}
			return binary.LittleEndian.AppendUint16(b, 65535)
		}
	})
	return g.accessor(&gltf.Accessor{BufferView: gltf.Index(view), ComponentType: gltf.ComponentUshort, Normalized: true, Type: gltf.AccessorVec4, Count: n})
}

// indices appends an accessor of n indices below vertices.
func (g *scene) indices(n, vertices int, at func(i int) int32) int {
	kind, size := gltf.ComponentUint, 4
	if vertices < math.MaxUint16 {
		kind, size = gltf.ComponentUshort, 2
	}
	view := g.view(gltf.TargetElementArrayBuffer, 0, n, size, func() func(b []byte, i int) []byte {
		if size == 2 {
			return func(b []byte, i int) []byte { return binary.LittleEndian.AppendUint16(b, uint16(at(i))) }
		}
		return func(b []byte, i int) []byte { return binary.LittleEndian.AppendUint32(b, uint32(at(i))) }
	})
	return g.accessor(&gltf.Accessor{BufferView: gltf.Index(view), ComponentType: kind, Type: gltf.AccessorScalar, Count: n})
}

// sharedIndices appends an accessor of the corners of triangles, unless there is
// one already: tubes of as many pieces have the same ones.
func (g *scene) sharedIndices(corners [][3]int32, vertices int) int {
	h := sha256.New()
	var b []byte
	for _, c := range corners {
		b = b[:0]
		for _, v := range c {
			b = binary.LittleEndian.AppendUint32(b, uint32(v))
		}
		h.Write(b)
	}
	key := fmt.Sprintf("%d %x", vertices, h.Sum(nil))
	a, ok := g.corners[key]
	if !ok {
		a = g.indices(3*len(corners), vertices, func(i int) int32 { return corners[i/3][i%3] })
		g.corners[key] = a
	}
	return a
}

// material returns the number of a material, made at its first use.
func (g *scene) material(name string, c rgb, roughness float64, unlit bool) int {
	table := g.lit
	if unlit {
		table = g.unlit
	}
	if i, ok := table[name]; ok {
		return i
	}
	m := &gltf.Material{Name: name, DoubleSided: true, PBRMetallicRoughness: &gltf.PBRMetallicRoughness{
		BaseColorFactor: &[4]float64{short(c[0]), short(c[1]), short(c[2]), 1},
		MetallicFactor:  gltf.Float(0), RoughnessFactor: gltf.Float(roughness)}}
	if unlit {
		const unlitName = "KHR_materials_unlit"
		m.Extensions = gltf.Extensions{unlitName: struct{}{}}
		g.doc.ExtensionsUsed = []string{unlitName}
	}
	g.doc.Materials = append(g.doc.Materials, m)
	table[name] = len(g.doc.Materials) - 1
	return table[name]
}

// dropUnusedMaterials removes materials of which nothing came to be made.
func (g *scene) dropUnusedMaterials() {
	number := make([]int, len(g.doc.Materials))
	for _, m := range g.doc.Meshes {
		for _, p := range m.Primitives {
			number[*p.Material] = 1
		}
	}
	var kept []*gltf.Material
	for i, used := range number {
		if used != 0 {
			number[i] = len(kept)
			kept = append(kept, g.doc.Materials[i])
		}
	}
	for _, m := range g.doc.Meshes {
		for _, p := range m.Primitives {
			p.Material = gltf.Index(number[*p.Material])
		}
	}
	g.doc.Materials = kept
}

// short drops digits that no eye sees.
func short(v float64) float64 { return math.Round(v*1e4) / 1e4 }

func (g *scene) mesh(name string, p *gltf.Primitive) int {
	g.doc.Meshes = append(g.doc.Meshes, &gltf.Mesh{Name: name, Primitives: []*gltf.Primitive{p}})
	return len(g.doc.Meshes) - 1
}

// solid appends a mesh of a solid; none when it has no triangle.
func (g *scene) solid(name string, m *solid, material int) (int, bool) {
	// What collapses in single precision is left out: a mesh should have no
	// degenerate triangle.
	single := func(v r3.Vec) [3]float32 {
		u := upY(r3.Sub(v, g.origin))
		return [3]float32{float32(u[0]), float32(u[1]), float32(u[2])}
	}
	var kept [][3]int32
	for _, c := range m.corners {
		a, b, d := single(m.position[c[0]]), single(m.position[c[1]]), single(m.position[c[2]])
		if a != b && b != d && d != a {
			kept = append(kept, c)
		}
	}
	if len(kept) == 0 {
		return 0, false
	}
	p := &gltf.Primitive{
		Attributes: gltf.PrimitiveAttributes{
			gltf.POSITION: g.positions(len(m.position), func(i int) r3.Vec { return m.position[i] }),
			gltf.NORMAL:   g.vectors(len(m.normal), func(i int) r3.Vec { return m.normal[i] }),
		},
		Indices:  gltf.Index(g.sharedIndices(kept, len(m.position))),
		Material: gltf.Index(material),
	}
	return g.mesh(name, p), true
}

// lines appends a mesh of separate lines between pairs of positions.
func (g *scene) lines(name string, position []r3.Vec, pairs [][2]int32, material int) (int, bool) {
	if len(pairs) == 0 {
		return 0, false
	}
	return g.mesh(name, &gltf.Primitive{
		Attributes: gltf.PrimitiveAttributes{gltf.POSITION: g.positions(len(position), func(i int) r3.Vec { return position[i] })},
		Indices:    gltf.Index(g.indices(2*len(pairs), len(position), func(i int) int32 { return pairs[i/2][i%2] })),
		Material:   gltf.Index(material),
		Mode:       gltf.PrimitiveLines,
	}), true
}

// fabric appends the fabric in all its layers, the default first.
func (g *scene) fabric() []glbLayer {
	r := g.r
	meshes := sheets(r)
	type shared struct{ position, normal, index, warp, weft, yarn int }
	geometry := make([]shared, len(meshes))
	empty := true
	for i := range meshes {
		m := &meshes[i]
		if len(m.corners) == 0 {
			continue
		}
		empty = false
		along, across := m.weave(r)
		geometry[i] = shared{
			g.positions(len(m.node), func(k int) r3.Vec { return r.Form.Position[m.node[k]] }),
			g.vectors(len(m.node), func(k int) r3.Vec { return m.normal[k] }),
			g.indices(3*len(m.corners), len(m.node), func(k int) int32 { return m.corners[k/3][k%3] }),
			g.valuesOf(m, func(t int) float64 { return r.Form.Stress[t].Warp }),
			g.valuesOf(m, func(t int) float64 { return r.Form.Stress[t].Weft }),
			g.textureCoordinates(along, across),
		}
	}
	if empty {
		return nil
	}
	var out []glbLayer
	show := func(name string, extras map[string]any, material int, colour func(m *sheetMesh) int) {
		var children []int
		for i := range meshes {
			m := &meshes[i]
			if len(m.corners) == 0 {
				continue
			}
			p := &gltf.Primitive{
				Attributes: gltf.PrimitiveAttributes{gltf.POSITION: geometry[i].position, gltf.NORMAL: geometry[i].normal,
					"_WARP_STRESS": geometry[i].warp, "_WEFT_STRESS": geometry[i].weft},
				Indices: gltf.Index(geometry[i].index), Material: gltf.Index(material),
			}
			if colour != nil {
				p.Attributes[gltf.COLOR_0] = colour(m)
			} else {
				p.Attributes[gltf.TEXCOORD_0] = geometry[i].yarn
			}
			what := "fabric " + r.Structure.Fabrics[i].Name
			n := &gltf.Node{Name: what, Mesh: gltf.Index(g.mesh(what+", "+name, p))}
			n.Extras = g.fabricExtras(i, m)
			children = append(children, g.node(n))
		}
		out = append(out, glbLayer{name: name, root: g.root("fabric, "+name, children)[0], extras: extras})
	}
	white := rgb{1, 1, 1}
	for _, l := range layers(r) {
		extras := map[string]any{"layer": l.title, "caution": canopy.Caution}
		if l.centred {
			extras["scale"] = map[string]any{"blue": rounded(1 - l.reach), "neutral": 1.0, "orange": rounded(1 + l.reach)}
		} else {
			extras["scale"] = map[string]any{"pale": 0.0, "dark": l.reach}
		}
		show(l.name, extras, g.material("fabric values", white, 1, true), func(m *sheetMesh) int {
			return g.colours(len(m.node), func() func(k int) rgb {
				v := m.atVertices(l.value)
				return func(k int) rgb { return l.colour(v[k]) }
			})
		})
		out[len(out)-1].legend = g.legend(&l)
	}
	show("plain", map[string]any{
		"layer":   "fabric in light, without values",
		"yarn":    "TEXCOORD_0 is the length along warp and weft in m; the texture has a line a metre, strong ones along the warp",
		"caution": canopy.Caution,
	}, g.woven(), nil)
	return out
}

// valuesOf appends an accessor of values of triangles at the vertices of a sheet.
func (g *scene) valuesOf(m *sheetMesh, ofTriangle func(t int) float64) int {
	return g.scalars(len(m.node), func() func(i int) float64 {
		v := m.atVertices(ofTriangle)
		return func(i int) float64 { return v[i] }
	})
}

func (g *scene) fabricExtras(i int, m *sheetMesh) map[string]any {
	r := g.r
	area := 0.0
	for _, a := range m.area {
		area += a
	}
	lo, hi := specifiedRange(r.Structure)
	extras := map[string]any{"fabric": r.Structure.Fabrics[i].Name, "area_m2": rounded(area), "triangles": len(m.corners)}
	for k, name := range []string{"warp", "weft"} {
		extras["specified_"+name+"_N_per_m"] = []float64{rounded(lo[i][k]), rounded(hi[i][k])}
		low, high := math.Inf(1), math.Inf(-1)
		for _, t := range m.triangle {
			v := [2]float64{r.Form.Stress[t].Warp, r.Form.Stress[t].Weft}[k]
			low, high = min(low, v), max(high, v)
		}
		extras["achieved_"+name+"_N_per_m"] = []float64{rounded(low), rounded(high)}
	}
	return extras
}

// rounded keeps nine significant digits.
func rounded(v float64) float64 {
	if v == 0 || math.IsInf(v, 0) || math.IsNaN(v) {
		return 0
	}
	scale := math.Pow(10, 8-math.Floor(math.Log10(math.Abs(v))))
	return math.Round(v*scale) / scale
}

// contours appends lines of equal height on the fabric at a round spacing, as a
// root node.
func (g *scene) contours() []int {
	r := g.r
	if len(r.Structure.Corners) == 0 {
		return nil
	}
	lo, hi := heights(r)
	spacing := contourSpacing(hi - lo)
	if spacing == 0 {
		return nil
	}
	var position []r3.Vec
	var pairs [][2]int32
	for _, c := range surface.Contours(r.Form.Position, r.Structure.Corners, levels(lo, hi, spacing)) {
		base := int32(len(position))
		position = append(position, c.Points...)
		for k := 1; k < len(c.Points); k++ {
			pairs = append(pairs, [2]int32{base + int32(k) - 1, base + int32(k)})
		}
		if c.Closed && len(c.Points) > 2 {
			pairs = append(pairs, [2]int32{base + int32(len(c.Points)) - 1, base})
		}
	}
	mesh, ok := g.lines("contours", position, pairs, g.material("contour", fromScreen(110, 100, 90), 1, true))
	if !ok {
		return nil
	}
	n := g.node(&gltf.Node{Name: fmt.Sprintf("contours every %g m", spacing), Mesh: gltf.Index(mesh),
		Extras: map[string]any{"spacing_m": spacing}})
	return g.root("contours", []int{n})
}

// heights is the range of z of the fabric.
func heights(r *canopy.Result) (lo, hi float64) {
	lo, hi = math.Inf(1), math.Inf(-1)
	for _, c := range r.Structure.Corners {
		for _, v := range c {
			z := r.Form.Position[v].Z
			lo, hi = min(lo, z), max(hi, z)
		}
	}
	return lo, hi
}

// contourSpacing is a round number that divides a height into 8 to 20 parts, 0
// for what is flat.
func contourSpacing(height float64) float64 {
	if height <= 1e-6 {
		return 0
	}
	unit := math.Pow(10, math.Floor(math.Log10(height/20)))
	for _, k := range []float64{1, 2, 2.5, 5, 10} {
		if height/(k*unit) <= 20 {
			return k * unit
		}
	}
	return 10 * unit
}

// levels are the multiples of spacing strictly between lo and hi.
func levels(lo, hi, spacing float64) []float64 {
	var out []float64
	for k := math.Floor(lo/spacing) + 1; k*spacing < hi; k++ {
		if k*spacing > lo {
			out = append(out, k*spacing)
		}
	}
	return out
}
