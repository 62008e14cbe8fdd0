package relax_test

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/relax"
)

// Equal tensions from three points meet at their Fermat point, equal force
// densities at their centroid. Triangle (0,0), (6,0), (0,4): recomputed, with
// the length √[(a²+b²+c²)/2 + 2√3·area].
func TestEqualTensionsMeetAtTheFermatPoint(t *testing.T) {
	eachDamping(t, func(t *testing.T, e engine.Engine) {
		s := net([]r3.Vec{{}, {X: 6}, {Y: 4}, {X: 3, Y: 3, Z: 1}}, []int32{0, 1, 2}, [][2]int32{{0, 3}, {3, 1}, {2, 3}})
		for k := range s.Ends {
			s.Law[k] = canopy.LawForce
			s.Given[k] = 7
		}
		f := relaxed(t, e, s, nil, engine.Settings{})
		assert.InDelta(t, 0.957250899105, f.Position[3].X, 1e-7)
		assert.InDelta(t, 1.065658275019, f.Position[3].Y, 1e-7)
		assert.InDelta(t, 0, f.Position[3].Z, 1e-7)
		assert.InDelta(t, 9.67311838972588, length(s, f, 0)+length(s, f, 1)+length(s, f, 2), 1e-9)
		for k := range s.Ends {
			s.Law[k] = canopy.LawForceDensity
		}
		f = relaxed(t, e, s, nil, engine.Settings{})
		assert.InDelta(t, 2, f.Position[3].X, 1e-7)
		assert.InDelta(t, 4.0/3, f.Position[3].Y, 1e-7)
	})
}

// Two junctions of three equal tensions join the corners of a square by the
// shortest network, length (1+√3)·d, with angles of 120° (Plateau 1873;
// Steiner's problem). The start is disturbed; each cable is a chain of three.
func TestEqualTensionsOnASquareAreTheShortestNetwork(t *testing.T) {
	eachDamping(t, func(t *testing.T, e engine.Engine) {
		nodes := []r3.Vec{{}, {X: 1}, {X: 1, Y: 1}, {Y: 1}, {X: 0.2, Y: 0.4, Z: 0.1}, {X: 0.7, Y: 0.6, Z: -0.1}}
		var ends [][2]int32
		for _, c := range [][2]int32{{0, 4}, {3, 4}, {4, 5}, {5, 1}, {5, 2}} {
			a, b := nodes[c[0]], nodes[c[1]]
			n := int32(len(nodes))
			for k := 1.0; k < 3; k++ {
				p := r3.Add(r3.Scale(1-k/3, a), r3.Scale(k/3, b))
				nodes = append(nodes, r3.Add(p, r3.Vec{X: 0.03 * k, Y: -0.02, Z: 0.05}))
			}
			ends = append(ends, [2]int32{c[0], n}, [2]int32{n, n + 1}, [2]int32{n + 1, c[1]})
		}
		s := net(nodes, []int32{0, 1, 2, 3}, ends)
		for k := range s.Ends {
			s.Law[k] = canopy.LawForce
			s.Given[k] = 3
		}
		f := relaxed(t, e, s, nil, engine.Settings{})
		total := 0.0
		for k := range s.Ends {
			total += length(s, f, k)
		}
		assert.InDelta(t, 1+math.Sqrt(3), total, 1e-9)
		at := func(i int) r3.Vec { return f.Position[i] }
		u := r3.Unit(r3.Sub(at(0), at(4)))
		v := r3.Unit(r3.Sub(at(3), at(4)))
		assert.InDelta(t, 120, math.Acos(r3.Dot(u, v))*180/math.Pi, 1e-5)
	})
}

