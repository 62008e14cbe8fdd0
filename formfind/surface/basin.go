package surface

import (
	"container/heap"

	"gonum.org/v1/gonum/spatial/r3"
)

// Basin is a hollow in the surface, ringed by a closed contour, in which water
// would stand.
type Basin struct {
	Lowest int32   // node at its bottom
	Depth  float64 // from the bottom to the level at which it spills, m
	Level  float64 // height at which it spills, m
	Area   float64 // plan area of the water when full, m²
	Volume float64 // of the water when full, m³
	Nodes  int     // nodes under water
}

// Basins returns the hollows of the surface that are deeper than least (m), the
// deepest first. Water is taken to run off at every free boundary of the
// surface, also through a ring, and along the sides of the triangles; nothing
// deforms under it.
//
// The levels come from flooding inwards from the boundaries, lowest first:
// R. Barnes, C. Lehman & D. Mulla: Priority-flood: an optimal
// depression-filling and watershed-labeling algorithm for digital elevation
// models. Computers & Geosciences 62 (2014), 117-127.
func Basins(position []r3.Vec, corners [][3]int32, least float64) []Basin {
	n := len(position)
	edges := Edges(corners)
	start, adj := neighbours(n, edges)

	level := make([]float64, n)
	seen := make([]bool, n)
	var q floodQueue
	push := func(i int32, z float64) {
		seen[i] = true
		level[i] = z
		heap.Push(&q, floodItem{z, i})
	}
	for i, b := range BoundaryNodes(n, edges) {
		if b {
			push(int32(i), position[i].Z)
		}
	}
	for q.Len() > 0 {
		it := heap.Pop(&q).(floodItem)
		for _, j := range adj[start[it.node]:start[it.node+1]] {
			if !seen[j] {
				push(j, max(position[j].Z, it.level))
			}
		}
	}

	// A part without any boundary (a closed cushion) is not flooded: seen is false.
	wet := func(i int32) bool { return seen[i] && level[i] > position[i].Z }
	label := make([]int32, n)
	for i := range label {
		label[i] = -1
	}
	var all []Basin
	var stack []int32
	for i := range int32(n) {
		if !wet(i) || label[i] >= 0 {
			continue
		}
		id := int32(len(all))
		b := Basin{Lowest: i, Level: level[i]}
		label[i] = id
		stack = append(stack[:0], i)
		for len(stack) > 0 {
			k := stack[len(stack)-1]
			stack = stack[:len(stack)-1]
			b.Nodes++
			if position[k].Z < position[b.Lowest].Z || position[k].Z == position[b.Lowest].Z && k < b.Lowest {
				b.Lowest = k
			}
			for _, j := range adj[start[k]:start[k+1]] {
				if wet(j) && label[j] < 0 && level[j] == b.Level {
					label[j] = id
					stack = append(stack, j)
				}
			}
		}
		b.Depth = b.Level - position[b.Lowest].Z
		all = append(all, b)
	}
	if len(all) == 0 {
		return nil
	}
	for _, c := range corners {
		id := int32(-1)
		for _, i := range c {
			if label[i] >= 0 {
				id = label[i]
			}
		}
		if id >= 0 {
			a, v := wetPart(position[c[0]], position[c[1]], position[c[2]], all[id].Level)
			all[id].Area += a
			all[id].Volume += v
		}
	}
	out := all[:0]
	for _, b := range all {
		if b.Depth > least {
			out = append(out, b)
		}
	}
	sortBasins(out)
	return out
}

func sortBasins(b []Basin) {
	for i := 1; i < len(b); i++ { // few
		for j := i; j > 0 && b[j].Depth > b[j-1].Depth; j-- {
			b[j], b[j-1] = b[j-1], b[j]
		}
	}
}

// wetPart returns the plan area of the part of a triangle below the level and
// the volume of water over it.
func wetPart(a, b, c r3.Vec, level float64) (area, volume float64) {
	p := [3]r3.Vec{a, b, c}
	poly := make([]r3.Vec, 0, 4)
	for k := range 3 {
		u, v := p[k], p[(k+1)%3]
		if u.Z <= level {
			poly = append(poly, u)
		}
		if (u.Z <= level) != (v.Z <= level) {
			s := (level - u.Z) / (v.Z - u.Z)
			poly = append(poly, r3.Add(u, r3.Scale(s, r3.Sub(v, u))))
		}
	}
	for k := 1; k+1 < len(poly); k++ {
		u, v := r3.Sub(poly[k], poly[0]), r3.Sub(poly[k+1], poly[0])
		t := (u.X*v.Y - u.Y*v.X) / 2
		if t < 0 {
			t = -t
		}
		area += t
		volume += t * (level - (poly[0].Z+poly[k].Z+poly[k+1].Z)/3)
	}
	return area, volume
}

type floodItem struct {
	level float64
	node  int32
}

type floodQueue []floodItem

func (q floodQueue) Len() int { return len(q) }
func (q floodQueue) Less(i, j int) bool {
	if q[i].level != q[j].level {
		return q[i].level < q[j].level
	}
	return q[i].node < q[j].node
}
func (q floodQueue) Swap(i, j int) { q[i], q[j] = q[j], q[i] }
func (q *floodQueue) Push(x any)   { *q = append(*q, x.(floodItem)) }
func (q *floodQueue) Pop() any {
	old := *q
	x := old[len(old)-1]
	*q = old[:len(old)-1]
	return x
}
