package element

import (
	"errors"

	"gonum.org/v1/gonum/spatial/r3"
)

// ErrFlatTriangle says that a triangle has no area, so that it has no axes.
var ErrFlatTriangle = errors.New("triangle has no area")

// FabricTriangle is a triangle of elastic fabric with constant strain: the
// unstressed area and the gradients of its three shape functions in the axes
// warp (first) and weft (second; normal × warp) of the unstressed triangle.
type FabricTriangle struct {
	Area float64       // m²
	Grad [3][2]float64 // 1/m
}

// NewFabricTriangle prepares the triangle whose corners, unstressed, are at
// ref, counter-clockwise seen from the positive side. The warp direction is
// the projection of warp into its plane. The error is [ErrFlatTriangle] or
// [ErrNormalToWarp].
func NewFabricTriangle(ref [3]r3.Vec, warp r3.Vec) (FabricTriangle, error) {
	g, ok := NewTriangle(ref[0], ref[1], ref[2])
	if !ok {
		return FabricTriangle{}, ErrFlatTriangle
	}
	w, f, err := g.ProjectWarp(warp)
	if err != nil {
		return FabricTriangle{}, err
	}
	t := FabricTriangle{Area: g.Area}
	for i := range 3 {
		h := g.Altitude(i)
		t.Grad[i] = [2]float64{r3.Dot(h, w) / g.Area, r3.Dot(h, f) / g.Area}
	}
	return t, nil
}

// deformation returns the images of the unit warp and weft vectors, the two
// columns of the deformation gradient.
func (t *FabricTriangle) deformation(x *[3]r3.Vec) (w, f r3.Vec) {
	// Gradients add up to zero, so only differences of positions enter.
	a, b := r3.Sub(x[1], x[0]), r3.Sub(x[2], x[0])
	w = r3.Add(r3.Scale(t.Grad[1][0], a), r3.Scale(t.Grad[2][0], b))
	f = r3.Add(r3.Scale(t.Grad[1][1], a), r3.Scale(t.Grad[2][1], b))
	return w, f
}

// Strain returns Green's strain (E_warp, E_weft, 2·E_shear) when the corners
// are at x.
func (t *FabricTriangle) Strain(x *[3]r3.Vec) [3]float64 {
	w, f := t.deformation(x)
	return [3]float64{(r3.Norm2(w) - 1) / 2, (r3.Norm2(f) - 1) / 2, r3.Dot(w, f)}
}

// Densities returns the force densities in N/m of three bars along the sides
// opposite corners 0, 1 and 2 that pull at the corners as the triangle does
// when it carries the second Piola-Kirchhoff stress s (warp, weft, shear; N/m):
// the natural force densities of Pauletti & Pimenta (2008).
func (t *FabricTriangle) Densities(s [3]float64) [3]float64 {
	var q [3]float64
	for k := range 3 {
		g, h := t.Grad[(k+1)%3], t.Grad[(k+2)%3]
		q[k] = -t.Area * (g[0]*(s[0]*h[0]+s[2]*h[1]) + g[1]*(s[2]*h[0]+s[1]*h[1]))
	}
	return q
}

// Pull returns the forces by which the triangle pulls at its corners when they
// are at x and it carries the stress s.
func (t *FabricTriangle) Pull(x *[3]r3.Vec, s [3]float64) [3]r3.Vec {
	q := t.Densities(s)
	var p [3]r3.Vec
	for k := range 3 {
		i, j := (k+1)%3, (k+2)%3
		pull := r3.Scale(q[k], r3.Sub(x[j], x[i]))
		p[i] = r3.Add(p[i], pull)
		p[j] = r3.Sub(p[j], pull)
	}
	return p
}

// Tangent returns the blocks (i, j) of the stiffness, minus the derivative of
// [FabricTriangle.Pull] by the positions, when the stress is s and changes by
// d = ∂s/∂E with strain. The whole is symmetric.
func (t *FabricTriangle) Tangent(x *[3]r3.Vec, s [3]float64, d *[3][3]float64) [3][3]Block {
	w, f := t.deformation(x)
	var b [3][3]r3.Vec // strain component per displacement of node i
	for i, g := range t.Grad {
		b[i] = [3]r3.Vec{
			r3.Scale(g[0], w),
			r3.Scale(g[1], f),
			r3.Add(r3.Scale(g[1], w), r3.Scale(g[0], f)),
		}
	}
	q := t.Densities(s)
	var k [3][3]Block
	for j := range 3 {
		var db [3]r3.Vec // stress component per displacement of node j
		for r := range 3 {
			db[r] = r3.Scale(t.Area, r3.Add(r3.Add(r3.Scale(d[r][0], b[j][0]), r3.Scale(d[r][1], b[j][1])), r3.Scale(d[r][2], b[j][2])))
		}
		for i := range 3 {
			m := &k[i][j]
			for r := range 3 {
				o := Outer(1, b[i][r], db[r])
				m.Add(&o)
			}
			g := q[(i+1)%3] + q[(i+2)%3]
			if i != j {
				g = -q[3-i-j] // the side opposite the third node
			}
			m[0] += g
			m[4] += g
			m[8] += g
		}
	}
	return k
}

// Cauchy turns the stress s on the unstressed triangle into the true stress of
// the triangle with corners at x. It returns the unit warp direction there and
// the stress (warp, weft, shear; N/m of deformed width) in the axes warp and
// normal × warp. A triangle without area gives zeros.
func (t *FabricTriangle) Cauchy(x *[3]r3.Vec, s [3]float64) (r3.Vec, [3]float64) {
	w, f := t.deformation(x)
	n := r3.Cross(w, f)
	j, lw := r3.Norm(n), r3.Norm(w)
	if !(j > 0) || !(lw > 0) {
		return r3.Vec{}, [3]float64{}
	}
	// In the axes u = w/|w| and v = n×u the gradient has the columns (lw, 0)
	// and (f·u, j/lw).
	u := r3.Scale(1/lw, w)
	fu, fv := r3.Dot(f, u), j/lw
	return u, [3]float64{
		(s[0]*lw*lw + 2*s[2]*lw*fu + s[1]*fu*fu) / j,
		s[1] * fv * fv / j,
		(s[2]*lw*fv + s[1]*fu*fv) / j,
	}
}
