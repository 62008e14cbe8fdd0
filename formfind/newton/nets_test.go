package newton_test

import (
	"encoding/json"
	"math"
	"os"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/newton"
)

// Members of equal force on the corners of a square reach the least network of
// length (1+√3)d with 120° at both points (Plateau's laws), from a disturbed
// start in space.
func TestSquareNetworkIsLeast(t *testing.T) {
	c := cases.SquareNetwork(3, 700)
	f, out := find(t, c.S, nil)
	assert.Less(t, distance(c.Exact, f.Position), 1e-8)
	long := 0.0
	for _, e := range c.S.Ends {
		long += r3.Norm(r3.Sub(f.Position[e[1]], f.Position[e[0]]))
	}
	assert.InDelta(t, 3*(1+math.Sqrt(3)), long, 1e-9)
	for i := 4; i < 6; i++ { // the two free nodes
		var dir []r3.Vec
		for _, e := range c.S.Ends {
			for side := range 2 {
				if int(e[side]) == i {
					dir = append(dir, r3.Unit(r3.Sub(f.Position[e[1-side]], f.Position[i])))
				}
			}
		}
		require.Len(t, dir, 3)
		for k := range 3 {
			assert.InDelta(t, -0.5, r3.Dot(dir[k], dir[(k+1)%3]), 1e-8)
		}
	}
	t.Log(out.Iterations, "steps")
}

// Equal forces lead to the Fermat point, equal force densities to the centroid.
func TestFermatPointAndCentroid(t *testing.T) {
	for _, c := range []cases.Case{cases.FermatPoint(canopy.LawForce, 1e3), cases.FermatPoint(canopy.LawForceDensity, 1e3)} {
		f, _ := find(t, c.S, nil)
		assert.Less(t, distance(c.Exact, f.Position), 1e-8)
	}
}

// A net of equal force densities with straight edges is the bilinear surface.
func TestForceDensityNetInOneStep(t *testing.T) {
	c := cases.QuadNet(20, 4, 5000, 16)
	f, out := find(t, c.S, nil)
	assert.Less(t, distance(c.Exact, f.Position), 1e-11)
	assert.LessOrEqual(t, out.Iterations, 2)
}

// Straight prestressed wire with a central load: half length 5, EA = 1e6,
// N = EA(L − L₀)/L₀; recomputed from statics of two links.
func TestWire(t *testing.T) {
	for _, v := range []struct{ n0, p, sag, force float64 }{
		{1e4, 1e3, 0.2267262528, 11037.843606},
		{0, 1e3, 0.5012520833, 5012.510391},
		{1e4, 5e3, 0.6662582198, 18927.326276},
	} {
		c := cases.Wire(5, 1e6, v.n0, v.p)
		f, out, err := newton.Engine{}.Find(ctx, c.S, nil, engine.Settings{Residual: 1e-12, Worst: 1e-11})
		require.NoError(t, err)
		require.Equal(t, engine.Converged, out.Status, out.Why)
		assert.InDelta(t, -v.sag, f.Position[2].Z, 2e-10)
		assert.InEpsilon(t, v.force, f.Force[0], 1e-9)
		t.Log(out.Iterations, "steps")
	}
}

// Elastic catenary (Irvine 1981), recomputed: span 100, w 10, EA 1e6. The chain
// of n links with its weight at the nodes tends to it as 1/n².
func TestElasticCatenary(t *testing.T) {
	for _, v := range []struct{ rise, l0, h, v1, v2 float64 }{
		{0, 100, 3456.0221, 500, 500},
		{0, 105, 909.80609, 525, 525},
		{20, 105, 1143.9874, 281.86825, 768.13175},
	} {
		var miss []float64
		for _, n := range []int{20, 40} {
			c := cases.HangingChain(100, v.rise, v.l0, 1e6, 10, n)
			f, out := find(t, c.S, nil)
			miss = append(miss, math.Abs(f.Reaction[n].X/v.h-1))
			assert.InEpsilon(t, v.h, f.Reaction[n].X, 0.02)
			assert.InDelta(t, v.v1, f.Reaction[0].Z, 0.02*v.h)
			assert.InDelta(t, v.v2, f.Reaction[n].Z, 0.02*v.h)
			assert.InEpsilon(t, 10*v.l0, f.Reaction[0].Z+f.Reaction[n].Z, 1e-9)
			t.Log(out.Iterations, "steps", miss[len(miss)-1])
		}
		assert.Greater(t, math.Log2(miss[0]/miss[1]), 1.8)
	}
}

