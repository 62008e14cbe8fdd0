package mesh

import (
	"context"
	"math"
	"slices"

	"anticlast/formfind/canopy"
	"gonum.org/v1/gonum/spatial/r3"
)

// Laid remembers how the nets of a structure were laid, so that equal-mesh nets
// can be laid anew in the shape that was found: how many whole meshes fit
// between edge cables is known only when these have found their places.
type Laid struct{ b *builder }

// HasEqualMesh reports whether m has a net all of whose meshes are equal.
func HasEqualMesh(m *canopy.Model) bool {
	return m.Listed == nil && slices.ContainsFunc(m.Nets, func(n canopy.Net) bool { return n.MeshLength > 0 })
}

// BuildLaid is [Build] for a drawn model whose nets may have to be laid again.
// Links of equal-mesh nets that end at the boundary have, in place of a given
// force, the force density that gives about that force, unless final is set:
// such links cannot shrink to nothing while the net is laid.
func BuildLaid(ctx context.Context, m *canopy.Model, final bool) (*canopy.Structure, *Laid, error) {
	b := newBuilder(ctx, m)
	b.soft = !final
	s, err := b.build()
	if err != nil {
		return nil, nil, err
	}
	return s, &Laid{b}, nil
}

// Again lays the nets of the same model in the shape x, in which its nodes were
// found. The positions of the free nodes of the answer start from there. same
// reports whether the lines cross and end as before.
func (l *Laid) Again(ctx context.Context, x []r3.Vec, final bool) (s *canopy.Structure, next *Laid, same bool, err error) {
	b := newBuilder(ctx, l.b.m)
	b.soft = !final
	b.found = &foundShape{old: l.b, x: x}
	if s, err = b.build(); err != nil {
		return nil, nil, false, err
	}
	for i, v := range b.node {
		if v >= 0 && s.FixedAt(int(v)) == 0 {
			s.Position[v] = x[l.b.node[i]]
		}
	}
	same = true
	for k, net := range b.laid {
		if net != nil && net.lat != nil {
			same = same && net.sameAs(l.b.laid[k], b, l.b)
		}
	}
	return s, &Laid{b}, same, nil
}

// sameAs reports whether two layouts of one net have the same crossings and
// lines.
func (net *laidNet) sameAs(old *laidNet, b, before *builder) bool {
	if len(net.chains) != len(old.chains) {
		return false
	}
	name := func(n *laidNet, b *builder, s int32) [2]int {
		if s >= 0 {
			return [2]int{int(s)%n.lat.ni + n.lat.i0, int(s)/n.lat.ni + n.lat.j0}
		}
		return [2]int{math.MaxInt, b.arrival[-1-s].edge}
	}
	for k, c := range net.chains {
		d := old.chains[k]
		if c.family != d.family || len(c.stops) != len(d.stops) {
			return false
		}
		for i := range c.stops {
			if name(net, b, c.stops[i]) != name(old, before, d.stops[i]) {
				return false
			}
		}
	}
	return true
}

// foundShape is where an earlier structure of the same model was found.
type foundShape struct {
	old *builder
	x   []r3.Vec
}

// edge returns the nodes along edge e, by length as drawn and in space as found.
func (f *foundShape) edge(e int) (t []float64, at []r3.Vec) {
	for k, v := range f.old.edgeNode[e] {
		t = append(t, f.old.nodeAt(e, k))
		at = append(at, f.x[v])
	}
	return t, at
}

// at returns the place at t of edge e.
func (f *foundShape) at(e int, t float64) r3.Vec {
	ts, at := f.edge(e)
	k := 1
	for k < len(ts)-1 && ts[k] < t {
		k++
	}
	return lerp(at[k-1], at[k], (t-ts[k-1])/(ts[k]-ts[k-1]))
}

// beyond is by how many meshes an equal-mesh net is continued beyond where it
// ended.
const beyond = 6

// lattice continues the net found for l beyond its boundary, one mesh after the
// other; nil where it is not an equal-mesh net.
func (f *foundShape) lattice(b *builder, l *loop, r *rim) *lattice {
	n := &f.old.m.Nets[l.index]
	k := slices.IndexFunc(f.old.loop, func(o *loop) bool { return o.net && o.index == l.index })
	if n.MeshLength == 0 || k < 0 || f.old.laid[k] == nil {
		return nil
	}
	old := f.old.laid[k]
	from := old.lat
	lat := &lattice{ni: from.ni + 2*beyond, nj: from.nj + 2*beyond, i0: from.i0 - beyond, j0: from.j0 - beyond, steps: from.steps, h: from.h}
	size := lat.ni * lat.nj
	if !b.crossings(lat.ni, lat.nj) {
		return nil
	}
	lat.at, lat.space, lat.known = make([]xy, size), make([]r3.Vec, size), make([]bool, size)
	layer := make([]int8, size) // 0 = not known
	for j := range from.nj {
		for i := range from.ni {
			if v := old.node[j*from.ni+i]; v >= 0 {
				p := (j+beyond)*lat.ni + i + beyond
				lat.space[p], layer[p] = f.x[v], 1
			}
		}
	}
	for d := int8(1); d <= beyond; d++ {
		for j := range lat.nj {
			for i := range lat.ni {
				if p := j*lat.ni + i; layer[p] == 0 {
					if v, ok := lat.continued(i, j, layer, d, n.MeshLength); ok {
						lat.space[p], layer[p] = v, d+1
					}
				}
			}
		}
	}
	for p := range layer {
		if lat.known[p] = layer[p] > 0; lat.known[p] {
			lat.at[p] = r.drop(lat.space[p])
		}
	}
	for p := range layer {
		for _, s := range lat.steps {
			if q := p + s[1]*lat.ni + s[0]; p%lat.ni+s[0] < lat.ni && q < size && lat.known[p] && lat.known[q] {
				lat.link = max(lat.link, math.Hypot(lat.at[p].x-lat.at[q].x, lat.at[p].y-lat.at[q].y))
			}
		}
	}
	return lat
}

// continued guesses the place of a crossing from those of the layers up to d:
// straight on along its lines, and as the corner of a parallelogram.
func (l *lattice) continued(i, j int, layer []int8, d int8, link float64) (r3.Vec, bool) {
	get := func(i, j int) (r3.Vec, bool) {
		if i < 0 || j < 0 || i >= l.ni || j >= l.nj {
			return r3.Vec{}, false
		}
		p := j*l.ni + i
		return l.space[p], layer[p] > 0 && layer[p] <= d
	}
	var sum r3.Vec
	num := 0.0
	for _, s := range [4][2]int{{1, 0}, {-1, 0}, {0, 1}, {0, -1}} {
		p, ok := get(i+s[0], j+s[1])
		if !ok {
			continue
		}
		if q, ok := get(i+2*s[0], j+2*s[1]); ok && p != q {
			sum = r3.Add(sum, r3.Add(p, r3.Scale(link, r3.Unit(r3.Sub(p, q)))))
			num++
		}
		for _, t := range [2][2]int{{s[1], s[0]}, {-s[1], -s[0]}} {
			q, ok1 := get(i+t[0], j+t[1])
			o, ok2 := get(i+s[0]+t[0], j+s[1]+t[1])
			if ok1 && ok2 {
				sum = r3.Add(sum, r3.Scale(0.5, r3.Add(p, r3.Sub(q, o))))
				num += 0.5
			}
		}
	}
	if num == 0 {
		return r3.Vec{}, false
	}
	return r3.Scale(1/num, sum), true
}
