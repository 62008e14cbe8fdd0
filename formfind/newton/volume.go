package newton

import (
	"context"
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/element"
	"anticlast/formfind/engine"
)

// pocket is an enclosure whose pressure p is one more common unknown, beside
// the forces of cables. Its condition is
//
//	wanted − V(x) = 0 (m³)
//
// and pressure does work on volume: the derivative of the pulls by p is that of
// V by the nodes, so that the bordered system is symmetric. A bubble past the
// hemisphere has one direction in which it would run away at constant pressure;
// at constant volume it has none, and the inertia of the bordered system says
// so (Nocedal & Wright 2006, theorem 16.3).
type pocket struct {
	index     int     // into Structure.Enclosures
	wanted    float64 // m³; the enclosure's, or on the way to it
	triangles []int32
	side      []float64 // +1 where the triangle's positive side looks out
	base      int32
}

// addPockets makes an unknown pressure of every enclosure.
func (v *Solver) addPockets() {
	s := v.s
	v.pocketOn = make([]int32, len(s.Fabrics))
	v.sideOn = make([]float64, len(s.Fabrics))
	for f := range v.pocketOn {
		v.pocketOn[f] = -1
	}
	for i := range s.Enclosures {
		e := &s.Enclosures[i]
		k := int32(len(v.commons))
		for j, f := range e.Fabrics {
			v.pocketOn[f], v.sideOn[f] = k, float64(e.Side[j])
		}
		v.commons = append(v.commons, common{cable: -1, pocket: &pocket{index: i, base: e.Base}})
	}
	for t, f := range s.FabricOf {
		if k := v.pocketOn[f]; k >= 0 {
			p := v.commons[k].pocket
			p.triangles = append(p.triangles, int32(t))
			p.side = append(p.side, v.sideOn[f])
		}
	}
}

// wantVolumes takes the volumes wanted from the structure.
func (v *Solver) wantVolumes() {
	for k := range v.commons {
		if p := v.commons[k].pocket; p != nil {
			p.wanted = v.s.Enclosures[p.index].Volume
		}
	}
}

// pressureOn is the pressure on the positive side of fabric f, Pa.
func (v *Solver) pressureOn(st *state, f int32) float64 {
	if k := v.pocketOn[f]; k >= 0 {
		return v.sideOn[f] * st.force[k]
	}
	return v.s.Fabrics[f].Pressure
}

// volume returns what the pocket encloses, m³, and its area.
func (v *Solver) volume(p *pocket, at []r3.Vec) (volume, area float64) {
	o := at[p.base]
	for j, t := range p.triangles {
		c := v.s.Corners[t]
		a, b, d := r3.Sub(at[c[0]], o), r3.Sub(at[c[1]], o), r3.Sub(at[c[2]], o)
		n := r3.Cross(r3.Sub(b, a), r3.Sub(d, a))
		volume += p.side[j] * r3.Dot(a, n)
		area += norm(n)
	}
	return volume / 6, area / 2
}

// leastVolume is the share of area^1.5 below which a volume wanted is judged by
// that share instead of by itself.
const leastVolume = 1e-5

// volumeCondition is the state of the condition of pocket p at st.
func (v *Solver) volumeCondition(p *pocket, st *state) condition {
	volume, area := v.volume(p, st.at)
	return condition{gap: p.wanted - volume, scale: max(math.Abs(p.wanted), leastVolume*area*math.Sqrt(area))}
}

// pocketColumn adds the derivative of the reduced pulls by the pressure of
// common k to v.columns.
func (v *Solver) pocketColumn(st *state, k int) {
	m := len(v.commons)
	p := v.commons[k].pocket
	for j, t := range p.triangles {
		c := v.s.Corners[t]
		tri, ok := element.NewTriangle(st.at[c[0]], st.at[c[1]], st.at[c[2]])
		if !ok {
			continue
		}
		push := tri.PressurePush(p.side[j])
		for _, i := range c {
			if v.first[i] < 0 {
				continue
			}
			for a, b := range st.basis[v.start[i]:v.start[i+1]] {
				v.columns[(int(v.first[i])+a)*m+k] += r3.Dot(push, b)
			}
		}
	}
}

