package mesh_test

import (
	"fmt"
	"math"

	"anticlast/formfind/canopy"
	"gonum.org/v1/gonum/spatial/r3"
)

// Invented models that the tests share.

func pt(name string, x, y, z float64) canopy.Point {
	return canopy.Point{Name: name, At: r3.Vec{X: x, Y: y, Z: z}}
}

// cableEdge adds an edge that is a cable of its own.
func cableEdge(m *canopy.Model, name, from, to string, c canopy.ModelCable) {
	m.Edges = append(m.Edges, canopy.Edge{Name: name, From: from, To: to, Kind: canopy.EdgeCable, Role: canopy.KindEdgeCable, Cable: name})
	c.Name, c.Edges = name, []string{name}
	m.Cables = append(m.Cables, c)
}

func fixedEdge(m *canopy.Model, name, from, to string) {
	m.Edges = append(m.Edges, canopy.Edge{Name: name, From: from, To: to})
}

func sail(name string, boundary ...string) canopy.ModelFabric {
	return canopy.ModelFabric{Name: name, Boundary: boundary, WarpDir: r3.Vec{X: 1}, Warp: 2000, Weft: 2000}
}

// polygon is a sail of n corners, alternately high and low.
func polygon(n int) *canopy.Model {
	m := &canopy.Model{}
	var names []string
	for i := range n {
		a := 2 * math.Pi * float64(i) / float64(n)
		z := 3.0
		if i%2 == 1 {
			z = 6
		}
		m.Points = append(m.Points, pt(fmt.Sprintf("P%d", i), 8*math.Cos(a), 8*math.Sin(a), z))
	}
	for i := range n {
		e := fmt.Sprintf("e%d", i)
		cableEdge(m, e, fmt.Sprintf("P%d", i), fmt.Sprintf("P%d", (i+1)%n), canopy.ModelCable{Force: 20e3})
		names = append(names, e)
	}
	m.Fabrics = []canopy.ModelFabric{sail("sail", names...)}
	return m
}

// cone is a square with a ring in the middle, carried by a mast and two guys.
func cone() *canopy.Model {
	m := polygon(4)
	for i := range m.Points {
		m.Points[i].At.Z = 3
	}
	m.Points = append(m.Points, pt("M", 0, 0, 8), pt("F", 0, 0, 0), pt("G1", -6, 1, 0), pt("G2", 6, 1, 0))
	m.Rings = []canopy.ModelRing{{Name: "top", At: "M", Radius: 0.6, Rigid: true, Weight: 800}}
	m.Fabrics[0].Ring = "top"
	m.Fabrics[0].WarpRule = canopy.WarpRadial
	m.Stays = []canopy.Stay{
		{Name: "mast", Mast: true, From: "F", To: "M"},
		{Name: "g1", From: "M", To: "G1"},
		{Name: "g2", From: "M", To: "G2"},
	}
	return m
}

// vault is two fabrics on two end walls and an arch between them.
func vault() *canopy.Model {
	m := &canopy.Model{}
	for i, x := range []float64{0, 6, 12} {
		m.Points = append(m.Points, pt(fmt.Sprintf("S%d", i), x, 0, 0), pt(fmt.Sprintf("N%d", i), x, 10, 0))
		m.Edges = append(m.Edges, canopy.Edge{
			Name: fmt.Sprintf("a%d", i), From: fmt.Sprintf("S%d", i), To: fmt.Sprintf("N%d", i),
			Arc: true, Through: r3.Vec{X: x, Y: 5, Z: 3}, Arch: i == 1,
		})
	}
	for i := range 2 {
		cableEdge(m, fmt.Sprintf("s%d", i), fmt.Sprintf("S%d", i), fmt.Sprintf("S%d", i+1), canopy.ModelCable{Sag: 0.1})
		cableEdge(m, fmt.Sprintf("n%d", i), fmt.Sprintf("N%d", i), fmt.Sprintf("N%d", i+1), canopy.ModelCable{Sag: 0.1})
		m.Fabrics = append(m.Fabrics, sail(fmt.Sprintf("bay%d", i), fmt.Sprintf("s%d", i), fmt.Sprintf("a%d", i+1), fmt.Sprintf("n%d", i), fmt.Sprintf("a%d", i)))
	}
	return m
}

// net is a cable net on the four-point saddle.
func net(sides int) *canopy.Model {
	m := polygon(sides)
	b := m.Fabrics[0].Boundary
	m.Fabrics = nil
	m.Nets = []canopy.Net{{Name: "roof", Boundary: b, Families: []canopy.Family{{Spacing: 1, Force: 5e3}, {Spacing: 1.25, ForceDensity: 4e3, Stiffness: 1e7}}}}
	return m
}

// ridges is a square of four triangular panels on cables that meet in the middle.
func ridges() *canopy.Model {
	m := polygon(4)
	m.Fabrics = nil
	m.Points = append(m.Points, canopy.Point{Name: "C", At: r3.Vec{Z: 7}, Hold: canopy.HoldAnchored})
	for i := range 4 {
		r := fmt.Sprintf("r%d", i)
		cableEdge(m, r, fmt.Sprintf("P%d", i), "C", canopy.ModelCable{Force: 30e3})
		m.Edges[len(m.Edges)-1].Role = canopy.KindRidgeCable
	}
	for i := range 4 {
		m.Fabrics = append(m.Fabrics, sail(fmt.Sprintf("f%d", i), fmt.Sprintf("e%d", i), fmt.Sprintf("r%d", (i+1)%4), fmt.Sprintf("r%d", i)))
	}
	return m
}

func lens() *canopy.Model {
	m := &canopy.Model{Points: []canopy.Point{pt("A", 0, 0, 0), pt("B", 10, 0, 0)}}
	m.Edges = []canopy.Edge{
		{Name: "ab", From: "A", To: "B", Arc: true, Through: r3.Vec{X: 5, Y: -3, Z: 1}},
		{Name: "ba", From: "B", To: "A", Arc: true, Through: r3.Vec{X: 5, Y: 3, Z: 1}},
	}
	m.Fabrics = []canopy.ModelFabric{sail("lens", "ab", "ba")}
	return m
}

// laws is a four-point sail whose cables each follow another law.
func laws() *canopy.Model {
	m := polygon(4)
	m.Cables[1] = canopy.ModelCable{Name: "e1", Edges: []string{"e1"}, Sag: 0.1, Weight: 12, Strength: 2e5}
	m.Cables[2] = canopy.ModelCable{Name: "e2", Edges: []string{"e2"}, Stiffness: 1e7, Unstressed: 11.5}
	m.Cables[3] = canopy.ModelCable{Name: "e3", Edges: []string{"e3"}, ForceDensity: 3e3}
	return m
}

var all = map[string]func() *canopy.Model{
	"triangle":    func() *canopy.Model { return polygon(3) },
	"four-point":  func() *canopy.Model { return polygon(4) },
	"laws":        laws,
	"five-point":  func() *canopy.Model { return polygon(5) },
	"seven-point": func() *canopy.Model { return polygon(7) },
	"cone":        cone,
	"vault":       vault,
	"ridges":      ridges,
	"lens":        lens,
	"net":         func() *canopy.Model { return net(4) },
	"net of 3":    func() *canopy.Model { return net(3) },
}
