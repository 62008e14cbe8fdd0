package mesh

import (
	"math"
	"math/big"
)

// xy is a point of the plane.
type xy struct{ x, y float64 }

// Half of the spacing of float64 numbers at 1.
const unit = 0x1p-53

// Error bounds of the two predicates below relative to the sum of the sizes of
// their products, in the manner of Shewchuk (Adaptive Precision Floating-Point
// Arithmetic and Fast Robust Geometric Predicates, 1997). Each subtraction of
// coordinates, product and sum has a relative error of at most ε = 2⁻⁵³.
//
// orient: det = a·b − c·d with a…d differences of coordinates. Each product is
// of two rounded factors and is rounded itself, (1+ε)³; the last difference
// rounds once more: |error| ≤ ((1+ε)⁴ − 1)(|ab| + |cd|) < (4ε + 7ε²)(…), and
// the sum of the sizes is itself computed with (1+ε)⁴: 4.1ε would do, 8ε is
// used.
//
// inCircle: each of three terms is a lifted length (a sum of two squares,
// (1+ε)⁴) times a 2×2 determinant (1+ε)⁴, rounded, and two more sums: fewer
// than 12 roundings in a row, and as many in the bound: 24ε is used.
const (
	orientBound   = 8 * unit
	inCircleBound = 24 * unit
)

// orient is positive when a, b, c turn counter-clockwise, negative when
// clockwise, zero when on a line. The sign is exact.
func orient(a, b, c xy) float64 {
	l := float64((a.x - c.x) * (b.y - c.y))
	r := float64((a.y - c.y) * (b.x - c.x))
	det := l - r
	if bound := orientBound * (math.Abs(l) + math.Abs(r)); det > bound || -det > bound {
		return det
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
	if bound := inCircleBound * size; det > bound || -det > bound {
		return det
	}
	return float64(exactInCircle(a, b, c, d))
}

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
