package newton

import (
	"fmt"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/internal/crew"
)

// gridBlock is the number of places that are worked on in one piece.
const gridBlock = 1024

// run calls pass for every block.
func (g *grids) run(c *crew.Crew, pass func(block int)) { c.Run(gridBlocks(len(g.diag)), pass) }

func gridBlocks(n int) int { return (n + gridBlock - 1) / gridBlock }

// arrange puts the unknowns in the order in which triangles meet their nodes. The
// triangles of a refined mesh follow those of the coarse one, four for each, so
// that a block of places next to each other is a patch of the surface.
func (v *Solver) arrange() {
	v.gridOrder, v.gridPlace = make([]int32, 0, v.unknown), make([]int32, v.unknown)
	for i := range v.gridPlace {
		v.gridPlace[i] = -1
	}
	take := func(i int32) {
		first := v.first[i]
		if first < 0 || v.gridPlace[first] >= 0 {
			return
		}
		for a := range v.start[i+1] - v.start[i] {
			v.gridPlace[first+a] = int32(len(v.gridOrder))
			v.gridOrder = append(v.gridOrder, first+a)
		}
	}
	for _, c := range v.s.Corners {
		take(c[0])
		take(c[1])
		take(c[2])
	}
	for i := range v.first {
		take(int32(i))
	}
	// Within a block in the solver's order, nodes of the mesh below first: rows of
	// one kind follow each other, and few wait for the one just before.
	next := make([]int32, gridBlocks(len(v.gridOrder)))
	for b := range next {
		next[b] = int32(b * gridBlock)
	}
	for k := range v.gridPlace {
		b := v.gridPlace[k] / gridBlock
		v.gridPlace[k] = next[b]
		next[b]++
	}
	for k, i := range v.gridPlace {
		v.gridOrder[i] = int32(k)
	}
}

// rows lists the tangent by rows and what it takes to get to the mesh below.
func (g *grids) rows(v *Solver, w Numbering) {
	g.of, g.over = v.pattern, w.pattern
	n := v.unknown
	pairs := v.pattern.pairs
	g.ptr, g.upper, g.outer = make([]int32, n+1), make([]int32, n), make([]int32, n)
	before, after, others := make([]int32, n), make([]int32, n), make([]int32, n)
	for _, p := range pairs {
		i, j := v.gridPlace[p[0]], v.gridPlace[p[1]]
		i, j = min(i, j), max(i, j)
		if i/gridBlock == j/gridBlock {
			after[i]++
			before[j]++
		} else {
			others[i]++
			others[j]++
		}
	}
	for i := range n {
		g.outer[i] = g.ptr[i] + before[i]
		g.upper[i] = g.outer[i] + others[i]
		g.ptr[i+1] = g.upper[i] + after[i]
	}
	copy(before, g.ptr)
	copy(after, g.upper)
	copy(others, g.outer)
	g.col, g.from = make([]int32, 2*len(pairs)), make([]int32, 2*len(pairs))
	g.entry = make([]float64, 2*len(pairs))
	put := func(at *int32, col int32, k int) {
		g.col[*at], g.from[*at] = col, int32(n+k)
		*at++
	}
	for k, p := range pairs {
		i, j := v.gridPlace[p[0]], v.gridPlace[p[1]]
		i, j = min(i, j), max(i, j)
		if i/gridBlock == j/gridBlock {
			put(&after[i], j, k)
			put(&before[j], i, k)
		} else {
			put(&others[i], j, k)
			put(&others[j], i, k)
		}
	}
	work := make([]float64, 9*n)
	for _, s := range []*[]float64{&g.diag, &g.inverse, &g.left, &g.guess, &g.x, &g.r, &g.z, &g.p, &g.q} {
		*s, work = work[:n:n], work[n:]
	}
	m := w.unknown
	g.pull, g.answer = make([]float64, m), make([]float64, m)
	blocks := gridBlocks(n)
	g.part, g.bad = make([]float64, blocks), make([]bool, blocks)
	g.advance, g.sweep, g.remain, g.lower = g.advanceBlock, g.sweepBlock, g.remainBlock, g.lowerBlock
	g.raise, g.back, g.turn = g.raiseBlock, g.backBlock, g.turnBlock
	g.links(v, w)
}

