package fdm_test

import (
	"context"
	"errors"
	"fmt"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/fdm"
)

// One node between four anchors: it goes to their mean, weighted with the
// force densities.
func Example() {
	network := fdm.Network{
		Position: []r3.Vec{{}, {X: 10, Z: 2}, {X: 10, Y: 10}, {Y: 10, Z: 4}, {}},
		Fixed:    []fdm.Directions{fdm.DirAll, fdm.DirAll, fdm.DirAll, fdm.DirAll, 0},
		Ends:     [][2]int32{{0, 4}, {1, 4}, {2, 4}, {3, 4}},
	}
	ctx := context.Background()
	s, err := fdm.New(ctx, network, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	x := make([]r3.Vec, s.Nodes())
	q := []float64{1000, 1000, 2000, 1000} // N/m
	if err := s.Shape(ctx, x, q); err != nil {
		fmt.Println(err)
		return
	}
	force := make([]float64, s.Members())
	s.Forces(force, x, q)
	fmt.Printf("node at (%.2f, %.2f, %.2f) m\n", x[4].X, x[4].Y, x[4].Z)
	fmt.Printf("forces %.0f N\n", force)
	// Output:
	// node at (6.00, 6.00, 1.20) m
	// forces [8570 7255 11565 7736] N
}

// A hanging cable of given sag: Fit finds its force density.
func ExampleSolver_Fit() {
	network := fdm.Network{
		Position: []r3.Vec{{}, {X: 5}, {X: 10}, {X: 15}, {X: 20}},
		Fixed:    []fdm.Directions{fdm.DirAll, 0, 0, 0, fdm.DirAll},
		Load:     []r3.Vec{{}, {Z: -2000}, {Z: -2000}, {Z: -2000}, {}}, // N
		Ends:     [][2]int32{{0, 1}, {1, 2}, {2, 3}, {3, 4}},
	}
	ctx := context.Background()
	s, err := fdm.New(ctx, network, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	r, err := s.Fit(ctx, []float64{1000, 1000, 1000, 1000},
		[]fdm.Target{{Quantity: fdm.Sag, Members: []int32{0, 1, 2, 3}, Value: 0.10}},
		fdm.FitSettings{Group: []int32{0, 0, 0, 0}})
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("%s: sag %.1f %% of the span, lowest point %.2f m, q = %.0f N/m\n",
		r.Status, 100*r.Reached[0], r.Position[2].Z, r.Q[0])
	// Output:
	// met: sag 10.0 % of the span, lowest point -2.00 m, q = 2000 N/m
}

// A square of fabric with edge cables on two high and two low corners.
func ExampleSolver_Natural() {
	network := fdm.Network{
		Position: []r3.Vec{{}, {X: 6, Z: 2}, {X: 6, Y: 6}, {Y: 6, Z: 2}, {X: 3, Y: 1}, {X: 5, Y: 3}, {X: 3, Y: 5}, {X: 1, Y: 3}, {X: 3, Y: 3}},
		Fixed:    []fdm.Directions{fdm.DirAll, fdm.DirAll, fdm.DirAll, fdm.DirAll, 0, 0, 0, 0, 0},
		Ends:     [][2]int32{{0, 4}, {4, 1}, {1, 5}, {5, 2}, {2, 6}, {6, 3}, {3, 7}, {7, 0}},
	}
	fabric := fdm.Panel{Warp: r3.Vec{X: 1}, WarpStress: 2000, WeftStress: 2000} // N/m
	var panels []fdm.Panel
	for _, c := range [][3]int32{{0, 4, 7}, {4, 1, 5}, {5, 2, 6}, {6, 3, 7}, {4, 5, 8}, {5, 6, 8}, {6, 7, 8}, {7, 4, 8}} {
		fabric.Corners = c
		panels = append(panels, fabric)
	}
	ctx := context.Background()
	s, err := fdm.New(ctx, network, panels)
	if err != nil {
		fmt.Println(err)
		return
	}
	const force = 15000 // N in the edge cables
	x := make([]r3.Vec, s.Nodes())
	if err := s.Shape(ctx, x, uniform(8, force/3.0)); err != nil {
		fmt.Println(err)
		return
	}
	r, err := s.Natural(ctx, x, fdm.Given{Force: uniform(8, force)}, 5)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("middle at (%.2f, %.2f, %.2f) m, edge %.1f kN, warp %.2f kN/m there\n",
		r.Position[8].X, r.Position[8].Y, r.Position[8].Z, r.Force[0]/1000, r.Stress[4].Warp/1000)
	fmt.Println("in balance:", r.Worst < 1e-13)
	// Output:
	// middle at (3.00, 3.00, 1.00) m, edge 15.0 kN, warp 2.00 kN/m there
	// in balance: true
}

// What hangs on nothing is named.
func ExampleSingularError() {
	network := fdm.Network{
		Position: []r3.Vec{{}, {X: 1}, {X: 2}, {X: 3}},
		Fixed:    []fdm.Directions{fdm.DirAll, 0, 0, 0},
		Ends:     [][2]int32{{0, 1}, {2, 3}},
	}
	_, err := fdm.New(context.Background(), network, nil)
	var singular *fdm.SingularError
	if errors.As(err, &singular) {
		fmt.Println(singular.Cause, singular.Nodes)
	}
	fmt.Println(err)
	// Output:
	// no support [2 3]
	// fdm: nothing holds nodes 2 and 3 along x, y and z: no chain of members with a force density other than zero leads to a support; fix a node there, or connect it
}
