package audit_test

import (
	"context"
	"math"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
	"pgregory.net/rapid"

	"anticlast/formfind/audit"
	"anticlast/formfind/canopy"
)

// sail is a curved four-point film on fixed straight edges, n × n
// quadrilaterals with jittered inner nodes; corners alternate between 0 and 3 m.
func sail(t testing.TB, n int, warp, weft float64) (*canopy.Structure, *canopy.Form) {
	s := structure()
	s.Fabrics = []canopy.Fabric{{Name: "sail"}}
	seed := uint64(3)
	random := func() float64 {
		seed = seed*6364136223846793005 + 1442695040888963407
		return float64(seed>>33)/(1<<31) - 0.5
	}
	for j := 0; j <= n; j++ {
		for i := 0; i <= n; i++ {
			u, v := float64(i)/float64(n), float64(j)/float64(n)
			fixed := canopy.DirAll
			if i > 0 && j > 0 && i < n && j < n {
				fixed = 0
				u += 0.3 / float64(n) * random()
				v += 0.3 / float64(n) * random()
			}
			node(s, 10*u, 8*v, 3*(u+v-2*u*v), fixed)
		}
	}
	for j := range n {
		for i := range n {
			a := int32(j*(n+1) + i)
			b, d, c := a+1, a+int32(n)+1, a+int32(n)+2
			if (i+j)%2 == 1 {
				triangle(s, a, b, c, r3.Vec{X: 1}, warp, weft)
				triangle(s, a, c, d, r3.Vec{X: 1}, warp, weft)
			} else {
				triangle(s, a, b, d, r3.Vec{X: 1}, warp, weft)
				triangle(s, b, c, d, r3.Vec{X: 1}, warp, weft)
			}
		}
	}
	return s, solveForm(t, s, nil)
}

// hanging is a chain of n equal links of force density q with a load at each
// node: a parabola, H = w·L²/(8f) for the load w per horizontal length.
func hanging(t testing.TB, n int) (*canopy.Structure, *canopy.Form) {
	s := structure()
	for i := 0; i <= n; i++ {
		fixed := canopy.Freedom(0)
		if i == 0 || i == n {
			fixed = canopy.DirAll
		}
		node(s, 20*float64(i)/float64(n), 0, 0, fixed)
	}
	var q []float64
	s.Load = make([]r3.Vec, n+1)
	for i := range n {
		member(s, int32(i), int32(i+1), canopy.KindCable, canopy.LawForceDensity, 4000)
		q = append(q, 4000)
		if i > 0 {
			s.Load[i] = r3.Vec{Z: -1000}
		}
	}
	f := solveForm(t, s, q)
	return s, f
}

// net is an n × n grid of force densities 1 kN/m between alternating corners.
func net(t testing.TB, n int) (*canopy.Structure, *canopy.Form) {
	s := structure()
	for j := 0; j <= n; j++ {
		for i := 0; i <= n; i++ {
			u, v := float64(i)/float64(n), float64(j)/float64(n)
			fixed := canopy.Freedom(0)
			if i == 0 || j == 0 || i == n || j == n {
				fixed = canopy.DirAll
			}
			node(s, 20*u, 20*v, 4*(u+v-2*u*v)*(1+0.1*u), fixed)
		}
	}
	var q []float64
	for j := 0; j <= n; j++ {
		for i := 0; i <= n; i++ {
			a := int32(j*(n+1) + i)
			if i < n && j > 0 && j < n {
				member(s, a, a+1, canopy.KindNetCable, canopy.LawForceDensity, 1000)
				q = append(q, 1000)
			}
			if j < n && i > 0 && i < n {
				member(s, a, a+int32(n)+1, canopy.KindNetCable, canopy.LawForceDensity, 1500)
				q = append(q, 1500)
			}
		}
	}
	return s, solveForm(t, s, q)
}

