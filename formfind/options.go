package formfind

import (
	"errors"
	"fmt"

	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/newton"
)

// Method chooses how a shape is found.
type Method uint8

// Methods.
const (
	// MethodAuto chains force density, natural force density and Newton as
	// the structure asks, and falls back on relaxation.
	MethodAuto Method = iota
	// MethodRelax finds the shape by dynamic relaxation from the
	// force-density start.
	MethodRelax
)

// ParseMethod reads the name of a method: "auto" or "relax".
func ParseMethod(s string) (Method, error) {
	switch s {
	case "", "auto":
		return MethodAuto, nil
	case "relax":
		return MethodRelax, nil
	}
	return 0, fmt.Errorf("unknown method %q: use auto or relax", s)
}

// Options of [Find] and [Solve]. The zero value is ready to use.
type Options struct {
	Method Method
	// CrossCheck has a second engine find the shape independently and the
	// two compared; they must agree to 1e-6 of the model's size, else the
	// result is not trusted.
	CrossCheck bool
	// Warm is a Form of the same structure, perhaps with other positions or
	// prestress, from which to start instead of from force densities.
	Warm *canopy.Form
	// Listed says that the positions of the structure's free nodes mean
	// something: if they are an equilibrium themselves, and an unstable one,
	// that is what is returned, not trusted. [Find] sets it for listed models.
	Listed bool
	// Progress, if set, is called now and then.
	Progress func(engine.Step)
	// Recorder, if set, records every iteration of every engine.
	Recorder *engine.Recorder
	// Stage, if set, is told when a stage begins: "mesh", "solve", "balance" (the
	// pass that balances fabric in all directions), "cross-check", "audit",
	// "limits".
	Stage func(name string)

	below   *canopy.Form   // the surface found on the mesh half as fine
	solver  *newton.Solver // that found it
	parents [][2]int32     // how the mesh refines that one, see mesh.Refinement
	ahead   *ahead         // prepares finer levels, nil
	level   string         // which of several levels this is
	eased   bool           // the ratio of warp to weft has been eased
	stiff   bool           // links of a length make single nodes far worse than the mean
	live    bool           // started from an earlier form: answer soon
	surface bool           // leave out the pass that balances in all directions
}

// ErrEmpty is returned for a structure with nothing to find.
var ErrEmpty = errors.New("formfind: there is nothing to find: no member and no triangle carries force")

// NoEquilibriumError says that what was asked for cannot be in equilibrium,
// or that no engine could find equilibrium, with the number that would work
// where it is known.
type NoEquilibriumError struct {
	// Shown is true when a known limit was passed or a collapse was seen,
	// false when the engines merely did not get there.
	Shown bool
	Text  string
	// Quantity names what was Given beyond its Limit, in SI; empty when not
	// known.
	Quantity     string
	Given, Limit float64
	// Tried says what was done, in order.
	Tried []string

	met *stand // where a walk met the limit
}

func (e *NoEquilibriumError) Error() string { return e.Text }

func (o *Options) begin(stage string) {
	if o.Stage != nil {
		o.Stage(stage)
	}
}
