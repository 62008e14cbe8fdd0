package mesh_test

import (
	"context"
	"fmt"
	"runtime"
	"strings"
	"testing"

	"anticlast/formfind/canopy"
	"anticlast/formfind/mesh"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

// netOf is a net within P and around H.
func netOf(pattern canopy.NetPattern, spacing [2]float64, p, h []r3.Vec) *canopy.Model {
	m := &canopy.Model{}
	loop := func(name string, at []r3.Vec) (edges []string) {
		for k, v := range at {
			m.Points = append(m.Points, pt(fmt.Sprint(name, k), v.X, v.Y, v.Z))
		}
		for k := range at {
			e := fmt.Sprint(name, "e", k)
			fixedEdge(m, e, fmt.Sprint(name, k), fmt.Sprint(name, (k+1)%len(at)))
			edges = append(edges, e)
		}
		return edges
	}
	n := canopy.Net{Name: "roof", Boundary: loop("P", p), Pattern: pattern}
	if h != nil {
		n.Holes = [][]string{loop("H", h)}
	}
	for k := range 2 {
		n.Families = append(n.Families, canopy.Family{Spacing: spacing[k], MeanForce: 3e3, Stiffness: 1e6})
	}
	m.Nets = []canopy.Net{n}
	return m
}

// What would be divided without bound is refused, before room is made for it.
func TestExplosionsAreRefused(t *testing.T) {
	square := []r3.Vec{{}, {X: 10}, {X: 10, Y: 10}, {Y: 10}}
	at := func(s float64, v ...r3.Vec) (out []r3.Vec) {
		for _, p := range v {
			out = append(out, r3.Scale(s, p))
		}
		return out
	}
	for name, c := range map[string]struct {
		model func() *canopy.Model
		text  string
	}{
		// A rim of 10⁻⁹ m around a hole of metres: three lines with millions of rings.
		"rings of a radial net": {func() *canopy.Model {
			return netOf(canopy.NetRadial, [2]float64{1e-7, 1e-7}, at(1e-10, square[:3]...), square)
		}, "more crossings than the 4 million"},
		"lines of a radial net": {func() *canopy.Model {
			return netOf(canopy.NetRadial, [2]float64{1e-5, 10}, square, []r3.Vec{{X: 4, Y: 4}, {X: 6, Y: 4}, {X: 5, Y: 6}})
		}, "more lines of a family than the 20000"},
		"a high radial net": {func() *canopy.Model {
			return netOf(canopy.NetRadial, [2]float64{0.1, 0.1}, square, []r3.Vec{{X: 4, Y: 4, Z: 1e7}, {X: 6, Y: 4, Z: 1e7}, {X: 5, Y: 6, Z: 1e7}})
		}, "more crossings than the 4 million"},
		"lines one way": {func() *canopy.Model {
			return netOf(canopy.NetStraight, [2]float64{1e-5, 20}, square, nil)
		}, "more lines of a family than the 20000"},
		"many fine nets": {func() *canopy.Model {
			m := netOf(canopy.NetStraight, [2]float64{0.006, 0.006}, square, nil)
			second := m.Nets[0]
			second.Name = "second"
			m.Nets = append(m.Nets, second)
			return m
		}, "net second: it would have more crossings"},
		"nets along sides": {func() *canopy.Model {
			m := netOf(canopy.NetSides, [2]float64{0.006, 0.006}, square, nil)
			second := m.Nets[0]
			second.Name = "second"
			m.Nets = append(m.Nets, second)
			return m
		}, "net second: it would have more crossings"},
		"segments of a cable in space": {func() *canopy.Model {
			m := drawn(square...)
			cableEdge(m, "line", "P0", "P2", canopy.ModelCable{Force: 1e3})
			m.Edges[len(m.Edges)-1].Segments = 2_000_000_000
			return m
		}, "segments, more than the 200000 that are possible"},
		"segments of many edges": {func() *canopy.Model {
			m := drawn(square...)
			for k := range 20 {
				e := fmt.Sprint("line", k)
				cableEdge(m, e, "P0", "P2", canopy.ModelCable{Force: 1e3})
				m.Edges[len(m.Edges)-1].Segments = 100_000
			}
			return m
		}, "segments, more than the 200000 that are possible"},
		"a strip without width": {func() *canopy.Model {
			m := drawn(r3.Vec{}, r3.Vec{X: 1e5}, r3.Vec{X: 1e5, Y: 1e-3}, r3.Vec{Y: 1e-3})
			m.MeshSize = 0.01
			return m
		}, "that are possible"},
		"a tall cone": {func() *canopy.Model {
			m := cone()
			for i := range m.Points {
				if m.Points[i].Name == "M" {
					m.Points[i].At.Z = 1e7
				}
			}
			m.MeshSize = 0.3
			return m
		}, "more triangles than the 2 million"},
		"a fine ring": {func() *canopy.Model {
			m := cone()
			m.Fabrics[0].Pattern = canopy.FabricFree
			for i := range m.Points {
				m.Points[i].At = r3.Scale(1e7, m.Points[i].At)
			}
			m.Rings[0].Radius *= 1e7
			m.MeshSize = 1
			for i := range m.Edges {
				m.Edges[i].Segments = 10
			}
			return m
		}, "more triangles than the 2 million"},
	} {
		t.Run(name, func(t *testing.T) {
			var before, after runtime.MemStats
			runtime.ReadMemStats(&before)
			_, err := mesh.Build(context.Background(), c.model())
			runtime.ReadMemStats(&after)
			require.ErrorContains(t, err, c.text)
			require.NotNil(t, mesh.AsErrors(err))
			require.Contains(t, err.Error(), "give ", "a way out")
			most := uint64(64 << 20)
			if strings.HasPrefix(name, "many fine") {
				most = 400 << 20 // of the first, which is allowed
			}
			require.Less(t, after.TotalAlloc-before.TotalAlloc, most, "allocated")
		})
	}
}
