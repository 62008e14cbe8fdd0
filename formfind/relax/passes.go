package relax

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/internal/crew"
)

// state is a problem on its way to rest.
//
// One iteration is two passes. The pass over elements turns positions into
// force densities and facets; the pass over nodes gathers what meets at each
// node, projects it and moves the node. Each item is written by one worker
// only and gathered in a fixed order, so the bits do not depend on the number
// of workers. An iteration moves about 130 bytes a triangle of uniform stress,
// 60 a member and 170 a node.
type state struct {
	*problem
	crew *crew.Crew

	x, next, before []r3.Vec // positions now, at the next step and at the one before
	v               []r3.Vec // m per step; force and mass are in units with Δt = 1
	mass            []float64
	stride2         []float64 // the longest step of a node, squared, m²
	meet            []float64 // sum of the sizes of the forces that meet at a node, N
	q               []float64 // force densities of members, N/m
	length          []float64 // of members, m; nil when nobody asks
	facets          []facet
	onRing          []r3.Vec // forces on the nodes of rings, nil without rings
	force0          []r3.Vec // forces of the last step
	lineOf          []int32  // index into line, −1; nil without lines
	parts           []sums
	smooth          float64    // damping in proportion to stiffness, steps
	safety          float64    // factor on all masses
	directed        []directed // masses with directions, nil without elastic elements
	contrast        float64    // between the stiffest direction and the lightest
}

// sums are what a pass over nodes adds up.
type sums struct {
	residual2 float64 // Σ|r|²
	kinetic   float64 // Σ½m|v|²
	fastest2  float64 // max |v|²
	work      float64 // Σ v·(r_before − r), twice which over the energy is the frequency squared
}

func (a *sums) add(b *sums) {
	a.residual2 += b.residual2
	a.kinetic += b.kinetic
	a.fastest2 = max(a.fastest2, b.fastest2)
	a.work += b.work
}

func newState(p *problem, x []r3.Vec, viscous bool) *state {
	n := p.n
	st := &state{
		problem: p, crew: crew.New((n + len(p.corners) + len(p.ends)) / (8 * block)),
		x: x, next: append([]r3.Vec(nil), x...), before: append([]r3.Vec(nil), x...),
		v: make([]r3.Vec, n), mass: make([]float64, n), meet: make([]float64, n), stride2: make([]float64, n),
		force0: make([]r3.Vec, n),
		q:      make([]float64, len(p.ends)), facets: make([]facet, len(p.corners)),
		parts: make([]sums, (n+block-1)/block), safety: 1, contrast: 1,
	}
	for _, l := range p.law {
		if l == byStretch && st.directed == nil {
			st.directed = make([]directed, n)
		}
	}
	for _, l := range p.triLaw {
		if l == elastic && st.directed == nil {
			st.directed = make([]directed, n)
		}
	}
	if p.hang != nil || len(p.cable) > 0 {
		st.length = make([]float64, len(p.ends))
	}
	if len(p.ring) > 0 {
		st.onRing = make([]r3.Vec, n)
	}
	if !viscous {
		st.smooth = smoothing
		st.safety = 1 + 2*smoothing
	}
	if len(p.line) > 0 {
		st.lineOf = make([]int32, n)
		for i := range st.lineOf {
			st.lineOf[i] = -1
		}
		for l, e := range p.line {
			st.lineOf[e.node] = int32(l)
		}
	}
	return st
}

// elements brings force densities and facets up to date with x.
func (st *state) elements() {
	st.crew.Run(blocks(len(st.ends)), st.memberBlock)
	if len(st.cable) > 0 {
		st.pullCables()
	}
	st.crew.Run(blocks(len(st.corners)), st.triangleBlock)
	if len(st.pocket) > 0 {
		st.pressPockets()
	}
}

