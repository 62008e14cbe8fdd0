package newton

import (
	"context"
	"math"
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
//
// Unknowns are worked on in blocks of neighbours (see [Solver.arrange]), by several
// processors where there are many. A sweep takes from other blocks what was there
// before it, so that it does not matter which block comes first; the sweep back is
// the transpose of the one there.
type grids struct {
	below   *Solver
	parents [][2]int32

	of, over *pattern // of this mesh and the one below, that the rest is for

	// The tangent by rows: the entries of row i are those of places before i in
	// its block, from ptr[i], those in other blocks, from outer[i], and those after i
	// in its block, from upper[i] to ptr[i+1].
	ptr, outer, upper []int32
	col, from         []int32 // place, and index into the solver's values
	entry             []float64
	diag, inverse     []float64
	ready             bool // values are loaded, and every diagonal entry is positive

	up   transfer // moves of the mesh below to places here
	down transfer // the transpose

	// Work, by place here or by unknown of the mesh below.
	left, guess    []float64
	pull, answer   []float64 // of the mesh below
	x, r, z, p, q  []float64
	forces, moves  []float64 // what is corrected, and the correction
	alpha, beta    float64
	part           []float64 // a sum by block
	bad            []bool
	advance, sweep func(block int)
	remain, lower  func(block int)
	raise, back    func(block int)
	turn           func(block int)
}

// transfer is a sparse matrix by rows.
type transfer struct {
	ptr, col []int32
	value    []float64
	from     []int32 // up: direction of the mesh below; down: index into the values of up
	row      []int32 // up: direction here, by row
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
		if v.grids, v.expected = v.expected, nil; v.grids == nil || v.grids.below != below {
			v.grids = &grids{below: below, parents: parents}
		}
	}
}

// Numbering is how a solver numbers its unknowns. Looking for a shape may change the
// solver's, but not the one that was asked for.
type Numbering struct {
	first, start, place []int32
	unknown             int
	pattern             *pattern
}

// Numbering returns the numbering at the time.
func (v *Solver) Numbering() Numbering {
	return Numbering{v.first, v.start, v.gridPlace, v.unknown, v.pattern}
}

// Expect prepares for Above being called with below and parents, while below, with
// the numbering it had before, looks for its shape.
func (v *Solver) Expect(below *Solver, before Numbering, parents [][2]int32) {
	v.expected = nil
	if len(parents) == len(v.s.Position) && v.unknown >= tooSmallForGrids && before.unknown > 0 {
		v.expected = &grids{below: below, parents: parents}
		v.expected.rows(v, before)
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
	clear(g.x)
	clear(g.p)
	clear(g.q)
	for i, k := range v.gridOrder {
		g.r[i] = st.reduced[k]
	}
	goal := tol * math.Sqrt(dot(g.r, g.r))
	g.forces, g.moves, g.alpha = g.r, g.z, 0
	rz := 0.0
	for k := 0; ; k++ {
		if err := ctx.Err(); err != nil {
			return false, err
		}
		g.run(v.crew, g.advance)
		rr := math.Sqrt(sum(g.part))
		if rr <= goal {
			break
		}
		if k == mostCycles || !(rr < math.Inf(1)) {
			return false, nil
		}
		if err := g.aroundBelow(v.crew); err != nil {
			return false, err
		}
		before := rz
		if rz = sum(g.part); !(rz > 0) {
			return false, nil
		}
		g.beta = 0
		if k > 0 {
			g.beta = rz / before
		}
		g.run(v.crew, g.turn)
		curve := sum(g.part)
		if !(curve > 0) {
			return false, nil
		}
		g.alpha = rz / curve
	}
	for i, k := range v.gridOrder {
		out.u[k] = g.x[i]
	}
	copy(out.force, st.force)
	out.slope = -dot(out.u, st.reduced)
	out.shifted = false
	return true, nil
}

func sum(part []float64) float64 {
	all := 0.0
	for _, x := range part {
		all += x
	}
	return all
}