// stuck names a pocket whose volume nothing can change, "" when there is none.
func (v *Solver) stuck(at []r3.Vec) string {
	for k := range v.commons {
		p := v.commons[k].pocket
		if p == nil {
			continue
		}
		free := false
		for _, t := range p.triangles {
			for _, i := range v.s.Corners[t] {
				free = free || v.first[i] >= 0
			}
		}
		if !free {
			volume, _ := v.volume(p, at)
			return fmt.Sprintf("fabric %s is to enclose %.6g m³, but all of its nodes are fixed where they enclose %.6g m³", v.s.Enclosures[p.index].Name, p.wanted, volume)
		}
	}
	return ""
}

// takeForces gives the trial the common forces after alpha of the step:
// pressures in proportion, since they belong to the shape they were found
// with, cable forces at once.
func (v *Solver) takeForces(alpha float64, st *step) {
	for k, f := range st.force {
		if v.commons[k].pocket != nil {
			f = v.now.force[k] + alpha*(f-v.now.force[k])
		}
		v.trial.force[k] = f
	}
}

// On the way to a volume: the first step as a share of area^1.5 (a hemisphere
// holds 0.13 of it), how near each shape on the way must come to balance, and
// the share of the way below which a step is given up.
const (
	volumeStep  = 0.04
	volumeRough = 1e-3
	volumeLeast = 1.0 / 4096
	volumeTries = 12 // iterations for a step
)

// inflate brings v.now from the volumes it encloses near the ones wanted, in
// steps, each in balance with its own pressure. From a flat start the tangent
// is a shallow dish's; a deep one has to be approached. It leaves alone what is
// near already, and returns the iterations done.
func (v *Solver) inflate(ctx context.Context, set engine.Settings, first int) (iterations int, why string, err error) {
	var pockets []*pocket
	for k := range v.commons {
		if p := v.commons[k].pocket; p != nil {
			pockets = append(pockets, p)
		}
	}
	if len(pockets) == 0 || v.unknown == 0 {
		return first, "", nil
	}
	from, to := make([]float64, len(pockets)), make([]float64, len(pockets))
	for i, p := range pockets {
		from[i], _ = v.volume(p, v.now.at)
		to[i] = p.wanted
	}
	defer v.wantVolumes()
	reach := func() float64 {
		dt := math.Inf(1)
		for i, p := range pockets {
			if d := math.Abs(to[i] - from[i]); d > 0 {
				_, area := v.volume(p, v.now.at)
				dt = min(dt, volumeStep*area*math.Sqrt(area)/d)
			}
		}
		return dt
	}
	rough := set
	rough.Residual, rough.Worst, rough.Move = max(set.Residual, volumeRough), max(set.Worst, 10*volumeRough), max(set.Move, volumeRough)
	at := make([]r3.Vec, len(v.now.at))
	force := make([]float64, len(v.now.force))
	for t, dt := 0.0, reach(); ; {
		if t+dt >= 1 {
			return first, "", nil // the ordinary iteration takes the rest
		}
		for i, p := range pockets {
			p.wanted = from[i] + (t+dt)*(to[i]-from[i])
		}
		copy(at, v.now.at)
		copy(force, v.now.force)
		rough.MaxIterations = first + volumeTries
		out, err := v.iterate(ctx, rough, first)
		if err != nil {
			return first, "", err
		}
		first = max(first, out.Iterations)
		if out.Status == engine.Converged {
			t += dt
			dt = min(2*dt, reach())
			continue
		}
		copy(v.now.at, at)
		copy(v.now.force, force)
		v.evaluate(&v.now)
		if dt /= 2; dt < volumeLeast {
			p := pockets[0]
			return first, fmt.Sprintf("fabric %s was inflated up to %.4g m³ of the %.4g m³ that it is to enclose, and no further: %s",
				v.s.Enclosures[p.index].Name, from[0]+t*(to[0]-from[0]), to[0], out.Why), nil
		}
	}
}

// pressures fills in the pressures of the form.
func (v *Solver) pressures(st *state, f *canopy.Form) {
	for k := range v.commons {
		if p := v.commons[k].pocket; p != nil {
			f.Pressure[p.index] = st.force[k]
		}
	}
}
