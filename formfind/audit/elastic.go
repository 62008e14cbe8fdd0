package audit

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// elasticTri is one triangle of elastic fabric: S = S₀ + C·E with E the strain
// of Green from the unstressed triangle and S the second stress of Piola and
// Kirchhoff in its warp and weft axes, compression taken away by wrinkles.
type elasticTri struct {
	area   float64       // unstressed
	grad   [3][2]float64 // gradients of the shape functions in warp and weft, unstressed
	c, inv [3][3]float64 // stiffness and its inverse for (E_warp, E_weft, 2E_shear)
	s0     [3]float64
	x      [3]r3.Vec
}

// elasticTriangle prepares triangle t; false when it has no unstressed area or
// its law no positive energy.
func (c *audited) elasticTriangle(t int) (e elasticTri, ok bool) {
	s := c.s
	ref := s.Reference
	if len(ref) == 0 {
		ref = s.Position
	}
	t3 := s.Corners[t]
	a, b, d := ref[t3[0]], ref[t3[1]], ref[t3[2]]
	u, v := r3.Sub(b, a), r3.Sub(d, a)
	n := r3.Cross(u, v)
	twice := norm(n)
	if !(twice > 0) {
		return e, false
	}
	n = r3.Scale(1/twice, n)
	w := r3.Sub(s.Warp[t], r3.Scale(r3.Dot(s.Warp[t], n), n))
	if !(norm(w) > 0) {
		return e, false
	}
	w = r3.Unit(w)
	f := r3.Cross(n, w)
	// Rows of the inverse of the 2×2 matrix of sides are the gradients.
	uw, uf, vw, vf := r3.Dot(u, w), r3.Dot(u, f), r3.Dot(v, w), r3.Dot(v, f)
	det := uw*vf - uf*vw
	e.grad[1] = [2]float64{vf / det, -vw / det}
	e.grad[2] = [2]float64{-uf / det, uw / det}
	e.grad[0] = [2]float64{-e.grad[1][0] - e.grad[2][0], -e.grad[1][1] - e.grad[2][1]}
	e.area = twice / 2

	fab := &s.Fabrics[s.FabricOf[t]]
	ew, ef, g, nu := fab.WarpModulus, fab.WeftModulus, fab.ShearModulus, fab.PoissonWarpWeft
	// Compliance first: strain in weft by warp stress is −ν_wf/E_w.
	e.inv = [3][3]float64{{1 / ew, -nu / ew, 0}, {-nu / ew, 1 / ef, 0}, {0, 0, 1 / g}}
	q := e.inv[0][0]*e.inv[1][1] - e.inv[0][1]*e.inv[0][1]
	if !(q > 0) || !(ew > 0) || !(ef > 0) || !(g > 0) {
		return e, false
	}
	e.c = [3][3]float64{{e.inv[1][1] / q, -e.inv[0][1] / q, 0}, {-e.inv[0][1] / q, e.inv[0][0] / q, 0}, {0, 0, g}}
	e.s0 = [3]float64{s.Stress[t][0], s.Stress[t][1], 0}
	for k, i := range t3 {
		e.x[k] = c.x[i]
	}
	return e, true
}

// images are where the unit warp and weft vectors go.
func (e *elasticTri) images(x *[3]r3.Vec) (w, f r3.Vec) {
	u, v := r3.Sub(x[1], x[0]), r3.Sub(x[2], x[0])
	w = r3.Add(r3.Scale(e.grad[1][0], u), r3.Scale(e.grad[2][0], v))
	f = r3.Add(r3.Scale(e.grad[1][1], u), r3.Scale(e.grad[2][1], v))
	return w, f
}

func (e *elasticTri) strain(x *[3]r3.Vec) [3]float64 {
	w, f := e.images(x)
	return [3]float64{(r3.Dot(w, w) - 1) / 2, (r3.Dot(f, f) - 1) / 2, r3.Dot(w, f)}
}

func times(m *[3][3]float64, v [3]float64) (r [3]float64) {
	for i := range 3 {
		r[i] = m[i][0]*v[0] + m[i][1]*v[1] + m[i][2]*v[2]
	}
	return r
}

// trial is the stress without wrinkles.
func (e *elasticTri) trial(x *[3]r3.Vec) [3]float64 {
	s := times(&e.c, e.strain(x))
	for i := range 3 {
		s[i] += e.s0[i]
	}
	return s
}

