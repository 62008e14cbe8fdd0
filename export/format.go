package export

import (
	"context"
	"fmt"
	"io"
	"slices"
	"strings"

	"anticlast/formfind/canopy"
	"anticlast/formfind/formfile"
)

// Options are choices of those who write. The zero value is ready to use.
type Options struct {
	// Force lets Folder take the place of a folder that this program did
	// not write. That folder is kept beside it under another name.
	Force bool
	// Width of the summary in columns; 0 = 80.
	Width int
	// Ground adds to GLB scenes a ground plane under the structure and a
	// levelling staff beside it, banded in metres.
	Ground bool
	// PictureWidth is the width of pictures in pixels, those beneath the lines
	// of drawings and reports included; 0 = 1600.
	PictureWidth int
	// Colour allows terminal colours in the summary.
	Colour bool
}

func (o Options) pictureWidth() float64 {
	if o.PictureWidth == 0 {
		return 1600
	}
	return float64(min(max(o.PictureWidth, 100), 8000))
}

// A Format is one kind of file.
type Format struct {
	Name    string // as asked for, e.g. "glb"
	File    string // name in a folder, e.g. "form.glb"
	Ext     string // extension with its dot
	Purpose string // what it is for, in a line
	Write   func(context.Context, io.Writer, *canopy.Result, Options) error
}

// Formats returns the table of formats in the order of listings.
func Formats() []Format {
	return []Format{
		{"json", "form.json", ".json", "the whole result, to check and export again",
			func(ctx context.Context, w io.Writer, r *canopy.Result, _ Options) error {
				return formfile.Write(ctx, w, r)
			}},
		{"glb", "form.glb", ".glb", "3D scene for viewers and browsers (glTF 2.0), with values in colour", writeGLB},
		{"nodes", "nodes.csv", ".csv", "table of nodes", writeNodes},
		{"members", "members.csv", ".csv", "table of cables, masts and struts with lengths and forces", writeMembers},
		{"triangles", "triangles.csv", ".csv", "table of fabric triangles with stresses", writeTriangles},
		{"reactions", "reactions.csv", ".csv", "table of reactions and actions on foundations", writeReactions},
		{"summary", "summary.txt", ".txt", "what was found, to read in ten seconds", writeSummary},
		{"report", "report.html", ".html", "the whole story on one page, with a live 3D view", writeReport},
		{"svg", "drawings.svg", ".svg", "plan, elevations and axonometric with dimensions and forces", writeSVG},
		{"png", "picture.png", ".png", "axonometric picture with values in colour", writePNG},
		{"handover", "handover.zip", ".zip", "everything an analysis engineer needs to rebuild the structure", writeHandover},
		{"dxf", "form.dxf", ".dxf", "CAD drawing with layers, names and forces (DXF release 12)", writeDXF},
		{"ifc", "form.ifc", ".ifc", "structural model with prestress and supports (IFC4), experimental", writeIFC},
		{"obj", "form.obj", ".obj", "mesh and cables for modelling programs", writeOBJ},
		{"stl", "form.stl", ".stl", "fabric for printers and mesh tools", writeSTL},
		{"ply", "form.ply", ".ply", "fabric with nodes in double precision and values in colour", writePLY},
		{"vtu", "form.vtu", ".vtu", "stresses, forces and reactions for scientific viewers (VTK XML)", writeVTU},
	}
}

// Standard are the names of the formats that make up a result folder.
func Standard() []string {
	return []string{"json", "glb", "nodes", "members", "triangles", "reactions", "summary"}
}

// Lookup finds a format by name, file name or extension. The error of a name
// that does not exist suggests the nearest.
func Lookup(name string) (Format, error) {
	wanted := strings.TrimPrefix(strings.ToLower(name), ".")
	formats := Formats()
	for _, f := range formats {
		if wanted == f.Name || wanted == f.File {
			return f, nil
		}
	}
	// An extension serves when only one format has it.
	var byExt []Format
	for _, f := range formats {
		if "."+wanted == f.Ext {
			byExt = append(byExt, f)
		}
	}
	if len(byExt) == 1 {
		return byExt[0], nil
	}
	if len(byExt) > 1 {
		var names []string
		for _, f := range byExt {
			names = append(names, f.Name)
		}
		return Format{}, fmt.Errorf("%q is ambiguous: say which of %s", name, strings.Join(names, ", "))
	}
	var names []string
	for _, f := range formats {
		names = append(names, f.Name)
	}
	nearest := slices.MinFunc(names, func(a, b string) int { return distance(wanted, a) - distance(wanted, b) })
	if distance(wanted, nearest) <= 1+len(wanted)/3 {
		return Format{}, fmt.Errorf("there is no format %q; did you mean %q?", name, nearest)
	}
	return Format{}, fmt.Errorf("there is no format %q; there are %s", name, strings.Join(names, ", "))
}

// distance is the number of letters to insert, drop or change to make b of a.
func distance(a, b string) int {
	row := make([]int, len(b)+1)
	for j := range row {
		row[j] = j
	}
	for i := range len(a) {
		diagonal := row[0]
		row[0] = i + 1
		for j := range len(b) {
			cost := diagonal
			if a[i] != b[j] {
				cost++
			}
			diagonal = row[j+1]
			row[j+1] = min(cost, row[j]+1, row[j+1]+1)
		}
	}
	return row[len(b)]
}
