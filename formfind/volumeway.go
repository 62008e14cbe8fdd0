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

// ownLaw reports whether the force of member k, a cable, follows from the shape.
func ownLaw(s *canopy.Structure, k int) bool {
	switch s.Law[k] {
	case canopy.LawElastic:
		return !s.Kind[k].Pushes()
	case canopy.LawCable:
		return s.Cables[s.CableOf[k]].Law != canopy.CableBalance && !s.Kind[k].Pushes()
	}
	return false
}

// restrained reports whether there are cables whose force follows from the shape.
func restrained(s *canopy.Structure) bool {
	for k := range s.Law {
		if ownLaw(s, k) {
			return true
		}
	}
	return false
}

// blown is a start with the volumes already there. Cables that restrain a bubble
// are too long for the flat fabric it grows from, so that nothing is in balance
// on the way; here they have a force instead.
func (c *chain) blown(ctx context.Context, force []float64) error {
	if err := c.natural(ctx, force, naturalStart{drawn: soundMesh(c.s)}); err != nil {
		return err
	}
	w := *c.s
	w.Law, w.Given = slices.Clone(c.s.Law), slices.Clone(c.s.Given)
	for k := range w.Law {
		if ownLaw(c.s, k) {
			w.Law[k], w.Given[k] = canopy.LawForce, force[k]
		}
	}
	f, out, err := newton.Engine{}.Find(ctx, &w, c.f, c.settings(false))
	if err != nil {
		return fmt.Errorf("newton: %w", err)
	}
	if out.Status == engine.Converged {
		c.f = f
		c.say("Newton, blown up with given forces in place of the cables' own laws: %d iterations", out.Iterations)
	}
	return nil
}

// volumeWay is the way from fabric that encloses little to the volumes asked
// for, false when none are. A film of equal stress on a plane boundary has a
// shape for any volume; one between cables or of unequal stress may not.
func volumeWay(s *canopy.Structure) (way, bool) {
	name, most := "", 0.0
	for i := range s.Enclosures {
		if v := s.Enclosures[i].Volume; math.Abs(v) > math.Abs(most) {
			name, most = s.Enclosures[i].Name, v
		}
	}
	return way{
		name: "volume",
		easy: []float64{0.5, 0.1, 0.01},
		set: func(w, s *canopy.Structure, t float64) {
			for i := range w.Enclosures {
				w.Enclosures[i].Volume = t * s.Enclosures[i].Volume
			}
		},
		say: func(s *canopy.Structure, t float64) *NoEquilibriumError {
			hint := ""
			if !equalStress(s) {
				hint = ". Of unequal stress, it may be the warp that ends there: laid along a direction in space it must not become square to the surface"
			}
			return &NoEquilibriumError{Shown: true, Quantity: "enclosed volume", Given: most, Limit: t * most,
				Text: fmt.Sprintf("no equilibrium with %.4g m³ of air below fabric %s: with this prestress and these edges a stable shape exists up to about %.4g m³ (%.1f %% of it). Give less volume, make the edge cables stronger, or fix the edges%s", most, name, t*most, 100*t, hint)}
		},
	}, most != 0
}
