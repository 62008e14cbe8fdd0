package mesh

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"anticlast/formfind/canopy"
	"gonum.org/v1/gonum/spatial/r3"
)

// Refinement is a structure on a mesh twice as fine, and how it came from the
// coarse one.
type Refinement struct {
	Fine *canopy.Structure
	// Parents are, for each fine node, the coarse nodes it lies half-way
	// between, the same one twice for a node that was there before. The
	// nodes of the coarse mesh come first and keep their numbers.
	Parents    [][2]int32
	MemberOf   []int32 // per fine member: the coarse member it is (part of)
	TriangleOf []int32 // per fine triangle: the coarse triangle it is part of

	coarse *canopy.Structure
	folds  [][2]int32 // coarse sides with one triangle, or more than two
}

// Refine divides every triangle of s into four and every member that lies on
// the side of a triangle into two. New nodes on fixed edges are put on their
// curves and fixed, new nodes of rigid rings on the circle. Other members (net
// links, masts, guys) are as they were: their nodes are real ones. Force
// densities of divided members are doubled and unstressed lengths halved, so
// that forces stay what they are. s is not changed; what needs no change is
// shared with it.
func Refine(s *canopy.Structure) (*Refinement, error) {
	if len(s.Corners) > MaxTriangles {
		return nil, Errors{{Reason: TooFine, Problem: fmt.Sprintf("refining %d triangles would give more than %d", len(s.Corners), 4*MaxTriangles)}}
	}
	r := &refiner{s: s, mid: make(map[[2]int32]int32, len(s.Corners)*3/2+16)}
	r.sides()
	r.nodes()
	r.members()
	r.triangles()
	r.chains()
	r.names()
	return &Refinement{Fine: r.f, Parents: r.parents, MemberOf: r.memberOf, TriangleOf: r.triangleOf, coarse: s, folds: r.folds()}, nil
}

// pick takes the coordinates in the directions of d from a, the others from b.
func pick(d canopy.Freedom, a, b r3.Vec) r3.Vec {
	if d.Has(0) {
		b.X = a.X
	}
	if d.Has(1) {
		b.Y = a.Y
	}
	if d.Has(2) {
		b.Z = a.Z
	}
	return b
}

type refiner struct {
	s, f       *canopy.Structure
	mid        map[[2]int32]int32 // side → new node
	parents    [][2]int32
	uses       []uint8        // per new node: triangles at its side, up to 3
	joined     map[int32]bool // new nodes on sides of several fabrics
	fabric     []int32        // per new node: fabric that made it
	memberOf   []int32
	triangleOf []int32
	halves     [][2]int32 // per coarse member: its fine members, the second −1 when undivided
	lineOf     map[int32]int32
	ringOf     map[int32]int32
}

func sideKey(a, b int32) [2]int32 { return [2]int32{min(a, b), max(a, b)} }

// at returns the new node on the side a–b.
func (r *refiner) at(a, b int32) (int32, bool) {
	m, ok := r.mid[sideKey(a, b)]
	return m, ok
}

// sides gives every side of a triangle its new node, in order of appearance.
func (r *refiner) sides() {
	s := r.s
	n := int32(len(s.Position))
	r.parents = make([][2]int32, n, int(n)+len(s.Corners)*3/2+16)
	for i := range r.parents {
		r.parents[i] = [2]int32{int32(i), int32(i)}
	}
	for t, c := range s.Corners {
		for k := range 3 {
			key := sideKey(c[k], c[(k+1)%3])
			m, seen := r.mid[key]
			if !seen {
				m = int32(len(r.parents))
				r.mid[key] = m
				r.parents = append(r.parents, key)
				r.uses = append(r.uses, 0)
				r.fabric = append(r.fabric, s.FabricOf[t])
			}
			if u := &r.uses[m-n]; *u < 3 {
				*u++
			}
			if r.fabric[m-n] != s.FabricOf[t] {
				if r.joined == nil {
					r.joined = map[int32]bool{}
				}
				r.joined[m] = true
			}
		}
	}
}

// rims finds new nodes on what films have for a common boundary: sides between
// supports at which two films end, other than seams.
func (r *refiner) rims() map[int32]bool {
	s, n := r.s, int32(len(r.s.Position))
	var rim map[int32]bool
	for m := range r.joined {
		if p := r.parents[m]; r.uses[m-n] == 2 && s.Fixed[p[0]]&s.Fixed[p[1]] != 0 {
			if rim == nil {
				rim = map[int32]bool{}
			}
			rim[m] = true
		}
	}
	if rim == nil {
		return nil
	}
	for _, l := range s.Lines {
		for j := 1; j < len(l.Nodes) && l.Role == "seam"; j++ {
			if m, ok := r.at(l.Nodes[j-1], l.Nodes[j]); ok {
				delete(rim, m)
			}
		}
	}
	return rim
}

