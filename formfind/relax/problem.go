package relax

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/element"
)

// memberLaw says how the pass over members finds a force density.
type memberLaw uint8

const (
	byDensity memberLaw = iota // given: q
	byForce                    // given: T
	byStretch                  // given: EA/L₀, rest: L₀
	byCable                    // q is set from the common force of its cable
)

// triangleLaw says how the pass over triangles finds their pull.
type triangleLaw uint8

const (
	uniform triangleLaw = iota // the same given stress in all directions
	woven                      // given stress in warp and weft
	elastic                    // stress from strain
	frozen                     // given stress on a given shape: constant force densities
)

// corner is a triangle as one of its nodes sees it: the node itself is corner
// at&3 of triangle at>>2, and the other two follow counter-clockwise.
type corner struct {
	at, next, prev int32
}

// link is a member as one of its nodes sees it.
type link struct {
	member, other int32
}

// facet is what the pass over triangles leaves for the nodes: twice the
// vector area, and for a uniform stress σ the factor σ/(2·|twice|), so that
// the pull at a corner is −g·twice × e with e its opposite edge.
type facet struct {
	twice r3.Vec
	g     float64
}

// problem is a structure laid out for relaxation. Positions are about a local
// origin.
type problem struct {
	s      *canopy.Structure
	origin r3.Vec
	size   float64
	n      int

	free []canopy.Freedom // directions in which a node moves by itself
	mode []mode
	line []lineEnds // of nodes in mode across
	lead []r3.Vec   // dead load and the weights that do not change
	ring []ringNodes
	tied []int32 // index into ring of the ring a node is tied to or is the centre of, −1

	// Members without those left out; src is their index in the structure.
	ends   [][2]int32
	law    []memberLaw
	given  []float64
	rest   []float64
	pushes []bool
	src    []int32
	hang   []float64 // weight per current length, nil when none
	cable  []sliding

	// Triangles, those of uniform stress first.
	uniforms  int
	corners   [][3]int32
	tri       []int32 // index in the structure
	triLaw    []triangleLaw
	stress    [][2]float64 // given stress, or prestress
	fabric    []element.FabricTriangle
	fabricLaw []element.FabricLaw // by fabric
	fabricOf  []int32
	bound     []float64    // of the elastic law, by fabric
	push      []float64    // pressure/6, nil when none
	pocket    []pocket     // air of given volume
	drape     []float64    // weight/6, nil when none
	shear     []float64    // shear of frozen stress, nil when none
	density   [][3]float64 // of all but the uniform ones: q of the side opposite each corner

	// What meets at node i: corners cornerAt[i]…cornerAt[i+1], the uniform ones
	// up to cornerSplit[i]; links linkAt[i]…linkAt[i+1].
	cornerAt, cornerSplit []int32
	around                []corner
	linkAt                []int32
	links                 []link
}

// ringNodes is a rigid ring as it moves: the centre and those that follow it.
type ringNodes struct {
	centre int32
	nodes  []int32
}

// compile lays out s, starting at x. With a form, its forces and stresses are
// frozen.
func compile(s *canopy.Structure, start []r3.Vec, form *canopy.Form, all bool) (*problem, []r3.Vec, error) {
	n := len(s.Position)
	if n == 0 {
		return nil, nil, fmt.Errorf("structure has no nodes")
	}
	if len(s.Fixed) != n {
		return nil, nil, fmt.Errorf("structure has %d nodes but %d supports", n, len(s.Fixed))
	}
	if start == nil {
		start = s.Position
	}
	if len(start) != n {
		return nil, nil, fmt.Errorf("start has %d nodes, structure %d", len(start), n)
	}
	for i, p := range start {
		if !finite(p) {
			return nil, nil, fmt.Errorf("node %s has no finite position", s.NodeName.At(i))
		}
		if !finite(s.LoadAt(i)) {
			return nil, nil, fmt.Errorf("load on node %s is not finite", s.NodeName.At(i))
		}
	}
	p := &problem{s: s, n: n}
	lo, hi := canopy.Bounds(start)
	p.origin = r3.Scale(0.5, r3.Add(lo, hi))
	p.size = norm(r3.Sub(hi, lo))
	if !(p.size > 0) || math.IsInf(p.size, 0) {
		return nil, nil, fmt.Errorf("all nodes are in one place")
	}
	x := make([]r3.Vec, n)
	for i := range x {
		x[i] = r3.Sub(start[i], p.origin)
	}
	p.free = make([]canopy.Freedom, n)
	p.lead = make([]r3.Vec, n)
	for i := range p.free {
		p.free[i] = canopy.DirAll &^ s.FixedAt(i)
		p.lead[i] = s.LoadAt(i)
	}
	if err := p.addMembers(form); err != nil {
		return nil, nil, err
	}
	if err := p.addTriangles(start, form); err != nil {
		return nil, nil, err
	}
	if err := p.addRings(x); err != nil {
		return nil, nil, err
	}
	p.join()
	if form != nil {
		p.freezeLoads(form)
		all = true
	} else {
		p.addWeights()
	}
	p.chooseDirections(x, all)
	if form == nil {
		if err := p.addCables(x); err != nil {
			return nil, nil, err
		}
		p.addPockets(x)
	}
	return p, x, p.checkHeld()
}

