package outline_test

import (
	"fmt"
	"strings"

	"anticlast/formfind/outline"
)

// A sail from a table of points in mm, with a hole.
func ExampleTrace() {
	d, err := outline.ReadCSV(strings.NewReader(`layer,x [mm],y [mm]
RIM,0,0
RIM,9000,0
RIM,9000,7000
RIM,0,7000
RIM,0,0

TREE,4000,3000
TREE,5000,3000
TREE,4500,4000
TREE,4000,3000
`))
	if err != nil {
		fmt.Println(err)
		return
	}
	d.Scale(d.Unit)
	o, faults := outline.Trace(d, []outline.Layer{
		{Name: "RIM", Class: outline.Border, Cable: true},
		{Name: "TREE", Class: outline.Border, Hole: true},
	}, outline.Options{Unit: d.Unit, Snap: 0.005})
	for _, f := range faults {
		fmt.Println(f)
	}
	for _, f := range o.Faces {
		for _, e := range f.Boundary {
			fmt.Print(o.Edges[e].Name, " ")
		}
		fmt.Println("around", len(f.Holes), "hole")
	}
	// Output: RIM:1 RIM:2 RIM:3 RIM:4 around 1 hole
}
