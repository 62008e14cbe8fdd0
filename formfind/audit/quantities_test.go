package audit_test

import (
	"math"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/audit"
	"anticlast/formfind/canopy"
)

// A flat film of 2 and 1.2 kN/m on an uneven mesh pulls its edges with just
// that per metre.
func TestLoadAlongFixedLines(t *testing.T) {
	s := structure()
	s.Fabrics = []canopy.Fabric{{Name: "film", WarpStrength: 60e3, WeftStrength: 20e3}}
	xs := []float64{0, 1, 1.7, 3, 4}
	for j := range 4 {
		for _, x := range xs {
			fixed := canopy.Freedom(0)
			if x == 0 || x == 4 || j == 0 || j == 3 {
				fixed = canopy.DirAll
			}
			node(s, x, float64(j), 0, fixed)
		}
	}
	for j := range int32(3) {
		for i := range int32(4) {
			a := 5*j + i
			triangle(s, a, a+1, a+6, r3.Vec{X: 1}, 2000, 1200)
			triangle(s, a, a+6, a+5, r3.Vec{X: 1}, 2000, 1200)
		}
	}
	f := canopy.NewForm(s)
	for tr := range s.Corners {
		f.Warp[tr] = r3.Vec{X: 1}
		f.Stress[tr] = canopy.Stress{Warp: 2000, Weft: 1200}
	}
	react(s, f)
	s.Lines = []canopy.Line{{Name: "south", Nodes: []int32{0, 1, 2, 3, 4}}, {Name: "west", Nodes: []int32{0, 5, 10, 15}}, {Name: "short", Nodes: []int32{1, 2}}, {Name: "none", Nodes: []int32{3}}}
	q := audit.Quantities(s, f, canopy.Factors{Load: 1.35, Fabric: 4})
	south, west := q.Lines[0], q.Lines[1]
	require.InDelta(t, 4, south.Length, 1e-12)
	require.InDelta(t, 1200, south.Mean, 1e-9)
	require.InDelta(t, 1200, south.Min, 1e-9)
	require.InDelta(t, 1200, south.Max, 1e-9)
	require.InDelta(t, -1200*3, south.Total.Y, 1e-9) // without the half sides at its ends
	require.InDelta(t, 2000, west.Mean, 1e-9)
	require.InDelta(t, -2000*2, west.Total.X, 1e-9)
	require.InDelta(t, 1200*(0.85+1)/0.7, q.Lines[2].Mean, 1e-9) // all it has: two nodes
	require.Zero(t, q.Lines[3])

	require.InDelta(t, 12, q.FabricArea[0], 1e-12)
	one := canopy.Spread{Min: 1, P5: 1, Mean: 1, P95: 1, Max: 1}
	for _, sp := range [][]canopy.Spread{q.WarpAchieved, q.WeftAchieved, q.MajorAchieved, q.MinorAchieved, q.Ratio} {
		require.Equal(t, one, sp[0])
	}
	require.Zero(t, q.Shear[0])
	// γ·σ·γ_M/f: weft governs, 1.35·1.2·4/20.
	require.InEpsilon(t, 0.324, q.FabricUtilisation[0], 1e-12)
	require.Zero(t, audit.Quantities(s, f, canopy.Factors{Load: 1.35}).FabricUtilisation[0], "no factor, no utilisation")

	// A quarter of the area 10 % up in weft, with shear elsewhere.
	for tr := range s.Corners {
		if tr%4 == 0 {
			f.Stress[tr].Weft = 1320
		}
	}
	f.Stress[1].Shear = 160
	q = audit.Quantities(s, f, canopy.Factors{})
	require.InEpsilon(t, 1.1, q.WeftAchieved[0].Max, 1e-12)
	require.Equal(t, 1., q.WeftAchieved[0].P5)
	require.InEpsilon(t, 1/1.1, q.Ratio[0].Min, 1e-12)
	require.InEpsilon(t, 0.1, q.Shear[0].Max, 1e-12)
}

func TestCableReport(t *testing.T) {
	s := structure()
	node(s, 0, 0, 0, canopy.DirAll)
	node(s, 3, 0, -4, 0)
	node(s, 6, 0, 0, canopy.DirAll)
	node(s, 6, 0, 2, canopy.DirAll)
	var line []int32
	for i := range int32(3) {
		line = append(line, member(s, i, i+1, canopy.KindEdgeCable, canopy.LawForce, 1e3))
	}
	member(s, 0, 3, canopy.KindMast, canopy.LawForce, -500)
	s.Strength = []float64{8e3, 4e3, 9e3, 1}
	chain(s, "edge", canopy.KindEdgeCable, canopy.CablePerMember, line...)
	s.Cables = append(s.Cables, canopy.Cable{Name: "empty"}, canopy.Cable{Name: "mast", Kind: canopy.KindMast, Members: []int32{3}, Nodes: []int32{0, 3}})
	f := report(s, 1e3, 1.2e3, 0.9e3, -500)
	q := audit.Quantities(s, f, canopy.Factors{Load: 1.5, Cable: 2})
	r := q.Cables[0]
	require.InDelta(t, 12, r.Length, 1e-12)
	require.InDelta(t, math.Hypot(6, 2), r.Chord, 1e-12)
	require.InDelta(t, (5*1e3+5*1.2e3+2*0.9e3)/12, r.ForceMean, 1e-9)
	require.Equal(t, 0.9e3, r.ForceMin)
	require.Equal(t, 1.2e3, r.ForceMax)
	require.InEpsilon(t, 300/r.ForceMean, r.Evenness, 1e-12)
	require.InEpsilon(t, 1.5*1.2e3*2/4e3, r.Utilisation, 1e-12)
	require.Zero(t, q.Cables[1])
	require.Zero(t, q.Cables[2].Utilisation, "a mast fails by buckling, not by its breaking force")
	require.InDelta(t, 12, q.KindLength[canopy.KindEdgeCable], 1e-12)
	require.InDelta(t, math.Hypot(6, 2), q.KindLength[canopy.KindMast], 1e-12)
	require.Zero(t, q.KindLength[canopy.KindGuy])
}
