package audit_test

import (
	"context"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/audit"
	"anticlast/formfind/canopy"
)

// star is one free node at the centre of a flat film of six triangles between
// fixed corners; extra adds what else is there.
func star(extra func(s *canopy.Structure)) (*canopy.Structure, *canopy.Form) {
	s := structure()
	s.Fabrics = []canopy.Fabric{{Name: "a"}, {Name: "b"}}
	node(s, 0, 0, 0, 0)
	for _, p := range [][2]float64{{2, 0}, {1, 2}, {-1, 2}, {-2, 0}, {-1, -2}, {1, -2}} {
		node(s, p[0], p[1], 0, canopy.DirAll)
	}
	for k := range int32(6) {
		triangle(s, 0, 1+k, 1+(k+1)%6, r3.Vec{X: 1}, 1000, 1000)
	}
	extra(s)
	f := canopy.NewForm(s)
	for k := range f.Force {
		f.Force[k] = s.Given[k]
	}
	for t := range s.Corners {
		f.Warp[t] = r3.Vec{X: 1}
		f.Stress[t] = canopy.Stress{Warp: s.Stress[t][0], Weft: s.Stress[t][1]}
	}
	return s, f
}

// The directions in which the shape can change, counted.
func TestShapeChangingDirections(t *testing.T) {
	cable := func(s *canopy.Structure, to ...int32) {
		for _, j := range to {
			member(s, 0, j, canopy.KindCable, canopy.LawForce, 500)
		}
	}
	fabricB := func(s *canopy.Structure, stress float64) { // the upper half is another fabric
		for t := range 3 {
			s.FabricOf[t] = 1
			s.Stress[t] = [2]float64{stress, stress}
		}
	}
	for name, c := range map[string]struct {
		want  int
		extra func(s *canopy.Structure)
	}{
		"fabric":                       {1, func(s *canopy.Structure) {}},
		"straight cable":               {2, func(s *canopy.Structure) { cable(s, 1, 4) }},
		"cable turning by 63 degrees":  {3, func(s *canopy.Structure) { cable(s, 2, 4) }},
		"crossing cables":              {3, func(s *canopy.Structure) { cable(s, 1, 4, 2, 5) }},
		"cable that ends":              {3, func(s *canopy.Structure) { cable(s, 1) }},
		"cable with stiffness":         {3, func(s *canopy.Structure) { cable(s, 1, 4); s.Stiffness = []float64{1e6, 1e6} }},
		"seam of equal stress":         {1, func(s *canopy.Structure) { fabricB(s, 1000) }},
		"seam of unequal stress":       {2, func(s *canopy.Structure) { fabricB(s, 1500) }},
		"elastic fabric":               {3, func(s *canopy.Structure) { f := weave; s.Fabrics[0] = f }},
		"sliding in x and y only":      {0, func(s *canopy.Structure) { s.Fixed[0] = canopy.DirZ }},
		"on a plane of symmetry":       {1, func(s *canopy.Structure) { s.Fixed[0] = canopy.DirX }},
		"held":                         {0, func(s *canopy.Structure) { s.Held = make([]canopy.Freedom, 7); s.Held[0] = canopy.DirAll }},
		"cable on a plane of symmetry": {2, func(s *canopy.Structure) { cable(s, 1, 4); s.Fixed[0] = canopy.DirX }},
		"three sheets": {2, func(s *canopy.Structure) {
			n := node(s, 0, 0, 3, canopy.DirAll)
			triangle(s, 0, 1, n, r3.Vec{Z: 1}, 1000, 1000)
			triangle(s, 0, n, 4, r3.Vec{Z: 1}, 1000, 1000)
			// Sides 0–1 and 0–4 now have three triangles, 0–n two.
		}},
		"no fabric, straight":       {2, func(s *canopy.Structure) { s.Corners = nil; bare(s); cable(s, 1, 4) }},
		"no fabric, kinked tension": {2, func(s *canopy.Structure) { s.Corners = nil; bare(s); cable(s, 2, 3) }},
		"no fabric, kinked with a strut": {3, func(s *canopy.Structure) {
			s.Corners = nil
			bare(s)
			cable(s, 2, 3)
			s.Kind[1], s.Given[1] = canopy.KindStrut, -500
		}},
		"net": {3, func(s *canopy.Structure) { s.Corners = nil; bare(s); cable(s, 1, 2, 4, 5) }},
		"nobody": {0, func(s *canopy.Structure) {
			s.Corners = nil
			bare(s)
			member(s, 1, 2, canopy.KindCable, canopy.LawForce, 1)
		}},
	} {
		t.Run(name, func(t *testing.T) {
			s, f := star(c.extra)
			require.NoError(t, s.Validate())
			r, err := audit.Stability(context.Background(), s, f, audit.Options{})
			require.NoError(t, err)
			require.Equal(t, c.want, r.Unknowns)
		})
	}
}

func bare(s *canopy.Structure) { s.FabricOf, s.Warp, s.Stress = nil, nil, nil }

// Three films that meet on a line at 120° are in equilibrium and stable
// (Plateau 1873); at another angle they are not in equilibrium.
func TestThreeFilmsMeetAt120(t *testing.T) {
	build := func(shift float64) (*canopy.Structure, *canopy.Form) {
		const n, r = 6, 4.
		s := structure()
		s.Fabrics = []canopy.Fabric{{Name: "film"}}
		dirs := [3]r3.Vec{{X: 1}, {X: -0.5, Y: 0.8660254037844386}, {X: -0.5, Y: -0.8660254037844386}}
		at := func(i, d, j int32) int32 { return i*7 + 1 + d*2 + j - 1 } // j = 1, 2 along sheet d; the line itself at i·7
		for i := range n + 1 {
			fixed := canopy.Freedom(0)
			if i == 0 || i == n {
				fixed = canopy.DirAll
			}
			node(s, shift, 0, float64(i), fixed)
			for d := range 3 {
				for j := 1; j <= 2; j++ {
					p := r3.Scale(r*float64(j)/2, dirs[d])
					if j == 1 {
						p.X += shift / 2
					}
					g := fixed
					if j == 2 {
						g = canopy.DirAll
					}
					node(s, p.X, p.Y, float64(i), g)
				}
			}
		}
		for i := range int32(n) {
			for d := range int32(3) {
				a, b, c := i*7, at(i, d, 1), at(i, d, 2)
				e, g, h := (i+1)*7, at(i+1, d, 1), at(i+1, d, 2)
				for _, k := range [][3]int32{{a, b, g}, {a, g, e}, {b, c, h}, {b, h, g}} {
					triangle(s, k[0], k[1], k[2], r3.Vec{Z: 1}, 1000, 1000)
				}
			}
		}
		f := canopy.NewForm(s)
		for t := range s.Corners {
			f.Warp[t] = r3.Vec{Z: 1}
			f.Stress[t] = canopy.Stress{Warp: 1000, Weft: 1000}
		}
		react(s, f)
		return s, f
	}
	s, f := build(0)
	trusted(t, run(t, s, f))
	s, f = build(0.01)
	untrusted(t, run(t, s, f), "do not balance")
}
