package element

import "math"

// Tension-only fabric as a relaxed energy.
//
// Wrinkles let the surface shorten without stress: the energy is the least of
// W(E + E_w) over all wrinkle strains E_w ⪰ 0. Its conjugate is the largest of
// S:E − ½ S:C⁻¹:S over all tensile stresses S ⪰ 0, so the stress is
//   - S = C·E where that is tensile (taut),
//   - zero where no principal value of E is positive (slack),
//   - else uniaxial, S = (a/b)·t⊗t with a = tᵀEt, b = (t⊗t):C⁻¹:(t⊗t) and the
//     direction t for which a²/b is greatest (wrinkled).
//
// Those are the cases of the mixed stress-strain criterion (Roddeman, Drukker,
// Oomens & Janssen, J. Appl. Mech. 54, 1987). E is counted from the state
// without stress.

// uniaxialState is the stress field of wrinkled fabric.
type uniaxialState struct {
	m    [3]float64 // t⊗t as (cos², sin², sin·cos)
	a, b float64
	k    [3]float64 // d/dθ of (a/b)·m
	htt  float64    // second derivative of ½a²/b along θ, negative at the maximum
}

func (u *uniaxialState) stress() [3]float64 {
	s := u.a / u.b
	return [3]float64{s * u.m[0], s * u.m[1], s * u.m[2]}
}

// addTangent adds the derivative of the stress: the direction follows the
// strain so that a²/b stays greatest, dθ/dE = −k/htt.
func (u *uniaxialState) addTangent(d *[3][3]float64) {
	for i := range 3 {
		for j := range 3 {
			d[i][j] += u.m[i] * u.m[j] / u.b
			if u.htt < 0 {
				d[i][j] -= u.k[i] * u.k[j] / u.htt
			}
		}
	}
}

// directions is the number of directions sampled before the search is refined.
// a²/b has at most two maxima in half a turn, at least 180°/4 apart for all
// but absurd moduli; 24 samples are 7.5° apart.
const directions = 24

var sampled = func() (m [directions][3]float64) {
	for i := range m {
		s, c := math.Sincos(math.Pi * float64(i) / directions)
		m[i] = [3]float64{c * c, s * s, s * c}
	}
	return m
}()

// uniaxial returns the wrinkled state at strain h, false when the fabric is
// slack there.
func (l *FabricLaw) uniaxial(h [3]float64) (uniaxialState, bool) {
	// Largest principal strain; not a number counts as slack.
	if !((h[0]+h[1])/2+math.Hypot((h[0]-h[1])/2, h[2]/2) > 0) {
		return uniaxialState{}, false
	}
	// The principal direction of h is a sample too: near the onset of slackness
	// a > 0 only in a narrow fan around it.
	theta := math.Atan2(h[2], h[0]-h[1]) / 2
	best := l.value(h, theta)
	for i, m := range sampled {
		a := m[0]*h[0] + m[1]*h[1] + m[2]*h[2]
		if a <= 0 {
			continue
		}
		if v := a * a / l.quadratic(m, m); v > best {
			best, theta = v, math.Pi*float64(i)/directions
		}
	}
	// Newton on the derivative, kept inside the bracket of the neighbouring
	// samples by bisection.
	lo, hi := theta-math.Pi/directions, theta+math.Pi/directions
	var u uniaxialState
	for range 60 {
		var ht float64
		u, ht = l.derivatives(h, theta)
		// Outside the fan of tension the value grows away from it: turn round.
		if (ht > 0) == (u.a > 0) {
			lo = theta
		} else {
			hi = theta
		}
		next := theta - ht/u.htt
		newton := u.a > 0 && u.htt < 0 && next > lo && next < hi
		if !newton {
			next = (lo + hi) / 2
		}
		step := math.Abs(next - theta)
		theta = next
		// A Newton step of 1e-9 leaves an error of the order of its square.
		if newton && step <= 1e-9 || step <= 1e-15 {
			break
		}
	}
	u, _ = l.derivatives(h, theta)
	if !(u.a > 0) || math.IsInf(u.a, 0) {
		return uniaxialState{}, false
	}
	return u, true
}

func (l *FabricLaw) value(h [3]float64, theta float64) float64 {
	s, c := math.Sincos(theta)
	m := [3]float64{c * c, s * s, s * c}
	a := m[0]*h[0] + m[1]*h[1] + m[2]*h[2]
	if a <= 0 {
		return 0
	}
	return a * a / l.quadratic(m, m)
}

// quadratic is uᵀ·C⁻¹·v; in the axes of the fabric no stress in warp or weft
// causes shear.
func (l *FabricLaw) quadratic(u, v [3]float64) float64 {
	return u[0]*(l.Inverse[0][0]*v[0]+l.Inverse[0][1]*v[1]) +
		u[1]*(l.Inverse[1][0]*v[0]+l.Inverse[1][1]*v[1]) + u[2]*l.Inverse[2][2]*v[2]
}

// derivatives returns the uniaxial state at the direction theta and the first
// derivative of ½a²/b along theta.
func (l *FabricLaw) derivatives(h [3]float64, theta float64) (uniaxialState, float64) {
	s, c := math.Sincos(theta)
	s2, c2 := 2*s*c, c*c-s*s
	m := [3]float64{c * c, s * s, s * c}
	m1 := [3]float64{-s2, s2, c2}
	m2 := [3]float64{-2 * c2, 2 * c2, -2 * s2}
	dot := func(u [3]float64) float64 { return u[0]*h[0] + u[1]*h[1] + u[2]*h[2] }
	a, a1, a2 := dot(m), dot(m1), dot(m2)
	b, b1 := l.quadratic(m, m), 2*l.quadratic(m, m1)
	b2 := 2*l.quadratic(m1, m1) + 2*l.quadratic(m, m2)
	r := a / b // stress; r1 its derivative
	r1 := (a1 - r*b1) / b
	u := uniaxialState{m: m, a: a, b: b}
	for i := range 3 {
		u.k[i] = r1*m[i] + r*m1[i]
	}
	// h = ½a²/b: h' = r·a1 − ½r²·b1, h'' = r1·a1 + r·a2 − r·r1·b1 − ½r²·b2.
	u.htt = r1*a1 + r*a2 - r*r1*b1 - r*r*b2/2
	return u, r*a1 - r*r*b1/2
}
