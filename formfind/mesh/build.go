package mesh

import (
	"context"
	"fmt"
	"slices"

	"anticlast/formfind/canopy"
	"gonum.org/v1/gonum/spatial/r3"
)

// MaxTriangles is the largest number of triangles a model may be divided into.
const MaxTriangles = 2_000_000

// maxEdgeNodes bounds the nodes on all edges of a model, and of a ring.
const maxEdgeNodes = 200_000

// Build divides m into nodes, members and triangles. A listed model is checked
// by [Validate] and returned as it is. The error is an [Errors] with everything
// found wrong, or that of ctx.
func Build(ctx context.Context, m *canopy.Model) (*canopy.Structure, error) {
	s, _, err := BuildMeasured(ctx, m)
	return s, err
}

// BuildMeasured is Build and says of every fabric that was triangulated freely
// how well that went. Fabrics with structured patches are not among them.
func BuildMeasured(ctx context.Context, m *canopy.Model) (*canopy.Structure, []Quality, error) {
	if err := ctx.Err(); err != nil {
		return nil, nil, err
	}
	if m.Listed != nil {
		if err := Validate(m.Listed); err != nil {
			return nil, nil, err
		}
		return m.Listed, nil, nil
	}
	b := newBuilder(ctx, m)
	s, err := b.build()
	if err != nil {
		return nil, nil, err
	}
	return s, b.quality, nil
}

func newBuilder(ctx context.Context, m *canopy.Model) *builder {
	return &builder{ctx: ctx, m: m}
}

// build runs all stages.
func (b *builder) build() (*canopy.Structure, error) {
	// Each stage needs the ones before it to be without fault.
	run := func(stages ...func()) error {
		for _, stage := range stages {
			if err := b.ctx.Err(); err != nil {
				return err
			}
			stage()
			if len(b.errs) > 0 {
				return b.errs.err()
			}
		}
		return b.ctx.Err()
	}
	if err := run(b.index, b.curves, b.loops, b.orient, b.divide, b.layNets, b.supports); err != nil {
		return nil, err
	}
	if err := b.fillFinely(run); err != nil {
		return nil, err
	}
	if err := run(b.cables, b.stays, b.finish, b.openCorners, b.verify, b.pressUp, b.enclosures); err != nil {
		return nil, err
	}
	return b.s, nil
}

// builder carries what the stages of Build learn.
type builder struct {
	ctx  context.Context
	m    *canopy.Model
	s    *canopy.Structure
	errs Errors

	point, edge, cable, ring map[string]int

	ends      [][2]int    // per edge: model indices of its points
	curve     []curve     // per edge
	loop      []*loop     // fabrics first, then nets
	users     [][]int32   // per edge: loops that it bounds
	closed    []int       // fabrics that close by themselves, so that no side of them all is up
	count     []int       // per edge: number of segments
	asked     []int       // the same before narrow places were divided further
	param     [][]float64 // per edge: where its nodes are, by length; nil = evenly
	laid      []*laidNet  // per loop: the lines of a net laid in its plane
	arrival   []arrival   // where such lines end on edges
	found     *foundShape // an earlier shape in which nets are laid anew
	crossed   float64     // crossings of nets so far
	soft      bool        // end links of given force start with the force density that gives it
	wish      wish        // what stands in the way of fabrics
	ringWish  []bool      // per ring: whether it does
	ringTimes []int       // per ring: how many times as many nodes as its size asks for
	ringUse   []int       // per ring: loop that surrounds it, −1 = none

	fixed []canopy.Freedom // per point
	held  []canopy.Freedom

	node     []int32   // per point: node, −1 = none
	edgeNode [][]int32 // per edge: nodes from its first point to its second
	ringNode [][]int32 // per ring
	quality  []Quality // of what was meshed freely
	size     float64   // default length of a mesh side
	group    map[string]int32
}

func (b *builder) fail(part, name string, line int, r Reason, wayOut, format string, args ...any) {
	b.errs = append(b.errs, &Error{Part: part, Name: name, Line: line, Reason: r, Problem: fmt.Sprintf(format, args...), WayOut: wayOut})
}