// A cable of equal force densities under equal loads is a parabola:
// z_i = −P·i(n−i)/(2q), exactly at the nodes (Schek 1974).
func TestEqualForceDensitiesUnderEqualLoadsMakeAParabola(t *testing.T) {
	eachDamping(t, func(t *testing.T, e engine.Engine) {
		const n, q, load = 10, 5.0, 3.0
		nodes := make([]r3.Vec, n+1)
		var ends [][2]int32
		for i := range nodes {
			nodes[i].X = float64(i)
			if i > 0 {
				ends = append(ends, [2]int32{int32(i - 1), int32(i)})
			}
		}
		s := net(nodes, []int32{0, n}, ends)
		for k := range ends {
			s.Given[k] = q
		}
		for i := 1; i < n; i++ {
			s.Load[i].Z = -load
		}
		f := relaxed(t, e, s, nil, engine.Settings{})
		for i := range nodes {
			assert.InDelta(t, -load*float64(i*(n-i))/(2*q), f.Position[i].Z, 1e-7)
			assert.InDelta(t, float64(i), f.Position[i].X, 1e-7)
		}
		// H = w·L²/(8f) with w = P per 1 m, f = 7.5.
		assert.InDelta(t, load*n*n/(8*7.5), math.Abs(f.Reaction[0].X), 1e-6)
	})
}

// chain builds a cable of n equal straight bars from a to b.
func chain(a, b r3.Vec, n int, unstressed, ea, weight float64) *canopy.Structure {
	nodes := make([]r3.Vec, n+1)
	var ends [][2]int32
	for i := range nodes {
		u := float64(i) / float64(n)
		nodes[i] = r3.Add(r3.Scale(1-u, a), r3.Scale(u, b))
		nodes[i].Z -= 0.3 * unstressed * u * (1 - u)
		if i > 0 {
			ends = append(ends, [2]int32{int32(i - 1), int32(i)})
		}
	}
	s := net(nodes, []int32{0, int32(n)}, ends)
	elastic(s, ea, func(int) float64 { return unstressed / float64(n) })
	for k := range ends {
		s.Weight[k] = weight
	}
	s.SelfWeight = true
	return s
}

// Elastic catenary: Irvine, Cable Structures, 1981; Irvine & Sinclair, Int. J.
// Solids Struct. 12 (1976). Rows recomputed from the closed form
// (testdata/elastic_catenary.json). Straight bars with lumped weight converge to
// it with the square of their length.
func TestElasticCatenaryConvergesSecondOrder(t *testing.T) {
	var raw struct{ Rows []map[string]any }
	readJSON(t, "elastic_catenary.json", &raw)
	num := func(r map[string]any, k string) float64 { return r[k].(float64) }
	for _, r := range raw.Rows {
		var last float64
		for _, n := range []int{20, 40} {
			s := chain(r3.Vec{}, r3.Vec{X: num(r, "l"), Z: num(r, "h")}, n, num(r, "L0"), num(r, "EA"), num(r, "w"))
			f := relaxed(t, relax.New(), s, nil, engine.Settings{})
			h := -f.Reaction[0].X
			assert.InEpsilon(t, num(r, "H"), h, 6e-3*400/float64(n*n)+1e-9)
			// Vertical reactions are those of statics: half the end bar hangs
			// on the support itself.
			assert.InEpsilon(t, num(r, "V1"), f.Reaction[0].Z, 2e-3*400/float64(n*n))
			assert.InEpsilon(t, num(r, "V2"), f.Reaction[n].Z, 2e-3*400/float64(n*n))
			worst := 0.0
			for k, x := range r["x"].([]any) {
				p := f.Position[k*n/10]
				worst = max(worst, math.Abs(p.X-x.(float64)), math.Abs(p.Z-r["y"].([]any)[k].(float64)))
			}
			if last > 0 {
				assert.Greater(t, math.Log2(last/worst), 1.9, "order of convergence")
				assert.Less(t, worst, 0.01)
			}
			last = worst
		}
	}
}

