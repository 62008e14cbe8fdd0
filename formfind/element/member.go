package element

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// Line returns the unit direction from a to b and the distance. ok is false
// when the two coincide or the distance is not finite.
func Line(a, b r3.Vec) (t r3.Vec, length float64, ok bool) {
	d := r3.Sub(b, a)
	length = math.Sqrt(d.X*d.X + d.Y*d.Y + d.Z*d.Z)
	if !(length > 0) || math.IsInf(length, 1) {
		return r3.Vec{}, length, false
	}
	return r3.Scale(1/length, d), length, true
}

// Tension is the state of a straight member: its force, how the force grows
// with its length, and its energy.
type Tension struct {
	Force     float64 // T, N
	Stiffness float64 // k = dT/dL, N/m
	Energy    float64 // ∫T dL, N·m, up to a constant
	Slack     bool    // an elastic member that may not push and is too long for its ends
}

// GivenDensity is a member of force density q in N/m (Schek 1974): T = qL.
func GivenDensity(q, length float64) Tension {
	return Tension{Force: q * length, Stiffness: q, Energy: 0.5 * q * length * length}
}

// GivenForce is a member whose force in N does not depend on its length.
func GivenForce(force, length float64) Tension {
	return Tension{Force: force, Energy: force * length}
}

// Elastic is a member of stiffness ea = EA in N and unstressed length in m:
// T = EA·(L − L₀)/L₀. Unless it pushes it is slack when shorter than L₀.
func Elastic(ea, unstressed, length float64, pushes bool) Tension {
	stretch := length - unstressed
	if stretch < 0 && !pushes {
		return Tension{Slack: true}
	}
	k := ea / unstressed
	return Tension{Force: k * stretch, Stiffness: k, Energy: 0.5 * k * stretch * stretch}
}

// MemberTangent is the tangent of a member with unit direction t:
// K = (T/L)(I − t·tᵀ) + k·t·tᵀ. The four blocks of its two ends are K on the
// diagonal and −K off it.
func MemberTangent(t r3.Vec, length float64, m Tension) Block {
	g := m.Force / length
	b := Outer(m.Stiffness-g, t, t)
	b[0] += g
	b[4] += g
	b[8] += g
	return b
}
