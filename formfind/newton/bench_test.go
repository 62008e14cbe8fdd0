package newton_test

import (
	"fmt"
	"testing"

	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/newton"
)

// benchmarkCases are the surfaces on which engines are compared, n chosen for
// about the given number of triangles.
func benchmarkCases() []struct {
	name string
	make func(triangles int) (cases.Case, *canopy.Form)
} {
	side := func(triangles int) int {
		n := 1
		for 2*n*n < triangles {
			n++
		}
		return n
	}
	type mk = func(triangles int) (cases.Case, *canopy.Form)
	shaken := func(f func(n int) cases.Case, size float64) mk {
		return func(triangles int) (cases.Case, *canopy.Form) {
			c := f(side(triangles))
			at := c.S.Position
			if c.Exact != nil {
				at = c.Disturbed(c.Exact, size, 0)
			}
			return c, c.Form(at)
		}
	}
	return []struct {
		name string
		make mk
	}{
		{"catenoid", shaken(func(n int) cases.Case { return cases.Catenoid(0.5, 2*n, n/2, true, 1000) }, 1e-3)},
		{"Scherk", shaken(func(n int) cases.Case { return cases.Scherk(1, n, 1000) }, 1e-3)},
		{"SchwarzD", shaken(func(n int) cases.Case { return cases.SchwarzD(n, 1000) }, 0)},
		{"canopy", shaken(func(n int) cases.Case { return cases.FourPoint(10, 3, 2500, 30e3, 0.1, n) }, 0)},
	}
}

// BenchmarkFind is one call from a smooth start, set-up and ordering included.
func BenchmarkFind(b *testing.B) {
	for _, k := range benchmarkCases() {
		for _, triangles := range []int{15_000, 60_000} {
			b.Run(fmt.Sprintf("%s/%d", k.name, triangles), func(b *testing.B) {
				c, start := k.make(triangles)
				var out engine.Outcome
				for b.Loop() {
					_, out = find(b, c.S, start)
				}
				b.ReportMetric(float64(out.Iterations), "steps")
			})
		}
	}
}

// BenchmarkAgain moves a corner of a canopy up and down and finds the form
// anew, starting from the last one with everything cached.
func BenchmarkAgain(b *testing.B) {
	for _, n := range []int{35, 49, 86} { // 2.5k, 4.8k and 15k triangles
		b.Run(fmt.Sprintf("%d", 2*n*n), func(b *testing.B) {
			c := cases.FourPoint(10, 3, 2500, 30e3, 0.1, n)
			v, err := newton.New(ctx, c.S)
			if err != nil {
				b.Fatal(err)
			}
			f, _, err := v.Find(ctx, nil, engine.Settings{})
			if err != nil {
				b.Fatal(err)
			}
			corner := len(c.S.Position) - 1
			up := 0.1
			steps := 0
			for b.Loop() {
				c.S.Position[corner].Z += up
				up = -up
				var out engine.Outcome
				f, out, err = v.Find(ctx, f, engine.Settings{})
				if err != nil || out.Status != engine.Converged {
					b.Fatal(err, out.Why)
				}
				steps += out.Iterations
			}
			b.ReportMetric(float64(steps)/float64(b.N), "steps")
		})
	}
}

// BenchmarkNew is the preparation alone.
func BenchmarkNew(b *testing.B) {
	c := cases.FourPoint(10, 3, 2500, 30e3, 0.1, 173)
	for b.Loop() {
		if _, err := newton.New(ctx, c.S); err != nil {
			b.Fatal(err)
		}
	}
}
