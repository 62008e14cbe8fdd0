// Package relax finds shapes in equilibrium by dynamic relaxation: every node
// gets a mass and is let go; motion is damped until the canopy is at rest
// (Day, The Engineer 219, 1965; Barnes, Form finding and analysis of tension
// structures by dynamic relaxation, Int. J. Space Structures 14, 1999).
//
// It needs no matrix and no good start, and treats all that can be written as
// a force: cables of given force or force density, elastic cables that go
// slack, struts, cables that slide with one force, fabric of given stress,
// elastic fabric that wrinkles, loads, weights, internal pressure, rigid rings.
// It is the independent second opinion on the other engines, and the fallback.
//
// Fabric of equal given stress in warp and weft, and cables of given force,
// relax in the shape-changing directions only (see engine.Settings.AllDirections
// for the contrary): in the others they have no stiffness, and nodes would
// slide until triangles collapse. Fabric whose given stresses differ has an
// equilibrium across itself, but in general none within itself; what is found
// is the former. [Frozen] turns a found form into a problem with one answer in
// all directions.
package relax

import (
	"context"
	"fmt"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
)

// Engine is dynamic relaxation. The zero value damps kinetically: whenever the
// kinetic energy has passed a peak, the canopy is stopped there and let go
// again.
type Engine struct {
	// Viscous damps by a drag on all nodes instead, adapted to the lowest
	// frequency that is in motion.
	Viscous bool

	form *canopy.Form // the frozen field of forces, nil for none
}

// DefaultIterations bounds the iterations when engine.Settings does not.
const DefaultIterations = 200_000

// New returns dynamic relaxation with kinetic damping.
func New() *Engine { return &Engine{} }

// Name implements [engine.Engine].
func (e *Engine) Name() string {
	if e.Viscous {
		return "dynamic relaxation, viscous"
	}
	return "dynamic relaxation"
}

// Find implements [engine.Engine]. The start gives positions and, in the forces
// of members of sliding cables, first guesses.
//
// With settings.AllDirections every free direction relaxes. That is sound where
// every direction has stiffness: cable nets, elastic fabric, frozen fields.
func (e *Engine) Find(ctx context.Context, s *canopy.Structure, start *canopy.Form, set engine.Settings) (*canopy.Form, engine.Outcome, error) {
	set = set.WithDefaults(DefaultIterations)
	out := engine.Outcome{NegativePivots: -1}
	var from []r3.Vec
	if start != nil {
		from = start.Position
	}
	p, x, err := compile(s, from, e.form, set.AllDirections)
	if err != nil {
		return nil, out, fmt.Errorf("%s: %w", e.Name(), err)
	}
	if start != nil {
		p.startForces(start)
	}
	st := newState(p, x, e.Viscous)
	defer st.crew.Dismiss()
	r := run{state: st, set: set, name: e.Name()}
	if e.Viscous {
		err = r.viscous(ctx)
	} else {
		err = r.kinetic(ctx)
	}
	if err != nil {
		return nil, r.out, fmt.Errorf("%s: %w", e.Name(), err)
	}
	f := st.form(e.form)
	f.Engines = []string{e.Name()}
	f.Converged = r.out.Status == engine.Converged
	f.Why = r.out.Why
	return f, r.out, nil
}
