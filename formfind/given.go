package formfind

import (
	"context"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/audit"
	"anticlast/formfind/canopy"
	"anticlast/formfind/surface"
)

// nearlyBalanced is the residual in the shape-changing directions below which
// given nodes are taken for a shape someone has found: what the nodes of a
// smooth surface leave on a mesh of ordinary fineness.
const nearlyBalanced = 1e-2

// givenShape looks whether the nodes a structure comes with are an
// equilibrium, but an unstable one. No engine would return it (they go where
// the energy falls), so whoever enters such a shape would get another one
// without a word. It is then taken as what was found, for the audit to refuse.
func (c *chain) givenShape(ctx context.Context) (bool, error) {
	s := c.s
	if len(s.Enclosures) > 0 || !equalStress(s) || normalResidual(s) > nearlyBalanced {
		return false, nil
	}
	f := c.f
	c.f = canopy.NewForm(s)
	for t, w := range s.Stress {
		c.f.Stress[t] = canopy.Stress{Warp: w[0], Weft: w[1]}
	}
	copy(c.f.Force, guessForces(s, s.Position))
	given := c.f
	did := len(c.did)
	if err := c.finish(ctx); err != nil {
		c.f, c.did = f, c.did[:did]
		return false, nil
	}
	stable, err := audit.Stability(ctx, s, c.f, audit.Options{})
	if err != nil {
		return false, err
	}
	if stable.Unstable == 0 {
		c.f, c.did = f, c.did[:did]
		return false, nil
	}
	c.smooth = given
	c.say("the given nodes are already in balance, but unstable; they were kept, for the audit to say so")
	return true, nil
}

// normalResidual is ‖r‖/‖s‖ of the given nodes with the wanted stress, along
// the vertex normals of interior fabric nodes.
func normalResidual(s *canopy.Structure) float64 {
	f := canopy.NewForm(s)
	for t, w := range s.Stress {
		f.Stress[t] = canopy.Stress{Warp: w[0], Weft: w[1]}
		c := s.Corners[t]
		_, n := surface.AreaNormal(f.Position[c[0]], f.Position[c[1]], f.Position[c[2]])
		// Any direction in the plane serves: the stress is the same in all.
		d := r3.Sub(f.Position[c[1]], f.Position[c[0]])
		if d = r3.Sub(d, r3.Scale(r3.Dot(d, n), n)); d != (r3.Vec{}) {
			f.Warp[t] = r3.Unit(d)
		}
	}
	copy(f.Force, guessForces(s, s.Position))
	sum, size := nodalForces(s, f)
	normals := surface.VertexNormals(f.Position, s.Corners)
	rr, ss := 0.0, 0.0
	for i, n := range normals {
		if s.FixedAt(i) != 0 || s.MasterOf(i) >= 0 || n == (r3.Vec{}) {
			continue
		}
		r := r3.Dot(sum[i], n)
		rr += r * r
		ss += size[i] * size[i]
	}
	if ss == 0 {
		return math.Inf(1)
	}
	return math.Sqrt(rr / ss)
}
