package mesh_test

import (
	"math"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/mesh"
)

func TestProlongTakesTheFoundShape(t *testing.T) {
	s := build(t, cone())
	r, err := mesh.Refine(s)
	require.NoError(t, err)
	form := canopy.NewForm(s)
	drop := r3.Vec{Z: -0.25}
	for i := range form.Position {
		if s.FixedAt(i) == 0 && s.MasterOf(i) < 0 {
			form.Position[i] = r3.Add(form.Position[i], drop)
		}
	}
	for k := range form.Force {
		form.Force[k] = float64(k + 1)
	}
	f := r.Prolong(form)
	for i, p := range r.Parents {
		if r.Fine.MasterOf(i) >= 0 {
			require.InDelta(t, 0, r3.Norm(r3.Sub(r.Fine.Position[i], f.Position[i])), 1e-12)
			continue
		}
		a, b := form.Position[p[0]], form.Position[p[1]]
		off := r3.Norm(r3.Sub(r3.Scale(0.5, r3.Add(a, b)), f.Position[i]))
		if p[0] == p[1] {
			require.Zero(t, off)
		}
		require.LessOrEqual(t, off, 0.2*r3.Norm(r3.Sub(b, a)))
	}
	for i, k := range r.MemberOf {
		require.Equal(t, float64(k+1), f.Force[i])
	}
}

// New nodes lie on the surface through the old ones, not on its chords: on a
// saddle z = (x² − y²)/20 between edge cables ten times nearer, inside and on the
// cables; and half-way between their parents where the surface is flat.
func TestProlongPutsNodesOnTheSurface(t *testing.T) {
	for _, bend := range []float64{0.05, 0} {
		m := polygon(4)
		m.MeshSize = 0.4
		s := build(t, m)
		r, err := mesh.Refine(s)
		require.NoError(t, err)
		height := func(p r3.Vec) float64 { return bend * (p.X*p.X - p.Y*p.Y + p.X) }
		form := canopy.NewForm(s)
		for i, p := range s.Position {
			p.Z = height(p)
			form.Position[i], s.Position[i], r.Fine.Position[i] = p, p, p
		}
		cable := map[int32]bool{}
		for c := range r.Fine.Cables {
			for _, i := range r.Fine.Cables[c].Nodes {
				cable[i] = true
			}
		}
		f := r.Prolong(form)
		chord, curve, n := map[bool]float64{}, map[bool]float64{}, map[bool]int{}
		for i := len(s.Position); i < len(f.Position); i++ {
			p := r.Parents[i]
			half := r3.Scale(0.5, r3.Add(form.Position[p[0]], form.Position[p[1]]))
			on := cable[int32(i)]
			chord[on] += math.Abs(half.Z - height(half))
			curve[on] += math.Abs(f.Position[i].Z - height(f.Position[i]))
			n[on]++
			if bend == 0 && !on {
				require.InDelta(t, 0, r3.Norm(r3.Sub(half, f.Position[i])), 1e-12)
			}
		}
		for on := range n {
			require.Greater(t, n[on], 20)
			require.LessOrEqual(t, curve[on], 0.1*chord[on]+1e-12, "on cables: %v", on)
		}
	}
}
