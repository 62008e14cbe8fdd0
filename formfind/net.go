package formfind

import (
	"context"
	"errors"
	"fmt"

	"anticlast/formfind/canopy"
	"anticlast/formfind/mesh"
)

// layRounds bounds how often the nets of a model are laid again.
const layRounds = 12

// layEqualMesh lays equal-mesh nets. How many whole meshes fit between the edge
// cables depends on the shape, and the shape on the meshes: the net is laid in
// the outline that is expected, found, continued or shortened to where its edge
// cables now are, and found again, until no line gains or loses a mesh. It
// returns the structure and a form to start from.
//
// Found in this way the net is a minimum of a convex energy, that of forces and
// force densities and of elastic links that may go slack, and so does not
// depend on the start.
func layEqualMesh(ctx context.Context, m *canopy.Model, o Options) (*canopy.Structure, *canopy.Form, error) {
	s, laid, err := mesh.BuildLaid(ctx, m, false)
	if err != nil {
		return nil, nil, err
	}
	o.CrossCheck, o.Warm = false, nil
	for round := 1; ; round++ {
		if err := check(s); err != nil {
			return nil, nil, err
		}
		o.level = fmt.Sprintf("laying the net, round %d", round)
		local, origin := nearOrigin(s)
		got, err := findForm(ctx, local, o)
		if err != nil {
			return nil, nil, err
		}
		f := got.form
		backFrom(s, f, origin)
		next, again, same, err := laid.Again(ctx, f.Position, false)
		if err != nil {
			return nil, nil, err
		}
		if same || round == layRounds {
			if s, _, _, err = laid.Again(ctx, f.Position, true); err != nil {
				return nil, nil, err
			}
			return s, startOf(s, f), nil
		}
		o.Warm = startOf(next, f)
		s, laid = next, again
	}
}

// startOf is a form of s to start from: its own positions, and for elastic links
// the mean force of those found before.
func startOf(s *canopy.Structure, before *canopy.Form) *canopy.Form {
	f := canopy.NewForm(s)
	sum, n := 0.0, 0.0
	for _, t := range before.Force {
		if t > 0 {
			sum += t
			n++
		}
	}
	for k := range f.Force {
		f.Force[k] = sum / max(1, n)
	}
	return f
}

// clampHint adds to the error of a net for which no engine found equilibrium
// what is most often the reason: its lines end obliquely on an edge cable that
// has one force all along, and so lets them slide along it until nodes meet.
func clampHint(m *canopy.Model, err error) error {
	var none *NoEquilibriumError
	if !errors.As(err, &none) || none.Shown || m.Listed != nil {
		return err
	}
	slides := map[string]bool{}
	for _, c := range m.Cables {
		slides[c.Name] = c.ForceDensity == 0 && c.MeanForce == 0
	}
	cable := map[string]string{}
	for _, e := range m.Edges {
		if e.Kind == canopy.EdgeCable {
			cable[e.Name] = e.Cable
		}
	}
	for _, n := range m.Nets {
		for _, e := range n.Boundary {
			if c, ok := cable[e]; ok && slides[c] {
				none.Text += fmt.Sprintf("; lines of net %s that end obliquely slide along cable %s, which has one force all along: give it a mean force, with which they are clamped to it", n.Name, c)
				return err
			}
		}
	}
	return err
}
