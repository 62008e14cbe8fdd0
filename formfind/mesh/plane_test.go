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
)

// drawn is a fabric with fixed edges between the given corners, meshed freely.
func drawn(corner ...r3.Vec) *canopy.Model {
	m := &canopy.Model{MeshSize: 0.5}
	var names []string
	for i, c := range corner {
		m.Points = append(m.Points, pt(fmt.Sprintf("P%d", i), c.X, c.Y, c.Z))
	}
	for i, p := range m.Points {
		e := fmt.Sprintf("e%d", i)
		fixedEdge(m, e, p.Name, m.Points[(i+1)%len(m.Points)].Name)
		names = append(names, e)
	}
	m.Fabrics = []canopy.ModelFabric{sail("sail", names...)}
	m.Fabrics[0].Pattern = canopy.FabricFree
	m.Fabrics[0].WarpDir = r3.Vec{X: 0.5, Y: 1}
	return m
}

// A strip bent like a Z overlaps itself seen along the direction in which its
// outline looks largest, but not from everywhere.
func TestPlaneIsChosenWithoutOverlap(t *testing.T) {
	z := func() *canopy.Model {
		a := []r3.Vec{{}, {X: 3, Z: -2}, {X: 2, Z: -2.9}, {X: 5, Z: -4.9}}
		for i := range 4 {
			b := a[3-i]
			b.Y = 4
			a = append(a, b)
		}
		return drawn(a...)
	}
	check := func(m *canopy.Model) {
		s, quality, err := mesh.BuildMeasured(t.Context(), m)
		require.NoError(t, err)
		v, e, f := topology(t, s)
		require.Equal(t, 1, v-e+f)
		require.Len(t, quality, 1)
		// Sides of one length in space are not of one length seen aslant, so
		// that the bound may not be met, but then that is said.
		require.Equal(t, quality[0].LeastAngle >= mesh.AngleBound, quality[0].Met)
		require.Equal(t, quality[0].Met, quality[0].Why == "")
		require.Equal(t, len(s.Corners), quality[0].Triangles)
		require.True(t, quality[0].Sharp > 0 || quality[0].LeastAngle > 20*math.Pi/180)
		require.Greater(t, quality[0].Mean, 0.9)
	}
	check(z())
	m := z()
	m.Fabrics[0].Plane = r3.Vec{X: 1}
	check(m)
	m.Fabrics[0].Plane = r3.Vec{X: -1}
	check(m)
	m.Fabrics[0].Plane = r3.Vec{Y: 1}
	_, err := mesh.Build(context.Background(), m)
	require.ErrorContains(t, err, "fabric sail: its plane is seen nearly edge-on from its own side: they are 90° apart")
	m.Fabrics[0].Plane = r3.Vec{X: 4.9, Z: 5}
	_, err = mesh.Build(context.Background(), m)
	require.ErrorContains(t, err, "itself when seen along (0.70, 0.00, 0.71)")
}

// One like a C overlaps whatever it is seen along: the corner at which it folds
// is named.
func TestOverlapNamesTheCorner(t *testing.T) {
	_, err := mesh.Build(context.Background(), drawn(r3.Vec{}, r3.Vec{X: 7}, r3.Vec{X: 1, Z: -0.4}, r3.Vec{X: 1, Y: 4, Z: -0.4}, r3.Vec{X: 7, Y: 4}, r3.Vec{Y: 4}))
	require.ErrorContains(t, err, "fabric sail: its boundary ")
	require.ErrorContains(t, err, "itself when seen along")
	require.ErrorContains(t, err, "edges e")
	require.Regexp(t, `folded at corner P[14]; move that corner`, err.Error())
}

func TestPatternCanBeAskedFor(t *testing.T) {
	free := func(m *canopy.Model) bool {
		_, q, err := mesh.BuildMeasured(t.Context(), m)
		require.NoError(t, err)
		return len(q) == 1
	}
	m := polygon(4)
	require.False(t, free(m))
	m.Fabrics[0].Pattern = canopy.FabricFree
	require.True(t, free(m))
	// Long and narrow at one end: free unless asked otherwise.
	m = polygon(4)
	m.Points[2].At, m.Points[3].At = r3.Vec{X: -30, Y: 1, Z: 4}, r3.Vec{X: -30, Y: -1, Z: 4}
	for i := range m.Edges {
		m.Edges[i].Kind = canopy.EdgeFixed
	}
	m.Cables = nil
	require.True(t, free(m))
	m.Fabrics[0].Pattern = canopy.FabricSides
	require.False(t, free(m))
	m = courtyard()
	m.Fabrics[0].Pattern = canopy.FabricSides
	_, err := mesh.Build(context.Background(), m)
	require.ErrorContains(t, err, "cannot be meshed along its sides")
}

// A corner sharper than the bound is named, and only the triangles in it are
// thinner.
func TestSharpCornersAreNamed(t *testing.T) {
	m := polygon(3)
	m.Points[0].At, m.Points[1].At, m.Points[2].At = r3.Vec{}, r3.Vec{X: 12}, r3.Vec{X: 12, Y: 3, Z: 0.1}
	for i := range m.Edges {
		m.Edges[i].Kind = canopy.EdgeFixed
	}
	m.Cables = nil
	m.Fabrics[0].Pattern = canopy.FabricFree
	s, q, err := mesh.BuildMeasured(t.Context(), m)
	require.NoError(t, err)
	require.True(t, q[0].Met, q[0].Why)
	require.Less(t, q[0].LeastAngle, mesh.AngleBound)
	require.Equal(t, 1, q[0].Sharp)
	require.Equal(t, m.Points[0].Name, s.NodeName.At(int(q[0].Corner)))
	require.InDelta(t, math.Atan2(3, 12), q[0].CornerAngle, 1e-3)
}
