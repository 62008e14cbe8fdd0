package sparse

// pool hands out working arrays again that an earlier step of an analysis has
// done with: fresh memory costs as much to touch as most of these steps take.
type pool struct{ free [][]int32 }

// get returns an array of length n with any content.
func (p *pool) get(n int) []int32 {
	for k, s := range p.free {
		if cap(s) >= n {
			last := len(p.free) - 1
			p.free[k] = p.free[last]
			p.free = p.free[:last]
			return s[:n]
		}
	}
	return make([]int32, n)
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
func (p *pool) put(arrays ...[]int32) { p.free = append(p.free, arrays...) }
