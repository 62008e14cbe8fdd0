package formfind_test

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind"
	"anticlast/formfind/canopy"
	"anticlast/formfind/internal/sweep"
)

// meshNet is an equal-mesh net on edge cables between the given corners, or on
// fixed edges when rim is zero.
func meshNet(rim, mesh, mark float64, corners ...r3.Vec) *canopy.Model {
	m := &canopy.Model{}
	var boundary []string
	for k, p := range corners {
		m.Points = append(m.Points, canopy.Point{Name: fmt.Sprint("P", k), At: p})
		e := canopy.Edge{Name: fmt.Sprint("e", k), From: fmt.Sprint("P", k), To: fmt.Sprint("P", (k+1)%len(corners))}
		if rim > 0 {
			e.Kind, e.Role, e.Cable = canopy.EdgeCable, canopy.KindEdgeCable, e.Name
			m.Cables = append(m.Cables, canopy.ModelCable{Name: e.Name, Edges: []string{e.Name}, MeanForce: rim, Stiffness: 60e6})
		}
		m.Edges = append(m.Edges, e)
		boundary = append(boundary, e.Name)
	}
	m.Nets = []canopy.Net{{Name: "roof", Boundary: boundary, MeshLength: mesh, MarkTension: mark, Families: []canopy.Family{
		{Name: "one", MeanForce: 8e3, Stiffness: 8e6}, {Name: "two", MeanForce: 8e3, Stiffness: 8e6},
	}}}
	return m
}

// meshes returns the forces of the links between crossings, and their lengths as
// they would be at the given tension, from what was found alone.
func meshes(r *canopy.Result, at float64) (force, length []float64) {
	s := r.Structure
	for k, e := range s.Ends {
		inner := s.Kind[k] == canopy.KindNetCable
		for _, i := range e {
			inner = inner && strings.HasPrefix(s.NodeName.At(int(i)), "roof:")
		}
		if !inner {
			continue
		}
		l := r3.Norm(r3.Sub(r.Form.Position[e[1]], r.Form.Position[e[0]]))
		t := r.Form.Force[k]
		force = append(force, t)
		length = append(length, l*(1+at/s.Stiffness[k])/(1+t/s.Stiffness[k]))
	}
	return force, length
}

// A net of equal meshes on a saddle: the length of every link between two
// crossings, taken back from the length and force found, is the one that was
// asked for; all links pull; relaxation from disturbed nodes returns to it.
func TestEqualMeshNetOnASaddle(t *testing.T) {
	for _, mark := range []float64{0, 12e3} {
		m := meshNet(220e3, 0.9, mark, r3.Vec{Z: 4}, r3.Vec{X: 20, Z: 9}, r3.Vec{X: 20, Y: 20, Z: 4}, r3.Vec{Y: 20, Z: 9})
		m.Nets[0].Direction = r3.Vec{X: 1, Y: 1}
		r, err := formfind.Find(context.Background(), m, formfind.Options{CrossCheck: true})
		require.NoError(t, err)
		require.True(t, r.Audit.Trusted, r.Audit.Reasons)
		require.LessOrEqual(t, r.Audit.ResidualLargest, 1e-9)
		require.Zero(t, r.Audit.SlackCables)
		force, length := meshes(r, mark)
		require.Greater(t, len(force), 400)
		for k := range force {
			require.Greater(t, force[k], 3e3)
			require.InEpsilon(t, 0.9, length[k], 1e-9)
		}
		// The cable it takes is reported.
		total, nodes := 0.0, 0
		for k, e := range r.Structure.Ends {
			if r.Structure.Kind[k] == canopy.KindNetCable {
				l := r3.Norm(r3.Sub(r.Form.Position[e[1]], r.Form.Position[e[0]]))
				total += l / (1 + r.Form.Force[k]/8e6)
			}
		}
		for i := range r.Structure.Position {
			if strings.HasPrefix(r.Structure.NodeName.At(i), "roof:") {
				nodes++
			}
		}
		var found bool
		for _, f := range r.Findings {
			if f.ID == "equal-mesh" {
				found = true
				require.Equal(t, canopy.Note, f.Severity)
				require.InEpsilon(t, total, f.Value, 1e-12)
				require.Contains(t, f.Text, fmt.Sprintf("%d mesh sides", len(force)))
				require.Contains(t, f.Text, fmt.Sprintf("%d crossings", nodes))
			}
		}
		require.True(t, found)
	}
}

