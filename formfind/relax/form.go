package relax

import (
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/element"
)

// startForces takes first guesses of common cable forces from a form.
func (p *problem) startForces(f *canopy.Form) {
	p.startPressures(f)
	for c := range p.cable {
		g := &p.cable[c]
		if g.law == canopy.CableElastic || len(f.Force) != len(p.s.Ends) {
			continue
		}
		t := f.Force[p.src[g.members[0]]]
		if t == 0 || t < 0 && !g.pushes {
			continue
		}
		g.base, g.force = t, t
		if g.law == canopy.CableLength {
			g.stiff = max(g.stiff, 100*max(t, -t)/g.rest)
		}
	}
}

// form reports the shape at x with the forces it carries; elements must be up
// to date. frozen is the form whose forces are carried, or nil.
func (st *state) form(frozen *canopy.Form) *canopy.Form {
	s := st.s
	f := canopy.NewForm(s)
	for i := range f.Position {
		p := r3.Add(st.x[i], st.origin)
		// What is held stays to the last bit where it was put.
		f.Position[i] = choose(canopy.DirAll&^s.FixedAt(i), p, s.Position[i])
	}
	for m, k := range st.src {
		e := st.ends[m]
		f.Force[k] = st.q[m] * norm(r3.Sub(st.x[e[1]], st.x[e[0]]))
	}
	for t := range st.corners {
		st.reportStress(t, f)
	}
	for k := range st.pocket {
		f.Pressure[st.pocket[k].index] = st.pocket[k].pressure
	}
	if frozen != nil {
		copy(f.Pressure, frozen.Pressure)
	}
	st.react(f)
	return f
}

func (st *state) reportStress(t int, f *canopy.Form) {
	c, k := st.corners[t], st.tri[t]
	x := [3]r3.Vec{st.x[c[0]], st.x[c[1]], st.x[c[2]]}
	switch st.triLaw[t] {
	case uniform, woven:
		f.Stress[k] = canopy.Stress{Warp: st.stress[t][0], Weft: st.stress[t][1]}
		g, ok := element.NewTriangle(x[0], x[1], x[2])
		if !ok {
			return
		}
		w, _, err := g.ProjectWarp(st.warpAt(t, x))
		if err != nil {
			// Equal stresses: any direction will do.
			w = unit(g.Edge[0])
		}
		f.Warp[k] = w
	default:
		ft := &st.fabric[t-st.uniforms]
		s := [3]float64{st.stress[t][0], st.stress[t][1]}
		if st.triLaw[t] == elastic {
			s, _ = st.fabricLaw[st.fabricOf[t]].Stress(s, ft.Strain(&x))
		} else {
			s[2] = st.shear[t]
		}
		w, n := ft.Cauchy(&x, s)
		f.Warp[k] = w
		f.Stress[k] = canopy.Stress{Warp: n[0], Weft: n[1], Shear: n[2]}
	}
}

// warpAt is the wanted warp direction of triangle t with its corners at x.
func (p *problem) warpAt(t int, x [3]r3.Vec) r3.Vec {
	return p.s.WarpAt(int(p.tri[t]), r3.Add(x[0], p.origin), r3.Add(x[1], p.origin), r3.Add(x[2], p.origin))
}

// react fills in reactions and the couples of rings.
func (st *state) react(f *canopy.Form) {
	s := st.s
	total := make([]r3.Vec, st.n)
	for i := range total {
		if s.Fixed[i] != 0 || st.tied[i] >= 0 {
			total[i], _ = st.nodal(i)
		}
	}
	couple := map[int32]r3.Vec{}
	for _, g := range st.ring {
		var m r3.Vec
		for _, i := range g.nodes {
			pass := masked(total[i], st.free[i])
			m = r3.Add(m, r3.Cross(r3.Sub(st.x[i], st.x[g.centre]), pass))
			total[g.centre] = r3.Add(total[g.centre], pass)
		}
		couple[g.centre] = r3.Scale(-1, m)
	}
	for i := range total {
		if d := s.Fixed[i]; d != 0 {
			f.Reaction[i] = masked(r3.Scale(-1, total[i]), d)
		}
	}
	for r := range s.Rings {
		if s.Rings[r].Rigid {
			f.Couple[r] = couple[s.Rings[r].Centre]
		}
	}
}
