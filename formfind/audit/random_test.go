package audit_test

import (
	"context"
	"math"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
	"pgregory.net/rapid"

	"anticlast/formfind/audit"
	"anticlast/formfind/canopy"
	"anticlast/formfind/limit"
)

// anything draws a structure that passes Validate and a form of it, both
// without any sense: coinciding nodes, slivers, forces without balance, ties,
// laws of every kind, values of extreme size.
func anything(t *rapid.T) (*canopy.Structure, *canopy.Form) {
	value := rapid.OneOf(rapid.Float64Range(-3, 3), rapid.SampledFrom([]float64{0, 1, -1, 1e-12, 1e9, -1e9, 1e-300, 1e150}))
	number := func(label string) float64 { return value.Draw(t, label) }
	vec := func(label string) r3.Vec { return r3.Vec{X: number(label), Y: number(label), Z: number(label)} }
	freedom := func() canopy.Freedom { return canopy.Freedom(rapid.IntRange(0, 7).Draw(t, "freedom")) }
	s := structure()
	n := rapid.IntRange(2, 8).Draw(t, "nodes")
	pick := func() int32 { return int32(rapid.IntRange(0, n-1).Draw(t, "node")) }
	for range n {
		p := vec("place")
		node(s, p.X, p.Y, p.Z, freedom())
	}
	if rapid.Bool().Draw(t, "held") {
		for range n {
			s.Held = append(s.Held, freedom())
		}
	}
	if rapid.Bool().Draw(t, "loads") {
		for range n {
			s.Load = append(s.Load, vec("load"))
		}
	}
	s.SelfWeight = rapid.Bool().Draw(t, "weights")
	if rapid.Bool().Draw(t, "ring") {
		s.Master = make([]int32, n)
		ring := canopy.Ring{Name: "r", Rigid: true, Centre: 0, Weight: number("weight")}
		for i := range s.Master {
			s.Master[i] = -1
			if i > 0 && rapid.Bool().Draw(t, "tied") {
				s.Master[i] = 0
				ring.Nodes = append(ring.Nodes, int32(i))
			}
		}
		s.Rings = []canopy.Ring{ring, {Name: "c", Centre: -1, Weight: number("weight")}}
	}
	m := rapid.IntRange(0, 8).Draw(t, "members")
	for range m {
		i, j := pick(), pick()
		if i == j {
			j = (i + 1) % int32(n)
		}
		law := canopy.Law(rapid.IntRange(0, 2).Draw(t, "law"))
		member(s, i, j, canopy.Kind(rapid.IntRange(0, int(canopy.KindStrut)).Draw(t, "kind")), law, number("given"))
		s.Stiffness = append(s.Stiffness, math.Abs(number("stiffness"))+1e-3)
		s.Unstressed = append(s.Unstressed, math.Abs(number("unstressed"))+1e-3)
		s.Weight = append(s.Weight, number("weight"))
		s.Strength = append(s.Strength, math.Abs(number("strength")))
	}
	if m > 1 {
		cb := chain(s, "c", canopy.KindEdgeCable, canopy.CableLaw(rapid.IntRange(0, 4).Draw(t, "cable law")), 0, 1)
		cb.Value, cb.Stiffness, cb.Unstressed = number("value"), math.Abs(number("ea"))+1e-3, math.Abs(number("l0"))+1e-3
		if rapid.Bool().Draw(t, "common") {
			s.Law[0], s.Law[1] = canopy.LawCable, canopy.LawCable
		}
	}
	s.Fabrics = []canopy.Fabric{
		{Name: "a", Pressure: number("pressure"), Weight: number("weight"), WarpStrength: 1},
		{Name: "b", Elastic: true, WarpModulus: number("modulus"), WeftModulus: number("modulus"), ShearModulus: number("modulus"), PoissonWarpWeft: number("poisson")},
	}
	for range rapid.IntRange(0, 8).Draw(t, "triangles") {
		if n < 3 {
			break
		}
		i := pick()
		j := (i + 1 + int32(rapid.IntRange(0, n-3).Draw(t, "j"))) % int32(n)
		k := (j + 1) % int32(n)
		if k == i {
			k = (k + 1) % int32(n)
		}
		if k == j || i == j {
			continue
		}
		triangle(s, i, j, k, r3.Vec{X: 1, Y: number("warp")}, number("stress"), number("stress"))
		s.FabricOf[len(s.FabricOf)-1] = int32(rapid.IntRange(0, 1).Draw(t, "fabric"))
	}
	s.Lines = []canopy.Line{{Name: "l", Nodes: []int32{pick(), pick(), pick()}}}
	f := canopy.NewForm(s)
	for k := range f.Force {
		f.Force[k] = number("force")
	}
	for i := range f.Stress {
		f.Stress[i] = canopy.Stress{Warp: number("warp"), Weft: number("weft"), Shear: number("shear")}
		f.Warp[i] = vec("warp")
	}
	if rapid.Bool().Draw(t, "reactions") {
		for i := range f.Reaction {
			f.Reaction[i] = vec("reaction")
		}
	}
	return s, f
}

// Whatever it is given, the audit answers, soon and without a panic, and never
// trusts numbers that are not finite; the limits speak of all of it.
func TestAuditSurvivesAnything(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s, f := anything(t)
		if s.Validate() != nil {
			t.Skip("not a structure")
		}
		a, err := audit.Run(context.Background(), s, f, audit.Options{})
		if err != nil {
			t.Fatalf("%v", err)
		}
		if a.Trusted {
			for _, v := range []float64{a.ResidualRMS, a.ResidualWorst, a.ResidualLargest, a.ForceBalance, a.MomentBalance, a.Virial, a.ReactionMismatch, a.ForceMismatch} {
				if math.IsNaN(v) || math.IsInf(v, 0) {
					t.Fatalf("trusted with %v", a)
				}
			}
		}
		g := canopy.Factors{Load: 1.35, Fabric: 2, Cable: 2}
		q := audit.Quantities(s, f, g)
		one := 1.
		limit.Check(s, f, &q, canopy.Limits{StressMin: &one, StressMax: &one, CableMax: &one, SlopeMin: &one, ReactionMax: &one, Utilisation: &one,
			Achieved: &[2]float64{1, 1}, Ratio: &[2]float64{1, 1}, Headroom: []canopy.Headroom{{}, {Region: s.Position}}}, g)
	})
	require.False(t, t.Failed())
}
