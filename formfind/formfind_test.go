package formfind_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind"
	"anticlast/formfind/canopy"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/spec"
	"anticlast/formfind/surface"
)

func solve(t *testing.T, s *canopy.Structure, o formfind.Options) *canopy.Result {
	t.Helper()
	r, err := formfind.Solve(t.Context(), s, o)
	require.NoError(t, err)
	return r
}

func trusted(t *testing.T, r *canopy.Result) {
	t.Helper()
	require.True(t, r.Audit.Trusted, "%v", r.Audit.Reasons)
	require.LessOrEqual(t, r.Audit.ResidualLargest, 1e-9)
}

func read(t *testing.T, text string, set ...string) *canopy.Model {
	t.Helper()
	m, err := spec.Read(t.Context(), spec.Input(strings.NewReader(text), "."), spec.Options{Set: set})
	require.NoError(t, err)
	return m
}

func find(t *testing.T, text string, set ...string) *canopy.Result {
	t.Helper()
	r, err := formfind.Find(t.Context(), read(t, text, set...), formfind.Options{})
	require.NoError(t, err)
	return r
}

func near(t *testing.T, want, got []r3.Vec, tol float64, what string) {
	t.Helper()
	require.Len(t, got, len(want))
	for i := range want {
		if d := r3.Norm(r3.Sub(want[i], got[i])); !(d <= tol) {
			t.Fatalf("%s: node %d is %.3g m from where it should be (%.3g allowed)", what, i, d, tol)
		}
	}
}

func TestExamplesAreTrustedAndTwoEnginesAgree(t *testing.T) {
	files, err := filepath.Glob("../examples/*.yaml")
	require.NoError(t, err)
	require.GreaterOrEqual(t, len(files), 6)
	for _, f := range files {
		t.Run(filepath.Base(f), func(t *testing.T) {
			t.Parallel()
			m, err := spec.Read(t.Context(), spec.File(f), spec.Options{})
			require.NoError(t, err)
			r, err := formfind.Find(t.Context(), m, formfind.Options{CrossCheck: true})
			require.NoError(t, err)
			trusted(t, r)
			require.Contains(t, strings.Join(r.Form.Steps, "\n"), "agrees to")
			for _, f := range r.Findings {
				require.NotEqual(t, canopy.Broken, f.Severity, f.Text)
			}
		})
	}
}

const sail = `anticlast: 1
title: Trial
mesh: 800 mm
points:
  A: [0, 0, 4]
  B: [8, 0, 2]
  C: [8, 8, 4.5]
  D: [0, 8, 2]
edges:
  AB: {from: A, to: B, cable: {force: 22 kN}}
  BC: {from: B, to: C, cable: {force: 24 kN}}
  CD: {from: C, to: D, cable: {force: 22 kN}}
  DA: {from: D, to: A, cable: {force: 23 kN}}
fabrics:
  sail: {boundary: [AB, BC, CD, DA], prestress: {warp: 2.5 kN/m, weft: 2.5 kN/m}, warp: [1, 1, 0]}
`

func sailStructure(t *testing.T) *canopy.Structure { return find(t, sail).Structure }

// moveStructure returns s with every position and direction mapped.
func moveStructure(s *canopy.Structure, point, direction func(r3.Vec) r3.Vec) *canopy.Structure {
	out := *s
	out.Position = make([]r3.Vec, len(s.Position))
	for i, p := range s.Position {
		out.Position[i] = point(p)
	}
	out.Warp = make([]r3.Vec, len(s.Warp))
	for i, w := range s.Warp {
		out.Warp[i] = direction(w)
	}
	if s.Load != nil {
		out.Load = make([]r3.Vec, len(s.Load))
		for i, w := range s.Load {
			out.Load[i] = direction(w)
		}
	}
	out.Curves, out.OnCurve, out.Param = nil, nil, nil
	return &out
}

