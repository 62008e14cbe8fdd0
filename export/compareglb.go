package export

import (
	"context"
	"errors"
	"io"

	"anticlast/formfind/canopy"

	"github.com/qmuntal/gltf"
	"gonum.org/v1/gonum/spatial/r3"
)

// Colours of the two forms of a comparison.
var (
	first  = fromScreen(120, 150, 190)
	second = fromScreen(224, 160, 110)
)

// CompareGLB writes a scene with two forms, a in blue and b in orange. When they
// have the same topology a second scene holds the fabric as a morph target with
// an animation that goes from a to b and back.
func CompareGLB(ctx context.Context, w io.Writer, a, b *canopy.Result, _ Options) error {
	if a.Structure == nil || b.Structure == nil || a.Form == nil || b.Form == nil {
		return errors.New("comparing: there are not two shapes")
	}
	g := newScene(a)
	g.doc.Asset.Extras = map[string]any{"a": a.Title, "b": b.Title, "caution": canopy.Caution, "units": "m"}
	var roots []int
	for k, r := range []*canopy.Result{a, b} {
		if err := ctx.Err(); err != nil {
			return err
		}
		h := newScene(r) // for the sizes
		g.r, g.size, g.most = r, h.size, h.most
		name := string(rune('A' + k))
		roots = append(roots, g.sheetsIn(name, [2]rgb{first, second}[k], nil)...)
		roots = append(roots, g.root(name+": cables", g.cables())...)
		roots = append(roots, g.root(name+": masts", g.masts())...)
		roots = append(roots, g.root(name+": rings", g.rings())...)
		roots = append(roots, g.root(name+": supports", g.supports())...)
	}
	g.doc.Scenes = []*gltf.Scene{{Name: "both", Nodes: roots}}
	if sameTopology(a, b) && len(a.Structure.Corners) > 0 {
		g.r = a
		if moving := g.sheetsIn("A to B", second, b); len(moving) > 0 {
			g.doc.Scenes = append(g.doc.Scenes, &gltf.Scene{Name: "A to B", Nodes: moving})
			g.animate(moving[0])
		}
	}
	return g.write(ctx, w)
}

// sheetsIn appends the fabric in one colour, with a morph target towards the
// other form if there is one.
func (g *scene) sheetsIn(name string, c rgb, to *canopy.Result) []int {
	r := g.r
	paint := g.material("fabric "+name, c, 0.85, false)
	var toMeshes []sheetMesh
	if to != nil {
		toMeshes = sheets(to)
	}
	var children []int
	for i, m := range sheets(r) {
		if len(m.corners) == 0 {
			continue
		}
		p := &gltf.Primitive{
			Attributes: gltf.PrimitiveAttributes{
				gltf.POSITION: g.positions(len(m.node), func(k int) r3.Vec { return r.Form.Position[m.node[k]] }),
				gltf.NORMAL:   g.vectors(len(m.node), func(k int) r3.Vec { return m.normal[k] }),
			},
			Indices:  gltf.Index(g.indices(3*len(m.corners), len(m.node), func(k int) int32 { return m.corners[k/3][k%3] })),
			Material: gltf.Index(paint),
		}
		what := name + ": fabric " + r.Structure.Fabrics[i].Name
		mesh := g.mesh(what, p)
		// Vertices come in the order of first use, which is the same in both
		// forms unless triangles have lost their area in one of them.
		if to != nil && len(toMeshes[i].node) == len(m.node) {
			other := toMeshes[i]
			p.Targets = []gltf.PrimitiveAttributes{{
				gltf.POSITION: g.positions(len(m.node), func(k int) r3.Vec {
					return r3.Add(g.origin, r3.Sub(to.Form.Position[m.node[k]], r.Form.Position[m.node[k]]))
				}),
				gltf.NORMAL: g.vectors(len(m.node), func(k int) r3.Vec { return r3.Sub(other.normal[k], m.normal[k]) }),
			}}
			g.doc.Meshes[mesh].Weights = []float64{0}
		}
		children = append(children, g.node(&gltf.Node{Name: what, Mesh: gltf.Index(mesh)}))
	}
	return g.root(name+": fabric", children)
}

// animate lets the weights of the morph targets under a root go from 0 to 1 and
// back.
func (g *scene) animate(root int) {
	times := []float64{0, 2, 3, 5, 6}
	weights := []float64{0, 1, 1, 0, 0}
	input, output := -1, -1
	anim := &gltf.Animation{Name: "A to B and back"}
	for _, child := range g.doc.Nodes[root].Children {
		if len(g.doc.Meshes[*g.doc.Nodes[child].Mesh].Weights) == 0 {
			continue
		}
		if input < 0 {
			input, output = g.track(times), g.track(weights)
			g.doc.Accessors[input].Min, g.doc.Accessors[input].Max = []float64{times[0]}, []float64{times[len(times)-1]}
			anim.Samplers = []*gltf.AnimationSampler{{Input: input, Output: output, Interpolation: gltf.InterpolationLinear}}
		}
		anim.Channels = append(anim.Channels, &gltf.AnimationChannel{Sampler: 0, Target: gltf.AnimationChannelTarget{Node: gltf.Index(child), Path: gltf.TRSWeights}})
	}
	if input >= 0 {
		g.doc.Animations = append(g.doc.Animations, anim)
	}
}

// track appends an accessor of numbers of an animation.
func (g *scene) track(v []float64) int {
	view := g.floats(gltf.TargetNone, len(v), 1, func() func(i int, out []float64) {
		return func(i int, out []float64) { out[0] = v[i] }
	})
	return g.accessor(&gltf.Accessor{BufferView: gltf.Index(view), ComponentType: gltf.ComponentFloat, Type: gltf.AccessorScalar, Count: len(v)})
}
