package mesh_test

import (
	"context"
	"fmt"
	"math"
	"testing"

	"anticlast/formfind/canopy"
	"anticlast/formfind/mesh"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
	"pgregory.net/rapid"
)

// shortest is the least length of a link over the spacing that the package
// promises.
const shortest = 1.0 / 3

// starNet is a net inside an outline of n corners that are seen from the middle,
// with edges of cable of so much force that they are straight.
func starNet(t *rapid.T, n int) *canopy.Model {
	m := &canopy.Model{}
	turn := rapid.Float64Range(0, 2*math.Pi).Draw(t, "turn")
	scale := rapid.SampledFrom([]float64{0.01, 1, 30}).Draw(t, "scale")
	at := r3.Scale(scale, r3.Vec{X: rapid.SampledFrom([]float64{0, -7, 1e5}).Draw(t, "x"), Y: 3})
	var boundary []string
	for k := range n {
		a := turn + 2*math.Pi*(float64(k)+rapid.Float64Range(-0.3, 0.3).Draw(t, "angle"))/float64(n)
		r := scale * rapid.Float64Range(4, 12).Draw(t, "radius")
		p := canopy.Point{Name: fmt.Sprint("P", k), At: r3.Add(at, r3.Vec{X: r * math.Cos(a), Y: r * math.Sin(a), Z: scale * rapid.Float64Range(0, 6).Draw(t, "z")})}
		m.Points = append(m.Points, p)
	}
	for k := range n {
		e := fmt.Sprint("e", k)
		from, to := fmt.Sprint("P", k), fmt.Sprint("P", (k+1)%n)
		if rapid.Bool().Draw(t, "turned") {
			from, to = to, from
		}
		cableEdge(m, e, from, to, canopy.ModelCable{MeanForce: 1e14 * scale})
		boundary = append(boundary, e)
	}
	h := scale * rapid.Float64Range(0.4, 2).Draw(t, "spacing")
	net := canopy.Net{Name: "roof", Boundary: boundary, Pattern: canopy.NetStraight, Families: []canopy.Family{
		{Spacing: h, MeanForce: 5e3},
		{Spacing: h * rapid.Float64Range(0.6, 1.5).Draw(t, "ratio"), MeanForce: 5e3},
	}}
	switch rapid.IntRange(0, 2).Draw(t, "families") {
	case 1:
		net.Families[1].Angle, net.Families[1].HasAngle = rapid.Float64Range(0.6, 2.5).Draw(t, "crossing"), true
	case 2:
		net.Families = append(net.Families, canopy.Family{MeanForce: 5e3})
		net.Families[1].Spacing = h
	}
	m.Nets = []canopy.Net{net}
	return m
}

// inPlan reports whether a place in plan lies inside the polygon of the points
// or within tol of it.
func inPlan(p []canopy.Point, q r3.Vec, tol float64) bool {
	in := false
	for i, a := range p {
		b := p[(i+1)%len(p)]
		u, v := r3.Sub(b.At, a.At), r3.Sub(q, a.At)
		u.Z, v.Z = 0, 0
		t := min(1, max(0, r3.Dot(u, v)/r3.Norm2(u)))
		if r3.Norm(r3.Sub(v, r3.Scale(t, u))) <= tol {
			return true
		}
		if (a.At.Y > q.Y) != (b.At.Y > q.Y) && q.X < a.At.X+(q.Y-a.At.Y)/(b.At.Y-a.At.Y)*(b.At.X-a.At.X) {
			in = !in
		}
	}
	return in
}

// The promises of the package hold on any outline: crossings have three links or
// more, links lie inside, none is shorter than a third of the least distance of
// lines, and each belongs to a cable that ends on the boundary.
func TestStraightNetsInAnyOutline(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m := starNet(t, rapid.IntRange(3, 9).Draw(t, "corners"))
		s, err := mesh.Build(context.Background(), m)
		if err != nil {
			require.ErrorContains(t, err, "smaller spacing")
			return
		}
		size := s.Size()
		f := m.Nets[0].Families
		h := min(f[0].Spacing, f[1].Spacing)
		if len(f) == 3 {
			h = f[0].Spacing // all three are alike at 60°
		}
		links := make([]int, len(s.Position))
		seen := map[[2]int32]bool{}
		for k, e := range s.Ends {
			key := [2]int32{min(e[0], e[1]), max(e[0], e[1])}
			require.False(t, seen[key], "two members between the same nodes")
			seen[key] = true
			if s.Kind[k] != canopy.KindNetCable {
				continue
			}
			links[e[0]]++
			links[e[1]]++
			a, b := s.Position[e[0]], s.Position[e[1]]
			d := r3.Sub(b, a)
			d.Z = 0
			require.GreaterOrEqual(t, r3.Norm(d), shortest*h*(1-1e-6), s.MemberName.At(k))
			for i := range 9 {
				q := r3.Add(a, r3.Scale(float64(i)/8, r3.Sub(b, a)))
				require.True(t, inPlan(m.Points, q, 0.03*h+1e-9*size), "%s leaves the outline", s.MemberName.At(k))
			}
		}
		for i, n := range links {
			if s.NodeName.At(i)[0] == 'r' {
				require.GreaterOrEqual(t, n, 3, s.NodeName.At(i))
			}
		}
		for _, c := range s.Cables {
			if c.Kind == canopy.KindNetCable {
				require.Len(t, c.Members, len(c.Nodes)-1)
			}
		}
	})
}

