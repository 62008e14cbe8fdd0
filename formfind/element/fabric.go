package element

import (
	"fmt"
	"math"
)

// Orthotropic is the linear plane-stress law of a woven fabric in its own
// axes, warp and weft. All moduli are in N/m of width.
//
//	ε_warp = N_warp/Warp − ν_fw·N_weft/Weft
//	ε_weft = N_weft/Weft − ν_wf·N_warp/Warp
//	γ      = N_shear/Shear
//
// PoissonWarpWeft is ν_wf, the contraction in weft caused by stress in warp;
// symmetry of the energy then asks for ν_fw = ν_wf·Weft/Warp (Lekhnitskii,
// Anisotropic Plates).
type Orthotropic struct {
	Warp, Weft, Shear float64
	PoissonWarpWeft   float64
}

// Check says what is wrong with the moduli, nil when the law has a positive
// energy: positive finite moduli and ν_wf² < Warp/Weft.
func (o Orthotropic) Check() error {
	for _, m := range []struct {
		name  string
		value float64
	}{{"warp", o.Warp}, {"weft", o.Weft}, {"shear", o.Shear}} {
		if !(m.value > 0) || math.IsInf(m.value, 0) {
			return fmt.Errorf("%s modulus of fabric must be positive, got %g N/m", m.name, m.value)
		}
	}
	nu := o.PoissonWarpWeft
	if d := 1 - nu*nu*o.Weft/o.Warp; !(d > 0) || math.IsNaN(nu) {
		return fmt.Errorf("the Poisson ratio %g of fabric (weft contraction under warp stress) must be smaller in size than √(warp/weft modulus) = %.4g",
			nu, math.Sqrt(o.Warp/o.Weft))
	}
	return nil
}

// Stiffness returns C, 3×3, of N = C·ε with N = (warp, weft, shear) in N/m and
// ε = (ε_warp, ε_weft, γ). The law must have passed [Orthotropic.Check].
func (o Orthotropic) Stiffness() [3][3]float64 {
	nu := o.PoissonWarpWeft
	nuBack := nu * o.Weft / o.Warp
	d := 1 - nu*nuBack
	return [3][3]float64{
		{o.Warp / d, nu * o.Weft / d, 0},
		{nu * o.Weft / d, o.Weft / d, 0},
		{0, 0, o.Shear},
	}
}

// Compliance returns the inverse of [Orthotropic.Stiffness], 3×3, in m/N.
func (o Orthotropic) Compliance() [3][3]float64 {
	return [3][3]float64{
		{1 / o.Warp, -o.PoissonWarpWeft / o.Warp, 0},
		{-o.PoissonWarpWeft / o.Warp, 1 / o.Weft, 0},
		{0, 0, 1 / o.Shear},
	}
}

// TurnStiffness returns the plane-stress stiffness c, given in axes (1, 2), in
// axes (x, y) such that axis 1 lies at the angle (rad) from x towards y.
// Strains are (ε_x, ε_y, γ_xy), so that c_xy = Rᵀ·c·R with R the map of
// engineering strain from (x, y) to (1, 2).
func TurnStiffness(c [3][3]float64, angle float64) [3][3]float64 {
	s, k := math.Sincos(angle)
	r := [3][3]float64{
		{k * k, s * s, s * k},
		{s * s, k * k, -s * k},
		{-2 * s * k, 2 * s * k, k*k - s*s},
	}
	var cr, out [3][3]float64
	for i := range 3 {
		for j := range 3 {
			for l := range 3 {
				cr[i][j] += c[i][l] * r[l][j]
			}
		}
	}
	for i := range 3 {
		for j := range 3 {
			for l := range 3 {
				out[i][j] += r[l][i] * cr[l][j]
			}
		}
	}
	return out
}

// FabricState says how a piece of elastic fabric carries its load.
type FabricState uint8

// States of elastic fabric.
const (
	Taut     FabricState = iota // tension in every direction
	Wrinkled                    // tension in one direction, folds along it
	Slack                       // no stress
)

var fabricStateNames = [...]string{"taut", "wrinkled", "slack"}

func (s FabricState) String() string { return fabricStateNames[s] }

