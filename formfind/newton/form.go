package newton

import (
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/element"
)

// form makes the result of a state.
func (v *Solver) form(st *state) (*canopy.Form, error) {
	s := v.s
	f := canopy.NewForm(s)
	copy(f.Position, st.at)
	for m, e := range s.Ends {
		if !v.active[m] {
			continue
		}
		_, l, ok := element.Line(st.at[e[0]], st.at[e[1]])
		if ok {
			f.Force[m] = v.tension(m, l, st.force).Force
		}
	}
	v.pressures(st, f)
	v.overTriangles(func(block, lo, hi int) {
		part := &v.pieces[block]
		part.err = nil
		var tri element.Triangle
		for t := lo; t < hi; t++ {
			c := &s.Corners[t]
			f.Stress[t].Warp, f.Stress[t].Weft = v.stressOf(t)
			if !tri.Span(&st.at[c[0]], &st.at[c[1]], &st.at[c[2]]) {
				f.Warp[t] = s.Warp[t]
				continue
			}
			w, _, err := v.axes(st, t, &tri)
			if err != nil {
				part.err = v.warpError(t, err)
				return
			}
			f.Warp[t] = w
		}
	})
	for k := range (len(s.Corners) + patchSize - 1) / patchSize {
		if err := v.pieces[k].err; err != nil {
			return nil, err
		}
	}
	// What a support must add to the pulls in the directions it holds. A
	// tied node hands the rest to its centre.
	carried := make([]r3.Vec, len(st.at))
	copy(carried, st.pull)
	for i, m := range s.Master {
		if m >= 0 {
			p := mask(s.Fixed[i], st.pull[i])
			carried[m] = r3.Add(carried[m], p)
			carried[i] = r3.Sub(carried[i], p)
		}
	}
	for i := range f.Reaction {
		f.Reaction[i] = r3.Scale(-1, mask(canopy.DirAll&^s.Fixed[i], carried[i]))
	}
	for r := range s.Rings {
		rg := &s.Rings[r]
		if !rg.Rigid || rg.Centre < 0 {
			continue
		}
		for _, i := range rg.Nodes {
			if s.MasterOf(int(i)) != rg.Centre {
				continue
			}
			p := mask(s.Fixed[i], st.pull[i])
			f.Couple[r] = r3.Sub(f.Couple[r], r3.Cross(r3.Sub(st.at[i], st.at[rg.Centre]), p))
		}
	}
	return f, nil
}
