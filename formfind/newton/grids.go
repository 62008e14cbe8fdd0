package newton

import (
	"context"
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// grids solves a step on a mesh that refines another one, whose tangent is
// factorised already: by conjugate gradients, preconditioned by one sweep of
// Gauss and Seidel there and back around a correction from the mesh below
// (multigrid; Fedorenko 1964, Brandt, Math. Comp. 31 (1977)). A step costs a
// fixed number of passes over the matrix, whatever the size, and neither an
// ordering nor a factor.
//
// Moves go up as vectors: those of new nodes are the mean of their parents',
// taken in the directions that each node has here. Forces go down by the
// transpose, so that the preconditioner is symmetric.
type grids struct {
	below   *Solver
	parents [][2]int32

	// The tangent: diagonal and, by row, the entries right of it.
	ptr, col []int32
	from     []int32 // index into values of each entry
	entry    []float64
	diag     []float64
	inverse  []float64 // of the diagonal
	ready    bool      // values are loaded, and every diagonal entry is positive

	// Work, by unknown, and moves or forces by node of the mesh below.
	left, up, part []float64
	down, answer   []float64 // by unknown of the mesh below
	node           []r3.Vec
	x, r, z, p, q  []float64
}

// tooSmallForGrids is the number of unknowns below which a factorisation is
// quicker.
const tooSmallForGrids = 2000

// Above tells the solver that its mesh refines that of below, which has found
// its shape: nodes of below keep their numbers, parents are for each node the
// two nodes below half-way between which it lies, the same one twice for a node
// that was there before. Steps of large systems are then solved with the help of
// the mesh below instead of by a factorisation of their own, where that works;
// the number of negative pivots stays unknown then. below must not be used for
// anything else before v is done.
func (v *Solver) Above(below *Solver, parents [][2]int32) {
	v.grids = nil
	if below != nil && len(parents) == len(v.s.Position) && below.canCorrect() {
		v.grids = &grids{below: below, parents: parents}
	}
}

// canCorrect reports whether the solver has a positive definite tangent to
// correct the step on a finer mesh with.
func (v *Solver) canCorrect() bool {
	if v.unknown == 0 || len(v.commons) > 0 || v.uneven || v.approaching {
		return false
	}
	return v.positive && (v.byGrids && v.grids != nil && v.grids.ready || !v.byGrids && v.chol != nil)
}

// rows lists the tangent by rows.
func (g *grids) rows(v *Solver) {
	n := v.unknown
	pairs := v.pattern.pairs
	g.ptr = make([]int32, n+1)
	for _, p := range pairs {
		g.ptr[p[0]+1]++
	}
	for i := range n {
		g.ptr[i+1] += g.ptr[i]
	}
	g.col, g.from = make([]int32, len(pairs)), make([]int32, len(pairs))
	g.entry = make([]float64, len(pairs))
	at := append([]int32(nil), g.ptr[:n]...)
	for k, p := range pairs {
		g.col[at[p[0]]], g.from[at[p[0]]] = p[1], int32(n+k)
		at[p[0]]++
	}
	work := make([]float64, 10*n)
	for _, s := range []*[]float64{&g.diag, &g.inverse, &g.left, &g.up, &g.part, &g.x, &g.r, &g.z, &g.p, &g.q} {
		*s, work = work[:n:n], work[n:]
	}
	g.down, g.answer = make([]float64, g.below.unknown), make([]float64, g.below.unknown)
	g.node = make([]r3.Vec, len(g.below.s.Position))
}

// load takes over the values of the tangent.
func (g *grids) load(v *Solver) {
	if g.ptr == nil {
		g.rows(v)
	}
	g.ready = true
	copy(g.diag, v.values)
	for i, d := range g.diag {
		g.inverse[i] = 1 / d
		if !(d > 0) {
			g.ready = false
		}
	}
	for k, i := range g.from {
		g.entry[k] = v.values[i]
	}
}

// times is q = A·p; it returns p·q.
func (g *grids) times(q, p []float64) float64 {
	for i, d := range g.diag {
		q[i] = d * p[i]
	}
	for i := range g.diag {
		a, b := g.ptr[i], g.ptr[i+1]
		col := g.col[a:b]
		entry := g.entry[a:b][:len(col)]
		pi, sum := p[i], 0.0
		for k, j := range col {
			sum += entry[k] * p[j]
			q[j] += entry[k] * pi
		}
		q[i] += sum
	}
	return dot(p, q)
}

// correct applies an approximate inverse of the tangent: z from r, which is
// left as it is.
func (v *Solver) correct(z, r []float64) error {
	if !v.byGrids {
		copy(z, r)
		if err := v.chol.Solve(z, 1); err != nil {
			return fmt.Errorf("newton: %w", err)
		}
		return nil
	}
	g := v.grids
	n := len(g.diag)
	// Downwards: (D + L)·z = r, from z = 0.
	left := g.left
	copy(left, r)
	for i := range n {
		a, b := g.ptr[i], g.ptr[i+1]
		col := g.col[a:b]
		entry := g.entry[a:b][:len(col)]
		zi := left[i] * g.inverse[i]
		z[i] = zi
		for k, j := range col {
			left[j] -= entry[k] * zi
		}
	}
	// What it leaves, r − A·z = −U·z.
	for i := range n {
		a, b := g.ptr[i], g.ptr[i+1]
		col := g.col[a:b]
		entry := g.entry[a:b][:len(col)]
		sum := 0.0
		for k, j := range col {
			sum -= entry[k] * z[j]
		}
		left[i] = sum
	}
	g.lower(v, left)
	if err := g.below.correct(g.answer, g.down); err != nil {
		return err
	}
	g.raise(v)
	g.times(g.part, g.up)
	for i := range n {
		z[i] += g.up[i]
		left[i] -= g.part[i]
	}
	// And back: (D + U)·d = what is left.
	d := g.part
	for i := n - 1; i >= 0; i-- {
		a, b := g.ptr[i], g.ptr[i+1]
		col := g.col[a:b]
		entry := g.entry[a:b][:len(col)]
		sum := left[i]
		for k, j := range col {
			sum -= entry[k] * d[j]
		}
		d[i] = sum * g.inverse[i]
		z[i] += d[i]
	}
	return nil
}

// lower brings the forces r by unknown down to the mesh below, into g.down.
func (g *grids) lower(v *Solver, r []float64) {
	clear(g.node)
	for i, p := range g.parents {
		first := v.first[i]
		if first < 0 || v.cls[i] == tied {
			continue
		}
		var f r3.Vec
		for a, b := range v.now.basis[v.start[i]:v.start[i+1]] {
			f = r3.Add(f, r3.Scale(r[int(first)+a], b))
		}
		if p[0] == p[1] {
			g.node[p[0]] = r3.Add(g.node[p[0]], f)
			continue
		}
		f = r3.Scale(0.5, f)
		g.node[p[0]] = r3.Add(g.node[p[0]], f)
		g.node[p[1]] = r3.Add(g.node[p[1]], f)
	}
	clear(g.down)
	w := g.below
	for i, f := range g.node {
		first := w.first[i]
		if first < 0 {
			continue
		}
		for a, b := range w.now.basis[w.start[i]:w.start[i+1]] {
			g.down[int(first)+a] += r3.Dot(b, f)
		}
	}
}

// raise brings the moves g.answer of the mesh below up, into g.up.
func (g *grids) raise(v *Solver) {
	w := g.below
	for i := range g.node {
		var d r3.Vec
		if first := w.first[i]; first >= 0 {
			for a, b := range w.now.basis[w.start[i]:w.start[i+1]] {
				d = r3.Add(d, r3.Scale(g.answer[int(first)+a], b))
			}
		}
		g.node[i] = d
	}
	for i, p := range g.parents {
		first := v.first[i]
		if first < 0 || v.cls[i] == tied {
			continue
		}
		d := g.node[p[0]]
		if p[0] != p[1] {
			d = r3.Scale(0.5, r3.Add(d, g.node[p[1]]))
		}
		for a, b := range v.now.basis[v.start[i]:v.start[i+1]] {
			g.up[int(first)+a] = r3.Dot(b, d)
		}
	}
}

// gridsStep is newtonStep by grids, where there are some that work.
func (v *Solver) gridsStep(ctx context.Context, st *state, out *step) (bool, error) {
	if v.grids == nil || v.unknown < tooSmallForGrids || len(v.commons) > 0 || v.uneven || v.approaching {
		v.byGrids = false
		return false, nil
	}
	if !v.reuse {
		v.grids.load(v)
	}
	v.byGrids = true
	if v.grids.ready {
		tol := min(max(0.1*v.target/st.eta, finest), coarsest)
		ok, err := v.solveByGrids(ctx, st, tol, out)
		if ok || err != nil {
			v.positive = ok
			return ok, err
		}
	}
	v.byGrids, v.reuse, v.grids = false, false, nil
	return false, nil
}

// How exactly a step is solved for, as a share of the residual: no better than
// the next evaluation of it could tell.
const (
	finest   = 1e-4
	coarsest = 0.1
)

// mostCycles bounds the conjugate gradient steps; a mesh on which they are not
// enough is left to a factorisation.
const mostCycles = 40

// solveByGrids solves for the step at st until its residual is the share tol of
// what it starts from; ok is false where that does not work, in particular where
// the tangent turns out not to be positive definite.
func (v *Solver) solveByGrids(ctx context.Context, st *state, tol float64, out *step) (ok bool, err error) {
	g := v.grids
	x, r, z, p, q := g.x, g.r, g.z, g.p, g.q
	clear(x)
	copy(r, st.reduced)
	goal := tol * math.Sqrt(dot(r, r))
	rz := 0.0
	for k := 0; ; k++ {
		if err := ctx.Err(); err != nil {
			return false, err
		}
		rr := math.Sqrt(dot(r, r))
		if rr <= goal {
			break
		}
		if k == mostCycles || !(rr < math.Inf(1)) {
			return false, nil
		}
		if err := v.correct(z, r); err != nil {
			return false, err
		}
		before := rz
		if rz = dot(r, z); !(rz > 0) {
			return false, nil
		}
		if k == 0 {
			copy(p, z)
		} else {
			beta := rz / before
			for i := range p {
				p[i] = z[i] + beta*p[i]
			}
		}
		curve := g.times(q, p)
		if !(curve > 0) {
			return false, nil
		}
		alpha := rz / curve
		for i := range x {
			x[i] += alpha * p[i]
			r[i] -= alpha * q[i]
		}
	}
	copy(out.u, x)
	copy(out.force, st.force)
	out.slope = -dot(out.u, st.reduced)
	out.shifted = false
	return true, nil
}
