package outline

import (
	"fmt"
	"math"
	"sort"

	"gonum.org/v1/gonum/spatial/r3"
)

// Surface is a mesh of triangles, in the unit of its file.
type Surface struct {
	Vertex   []r3.Vec
	Triangle [][3]int32
	Line     []int32 // of the triangles in the file, 0 = none
	Faults   []Fault
}

// maxTriangles is how many triangles a mesh may have.
const maxTriangles = 2_000_000

func (s *Surface) fail(line int, hint, format string, args ...any) {
	if len(s.Faults) < maxFaults {
		s.Faults = append(s.Faults, Fault{Line: line, Message: fmt.Sprintf(format, args...), Hint: hint})
	}
}

func (s *Surface) warn(line int, hint, format string, args ...any) {
	if len(s.Faults) < maxFaults {
		s.Faults = append(s.Faults, Fault{Line: line, Message: fmt.Sprintf(format, args...), Hint: hint, Warning: true})
	}
}

// Failed reports whether some fault is more than a warning.
func (s *Surface) Failed() bool {
	for _, f := range s.Faults {
		if !f.Warning {
			return true
		}
	}
	return false
}

// Settle turns the surface into metres and joins vertices that are closer than
// snap (m), leaves out triangles that have no area and vertices that are not
// used, and turns triangles so that neighbours agree and most of the surface
// looks up. What it finds wrong (edges of more than two triangles, surfaces that
// cannot be turned alike) goes into Faults.
func (s *Surface) Settle(u Unit, snap float64) {
	for i := range s.Vertex {
		s.Vertex[i] = r3.Scale(u.Metres, s.Vertex[i])
	}
	s.weld(snap)
	s.drop(u)
	if !s.Failed() {
		s.turn(u)
	}
}

// weld joins vertices that are closer than snap to one there was before.
func (s *Surface) weld(snap float64) {
	cell := max(snap, 1e-9)
	key := func(v r3.Vec) [3]int64 {
		return [3]int64{int64(math.Floor(v.X / cell)), int64(math.Floor(v.Y / cell)), int64(math.Floor(v.Z / cell))}
	}
	grid := make(map[[3]int64][]int32, len(s.Vertex))
	of := make([]int32, len(s.Vertex))
	var keep []r3.Vec
	for i, v := range s.Vertex {
		k := key(v)
		best, bestD := int32(-1), snap
		for dx := int64(-1); dx <= 1; dx++ {
			for dy := int64(-1); dy <= 1; dy++ {
				for dz := int64(-1); dz <= 1; dz++ {
					for _, n := range grid[[3]int64{k[0] + dx, k[1] + dy, k[2] + dz}] {
						if d := apart3(keep[n], v); d <= bestD && (best < 0 || d < bestD) {
							best, bestD = n, d
						}
					}
				}
			}
		}
		if best < 0 {
			best = int32(len(keep))
			keep = append(keep, v)
			grid[k] = append(grid[k], best)
		}
		of[i] = best
	}
	s.Vertex = keep
	for t := range s.Triangle {
		for k := range 3 {
			s.Triangle[t][k] = of[s.Triangle[t][k]]
		}
	}
}

// drop leaves out what has no area and what is not used.
func (s *Surface) drop(u Unit) {
	used := make([]bool, len(s.Vertex))
	n, flat, first := 0, 0, 0
	for t, c := range s.Triangle {
		p, q, r := s.Vertex[c[0]], s.Vertex[c[1]], s.Vertex[c[2]]
		a, b := r3.Sub(q, p), r3.Sub(r, p)
		if !(r3.Norm(r3.Cross(a, b)) > 1e-9*max(r3.Norm2(a), r3.Norm2(b), r3.Norm2(r3.Sub(r, q)))) {
			if flat++; flat == 1 {
				first = t
			}
			continue
		}
		s.Triangle[n], s.Line[n] = c, s.Line[t]
		n++
		for _, i := range c {
			used[i] = true
		}
	}
	if flat > 0 {
		s.warn(int(s.Line[first]), "", "%d triangle%s without area left out, the first at %s", flat, plural(flat), place(s.Vertex[s.Triangle[first][0]], u))
	}
	s.Triangle, s.Line = s.Triangle[:n], s.Line[:n]
	if n == 0 {
		s.fail(0, "", "the mesh has no triangles")
		return
	}
	of := make([]int32, len(s.Vertex))
	var keep []r3.Vec
	for i, v := range s.Vertex {
		if used[i] {
			of[i] = int32(len(keep))
			keep = append(keep, v)
		}
	}
	s.Vertex = keep
	for t := range s.Triangle {
		for k := range 3 {
			s.Triangle[t][k] = of[s.Triangle[t][k]]
		}
	}
}