// Straight prestressed wire of half length 5 m, EA = 1 MN, with a transverse
// load P at its middle: exact roots of 2N(δ)·sin = P, recomputed.
func TestStraightWireWithCentralLoad(t *testing.T) {
	for _, c := range []struct{ prestress, load, sag, force float64 }{
		{1e4, 1e3, 0.2267262528, 11037.843606},
		{0, 1e3, 0.5012520833, 5012.510391},
		{1e4, 5e3, 0.6662582198, 18927.326276},
	} {
		eachDamping(t, func(t *testing.T, e engine.Engine) {
			s := net([]r3.Vec{{X: -5}, {}, {X: 5}}, []int32{0, 2}, [][2]int32{{0, 1}, {1, 2}})
			elastic(s, 1e6, func(int) float64 { return 5 / (1 + c.prestress/1e6) })
			s.Load[1].Z = -c.load
			f := relaxed(t, e, s, nil, engine.Settings{})
			assert.InDelta(t, c.sag, -f.Position[1].Z, 1e-8)
			assert.InEpsilon(t, c.force, f.Force[0], 1e-8)
		})
	}
}

// Isolated cable with a load of 8 kip at a joint, Michalos & Birnstiel, J.
// Struct. Div. ASCE 86 (1960), as chains of straight bars with lumped weight:
// displacements recomputed (testdata). Published for straight links: (−0.845,
// −5.472) m in the paper, by the same discretisation error.
func TestIsolatedCableAsStraightBars(t *testing.T) {
	var ref struct {
		Nodes      [][]float64
		EA         float64
		SelfWeight float64   `json:"self_weight"`
		Unstressed []float64 `json:"unstressed_lengths"`
		Expected   struct {
			Chain map[string][2]float64 `json:"straight_bar_chain"`
		}
	}
	readJSON(t, "isolated_cable_michalos_birnstiel.json", &ref)
	for name, bars := range map[string][2]int{"2+3 bars": {2, 3}, "4+6": {4, 6}, "8+12": {8, 12}} {
		var nodes []r3.Vec
		var ends [][2]int32
		for seg := range 2 {
			a, b := vec(ref.Nodes[seg]), vec(ref.Nodes[seg+1])
			for k := range bars[seg] {
				u := float64(k) / float64(bars[seg])
				nodes = append(nodes, r3.Add(r3.Scale(1-u, a), r3.Scale(u, b)))
			}
		}
		nodes = append(nodes, vec(ref.Nodes[2]))
		for i := 1; i < len(nodes); i++ {
			ends = append(ends, [2]int32{int32(i - 1), int32(i)})
		}
		s := net(nodes, []int32{0, int32(len(nodes) - 1)}, ends)
		elastic(s, ref.EA, func(k int) float64 {
			if k < bars[0] {
				return ref.Unstressed[0] / float64(bars[0])
			}
			return ref.Unstressed[1] / float64(bars[1])
		})
		for k := range ends {
			s.Weight[k] = ref.SelfWeight
		}
		s.SelfWeight = true
		before := relaxed(t, relax.New(), s, nil, engine.Settings{})
		s.Load[bars[0]].Z = -8
		after := relaxed(t, relax.New(), s, before, engine.Settings{})
		t.Log(name, before.Position[bars[0]], after.Position[bars[0]], r3.Sub(after.Position[bars[0]], before.Position[bars[0]]))
		d := r3.Sub(after.Position[bars[0]], before.Position[bars[0]])
		want := ref.Expected.Chain[name]
		assert.InDelta(t, want[0], d.X, 2e-5, name)
		assert.InDelta(t, want[1], d.Z, 2e-5, name)
	}
}

