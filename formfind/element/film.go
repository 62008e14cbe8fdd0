package element

import (
	"errors"
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// ErrNormalToWarp says that a wanted warp direction is normal to the triangle,
// so that its projection into the triangle is undefined.
var ErrNormalToWarp = errors.New("warp direction is normal to the fabric")

// Triangle is the geometry of a fabric triangle.
type Triangle struct {
	Edge   [3]r3.Vec // eᵢ opposite node i, counter-clockwise, m
	Normal r3.Vec    // unit, towards the positive side
	Area   float64   // m²
}

// NewTriangle takes the corners counter-clockwise. ok is false when the corners
// are on one line (area below 1e-14 of the longest edge squared, the rounding
// of its computation) or not finite.
func NewTriangle(x0, x1, x2 r3.Vec) (t Triangle, ok bool) {
	ok = t.Span(&x0, &x1, &x2)
	return t, ok
}

// Span is NewTriangle in place, for loops over many triangles.
func (t *Triangle) Span(x0, x1, x2 *r3.Vec) (ok bool) {
	e0 := r3.Vec{X: x2.X - x1.X, Y: x2.Y - x1.Y, Z: x2.Z - x1.Z}
	e1 := r3.Vec{X: x0.X - x2.X, Y: x0.Y - x2.Y, Z: x0.Z - x2.Z}
	e2 := r3.Vec{X: x1.X - x0.X, Y: x1.Y - x0.Y, Z: x1.Z - x0.Z}
	l0, l1, l2 := norm2(e0), norm2(e1), norm2(e2)
	// The product of the two shorter edges loses least on needles.
	var a r3.Vec
	longest := l0
	switch {
	case l0 >= l1 && l0 >= l2:
		a = r3.Cross(e1, e2)
	case l1 >= l2:
		longest = l1
		a = r3.Cross(e2, e0)
	default:
		longest = l2
		a = r3.Cross(e0, e1)
	}
	t.Edge[0], t.Edge[1], t.Edge[2] = e0, e1, e2
	twice := math.Sqrt(norm2(a))
	t.Area = 0.5 * twice
	if !(t.Area > 1e-14*longest) || math.IsInf(t.Area, 1) {
		t.Normal = r3.Vec{}
		return false
	}
	f := 1 / twice
	t.Normal = r3.Vec{X: f * a.X, Y: f * a.Y, Z: f * a.Z}
	return true
}

// Altitude returns ½·n × eᵢ, the gradient of the area by the place of node i:
// it points from the opposite edge to node i and is half as long as the edge.
func (t *Triangle) Altitude(i int) r3.Vec {
	return r3.Scale(0.5, r3.Cross(t.Normal, t.Edge[i]))
}

// FilmPull returns the pulls of a uniform stress (N/m, equal in all
// directions): −½σ n × eᵢ, that is −σ ∂A/∂xᵢ. The three add up to zero.
func (t *Triangle) FilmPull(stress float64) [3]r3.Vec {
	n := r3.Scale(-0.5*stress, t.Normal)
	return [3]r3.Vec{r3.Cross(n, t.Edge[0]), r3.Cross(n, t.Edge[1]), r3.Cross(n, t.Edge[2])}
}

// FilmTangent returns the block (i, j) of the second derivative of σ·A,
//
//	σ[(eᵢ·eⱼ)/(4A) n·nᵀ ∓ ½[n]ₓ],
//
// minus for j following i counter-clockwise, plus for j before i, and without
// the second part on the diagonal. It is derived by ∂(½ n×eᵢ)/∂xⱼ with
// dn = (eⱼ × n)(n·dxⱼ)/2A. Rows i, columns j.
func (t *Triangle) FilmTangent(stress float64, i, j int) Block {
	b := Outer(stress*r3.Dot(t.Edge[i], t.Edge[j])/(4*t.Area), t.Normal, t.Normal)
	if i != j {
		half := 0.5 * stress
		if j == (i+1)%3 {
			half = -half
		}
		s := Skew(half, t.Normal)
		b.Add(&s)
	}
	return b
}

// ProjectWarp returns the unit direction in the triangle that is the
// projection of dir, and the weft direction n × warp. The error is
// ErrNormalToWarp when dir is within 1e-6 rad of the normal, zero or not
// finite.
func (t *Triangle) ProjectWarp(dir r3.Vec) (warp, weft r3.Vec, err error) {
	size := math.Sqrt(norm2(dir))
	p := r3.Sub(dir, r3.Scale(r3.Dot(dir, t.Normal), t.Normal))
	// Once more: the first projection leaves a rest of the order of rounding
	// of dir, which matters when dir is nearly normal.
	p = r3.Sub(p, r3.Scale(r3.Dot(p, t.Normal), t.Normal))
	l := math.Sqrt(norm2(p))
	if !(l > 1e-6*size) || math.IsInf(l, 1) {
		return r3.Vec{}, r3.Vec{}, ErrNormalToWarp
	}
	warp = r3.Scale(1/l, p)
	return warp, r3.Cross(t.Normal, warp), nil
}

// StressPull returns the pulls of a Cauchy stress given in the axes warp and
// weft of the triangle (unit, normal to each other and to n), in N/m:
// −½ S·(n × eᵢ) with S the stress tensor. The three add up to zero.
func (t *Triangle) StressPull(warp, weft r3.Vec, sWarp, sWeft, shear float64) [3]r3.Vec {
	var f [3]r3.Vec
	for i := range f {
		h := t.Altitude(i)
		a, b := r3.Dot(h, warp), r3.Dot(h, weft)
		f[i] = r3.Add(r3.Scale(-(sWarp*a+shear*b), warp), r3.Scale(-(shear*a+sWeft*b), weft))
	}
	return f
}

func norm2(v r3.Vec) float64 { return v.X*v.X + v.Y*v.Y + v.Z*v.Z }
