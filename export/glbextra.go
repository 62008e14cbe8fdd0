package export

import (
	"fmt"
	"math"

	"anticlast/formfind/canopy"
	"anticlast/formfind/surface"

	"github.com/qmuntal/gltf"
	"gonum.org/v1/gonum/spatial/r3"
)

// reactions appends an arrow for each reaction of a named support and for the
// sum along each fixed line, as a root node of its own. An arrow points the way
// the support pushes the structure and ends at the support; its length grows
// with the force.
func (g *scene) reactions() []int {
	s, f := g.r.Structure, g.r.Form
	type force struct {
		name string
		at   r3.Vec
		v    r3.Vec
	}
	var list []force
	inner := innerNodes(s)
	for i, fixed := range s.Fixed {
		if fixed != 0 && !inner[i] && len(s.NodeName.Bytes(i)) > 0 && len(list) < 500 {
			list = append(list, force{"reaction at " + s.NodeName.At(i), f.Position[i], f.Reaction[i]})
		}
	}
	for i := range s.Lines {
		l := &s.Lines[i]
		if l.Role == "seam" || len(l.Nodes) < 3 {
			continue
		}
		// Between its ends, for those have arrows of their own.
		var sum r3.Vec
		for _, v := range l.Nodes[1 : len(l.Nodes)-1] {
			sum = r3.Add(sum, f.Reaction[v])
		}
		list = append(list, force{"reaction along " + l.Name, f.Position[l.Nodes[len(l.Nodes)/2]], sum})
	}
	most := 0.0
	for _, a := range list {
		most = max(most, r3.Norm(a.v))
	}
	if most == 0 {
		return nil
	}
	paint := g.material("reaction", fromScreen(40, 120, 90), 0.7, false)
	var nodes []int
	for _, a := range list {
		length := 0.16 * g.size * r3.Norm(a.v) / most
		if length < 0.004*g.size {
			continue
		}
		var m solid
		m.arrow(r3.Sub(a.at, r3.Scale(length/r3.Norm(a.v), a.v)), a.at, 0.0025*g.size, 8)
		if mesh, ok := g.solid(a.name, &m, paint); ok {
			nodes = append(nodes, g.node(&gltf.Node{Name: a.name, Mesh: gltf.Index(mesh),
				Extras: map[string]any{"reaction_on_structure_N": upExtras(a.v), "size_N": rounded(r3.Norm(a.v))}}))
		}
	}
	return g.root("reactions", nodes)
}

// yarns appends marks that show which way the yarns run: a long line along the
// warp and a short one along the weft, on triangles spread over the fabric.
func (g *scene) yarns() []int {
	s, f := g.r.Structure, g.r.Form
	cell := g.size / 40
	taken := map[[3]int]bool{}
	var position []r3.Vec
	var warp, weft [][2]int32
	for i, c := range s.Corners {
		normal, area := triangleNormal(g.r, i)
		middle := surface.Centre(f.Position, c)
		d := r3.Sub(middle, g.origin)
		key := [3]int{int(math.Floor(d.X / cell)), int(math.Floor(d.Y / cell)), int(math.Floor(d.Z / cell))}
		if area == 0 || taken[key] {
			continue
		}
		taken[key] = true
		w := f.Warp[i]
		across := r3.Cross(normal, w)
		n := int32(len(position))
		position = append(position, r3.Sub(middle, r3.Scale(0.38*cell, w)), r3.Add(middle, r3.Scale(0.38*cell, w)),
			r3.Sub(middle, r3.Scale(0.16*cell, across)), r3.Add(middle, r3.Scale(0.16*cell, across)))
		warp, weft = append(warp, [2]int32{n, n + 1}), append(weft, [2]int32{n + 2, n + 3})
	}
	mesh, ok := g.lines("warp and weft", position, append(warp, weft...), g.material("yarn", fromScreen(70, 90, 105), 1, true))
	if !ok {
		return nil
	}
	return g.root("yarns", []int{g.node(&gltf.Node{Name: "warp (long) and weft (short)", Mesh: gltf.Index(mesh)})})
}