func tensile(s [3]float64) bool {
	return s[0] >= 0 && s[1] >= 0 && s[0]*s[1] >= s[2]*s[2]
}

// pull is the force at each corner for the stress s: −A₀·F·S·∇φ.
func (e *elasticTri) pull(x *[3]r3.Vec, s [3]float64) (p [3]r3.Vec) {
	w, f := e.images(x)
	for i, g := range e.grad {
		a := s[0]*g[0] + s[2]*g[1]
		b := s[2]*g[0] + s[1]*g[1]
		p[i] = r3.Scale(-e.area, r3.Add(r3.Scale(a, w), r3.Scale(b, f)))
	}
	return p
}

// pulledBack turns a reported true stress in the axes warp and normal × warp
// of the deformed triangle into S on the unstressed one: S = J·F⁻¹·σ·F⁻ᵀ.
func (e *elasticTri) pulledBack(st canopy.Stress, warp r3.Vec) (s [3]float64, ok bool) {
	w, f := e.images(&e.x)
	n := r3.Cross(w, f)
	j := norm(n)
	if !(j > 0) {
		return s, false
	}
	n = r3.Scale(1/j, n)
	u := r3.Sub(warp, r3.Scale(r3.Dot(warp, n), n))
	if !(norm(u) > 0) {
		return s, false
	}
	u = r3.Unit(u)
	v := r3.Cross(n, u)
	// F in the axes u, v, its columns the images of warp and weft.
	a, b, c, d := r3.Dot(w, u), r3.Dot(f, u), r3.Dot(w, v), r3.Dot(f, v)
	det := a*d - b*c
	ia, ib, ic, id := d/det, -b/det, -c/det, a/det // F⁻¹
	// rows of F⁻¹·σ
	p, q := ia*st.Warp+ib*st.Shear, ia*st.Shear+ib*st.Weft
	r, t := ic*st.Warp+id*st.Shear, ic*st.Shear+id*st.Weft
	return [3]float64{j * (p*ia + q*ib), j * (r*ic + t*id), j * (p*ic + q*id)}, true
}

// misfit says how far a reported stress is from its law, in N/m. Taut fabric
// must carry the trial stress. Otherwise the stress must be the one at which
// the energy is least over all wrinkle strains E_w ⪰ 0, that is
// E_w = C⁻¹(S − S₀) − E ⪰ 0, S ⪰ 0 and S:E_w = 0, the conditions of the mixed
// criterion (Roddeman, Drukker, Oomens & Janssen, J. Appl. Mech. 54, 1987);
// they are checked instead of solving for S again. noise is the misfit for one
// metre of error in the positions.
func (e *elasticTri) misfit(st canopy.Stress, warp r3.Vec) (d, scale, noise float64) {
	stiff := max(e.c[0][0], e.c[1][1], e.c[2][2])
	noise = stiff / math.Sqrt(e.area)
	scale = max(math.Abs(e.s0[0]), math.Abs(e.s0[1]), math.Abs(st.Warp), math.Abs(st.Weft), 1e-6*stiff)
	s, ok := e.pulledBack(st, warp)
	if !ok {
		return scale, scale, noise
	}
	t := e.trial(&e.x)
	if tensile(t) {
		return max(math.Abs(s[0]-t[0]), math.Abs(s[1]-t[1]), math.Abs(s[2]-t[2])), scale, noise
	}
	diff := [3]float64{s[0] - e.s0[0], s[1] - e.s0[1], s[2] - e.s0[2]}
	el := times(&e.inv, diff)
	now := e.strain(&e.x)
	w := [3]float64{el[0] - now[0], el[1] - now[1], el[2] - now[2]} // third is twice the shear
	least := func(a, b, c float64) float64 { return (a+b)/2 - math.Hypot((a-b)/2, c) }
	// Compression in S, stretching wrinkles, and work in wrinkles, each as a
	// stress.
	d = max(0, -least(s[0], s[1], s[2]))
	d = max(d, -stiff*least(w[0], w[1], w[2]/2))
	size := max(math.Abs(s[0]), math.Abs(s[1]), math.Abs(s[2]))
	if size > 0 {
		d = max(d, stiff*math.Abs(s[0]*w[0]+s[1]*w[1]+s[2]*w[2])/size)
	}
	return d, scale, noise
}