func trusted(t *testing.T, a canopy.Audit) {
	t.Helper()
	require.True(t, a.Trusted, "%v", a.Reasons)
	require.Empty(t, a.Reasons)
	require.LessOrEqual(t, a.ResidualLargest, 1e-9)
	require.LessOrEqual(t, a.ForceBalance, 1e-9)
	require.LessOrEqual(t, a.MomentBalance, 1e-9)
	require.LessOrEqual(t, a.Virial, 1e-9)
	require.True(t, a.StabilityKnown)
	require.Zero(t, a.Unstable)
}

func untrusted(t *testing.T, a canopy.Audit, about string) {
	t.Helper()
	require.False(t, a.Trusted)
	require.Contains(t, strings.Join(a.Reasons, "\n"), about)
}

func TestSoundFormsAreTrusted(t *testing.T) {
	s, f := sail(t, 12, 2000, 2000)
	trusted(t, run(t, s, f))
	s, f = sail(t, 12, 3000, 1500)
	trusted(t, run(t, s, f))
	s, f = hanging(t, 10)
	trusted(t, run(t, s, f))
	// H = wL²/8f: w = 1 kN per 2 m, and H = 4 kN/m · 2 m.
	require.InDelta(t, -500*20*20/8./8000, f.Position[5].Z, 1e-9)
	s, f = net(t, 12)
	trusted(t, run(t, s, f))
}

// A flat film balances whatever the mesh, and its residual is rounding.
func TestFlatFilmPatch(t *testing.T) {
	s := structure()
	s.Fabrics = []canopy.Fabric{{Name: "film"}}
	node(s, 0, 0, 0, canopy.DirAll)
	node(s, 4, 0, 0, canopy.DirAll)
	node(s, 4, 3, 0, canopy.DirAll)
	node(s, 0, 3, 0, canopy.DirAll)
	node(s, 1.3, 0.7, 0, 0)
	node(s, 2.9, 1.9, 0, 0)
	for _, c := range [][3]int32{{0, 1, 4}, {1, 5, 4}, {1, 2, 5}, {2, 3, 5}, {3, 4, 5}, {3, 0, 4}} {
		triangle(s, c[0], c[1], c[2], r3.Vec{X: 1, Y: 1}, 2000, 1200) // uniform, not equal
	}
	f := canopy.NewForm(s)
	for tr := range s.Corners {
		f.Warp[tr] = r3.Unit(r3.Vec{X: 1, Y: 1})
		f.Stress[tr] = canopy.Stress{Warp: 2000, Weft: 1200}
	}
	react(s, f)
	a := run(t, s, f)
	trusted(t, a)
	require.Less(t, a.ResidualLargest, 1e-15)
	// The film pulls 1.6 kN/m in the mean normal to an edge: total 2·(σ·A)/… by the virial.
	require.InDelta(t, math.Pi/180*13.9, a.MinAngle, 0.05)
}