// Two-way net of 12 members: S. A. Saafan, Theoretical analysis of suspension
// roofs, J. Struct. Div. ASCE 96 (1970), in ft and kip. Recomputed with
// N = EA(L−L₀)/L₀; the published displacements are 0.1324 and −1.4707.
func TestSaafanNet(t *testing.T) {
	var ref struct {
		Nodes      [][]float64
		Fixed      []int32
		Members    [][2]int32
		EA         float64
		Unstressed []float64 `json:"unstressed_lengths"`
		Weight     float64   `json:"self_weight_kip_per_ft"`
		Loads      []struct {
			Node int
			F    []float64
		}
	}
	readJSON(t, "net_saafan_1970.json", &ref)
	nodes := make([]r3.Vec, len(ref.Nodes))
	for i, p := range ref.Nodes {
		nodes[i] = vec(p)
	}
	s := net(nodes, ref.Fixed, ref.Members)
	elastic(s, ref.EA, func(k int) float64 { return ref.Unstressed[k] })
	for _, l := range ref.Loads {
		s.Load[l.Node] = vec(l.F)
	}
	eachDamping(t, func(t *testing.T, e engine.Engine) {
		s.SelfWeight = false
		f := relaxed(t, e, s, nil, engine.Settings{})
		d := r3.Sub(nodes[0], f.Position[0]) // node 0 is at (−50, −50, 0)
		assert.InDelta(t, 0.1322317, d.X, 1e-6)
		assert.InDelta(t, 0.1322317, d.Y, 1e-6)
		assert.InDelta(t, 1.4687105, d.Z, 1e-6)
		assert.InEpsilon(t, 1.4707, d.Z, 3e-3) // Saafan
		assert.InDelta(t, 12.677423, f.Force[0], 1e-5)
		assert.InDelta(t, 13.309537, f.Force[4], 1e-5)
		for k := range s.Weight {
			s.Weight[k] = ref.Weight
		}
		s.SelfWeight = true
		f = relaxed(t, e, s, nil, engine.Settings{})
		d = r3.Sub(nodes[0], f.Position[0])
		// The weight of the reference acts per initial length, here per
		// unstressed length: 0.2 % of a hundredth of the load.
		assert.InDelta(t, 0.1327798, d.X, 1e-4)
		assert.InDelta(t, 1.4744836, d.Z, 1e-4)
	})
}

// Hypar net on straight generators, 31 elastic members, in mm and N; member
// data as in the model net of Lewis, Jones & Rushton (1984), geometry of our
// own, recomputed by Newton's method and by energy minimisation.
func TestHyparNetUnderLoad(t *testing.T) {
	var ref struct {
		Nodes      [][]float64
		Fixed      []int32
		Members    [][2]int32
		EA         float64
		Unstressed []float64 `json:"unstressed_lengths"`
		LoadA      []struct {
			Node int
			F    []float64
		} `json:"load_case_A"`
		MoveA  map[string][]float64 `json:"displacements_A"`
		ForceA []float64            `json:"forces_A"`
		MoveB  map[string][]float64 `json:"displacements_B"`
		ForceB []float64            `json:"forces_B"`
	}
	readJSON(t, "net_hypar_straight_generators.json", &ref)
	nodes := make([]r3.Vec, len(ref.Nodes))
	for i, p := range ref.Nodes {
		nodes[i] = vec(p)
	}
	s := net(nodes, ref.Fixed, ref.Members)
	elastic(s, ref.EA, func(k int) float64 { return ref.Unstressed[k] })
	check := func(t *testing.T, f *canopy.Form, move map[string][]float64, force []float64) {
		require.NotEmpty(t, move)
		for name, d := range move {
			var i int
			for _, r := range name {
				i = 10*i + int(r-'0')
			}
			got := r3.Sub(f.Position[i], nodes[i])
			assert.InDelta(t, d[0], got.X, 2e-6)
			assert.InDelta(t, d[1], got.Y, 2e-6)
			assert.InDelta(t, d[2], got.Z, 2e-6)
		}
		for k, n := range force {
			assert.InDelta(t, n, f.Force[k], 2e-6)
		}
	}
	eachDamping(t, func(t *testing.T, e engine.Engine) {
		for _, l := range ref.LoadA {
			s.Load[l.Node] = vec(l.F)
		}
		// The members are stiff: 1e-9 of the forces is 1e-8 of their stretch.
		tight := engine.Settings{Residual: 1e-12, Worst: 1e-11, Move: 1e-12}
		check(t, relaxed(t, e, s, nil, tight), ref.MoveA, ref.ForceA)
		for _, i := range []int{16, 20, 21} {
			s.Load[i] = r3.Vec{}
		}
		check(t, relaxed(t, e, s, nil, tight), ref.MoveB, ref.ForceB)
	})
}