// links finds which moves of the mesh below make the moves here.
func (g *grids) links(v *Solver, w Numbering) {
	n, m := v.unknown, w.unknown
	u := &g.up
	u.ptr, u.row = make([]int32, n+1), make([]int32, n)
	each := func(f func(row, i int32, parents []int32)) {
		for i, p := range g.parents {
			if v.first[i] < 0 || v.cls[i] == tied {
				continue
			}
			parents := p[:]
			if p[0] == p[1] {
				parents = p[:1]
			}
			for a := range v.start[i+1] - v.start[i] {
				f(v.gridPlace[v.first[i]+a], v.start[i]+a, parents)
			}
		}
	}
	each(func(row, direction int32, parents []int32) {
		u.row[row] = direction
		for _, p := range parents {
			if w.first[p] >= 0 {
				u.ptr[row+1] += w.start[p+1] - w.start[p]
			}
		}
	})
	for i := range n {
		u.ptr[i+1] += u.ptr[i]
	}
	count := u.ptr[n]
	u.col, u.from, u.value = make([]int32, count), make([]int32, count), make([]float64, count)
	each(func(row, _ int32, parents []int32) {
		at := u.ptr[row]
		for _, p := range parents {
			if w.first[p] < 0 {
				continue
			}
			for b := range w.start[p+1] - w.start[p] {
				d := w.start[p] + b
				if len(parents) == 2 {
					d = -1 - d // half of it
				}
				u.col[at], u.from[at] = w.place[w.first[p]+b], d
				at++
			}
		}
	})
	d := &g.down
	d.ptr, d.col = make([]int32, m+1), make([]int32, count)
	d.from, d.value = make([]int32, count), make([]float64, count)
	for _, j := range u.col {
		d.ptr[j+1]++
	}
	for j := range m {
		d.ptr[j+1] += d.ptr[j]
	}
	fill := append([]int32(nil), d.ptr[:m]...)
	for i := range int32(n) {
		for k := u.ptr[i]; k < u.ptr[i+1]; k++ {
			j := u.col[k]
			d.col[fill[j]], d.from[fill[j]] = i, k
			fill[j]++
		}
	}
}

// load takes over the values of the tangent and the directions at v.now.
func (g *grids) load(v *Solver) {
	if g.of != v.pattern || g.over != g.below.pattern {
		g.rows(v, g.below.Numbering())
	}
	n := len(g.diag)
	g.run(v.crew, func(block int) {
		lo, hi := gridSpan(block, n)
		g.bad[block] = false
		for i := lo; i < hi; i++ {
			d := v.values[v.gridOrder[i]]
			g.diag[i], g.inverse[i] = d, 1/d
			if !(d > 0) {
				g.bad[block] = true
			}
		}
		a, b := g.ptr[lo], g.ptr[hi]
		entry := g.entry[a:b]
		for k, i := range g.from[a:b] {
			entry[k] = v.values[i]
		}
		u := &g.up
		for i := lo; i < hi; i++ {
			own := v.now.basis[u.row[i]]
			for k := u.ptr[i]; k < u.ptr[i+1]; k++ {
				if d := u.from[k]; d >= 0 {
					u.value[k] = r3.Dot(own, g.below.now.basis[d])
				} else {
					u.value[k] = 0.5 * r3.Dot(own, g.below.now.basis[-1-d])
				}
			}
		}
	})
	d := &g.down
	v.crew.Run(gridBlocks(len(g.pull)), func(block int) {
		lo, hi := gridSpan(block, len(g.pull))
		for k := d.ptr[lo]; k < d.ptr[hi]; k++ {
			d.value[k] = g.up.value[d.from[k]]
		}
	})
	g.ready = true
	for _, bad := range g.bad {
		g.ready = g.ready && !bad
	}
}

func gridSpan(block, n int) (lo, hi int) { return block * gridBlock, min((block+1)*gridBlock, n) }

// correct applies an approximate inverse of the tangent: z from r, both by place, r
// left as it is.
func (v *Solver) correct(c *crew.Crew, z, r []float64) error {
	if !v.byGrids {
		x := v.rhs
		for i, k := range v.gridOrder {
			x[k] = r[i]
		}
		if err := v.chol.Solve(x, 1); err != nil {
			return fmt.Errorf("newton: %w", err)
		}
		for i, k := range v.gridOrder {
			z[i] = x[k]
		}
		return nil
	}
	g := v.grids
	g.forces, g.moves = r, z
	g.run(c, g.sweep)
	return g.aroundBelow(c)
}

