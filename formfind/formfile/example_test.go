package formfile_test

import (
	"bytes"
	"context"
	"fmt"

	"anticlast/formfind/canopy"
	"anticlast/formfind/formfile"

	"gonum.org/v1/gonum/spatial/r3"
)

// A cable between two anchors, written and read back.
func Example() {
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

	ctx := context.Background()
	var file bytes.Buffer
	if err := formfile.Write(ctx, &file, &canopy.Result{Title: "Cable", Structure: s, Form: f}); err != nil {
		fmt.Println(err)
		return
	}
	r, err := formfile.Read(ctx, &file, "form.json")
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("%s: %g N between %v and %v\n", r.Title, r.Form.Force[0], r.Form.Position[0], r.Form.Position[1])
	// Output: Cable: 25000 N between {0 0 0} and {5 0 0}
}
