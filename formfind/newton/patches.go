package newton

// Loops over the nodes and triangles of large meshes are shared among processors.
// How they are cut depends on the mesh only, and sums are added in the order of the
// pieces, so that the numbers do not depend on the processors.

const (
	// nodeBlock is the number of nodes that are worked on in one piece.
	nodeBlock = 2048
	// patchSize is the number of triangles in the list whose nodes make a patch.
	patchSize = 2048
)

// patches divide the fabric so that what triangles add to their nodes can be added
// by several processors: every node belongs to one patch, and a patch has all
// triangles that touch its nodes, those on its border together with others. At
// every node triangles come in the order of their numbers, as without patches.
type patches struct {
	ptr  []int32
	list []corners
}

// corners is a triangle and, in the last three bits, which of its corners belong to
// the patch.
type corners uint32

func (c corners) triangle() int { return int(c >> 3) }

const allCorners corners = 7

// newPatches cuts the list of triangles into pieces. The triangles of a refined mesh
// follow those of the coarse one, four for each, so that pieces have short borders.
// Nodes of a rigid ring belong to the patch of its centre, whose unknowns they share.
func (v *Solver) newPatches() *patches {
	s := v.s
	n := (len(s.Corners) + patchSize - 1) / patchSize
	owner := make([]int32, len(s.Position))
	for i := range owner {
		owner[i] = -1
	}
	for t, c := range s.Corners {
		for _, i := range c {
			if m := s.MasterOf(int(i)); m >= 0 {
				i = m
			}
			if owner[i] < 0 {
				owner[i] = int32(t / patchSize)
			}
		}
	}
	for i := range owner {
		if m := s.MasterOf(i); m >= 0 {
			owner[i] = owner[m]
		}
	}
	p := &patches{ptr: make([]int32, n+1)}
	each := func(f func(patch, t int32, which corners)) {
		for t, c := range s.Corners {
			a, b, d := owner[c[0]], owner[c[1]], owner[c[2]]
			if a == b && b == d {
				f(a, int32(t), allCorners)
				continue
			}
			for k, o := range [3]int32{a, b, d} {
				if k > 0 && o == a || k > 1 && o == b {
					continue
				}
				var which corners
				for l, q := range [3]int32{a, b, d} {
					if q == o {
						which |= 1 << l
					}
				}
				f(o, int32(t), which)
			}
		}
	}
	each(func(patch, _ int32, _ corners) { p.ptr[patch+1]++ })
	for k := range n {
		p.ptr[k+1] += p.ptr[k]
	}
	p.list = make([]corners, p.ptr[n])
	fill := append([]int32(nil), p.ptr[:n]...)
	each(func(patch, t int32, which corners) {
		p.list[fill[patch]] = corners(t)<<3 | which
		fill[patch]++
	})
	return p
}

// overFabric calls f for pieces of the fabric: the whole of it where it is small,
// else patch by patch with the triangles in the list. Whole triangles of a piece are
// those whose first corner belongs to it.
func (v *Solver) overFabric(f func(piece int, list []corners)) {
	if v.patches == nil {
		f(0, v.everyTriangle)
		return
	}
	p := v.patches
	v.crew.Run(len(p.ptr)-1, func(k int) { f(k, p.list[p.ptr[k]:p.ptr[k+1]]) })
}

// fabricPieces is the number of pieces that overFabric cuts.
func (v *Solver) fabricPieces() int {
	if v.patches == nil {
		return 1
	}
	return len(v.patches.ptr) - 1
}

// overNodes calls f for ranges of nodes.
func (v *Solver) overNodes(f func(block, lo, hi int)) { v.over(len(v.s.Position), nodeBlock, f) }

// overTriangles calls f for ranges of triangles.
func (v *Solver) overTriangles(f func(block, lo, hi int)) { v.over(len(v.s.Corners), patchSize, f) }

func (v *Solver) over(n, block int, f func(block, lo, hi int)) {
	v.crew.Run((n+block-1)/block, func(k int) { f(k, k*block, min((k+1)*block, n)) })
}

// partial is what one piece adds to a sum over all.
type partial struct {
	energy   float64
	r2, s2   float64
	most     float64
	worst    float64
	worstAt  int32
	collapse int32
	err      error
	_        [2]int64 // on cache lines of its own
}

// preparePieces makes what loops in pieces need.
func (v *Solver) preparePieces() {
	n := max(len(v.s.Position)/nodeBlock, len(v.s.Corners)/patchSize) + 1
	v.pieces = make([]partial, n)
	v.patches, v.everyTriangle = nil, nil
	if len(v.s.Position) >= 2*nodesAHand && len(v.s.Corners) > 0 {
		v.patches = v.newPatches()
		return
	}
	v.everyTriangle = make([]corners, len(v.s.Corners))
	for t := range v.everyTriangle {
		v.everyTriangle[t] = corners(t)<<3 | allCorners
	}
}
