package canopy

import "gonum.org/v1/gonum/spatial/r3"

// Stress is the membrane stress of a triangle in N/m of width, true (Cauchy)
// stress in the axes warp, weft of the deformed triangle. Weft is the triangle's
// normal × warp.
type Stress struct {
	Warp, Weft, Shear float64
}

// Form is a found shape with the forces it carries. Slices are indexed as
// those of the [Structure] it belongs to.
type Form struct {
	Position []r3.Vec  // m
	Force    []float64 // member forces, N, tension positive
	Warp     []r3.Vec  // unit warp direction in the plane of each deformed triangle
	Stress   []Stress  // N/m
	// Reaction is the force of the support on each node, N, zero in
	// directions in which no support holds it.
	Reaction []r3.Vec
	// Couple is, for each ring, the moment about its centre by which what
	// carries a rigid ring restrains its rotation, N·m.
	Couple []r3.Vec
	// Pressure is the pressure found in each enclosure, Pa.
	Pressure []float64

	// Steps says in plain words, in order, what the front door did.
	Steps []string
	// Engines are the names of the engines used.
	Engines []string
	// Converged is what the last engine claims; the audit decides.
	Converged bool
	Why       string // the engine's reason when it does not
}

// NewForm returns a Form for s with all slices allocated and the positions of
// s copied.
func NewForm(s *Structure) *Form {
	f := &Form{
		Position: make([]r3.Vec, len(s.Position)),
		Force:    make([]float64, len(s.Ends)),
		Warp:     make([]r3.Vec, len(s.Corners)),
		Stress:   make([]Stress, len(s.Corners)),
		Reaction: make([]r3.Vec, len(s.Position)),
		Couple:   make([]r3.Vec, len(s.Rings)),
	}
	if n := len(s.Enclosures); n > 0 {
		f.Pressure = make([]float64, n)
	}
	copy(f.Position, s.Position)
	return f
}
