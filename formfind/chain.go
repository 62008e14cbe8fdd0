package formfind

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/fdm"
	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/load"
	"anticlast/formfind/newton"
	"anticlast/formfind/relax"
)

// chain is one run of the engines over a structure.
type chain struct {
	s *canopy.Structure
	o Options
	f *canopy.Form // the shape so far
	// smooth is the surface of prescribed stress, before the pass that
	// balances in all directions.
	smooth *canopy.Form
	solver *newton.Solver // that found it
	did    []string
	use    []string
	// eased is the structure with another ratio of warp to weft, see ease.
	eased *canopy.Structure
	// hung says that only the mesh holds the shape, see unreal.
	hung bool
	// unstable is how many unstable directions Newton's last shape has.
	unstable int
}

func (c *chain) say(format string, a ...any) { c.did = append(c.did, fmt.Sprintf(format, a...)) }

func (c *chain) used(name string) { c.use = appendNew(c.use, name) }

func (c *chain) stage(name, stage string) {
	if c.o.Progress != nil {
		if c.o.level != "" {
			stage = strings.TrimPrefix(stage+", ", ", ") + c.o.level
		}
		c.o.Progress(engine.Step{Engine: name, Stage: stage})
	}
}

// findForm chains the engines. The form it returns has positions, forces and
// stresses; reactions and the forces of balancing masts and guys are left.
func findForm(ctx context.Context, s *canopy.Structure, o Options) (found, error) {
	c := &chain{s: s, o: o}
	var err error
	if len(s.Corners) > 0 {
		err = c.fabric(ctx)
	} else {
		err = c.net(ctx)
	}
	if err != nil {
		return found{}, err
	}
	if c.hung {
		c.f.Converged = false
		c.f.Why = "the surface hangs on a few drawn-out triangles and is far from balance in its plane: only the mesh holds this shape"
	}
	c.f.Steps, c.f.Engines = c.did, c.use
	return found{c.f, c.smooth, c.solver, c.eased}, nil
}

// found is what a chain of engines ends with. surface is the fabric's before the
// pass that balances in all directions.
type found struct {
	form, surface *canopy.Form
	solver        *newton.Solver    // of the surface
	eased         *canopy.Structure // with the stress ratio that was eased, nil
}

// net finds the shape of a structure without triangles.
func (c *chain) net(ctx context.Context) error {
	s := c.s
	force := guessForces(s, s.Position)
	q := guessDensities(s, s.Position, force)
	f, err := c.linear(ctx, q)
	if err != nil {
		return err
	}
	c.f = f
	if onlyDensities(s) && steadyLoads(s) {
		c.f.Converged = true
		return nil
	}
	if c.o.Warm != nil && len(c.o.Warm.Position) == len(s.Position) {
		c.f = c.warmStart()
	} else if err := c.aim(ctx, q); err != nil {
		return err
	}
	return c.iterate(ctx, true, []start{func(context.Context) error { return nil }}, nil)
}

// aim improves the start of a net by a few linear steps whose force densities
// follow the wanted forces.
func (c *chain) aim(ctx context.Context, q []float64) error {
	s := c.s
	for range naturalUpdates {
		changed := false
		for k, e := range s.Ends {
			if s.Law[k] != canopy.LawForce {
				continue
			}
			if l := r3.Norm(r3.Sub(c.f.Position[e[1]], c.f.Position[e[0]])); l > 0 {
				q[k] = s.Given[k] / l
				changed = true
			}
		}
		if !changed {
			return nil
		}
		f, err := c.linear(ctx, q)
		var singular *fdm.SingularError
		if errors.As(err, &singular) {
			return nil // keep the shape there is
		}
		if err != nil {
			return err
		}
		c.f = f
		c.did = c.did[:len(c.did)-1]
	}
	c.say("force density, %d linear steps towards the given forces", naturalUpdates)
	return nil
}

