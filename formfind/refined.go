package formfind

import (
	"context"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/mesh"
	"anticlast/formfind/newton"
)

const (
	// doubtful is the estimate of discretisation, over the size, from which a
	// surface is looked for on a finer mesh before it is believed. Random canopies
	// that have a shape stay below it from 300 triangles on, with few exceptions;
	// near the last equilibrium the estimate grows, since there the surface answers
	// to a change δ of the boundary by √δ.
	doubtful = 1e-3
	// unsure is the estimate above which a surface is not trusted unless finer meshes
	// confirm it.
	unsure = 2.5e-3
	// A surface without a coarser one to compare it with is refined for an
	// estimate up to this number of triangles, which costs about as much as finding
	// it; a doubtful one up to this other number.
	mostEstimated = 5000
	mostConfirmed = 30000
	// A surface that converges moves by a quarter of the last move when the mesh is
	// refined again; by this share it is still taken to come to rest.
	comesToRest = 0.75
)

// refined compares a surface with the one on the mesh twice as fine. estimate is how
// far it is from the smooth one over the size, NaN when not known. It returns that
// estimate, found by refining where it was not known and still NaN where that would
// cost too much, and whether there is reason to believe in the surface: it is not
// doubtful, or comes to rest on finer meshes. Where a finer mesh has none, though the
// boundary is walked there, the refusal is the error: only the mesh held the shape.
func refined(ctx context.Context, s *canopy.Structure, f *canopy.Form, estimate float64, o Options) (float64, bool, error) {
	n, known := len(s.Corners), !math.IsNaN(estimate)
	switch {
	case known && estimate <= doubtful:
		return estimate, true, nil
	case known && n > mostConfirmed, !known && n > mostEstimated:
		return estimate, false, nil
	}
	r, err := mesh.Refine(s)
	if err != nil {
		return estimate, false, nil // too fine to be refined
	}
	o.level, o.below, o.solver, o.Warm, o.surface = fmt.Sprintf("asking %d triangles", len(r.Fine.Corners)), nil, nil, nil, true
	c := &chain{s: r.Fine, o: o}
	c.stage("newton", "")
	fine, out, err := newton.Engine{}.Find(ctx, r.Fine, r.Prolong(f), c.settings(false))
	if err != nil && ctx.Err() != nil {
		return estimate, false, err
	}
	if err != nil || out.Status != engine.Converged || out.NegativePivots != 0 || unreal(r.Fine, fine) {
		if sheared(s) {
			return estimate, false, nil
		}
		return estimate, false, c.ask(ctx, r, f)
	}
	move := moveOnRefinement(f, fine, r.Fine) / s.Size()
	if known && move <= comesToRest*3*estimate {
		return estimate, true, nil
	}
	// The coarse of two meshes is off by 4/3 of the move, the fine by 1/3. What does
	// not come to rest is looked for on the next mesh, until there is none.
	_, sure, err := refined(ctx, r.Fine, fine, move/3, o)
	if known {
		return math.Max(estimate, 4*move/3), sure, err
	}
	return 4 * move / 3, sure, err
}

// ask walks to the model on the finer mesh of a refinement, whose coarse mesh has the
// form f. The limit met is the error; nil when a walk arrives or none can start.
func (c *chain) ask(ctx context.Context, r *mesh.Refinement, f *canopy.Form) error {
	var met *NoEquilibriumError
	for _, w := range ways(c.s) {
		done, limit, err := c.resume(ctx, r, &stand{w.name, 1, f}, farBack)
		if err == nil && !done && limit == nil {
			done, limit, err = c.along(ctx, w)
		}
		if err != nil || done {
			return err
		}
		if met == nil {
			met = limit
		}
	}
	if met == nil {
		return nil
	}
	met.Tried = append([]string{"a finer mesh was asked whether the shape is held by its mesh"}, c.did...)
	return met
}

// refinable reports whether a finer mesh can say more about a shape: of fabric of
// prescribed stress, found by Newton's method.
func refinable(s *canopy.Structure, got found, o Options) bool {
	if got.surface == nil || o.Method != MethodAuto || o.stiff || o.live {
		return false
	}
	for i := range s.Fabrics {
		if s.Fabrics[i].Elastic {
			return false
		}
	}
	return slices.Equal(got.surface.Engines, []string{newton.Name}) && got.surface.Converged
}

// discretisation estimates how far the surface found on s is from the smooth one, over
// the size; NaN when that is not judged. A form that finer meshes do not confirm is no
// longer taken for converged.
func discretisation(ctx context.Context, s *canopy.Structure, got found, origin r3.Vec, o Options) (float64, error) {
	estimate, sure := math.NaN(), true
	if got.eased != nil {
		s = got.eased
	} else if o.below != nil && got.surface != nil {
		below := *o.below
		below.Position = moved(below.Position, r3.Scale(-1, origin))
		estimate = moveOnRefinement(&below, got.surface, s) / 3 / s.Size()
		sure = false
	}
	if refinable(s, got, o) {
		var err error
		if estimate, sure, err = refined(ctx, s, got.surface, estimate, o); err != nil {
			return estimate, err
		}
	}
	if !sure && math.IsNaN(estimate) {
		got.form.Steps = append(got.form.Steps, "how far a finer mesh would move the surface was not judged: it has too many triangles to be refined for that, or no balance was found there")
	}
	if !sure && estimate > unsure {
		got.form.Converged = false
		got.form.Why = fmt.Sprintf("a finer mesh would move the surface by about %.2g %% of its size, and refining does not show that it comes to rest: form it on a finer mesh, and ask whether it can exist at all", 100*estimate)
	}
	return estimate, nil
}
