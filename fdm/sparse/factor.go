package sparse

import (
	"context"
	"fmt"
	"math"
)

// Factor is a numeric factorisation of one matrix with the pattern of its
// [Analysis]. A Factor is not safe for concurrent use; make one per goroutine
// from the same analysis.
type Factor struct {
	a    *Analysis
	kind Kind

	panels panelStore
	store  []float64 // updates between subtrees, several workers only
	crew   crew
	x      []float64 // right-hand sides in the order of elimination, four floats an unknown: the memory of a stack
	below  []int32   // LDL only: the pivots of the rows of a front
	ok     bool

	// LDL only.
	diag      []float64 // D: the diagonal, by pivot
	sub       []float64 // D: the entry below the diagonal of a 2×2 pivot, else 0
	pivots    []int32   // place of the unknown that each pivot eliminates
	position  []int32   // its inverse: the pivot that eliminates each place
	size      []float64 // by place: the largest entry of the row of the matrix
	delayed   []delayedFront
	negative  int
	perturbed int
}

// NewFactor prepares a factorisation of the given kind. Its memory, see
// [Cost.Bytes], is taken here.
func (a *Analysis) NewFactor(k Kind) (*Factor, error) {
	if k != Cholesky && k != LDL {
		return nil, fmt.Errorf("sparse: unknown kind of factorisation %d", int(k))
	}
	f := &Factor{a: a, kind: k}
	f.panels = newPanelStore(a.panel, a.spare.Swap(nil))
	f.crew.init(f, a.workers())
	if k == LDL {
		f.diag = make([]float64, a.n)
		f.sub = make([]float64, a.n)
		f.size = make([]float64, a.n)
		ints := make([]int32, 2*a.n)
		f.pivots, f.position = ints[:a.n], ints[a.n:]
	}
	return f, nil
}

// Kind of the factorisation.
func (f *Factor) Kind() Kind { return f.kind }

// Analysis the factor was made from.
func (f *Factor) Analysis() *Analysis { return f.a }

// Refactor computes the factorisation for new values: values[:n] is the
// diagonal, values[n+k] the entry of pairs[k]. It allocates nothing after the
// first time, but for the goroutines of a parallel run and for LDL where
// pivots have to wait for a later front.
//
// Errors: [SizeError], [ValueError], [PivotError] (Cholesky only), that of
// ctx, which is looked at once per front. After an error there is no
// factorisation until the next success.
func (f *Factor) Refactor(ctx context.Context, values []float64) error {
	a := f.a
	f.ok = false
	if err := checkValues(values, a.n+a.entries, "values"); err != nil {
		return err
	}
	f.negative, f.perturbed = 0, 0
	f.delayed = f.delayed[:0]
	if f.kind == LDL {
		f.rowSizes(values)
	}
	err := f.crew.factor(ctx, values)
	if f.kind == LDL {
		if err == errDelay {
			err = f.factorDelayed(ctx, values)
		}
		if err == nil {
			f.countPivots()
		}
	}
	f.ok = err == nil
	return err
}

// checkValues refuses a wrong length and anything not finite.
func checkValues(v []float64, n int, what string) error {
	if len(v) != n {
		return &SizeError{What: what, Got: len(v), Want: n}
	}
	// x−x is 0 for finite x and not a number otherwise. Four sums, so that none
	// has to wait for the last addition.
	var s0, s1, s2, s3 float64
	r := v
	for ; len(r) >= 4; r = r[4:] {
		s0 += r[0] - r[0]
		s1 += r[1] - r[1]
		s2 += r[2] - r[2]
		s3 += r[3] - r[3]
	}
	for _, x := range r {
		s0 += x - x
	}
	if s0+s1+s2+s3 == 0 {
		return nil
	}
	for i, x := range v {
		if math.IsNaN(x) || math.IsInf(x, 0) {
			return &ValueError{Entry: i, Value: x}
		}
	}
	return nil
}

// front assembles and eliminates front s. It returns false if a pivot was not
// positive (Cholesky) or must be delayed (LDL); w then holds the details.
func (f *Factor) front(s int32, values []float64, w *worker) bool {
	a := f.a
	cols, rows := a.shape(s)
	nu := rows - cols
	p := f.panels.panel(a.panel[s], a.panel[s+1])
	f.assemble(p, s, values, cols, rows)
	kids := a.children[a.childPtr[s]:a.childPtr[s+1]]
	for _, c := range kids {
		n := int(a.rowPtr[c+1] - a.rowPtr[c])
		extendAdd(p, rows, 0, f.updateOf(c, w), n, updateChunk(n), a.runsOf(c), 0, cols)
	}
	u := f.updateOf(s, w)
	if f.kind == LDL {
		first := int(a.first[s])
		d, e, piv := f.diag[first:first+cols], f.sub[first:first+cols], f.pivots[first:first+cols]
		for j := range piv {
			piv[j] = int32(first + j)
		}
		n := ldlPanel(p, rows, rows, cols, d, e, piv, f.size, w.scratch)
		if n < cols {
			if a.parent[s] != none || !f.perturb(p, rows, cols, n, d, e, piv) {
				return false
			}
		}
		for j, i := range piv {
			f.position[i] = int32(first + j)
		}
		ldlUpdate(u, p, rows, cols, nu, cols, d, e, w.scratch)
	} else {
		if bad, pivot := choleskyPanel(p, rows, rows, cols, w); bad >= 0 {
			w.badPlace, w.badPivot = a.first[s]+int32(bad), pivot
			return false
		}
		choleskyUpdate(u, p, rows, cols, nu, w)
	}
	if nu > 0 {
		for _, c := range kids {
			n := int(a.rowPtr[c+1] - a.rowPtr[c])
			extendUpdate(u, nu, f.updateOf(c, w), n, a.runsOf(c), cols)
		}
	}
	return true
}

// assemble puts the entries of the matrix into the panel p of front s.
func (f *Factor) assemble(p []float64, s int32, values []float64, cols, ld int) {
	a := f.a
	clear(p)
	at := 0
	for _, i := range a.order[a.first[s]:a.first[s+1]] {
		p[at] = values[i]
		at += ld + 1
	}
	entries := values[a.n:]
	target := a.target[a.sourcePtr[s]:a.sourcePtr[s+1]]
	source := a.source[a.sourcePtr[s]:a.sourcePtr[s+1]][:len(target)]
	for k, t := range target {
		p[t] += entries[source[k]]
	}
}

// updateOf is where the update matrix that front c leaves for its parent starts.
func (f *Factor) updateOf(c int32, w *worker) []float64 {
	p := &f.a.plan
	if !w.shares {
		return w.stack[p.update[c]:]
	}
	if p.shared[c] {
		return f.store[p.local[c]:]
	}
	return w.stack[p.local[c]:]
}
