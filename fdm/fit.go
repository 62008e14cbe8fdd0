package fdm

import (
	"context"
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// FitSettings steer [Solver.Fit]. The zero value is ready to use.
type FitSettings struct {
	// Group of each member, from 0: members of one group are scaled together,
	// so that those that start with equal force densities keep them equal.
	// −1: the member keeps its force density. nil: every member by itself.
	Group []int32
	// Stiffness EA of each member in N, for targets of unstressed length only.
	Stiffness []float64
	// Tolerance is the relative difference at which a target counts as met.
	// 0: 1e-9.
	Tolerance float64
	// MaxIterations bounds the steps. 0: 200.
	MaxIterations int
	// Range bounds how far a force density may go: between start/Range and
	// start·Range. 0: 1e6.
	Range float64
	// Progress, if set, is called after every step with the largest relative
	// difference left.
	Progress func(iteration int, worst float64)
}

// FitStatus says how a fit ended.
type FitStatus uint8

// Statuses of a fit.
const (
	// FitMet: all targets are met to the tolerance.
	FitMet FitStatus = iota
	// FitNearest: not all targets can be met from here. The result is
	// stationary as far as numbers can tell: no small change of the force
	// densities brings the weighted sum of squared relative differences down by
	// an amount worth having.
	FitNearest
	// FitStopped: it did not come to an end, by the limit on iterations or
	// because no step helped any more.
	FitStopped
)

// String gives the status in words.
func (s FitStatus) String() string {
	switch s {
	case FitMet:
		return "met"
	case FitNearest:
		return "nearest reached"
	case FitStopped:
		return "stopped"
	}
	return "unknown"
}

// FitResult is a shape in equilibrium and how near its quantities come to the
// targets. Whatever the status, Position belongs to Q exactly.
type FitResult struct {
	Position []r3.Vec  // m
	Q        []float64 // force densities, N/m
	// Reached is the value of each target's quantity in this shape, Off the
	// relative difference (Reached − Value)/|Value|.
	Reached, Off []float64
	// Worst is the largest size of Off, WorstTarget where (−1 without targets).
	Worst       float64
	WorstTarget int
	Status      FitStatus
	// Why in plain words when the status is not FitMet.
	Why string
	// Iterations done; each took one or more factorisations.
	Iterations int
	// AtBound lists members whose force density stands at a bound of its range.
	AtBound []int32
}

// Fit changes force densities until the shape meets targets: given forces,
// lengths, unstressed lengths and sags (Schek 1974, section on additional
// conditions). q are the force densities to start from, one for each member,
// in N/m; they keep their signs, and zeros stay zero.
//
// It works on the logarithms of the force densities, by Gauss-Newton steps on
// the relative differences, damped after Levenberg (1944) and Marquardt (1963)
// with a damping that fades with the differences. With fewer targets than force
// densities it takes the smallest change that serves. The derivatives come
// through the factorised system, D·dx = Σ dq (x_j − x_i), row by row, where
// targets or variables are few; where both are many, displacements, force
// densities and multipliers are solved for together in one sparse system.
//
// Targets that contradict each other or statics are no error: the result then
// says what was reached. Panels act as in [Solver.Shape]. Errors: [InputError],
// [SingularError] at the starting q, that of ctx.
func (s *Solver) Fit(ctx context.Context, q []float64, targets []Target, set FitSettings) (FitResult, error) {
	if set.Tolerance == 0 {
		set.Tolerance = 1e-9
	}
	if set.MaxIterations == 0 {
		set.MaxIterations = 200
	}
	if set.Range == 0 {
		set.Range = 1e6
	}
	if !(set.Range >= 1) || !(set.Tolerance > 0) {
		return FitResult{}, &InputError{What: "settings", Index: -1, Why: fmt.Sprintf("range %g must be at least 1 and tolerance %g positive", set.Range, set.Tolerance)}
	}
	if err := s.checkDensities(q); err != nil {
		return FitResult{}, err
	}
	goals, err := newGoals(targets, s.ends, set.Stiffness)
	if err != nil {
		return FitResult{}, err
	}
	f, err := s.newFit(q, goals, set)
	if err != nil {
		return FitResult{}, err
	}
	if err := s.Shape(ctx, f.x, f.q); err != nil {
		return FitResult{}, err
	}
	if !goals.measure(f.x, f.q) {
		return FitResult{}, &InputError{What: "force densities", Index: -1, Why: "at the start a target's quantity has no finite value; start from another shape"}
	}
	return f.run(ctx)
}

// fit is the state of a fit.
type fit struct {
	s     *Solver
	goals *goals
	set   FitSettings

	start    []float64 // force densities at the start
	variable []int32   // of each member, −1: kept
	count    int       // number of variables
	limit    float64   // bound of |theta|

	theta  []float64 // logarithms of q/start
	q      []float64
	x      []r3.Vec
	off    []float64 // at x
	frozen []bool    // variables at a bound that the gradient pushes outwards

	nextTheta, nextQ []float64
	nextX            []r3.Vec

	force, move []r3.Vec
	change      []float64 // of force densities
	factored    bool      // the solver's systems and weights belong to q
}

func (s *Solver) newFit(q []float64, g *goals, set FitSettings) (*fit, error) {
	nodes, members := len(s.position), len(s.ends)
	f := &fit{
		s: s, goals: g, set: set, limit: math.Log(set.Range),
		start: append([]float64(nil), q...), q: append([]float64(nil), q...),
		variable: make([]int32, members),
		x:        make([]r3.Vec, nodes), nextX: make([]r3.Vec, nodes),
		force: make([]r3.Vec, nodes), move: make([]r3.Vec, nodes),
		nextQ: make([]float64, members), change: make([]float64, members),
		off: make([]float64, len(g.target)),
	}
	if set.Group != nil && len(set.Group) != members {
		return nil, &InputError{What: "group", Index: -1, Why: fmt.Sprintf("there are %d values for %d members", len(set.Group), members)}
	}
	for k := range f.variable {
		v := int32(k)
		if set.Group != nil {
			if v = set.Group[k]; v < -1 || int(v) >= members {
				return nil, &InputError{What: "group of member", Index: k, Why: fmt.Sprintf("%d is neither −1 nor from 0 to %d", v, members-1)}
			}
		}
		if q[k] == 0 {
			v = -1
		}
		f.variable[k] = v
		f.count = max(f.count, int(v)+1)
	}
	f.theta, f.nextTheta = make([]float64, f.count), make([]float64, f.count)
	f.frozen = make([]bool, f.count)
	return f, nil
}

const (
	// longest is the largest change of a logarithm in one step.
	longest = 2.0
	// stationary is the share of the differences that a step must promise, or
	// three steps in a row bring, to be worth taking (the relative offset of
	// Bates & Watts 1981 is of this kind).
	stationary = 1e-5
)

func (f *fit) run(ctx context.Context) (FitResult, error) {
	f.factored = true
	copy(f.off, f.goals.off)
	damping, fresh := 1e-2, true
	step := make([]float64, f.count)
	gradient := make([]float64, f.count)
	var solve stepper
	hope := math.Inf(1) // what the last little damped step promised
	idle := 0           // steps in a row that brought next to nothing
	for iteration := 0; ; iteration++ {
		worst, _ := f.worst()
		if f.set.Progress != nil && iteration > 0 {
			f.set.Progress(iteration, worst)
		}
		if worst <= f.set.Tolerance {
			return f.result(FitMet, "", iteration), nil
		}
		if f.count == 0 {
			return f.result(FitNearest, "no force density may change", iteration), nil
		}
		if iteration >= f.set.MaxIterations {
			return f.result(FitStopped, fmt.Sprintf("%d iterations did not suffice", iteration), iteration), nil
		}
		if err := ctx.Err(); err != nil {
			return FitResult{}, err
		}
		size := norm2(f.off)
		if fresh {
			if err := f.refactor(ctx); err != nil {
				return FitResult{}, err
			}
			f.goals.differentiate(f.x, f.q)
			clear(f.frozen)
			if err := f.backward(gradient, f.off); err != nil {
				return FitResult{}, err
			}
			f.freeze(gradient)
			if solve == nil {
				solve = f.newStepper()
			}
			if err := solve.linearise(ctx); err != nil {
				return FitResult{}, err
			}
			fresh = false
		}
		// The damping fades with the differences, and is measured by what J
		// does to them.
		slope := norm2(gradient) / size
		if !finite(slope * slope) {
			return f.result(FitStopped, "values and targets are too far apart to reckon with", iteration), nil
		}
		mu := damping * math.Min(1, size*size) * slope * slope
		promised, err := solve.step(ctx, step, mu)
		if err != nil {
			return FitResult{}, err
		}
		if promised <= stationary*size && damping <= 1 {
			return f.result(FitNearest, "", iteration), nil
		}
		if damping <= 1 {
			hope = promised
		}
		gain, err := f.try(ctx, step, gradient)
		if err != nil {
			return FitResult{}, err
		}
		switch {
		case gain > 1e-4:
			f.accept()
			fresh = true
			if norm2(f.off) > (1-stationary)*size {
				if idle++; idle == 3 {
					return f.result(FitNearest, "", iteration+1), nil
				}
			} else {
				idle = 0
			}
			if gain > 0.75 {
				damping = max(damping/8, 1e-14)
			} else if gain < 0.25 {
				damping *= 4
			}
		default:
			damping *= 8
			if damping > 1e12 {
				if hope <= 1e-3*size {
					return f.result(FitNearest, "", iteration), nil
				}
				return f.result(FitStopped, "no step brings the targets nearer", iteration), nil
			}
		}
	}
}

// freeze takes variables at a bound that would go beyond it out of the step.
func (f *fit) freeze(gradient []float64) {
	const close = 1e-12
	for v, t := range f.theta {
		if t >= f.limit-close && gradient[v] < 0 || t <= close-f.limit && gradient[v] > 0 {
			f.frozen[v] = true
			gradient[v] = 0
		}
	}
}

// try takes a step and returns by how much of what it promised it brought the
// sum of squares down; negative when it went up or there is no shape.
func (f *fit) try(ctx context.Context, step, gradient []float64) (float64, error) {
	most := 0.0
	for _, d := range step {
		most = max(most, math.Abs(d))
	}
	if !finite(most) {
		return -1, nil
	}
	short := 1.0
	if most > longest {
		short = longest / most
	}
	slope := 0.0
	for v, t := range f.theta {
		d := step[v] * short
		f.nextTheta[v] = min(max(t+d, -f.limit), f.limit)
		slope += gradient[v] * (f.nextTheta[v] - t)
	}
	for k, v := range f.variable {
		f.nextQ[k] = f.start[k]
		if v >= 0 {
			f.nextQ[k] *= math.Exp(f.nextTheta[v])
		}
	}
	f.factored = false
	err := f.s.Shape(ctx, f.nextX, f.nextQ)
	var singular *SingularError
	if errors.As(err, &singular) {
		return -1, nil
	}
	if err != nil {
		return 0, err
	}
	if !f.goals.measure(f.nextX, f.nextQ) {
		return -1, nil
	}
	before, after := norm2(f.off), norm2(f.goals.off)
	// With slope = off·J·step the linear model lets the sum of squares fall by
	// −slope for an undamped step and by nearly twice that for a short one.
	if slope >= 0 {
		return -1, nil
	}
	return (before*before - after*after) / (-slope), nil
}

func (f *fit) accept() {
	f.theta, f.nextTheta = f.nextTheta, f.theta
	f.q, f.nextQ = f.nextQ, f.q
	f.x, f.nextX = f.nextX, f.x
	copy(f.off, f.goals.off)
	f.factored = true
}

// refactor makes the solver's systems those of q again.
func (f *fit) refactor(ctx context.Context) error {
	if f.factored {
		return nil
	}
	f.factored = true
	return f.s.prepare(ctx, f.q)
}

// worst is the largest relative difference, and the target it belongs to.
func (f *fit) worst() (worst float64, target int) {
	target = -1
	for t, o := range f.off {
		if d := math.Abs(f.relative(t, o)); target < 0 || d > worst {
			worst, target = d, t
		}
	}
	return worst, target
}

// relative takes the weight out of a weighted relative difference.
func (f *fit) relative(t int, off float64) float64 {
	if off == 0 {
		return 0
	}
	return off / (f.goals.weight[t] * math.Abs(f.goals.target[t].Value))
}

func (f *fit) result(status FitStatus, why string, iterations int) FitResult {
	f.goals.measure(f.x, f.q)
	r := FitResult{
		Position: f.x, Q: f.q, Status: status, Iterations: iterations,
		Reached: f.goals.value, Off: make([]float64, len(f.off)),
	}
	for t, o := range f.off {
		r.Off[t] = f.relative(t, o)
	}
	r.Worst, r.WorstTarget = f.worst()
	for k, v := range f.variable {
		if v >= 0 && math.Abs(f.theta[v]) >= f.limit-1e-9 {
			r.AtBound = append(r.AtBound, int32(k))
		}
	}
	if status != FitMet {
		r.Why = f.why(&r, why)
	}
	return r
}

// why says in plain words what was not met.
func (f *fit) why(r *FitResult, first string) string {
	if first == "" {
		first = "not all targets can be met together from this start"
	}
	if r.WorstTarget >= 0 {
		t := &f.goals.target[r.WorstTarget]
		first += fmt.Sprintf("; farthest off is target %d, %s of %s: %.6g reached, %.6g wanted",
			r.WorstTarget, t.Quantity, list("member", t.Members), r.Reached[r.WorstTarget], t.Value)
		if k := t.Members[0]; t.Quantity == Force && f.start[k]*t.Value < 0 {
			first += " (a member keeps the sign it starts with)"
		}
	}
	if len(r.AtBound) > 0 {
		first += fmt.Sprintf("; the force density of %s stands at the bound of its range", list("member", r.AtBound))
	}
	return first
}
