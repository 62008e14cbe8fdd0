// Package audit is the independent proof of a Form. Everything is computed
// from what the result file holds (positions, member forces, triangle
// stresses, reactions, loads) by code of its own: nothing here calls an
// engine or an engine's elements, so that a mistake there cannot hide here.
//
// # What is proved
//
// Balance: at every node the forces of members and triangles, from their
// reported forces and true stresses, add up to zero with the loads in every
// direction in which the node is free or held without a support. The reported
// reactions are compared with what the elements ask of the supports; their
// sums with the loads vanish in force and moment; and the virial identity
// ΣA·tr σ + ΣT·L = ΣR·x + ΣF·x ties reported stresses to reported reactions
// without nodal forces.
//
// Law: the reported forces and stresses are those that their laws give at the
// reported positions.
//
// Stability: see [Stability].
//
// # Tolerances
//
// A residual r is judged against the sum s of the sizes of all forces that
// meet at the node. Positions are written with 53 bits: a coordinate X turns
// an element of length L by 2⁻⁵³·X/L, which no solver can help. Every
// tolerance is therefore the larger of the one in [Options] and a few times
// that rounding.
package audit

import (
	"context"
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/surface"
)

// Options are the tolerances of the audit; zero values are the documented
// defaults, which are the ones that every command uses.
type Options struct {
	// Residual bounds ‖r‖₂/‖s‖₂. Zero: 1e-9.
	Residual float64
	// Worst bounds maxᵢ|rᵢ|/max sᵢ. Zero: 1e-8.
	Worst float64
	// Largest bounds |rᵢ|/sᵢ at every node. Zero: 1e-8.
	Largest float64
	// Balance bounds the global sums and the virial identity. Zero: 1e-9.
	Balance float64
	// Reaction bounds the difference between reported and recomputed
	// reactions over the forces that meet at the node. Zero: 1e-8.
	Reaction float64
	// Law bounds the relative difference between reported forces or stresses
	// and their laws. Zero: 1e-6.
	Law float64
	// LawInFabric is the same for cables along fabric of prescribed stress,
	// of which only the mean along the cable is asked for and the
	// discretisation takes its share; what lies below is reported as
	// prestress achieved. Zero: 0.25.
	LawInFabric float64
	// Volume bounds the difference between enclosed and wanted volumes of air,
	// relative (to 1e-5 of area^1.5 at least). Zero: 1e-8.
	Volume float64
	// AngleMin is the smallest triangle angle that is not called collapsed,
	// rad. Zero: 1°.
	AngleMin float64
	// MemoryBudget in bytes for factorising the tangent; beyond it
	// stability is said to be unknown. Zero: 2 GiB.
	MemoryBudget int64
	// ConvexUnknowns: up to this many unknowns the smallest eigenvalue is
	// computed even where instability is already excluded because every
	// element is in tension and no fabric stress is prescribed. Zero: 6000.
	ConvexUnknowns int
}

func (o Options) withDefaults() Options {
	set := func(p *float64, v float64) {
		if *p == 0 {
			*p = v
		}
	}
	set(&o.Residual, 1e-9)
	set(&o.Worst, 1e-8)
	set(&o.Largest, 1e-8)
	set(&o.Balance, 1e-9)
	set(&o.Reaction, 1e-8)
	set(&o.Law, 1e-6)
	set(&o.LawInFabric, 0.25)
	set(&o.Volume, 1e-8)
	set(&o.AngleMin, math.Pi/180)
	if o.MemoryBudget == 0 {
		o.MemoryBudget = 2 << 30
	}
	if o.ConvexUnknowns == 0 {
		o.ConvexUnknowns = 6000
	}
	return o
}

