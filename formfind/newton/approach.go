package newton

import (
	"context"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/element"
	"anticlast/formfind/engine"
)

// Members that are stiff against the forces they carry make a narrow curved
// valley of the energy: a rough shape has absurd forces, and steps that insist
// on less residual are short. The approach therefore treats the forces of
// elastic members as unknowns of their own. Linearised and eliminated member by
// member this is the ordinary step with two changes: the geometric part of the
// tangent uses the member's present force T, and after the step the force is
// that of the linearised length,
//
//	T ← EA (L + t·Δu − L₀)/L₀, zero at least where the member may not push.
//
// It converges like Newton's method on a cable that cannot stretch. The
// ordinary iteration then starts from a shape whose lengths fit its forces.
// (Two-field Newton iteration, as in the mixed-integration-point method:
// Magisano, Leonetti & Garcea, Int. J. Numer. Methods Eng. 109, 2017.)

const (
	// approachSteps bounds the approach.
	approachSteps = 40
	// approachIdle bounds its steps without a new best.
	approachIdle = 10
	// approachEnd is the misfit, of forces in balance and forces by law, at
	// which the ordinary iteration takes over.
	approachEnd = 1e-3
)

// hasElastic reports whether a member that takes part is elastic.
func (v *Solver) hasElastic() bool {
	for m, l := range v.s.Law {
		if v.active[m] && l == canopy.LawElastic {
			return true
		}
	}
	return false
}

// tensionOf is the state of member m in st: by its law, or in the approach
// with the force of its own.
func (v *Solver) tensionOf(st *state, m int, length float64) element.Tension {
	if !v.approaching || v.s.Law[m] != canopy.LawElastic {
		return v.tension(m, length, st.force)
	}
	s := v.s
	t := element.Tension{Force: st.own[m]}
	if st.own[m] != 0 || length > s.Unstressed[m] || s.Kind[m].Pushes() {
		t.Stiffness = s.Stiffness[m] / s.Unstressed[m]
	}
	return t
}

// approach brings v.now near balance, or leaves it where it was. It returns the
// number of steps.
func (v *Solver) approach(ctx context.Context, set engine.Settings, start *canopy.Form, first int) (int, error) {
	s := v.s
	v.evaluate(&v.now)
	if v.now.collapse != none || v.now.merit < approachEnd || v.unknown == 0 {
		return first, nil
	}
	from := append([]r3.Vec(nil), v.now.at...)
	force := append([]float64(nil), v.now.force...)
	size := v.modelSize(from)
	for _, st := range []*state{&v.now, &v.trial} {
		if st.own == nil {
			st.own = make([]float64, len(s.Ends))
		}
	}
	// Forces to begin with: by law where that is a tension of a size that a
	// member may have, else those of the start, else the loads'.
	loads := 0.0
	for _, l := range s.Load {
		loads += norm(l)
	}
	for m, e := range s.Ends {
		if !v.active[m] || s.Law[m] != canopy.LawElastic {
			continue
		}
		_, l, _ := element.Line(from[e[0]], from[e[1]])
		if s.SelfWeight && s.Weight != nil {
			loads += s.Weight[m] * l
		}
	}
	for m, e := range s.Ends {
		if !v.active[m] || s.Law[m] != canopy.LawElastic {
			continue
		}
		_, l, _ := element.Line(from[e[0]], from[e[1]])
		t := v.tension(m, l, nil).Force
		if !s.Kind[m].Pushes() && !(t > 0 && t < 0.02*s.Stiffness[m]) {
			switch {
			case start != nil && len(start.Force) == len(s.Ends) && start.Force[m] > 0:
				t = start.Force[m]
			case t <= 0:
				t = loads
			}
			t = min(t, 0.02*s.Stiffness[m])
		}
		v.now.own[m] = t
	}
	v.approaching = true
	defer func() { v.approaching = false }()
	st := step{u: make([]float64, v.unknown), force: make([]float64, len(v.commons))}
	best, idle := math.Inf(1), 0
	for it := first; ; it++ {
		if err := ctx.Err(); err != nil {
			return it, err
		}
		v.evaluate(&v.now)
		misfit := math.Hypot(v.now.merit, v.misfit(&v.now))
		if misfit < 0.9*best {
			best, idle = misfit, 0
		} else if idle++; idle > approachIdle {
			break
		}
		if v.now.collapse != none || it-first == approachSteps || it >= set.MaxIterations {
			break
		}
		if misfit < approachEnd {
			return it, nil
		}
		set.Recorder.Record(engine.Row{Engine: Name, Stage: "approach", Iteration: it, Residual: misfit})
		if set.Progress != nil {
			set.Progress(engine.Step{Engine: Name, Stage: "approaching", Iteration: it, Residual: misfit, Target: set.Residual})
		}
		v.assemble(&v.now)
		v.columnsOf(&v.now)
		v.addMisfit(&v.now)
		if err := v.newtonStep(ctx, &v.now, &st); err != nil {
			return it, err
		}
		var err error
		if v.along, err = v.slide(ctx, &v.now, st.u); err != nil {
			return it, err
		}
		alpha := 1.0
		if move := v.largestMove(&v.now, st.u); move > 0.25*size {
			alpha = 0.25 * size / move
		}
		for alpha > shortest && !v.keepsShape(alpha, st.u) {
			alpha /= 2
		}
		if alpha <= shortest {
			break
		}
		v.moveTrial(alpha, st.u)
		for k := range st.force {
			v.trial.force[k] = v.now.force[k] + alpha*(st.force[k]-v.now.force[k])
		}
		v.ownForces(alpha, st.u)
		v.now, v.trial = v.trial, v.now
	}
	copy(v.now.at, from)
	copy(v.now.force, force)
	return first, nil
}

