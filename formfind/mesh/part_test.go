package mesh_test

import (
	"context"
	"errors"
	"math"
	"testing"

	"anticlast/formfind/canopy"
	"anticlast/formfind/mesh"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

func nodeNamed(t testing.TB, s *canopy.Structure, name string) int {
	t.Helper()
	for i := range s.Position {
		if s.NodeName.At(i) == name {
			return i
		}
	}
	t.Fatalf("no node %s", name)
	return -1
}

func cableNamed(t testing.TB, s *canopy.Structure, name string) *canopy.Cable {
	t.Helper()
	for i := range s.Cables {
		if s.Cables[i].Name == name {
			return &s.Cables[i]
		}
	}
	t.Fatalf("no cable %s", name)
	return nil
}

func TestPointsAreHeldByWhatIsThere(t *testing.T) {
	s := build(t, cone())
	at := func(n string) int { return nodeNamed(t, s, n) }
	require.Equal(t, canopy.DirAll, s.Fixed[at("P0")], "a corner")
	require.Equal(t, canopy.DirAll, s.Fixed[at("F")], "the foot of a mast")
	require.Equal(t, canopy.DirAll, s.Fixed[at("G1")], "the anchor of a guy")
	require.Zero(t, s.Fixed[at("M")])
	require.Equal(t, canopy.DirAll, s.Held[at("M")], "a head with forces to find")
	require.Equal(t, canopy.CableBalance, cableNamed(t, s, "mast").Law)
	ring := s.Rings[0]
	require.EqualValues(t, at("M"), ring.Centre)
	for _, i := range ring.Nodes {
		require.Zero(t, s.Fixed[i])
		require.Equal(t, ring.Centre, s.Master[i])
	}

	// Given forces: the head is free; the mast pushes.
	m := cone()
	m.Stays[0].Force, m.Stays[0].HasForce = 40e3, true
	m.Stays[1].Length = 9
	m.Stays[2].Stiffness, m.Stays[2].Unstressed = 8e6, 9
	s = build(t, m)
	require.Zero(t, s.FixedAt(at("M")))
	mast := cableNamed(t, s, "mast").Members[0]
	require.Equal(t, -40e3, s.Given[mast])
	require.Equal(t, canopy.LawForce, s.Law[mast])
	require.Equal(t, canopy.CableLength, cableNamed(t, s, "g1").Law)
	require.Equal(t, 9.0, cableNamed(t, s, "g1").Value)
	g2 := cableNamed(t, s, "g2").Members[0]
	require.Equal(t, canopy.LawElastic, s.Law[g2])
	require.Equal(t, 9.0, s.Unstressed[g2])

	// A ring that slides up and down its mast.
	m = cone()
	m.Stays = m.Stays[:1]
	m.Stays[0].Force, m.Stays[0].HasForce = 10e3, true
	m.Rings[0].Free = canopy.DirZ
	s = build(t, m)
	require.Equal(t, canopy.DirX|canopy.DirY, s.Fixed[at("M")])
	require.Equal(t, s.Rings[0].Centre, s.Master[s.Rings[0].Nodes[0]])

	// A ring on its own is a row of supports.
	m = cone()
	m.Stays = nil
	s = build(t, m)
	for _, i := range s.Rings[0].Nodes {
		require.Equal(t, canopy.DirAll, s.Fixed[i])
		require.EqualValues(t, -1, s.MasterOf(int(i)))
	}

	// A cable ring is free by itself and hangs from its point.
	m = cone()
	m.Stays = nil
	r := &m.Rings[0]
	r.Rigid, r.Free, r.Force, r.Hangers, r.HangerForce = false, canopy.DirAll, 15e3, 4, 6e3
	s = build(t, m)
	for _, i := range s.Rings[0].Nodes {
		require.Zero(t, s.Fixed[i])
	}
	loop := s.Cables[s.Rings[0].Cable]
	require.Equal(t, canopy.KindRingCable, loop.Kind)
	require.Equal(t, loop.Nodes[0], loop.Nodes[len(loop.Nodes)-1])
	require.Len(t, loop.Members, len(s.Rings[0].Nodes))
	for h := range 4 {
		c := cableNamed(t, s, []string{"top/hanger:1", "top/hanger:2", "top/hanger:3", "top/hanger:4"}[h])
		require.EqualValues(t, nodeNamed(t, s, "M"), c.Nodes[1])
		require.Equal(t, 6e3, s.Given[c.Members[0]])
	}
}

func TestCableSlidesUnlessClamped(t *testing.T) {
	m := polygon(5)
	m.Cables = append(m.Cables[3:], canopy.ModelCable{Name: "K", Edges: []string{"e0", "e1", "e2"}, Length: 30})
	for i := range 3 {
		m.Edges[i].Cable = "K"
	}
	m.Points[1].Hold, m.Points[2].Hold = canopy.HoldFree, canopy.HoldAnchored
	// One edge drawn against the run of the cable.
	m.Edges[1].From, m.Edges[1].To = m.Edges[1].To, m.Edges[1].From
	s := build(t, m)
	k := cableNamed(t, s, "K")
	require.Equal(t, canopy.CableLength, k.Law)
	require.Equal(t, 30.0, k.Value)
	require.EqualValues(t, nodeNamed(t, s, "P0"), k.Nodes[0])
	require.EqualValues(t, nodeNamed(t, s, "P3"), k.Nodes[len(k.Nodes)-1])
	require.Contains(t, k.Nodes, int32(nodeNamed(t, s, "P2")))
	require.Equal(t, len(k.Members), 3*len(cableNamed(t, s, "e3").Members))

	m.Cables[len(m.Cables)-1].Clamped = []string{"P2"}
	s = build(t, m)
	one, two := cableNamed(t, s, "K/1"), cableNamed(t, s, "K/2")
	require.EqualValues(t, nodeNamed(t, s, "P2"), one.Nodes[len(one.Nodes)-1])
	require.EqualValues(t, nodeNamed(t, s, "P2"), two.Nodes[0])
	require.Equal(t, len(one.Members), 2*len(two.Members))
	require.InDelta(t, 20, one.Value, 1e-9)
	require.InDelta(t, 10, two.Value, 1e-9)
}

func TestCableLaws(t *testing.T) {
	s := build(t, laws())
	require.Equal(t, canopy.LawForce, s.Law[cableNamed(t, s, "e0").Members[3]])
	e1 := cableNamed(t, s, "e1")
	require.Equal(t, canopy.CableSag, e1.Law)
	require.Equal(t, 0.1, e1.Value)
	require.Equal(t, 12.0, s.Weight[e1.Members[0]])
	require.Equal(t, 2e5, s.Strength[e1.Members[0]])
	e2 := cableNamed(t, s, "e2")
	require.Equal(t, canopy.CableElastic, e2.Law)
	require.Equal(t, 11.5, e2.Unstressed)
	sum := 0.0
	for _, i := range e2.Members {
		require.Equal(t, canopy.LawCable, s.Law[i])
		require.Equal(t, 1e7, s.Stiffness[i])
		sum += s.Unstressed[i]
	}
	require.InDelta(t, 11.5, sum, 1e-9)
	require.Equal(t, canopy.LawForceDensity, s.Law[cableNamed(t, s, "e3").Members[0]])
	require.Equal(t, "e3", s.Groups[s.Group[cableNamed(t, s, "e3").Members[0]]])
}

// Two families cross at every inner node, each line runs from edge to edge, and
// lines are spaced as asked for as far as whole numbers allow.
func TestNetFamilies(t *testing.T) {
	s := build(t, net(4))
	side := r3.Norm(r3.Sub(s.Position[0], s.Position[1]))
	count := map[string]int{}
	links := make([]int, len(s.Position))
	for k, c := range s.Cables {
		if c.Kind != canopy.KindNetCable {
			continue
		}
		count[c.Name[:6]]++
		for _, e := range [2]int32{c.Nodes[0], c.Nodes[len(c.Nodes)-1]} {
			require.Regexp(t, "^e[0-3]:", s.NodeName.At(int(e)))
		}
		for _, i := range c.Members {
			links[s.Ends[i][0]]++
			links[s.Ends[i][1]]++
			require.EqualValues(t, k, s.CableOf[i])
		}
	}
	require.Equal(t, int(math.Round(side/1))-1, count["roof/1"])
	require.Equal(t, int(math.Round(side/1.25))-1, count["roof/2"])
	for i, n := range links {
		if s.NodeName.At(i)[0] == 'r' {
			require.Equal(t, 4, n, s.NodeName.At(i))
		}
	}
	require.Equal(t, 5e3, s.Given[cableNamed(t, s, "roof/1:1").Members[0]])
	second := cableNamed(t, s, "roof/2:1").Members[0]
	require.Equal(t, canopy.LawForceDensity, s.Law[second])
	require.Equal(t, 1e7, s.Stiffness[second])
	// The first family runs along the first side: its first line is next to it.
	first := cableNamed(t, s, "roof/1:1")
	require.Equal(t, "e3:"+itoa(int(math.Round(side/1))-1), s.NodeName.At(int(first.Nodes[0])))
}

func itoa(n int) string {
	if n < 10 {
		return string(rune('0' + n))
	}
	return itoa(n/10) + itoa(n%10)
}

func TestSharedEdgesHaveTheSameNodes(t *testing.T) {
	s := build(t, ridges())
	// Nodes of a ridge have triangles of two fabrics.
	seen := map[int32]map[int32]bool{}
	for k, c := range s.Corners {
		for _, i := range c {
			if seen[i] == nil {
				seen[i] = map[int32]bool{}
			}
			seen[i][s.FabricOf[k]] = true
		}
	}
	c := cableNamed(t, s, "r1")
	require.Equal(t, canopy.KindRidgeCable, c.Kind)
	require.Equal(t, canopy.KindRidgeCable, s.Kind[c.Members[0]])
	for _, i := range c.Nodes[1 : len(c.Nodes)-1] {
		require.Len(t, seen[i], 2)
		require.Zero(t, s.Fixed[i])
	}
}

func TestArchIsFixedAndReported(t *testing.T) {
	s := build(t, vault())
	roles := map[string]string{}
	for _, l := range s.Lines {
		roles[l.Name] = l.Role
		for j, i := range l.Nodes {
			p := s.Position[i]
			require.Equal(t, canopy.DirAll, s.Fixed[i])
			// On the circle through (0,0), (5,3), (10,0): centre height 3 − R, 2·3·R = 5² + 3².
			const radius = 34.0 / 6
			require.InDelta(t, radius, math.Hypot(p.Y-5, p.Z-(3-radius)), 1e-12)
			if 0 < j && j < len(l.Nodes)-1 {
				require.Equal(t, l.Name, s.Curves[s.OnCurve[i]].Name)
				require.InDelta(t, float64(j)/float64(len(l.Nodes)-1), s.Param[i], 1e-12)
			}
		}
		// By arc length: all sides alike.
		first := dist(s, [2]int32{l.Nodes[0], l.Nodes[1]})
		for j := 1; j < len(l.Nodes); j++ {
			require.InDelta(t, first, dist(s, [2]int32{l.Nodes[j-1], l.Nodes[j]}), 1e-12)
		}
	}
	require.Equal(t, map[string]string{"a0": "fixed edge", "a1": "arch", "a2": "fixed edge"}, roles)
}

func TestSegmentsAreRespected(t *testing.T) {
	m := polygon(4)
	m.Edges[0].Segments = 9
	m.Edges[3].Segments = 14
	s := build(t, m)
	for k, n := range []int{9, 14, 9, 14} {
		require.Len(t, s.Cables[k].Members, n)
	}
	require.Len(t, s.Corners, 2*9*14)
	// A cable in space is one member unless it says otherwise.
	m.Points = append(m.Points, pt("X", 0, 20, 5))
	m.Edges = append(m.Edges, canopy.Edge{Name: "tie", From: "X", To: "P0", Kind: canopy.EdgeCable, Role: canopy.KindCable, Cable: "tie"})
	m.Cables = append(m.Cables, canopy.ModelCable{Name: "tie", Edges: []string{"tie"}, Force: 5e3})
	require.Len(t, cableNamed(t, build(t, m), "tie").Members, 1)
	m.Edges[4].Segments = 5
	require.Len(t, cableNamed(t, build(t, m), "tie").Members, 5)
}

// Sides that a structured patch cannot have are meshed freely.
func TestAnyNumbersOfSegmentsAreMeshed(t *testing.T) {
	for name, c := range map[string]struct {
		model    *canopy.Model
		segments []int
	}{
		"opposite sides":      {polygon(4), []int{8, 12, 10, 9}},
		"odd sides of a star": {polygon(5), []int{7, 8, 8, 8, 8}},
		"sides of a triangle": {polygon(3), []int{10, 20, 15}},
		"halves of a lens":    {lens(), []int{13, 20}},
		"a coarse side":       {polygon(4), []int{8, 24, 24, 24}},
		"a star from elsewhere": {func() *canopy.Model {
			m := polygon(5)
			m.Fabrics[0].Boundary = []string{"e2", "e3", "e4", "e0", "e1"}
			return m
		}(), []int{0, 0, 0, 7, 0}},
		"seven sides, one fine": {polygon(7), []int{40, 0, 0, 0, 0, 0, 0}},
	} {
		t.Run(name, func(t *testing.T) {
			for i, n := range c.segments {
				c.model.Edges[i].Segments = n
			}
			s := build(t, c.model)
			for i, n := range c.segments {
				last := 0
				for k := range s.Position {
					if s.NodeName.At(k) == c.model.Edges[i].Name+":"+itoa(last+1) {
						last++
					}
				}
				if n > 0 {
					require.Equal(t, n, last+1, "edge %d", i)
				}
			}
			v, e, f := topology(t, s)
			require.Equal(t, 1, v-e+f)
			require.Greater(t, angles(s), 12*math.Pi/180)
		})
	}
}

func TestRefusals(t *testing.T) {
	for name, c := range map[string]struct {
		model  func() *canopy.Model
		reason mesh.Reason
		part   string
		name   string
		text   string
	}{
		"opposite sides of a net in conflict": {func() *canopy.Model {
			m := net(4)
			m.Edges[0].Segments, m.Edges[2].Segments, m.Edges[2].Line = 8, 10, 17
			return m
		}, mesh.Conflict, "edge", "e2", "line 17: edge e2: it has 10 segments but must be divided like edge e0 with 8 for the sake of net roof"},
		"single-segment arc": {func() *canopy.Model {
			m := vault()
			m.Edges[0].Segments, m.Edges[1].Segments, m.Edges[2].Segments = 1, 1, 1
			return m
		}, mesh.Conflict, "edge", "a0", "an arc cannot be a single straight segment"},
		"too fine": {func() *canopy.Model {
			m := polygon(4)
			m.MeshSize = 0.002
			return m
		}, mesh.TooFine, "", "", "give a mesh size of 13 mm or more"},
		"far too fine": {func() *canopy.Model {
			m := polygon(4)
			m.MeshSize = 1e-300
			return m
		}, mesh.TooFine, "", "", "give a mesh size of 13 mm or more"},
		"not closed": {func() *canopy.Model {
			m := polygon(4)
			m.Fabrics[0].Boundary = m.Fabrics[0].Boundary[:3]
			return m
		}, mesh.NotClosed, "fabric", "sail", "not closed"},
		"out of order": {func() *canopy.Model {
			m := polygon(5)
			b := m.Fabrics[0].Boundary
			b[2], b[3] = b[3], b[2]
			return m
		}, mesh.NotClosed, "fabric", "sail", "edge e3 does not start where edge e1 ends"},
		"ring outside": {func() *canopy.Model {
			m := cone()
			m.Points[4].At.X = 12
			return m
		}, mesh.RingOutside, "ring", "top", "does not lie inside the boundary of fabric sail"},
		"ring too large": {func() *canopy.Model {
			m := cone()
			m.Rings[0].Radius = 6
			return m
		}, mesh.RingOutside, "ring", "top", "its radius is 6.000 m"},
		"ring shared": {func() *canopy.Model {
			m := cone()
			f := m.Fabrics[0]
			f.Name = "twin"
			m.Fabrics = append(m.Fabrics, f)
			return m
		}, mesh.Mismatch, "fabric", "twin", "its ring top is already inside fabric sail"},
		"straight arc": {func() *canopy.Model {
			m := vault()
			m.Edges[0].Through = r3.Vec{Y: 5}
			return m
		}, mesh.Degenerate, "edge", "a0", "lie on one line"},
		"no length": {func() *canopy.Model {
			m := polygon(4)
			m.Points[1].At = m.Points[0].At
			return m
		}, mesh.Degenerate, "edge", "e0", "at the same place"},
		"flat line": {func() *canopy.Model {
			m := polygon(4)
			for i := range m.Points {
				m.Points[i].At.Y, m.Points[i].At.Z = 0, 0
			}
			return m
		}, mesh.Degenerate, "fabric", "sail", "without area"},
		"warp along the normal": {func() *canopy.Model {
			m := polygon(4)
			m.Fabrics[0].WarpDir = r3.Vec{Z: 1}
			return m
		}, mesh.NoWarp, "fabric", "sail", "at right angles to the surface"},
		"radial without ring": {func() *canopy.Model {
			m := polygon(4)
			m.Fabrics[0].WarpRule = canopy.WarpRadial
			return m
		}, mesh.NoWarp, "fabric", "sail", "needs a ring"},
		"held by nobody": {func() *canopy.Model {
			m := polygon(4)
			m.Points[1].Hold = canopy.HoldHeld
			return m
		}, mesh.Unsupported, "point", "P1", "there is no mast or guy"},
		"free and alone": {func() *canopy.Model {
			m := polygon(4)
			m.Points = append(m.Points, canopy.Point{Name: "X", At: r3.Vec{Z: 1}, Hold: canopy.HoldFree})
			return m
		}, mesh.Unsupported, "point", "X", "nothing is attached"},
		"all free": {func() *canopy.Model {
			m := polygon(4)
			for i := range m.Points {
				m.Points[i].Hold = canopy.HoldFree
			}
			return m
		}, mesh.Unsupported, "point", "P0", "nothing holds the part"},
		"force of a mast between supports": {func() *canopy.Model {
			m := cone()
			m.Points[4].Hold = canopy.HoldAnchored
			return m
		}, mesh.Unbalanced, "mast", "mast", "neither of its ends is a held point"},
		"force to find at a free point": {func() *canopy.Model {
			m := cone()
			m.Points[5].Hold = canopy.HoldFree
			return m
		}, mesh.Unbalanced, "mast", "mast", "its end F may move"},
		"free end of a fixed edge": {func() *canopy.Model {
			m := vault()
			m.Points[0].Hold = canopy.HoldFree
			return m
		}, mesh.Unsupported, "point", "S0", "ends fixed edge a0"},
		"seam at the rim": {func() *canopy.Model {
			m := polygon(4)
			m.Edges[1].Kind = canopy.EdgeSeam
			m.Cables = append(m.Cables[:1], m.Cables[2:]...)
			return m
		}, mesh.Mismatch, "edge", "e1", "a seam joins two fabrics"},
		"fixed edge without purpose": {func() *canopy.Model {
			m := polygon(4)
			fixedEdge(m, "x", "P0", "P2")
			return m
		}, mesh.Mismatch, "edge", "x", "bounds nothing"},
		"net of five along its sides": {func() *canopy.Model {
			m := net(5)
			m.Nets[0].Pattern = canopy.NetSides
			return m
		}, mesh.Mismatch, "net", "roof", "5 corners"},
		"clamped outside": {func() *canopy.Model {
			m := polygon(4)
			m.Cables[0].Clamped = []string{"P2"}
			return m
		}, mesh.Mismatch, "cable", "e0", "clamped at a point that is not inside"},
		"cable without law": {func() *canopy.Model {
			m := polygon(4)
			m.Cables[0].Force = 0
			return m
		}, mesh.Missing, "cable", "e0", "what force"},
		"one-sided": {func() *canopy.Model {
			// Three fabrics around, the last with a twist.
			m := &canopy.Model{Points: []canopy.Point{pt("A", 0, 0, 0), pt("B", 0, 0, 1), pt("C", 4, 0, 0), pt("D", 4, 0, 1), pt("E", 2, 4, 0), pt("F", 2, 4, 1)}}
			for _, e := range [][3]string{{"s1", "A", "B"}, {"s2", "C", "D"}, {"s3", "E", "F"}} {
				m.Edges = append(m.Edges, canopy.Edge{Name: e[0], From: e[1], To: e[2], Kind: canopy.EdgeSeam})
			}
			for _, e := range [][3]string{{"a", "A", "C"}, {"b", "B", "D"}, {"c", "C", "E"}, {"d", "D", "F"}, {"e", "E", "B"}, {"f", "F", "A"}} {
				fixedEdge(m, e[0], e[1], e[2])
			}
			m.Fabrics = []canopy.ModelFabric{sail("u", "s1", "b", "s2", "a"), sail("v", "s2", "d", "s3", "c"), sail("w", "s3", "f", "s1", "e")}
			return m
		}, mesh.Mismatch, "fabric", "", "only one side"},
		"nothing": {func() *canopy.Model { return &canopy.Model{} }, mesh.Missing, "", "", "no members and no triangles"},
	} {
		t.Run(name, func(t *testing.T) {
			s, err := mesh.Build(context.Background(), c.model())
			require.Error(t, err)
			require.Nil(t, s)
			var list mesh.Errors
			require.True(t, errors.As(err, &list))
			var first *mesh.Error
			require.True(t, errors.As(err, &first))
			require.Equal(t, c.reason, first.Reason, first.Error())
			require.Equal(t, c.part, first.Part)
			if c.name != "" {
				require.Equal(t, c.name, first.Name)
			}
			require.Contains(t, err.Error(), c.text)
			require.NotEmpty(t, first.WayOut)
		})
	}
}

func TestBuildCanBeCancelled(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	_, err := mesh.Build(ctx, polygon(4))
	require.ErrorIs(t, err, context.Canceled)
}

func TestListedModelIsCheckedAndReturned(t *testing.T) {
	s := build(t, polygon(4))
	got := build(t, &canopy.Model{Listed: s})
	require.Same(t, s, got)
	s.Ends[3][1] = s.Ends[3][0]
	_, err := mesh.Build(context.Background(), &canopy.Model{Listed: s})
	require.ErrorContains(t, err, "from a node to itself")
	s = build(t, polygon(4))
	s.Position[s.Corners[7][0]] = s.Position[s.Corners[7][1]]
	_, err = mesh.Build(context.Background(), &canopy.Model{Listed: s})
	require.ErrorContains(t, err, "triangle 7: it has no area")
}

// Rim cables start about where the prestress pulls them: at their sag, or on the
// arc of radius force over stress; lines inside the canopy start straight.
func TestRimCablesStartSagged(t *testing.T) {
	m := laws()
	m.Cables[0].Force = 30e3
	s := build(t, m)
	sag := func(k int) float64 {
		c := s.Cables[k]
		a, b := s.Position[c.Nodes[0]], s.Position[c.Nodes[len(c.Nodes)-1]]
		return r3.Norm(r3.Sub(s.Position[c.Nodes[len(c.Nodes)/2]], r3.Scale(0.5, r3.Add(a, b)))) / r3.Norm(r3.Sub(a, b))
	}
	require.InDelta(t, 0.1, sag(1), 1e-9)
	c := r3.Norm(r3.Sub(m.Points[0].At, m.Points[1].At))
	const radius = 30e3 / 2e3
	require.InDelta(t, (radius-math.Sqrt(radius*radius-c*c/4))/c, sag(0), 1e-9)
	// Towards the inside.
	middle := s.Position[s.Cables[0].Nodes[len(s.Cables[0].Nodes)/2]]
	require.Less(t, math.Hypot(middle.X, middle.Y), 8/math.Sqrt2)
	s = build(t, ridges())
	for k := 4; k < 8; k++ {
		require.InDelta(t, 0, sag(k), 1e-12)
	}
}