// folds lists the sides with one triangle, or with more than two.
func (r *refiner) folds() [][2]int32 {
	var out [][2]int32
	for k, u := range r.uses {
		if u != 2 {
			out = append(out, r.parents[len(r.s.Position)+k])
		}
	}
	return out
}

// nodes places the nodes of the fine mesh.
func (r *refiner) nodes() {
	s := r.s
	n, total := len(s.Position), len(r.parents)
	f := &canopy.Structure{Curves: s.Curves, Groups: s.Groups, Fabrics: s.Fabrics, Enclosures: s.Enclosures, SelfWeight: s.SelfWeight}
	r.f = f
	f.Position = append(make([]r3.Vec, 0, total), s.Position...)
	f.Fixed = append(make([]canopy.Freedom, 0, total), s.Fixed...)
	for m := n; m < total; m++ {
		p := r.parents[m]
		f.Position = append(f.Position, mid(s.Position[p[0]], s.Position[p[1]]))
		f.Fixed = append(f.Fixed, 0)
	}
	f.Held = grown(s.Held, total, 0)
	f.Load = grown(s.Load, total, r3.Vec{})
	f.Master = grown(s.Master, total, -1)
	f.OnCurve = grown(s.OnCurve, total, -1)
	f.Param = grown(s.Param, total, 0)
	if s.Reference != nil {
		f.Reference = append(make([]r3.Vec, 0, total), s.Reference...)
		for m := n; m < total; m++ {
			p := r.parents[m]
			f.Reference = append(f.Reference, mid(s.Reference[p[0]], s.Reference[p[1]]))
		}
	}
	// A side of one triangle, or of one in each of two films, without a member
	// between supports is supported.
	rim := r.rims()
	cable := map[[2]int32]bool{}
	for _, e := range s.Ends {
		cable[sideKey(e[0], e[1])] = true
	}
	for m := n; m < total; m++ {
		if p := r.parents[m]; (r.uses[m-n] == 1 || rim[int32(m)]) && !cable[p] {
			f.Fixed[m] = s.Fixed[p[0]] & s.Fixed[p[1]]
		}
	}
	r.lineNodes()
	r.ringNodes()
}

// grown returns a copy of list with length n, filled up with v; nil stays nil.
func grown[T any](list []T, n int, v T) []T {
	if len(list) == 0 {
		return nil
	}
	out := append(make([]T, 0, n), list...)
	for len(out) < n {
		out = append(out, v)
	}
	return out
}

// lineNodes fixes the new nodes of fixed edges and puts them on their curves.
func (r *refiner) lineNodes() {
	s, f := r.s, r.f
	curveOf := make(map[string]int32, len(s.Curves))
	for i, c := range s.Curves {
		curveOf[c.Name] = int32(i)
	}
	r.lineOf = map[int32]int32{}
	for li, l := range s.Lines {
		ci, onCurve := curveOf[l.Name]
		onCurve = onCurve && s.OnCurve != nil
		var c curve
		if onCurve {
			c, onCurve = newCurve(s.Curves[ci])
		}
		for j := 1; j < len(l.Nodes); j++ {
			m, ok := r.at(l.Nodes[j-1], l.Nodes[j])
			if !ok {
				continue
			}
			r.lineOf[m] = int32(li)
			if l.Role == "seam" {
				continue
			}
			f.Fixed[m] = canopy.DirAll
			if !onCurve {
				continue
			}
			t0, t1 := 0.0, 1.0
			if j > 1 {
				t0 = s.Param[l.Nodes[j-1]]
			}
			if j < len(l.Nodes)-1 {
				t1 = s.Param[l.Nodes[j]]
			}
			t := (t0 + t1) / 2
			f.OnCurve[m], f.Param[m], f.Position[m] = ci, t, c.at(t)
		}
	}
}