// legend appends the scale of colours of a layer as an upright bar with numbers
// at the front left corner of the fabric.
func (g *scene) legend(l *layer) []int {
	lo, hi := canopy.Bounds(fabricPoints(g.r))
	low, high := 0.0, l.reach
	if l.centred {
		low, high = 1-l.reach, 1+l.reach
	}
	height, width := 0.22*g.size, 0.018*g.size
	corner := r3.Vec{X: lo.X - 0.06*g.size, Y: lo.Y, Z: (lo.Z+hi.Z)/2 - height/2}
	var position []r3.Vec
	var colour []rgb
	var corners [][3]int32
	quad := func(x, z, w, h float64, bottom, top rgb) {
		n := int32(len(position))
		for k, p := range [4][2]float64{{x, z}, {x + w, z}, {x + w, z + h}, {x, z + h}} {
			position = append(position, r3.Add(corner, r3.Vec{X: p[0], Z: p[1]}))
			colour = append(colour, [4]rgb{bottom, bottom, top, top}[k])
		}
		corners = append(corners, [3]int32{n, n + 1, n + 2}, [3]int32{n, n + 2, n + 3})
	}
	const steps = 16
	at := func(k int) rgb { return l.colour(low + (high-low)*float64(k)/steps) }
	for k := range steps {
		quad(0, height*float64(k)/steps, width, height/steps, at(k), at(k+1))
	}
	ink := fromScreen(60, 68, 76)
	dot := 0.0028 * g.size
	for k, v := range []float64{low, (low + high) / 2, high} {
		s := string(appendNumber(nil, v, 4))
		x := -dot * float64(4*len(s)+1) // left of the bar
		for _, sign := range s {
			for j, row := range figures[sign] {
				for i := range 3 {
					if row>>(2-i)&1 != 0 {
						quad(x+dot*float64(i), height*float64(k)/2+dot*(2.5-float64(j)-1), dot, dot, ink, ink)
					}
				}
			}
			x += 4 * dot
		}
	}
	mesh := g.mesh("scale of "+l.name, &gltf.Primitive{
		Attributes: gltf.PrimitiveAttributes{
			gltf.POSITION: g.positions(len(position), func(i int) r3.Vec { return position[i] }),
			gltf.COLOR_0:  g.colours(len(colour), func() func(i int) rgb { return func(i int) rgb { return colour[i] } }),
		},
		Indices:  gltf.Index(g.indices(3*len(corners), len(position), func(i int) int32 { return corners[i/3][i%3] })),
		Material: gltf.Index(g.material("fabric values", rgb{1, 1, 1}, 1, true)),
	})
	return g.root("legend, "+l.name, []int{g.node(&gltf.Node{Name: fmt.Sprintf("%s: %s to %s", l.title, appendNumber(nil, low, 4), appendNumber(nil, high, 4)), Mesh: gltf.Index(mesh)})})
}

// ground appends a plane just under the lowest node and a staff at its
// front right corner with bands of one metre, light and dark, as a root node.
func (g *scene) ground() []int {
	lo, hi := canopy.Bounds(g.r.Form.Position)
	m := 0.12 * g.size
	level := lo.Z - 0.017*g.size // under the signs of supports
	var plane solid
	c := [4]r3.Vec{{X: lo.X - m, Y: lo.Y - m, Z: level}, {X: hi.X + m, Y: lo.Y - m, Z: level}, {X: hi.X + m, Y: hi.Y + m, Z: level}, {X: lo.X - m, Y: hi.Y + m, Z: level}}
	plane.facets([3]r3.Vec{c[0], c[1], c[2]}, [3]r3.Vec{c[0], c[2], c[3]})
	var children []int
	if mesh, ok := g.solid("ground", &plane, g.material("ground", fromScreen(196, 200, 192), 1, false)); ok {
		children = append(children, g.node(&gltf.Node{Name: "ground", Mesh: gltf.Index(mesh)}))
	}
	foot := r3.Vec{X: hi.X + m/2, Y: lo.Y - m/2, Z: level}
	bands := int(math.Ceil(hi.Z - level))
	if bands >= 1 && bands <= 200 {
		for k, paint := range []int{g.material("staff, odd metres", fromScreen(190, 60, 45), 0.8, false), g.material("staff, even metres", fromScreen(245, 245, 240), 0.8, false)} {
			var staff solid
			for i := k; i < bands; i += 2 {
				staff.tube([]r3.Vec{r3.Add(foot, r3.Vec{Z: float64(i)}), r3.Add(foot, r3.Vec{Z: float64(i + 1)})}, 0.05, 12)
			}
			if mesh, ok := g.solid("levelling staff", &staff, paint); ok {
				children = append(children, g.node(&gltf.Node{Name: fmt.Sprintf("levelling staff, metres from %d", k+1), Mesh: gltf.Index(mesh)}))
			}
		}
	}
	return g.root("ground and staff", children)
}

// fabricPoints are the corners of all triangles.
func fabricPoints(r *canopy.Result) []r3.Vec {
	p := make([]r3.Vec, 0, 3*len(r.Structure.Corners))
	for _, c := range r.Structure.Corners {
		p = append(p, r.Form.Position[c[0]], r.Form.Position[c[1]], r.Form.Position[c[2]])
	}
	return p
}

// scalars appends an accessor of a value per vertex, for attributes of our own.
func (g *scene) scalars(n int, start func() func(i int) float64) int {
	view := g.floats(gltf.TargetArrayBuffer, n, 1, func() func(i int, out []float64) {
		at := start()
		return func(i int, out []float64) {
			if out[0] = at(i); math.IsNaN(out[0]) {
				out[0] = 0
			}
		}
	})
	return g.accessor(&gltf.Accessor{BufferView: gltf.Index(view), ComponentType: gltf.ComponentFloat, Type: gltf.AccessorScalar, Count: n})
}