func TestTurningAModelTurnsTheAnswer(t *testing.T) {
	turn := r3.NewRotation(1.1, r3.Unit(r3.Vec{X: 0.3, Y: -0.5, Z: 0.8}))
	for name, s := range map[string]*canopy.Structure{"equal": sailStructure(t), "unequal": find(t, sail, "fabrics.sail.prestress.warp=2 kN/m").Structure} {
		a := solve(t, s, formfind.Options{})
		b := solve(t, moveStructure(s, turn.Rotate, turn.Rotate), formfind.Options{})
		trusted(t, a)
		trusted(t, b)
		want := make([]r3.Vec, len(a.Form.Position))
		for i, p := range a.Form.Position {
			want[i] = turn.Rotate(p)
		}
		near(t, want, b.Form.Position, 1e-8*s.Size(), name)
	}
}

func TestTurningAboutZUnderGravityTurnsTheAnswer(t *testing.T) {
	s := sailStructure(t)
	heavy := *s
	heavy.SelfWeight = true
	heavy.Fabrics = append([]canopy.Fabric(nil), s.Fabrics...)
	heavy.Fabrics[0].Weight = 40
	turn := r3.NewRotation(0.7, r3.Vec{Z: 1})
	a := solve(t, &heavy, formfind.Options{})
	b := solve(t, moveStructure(&heavy, turn.Rotate, turn.Rotate), formfind.Options{})
	trusted(t, a)
	trusted(t, b)
	want := make([]r3.Vec, len(a.Form.Position))
	for i, p := range a.Form.Position {
		want[i] = turn.Rotate(p)
	}
	near(t, want, b.Form.Position, 1e-8*s.Size(), "turned")
	without := solve(t, s, formfind.Options{})
	lower := 0
	for i := range want {
		if a.Form.Position[i].Z < without.Form.Position[i].Z-1e-4 {
			lower++
		}
	}
	require.Greater(t, lower, len(want)/2, "weight makes it sag")
}

func TestMovingAModelMovesTheAnswer(t *testing.T) {
	s := sailStructure(t)
	a := solve(t, s, formfind.Options{})
	for _, far := range []r3.Vec{{X: 3, Y: -2, Z: 1}, {X: 52_000, Y: 431_000, Z: 120}} {
		b := solve(t, moveStructure(s, func(p r3.Vec) r3.Vec { return r3.Add(p, far) }, func(d r3.Vec) r3.Vec { return d }), formfind.Options{})
		want := make([]r3.Vec, len(a.Form.Position))
		for i, p := range a.Form.Position {
			want[i] = r3.Add(p, far)
		}
		near(t, want, b.Form.Position, 1e-8*s.Size(), fmt.Sprint(far))
		require.True(t, b.Audit.Trusted, "%v", b.Audit.Reasons)
	}
}

func TestRenumberingAModelRenumbersTheAnswer(t *testing.T) {
	s := sailStructure(t)
	a := solve(t, s, formfind.Options{})
	n := len(s.Position)
	to := make([]int32, n) // a fixed shuffle
	for i := range to {
		to[i] = int32(i)
	}
	state := uint64(7)
	for i := n - 1; i > 0; i-- {
		state = state*6364136223846793005 + 1442695040888963407
		j := int(state>>33) % (i + 1)
		to[i], to[j] = to[j], to[i]
	}
	b := *s
	b.Curves, b.OnCurve, b.Param, b.NodeName = nil, nil, nil, canopy.Names{}
	b.Position, b.Fixed = make([]r3.Vec, n), make([]canopy.Freedom, n)
	if s.Held != nil {
		b.Held = make([]canopy.Freedom, n)
	}
	if s.Master != nil {
		b.Master = make([]int32, n)
	}
	for i, j := range to {
		b.Position[j], b.Fixed[j] = s.Position[i], s.Fixed[i]
		if s.Held != nil {
			b.Held[j] = s.Held[i]
		}
		if s.Master != nil {
			b.Master[j] = -1
			if m := s.Master[i]; m >= 0 {
				b.Master[j] = to[m]
			}
		}
	}
	b.Ends = make([][2]int32, len(s.Ends))
	for k, e := range s.Ends {
		b.Ends[k] = [2]int32{to[e[0]], to[e[1]]}
	}
	b.Corners = make([][3]int32, len(s.Corners))
	for k, c := range s.Corners {
		b.Corners[k] = [3]int32{to[c[1]], to[c[2]], to[c[0]]}
	}
	b.Cables = append([]canopy.Cable(nil), s.Cables...)
	for c := range b.Cables {
		nodes := make([]int32, len(b.Cables[c].Nodes))
		for i, v := range b.Cables[c].Nodes {
			nodes[i] = to[v]
		}
		b.Cables[c].Nodes = nodes
	}
	b.Lines = nil
	got := solve(t, &b, formfind.Options{})
	trusted(t, got)
	back := make([]r3.Vec, n)
	for i, j := range to {
		back[i] = got.Form.Position[j]
	}
	near(t, a.Form.Position, back, 1e-8*s.Size(), "renumbered")
}

