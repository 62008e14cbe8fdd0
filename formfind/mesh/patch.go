package mesh

import (
	"math"

	"anticlast/formfind/canopy"
	"gonum.org/v1/gonum/spatial/r3"
)

// patcher is a way to fill a boundary with triangles.
type patcher interface {
	// relate says what the patch asks of the division of its edges.
	relate(d *division, l *loop)
	// triangles is about how many triangles the patch will have.
	triangles(b *builder, l *loop) float64
	// fill makes nodes and triangles inside the divided boundary.
	fill(p *plot)
}

// plot is the place where a patch puts its nodes and triangles.
type plot struct {
	b     *builder
	l     *loop
	inner int // nodes made inside
}

func (p *plot) at(i int32) r3.Vec { return p.b.s.Position[i] }

func (p *plot) node(v r3.Vec) int32 {
	p.inner++
	return p.b.addNode(v, numbered(p.l.name, p.inner))
}

func (p *plot) tri(i, j, k int32) {
	p.b.s.Corners = append(p.b.s.Corners, [3]int32{i, j, k})
}

// quad splits the quadrilateral a, b, c, d into two triangles: along a–c when ac
// is set, else along b–d; the other way when the preferred diagonal is much
// longer than the other.
func (p *plot) quad(a, b, c, d int32, ac bool) {
	lac, lbd := dist(p.at(a), p.at(c)), dist(p.at(b), p.at(d))
	const much = 1.4
	if ac && lac > much*lbd || !ac && lbd > much*lac {
		ac = !ac
	}
	if ac {
		p.tri(a, b, c)
		p.tri(a, c, d)
	} else {
		p.tri(a, b, d)
		p.tri(b, c, d)
	}
}

func (p *plot) sides() [][]int32 {
	list := make([][]int32, len(p.l.sides))
	for i, ks := range p.l.sides {
		list[i] = p.b.along(p.l, ks)
	}
	return list
}

// grid makes the nodes of a four-sided patch by transfinite interpolation
// (Coons 1967): row j of the answer runs from the fourth side to the second,
// row 0 is the first side.
func (p *plot) grid(side [][]int32) [][]int32 {
	nu, nv := len(side[0])-1, len(side[1])-1
	g := make([][]int32, nv+1)
	g[0] = side[0]
	top := make([]int32, nu+1)
	for i := range top {
		top[i] = side[2][nu-i]
	}
	g[nv] = top
	p00, p10 := p.at(side[0][0]), p.at(side[0][nu])
	p11, p01 := p.at(top[nu]), p.at(top[0])
	for j := 1; j < nv; j++ {
		v := float64(j) / float64(nv)
		left, right := side[3][nv-j], side[1][j]
		row := make([]int32, nu+1)
		row[0], row[nu] = left, right
		for i := 1; i < nu; i++ {
			u := float64(i) / float64(nu)
			across := lerp(p.at(left), p.at(right), u)
			up := lerp(p.at(side[0][i]), p.at(top[i]), v)
			flat := lerp(lerp(p00, p10, u), lerp(p01, p11, u), v)
			row[i] = p.node(r3.Sub(r3.Add(across, up), flat))
		}
		g[j] = row
	}
	return g
}

// cells splits the cells of a grid; toMiddle makes diagonals point from the
// corners to the middle, otherwise all run from the second to the fourth corner.
func (p *plot) cells(g [][]int32, toMiddle bool) {
	nv, nu := len(g)-1, len(g[0])-1
	for j := range nv {
		for i := range nu {
			ac := toMiddle && (2*i+1 < nu) == (2*j+1 < nv)
			p.quad(g[j][i], g[j][i+1], g[j+1][i+1], g[j+1][i], ac)
		}
	}
}

// gridPatch fills four sides with a grid.
type gridPatch struct{}

func (gridPatch) relate(d *division, l *loop) {
	for i := range 2 {
		s, t := l.sides[i], l.sides[i+2]
		for k := range s {
			d.alike(l.edges[s[k]], l.edges[t[len(t)-1-k]], l)
		}
	}
}

