package mesh

import (
	"math"
	"testing"

	"github.com/stretchr/testify/require"
)

// Heights inside are the means of their neighbours', whatever the outline, and
// finding them takes about as many steps on fine meshes as on coarse ones.
func TestHeightsTakeFewSteps(t *testing.T) {
	for _, fine := range []float64{1, 0.25} {
		for _, d := range drawings(fine) {
			f := d.divided()
			tri, in, fault := f.outline()
			require.Nil(t, fault)
			r := refinement{d: tri, size: f.size, most: max(f.mean, f.lone), in: in, rim: len(tri.p)}
			r.run(MaxTriangles)
			h := make([]float64, len(r.d.p))
			lo, hi := math.Inf(1), math.Inf(-1)
			for i := 3; i < r.rim; i++ {
				h[i] = 3 * math.Sin(0.3*r.d.p[i].x) * math.Cos(0.2*r.d.p[i].y)
				lo, hi = min(lo, h[i]), max(hi, h[i])
			}
			steps := r.relaxHeights(h)
			t.Logf("%s: %d triangles, %d steps", d.name, len(r.in), steps)
			require.Less(t, steps, 60)
			start, near := r.neighbours()
			for i := range len(h) - r.rim {
				sum := 0.0
				for _, q := range near[start[i]:start[i+1]] {
					sum += h[q]
				}
				if k := float64(start[i+1] - start[i]); k > 0 {
					require.InDelta(t, sum/k, h[r.rim+i], 1e-5*(hi-lo))
				}
			}
		}
	}
}