// The total length of the lines of one family over the area is one over their
// spacing (every point of the plane is on one line per spacing), up to what the
// boundary takes: at most a link at each end of each line.
func TestStraightNetsHaveTheirSpacing(t *testing.T) {
	m := polygon(6)
	m.Nets = []canopy.Net{{Name: "roof", Boundary: m.Fabrics[0].Boundary, Families: []canopy.Family{
		{Spacing: 0.25, MeanForce: 5e3}, {Spacing: 0.4, MeanForce: 5e3, Angle: 1.1, HasAngle: true},
	}}}
	m.Fabrics = nil
	for i := range m.Points {
		m.Points[i].At.Z = 0
	}
	for i := range m.Cables {
		m.Cables[i].Sag, m.Cables[i].Force, m.Cables[i].MeanForce = 0, 0, 1e9
	}
	s := build(t, m)
	area := 0.0
	for i, p := range m.Points {
		q := m.Points[(i+1)%len(m.Points)]
		area += (p.At.X*q.At.Y - p.At.Y*q.At.X) / 2
	}
	length := map[string]float64{}
	for k, e := range s.Ends {
		length[s.Groups[s.Group[k]]] += r3.Norm(r3.Sub(s.Position[e[0]], s.Position[e[1]]))
	}
	require.InEpsilon(t, area/0.25, length["roof/1"], 0.04)
	require.InEpsilon(t, area/0.4, length["roof/2"], 0.04)
}

// mirroredNet checks that every node and every member has an image under f.
func mirroredNet(t testing.TB, s *canopy.Structure, f func(r3.Vec) r3.Vec) {
	t.Helper()
	key := func(p r3.Vec) [3]int64 {
		grid := func(v float64) int64 { return int64(math.Floor(v*1e5 + 0.37)) }
		return [3]int64{grid(p.X), grid(p.Y), grid(p.Z)}
	}
	at := map[[3]int64]int32{}
	for i, p := range s.Position {
		at[key(p)] = int32(i)
	}
	image := func(i int32) int32 {
		p := f(s.Position[i])
		for d := range 27 { // it may lie beyond the edge of a cell
			q := r3.Add(p, r3.Scale(2e-7, r3.Vec{X: float64(d%3 - 1), Y: float64(d/3%3 - 1), Z: float64(d/9 - 1)}))
			if j, ok := at[key(q)]; ok {
				return j
			}
		}
		require.Fail(t, "no image", "node %s", s.NodeName.At(int(i)))
		return -1
	}
	pair := func(a, b int32) [2]int32 { return [2]int32{min(a, b), max(a, b)} }
	members := map[[2]int32]bool{}
	for _, e := range s.Ends {
		members[pair(e[0], e[1])] = true
	}
	for k, e := range s.Ends {
		require.True(t, members[pair(image(e[0]), image(e[1]))], "member %s has no image", s.MemberName.At(k))
	}
}

func TestSymmetricOutlinesHaveSymmetricNets(t *testing.T) {
	for _, h := range []float64{0.7, 0.83, 1, 1.31} {
		m := net(4)
		m.Nets[0].Pattern = canopy.NetStraight
		m.Nets[0].Direction = r3.Sub(m.Points[2].At, m.Points[0].At)
		m.Nets[0].Families = []canopy.Family{{Spacing: h, Force: 5e3}, {Spacing: h, Force: 5e3}}
		s := build(t, m)
		centre := r3.Scale(0.5, r3.Add(m.Points[0].At, m.Points[2].At))
		u := r3.Sub(m.Points[2].At, m.Points[0].At)
		u.Z = 0
		u = r3.Unit(u)
		mirroredNet(t, s, func(p r3.Vec) r3.Vec { // across the vertical plane through P0 and P2
			d := r3.Sub(p, centre)
			w := r3.Vec{X: -u.Y, Y: u.X}
			return r3.Sub(p, r3.Scale(2*r3.Dot(d, w), w))
		})
		mirroredNet(t, s, func(p r3.Vec) r3.Vec { // across the other
			return r3.Sub(p, r3.Scale(2*r3.Dot(r3.Sub(p, centre), u), u))
		})
	}
}