// ringNodes puts the new nodes of rings on the circle and ties them.
func (r *refiner) ringNodes() {
	s, f := r.s, r.f
	r.ringOf = map[int32]int32{}
	for ri, g := range s.Rings {
		for j, a := range g.Nodes {
			b := g.Nodes[(j+1)%len(g.Nodes)]
			m, ok := r.at(a, b)
			if !ok {
				continue
			}
			r.ringOf[m] = int32(ri)
			f.Fixed[m] = s.Fixed[a] & s.Fixed[b]
			if c := s.MasterOf(int(a)); c >= 0 && c == s.MasterOf(int(b)) {
				f.Master[m] = c
			}
			if g.Centre < 0 {
				continue
			}
			o := s.Position[g.Centre]
			u, v := r3.Sub(s.Position[a], o), r3.Sub(s.Position[b], o)
			if w := r3.Add(u, v); r3.Norm(w) > 0.1*r3.Norm(u) {
				f.Position[m] = r3.Add(o, r3.Scale((r3.Norm(u)+r3.Norm(v))/2/r3.Norm(w), w))
			}
		}
	}
}

// members divides the members on sides of triangles.
func (r *refiner) members() {
	s, f := r.s, r.f
	r.halves = make([][2]int32, len(s.Ends))
	add := func(k int, a, b int32, parts float64) int32 {
		f.Ends = append(f.Ends, [2]int32{a, b})
		r.memberOf = append(r.memberOf, int32(k))
		given := s.Given[k]
		if s.Law[k] == canopy.LawForceDensity {
			given *= parts
		}
		f.Given = append(f.Given, given)
		if s.Unstressed != nil {
			f.Unstressed = append(f.Unstressed, s.Unstressed[k]/parts)
		}
		return int32(len(f.Ends) - 1)
	}
	for k, e := range s.Ends {
		if m, ok := r.at(e[0], e[1]); ok {
			r.halves[k] = [2]int32{add(k, e[0], m, 2), add(k, m, e[1], 2)}
		} else {
			r.halves[k] = [2]int32{add(k, e[0], e[1], 1), -1}
		}
	}
	f.Kind = taken(s.Kind, r.memberOf)
	f.Law = taken(s.Law, r.memberOf)
	f.Stiffness = taken(s.Stiffness, r.memberOf)
	f.Weight = taken(s.Weight, r.memberOf)
	f.Strength = taken(s.Strength, r.memberOf)
	f.Group = taken(s.Group, r.memberOf)
	f.CableOf = taken(s.CableOf, r.memberOf)
}

// taken returns list[from[i]] for all i; nil stays nil.
func taken[T any](list []T, from []int32) []T {
	if len(list) == 0 {
		return nil
	}
	out := make([]T, len(from))
	for i, k := range from {
		out[i] = list[k]
	}
	return out
}

// triangles divides each triangle into three at its corners and one in its
// middle.
func (r *refiner) triangles() {
	s, f := r.s, r.f
	f.Corners = make([][3]int32, 0, 4*len(s.Corners))
	r.triangleOf = make([]int32, 0, 4*len(s.Corners))
	for t, c := range s.Corners {
		ab, _ := r.at(c[0], c[1])
		bc, _ := r.at(c[1], c[2])
		ca, _ := r.at(c[2], c[0])
		f.Corners = append(f.Corners, [3]int32{c[0], ab, ca}, [3]int32{ab, c[1], bc}, [3]int32{ca, bc, c[2]}, [3]int32{ab, bc, ca})
		r.triangleOf = append(r.triangleOf, int32(t), int32(t), int32(t), int32(t))
	}
	f.FabricOf = taken(s.FabricOf, r.triangleOf)
	f.Stress = taken(s.Stress, r.triangleOf)
	f.Warp = taken(s.Warp, r.triangleOf)
	for t, c := range f.Corners {
		fab := &f.Fabrics[f.FabricOf[t]]
		if fab.WarpRule == canopy.WarpAlong {
			continue
		}
		p, q, v := f.Position[c[0]], f.Position[c[1]], f.Position[c[2]]
		normal := r3.Cross(r3.Sub(q, p), r3.Sub(v, p))
		if r3.Norm(normal) == 0 {
			continue
		}
		d := r3.Sub(r3.Scale(1.0/3, r3.Add(p, r3.Add(q, v))), fab.WarpCentre)
		if w := canopy.WarpAbout(fab.WarpRule, fab.WarpAxis, d, r3.Unit(normal)); w != (r3.Vec{}) {
			f.Warp[t] = w
		}
	}
}