// Everything that a form reports is checked against something else: each of
// these faults must be caught, by the check that is there for it.
func TestFaultsAreCaught(t *testing.T) {
	fabric := func(t testing.TB) (*canopy.Structure, *canopy.Form) { return sail(t, 8, 2000, 2000) }
	cables := func(t testing.TB) (*canopy.Structure, *canopy.Form) { return net(t, 8) }
	for _, c := range []struct {
		name  string
		make  func(testing.TB) (*canopy.Structure, *canopy.Form)
		spoil func(*canopy.Structure, *canopy.Form)
		about string
		seen  func(*testing.T, canopy.Audit)
	}{
		{"node moved by 1e-7 m", fabric, func(s *canopy.Structure, f *canopy.Form) { f.Position[40].Z += 1e-7 }, "do not balance",
			func(t *testing.T, a canopy.Audit) { require.Equal(t, int32(40), a.ResidualNode) }},
		{"stress of a triangle", fabric, func(s *canopy.Structure, f *canopy.Form) { f.Stress[60].Warp *= 1.001 }, "do not balance",
			func(t *testing.T, a canopy.Audit) { require.Greater(t, a.Virial, 1e-9) }},
		{"stress hidden from free nodes", fabric, func(s *canopy.Structure, f *canopy.Form) {
			// A corner triangle with all its nodes fixed pulls at nothing
			// that is free: only the virial and the reactions can tell.
			for tr, c := range s.Corners {
				if s.Fixed[c[0]]&s.Fixed[c[1]]&s.Fixed[c[2]] == canopy.DirAll {
					f.Stress[tr].Weft *= 1.5
					return
				}
			}
			panic("no such triangle")
		}, "virial", func(t *testing.T, a canopy.Audit) {
			require.Less(t, a.ResidualLargest, 1e-9)
			require.Greater(t, a.ReactionMismatch, 1e-3)
		}},
		{"warp turned out of its plane", fabric, func(s *canopy.Structure, f *canopy.Form) { f.Warp[3].Z += 1e-3 }, "is not a unit direction", nil},
		{"warp turned in its plane", fabric, func(s *canopy.Structure, f *canopy.Form) {
			f.Stress[60] = canopy.Stress{Warp: f.Stress[60].Warp + 300, Weft: f.Stress[60].Weft - 300}
		}, "do not balance", nil},
		{"reaction", fabric, func(s *canopy.Structure, f *canopy.Form) { f.Reaction[3].X += 1 }, "reported reaction at node 3",
			func(t *testing.T, a canopy.Audit) { require.Greater(t, a.ForceBalance, 1e-9) }},
		{"reactions whose forces balance", fabric, func(s *canopy.Structure, f *canopy.Form) { f.Reaction[0].Z += 5; f.Reaction[8].Z -= 5 }, "moments of the reported reactions",
			func(t *testing.T, a canopy.Audit) { require.Less(t, a.ForceBalance, 1e-12) }},
		{"reaction at a free node", fabric, func(s *canopy.Structure, f *canopy.Form) { f.Reaction[40].Z += 1 }, "reported reaction at node 40", nil},
		{"member force", cables, func(s *canopy.Structure, f *canopy.Form) { f.Force[50] *= 1 + 1e-5 }, "where its law gives", nil},
		{"law of a member", cables, func(s *canopy.Structure, f *canopy.Form) { s.Given[50] *= 1.01 }, "where its law gives",
			func(t *testing.T, a canopy.Audit) {
				require.Less(t, a.ResidualLargest, 1e-9)
				require.InDelta(t, 0.01, a.ForceMismatch, 1e-3)
			}},
		{"pushed cable", cables, func(s *canopy.Structure, f *canopy.Form) { f.Force[50] *= -1 }, "would have to push", nil},
		{"fabric in compression", fabric, func(s *canopy.Structure, f *canopy.Form) { f.Stress[60].Shear = 2500 }, "in compression", nil},
		{"couple without a ring's forces", fabric, func(s *canopy.Structure, f *canopy.Form) {
			s.Rings = []canopy.Ring{{Name: "eye", Centre: -1}}
			f.Couple = []r3.Vec{{Z: 10}}
		}, "couple of ring eye", nil},
		{"collapsed triangle", fabric, func(s *canopy.Structure, f *canopy.Form) {
			c := s.Corners[60]
			f.Position[c[0]] = r3.Add(f.Position[c[1]], r3.Vec{X: 1e-6})
		}, "mesh has collapsed", nil},
		{"not a number", fabric, func(s *canopy.Structure, f *canopy.Form) { f.Position[40].Z = math.NaN() }, "not a finite number",
			func(t *testing.T, a canopy.Audit) { require.False(t, a.StabilityKnown) }},
		{"infinite stress", fabric, func(s *canopy.Structure, f *canopy.Form) { f.Stress[4].Weft = math.Inf(1) }, "not a finite number", nil},
	} {
		t.Run(c.name, func(t *testing.T) {
			s, f := c.make(t)
			trusted(t, run(t, s, f))
			c.spoil(s, f)
			a := run(t, s, f)
			untrusted(t, a, c.about)
			if c.seen != nil {
				c.seen(t, a)
			}
		})
	}
}

