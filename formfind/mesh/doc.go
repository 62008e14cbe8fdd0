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
// Any other outline, with a ring in it or without, and any boundary whose edges
// must be divided otherwise than the patch asks for, is triangulated in the
// plane of its vector area: constrained Delaunay (Lawson 1977; Sloan 1993) with exact
// predicates (after Shewchuk 1997), refined by circumcentres (Chew 1989;
// Ruppert 1995), smoothed, and lifted into space by mean value coordinates
// (Floater 2003). Its sides may be divided in any way.
//
// # Nets
//
// The lines of a net run along the sides of its boundary where that is a fair
// patch of three or four sides, by transfinite interpolation as above. Straight
// lines of two or three families are laid in plan (in the plane of its vector
// area where the boundary stands upright), symmetric about the middle of the
// outline, and cut at the boundary and at holes, with edge cables where their
// forces are expected to pull them. A crossing nearer to the boundary than a third
// of the spacing is put on it; line ends nearer than that to each other or to a
// corner are put together; links that double others, run beside the boundary or
// leave the net, and crossings of fewer than three links, are left out. So no
// link is shorter than a third of the spacing. Edges that bound only such nets
// are divided where lines end. Radial nets join even divisions of the boundary to
// the same parts of the hole's length, turned so that the sum of the squares of
// the lines is least.
//
// Equal-mesh nets start as straight lines a mesh apart, and are laid again in the
// shape found (BuildLaid, Laid.Again): each line is continued mesh by mesh beyond
// where it ended, and cut at the edge cables where they now are.
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
