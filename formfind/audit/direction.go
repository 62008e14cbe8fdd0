package audit

import (
	"context"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/surface"
)

// smoothLine is the cosine of the largest turn of a cable or seam at a node,
// 35°, up to which it counts as one smooth line there, along which sliding a
// node does not change the shape. Edge cables of a sag of a tenth of the chord
// turn by 44° in all.
const smoothLine = 0.8191520442889918

// freedoms are the unknowns of the stability problem: up to three at a node,
// each a unit direction in which the node may move and thereby change the
// shape.
//
//   - Fabric of prescribed stress away from lines: the normal of the surface.
//     The stress does not resist sliding in the surface and does not change
//     by it.
//   - A node on one smooth cable or seam, with fabric or not, and any node of
//     a chain of given forces, two cables in tension and nothing else: the two
//     directions across it.
//   - All directions where lines meet, where fabric or a member there is
//     elastic (sliding then stretches something), and in nets.
//   - At the centre of a rigid ring: its free directions; its nodes go with it.
//
// Directions that a support or a held position takes away are left out.
type freedoms struct {
	first []int32  // unknowns of node i are first[i] to first[i+1]; none for tied nodes
	dir   []r3.Vec // direction of each unknown
	node  []int32  // node of each unknown
}

func (d *freedoms) unknowns() int { return len(d.dir) }

// freeOf returns the directions in which nothing holds node i.
func freeOf(s *canopy.Structure, i int) canopy.Freedom {
	return canopy.DirAll &^ s.FixedAt(i)
}

// rayKind says what leaves a node along a line.
type ray struct {
	node    int32
	along   r3.Vec // unit, away from the node
	elastic bool   // stretching it is resisted
	pushed  bool
}

// findFreedoms chooses the unknowns.
func (c *audited) findFreedoms(ctx context.Context) (*freedoms, error) {
	s, x := c.s, c.x
	n := len(x)
	const (
		touched = 1 << iota // some element is there
		elasticFabric
	)
	flag := make([]uint8, n)
	for t, t3 := range s.Corners {
		b := uint8(touched)
		if s.Fabrics[s.FabricOf[t]].Elastic {
			b |= elasticFabric
		}
		for _, i := range t3 {
			flag[i] |= b
		}
	}

	// Rays: members, and sides along which fabrics of different stress or
	// more than two sheets meet.
	var rays []ray
	add := func(i, j int32, elastic, pushed bool) {
		d := r3.Sub(x[j], x[i])
		l := norm(d)
		if !(l > 0) {
			return
		}
		d = r3.Scale(1/l, d)
		rays = append(rays, ray{i, d, elastic, pushed}, ray{j, r3.Scale(-1, d), elastic, pushed})
	}
	for k, e := range s.Ends {
		flag[e[0]] |= touched
		flag[e[1]] |= touched
		_, axial := c.memberStiffness(k)
		add(e[0], e[1], axial > 0, c.f.Force[k] < 0)
	}
	if len(s.Corners) > 0 {
		for _, e := range surface.Edges(s.Corners) {
			if e.Triangles == 1 || e.Triangles == 2 && sameStress(s, e.First, e.Second) {
				continue
			}
			add(e.Nodes[0], e.Nodes[1], false, false)
		}
	}
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	start := make([]int32, n+1)
	for _, r := range rays {
		start[r.node+1]++
	}
	for i := range n {
		start[i+1] += start[i]
	}
	at := make([]ray, len(rays))
	fill := append([]int32(nil), start[:n]...)
	for _, r := range rays {
		at[fill[r.node]] = r
		fill[r.node]++
	}

	var normals []r3.Vec
	if len(s.Corners) > 0 {
		normals = surface.VertexNormals(x, s.Corners)
	}
	master := make([]bool, n)
	for i, m := range s.Master {
		if m >= 0 {
			master[m] = true
			flag[m] |= flag[i] & touched
		}
	}
	axes := []r3.Vec{{X: 1}, {Y: 1}, {Z: 1}}
	d := &freedoms{first: make([]int32, n+1)}
	var want []r3.Vec
	for i := range n {
		d.first[i] = int32(len(d.dir))
		free := freeOf(s, i)
		if free == 0 || s.MasterOf(i) >= 0 || flag[i]&touched == 0 {
			continue
		}
		want = want[:0]
		here := at[start[i]:start[i+1]]
		switch {
		case master[i] || flag[i]&elasticFabric != 0:
			want = append(want, axes...)
		case len(here) == 0 && normals != nil && normals[i] != (r3.Vec{}):
			want = append(want, normals[i])
		case len(here) == 0: // nothing but elements without size
			want = append(want, axes...)
		default:
			line, ok := smooth(here, c.fabric[i])
			if !ok {
				want = append(want, axes...)
				break
			}
			u, v := across(line)
			want = append(want, u, v)
		}
		if free == canopy.DirAll && !master[i] {
			for _, v := range want {
				d.dir = append(d.dir, v)
				d.node = append(d.node, int32(i))
			}
			continue
		}
		if len(want) == 3 || master[i] { // keep to the axes
			for k, v := range axes {
				if free.Has(k) {
					d.dir = append(d.dir, v)
					d.node = append(d.node, int32(i))
				}
			}
			continue
		}
		// What the support leaves of the directions, orthonormal again. A
		// direction of which hardly anything is left moves the node along
		// the surface only.
		from := len(d.dir)
		for _, v := range want {
			v = masked(v, free)
			for _, u := range d.dir[from:] {
				v = r3.Sub(v, r3.Scale(r3.Dot(u, v), u))
			}
			if l := norm(v); l > 0.05 {
				d.dir = append(d.dir, r3.Scale(1/l, v))
				d.node = append(d.node, int32(i))
			}
		}
	}
	d.first[n] = int32(len(d.dir))
	return d, nil
}

