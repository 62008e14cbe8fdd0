package formfind

import (
	"context"
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/mesh"
	"anticlast/formfind/newton"
)

// Limits are met on the coarsest mesh, where a walk costs little, and then on one
// finer mesh after the other: each starts a little before the limit of the mesh
// below and walks on. Limits of two meshes differ by the order of the mesh size
// squared, each time by a quarter of the difference before, so that a few steps do,
// and nothing is taken from the coarse mesh but the place to start: where the fine
// one has a shape the walk arrives at it.

// narrow carries the limit met on the coarse mesh of the first refinement up to the
// last. It returns how many refinements up a walk arrived at the model, with the
// shape there; or none and the limit met on the last mesh; or neither when no walk
// could start.
func narrow(ctx context.Context, steps []*mesh.Refinement, coarse *canopy.Structure, met *stand, o Options) (up int, shape *canopy.Form, limit *NoEquilibriumError, err error) {
	_, below := nearOrigin(coarse)
	back := farBack
	for k, r := range steps {
		local, origin := nearOrigin(r.Fine)
		o.level = fmt.Sprintf("narrowing the limit on %d triangles", len(local.Corners))
		c := &chain{s: local, o: o}
		form := *met.form
		form.Position = moved(form.Position, r3.Sub(below, origin))
		done, found, err := c.resume(ctx, r, &stand{met.way, met.at, &form}, back)
		if err != nil {
			return 0, nil, nil, err
		}
		if done {
			backFrom(r.Fine, c.f, origin)
			return k + 1, c.f, nil, nil
		}
		if found == nil || found.met == nil {
			return 0, nil, nil, nil
		}
		back = min(farBack, max(4*walkPrecision, 2*math.Abs(found.met.at-met.at)))
		met, limit, below = found.met, found, origin
		limit.Tried = append(limit.Tried, c.did...)
	}
	return 0, nil, limit, nil
}

// farBack is how far before a limit a walk on a finer mesh starts when nothing is
// known of how limits change with the mesh: those of 300 triangles are within 4 %.
const farBack = 0.05

// resume walks on in the finer mesh of a refinement from where a walk stands in its
// coarse one, going back first.
func (c *chain) resume(ctx context.Context, r *mesh.Refinement, from *stand, back float64) (bool, *NoEquilibriumError, error) {
	for _, w := range ways(c.s) {
		if w.name != from.way {
			continue
		}
		s := copyForWalk(c.s)
		w.set(s, c.s, from.at)
		at := *r
		at.Fine = s
		form := at.Prolong(from.form)
		solver, err := newton.New(ctx, s)
		if err != nil {
			return false, nil, fmt.Errorf("newton: %w", err)
		}
		c.stage("newton", "walking the boundary: "+w.name)
		least := min(nearCollapse/4, smallestAngle(form.Position, s.Corners)/3)
		for ; back < 1; back *= 4 {
			t := from.at - back
			if t <= 0 {
				break
			}
			w.set(s, c.s, t)
			f, err := c.foothold(ctx, solver, s, form, least)
			if err != nil {
				return false, nil, err
			}
			if f != nil {
				return c.reach(ctx, w, s, stand{w.name, t, f}, back)
			}
		}
	}
	return false, nil, nil
}
