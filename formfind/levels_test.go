package formfind_test

import (
	"context"
	"math"
	"reflect"
	"runtime"
	"testing"

	"github.com/stretchr/testify/require"

	"anticlast/formfind"
	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/mesh"
)

// Coarse to fine ends where one level ends, with few steps on the fine mesh, and
// with the same bits for any number of processors, on meshes large enough to be
// shared among three: with edge cables, with nodes of a ring that share their
// unknowns, and with pressure.
func TestSolveLevels(t *testing.T) {
	ring := cases.RingOnMast(5, 0.5, 0.8, 1000, 2*math.Pi*1000*cases.ConeConstant(5, 0.5, 1, 1), 32, 8)
	for _, k := range []struct {
		cases.Case
		most int // iterations on the finest mesh
	}{{cases.FourPoint(10, 3, 2500, 30e3, 0.1, 16), 3}, {ring, 4}, {cases.SphereCap(5, 1, 5, 32, 8), 3}} {
		c := k.Case
		t.Run(c.Name, func(t *testing.T) {
			fine := c.S
			var steps []*mesh.Refinement
			for range 3 {
				r, err := mesh.Refine(fine)
				require.NoError(t, err)
				steps, fine = append(steps, r), r.Fine
			}
			require.Greater(t, len(fine.Position), 15_000)
			var rec *engine.Recorder
			type result struct {
				form *canopy.Form
				rows []float64
				off  float64
			}
			at := func(processors int) result {
				defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(processors))
				rec = &engine.Recorder{}
				r, err := formfind.SolveLevels(t.Context(), c.S, steps, formfind.Options{Recorder: rec})
				require.NoError(t, err)
				trusted(t, r)
				got := result{form: r.Form, off: r.Audit.Discretisation}
				for _, row := range rec.Rows {
					got.rows = append(got.rows, row.Residual)
				}
				return got
			}
			one := at(1)
			require.LessOrEqual(t, one.rows[len(one.rows)-1], 1e-9)
			require.LessOrEqual(t, rec.Rows[len(rec.Rows)-1].Iteration, k.most)
			for _, processors := range []int{2, 3} {
				require.True(t, reflect.DeepEqual(one, at(processors)), "%d processors", processors)
			}
			if c.S.Ends == nil {
				return
			}
			whole := solve(t, fine, formfind.Options{})
			require.InEpsilon(t, cases.Area(fine, whole.Form.Position), cases.Area(fine, one.form.Position), 3*one.off)
		})
	}
}

// A solve that is cancelled ends at once, wherever it is, and leaves no goroutine at
// work on the structures.
func TestCancelSolveLevels(t *testing.T) {
	c := cases.FourPoint(10, 3, 2500, 30e3, 0.1, 16)
	fine := c.S
	var steps []*mesh.Refinement
	for range 3 {
		r, err := mesh.Refine(fine)
		require.NoError(t, err)
		steps, fine = append(steps, r), r.Fine
	}
	defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(2))
	told := 0
	for k := range 1000 {
		ctx, cancel := context.WithCancel(t.Context())
		told = 0
		_, err := formfind.SolveLevels(ctx, c.S, steps, formfind.Options{Progress: func(engine.Step) {
			if told++; told > k*3 {
				cancel()
			}
		}})
		cancel()
		for i := range fine.Position { // a race if something still reads it
			fine.Position[i].X += 0
		}
		if err == nil {
			require.Greater(t, k, 3)
			return
		}
		require.ErrorIs(t, err, context.Canceled)
	}
	t.Fatal("never ends")
}
