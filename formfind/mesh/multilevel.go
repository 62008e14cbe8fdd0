package mesh

import "math"

// multilevel approximates the inverse of the matrix of [refinement.relaxHeights]
// by a sum over square grids laid under the points, each twice as coarse as the
// one before (Bramble, Pasciak and Xu 1990):
//
//	M = D⁻¹ + Σₖ PₖPₖᵀ/a
//
// with D the diagonal of the matrix, Pₖ bilinear interpolation from the nodes of
// grid k to the points, and a the energy of a hat function of a grid. With it the
// number of steps hardly depends on that of the points. Hats that reach a point of given
// height are left out: they could not vanish there.
type multilevel struct {
	r     *refinement
	start []int32 // as of neighbours
	at    xy      // corner of the grids
	per   float64 // cells of the finest grid per length
	grid  []layer
}

// layer is a grid of (nx+1)·(ny+1) nodes.
type layer struct {
	nx, ny int
	g      []float64
	out    []bool // per node: left out
}

// hat is the energy of a bilinear hat function, 8/3, in a mesh of equilateral
// triangles, where the sum of the squares of differences along sides is √3
// times that of the gradient.
var hat = 8 / math.Sqrt(3)

func newMultilevel(r *refinement, start []int32) *multilevel {
	p := r.d.p[r.rim:]
	lo, hi := p[0], p[0]
	for _, q := range p {
		lo = xy{min(lo.x, q.x), min(lo.y, q.y)}
		hi = xy{max(hi.x, q.x), max(hi.y, q.y)}
	}
	m := &multilevel{r: r, start: start, at: lo}
	// About two points to a cell in a region that is round, fewer cells in all
	// than points in any other.
	w, h := hi.x-lo.x, hi.y-lo.y
	cell := max(math.Sqrt(2*w*h/float64(len(p))), 2*max(w, h)/float64(len(p)))
	if !(cell > 0 && 1/cell < math.MaxFloat64) {
		return m // all at one place
	}
	m.per = 1 / cell
	for nx, ny := int(w*m.per)+1, int(h*m.per)+1; ; nx, ny = (nx+1)/2, (ny+1)/2 {
		m.grid = append(m.grid, layer{nx, ny, make([]float64, (nx+1)*(ny+1)), make([]bool, (nx+1)*(ny+1))})
		if max(nx, ny) <= 2 {
			break
		}
	}
	for _, q := range r.d.p[3:r.rim] {
		x, y := (q.x-lo.x)*m.per, (q.y-lo.y)*m.per
		for k := range m.grid {
			g := &m.grid[k]
			// No farther than a cell outside: what lies there is of no interest.
			i, j := math.Floor(x), math.Floor(y)
			if i >= -1 && j >= -1 && i <= float64(g.nx) && j <= float64(g.ny) {
				for b := max(0, int(j)); b <= min(g.ny, int(j)+1); b++ {
					for a := max(0, int(i)); a <= min(g.nx, int(i)+1); a++ {
						g.out[b*(g.nx+1)+a] = true
					}
				}
			}
			x, y = x/2, y/2
		}
	}
	return m
}

// cell returns the node of the finest grid below and left of q, and how far from
// there q is in cells.
func (m *multilevel) cell(q xy) (c int, u, v float64) {
	g := &m.grid[0]
	x, y := (q.x-m.at.x)*m.per, (q.y-m.at.y)*m.per
	i, j := min(int(x), g.nx-1), min(int(y), g.ny-1)
	return j*(g.nx+1) + i, x - float64(i), y - float64(j)
}

// apply sets z to M·res and returns z·res.
func (m *multilevel) apply(z, res []float64) (dot float64) {
	p := m.r.d.p[m.r.rim:]
	if len(m.grid) > 0 {
		f := &m.grid[0]
		clear(f.g)
		for i, s := range res {
			c, u, v := m.cell(p[i])
			low, up := f.g[c:c+2], f.g[c+f.nx+1:c+f.nx+3]
			low[0] += (1 - u) * (1 - v) * s
			low[1] += u * (1 - v) * s
			up[0] += (1 - u) * v * s
			up[1] += u * v * s
		}
		for k := 1; k < len(m.grid); k++ {
			m.grid[k].gather(&m.grid[k-1])
		}
		for k := len(m.grid) - 1; k >= 0; k-- {
			g := &m.grid[k]
			for c, out := range g.out {
				if out {
					g.g[c] = 0
				} else {
					g.g[c] /= hat
				}
			}
			if k+1 < len(m.grid) {
				m.grid[k+1].spread(g)
			}
		}
	}
	for i, s := range res {
		e := s / max(1, float64(m.start[i+1]-m.start[i]))
		if len(m.grid) > 0 {
			g := &m.grid[0]
			c, u, v := m.cell(p[i])
			low, up := g.g[c:c+2], g.g[c+g.nx+1:c+g.nx+3]
			e += (1-v)*((1-u)*low[0]+u*low[1]) + v*((1-u)*up[0]+u*up[1])
		}
		z[i] = e
		dot += e * s
	}
	return dot
}

// gather sets g to the transpose of what spread does.
func (g *layer) gather(fine *layer) {
	clear(g.g)
	g.pairs(fine, func(c, f int, w float64) { g.g[c] += w * fine.g[f] })
}

// spread adds the bilinear interpolation of g to a grid of twice the fineness.
func (g *layer) spread(fine *layer) {
	g.pairs(fine, func(c, f int, w float64) { fine.g[f] += w * g.g[c] })
}

// pairs calls do for every node c of g, every node f of the finer grid that its
// hat reaches, and the value of the hat there.
func (g *layer) pairs(fine *layer, do func(c, f int, w float64)) {
	for j := 0; j <= fine.ny; j++ {
		for i := 0; i <= fine.nx; i++ {
			f, c := j*(fine.nx+1)+i, j/2*(g.nx+1)+i/2
			switch i, j := i%2, j%2; {
			case i == 0 && j == 0:
				do(c, f, 1)
			case j == 0:
				do(c, f, 0.5)
				do(c+1, f, 0.5)
			case i == 0:
				do(c, f, 0.5)
				do(c+g.nx+1, f, 0.5)
			default:
				do(c, f, 0.25)
				do(c+1, f, 0.25)
				do(c+g.nx+1, f, 0.25)
				do(c+g.nx+2, f, 0.25)
			}
		}
	}
}
