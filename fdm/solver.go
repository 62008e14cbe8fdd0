package fdm

import (
	"context"
	"fmt"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"
)

// Solver finds shapes of one network. What depends on the connections only
// (which unknowns there are, in which order they are eliminated) is worked out
// once, by [New]; every further shape costs one numeric factorisation and one
// solve.
//
// A Solver keeps working storage: it must not be used by two goroutines at a
// time.
type Solver struct {
	position []r3.Vec
	load     []r3.Vec // nil: none
	fixed    []Directions
	master   []int32 // nil: none
	ends     [][2]int32
	panels   []Panel

	// links are the members, then the three edges of each panel, opposite
	// its corners 0, 1, 2; weight are their force densities in the system
	// that was factorised last.
	links  [][2]int32
	weight []float64
	kind   signs // of weight

	systems []*system
	free    []Directions // directions in which each node is an unknown by itself
	start   []r3.Vec     // fixed nodes in place, unknowns at one point near them

	// Working storage over nodes.
	force, size, move, trial []r3.Vec
}

// New prepares a solver for the network and its panels, which may be nil. It
// copies what it is given.
//
// It looks at everything that does not depend on force densities: errors are
// [InputError] for an argument that makes no sense and [SingularError] with
// cause [NoSupport] when a part would hang on nothing even if every member
// carried force. Cost: that of a fill-reducing ordering and a symbolic
// factorisation, nearly linear for nets.
func New(ctx context.Context, n Network, panels []Panel) (*Solver, error) {
	if err := n.validate(panels); err != nil {
		return nil, err
	}
	if err := n.checkMasters(); err != nil {
		return nil, err
	}
	s := &Solver{
		position: slices.Clone(n.Position),
		load:     slices.Clone(n.Load),
		fixed:    slices.Clone(n.Fixed),
		master:   slices.Clone(n.Master),
		ends:     slices.Clone(n.Ends),
		panels:   slices.Clone(panels),
	}
	s.links = s.ends
	if len(panels) > 0 {
		s.links = make([][2]int32, len(s.ends), len(s.ends)+3*len(panels))
		copy(s.links, s.ends)
		for k := range panels {
			c := panels[k].Corners
			s.links = append(s.links, [2]int32{c[1], c[2]}, [2]int32{c[2], c[0]}, [2]int32{c[0], c[1]})
		}
		s.ends = s.links[:len(s.ends):len(s.ends)]
	}
	s.systems = newSystems(&n)
	if err := s.checkSupport(nil); err != nil {
		return nil, err
	}
	for _, sys := range s.systems {
		if err := sys.analyse(ctx, s.links); err != nil {
			return nil, err
		}
	}
	count := len(s.position)
	s.weight = make([]float64, len(s.links))
	s.start = make([]r3.Vec, count)
	s.force = make([]r3.Vec, count)
	s.size = make([]r3.Vec, count)
	s.move = make([]r3.Vec, count)
	s.trial = make([]r3.Vec, count)
	s.free = make([]Directions, count)
	for _, sys := range s.systems {
		for _, i := range sys.node {
			s.free[i] |= sys.directions()
		}
	}
	s.place()
	return s, nil
}

// Nodes is the number of nodes.
func (s *Solver) Nodes() int { return len(s.position) }

// Members is the number of members.
func (s *Solver) Members() int { return len(s.ends) }

// Panels is the number of panels.
func (s *Solver) Panels() int { return len(s.panels) }

// SetPosition gives new places to fixed nodes and new offsets to tied ones, for
// instance after a mast has been moved. Nothing needs to be analysed again.
// position has one entry for each node, in m.
func (s *Solver) SetPosition(position []r3.Vec) error {
	if len(position) != len(s.position) {
		return &InputError{What: "positions", Index: -1, Why: fmt.Sprintf("there are %d of them for %d nodes", len(position), len(s.position))}
	}
	if err := usablePositions(position); err != nil {
		return err
	}
	copy(s.position, position)
	s.place()
	return nil
}

// SetLoad gives new nodal loads in N, nil for none. Nothing needs to be
// analysed again.
func (s *Solver) SetLoad(load []r3.Vec) error {
	if load != nil && len(load) != len(s.position) {
		return &InputError{What: "loads", Index: -1, Why: fmt.Sprintf("there are %d of them for %d nodes", len(load), len(s.position))}
	}
	if err := usableLoads(load); err != nil {
		return err
	}
	s.load = append(s.load[:0], load...)
	if load == nil {
		s.load = nil
	}
	return nil
}

// SetPanels gives new stresses and warp directions to the panels, whose corners
// must be the same as before. Nothing needs to be analysed again.
func (s *Solver) SetPanels(panels []Panel) error {
	if len(panels) != len(s.panels) {
		return &InputError{What: "panels", Index: -1, Why: fmt.Sprintf("there are %d of them, there were %d", len(panels), len(s.panels))}
	}
	if err := validatePanels(panels, len(s.position)); err != nil {
		return err
	}
	for k := range panels {
		if panels[k].Corners != s.panels[k].Corners {
			return &InputError{What: "panel", Index: k, Why: "its corners have changed; make a new solver"}
		}
	}
	copy(s.panels, panels)
	return nil
}

// place fills start: fixed nodes where they are, all unknowns at the middle of
// the fixed nodes' box, tied nodes at their offsets from it. Solving for the
// way from there keeps digits when the network lies far from the origin.
func (s *Solver) place() {
	var lo, hi, middle r3.Vec
	for axis := range 3 {
		seen := false
		for i := range s.position {
			if !s.fixed[i].Has(axis) {
				continue
			}
			p := *at(&s.position[i], axis)
			if l, h := at(&lo, axis), at(&hi, axis); !seen {
				*l, *h, seen = p, p, true
			} else {
				*l, *h = min(*l, p), max(*h, p)
			}
		}
		*at(&middle, axis) = 0.5**at(&lo, axis) + 0.5**at(&hi, axis)
	}
	copy(s.start, s.position)
	for _, sys := range s.systems {
		for _, axis := range sys.axes {
			m := *at(&middle, axis)
			for i, u := range sys.unknown {
				if u >= 0 {
					own, leader := *at(&s.position[i], axis), *at(&s.position[sys.node[u]], axis)
					*at(&s.start[i], axis) = m + (own - leader)
				}
			}
		}
	}
}

// factorise prepares all systems for the weights in s.weight.
func (s *Solver) factorise(ctx context.Context, kind signs, wide bool) error {
	s.kind = kind
	for _, sys := range s.systems {
		if err := sys.factorise(ctx, s.links, s.weight, kind, wide); err != nil {
			return err
		}
	}
	return nil
}

// solve turns nodal forces into displacements of all nodes (zero in fixed
// directions) by the systems factorised last. move and force must not be the
// same slice.
func (s *Solver) solve(move, force []r3.Vec) error {
	clear(move)
	for _, sys := range s.systems {
		if err := sys.solve(force, move); err != nil {
			return err
		}
	}
	return nil
}

// gather brings the forces on tied nodes to the node they follow, in place, and
// sets every entry that is not an unknown to zero.
func (s *Solver) gather(f []r3.Vec) {
	if s.master != nil {
		for _, sys := range s.systems {
			for i, u := range sys.unknown {
				if u < 0 || sys.node[u] == int32(i) {
					continue
				}
				for _, axis := range sys.axes {
					*at(&f[sys.node[u]], axis) += *at(&f[i], axis)
				}
			}
		}
	}
	for i, free := range s.free {
		if free == DirAll {
			continue
		}
		for axis := range 3 {
			if !free.Has(axis) {
				*at(&f[i], axis) = 0
			}
		}
	}
}