func (st *state) memberBlock(b int) {
	lo, hi := span(b, len(st.ends))
	x := st.x
	tiny := 1e-12 * st.size
	for m := lo; m < hi; m++ {
		law := st.law[m]
		if law == byDensity && st.length == nil {
			st.q[m] = st.given[m]
			continue
		}
		e := st.ends[m]
		a, c := x[e[0]], x[e[1]]
		dx, dy, dz := c.X-a.X, c.Y-a.Y, c.Z-a.Z
		l := math.Sqrt(dx*dx + dy*dy + dz*dz)
		if st.length != nil {
			st.length[m] = l
		}
		switch law {
		case byDensity:
			st.q[m] = st.given[m]
		case byForce:
			st.q[m] = st.given[m] / max(l, tiny)
		case byStretch:
			t := st.given[m] * (l - st.rest[m])
			if t < 0 && !st.pushes[m] {
				t = 0
			}
			st.q[m] = t / max(l, tiny)
		}
	}
}

func (st *state) triangleBlock(b int) {
	lo, hi := span(b, len(st.corners))
	x := st.x
	for t := lo; t < hi; t++ {
		c := st.corners[t]
		p0, p1, p2 := x[c[0]], x[c[1]], x[c[2]]
		ax, ay, az := p1.X-p0.X, p1.Y-p0.Y, p1.Z-p0.Z
		bx, by, bz := p2.X-p0.X, p2.Y-p0.Y, p2.Z-p0.Z
		f := &st.facets[t]
		cx, cy, cz := ay*bz-az*by, az*bx-ax*bz, ax*by-ay*bx
		f.twice = r3.Vec{X: cx, Y: cy, Z: cz}
		if t < st.uniforms {
			l := math.Sqrt(cx*cx + cy*cy + cz*cz)
			f.g = 0
			if l > 0 {
				f.g = 0.5 * st.stress[t][0] / l
			}
			continue
		}
		st.pullWeighted(t, [3]r3.Vec{p0, p1, p2})
	}
}

// pullWeighted finds the force densities of a triangle that is not of uniform
// stress.
func (st *state) pullWeighted(t int, x [3]r3.Vec) {
	k := t - st.uniforms
	switch st.triLaw[t] {
	case elastic:
		ft := &st.fabric[k]
		s, _ := st.fabricLaw[st.fabricOf[t]].Stress([3]float64{st.stress[t][0], st.stress[t][1]}, ft.Strain(&x))
		st.density[k] = ft.Densities(s)
	case woven:
		twice := st.facets[t].twice
		l := norm(twice)
		st.density[k] = [3]float64{}
		if !(l > 0) {
			return
		}
		n := r3.Scale(1/l, twice)
		w := st.warpAt(t, x)
		w = unit(r3.Sub(w, r3.Scale(r3.Dot(w, n), n)))
		f := r3.Cross(n, w)
		var ew, ef [3]float64
		for i := range 3 {
			e := r3.Sub(x[(i+2)%3], x[(i+1)%3])
			ew[i], ef[i] = r3.Dot(e, w), r3.Dot(e, f)
		}
		// −A ∇φᵢ·σ∇φⱼ with 2A∇φᵢ = n × eᵢ = (−eᵢ·f, eᵢ·w) in warp and weft.
		sw, sf := st.stress[t][0]/(2*l), st.stress[t][1]/(2*l)
		for o := range 3 {
			i, j := (o+1)%3, (o+2)%3
			st.density[k][o] = -(sw*ef[i]*ef[j] + sf*ew[i]*ew[j])
		}
	}
}