// linear is one force-density step.
func (c *chain) linear(ctx context.Context, q []float64) (*canopy.Form, error) {
	s := c.s
	c.stage("force density", "first shape")
	net, panels := startNetwork(s, startLoads(s))
	solver, err := fdm.New(ctx, net, panels)
	if err != nil {
		return nil, c.unsupported(err)
	}
	f := canopy.NewForm(s)
	if err := solver.Shape(ctx, f.Position, q); err != nil {
		return nil, c.unsupported(err)
	}
	for k, e := range s.Ends {
		f.Force[k] = q[k] * r3.Norm(r3.Sub(f.Position[e[1]], f.Position[e[0]]))
	}
	c.used("force density")
	c.say("force density, linear: a first shape from the boundary and the prestress alone")
	return f, nil
}

// unsupported names the nodes of a singular system as the model does.
func (c *chain) unsupported(err error) error {
	var singular *fdm.SingularError
	if !errors.As(err, &singular) {
		return err
	}
	names := make([]string, len(singular.Nodes))
	for i, n := range singular.Nodes {
		names[i] = c.s.NodeName.At(int(n))
	}
	return &SupportError{Nodes: names, Err: singular}
}

// SupportError says which nodes of a structure nothing holds, by name.
type SupportError struct {
	Nodes []string
	Err   *fdm.SingularError
}

func (e *SupportError) Error() string {
	switch e.Err.Cause {
	case fdm.NoSupport:
		return fmt.Sprintf("nothing holds %s in %s: no chain of members or fabric under tension leads from there to a support; anchor a point of that part, or connect it", nodeList(e.Nodes), e.Err.Directions)
	case fdm.Cancel, fdm.Weak:
		return fmt.Sprintf("tension and compression cancel at %s, so that nothing says where the nodes should be; change a force there", nodeList(e.Nodes))
	}
	return e.Err.Error()
}

func (e *SupportError) Unwrap() error { return e.Err }

func nodeList(names []string) string {
	if len(names) == 1 {
		return "node " + names[0]
	}
	return "nodes " + list(names)
}

func onlyDensities(s *canopy.Structure) bool {
	for k, l := range s.Law {
		if l == canopy.LawForceDensity {
			continue
		}
		if l == canopy.LawCable && s.Cables[s.CableOf[k]].Law == canopy.CableBalance {
			continue
		}
		return false
	}
	return true
}

// warmStart takes the positions of the given form, with fixed nodes where the
// structure now has them.
func (c *chain) warmStart() *canopy.Form {
	if c.o.below != nil {
		// Made for this, with fixed nodes in their places.
		f := *c.o.Warm
		c.say("coarse to fine: started from the surface found with mesh sides twice as long")
		return &f
	}
	f := canopy.NewForm(c.s)
	copy(f.Force, c.o.Warm.Force)
	copy(f.Stress, c.o.Warm.Stress)
	copy(f.Pressure, c.o.Warm.Pressure)
	for i := range f.Position {
		fixed := c.s.FixedAt(i)
		f.Position[i] = r3.Add(only(c.s.Position[i], fixed), only(c.o.Warm.Position[i], canopy.DirAll&^fixed))
	}
	c.say("started from an earlier shape")
	return f
}

// newton runs Newton from the shape so far and keeps its shape if it converged;
// otherwise it returns why not.
func (c *chain) newton(ctx context.Context, all bool) (why string, err error) {
	v, err := c.o.ahead.solver(ctx, c.s)
	if err != nil {
		return "", err
	}
	if !all {
		v.Above(c.o.solver, c.o.parents)
	}
	f, out, err := v.Find(ctx, c.f, c.settings(all))
	var flat *newton.DegenerateError
	if errors.As(err, &flat) {
		c.say("Newton was not tried: %s %s has no size", flat.Element, flat.Name)
		return fmt.Sprintf("%s %s shrinks to nothing, as nothing else pulls at its end; hold that point, or connect it to something that pulls the other way", flat.Element, flat.Name), nil
	}
	if err != nil {
		return "", err
	}
	if out.Status != engine.Converged {
		c.say("Newton%s %s after %d iterations: %s", directions(all), out.Status, out.Iterations, out.Why)
		return out.Why, nil
	}
	c.f, c.f.Converged = f, true
	c.solver = v
	c.unstable = out.NegativePivots
	c.used("newton")
	c.say("Newton%s: %d iterations to a residual of %.1e", directions(all), out.Iterations, out.Residual)
	return "", nil
}

// start puts a shape to begin with into the chain.
type start = func(context.Context) error

