package export

import (
	"math"
	"strings"
	"testing"

	"anticlast/formfind/canopy"

	"github.com/stretchr/testify/require"
)

func difference(t *testing.T, list []Difference, group, name string) Difference {
	t.Helper()
	for _, d := range list {
		if d.Group == group && d.Name == name {
			return d
		}
	}
	t.Fatalf("no %s %s", group, name)
	return Difference{}
}

func TestDifferencesMatchByName(t *testing.T) {
	a, b := sail(6), sail(6)
	for i := range b.Form.Position {
		b.Form.Position[i].Z += 0.25
	}
	b.Summary.Cables[0].ForceMean = 30e3
	b.Structure.Cables[5].Name = "G9"
	b.Form.Reaction[0].X *= 2
	list := Differences(a, b)
	d := difference(t, list, "highest point", "")
	require.InDelta(t, 6.5, d.A, 1e-12)
	require.InDelta(t, 6.75, d.B, 1e-12)
	require.InDelta(t, 0.25, difference(t, list, "largest move of a node", "").B, 1e-12)
	require.InDelta(t, 30, difference(t, list, "cable force, mean", "edge cable AB").B, 1e-12)
	require.True(t, math.IsNaN(difference(t, list, "cable force, mean", "guy G1").B))
	require.True(t, math.IsNaN(difference(t, list, "cable force, mean", "guy G9").A))
	d = difference(t, list, "reaction, size", "A")
	require.Greater(t, d.B, d.A)
	var s strings.Builder
	require.NoError(t, Compare(&s, a, b, Options{}))
	for _, want := range []string{"A  Quay market sail, trusted", "+0.250", "30.000", canopy.Caution[:40]} {
		require.Contains(t, s.String(), want)
	}
	// Other meshes have no common nodes.
	for _, d := range Differences(sail(6), sail(7)) {
		require.NotEqual(t, "largest move of a node", d.Group)
	}
	require.NoError(t, Compare(&s, sail(3), grid(4), Options{Width: 60, Colour: true}))
}

func TestAFormDoesNotDifferFromItself(t *testing.T) {
	for _, r := range []*canopy.Result{sail(5), cone(8), grid(4)} {
		for _, d := range Differences(r, r) {
			if d.Group == "largest move of a node" {
				require.Zero(t, d.B)
			} else {
				require.Equal(t, d.A, d.B, d)
			}
		}
	}
}
