package examples_test

import (
	"context"
	"math"
	"path/filepath"
	"testing"

	"anticlast/formfind"
	"anticlast/formfind/canopy"
	"anticlast/formfind/spec"
	"github.com/stretchr/testify/require"
)

// Every example is read without a warning, found, trusted, within its own
// limits, and meshed well.
func TestExamplesAreTrusted(t *testing.T) {
	files, err := filepath.Glob("*.yaml")
	require.NoError(t, err)
	require.GreaterOrEqual(t, len(files), 15)
	for _, file := range files {
		t.Run(file, func(t *testing.T) {
			ctx := context.Background()
			m, err := spec.Read(ctx, spec.File(file), spec.Options{Warn: func(d spec.Diagnostic) { t.Errorf("%v", d) }})
			require.NoError(t, err)
			r, err := formfind.Find(ctx, m, formfind.Options{})
			require.NoError(t, err)
			require.True(t, r.Audit.Trusted, r.Audit.Reasons)
			require.LessOrEqual(t, r.Audit.ResidualLargest, 1e-9)
			require.Zero(t, r.Audit.Unstable)
			for _, f := range r.Findings {
				require.NotEqual(t, canopy.Broken, f.Severity, f.Text)
			}
			if len(r.Structure.Corners) > 0 {
				require.Greater(t, r.Audit.MinAngle, 20*math.Pi/180)
			}
		})
	}
}
