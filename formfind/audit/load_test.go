package audit_test

import (
	"math"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/audit"
	"anticlast/formfind/canopy"
)

// balanced puts on every free node the dead load that balances it exactly.
func balanced(s *canopy.Structure, f *canopy.Form, extra func(i int) r3.Vec) {
	s.Load = make([]r3.Vec, len(s.Position))
	fixed := s.Fixed
	s.Fixed = make([]canopy.Freedom, len(fixed))
	for i := range s.Fixed {
		s.Fixed[i] = canopy.DirAll
	}
	react(s, f) // what each node needs
	s.Fixed = fixed
	for i := range s.Load {
		need := r3.Sub(f.Reaction[i], extra(i))
		f.Reaction[i] = r3.Vec{}
		if fixed[i] == canopy.DirAll {
			f.Reaction[i] = need
		} else {
			s.Load[i] = need
		}
	}
}

// bubble is a spherical cap of the given radius over a ring of radius 5, rise
// f, meshed in rings of latitude, under its own pressure 2T/R.
func bubble(rise, tension float64, rows int) (*canopy.Structure, *canopy.Form) {
	const a = 5.
	r := (a*a + rise*rise) / (2 * rise)
	p := 2 * tension / r
	end := math.Acos((r - rise) / r) // angle from the crown to the ring
	s := structure()
	s.Fabrics = []canopy.Fabric{{Name: "cushion", Pressure: p}}
	node(s, 0, 0, r, 0)
	around := 24
	for i := 1; i <= rows; i++ {
		g := end * float64(i) / float64(rows)
		fixed := canopy.Freedom(0)
		if i == rows {
			fixed = canopy.DirAll
		}
		for j := range around {
			b := 2 * math.Pi * (float64(j) + float64(i%2)/2) / float64(around)
			node(s, r*math.Sin(g)*math.Cos(b), r*math.Sin(g)*math.Sin(b), r*math.Cos(g), fixed)
		}
	}
	at := func(i, j int) int32 { return int32(1 + (i-1)*around + (j+around)%around) }
	add := func(i, j, k int32) {
		// Warp around the axis; towards x at the crown.
		c := r3.Add(r3.Add(s.Position[i], s.Position[j]), s.Position[k])
		triangle(s, i, j, k, r3.Vec{X: -c.Y, Y: c.X}, tension, tension)
	}
	for j := range around {
		add(0, at(1, j), at(1, j+1))
	}
	for i := 1; i < rows; i++ {
		for j := range around {
			if i%2 == 1 { // odd rows are half a step ahead
				add(at(i, j), at(i+1, j), at(i+1, j+1))
				add(at(i, j), at(i+1, j+1), at(i, j+1))
			} else {
				add(at(i, j), at(i+1, j), at(i, j+1))
				add(at(i, j+1), at(i+1, j), at(i+1, j+1))
			}
		}
	}
	f := canopy.NewForm(s)
	for tr, c := range s.Corners {
		n := r3.Unit(r3.Cross(r3.Sub(s.Position[c[1]], s.Position[c[0]]), r3.Sub(s.Position[c[2]], s.Position[c[0]])))
		f.Warp[tr] = r3.Unit(r3.Sub(s.Warp[tr], r3.Scale(r3.Dot(s.Warp[tr], n), n)))
		f.Stress[tr] = canopy.Stress{Warp: tension, Weft: tension}
	}
	push := make([]r3.Vec, len(s.Position))
	for _, c := range s.Corners {
		v := r3.Scale(p/6, r3.Cross(r3.Sub(s.Position[c[1]], s.Position[c[0]]), r3.Sub(s.Position[c[2]], s.Position[c[0]])))
		for _, i := range c {
			push[i] = r3.Add(push[i], v)
		}
	}
	balanced(s, f, func(i int) r3.Vec { return push[i] })
	return s, f
}