// A flat net on fixed edges, marked at the tension of its ends: its lines are
// straight, and each carries from end to end what its ends are given (equilibrium
// of a straight cable).
func TestFlatEqualMeshNet(t *testing.T) {
	m := meshNet(0, 0.5, 8e3, r3.Vec{}, r3.Vec{X: 8}, r3.Vec{X: 8, Y: 6}, r3.Vec{Y: 6})
	for k := range m.Nets[0].Families {
		m.Nets[0].Families[k].MeanForce, m.Nets[0].Families[k].Force = 0, 8e3
	}
	r, err := formfind.Find(context.Background(), m, formfind.Options{})
	require.NoError(t, err)
	require.True(t, r.Audit.Trusted, r.Audit.Reasons)
	force, length := meshes(r, 8e3)
	require.Len(t, force, 14*11+15*10) // 15 × 11 crossings
	for k := range force {
		require.InEpsilon(t, 8e3, force[k], 1e-8)
		require.InEpsilon(t, 0.5, length[k], 1e-9)
	}
}

// Turning and moving a model turns and moves its net.
func TestEqualMeshNetTurnsWithItsModel(t *testing.T) {
	corners := []r3.Vec{{Z: 4}, {X: 17, Y: -2, Z: 8}, {X: 21, Y: 14, Z: 3}, {X: 6, Y: 19, Z: 7}, {X: -3, Y: 9, Z: 4}}
	find := func(p []r3.Vec) *canopy.Result {
		r, err := formfind.Find(context.Background(), meshNet(200e3, 0.9, 0, p...), formfind.Options{})
		require.NoError(t, err)
		require.True(t, r.Audit.Trusted, r.Audit.Reasons)
		return r
	}
	a := find(corners)
	sin, cos := math.Sincos(0.7)
	move := func(p r3.Vec) r3.Vec {
		return r3.Vec{X: cos*p.X - sin*p.Y + 40, Y: sin*p.X + cos*p.Y - 7, Z: p.Z + 3}
	}
	turned := make([]r3.Vec, len(corners))
	for i, p := range corners {
		turned[i] = move(p)
	}
	b := find(turned)
	require.Len(t, b.Form.Position, len(a.Form.Position))
	for i, p := range a.Form.Position {
		require.InDelta(t, 0, r3.Norm(r3.Sub(move(p), b.Form.Position[i])), 1e-7)
	}
}

// Lines that end obliquely on a cable of one force slide along it; the refusal
// says so.
func TestObliqueLinesSlideOnACableOfOneForce(t *testing.T) {
	m := meshNet(200e3, 1.2, 0, r3.Vec{Z: 4}, r3.Vec{X: 20, Z: 9}, r3.Vec{X: 20, Y: 20, Z: 4}, r3.Vec{Y: 20, Z: 9})
	m.Nets[0].Direction = r3.Vec{X: 1, Y: 1}
	for i := range m.Cables {
		m.Cables[i].Force, m.Cables[i].MeanForce = m.Cables[i].MeanForce, 0
	}
	_, err := formfind.Find(context.Background(), m, formfind.Options{})
	require.ErrorContains(t, err, "slide along cable e0")
	require.ErrorContains(t, err, "mean force")
}

// Whatever the outline, the net is found, trusted and under tension throughout.
func TestEqualMeshNetsInRandomOutlines(t *testing.T) {
	for seed := range sweep.N(12, 60, 1000) {
		rnd := rand.New(rand.NewPCG(uint64(seed), 9))
		n := 3 + rnd.IntN(5)
		corners := make([]r3.Vec, n)
		for k := range corners {
			a := 2 * math.Pi * (float64(k) + 0.5*(rnd.Float64()-0.5)) / float64(n)
			r := 12 * (0.7 + 0.6*rnd.Float64())
			corners[k] = r3.Vec{X: r * math.Cos(a), Y: r * math.Sin(a), Z: 9 * rnd.Float64()}
		}
		mesh := 0.8 + 0.7*rnd.Float64()
		r, err := formfind.Find(context.Background(), meshNet(150e3, mesh, 0, corners...), formfind.Options{})
		require.NoError(t, err, seed)
		require.True(t, r.Audit.Trusted, "%d: %v", seed, r.Audit.Reasons)
		force, length := meshes(r, 0)
		for k := range force {
			require.Greater(t, force[k], 0.0, seed)
			require.InEpsilon(t, mesh, length[k], 1e-8, seed)
		}
	}
}