// Scaling: lengths × k scale the shape by k when cable forces scale by k and
// fabric stress stays (T = σR); doubling all prestress leaves the shape.
func TestScalingLaws(t *testing.T) {
	s := sailStructure(t)
	a := solve(t, s, formfind.Options{})
	const k = 3.5
	large := moveStructure(s, func(p r3.Vec) r3.Vec { return r3.Scale(k, p) }, func(d r3.Vec) r3.Vec { return d })
	large.Given = append([]float64(nil), s.Given...)
	for i := range large.Given {
		large.Given[i] *= k
	}
	b := solve(t, large, formfind.Options{})
	trusted(t, b)
	want := make([]r3.Vec, len(a.Form.Position))
	for i, p := range a.Form.Position {
		want[i] = r3.Scale(k, p)
	}
	near(t, want, b.Form.Position, 1e-8*k*s.Size(), "scaled")

	double := *s
	double.Given = append([]float64(nil), s.Given...)
	for i := range double.Given {
		double.Given[i] *= 2
	}
	double.Stress = append([][2]float64(nil), s.Stress...)
	for i := range double.Stress {
		double.Stress[i] = [2]float64{2 * s.Stress[i][0], 2 * s.Stress[i][1]}
	}
	c := solve(t, &double, formfind.Options{})
	near(t, a.Form.Position, c.Form.Position, 1e-8*s.Size(), "doubled")
	for i, f := range a.Form.Force {
		require.InDelta(t, 2*f, c.Form.Force[i], 1e-6*math.Abs(f))
	}
	for i, r := range a.Form.Reaction {
		require.InDelta(t, 0, r3.Norm(r3.Sub(c.Form.Reaction[i], r3.Scale(2, r))), 1e-5*(1+r3.Norm(r)))
	}
}

// An edge cable against a uniform film has constant force T and bends with
// radius R = T/σ in the plane of film and cable (equilibrium across the cable:
// T/R = σ), to the accuracy of its polygon.
func TestEdgeCableBendsWithRadiusForceOverStress(t *testing.T) {
	var last float64
	for i, mesh := range []string{"800 mm", "400 mm", "200 mm"} {
		r := find(t, sail, "mesh="+mesh)
		trusted(t, r)
		worst := 0.0
		for c := range r.Structure.Cables {
			nodes := r.Structure.Cables[c].Nodes
			if r.Structure.Cables[c].Kind != canopy.KindEdgeCable {
				continue
			}
			for k := 2; k+2 < len(nodes); k++ {
				p, q, s := r.Form.Position[nodes[k-1]], r.Form.Position[nodes[k]], r.Form.Position[nodes[k+1]]
				a, b, d := r3.Norm(r3.Sub(q, p)), r3.Norm(r3.Sub(s, q)), r3.Norm(r3.Sub(s, p))
				area := r3.Norm(r3.Cross(r3.Sub(q, p), r3.Sub(s, p))) / 2
				radius := a * b * d / (4 * area) // circle through three points
				want := r.Form.Force[r.Structure.Cables[c].Members[k]] / 2500
				worst = math.Max(worst, math.Abs(radius/want-1))
			}
		}
		t.Logf("mesh %s: radius within %.2f %%", mesh, 100*worst)
		if i == 2 {
			require.Less(t, worst, 0.02)
			require.Less(t, worst, last)
		}
		last = worst
	}
}