// A residual too small to matter at any node, but everywhere.
func TestResidualEverywhere(t *testing.T) {
	s, f := sail(t, 12, 2000, 2000)
	seed := uint64(5)
	for i := range f.Position {
		if s.Fixed[i] == 0 {
			seed = seed*6364136223846793005 + 1442695040888963407
			f.Position[i].Z += 3e-9 * (float64(seed>>33)/(1<<31) - 0.5)
		}
	}
	react(s, f)
	a := run(t, s, f)
	require.Less(t, a.ResidualLargest, 1e-8)
	require.Greater(t, a.ResidualRMS, 1e-9)
	untrusted(t, a, "mean residual")
}

// The laws of whole cables, away from fabric, where they must hold exactly.
func TestCableLaws(t *testing.T) {
	// A cable over two nodes that ropes of given force pull down and out;
	// lengths 5, 6, 5, sag 4 over chord 12. (With dead loads instead of the
	// ropes the nodes could slide along the cable.)
	build := func(law canopy.CableLaw) (*canopy.Structure, *canopy.Form, *canopy.Cable) {
		s := structure()
		node(s, 0, 0, 0, canopy.DirAll)
		node(s, 3, 0, -4, 0)
		node(s, 9, 0, -4, 0)
		node(s, 12, 0, 0, canopy.DirAll)
		var line []int32
		for i := range int32(3) {
			line = append(line, member(s, i, i+1, canopy.KindCable, canopy.LawCable, 0))
		}
		rope := 1e3 * math.Sqrt(0.8)
		for i, x := range [2]float64{3 - 2, 9 + 2} {
			member(s, int32(i)+1, node(s, x, 0, -8, canopy.DirAll), canopy.KindGuy, canopy.LawForce, rope)
		}
		s.Load = make([]r3.Vec, 6)
		c := chain(s, "line", canopy.KindCable, law, line...)
		return s, report(s, 1e3, 1e3, 1e3, rope, rope), c
	}
	s, f, c := build(canopy.CableSag)
	c.Value = 4. / 12
	trusted(t, run(t, s, f))
	c.Value *= 1.0001
	untrusted(t, run(t, s, f), "a sag over chord of")
	s, f, c = build(canopy.CableLength)
	c.Value = 16
	trusted(t, run(t, s, f))
	c.Value = 16.001
	untrusted(t, run(t, s, f), "a length in m of")
	s, f, c = build(canopy.CableElastic)
	c.Stiffness, c.Unstressed = 1e5, 16/1.01
	trusted(t, run(t, s, f))
	c.Unstressed = 15.85
	untrusted(t, run(t, s, f), "where its law gives")
	// Another force in the middle, balanced by other loads: not one force.
	s, f, c = build(canopy.CableLength)
	c.Value = 16
	f.Force[1] = 1.2e3
	s.Load[1].X -= 200
	s.Load[2].X += 200
	react(s, f)
	untrusted(t, run(t, s, f), "cable line carries")
}

func TestSlicesThatDoNotFitAreAnError(t *testing.T) {
	s, f := net(t, 4)
	f.Force = f.Force[1:]
	_, err := audit.Run(context.Background(), s, f, audit.Options{})
	require.ErrorContains(t, err, "member forces")
	s, f = net(t, 4)
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	_, err = audit.Run(ctx, s, f, audit.Options{})
	require.ErrorIs(t, err, context.Canceled)
}

// turned is the rotation about an axis by an angle.
func turned(axis r3.Vec, angle float64) func(r3.Vec) r3.Vec {
	r := r3.NewRotation(angle, axis)
	return func(v r3.Vec) r3.Vec { return r.Rotate(v) }
}

