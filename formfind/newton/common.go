package newton

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/element"
)

// common is a cable whose members share one unknown force T, and the condition
// that decides it:
//
//	sag:     d − Value·chord = 0, d the largest distance of a node from the chord
//	length:  ΣL − Value = 0
//	elastic: ΣL − L₀(1 + T/EA) = 0, or T = 0 when slack
//
// all in m. The last two make the bordered system symmetric.
type common struct {
	cable  int32
	pocket *pocket // air of given volume instead of a cable, whose pressure is the unknown; nil for a cable
}

// condition is the state of a common's condition at one shape.
type condition struct {
	gap   float64 // m
	scale float64 // m, makes the gap a ratio
	slack bool    // elastic and too long for its place
	far   int32   // sag: the node farthest from the chord
}

func (v *Solver) cableOf(k int) *canopy.Cable { return &v.s.Cables[v.commons[k].cable] }

// pushes reports whether the common force may be negative.
func (v *Solver) pushes(k int) bool { return v.commons[k].pocket != nil || v.cableOf(k).Kind.Pushes() }

// conditions computes the gaps of st and, for elastic cables, who is slack.
func (v *Solver) conditions(st *state) {
	for k := range v.commons {
		cm := &st.cond[k]
		if p := v.commons[k].pocket; p != nil {
			*cm = v.volumeCondition(p, st)
			continue
		}
		cb := v.cableOf(k)
		switch cb.Law {
		case canopy.CableSag:
			a, b := st.at[cb.Nodes[0]], st.at[cb.Nodes[len(cb.Nodes)-1]]
			_, chord, _ := element.Line(a, b)
			d, far := 0.0, cb.Nodes[0]
			for _, i := range cb.Nodes {
				if w := norm(offChord(a, b, st.at[i])); w > d {
					d, far = w, i
				}
			}
			cm.far, cm.scale = far, chord
			cm.gap = d - cb.Value*chord
		case canopy.CableLength:
			cm.scale = cb.Value
			cm.gap = v.lengthOf(k, st.at) - cb.Value
		case canopy.CableElastic:
			cm.scale = cb.Unstressed
			l := v.lengthOf(k, st.at)
			cm.slack = l < cb.Unstressed && !v.pushes(k) && st.force[k] <= 0
			if cm.slack {
				st.force[k] = 0
				cm.gap = 0
			} else {
				cm.gap = l - cb.Unstressed*(1+st.force[k]/cb.Stiffness)
			}
		}
		if !(cm.scale > 0) {
			cm.scale = 1
		}
	}
}

func (v *Solver) lengthOf(k int, at []r3.Vec) float64 {
	sum := 0.0
	for _, m := range v.cableOf(k).Members {
		_, l, _ := element.Line(at[v.s.Ends[m][0]], at[v.s.Ends[m][1]])
		sum += l
	}
	return sum
}

// offChord is the shortest vector from the line through a and b to p.
func offChord(a, b, p r3.Vec) r3.Vec {
	t, _, ok := element.Line(a, b)
	if !ok {
		return r3.Vec{}
	}
	w := r3.Sub(p, a)
	return r3.Sub(w, r3.Scale(r3.Dot(w, t), t))
}

// columnsOf fills v.columns, unknown × commons row by row, with the derivative
// of the reduced pulls by each common force.
func (v *Solver) columnsOf(st *state) {
	m := len(v.commons)
	for i := range v.columns {
		v.columns[i] = 0
	}
	for k := range v.commons {
		if v.commons[k].pocket != nil {
			v.pocketColumn(st, k)
			continue
		}
		for _, e := range v.cableOf(k).Members {
			if v.comOf[e] != int32(k) {
				continue
			}
			ends := v.s.Ends[e]
			t, _, ok := element.Line(st.at[ends[0]], st.at[ends[1]])
			if !ok {
				continue
			}
			for side, i := range ends {
				if v.first[i] < 0 {
					continue
				}
				for a, b := range st.basis[v.start[i]:v.start[i+1]] {
					x := v.shareOf(int(e)) * r3.Dot(t, b)
					if side == 1 {
						x = -x
					}
					v.columns[(int(v.first[i])+a)*m+k] += x
				}
			}
		}
	}
}

// conditionRow calls f with the derivative of the gap of common k by the
// unknowns, entry by entry; an unknown may come more than once.
func (v *Solver) conditionRow(st *state, k int, f func(unknown int, x float64)) {
	cm := &st.cond[k]
	if v.commons[k].pocket != nil || v.cableOf(k).Law != canopy.CableSag {
		if cm.slack {
			return
		}
		m := len(v.commons)
		for i := range v.unknown {
			if x := v.columns[i*m+k]; x != 0 {
				f(i, -x)
			}
		}
		return
	}
	cb := v.cableOf(k)
	na, nb := cb.Nodes[0], cb.Nodes[len(cb.Nodes)-1]
	a, b := st.at[na], st.at[nb]
	t, chord, ok := element.Line(a, b)
	w := offChord(a, b, st.at[cm.far])
	d := norm(w)
	if !ok || d == 0 {
		return
	}
	w = r3.Scale(1/d, w)
	lambda := r3.Dot(r3.Sub(st.at[cm.far], a), t) / chord
	for _, n := range []struct {
		i int32
		g r3.Vec
	}{
		{cm.far, w},
		{na, r3.Add(r3.Scale(lambda-1, w), r3.Scale(cb.Value, t))},
		{nb, r3.Sub(r3.Scale(-lambda, w), r3.Scale(cb.Value, t))},
	} {
		if v.first[n.i] < 0 {
			continue
		}
		for c, e := range st.basis[v.start[n.i]:v.start[n.i+1]] {
			f(int(v.first[n.i])+c, r3.Dot(e, n.g))
		}
	}
}

