package surface

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// Contour is a line of equal height on the surface.
type Contour struct {
	Level  float64 // m
	Points []r3.Vec
	Closed bool // the last point joins the first, which is not repeated
}

// Levels returns the round heights at the given spacing (m) that lie within
// the heights of the points.
func Levels(position []r3.Vec, spacing float64) []float64 {
	if len(position) == 0 || !(spacing > 0) {
		return nil
	}
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, p := range position {
		lo, hi = min(lo, p.Z), max(hi, p.Z)
	}
	if math.IsInf(lo, 0) || math.IsInf(hi, 0) || (hi-lo)/spacing > 1e5 {
		return nil
	}
	var l []float64
	for k := math.Ceil(lo / spacing); k*spacing <= hi; k++ {
		l = append(l, k*spacing)
	}
	return l
}

// Contours returns the lines of equal height at the given levels, in the order
// of the levels. A node that lies exactly at a level counts as above it, so
// that every contour is a chain of points on sides of triangles and flat parts
// give no area of contour.
func Contours(position []r3.Vec, corners [][3]int32, levels []float64) []Contour {
	var out []Contour
	edges := Edges(corners)
	// sides[3t+k]: number in edges of the side of triangle t from corner k to k+1.
	sides := make([]int32, 3*len(corners))
	index := make(map[uint64]int32, len(edges))
	for i, e := range edges {
		index[uint64(uint32(e.Nodes[0]))<<32|uint64(uint32(e.Nodes[1]))] = int32(i)
	}
	for t, c := range corners {
		for k := range 3 {
			a, b := c[k], c[(k+1)%3]
			if a > b {
				a, b = b, a
			}
			sides[3*t+k] = index[uint64(uint32(a))<<32|uint64(uint32(b))]
		}
	}
	type segment struct{ from, to int32 } // numbers of sides
	next := make([][2]int32, len(edges))  // up to two segments at each side
	for _, level := range levels {
		for i := range next {
			next[i] = [2]int32{-1, -1}
		}
		var segs []segment
		join := func(side, seg int32) {
			if next[side][0] < 0 {
				next[side][0] = seg
			} else if next[side][1] < 0 {
				next[side][1] = seg
			} // where sheets branch the third line ends on its own
		}
		for t, c := range corners {
			var cut [3]int32
			n := 0
			for k := range 3 {
				if (position[c[k]].Z >= level) != (position[c[(k+1)%3]].Z >= level) {
					cut[n] = sides[3*t+k]
					n++
				}
			}
			if n == 2 {
				s := int32(len(segs))
				segs = append(segs, segment{cut[0], cut[1]})
				join(cut[0], s)
				join(cut[1], s)
			}
		}
		point := func(side int32) r3.Vec {
			p, q := position[edges[side].Nodes[0]], position[edges[side].Nodes[1]]
			u := (level - p.Z) / (q.Z - p.Z)
			v := r3.Add(p, r3.Scale(u, r3.Sub(q, p)))
			v.Z = level
			return v
		}
		used := make([]bool, len(segs))
		walk := func(start int32, seg int32) Contour {
			line := Contour{Level: level, Points: []r3.Vec{point(start)}}
			at := start
			for seg >= 0 && !used[seg] {
				used[seg] = true
				s := segs[seg]
				if s.from == at {
					at = s.to
				} else {
					at = s.from
				}
				if at == start {
					line.Closed = true
					return line
				}
				line.Points = append(line.Points, point(at))
				if next[at][0] == seg {
					seg = next[at][1]
				} else if next[at][1] == seg {
					seg = next[at][0]
				} else {
					seg = -1
				}
			}
			return line
		}
		// Open lines first, from their ends; what is left is closed.
		for side := range next {
			if next[side][0] >= 0 && next[side][1] < 0 && !used[next[side][0]] {
				out = append(out, walk(int32(side), next[side][0]))
			}
		}
		for s := range segs {
			if !used[s] {
				out = append(out, walk(segs[s].from, int32(s)))
			}
		}
	}
	return out
}
