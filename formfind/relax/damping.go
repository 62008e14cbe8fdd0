package relax

import (
	"context"
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/engine"
)

// run is one relaxation on its way.
type run struct {
	*state
	set  engine.Settings
	name string
	out  engine.Outcome

	meetAll  float64  // ‖s‖₂ at the last refresh
	rest     []r3.Vec // the last place of rest
	lastMove float64  // between the last two places of rest, m

	best      []r3.Vec
	bestMerit float64
	bestAt    int // iteration
	bestRest  int // place of rest
	rests     int

	mostContrast float64
	doubled      bool // masses doubled for want of progress

	startAngle float64
	crushed    int // looks in a row that found a collapsed triangle
}

// Limits of patience and sanity.
const (
	refreshEvery = 40     // iterations between two updates of masses while in motion
	patience     = 4000   // iterations without progress before giving up …
	restPatience = 60     // … and places of rest
	collapse     = 0.0087 // rad, half a degree: triangle angles below have collapsed
	cableTarget  = 1e-9   // relative error of given lengths and sags
	tooFast      = 0.1    // of the size of the model in one step: thrown away
	mostSafety   = 64     // factor on masses beyond which we give up
)

func (r *run) begin() {
	r.out = engine.Outcome{NegativePivots: -1}
	r.bestMerit = math.Inf(1)
	r.lastMove = math.Inf(1)
	r.mostContrast = 1e4
	r.rest = append([]r3.Vec(nil), r.x...)
	r.best = append([]r3.Vec(nil), r.x...)
	r.elements()
	r.renew()
	r.startAngle, _ = r.sharpest()
}

func (r *run) renew() {
	r.refresh()
	r.meetAll = r.meetNorm()
}

// eta is the residual of the last move with the sums of the last refresh.
func (r *run) eta(s *sums) float64 {
	if s.residual2 == 0 {
		return 0
	}
	return math.Sqrt(s.residual2) / r.meetAll
}

// tell records and reports an iteration, and looks whether to stop.
func (r *run) tell(ctx context.Context, it int, eta, energy float64) error {
	r.out.Iterations = it
	r.set.Recorder.Record(engine.Row{Engine: r.name, Stage: "relaxation", Iteration: it, Residual: eta, Energy: energy})
	if it%64 == 0 {
		if r.set.Progress != nil {
			r.set.Progress(engine.Step{Engine: r.name, Stage: "relaxation", Iteration: it, Residual: eta, Target: r.set.Residual})
		}
		return ctx.Err()
	}
	return nil
}

// kinetic relaxes with kinetic damping.
func (r *run) kinetic(ctx context.Context) error {
	if err := ctx.Err(); err != nil {
		return err
	}
	r.begin()
	fresh := true                // at a place of rest
	var energy0, energy1 float64 // of the last two steps
	for it := 1; it <= r.set.MaxIterations; it++ {
		keep, push := 1.0, 1.0
		if fresh {
			keep, push = 0, 0.5
		}
		s := r.move(keep, push)
		eta := r.eta(&s)
		if err := r.tell(ctx, it, eta, s.kinetic); err != nil {
			return err
		}
		if !r.sane(&s) {
			if !r.heavier() {
				return nil
			}
			fresh = true
			continue
		}
		if fresh && r.resting(it, eta) {
			return nil
		}
		if !fresh && s.kinetic <= energy1 {
			r.stop(energy0, energy1, s.kinetic)
			r.adjustCables(eta)
			r.adjustPockets(eta)
			r.elements()
			r.renew()
			fresh, energy0, energy1 = true, 0, 0
			continue
		}
		fresh, energy0, energy1 = false, energy1, s.kinetic
		r.advance()
		r.elements()
		if it%refreshEvery == 0 {
			r.renew()
		}
	}
	r.exhausted()
	return nil
}