// index makes the names of parts known and checks that what they refer to exists.
func (b *builder) index() {
	m := b.m
	b.point = make(map[string]int, len(m.Points))
	for i, p := range m.Points {
		if _, twice := b.point[p.Name]; twice {
			b.fail("point", p.Name, p.Line, Mismatch, "give each its own name", "the name is used twice")
		}
		b.point[p.Name] = i
	}
	b.cable = make(map[string]int, len(m.Cables))
	for i, c := range m.Cables {
		b.cable[c.Name] = i
	}
	b.ring = make(map[string]int, len(m.Rings))
	for i, r := range m.Rings {
		if _, twice := b.ring[r.Name]; twice {
			b.fail("ring", r.Name, r.Line, Mismatch, "give each its own name", "the name is used twice")
		}
		b.ring[r.Name] = i
		if _, ok := b.point[r.At]; !ok {
			b.fail("ring", r.Name, r.Line, Missing, "add it under points", "its point %q is not defined", r.At)
		}
		if !(r.Radius > 0) {
			b.fail("ring", r.Name, r.Line, Degenerate, "give a radius above 0", "it has no radius")
		}
		if !r.Rigid && !(r.Force > 0) {
			b.fail("ring", r.Name, r.Line, Missing, "give the force of its cable, or make it rigid", "a ring of cable needs a force")
		}
	}
	b.edge = make(map[string]int, len(m.Edges))
	b.ends = make([][2]int, len(m.Edges))
	for i, e := range m.Edges {
		if _, twice := b.edge[e.Name]; twice {
			b.fail("edge", e.Name, e.Line, Mismatch, "give each its own name", "the name is used twice")
		}
		b.edge[e.Name] = i
		for k, n := range [2]string{e.From, e.To} {
			p, ok := b.point[n]
			if !ok {
				b.fail("edge", e.Name, e.Line, Missing, "add it under points", "its point %q is not defined", n)
			}
			b.ends[i][k] = p
		}
		if e.From == e.To {
			b.fail("edge", e.Name, e.Line, Degenerate, "end it at another point", "it starts and ends at point %s", e.From)
		}
		if e.Segments < 0 {
			b.fail("edge", e.Name, e.Line, Conflict, "give 1 or more", "%d segments", e.Segments)
		}
		if e.Kind == canopy.EdgeCable {
			if _, ok := b.cable[e.Cable]; !ok {
				b.fail("edge", e.Name, e.Line, Missing, "give the edge a force, sag, stiffness or length", "its cable %q is not defined", e.Cable)
			}
		}
	}
	for _, st := range m.Stays {
		for _, n := range [2]string{st.From, st.To} {
			if _, ok := b.point[n]; !ok {
				b.fail(stayPart(st), st.Name, st.Line, Missing, "add it under points", "its point %q is not defined", n)
			}
		}
		if st.From == st.To {
			b.fail(stayPart(st), st.Name, st.Line, Degenerate, "end it at another point", "it starts and ends at point %s", st.From)
		}
	}
	for _, f := range m.Fabrics {
		if f.Ring != "" {
			if _, ok := b.ring[f.Ring]; !ok {
				b.fail("fabric", f.Name, f.Line, Missing, "add it under rings", "its ring %q is not defined", f.Ring)
			}
		} else if f.WarpRule != canopy.WarpAlong {
			b.fail("fabric", f.Name, f.Line, NoWarp, "give a direction instead", "a warp %s needs a ring inside the fabric", warpWord(f.WarpRule))
		}
	}
}

func stayPart(s canopy.Stay) string {
	if s.Mast {
		return "mast"
	}
	return "guy"
}

// curves lays each edge in space.
func (b *builder) curves() {
	b.curve = make([]curve, len(b.m.Edges))
	for i, e := range b.m.Edges {
		p, q := b.m.Points[b.ends[i][0]].At, b.m.Points[b.ends[i][1]].At
		var ok bool
		b.curve[i], ok = newCurve(canopy.Curve{Name: e.Name, Start: p, End: q, Through: e.Through, Arc: e.Arc})
		switch {
		case ok:
		case e.Arc:
			b.fail("edge", e.Name, e.Line, Degenerate, "move the point it goes through, or make it straight", "no arc goes through its three points: they lie on one line")
		default:
			b.fail("edge", e.Name, e.Line, Degenerate, "move one of them", "its points %s and %s are at the same place", e.From, e.To)
		}
	}
}

// addNode appends a free node.
func (b *builder) addNode(at r3.Vec, name string) int32 {
	s := b.s
	s.Position = append(s.Position, at)
	s.Fixed = append(s.Fixed, 0)
	s.OnCurve = append(s.OnCurve, -1)
	s.Param = append(s.Param, 0)
	s.NodeName.Append(name)
	return int32(len(s.Position) - 1)
}

// reserve makes room for nodes with names of about the given length, and for
// triangles.
func (b *builder) reserve(nodes, triangles, name int) {
	s := b.s
	s.Position, s.Fixed = slices.Grow(s.Position, nodes), slices.Grow(s.Fixed, nodes)
	s.OnCurve, s.Param = slices.Grow(s.OnCurve, nodes), slices.Grow(s.Param, nodes)
	s.NodeName.Grow(nodes, nodes*name)
	s.Corners, s.FabricOf = slices.Grow(s.Corners, triangles), slices.Grow(s.FabricOf, triangles)
	s.Stress, s.Warp = slices.Grow(s.Stress, triangles), slices.Grow(s.Warp, triangles)
}

// member is what addMember is told about a member.
type member struct {
	a, b                  int32
	name, group           string
	kind                  canopy.Kind
	law                   canopy.Law
	given                 float64
	mean                  float64 // N: the force density that gives this force where the member starts
	stiffness, unstressed float64
	weight, strength      float64
}

func (b *builder) addMember(m member) int32 {
	s := b.s
	if m.mean != 0 {
		m.given = m.mean / dist(s.Position[m.a], s.Position[m.b])
	}
	s.Ends = append(s.Ends, [2]int32{m.a, m.b})
	s.Kind = append(s.Kind, m.kind)
	s.Law = append(s.Law, m.law)
	s.Given = append(s.Given, m.given)
	s.Stiffness = append(s.Stiffness, m.stiffness)
	s.Unstressed = append(s.Unstressed, m.unstressed)
	s.Weight = append(s.Weight, m.weight)
	s.Strength = append(s.Strength, m.strength)
	s.CableOf = append(s.CableOf, -1)
	s.MemberName.Append(m.name)
	g, ok := b.group[m.group]
	if !ok {
		if b.group == nil {
			b.group = map[string]int32{}
		}
		g = int32(len(s.Groups))
		b.group[m.group] = g
		s.Groups = append(s.Groups, m.group)
	}
	s.Group = append(s.Group, g)
	return int32(len(s.Ends) - 1)
}

// addCable appends a cable and marks its members.
func (b *builder) addCable(c canopy.Cable) int32 {
	k := int32(len(b.s.Cables))
	for _, i := range c.Members {
		b.s.CableOf[i] = k
	}
	b.s.Cables = append(b.s.Cables, c)
	return k
}
