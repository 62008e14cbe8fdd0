// Package canopy holds the values that pass through Anticlast, and nothing else.
//
// Data flows in one direction:
//
//	Model ──mesh──▶ Structure ──engine──▶ Form ──audit, limit──▶ Result ──export──▶ files
//
// A [Model] is what the designer wants: points, edges, fabrics, nets, rings,
// masts, guys and limits. A [Structure] is the same intent as flat arrays of
// nodes, members and triangles that engines run over at memory speed. A [Form]
// is one shape in (claimed) equilibrium with the forces it carries. A [Result]
// is a Form together with its [Audit] and [Finding] list, ready to be written.
//
// The package imports nothing of the module's own, so that mesher, engines,
// audit and writers can share these values without knowing each other.
//
// Conventions everywhere: SI units (m, N, N/m, N/m², Pa, rad), z up, tension
// positive. A reaction is the force of a support on the structure; the action
// on the foundation is its opposite.
package canopy
