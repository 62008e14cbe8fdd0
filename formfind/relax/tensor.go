package relax

import "gonum.org/v1/gonum/spatial/r3"

// Masses with directions.
//
// An elastic cable or sheet resists stretching a thousand times more than
// moving across itself. One mass for all directions, as the stiffest asks for,
// makes the motion across itself slow; so nodes of elastic elements get a mass
// tensor: the stiffness bound along members and in the plane of fabric, and
// across them a lighter one, at least 1/contrast of it. Element by element the
// bound of refresh holds for tensors too. As the directions turn with the
// shape, the contrast is raised only as the canopy comes to rest.

// symmetric is a symmetric 3×3 matrix: xx, yy, zz, xy, yz, zx.
type symmetric [6]float64

// addLine adds a·t·tᵀ + b·(I − t·tᵀ) with t a unit vector.
func (m *symmetric) addLine(t r3.Vec, a, b float64) {
	c := a - b
	m[0] += b + c*t.X*t.X
	m[1] += b + c*t.Y*t.Y
	m[2] += b + c*t.Z*t.Z
	m[3] += c * t.X * t.Y
	m[4] += c * t.Y * t.Z
	m[5] += c * t.Z * t.X
}

func (m *symmetric) mul(v r3.Vec) r3.Vec {
	return r3.Vec{
		X: m[0]*v.X + m[3]*v.Y + m[5]*v.Z,
		Y: m[3]*v.X + m[1]*v.Y + m[4]*v.Z,
		Z: m[5]*v.X + m[4]*v.Y + m[2]*v.Z,
	}
}

// inverse returns the inverse of a positive definite matrix; false if it is none.
func (m *symmetric) inverse() (symmetric, bool) {
	a, b, c, d, e, f := m[0], m[1], m[2], m[3], m[4], m[5]
	x := b*c - e*e
	y := e*f - d*c
	z := d*e - b*f
	det := a*x + d*y + f*z
	if !(a > 0 && a*b-d*d > 0 && det > 0) {
		return symmetric{}, false
	}
	s := 1 / det
	return symmetric{s * x, s * (a*c - f*f), s * (a*b - d*d), s * y, s * (d*f - a*e), s * z}, true
}

// directed is the mass of a node of elastic elements.
type directed struct {
	mass, inverse symmetric
	used          bool
}

// direct finds the mass tensor of node i, whose bound for all directions is
// stiff.
func (st *state) direct(i int, stiff float64) {
	d := &st.directed[i]
	d.used = false
	if st.mode[i] != every || st.contrast <= 1 {
		return
	}
	var m symmetric
	found := 0.0 // bound of the elements that are given directions
	x := st.x
	for _, l := range st.links[st.linkAt[i]:st.linkAt[i+1]] {
		if st.law[l.member] != byStretch {
			continue
		}
		k := st.given[l.member]
		q := st.q[l.member]
		if q > k || q < 0 {
			continue // a strut, or not a small strain
		}
		m.addLine(unit(r3.Sub(x[l.other], x[i])), k, max(q, k/st.contrast))
		found += k
	}
	for _, c := range st.around[st.cornerSplit[i]:st.cornerAt[i+1]] {
		t := int(c.at >> 2)
		if st.triLaw[t] != elastic {
			continue
		}
		k := st.elasticStiffness(t, int(c.at&3), [3]r3.Vec{x[st.corners[t][0]], x[st.corners[t][1]], x[st.corners[t][2]]})
		m.addLine(unit(st.facets[t].twice), k/st.contrast, k)
		found += k
	}
	if found == 0 {
		return
	}
	// All else resists in all directions; rounding must not make it negative.
	rest := max(stiff-found, 1e-9*stiff)
	for k := range 3 {
		m[k] += rest
		if !st.free[i].Has(k) {
			for _, o := range [3][2]int{{3, 5}, {3, 4}, {4, 5}}[k] {
				m[o] = 0
			}
		}
	}
	for k := range m {
		m[k] *= 0.5 * st.safety
	}
	if inv, ok := m.inverse(); ok {
		*d = directed{m, inv, true}
	}
}
