package export

import (
	"bytes"
	"image/png"
	"math"
	"testing"

	"anticlast/formfind/canopy"

	"github.com/qmuntal/gltf"
	"github.com/qmuntal/gltf/modeler"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

// barrel is a sheet bent over a prism of n flat strips, which unrolls without
// strain, with its warp askew to the axis. The lengths along the yarns of the
// unrolled sheet are known: they are returned for each node of the sheet.
func barrel(n int, askew float64) (r *canopy.Result, warp, weft []float64) {
	r = sail(n)
	s, f := r.Structure, r.Form
	const radius = 4.0
	step := 2.5 / float64(n)
	chord := 2 * radius * math.Sin(step/2)
	flat := make([]r3.Vec, (n+1)*(n+1))
	for i := range n + 1 {
		for j := range n + 1 {
			k, a := i*(n+1)+j, step*float64(i)-1.25
			y := 5 * float64(j) / float64(n)
			f.Position[k] = r3.Vec{X: radius * math.Sin(a), Y: y, Z: radius * math.Cos(a)}
			flat[k] = r3.Vec{X: chord * float64(i), Y: y}
		}
	}
	c, d := math.Cos(askew), math.Sin(askew)
	for t, v := range s.Corners {
		// One flat strip: its direction around the prism.
		i := min(int(v[0]), int(v[1]), int(v[2])) / (n + 1)
		around := r3.Unit(r3.Sub(f.Position[(i+1)*(n+1)], f.Position[i*(n+1)]))
		f.Warp[t] = r3.Add(r3.Scale(c, around), r3.Vec{Y: d})
	}
	for _, p := range flat {
		warp, weft = append(warp, c*p.X+d*p.Y), append(weft, c*p.Y-d*p.X)
	}
	return r, fromLeast(warp), fromLeast(weft)
}

func texture(t *testing.T, r *canopy.Result) (doc *gltf.Document, p *gltf.Primitive, at [][2]float32, index []uint32) {
	t.Helper()
	doc = open(t, r)
	for _, m := range doc.Meshes {
		if a, ok := m.Primitives[0].Attributes[gltf.TEXCOORD_0]; ok {
			p = m.Primitives[0]
			var err error
			at, err = modeler.ReadTextureCoord(doc, doc.Accessors[a], nil)
			require.NoError(t, err)
			index, err = modeler.ReadIndices(doc, doc.Accessors[*p.Indices], nil)
			require.NoError(t, err)
		}
	}
	require.NotNil(t, p, "a mesh with texture coordinates")
	return doc, p, at, index
}

// Texture coordinates are lengths in m along the yarns: on a surface that
// unrolls they are those of the unrolled sheet.
func TestTextureCoordinatesAreLengthsAlongTheYarns(t *testing.T) {
	r, warp, weft := barrel(14, 0.5)
	doc, p, at, _ := texture(t, r)
	nodes := sheets(r)[0].node
	require.Len(t, at, len(nodes))
	for i, v := range nodes {
		require.InDelta(t, warp[v], at[i][0], 2e-3, "warp at node %d", v)
		require.InDelta(t, weft[v], at[i][1], 2e-3, "weft at node %d", v)
	}
	// The picture of a square metre is a PNG whose sides are powers of two.
	m := doc.Materials[*p.Material]
	image := doc.Images[*doc.Textures[m.PBRMetallicRoughness.BaseColorTexture.Index].Source]
	raw, err := modeler.ReadBufferView(doc, doc.BufferViews[*image.BufferView])
	require.NoError(t, err)
	require.Less(t, len(raw), 600)
	picture, err := png.Decode(bytes.NewReader(raw))
	require.NoError(t, err)
	require.Equal(t, 64, picture.Bounds().Dx())
	require.Equal(t, 64, picture.Bounds().Dy())
}

// On a surface that does not unroll the gradients are near to unit vectors along
// the yarns.
func TestTextureFollowsTheYarnsOnASaddle(t *testing.T) {
	r := sail(20)
	for i := range r.Form.Warp { // into the triangles
		n, _ := triangleNormal(r, i)
		w := r.Form.Warp[i]
		r.Form.Warp[i] = r3.Unit(r3.Sub(w, r3.Scale(r3.Dot(w, n), n)))
	}
	m := sheets(r)[0]
	u, v := m.weave(r)
	squares, area := 0.0, 0.0
	for k, t := range m.triangle {
		n, _ := triangleNormal(r, int(t))
		w := r.Form.Warp[t]
		squares += m.area[k] * (r3.Norm2(r3.Sub(m.gradient(r, k, u), w)) + r3.Norm2(r3.Sub(m.gradient(r, k, v), r3.Cross(n, w))))
		area += m.area[k]
	}
	require.Less(t, math.Sqrt(squares/area), 0.08)
}

// Around a ring the radial yarns fan out: lines of equal weft coordinate are
// meridians, no triangle crosses the jump, and the two vertices at a node of the
// cut agree in all but the length around.
func TestTextureAroundARing(t *testing.T) {
	for name, radial := range map[string]bool{"radial warp": true, "radial weft": false} {
		t.Run(name, func(t *testing.T) {
			r := cone(24)
			s, f := r.Structure, r.Form
			ring := s.Rings[0].Nodes
			centre := r3.Vec{}
			for _, v := range ring {
				centre = r3.Add(centre, r3.Scale(1/float64(len(ring)), f.Position[v]))
			}
			for i, c := range s.Corners {
				n, _ := triangleNormal(r, i)
				d := r3.Sub(r3.Scale(1./3, r3.Add(r3.Add(f.Position[c[0]], f.Position[c[1]]), f.Position[c[2]])), centre)
				f.Warp[i] = r3.Unit(r3.Cross(r3.Vec{Z: 1}, d))
				if radial {
					f.Warp[i] = r3.Cross(f.Warp[i], n)
				}
			}
			m := sheets(r)[0]
			whole := len(m.node)
			u, v := m.weave(r)
			meridian, around := u, v
			if !radial {
				meridian, around = v, u
			}
			require.Len(t, m.node, whole+len(m.twin))
			require.NotEmpty(t, m.twin)
			for i, c := range m.twin {
				require.Equal(t, m.node[c], m.node[whole+i])
				require.Equal(t, meridian[c], meridian[whole+i])
			}
			most := 0.0
			for k, c := range m.corners {
				span := max(around[c[0]], around[c[1]], around[c[2]]) - min(around[c[0]], around[c[1]], around[c[2]])
				most = max(most, span)
				w := f.Warp[m.triangle[k]]
				n, _ := triangleNormal(r, int(m.triangle[k]))
				require.Greater(t, r3.Dot(r3.Unit(m.gradient(r, k, u)), w), 0.9)
				require.Greater(t, r3.Dot(r3.Unit(m.gradient(r, k, v)), r3.Cross(n, w)), 0.9)
			}
			total := 0.0
			for _, a := range around {
				total = max(total, a)
			}
			require.InDelta(t, total/24, most, total*0.02)
			// All layers have the same vertices; values do not jump at the cut.
			flat := m.atVertices(func(t int) float64 { return float64(t) })
			for i, c := range m.twin {
				require.Equal(t, flat[c], flat[whole+i])
			}
		})
	}
}
