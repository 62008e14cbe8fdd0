package mesh_test

import (
	"math"
	"strings"
	"testing"

	"anticlast/formfind/canopy"
	"anticlast/formfind/mesh"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

func area(s *canopy.Structure, of func(int) bool) (a float64) {
	for t, c := range s.Corners {
		if of(t) {
			a += r3.Norm(r3.Cross(r3.Sub(s.Position[c[1]], s.Position[c[0]]), r3.Sub(s.Position[c[2]], s.Position[c[0]]))) / 2
		}
	}
	return a
}

func every(int) bool { return true }

func TestRefineKeepsEverythingTwiceAsFine(t *testing.T) {
	for name, model := range all {
		t.Run(name, func(t *testing.T) {
			s := build(t, model())
			r, err := mesh.Refine(s)
			require.NoError(t, err)
			f := r.Fine
			require.NoError(t, mesh.Validate(f))
			require.Equal(t, 4*len(s.Corners), len(f.Corners))
			if len(s.Corners) == 0 {
				// The links of a net are real ones: nothing to refine.
				require.Equal(t, s.Position, f.Position)
				require.Equal(t, len(s.Ends), len(f.Ends))
			} else {
				v, e, tri := topology(t, s)
				fv, fe, ft := topology(t, f)
				require.Equal(t, v+e, fv)
				require.Equal(t, 2*e+3*tri, fe)
				require.Equal(t, 4*tri, ft)
				require.InEpsilon(t, area(s, every), area(f, every), 0.03)
			}
			names := map[string]bool{}
			for i := range f.Position {
				require.False(t, names[f.NodeName.At(i)], f.NodeName.At(i))
				names[f.NodeName.At(i)] = true
			}
			names = map[string]bool{}
			for i := range f.Ends {
				require.False(t, names[f.MemberName.At(i)], f.MemberName.At(i))
				names[f.MemberName.At(i)] = true
			}
			for i, p := range r.Parents {
				if p[0] == p[1] {
					require.EqualValues(t, i, p[0])
					require.Equal(t, s.Position[i], f.Position[i])
					require.Equal(t, s.FixedAt(i), f.FixedAt(i))
				}
			}
			// Cables: as long, with the same forces; twice as many members.
			require.Equal(t, len(s.Cables), len(f.Cables))
			for k := range s.Cables {
				require.InDelta(t, cableLength(s, k), cableLength(f, k), 0.02*cableLength(s, k))
				for _, i := range f.Cables[k].Members {
					j := r.MemberOf[i]
					require.Equal(t, f.Law[i], s.Law[j])
					if s.Law[j] == canopy.LawForceDensity {
						ends, old := f.Ends[i], s.Ends[j]
						require.InEpsilon(t, s.Given[j]*dist(s, old), f.Given[i]*dist(f, ends), 1e-12)
					} else {
						require.Equal(t, s.Given[j], f.Given[i])
					}
				}
			}
		})
	}
}

func dist(s *canopy.Structure, e [2]int32) float64 {
	return r3.Norm(r3.Sub(s.Position[e[0]], s.Position[e[1]]))
}

func cableLength(s *canopy.Structure, k int) (l float64) {
	for _, i := range s.Cables[k].Members {
		l += dist(s, s.Ends[i])
	}
	return l
}

// A refined mesh has the same boundary nodes, by name and place, as one that was
// drawn with twice the number of segments.
func TestRefineEqualsDrawingFinerOnEdges(t *testing.T) {
	coarse := vault()
	fine := vault()
	for i := range coarse.Edges {
		coarse.Edges[i].Kind, fine.Edges[i].Kind = canopy.EdgeFixed, canopy.EdgeFixed
		coarse.Edges[i].Segments = 6
		fine.Edges[i].Segments = 12
	}
	coarse.Cables, fine.Cables = nil, nil
	r, err := mesh.Refine(build(t, coarse))
	require.NoError(t, err)
	want := build(t, fine)
	at := map[string]r3.Vec{}
	fixed := map[string]canopy.Freedom{}
	for i, p := range want.Position {
		at[want.NodeName.At(i)] = p
		fixed[want.NodeName.At(i)] = want.Fixed[i]
	}
	edge := 0
	for i, p := range r.Fine.Position {
		name := r.Fine.NodeName.At(i)
		require.Contains(t, at, name)
		if strings.HasPrefix(name, "bay") {
			continue
		}
		edge++
		require.InDelta(t, 0, r3.Norm(r3.Sub(p, at[name])), 1e-12, name)
		require.Equal(t, fixed[name], r.Fine.Fixed[i], name)
	}
	require.Greater(t, edge, 60)
	require.Equal(t, len(want.Lines), len(r.Fine.Lines))
	for i := range want.Lines {
		require.Equal(t, len(want.Lines[i].Nodes), len(r.Fine.Lines[i].Nodes))
	}
}

func TestRefinedCablesAreNumberedAlongTheirEdges(t *testing.T) {
	coarse, fine := polygon(4), polygon(4)
	coarse.MeshSize, fine.MeshSize = 2, 1
	coarse.Edges[0].Segments, fine.Edges[0].Segments = 6, 12
	coarse.Edges[1].Segments, fine.Edges[1].Segments = 1, 2
	r, err := mesh.Refine(build(t, coarse))
	require.NoError(t, err)
	want := build(t, fine)
	require.Equal(t, len(want.Ends), len(r.Fine.Ends))
	for i := range want.Ends {
		require.Equal(t, want.MemberName.At(i), r.Fine.MemberName.At(i))
		for k := range 2 {
			require.Equal(t, want.NodeName.At(int(want.Ends[i][k])), r.Fine.NodeName.At(int(r.Fine.Ends[i][k])))
		}
	}
}

func TestRefinedRingIsRoundAndTied(t *testing.T) {
	s := build(t, cone())
	for range 2 {
		r, err := mesh.Refine(s)
		require.NoError(t, err)
		s = r.Fine
	}
	g := s.Rings[0]
	c := s.Position[g.Centre]
	for _, i := range g.Nodes {
		require.InDelta(t, 0.6, r3.Norm(r3.Sub(s.Position[i], c)), 1e-12)
		require.InDelta(t, c.Z, s.Position[i].Z, 1e-12)
		require.Equal(t, g.Centre, s.Master[i])
		require.Zero(t, s.Fixed[i])
	}
	// Warp laid anew: radial on every triangle of the fine mesh.
	for k, w := range s.Warp {
		p := s.Position[s.Corners[k][0]]
		q := s.Position[s.Corners[k][1]]
		v := s.Position[s.Corners[k][2]]
		d := r3.Sub(r3.Scale(1.0/3, r3.Add(p, r3.Add(q, v))), c)
		require.InDelta(t, 0, r3.Dot(w, r3.Unit(r3.Vec{X: -d.Y, Y: d.X})), 1e-9)
	}
}

// A listed square of fixed rim nodes without names or curves: the new rim nodes
// are fixed, the new inner ones free.
func TestRefineListedMesh(t *testing.T) {
	s := &canopy.Structure{
		Position: []r3.Vec{{}, {X: 1}, {X: 1, Y: 1}, {Y: 1}, {X: 0.5, Y: 0.5}},
		Fixed:    []canopy.Freedom{7, 7, 7, 7, 0},
		Corners:  [][3]int32{{0, 1, 4}, {1, 2, 4}, {2, 3, 4}, {3, 0, 4}},
		FabricOf: make([]int32, 4), Stress: make([][2]float64, 4),
		Warp:    []r3.Vec{{X: 1}, {X: 1}, {X: 1}, {X: 1}},
		Fabrics: make([]canopy.Fabric, 1),
	}
	for range 3 {
		r, err := mesh.Refine(s)
		require.NoError(t, err)
		s = r.Fine
	}
	require.Len(t, s.Corners, 256)
	for i, p := range s.Position {
		rim := math.Min(math.Min(p.X, p.Y), math.Min(1-p.X, 1-p.Y)) == 0
		require.Equal(t, rim, s.Fixed[i] == canopy.DirAll)
	}
}

func BenchmarkRefine(b *testing.B) {
	m := polygon(4)
	m.MeshSize = 0.05
	s := build(b, m)
	b.ReportMetric(float64(len(s.Corners)), "triangles")
	for b.Loop() {
		if _, err := mesh.Refine(s); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkBuild(b *testing.B) {
	m := polygon(4)
	m.MeshSize = 0.05
	for b.Loop() {
		build(b, m)
	}
}