// A chain that hardly stretches is found in as few steps as a soft one, and is
// the inextensible catenary: span 100, length 105: a = 91.9639630037, sag
// 13.9304206592, H = w·a (recomputed from 2a·sinh(l/2a) = S). With supports 20
// apart in level and length 110: a = 72.288087476.
func TestStiffChain(t *testing.T) {
	for _, ea := range []float64{1e6, 1e8, 1e10} {
		c := cases.HangingChain(100, 0, 105, ea, 10, 60)
		f, out, err := newton.Engine{}.Find(ctx, c.S, nil, engine.Settings{})
		require.NoError(t, err)
		require.Equal(t, engine.Converged, out.Status, out.Why)
		assert.LessOrEqual(t, out.Iterations, 8)
		if ea > 1e7 {
			assert.InEpsilon(t, 10*91.9639630037, f.Reaction[60].X, 3e-4)
			assert.InEpsilon(t, -13.9304206592, f.Position[30].Z, 4e-4)
		}
	}
	c := cases.HangingChain(100, 20, 110, 1e9, 10, 60)
	f, out, err := newton.Engine{}.Find(ctx, c.S, nil, engine.Settings{})
	require.NoError(t, err)
	require.Equal(t, engine.Converged, out.Status, out.Why)
	assert.InEpsilon(t, 10*72.288087476, f.Reaction[60].X, 3e-4)
}

// The parabola of a cable under equal loads at equal horizontal distances,
// H = wL²/8f: force densities q leave nodes at equal distances in plan and
// give z_i = −P·i·(n−i)/(2q) exactly (Schek 1974).
func TestLoadedForceDensityCable(t *testing.T) {
	const n, q, p = 10, 5.0, 3.0
	s := &canopy.Structure{}
	for i := range n + 1 {
		s.Position = append(s.Position, r3.Vec{X: float64(i * i)})
		s.Fixed = append(s.Fixed, 0)
		s.Load = append(s.Load, r3.Vec{Z: -p})
		if i > 0 {
			s.Ends = append(s.Ends, [2]int32{int32(i - 1), int32(i)})
			s.Kind, s.Law, s.Given = append(s.Kind, canopy.KindCable), append(s.Law, canopy.LawForceDensity), append(s.Given, q)
		}
	}
	s.Fixed[0], s.Fixed[n] = canopy.DirAll, canopy.DirAll
	f, _ := find(t, s, nil)
	for i := range n + 1 {
		assert.InDelta(t, -p*float64(i*(n-i))/(2*q), f.Position[i].Z, 1e-11)
		assert.InDelta(t, 10*float64(i), f.Position[i].X, 1e-11)
	}
}

// An elastic net under heavy load and under uplift: reactions balance loads.
func TestElasticNetUnderLoad(t *testing.T) {
	c := cases.QuadNet(40, 8, 10000, 24)
	s := c.S
	f, _ := find(t, s, nil)
	for m, e := range s.Ends {
		l := r3.Norm(r3.Sub(f.Position[e[0]], f.Position[e[1]]))
		s.Law[m], s.Stiffness[m], s.Unstressed[m] = canopy.LawElastic, 1e7, l/(1+f.Force[m]/1e7)
	}
	s.Load = make([]r3.Vec, len(s.Position))
	for _, load := range []float64{0, 1000, 10000, -6000} {
		for i := range s.Load {
			s.Load[i].Z = -load
		}
		g, out := find(t, s, f)
		least, sum := math.Inf(1), r3.Vec{}
		for _, v := range g.Force {
			least = min(least, v)
		}
		for i, r := range g.Reaction {
			sum = r3.Add(sum, r3.Add(r, s.Load[i]))
		}
		// The residual wanted is 1e-9 of the forces that meet.
		assert.LessOrEqual(t, r3.Norm(sum), 1e-8*math.Abs(load)*float64(len(s.Load))+1e-6)
		assert.GreaterOrEqual(t, least, 0.0)
		assert.Less(t, out.Iterations, 20)
		t.Logf("load %g: %d steps, least force %.0f N", load, out.Iterations, least)
	}
}

