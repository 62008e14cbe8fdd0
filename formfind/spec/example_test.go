package spec_test

import (
	"context"
	"fmt"
	"strings"

	"anticlast/formfind/spec"
)

// A model with two mistakes: both are found, each with the way out.
func ExampleRead() {
	text := `anticlast: 1
points:
  A: [0, 0, 3]
  B: [8, 0, 5]
edges:
  AB: {from: A, to: D, cable: {forse: 20 kN}}
`
	_, err := spec.Read(context.Background(), spec.Input(strings.NewReader(text), "."), spec.Options{})
	fmt.Println(err)
	// Output:
	// -:6:21: point "D" is not defined; the points are A and B
	// -:6:32: unknown key "forse"; did you mean "force"?
}

func ExampleRead_set() {
	sail := spec.Samples()[0]
	m, err := spec.Read(context.Background(), spec.Input(strings.NewReader(sail.Text), "."), spec.Options{
		Set: []string{"points.B.z=6.2", "edges.AB.cable.force=24 kN"},
	})
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Println(m.Title)
	fmt.Printf("B is %.1f m high, AB carries %.0f kN\n", m.Points[1].At.Z, m.Cables[0].Force/1000)
	// Output:
	// Four-point sail
	// B is 6.2 m high, AB carries 24 kN
}

func ExampleParseQuantity() {
	v, err := spec.ParseQuantity("600 mm", spec.Length)
	fmt.Println(v, err)
	_, err = spec.ParseQuantity("25 kN", spec.Length)
	fmt.Println(err)
	// Output:
	// 0.6 <nil>
	// "25 kN" is a force, not a length; a length is written in m, mm, cm or km
}
