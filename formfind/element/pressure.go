package element

import "gonum.org/v1/gonum/spatial/r3"

// PressurePush returns the force of a pressure p (N/m²) acting towards the
// positive side on each node of a facet: a third of p times its vector area.
// On a closed surface the forces add up to p·∂V/∂x, with V the enclosed volume.
func (t *Triangle) PressurePush(p float64) r3.Vec {
	return r3.Scale(p*t.Area/3, t.Normal)
}

// PressureTangent is minus the derivative of [Triangle.PressurePush] by the
// place of node j, the same for each of the three nodes: −(p/6)[eⱼ]ₓ. The
// pressure follows the facet, so that the facet's own tangent is not
// symmetric; the sum over a closed surface, or over one with a fixed boundary,
// is.
func (t *Triangle) PressureTangent(p float64, j int) Block {
	return Skew(-p/6, t.Edge[j])
}

// Volume is the facet's share of the volume behind it: the signed volume of
// the tetrahedron of its corners and the origin point o. The sum over a closed
// surface does not depend on o; choose o near the surface.
func Volume(o, x0, x1, x2 r3.Vec) float64 {
	return r3.Dot(r3.Sub(x0, o), r3.Cross(r3.Sub(x1, o), r3.Sub(x2, o))) / 6
}
