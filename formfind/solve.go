package formfind

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/audit"
	"anticlast/formfind/canopy"
	"anticlast/formfind/limit"
	"anticlast/formfind/mesh"
)

// Find meshes the model, solves it and holds its limits against what was
// found. See the package comment for errors.
func Find(ctx context.Context, m *canopy.Model, o Options) (*canopy.Result, error) {
	o.live = o.Warm != nil
	r, err := find(ctx, m, o)
	return r, clampHint(m, err)
}

func find(ctx context.Context, m *canopy.Model, o Options) (*canopy.Result, error) {
	if mesh.HasEqualMesh(m) {
		s, warm, err := layEqualMesh(ctx, m, o)
		if err != nil {
			return nil, err
		}
		o.Warm, o.stiff = warm, true
		return solve(ctx, s, m, o)
	}
	o.begin("mesh")
	o.Listed = o.Listed || m.Listed != nil
	whole := func() (*canopy.Structure, error) { return mesh.Build(ctx, m) }
	if o.Warm == nil {
		coarse, steps, err := meshLevels(ctx, m)
		if err != nil {
			return nil, err
		}
		if len(steps) > 0 {
			return solveLevels(ctx, coarse, steps, whole, m, o)
		}
	}
	s, err := whole()
	if err != nil {
		return nil, err
	}
	return solve(ctx, s, m, o)
}

// Solve finds the shape of a structure: engines, balance of held points,
// audit. The structure is not changed.
func Solve(ctx context.Context, s *canopy.Structure, o Options) (*canopy.Result, error) {
	o.live = o.Warm != nil
	return solve(ctx, s, &canopy.Model{}, o)
}

func solve(ctx context.Context, s *canopy.Structure, m *canopy.Model, o Options) (*canopy.Result, error) {
	if err := check(s); err != nil {
		return nil, err
	}
	o.begin("solve")
	local, origin := nearOrigin(s)
	if o.Warm != nil && origin != (r3.Vec{}) {
		warm := *o.Warm
		warm.Position = moved(warm.Position, r3.Scale(-1, origin))
		o.Warm = &warm
	}
	with := o
	o.solver, o.parents, o.ahead = nil, nil, nil // not to be kept for what comes after
	got, err := findForm(ctx, local, with)
	if err != nil {
		return nil, err
	}
	f := got.form
	finer, err := discretisation(ctx, local, got, origin, o)
	if err != nil {
		return nil, err
	}
	// From here on the pressures found act like given ones.
	s, local = s.Carrying(f), local.Carrying(f)
	setReactions(local, f)
	if err := balanceHeld(local, f); err != nil {
		return nil, err
	}
	setReactions(local, f)
	if !finiteForm(f) {
		return nil, errors.New("the engines left the range of numbers: no shape was found")
	}
	var disagreement string
	if o.CrossCheck {
		o.begin("cross-check")
		if disagreement, err = crossCheck(ctx, local, got, o); err != nil {
			return nil, err
		}
	}
	backFrom(s, f, origin)
	r := &canopy.Result{
		Title: m.Title, File: m.File, Digest: m.Digest,
		Limits: m.Limits, Factors: m.Factors, North: m.North,
		Structure: laid(s, f), Form: f,
	}
	r.Program.Engines = f.Engines
	r.Audit.Discretisation = finer
	if err := judge(ctx, r, o); err != nil {
		return nil, err
	}
	if disagreement != "" {
		r.Audit.Trusted = false
		r.Audit.Reasons = append(r.Audit.Reasons, disagreement)
	}
	return r, nil
}

// laid returns the structure with its wanted warp as it lies on the surface found,
// which is what the warp achieved is held against.
func laid(s *canopy.Structure, f *canopy.Form) *canopy.Structure {
	out := *s
	out.Warp = make([]r3.Vec, len(s.Corners))
	same := true
	for t, n := range s.Corners {
		out.Warp[t] = s.WarpAt(t, f.Position[n[0]], f.Position[n[1]], f.Position[n[2]])
		same = same && out.Warp[t] == s.Warp[t]
	}
	if same {
		return s
	}
	return &out
}