// nodal returns the sum of all forces on node i but reactions, and the sum of
// the vector areas around it.
func (st *state) nodal(i int) (f, area r3.Vec) {
	x := st.x
	xi := x[i]
	f = st.lead[i]
	fx, fy, fz := f.X, f.Y, f.Z
	var nx, ny, nz float64
	split := st.cornerSplit[i]
	for _, c := range st.around[st.cornerAt[i]:split] {
		t := &st.facets[c.at>>2]
		p, o := x[c.prev], x[c.next]
		ex, ey, ez := p.X-o.X, p.Y-o.Y, p.Z-o.Z
		cx, cy, cz, g := t.twice.X, t.twice.Y, t.twice.Z, t.g
		fx -= g * (cy*ez - cz*ey)
		fy -= g * (cz*ex - cx*ez)
		fz -= g * (cx*ey - cy*ex)
		nx += cx
		ny += cy
		nz += cz
	}
	for _, c := range st.around[split:st.cornerAt[i+1]] {
		t := c.at >> 2
		d := &st.density[int(t)-st.uniforms]
		k := c.at & 3
		p, o := x[c.prev], x[c.next]
		qo, qp := d[after[after[k]]], d[after[k]]
		fx += qo*(o.X-xi.X) + qp*(p.X-xi.X)
		fy += qo*(o.Y-xi.Y) + qp*(p.Y-xi.Y)
		fz += qo*(o.Z-xi.Z) + qp*(p.Z-xi.Z)
		tw := &st.facets[t].twice
		nx += tw.X
		ny += tw.Y
		nz += tw.Z
	}
	for _, l := range st.links[st.linkAt[i]:st.linkAt[i+1]] {
		q := st.q[l.member]
		o := x[l.other]
		fx += q * (o.X - xi.X)
		fy += q * (o.Y - xi.Y)
		fz += q * (o.Z - xi.Z)
	}
	if st.push != nil || st.drape != nil || st.hang != nil {
		l := st.shapeLoad(i)
		fx += l.X
		fy += l.Y
		fz += l.Z
	}
	return r3.Vec{X: fx, Y: fy, Z: fz}, r3.Vec{X: nx, Y: ny, Z: nz}
}

// after is the next corner of a triangle.
var after = [4]int32{1, 2, 0, 0}

// shapeLoad is the part of the load on node i that depends on the shape:
// pressure and weights by current area and length.
func (st *state) shapeLoad(i int) (f r3.Vec) {
	for _, c := range st.around[st.cornerAt[i]:st.cornerAt[i+1]] {
		t := c.at >> 2
		tw := st.facets[t].twice
		if st.push != nil {
			p := st.push[t]
			f.X += p * tw.X
			f.Y += p * tw.Y
			f.Z += p * tw.Z
		}
		if st.drape != nil {
			f.Z -= st.drape[t] * norm(tw)
		}
	}
	if st.hang != nil {
		for _, l := range st.links[st.linkAt[i]:st.linkAt[i+1]] {
			f.Z -= st.hang[l.member] * st.length[l.member] / 2
		}
	}
	return f
}

// project leaves of v what moves node i in its mode; area is the sum of the
// vector areas around it.
func (st *state) project(i int, v, area r3.Vec) r3.Vec {
	if f := st.free[i]; f != canopy.DirAll {
		v = masked(v, f)
		area = masked(area, f)
	}
	switch st.mode[i] {
	case normal:
		d := unit(area)
		return r3.Scale(r3.Dot(v, d), d)
	case across:
		l := st.line[st.lineOf[i]]
		d := unit(masked(along(st.x[l.from], st.x[i], st.x[l.to]), st.free[i]))
		return r3.Sub(v, r3.Scale(r3.Dot(v, d), d))
	}
	return v
}