// Run audits f as a form of s. The error is about the call (slices that do not
// fit, ctx done); whatever is wrong with the form itself is in the Audit.
func Run(ctx context.Context, s *canopy.Structure, f *canopy.Form, o Options) (canopy.Audit, error) {
	o = o.withDefaults()
	a := canopy.Audit{ResidualNode: -1, SoftestNode: -1, MinAngleTri: -1, Discretisation: math.NaN(), Softest: math.NaN()}
	if err := fits(s, f); err != nil {
		return a, fmt.Errorf("audit: %w", err)
	}
	if where := notFinite(s, f); where != "" {
		a.Reasons = []string{fmt.Sprintf("the form holds a value that is not a finite number, or absurdly large (%s)", where)}
		nan := math.NaN()
		a.ResidualRMS, a.ResidualWorst, a.ResidualLargest = nan, nan, nan
		a.ForceBalance, a.MomentBalance, a.Virial, a.ReactionMismatch, a.ForceMismatch, a.VolumeMismatch = nan, nan, nan, nan, nan, nan
		a.StabilityNote = "not judged: the form is not finite"
		return a, nil
	}
	var why reasons
	c := newCase(s, f)
	c.checkAxes(&why)
	c.forces()
	if err := ctx.Err(); err != nil {
		return a, err
	}
	c.residuals(&a, o, &why)
	c.reactions(&a, o, &why)
	c.balance(&a, o, &why)
	c.virial(&a, o, &why)
	c.laws(&a, o, &why)
	c.volumes(&a, o, &why)
	c.tension(&a, &why)
	c.quality(&a, o, &why)
	if err := ctx.Err(); err != nil {
		return a, err
	}
	st, err := stability(ctx, c, o)
	if err != nil {
		return a, fmt.Errorf("audit: stability: %w", err)
	}
	c.judgeStability(&a, st, &why)
	a.Reasons = why
	a.Trusted = len(why) == 0
	return a, nil
}

// reasons collects in plain words why a form is not trusted.
type reasons []string

func (r *reasons) add(format string, a ...any) { *r = append(*r, fmt.Sprintf(format, a...)) }

// fits checks that f has the slices that s asks for.
func fits(s *canopy.Structure, f *canopy.Form) error {
	for _, l := range []struct {
		what      string
		got, want int
	}{
		{"positions", len(f.Position), len(s.Position)},
		{"reactions", len(f.Reaction), len(s.Position)},
		{"member forces", len(f.Force), len(s.Ends)},
		{"stresses", len(f.Stress), len(s.Corners)},
		{"warp directions", len(f.Warp), len(s.Corners)},
		{"ring couples", len(f.Couple), len(s.Rings)},
	} {
		if l.got != l.want {
			return fmt.Errorf("the form has %d %s where the structure asks for %d", l.got, l.what, l.want)
		}
	}
	return nil
}

// beyond is the size of metres and newtons from which products of them leave
// the numbers; nothing that is built comes near.
const beyond = 1e60

// notFinite names the first place whose values cannot be computed with, ""
// when there is none.
func notFinite(s *canopy.Structure, f *canopy.Form) string {
	bad := func(v r3.Vec) bool { return !(math.Abs(v.X)+math.Abs(v.Y)+math.Abs(v.Z) < beyond) }
	for i := range f.Position {
		if bad(f.Position[i]) || bad(f.Reaction[i]) {
			return "node " + s.NodeName.At(i)
		}
	}
	for k, t := range f.Force {
		if !(math.Abs(t) < beyond) {
			return "member " + s.MemberName.At(k)
		}
	}
	for t := range f.Stress {
		st := f.Stress[t]
		if bad(f.Warp[t]) || bad(r3.Vec{X: st.Warp, Y: st.Weft, Z: st.Shear}) {
			return "triangle " + s.TrianglePlace(f.Position, int32(t)).Name
		}
	}
	for _, p := range f.Pressure {
		if !(math.Abs(p) < beyond) {
			return "a pressure found"
		}
	}
	for r, c := range f.Couple {
		if bad(c) {
			return "ring " + s.Rings[r].Name
		}
	}
	return ""
}

// quality measures the mesh.
func (c *audited) quality(a *canopy.Audit, o Options, why *reasons) {
	q := surface.MeasureQuality(c.x, c.s.Corners)
	a.MinAngle, a.MinAngleTri, a.MeanAngleMin = q.MinAngle, q.Triangle, q.MeanMin
	if q.Triangle >= 0 && !(q.MinAngle >= o.AngleMin) {
		why.add("the mesh has collapsed: triangle %s has an angle of %.2g°", c.s.TrianglePlace(c.x, q.Triangle).Name, q.MinAngle*180/math.Pi)
	}
	if len(c.s.Ends) > 0 {
		shortest, sum := math.Inf(1), 0.0
		for _, l := range c.length {
			shortest = min(shortest, l)
			sum += l
		}
		if sum > 0 {
			a.ShortestOver = shortest * float64(len(c.length)) / sum
		}
		if !(shortest > 0) {
			for k, l := range c.length {
				if !(l > 0) {
					why.add("member %s has no length", c.s.MemberName.At(k))
					break
				}
			}
		}
	}
}
