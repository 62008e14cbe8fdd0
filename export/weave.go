package export

import (
	"bytes"
	"image"
	"image/color"
	"image/png"
	"math"

	"anticlast/formfind/canopy"

	"github.com/qmuntal/gltf"
	"gonum.org/v1/gonum/spatial/r3"
)

// weave returns, for each vertex of a sheet, the length in m along the warp and
// along the weft, each from 0 at its least vertex.
//
// On a curved surface there is no such pair of lengths: what is found has the
// gradients nearest to the unit vectors along the yarns, in the mean square over
// the area. Around a ring whose warp or weft is radial the yarns fan out, and
// the other length is the angle times the mean radius; there the sheet is cut
// open along one meridian, where the length around would jump.
func (m *sheetMesh) weave(r *canopy.Result) (warp, weft []float64) {
	along := func(k int) r3.Vec { return r.Form.Warp[m.triangle[k]] }
	across := func(k int) r3.Vec {
		n, _ := triangleNormal(r, int(m.triangle[k]))
		return r3.Cross(n, along(k))
	}
	ring, radialWarp, found := m.fan(r, along)
	if !found {
		return fromLeast(m.potential(r, along)), fromLeast(m.potential(r, across))
	}
	meridian := along
	if !radialWarp {
		meridian = across
	}
	// The length along meridians does not jump: it is found before the cut.
	length := fromLeast(m.potential(r, meridian))
	around := m.cut(ring.angles(r, m))
	for _, c := range m.twin {
		length = append(length, length[c])
	}
	radius, total := 0.0, 0.0
	for k, c := range m.corners {
		for _, v := range c {
			_, d := ring.polar(r.Form.Position[m.node[v]])
			radius += m.area[k] * d
			total += m.area[k]
		}
	}
	for i := range around {
		around[i] *= radius / total
	}
	fromLeast(around)
	// Weft is normal × warp: the length must grow that way.
	other, sign := across, 0.0
	if !radialWarp {
		other = along
	}
	for k := range m.corners {
		sign += m.area[k] * r3.Dot(other(k), m.gradient(r, k, around))
	}
	if sign < 0 {
		for i := range around {
			around[i] = -around[i]
		}
		fromLeast(around)
	}
	if radialWarp {
		return length, around
	}
	return around, length
}

// axis is that of a ring, with two directions across it.
type axis struct{ centre, x, y r3.Vec }

// polar returns angle and distance of a point about the axis.
func (a *axis) polar(p r3.Vec) (angle, distance float64) {
	d := r3.Sub(p, a.centre)
	x, y := r3.Dot(d, a.x), r3.Dot(d, a.y)
	return math.Atan2(y, x), math.Hypot(x, y)
}

func (a *axis) angles(r *canopy.Result, m *sheetMesh) []float64 {
	out := make([]float64, len(m.node))
	for i, v := range m.node {
		out[i], _ = a.polar(r.Form.Position[v])
	}
	return out
}

// fan looks for a ring in the sheet towards which its warp or weft runs.
func (m *sheetMesh) fan(r *canopy.Result, along func(k int) r3.Vec) (ring axis, radialWarp, found bool) {
	for i := range r.Structure.Rings {
		nodes := r.Structure.Rings[i].Nodes
		if len(nodes) < 3 {
			continue
		}
		inSheet := make(map[int32]bool, len(nodes))
		for _, v := range nodes {
			inSheet[v] = true
		}
		here := 0
		for _, v := range m.node {
			if inSheet[v] {
				here++
			}
		}
		if here < len(inSheet) {
			continue
		}
		a := axis{}
		for _, v := range nodes {
			a.centre = r3.Add(a.centre, r3.Scale(1/float64(len(nodes)), r.Form.Position[v]))
		}
		var normal r3.Vec
		for k, v := range nodes {
			w := nodes[(k+1)%len(nodes)]
			normal = r3.Add(normal, r3.Cross(r3.Sub(r.Form.Position[v], a.centre), r3.Sub(r.Form.Position[w], a.centre)))
		}
		if r3.Norm(normal) == 0 {
			continue
		}
		normal = r3.Unit(normal)
		a.x = r3.Unit(perpendicular(normal))
		a.y = r3.Cross(normal, a.x)
		// Mean square of the component of the warp around the axis: 1/2 where
		// the warp runs in one direction, 0 or 1 where it fans out or goes around.
		around, total := 0.0, 0.0
		for k, c := range m.corners {
			p := r3.Scale(1./3, r3.Add(r3.Add(r.Form.Position[m.node[c[0]]], r.Form.Position[m.node[c[1]]]), r.Form.Position[m.node[c[2]]]))
			t := r3.Cross(normal, r3.Sub(p, a.centre))
			if l := r3.Norm(t); l > 0 {
				around += m.area[k] * math.Pow(r3.Dot(t, along(k))/l, 2)
				total += m.area[k]
			}
		}
		if total > 0 && (around < 0.1*total || around > 0.9*total) {
			return a, around < 0.1*total, true
		}
	}
	return axis{}, false, false
}