// sameStress reports whether two triangles carry the same prescribed stress.
func sameStress(s *canopy.Structure, a, b int32) bool {
	fa, fb := s.FabricOf[a], s.FabricOf[b]
	if fa == fb {
		return true
	}
	if s.Fabrics[fa].Elastic || s.Fabrics[fb].Elastic {
		return s.Fabrics[fa].Elastic && s.Fabrics[fb].Elastic
	}
	p, q := s.Stress[a], s.Stress[b]
	return p == q && p[0] == p[1] // unequal warp and weft need not run the same way
}

// smooth reports whether the rays at a node make one smooth line along which
// nothing resists sliding, and its direction.
func smooth(rays []ray, fabric bool) (r3.Vec, bool) {
	for _, r := range rays {
		if r.elastic {
			return r3.Vec{}, false
		}
	}
	if !fabric && len(rays) == 2 && !rays[0].pushed && !rays[1].pushed {
		if d := r3.Sub(rays[0].along, rays[1].along); norm(d) > 0.1 {
			return r3.Unit(d), true
		}
	}
	// The line is the sum of the rays turned to the side of the first.
	first := rays[0].along
	var ahead, back, sum r3.Vec
	nBack := 0
	for _, r := range rays {
		if r3.Dot(r.along, first) >= 0 {
			ahead = r3.Add(ahead, r.along)
		} else {
			back = r3.Add(back, r.along)
			nBack++
		}
	}
	if nBack == 0 {
		if fabric {
			// A cable that ends in fabric: which way it ends matters.
			return r3.Vec{}, false
		}
		sum = ahead
	} else {
		ahead, back = r3.Unit(ahead), r3.Unit(back)
		if -r3.Dot(ahead, back) < smoothLine {
			return r3.Vec{}, false
		}
		sum = r3.Sub(ahead, back)
	}
	line := r3.Unit(sum)
	for _, r := range rays {
		if math.Abs(r3.Dot(r.along, line)) < 0.95 { // 18°, half the turn allowed
			return r3.Vec{}, false
		}
	}
	return line, true
}

// across returns two unit vectors that make a right-handed frame with the unit
// vector u.
func across(u r3.Vec) (v, w r3.Vec) {
	a := r3.Vec{X: 1}
	switch x, y, z := math.Abs(u.X), math.Abs(u.Y), math.Abs(u.Z); {
	case z <= x && z <= y:
		a = r3.Vec{Z: 1}
	case y <= x:
		a = r3.Vec{Y: 1}
	}
	v = r3.Unit(r3.Cross(a, u))
	return v, r3.Cross(u, v)
}

// share is an unknown seen from a node: moving it by one metre moves the node
// by dir.
type share struct {
	unknown int32
	dir     r3.Vec
}

// at lists the unknowns that move node i: its own, or those of the centre of
// its ring in the directions in which it is tied.
func (d *freedoms) at(s *canopy.Structure, i int32, buf []share) []share {
	buf = buf[:0]
	if m := s.MasterOf(int(i)); m >= 0 {
		tied := canopy.DirAll &^ s.FixedAt(int(i))
		for u := d.first[m]; u < d.first[m+1]; u++ {
			if v := masked(d.dir[u], tied); v != (r3.Vec{}) {
				buf = append(buf, share{u, v})
			}
		}
		return buf
	}
	for u := d.first[i]; u < d.first[i+1]; u++ {
		buf = append(buf, share{u, d.dir[u]})
	}
	return buf
}
