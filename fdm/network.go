package fdm

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// Directions is a set of coordinate directions, one bit each.
type Directions uint8

// Directions of a node.
const (
	DirX   Directions = 1 << iota // along x
	DirY                          // along y
	DirZ                          // along z
	DirAll = DirX | DirY | DirZ
)

// Has reports whether direction d (0 = x, 1 = y, 2 = z) is in the set.
func (d Directions) Has(axis int) bool { return d>>uint(axis)&1 != 0 }

// String names the directions: "x", "x and z", "x, y and z", "none".
func (d Directions) String() string {
	return [...]string{
		"none", "x", "y", "x and y", "z", "x and z", "y and z", "x, y and z",
	}[d&DirAll]
}

// Network is what a force density solver works on: nodes and the straight
// members between them. N is the number of nodes, M the number of members.
type Network struct {
	// Position of the nodes in m (N). It places nodes in their fixed
	// directions and gives tied nodes their offsets; what it says about free
	// directions does not enter any shape.
	Position []r3.Vec
	// Fixed are the directions in which a support holds each node (N).
	Fixed []Directions
	// Load is the dead load on each node in N (N), or nil for none.
	Load []r3.Vec
	// Master (N, or nil for none) ties nodes: a node with Master ≥ 0 keeps
	// its offset from that node in all directions in which it is not Fixed
	// itself, and the forces on it act on that node. −1 means not tied. A
	// master may be tied in turn, but not in a circle.
	Master []int32
	// Ends are the nodes at the two ends of each member (M). Several members
	// may join the same two nodes.
	Ends [][2]int32
}

// Panel is a triangle of fabric for natural force densities.
type Panel struct {
	// Corners are the three nodes.
	Corners [3]int32
	// Warp is the wanted direction of the warp in space; its projection into
	// the reference triangle is the warp. It need not have length one.
	Warp r3.Vec
	// WarpStress and WeftStress are the wanted stresses in N/m of width.
	WarpStress, WeftStress float64
}

// validate checks everything about the network and its panels that does not
// depend on force densities.
func (n *Network) validate(panels []Panel) error {
	count := len(n.Position)
	if count > math.MaxInt32 || len(n.Ends)+3*len(panels) > math.MaxInt32 {
		return &InputError{What: "network", Index: -1, Why: "it has more nodes or members than 32-bit numbers can count"}
	}
	if len(n.Fixed) != count {
		return &InputError{What: "network", Index: -1, Why: fmt.Sprintf("Fixed has length %d, Position %d; they go together", len(n.Fixed), count)}
	}
	if n.Load != nil && len(n.Load) != count {
		return &InputError{What: "network", Index: -1, Why: fmt.Sprintf("Load has length %d, Position %d; give one load for each node, or nil", len(n.Load), count)}
	}
	if n.Master != nil && len(n.Master) != count {
		return &InputError{What: "network", Index: -1, Why: fmt.Sprintf("Master has length %d, Position %d; give one for each node, or nil", len(n.Master), count)}
	}
	if err := usablePositions(n.Position); err != nil {
		return err
	}
	if err := usableLoads(n.Load); err != nil {
		return err
	}
	for k, e := range n.Ends {
		for _, i := range e {
			if int(i) >= count || i < 0 {
				return &InputError{What: "member", Index: k, Why: fmt.Sprintf("it ends at node %d, but nodes go from 0 to %d", i, count-1)}
			}
		}
		if e[0] == e[1] {
			return &InputError{What: "member", Index: k, Why: fmt.Sprintf("both its ends are node %d", e[0])}
		}
	}
	return validatePanels(panels, count)
}

func validatePanels(panels []Panel, nodes int) error {
	for k := range panels {
		p := &panels[k]
		for _, i := range p.Corners {
			if int(i) >= nodes || i < 0 {
				return &InputError{What: "panel", Index: k, Why: fmt.Sprintf("it has a corner at node %d, but nodes go from 0 to %d", i, nodes-1)}
			}
		}
		if c := p.Corners; c[0] == c[1] || c[1] == c[2] || c[2] == c[0] {
			return &InputError{What: "panel", Index: k, Why: fmt.Sprintf("two of its corners are the same node (%d, %d, %d)", c[0], c[1], c[2])}
		}
		if !usable(p.WarpStress) || !usable(p.WeftStress) {
			return &InputError{What: "panel", Index: k, Why: fmt.Sprintf("its stress (%g, %g N/m) is not a finite number (or beyond 1e70)", p.WarpStress, p.WeftStress)}
		}
		if !usableVec(p.Warp) {
			return &InputError{What: "panel", Index: k, Why: "its warp direction is not a finite number (or beyond 1e70)"}
		}
	}
	return nil
}

func usablePositions(x []r3.Vec) error {
	for i, p := range x {
		if !usableVec(p) {
			return &InputError{What: "node", Index: i, Why: fmt.Sprintf("its position (%g, %g, %g) is not a finite number (or beyond 1e70)", p.X, p.Y, p.Z)}
		}
	}
	return nil
}

func usableLoads(load []r3.Vec) error {
	for i, p := range load {
		if !usableVec(p) {
			return &InputError{What: "node", Index: i, Why: fmt.Sprintf("its load (%g, %g, %g) is not a finite number (or beyond 1e70)", p.X, p.Y, p.Z)}
		}
	}
	return nil
}

// checkMasters looks for masters that do not exist and for nodes tied to
// themselves in a circle.
func (n *Network) checkMasters() error {
	const (
		unseen = iota
		onPath
		done
	)
	if n.Master == nil {
		return nil
	}
	state := make([]uint8, len(n.Master))
	for start := range n.Master {
		i := int32(start)
		for i >= 0 && state[i] == unseen {
			state[i] = onPath
			m := n.Master[i]
			if int(m) >= len(n.Master) || m < -1 {
				return &InputError{What: "node", Index: int(i), Why: fmt.Sprintf("its master %d is neither a node nor −1", m)}
			}
			i = m
		}
		if i >= 0 && state[i] == onPath {
			return &InputError{What: "node", Index: int(i), Why: "it is tied to itself through its masters"}
		}
		for i = int32(start); i >= 0 && state[i] == onPath; i = n.Master[i] {
			state[i] = done
		}
	}
	return nil
}

// largest is the greatest size of a number in the input: products of two and
// their squares stay far from overflow.
const largest = 1e70

// usable reports whether a number of the input is finite and within reason.
func usable(v float64) bool { return math.Abs(v) <= largest }

func usableVec(v r3.Vec) bool { return usable(v.X) && usable(v.Y) && usable(v.Z) }

func finite(v float64) bool { return v-v == 0 }