// iterate runs Newton from one start after the other, then from those that more
// returns, and relaxation where Newton does not get there.
func (c *chain) iterate(ctx context.Context, all bool, starts []start, more func() []start) error {
	first := ""
	var best candidate
	for k := 0; ; k++ {
		if k == len(starts) && more != nil {
			starts, more = append(starts, more()...), nil
		}
		if k == len(starts) {
			break
		}
		err := starts[k](ctx)
		var collapsed *fdm.ReferenceError
		if errors.As(err, &collapsed) {
			c.say("that start collapsed: %v", collapsed)
			continue
		}
		if err != nil {
			return err
		}
		if c.o.Method == MethodRelax {
			break
		}
		why, err := c.newton(ctx, all)
		if err != nil {
			return err
		}
		if why == "" {
			if len(c.s.Corners) == 0 {
				return nil
			}
			angle := smallestAngle(c.f.Position, c.s.Corners)
			got := candidate{c.f, angle, c.unstable > 0, angle < nearCollapse/4 || unreal(c.s, c.f)}
			if got.sound() {
				return nil
			}
			if best.form == nil || got.better(best) {
				best = got
			}
			continue
		}
		if first == "" {
			first = why + "; "
		}
	}
	keep := func() error {
		c.f = best.form
		c.hung = best.unreal
		if len(starts) > 1 {
			c.say("kept the best of these")
		}
		return nil
	}
	if best.form != nil && !best.unreal {
		return keep()
	}
	if len(c.s.Corners) > 0 && c.o.Method == MethodAuto {
		done, limit, err := c.walk(ctx)
		if err != nil || done {
			return err
		}
		if limit != nil {
			limit.Tried = c.did
			return limit
		}
	}
	if best.form != nil {
		return keep()
	}
	if c.f == nil {
		var err error
		if c.f, err = c.linear(ctx, guessDensities(c.s, c.s.Position, guessForces(c.s, c.s.Position))); err != nil {
			return err
		}
	}
	if err := c.relax(ctx, c.settings(all)); err != nil {
		return err
	}
	if !c.f.Converged {
		return &NoEquilibriumError{
			Text:  fmt.Sprintf("no shape in equilibrium was found: %srelaxation: %s", first, c.f.Why),
			Tried: c.did,
		}
	}
	if c.o.Method == MethodRelax {
		return nil
	}
	// Relaxation ends where its damping lets it; Newton takes the rest.
	_, err := c.newton(ctx, all)
	return err
}

func (c *chain) settings(all bool) engine.Settings {
	set := engine.Settings{AllDirections: all, Progress: c.o.Progress, Recorder: c.o.Recorder}
	if c.o.stiff {
		set.Residual, set.Worst = 1e-11, 1e-10
	}
	return set
}

func directions(all bool) string {
	if all {
		return ""
	}
	return " in the shape-changing directions"
}

func (c *chain) relax(ctx context.Context, set engine.Settings) error {
	f, out, err := (&relax.Engine{}).Find(ctx, c.s, c.f, set)
	if err != nil {
		return fmt.Errorf("relaxation: %w", err)
	}
	c.used(relax.New().Name())
	c.say("dynamic relaxation %s after %d iterations, residual %.1e", out.Status, out.Iterations, out.Residual)
	f.Converged = out.Status == engine.Converged
	f.Why = out.Why
	c.f = f
	return nil
}

