package relax

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// pocket is air whose volume is given. Its pressure is the multiplier of an
// augmented Lagrangian: base + stiff·(wanted − volume) acts, and becomes the new
// base when the canopy comes to rest (Hestenes 1969; Powell 1969). So a bubble
// past the hemisphere, which would run away at constant pressure, is held by
// its volume.
type pocket struct {
	index     int // in the structure
	triangles []int32
	side      []float64
	node      int32   // the plane of the boundary passes through it
	wanted    float64 // m³
	aim       float64 // on the way there, m³
	volume    float64 // now, m³
	pressure  float64 // acting now, Pa
	base      float64 // of the augmented Lagrangian, Pa
	stiff     float64 // Pa/m³
	most, cap float64 // what may be added to base, and the largest pressure, Pa
	area      float64 // at the last rest, m²
}

// pocketStiffness is the stiffness of air over 8πσ/A², which is that of a film
// of stress σ and area A, both for a shallow dish (πa⁴/8σ of volume per
// pressure) and, with the other sign, for a whole sphere (2πR⁴/σ). Above 1 it
// holds any bubble; the error of the volume falls by as much at each rest.
const pocketStiffness = 30

func (p *problem) addPockets(x []r3.Vec) {
	s := p.s
	if len(s.Enclosures) == 0 {
		return
	}
	of, side := make([]int, len(s.Fabrics)), make([]float64, len(s.Fabrics))
	for i := range s.Enclosures {
		e := &s.Enclosures[i]
		p.pocket = append(p.pocket, pocket{index: i, node: e.Base, wanted: e.Volume})
		for k, f := range e.Fabrics {
			of[f], side[f] = i+1, float64(e.Side[k])
		}
	}
	for t, f := range p.fabricOf {
		if k := of[f] - 1; k >= 0 {
			p.pocket[k].triangles = append(p.pocket[k].triangles, int32(t))
			p.pocket[k].side = append(p.pocket[k].side, side[f])
		}
	}
	for k := range p.pocket {
		g := &p.pocket[k]
		p.stiffen(g, x)
		o := x[g.node]
		for j, t := range g.triangles {
			c := p.corners[t]
			a := r3.Sub(x[c[0]], o)
			g.volume += g.side[j] * r3.Dot(a, r3.Cross(r3.Sub(x[c[1]], o), r3.Sub(x[c[2]], o))) / 6
		}
		g.aim = g.volume
		g.advance()
	}
}

// stiffen measures the films around a pocket for its stiffness.
func (p *problem) stiffen(g *pocket, x []r3.Vec) {
	area, pull := 0.0, 0.0
	for _, t := range g.triangles {
		c := p.corners[t]
		a := norm(r3.Cross(r3.Sub(x[c[1]], x[c[0]]), r3.Sub(x[c[2]], x[c[0]]))) / 2
		area += a
		pull += a * (p.stress[t][0] + p.stress[t][1]) / 2
	}
	if !(area > 0) {
		return
	}
	g.area = area
	stress := pull / area
	if !(stress > 0) { // elastic fabric without prestress
		stress = 1
		for _, t := range g.triangles {
			stress = max(stress, 1e-3*p.bound[p.fabricOf[t]])
		}
	}
	g.stiff = pocketStiffness * 8 * math.Pi * stress / (area * area)
	// No film of this area needs more than a sphere does, 2σ/R with A = 4πR².
	g.cap = 5 * stress * math.Sqrt(math.Pi/area)
	g.most = g.cap / 10
}

// advance aims at a volume nearer to the one wanted: blown up at once, a flat
// film swings in waves that tangle its mesh.
func (g *pocket) advance() {
	most := aimStep * g.area * math.Sqrt(g.area)
	g.aim += min(max(g.wanted-g.aim, -most), most)
}

// aimStep is how far one aim is from the last, over area^1.5 (a hemisphere
// holds 0.13 of it).
const aimStep = 0.03

// pressPockets finds the pressures from the volumes at x and puts them on the
// triangles.
func (st *state) pressPockets() {
	for k := range st.pocket {
		g := &st.pocket[k]
		o := st.x[g.node]
		sum := 0.0
		for j, t := range g.triangles {
			sum += g.side[j] * r3.Dot(r3.Sub(st.x[st.corners[t][0]], o), st.facets[t].twice)
		}
		g.volume = sum / 6
		add := g.stiff * (g.aim - g.volume)
		g.pressure = min(max(g.base+min(max(add, -g.most), g.most), -g.cap), g.cap)
		for j, t := range g.triangles {
			st.push[t] = g.side[j] * g.pressure / 6
		}
	}
}

// stiffenPockets adds to the masses what the air resists: its stiffness is
// k·g·gᵀ with gᵢ = ∂V/∂xᵢ, a third of the area around a node at most, whose row
// sums are k·|gᵢ|·Σ|gⱼ|.
func (st *state) stiffenPockets() {
	for k := range st.pocket {
		g := &st.pocket[k]
		for _, t := range g.triangles {
			share := g.stiff * g.area * norm(st.facets[t].twice) / 6
			for _, i := range st.corners[t] {
				st.mass[i] += share
			}
		}
	}
}

// airError is the largest relative error of a volume.
func (st *state) airError() (worst float64, at int) {
	at = -1
	for k := range st.pocket {
		g := &st.pocket[k]
		e := math.Abs(g.wanted-g.volume) / max(math.Abs(g.wanted), 1e-5*g.area*math.Sqrt(g.area))
		if e > worst || math.IsNaN(e) {
			worst, at = e, k
		}
	}
	return worst, at
}

// calm is the residual at which a place of rest counts for air: pressures taken
// from a canopy that is far from balance run away.
const calm = 0.003

// adjustPockets takes the pressures that act for the new bases, and aims on, at
// a rest with residual eta.
func (st *state) adjustPockets(eta float64) {
	if eta > calm {
		return
	}
	for k := range st.pocket {
		g := &st.pocket[k]
		g.base = g.pressure
		st.stiffen(g, st.x)
		g.advance()
	}
}

// startPressures takes first guesses of pressures from a form.
func (p *problem) startPressures(f *canopy.Form) {
	for k := range p.pocket {
		if g := &p.pocket[k]; g.index < len(f.Pressure) {
			g.base = f.Pressure[g.index]
		}
	}
}