// Along an edge cable bonded to fabric of unequal prestress the cable force
// changes by the shear that the fabric puts along it: dT/ds = (σw − σf) sinθ
// cosθ in size, θ between cable and warp (resolving the membrane stress along
// a cut at θ).
func TestCableForceChangesByTheShearOfUnequalFabric(t *testing.T) {
	r := find(t, sail, "mesh=250 mm", "fabrics.sail.prestress.warp=1.6 kN/m", "fabrics.sail.warp=[1, 0.25, 0]")
	trusted(t, r)
	s, f := r.Structure, r.Form
	// The triangle on each cable member.
	side := map[[2]int32]int{}
	for tri, c := range s.Corners {
		for k := range 3 {
			i, j := c[k], c[(k+1)%3]
			side[[2]int32{min(i, j), max(i, j)}] = tri
		}
	}
	for c := range s.Cables {
		cb := &s.Cables[c]
		first, last := 3, len(cb.Members)-4 // away from the corners
		expected, size := 0.0, 0.0
		for k := first; k < last; k++ {
			// Half of each of the two members between mid k and mid k+1.
			for _, m := range []int32{cb.Members[k], cb.Members[k+1]} {
				e := s.Ends[m]
				tri := side[[2]int32{min(e[0], e[1]), max(e[0], e[1])}]
				i := cb.Nodes[k]
				if m == cb.Members[k+1] {
					i = cb.Nodes[k+1]
				}
				j := e[0] + e[1] - i
				d := r3.Sub(f.Position[j], f.Position[i]) // along the cable's order
				l := r3.Norm(d)
				u := r3.Scale(1/l, d)
				cn := s.Corners[tri]
				_, n := surface.AreaNormal(f.Position[cn[0]], f.Position[cn[1]], f.Position[cn[2]])
				weft := r3.Cross(n, f.Warp[tri])
				into := r3.Cross(n, u) // across the cable, into the fabric
				third := cn[0] + cn[1] + cn[2] - i - j
				if r3.Dot(into, r3.Sub(f.Position[third], f.Position[i])) < 0 {
					into = r3.Scale(-1, into)
				}
				co, si := r3.Dot(u, f.Warp[tri]), r3.Dot(u, weft)
				cm, sm := r3.Dot(into, f.Warp[tri]), r3.Dot(into, weft)
				st := f.Stress[tri]
				// −u·σ·into; without shear stress (σw − σf) sinθ cosθ in size.
				shear := -(st.Warp*co*cm + st.Weft*si*sm + st.Shear*(co*sm+si*cm))
				require.InDelta(t, math.Abs((st.Warp-st.Weft)*si*co), math.Abs(shear+st.Shear*(co*sm+si*cm)), 1e-9*st.Warp)
				expected += shear * l / 2
				size += math.Abs(shear) * l / 2
			}
		}
		got := f.Force[cb.Members[last]] - f.Force[cb.Members[first]]
		t.Logf("cable %s: force changes by %.0f N, by the formula %.0f N", cb.Name, got, expected)
		require.InDelta(t, expected, got, 0.03*size+20, cb.Name)
	}
}

