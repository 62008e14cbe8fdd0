package sparse

import (
	"context"
	"fmt"
	"math/rand/v2"
	"testing"
)

func benchSystem(side int, diagonals bool) *system {
	n, pairs := gridPairs(side, side, diagonals)
	return laplacian(rand.New(rand.NewPCG(1, 1)), n, pairs)
}

func forEachSize(b *testing.B, run func(b *testing.B, s *system)) {
	for _, side := range []int{32, 100, 316} {
		for _, diagonals := range []bool{false, true} {
			name := fmt.Sprintf("quad%d", side*side)
			if diagonals {
				name = fmt.Sprintf("tri%d", side*side)
			}
			b.Run(name, func(b *testing.B) {
				s := benchSystem(side, diagonals)
				b.ReportAllocs()
				run(b, s)
			})
		}
	}
}

func BenchmarkAnalyze(b *testing.B) {
	forEachSize(b, func(b *testing.B, s *system) {
		for b.Loop() {
			if _, err := Analyze(context.Background(), s.n, s.pairs, Options{}); err != nil {
				b.Fatal(err)
			}
		}
	})
}

func benchmarkRefactor(b *testing.B, kind Kind) {
	forEachSize(b, func(b *testing.B, s *system) {
		f := factorise(b, s, kind, Options{})
		for b.Loop() {
			if err := f.Refactor(context.Background(), s.values); err != nil {
				b.Fatal(err)
			}
		}
		c := f.Analysis().Cost()
		b.ReportMetric(float64(c.Nonzeros), "nnz")
		b.ReportMetric(c.Flops*float64(b.N)/b.Elapsed().Seconds()/1e9, "GF/s")
	})
}

func BenchmarkRefactorCholesky(b *testing.B) { benchmarkRefactor(b, Cholesky) }
func BenchmarkRefactorLDL(b *testing.B)      { benchmarkRefactor(b, LDL) }

func BenchmarkSolve3(b *testing.B) {
	forEachSize(b, func(b *testing.B, s *system) {
		f := factorise(b, s, Cholesky, Options{})
		rhs, x := make([]float64, 3*s.n), make([]float64, 3*s.n)
		for i := range rhs {
			rhs[i] = float64(i%7) - 3
		}
		for b.Loop() {
			copy(x, rhs)
			if err := f.Solve(x, 3); err != nil {
				b.Fatal(err)
			}
		}
	})
}
