package formfind_test

import (
	"runtime"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind"
	"anticlast/formfind/engine"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/mesh"
)

// Coarse to fine ends where one level ends, with fewer steps on the fine mesh, and
// with the same bits for any number of processors.
func TestSolveLevels(t *testing.T) {
	c := cases.FourPoint(10, 3, 2500, 30e3, 0.1, 11)
	fine := c.S
	var steps []*mesh.Refinement
	for range 3 {
		r, err := mesh.Refine(fine)
		require.NoError(t, err)
		steps, fine = append(steps, r), r.Fine
	}
	rec := &engine.Recorder{}
	type result struct {
		position []r3.Vec
		off      float64
	}
	at := func(processors int) result {
		defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(processors))
		rec = &engine.Recorder{}
		r, err := formfind.SolveLevels(t.Context(), c.S, steps, formfind.Options{Recorder: rec})
		require.NoError(t, err)
		trusted(t, r)
		return result{r.Form.Position, r.Audit.Discretisation}
	}
	one := at(1)
	last := rec.Rows[len(rec.Rows)-1]
	require.LessOrEqual(t, last.Residual, 1e-9)
	require.LessOrEqual(t, last.Iteration, 3)
	require.Equal(t, one, at(2))
	whole := solve(t, fine, formfind.Options{})
	require.InEpsilon(t, cases.Area(fine, whole.Form.Position), cases.Area(fine, one.position), 3*one.off)
}