// move gathers the forces at x and steps to next: v becomes keep·v + push·r/m.
func (st *state) move(keep, push float64) sums {
	st.crew.Run(blocks(st.n), func(b int) {
		lo, hi := span(b, st.n)
		var s sums
		for i := lo; i < hi; i++ {
			if st.mode[i] == still {
				if st.tied[i] >= 0 {
					st.onRing[i], _ = st.nodal(i)
				}
				continue
			}
			f, area := st.nodal(i)
			v := st.v[i]
			if st.free[i] != canopy.DirAll || st.mode[i] == across {
				f = st.project(i, f, area)
				v = st.project(i, v, area)
			} else if st.mode[i] == normal {
				// As project does, with the normal's length found once.
				inv := 0.0
				if n2 := r3.Norm2(area); n2 > 0 {
					inv = 1 / n2
				}
				f = r3.Scale(inv*r3.Dot(f, area), area)
				v = r3.Scale(inv*r3.Dot(v, area), area)
			}
			st.step(i, f, v, keep, push, &s)
		}
		st.parts[b] = s
	})
	var all sums
	for b := range st.parts {
		all.add(&st.parts[b])
	}
	if len(st.ring) > 0 {
		s := st.moveRings(keep, push)
		all.add(&s)
	}
	return all
}

// smoothing damps the quickest modes of motion under kinetic damping, by
// −smoothing·K·v (the part of Rayleigh's damping in proportion to stiffness),
// for which the change of force over a step stands in. Without it their
// flutter makes the kinetic energy peak, and the canopy stop, long before the
// slow modes have got going. It asks for masses greater by 1 + 2·smoothing.
const smoothing = 0.1

// step moves node i by one step under the force f, with the velocity v before.
func (st *state) step(i int, f, v r3.Vec, keep, push float64, s *sums) {
	s.residual2 += f.X*f.X + f.Y*f.Y + f.Z*f.Z
	o := st.force0[i]
	st.force0[i] = f
	change := r3.Vec{X: f.X - o.X, Y: f.Y - o.Y, Z: f.Z - o.Z}
	s.work -= v.X*change.X + v.Y*change.Y + v.Z*change.Z
	if b := st.smooth; b > 0 && keep == 1 {
		f.X += b * change.X
		f.Y += b * change.Y
		f.Z += b * change.Z
	}
	m := st.mass[i]
	g := push / m
	d := st.directed != nil && st.directed[i].used
	if d {
		v = r3.Add(r3.Scale(keep, v), r3.Scale(push, st.directed[i].inverse.mul(f)))
	} else {
		v.X = keep*v.X + g*f.X
		v.Y = keep*v.Y + g*f.Y
		v.Z = keep*v.Z + g*f.Z
	}
	v2 := v.X*v.X + v.Y*v.Y + v.Z*v.Z
	if v2 > st.stride2[i] {
		v = r3.Scale(math.Sqrt(st.stride2[i]/v2), v)
		v2 = st.stride2[i]
	}
	st.v[i] = v
	x := st.x[i]
	st.next[i] = r3.Vec{X: x.X + v.X, Y: x.Y + v.Y, Z: x.Z + v.Z}
	if d {
		s.kinetic += 0.5 * r3.Dot(v, st.directed[i].mass.mul(v))
	} else {
		s.kinetic += 0.5 * m * v2
	}
	if !(v2 <= s.fastest2) { // not a number too
		s.fastest2 = v2
	}
}

// moveRings moves the rigid rings: what acts on a tied node in the directions
// in which it follows acts on the centre.
func (st *state) moveRings(keep, push float64) (s sums) {
	for _, r := range st.ring {
		c := r.centre
		f := st.onRing[c]
		for _, i := range r.nodes {
			f = r3.Add(f, masked(st.onRing[i], st.free[i]))
		}
		f = masked(f, st.free[c])
		st.step(int(c), f, masked(st.v[c], st.free[c]), keep, push, &s)
		st.follow(st.next, r)
	}
	return s
}

// follow lays the nodes of a ring at their places beside its centre in x.
func (st *state) follow(x []r3.Vec, r ringNodes) {
	c := st.s.Position[r.centre]
	for _, i := range r.nodes {
		offset := r3.Sub(st.s.Position[i], c)
		x[i] = choose(st.free[i], r3.Add(x[r.centre], offset), x[i])
	}
}

// advance makes the step that move has prepared.
func (st *state) advance() { st.before, st.x, st.next = st.x, st.next, st.before }
