package relax_test

import (
	"context"
	"testing"

	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/relax"
)

// benchmark lets s relax for a fixed number of iterations, so that the figure
// is the cost of an iteration.
func benchmark(b *testing.B, s *canopy.Structure, start *canopy.Form) {
	const iterations = 100
	e := relax.New()
	set := engine.Settings{MaxIterations: iterations, Residual: 1e-30}
	for b.Loop() {
		if _, _, err := e.Find(context.Background(), s, start, set); err != nil {
			b.Fatal(err)
		}
	}
	n := float64(b.N) * iterations * float64(len(s.Corners)+len(s.Ends))
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/n, "ns/element")
}

func BenchmarkUniformFilm60k(b *testing.B) {
	c := cases.Scherk(1, 174, 2500)
	benchmark(b, c.S, c.Form(c.Exact))
}

func BenchmarkElasticMembrane(b *testing.B) {
	f := sheet
	f.Pressure = 1000
	benchmark(b, disc(5, 60, f, 2000), nil)
}

func BenchmarkForceDensityNet100k(b *testing.B) {
	c := cases.QuadNet(100, 20, 1000, 220)
	benchmark(b, c.S, nil)
}

// BenchmarkScherkToRest is a whole relaxation from the linear start.
func BenchmarkScherkToRest(b *testing.B) {
	c := cases.Scherk(1, 64, 2500)
	start := linearStart(c.S, 4)
	for b.Loop() {
		relaxed(b, relax.New(), c.S, start, engine.Settings{})
	}
}