type netFile struct {
	Nodes      [][3]float64 `json:"nodes"`
	Fixed      []int        `json:"fixed"`
	Members    [][2]int32   `json:"members"`
	EA         float64      `json:"EA"`
	Unstressed []float64    `json:"unstressed_lengths"`
	LoadA      []struct {
		Node int        `json:"node"`
		F    [3]float64 `json:"F"`
	} `json:"load_case_A"`
	MoveA      map[string][3]float64 `json:"displacements_A"`
	ForceA     []float64             `json:"forces_A"`
	MoveB      map[string][3]float64 `json:"displacements_B"`
	ForceB     []float64             `json:"forces_B"`
	UnloadedB  []int                 `json:"unloaded_in_B"`
	Loaded     []int                 `json:"loaded"`
	LoadZ      float64               `json:"load_z"`
	Move       [3]float64            `json:"recomputed_displacement"`
	Published  [3]float64            `json:"published_displacement"`
	Recomputed struct {
		Horizontal float64 `json:"horizontal"`
		Inclined   float64 `json:"inclined"`
	} `json:"recomputed_forces"`
}

func readNet(t *testing.T, file string) (netFile, *canopy.Structure) {
	b, err := os.ReadFile(file)
	require.NoError(t, err)
	var n netFile
	require.NoError(t, json.Unmarshal(b, &n))
	s := &canopy.Structure{Fixed: make([]canopy.Freedom, len(n.Nodes)), Load: make([]r3.Vec, len(n.Nodes))}
	for _, p := range n.Nodes {
		s.Position = append(s.Position, r3.Vec{X: p[0], Y: p[1], Z: p[2]})
	}
	for _, i := range n.Fixed {
		s.Fixed[i] = canopy.DirAll
	}
	for m, e := range n.Members {
		s.Ends = append(s.Ends, e)
		s.Kind = append(s.Kind, canopy.KindNetCable)
		s.Law = append(s.Law, canopy.LawElastic)
		s.Given = append(s.Given, 0)
		s.Stiffness = append(s.Stiffness, n.EA)
		s.Unstressed = append(s.Unstressed, n.Unstressed[m])
	}
	return n, s
}

// Net on straight generators under point loads; units mm and N. Source and
// status in the file.
func TestHyparNet(t *testing.T) {
	n, s := readNet(t, "testdata/net_hypar.json")
	for _, l := range n.LoadA {
		s.Load[l.Node] = r3.Vec{X: l.F[0], Y: l.F[1], Z: l.F[2]}
	}
	check := func(move map[string][3]float64, force []float64) {
		f, out := find(t, s, nil)
		for key, d := range move {
			var i int
			require.NoError(t, json.Unmarshal([]byte(key), &i))
			u := r3.Sub(f.Position[i], s.Position[i])
			assert.InDelta(t, 0, r3.Norm(r3.Sub(u, r3.Vec{X: d[0], Y: d[1], Z: d[2]})), 2e-6, "node %s", key)
		}
		for m, v := range force {
			assert.InDelta(t, v, f.Force[m], 2e-6)
		}
		t.Log(out.Iterations, "steps")
	}
	check(n.MoveA, n.ForceA)
	for _, i := range n.UnloadedB {
		s.Load[i] = r3.Vec{}
	}
	check(n.MoveB, n.ForceB)
}

// Two-way net of Saafan 1970; units ft and kip. Recomputed to 1e-6, published
// within 0.3 % (the spread of published values is 0.7 %).
func TestSaafanNet(t *testing.T) {
	n, s := readNet(t, "testdata/net_saafan_1970.json")
	for _, i := range n.Loaded {
		s.Load[i] = r3.Vec{Z: n.LoadZ}
	}
	f, out := find(t, s, nil)
	for i := range 4 {
		u := r3.Sub(f.Position[i], s.Position[i])
		assert.InDelta(t, n.Move[0], math.Abs(u.X), 1e-6)
		assert.InDelta(t, n.Move[1], math.Abs(u.Y), 1e-6)
		assert.InDelta(t, n.Move[2], u.Z, 1e-6)
		assert.InEpsilon(t, n.Published[2], u.Z, 3e-3)
		assert.InEpsilon(t, n.Published[0], math.Abs(u.X), 3e-3)
	}
	assert.InDelta(t, n.Recomputed.Horizontal, f.Force[0], 1e-5)
	assert.InDelta(t, n.Recomputed.Inclined, f.Force[5], 1e-5)
	t.Log(out.Iterations, "steps")
}