// side is one side of a triangle.
type side struct {
	a, b int32 // a < b
	t    int32
	back bool // the triangle walks it from b to a
}

// sides lists all sides, those between the same vertices together.
func (s *Surface) sides() []side {
	out := make([]side, 0, 3*len(s.Triangle))
	for t, c := range s.Triangle {
		for k := range 3 {
			a, b := c[k], c[(k+1)%3]
			out = append(out, side{min(a, b), max(a, b), int32(t), a > b})
		}
	}
	sort.Slice(out, func(i, j int) bool {
		p, q := out[i], out[j]
		if p.a != q.a {
			return p.a < q.a
		}
		if p.b != q.b {
			return p.b < q.b
		}
		return p.t < q.t
	})
	return out
}

// turn makes neighbours agree on which side is up.
func (s *Surface) turn(u Unit) {
	sides := s.sides()
	type link struct {
		to   int32
		flip bool
	}
	near := make([][]link, len(s.Triangle))
	for i := 0; i < len(sides); {
		j := i + 1
		for j < len(sides) && sides[j].a == sides[i].a && sides[j].b == sides[i].b {
			j++
		}
		switch p := sides[i]; {
		case j-i > 2:
			s.fail(int(s.Line[p.t]), "split the mesh there", "%d triangles meet along the side from %s to %s", j-i, place(s.Vertex[p.a], u), place(s.Vertex[p.b], u))
		case j-i == 2:
			q := sides[i+1]
			near[p.t] = append(near[p.t], link{q.t, p.back == q.back})
			near[q.t] = append(near[q.t], link{p.t, p.back == q.back})
		}
		i = j
	}
	if s.Failed() {
		return
	}
	state := make([]int8, len(s.Triangle)) // 1 as it is, −1 turned
	for t := range state {
		if state[t] != 0 {
			continue
		}
		state[t] = 1
		group := []int32{int32(t)}
		up := 0.0
		for k := 0; k < len(group); k++ {
			i := group[k]
			c := s.Triangle[i]
			n := r3.Cross(r3.Sub(s.Vertex[c[1]], s.Vertex[c[0]]), r3.Sub(s.Vertex[c[2]], s.Vertex[c[0]]))
			up += float64(state[i]) * n.Z
			for _, l := range near[i] {
				want := state[i]
				if l.flip {
					want = -want
				}
				if state[l.to] == 0 {
					state[l.to] = want
					group = append(group, l.to)
				} else if state[l.to] != want {
					s.fail(int(s.Line[l.to]), "cut it", "the surface has one side only: its triangles cannot be turned alike (at %s)", place(s.Vertex[s.Triangle[l.to][0]], u))
					return
				}
			}
		}
		if up < 0 {
			for _, i := range group {
				state[i] = -state[i]
			}
		}
	}
	for t, f := range state {
		if f < 0 {
			c := &s.Triangle[t]
			c[1], c[2] = c[2], c[1]
		}
	}
}

// Loops returns the closed chains of vertices along the edge of a settled
// surface, with the surface on the left, each starting at its least vertex.
func (s *Surface) Loops() [][]int32 {
	next := map[int32]int32{}
	sides := s.sides()
	var starts []int32
	for i := 0; i < len(sides); {
		j := i + 1
		for j < len(sides) && sides[j].a == sides[i].a && sides[j].b == sides[i].b {
			j++
		}
		if j == i+1 {
			a, b := sides[i].a, sides[i].b
			if sides[i].back {
				a, b = b, a
			}
			if _, twice := next[a]; twice {
				s.fail(int(s.Line[sides[i].t]), "part the mesh there", "the edge of the mesh passes a vertex twice")
				return nil
			}
			next[a] = b
			starts = append(starts, a)
		}
		i = j
	}
	sort.Slice(starts, func(i, j int) bool { return starts[i] < starts[j] })
	var out [][]int32
	done := map[int32]bool{}
	for _, a := range starts {
		if done[a] {
			continue
		}
		var loop []int32
		for v := a; !done[v]; v = next[v] {
			done[v] = true
			loop = append(loop, v)
		}
		out = append(out, loop)
	}
	return out
}
