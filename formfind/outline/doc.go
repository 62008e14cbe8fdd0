// Package outline reads outlines that others have drawn: DXF drawings, CSV
// tables of points, and OBJ or STL meshes.
//
// [ReadDXF] and [ReadCSV] give a [Drawing]: straight and curved segments and
// points, each on a layer and with the line of the file it came from. [Trace]
// snaps what was drawn into a network, says where it does not fit together
// (gaps, duplicates, T-junctions, crossings, all with coordinates), and finds
// the faces that fabric fills, with the holes, lines and points inside them, as
// seen from above.
//
// [ReadOBJ] and [ReadSTL] give a [Surface] of triangles, whose boundary
// [Surface.Loops] finds.
//
// # DXF
//
// The ASCII form of DXF as published from release 12 to 2018: pairs of lines, a
// group code and a value. Read are LINE, POLYLINE (two and three dimensions,
// bulges), LWPOLYLINE, ARC, CIRCLE, ELLIPSE, SPLINE and POINT in the section
// ENTITIES, in model space, with extrusion directions (the arbitrary axis rule of
// the DXF reference) and the header variable $INSUNITS. In the place of an ELLIPSE
// or a SPLINE (by its control points) come circular arcs, and lines where it is
// straight, that lie within a thousandth of its size from it; [Drawing.Replaced]
// says how far. Everything else is counted in [Drawing.Ignored].
//
// # Units
//
// A drawing has coordinates in its own unit. Everything that this package gives
// is in metres; messages state coordinates in the unit of the drawing, as they
// are seen there, with its name.
package outline

import _ "anticlast/formfind/canopy" // what outlines become