// setCable makes cable c of s one of common force.
func setCable(s *canopy.Structure, c int, law canopy.CableLaw, value, ea, unstressed, guess float64) {
	cb := &s.Cables[c]
	cb.Law, cb.Value, cb.Stiffness, cb.Unstressed = law, value, ea, unstressed
	for _, m := range cb.Members {
		s.Law[m], s.Given[m] = canopy.LawCable, guess
	}
}

// The force that gives an edge cable its sag: chord 10, sag 1, σ = 3 needs
// T = σR = 39 with R = 13; with and without a guess.
func TestEdgeCableBySag(t *testing.T) {
	for _, guess := range []float64{0, 20, 90} {
		var miss []float64
		for _, n := range []int{16, 32} {
			c := cases.EdgeCableStrip(10, 4, 3, 39, n, n/2)
			setCable(c.S, 0, canopy.CableSag, 0.1, 0, 0, guess)
			f, out := find(t, c.S, nil)
			assert.InDelta(t, 0.1, cases.CableSag(c.S, 0, f.Position), 1e-9)
			for _, m := range c.S.Cables[0].Members {
				assert.Equal(t, f.Force[0], f.Force[m])
			}
			miss = append(miss, math.Abs(f.Force[0]/39-1))
			t.Logf("guess %g n=%d: %d steps, force %.6f", guess, n, out.Iterations, f.Force[0])
		}
		assert.Less(t, miss[1], 3e-3)
		assert.Greater(t, math.Log2(miss[0]/miss[1]), 1.8)
	}
}

// Four sails whose edges sag by different shares: all four forces are found at
// once.
func TestSailBySags(t *testing.T) {
	c := cases.FourPoint(10, 3, 2500, 30e3, 0.1, 16)
	sags := []float64{0.08, 0.1, 0.12, 0.1}
	for k, v := range sags {
		setCable(c.S, k, canopy.CableSag, v, 0, 0, 0)
	}
	f, out := find(t, c.S, nil)
	for k, v := range sags {
		assert.InDelta(t, v, cases.CableSag(c.S, k, f.Position), 1e-9)
	}
	assert.Greater(t, f.Force[0], f.Force[c.S.Cables[2].Members[0]])
	t.Log(out.Iterations, "steps", f.Force[0])

	// The forces found, given, lead to the same shape.
	g := cases.FourPoint(10, 3, 2500, 30e3, 0.1, 16)
	copy(g.S.Given, f.Force)
	again, _ := find(t, g.S, g.Form(f.Position))
	assert.Less(t, distance(f.Position, again.Position), 1e-7)
}

// An elastic edge cable that slides: its force follows its length. The length
// found, asked for, gives the same force; and the unstressed length and
// stiffness are chosen so that 39 is the answer for the exact arc.
func TestEdgeCableElasticAndByLength(t *testing.T) {
	arc := 26 * math.Asin(5.0/13)
	const ea = 5000.0
	c := cases.EdgeCableStrip(10, 4, 3, 39, 32, 16)
	setCable(c.S, 0, canopy.CableElastic, 0, ea, arc/(1+39/ea), 0)
	f, out := find(t, c.S, nil)
	assert.InEpsilon(t, 39, f.Force[0], 0.03) // a stiff cable magnifies the mesh's length error
	l := cases.CableLength(c.S, 0, f.Position)
	assert.InDelta(t, ea*(l*(1+39/ea)/arc-1), f.Force[0], 1e-6*39)
	t.Log(out.Iterations, "steps", f.Force[0])

	d := cases.EdgeCableStrip(10, 4, 3, 39, 32, 16)
	setCable(d.S, 0, canopy.CableLength, l, 0, 0, 0)
	g, out := find(t, d.S, nil)
	assert.InEpsilon(t, f.Force[0], g.Force[0], 1e-6)
	assert.InDelta(t, l, cases.CableLength(d.S, 0, g.Position), 1e-8)
	t.Log(out.Iterations, "steps", g.Force[0])
}

// A cable shorter than the distance of its ends is said to be impossible.
func TestCableTooShort(t *testing.T) {
	c := cases.EdgeCableStrip(10, 4, 3, 39, 16, 8)
	setCable(c.S, 0, canopy.CableLength, 9.9, 0, 0, 0)
	_, out, err := newton.Engine{}.Find(ctx, c.S, nil, engine.Settings{})
	require.NoError(t, err)
	assert.Equal(t, engine.Stalled, out.Status)
	assert.Contains(t, out.Why, "9.9 m long, but its ends are 10 m apart")
}

