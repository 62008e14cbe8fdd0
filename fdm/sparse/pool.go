package sparse

import "unsafe"

// pool lends the working arrays of an analysis, cut from one piece of memory,
// and hands out again what an earlier step has done with: fresh memory costs as
// much to touch as most of these steps take.
type pool struct {
	all  []float64
	slab []int32 // what has not been lent yet
	free [][]int32
}

// minSplit is the length from which the rest of a returned array is kept when
// a part of it is lent.
const minSplit = 64

// newPool has room for what the analysis of n unknowns and so many pairs needs
// at a time, about. There may be less or more.
func newPool(n, pairs int) *pool {
	all := large[float64](8*n + 2*pairs + 32)
	slab := unsafe.Slice((*int32)(unsafe.Pointer(unsafe.SliceData(all))), 2*len(all))
	return &pool{all: all, slab: slab, free: make([][]int32, 0, 32)}
}

// get returns an array of length n with any content.
func (p *pool) get(n int) []int32 {
	best := -1
	for k, s := range p.free {
		if cap(s) >= n && (best < 0 || cap(s) < cap(p.free[best])) {
			best = k
		}
	}
	if best < 0 {
		if n > len(p.slab) {
			return make([]int32, n)
		}
		s := p.slab[:n:n]
		p.slab = p.slab[n:]
		return s
	}
	s := p.free[best]
	s = s[:cap(s)]
	if len(s)-n >= minSplit {
		p.free[best] = s[n:]
		return s[:n:n]
	}
	last := len(p.free) - 1
	p.free[best] = p.free[last]
	p.free = p.free[:last]
	return s[:n]
}

// filled returns an array of length n full of v.
func (p *pool) filled(n int, v int32) []int32 {
	s := p.get(n)
	for i := range s {
		s[i] = v
	}
	return s
}

// put takes arrays back. The caller must not use them any more.
func (p *pool) put(arrays ...[]int32) {
	for _, s := range arrays {
		if cap(s) > 0 {
			p.free = append(p.free, s)
		}
	}
}

// points returns an array of n points with any content.
func (p *pool) points(n int) []point {
	if n == 0 {
		return nil
	}
	return unsafe.Slice((*point)(unsafe.Pointer(unsafe.SliceData(p.get(2*n)))), n)
}

// putPoints takes back what points returned.
func (p *pool) putPoints(s []point) {
	if len(s) > 0 {
		p.put(unsafe.Slice((*int32)(unsafe.Pointer(unsafe.SliceData(s))), 2*len(s)))
	}
}
