package mesh

import (
	"math"

	"anticlast/formfind/canopy"
	"gonum.org/v1/gonum/spatial/r3"
)

// lattice is where the lines of a net cross if it had no end: crossing (i, j)
// at index j·ni + i. Lines of the first family follow i, those of the second j,
// those of the third a diagonal.
type lattice struct {
	ni, nj int
	i0, j0 int // numbers of the first column and row, which an earlier lattice shares
	at     []xy
	space  []r3.Vec // in space, where they follow from an earlier shape
	known  []bool   // nil = all
	steps  [][2]int // per family
	h      float64  // least distance between lines
	link   float64  // greatest distance between neighbours along a line
}

const (
	// maxLattice bounds the crossings of all nets of a model.
	maxLattice = 4_000_000
	// maxLines bounds the lines of a family.
	maxLines = 20_000
)

// crossings adds those of a net to the ones there are, before room is made for
// them, and reports whether that is not too many.
func (b *builder) crossings(ni, nj int) bool {
	b.crossed += float64(ni) * float64(nj)
	return b.crossed <= maxLattice
}

// netSpacings returns the spacing of the first two families.
func netSpacings(n *canopy.Net) (h [2]float64) {
	for k := range h {
		if h[k] = n.Families[k].Spacing; n.MeshLength > 0 {
			h[k] = n.MeshLength
		}
	}
	return h
}

// newLattice lays straight lines over the rim so that the outermost of each
// family are about a spacing away from where the rim reaches farthest, and the
// whole is symmetric about the middle of that. nil when there would be too many.
func (b *builder) newLattice(n *canopy.Net, r *rim) *lattice {
	h := netSpacings(n)
	angle := [2]float64{0, math.Pi / 2}
	if len(n.Families) == 3 {
		angle[1] = math.Pi / 3
	}
	for k := range angle {
		if n.Families[k].HasAngle {
			angle[k] = n.Families[k].Angle
		}
	}
	// Lines of family k run along (cos, sin) of its angle, h[k] apart.
	s0, c0 := math.Sincos(angle[0])
	s1, c1 := math.Sincos(angle[1])
	sin := c0*s1 - s0*c1
	if math.Abs(sin) < leastCrossing {
		return nil
	}
	// A step along i follows the first family from one line of the second to
	// the next.
	a := xy{c0 * h[1] / math.Abs(sin), s0 * h[1] / math.Abs(sin)}
	c := xy{c1 * h[0] / math.Abs(sin), s1 * h[0] / math.Abs(sin)}
	l := &lattice{steps: [][2]int{{1, 0}, {0, 1}}, h: min(h[0], h[1])}
	l.link = max(math.Hypot(a.x, a.y), math.Hypot(c.x, c.y))
	if len(n.Families) == 3 {
		d := [2]int{-1, 1}
		dx, dy := c.x-a.x, c.y-a.y
		if a.x*c.x+a.y*c.y < 0 {
			d, dx, dy = [2]int{1, 1}, c.x+a.x, c.y+a.y
		}
		l.steps = append(l.steps, d)
		l.link = max(l.link, math.Hypot(dx, dy))
		l.h = min(l.h, math.Abs(a.x*c.y-a.y*c.x)/math.Hypot(dx, dy))
	}
	det := a.x*c.y - a.y*c.x
	lo, hi := xy{math.Inf(1), math.Inf(1)}, xy{math.Inf(-1), math.Inf(-1)}
	for _, s := range r.sides {
		u, v := (s.a.x*c.y-s.a.y*c.x)/det, (a.x*s.a.y-a.y*s.a.x)/det
		lo = xy{min(lo.x, u), min(lo.y, v)}
		hi = xy{max(hi.x, u), max(hi.y, v)}
	}
	u0, ni := spread(lo.x, hi.x)
	v0, nj := spread(lo.y, hi.y)
	if min(ni, nj) < 1 || max(ni, nj) > maxLines || !b.crossings(ni, nj) {
		return nil
	}
	l.ni, l.nj = ni, nj
	l.at = make([]xy, 0, ni*nj)
	for j := range nj {
		for i := range ni {
			u, v := u0+float64(i), v0+float64(j)
			l.at = append(l.at, xy{u*a.x + v*c.x, u*a.y + v*c.y})
		}
	}
	return l
}

// leastCrossing is the sine of the least angle at which families may cross.
const leastCrossing = 0.17

// spread returns the first and the number of whole steps that reach beyond lo
// and hi by one at least, symmetric about the middle, with the last inside
// between 0.75 and 1.25 from the ends.
func spread(lo, hi float64) (first float64, n int) {
	k := math.Max(1, math.Round(hi-lo))
	n = int(min(k, maxLattice)) + 3
	return (lo+hi)/2 - float64(n-1)/2, n
}

// walk calls do with the crossings along every line, line by line within family
// after family.
func (l *lattice) walk(do func(family int, line []int32)) {
	var line []int32
	for f, d := range l.steps {
		start := func(i, j int) {
			line = line[:0]
			for i >= 0 && i < l.ni && j < l.nj {
				line = append(line, int32(j*l.ni+i))
				i, j = i+d[0], j+d[1]
			}
			do(f, line)
		}
		switch d {
		case [2]int{1, 0}:
			for j := range l.nj {
				start(0, j)
			}
		case [2]int{0, 1}:
			for i := range l.ni {
				start(i, 0)
			}
		case [2]int{-1, 1}:
			for i := range l.ni {
				start(i, 0)
			}
			for j := 1; j < l.nj; j++ {
				start(l.ni-1, j)
			}
		default: // 1, 1
			for j := l.nj - 1; j > 0; j-- {
				start(0, j)
			}
			for i := range l.ni {
				start(i, 0)
			}
		}
	}
}

func (l *lattice) has(p int32) bool { return l.known == nil || l.known[p] }