// An elastic cable that slides freely along three pulleys and is too long is
// slack; tightened, it carries EA(L − L₀)/L₀.
func TestSlidingElasticCable(t *testing.T) {
	s := &canopy.Structure{
		Position: []r3.Vec{{}, {X: 4}, {X: 2, Z: -1}, {X: 2, Z: 3}},
		Fixed:    []canopy.Freedom{7, 7, 0, 7},
		Ends:     [][2]int32{{0, 2}, {2, 1}, {2, 3}},
		Kind:     []canopy.Kind{canopy.KindCable, canopy.KindCable, canopy.KindCable},
		Law:      []canopy.Law{canopy.LawCable, canopy.LawCable, canopy.LawElastic},
		Given:    []float64{0, 0, 0}, Stiffness: []float64{0, 0, 1e5}, Unstressed: []float64{0, 0, 3.5},
		CableOf: []int32{0, 0, -1},
		Cables:  []canopy.Cable{{Name: "K", Members: []int32{0, 1}, Nodes: []int32{0, 2, 1}, Law: canopy.CableElastic, Stiffness: 2e5, Unstressed: 4.1}},
		Load:    []r3.Vec{{}, {}, {Z: -500}, {}},
	}
	f, _ := find(t, s, nil)
	l := cases.CableLength(s, 0, f.Position)
	assert.InEpsilon(t, 2e5*(l-4.1)/4.1, f.Force[0], 1e-6)
	// Vertical balance of the node.
	z := f.Position[2].Z
	assert.InDelta(t, 0, 2*f.Force[0]*-z/(l/2)+f.Force[2]-500, 1e-4)

	s.Cables[0].Unstressed = 6
	f, _ = find(t, s, nil)
	assert.Zero(t, f.Force[0])
	assert.InDelta(t, 500, f.Force[2], 1e-6)
}

// mastAndGuys is a mast of given length 3 m on a foot, its head free and stayed
// by three guys to anchors 4 m out; the head starts off the axis by lean.
func mastAndGuys(lean float64) *canopy.Structure {
	s := &canopy.Structure{Fixed: []canopy.Freedom{7, 7, 7, 7, 0}}
	for k := range 3 {
		sin, cos := math.Sincos(2 * math.Pi * float64(k) / 3)
		s.Position = append(s.Position, r3.Vec{X: 4 * cos, Y: 4 * sin})
	}
	s.Position = append(s.Position, r3.Vec{}, r3.Vec{X: lean, Y: -0.3 * lean, Z: 3 + 0.5*lean})
	s.Ends = [][2]int32{{0, 4}, {1, 4}, {2, 4}, {3, 4}}
	s.Kind = []canopy.Kind{canopy.KindGuy, canopy.KindGuy, canopy.KindGuy, canopy.KindMast}
	s.Law = []canopy.Law{canopy.LawElastic, canopy.LawElastic, canopy.LawElastic, canopy.LawCable}
	s.Given = []float64{1e4, 1e4, 1e4, 0}
	s.Stiffness, s.Unstressed = []float64{1e6, 1e6, 1e6, 0}, []float64{4.95, 4.95, 4.95, 0}
	s.CableOf = []int32{-1, -1, -1, 0}
	s.Cables = []canopy.Cable{{Name: "M", Kind: canopy.KindMast, Members: []int32{3}, Nodes: []int32{3, 4}, Law: canopy.CableLength, Value: 3}}
	return s
}

// With elastic guys the head settles on the axis, where each guy is 5 m long
// (3-4-5 triangle) and the mast carries three times 3/5 of its force.
func TestFreeMastHead(t *testing.T) {
	for _, lean := range []float64{0, 0.8} {
		f, out := find(t, mastAndGuys(lean), nil)
		assert.InDelta(t, 0, r3.Norm(r3.Sub(f.Position[4], r3.Vec{Z: 3})), 1e-7)
		assert.InEpsilon(t, 1e6*0.05/4.95, f.Force[0], 1e-6)
		assert.InEpsilon(t, -3*1e6*0.05/4.95*3/5, f.Force[3], 1e-6)
		t.Log(out.Iterations, "steps")
	}
}

