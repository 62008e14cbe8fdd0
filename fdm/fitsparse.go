package fdm

import (
	"context"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/fdm/sparse"
)

// sparseStep solves the damped least squares problem with many targets and
// variables directly. With displacements u, steps p, the balance D·u = B·p as a
// constraint with multipliers λ, and the differences w = E·u + G·p + off, the
// least of ½‖w‖² + ½mu‖p‖² is where
//
//	⎡ 0   0   D   Eᵀ ⎤ ⎡u⎤   ⎡  0  ⎤
//	⎢ 0   mu −Bᵀ  Gᵀ ⎥ ⎢p⎥ = ⎢  0  ⎥
//	⎢ D  −B   0   0  ⎥ ⎢λ⎥   ⎢  0  ⎥
//	⎣ E   G   0  −1  ⎦ ⎣w⎦   ⎣ −off⎦
//
// (the augmented system, Björck 1996). It is as sparse as the net; J, which is
// not, never appears.
type sparseStep struct {
	f        *fit
	analysis *sparse.Analysis
	factor   *sparse.Factor
	pairs    [][2]int32
	values   []float64 // diagonal, then pairs
	rhs      []float64

	// First unknowns of each axis of each system for u and for λ, of p and w.
	axes []axisBlock
	p, w int
	n    int
	// The first balance pairs belong to D and B, in units of the mean force
	// density. They are scaled anew in every step, see scaling.
	balance     int
	base        []float64 // values of all pairs as linearise leaves them
	byP, byMove float64   // mean squares of the columns of G and the entries of B
}

type axisBlock struct {
	sys  *system
	axis int
	u, l int
}

// memory is what the sparse system may take in bytes; beyond it Fit refuses.
const memory = 4 << 30

func (g *sparseStep) number() {
	f := g.f
	for _, sys := range f.s.systems {
		for _, axis := range sys.axes {
			g.axes = append(g.axes, axisBlock{sys: sys, axis: axis, u: g.n, l: g.n + sys.n})
			g.n += 2 * sys.n
		}
	}
	g.p = g.n
	g.n += f.count
	g.w = g.n
	g.n += len(f.off)
}

// linearise writes down the system at the present shape and analyses it when
// its pattern is new.
func (g *sparseStep) linearise(ctx context.Context) error {
	f := g.f
	if g.n == 0 {
		g.number()
	}
	before := g.pairs
	g.pairs, g.base = make([][2]int32, 0, cap(before)), g.base[:0]
	add := func(i, j int, v float64) {
		g.pairs = append(g.pairs, [2]int32{int32(i), int32(j)})
		g.base = append(g.base, v)
	}
	g.byP, g.byMove = 0, 0
	mean := 0.0
	for _, w := range f.s.weight {
		mean += math.Abs(w) / float64(len(f.s.weight))
	}
	moves := 0
	for _, b := range g.axes {
		for k, l := range f.s.links {
			i, j := int(b.sys.unknown[l[0]]), int(b.sys.unknown[l[1]])
			w := f.s.weight[k] / mean
			if i == j || w == 0 {
				continue
			}
			if i >= 0 {
				add(b.u+i, b.l+i, w)
			}
			if j >= 0 {
				add(b.u+j, b.l+j, w)
			}
			if i >= 0 && j >= 0 {
				add(b.u+i, b.l+j, -w)
				add(b.u+j, b.l+i, -w)
			}
		}
		for k, v := range f.variable {
			if v < 0 {
				continue
			}
			e := f.s.ends[k]
			i, j := int(b.sys.unknown[e[0]]), int(b.sys.unknown[e[1]])
			if i == j {
				continue
			}
			d := r3.Sub(f.x[e[1]], f.x[e[0]])
			c := f.q[k] / mean * *at(&d, b.axis)
			if f.frozen[v] {
				c = 0
			}
			g.byMove += c * c
			moves++
			if i >= 0 {
				add(g.p+int(v), b.l+i, -c)
			}
			if j >= 0 {
				add(g.p+int(v), b.l+j, c)
			}
		}
	}
	g.byMove /= float64(max(moves, 1))
	g.balance = len(g.pairs)
	goals := f.goals
	for t := range f.off {
		for m := goals.nodeFirst[t]; m < goals.nodeFirst[t+1]; m++ {
			for _, b := range g.axes {
				if i := int(b.sys.unknown[goals.node[m]]); i >= 0 {
					add(g.w+t, b.u+i, *at(&goals.byPosition[m], b.axis))
				}
			}
		}
		for m := goals.memberFirst[t]; m < goals.memberFirst[t+1]; m++ {
			k := goals.member[m]
			if v := f.variable[k]; v >= 0 {
				c := goals.byDensity[m] * f.q[k]
				if f.frozen[v] {
					c = 0
				}
				g.byP += c * c / float64(f.count)
				add(g.w+t, g.p+int(v), c)
			}
		}
	}
	if slices.Equal(before, g.pairs) {
		return nil
	}
	var err error
	if g.analysis, err = sparse.Analyze(ctx, g.n, g.pairs, sparse.Options{MemoryBudget: memory}); err != nil {
		return fmt.Errorf("fdm: %w", err)
	}
	if g.factor, err = g.analysis.NewFactor(sparse.LDL); err != nil {
		return fmt.Errorf("fdm: %w", err)
	}
	g.rhs = make([]float64, g.n)
	g.values = make([]float64, g.n+len(g.pairs))
	return nil
}

// scaling multiplies the balance D·u = B·p so that the pivots of w, p and λ, in
// this order, are acceptable by themselves: with G² + mu on the diagonal of p
// and B beside it, elimination leaves B²/(G² + mu) for λ beside D, which is
// about 1. Otherwise pivots are put off and the factor fills up.
func (g *sparseStep) scaling(mu float64) float64 {
	if g.byMove == 0 {
		return 1
	}
	return (g.byP + mu) / g.byMove
}

func (g *sparseStep) step(ctx context.Context, p []float64, mu float64) (float64, error) {
	f := g.f
	// Variables without any effect need a pivot of their own.
	const least = 1e-30
	scale := g.scaling(max(mu, least))
	entries := g.values[g.n:]
	for k, v := range g.base[:g.balance] {
		entries[k] = scale * v
	}
	copy(entries[g.balance:], g.base[g.balance:])
	for t := range f.off {
		g.values[g.w+t] = -1
	}
	for v := range p {
		g.values[g.p+v] = max(mu, least)
		if f.frozen[v] {
			g.values[g.p+v] = 1
		}
	}
	if err := g.factor.Refactor(ctx, g.values); err != nil {
		return 0, err
	}
	clear(g.rhs)
	for t, o := range f.off {
		g.rhs[g.w+t] = -o
	}
	if err := g.factor.Solve(g.rhs, 1); err != nil {
		return 0, err
	}
	copy(p, g.rhs[g.p:g.w])
	// w is what is left: J·p = w − off.
	sum := 0.0
	for t, o := range f.off {
		d := g.rhs[g.w+t] - o
		sum += d * d
	}
	return math.Sqrt(sum), nil
}