// FabricLaw is the stress of elastic fabric: S = S₀ + C·E with E the strain of
// Green and S the second stress of Piola and Kirchhoff, in warp and weft axes
// of the unstressed fabric; with TensionOnly, wrinkling takes away what would
// be compression.
type FabricLaw struct {
	C, Inverse  [3][3]float64
	TensionOnly bool
}

// NewFabricLaw checks the moduli and prepares the law.
func NewFabricLaw(o Orthotropic, tensionOnly bool) (FabricLaw, error) {
	if err := o.Check(); err != nil {
		return FabricLaw{}, err
	}
	return FabricLaw{C: o.Stiffness(), Inverse: o.Compliance(), TensionOnly: tensionOnly}, nil
}

// Bound returns the largest stress per unit of strain in any mode of strain,
// N/m: the largest eigenvalue of C with strain and stress measured by the
// Euclidean norm of their tensors. It bounds what a node feels when it moves.
func (l *FabricLaw) Bound() float64 {
	a, b, c := l.C[0][0], l.C[0][1], l.C[1][1]
	return max((a+c)/2+math.Hypot((a-c)/2, b), 2*l.C[2][2])
}

// Stress returns the stress S (warp, weft, shear; N/m) for the prestress s0 in
// the unstrained fabric and the strain e = (E_warp, E_weft, 2·E_shear).
func (l *FabricLaw) Stress(s0, e [3]float64) ([3]float64, FabricState) {
	s := l.trial(s0, e)
	if !l.TensionOnly || tensile(s) {
		return s, Taut
	}
	h := l.shifted(s0, e)
	t, ok := l.uniaxial(h)
	if !ok {
		return [3]float64{}, Slack
	}
	return t.stress(), Wrinkled
}

// Energy returns the strain energy in J/m² of unstressed fabric, of which
// [FabricLaw.Stress] is the gradient; zero where fabric is slack, and without
// TensionOnly the energy above the one at which S would vanish.
func (l *FabricLaw) Energy(s0, e [3]float64) float64 {
	h := l.shifted(s0, e)
	s := l.trial(s0, e)
	if !l.TensionOnly || tensile(s) {
		return (s[0]*h[0] + s[1]*h[1] + s[2]*h[2]) / 2
	}
	t, ok := l.uniaxial(h)
	if !ok {
		return 0
	}
	return t.a * t.a / t.b / 2
}

// SoftTangent is the share of the taut stiffness that [FabricLaw.Tangent]
// leaves to wrinkled and slack fabric, so that a factorisation does not meet a
// node without any stiffness. It does not change the stress.
const SoftTangent = 1e-7

// Tangent returns the stress and its derivative D = ∂S/∂e, 3×3, symmetric and
// positive semidefinite, with [SoftTangent]·C added where fabric is wrinkled
// or slack.
func (l *FabricLaw) Tangent(s0, e [3]float64) (s [3]float64, d [3][3]float64, state FabricState) {
	s = l.trial(s0, e)
	if !l.TensionOnly || tensile(s) {
		return s, l.C, Taut
	}
	for i := range 3 {
		for j := range 3 {
			d[i][j] = SoftTangent * l.C[i][j]
		}
	}
	t, ok := l.uniaxial(l.shifted(s0, e))
	if !ok {
		return [3]float64{}, d, Slack
	}
	t.addTangent(&d)
	return t.stress(), d, Wrinkled
}

func (l *FabricLaw) trial(s0, e [3]float64) [3]float64 {
	return [3]float64{
		s0[0] + l.C[0][0]*e[0] + l.C[0][1]*e[1] + l.C[0][2]*e[2],
		s0[1] + l.C[1][0]*e[0] + l.C[1][1]*e[1] + l.C[1][2]*e[2],
		s0[2] + l.C[2][0]*e[0] + l.C[2][1]*e[1] + l.C[2][2]*e[2],
	}
}

// shifted returns the strain measured from the state without stress, e + C⁻¹·s0.
func (l *FabricLaw) shifted(s0, e [3]float64) [3]float64 {
	for i := range 3 {
		e[i] += l.Inverse[i][0]*s0[0] + l.Inverse[i][1]*s0[1] + l.Inverse[i][2]*s0[2]
	}
	return e
}

// tensile reports whether no direction is in compression.
func tensile(s [3]float64) bool {
	return s[0] >= 0 && s[1] >= 0 && s[0]*s[1] >= s[2]*s[2]
}