// With guys of given force T the head is in balance on the axis but not
// stable: turning the mast wins 3T/L per metre, the guys resist with
// (3 − 1.5·cos²)T/L only. Both horizontal directions are reported.
func TestGivenForceGuysDoNotHoldAMast(t *testing.T) {
	s := mastAndGuys(0)
	for m := range 3 {
		s.Law[m] = canopy.LawForce
	}
	f, out, err := newton.Engine{}.Find(ctx, s, nil, engine.Settings{})
	require.NoError(t, err)
	assert.Equal(t, 2, out.NegativePivots)
	assert.InEpsilon(t, -3*1e4*3/5, f.Force[3], 1e-8)
}

// The same with elastic guys and a mast of given thrust: equilibrium checked
// by its own sums.
func TestFreeMastHeadElastic(t *testing.T) {
	s := &canopy.Structure{
		Position: []r3.Vec{{X: 4}, {X: -2, Y: 3}, {X: -2, Y: -4}, {}, {Z: 3}},
		Fixed:    []canopy.Freedom{7, 7, 7, 7, 0},
		Ends:     [][2]int32{{0, 4}, {1, 4}, {2, 4}, {3, 4}},
		Kind:     []canopy.Kind{canopy.KindGuy, canopy.KindGuy, canopy.KindGuy, canopy.KindMast},
		Law:      []canopy.Law{canopy.LawElastic, canopy.LawElastic, canopy.LawElastic, canopy.LawForce},
		Given:    []float64{0, 0, 0, -2e4}, Stiffness: []float64{1e6, 1e6, 1e6, 0}, Unstressed: []float64{5, 4.7, 5.4, 0},
	}
	f, out := find(t, s, nil)
	var sum r3.Vec
	for m, e := range s.Ends {
		d := r3.Sub(f.Position[e[0]], f.Position[4])
		sum = r3.Add(sum, r3.Scale(f.Force[m]/r3.Norm(d), d))
	}
	assert.Less(t, r3.Norm(sum), 1e-4)
	assert.InDelta(t, 0, r3.Norm(r3.Add(f.Reaction[3], r3.Scale(f.Force[3], r3.Unit(r3.Sub(f.Position[4], f.Position[3]))))), 1e-6)
	t.Log(out.Iterations, "steps")
}

// A rigid ring on a net of no symmetry: the reactions of anchors and ring and
// the couple that keeps the ring from turning balance in forces and moments.
func TestRingReactionsBalance(t *testing.T) {
	s := &canopy.Structure{
		Position: []r3.Vec{{X: 5, Y: 1}, {X: -1, Y: 6, Z: 1}, {X: -4, Y: -2}, {X: 2, Y: -5, Z: -1}, {Z: 2}},
		Fixed:    []canopy.Freedom{7, 7, 7, 7, canopy.DirX | canopy.DirY},
		Master:   []int32{-1, -1, -1, -1, -1},
		Load:     make([]r3.Vec, 9),
	}
	ring := canopy.Ring{Name: "R", Centre: 4, Rigid: true, Free: canopy.DirZ, Cable: -1}
	for k := range int32(4) {
		sin, cos := math.Sincos(0.3 + math.Pi/2*float64(k))
		s.Position = append(s.Position, r3.Vec{X: cos, Y: sin, Z: 2})
		s.Fixed = append(s.Fixed, 0)
		s.Master = append(s.Master, 4)
		ring.Nodes = append(ring.Nodes, 5+k)
		s.Ends = append(s.Ends, [2]int32{k, 5 + k}, [2]int32{5 + k, (k + 1) % 4})
		s.Given = append(s.Given, 100*float64(k+1), 500)
	}
	s.Rings = []canopy.Ring{ring}
	s.Load[4] = r3.Vec{X: 30, Y: -20, Z: 900}
	for range s.Ends {
		s.Kind, s.Law = append(s.Kind, canopy.KindCable), append(s.Law, canopy.LawForce)
	}
	f, _ := find(t, s, nil)
	force, moment := s.Load[4], r3.Add(r3.Cross(f.Position[4], s.Load[4]), f.Couple[0])
	for i, r := range f.Reaction {
		force, moment = r3.Add(force, r), r3.Add(moment, r3.Cross(f.Position[i], r))
	}
	assert.Less(t, r3.Norm(force), 1e-5)
	assert.Less(t, r3.Norm(moment), 1e-5)
	assert.Greater(t, r3.Norm(f.Couple[0]), 10.0)
}