// aroundBelow goes on after the sweep there: what that leaves goes to the mesh
// below, whose moves are added, and the sweep back follows. The product of forces
// and moves is left in part.
func (g *grids) aroundBelow(c *crew.Crew) error {
	g.run(c, g.remain)
	c.Run(gridBlocks(len(g.pull)), g.lower)
	if err := g.below.correct(c, g.answer, g.pull); err != nil {
		return err
	}
	g.run(c, g.raise)
	g.run(c, g.back)
	return nil
}

// advanceBlock takes the step alpha along p, whose change of the forces is q, and
// sweeps there.
func (g *grids) advanceBlock(block int) {
	lo, hi := gridSpan(block, len(g.diag))
	x, r, p, q := g.x[lo:hi], g.r[lo:hi], g.p[lo:hi], g.q[lo:hi]
	x, p, q = x[:len(r)], p[:len(r)], q[:len(r)]
	s := 0.0
	for i := range r {
		x[i] += g.alpha * p[i]
		d := r[i] - g.alpha*q[i]
		r[i] = d
		s += d * d
	}
	g.part[block] = s
	g.sweepBlock(block)
}

// sweepBlock solves (D + L)·moves = forces in a block, with moves in others nil.
func (g *grids) sweepBlock(block int) {
	lo, hi := gridSpan(block, len(g.diag))
	r, z := g.forces, g.moves
	for i := lo; i < hi; i++ {
		a, b := g.ptr[i], g.outer[i]
		col := g.col[a:b]
		entry := g.entry[a:b][:len(col)]
		s := r[i]
		for k, j := range col {
			s -= entry[k] * z[j]
		}
		z[i] = s * g.inverse[i]
	}
}

// remainBlock computes what the sweep leaves, forces − A·moves.
func (g *grids) remainBlock(block int) {
	lo, hi := gridSpan(block, len(g.diag))
	z := g.moves
	for i := lo; i < hi; i++ {
		a, b := g.outer[i], g.ptr[i+1]
		col := g.col[a:b]
		entry := g.entry[a:b][:len(col)]
		s := 0.0
		for k, j := range col {
			s -= entry[k] * z[j]
		}
		g.left[i] = s
	}
}

// lowerBlock brings it down.
func (g *grids) lowerBlock(block int) {
	lo, hi := gridSpan(block, len(g.pull))
	d := &g.down
	for j := lo; j < hi; j++ {
		g.pull[j] = d.times(j, g.left)
	}
}

// raiseBlock adds the moves of the mesh below.
func (g *grids) raiseBlock(block int) {
	lo, hi := gridSpan(block, len(g.diag))
	for i := lo; i < hi; i++ {
		g.guess[i] = g.moves[i] + g.up.times(i, g.answer)
	}
}

// times is row i of t·x.
func (t *transfer) times(i int, x []float64) float64 {
	a, b := t.ptr[i], t.ptr[i+1]
	col := t.col[a:b]
	value := t.value[a:b][:len(col)]
	s := 0.0
	for k, j := range col {
		s += value[k] * x[j]
	}
	return s
}

// backBlock sweeps back from the guess.
func (g *grids) backBlock(block int) {
	lo, hi := gridSpan(block, len(g.diag))
	r, z, old := g.forces, g.moves, g.guess
	product := 0.0
	for i := hi - 1; i >= lo; i-- {
		s := r[i]
		a, b := g.ptr[i], g.upper[i]
		col := g.col[a:b]
		entry := g.entry[a:b][:len(col)]
		for k, j := range col {
			s -= entry[k] * old[j]
		}
		a, b = b, g.ptr[i+1]
		col = g.col[a:b]
		entry = g.entry[a:b][:len(col)]
		for k, j := range col {
			s -= entry[k] * z[j]
		}
		s *= g.inverse[i]
		z[i] = s
		product += r[i] * s
	}
	g.part[block] = product
}

// turnBlock makes the next direction p = z + beta·p with q = A·p, and p·q.
func (g *grids) turnBlock(block int) {
	lo, hi := gridSpan(block, len(g.diag))
	z, p, q := g.z, g.p, g.q
	product := 0.0
	for i := lo; i < hi; i++ {
		a, b := g.ptr[i], g.ptr[i+1]
		col := g.col[a:b]
		entry := g.entry[a:b][:len(col)]
		s := g.diag[i] * z[i]
		for k, j := range col {
			s += entry[k] * z[j]
		}
		s += g.beta * q[i]
		q[i] = s
		d := z[i] + g.beta*p[i]
		p[i] = d
		product += d * s
	}
	g.part[block] = product
}
