package mesh

import (
	"math"

	"anticlast/formfind/canopy"
	"gonum.org/v1/gonum/spatial/r3"
)

// ringAxis returns the unit axis of ring i, z unless given.
func (b *builder) ringAxis(i int) r3.Vec {
	a := b.m.Rings[i].Axis
	if a == (r3.Vec{}) {
		return r3.Vec{Z: 1}
	}
	return r3.Unit(a)
}

// ringNodes places the nodes of each ring, one for each node of the boundary
// around it.
//
// A rigid ring whose point is anchored in all directions, with nothing else at
// that point, is a row of supports: its nodes are fixed and react one by one.
// Any other rigid ring is tied to its point: its nodes keep their offsets from
// the centre (Structure.Master) and their forces act there, so that the centre
// carries the support, or masts and guys, or is free, in each direction. The
// nodes of a cable ring move each for itself in the directions of Ring.Free and
// are fixed in the others.
func (b *builder) ringNodes() {
	b.ringNode = make([][]int32, len(b.m.Rings))
	busy := make([]bool, len(b.m.Points))
	for _, e := range b.ends {
		busy[e[0]], busy[e[1]] = true, true
	}
	for _, s := range b.m.Stays {
		busy[b.point[s.From]], busy[b.point[s.To]] = true, true
	}
	for ri, r := range b.m.Rings {
		l := b.loop[b.ringUse[ri]]
		phi, e1, e2, ok := b.ringAngles(ri, l)
		if !ok {
			continue
		}
		if _, free := l.patch.(freePatch); free {
			want := math.Round(math.Pi * r.Radius / b.meshSize(l))
			if !(want <= maxEdgeNodes/2) {
				b.tooManyTriangles()
				return
			}
			n := b.ringTimes[ri] * max(16, 2*int(want))
			phi = make([]float64, n)
			for j := range phi {
				phi[j] = 2 * math.Pi * float64(j) / float64(n)
			}
		}
		p := b.point[r.At]
		fixed := canopy.Freedom(0)
		if !r.Rigid {
			fixed = canopy.DirAll &^ r.Free
		} else if b.fixed[p] == canopy.DirAll && !busy[p] {
			fixed = canopy.DirAll
		}
		centre := b.m.Points[p].At
		nodes := make([]int32, len(phi))
		for j, a := range phi {
			sin, cos := math.Sincos(a)
			nodes[j] = b.addNode(r3.Add(centre, r3.Add(r3.Scale(r.Radius*cos, e1), r3.Scale(r.Radius*sin, e2))), numbered(r.Name, j+1))
			b.s.Fixed[nodes[j]] = fixed
		}
		b.ringNode[ri] = nodes
		ring := canopy.Ring{Name: r.Name, Centre: b.node[p], Nodes: nodes, Rigid: r.Rigid, Free: r.Free, Weight: r.Weight, Cable: -1}
		if r.Rigid {
			if r.Free == 0 {
				ring.Free = canopy.DirAll &^ (b.fixed[p] | b.held[p])
			}
		} else {
			ring.Cable = b.ringCable(r, nodes)
		}
		b.s.Rings = append(b.s.Rings, ring)
	}
}

// ringCable makes the members of a cable ring and its hangers.
func (b *builder) ringCable(r canopy.ModelRing, nodes []int32) int32 {
	closed := append(append(make([]int32, 0, len(nodes)+1), nodes...), nodes[0])
	k := b.chainMembers(r.Name, canopy.KindRingCable, closed, member{
		group: r.Name, kind: canopy.KindRingCable, law: canopy.LawForce, given: r.Force,
		strength: r.Strength,
	})
	if r.Hangers > len(nodes) {
		b.fail("ring", r.Name, r.Line, Conflict, "use fewer hangers or a finer mesh", "it has %d hangers but only %d nodes", r.Hangers, len(nodes))
		return k
	}
	if r.Hangers > 0 && !(r.HangerForce > 0) {
		b.fail("ring", r.Name, r.Line, Missing, "give a force above 0", "its hangers have no force")
		return k
	}
	for h := range r.Hangers {
		i := nodes[(2*h*len(nodes)+r.Hangers)/(2*r.Hangers)%len(nodes)]
		b.chainMembers(numbered(r.Name+"/hanger", h+1), canopy.KindCable, []int32{i, b.node[b.point[r.At]]}, member{
			group: r.Name + "/hangers", kind: canopy.KindCable, law: canopy.LawForce, given: r.HangerForce,
		})
	}
	return k
}

