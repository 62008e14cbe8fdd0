package relax_test

import (
	"context"
	"encoding/json"
	"os"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/relax"
)

// relaxed lets s go and expects it to come to rest.
func relaxed(t testing.TB, e engine.Engine, s *canopy.Structure, start *canopy.Form, set engine.Settings) *canopy.Form {
	t.Helper()
	f, out, err := e.Find(context.Background(), s, start, set)
	require.NoError(t, err)
	require.Equal(t, engine.Converged, out.Status, out.Why)
	require.True(t, f.Converged)
	return f
}

// eachDamping runs a test with kinetic and with viscous damping.
func eachDamping(t *testing.T, run func(t *testing.T, e engine.Engine)) {
	t.Run("kinetic", func(t *testing.T) { run(t, relax.New()) })
	t.Run("viscous", func(t *testing.T) { run(t, &relax.Engine{Viscous: true}) })
}

func readJSON(t testing.TB, name string, v any) {
	t.Helper()
	data, err := os.ReadFile("testdata/" + name)
	require.NoError(t, err)
	require.NoError(t, json.Unmarshal(data, v))
}

func vec(v []float64) r3.Vec { return r3.Vec{X: v[0], Y: v[1], Z: v[2]} }

// net is a structure of members of one kind, without triangles.
func net(nodes []r3.Vec, fixed []int32, ends [][2]int32) *canopy.Structure {
	s := &canopy.Structure{
		Position:   nodes,
		Fixed:      make([]canopy.Freedom, len(nodes)),
		Load:       make([]r3.Vec, len(nodes)),
		Ends:       ends,
		Kind:       make([]canopy.Kind, len(ends)),
		Law:        make([]canopy.Law, len(ends)),
		Given:      make([]float64, len(ends)),
		Stiffness:  make([]float64, len(ends)),
		Unstressed: make([]float64, len(ends)),
		Weight:     make([]float64, len(ends)),
	}
	for _, i := range fixed {
		s.Fixed[i] = canopy.DirAll
	}
	return s
}

// elastic makes all members of s elastic.
func elastic(s *canopy.Structure, ea float64, unstressed func(k int) float64) {
	for k := range s.Ends {
		s.Law[k] = canopy.LawElastic
		s.Stiffness[k] = ea
		s.Unstressed[k] = unstressed(k)
	}
}

func length(s *canopy.Structure, f *canopy.Form, k int) float64 {
	return r3.Norm(r3.Sub(f.Position[s.Ends[k][1]], f.Position[s.Ends[k][0]]))
}

func farthest(a, b []r3.Vec) float64 {
	d := 0.0
	for i := range a {
		d = max(d, r3.Norm(r3.Sub(a[i], b[i])))
	}
	return d
}

// imbalance is the largest residual of a form over the largest sum of forces
// at a node, from what the form reports, in all directions in which a node is
// free or has a reaction.
func imbalance(s *canopy.Structure, f *canopy.Form, load []r3.Vec) float64 {
	sum := make([]r3.Vec, len(f.Position))
	size := make([]float64, len(sum))
	add := func(i int32, v r3.Vec) {
		sum[i] = r3.Add(sum[i], v)
		size[i] += r3.Norm(v)
	}
	for i := range sum {
		add(int32(i), load[i])
		add(int32(i), f.Reaction[i])
	}
	for k, e := range s.Ends {
		d := r3.Sub(f.Position[e[1]], f.Position[e[0]])
		v := r3.Scale(f.Force[k]/r3.Norm(d), d)
		add(e[0], v)
		add(e[1], r3.Scale(-1, v))
	}
	worst, most := 0.0, 0.0
	for i := range sum {
		most = max(most, size[i])
		worst = max(worst, r3.Norm(sum[i]))
	}
	return worst / most
}

func sumOf(v []r3.Vec) (s r3.Vec) {
	for _, a := range v {
		s = r3.Add(s, a)
	}
	return s
}