// stop goes back to where the kinetic energy had its peak: that of the parabola
// through the last three energies, which belong to the middles of three steps.
func (r *run) stop(e0, e1, e2 float64) {
	tau := 0.0
	if d := e0 - 2*e1 + e2; d < 0 {
		tau = min(max((e0-e2)/(2*d), -0.5), 0.5)
	}
	back := 0.5 - tau
	most := 0.0
	for i, x := range r.x {
		b := r.before[i]
		x.X -= back * (x.X - b.X)
		x.Y -= back * (x.Y - b.Y)
		x.Z -= back * (x.Z - b.Z)
		r.next[i] = x
		most = max(most, r3.Norm2(r3.Sub(x, r.rest[i])))
		r.rest[i] = x
	}
	for _, g := range r.ring {
		r.follow(r.next, g)
		r.follow(r.rest, g)
	}
	r.lastMove = math.Sqrt(most)
	r.advance()
}

// sane reports whether the step is one of numbers and no leap.
func (r *run) sane(s *sums) bool {
	t := s.residual2 + s.kinetic + s.fastest2
	return !math.IsNaN(t) && !math.IsInf(t, 0) && s.fastest2 <= tooFast*tooFast*r.size*r.size
}

// heavier goes back to the best shape and doubles the masses; false when that
// has been done too often.
func (r *run) heavier() bool {
	if r.safety >= mostSafety {
		r.finish(engine.Diverged, fmt.Sprintf("the motion grows without bound, most at node %s", r.nodeName(r.fastestNode())))
		return false
	}
	if r.contrast > 1 {
		r.mostContrast = max(1, r.contrast/16)
		r.contrast = 1
	} else {
		r.safety *= 2
	}
	r.back()
	return true
}

func (r *run) back() {
	copy(r.x, r.best)
	copy(r.rest, r.best)
	copy(r.next, r.best)
	copy(r.before, r.best)
	clear(r.v)
	clear(r.force0)
	r.lastMove = math.Inf(1)
	r.elements()
	r.renew()
}

func (r *run) fastestNode() int {
	worst, node := -1.0, 0
	for i, v := range r.v {
		l := r3.Norm2(v)
		if math.IsNaN(l) {
			return i
		}
		if l > worst {
			worst, node = l, i
		}
	}
	return node
}

func (r *run) nodeName(i int) string { return r.s.NodeName.At(i) }

// resting looks at a place of rest; true ends the run.
func (r *run) resting(it int, eta float64) bool {
	cable, _ := r.cableError()
	air, _ := r.airError()
	cable = max(cable, air)
	merit := max(eta, cable)
	if merit < 0.9*r.bestMerit {
		r.bestMerit, r.bestAt, r.bestRest = merit, it, r.rests
		copy(r.best, r.x)
	}
	r.rests++
	if r.directed != nil {
		r.sharpen(eta)
	}
	if eta <= r.set.Residual && cable <= cableTarget && (r.lastMove <= r.set.Move*r.size || eta == 0) {
		if r.arrived() {
			return true
		}
	}
	if r.rests%5 == 0 && r.collapsing() {
		return true
	}
	if it-r.bestAt > patience && r.rests-r.bestRest > restPatience {
		if !r.doubled {
			// Perhaps the masses are too light for what happens here.
			r.doubled = true
			r.safety *= 2
			r.bestAt, r.bestRest = it, r.rests
			r.renew()
			return false
		}
		r.stall()
		return true
	}
	return false
}

// sharpen raises the contrast of masses as the canopy comes to rest, and takes
// it back when that did not go well.
func (r *run) sharpen(eta float64) {
	switch {
	case eta > 0.2:
		r.contrast = 1
	case r.rests-r.bestRest > 8 && r.contrast > 1:
		r.contrast /= 4
		r.mostContrast = r.contrast
		r.bestRest = r.rests
	case r.contrast < r.mostContrast:
		r.contrast = min(4*r.contrast, r.mostContrast)
	default:
		return
	}
	r.renew()
}

// arrived checks all criteria afresh.
func (r *run) arrived() bool {
	r.renew()
	b := r.balance()
	if !(b.eta <= r.set.Residual && b.worst <= r.set.Worst) {
		return false
	}
	if t := r.collapsed(); t >= 0 {
		r.finish(engine.Diverged, r.collapseReason(t))
		return true
	}
	r.out.Status = engine.Converged
	r.out.Residual, r.out.Worst = b.eta, b.worst
	r.out.Move = r.lastMove / r.size
	if math.IsInf(r.lastMove, 0) {
		r.out.Move = 0
	}
	return true
}

