package relax

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// refresh brings masses and the sums of forces up to date with x; the
// elements must be.
//
// With Δt = 1 an explicit step is stable while the largest eigenvalue of
// M⁻¹K stays below 4. Element by element that holds for mᵢ = ½ΣSᵢ, S bounding
// what the element does when the node alone moves, as long as the element's
// own matrix has no eigenvalue above 2 in units of its diagonal (Barnes, Int. J.
// Space Structures 14, 1999). That is so for members and triangles without
// obtuse angle; for others S grows by half the eigenvalue.
func (st *state) refresh() {
	st.crew.Run(blocks(st.n), func(b int) {
		lo, hi := span(b, st.n)
		for i := lo; i < hi; i++ {
			if st.mode[i] == still && st.tied[i] < 0 {
				continue
			}
			stiff, meet := st.stiffness(i)
			st.mass[i] = stiff
			st.meet[i] = meet
			if st.directed != nil {
				st.direct(i, stiff)
			}
			st.stride2[i] = stride * stride * st.near2(i)
		}
	})
	if len(st.cable) > 0 {
		st.stiffenCables()
	}
	if len(st.pocket) > 0 {
		st.stiffenPockets()
	}
	for _, r := range st.ring {
		for _, i := range r.nodes {
			st.mass[r.centre] += st.mass[i]
			st.stride2[r.centre] = min(st.stride2[r.centre], st.stride2[i])
			st.meet[r.centre] += st.meet[i]
		}
	}
	for i := range st.mass {
		st.mass[i] *= 0.5 * st.safety
		if !(st.mass[i] > 0) {
			st.mass[i] = st.leastMass(i)
		}
	}
}

// stride is the longest step of a node in units of the distance to its nearest
// neighbour. Only the first steps from a bad start are that long; without the
// limit the swing of a film tangles its mesh.
const stride = 0.1

// near2 is the squared distance from node i to its nearest neighbour.
func (st *state) near2(i int) float64 {
	x := st.x
	near := math.Inf(1)
	for _, c := range st.around[st.cornerAt[i]:st.cornerAt[i+1]] {
		near = min(near, r3.Norm2(r3.Sub(x[c.next], x[i])), r3.Norm2(r3.Sub(x[c.prev], x[i])))
	}
	for _, l := range st.links[st.linkAt[i]:st.linkAt[i+1]] {
		near = min(near, r3.Norm2(r3.Sub(x[l.other], x[i])))
	}
	if tiny := 1e-12 * st.size * st.size; !(near > tiny) {
		return tiny
	}
	return near
}

// leastMass serves nodes at which everything is slack and without stiffness.
func (st *state) leastMass(i int) float64 {
	if st.meet[i] > 0 {
		return st.meet[i] / (1e-3 * st.size)
	}
	return 1
}

// stiffness returns ΣS and the sum of the sizes of the forces at node i.
func (st *state) stiffness(i int) (stiff, meet float64) {
	x := st.x
	load := r3.Add(st.lead[i], st.shapeLoad(i))
	meet = norm(load)
	for _, c := range st.around[st.cornerAt[i]:st.cornerAt[i+1]] {
		t := int(c.at >> 2)
		next, prev := x[c.next], x[c.prev]
		e := r3.Sub(prev, next)
		if st.push != nil {
			stiff += math.Abs(st.push[t]) * norm(e)
		}
		if t < st.uniforms {
			f := &st.facets[t]
			// K = g·eᵢ·eⱼ; |σ| so that a pushing stress is bounded too.
			g := math.Abs(f.g)
			a, b := r3.Sub(x[i], prev), r3.Sub(next, x[i])
			ee := r3.Norm2(e)
			stiff += g * ee * excess(ee, r3.Norm2(a), r3.Norm2(b), r3.Dot(e, a), r3.Dot(a, b), r3.Dot(b, e))
			meet += g * norm(f.twice) * math.Sqrt(ee)
			continue
		}
		k := t - st.uniforms
		d := &st.density[k]
		at := c.at & 3
		qo, qp := d[after[after[at]]], d[after[at]]
		pull := r3.Add(r3.Scale(qo, r3.Sub(next, x[i])), r3.Scale(qp, r3.Sub(prev, x[i])))
		meet += norm(pull)
		qi := d[at]
		geometric := math.Abs(qo) + math.Abs(qp)
		if qo+qp > 0 && qi+qp > 0 && qi+qo > 0 {
			geometric = (qo + qp) * excess(qo+qp, qi+qo, qi+qp, qo, qi, qp)
		}
		stiff += geometric
		if st.triLaw[t] == elastic {
			stiff += st.elasticStiffness(t, int(at), [3]r3.Vec{x[st.corners[t][0]], x[st.corners[t][1]], x[st.corners[t][2]]})
		}
	}
	for _, l := range st.links[st.linkAt[i]:st.linkAt[i+1]] {
		q := math.Abs(st.q[l.member])
		meet += q * norm(r3.Sub(x[l.other], x[i]))
		if st.law[l.member] == byStretch {
			q = max(q, st.given[l.member]) // EA/L₀ bounds both directions
		}
		stiff += q
	}
	return stiff, meet
}

