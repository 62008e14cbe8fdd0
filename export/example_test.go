package export_test

import (
	"context"
	"fmt"
	"os"

	"anticlast/export"
	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

// A cable between two anchors as a table.
func ExampleLookup() {
	s := &canopy.Structure{
		Position: []r3.Vec{{X: 0}, {X: 5}},
		Fixed:    []canopy.Freedom{canopy.DirAll, canopy.DirAll},
		Ends:     [][2]int32{{0, 1}},
		Kind:     []canopy.Kind{canopy.KindCable},
		Law:      []canopy.Law{canopy.LawForce},
		Given:    []float64{25e3},
	}
	f := canopy.NewForm(s)
	f.Force[0] = 25e3
	f.Reaction = []r3.Vec{{X: -25e3}, {X: 25e3}}

	format, err := export.Lookup("summary")
	if err != nil {
		fmt.Println(err)
		return
	}
	r := &canopy.Result{Title: "Cable", Structure: s, Form: f}
	if err := format.Write(context.Background(), os.Stdout, r, export.Options{Width: 72}); err != nil {
		fmt.Println(err)
	}
	// Output:
	// Cable
	// NOT TRUSTED: no audit was made.
	// 2 nodes, 1 member
	//
	// Net
	//   1 member, forces 25.00 kN
	//
	// Largest reactions (support on structure; foundations feel the opposite)
	//   node  size kN    x kN  y kN  z kN
	//   0       25.00  -25.00  0.00  0.00
	//   1       25.00   25.00  0.00  0.00
	//
	// Audit
	//   largest nodal residual 0.0e+00 of the forces meeting there; reactions
	//   balance to 0.0e+00 (moments 0.0e+00); virial identity to 0.0e+00
	//   stability: not known
	//
	// For preliminary design only. Not a structural verification: local codes
	// and a licensed structural engineer decide. See SAFETY.md.
}