func finite(v r3.Vec) bool {
	s := v.X + v.Y + v.Z
	return !math.IsNaN(s) && !math.IsInf(s, 0)
}

// leftOut reports whether member k belongs to a cable that is balanced
// afterwards.
func leftOut(s *canopy.Structure, k int) bool {
	return s.Law[k] == canopy.LawCable && s.CableOf != nil && s.CableOf[k] >= 0 &&
		s.Cables[s.CableOf[k]].Law == canopy.CableBalance
}

func at(v []float64, k int) float64 {
	if v == nil {
		return 0
	}
	return v[k]
}

func (p *problem) addMembers(form *canopy.Form) error {
	s := p.s
	for k, e := range s.Ends {
		name := func() string { return s.MemberName.At(k) }
		for _, i := range e {
			if i < 0 || int(i) >= p.n {
				return fmt.Errorf("member %s ends at node %d, which does not exist", name(), i)
			}
		}
		if e[0] == e[1] {
			return fmt.Errorf("member %s ends where it begins, at node %s", name(), s.NodeName.At(int(e[0])))
		}
		if leftOut(s, k) {
			continue
		}
		law, given, rest := byDensity, s.Given[k], 0.0
		switch {
		case form != nil:
			l := norm(r3.Sub(form.Position[e[1]], form.Position[e[0]]))
			if !(l > 0) {
				return fmt.Errorf("member %s has no length", name())
			}
			given = form.Force[k] / l
		case s.Law[k] == canopy.LawForceDensity:
		case s.Law[k] == canopy.LawForce:
			law = byForce
		case s.Law[k] == canopy.LawElastic:
			ea, l0 := at(s.Stiffness, k), at(s.Unstressed, k)
			if !(ea > 0) || !(l0 > 0) || math.IsInf(ea/l0, 0) {
				return fmt.Errorf("elastic member %s needs a positive stiffness and unstressed length, has %g N and %g m", name(), ea, l0)
			}
			law, given, rest = byStretch, ea/l0, l0
		case s.Law[k] == canopy.LawCable:
			if s.CableOf == nil || s.CableOf[k] < 0 || s.Cables[s.CableOf[k]].Law == canopy.CablePerMember {
				return fmt.Errorf("member %s takes its force from a cable, but belongs to none that has one", name())
			}
			law = byCable
		default:
			return fmt.Errorf("member %s has an unknown law", name())
		}
		if math.IsNaN(given) || math.IsInf(given, 0) {
			return fmt.Errorf("member %s has the force %g, not a finite number", name(), given)
		}
		p.ends = append(p.ends, e)
		p.law = append(p.law, law)
		p.given = append(p.given, given)
		p.rest = append(p.rest, rest)
		p.pushes = append(p.pushes, s.Kind[k].Pushes())
		p.src = append(p.src, int32(k))
	}
	return nil
}

