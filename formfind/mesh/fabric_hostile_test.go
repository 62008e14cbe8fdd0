package mesh_test

import (
	"context"
	"fmt"
	"math/rand/v2"
	"testing"

	"anticlast/formfind/canopy"
	"anticlast/formfind/mesh"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
	"pgregory.net/rapid"
)

// Whatever the outlines, holes, rings, lines, points, sizes and numbers of
// segments, Build answers or says what is wrong; what it builds is sound.
func TestFabricsInHostileOutlines(t *testing.T) { rapid.Check(t, hostileFabric) }

func FuzzFabrics(f *testing.F) {
	for seed := range uint64(16) {
		rnd := rand.New(rand.NewPCG(seed, 2))
		b := make([]byte, 4000)
		for i := range b {
			b[i] = byte(rnd.Uint32())
		}
		f.Add(b)
	}
	f.Fuzz(rapid.MakeFuzz(hostileFabric))
}

func hostileFabric(t *rapid.T) {
	m := &canopy.Model{MeshSize: rapid.SampledFrom([]float64{0, 0.3, 0.6, 1, 1, 5, 1e-7, 1e9}).Draw(t, "size")}
	few := func(label string) bool { return rapid.IntRange(0, 4).Draw(t, label) == 0 }
	coordinate := func(label string) float64 {
		v := rapid.SampledFrom([]float64{0, 1, 2, 3, 4, 5, 6, 2.5, 3.3, 1e-9, 1 + 1e-12, 5 - 1e-7, 4.9, 5.05}).Draw(t, label)
		return v * rapid.SampledFrom([]float64{1, 1, 1, -1}).Draw(t, "sign")
	}
	far := rapid.SampledFrom([]float64{0, 0, 1e7}).Draw(t, "far")
	tall := rapid.SampledFrom([]float64{0, 1, 1, 1e6}).Draw(t, "tall")
	point := func(name string) string {
		p := r3.Vec{X: far + coordinate("x"), Y: coordinate("y"), Z: tall * rapid.Float64Range(0, 3).Draw(t, "z")}
		m.Points = append(m.Points, canopy.Point{Name: name, At: p})
		return name
	}
	edge := func(e, from, to string) string {
		switch rapid.IntRange(0, 3).Draw(t, "kind") {
		case 0:
			cableEdge(m, e, from, to, canopy.ModelCable{Sag: 0.1})
		case 1:
			cableEdge(m, e, from, to, canopy.ModelCable{Force: 20e3})
		default:
			fixedEdge(m, e, from, to)
			if few("arc") {
				last := &m.Edges[len(m.Edges)-1]
				rise := rapid.SampledFrom([]float64{0.3, -0.5, 1e-9, 2}).Draw(t, "rise")
				at := func(name string) r3.Vec {
					for _, p := range m.Points {
						if p.Name == name {
							return p.At
						}
					}
					return r3.Vec{}
				}
				last.Arc, last.Through = true, r3.Add(r3.Scale(0.5, r3.Add(at(from), at(to))), r3.Vec{X: rise, Y: 0.7 * rise})
			}
		}
		if few("given") {
			m.Edges[len(m.Edges)-1].Segments = rapid.SampledFrom([]int{1, 2, 5, 16, 200, 2_000_000_000}).Draw(t, "segments")
		}
		return e
	}
	loop := func(name string, n int) (edges []string) {
		for k := range n {
			point(fmt.Sprint(name, k))
		}
		for k := range n {
			edges = append(edges, edge(fmt.Sprint(name, "e", k), fmt.Sprint(name, k), fmt.Sprint(name, (k+1)%n)))
		}
		return edges
	}
	f := sail("sail", loop("P", rapid.IntRange(2, 9).Draw(t, "corners"))...)
	f.Pattern = canopy.FabricPattern(rapid.IntRange(0, 2).Draw(t, "pattern"))
	if few("hole") {
		f.Holes = [][]string{loop("H", rapid.IntRange(2, 5).Draw(t, "hole corners"))}
	}
	if few("ring") {
		m.Rings = []canopy.ModelRing{{Name: "top", At: point("C"), Radius: rapid.SampledFrom([]float64{0.5, 1, 1e-9, 2.9999}).Draw(t, "radius"), Rigid: true}}
		f.Ring, f.WarpRule = "top", canopy.WarpRule(rapid.IntRange(0, 2).Draw(t, "warp"))
	}
	if few("line") {
		from := point("L0")
		if few("from the rim") {
			from = "P0"
		}
		f.Lines = []string{edge("line", from, point("L1"))}
	}
	if few("inside") {
		f.Inside = []string{point("X")}
	}
	m.Fabrics = []canopy.ModelFabric{f}
	if few("second") { // on the other side of the first edge
		point("Q")
		g := sail("second", f.Boundary[0], edge("q0", "P1", "Q"), edge("q1", "Q", "P0"))
		g.Pattern = canopy.FabricPattern(rapid.IntRange(0, 2).Draw(t, "pattern"))
		m.Fabrics = append(m.Fabrics, g)
	}
	s, quality, err := mesh.BuildMeasured(context.Background(), m)
	if err != nil {
		require.NotNil(t, mesh.AsErrors(err), "%v", err)
		return
	}
	require.NoError(t, s.Validate())
	require.NoError(t, mesh.Validate(s))
	require.Less(t, len(s.Position), 3_000_000)
	for _, q := range quality {
		require.True(t, q.Met || q.Why != "")
		require.Positive(t, q.Triangles)
	}
	topology(t, s)
}