func (gridPatch) triangles(b *builder, l *loop) float64 {
	return 2 * float64(b.segments(l, l.sides[0])) * float64(b.segments(l, l.sides[1]))
}

func (gridPatch) fill(p *plot) { p.cells(p.grid(p.sides()), true) }

// lensPatch fills two sides with two triangular grids that meet on the line
// between their middles.
type lensPatch struct{}

func (lensPatch) relate(d *division, l *loop) {
	d.evenly(l.edges[0], l)
	d.alike(l.edges[0], l.edges[1], l)
}

func (lensPatch) triangles(b *builder, l *loop) float64 {
	n := float64(b.segments(l, l.sides[0]))
	return n * n / 2
}

func (lensPatch) fill(p *plot) {
	s := p.sides()
	m := len(s[0]) / 2
	across, back := make([]int32, m+1), make([]int32, m+1)
	across[0], across[m] = s[0][m], s[1][m]
	for i := 1; i < m; i++ {
		across[i] = p.node(lerp(p.at(s[0][m]), p.at(s[1][m]), float64(i)/float64(m)))
	}
	for i, v := range across {
		back[m-i] = v
	}
	p.triCells(p.triGrid([][]int32{across, s[1][m:], s[0][:m+1]}))
	p.triCells(p.triGrid([][]int32{back, s[0][m:], s[1][:m+1]}))
}

// triPatch fills three sides with a triangular grid.
type triPatch struct{}

func (triPatch) relate(d *division, l *loop) {
	for i := range 2 {
		for k := range l.sides[0] {
			d.alike(l.edges[l.sides[0][k]], l.edges[l.sides[i+1][k]], l)
		}
	}
}

func (triPatch) triangles(b *builder, l *loop) float64 {
	n := float64(b.segments(l, l.sides[0]))
	return n * n
}

func (triPatch) fill(p *plot) { p.triCells(p.triGrid(p.sides())) }

// triCells makes the triangles of a triangular grid.
func (p *plot) triCells(g [][]int32) {
	n := len(g) - 1
	for j := range n {
		for i := 0; i < n-j; i++ {
			p.tri(g[j][i], g[j][i+1], g[j+1][i])
			if i+1 < n-j {
				p.tri(g[j][i+1], g[j+1][i+1], g[j+1][i])
			}
		}
	}
}

// triGrid makes the nodes of a three-sided patch by transfinite interpolation
// over barycentric coordinates: each corner sees the two sides that leave it,
// and the three views are weighted by nearness. Row j runs parallel to the first
// side, from the third side to the second; row 0 is the first side.
func (p *plot) triGrid(side [][]int32) [][]int32 {
	n := len(side[0]) - 1
	a, b, c := p.at(side[0][0]), p.at(side[1][0]), p.at(side[2][0])
	g := make([][]int32, n+1)
	g[0] = side[0]
	for j := 1; j <= n; j++ {
		row := make([]int32, n-j+1)
		row[0], row[n-j] = side[2][n-j], side[1][j]
		for i := 1; i < n-j; i++ {
			k := n - i - j // steps from A: i towards B, j towards C, k left
			u, v, w := float64(k)/float64(n), float64(i)/float64(n), float64(j)/float64(n)
			fromA := r3.Sub(r3.Add(p.at(side[0][i]), p.at(side[2][n-j])), a)
			fromB := r3.Sub(r3.Add(p.at(side[1][j]), p.at(side[0][n-k])), b)
			fromC := r3.Sub(r3.Add(p.at(side[2][k]), p.at(side[1][n-i])), c)
			row[i] = p.node(r3.Add(r3.Scale(u, fromA), r3.Add(r3.Scale(v, fromB), r3.Scale(w, fromC))))
		}
		g[j] = row
	}
	return g
}

// starPatch fills five sides or more by midpoint subdivision: the middle of each
// side is joined to the centre, and each corner has a grid.
type starPatch struct{}

