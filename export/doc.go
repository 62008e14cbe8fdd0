// Package export turns a result into what other people and programs take over:
// tables, pictures, a scene for viewers, meshes, a summary to read. It holds no
// mechanics: every number it writes is in the result, or is a plain sum, ratio
// or conversion of units of such numbers.
//
// A format is one file of this package and one line in the table [Formats].
// Each writes to an [io.Writer] and nothing else. [Folder] writes several into
// a folder that is swapped in whole, so that a folder is always from one run.
//
// In files for people lengths are in m, forces in kN, stresses in kN/m and
// angles in degrees, always with the unit beside the number. Same result, same
// bytes.
package export
