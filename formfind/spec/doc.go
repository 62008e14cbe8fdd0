// Package spec reads model files: YAML text, written by a person, that says
// what a designer wants, CSV tables of engineers who bring their own topology,
// and outlines that were drawn elsewhere.
//
// [Read] checks everything it reads and reports all errors at once, each with
// file, line, column, the offending text, what is wrong and the way out:
//
//	sail.yaml:12:7: unknown key "forse"; did you mean "force"?
//
// One table of keys (in format.go) says what a model may hold. The reader
// follows it, and so do the JSON Schema for editors ([Schema]) and the
// reference page ([Reference]); they cannot drift apart.
//
// # Quantities
//
// Quantities carry units: 25 kN, 2.5 kN/m, 600 mm, 8 %, 3 deg. A bare number
// is in m, kN, kN/m, kN/m² or degrees, by what is asked for, and a ratio is a
// bare number. Everything is SI (m, N, N/m, N/m², rad) in the [canopy.Model].
//
// # Tables
//
// CSV tables start with a header row that names the columns, with the unit of
// a column in brackets where it is not the bare one: x [mm]. Lines that start
// with # are comments. They are streamed into the flat arrays of a
// [canopy.Structure]; a million rows take a fraction of a second.
//
// # Outlines
//
// An outline is a drawing (DXF or a CSV of points) beside the model file. Its
// layers become edges, cables, masts, guys and points, its faces fabrics with
// the holes, lines and points inside them; see package [outline]. An OBJ or STL
// mesh becomes a listed structure. Faults of a drawing are told with its file
// and line and with places in its unit.
package spec

import _ "anticlast/formfind/canopy" // for the links above
