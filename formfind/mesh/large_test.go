package mesh_test

import (
	"fmt"
	"runtime"
	"testing"

	"anticlast/formfind/canopy"
	"anticlast/formfind/internal/sweep"
	"anticlast/formfind/mesh"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

// square is a fixed square of n sides a side, meshed freely.
func freeSquare(n float64) *canopy.Model {
	m := drawn(r3.Vec{}, r3.Vec{X: n}, r3.Vec{X: n, Y: n, Z: 3}, r3.Vec{Y: n})
	m.MeshSize = 1
	return m
}

// A mesh takes a few hundred bytes a triangle, and neighbours have near numbers:
// nodes of a triangle differ by a few times the root of the number of nodes.
func TestLargeMeshes(t *testing.T) {
	n := float64(sweep.N(60, 200, 660)) // 8,000, 92,000, 1,000,000 triangles
	m := freeSquare(n)
	var before, after runtime.MemStats
	runtime.GC()
	runtime.ReadMemStats(&before)
	s, err := mesh.Build(t.Context(), m)
	require.NoError(t, err)
	runtime.ReadMemStats(&after)
	count := float64(len(s.Corners))
	require.InDelta(t, n*n/0.433, count, 0.05*count)
	t.Logf("%.0f triangles, %.0f bytes allocated a triangle in all", count, float64(after.TotalAlloc-before.TotalAlloc)/count)
	require.Less(t, float64(after.TotalAlloc-before.TotalAlloc)/count, 400.0)
	runtime.GC()
	runtime.ReadMemStats(&after)
	require.Less(t, float64(after.HeapAlloc)-float64(before.HeapAlloc), 300*count)
	far := 0
	for _, c := range s.Corners {
		inner := min(c[0], c[1], c[2]) > int32(4*n) // nodes of edges come first
		if inner {
			far = max(far, int(max(c[0], c[1], c[2])-min(c[0], c[1], c[2])))
		}
	}
	require.Less(t, float64(far), 4*n)
	runtime.KeepAlive(s)
}

// Time and memory of 92,000, 250,000 and 1,000,000 triangles.
func BenchmarkFreeSquare(b *testing.B) {
	for _, n := range []float64{200, 330, 660} {
		m := freeSquare(n)
		b.Run(fmt.Sprintf("%.0fk", n*n/433), func(b *testing.B) {
			b.ReportAllocs()
			triangles := 0
			for b.Loop() {
				triangles = len(build(b, m).Corners)
			}
			b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/float64(triangles), "ns/triangle")
		})
	}
}