// ovals is a radial net between an outer ring of arcs and an inner one of cable.
func ovals(n int) *canopy.Model {
	m := &canopy.Model{}
	at := func(a, b, t float64) r3.Vec {
		return r3.Vec{X: a * math.Cos(t), Y: b * math.Sin(t), Z: 10 + 2*math.Cos(2*t)}
	}
	var outer, inner []string
	for k := range n {
		t := 2 * math.Pi * float64(k) / float64(n)
		m.Points = append(m.Points,
			canopy.Point{Name: fmt.Sprint("O", k), At: at(30, 22, t)},
			canopy.Point{Name: fmt.Sprint("I", k), At: at(14, 9, t), Hold: canopy.HoldFree})
	}
	for k := range n {
		o, i := fmt.Sprint("o", k), fmt.Sprint("i", k)
		m.Edges = append(m.Edges, canopy.Edge{Name: o, From: fmt.Sprint("O", k), To: fmt.Sprint("O", (k+1)%n), Arc: true, Through: at(30, 22, 2*math.Pi*(float64(k)+0.5)/float64(n))})
		m.Edges = append(m.Edges, canopy.Edge{Name: i, From: fmt.Sprint("I", k), To: fmt.Sprint("I", (k+1)%n), Kind: canopy.EdgeCable, Role: canopy.KindEdgeCable, Cable: "ring"})
		outer, inner = append(outer, o), append(inner, i)
	}
	m.Cables = []canopy.ModelCable{{Name: "ring", Edges: inner, MeanForce: 800e3}}
	m.Nets = []canopy.Net{{Name: "roof", Boundary: outer, Holes: [][]string{inner}, Pattern: canopy.NetRadial, Families: []canopy.Family{
		{Name: "radial", Spacing: 2, MeanForce: 80e3}, {Name: "ring", Spacing: 2.5, MeanForce: 30e3},
	}}}
	return m
}

func TestRadialNet(t *testing.T) {
	for _, n := range []int{6, 8, 12} {
		m := ovals(n)
		s := build(t, m)
		radial, rings := 0, 0
		for _, c := range s.Cables {
			if c.Kind != canopy.KindNetCable {
				continue
			}
			first, last := c.Nodes[0], c.Nodes[len(c.Nodes)-1]
			if first == last {
				rings++
				continue
			}
			radial++
			require.Contains(t, "iI", s.NodeName.At(int(first))[:1])
			require.Contains(t, "oO", s.NodeName.At(int(last))[:1])
		}
		// Ramanujan's approximation of the outer oval's length over the spacing.
		around := math.Pi * (3*(30+22) - math.Sqrt((3*30+22)*(30+3*22)))
		require.InDelta(t, around/2, radial, float64(n)/2)
		require.Equal(t, 5, rings) // 14.5 m in the mean, 2.5 m apart
		links := make([]int, len(s.Position))
		for _, e := range s.Ends {
			links[e[0]]++
			links[e[1]]++
		}
		for i, k := range links {
			if s.NodeName.At(i)[0] == 'r' {
				require.Equal(t, 4, k)
			}
		}
		for _, flip := range []r3.Vec{{X: -1, Y: 1, Z: 1}, {X: 1, Y: -1, Z: 1}} {
			mirroredNet(t, s, func(p r3.Vec) r3.Vec { return r3.Vec{X: flip.X * p.X, Y: flip.Y * p.Y, Z: p.Z} })
		}
	}
}

func TestNetAroundHoles(t *testing.T) {
	m := ovals(8)
	m.Nets[0].Pattern = canopy.NetStraight
	m.Nets[0].Families = []canopy.Family{{Spacing: 1.5, MeanForce: 20e3}, {Spacing: 1.5, MeanForce: 20e3}}
	s := build(t, m)
	var hole []canopy.Point
	for _, p := range m.Points {
		if p.Name[0] == 'I' {
			hole = append(hole, p)
		}
	}
	for k, e := range s.Ends {
		if s.Kind[k] == canopy.KindNetCable {
			q := r3.Scale(0.5, r3.Add(s.Position[e[0]], s.Position[e[1]]))
			require.False(t, inPlan(hole, q, 0), s.MemberName.At(k))
		}
	}
	// The hole's cable is divided where lines end on it.
	require.Greater(t, len(cableNamed(t, s, "ring").Members), 30)
}

// The choice between lines along the sides and straight ones.
func TestPatternIsChosen(t *testing.T) {
	ends := func(m *canopy.Model) bool { // lines along the sides divide opposite sides alike
		s := build(t, m)
		return len(cableNamed(t, s, "e0").Members) == len(cableNamed(t, s, "e2").Members)
	}
	m := net(4)
	m.Points[0].At = r3.Add(m.Points[0].At, r3.Vec{X: -2, Y: 0.7}) // no two sides alike
	require.True(t, ends(m))
	m.Nets[0].Pattern = canopy.NetStraight
	require.False(t, ends(m))
	m.Nets[0].Pattern = canopy.NetAuto
	m.Nets[0].Direction = r3.Vec{X: 1, Y: 0.3}
	require.False(t, ends(m))
	require.NotNil(t, cableNamed(t, build(t, net(5)), "roof/1:1"))
}
