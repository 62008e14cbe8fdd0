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

	panels []float64
	stack  []float64
	work   []float64
	ok     bool

	// LDL only.
	diag      []float64 // D: per place, the diagonal
	sub       []float64 // D: per place, the entry below the diagonal of a 2×2 pivot, else 0
	pivots    []int32   // per place, the place of the unknown eliminated there
	negative  int
	perturbed int
	scale     float64 // largest |value|
}

// NewFactor prepares a factorisation of the given kind. Its memory, see
// [Cost.Bytes], is taken here.
func (a *Analysis) NewFactor(k Kind) (*Factor, error) {
	if k != Cholesky && k != LDL {
		return nil, fmt.Errorf("sparse: unknown kind of factorisation %d", int(k))
	}
	f := &Factor{a: a, kind: k}
	f.panels = make([]float64, a.panel[a.fronts()]+slack)
	f.stack = make([]float64, a.plan.stack+slack)
	f.work = make([]float64, 4*max(a.n, 1))
	if k == LDL {
		f.diag = make([]float64, a.n)
		f.sub = make([]float64, a.n)
		f.pivots = make([]int32, a.n)
	}
	return f, nil
}

// Kind of the factorisation.
func (f *Factor) Kind() Kind { return f.kind }

// Analysis the factor was made from.
func (f *Factor) Analysis() *Analysis { return f.a }

// Refactor computes the factorisation for new values: values[:n] is the
// diagonal, values[n+k] the entry of pairs[k].
//
// Errors: [SizeError], [ValueError], [PivotError] (Cholesky only), that of
// ctx, which is looked at once per front. After an error there is no
// factorisation until the next success.
func (f *Factor) Refactor(ctx context.Context, values []float64) error {
	a := f.a
	f.ok = false
	if len(values) != a.n+a.entries {
		return &SizeError{What: "values", Got: len(values), Want: a.n + a.entries}
	}
	f.scale = 0
	for i, v := range values {
		if v = math.Abs(v); !(v <= math.MaxFloat64) {
			return &ValueError{Entry: i, Value: values[i]}
		}
		f.scale = max(f.scale, v)
	}
	f.negative, f.perturbed = 0, 0
	for s := range int32(a.fronts()) {
		if err := ctx.Err(); err != nil {
			return err
		}
		if err := f.front(s, values); err != nil {
			return err
		}
	}
	f.ok = true
	return nil
}

// front assembles and eliminates front s.
func (f *Factor) front(s int32, values []float64) error {
	a := f.a
	cols, rows := a.shape(s)
	nu := rows - cols
	p := f.panels[a.panel[s]:a.panel[s+1]]
	clear(p)
	for j := range cols {
		p[j*(rows+1)] = values[a.order[int(a.first[s])+j]]
	}
	entries := values[a.n:]
	source := a.source[a.sourcePtr[s]:a.sourcePtr[s+1]]
	target := a.target[a.sourcePtr[s]:a.sourcePtr[s+1]]
	for k, t := range target {
		p[t] += entries[source[k]]
	}
	kids := a.children[a.childPtr[s]:a.childPtr[s+1]]
	for _, c := range kids {
		u, n, rel := f.updateOf(c)
		for j := range n {
			if int(rel[j]) >= cols {
				break
			}
			dst := p[int(rel[j])*rows:]
			src := u[j*n:]
			for i := j; i < n; i++ {
				dst[rel[i]] += src[i]
			}
		}
	}
	u := f.stack[a.plan.update[s]:][:nu*nu]
	if f.kind == LDL {
		f.eliminateLDL(s, p, rows, cols, u)
	} else {
		if bad, pivot := choleskyPanel(p, rows, rows, cols); bad >= 0 {
			return &PivotError{Unknown: int(a.order[int(a.first[s])+bad]), Pivot: pivot}
		}
		if nu > 0 {
			mulSubLower(u, nu, p[cols:], rows, p[cols:], rows, nu, cols, true)
		}
	}
	for _, c := range kids {
		cu, n, rel := f.updateOf(c)
		for j := range n {
			if int(rel[j]) < cols {
				continue
			}
			dst := u[(int(rel[j])-cols)*nu:]
			src := cu[j*n:]
			for i := j; i < n; i++ {
				dst[int(rel[i])-cols] += src[i]
			}
		}
	}
	return nil
}

// updateOf is the update matrix that front c left for its parent, its order,
// and where its rows are in the parent's front.
func (f *Factor) updateOf(c int32) (u []float64, n int, rel []int32) {
	a := f.a
	rel = a.rel[a.rowPtr[c]:a.rowPtr[c+1]]
	n = len(rel)
	return f.stack[a.plan.update[c]:][:n*n], n, rel
}
