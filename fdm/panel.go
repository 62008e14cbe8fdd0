package fdm

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// PanelStress is the stress a panel carries in a found shape: true (Cauchy)
// stress in N/m of width, in the axes of the deformed triangle.
type PanelStress struct {
	// Warp and Weft are the normal stresses along the two axes.
	Warp, Weft float64
	// Shear between them.
	Shear float64
	// Axis is the unit direction of the warp, which the deformation has
	// carried along with the material; weft is the triangle's normal × Axis.
	Axis r3.Vec
}

// flat is a reference triangle in its own plane: the warp along the first axis,
// the weft along the second.
type flat struct {
	// x and y of the edges opposite corners 0, 1, 2, counter-clockwise.
	x, y [3]float64
	// twice the area
	double float64
}

const (
	// thinnest is the least ratio of twice the area to the square of the
	// longest edge at which a triangle still counts as one. Edge differences
	// of coordinates of the size of the edge have about 16 digits.
	thinnest = 1e-12
	// steepest is the least sine between warp and normal at which the warp of
	// a panel still counts as defined; below it the projection is rounding.
	steepest = 1e-6
)

// lay puts a panel flat in the reference shape x. The text says what is wrong
// with it, "" when nothing is.
func (p *Panel) lay(x []r3.Vec) (f flat, wrong string) {
	a, b, c := x[p.Corners[0]], x[p.Corners[1]], x[p.Corners[2]]
	edge := [3]r3.Vec{r3.Sub(c, b), r3.Sub(a, c), r3.Sub(b, a)}
	normal := r3.Cross(edge[2], edge[0])
	f.double = r3.Norm(normal)
	longest := math.Sqrt(max(r3.Norm2(edge[0]), r3.Norm2(edge[1]), r3.Norm2(edge[2])))
	if !(f.double > thinnest*longest*longest) {
		return f, fmt.Sprintf("its corners lie on one line (area %.3g m², longest edge %.3g m)", f.double/2, longest)
	}
	normal = r3.Scale(1/f.double, normal)
	warp := r3.Sub(p.Warp, r3.Scale(r3.Dot(p.Warp, normal), normal))
	if !(r3.Norm(warp) > steepest*r3.Norm(p.Warp)) {
		if p.WarpStress != p.WeftStress {
			return f, fmt.Sprintf("its warp direction (%g, %g, %g) is normal to it, so that the warp is undefined", p.Warp.X, p.Warp.Y, p.Warp.Z)
		}
		// Equal stresses have no direction: any axes serve to report them.
		warp = edge[2]
	}
	warp = r3.Unit(warp)
	warp = r3.Unit(r3.Sub(warp, r3.Scale(r3.Dot(warp, normal), normal)))
	weft := r3.Cross(normal, warp)
	for i, e := range edge {
		f.x[i], f.y[i] = r3.Dot(e, warp), r3.Dot(e, weft)
	}
	return f, ""
}

// densities are the natural force densities of the edges opposite the three
// corners: −K_ij with K_ij = A ∇φ_i·S∇φ_j, S = diag(warp, weft).
func (f *flat) densities(warp, weft float64) (w [3]float64) {
	for k := range 3 {
		i, j := (k+1)%3, (k+2)%3
		// ∇φ_i = (−y_i, x_i)/2A of the edge opposite i.
		w[k] = -(warp*f.y[i]*f.y[j] + weft*f.x[i]*f.x[j]) / (2 * f.double)
	}
	return w
}

// carry is the Cauchy stress to which the second Piola–Kirchhoff stress
// diag(warp, weft) on the reference triangle f amounts in the triangle with
// corners a, b, c: σ = F·S·Fᵀ/J. The text says what is wrong, "" when nothing
// is.
func (f *flat) carry(warp, weft float64, a, b, c r3.Vec) (s PanelStress, wrong string) {
	e1, e2 := r3.Sub(b, a), r3.Sub(c, a)
	normal := r3.Cross(e1, e2)
	double := r3.Norm(normal)
	longest := math.Sqrt(max(r3.Norm2(e1), r3.Norm2(e2), r3.Norm2(r3.Sub(e2, e1))))
	if !(double > thinnest*longest*longest) {
		return s, fmt.Sprintf("it collapses onto a line (area %.3g m², longest edge %.3g m)", double/2, longest)
	}
	normal = r3.Scale(1/double, normal)
	// Reference corners 1 and 2 seen from corner 0; [f1 f2] = [e1 e2]·P⁻¹.
	p1x, p1y := f.x[2], f.y[2]
	p2x, p2y := -f.x[1], -f.y[1]
	f1 := r3.Scale(1/f.double, r3.Sub(r3.Scale(p2y, e1), r3.Scale(p1y, e2)))
	f2 := r3.Scale(1/f.double, r3.Sub(r3.Scale(p1x, e2), r3.Scale(p2x, e1)))
	stretch := r3.Norm(f1)
	s.Axis = r3.Scale(1/stretch, f1)
	across := r3.Cross(normal, s.Axis)
	along, normalTo := r3.Dot(f2, s.Axis), r3.Dot(f2, across)
	j := stretch * normalTo
	s.Warp = (warp*stretch*stretch + weft*along*along) / j
	s.Weft = weft * normalTo * normalTo / j
	s.Shear = weft * along * normalTo / j
	return s, ""
}

// pulls are the forces by which a stressed triangle acts on its corners a, b,
// c, from the Cauchy stress in edge form: on the corner opposite the edge e,
// −A·σ·∇φ = −½ σ·(n × e), e counter-clockwise.
func (s *PanelStress) pulls(a, b, c r3.Vec) (f [3]r3.Vec) {
	edge := [3]r3.Vec{r3.Sub(c, b), r3.Sub(a, c), r3.Sub(b, a)}
	normal := r3.Unit(r3.Cross(edge[2], edge[0]))
	weft := r3.Cross(normal, s.Axis)
	for k, e := range edge {
		// n × e has the components −e·weft along the warp, e·warp along the weft.
		x, y := -r3.Dot(e, weft), r3.Dot(e, s.Axis)
		f[k] = r3.Add(
			r3.Scale(-0.5*(s.Warp*x+s.Shear*y), s.Axis),
			r3.Scale(-0.5*(s.Shear*x+s.Weft*y), weft))
	}
	return f
}
