package mesh_test

import (
	"context"
	"math"
	"testing"

	"anticlast/formfind/canopy"
	"anticlast/formfind/mesh"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

func measured(t testing.TB, m *canopy.Model) (*canopy.Structure, []mesh.Quality) {
	t.Helper()
	s, q, err := mesh.BuildMeasured(context.Background(), m)
	require.NoError(t, err)
	return s, q
}

// neck is two squares of 6 m joined by a neck of the given width, 4 m long.
func neck(width float64) *canopy.Model {
	a, b := 3-width/2, 3+width/2
	return drawn(r3.Vec{}, r3.Vec{X: 6}, r3.Vec{X: 6, Y: a}, r3.Vec{X: 10, Y: a}, r3.Vec{X: 10}, r3.Vec{X: 16},
		r3.Vec{X: 16, Y: 6}, r3.Vec{X: 10, Y: 6}, r3.Vec{X: 10, Y: b}, r3.Vec{X: 6, Y: b}, r3.Vec{X: 6, Y: 6}, r3.Vec{Y: 6})
}

// Where an outline is narrow its sides are divided until the bound of 28° is met.
func TestNarrowPlacesAreDivided(t *testing.T) {
	for _, width := range []float64{1, 0.5, 0.2, 0.1, 0.05} {
		m := neck(width)
		m.MeshSize = 1
		s, q := measured(t, m)
		t.Logf("neck of %g m: %d triangles, least angle %.1f°, %v", width, len(s.Corners), q[0].LeastAngle*180/math.Pi, q[0].Why)
		require.True(t, q[0].Met, q[0].Why)
		require.Less(t, float64(len(s.Corners)), 200+40/width)
	}
}

// A ridge that ends inside the fabric, anywhere.
func TestRidgeEndingInside(t *testing.T) {
	for _, end := range []r3.Vec{{X: 5, Y: 3}, {X: 9.8, Y: 4}, {X: 9.95, Y: 3.1}, {X: 7, Y: 7.7}, {X: 0.9, Y: 0.8}} {
		m := drawn(r3.Vec{}, r3.Vec{X: 10}, r3.Vec{X: 10, Y: 8}, r3.Vec{Y: 8})
		m.MeshSize = 0.8
		m.Points = append(m.Points, pt("R0", 2, 2, 1), pt("R1", end.X, end.Y, 0.1))
		cableEdge(m, "ridge", "R0", "R1", canopy.ModelCable{Force: 10e3})
		m.Fabrics[0].Lines = []string{"ridge"}
		m.Fabrics[0].Pattern = canopy.FabricFree
		s, q := measured(t, m)
		t.Logf("ridge to %v: %d triangles, least angle %.1f°, %v", end, len(s.Corners), q[0].LeastAngle*180/math.Pi, q[0].Why)
		require.True(t, q[0].Met, q[0].Why)
	}
}

// A strip beside a wide fabric: the edge that they share is divided for both, an
// arc at its own places; whatever is along an edge fits.
func TestDividedEdgesAreShared(t *testing.T) {
	m := &canopy.Model{MeshSize: 0.8}
	m.Points = append(m.Points, pt("A", 0, 0, 1), pt("B", 9, 0, 1), pt("C", 9, 0.1, 1), pt("D", 0, 0.1, 1), pt("E", 9, 7, 2), pt("F", 0, 7, 1))
	m.Edges = append(m.Edges, canopy.Edge{Name: "AB", From: "A", To: "B", Arc: true, Through: r3.Vec{X: 4.5, Y: -0.3, Z: 1}})
	fixedEdge(m, "BC", "B", "C")
	m.Edges = append(m.Edges, canopy.Edge{Name: "DC", From: "D", To: "C", Kind: canopy.EdgeSeam})
	fixedEdge(m, "DA", "D", "A")
	fixedEdge(m, "CE", "C", "E")
	fixedEdge(m, "EF", "E", "F")
	fixedEdge(m, "FD", "F", "D")
	m.Fabrics = []canopy.ModelFabric{sail("strip", "AB", "BC", "DC", "DA"), sail("field", "DC", "CE", "EF", "FD")}
	for i := range m.Fabrics {
		m.Fabrics[i].Pattern = canopy.FabricFree
	}
	s, q := measured(t, m)
	for _, q := range q {
		t.Logf("%s: %d triangles, least angle %.1f°", q.Fabric, q.Triangles, q.LeastAngle*180/math.Pi)
		require.True(t, q.Met, q.Why)
	}
	v, e, f := topology(t, s)
	require.Equal(t, 1, v-e+f, "they fit")
	seam := 0
	for _, l := range s.Lines {
		if l.Role == "seam" {
			seam = len(l.Nodes) - 1
		}
	}
	require.Greater(t, seam, 30, "divided")
	on := 0
	centre := r3.Vec{X: 4.5, Y: (4.5*4.5 - 0.09) / 0.6, Z: 1}
	for i, c := range s.OnCurve {
		if c >= 0 && s.Curves[c].Name == "AB" {
			on++
			require.InDelta(t, r3.Norm(r3.Sub(s.Position[i], centre)), centre.Y+0.3, 1e-9, "on the arc")
		}
	}
	require.Greater(t, on, 20, "divided")
	require.NoError(t, mesh.Validate(s))
	r, err := mesh.Refine(s)
	require.NoError(t, err)
	require.NoError(t, mesh.Validate(r.Fine))
	again, _ := measured(t, m)
	require.Equal(t, s.Position, again.Position, "same model, same mesh")
}

// A ring, a hole and a point near the rim, and near each other.
func TestNarrowAroundRingsHolesAndPoints(t *testing.T) {
	m := drawn(r3.Vec{}, r3.Vec{X: 10}, r3.Vec{X: 10, Y: 8}, r3.Vec{Y: 8})
	m.MeshSize = 1
	for k, c := range [][2]float64{{2, 2}, {3, 2}, {3, 3}, {2, 3}} {
		m.Points = append(m.Points, pt([]string{"H0", "H1", "H2", "H3"}[k], c[0]-1.95, c[1], 0.1))
	}
	for k, e := range []string{"h0", "h1", "h2", "h3"} {
		fixedEdge(m, e, []string{"H0", "H1", "H2", "H3"}[k], []string{"H1", "H2", "H3", "H0"}[k])
	}
	m.Points = append(m.Points, pt("X", 9.9, 6, 0.1))
	m.Fabrics[0].Holes = [][]string{{"h0", "h1", "h2", "h3"}}
	m.Fabrics[0].Inside = []string{"X"}
	_, q := measured(t, m)
	require.True(t, q[0].Met, q[0].Why)

	m = drawn(r3.Vec{}, r3.Vec{X: 10}, r3.Vec{X: 10, Y: 8}, r3.Vec{Y: 8})
	m.MeshSize = 1
	m.Points = append(m.Points, pt("R", 2.1, 4, 1))
	m.Rings = []canopy.ModelRing{{Name: "top", At: "R", Radius: 2, Rigid: true}}
	m.Fabrics[0].Ring = "top"
	m.Fabrics[0].WarpRule = canopy.WarpRadial
	s, q := measured(t, m)
	require.True(t, q[0].Met, q[0].Why)
	require.Greater(t, len(s.Rings[0].Nodes), 20)
}

// Numbers of segments that were given, and edges whose force hangs on them, stay.
func TestGivenSegmentsAreKept(t *testing.T) {
	for name, change := range map[string]func(*canopy.Model){
		"segments": func(m *canopy.Model) {
			for i := range m.Edges {
				m.Edges[i].Segments = 6
			}
		},
		"force density": func(m *canopy.Model) {
			old := m.Edges
			m.Edges = nil
			for _, e := range old {
				cableEdge(m, e.Name, e.From, e.To, canopy.ModelCable{ForceDensity: 1e9})
			}
		},
	} {
		t.Run(name, func(t *testing.T) {
			m := neck(0.2)
			m.MeshSize = 1
			change(m)
			s, q := measured(t, m)
			require.False(t, q[0].Met)
			require.Contains(t, q[0].Why, "more segments")
			if name == "segments" {
				for _, l := range s.Lines {
					require.Len(t, l.Nodes, 7)
				}
			} else {
				require.Less(t, len(s.Ends), 12*8)
			}
		})
	}
}
