package formfind

import (
	"context"
	"fmt"
	"math"
	"slices"

	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/newton"
)

// A way leads from a model that surely has a shape to the one asked for, by
// one number: 0 is easy, 1 is the model. Where no engine finds the shape at
// once, it is walked towards from the easy end; where the walk gets stuck is
// how far the model could go.
type way struct {
	name string
	// set writes the model at t into w, from the model s.
	set func(w, s *canopy.Structure, t float64)
	// easy are values of t to try in turn until one has a shape.
	easy []float64
	// say tells how far the model can go.
	say func(s *canopy.Structure, t float64) *NoEquilibriumError
}

// walkPrecision is the step of t at which a walk ends.
const walkPrecision = 2e-4

// walk looks for a shape along the ways that apply. It returns true when it
// got to the model, and the limit met on the way that got nowhere.
func (c *chain) walk(ctx context.Context) (bool, *NoEquilibriumError, error) {
	var met *NoEquilibriumError
	for _, w := range ways(c.s) {
		done, limit, err := c.along(ctx, w)
		if err != nil || done {
			return done, nil, err
		}
		if met == nil {
			met = limit
		}
	}
	return false, met, nil
}

func (c *chain) along(ctx context.Context, w way) (bool, *NoEquilibriumError, error) {
	s := copyForWalk(c.s)
	var (
		at   float64
		form *canopy.Form
	)
	c.stage("newton", "walking the boundary: "+w.name)
	for _, t := range w.easy {
		w.set(s, c.s, t)
		sub := &chain{s: s, o: Options{Progress: c.o.Progress, Recorder: c.o.Recorder}}
		ok, err := sub.atOnce(ctx)
		if err != nil {
			return false, nil, err
		}
		if ok {
			at, form = t, sub.f
			break
		}
	}
	if form == nil {
		return false, nil, nil
	}
	return c.reach(ctx, w, s, stand{w.name, at, form}, 1-at)
}

// stand is how far a walk got: a shape of the model at a number of a way.
type stand struct {
	way  string
	at   float64
	form *canopy.Form
}

// reach walks on from a stand, in s, a copy of the model for walking: in steps that
// double until one fails and are halved from there. It returns true when it arrives
// at the model, else the limit met.
func (c *chain) reach(ctx context.Context, w way, s *canopy.Structure, from stand, step float64) (bool, *NoEquilibriumError, error) {
	solver, err := newton.New(ctx, s)
	if err != nil {
		return false, nil, fmt.Errorf("newton: %w", err)
	}
	// A walk past the last shape draws out triangles.
	least := min(nearCollapse/4, smallestAngle(from.form.Position, s.Corners)/3)
	start, failed := from.at, false
	for step >= walkPrecision {
		t := math.Min(1, from.at+step)
		w.set(s, c.s, t)
		f, err := c.foothold(ctx, solver, s, from.form, least)
		if err != nil {
			return false, nil, err
		}
		if f == nil {
			step, failed = step/2, true
			continue
		}
		from.at, from.form = t, f
		if t == 1 {
			c.f = f
			c.f.Converged = true
			c.used("newton")
			c.say("Newton in the shape-changing directions, walking the boundary (%s) from %.0f %% to the model", w.name, 100*start)
			return true, nil, nil
		}
		if !failed {
			step *= 2
		}
	}
	if from.at == start {
		return false, nil, nil // not one step: that is no limit but a bad place to start
	}
	limit := w.say(c.s, from.at)
	if limit != nil {
		c.say("walked the boundary (%s): a stable shape up to %.1f %%, none beyond", w.name, 100*from.at)
		limit.met = &from
	}
	return false, limit, nil
}

// foothold is a stable shape of s near the given one, nil when there is none.
func (c *chain) foothold(ctx context.Context, solver *newton.Solver, s *canopy.Structure, near *canopy.Form, least float64) (*canopy.Form, error) {
	set := c.settings(false)
	set.MaxIterations = 30 // from a shape nearby it takes a few; a failure need not take long
	f, out, err := solver.Find(ctx, near, set)
	switch {
	case err != nil && ctx.Err() != nil:
		return nil, err
	case err != nil || out.Status != engine.Converged || out.NegativePivots != 0,
		unreal(s, f), smallestAngle(f.Position, s.Corners) <= least:
		return nil, nil
	}
	return f, nil
}

// atOnce tries the ordinary starts, without relaxation and without walking.
func (c *chain) atOnce(ctx context.Context) (bool, error) {
	force := guessForces(c.s, c.s.Position)
	var best candidate
	for _, n := range c.naturalStarts() {
		if err := c.natural(ctx, force, n); err != nil {
			if ctx.Err() != nil {
				return false, err
			}
			continue
		}
		f, out, err := newton.Engine{}.Find(ctx, c.s, c.f, c.settings(false))
		if err != nil {
			if ctx.Err() != nil {
				return false, err
			}
			continue
		}
		if out.Status != engine.Converged || out.NegativePivots != 0 || unreal(c.s, f) {
			continue
		}
		got := candidate{form: f, angle: smallestAngle(f.Position, c.s.Corners)}
		if best.form == nil || got.better(best) {
			best = got
		}
		if got.sound() {
			break
		}
	}
	if best.form != nil {
		c.f = best.form
	}
	return best.form != nil, nil
}

