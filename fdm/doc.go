// Package fdm finds equilibrium shapes of cable nets and membranes by force
// densities. It stands by itself: give it nodes, members and numbers.
//
// The force density of a member is its force over its length, q = T/L in N/m.
// With given force densities the balance of forces at every free node,
//
//	Σ q_ij (x_j − x_i) + p_i = 0,
//
// is linear in the positions, the same for x, y and z, and the shape comes from
// one sparse symmetric solve whatever the start (Schek 1974):
//
//	s, err := fdm.New(ctx, network, nil) // analyse the connections once
//	err = s.Shape(ctx, x, q)             // a shape for every q
//
// # Three ways to a shape
//
// [Solver.Shape] takes force densities as they are. [Solver.Fit] changes them
// until members have given forces, lengths, unstressed lengths or sags.
// [Solver.Natural] works on fabric: the wanted stress of triangles and the
// given forces of cables become force densities on a reference shape (Pauletti
// & Pimenta 2008), with the true stress of the result reported beside it. A
// fabric canopy takes Shape, a few Natural updates, and, after other means have
// found the prescribed-stress surface, one more Natural pass with that as
// reference for a balance exact to rounding.
//
// # Supports, ties, loads
//
// A support may hold a node in any of the three directions. Directions with the
// same free nodes share one factorisation and are solved together. Nodes may be
// tied to others (the nodes of a rigid ring to its centre); loads are dead
// loads at nodes.
//
// # Conventions
//
// Units are m, N, N/m. Tension is positive; a negative force density is a strut
// and makes the system indefinite, which costs about twice the time. Reactions
// are forces of the supports on the structure. Results do not depend on the
// number of processors.
//
// # When there is no shape
//
// A part that hangs on nothing, and force densities that cancel, have no shape
// or too many. [SingularError] names the nodes and the reason. Parts without
// support are found by walking the network, not by a zero pivot, which rounding
// would hide.
//
// # References
//
// H.-J. Schek: The force density method for form finding and computation of
// general networks. Comput. Methods Appl. Mech. Eng. 3 (1974), 115-134.
//
// R. M. O. Pauletti, P. M. Pimenta: The natural force density method for the
// shape finding of taut structures. Comput. Methods Appl. Mech. Eng. 197 (2008),
// 4419-4428.
package fdm