func (starPatch) relate(d *division, l *loop) {
	d.evenly(l.edges[0], l)
	for _, e := range l.edges[1:] {
		d.alike(l.edges[0], e, l)
	}
}

func (starPatch) triangles(b *builder, l *loop) float64 {
	m := float64(b.segments(l, l.sides[0]) / 2)
	return 2 * m * m * float64(len(l.sides))
}

func (starPatch) fill(p *plot) {
	side := p.sides()
	n := len(side)
	m := len(side[0]) / 2
	var sum r3.Vec
	for _, s := range side {
		for _, i := range s[1:] {
			sum = r3.Add(sum, p.at(i))
		}
	}
	centre := p.node(r3.Scale(1/float64(2*m*n), sum))
	spoke := make([][]int32, n) // from the middle of a side to the centre
	for k, s := range side {
		spoke[k] = make([]int32, m+1)
		spoke[k][0], spoke[k][m] = s[m], centre
		for i := 1; i < m; i++ {
			spoke[k][i] = p.node(lerp(p.at(s[m]), p.at(centre), float64(i)/float64(m)))
		}
	}
	for k := range side {
		before := (k + n - 1) % n
		out := make([]int32, m+1) // from the centre to the middle of the side before
		for i := range out {
			out[i] = spoke[before][m-i]
		}
		g := p.grid([][]int32{side[before][m:], side[k][:m+1], spoke[k], out})
		p.cells(g, false)
	}
}

// radialPatch fills the space between a ring and any number of sides around it.
type radialPatch struct{}

func (radialPatch) relate(d *division, l *loop) {
	// At least 12 around the ring.
	for _, e := range l.edges {
		d.atLeast(e, (11+len(l.edges))/len(l.edges))
	}
}

func (radialPatch) triangles(b *builder, l *loop) float64 {
	n := 0
	r := 0.0
	at := b.ringAt(l)
	pts := b.sample(l)
	for _, v := range pts {
		r += dist(v, at) / float64(len(pts))
	}
	for _, e := range l.edges {
		n += b.count[e]
	}
	return 2 * float64(n) * max(2, float64(n)/(2*math.Pi)*math.Log(r/b.m.Rings[l.ring].Radius))
}

func (b *builder) ringAt(l *loop) r3.Vec {
	return b.m.Points[b.point[b.m.Rings[l.ring].At]].At
}

func (radialPatch) fill(p *plot) {
	outer := p.b.outerNodes(p.l)
	ring := p.b.ringNode[p.l.ring]
	n := len(outer)
	centre := p.b.ringAt(p.l)
	axis := p.b.ringAxis(p.l.ring)
	r := p.b.m.Rings[p.l.ring].Radius
	mean, slant := 0.0, 0.0
	for j, o := range outer {
		d := r3.Sub(p.at(o), centre)
		flat := r3.Sub(d, r3.Scale(r3.Dot(d, axis), axis))
		mean += r3.Norm(flat) / float64(n)
		slant += dist(p.at(o), p.at(ring[j])) / float64(n)
	}
	// A layer is as deep as a mesh side around is long: ds = 2πρ/n, along a
	// line that rises by slant/(mean − r).
	grow := math.Log(mean / r)
	want := math.Round(float64(n) / (2 * math.Pi) * grow * slant / (mean - r))
	if left := MaxTriangles - len(p.b.s.Corners); !(2*float64(n)*want <= float64(left)) {
		p.b.tooManyTriangles()
		return
	}
	layers := max(2, int(want))
	line := make([][]int32, layers+1)
	line[0], line[layers] = ring, outer
	for k := 1; k < layers; k++ {
		t := math.Expm1(grow*float64(k)/float64(layers)) / math.Expm1(grow)
		line[k] = make([]int32, n)
		for j := range outer {
			line[k][j] = p.node(lerp(p.at(ring[j]), p.at(outer[j]), t))
		}
	}
	// Diagonals point outwards to the middle of each side, so that the angle
	// at a corner is halved and both halves of a side mirror each other.
	toNext := make([]bool, 0, n)
	for k := range p.l.edges {
		m := p.b.count[p.l.edges[k]]
		for i := range m {
			toNext = append(toNext, 2*i+1 < m)
		}
	}
	for k := range layers {
		for j := range n {
			next := (j + 1) % n
			// In counter-clockwise order: inner j, outer j, outer next, inner next.
			p.quad(line[k][j], line[k+1][j], line[k+1][next], line[k][next], toNext[j])
		}
	}
}