func (p *problem) addTriangles(start []r3.Vec, form *canopy.Form) error {
	s := p.s
	p.fabricLaw = make([]element.FabricLaw, len(s.Fabrics))
	p.bound = make([]float64, len(s.Fabrics))
	pressed, heavy := len(s.Enclosures) > 0, false
	for f := range s.Fabrics {
		fab := &s.Fabrics[f]
		pressed = pressed || fab.Pressure != 0
		heavy = heavy || s.SelfWeight && fab.Weight != 0
		if !fab.Elastic || form != nil {
			continue
		}
		law, err := element.NewFabricLaw(element.Orthotropic{
			Warp: fab.WarpModulus, Weft: fab.WeftModulus, Shear: fab.ShearModulus, PoissonWarpWeft: fab.PoissonWarpWeft,
		}, true)
		if err != nil {
			return fmt.Errorf("fabric %s: %w", fab.Name, err)
		}
		p.fabricLaw[f] = law
		p.bound[f] = law.Bound()
	}
	reference := s.Reference
	if reference == nil {
		reference = s.Position
	}
	if form != nil {
		pressed, heavy = false, false
		reference = form.Position
	}
	lawOf := func(t int) triangleLaw {
		switch {
		case form != nil:
			return frozen
		case s.Fabrics[s.FabricOf[t]].Elastic:
			return elastic
		case s.Stress[t][0] == s.Stress[t][1]:
			return uniform
		}
		return woven
	}
	for t, c := range s.Corners {
		for _, i := range c {
			if i < 0 || int(i) >= p.n {
				return fmt.Errorf("triangle %d has a corner at node %d, which does not exist", t, i)
			}
		}
		if c[0] == c[1] || c[1] == c[2] || c[2] == c[0] {
			return fmt.Errorf("triangle %d has two corners at one node", t)
		}
		st := s.Stress[t]
		if v := st[0] + st[1]; math.IsNaN(v) || math.IsInf(v, 0) {
			return fmt.Errorf("triangle %d has no finite prestress", t)
		}
		if lawOf(t) == uniform {
			p.uniforms++
		}
	}
	add := func(t int, law triangleLaw) error {
		c, f := s.Corners[t], s.FabricOf[t]
		p.corners = append(p.corners, c)
		p.tri = append(p.tri, int32(t))
		p.triLaw = append(p.triLaw, law)
		p.stress = append(p.stress, s.Stress[t])
		p.fabricOf = append(p.fabricOf, f)
		if pressed {
			p.push = append(p.push, s.Fabrics[f].Pressure/6)
		}
		if heavy {
			p.drape = append(p.drape, s.Fabrics[f].Weight/6)
		}
		if law == uniform {
			return nil
		}
		p.density = append(p.density, [3]float64{})
		var ft element.FabricTriangle
		if law == woven {
			g, ok := element.NewTriangle(start[c[0]], start[c[1]], start[c[2]])
			if !ok {
				return fmt.Errorf("triangle %d at node %s: %w", t, s.NodeName.At(int(c[0])), element.ErrFlatTriangle)
			}
			if _, _, err := g.ProjectWarp(s.WarpAt(t, start[c[0]], start[c[1]], start[c[2]])); err != nil {
				return fmt.Errorf("triangle %d at node %s: %w", t, s.NodeName.At(int(c[0])), err)
			}
		} else {
			warp := s.Warp[t]
			if form != nil {
				warp = form.Warp[t]
			}
			var err error
			ft, err = element.NewFabricTriangle([3]r3.Vec{reference[c[0]], reference[c[1]], reference[c[2]]}, warp)
			if err != nil {
				return fmt.Errorf("triangle %d at node %s: %w", t, s.NodeName.At(int(c[0])), err)
			}
		}
		p.fabric = append(p.fabric, ft)
		if form != nil {
			st := form.Stress[t]
			p.stress[len(p.stress)-1] = [2]float64{st.Warp, st.Weft}
			p.shear = append(p.shear, st.Shear)
			p.density[len(p.density)-1] = ft.Densities([3]float64{st.Warp, st.Weft, st.Shear})
		}
		return nil
	}
	for _, second := range []bool{false, true} {
		for t := range s.Corners {
			law := lawOf(t)
			if (law == uniform) == second {
				continue
			}
			if err := add(t, law); err != nil {
				return err
			}
		}
	}
	return nil
}