// On a shallow saddle without pressure the two directions carry each other:
// σw ∂²z/∂x² + σf ∂²z/∂y² = 0, so H₁·8f₁/L₁² = H₂·8f₂/L₂². With a boundary on
// z = c(x²/σw − y²/σf), which solves it, the surface inside is the same. Worked
// numbers: L = 20, f₁ = 2, f₂ = 1.5, H₁ = 3 gives H₂ = 4 kN/m.
func TestShallowSaddleRelation(t *testing.T) {
	require.InDelta(t, 4, 3*(8*2./400)/(8*1.5/400), 1e-12)
	const l, warp, weft = 20.0, 3000.0, 4000.0
	for _, rise := range []float64{0.4, 0.2} {
		c := rise * warp / (l * l / 4)
		n := 16
		s := &canopy.Structure{}
		at := func(i, j int) r3.Vec {
			x, y := l*(float64(i)/float64(n)-0.5), l*(float64(j)/float64(n)-0.5)
			return r3.Vec{X: x, Y: y, Z: c * (x*x/warp - y*y/weft)}
		}
		id := func(i, j int) int32 { return int32(j*(n+1) + i) }
		exact := []r3.Vec{}
		for j := 0; j <= n; j++ {
			for i := 0; i <= n; i++ {
				p := at(i, j)
				exact = append(exact, p)
				fixed := canopy.Freedom(0)
				if i == 0 || j == 0 || i == n || j == n {
					fixed = canopy.DirAll
				} else {
					p.Z += 0.3 * math.Sin(float64(i*j))
				}
				s.Position, s.Fixed = append(s.Position, p), append(s.Fixed, fixed)
			}
		}
		for j := range n {
			for i := range n {
				a, b, d, e := id(i, j), id(i+1, j), id(i+1, j+1), id(i, j+1)
				s.Corners = append(s.Corners, [3]int32{a, b, d}, [3]int32{a, d, e})
			}
		}
		s.Fabrics = []canopy.Fabric{{Name: "saddle"}}
		for range s.Corners {
			s.FabricOf = append(s.FabricOf, 0)
			s.Warp = append(s.Warp, r3.Vec{X: 1})
			s.Stress = append(s.Stress, [2]float64{warp, weft})
		}
		r := solve(t, s, formfind.Options{})
		trusted(t, r)
		worst := 0.0
		for i, p := range r.Form.Position {
			worst = math.Max(worst, math.Abs(p.Z-c*(p.X*p.X/warp-p.Y*p.Y/weft)))
			_ = exact[i]
		}
		t.Logf("rise %.2f m: surface within %.1e of the rise", rise, worst/rise)
		require.Less(t, worst/rise, 3*(rise/l)*(rise/l)*4+2e-3, "small slopes: error of second order in rise over span")
	}
}

// The catenoid of half separation h = 0.5 R: waist 0.848337938094979 R and area
// 5.99179697580228 R² (stable), 0.235094990234533 R (unstable): roots of
// a cosh(h/a) = R (Euler 1744; J. C. C. Nitsche, Minimal Surfaces 1,
// Cambridge 1989), recomputed.
func TestCatenoidBothBranches(t *testing.T) {
	require.InDelta(t, 0.848337938094979, cases.Waist(0.5, true), 1e-12)
	require.InDelta(t, 0.235094990234533, cases.Waist(0.5, false), 1e-12)

	stable := cases.Catenoid(0.5, 48, 24, true, 1000)
	r := solve(t, stable.S, formfind.Options{Listed: true, CrossCheck: true})
	trusted(t, r)
	require.InDelta(t, 5.99179697580228, cases.Area(stable.S, r.Form.Position), 0.02)

	unstable := cases.Catenoid(0.5, 64, 64, false, 1000)
	s := *unstable.S
	s.Position = unstable.Exact
	r = solve(t, &s, formfind.Options{Listed: true})
	require.False(t, r.Audit.Trusted)
	require.Positive(t, r.Audit.Unstable)
	require.Contains(t, strings.Join(r.Audit.Reasons, "\n"), "unstable")
	require.LessOrEqual(t, r.Audit.ResidualLargest, 1e-9, "in perfect balance all the same")

	// Without its nodes meaning anything the same boundary has the stable shape.
	r = solve(t, &s, formfind.Options{})
	trusted(t, r)
	require.InDelta(t, 5.99179697580228, cases.Area(&s, r.Form.Position), 0.02)
}