// fabric finds the shape of a structure with triangles.
func (c *chain) fabric(ctx context.Context) error {
	s := c.s
	elastic := false
	for i := range s.Fabrics {
		elastic = elastic || s.Fabrics[i].Elastic
	}
	force := guessForces(s, s.Position)
	var starts []start
	if c.o.Warm != nil && len(c.o.Warm.Position) == len(s.Position) {
		starts = append(starts, func(context.Context) error { c.f = c.warmStart(); return nil })
	}
	more := func() (out []start) {
		for _, n := range c.naturalStarts() {
			out = append(out, func(ctx context.Context) error { return c.natural(ctx, force, n) })
		}
		return out
	}
	if len(s.Enclosures) > 0 && restrained(s) {
		starts = append(starts, func(ctx context.Context) error { return c.blown(ctx, force) })
	}
	if elastic {
		// Newton's tangent is that of prescribed stress.
		if len(starts) == 0 {
			starts = more()
		}
		if err := starts[0](ctx); err != nil {
			return err
		}
		return c.relax(ctx, c.settings(true))
	}
	if c.o.Listed {
		if kept, err := c.givenShape(ctx); kept || err != nil {
			return err
		}
	}
	equal := equalStress(s)
	err := c.iterate(ctx, false, starts, more)
	var none *NoEquilibriumError
	switch {
	case err == nil:
	case !equal && errors.As(err, &none) && !none.Shown:
		// The ratio could not be held everywhere. The shape of the natural
		// updates is in balance with the stress it reports; the report says
		// how far that is from what was asked.
		if err := c.natural(ctx, force, naturalStart{drawn: soundMesh(s), whole: true}); err != nil {
			var collapsed *fdm.ReferenceError
			if errors.As(err, &collapsed) {
				return none
			}
			return err
		}
		for t, w := range s.Stress {
			c.f.Stress[t] = canopy.Stress{Warp: w[0], Weft: w[1]}
		}
		copy(c.f.Force, force)
		c.say("kept the shape of the natural force densities, whose stress deviates from the wanted ratio")
	default:
		return err
	}
	c.smooth = c.f
	if c.o.surface {
		return nil
	}
	// What Newton keeps is large, and the work that follows needs room.
	c.solver, c.o.solver, c.o.parents = nil, nil, nil
	c.o.ahead.end()
	if err := c.finish(ctx); err != nil || equal || c.o.eased {
		return err
	}
	return c.ease(ctx)
}

// naturalStart is one way to start by natural force densities.
type naturalStart struct {
	drawn bool // from the nodes as drawn, not from the linear step
	even  bool // with the geometric mean of warp and weft both ways
	whole bool // all updates, even where they draw out triangles
}

// naturalStarts lists the starts by natural force densities that suit the
// structure, the best first.
func (c *chain) naturalStarts() []naturalStart {
	sound := soundMesh(c.s)
	switch equal := equalStress(c.s); {
	case equal && sound:
		return []naturalStart{{drawn: true}, {drawn: true, whole: true}, {whole: true}}
	case equal:
		return []naturalStart{{whole: true}, {drawn: true, whole: true}}
	case sound:
		return []naturalStart{{drawn: true, even: true}, {drawn: true}, {even: true}, {}}
	}
	return []naturalStart{{even: true}, {}, {drawn: true, even: true}}
}

// natural is a fixed few updates from the nodes as drawn, or from the linear
// step, which does not depend on them. Unequal warp and weft of constant
// magnitude are in balance in their plane only by chance, and updates would slide
// nodes until triangles collapse: with even set, their geometric mean acts both
// ways instead, which leaves the turn to the wanted ratio to Newton.
func (c *chain) natural(ctx context.Context, force []float64, n naturalStart) error {
	s := c.s
	ref := s.Position
	if !n.drawn {
		f, err := c.linear(ctx, guessDensities(s, s.Position, force))
		if err != nil {
			return err
		}
		ref = f.Position
	}
	c.stage("natural force density", "")
	net, panels := startNetwork(s, startLoads(s))
	if n.even {
		for t, p := range panels {
			mean := math.Sqrt(p.WarpStress * p.WeftStress)
			panels[t].WarpStress, panels[t].WeftStress = mean, mean
		}
	}
	solver, err := fdm.New(ctx, net, panels)
	if err != nil {
		return c.unsupported(err)
	}
	var best fdm.NaturalResult
	done, widest := 0, 0.0
	for done < naturalUpdates {
		r, err := solver.Natural(ctx, ref, given(s, force), 1)
		var collapsed *fdm.ReferenceError
		if done > 0 && errors.As(err, &collapsed) {
			break
		}
		if err != nil {
			return c.unsupported(err)
		}
		angle := smallestAngle(r.Position, s.Corners)
		if !n.whole && done > 0 && angle < thinning && angle < widest/2 {
			break
		}
		best, ref, widest = r, r.Position, max(widest, angle)
		done++
	}
	c.f = naturalForm(s, best)
	c.used("natural force density")
	with := ""
	if n.even {
		with = " with the mean of warp and weft both ways"
	}
	c.say("natural force density%s: %d updates", with, done)
	return nil
}

