package fdm

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"
)

// The derivatives of all quantities against central differences, and Jᵀ
// against J.
func TestDerivativesAgreeWithDifferences(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 9))
	ctx := context.Background()
	for trial := range 20 {
		const cells = 4
		var n Network
		for j := 0; j <= cells; j++ {
			for i := 0; i <= cells; i++ {
				n.Position = append(n.Position, r3.Vec{X: float64(i) + 0.3*r.Float64(), Y: float64(j), Z: 3 * r.Float64()})
				n.Load = append(n.Load, r3.Vec{Z: r.NormFloat64()})
				fixed := Directions(0)
				if (i == 0 || i == cells) && (j == 0 || j == cells) {
					fixed = DirAll
				} else if i == 0 {
					fixed = DirX
				}
				n.Fixed = append(n.Fixed, fixed)
				n.Master = append(n.Master, -1)
				k := int32(i + j*(cells+1))
				if i < cells {
					n.Ends = append(n.Ends, [2]int32{k, k + 1})
				}
				if j < cells {
					n.Ends = append(n.Ends, [2]int32{k + cells + 1, k})
				}
			}
		}
		n.Master[12] = 6 // a tied node on the way
		s, err := New(ctx, n, []Panel{{Corners: [3]int32{6, 7, 11}, WarpStress: 1, WeftStress: 2}})
		if err != nil {
			t.Fatal(err)
		}
		q, ea, group := make([]float64, len(n.Ends)), make([]float64, len(n.Ends)), make([]int32, len(n.Ends))
		for k := range q {
			q[k], ea[k], group[k] = 0.5+r.Float64(), 5+10*r.Float64(), int32(r.IntN(9))-1
		}
		if trial%2 == 0 {
			group = nil
		}
		member := func(a, b int32) int32 {
			for k, e := range n.Ends {
				if e == [2]int32{a, b} || e == [2]int32{b, a} {
					return int32(k)
				}
			}
			panic("no such member")
		}
		targets := []Target{
			{Quantity: Force, Members: []int32{3}, Value: 2},
			{Quantity: Force, Members: []int32{5, 9, 11}, Value: 1, Weight: 3},
			{Quantity: Length, Members: []int32{2, 7}, Value: 4},
			{Quantity: Unstressed, Members: []int32{8, 4}, Value: 3},
			{Quantity: Sag, Members: []int32{member(0, 1), member(1, 2), member(2, 3), member(3, 4)}, Value: 0.1},
			{Quantity: Sag, Members: []int32{member(17, 12), member(12, 7)}, Value: 0.2},
		}
		goals, err := newGoals(targets, s.ends, ea)
		if err != nil {
			t.Fatal(err)
		}
		f, err := s.newFit(q, goals, FitSettings{Group: group, Range: 1e6})
		if err != nil {
			t.Fatal(err)
		}
		if err := s.Shape(ctx, f.x, f.q); err != nil {
			t.Fatal(err)
		}
		goals.measure(f.x, f.q)
		goals.differentiate(f.x, f.q)
		v, w := make([]float64, f.count), make([]float64, len(targets))
		for i := range v {
			v[i] = r.NormFloat64()
		}
		for i := range w {
			w[i] = r.NormFloat64()
		}
		jv, jw := make([]float64, len(w)), make([]float64, len(v))
		if err := f.forward(jv, v); err != nil {
			t.Fatal(err)
		}
		if err := f.backward(jw, w); err != nil {
			t.Fatal(err)
		}
		if a, b := dotFlat(w, jv), dotFlat(jw, v); math.Abs(a-b) > 1e-11*(1+math.Abs(a)) {
			t.Errorf("w·Jv = %g, Jᵀw·v = %g", a, b)
		}
		const h = 1e-5
		side := func(sign float64) []float64 {
			moved := make([]float64, len(q))
			for k, i := range f.variable {
				moved[k] = q[k]
				if i >= 0 {
					moved[k] *= math.Exp(sign * h * v[i])
				}
			}
			x := make([]r3.Vec, len(f.x))
			if err := s.Shape(ctx, x, moved); err != nil {
				t.Fatal(err)
			}
			goals.measure(x, moved)
			return append([]float64(nil), goals.off...)
		}
		up, down := side(1), side(-1)
		for i := range jv {
			if d := (up[i] - down[i]) / (2 * h); math.Abs(d-jv[i]) > 1e-7*(1+math.Abs(d)) {
				t.Errorf("trial %d, target %d (%s): derivative %.10g, differences %.10g", trial, i, targets[i].Quantity, jv[i], d)
			}
		}
	}
}

// Both ways of solving for the step give the same step.
func TestStepsAgree(t *testing.T) {
	r := rand.New(rand.NewPCG(4, 4))
	ctx := context.Background()
	for trial := range 20 {
		n := Network{Position: []r3.Vec{{}}, Fixed: []Directions{DirAll}}
		for i := int32(1); i < 30; i++ {
			n.Position = append(n.Position, r3.Vec{X: r.NormFloat64(), Y: r.NormFloat64(), Z: r.NormFloat64()})
			n.Fixed = append(n.Fixed, 0)
			if i%5 == 0 {
				n.Fixed[i] = DirAll
			}
			for range 2 {
				n.Ends = append(n.Ends, [2]int32{r.Int32N(i), i})
			}
		}
		s, err := New(ctx, n, nil)
		if err != nil {
			t.Fatal(err)
		}
		q := make([]float64, len(n.Ends))
		var targets []Target
		for k := range q {
			q[k] = 0.5 + r.Float64()
			if k%2 == 0 || trial%2 == 0 {
				targets = append(targets, Target{Quantity: Force, Members: []int32{int32(k)}, Value: 1 + r.Float64()})
			}
		}
		set := FitSettings{Range: 1e6}
		if trial%2 == 0 { // fewer variables than targets
			set.Group = make([]int32, len(q))
			for k := range q {
				set.Group[k] = int32(k % 7)
			}
		}
		goals, err := newGoals(targets, s.ends, nil)
		if err != nil {
			t.Fatal(err)
		}
		f, err := s.newFit(q, goals, set)
		if err != nil {
			t.Fatal(err)
		}
		if err := s.Shape(ctx, f.x, f.q); err != nil {
			t.Fatal(err)
		}
		f.factored = true
		goals.measure(f.x, f.q)
		goals.differentiate(f.x, f.q)
		copy(f.off, goals.off)
		f.frozen[2] = trial%3 == 0
		dense, many := &denseStep{f: f}, &sparseStep{f: f}
		if err := dense.linearise(ctx); err != nil {
			t.Fatal(err)
		}
		if err := many.linearise(ctx); err != nil {
			t.Fatal(err)
		}
		a, b := make([]float64, f.count), make([]float64, f.count)
		pa, err := dense.step(ctx, a, 1e-3)
		if err != nil {
			t.Fatal(err)
		}
		pb, err := many.step(ctx, b, 1e-3)
		if err != nil {
			t.Fatal(err)
		}
		for i := range a {
			if math.Abs(a[i]-b[i]) > 1e-9*norm2(a) {
				t.Errorf("trial %d: variable %d steps %g and %g", trial, i, a[i], b[i])
			}
		}
		if math.Abs(pa-pb) > 1e-9*pa {
			t.Errorf("trial %d: promises %g and %g", trial, pa, pb)
		}
	}
}
