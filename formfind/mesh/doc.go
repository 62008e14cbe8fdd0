// Package mesh turns what the designer drew into what engines solve: a
// canopy.Model of points, edges, fabrics, nets, rings, masts and guys becomes a
// canopy.Structure of nodes, members and triangles.
//
// # How a model is divided
//
// Every edge is divided once and its nodes are shared by all that meets along
// it, so that parts fit by construction and never by a tolerance. How many mesh
// sides an edge gets follows from the wanted length of a side (the fabric's, the
// model's, or one chosen so that the whole canopy has about 1,600 triangles),
// from the spacing of net lines, or from the edge itself (Edge.Segments), which
// wins. Where its shape allows that without thin triangles, a fabric is meshed
// by a structured patch whose lines follow the boundary, and so the yarn laid
// along it:
//
//   - four sides (or a boundary whose corners group it into four sides with as
//     many edges on opposite ones): a grid by transfinite interpolation
//     (Coons 1967); opposite sides are divided alike;
//   - three sides: a triangular grid; all sides alike;
//   - two sides, each broken in its middle: two triangular grids back to back;
//   - five sides or more: each side is halved and joined to the middle, one
//     grid at each corner (midpoint subdivision); all sides alike and even;
//   - around a ring, any number of sides, divided as they like: radial lines
//     with layers whose depth grows with the distance from the ring.
//
// Any other outline, with holes, lines and points in it, and any boundary whose
// edges must be divided otherwise than the patch asks for, is triangulated in a
// plane in which it does not overlap itself, first of all that of its vector area:
// constrained Delaunay (Lawson 1977; Toussaint and Avis 1982) with exact predicates (after
// Shewchuk 1997), filled by an advancing front (Rebay 1993) and refined by
// circumcentres (Chew 1993; Ruppert 1995), smoothed, and lifted into space by mean
// value coordinates (Floater 2003). Its sides may be divided in any way. Where it is
// narrower than they are long they are divided further, at places of their curve
// and for all fabrics along them, until no angle is below [AngleBound] but in sharp
// corners. Left as they are: edges whose number of segments is given, edges of
// structured patches and of nets, and cables with a force density, whose force
// hangs on that number. [BuildMeasured] says how well that went, and what stood in the way where an
// angle is below [AngleBound]. The model may ask for either kind, and give the
// plane.
//
// Rim cables start about at the sag that the prestress will give them, so that
// the mesh of the found shape is about as even as that of the start. Numbers of
// sides chosen here are even, and diagonals of structured patches mirror about
// their middle, so that a symmetric model has a symmetric mesh.
//
// # Names
//
// A node at a point carries the point's name, nodes along edge AB are AB:1,
// AB:2, … from its first point, members along it AB:1, AB:2, …; nodes inside
// fabric sail are sail:1, …, of ring top top:1, …; line 3 of the first family
// of net roof is roof/1:3 and its links roof/1:3:1, ….
package mesh