// collapsed returns a triangle that has collapsed since the start, or −1.
func (r *run) collapsed() int {
	a, t := r.sharpest()
	if t >= 0 && !(a >= collapse) && !(a >= 0.2*r.startAngle) {
		return t
	}
	return -1
}

func (r *run) collapsing() bool {
	t := r.collapsed()
	if t < 0 {
		r.crushed = 0
		return false
	}
	r.crushed++
	if r.crushed < 4 {
		return false
	}
	r.finish(engine.Diverged, r.collapseReason(t))
	return true
}

func (r *run) collapseReason(t int) string {
	return fmt.Sprintf("triangles collapse at node %s: there is no shape to rest in, or the mesh is too coarse for it", r.nodeName(int(r.corners[t][0])))
}

func (r *run) stall() {
	copy(r.x, r.best)
	r.elements()
	r.renew()
	b := r.balance()
	if e, k := r.airError(); k >= 0 && e > cableTarget && e > b.eta {
		r.finish(engine.Stalled, fmt.Sprintf("the volume of fabric %s stays %.1e from the one asked for", r.s.Enclosures[r.pocket[k].index].Name, e))
		return
	}
	if e, c := r.cableError(); c >= 0 && e > cableTarget && e > b.eta {
		r.finish(engine.Stalled, fmt.Sprintf("cable %s stays %.1e from the length or sag asked for", r.s.Cables[r.cable[c].index].Name, e))
		return
	}
	r.finish(engine.Stalled, fmt.Sprintf("the residual stays at %.1e of the forces, largest at node %s", b.eta, r.nodeName(int(b.node))))
}

func (r *run) exhausted() {
	if t := r.collapsed(); t >= 0 {
		r.finish(engine.Diverged, r.collapseReason(t))
		return
	}
	r.finish(engine.Stalled, fmt.Sprintf("not at rest after %d iterations", r.set.MaxIterations))
}

// finish ends the run with the best shape seen.
func (r *run) finish(status engine.Status, why string) {
	if !math.IsInf(r.bestMerit, 1) {
		copy(r.x, r.best)
	} else {
		copy(r.x, r.rest)
	}
	r.elements()
	r.renew()
	b := r.balance()
	r.out.Status, r.out.Why = status, why
	r.out.Residual, r.out.Worst = b.eta, b.worst
	r.out.Move = r.lastMove / r.size
	if math.IsInf(r.lastMove, 0) {
		r.out.Move = 0
	}
}

// viscous relaxes with viscous damping, c = 2√λ per unit of mass and step,
// with λ = −Σv·Δr/Σmv² the square of the frequency that is in motion
// (Rayleigh's quotient; Underwood, Dynamic relaxation, in Computational
// Methods for Transient Analysis, 1983).
func (r *run) viscous(ctx context.Context) error {
	if err := ctx.Err(); err != nil {
		return err
	}
	r.begin()
	fresh := true
	drag, energy := 0.0, 0.0
	for it := 1; it <= r.set.MaxIterations; it++ {
		keep, push := (1-drag/2)/(1+drag/2), 1/(1+drag/2)
		if fresh {
			keep, push = 0, 0.5
		}
		s := r.move(keep, push)
		eta := r.eta(&s)
		if err := r.tell(ctx, it, eta, s.kinetic); err != nil {
			return err
		}
		if !r.sane(&s) {
			if !r.heavier() {
				return nil
			}
			fresh, drag = true, 0
			continue
		}
		if !fresh && energy > 0 {
			if l := s.work / (2 * energy); l > 0 && !math.IsInf(l, 0) {
				drag = min(2*math.Sqrt(l), 1.5)
			} else {
				drag *= 0.9
			}
		}
		fresh, energy = false, s.kinetic
		if it%20 == 0 || s.kinetic == 0 {
			// What is left to go at critical damping is about v·2/c.
			r.lastMove = math.Sqrt(s.fastest2) * 2 / max(drag, 1e-3)
			if r.resting(it, eta) {
				return nil
			}
			r.adjustCables(eta)
			r.adjustPockets(eta)
		}
		r.advance()
		r.elements()
		if it%refreshEvery == 0 {
			r.renew()
		}
	}
	r.exhausted()
	return nil
}
