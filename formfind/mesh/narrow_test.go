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
