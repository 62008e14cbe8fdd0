package sparse

import (
	"context"
	"slices"
)

// delayedFront is a front of an LDL run in which candidates without an
// acceptable pivot were passed on to the parent. Its places: first the
// eliminated ones, then those passed on, then the update rows.
type delayedFront struct {
	panel []float64 // the eliminated columns
	rows  []int32   // places of all rows
	cols  int       // eliminated
	first int       // number of the first pivot
	u     []float64 // update matrix, of all rows but the eliminated, a square
}

// factorDelayed factors once more, now with candidates passed on to the parent
// where a front has no acceptable pivot for them (delayed pivots, Duff & Reid
// 1983). It takes memory as it goes.
func (f *Factor) factorDelayed(ctx context.Context, values []float64) error {
	a := f.a
	m := int32(a.fronts())
	f.delayed = make([]delayedFront, m)
	local := make([]int32, a.n)
	var own []float64
	var rel []int32
	pivot := 0
	for s := range m {
		if err := ctx.Err(); err != nil {
			f.delayed = f.delayed[:0]
			return err
		}
		ownCols, ownRows := a.shape(s)
		kids := a.children[a.childPtr[s]:a.childPtr[s+1]]
		// Candidates: those that the children passed on, then the front's own.
		var rows []int32
		for _, c := range kids {
			k := &f.delayed[c]
			n := len(k.rows) - int(a.rowPtr[c+1]-a.rowPtr[c])
			rows = append(rows, k.rows[k.cols:n]...)
		}
		late := len(rows)
		for i := a.first[s]; i < a.first[s+1]; i++ {
			rows = append(rows, i)
		}
		cand := len(rows)
		rows = append(rows, a.rows[a.rowPtr[s]:a.rowPtr[s+1]]...)
		ld := len(rows)
		for k, i := range rows {
			local[i] = int32(k)
		}
		p := make([]float64, cand*ld+slack)
		own = slices.Grow(own[:0], ownCols*ownRows)[:ownCols*ownRows]
		f.assemble(own, s, values, ownCols, ownRows)
		for j := range ownCols {
			copy(p[(late+j)*ld+late:(late+j+1)*ld], own[j*ownRows:])
		}
		runs := make([][]run, len(kids))
		for x, c := range kids {
			k := &f.delayed[c]
			rel = rel[:0]
			for _, i := range k.rows[k.cols:] {
				rel = append(rel, local[i])
			}
			runs[x] = appendRuns(nil, rel, int32(cand))
			extendAdd(p, ld, 0, k.u, len(rel), len(rel)+1, runs[x], 0, cand)
		}
		d, e := make([]float64, cand), make([]float64, cand)
		scratch := make([]float64, ld*max(ldlBlock, 1)+slack)
		piv := rows[:cand]
		n := ldlPanel(p, ld, ld, cand, d, e, piv, f.size, scratch)
		if n < cand && a.parent[s] == none {
			if !f.perturb(p, ld, cand, n, d, e, piv) {
				f.perturbRest(p, ld, cand, n, d, e, piv)
			}
			n = cand
		}
		front := &f.delayed[s]
		*front = delayedFront{rows: rows, cols: n, first: pivot}
		left := ld - n
		if left > 0 {
			u := make([]float64, left*left+slack)
			// Candidates left are up to date in the panel; the rest is formed.
			for j := n; j < cand; j++ {
				copy(u[(j-n)*left+j-n:(j-n+1)*left], p[j*ld+j:(j+1)*ld])
			}
			nu := ld - cand
			at := (cand-n)*left + cand - n
			for k := 0; k < n && nu > 0; {
				w := ldlWidth(e[:n], k, n)
				ldlScale(scratch, p[k*ld+cand:], ld, nu, w, d[k:], e[k:])
				mulSub(u[at:], left, p[k*ld+cand:], ld, scratch, nu, nu, nu, w, false, true)
				k += w
			}
			front.u = u
			for x, c := range kids {
				k := &f.delayed[c]
				n := len(k.rows) - k.cols
				extendAdd(u[at:], left, cand, k.u, n, n+1, runs[x], cand, ld)
			}
		}
		for _, c := range kids {
			f.delayed[c].u = nil
		}
		front.panel = p[: n*ld+min(slack, cap(p)-n*ld) : n*ld+min(slack, cap(p)-n*ld)]
		copy(f.diag[pivot:], d[:n])
		copy(f.sub[pivot:], e[:n])
		for k, i := range rows[:n] {
			f.pivots[pivot+k] = i
			f.position[i] = int32(pivot + k)
		}
		pivot += n
	}
	return nil
}

// perturbRest eliminates what is left of a root front that is neither zero nor
// has an acceptable pivot, taking its largest entries as they come.
func (f *Factor) perturbRest(p []float64, ld, cols, n int, d, e []float64, piv []int32) {
	l := ldlFront{f: p, ld: ld, m: ld, n: cols, d: d, e: e, piv: piv, tiny: f.size}
	for k := n; k < cols; k++ {
		best := k
		for j := k; j < cols; j++ {
			if v := p[j*ld+j]; v*v > p[best*ld+best]*p[best*ld+best] {
				best = j
			}
		}
		l.swap(k, best)
		if v := p[k*ld+k]; v*v <= f.size[piv[k]]*f.size[piv[k]] {
			p[k*ld+k] = max(1e6*f.size[piv[k]], 1e-300)
		}
		f.perturbed++
		l.one(k, cols)
	}
}