// Equal tensions on the corners of a square of side d shorten to (1+√3)d with
// 120° junctions (Plateau 1873; minimal network of a square); equal tensions
// give a triangle's Fermat point, equal force densities its centroid.
func TestMinimalNetworks(t *testing.T) {
	c := cases.SquareNetwork(2, 1000)
	r := solve(t, c.S, formfind.Options{CrossCheck: true})
	trusted(t, r)
	length := 0.0
	for _, e := range c.S.Ends {
		length += r3.Norm(r3.Sub(r.Form.Position[e[1]], r.Form.Position[e[0]]))
	}
	require.InDelta(t, (1+math.Sqrt(3))*2, length, 1e-8)

	for law, want := range map[canopy.Law]r3.Vec{
		canopy.LawForce:        {X: 0.957250899105, Y: 1.065658275019},
		canopy.LawForceDensity: {X: 2, Y: 4. / 3},
	} {
		c := cases.FermatPoint(law, 1000)
		r := solve(t, c.S, formfind.Options{CrossCheck: true})
		trusted(t, r)
		for i := range c.S.Position {
			if c.S.Fixed[i] == 0 {
				require.InDelta(t, 0, r3.Norm(r3.Sub(want, r.Form.Position[i])), 1e-8)
			}
		}
	}
}

// Beyond h = 0.6627434 R no catenoid exists (u tanh u = 1): said, not drawn.
func TestNoCatenoidBeyondTheCriticalSeparation(t *testing.T) {
	c := cases.Catenoid(0.5, 32, 16, true, 1000)
	s := *c.S
	s.Position = append([]r3.Vec(nil), s.Position...)
	for i := range s.Position {
		s.Position[i].Z *= 0.75 / 0.5
	}
	_, err := formfind.Solve(t.Context(), &s, formfind.Options{})
	var none *formfind.NoEquilibriumError
	require.ErrorAs(t, err, &none)
}

const masted = `anticlast: 1
title: Held corner
mesh: 1 m
points:
  A: [0, 0, 5]
  B: [8, 0, 2]
  C: [8, 8, 5]
  D: [0, 8, 2]
  F: [0, 0, 0]
  G1: [-4, 0, 0]
  G2: [0, -4, 0]
  G3: [-4, -4, 0]
edges:
  AB: {from: A, to: B, cable: {force: 22 kN}}
  BC: {from: B, to: C, cable: {force: 22 kN}}
  CD: {from: C, to: D, cable: {force: 22 kN}}
  DA: {from: D, to: A, cable: {force: 22 kN}}
fabrics:
  sail: {boundary: [AB, BC, CD, DA], prestress: 2.5 kN/m, warp: [1, 1, 0]}
masts:
  M: {foot: F, head: A}
guys:
  E: {from: A, to: G1}
  N: {from: A, to: G2}
`

func TestMastAndGuysBalanceAHeldPoint(t *testing.T) {
	r := find(t, masted)
	trusted(t, r)
	force := map[string]float64{}
	for c := range r.Structure.Cables {
		cb := &r.Structure.Cables[c]
		force[cb.Name] = r.Form.Force[cb.Members[0]]
	}
	require.Negative(t, force["M"])
	require.Positive(t, force["E"])
	require.InDelta(t, force["E"], force["N"], 1e-6*force["E"], "symmetry")
}

func TestBalanceRefusals(t *testing.T) {
	fault := func(text string) formfind.BalanceFault {
		t.Helper()
		_, err := formfind.Find(t.Context(), read(t, text), formfind.Options{})
		var b *formfind.BalanceError
		require.Error(t, err)
		if !errors.As(err, &b) {
			t.Fatalf("%T %v", err, err)
		}
		require.NotEmpty(t, b.Text)
		return b.Fault
	}
	require.Equal(t, formfind.BalanceSurplus, fault(masted+"  S: {from: A, to: G3}\n"))
	inward := strings.Replace(masted, "G1: [-4, 0, 0]", "G1: [4, 0, 0]", 1)
	require.Equal(t, formfind.BalancePushed, fault(inward))
	require.Equal(t, formfind.BalanceNotSpanned, fault(strings.Replace(masted, "  N: {from: A, to: G2}\n", "", 1)))
	given := find(t, masted+"  S: {from: A, to: G3, force: 5 kN}\n")
	trusted(t, given)
}

func TestCancelledContextEndsTheSearch(t *testing.T) {
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	_, err := formfind.Solve(ctx, cases.Catenoid(0.5, 32, 16, true, 1000).S, formfind.Options{})
	require.ErrorIs(t, err, context.Canceled)
}
