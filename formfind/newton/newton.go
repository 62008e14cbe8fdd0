// Package newton finds static equilibrium by Newton's method on the tangent
// stiffness, in the directions that can change the shape.
//
// A film of prescribed stress has no stiffness against sliding in its own
// plane: nodes may move along the surface without changing it, and a method
// that balances all three directions slides them until triangles collapse. So
// each node gets only the directions that change the shape:
//
//   - a fabric node without cables: the area-weighted normal of its triangles;
//   - a node on one cable, or on a line where three or more films meet: the two
//     directions across the line (three where the members on both sides resist
//     sliding by a stiffness or force density of their own);
//   - a node where cables meet, or without fabric: all directions (a node of
//     one given-force cable in space: the two across).
//
// Supported and held directions are left out. The nodes of a rigid ring move
// with its centre. With B the orthonormal directions (refreshed every step), g
// the gradient and H the tangent, a step solves
//
//	(Bᵀ H B) u = −Bᵀ g
//
// by a sparse factorisation, or with the help of a coarser mesh (see
// [Solver.Above]). Where the tangent is not positive definite a
// growing multiple of the identity is added until it is; steps are shortened
// until the residual or the energy falls and no triangle is turned over.
//
// Cables of common force (sliding cables of given sag, of given length, or
// elastic as a whole) bring one unknown force and one condition each; they are
// solved together with the shape by the Schur complement of the bordered
// system.
//
// Fabric of unequal warp and weft stress: along the normal only their ratio
// matters, and the surface found holds it everywhere. In its plane a constant
// magnitude is in balance only by chance, so a smooth factor with mean 1 over
// each fabric is fitted by least squares to the balance in all directions, and
// for each chain of given or common force bonded to such fabric a distribution
// of its force with mean 1 (by length). Fits and shape are found in turn; the
// form has the stresses and forces that balance the shape along its normals.
// The iteration is then accelerated by mixing steps (Anderson 1965).
//
// Left out of the tangent: the turning of B, and the change of area- and
// length-dependent weights. They make the last steps converge linearly with a
// small factor instead of quadratically. Of pressure the symmetric part is
// taken; the rest vanishes for closed surfaces and fixed boundaries.
//
// Sources of the pieces: member tangents are standard (e.g. Argyris & Scharpf
// 1972); the second derivative of the area as in the discrete minimal surface
// literature (Pinkall & Polthier 1993); modified Newton and sufficient decrease
// as in Nocedal & Wright, Numerical Optimization, 2006, chapters 3 and 16;
// inertia of bordered systems as ibid., theorem 16.3.
package newton

import (
	"context"
	"errors"
	"fmt"

	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
)

// Name of the engine in reports and traces.
const Name = "newton"

// DefaultIterations bounds the iterations when the settings do not.
const DefaultIterations = 60

var (
	// ErrElasticFabric is returned for fabric whose stress follows strain.
	ErrElasticFabric = errors.New("newton: elastic fabric is not treated")
	// ErrNotTension is returned for a fabric stress that is not positive.
	ErrNotTension = errors.New("newton: fabric stress must be positive")
)

// FreeEdgeError says that an edge of fabric between two free nodes has neither
// a cable nor a support. Nothing could carry the film's pull there.
type FreeEdgeError struct {
	Nodes [2]int32
	Names [2]string
}

func (e *FreeEdgeError) Error() string {
	return fmt.Sprintf("newton: the fabric's edge between nodes %s and %s has neither cable nor support", e.Names[0], e.Names[1])
}

// DegenerateError says that an element has no length or no area at the start.
type DegenerateError struct {
	Element string // "member" or "triangle"
	Index   int32
	Name    string
}

func (e *DegenerateError) Error() string {
	return fmt.Sprintf("newton: %s %s has no size at the start", e.Element, e.Name)
}

// Engine is [engine.Engine] without memory between calls. Use a [Solver] for
// repeated calls on one topology.
type Engine struct{}

// Name is the engine's name.
func (Engine) Name() string { return Name }

// Find implements [engine.Engine].
func (Engine) Find(ctx context.Context, s *canopy.Structure, start *canopy.Form, set engine.Settings) (*canopy.Form, engine.Outcome, error) {
	v, err := New(ctx, s)
	if err != nil {
		return nil, engine.Outcome{NegativePivots: -1}, err
	}
	return v.Find(ctx, start, set)
}
