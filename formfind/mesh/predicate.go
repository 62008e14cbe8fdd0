package mesh

import (
	"math"
	"math/big"
)

// xy is a point of the plane.
type xy struct{ x, y float64 }

// Half of the spacing of float64 numbers at 1.
const unit = 0x1p-53

// Error bounds of the two predicates below, in the manner of Shewchuk (Adaptive
// Precision Floating-Point Arithmetic and Fast Robust Geometric Predicates, 1997).
// Each difference, product and sum is rounded with a relative error of at most
// ε = 2⁻⁵³; hats mark what is computed, so that x̂ = x(1+δ), |δ| ≤ ε.
//
// orient: det = l − r with l = (ax−cx)(by−cy) and r alike. A product is of two
// rounded differences and is rounded itself: l̂ = l(1+δ)³, and so
// |l| ≤ |l̂|/(1−ε)³. Therefore
//
//	|l̂ − r̂ − det| ≤ ((1+ε)³ − 1)(|l| + |r|) ≤ (3ε + 7ε²)(|l̂| + |r̂|);
//
// the last difference adds ε·|l̂ − r̂| ≤ ε(|l̂| + |r̂|), and the sum of sizes is
// computed with one rounding: (4ε + 12ε²)(1+ε)² < 4.01ε bounds the error
// relative to what is computed. 6ε is used.
//
// inCircle: det = Σ lift·minor over three terms.
//
//	lift = x² + y²: (1+δ)³ for each square of a difference and one for the sum: (1+δ)⁴
//	minor = s − t:  (1+δ)³ for each product, one for the difference, relative to
//	                |s| + |t|: (1+δ)⁴
//	term:           (1+δ)⁹ with the product
//	sum of three:   two more at most: (1+δ)¹¹
//
// all relative to size = Σ lift(|s| + |t|), which is computed with as many
// roundings, all of positive numbers: |error| ≤ ((1+ε)¹¹ − 1)·size ≤
// ((1+ε)¹¹ − 1)/(1−ε)¹¹·sizê < 11.01ε·sizê. 16ε is used.
//
// All this holds while nothing underflows: a product below 2⁻¹⁰²² has an
// absolute error of up to 2⁻¹⁰⁷⁵, times a lifted length or not. tiny covers it
// for coordinates up to 10⁵⁰.
const (
	orientBound   = 6 * unit
	inCircleBound = 16 * unit
	tiny          = 0x1p-500
)

// orient is positive when a, b, c turn counter-clockwise, negative when
// clockwise, zero when on a line. The sign is exact.
func orient(a, b, c xy) float64 {
	l := float64((a.x - c.x) * (b.y - c.y))
	r := float64((a.y - c.y) * (b.x - c.x))
	det := l - r
	if bound := orientBound*(math.Abs(l)+math.Abs(r)) + tiny; det > bound || -det > bound {
		return det
	}
	if expandable(a, b, c) {
		return float64(expandedOrient(a, b, c))
	}
	return float64(exactOrient(a, b, c))
}

// inCircle is positive when d lies inside the circle through a, b, c, which
// turn counter-clockwise; negative when outside. The sign is exact.
func inCircle(a, b, c, d xy) float64 {
	adx, ady := a.x-d.x, a.y-d.y
	bdx, bdy := b.x-d.x, b.y-d.y
	cdx, cdy := c.x-d.x, c.y-d.y
	bc, cb := float64(bdx*cdy), float64(cdx*bdy)
	ca, ac := float64(cdx*ady), float64(adx*cdy)
	ab, ba := float64(adx*bdy), float64(bdx*ady)
	al := float64(adx*adx) + float64(ady*ady)
	bl := float64(bdx*bdx) + float64(bdy*bdy)
	cl := float64(cdx*cdx) + float64(cdy*cdy)
	det := float64(al*(bc-cb)) + float64(bl*(ca-ac)) + float64(cl*(ab-ba))
	size := float64(al*(math.Abs(bc)+math.Abs(cb))) + float64(bl*(math.Abs(ca)+math.Abs(ac))) + float64(cl*(math.Abs(ab)+math.Abs(ba)))
	if bound := inCircleBound*size + tiny; det > bound || -det > bound {
		return det
	}
	if expandable(a, b, c, d) {
		return float64(expandedInCircle(a, b, c, d))
	}
	return float64(exactInCircle(a, b, c, d))
}

// The same with rational numbers of any size, for coordinates out of the range of
// expansions.

func rat(v float64) *big.Rat { return new(big.Rat).SetFloat64(v) }

func sub(a, b *big.Rat) *big.Rat { return new(big.Rat).Sub(a, b) }
func mul(a, b *big.Rat) *big.Rat { return new(big.Rat).Mul(a, b) }

func exactOrient(a, b, c xy) int {
	cx, cy := rat(c.x), rat(c.y)
	return mul(sub(rat(a.x), cx), sub(rat(b.y), cy)).Cmp(mul(sub(rat(a.y), cy), sub(rat(b.x), cx)))
}

func exactInCircle(a, b, c, d xy) int {
	dx, dy := rat(d.x), rat(d.y)
	ax, ay := sub(rat(a.x), dx), sub(rat(a.y), dy)
	bx, by := sub(rat(b.x), dx), sub(rat(b.y), dy)
	cx, cy := sub(rat(c.x), dx), sub(rat(c.y), dy)
	lift := func(x, y *big.Rat) *big.Rat { return new(big.Rat).Add(mul(x, x), mul(y, y)) }
	det := mul(lift(ax, ay), sub(mul(bx, cy), mul(cx, by)))
	det.Add(det, mul(lift(bx, by), sub(mul(cx, ay), mul(ax, cy))))
	det.Add(det, mul(lift(cx, cy), sub(mul(ax, by), mul(bx, ay))))
	return det.Sign()
}