// A cap of tension T over a ring of radius a needs p = 4Tf/(a²+f²), least at
// small and at great rise, most, 2T/a, at the hemisphere (Laplace and Young).
// Below the hemisphere it is stable under constant pressure; beyond, growing
// needs less pressure and it runs away. a = 5, T = 5, p = 1: f = 1.33974596216.
func TestBubbleRunsAwayBeyondTheHemisphere(t *testing.T) {
	for _, c := range []struct {
		rise     float64
		unstable int
	}{{1.33974596216, 0}, {4.5, 0}, {5.6, 1}, {25 / 1.33974596216, 1}} {
		s, f := bubble(c.rise, 5000, 16)
		a := run(t, s, f)
		require.Less(t, a.ResidualLargest, 1e-12)
		require.Equal(t, c.unstable, a.Unstable, "rise %g: %g", c.rise, a.Softest)
		require.Equal(t, c.unstable == 0, a.Trusted, "%v", a.Reasons)
		// The dead loads that make the polyhedron balance are small beside
		// the pressure: p = 2T/R is right.
		var rest, all float64
		for i, l := range s.Load {
			rest += r3.Norm(l)
			all += r3.Norm(f.Reaction[i])
		}
		require.Less(t, rest, 0.12*all)
		// Without the pressure nothing balances.
		s.Fabrics[0].Pressure = 0
		untrusted(t, run(t, s, f), "do not balance")
	}
}

// Weights act as the structure documents them: each spoils the balance when
// it is switched off.
func TestWeightsAct(t *testing.T) {
	s, f := sail(t, 6, 2000, 2000)
	n := len(s.Position)
	free := int32(24)
	// A cable inside, with and without unstressed length, and a rigid ring's
	// weight at a node.
	member(s, free, free+1, canopy.KindCable, canopy.LawForce, 500)
	member(s, free+1, free+2, canopy.KindCable, canopy.LawForce, 500)
	f.Force = []float64{500, 500}
	s.Weight = []float64{20, 30}
	s.Unstressed = []float64{0, 1.5}
	s.Fabrics[0].Weight = 12
	s.Rings = []canopy.Ring{{Name: "r", Centre: free, Rigid: true, Weight: 700}, {Name: "c", Centre: -1, Nodes: []int32{25, 26}, Weight: 90}}
	f.Couple = make([]r3.Vec, 2)
	s.SelfWeight = true
	down := make([]float64, n)
	for _, c := range s.Corners {
		area := r3.Norm(r3.Cross(r3.Sub(f.Position[c[1]], f.Position[c[0]]), r3.Sub(f.Position[c[2]], f.Position[c[0]]))) / 2
		for _, i := range c {
			down[i] += 12 * area / 3
		}
	}
	l0 := r3.Norm(r3.Sub(f.Position[free+1], f.Position[free]))
	down[free] += 20*l0/2 + 700
	down[free+1] += 20*l0/2 + 30*1.5/2 + 45
	down[free+2] += 30*1.5/2 + 45
	copy(s.Position, f.Position)
	balanced(s, f, func(i int) r3.Vec { return r3.Vec{Z: -down[i]} })
	trusted(t, run(t, s, f))
	for name, spoil := range map[string]func(){
		"all":    func() { s.SelfWeight = false },
		"fabric": func() { s.Fabrics[0].Weight++ },
		"cable":  func() { s.Weight[0]++ },
		"length": func() { s.Unstressed[1] += 0.01 },
		"ring":   func() { s.Rings[0].Weight++ },
		"cables": func() { s.Rings[1].Weight++ },
	} {
		keep, w, u, rings := *s, s.Weight, s.Unstressed, s.Rings
		fab := s.Fabrics
		s.Weight, s.Unstressed = append([]float64(nil), w...), append([]float64(nil), u...)
		s.Rings, s.Fabrics = append([]canopy.Ring(nil), rings...), append([]canopy.Fabric(nil), fab...)
		spoil()
		untrusted(t, run(t, s, f), "do not balance")
		*s = keep
		_ = name
	}
	trusted(t, run(t, s, f))
}