// cut opens the sheet where an angle jumps from π to −π: triangles across the
// jump get copies of their vertices on its far side. It returns the angle of
// every vertex, copies included, without a jump in any triangle.
func (m *sheetMesh) cut(angle []float64) []float64 {
	copies := map[int32]int32{}
	for k, c := range m.corners {
		lo := min(angle[c[0]], angle[c[1]], angle[c[2]])
		hi := max(angle[c[0]], angle[c[1]], angle[c[2]])
		if hi-lo <= math.Pi {
			continue
		}
		for j, v := range c {
			if angle[v] >= 0 {
				continue
			}
			twin, ok := copies[v]
			if !ok {
				twin = int32(len(m.node))
				copies[v] = twin
				m.node = append(m.node, m.node[v])
				m.normal = append(m.normal, m.normal[v])
				m.twin = append(m.twin, v)
				angle = append(angle, angle[v]+2*math.Pi)
			}
			m.corners[k][j] = twin
		}
	}
	return angle
}

// gradient is that of values at vertices in triangle k of the sheet: the sum of
// vᵢ·∇φᵢ with ∇φᵢ = n × eᵢ/(2A), eᵢ the side opposite corner i.
func (m *sheetMesh) gradient(r *canopy.Result, k int, v []float64) r3.Vec {
	c, n, area := m.corners[k], r3.Vec{}, m.area[k]
	p := [3]r3.Vec{}
	for j := range p {
		p[j] = r.Form.Position[m.node[c[j]]]
	}
	n = r3.Unit(r3.Cross(r3.Sub(p[1], p[0]), r3.Sub(p[2], p[0])))
	var side r3.Vec
	for j := range p {
		side = r3.Add(side, r3.Scale(v[c[j]], r3.Sub(p[(j+2)%3], p[(j+1)%3])))
	}
	return r3.Scale(1/(2*area), r3.Cross(n, side))
}

// potential returns values at the vertices whose gradient is nearest to a
// direction given in each triangle, in the mean square over the area. That is
// a Poisson equation with the cotangent weights of linear triangles (Pinkall
// and Polthier 1993), solved by conjugate gradients from values found by walking
// over the sheet, which are nearly right already.
func (m *sheetMesh) potential(r *canopy.Result, direction func(k int) r3.Vec) []float64 {
	n := len(m.node)
	at := func(v int32) r3.Vec { return r.Form.Position[m.node[v]] }
	// For each side, opposite corner j: half the cotangent of the angle there.
	half := make([][3]float32, len(m.corners)) // there are many
	rhs, diagonal := make([]float64, n), make([]float64, n)
	for k, c := range m.corners {
		d := direction(k)
		for j := range c {
			a, b := c[(j+1)%3], c[(j+2)%3]
			u, w := r3.Sub(at(a), at(c[j])), r3.Sub(at(b), at(c[j]))
			half[k][j] = float32(r3.Dot(u, w) / (4 * m.area[k]))
			h := float64(half[k][j])
			e := h * r3.Dot(d, r3.Sub(at(b), at(a)))
			rhs[b] += e
			rhs[a] -= e
			diagonal[a] += h
			diagonal[b] += h
		}
	}
	x := m.walk(r, direction)
	times := func(v, out []float64) {
		clear(out)
		for k, c := range m.corners {
			for j := range c {
				a, b := c[(j+1)%3], c[(j+2)%3]
				e := float64(half[k][j]) * (v[b] - v[a])
				out[b] += e
				out[a] -= e
			}
		}
	}
	dot := func(a, b []float64) (s float64) {
		for i := range a {
			s += a[i] * b[i]
		}
		return s
	}
	image, z := make([]float64, n), make([]float64, n)
	times(x, image)
	rest := rhs
	for i := range rest {
		rest[i] -= image[i]
	}
	settle := func() {
		for i := range z {
			z[i] = 0
			if diagonal[i] > 0 {
				z[i] = rest[i] / diagonal[i]
			}
		}
	}
	settle()
	p := append([]float64(nil), z...)
	rho := dot(rest, z)
	total := 0.0
	for _, a := range m.area {
		total += a
	}
	// rho is a squared error of the gradient times area, or nearly.
	for range 100 {
		if rho <= 1e-8*total {
			break
		}
		times(p, image)
		curvature := dot(p, image)
		if curvature <= 0 {
			break
		}
		step := rho / curvature
		for i := range x {
			x[i] += step * p[i]
			rest[i] -= step * image[i]
		}
		settle()
		next := dot(rest, z)
		for i := range p {
			p[i] = z[i] + next/rho*p[i]
		}
		rho = next
	}
	return x
}

