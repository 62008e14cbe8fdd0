package formfind

import (
	"context"
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/mesh"
	"anticlast/formfind/surface"
)

// coarsest is about how many triangles the first of several levels has: few
// enough to be solved at once, enough to have the shape of the answer.
const coarsest = 300

// coarserModel returns a model whose mesh sides are 2^levels times longer, or
// false where numbers of segments given by hand do not allow that.
func coarserModel(m *canopy.Model, levels int) (*canopy.Model, bool) {
	k := 1 << levels
	out := *m
	out.MeshSize *= float64(k)
	out.Coarser = float64(k)
	out.Edges = append([]canopy.Edge(nil), m.Edges...)
	for i := range out.Edges {
		if out.Edges[i].Segments%k != 0 {
			return nil, false
		}
		out.Edges[i].Segments /= k
	}
	out.Fabrics = append([]canopy.ModelFabric(nil), m.Fabrics...)
	for i := range out.Fabrics {
		out.Fabrics[i].MeshSize *= float64(k)
	}
	return &out, true
}

// most is how many times longer than wanted the sides of the coarsest mesh may be,
// as a power of two.
const most = 8

// meshLevels returns a coarse mesh of the model and its refinements up to one
// about as fine as the model asks for, which itself is not made: that would be
// most of the work. None when one level is better.
//
// Coarser and coarser meshes have fewer triangles only until least numbers of
// segments hold them up. The coarsest is the first of some hundred triangles, from
// above, whose refinement has about as many as the mesh half as fine.
func meshLevels(ctx context.Context, m *canopy.Model) (*canopy.Structure, []*mesh.Refinement, error) {
	if m.Listed != nil || len(m.Fabrics) == 0 {
		return nil, nil, nil
	}
	build := func(levels int) (*canopy.Structure, error) {
		c := m
		if levels > 0 {
			var ok bool
			if c, ok = coarserModel(m, levels); !ok {
				return nil, nil
			}
		}
		s, err := mesh.Build(ctx, c)
		if err != nil && ctx.Err() == nil {
			return nil, nil // what cannot be meshed coarsely is meshed at once
		}
		return s, err
	}
	var coarse, half *canopy.Structure
	for levels := most; levels > 0; levels-- {
		var err error
		if coarse = half; coarse == nil {
			if coarse, err = build(levels); err != nil {
				return nil, nil, err
			}
		}
		half = nil
		enough := coarsest / 2
		if levels == 1 {
			enough = coarsest / 4
		}
		if coarse == nil || len(coarse.Corners) < enough {
			continue
		}
		if half, err = build(levels - 1); err != nil {
			return nil, nil, err
		}
		if half == nil || float64(4*len(coarse.Corners)) > 1.25*float64(len(half.Corners)) {
			continue
		}
		if float64(len(coarse.Corners))*math.Pow(4, float64(levels)) > mesh.MaxTriangles {
			return nil, nil, nil // Build says it better
		}
		var steps []*mesh.Refinement
		for at := coarse; len(steps) < levels; {
			r, err := mesh.Refine(at)
			if err != nil {
				return nil, nil, fmt.Errorf("refining the mesh: %w", err)
			}
			steps = append(steps, r)
			at = r.Fine
		}
		return coarse, steps, nil
	}
	return nil, nil, nil
}

// SolveLevels is [Solve] on the finest of several meshes, each of which refines
// the one before: the surface found on one is the start on the next, and steps
// there are solved with its help. The difference between the last two says how
// far a finer mesh would still move the surface.
func SolveLevels(ctx context.Context, coarse *canopy.Structure, steps []*mesh.Refinement, o Options) (*canopy.Result, error) {
	if len(steps) == 0 {
		return Solve(ctx, coarse, o)
	}
	whole := func() (*canopy.Structure, error) { return steps[len(steps)-1].Fine, nil }
	return solveLevels(ctx, coarse, steps, whole, &canopy.Model{}, o)
}

// solveLevels is SolveLevels for the model m; what whole returns is solved at once
// when a coarser mesh has no shape.
func solveLevels(ctx context.Context, coarse *canopy.Structure, steps []*mesh.Refinement, whole func() (*canopy.Structure, error), m *canopy.Model, o Options) (*canopy.Result, error) {
	if err := check(coarse); err != nil {
		return nil, err
	}
	o.begin("solve")
	o.ahead = lookAhead(ctx, steps, o)
	defer o.ahead.end()
	up, ok, err := climb(ctx, coarse, steps, o)
	if err != nil {
		return nil, err
	}
	if ok {
		return solve(ctx, steps[len(steps)-1].Fine, m, up)
	}
	o.ahead.end()
	o.ahead = nil
	s, err := whole()
	if err != nil {
		return nil, err
	}
	return solve(ctx, s, m, o)
}

// climb solves level after level below the last one and returns options with a
// start for that; false when a level has no shape, which is for the last one to
// say. Where a walk meets a limit on one level, the limit is met on the finer ones in
// turn, and that of the last one is the error.
func climb(ctx context.Context, coarse *canopy.Structure, steps []*mesh.Refinement, o Options) (Options, bool, error) {
	last := o
	o.surface, o.CrossCheck = true, false
	s := coarse
	for i := 0; i < len(steps); i++ {
		o.level = fmt.Sprintf("level %d of %d", i+1, len(steps)+1)
		local, origin := nearOrigin(s)
		if o.Warm != nil {
			w := *o.Warm
			w.Position = moved(w.Position, r3.Scale(-1, origin))
			o.Warm = &w
		}
		got, err := findForm(ctx, local, o)
		if err == nil {
			if i == 0 && o.Method == MethodAuto && got.form.Converged {
				c := &chain{s: local, o: o}
				if got.form, err = even(ctx, local, got.form, c.settings(false)); err != nil {
					return last, false, err
				}
				got.solver = nil
			}
			backFrom(s, got.form, origin)
		} else {
			var none *NoEquilibriumError
			if ctx.Err() != nil {
				return last, false, err
			}
			if !errors.As(err, &none) || none.met == nil || sheared(s) {
				return last, false, nil
			}
			up, shape, limit, err := narrow(ctx, steps[i:], s, none.met, o)
			switch {
			case err != nil:
				return last, false, err
			case limit != nil:
				return last, false, limit
			case up == 0:
				return last, false, nil
			}
			if i += up; i == len(steps) {
				last.Warm = shape
				return last, true, nil
			}
			got = found{form: shape}
		}
		r := steps[i]
		o.Warm, o.below = r.Prolong(got.form), got.form
		o.solver, o.parents = got.solver, r.Parents
		s = r.Fine
	}
	last.Warm, last.below, last.solver, last.parents = o.Warm, o.below, o.solver, o.parents
	return last, true, nil
}

// moveOnRefinement is how far the nodes of the coarse mesh lie from the surface
// of the fine one, along its normals, at most. For a method of second order a
// third of it estimates how far the fine surface is from the smooth one
// (Richardson 1911).
func moveOnRefinement(coarse, fine *canopy.Form, s *canopy.Structure) float64 {
	normals := surface.VertexNormals(fine.Position, s.Corners)
	worst := 0.0
	for i, p := range coarse.Position {
		worst = math.Max(worst, math.Abs(r3.Dot(normals[i], r3.Sub(fine.Position[i], p))))
	}
	return worst
}
