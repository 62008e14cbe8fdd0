package limit_test

import (
	"math"
	"testing"

	"github.com/stretchr/testify/require"

	"anticlast/formfind/canopy"
	"anticlast/formfind/limit"
)

// A coarse mesh is told among the warnings, where it is known to be one.
func TestCoarseMeshesAreTold(t *testing.T) {
	others := []canopy.Finding{{ID: "headroom", Severity: canopy.Broken}, {ID: "slope-low", Severity: canopy.Warning}, {ID: "cable-sag"}}
	require.Equal(t, others, limit.WithFineness(others, math.NaN()))
	require.Equal(t, others, limit.WithFineness(others, 0.002))
	got := limit.WithFineness(others, 0.0153)
	require.Len(t, got, 4)
	require.Equal(t, "mesh-coarse", got[1].ID)
	require.Contains(t, got[1].Text, "1.5 % of its size")
}
