// Package engine holds what all equilibrium engines share: the interface,
// settings, status, and the recorder of how an iteration went.
package engine

import (
	"context"

	"anticlast/formfind/canopy"
)

// Engine finds a shape in equilibrium.
type Engine interface {
	// Name is the engine's short name, as used in reports and traces.
	Name() string
	// Find starts at start (which it does not change; nil means the
	// positions of s) and returns the shape it found and what it claims
	// about it. It leaves out members with law canopy.CableBalance.
	//
	// An error is returned when the structure cannot be treated at all or
	// ctx is done; an iteration that stalls or diverges is an Outcome, not
	// an error, and the best shape seen is returned with it.
	Find(ctx context.Context, s *canopy.Structure, start *canopy.Form, set Settings) (*canopy.Form, Outcome, error)
}

// Settings control an engine. The zero value is ready to use.
type Settings struct {
	// MaxIterations bounds the iterations. Zero: the engine's own default.
	MaxIterations int
	// Residual is the wanted η = ‖r‖₂/‖s‖₂ over free nodes, sᵢ the sum of
	// the sizes of the forces that meet at node i. Zero: 1e-9.
	Residual float64
	// Worst is the wanted maxᵢ|rᵢ| / max sᵢ. Zero: 1e-8.
	Worst float64
	// Move is the wanted last move over the size of the model. Zero: 1e-9.
	Move float64
	// AllDirections makes the engine balance all directions of fabric
	// nodes instead of the shape-changing ones only. See the engine's doc
	// for when that is sound.
	AllDirections bool
	// Progress, if set, is called now and then from the engine's goroutine.
	Progress func(Step)
	// Recorder, if set, records every iteration.
	Recorder *Recorder
}

// WithDefaults returns s with zero values replaced by the documented defaults.
func (s Settings) WithDefaults(maxIterations int) Settings {
	if s.MaxIterations == 0 {
		s.MaxIterations = maxIterations
	}
	if s.Residual == 0 {
		s.Residual = 1e-9
	}
	if s.Worst == 0 {
		s.Worst = 1e-8
	}
	if s.Move == 0 {
		s.Move = 1e-9
	}
	return s
}

// Step tells how far an iteration has come.
type Step struct {
	Engine    string
	Stage     string // in plain words, e.g. "level 2 of 3"
	Iteration int
	Residual  float64 // η
	Target    float64
}

// Status says how an iteration ended.
type Status uint8

// Statuses of an iteration.
const (
	NotRun    Status = iota
	Converged        // all criteria met
	Stalled          // no progress, or out of iterations
	Diverged         // grew without bound or left the numbers
)

var statusNames = [...]string{"not run", "converged", "stalled", "diverged"}

func (s Status) String() string { return statusNames[s] }

// Outcome is what an engine claims about its result.
type Outcome struct {
	Status     Status
	Why        string // in plain words, when not converged
	Iterations int
	Residual   float64 // η at the end
	Worst      float64
	Move       float64
	// NegativePivots of the last tangent factorised, at the returned shape or a
	// last small step before it; −1 when the engine factorises none, or solved
	// its steps without. Not known is not stable.
	NegativePivots int
}