// A held corner without support must be balanced by its mast and guys.
func TestHeldPointsAreBalanced(t *testing.T) {
	s, f := sail(t, 8, 2000, 2000)
	corner := int32(8) // (10, 0, 3)
	s.Fixed[corner] = 0
	s.Held = make([]canopy.Freedom, len(s.Position), len(s.Position)+3)
	s.Held[corner] = canopy.DirAll
	pull := r3.Scale(-1, f.Reaction[corner])
	f.Reaction[corner] = r3.Vec{}
	a := mat.NewDense(3, 3, nil)
	for k, p := range [][3]float64{{10.5, -0.5, 0}, {14, -1, 0}, {11, -5, 0}} {
		e := node(s, p[0], p[1], p[2], canopy.DirAll)
		kind := canopy.KindGuy
		if k == 0 {
			kind = canopy.KindMast
		}
		m := member(s, e, corner, kind, canopy.LawCable, 0)
		chain(s, []string{"mast", "g1", "g2"}[k], kind, canopy.CableBalance, m)
		s.Held = append(s.Held, 0)
		f.Position = append(f.Position, s.Position[e])
		f.Reaction = append(f.Reaction, r3.Vec{})
		u := r3.Unit(r3.Sub(s.Position[e], s.Position[corner]))
		a.Set(0, k, u.X)
		a.Set(1, k, u.Y)
		a.Set(2, k, u.Z)
	}
	var x mat.VecDense
	require.NoError(t, x.SolveVec(a, mat.NewVecDense(3, []float64{-pull.X, -pull.Y, -pull.Z})))
	f.Force = append([]float64(nil), x.RawVector().Data...)
	require.Negative(t, f.Force[0])
	react(s, f)
	trusted(t, run(t, s, f))
	f.Force[1] *= 1.01
	react(s, f)
	au := run(t, s, f)
	untrusted(t, au, "do not balance")
	require.Equal(t, corner, au.ResidualNode)
	// A guy in compression is told.
	f.Force[1] = -100
	untrusted(t, run(t, s, f), "would have to push")
}

// Chord 10, sag 1: the radius is 13, and a film of 3 kN/m across needs an edge
// cable of 39 kN. On a polygon of n sides in the arc the exact force is that
// times cos(θ/2), θ the turn at a node.
func TestEdgeCableOfAFlatFilm(t *testing.T) {
	const sigma, r = 3000., 13.
	n := 20
	half := math.Asin(5 / r)
	turn := 2 * half / float64(n)
	s := structure()
	s.Fabrics = []canopy.Fabric{{Name: "film"}}
	for i := 0; i <= n; i++ { // the arc sags into the film below it
		g := -half + turn*float64(i)
		fixed := canopy.Freedom(0)
		if i == 0 || i == n {
			fixed = canopy.DirAll
		}
		node(s, r*math.Sin(g), 13-r*math.Cos(g), 0, fixed)
	}
	for i := 0; i <= n; i++ {
		node(s, -5+10*float64(i)/float64(n), -3, 0, canopy.DirAll)
	}
	force := sigma * r * math.Cos(turn/2)
	var line []int32
	var forces []float64
	for i := range int32(n) {
		line = append(line, member(s, i, i+1, canopy.KindEdgeCable, canopy.LawForce, 39e3))
		forces = append(forces, force)
		low := int32(n) + 1 + i
		triangle(s, low, low+1, i, r3.Vec{X: 1}, sigma, sigma)
		triangle(s, low+1, i+1, i, r3.Vec{X: 1}, sigma, sigma)
	}
	chain(s, "north", canopy.KindEdgeCable, canopy.CablePerMember, line...)
	f := canopy.NewForm(s)
	f.Force = forces
	for tr := range s.Corners {
		f.Warp[tr] = r3.Vec{X: 1}
		f.Stress[tr] = canopy.Stress{Warp: sigma, Weft: sigma}
	}
	react(s, f)
	a := run(t, s, f)
	trusted(t, a)
	q := audit.Quantities(s, f, canopy.Factors{})
	require.InDelta(t, 10, q.Cables[0].Chord, 1e-12)
	require.InDelta(t, 1, q.Cables[0].Sag, 1e-12)
	require.InEpsilon(t, 10.2645691121938, q.Cables[0].Length, 1e-4)
	require.InEpsilon(t, 39e3, q.Cables[0].ForceMean, 1e-3)
	require.InDelta(t, 0, q.Cables[0].Evenness, 1e-12)
	// A cable far from what is asked is not this cable.
	for i := range s.Given {
		s.Given[i] = 20e3
	}
	untrusted(t, run(t, s, f), "where its law gives")
}