// misfit is ‖T by law − own T‖/‖own T‖ over elastic members.
func (v *Solver) misfit(st *state) float64 {
	up, down := 0.0, 0.0
	for m, e := range v.s.Ends {
		if !v.active[m] || v.s.Law[m] != canopy.LawElastic {
			continue
		}
		_, l, _ := element.Line(st.at[e[0]], st.at[e[1]])
		t := v.tension(m, l, nil).Force
		up += (t - st.own[m]) * (t - st.own[m])
		down += st.own[m] * st.own[m]
	}
	return ratio(math.Sqrt(up), math.Sqrt(down))
}

// addMisfit adds to the reduced pulls what closing the misfit of lengths and
// forces brings: the pull of EA(L − L₀)/L₀ − T in each active member.
func (v *Solver) addMisfit(st *state) {
	s := v.s
	for m, e := range s.Ends {
		if !v.active[m] || s.Law[m] != canopy.LawElastic {
			continue
		}
		t, l, ok := element.Line(st.at[e[0]], st.at[e[1]])
		if !ok {
			continue
		}
		k := v.tensionOf(st, m, l).Stiffness
		d := k*(l-s.Unstressed[m]) - st.own[m]
		if k == 0 {
			continue
		}
		for side, i := range e {
			if v.first[i] < 0 {
				continue
			}
			for a, b := range st.basis[v.start[i]:v.start[i+1]] {
				x := d * r3.Dot(t, b)
				if side == 1 {
					x = -x
				}
				st.reduced[int(v.first[i])+a] += x
			}
		}
	}
}

// ownForces gives the trial the own forces after alpha of the step u.
func (v *Solver) ownForces(alpha float64, u []float64) {
	s := v.s
	now := &v.now
	moveOf := func(i int32) r3.Vec {
		var d r3.Vec
		if v.first[i] >= 0 {
			for a, b := range now.basis[v.start[i]:v.start[i+1]] {
				d = r3.Add(d, r3.Scale(u[int(v.first[i])+a], b))
			}
		}
		return d
	}
	for m, e := range s.Ends {
		if !v.active[m] || s.Law[m] != canopy.LawElastic {
			continue
		}
		t, l, _ := element.Line(now.at[e[0]], now.at[e[1]])
		l += r3.Dot(t, r3.Sub(moveOf(e[1]), moveOf(e[0])))
		to := s.Stiffness[m] * (l - s.Unstressed[m]) / s.Unstressed[m]
		if !s.Kind[m].Pushes() {
			to = max(to, 0)
		}
		v.trial.own[m] = now.own[m] + alpha*(to-now.own[m])
	}
}
