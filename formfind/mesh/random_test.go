package mesh_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"testing"

	"anticlast/formfind/canopy"
	"anticlast/formfind/mesh"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
	"pgregory.net/rapid"
)

// randomModel draws a fan of fabrics around a middle, or one fabric with or
// without a ring, on a random outline that sees its middle.
func randomModel(t *rapid.T) *canopy.Model {
	n := rapid.IntRange(3, 9).Draw(t, "corners")
	m := &canopy.Model{MeshSize: rapid.Float64Range(0.9, 2.5).Draw(t, "mesh")}
	angle := 0.0
	var names []string
	rigid := rapid.Bool().Draw(t, "all fixed")
	for i := range n {
		angle += 2 * math.Pi / float64(n) * rapid.Float64Range(0.7, 1.0).Draw(t, "angle")
		r := rapid.Float64Range(4, 9).Draw(t, "radius")
		m.Points = append(m.Points, pt(fmt.Sprintf("P%d", i), r*math.Cos(angle), r*math.Sin(angle), rapid.Float64Range(2, 6).Draw(t, "z")))
	}
	for i := range n {
		e := fmt.Sprintf("e%d", i)
		from, to := fmt.Sprintf("P%d", i), fmt.Sprintf("P%d", (i+1)%n)
		if rapid.Bool().Draw(t, "against") {
			from, to = to, from
		}
		if rigid || rapid.Bool().Draw(t, "fixed") {
			fixedEdge(m, e, from, to)
		} else {
			cableEdge(m, e, from, to, canopy.ModelCable{Force: 10e3})
		}
		names = append(names, e)
	}
	switch rapid.IntRange(0, 2).Draw(t, "form") {
	case 0:
		m.Fabrics = []canopy.ModelFabric{sail("sail", names...)}
	case 1:
		f := sail("sail", names...)
		f.Ring, f.WarpRule = "top", canopy.WarpRule(rapid.IntRange(1, 2).Draw(t, "warp"))
		m.Points = append(m.Points, pt("C", 0, 0, rapid.Float64Range(1, 9).Draw(t, "height")))
		m.Rings = []canopy.ModelRing{{Name: "top", At: "C", Radius: rapid.Float64Range(0.2, 1).Draw(t, "ring"), Rigid: true}}
		m.Fabrics = []canopy.ModelFabric{f}
	default:
		m.Points = append(m.Points, pt("C", 0, 0, rapid.Float64Range(1, 9).Draw(t, "height")))
		for i := range n {
			m.Edges = append(m.Edges, canopy.Edge{Name: fmt.Sprintf("s%d", i), From: fmt.Sprintf("P%d", i), To: "C", Kind: canopy.EdgeSeam})
		}
		for i := range n {
			b := []string{fmt.Sprintf("s%d", i), names[i], fmt.Sprintf("s%d", (i+1)%n)}
			if rapid.Bool().Draw(t, "round") {
				b[0], b[2] = b[2], b[0]
			}
			m.Fabrics = append(m.Fabrics, sail(fmt.Sprintf("f%d", i), b...))
		}
	}
	return m
}

// Every outline is meshed soundly or refused with reasons; all of its corners
// and edges are in the mesh, and areas add up.
func TestRandomOutlines(t *testing.T) {
	refused := 0
	rapid.Check(t, func(rt *rapid.T) {
		m := randomModel(rt)
		s, err := mesh.Build(context.Background(), m)
		if err != nil {
			var list mesh.Errors
			require.True(t, errors.As(err, &list), err)
			refused++
			return
		}
		v, e, f := topology(t, s)
		want := 1
		if len(m.Rings) > 0 {
			want = 0
		}
		require.Equal(t, want, v-e+f)
		// The positive side looks up where the plan is not folded. With a
		// fixed outline, the vector area of the mesh is that of the outline,
		// less that of the ring.
		var a, b r3.Vec
		for _, c := range s.Corners {
			a = r3.Add(a, r3.Scale(0.5, r3.Cross(r3.Sub(s.Position[c[1]], s.Position[c[0]]), r3.Sub(s.Position[c[2]], s.Position[c[0]]))))
		}
		n := len(m.Points)
		if n > 0 && m.Points[n-1].Name == "C" {
			n--
		}
		for i := 1; i+1 < n; i++ {
			o := m.Points[0].At
			b = r3.Add(b, r3.Scale(0.5, r3.Cross(r3.Sub(m.Points[i].At, o), r3.Sub(m.Points[i+1].At, o))))
		}
		if len(s.Rings) > 0 {
			g := s.Rings[0].Nodes
			for i := 1; i+1 < len(g); i++ {
				o := s.Position[g[0]]
				b = r3.Sub(b, r3.Scale(0.5, r3.Cross(r3.Sub(s.Position[g[i]], o), r3.Sub(s.Position[g[i+1]], o))))
			}
		}
		if len(m.Cables) == 0 {
			require.InDelta(t, 0, r3.Norm(r3.Sub(a, b)), 1e-9*r3.Norm(b))
		}
		require.Greater(t, a.Z, 0.0)
		r, err := mesh.Refine(s)
		require.NoError(t, err)
		require.NoError(t, mesh.Validate(r.Fine))
		_, _, f4 := topology(t, r.Fine)
		require.Equal(t, 4*f, f4)
	})
	t.Logf("%d refused", refused)
}

// Turning and moving a model turns and moves its mesh.
func TestMeshTurnsWithTheModel(t *testing.T) {
	for name, model := range all {
		t.Run(name, func(t *testing.T) {
			sin, cos := math.Sincos(0.7 + float64(len(name)))
			turn := func(p r3.Vec) r3.Vec { return r3.Vec{X: cos*p.X - sin*p.Y, Y: sin*p.X + cos*p.Y, Z: p.Z} }
			move := r3.Vec{X: 30, Y: -12, Z: 5}
			m := model()
			s := build(t, m)
			for i := range m.Points {
				m.Points[i].At = r3.Add(turn(m.Points[i].At), move)
			}
			for i := range m.Edges {
				m.Edges[i].Through = r3.Add(turn(m.Edges[i].Through), move)
			}
			for i := range m.Fabrics {
				m.Fabrics[i].WarpDir = turn(m.Fabrics[i].WarpDir)
			}
			got := build(t, m)
			require.Equal(t, len(s.Position), len(got.Position))
			for i, p := range s.Position {
				require.InDelta(t, 0, r3.Norm(r3.Sub(got.Position[i], r3.Add(turn(p), move))), 1e-9)
			}
			for k, w := range s.Warp {
				require.InDelta(t, 0, r3.Norm(r3.Sub(got.Warp[k], turn(w))), 1e-9)
			}
		})
	}
}