// outerNodes returns the nodes around a loop, each once.
func (b *builder) outerNodes(l *loop) []int32 {
	var list []int32
	for k := range l.edges {
		part := b.along(l, []int{k})
		list = append(list, part[:len(part)-1]...)
	}
	return list
}

// fill meshes all fabrics and nets.
func (b *builder) fill() {
	s := b.s
	for li, l := range b.loop {
		if b.ctx.Err() != nil {
			return
		}
		if l.net {
			if b.laid[li] != nil {
				b.fillLines(l, b.laid[li])
			} else {
				b.fillSides(l)
			}
			continue
		}
		f := b.m.Fabrics[l.index]
		prop := f.Properties
		prop.Name = f.Name
		if prop.WarpRule = f.WarpRule; f.WarpRule != canopy.WarpAlong {
			prop.WarpAxis, prop.WarpCentre = b.ringAxis(l.ring), b.ringAt(l)
		}
		s.Fabrics = append(s.Fabrics, prop)
		from := len(s.Corners)
		l.patch.fill(&plot{b: b, l: l})
		for range len(s.Corners) - from {
			s.FabricOf = append(s.FabricOf, int32(li))
			s.Stress = append(s.Stress, [2]float64{f.Warp, f.Weft})
		}
		b.warp(l, from)
	}
}

// warp lays the warp direction on the triangles of a fabric from number from on.
func (b *builder) warp(l *loop, from int) {
	s := b.s
	f := b.m.Fabrics[l.index]
	along := f.WarpDir
	if f.WarpRule == canopy.WarpAlong && along == (r3.Vec{}) {
		e := b.edge[f.Boundary[0]]
		along = r3.Sub(b.curve[e].End, b.curve[e].Start)
	}
	along = r3.Unit(along)
	for t := from; t < len(s.Corners); t++ {
		c := s.Corners[t]
		p, q, r := s.Position[c[0]], s.Position[c[1]], s.Position[c[2]]
		v := r3.Scale(1.0/3, r3.Add(p, r3.Add(q, r)))
		if !hasArea(p, q, r) {
			b.fail("fabric", l.name, l.line, Degenerate, "give the edges another number of segments, divide the fabric, or move the points so that its boundary is not folded",
				"the start mesh has a triangle without area at [%.3f, %.3f, %.3f]", v.X, v.Y, v.Z)
			return
		}
		normal := r3.Unit(r3.Cross(r3.Sub(q, p), r3.Sub(r, p)))
		w := along
		if f.WarpRule != canopy.WarpAlong {
			w = canopy.WarpAbout(f.WarpRule, b.ringAxis(l.ring), r3.Sub(v, b.ringAt(l)), normal)
		}
		flat := r3.Norm(r3.Sub(w, r3.Scale(r3.Dot(w, normal), normal)))
		if !(flat > minWarp) {
			b.fail("fabric", l.name, l.line, NoWarp, "give another direction for the warp, or divide the fabric",
				"the warp direction (%s) is at right angles to the surface near [%.3f, %.3f, %.3f] and so undefined there", warpWord(f.WarpRule), v.X, v.Y, v.Z)
			return
		}
		s.Warp = append(s.Warp, w)
	}
}

// minWarp is the least length of a unit warp direction projected into the
// surface: 5° from its normal.
const minWarp = 0.087

func warpWord(r canopy.WarpRule) string {
	switch r {
	case canopy.WarpRadial:
		return "radial"
	case canopy.WarpAround:
		return "around"
	default:
		return "along a direction"
	}
}
