package mesh

import (
	"slices"

	"gonum.org/v1/gonum/spatial/r3"
)

// openCorners turns the sides with which two films on one boundary cut the same
// corner of it. Such a side, between two nodes of the boundary and inside both
// films, would sew them together, there and in every finer mesh; and a triangle
// of three nodes of the boundary cannot follow the air between the films. Turned,
// each film has a side of its own into the corner. In a narrow corner several lie
// one behind the other, of which the outer ones can be turned after the inner.
func (b *builder) openCorners() {
	s := b.s
	if len(s.Fabrics) < 2 {
		return
	}
	along := map[[2]int32]bool{}
	for _, e := range s.Ends {
		along[sideKey(e[0], e[1])] = true
	}
	for _, l := range s.Lines {
		for i := 1; i < len(l.Nodes); i++ {
			along[sideKey(l.Nodes[i-1], l.Nodes[i])] = true
		}
	}
	// Nodes of several films.
	shared := make([]bool, len(s.Position))
	film := make([]int32, len(s.Position))
	for i := range film {
		film[i] = -1
	}
	for t, c := range s.Corners {
		for _, i := range c {
			shared[i] = shared[i] || film[i] >= 0 && film[i] != s.FabricOf[t]
			film[i] = s.FabricOf[t]
		}
	}
	// Corners are a few sides deep; that no side is turned to and fro without end is
	// not proven, so the passes are counted.
	const maxPasses = 1000
	for pass := 1; ; pass++ {
		if err := b.ctx.Err(); err != nil {
			return
		}
		turned, left := b.openOnce(shared, along)
		if left == nil {
			return
		}
		if turned == 0 || pass == maxPasses {
			f := b.m.Fabrics[left.fabric]
			p := s.Position[left.side[0]]
			b.fail("fabric", f.Name, f.Line, Mismatch, "give one of them another mesh size or pattern", "it cuts a corner of its boundary at [%.3f, %.3f, %.3f] with the same side as another fabric there, and cannot be told from it", p.X, p.Y, p.Z)
			return
		}
	}
}

// cut is a side inside a fabric that another fabric has too.
type cut struct {
	side   [2]int32
	fabric int32
}

// openOnce turns what can be turned, and returns how many sides that was and one
// that is left; nil when none is.
func (b *builder) openOnce(shared []bool, along map[[2]int32]bool) (turned int, left *cut) {
	s := b.s
	at := map[[2]int32][]int32{} // triangles at sides between shared nodes
	var order [][2]int32
	for t, c := range s.Corners {
		for k := range 3 {
			i, j := c[k], c[(k+1)%3]
			key := sideKey(i, j)
			if !shared[i] || !shared[j] || along[key] {
				continue
			}
			if at[key] == nil {
				order = append(order, key)
			}
			at[key] = append(at[key], int32(t))
		}
	}
	// Films with each side inside them, and those that have one in common.
	inside := make([][]cutPair, len(order))
	common := map[int32]bool{}
	for n, key := range order {
		byFilm := map[int32]int32{}
		for _, t := range at[key] {
			f := s.FabricOf[t]
			if first, second := byFilm[f]; second {
				inside[n] = append(inside[n], cutPair{f, first, t})
				continue
			}
			byFilm[f] = t
		}
		if len(inside[n]) > 1 {
			for _, p := range inside[n] {
				common[p.fabric] = true
			}
		}
	}
	moved := map[int32]bool{} // triangles turned in this pass
	for n, key := range order {
		kept := 0
		for _, p := range inside[n] {
			if !common[p.fabric] {
				continue
			}
			i, j := apex(s.Corners[p.first], key), apex(s.Corners[p.second], key)
			// Towards a node of the film's own, or out of the other's way.
			apart := !shared[i] || !shared[j] || len(inside[n]) > 1 && kept == 1
			if !moved[p.first] && !moved[p.second] && apart && at[sideKey(i, j)] == nil && b.turn(p.first, p.second, key) {
				moved[p.first], moved[p.second] = true, true
				turned++
				continue
			}
			if kept++; kept > 1 {
				left = &cut{key, p.fabric}
			}
		}
	}
	return turned, left
}

// cutPair are the two triangles of a fabric at a side inside it.
type cutPair struct{ fabric, first, second int32 }

// apex is the corner of a triangle off one of its sides.
func apex(c [3]int32, side [2]int32) int32 {
	for _, i := range c {
		if i != side[0] && i != side[1] {
			return i
		}
	}
	return -1
}

// turn replaces the side between two triangles by the one between their other
// corners; false when that would turn a triangle over.
func (b *builder) turn(t, u int32, side [2]int32) bool {
	s := b.s
	c := s.Corners[t]
	// Corners of t counter-clockwise from its apex: p, i, j; the apex of u is q.
	k := slices.Index(c[:], apex(c, side))
	p, i, j := c[k], c[(k+1)%3], c[(k+2)%3]
	q := apex(s.Corners[u], side)
	one, two := [3]int32{p, i, q}, [3]int32{p, q, j}
	normal := func(c [3]int32) r3.Vec {
		a := s.Position[c[0]]
		return r3.Cross(r3.Sub(s.Position[c[1]], a), r3.Sub(s.Position[c[2]], a))
	}
	up := r3.Add(normal(c), normal(s.Corners[u]))
	for _, n := range [2]r3.Vec{normal(one), normal(two)} {
		if !(r3.Dot(n, up) > 0.05*r3.Norm2(up)) {
			return false
		}
	}
	s.Corners[t], s.Corners[u] = one, two
	return true
}