// addRings notes which nodes follow a ring, and lays them at their offsets
// from the centre as the structure has them.
func (p *problem) addRings(x []r3.Vec) error {
	p.tied = make([]int32, p.n)
	for i := range p.tied {
		p.tied[i] = -1
	}
	if p.s.Master == nil {
		return nil
	}
	ringOf := map[int32]int32{}
	for i, m := range p.s.Master {
		if m < 0 {
			continue
		}
		if int(m) >= p.n || int(m) == i || p.s.Master[m] >= 0 {
			return fmt.Errorf("node %s is tied to node %d, which is no centre of a ring", p.s.NodeName.At(i), m)
		}
		r, ok := ringOf[m]
		if !ok {
			r = int32(len(p.ring))
			ringOf[m] = r
			p.ring = append(p.ring, ringNodes{centre: m})
			p.tied[m] = r
		}
		p.tied[i] = r
		p.ring[r].nodes = append(p.ring[r].nodes, int32(i))
		offset := r3.Sub(p.s.Position[i], p.s.Position[m])
		x[i] = choose(p.free[i], r3.Add(x[m], offset), x[i])
	}
	return nil
}

// choose takes the components of a in the directions d, those of b elsewhere.
func choose(d canopy.Freedom, a, b r3.Vec) r3.Vec {
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

// join builds the lists of what meets at each node.
func (p *problem) join() {
	p.cornerAt = make([]int32, p.n+1)
	p.cornerSplit = make([]int32, p.n)
	p.linkAt = make([]int32, p.n+1)
	for _, c := range p.corners {
		for _, i := range c {
			p.cornerAt[i+1]++
		}
	}
	for _, e := range p.ends {
		p.linkAt[e[0]+1]++
		p.linkAt[e[1]+1]++
	}
	for i := range p.n {
		p.cornerAt[i+1] += p.cornerAt[i]
		p.linkAt[i+1] += p.linkAt[i]
	}
	p.around = make([]corner, p.cornerAt[p.n])
	p.links = make([]link, p.linkAt[p.n])
	fill := append([]int32(nil), p.cornerAt[:p.n]...)
	copy(p.cornerSplit, fill)
	for t, c := range p.corners {
		for k, i := range c {
			p.around[fill[i]] = corner{at: int32(t)<<2 | int32(k), next: c[(k+1)%3], prev: c[(k+2)%3]}
			fill[i]++
			if t < p.uniforms {
				p.cornerSplit[i] = fill[i]
			}
		}
	}
	fill = append(fill[:0], p.linkAt[:p.n]...)
	for m, e := range p.ends {
		for k, i := range e {
			p.links[fill[i]] = link{member: int32(m), other: e[1-k]}
			fill[i]++
		}
	}
}

// addWeights adds the weights that do not change with the shape to the loads
// and keeps those that do with the members.
func (p *problem) addWeights() {
	s := p.s
	if !s.SelfWeight {
		return
	}
	for k, e := range s.Ends {
		w := at(s.Weight, k)
		if w == 0 {
			continue
		}
		if l0 := at(s.Unstressed, k); l0 > 0 || leftOut(s, k) {
			if l0 <= 0 {
				// Between points that are held: its length does not change.
				l0 = norm(r3.Sub(s.Position[e[1]], s.Position[e[0]]))
			}
			p.lead[e[0]].Z -= w * l0 / 2
			p.lead[e[1]].Z -= w * l0 / 2
		}
	}
	for m, k := range p.src {
		if w := at(s.Weight, int(k)); w != 0 && !(at(s.Unstressed, int(k)) > 0) {
			if p.hang == nil {
				p.hang = make([]float64, len(p.ends))
			}
			p.hang[m] = w
		}
	}
	for r := range s.Rings {
		g := &s.Rings[r]
		if g.Rigid && g.Centre >= 0 {
			p.lead[g.Centre].Z -= g.Weight
			continue
		}
		for _, i := range g.Nodes {
			p.lead[i].Z -= g.Weight / float64(len(g.Nodes))
		}
	}
}

// checkHeld refuses free nodes that nothing holds but a load pulls at.
func (p *problem) checkHeld() error {
	for i := range p.n {
		if p.free[i] == 0 || p.tied[i] >= 0 || p.linkAt[i+1] > p.linkAt[i] || p.cornerAt[i+1] > p.cornerAt[i] {
			continue
		}
		if l := choose(p.free[i], p.lead[i], r3.Vec{}); l != (r3.Vec{}) {
			return fmt.Errorf("node %s carries a load but nothing is attached to it", p.s.NodeName.At(i))
		}
	}
	return nil
}