// walk goes over the sheet from triangle to triangle and gives each vertex that
// it comes to the mean of what the sides from known vertices of triangles at
// hand tell.
func (m *sheetMesh) walk(r *canopy.Result, direction func(k int) r3.Vec) []float64 {
	n := len(m.node)
	// Triangles at each vertex, in one list.
	start := make([]int32, n+1)
	for _, c := range m.corners {
		for _, v := range c {
			start[v+1]++
		}
	}
	for i := range n {
		start[i+1] += start[i]
	}
	list, next := make([]int32, 3*len(m.corners)), append([]int32(nil), start[:n]...)
	for k, c := range m.corners {
		for _, v := range c {
			list[next[v]] = int32(k)
			next[v]++
		}
	}
	at := func(v int32) r3.Vec { return r.Form.Position[m.node[v]] }
	const unseen, waiting, known = 0, 1, 2
	state, value := make([]uint8, n), make([]float64, n)
	queue := next[:0]
	for seed := range int32(n) {
		if state[seed] != unseen {
			continue
		}
		queue = append(queue[:0], seed)
		state[seed] = waiting
		for at0 := 0; at0 < len(queue); at0++ {
			v := queue[at0]
			sum, weight := 0.0, 0.0
			for _, k := range list[start[v]:start[v+1]] {
				for _, w := range m.corners[k] {
					switch {
					case state[w] == known:
						sum += m.area[k] * (value[w] + r3.Dot(direction(int(k)), r3.Sub(at(v), at(w))))
						weight += m.area[k]
					case state[w] == unseen:
						state[w] = waiting
						queue = append(queue, w)
					}
				}
			}
			if weight > 0 {
				value[v] = sum / weight
			}
			state[v] = known
		}
	}
	return value
}

// fromLeast moves values so that the least is 0.
func fromLeast(v []float64) []float64 {
	least := math.Inf(1)
	for _, x := range v {
		least = min(least, x)
	}
	for i := range v {
		v[i] -= least
	}
	return v
}

// textureCoordinates appends an accessor of lengths along warp and weft in m.
func (g *scene) textureCoordinates(warp, weft []float64) int {
	// Kept until they are written in the precision they are written in.
	single := make([][2]float32, len(warp))
	for i := range warp {
		single[i] = [2]float32{float32(warp[i]), float32(weft[i])}
	}
	view := g.floats(gltf.TargetArrayBuffer, len(single), 2, func() func(i int, out []float64) {
		return func(i int, out []float64) { out[0], out[1] = float64(single[i][0]), float64(single[i][1]) }
	})
	return g.accessor(&gltf.Accessor{BufferView: gltf.Index(view), ComponentType: gltf.ComponentFloat, Type: gltf.AccessorVec2, Count: len(single)})
}

// woven returns the material of plain fabric, whose texture shows the yarns.
func (g *scene) woven() int {
	picture := weavePicture()
	view := g.view(gltf.TargetNone, 0, len(picture), 1, func() func(b []byte, i int) []byte {
		return func(b []byte, i int) []byte { return append(b, picture[i]) }
	})
	g.doc.Images = []*gltf.Image{{Name: "weave, 1 m", MimeType: "image/png", BufferView: gltf.Index(view)}}
	g.doc.Samplers = []*gltf.Sampler{{MagFilter: gltf.MagLinear, MinFilter: gltf.MinLinearMipMapLinear, WrapS: gltf.WrapRepeat, WrapT: gltf.WrapRepeat}}
	g.doc.Textures = []*gltf.Texture{{Name: "weave", Sampler: gltf.Index(0), Source: gltf.Index(0)}}
	i := g.material("fabric", fromScreen(245, 242, 235), 0.85, false)
	g.doc.Materials[i].PBRMetallicRoughness.BaseColorTexture = &gltf.TextureInfo{Index: 0}
	return i
}

// weavePicture is a square metre of fabric: four strong lines along the warp and
// two faint ones along the weft. Warp is the first coordinate, so that lines
// along it lie in rows of the picture.
func weavePicture() []byte {
	const n = 64
	m := image.NewGray(image.Rect(0, 0, n, n))
	for y := range n {
		for x := range n {
			shade := uint8(255)
			if x%(n/2) == n/4 {
				shade = 222
			}
			if k := y % (n / 4); k == n/8 || k == n/8+1 {
				shade = 176
			}
			m.SetGray(x, y, color.Gray{Y: shade})
		}
	}
	var b bytes.Buffer
	e := png.Encoder{CompressionLevel: png.BestCompression}
	_ = e.Encode(&b, m) // to memory
	return b.Bytes()
}
