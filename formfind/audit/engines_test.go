package audit_test

import (
	"context"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/relax"
)

// Elastic fabric as the relaxation engine finds it, taut and wrinkled under a
// strong side load, obeys the law as the audit reads it: two derivations of
// wrinkling, by maximising and by testing the conditions, agree.
func TestRelaxedElasticFabricObeysTheAuditsLaw(t *testing.T) {
	for _, load := range []float64{200, 6000} {
		s, _ := sail(t, 8, 2000, 2000)
		s.Fabrics[0] = weave
		for i := range s.Stress {
			s.Stress[i] = [2]float64{1500, 1000}
		}
		s.Reference = append([]r3.Vec(nil), s.Position...)
		s.Load = make([]r3.Vec, len(s.Position))
		for i := range s.Load {
			if s.Fixed[i] == 0 {
				s.Load[i] = r3.Vec{X: load * 0.7, Z: -load * 0.3}
			}
		}
		f, out, err := relax.New().Find(context.Background(), s, nil, engine.Settings{Residual: 1e-11, Worst: 1e-11, Move: 1e-10})
		require.NoError(t, err)
		require.Equal(t, engine.Converged, out.Status, out.Why)
		react(s, f)
		a := run(t, s, f)
		require.Less(t, a.ForceMismatch, 1e-9)
		require.Less(t, a.ResidualRMS, 1e-9)
		require.True(t, a.StabilityKnown)
		require.Zero(t, a.Unstable)
		require.Less(t, a.Virial, 1e-9)
		wrinkled := 0
		for _, st := range f.Stress {
			if _, minor := principal(st); minor < 1 {
				wrinkled++
			}
		}
		t.Logf("load %g N: %d of %d triangles wrinkled, largest misfit %.2g, firmness %.3g, %v", load, wrinkled, len(f.Stress), a.ForceMismatch, a.Softest, a.Reasons)
		if load > 1000 {
			require.Greater(t, wrinkled, 5)
		}
	}
}

func principal(s canopy.Stress) (major, minor float64) {
	m := (s.Warp + s.Weft) / 2
	d := r3.Norm(r3.Vec{X: (s.Warp - s.Weft) / 2, Y: s.Shear})
	return m + d, m - d
}