// conditionSlope is the derivative of the gap of common k by its own force.
func (v *Solver) conditionSlope(st *state, k int) float64 {
	if v.commons[k].pocket != nil {
		return 0
	}
	cb := v.cableOf(k)
	if cb.Law != canopy.CableElastic {
		return 0
	}
	if st.cond[k].slack {
		return 1
	}
	return -cb.Unstressed / cb.Stiffness
}

// symmetric reports whether common k makes the bordered system symmetric.
func (v *Solver) symmetric(st *state, k int) bool {
	return v.commons[k].pocket != nil || v.cableOf(k).Law != canopy.CableSag && !st.cond[k].slack
}

// impossible names a condition that no shape can meet, "" when there is none.
func (v *Solver) impossible(at []r3.Vec) string {
	if why := v.stuck(at); why != "" {
		return why
	}
	for k := range v.commons {
		if v.commons[k].pocket != nil {
			continue
		}
		cb := v.cableOf(k)
		na, nb := cb.Nodes[0], cb.Nodes[len(cb.Nodes)-1]
		if v.first[na] >= 0 || v.first[nb] >= 0 {
			continue
		}
		chord := norm(r3.Sub(at[nb], at[na]))
		switch {
		case cb.Law == canopy.CableLength && cb.Value < chord*(1-1e-12):
			return fmt.Sprintf("cable %s is to be %.6g m long, but its ends are %.6g m apart", cb.Name, cb.Value, chord)
		case cb.Law == canopy.CableLength && len(cb.Members) == 1:
			return fmt.Sprintf("cable %s is to be %.6g m long, but both its ends are fixed", cb.Name, cb.Value)
		case cb.Law == canopy.CableSag && len(cb.Members) == 1:
			return fmt.Sprintf("cable %s is to sag but has no node between its ends", cb.Name)
		case cb.Law == canopy.CableSag && !(cb.Value > 0):
			return fmt.Sprintf("cable %s is to have a sag of %g; only an endless force makes it straight", cb.Name, cb.Value)
		}
	}
	return ""
}

// startForces chooses the first common forces: those of the start, else the
// given guess, else the force that balances the cable's neighbours best at the
// starting shape.
func (v *Solver) startForces(start *canopy.Form) {
	if len(v.commons) == 0 {
		return
	}
	st := &v.now
	guess := make([]bool, len(v.commons))
	for k := range v.commons {
		st.force[k] = 0
		if v.commons[k].pocket != nil {
			continue // the pressure that balances the start best
		}
		for _, m := range v.cableOf(k).Members {
			if v.comOf[m] != int32(k) {
				continue
			}
			f := v.s.Given[m]
			if start != nil && len(start.Force) == len(v.s.Ends) && start.Force[m] != 0 {
				f = start.Force[m]
			}
			if f > 0 || (f < 0 && v.pushes(k)) {
				st.force[k], guess[k] = f, true
			}
			break
		}
	}
	v.evaluate(st)
	v.columnsOf(st)
	m := len(v.commons)
	for k := range v.commons {
		if guess[k] {
			continue
		}
		up, down := 0.0, 0.0
		for i := range v.unknown {
			c := v.columns[i*m+k]
			up -= c * st.reduced[i]
			down += c * c
		}
		t := 0.0
		if down > 0 {
			t = up / down
		}
		if !(t > 0) && !v.pushes(k) {
			t = v.fallbackForce(k, st.at)
		}
		st.force[k] = t
	}
	v.firstForce = append(v.firstForce[:0], st.force...)
}

// fallbackForce is a tension of the right size for common k: the mean fabric
// stress times the chord, or that of the other members.
func (v *Solver) fallbackForce(k int, at []r3.Vec) float64 {
	sum := 0.0
	if n := len(v.s.Stress); n > 0 {
		for _, p := range v.s.Stress {
			sum += p[0]
		}
		cb := v.cableOf(k)
		return sum / float64(n) * norm(r3.Sub(at[cb.Nodes[len(cb.Nodes)-1]], at[cb.Nodes[0]]))
	}
	for m := range v.s.Ends {
		if v.active[m] && v.comOf[m] < 0 {
			_, l, _ := element.Line(at[v.s.Ends[m][0]], at[v.s.Ends[m][1]])
			sum = max(sum, math.Abs(v.tension(m, l, nil).Force))
		}
	}
	if sum == 0 {
		sum = 1
	}
	return sum
}
