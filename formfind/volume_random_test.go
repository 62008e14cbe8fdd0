package formfind_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind"
	"anticlast/formfind/canopy"
	"anticlast/formfind/internal/sweep"
)

// randomAir draws a film of equal stress over a plane outline of 3 to 9 corners,
// the plane tilted, or a cushion of two films between corners at random heights;
// sides straight or arcs in the plane.
func randomAir(rnd *rand.Rand) *canopy.Model {
	n := 3 + rnd.IntN(7)
	cushion := rnd.IntN(3) == 0
	turn := r3.NewRotation(rnd.Float64()*2*math.Pi, r3.Unit(r3.Vec{X: rnd.NormFloat64(), Y: rnd.NormFloat64(), Z: rnd.NormFloat64()}))
	if cushion || rnd.IntN(2) == 0 {
		turn = r3.NewRotation(rnd.Float64(), r3.Vec{Z: 1})
	}
	size := math.Pow(10, rnd.Float64()*2)
	m := &canopy.Model{}
	var names []string
	area := 0.0
	var flat []r3.Vec
	for i := range n {
		a := 2 * math.Pi * (float64(i) + 0.5*(rnd.Float64()-0.5)) / float64(n)
		r := size * (0.6 + 0.4*rnd.Float64())
		p := r3.Vec{X: r * math.Cos(a), Y: 0.7 * r * math.Sin(a)}
		flat = append(flat, p)
	}
	for i, p := range flat {
		q := flat[(i+1)%n]
		area += (p.X*q.Y - p.Y*q.X) / 2
		at := p
		if cushion {
			at.Z = 0.15 * size * (rnd.Float64() - 0.5)
		}
		m.Points = append(m.Points, canopy.Point{Name: fmt.Sprint("P", i), At: turn.Rotate(at)})
		e := canopy.Edge{Name: fmt.Sprint("e", i), From: fmt.Sprint("P", i), To: fmt.Sprint("P", (i+1)%n), Kind: canopy.EdgeFixed}
		if !cushion && rnd.IntN(2) == 0 {
			d := r3.Sub(q, p)
			e.Arc, e.Through = true, turn.Rotate(r3.Add(r3.Scale(0.5, r3.Add(p, q)), r3.Scale(0.15*rnd.Float64(), r3.Vec{X: d.Y, Y: -d.X})))
		}
		m.Edges, names = append(m.Edges, e), append(names, e.Name)
	}
	stress := math.Pow(10, 2+2*rnd.Float64())
	part := 0.02 + 0.6*rnd.Float64() // a hemisphere holds 0.38 of the power 1.5 of its plan
	if cushion {
		part = 0.02 + 0.4*rnd.Float64()
	}
	if rnd.IntN(4) == 0 {
		part = -part
	}
	m.Fabrics = []canopy.ModelFabric{{Name: "film", Boundary: names, Warp: stress, Weft: stress, Pattern: canopy.FabricPattern(rnd.IntN(2) * 2),
		Volume: part * math.Pow(area, 1.5), HasVolume: true}}

	if cushion {
		other := stress * (0.5 + rnd.Float64())
		m.Fabrics[0].VolumeWith = []string{"lower"}
		m.Fabrics = append(m.Fabrics, canopy.ModelFabric{Name: "lower", Boundary: names, Warp: other, Weft: other, Pattern: m.Fabrics[0].Pattern})
	}
	return m
}

// A film of equal stress has a shape for any volume over a plane outline: all of
// them are found, trusted, and pushed the right way.
func TestRandomAirIsTrusted(t *testing.T) {
	tally := map[string]int{}
	for seed := range uint64(sweep.N(20, 80, 300)) {
		m := randomAir(rand.New(rand.NewPCG(seed, 7)))
		r, err := formfind.Find(t.Context(), m, formfind.Options{CrossCheck: seed%10 == 0})
		require.NoError(t, err, "seed %d", seed)
		if !assert.True(t, r.Audit.Trusted, "seed %d: %v", seed, r.Audit.Reasons) {
			tally["not trusted"]++
			continue
		}
		tally["trusted"]++
		v := m.Fabrics[0].Volume
		require.InEpsilon(t, v, r.Summary.Enclosed[0], 1e-9, "seed %d", seed)
		require.Positive(t, r.Form.Pressure[0]*v, "seed %d", seed)
		require.Greater(t, r.Audit.MinAngle, math.Pi/180, "seed %d", seed)
	}
	t.Log(tally)
}