// Moving, turning, scaling and renumbering a form changes no verdict and no
// dimensionless number but by rounding.
func TestAuditIsInvariant(t *testing.T) {
	s0, f0 := sail(t, 8, 2500, 1500)
	u0 := catenoid(unstableWaist, 0.5, 10, 30, 1000)
	g0 := solveForm(t, u0, nil)
	rapid.Check(t, func(rt *rapid.T) {
		s, f := s0, f0
		if rapid.Bool().Draw(rt, "catenoid") {
			s, f = u0, g0
		}
		before := run(t, s, f)
		g := rapid.Float64Range(-1, 1)
		axis := r3.Vec{X: g.Draw(rt, "ax"), Y: g.Draw(rt, "ay"), Z: g.Draw(rt, "az")}
		if r3.Norm(axis) < 0.1 {
			axis = r3.Vec{Z: 1}
		}
		turn := turned(axis, 3*g.Draw(rt, "angle"))
		by := r3.Scale(rapid.SampledFrom([]float64{0, 1, 1e3, 1e6}).Draw(rt, "far"), r3.Vec{X: g.Draw(rt, "x"), Y: g.Draw(rt, "y"), Z: g.Draw(rt, "z")})
		k := rapid.SampledFrom([]float64{1, 0.01, 100}).Draw(rt, "size")
		p := rapid.SampledFrom([]float64{1, 1e-3, 1e3}).Draw(rt, "prestress")
		perm := rapid.Permutation(upTo(len(s.Position))).Draw(rt, "numbers")
		s2, f2 := transform(s, f, perm, func(x r3.Vec) r3.Vec { return r3.Add(r3.Scale(k, turn(x)), by) }, turn, k, p)
		after := run(t, s2, f2)
		require.Equal(t, before.Trusted, after.Trusted, "%v", after.Reasons)
		require.Equal(t, before.Unstable, after.Unstable)
		tol := 1e-5 + 1e-10*r3.Norm(by)/k
		require.InEpsilon(t, before.Softest, after.Softest, tol)
		require.InDelta(t, before.MinAngle, after.MinAngle, tol)
	})
}

func upTo(n int) []int {
	v := make([]int, n)
	for i := range v {
		v[i] = i
	}
	return v
}

// transform moves a structure and its form, forces scaled by p and areas by k².
func transform(s *canopy.Structure, f *canopy.Form, perm []int, move, turn func(r3.Vec) r3.Vec, k, p float64) (*canopy.Structure, *canopy.Form) {
	s2 := *s
	n := len(s.Position)
	s2.Position, s2.Fixed = make([]r3.Vec, n), make([]canopy.Freedom, n)
	to := make([]int32, n)
	for i, j := range perm {
		to[i] = int32(j)
		s2.Position[j] = move(s.Position[i])
		s2.Fixed[j] = s.Fixed[i]
	}
	s2.Corners = make([][3]int32, len(s.Corners))
	s2.Warp = make([]r3.Vec, len(s.Corners))
	s2.Stress = make([][2]float64, len(s.Corners))
	for t, c := range s.Corners {
		s2.Corners[t] = [3]int32{to[c[0]], to[c[1]], to[c[2]]}
		s2.Warp[t] = turn(s.Warp[t])
		s2.Stress[t] = [2]float64{p * s.Stress[t][0], p * s.Stress[t][1]}
	}
	f2 := canopy.NewForm(&s2)
	for i, j := range perm {
		f2.Position[j] = move(f.Position[i])
		f2.Reaction[j] = r3.Scale(p*k, turn(f.Reaction[i]))
	}
	for t := range s.Corners {
		f2.Warp[t] = turn(f.Warp[t])
		st := f.Stress[t]
		f2.Stress[t] = canopy.Stress{Warp: p * st.Warp, Weft: p * st.Weft, Shear: p * st.Shear}
	}
	return &s2, f2
}

// Same input, same bits.
func TestAuditRepeats(t *testing.T) {
	s, f := sail(t, 10, 2000, 2000)
	a, b := run(t, s, f), run(t, s, f)
	require.Equal(t, math.Float64bits(a.Softest), math.Float64bits(b.Softest))
	a.Discretisation, b.Discretisation = 0, 0
	require.Equal(t, a, b)
}
