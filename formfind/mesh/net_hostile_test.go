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

// Whatever the outline, hole, spacing and pattern, Build answers or says what is
// wrong; what it builds is sound.
func TestNetsInHostileOutlines(t *testing.T) { rapid.Check(t, hostileNet) }

func FuzzNets(f *testing.F) {
	// Choices take eight bytes each.
	for seed := range uint64(16) {
		rnd := rand.New(rand.NewPCG(seed, 1))
		b := make([]byte, 3000)
		for i := range b {
			b[i] = byte(rnd.Uint32())
		}
		f.Add(b)
	}
	f.Fuzz(rapid.MakeFuzz(hostileNet))
}

func hostileNet(t *rapid.T) {
	m := &canopy.Model{}
	coordinate := func(label string) float64 {
		v := rapid.SampledFrom([]float64{0, 1, 1, 2, 3, 4, 5, 2.5, 1e-9, 1 + 1e-12, 5 - 1e-7}).Draw(t, label)
		return v * rapid.SampledFrom([]float64{1, 1, 1, -1}).Draw(t, "sign")
	}
	far := rapid.SampledFrom([]float64{0, 0, 1e7}).Draw(t, "far")
	tall := rapid.SampledFrom([]float64{1, 1, 1, 1e9}).Draw(t, "tall")
	loop := func(name string, n int) []string {
		var edges []string
		for k := range n {
			p := r3.Vec{X: far + coordinate("x"), Y: coordinate("y"), Z: tall * rapid.Float64Range(0, 3).Draw(t, "z")}
			m.Points = append(m.Points, canopy.Point{Name: fmt.Sprint(name, k), At: p})
		}
		for k := range n {
			e := fmt.Sprint(name, "e", k)
			from, to := fmt.Sprint(name, k), fmt.Sprint(name, (k+1)%n)
			if rapid.Bool().Draw(t, "cable") {
				cableEdge(m, e, from, to, canopy.ModelCable{MeanForce: 50e3})
			} else {
				fixedEdge(m, e, from, to)
				if rapid.IntRange(0, 3).Draw(t, "arc") == 0 {
					last := &m.Edges[len(m.Edges)-1]
					last.Arc, last.Through = true, r3.Vec{X: far + coordinate("x"), Y: coordinate("y"), Z: 2}
				}
			}
			if rapid.IntRange(0, 5).Draw(t, "given") == 0 {
				m.Edges[len(m.Edges)-1].Segments = rapid.IntRange(1, 9).Draw(t, "segments")
			}
			edges = append(edges, e)
		}
		return edges
	}
	n := canopy.Net{Name: "roof", Boundary: loop("P", rapid.IntRange(2, 8).Draw(t, "corners"))}
	n.Pattern = canopy.NetPattern(rapid.IntRange(0, 3).Draw(t, "pattern"))
	if rapid.Bool().Draw(t, "hole") {
		n.Holes = [][]string{loop("H", rapid.IntRange(2, 5).Draw(t, "hole corners"))}
	}
	spacing := rapid.SampledFrom([]float64{0.2, 0.37, 0.5, 1, 2.5, 40, 0.05, 1e-7})
	for range rapid.IntRange(2, 3).Draw(t, "families") {
		n.Families = append(n.Families, canopy.Family{Spacing: spacing.Draw(t, "spacing"), MeanForce: 3e3, Stiffness: 1e6})
	}
	if rapid.IntRange(0, 3).Draw(t, "turn") == 0 {
		n.Families[1].Angle, n.Families[1].HasAngle = rapid.SampledFrom([]float64{0, 0.3, 1.57, 3.1, -1}).Draw(t, "angle"), true
	}
	if rapid.IntRange(0, 4).Draw(t, "equal") == 0 {
		n.MeshLength = spacing.Draw(t, "mesh")
	}
	m.Nets = []canopy.Net{n}
	s, err := mesh.Build(context.Background(), m)
	if err != nil {
		require.NotNil(t, mesh.AsErrors(err), "%v", err)
		return
	}
	require.Less(t, len(s.Position), 6_000_000)
	require.NoError(t, s.Validate())
	require.NoError(t, mesh.Validate(s))
}