// ringAngles returns the angles about the axis at which the nodes of ring ri
// sit, running along with the boundary l around it: half-way between even
// spacing and the directions of the boundary's nodes, so that radial lines are
// nearly straight in plan and ring sides nearly even.
func (b *builder) ringAngles(ri int, l *loop) (phi []float64, e1, e2 r3.Vec, ok bool) {
	r := b.m.Rings[ri]
	centre := b.ringAt(l)
	axis := b.ringAxis(ri)
	outer := b.outerNodes(l)
	n := len(outer)
	e1, e2 = frame(axis)
	x, y := make([]float64, n), make([]float64, n)
	for j, o := range outer {
		d := r3.Sub(b.s.Position[o], centre)
		x[j], y[j] = r3.Dot(d, e1), r3.Dot(d, e2)
	}
	turn := 0.0
	theta := make([]float64, n)
	theta[0] = math.Atan2(y[0], x[0])
	for j := range n {
		k := (j + 1) % n
		da := math.Atan2(x[j]*y[k]-y[j]*x[k], x[j]*x[k]+y[j]*y[k])
		turn += da
		if k > 0 {
			theta[k] = theta[j] + da
		}
	}
	near, at := math.Inf(1), 0
	for j := range n {
		k := (j + 1) % n
		if d := segmentDistance(x[j], y[j], x[k], y[k]); d < near {
			near, at = d, j
		}
	}
	if math.Abs(math.Abs(turn)-2*math.Pi) > 1 {
		b.fail("ring", r.Name, r.Line, RingOutside, "move its point inside, or make the boundary go once around it",
			"its point %s does not lie inside the boundary of fabric %s, seen along its axis", r.At, l.name)
		return nil, e1, e2, false
	}
	if !(near > r.Radius) {
		edge := b.edgeOf(l, at)
		b.fail("ring", r.Name, r.Line, RingOutside, "make the ring smaller or move its point",
			"it does not fit inside fabric %s: edge %s passes %.3f m from its centre, its radius is %.3f m", l.name, b.m.Edges[edge].Name, near, r.Radius)
		return nil, e1, e2, false
	}
	step := math.Copysign(2*math.Pi/float64(n), turn)
	offset := 0.0
	for j, t := range theta {
		offset += (t - step*float64(j)) / float64(n)
	}
	phi = make([]float64, n)
	for j, t := range theta {
		phi[j] = (t + step*float64(j) + offset) / 2
	}
	// Where the boundary turns back or the ring sits far off the middle, even
	// spacing alone.
	for j := range phi {
		next := phi[(j+1)%n]
		if j+1 == n {
			next += math.Copysign(2*math.Pi, turn)
		}
		if (next-phi[j])/step < 0.4 {
			for k := range phi {
				phi[k] = step*float64(k) + offset
			}
			break
		}
	}
	return phi, e1, e2, true
}

// edgeOf returns the edge that holds side j of a divided boundary.
func (b *builder) edgeOf(l *loop, j int) int {
	for _, e := range l.edges {
		if j < b.count[e] {
			return e
		}
		j -= b.count[e]
	}
	return l.edges[0]
}

// segmentDistance returns the distance of the origin from the segment (x0, y0)–(x1, y1).
func segmentDistance(x0, y0, x1, y1 float64) float64 {
	dx, dy := x1-x0, y1-y0
	t := 0.0
	if l := dx*dx + dy*dy; l > 0 {
		t = min(1, max(0, -(x0*dx+y0*dy)/l))
	}
	return math.Hypot(x0+t*dx, y0+t*dy)
}
