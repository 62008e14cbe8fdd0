package newton_test

import (
	"context"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/newton"
)

var ctx = context.Background()

var _ engine.Engine = newton.Engine{}

// find runs the engine and requires convergence to a stable shape.
func find(t testing.TB, s *canopy.Structure, start *canopy.Form) (*canopy.Form, engine.Outcome) {
	t.Helper()
	f, out, err := newton.Engine{}.Find(ctx, s, start, engine.Settings{})
	require.NoError(t, err)
	require.Equal(t, engine.Converged, out.Status, out.Why)
	require.Zero(t, out.NegativePivots)
	require.LessOrEqual(t, out.Residual, 1e-9)
	require.True(t, f.Converged)
	return f, out
}

// distance is the largest distance between nodes of the same number.
func distance(a, b []r3.Vec) float64 {
	most := 0.0
	for i := range a {
		most = max(most, r3.Norm(r3.Sub(a[i], b[i])))
	}
	return most
}

// worstDistance is the largest distance of a node from the exact surface.
func worstDistance(c *cases.Case, at []r3.Vec) float64 {
	most := 0.0
	for _, p := range at {
		if d := c.Distance(p); d > most {
			most = d
		} else if -d > most {
			most = -d
		}
	}
	return most
}