func copyForWalk(s *canopy.Structure) *canopy.Structure {
	w := *s
	w.Position = slices.Clone(s.Position)
	w.Given = slices.Clone(s.Given)
	w.Fabrics = slices.Clone(s.Fabrics)
	w.Enclosures = slices.Clone(s.Enclosures)
	w.Load = slices.Clone(s.Load)
	return &w
}

// ways lists the ways that apply to a structure, the likeliest cause first.
func ways(s *canopy.Structure) []way {
	var out []way
	pressure := 0.0
	for i := range s.Fabrics {
		if s.EnclosureOf(i) < 0 { // there it is found
			pressure = math.Max(pressure, math.Abs(s.Fabrics[i].Pressure))
		}
	}
	if pressure > 0 {
		out = append(out, way{
			name: "pressure",
			easy: []float64{0.5, 0.1, 0},
			set: func(w, s *canopy.Structure, t float64) {
				for i := range w.Fabrics {
					w.Fabrics[i].Pressure = t * s.Fabrics[i].Pressure
				}
			},
			say: func(s *canopy.Structure, t float64) *NoEquilibriumError {
				return &NoEquilibriumError{Shown: true, Quantity: "internal pressure", Given: pressure, Limit: t * pressure,
					Text: fmt.Sprintf("no equilibrium at an internal pressure of %.4g Pa: with this prestress a shape exists up to about %.4g Pa, beyond which it has no more surface to grow into (the hemisphere of a round one). Raise the prestress, lower the pressure, or give the volume instead", pressure, t*pressure)}
			},
		})
	}
	if w, ok := volumeWay(s); ok {
		out = append(out, w)
	}
	if lo, hi := heights(s); hi > lo {
		out = append(out, way{
			name: "height",
			easy: []float64{0.5, 0.2, 0.05},
			set: func(w, s *canopy.Structure, t float64) {
				for i := range w.Position {
					w.Position[i].Z = lo + t*(s.Position[i].Z-lo)
				}
			},
			say: func(s *canopy.Structure, t float64) *NoEquilibriumError {
				return &NoEquilibriumError{Shown: true, Quantity: "height between the lowest and the highest support", Given: hi - lo, Limit: t * (hi - lo),
					Text: fmt.Sprintf("no equilibrium with supports %.3f m apart in height: with this prestress a stable shape exists up to about %.3f m (%.1f %% of it), beyond which the surface necks and falls apart. Lower the high points, widen the ring, or raise the prestress along the slope over that around it",
						hi-lo, t*(hi-lo), 100*t)}
			},
		})
	}
	if least, most := rimForces(s); most > 0 {
		const factor = 8 // the easy end: rim cables this much stronger
		scale := func(t float64) float64 { return math.Pow(factor, 1-t) }
		out = append(out, way{
			name: "edge force",
			easy: []float64{0.67, 0.33, 0},
			set: func(w, s *canopy.Structure, t float64) {
				for k := range w.Given {
					if rim(s, k) {
						w.Given[k] = scale(t) * s.Given[k]
					}
				}
			},
			say: func(s *canopy.Structure, t float64) *NoEquilibriumError {
				return &NoEquilibriumError{Shown: true, Quantity: "edge cable force", Given: least, Limit: scale(t) * least,
					Text: fmt.Sprintf("no equilibrium with edge cables of %.4g kN: against this prestress they must carry at least about %.2f times as much (%.4g kN), or neighbouring edges close a corner. Tighten the edge cables or lower the prestress of the fabric",
						least/1e3, scale(t), scale(t)*least/1e3)}
			},
		})
	}
	return out
}

// heights returns the range of height of the points that hold fabric or cables
// of the surface, anchors of masts and guys left out.
func heights(s *canopy.Structure) (lo, hi float64) {
	used := make([]bool, len(s.Position))
	for _, c := range s.Corners {
		for _, i := range c {
			used[i] = true
		}
	}
	lo, hi = math.Inf(1), math.Inf(-1)
	for i, u := range used {
		if u && (s.FixedAt(i).Has(2) || s.MasterOf(i) >= 0) {
			lo, hi = math.Min(lo, s.Position[i].Z), math.Max(hi, s.Position[i].Z)
		}
	}
	return lo, hi
}

func rim(s *canopy.Structure, k int) bool {
	switch s.Kind[k] {
	case canopy.KindEdgeCable, canopy.KindRingCable:
		return s.Law[k] == canopy.LawForce
	}
	return false
}

func rimForces(s *canopy.Structure) (least, most float64) {
	least = math.Inf(1)
	for k := range s.Ends {
		if rim(s, k) {
			least, most = math.Min(least, s.Given[k]), math.Max(most, s.Given[k])
		}
	}
	return least, most
}
