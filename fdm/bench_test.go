package fdm_test

import (
	"context"
	"fmt"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/fdm"
)

// BenchmarkShape is one shape of a net whose connections are analysed already:
// fill the matrix, factorise, solve for three directions, check the balance.
func BenchmarkShape(b *testing.B) {
	for _, cells := range []int{100, 316} {
		b.Run(fmt.Sprintf("nodes=%d", (cells+1)*(cells+1)), func(b *testing.B) {
			n := saddle(cells, cells, 100, 20)
			s := newSolver(b, n, nil)
			q := uniform(len(n.Ends), 1)
			x := make([]r3.Vec, s.Nodes())
			b.ReportAllocs()
			for b.Loop() {
				if err := s.Shape(context.Background(), x, q); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

// BenchmarkShapeWithStruts is the same with one member in a hundred in
// compression, which takes the factorisation for indefinite systems.
func BenchmarkShapeWithStruts(b *testing.B) {
	n := saddle(100, 100, 100, 20)
	s := newSolver(b, n, nil)
	q := uniform(len(n.Ends), 1)
	for k := 0; k < len(q); k += 100 {
		q[k] = -0.2
	}
	x := make([]r3.Vec, s.Nodes())
	for b.Loop() {
		if err := s.Shape(context.Background(), x, q); err != nil {
			b.Fatal(err)
		}
	}
}

// BenchmarkNew is the analysis of a net.
func BenchmarkNew(b *testing.B) {
	for _, cells := range []int{100, 316} {
		b.Run(fmt.Sprintf("nodes=%d", (cells+1)*(cells+1)), func(b *testing.B) {
			n := saddle(cells, cells, 100, 20)
			for b.Loop() {
				newSolver(b, n, nil)
			}
		})
	}
}

// BenchmarkNatural is one pass with natural force densities over about 60,000
// triangles, analysed already.
func BenchmarkNatural(b *testing.B) {
	n, panels, force := sail(173, 30)
	s := newSolver(b, n, panels)
	q := make([]float64, len(force))
	for k, l := range lengths(n, n.Position) {
		q[k] = force[k] / l
	}
	x := shape(b, s, q)
	b.ReportAllocs()
	var r fdm.NaturalResult
	for b.Loop() {
		var err error
		if r, err = s.Natural(context.Background(), x, fdm.Given{Force: force}, 1); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(len(panels)), "triangles")
	b.ReportMetric(r.Residual, "residual")
}

// BenchmarkFit meets one force target for each of the four edges of a net.
func BenchmarkFit(b *testing.B) {
	n := saddle(30, 30, 10, 3)
	s := newSolver(b, n, nil)
	q := uniform(len(n.Ends), 1)
	var targets []fdm.Target
	for k := 400; k < 420; k++ {
		targets = append(targets, fdm.Target{Quantity: fdm.Force, Members: []int32{int32(k)}, Value: 0.5})
	}
	for b.Loop() {
		r, err := s.Fit(context.Background(), q, targets, fdm.FitSettings{})
		if err != nil || r.Status != fdm.FitMet {
			b.Fatal(err, r.Why)
		}
	}
}
