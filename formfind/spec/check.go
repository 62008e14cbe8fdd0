package spec

import (
	"fmt"
	"math"

	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

// check finds what is wrong between parts that are each well written.
func (d *drawn) check() {
	d.edgesHaveKinds()
	d.boundaries()
	d.inside()
	d.drawnAir()
	d.roles()
	d.ringUse()
	d.holds()
	d.unusedPoints()
	d.duplicateEdges()
	d.supported()
	if len(d.m.Edges) == 0 && len(d.m.Stays) == 0 && !d.r.diags.failed() {
		d.r.fail(d.pointsKey, (*place)(nil).down("points"), "the model has points but nothing between them", "add edges, and fabrics or nets inside them")
	}
}

// edgesHaveKinds completes the kinds of edges once all cables are known.
func (d *drawn) edgesHaveKinds() {
	for i, e := range d.m.Edges {
		if d.edgeHas[i] == "" {
			d.r.fail(d.edgeAt[i].n, d.edgeAt[i].p, fmt.Sprintf("edge %q is neither a cable, nor fixed, nor a seam", e.Name), "add cable: {force: 25 kN}, fixed: straight or seam: true, or name it in a cable under cables")
		}
	}
}

// users counts the fabrics and nets along each edge.
func (d *drawn) users() []int {
	n := make([]int, len(d.m.Edges))
	count := func(refs []ref) {
		for _, q := range refs {
			if i, ok := d.edge[q.name]; ok {
				n[i]++
			}
		}
	}
	for _, refs := range d.boundaryRefs {
		count(refs)
	}
	for _, h := range d.holeRefs {
		count(h.refs)
	}
	for _, l := range d.lineRefs { // fabric on both sides
		count([]ref{l.ref, l.ref})
	}
	return n
}

func (d *drawn) roles() {
	users := d.users()
	within := map[string]bool{}
	for _, l := range d.lineRefs {
		within[l.name] = true
	}
	for i := range d.m.Edges {
		e := &d.m.Edges[i]
		if e.Kind != canopy.EdgeCable {
			continue
		}
		switch d.edgeRole[i] {
		case "edge":
			e.Role = canopy.KindEdgeCable
		case "ridge":
			e.Role = canopy.KindRidgeCable
		case "valley":
			e.Role = canopy.KindValleyCable
		default:
			e.Role = canopy.KindCable
			if users[i] > 0 && !within[e.Name] {
				e.Role = canopy.KindEdgeCable
			}
		}
	}
	for i, e := range d.m.Edges {
		if d.edgeHas[i] == "seam" && users[i] < 2 {
			d.r.fail(d.edgeAt[i].n, d.edgeAt[i].p, fmt.Sprintf("edge %q is a seam but bounds %d fabric%s", e.Name, users[i], plural(users[i])), "a seam joins two fabrics; a free edge needs a cable")
		}
		if d.edgeHas[i] == "fixed" && users[i] == 0 {
			d.r.fail(d.edgeAt[i].n, d.edgeAt[i].p, fmt.Sprintf("edge %q is fixed but bounds nothing", e.Name), "name it in the boundary of a fabric or net, or remove it")
		}
	}
}

// boundaries checks the boundary of every fabric and net.
func (d *drawn) boundaries() {
	for k := range len(d.boundaryRefs) + len(d.holeRefs) {
		var refs []ref
		what := ""
		switch f, n := len(d.m.Fabrics), len(d.boundaryRefs); {
		case k < f:
			refs, what = d.boundaryRefs[k], fmt.Sprintf("fabric %q", d.m.Fabrics[k].Name)
		case k < n:
			refs, what = d.boundaryRefs[k], fmt.Sprintf("net %q", d.m.Nets[k-f].Name)
		default:
			refs, what = d.holeRefs[k-n].refs, d.holeRefs[k-n].what
		}
		edges, good := make([]int, 0, len(refs)), len(refs) > 1
		seen := map[int]bool{}
		for _, q := range refs {
			i := d.findEdge(q)
			if i < 0 {
				good = false
				continue
			}
			if seen[i] {
				d.r.fail(q.n, q.p, fmt.Sprintf("edge %q is in the boundary of %s twice", q.name, what), "remove one of them")
				good = false
				continue
			}
			seen[i] = true
			edges = append(edges, i)
			good = good && d.edgeGood[i]
		}
		if !good {
			continue
		}
		outline, ok := d.loop(refs, edges, what)
		if !ok {
			continue
		}
		if !d.crossings(refs, edges, outline, what) && k < len(d.m.Fabrics) {
			d.ringInside(k, outline, what)
		}
	}
}

// contour is a closed boundary as a chain of places.
type contour struct {
	at   []r3.Vec
	edge []int // position in the boundary of the edge that starts at at[i]
}

// loop checks that the edges form one closed loop and returns it.
func (d *drawn) loop(refs []ref, edges []int, what string) (contour, bool) {
	ends := func(i int) [2]string { return [2]string{d.m.Edges[i].From, d.m.Edges[i].To} }
	if len(edges) == 2 {
		// walk turns the first edge either way and both may do.
		a, b := ends(edges[0]), ends(edges[1])
		if !(a == b || a == [2]string{b[1], b[0]}) {
			d.r.fail(refs[1].n, refs[1].p, fmt.Sprintf("the boundary of %s is not closed: edges %q and %q do not have both ends in common", what, refs[0].name, refs[1].name), "a boundary of two edges runs there and back")
			return contour{}, false
		}
	}
	nodes, broken := walk(ends, edges)
	if broken >= 0 {
		hint := "list the edges in order around it"
		if order := d.order(edges); order != nil {
			names := make([]string, len(order))
			for i, e := range order {
				names[i] = d.m.Edges[e].Name
			}
			hint = fmt.Sprintf("in this order they do: [%s]", joinComma(names))
		}
		d.r.fail(refs[broken].n, refs[broken].p, fmt.Sprintf("the boundary of %s breaks: edge %q does not start or end at point %q, where it has got to along %q", what, refs[broken].name, nodes[len(nodes)-1], refs[broken-1].name), hint)
		return contour{}, false
	}
	last := len(refs) - 1
	if nodes[0] != nodes[len(nodes)-1] {
		d.r.fail(refs[last].n, refs[last].p, fmt.Sprintf("the boundary of %s is not closed: it starts at point %q and ends at %q", what, nodes[0], nodes[len(nodes)-1]), fmt.Sprintf("add the edge from %q to %q", nodes[len(nodes)-1], nodes[0]))
		return contour{}, false
	}
	seen := map[string]bool{}
	for i, n := range nodes[:len(nodes)-1] {
		if seen[n] {
			d.r.fail(refs[i].n, refs[i].p, fmt.Sprintf("the boundary of %s passes point %q twice", what, n), "split it into two fabrics")
			return contour{}, false
		}
		seen[n] = true
	}
	var o contour
	for k, i := range edges {
		e := d.m.Edges[i]
		a, b := d.m.Points[d.point[nodes[k]]].At, d.m.Points[d.point[nodes[k+1]]].At
		if !e.Arc {
			o.at = append(o.at, a)
			o.edge = append(o.edge, k)
			continue
		}
		const pieces = 24
		for j := range pieces {
			o.at = append(o.at, arcAt(a, e.Through, b, float64(j)/pieces))
			o.edge = append(o.edge, k)
		}
	}
	return o, true
}

func joinComma(s []string) string {
	out := ""
	for i, w := range s {
		if i > 0 {
			out += ", "
		}
		out += w
	}
	return out
}

// order puts edges into an order in which they form a closed loop, nil when
// there is none.
func (d *drawn) order(edges []int) []int {
	if len(edges) > 100 {
		return nil
	}
	left := append([]int(nil), edges[1:]...)
	out := []int{edges[0]}
	start, cur := d.m.Edges[edges[0]].From, d.m.Edges[edges[0]].To
	for len(left) > 0 {
		found := false
		for k, i := range left {
			e := d.m.Edges[i]
			if e.From == cur {
				cur = e.To
			} else if e.To == cur {
				cur = e.From
			} else {
				continue
			}
			out = append(out, i)
			left = append(left[:k], left[k+1:]...)
			found = true
			break
		}
		if !found {
			return nil
		}
	}
	if cur != start {
		return nil
	}
	return out
}

// arcAt returns the place at the part t of the circular arc from a through m
// to b.
func arcAt(a, m, b r3.Vec, t float64) r3.Vec {
	u, v := r3.Sub(m, a), r3.Sub(b, a)
	w := r3.Cross(u, v)
	ww := r3.Norm2(w)
	if ww == 0 {
		return r3.Add(a, r3.Scale(t, v))
	}
	// Centre from a of the circle through three points.
	c := r3.Scale(1/(2*ww), r3.Add(r3.Scale(r3.Norm2(u), r3.Cross(v, w)), r3.Scale(r3.Norm2(v), r3.Cross(w, u))))
	radius := r3.Norm(c)
	ex := r3.Scale(-1/radius, c)
	ey := r3.Cross(r3.Scale(1/math.Sqrt(ww), w), ex)
	angle := func(p r3.Vec) float64 {
		q := r3.Sub(p, c)
		x := math.Atan2(r3.Dot(q, ey), r3.Dot(q, ex))
		if x < 0 {
			x += 2 * math.Pi
		}
		return x
	}
	s, co := math.Sincos(angle(v) * t)
	return r3.Add(a, r3.Add(c, r3.Scale(radius, r3.Add(r3.Scale(co, ex), r3.Scale(s, ey)))))
}

// maxPairs bounds the work of looking for crossings in one model.
const maxPairs = 50e6

// crossings finds edges of a boundary that cross or touch each other, seen in
// plan, or in the plane of a boundary that stands upright. Edges that pass
// each other far above one another, as in a steep twisted panel, do not cross.
func (d *drawn) crossings(refs []ref, edges []int, o contour, what string) bool {
	p := project(o.at)
	n := len(p.xy)
	if d.pairs += n * n; d.pairs > maxPairs {
		return false // left to the mesher
	}
	reported := false
	type pair struct{ a, b int }
	said := map[pair]bool{}
	for i := range n {
		i1 := (i + 1) % n
		for j := i + 1; j < n; j++ {
			j1 := (j + 1) % n
			adjacent := j == i1 || j1 == i
			var hit bool
			if adjacent {
				if n > 2 {
					hit = p.foldsBack(i, i1, j, j1)
				}
			} else {
				hit = p.cross(i, i1, j, j1)
			}
			if !hit || o.edge[i] == o.edge[j] {
				continue
			}
			k := pair{o.edge[i], o.edge[j]}
			if said[k] {
				continue
			}
			said[k] = true
			reported = true
			if len(said) > 3 {
				continue
			}
			verb := "cross each other"
			if adjacent {
				verb = "lie on each other"
			}
			d.r.fail(refs[k.b].n, refs[k.b].p, fmt.Sprintf("the boundary of %s crosses itself: edges %q and %q %s", what, refs[k.a].name, refs[k.b].name, verb), "check the order of its corners")
		}
	}
	return reported
}

// plane is an outline seen along one direction.
type plane struct {
	xy    [][2]float64
	depth []float64
	size  float64
}

// project looks at points from above, or square to their best plane when from
// above they are all on one line.
func project(at []r3.Vec) plane {
	var c r3.Vec
	for _, v := range at {
		c = r3.Add(c, r3.Scale(1/float64(len(at)), v))
	}
	p := plane{xy: make([][2]float64, len(at)), depth: make([]float64, len(at))}
	var sxx, sxy, syy, szz float64
	for i, v := range at {
		v = r3.Sub(v, c)
		p.xy[i], p.depth[i] = [2]float64{v.X, v.Y}, v.Z
		sxx, sxy, syy, szz = sxx+v.X*v.X, sxy+v.X*v.Y, syy+v.Y*v.Y, szz+v.Z*v.Z
	}
	// Principal directions in plan.
	theta := math.Atan2(2*sxy, sxx-syy) / 2
	sin, cos := math.Sincos(theta)
	minor := sxx*sin*sin - 2*sxy*sin*cos + syy*cos*cos
	if minor <= 1e-8*(sxx+syy+szz) {
		for i, v := range at {
			v = r3.Sub(v, c)
			p.xy[i] = [2]float64{v.X*cos + v.Y*sin, v.Z}
			p.depth[i] = v.Y*cos - v.X*sin
		}
	}
	for _, q := range p.xy {
		p.size = max(p.size, math.Hypot(q[0], q[1]))
	}
	return p
}

func side(a, b, c [2]float64) float64 {
	return (b[0]-a[0])*(c[1]-a[1]) - (b[1]-a[1])*(c[0]-a[0])
}

// cross reports whether the segments from a to b and from c to e meet.
func (p *plane) cross(a, b, c, e int) bool {
	A, B, C, E := p.xy[a], p.xy[b], p.xy[c], p.xy[e]
	eps := 1e-9 * p.size * p.size
	s1, s2, s3, s4 := side(A, B, C), side(A, B, E), side(C, E, A), side(C, E, B)
	near := func(s float64) bool { return math.Abs(s) <= eps }
	if (s1 > eps && s2 > eps) || (s1 < -eps && s2 < -eps) || (s3 > eps && s4 > eps) || (s3 < -eps && s4 < -eps) {
		return false
	}
	// Where they meet along each, to compare depths.
	t, u := 0.5, 0.5
	switch {
	case near(s1) && near(s2): // on one line, or one of them a point
		return p.overlap(a, b, c, e)
	case math.Abs(s3-s4) > 0 && math.Abs(s1-s2) > 0:
		t, u = s3/(s3-s4), s1/(s1-s2)
	default:
		return false
	}
	gap := math.Abs(p.depth[a] + t*(p.depth[b]-p.depth[a]) - p.depth[c] - u*(p.depth[e]-p.depth[c]))
	return gap <= p.size
}

// overlap reports whether two segments on one line share a stretch, in space.
func (p *plane) overlap(a, b, c, e int) bool {
	A, B := p.xy[a], p.xy[b]
	dx, dy := B[0]-A[0], B[1]-A[1]
	l2 := dx*dx + dy*dy
	if l2 <= 1e-18*p.size*p.size {
		return false
	}
	at := func(q [2]float64) float64 { return ((q[0]-A[0])*dx + (q[1]-A[1])*dy) / l2 }
	u, v := at(p.xy[c]), at(p.xy[e])
	du, dv := p.depth[c], p.depth[e]
	if u > v {
		u, v, du, dv = v, u, dv, du
	}
	lo, hi := max(0, u), min(1, v)
	if hi-lo < 1e-9 {
		return false
	}
	mid := (lo + hi) / 2
	gap := math.Abs(p.depth[a] + mid*(p.depth[b]-p.depth[a]) - du - (mid-u)/(v-u)*(dv-du))
	return gap <= 1e-6*p.size
}

// foldsBack reports whether two neighbouring segments lie on each other.
func (p *plane) foldsBack(i, i1, j, j1 int) bool {
	a, m, b := i, i1, j1
	if j1 == i {
		a, m, b = j, i, i1
	}
	u := r3.Vec{X: p.xy[a][0] - p.xy[m][0], Y: p.xy[a][1] - p.xy[m][1], Z: p.depth[a] - p.depth[m]}
	v := r3.Vec{X: p.xy[b][0] - p.xy[m][0], Y: p.xy[b][1] - p.xy[m][1], Z: p.depth[b] - p.depth[m]}
	lu, lv := r3.Norm(u), r3.Norm(v)
	return r3.Norm(r3.Cross(u, v)) <= 1e-6*lu*lv && r3.Dot(u, v) > 0
}

// ringInside checks that the ring of fabric k fits into its boundary.
func (d *drawn) ringInside(k int, o contour, what string) {
	i, ok := d.ring[d.m.Fabrics[k].Ring]
	if !ok {
		return
	}
	ring := d.m.Rings[i]
	pi, ok := d.point[ring.At]
	if !ok || ring.Radius <= 0 {
		return
	}
	c := d.m.Points[pi].At
	area, reach := 0.0, 0.0
	inside := false
	nearest := math.Inf(1)
	for j, a := range o.at {
		b := o.at[(j+1)%len(o.at)]
		area += (a.X-c.X)*(b.Y-c.Y) - (b.X-c.X)*(a.Y-c.Y)
		reach = max(reach, r3.Norm(r3.Sub(a, c)))
		if (a.Y > c.Y) != (b.Y > c.Y) && c.X < a.X+(c.Y-a.Y)/(b.Y-a.Y)*(b.X-a.X) {
			inside = !inside
		}
		ab := r3.Vec{X: b.X - a.X, Y: b.Y - a.Y}
		ac := r3.Vec{X: c.X - a.X, Y: c.Y - a.Y}
		t := 0.0
		if l2 := r3.Norm2(ab); l2 > 0 {
			t = min(1, max(0, r3.Dot(ab, ac)/l2))
		}
		nearest = min(nearest, r3.Norm(r3.Sub(ac, r3.Scale(t, ab))))
	}
	area = math.Abs(area) / 2
	at := d.ringAt[i]
	level := math.Abs(ring.Axis.Z) > 0.9
	switch {
	case ring.Radius >= reach || level && area > 0 && math.Pi*ring.Radius*ring.Radius >= area:
		d.r.fail(at.n, at.p.down("radius"), fmt.Sprintf("ring %q of radius %.4g m is larger than the boundary of %s", ring.Name, ring.Radius, what), "make the ring smaller")
	case level && area > 1e-6*reach*reach && (!inside || nearest <= ring.Radius):
		d.r.warn(at.n, at.p, fmt.Sprintf("ring %q reaches over the boundary of %s, seen in plan", ring.Name, what), "check the place of its point and its radius")
	}
}

// ringUse checks that each ring is in one fabric.
func (d *drawn) ringUse() {
	for i, ring := range d.m.Rings {
		u := d.ringUsers[i]
		if len(u) == 0 {
			d.r.warn(d.ringAt[i].n, d.ringAt[i].p, fmt.Sprintf("ring %q is in no fabric", ring.Name), "name it in a fabric: ring: "+ring.Name)
		}
		if len(u) > 1 {
			d.r.fail(u[1].n, u[1].p, fmt.Sprintf("ring %q is in two fabrics, %q and %q", ring.Name, u[0].name, u[1].name), "give each fabric its own ring")
		}
	}
}

// hold is what keeps a point in place once the rest of the model is known.
type hold struct {
	fixed canopy.Freedom // directions of its support
	held  bool
}

// settle decides for every point whether it is anchored, held or free, by the
// rule that the key hold documents.
func (d *drawn) settle() []hold {
	n := len(d.m.Points)
	heads, toFind := make([]bool, n), make([]bool, n)
	for _, s := range d.m.Stays {
		h, ok := d.point[stayHead(s)]
		if !ok {
			continue
		}
		heads[h] = true
		if stayForceUnknown(s) {
			toFind[h] = true
		}
	}
	moves := make([]canopy.Freedom, n)
	for _, r := range d.m.Rings {
		if i, ok := d.point[r.At]; ok && r.Rigid {
			moves[i] |= r.Free
		}
	}
	out := make([]hold, n)
	for i, p := range d.m.Points {
		h := p.Hold
		if h == canopy.HoldAuto {
			switch {
			case moves[i] != 0 || !heads[i]:
				h = canopy.HoldAnchored
			case toFind[i]:
				h = canopy.HoldHeld
			default:
				h = canopy.HoldFree
			}
		}
		switch h {
		case canopy.HoldAnchored:
			out[i].fixed = canopy.DirAll
			if p.Fixed != 0 {
				out[i].fixed = p.Fixed
			}
			out[i].fixed &^= moves[i]
		case canopy.HoldHeld:
			out[i].held = true
		case canopy.HoldFree:
			if moves[i] != 0 {
				out[i].fixed = canopy.DirAll &^ moves[i]
			}
		}
	}
	return out
}

// stayHead names the point that a mast carries or a guy stays.
func stayHead(s canopy.Stay) string {
	if s.Mast {
		return s.To
	}
	return s.From
}

func stayForceUnknown(s canopy.Stay) bool {
	return !s.HasForce && s.Length == 0 && s.Unstressed == 0
}

// holds checks what keeps points in place against masts, guys, rings and
// edges.
func (d *drawn) holds() {
	n := len(d.m.Points)
	settled := d.settle()
	stays := make([]int, n)     // masts and guys at each point
	unknown := make([]int, n)   // those whose force is to be found
	attached := make([]bool, n) // something other than a stay pulls
	ringAt := map[int]string{}
	for k, r := range d.m.Rings {
		i, ok := d.point[r.At]
		if !ok {
			continue
		}
		attached[i] = true
		at := d.ringAt[k]
		if first, twice := ringAt[i]; twice {
			d.r.fail(at.n, at.p.down("at"), fmt.Sprintf("rings %q and %q are at the same point %q", first, r.Name, r.At), "give each ring its own point")
		}
		ringAt[i] = r.Name
		if r.Rigid && r.Free != 0 && d.m.Points[i].Hold == canopy.HoldHeld {
			d.r.fail(at.n, at.p.down("free"), fmt.Sprintf("ring %q may move but its point %q is held", r.Name, r.At), "leave out free, or do not hold the point")
		}
	}
	for _, q := range d.insideRefs {
		if i, ok := d.point[q.name]; ok {
			attached[i] = true
		}
	}
	for k, e := range d.m.Edges {
		for _, name := range [2]string{e.From, e.To} {
			i, ok := d.point[name]
			if !ok {
				continue
			}
			attached[i] = true
			if e.Kind == canopy.EdgeFixed && d.edgeHas[k] == "fixed" && !settled[i].held && settled[i].fixed == 0 {
				d.r.fail(d.edgeAt[k].n, d.edgeAt[k].p, fmt.Sprintf("edge %q is fixed but its end %q is free", e.Name, name), "anchor the point, or make the edge a cable")
			}
		}
	}
	for k, s := range d.m.Stays {
		i, ok1 := d.point[s.From]
		j, ok2 := d.point[s.To]
		if !ok1 || !ok2 {
			continue
		}
		stays[i]++
		stays[j]++
		if !stayForceUnknown(s) {
			continue
		}
		unknown[i]++
		unknown[j]++
		what, at := "guy", d.stayAt[k]
		if s.Mast {
			what = "mast"
		}
		loose := ""
		for _, x := range [2]int{i, j} {
			if !settled[x].held && settled[x].fixed != canopy.DirAll {
				loose = d.m.Points[x].Name
			}
		}
		switch {
		case loose != "":
			d.r.fail(at.n, at.p, fmt.Sprintf("%s %q has no force, and its end %q is free to move", what, s.Name, loose), "give the force or the length, or hold the point: hold: held")
		case !settled[i].held && !settled[j].held:
			d.r.fail(at.n, at.p, fmt.Sprintf("%s %q has no force, and neither of its ends is held for it to balance", what, s.Name), "give its force, or hold its end: hold: held")
		}
	}
	for i, p := range d.m.Points {
		at := d.pointAt[i]
		switch {
		case p.Hold == canopy.HoldHeld && stays[i] == 0:
			d.r.fail(at.n, at.p, fmt.Sprintf("point %q is held but no mast or guy is there to balance it", p.Name), "add a mast or guy, or anchor it: hold: anchored")
		case p.Hold == canopy.HoldHeld && unknown[i] == 0:
			d.r.fail(at.n, at.p, fmt.Sprintf("point %q is held but all its masts and guys have their forces, so that none can balance it", p.Name), "leave out the force of one of them, or let the point find its place: hold: free")
		case p.Hold == canopy.HoldFree && !attached[i] && stays[i] == 0 && d.used[i]:
			d.r.fail(at.n, at.p, fmt.Sprintf("point %q is free but nothing is attached to it", p.Name), "attach an edge, a mast or a guy, or anchor it")
		}
	}
}

// unusedPoints warns of points that nothing refers to, and of those that were
// perhaps meant to be one.
func (d *drawn) unusedPoints() {
	for i, p := range d.m.Points {
		if !d.used[i] {
			d.r.warn(d.pointAt[i].n, d.pointAt[i].p, fmt.Sprintf("point %q is not used", p.Name), "remove it, or use it in an edge")
		}
	}
	first := make(map[r3.Vec]int, len(d.m.Points))
	for i, p := range d.m.Points {
		if !d.used[i] {
			continue
		}
		if j, twice := first[p.At]; twice {
			d.r.warn(d.pointAt[i].n, d.pointAt[i].p, fmt.Sprintf("point %q is at the same place as %q, but not connected to it", p.Name, d.m.Points[j].Name), "use one point for both")
			continue
		}
		first[p.At] = i
	}
}

// duplicateEdges finds edges that lie on each other.
func (d *drawn) duplicateEdges() {
	type line struct {
		a, b    string
		arc     bool
		through r3.Vec
	}
	seen := map[line]int{}
	for i, e := range d.m.Edges {
		if !d.edgeGood[i] {
			continue
		}
		l := line{min(e.From, e.To), max(e.From, e.To), e.Arc, e.Through}
		if j, twice := seen[l]; twice {
			at := d.edgeAt[i]
			d.r.fail(at.n, at.p, fmt.Sprintf("edges %q and %q both run from %q to %q", d.m.Edges[j].Name, e.Name, e.From, e.To), "remove one of them; two fabrics may share an edge")
			continue
		}
		seen[l] = i
	}
}

// supported finds connected parts that nothing holds up.
func (d *drawn) supported() {
	if d.r.diags.failed() {
		return // what is missing may be what is wrong
	}
	n := len(d.m.Points)
	set := newSets(n)
	anchored := make([]bool, n)
	for i, h := range d.settle() {
		anchored[i] = h.fixed != 0
	}
	for _, s := range d.m.Stays {
		set.join(d.point[s.From], d.point[s.To])
	}
	for _, e := range d.m.Edges {
		i, j := d.point[e.From], d.point[e.To]
		set.join(i, j)
		if e.Kind == canopy.EdgeFixed {
			anchored[i], anchored[j] = true, true
		}
	}
	for _, f := range d.m.Fabrics {
		if ri, ok := d.ring[f.Ring]; ok {
			set.join(d.point[d.m.Rings[ri].At], d.point[d.m.Edges[d.edge[f.Boundary[0]]].From])
		}
	}
	d.joinInside(set)
	good := make([]bool, n)
	for i := range n {
		if anchored[i] {
			good[set.find(i)] = true
		}
	}
	said := make([]bool, n)
	told := 0
	for i := range n {
		if told == maxPerTable {
			break
		}
		root := set.find(i)
		if good[root] || said[root] || !d.used[i] {
			continue
		}
		said[root] = true
		told++
		var names []string
		for j := range n {
			if set.find(j) == root {
				names = append(names, d.m.Points[j].Name)
			}
		}
		at := d.pointAt[i]
		d.r.fail(at.n, at.p, fmt.Sprintf("the part of the model with point%s %s has no support", plural(len(names)), quotedList(names, "and")), "anchor one of its points, or connect it to the rest")
	}
}

// sets are disjoint sets of small integers.
type sets []int32

func newSets(n int) sets {
	s := make(sets, n)
	for i := range s {
		s[i] = int32(i)
	}
	return s
}

func (s sets) find(i int) int {
	for s[i] != int32(i) {
		s[i] = s[s[i]]
		i = int(s[i])
	}
	return i
}

// join makes the smaller root the root, so that results do not depend on the
// order of joins.
func (s sets) join(i, j int) {
	i, j = s.find(i), s.find(j)
	if i < j {
		s[j] = int32(i)
	} else {
		s[i] = int32(j)
	}
}
