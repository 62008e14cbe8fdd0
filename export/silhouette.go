package export

import (
	"slices"

	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

// silhouettes returns the lines along which the fabric turns away from the
// viewer: of the two triangles at each of their sides, one shows its face and
// the other its back. Without them a dome fades into the paper, since nothing
// else ends where it does.
func silhouettes(r *canopy.Result, v view) [][]r3.Vec {
	corners := r.Structure.Corners
	front := make([]bool, len(corners))
	faces := 0
	for i, c := range corners {
		a, b, d := r.Form.Position[c[0]], r.Form.Position[c[1]], r.Form.Position[c[2]]
		if front[i] = r3.Dot(r3.Cross(r3.Sub(b, a), r3.Sub(d, a)), v.toward) > 0; front[i] {
			faces++
		}
	}
	// Only sides of the rarer kind are kept to be looked up: none in most plans.
	rare := 2*faces <= len(corners)
	var sides []uint64
	for i, c := range corners {
		if front[i] != rare {
			continue
		}
		for k := range 3 {
			sides = append(sides, directed(c[k], c[(k+1)%3]))
		}
	}
	if len(sides) == 0 {
		return nil
	}
	slices.Sort(sides)
	var found []uint64
	for i, c := range corners {
		if front[i] == rare {
			continue
		}
		for k := range 3 {
			// The neighbour runs along the side the other way.
			a, b := c[k], c[(k+1)%3]
			if _, ok := slices.BinarySearch(sides, directed(b, a)); ok {
				found = append(found, directed(a, b))
			}
		}
	}
	return chained(r.Form.Position, found)
}

// directed packs the way from node a to node b.
func directed(a, b int32) uint64 { return uint64(uint32(a))<<32 | uint64(uint32(b)) }

// chained joins ways that follow one another, open lines first.
func chained(position []r3.Vec, ways []uint64) [][]r3.Vec {
	slices.Sort(ways)
	used := make([]bool, len(ways))
	arrives := make(map[uint32]int, len(ways))
	for _, w := range ways {
		arrives[uint32(w)]++
	}
	var out [][]r3.Vec
	for _, open := range []bool{true, false} {
		for i, w := range ways {
			if used[i] || open && arrives[uint32(w>>32)] > 0 {
				continue
			}
			line := []r3.Vec{position[w>>32]}
			for k := i; k < len(ways) && !used[k]; {
				used[k] = true
				end := ways[k] & 0xffffffff
				line = append(line, position[end])
				k, _ = slices.BinarySearch(ways, end<<32)
				for k < len(ways) && ways[k]>>32 == end && used[k] {
					k++
				}
				if k < len(ways) && ways[k]>>32 != end {
					break
				}
			}
			out = append(out, line)
		}
	}
	return out
}