// nearCollapse is the angle of a triangle (rad) below which other starts are
// tried for a better mesh.
const nearCollapse = 5 * math.Pi / 180

// candidate is a shape in balance that is perhaps not the last word: unstable,
// or on a mesh close to collapse.
type candidate struct {
	form     *canopy.Form
	angle    float64 // smallest, rad
	unstable bool
	unreal   bool
}

func (a candidate) sound() bool { return !a.unstable && !a.unreal && a.angle > nearCollapse }

func (a candidate) better(b candidate) bool {
	if a.unreal != b.unreal {
		return b.unreal
	}
	if a.unstable != b.unstable {
		return b.unstable
	}
	return a.angle > b.angle
}

// thinning is the angle of a triangle (rad) below which updates end that have
// halved it.
const thinning = 8 * math.Pi / 180

// given splits what members carry into forces and force densities.
func given(s *canopy.Structure, force []float64) fdm.Given {
	g := fdm.Given{Force: make([]float64, len(force)), Density: make([]float64, len(force))}
	for k, t := range force {
		if s.Law[k] == canopy.LawForceDensity {
			g.Density[k] = s.Given[k]
		} else {
			g.Force[k] = t
		}
	}
	return g
}

func naturalForm(s *canopy.Structure, r fdm.NaturalResult) *canopy.Form {
	f := canopy.NewForm(s)
	copy(f.Position, r.Position)
	copy(f.Force, r.Force)
	for t, st := range r.Stress {
		f.Stress[t] = canopy.Stress{Warp: st.Warp, Weft: st.Weft, Shear: st.Shear}
		f.Warp[t] = st.Axis
	}
	return f
}

// finish is the pass that balances in all directions: the shape found is the
// reference, the wanted stress acts on it as second Piola–Kirchhoff stress, and
// the linear system has one exact solution nearby. The form reports the true
// stress and forces of that solution.
func (c *chain) finish(ctx context.Context) error {
	s := c.s
	if lawful(s) {
		if done, err := c.settle(ctx); done || err != nil {
			return err
		}
	}
	found := c.f
	c.o.begin("balance")
	c.stage("natural force density", "final pass")
	ref := found.Position
	members := given(s, found.Force)
	net, panels := network(s, nil)
	for t := range panels {
		// Of unequal warp and weft only the ratio is what was asked for;
		// the magnitude is what Newton fitted.
		n := s.Corners[t]
		panels[t].Warp = s.WarpAt(t, ref[n[0]], ref[n[1]], ref[n[2]])
		panels[t].WarpStress, panels[t].WeftStress = found.Stress[t].Warp, found.Stress[t].Weft
	}
	solver, err := fdm.New(ctx, net, panels)
	if err != nil {
		return c.unsupported(err)
	}
	var r fdm.NaturalResult
	loadsAt := func(x []r3.Vec, p []float64) []r3.Vec {
		return load.Nodal(s.Carrying(&canopy.Form{Pressure: p}), x)
	}
	rest := func(loads []r3.Vec) ([]r3.Vec, error) {
		if err := solver.SetLoad(loads); err != nil {
			return nil, fmt.Errorf("loads: %w", err)
		}
		var err error
		if r, err = solver.Natural(ctx, ref, members, 1); err != nil {
			return nil, c.unsupported(err)
		}
		return r.Position, nil
	}
	pressure := found.Pressure
	if steadyLoads(s) {
		_, err = rest(loadsAt(ref, nil))
	} else {
		pressure, err = followLoads(ctx, s, ref, pressure, loadsAt, rest)
	}
	if err != nil {
		return err
	}
	c.f = naturalForm(s, r)
	copy(c.f.Pressure, pressure)
	c.f.Converged = true
	c.used("natural force density")
	with := ""
	if len(s.Enclosures) > 0 {
		with = " with the volume asked for"
	}
	c.say("fixed-reference pass: exact balance in all directions%s, residual %.1e", with, r.Residual)
	return nil
}

func equalStress(s *canopy.Structure) bool {
	for _, st := range s.Stress {
		if st[0] != st[1] {
			return false
		}
	}
	return true
}