// chains divides cables, rings and lines.
func (r *refiner) chains() {
	s, f := r.s, r.f
	f.Cables = slices.Clone(s.Cables)
	for i := range f.Cables {
		c, old := &f.Cables[i], &s.Cables[i]
		c.Members, c.Nodes = nil, nil
		for j, k := range old.Members {
			h := r.halves[k]
			c.Nodes = append(c.Nodes, old.Nodes[j])
			if h[1] < 0 {
				c.Members = append(c.Members, h[0])
				continue
			}
			m, _ := r.at(old.Nodes[j], old.Nodes[j+1])
			c.Nodes = append(c.Nodes, m)
			if s.Ends[k][0] != old.Nodes[j] {
				h[0], h[1] = h[1], h[0]
			}
			c.Members = append(c.Members, h[0], h[1])
		}
		c.Nodes = append(c.Nodes, old.Nodes[len(old.Nodes)-1])
	}
	f.Rings = slices.Clone(s.Rings)
	for i := range f.Rings {
		g := &f.Rings[i]
		closed := append(slices.Clone(g.Nodes), g.Nodes[0])
		fine := r.divided(closed)
		g.Nodes = fine[:len(fine)-1]
	}
	f.Lines = slices.Clone(s.Lines)
	for i := range f.Lines {
		f.Lines[i].Nodes = r.divided(f.Lines[i].Nodes)
	}
}

// divided returns a chain of nodes with the new ones between.
func (r *refiner) divided(nodes []int32) []int32 {
	out := make([]int32, 0, 2*len(nodes))
	for j, i := range nodes {
		if j > 0 {
			if m, ok := r.at(nodes[j-1], i); ok {
				out = append(out, m)
			}
		}
		out = append(out, i)
	}
	return out
}

// names numbers nodes and members anew along the edges they are named after.
func (r *refiner) names() {
	s, f := r.s, r.f
	if s.MemberName.Len() > 0 {
		r.memberNames()
	}
	if s.NodeName.Len() == 0 {
		return
	}
	n, total := len(s.Position), len(f.Position)
	base := make([]string, total)
	keep := make([]string, n)
	for i := range n {
		name := s.NodeName.At(i)
		if b, ok := numberedBase(name); ok {
			base[i] = b
		} else {
			keep[i] = name
		}
	}
	for m := n; m < total; m++ {
		base[m] = f.Fabrics[r.fabric[m-n]].Name
		if l, ok := r.lineOf[int32(m)]; ok {
			base[m] = s.Lines[l].Name
		} else if g, ok := r.ringOf[int32(m)]; ok {
			base[m] = s.Rings[g].Name
		}
	}
	if s.MemberName.Len() > 0 {
		for k, e := range s.Ends {
			if m, ok := r.at(e[0], e[1]); ok {
				name := s.MemberName.At(k)
				if b, ok := numberedBase(name); ok {
					name = b
				}
				base[m] = name
			}
		}
	}
	number := make([]int, total)
	next := map[string]int{}
	give := func(i int32, of string) {
		if number[i] == 0 && base[i] == of && of != "" {
			next[of]++
			number[i] = next[of]
		}
	}
	for _, g := range f.Rings {
		for _, i := range g.Nodes {
			give(i, g.Name)
		}
	}
	for _, l := range f.Lines {
		for _, i := range l.Nodes {
			give(i, l.Name)
		}
	}
	for k := range f.Ends {
		name, ok := numberedBase(f.MemberName.At(k))
		if ok {
			give(f.Ends[k][0], name)
			give(f.Ends[k][1], name)
		}
	}
	for i := range base {
		give(int32(i), base[i])
	}
	for i := range total {
		if i < n && keep[i] != "" {
			f.NodeName.Append(keep[i])
		} else {
			f.NodeName.Append(numbered(base[i], number[i]))
		}
	}
}

func (r *refiner) memberNames() {
	s, f := r.s, r.f
	divided := map[string]bool{}
	for k, h := range r.halves {
		if h[1] >= 0 {
			name := s.MemberName.At(k)
			if b, ok := numberedBase(name); ok {
				name = b
			}
			divided[name] = true
		}
	}
	next := map[string]int{}
	for _, k := range r.memberOf {
		name := s.MemberName.At(int(k))
		b, ok := numberedBase(name)
		if !ok {
			b = name
		}
		if divided[b] {
			next[b]++
			name = numbered(b, next[b])
		}
		f.MemberName.Append(name)
	}
}

// numberedBase splits off what numbered has added.
func numberedBase(name string) (string, bool) {
	i := strings.LastIndexByte(name, ':')
	if i < 0 {
		return name, false
	}
	if k, err := strconv.Atoi(name[i+1:]); err != nil || k < 0 || k > math.MaxInt32 {
		return name, false
	}
	return name[:i], true
}