// elasticStiffness bounds the material stiffness of an elastic triangle at its
// corner: area × gradient² × the law's bound × stretch².
func (st *state) elasticStiffness(t, at int, x [3]r3.Vec) float64 {
	ft := &st.fabric[t-st.uniforms]
	var g2, gg [3]float64
	for k := range 3 {
		a, b := ft.Grad[k], ft.Grad[(k+1)%3]
		g2[k] = a[0]*a[0] + a[1]*a[1]
		gg[k] = a[0]*b[0] + a[1]*b[1]
	}
	e := ft.Strain(&x)
	// Largest principal stretch squared, 1 + 2·E₁.
	stretch := 1 + e[0] + e[1] + math.Hypot(e[0]-e[1], e[2])
	return ft.Area * g2[at] * st.bound[st.fabricOf[t]] * max(stretch, 1) * excess(g2[0], g2[1], g2[2], gg[0], gg[1], gg[2])
}

// excess returns half the largest eigenvalue of a 3×3 matrix with zero row
// sums in units of its diagonal, at least 1: the eigenvalues are 0 and two that
// add up to 3.
func excess(a, b, c, ab, bc, ca float64) float64 {
	if !(a > 0 && b > 0 && c > 0) {
		return 1.5
	}
	minors := 3 - ab*ab/(a*b) - bc*bc/(b*c) - ca*ca/(c*a)
	return max(1, (3+math.Sqrt(max(0, 9-4*minors)))/4)
}

// residual is how far x is from balance.
type residual struct {
	eta, worst float64
	node       int32 // of the largest residual
}

// balance measures the residual in the directions in which nodes relax, from
// fresh elements and sums; the caller has called elements and refresh.
func (st *state) balance() residual {
	var r residual
	var sum2, meet2, largest, most float64
	look := func(i int, f r3.Vec) {
		n2 := r3.Norm2(f)
		sum2 += n2
		meet2 += st.meet[i] * st.meet[i]
		most = max(most, st.meet[i])
		if n2 > largest || math.IsNaN(n2) {
			largest, r.node = n2, int32(i)
		}
	}
	for i := range st.n {
		if st.mode[i] == still {
			if st.tied[i] >= 0 {
				st.onRing[i], _ = st.nodal(i)
			}
			continue
		}
		f, area := st.nodal(i)
		look(i, st.project(i, f, area))
	}
	for _, g := range st.ring {
		f := st.onRing[g.centre]
		for _, i := range g.nodes {
			f = r3.Add(f, masked(st.onRing[i], st.free[i]))
		}
		if st.free[g.centre] != 0 {
			look(int(g.centre), masked(f, st.free[g.centre]))
		}
	}
	if meet2 > 0 {
		r.eta = math.Sqrt(sum2 / meet2)
		r.worst = math.Sqrt(largest) / most
	}
	if math.IsNaN(sum2) {
		r.eta, r.worst = math.NaN(), math.NaN()
	}
	return r
}

// meetNorm is ‖s‖₂ over the nodes that move.
func (st *state) meetNorm() float64 {
	sum := 0.0
	for i := range st.n {
		if st.mode[i] != still || st.tied[i] >= 0 && int32(i) == st.ring[st.tied[i]].centre && st.free[i] != 0 {
			sum += st.meet[i] * st.meet[i]
		}
	}
	return math.Sqrt(sum)
}

// sharpest returns the smallest angle of all triangles in rad and the triangle;
// −1 without triangles.
func (st *state) sharpest() (angle float64, triangle int) {
	angle, triangle = math.Pi, -1
	for t, c := range st.corners {
		tw := norm(st.facets[t].twice)
		a := r3.Norm2(r3.Sub(st.x[c[1]], st.x[c[0]]))
		b := r3.Norm2(r3.Sub(st.x[c[2]], st.x[c[1]]))
		d := r3.Norm2(r3.Sub(st.x[c[0]], st.x[c[2]]))
		// The smallest angle lies opposite the shortest side.
		short := min(a, b, d)
		if v := math.Atan2(tw, (a+b+d)/2-short); v < angle || math.IsNaN(v) {
			angle, triangle = v, t
		}
	}
	return angle, triangle
}