// check refuses what cannot be solved before anything is.
func check(s *canopy.Structure) error {
	if err := s.Validate(); err != nil {
		return fmt.Errorf("the structure does not fit together: %w", err)
	}
	if len(s.Ends) == 0 && len(s.Corners) == 0 {
		return ErrEmpty
	}
	if err := checkRingPull(s); err != nil {
		return err
	}
	return checkStays(s)
}

// Judge fills the audit, quantities and findings of a result from its
// structure and form: what check does with a file and Solve with what it
// found.
func Judge(ctx context.Context, r *canopy.Result) error { return judge(ctx, r, Options{}) }

func judge(ctx context.Context, r *canopy.Result, o Options) error {
	o.begin("audit")
	var err error
	// How far a finer mesh would move the answer was seen while solving and
	// cannot be recomputed from the shape.
	finer := r.Audit.Discretisation
	if finer == 0 {
		finer = math.NaN()
	}
	if r.Audit, err = audit.Run(ctx, r.Structure, r.Form, audit.Options{}); err != nil {
		return fmt.Errorf("audit: %w", err)
	}
	r.Audit.Discretisation = finer
	if !r.Form.Converged {
		r.Audit.Trusted = false
		r.Audit.Reasons = append(r.Audit.Reasons, "the engine did not converge: "+r.Form.Why)
	}
	if why := unsettled(&r.Audit); why != "" {
		r.Audit.Trusted = false
		r.Audit.Reasons = append(r.Audit.Reasons, why)
	}
	o.begin("limits")
	r.Summary = audit.Quantities(r.Structure, r.Form, r.Factors)
	r.Findings = limit.WithFineness(limit.Check(r.Structure, r.Form, &r.Summary, r.Limits, r.Factors), finer)
	return nil
}

// nearOrigin returns the structure about a local origin when it lies far from
// the global one: coordinates of many digits would cost the digits that
// equilibrium needs.
func nearOrigin(s *canopy.Structure) (*canopy.Structure, r3.Vec) {
	lo, hi := canopy.Bounds(s.Position)
	mid := r3.Scale(0.5, r3.Add(lo, hi))
	origin := r3.Vec{X: math.Round(mid.X), Y: math.Round(mid.Y), Z: math.Round(mid.Z)}
	if r3.Norm(origin) <= 10*r3.Norm(r3.Sub(hi, lo)) {
		return s, r3.Vec{}
	}
	local := *s
	local.Position = moved(s.Position, r3.Scale(-1, origin))
	local.Reference = moved(s.Reference, r3.Scale(-1, origin))
	local.Fabrics = slices.Clone(s.Fabrics)
	for i := range local.Fabrics {
		local.Fabrics[i].WarpCentre = r3.Sub(local.Fabrics[i].WarpCentre, origin)
	}
	local.Curves = slices.Clone(s.Curves)
	for i := range local.Curves {
		c := &local.Curves[i]
		c.Start, c.Through, c.End = r3.Sub(c.Start, origin), r3.Sub(c.Through, origin), r3.Sub(c.End, origin)
	}
	return &local, origin
}

func moved(p []r3.Vec, by r3.Vec) []r3.Vec {
	if p == nil {
		return nil
	}
	out := make([]r3.Vec, len(p))
	for i := range p {
		out[i] = r3.Add(p[i], by)
	}
	return out
}

// backFrom moves the form back to the global origin; nodes that do not move
// get their given coordinates to the last bit.
func backFrom(s *canopy.Structure, f *canopy.Form, origin r3.Vec) {
	if origin == (r3.Vec{}) {
		return
	}
	f.Position = append([]r3.Vec(nil), f.Position...) // forms may share it
	for i := range f.Position {
		p := r3.Add(f.Position[i], origin)
		fixed := s.FixedAt(i)
		if fixed.Has(0) {
			p.X = s.Position[i].X
		}
		if fixed.Has(1) {
			p.Y = s.Position[i].Y
		}
		if fixed.Has(2) {
			p.Z = s.Position[i].Z
		}
		f.Position[i] = p
	}
}
