package audit_test

import (
	"context"
	"testing"

	"github.com/stretchr/testify/require"

	"anticlast/formfind/audit"
	"anticlast/formfind/canopy"
)

// 60k triangles: 173 × 173 × 2.
func BenchmarkFilm60k(b *testing.B) {
	s, f := sail(b, 173, 2000, 2000)
	benchmark(b, s, f)
}

func BenchmarkFilm2k(b *testing.B) {
	s, f := sail(b, 32, 2000, 2000)
	benchmark(b, s, f)
}

func BenchmarkUnstableCatenoid60k(b *testing.B) {
	s := catenoid(unstableWaist, 0.5, 100, 300, 1000)
	f := solveForm(b, s, nil)
	for b.Loop() {
		_, err := audit.Run(context.Background(), s, f, audit.Options{})
		require.NoError(b, err)
	}
}

// 100k nodes: 317 × 317.
func BenchmarkNet100k(b *testing.B) {
	s, f := net(b, 317)
	benchmark(b, s, f)
}

func BenchmarkNet2k(b *testing.B) {
	s, f := net(b, 45)
	benchmark(b, s, f)
}

func benchmark(b *testing.B, s *canopy.Structure, f *canopy.Form) {
	b.ReportAllocs()
	for b.Loop() {
		a, err := audit.Run(context.Background(), s, f, audit.Options{})
		require.NoError(b, err)
		require.True(b, a.Trusted, "%v", a.Reasons)
	}
}

func BenchmarkQuantities60k(b *testing.B) {
	s, f := sail(b, 173, 2000, 2000)
	for b.Loop() {
		audit.Quantities(s, f, canopy.Factors{})
	}
}
