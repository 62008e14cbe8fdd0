package formfind

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/load"
)

// nodalForces returns the sum of all forces on each node, internal and
// external, supports left out, and the sum of their sizes. Forces on tied
// nodes stay on those nodes.
func nodalForces(s *canopy.Structure, f *canopy.Form) (sum []r3.Vec, size []float64) {
	sum = load.Nodal(s.Carrying(f), f.Position)
	size = make([]float64, len(sum))
	for i := range sum {
		size[i] = length(sum[i])
	}
	add := func(i int32, v r3.Vec) {
		sum[i] = r3.Add(sum[i], v)
		size[i] += length(v)
	}
	for k, e := range s.Ends {
		if f.Force[k] == 0 {
			continue
		}
		d := r3.Sub(f.Position[e[1]], f.Position[e[0]])
		l := length(d)
		if l == 0 {
			continue
		}
		d = r3.Scale(f.Force[k]/l, d)
		add(e[0], d)
		add(e[1], r3.Scale(-1, d))
	}
	for t, c := range s.Corners {
		g := trianglePulls(f.Position[c[0]], f.Position[c[1]], f.Position[c[2]], f.Warp[t], f.Stress[t])
		for a, i := range c {
			add(i, g[a])
		}
	}
	return sum, size
}

// length is r3.Norm without its guard against overflow, which costs several times
// as much.
func length(v r3.Vec) float64 { return math.Sqrt(v.X*v.X + v.Y*v.Y + v.Z*v.Z) }

// trianglePulls returns the forces by which a triangle of uniform true stress
// pulls its corners, −½ σ(n × e) with e the opposite edge counter-clockwise.
func trianglePulls(a, b, c, warp r3.Vec, st canopy.Stress) [3]r3.Vec {
	n := r3.Cross(r3.Sub(b, a), r3.Sub(c, a))
	l := length(n)
	if l == 0 {
		return [3]r3.Vec{}
	}
	edges := [3]r3.Vec{r3.Sub(c, b), r3.Sub(a, c), r3.Sub(b, a)}
	var out [3]r3.Vec
	if st.Shear == 0 && st.Warp == st.Weft { // the same in all directions
		n = r3.Scale(-0.5*st.Warp/l, n)
		for i, e := range edges {
			out[i] = r3.Cross(n, e)
		}
		return out
	}
	n = r3.Scale(1/l, n)
	weft := r3.Cross(n, warp)
	for i, e := range edges {
		in := r3.Cross(n, e) // points from the edge to the corner, |in| = |e|
		w, v := r3.Dot(in, warp), r3.Dot(in, weft)
		out[i] = r3.Scale(-0.5, r3.Add(
			r3.Scale(st.Warp*w+st.Shear*v, warp),
			r3.Scale(st.Shear*w+st.Weft*v, weft)))
	}
	return out
}

// setReactions fills f.Reaction and f.Couple so that supports balance what the
// form carries. Held directions get no reaction.
func setReactions(s *canopy.Structure, f *canopy.Form) {
	sum, _ := nodalForces(s, f)
	clear(f.Reaction)
	total := gather(s, sum)
	for i, fixed := range s.Fixed {
		if fixed == 0 {
			continue
		}
		f.Reaction[i] = r3.Scale(-1, only(total[i], fixed))
	}
	for r := range s.Rings {
		f.Couple[r] = r3.Vec{}
		rg := &s.Rings[r]
		if !rg.Rigid || rg.Centre < 0 || s.Master == nil {
			continue
		}
		var m r3.Vec
		for _, i := range rg.Nodes {
			if s.Master[i] == rg.Centre {
				tied := only(sum[i], canopy.DirAll&^s.Fixed[i])
				m = r3.Add(m, r3.Cross(r3.Sub(f.Position[i], f.Position[rg.Centre]), tied))
			}
		}
		f.Couple[r] = r3.Scale(-1, m)
	}
}

// gather returns nodal sums with what acts on tied nodes moved to their
// masters in the directions in which they are tied.
func gather(s *canopy.Structure, sum []r3.Vec) []r3.Vec {
	if s.Master == nil {
		return sum
	}
	out := append([]r3.Vec(nil), sum...)
	for i, m := range s.Master {
		if m < 0 {
			continue
		}
		tied := canopy.DirAll &^ s.Fixed[i]
		out[m] = r3.Add(out[m], only(sum[i], tied))
		out[i] = only(sum[i], s.Fixed[i])
	}
	return out
}

// only returns v with the components outside d set to zero.
func only(v r3.Vec, d canopy.Freedom) r3.Vec {
	if !d.Has(0) {
		v.X = 0
	}
	if !d.Has(1) {
		v.Y = 0
	}
	if !d.Has(2) {
		v.Z = 0
	}
	return v
}

func component(v r3.Vec, d int) float64 {
	switch d {
	case 0:
		return v.X
	case 1:
		return v.Y
	}
	return v.Z
}

func finiteForm(f *canopy.Form) bool {
	s := 0.0
	for _, p := range f.Position {
		s += p.X + p.Y + p.Z
	}
	for _, t := range f.Force {
		s += t
	}
	for _, t := range f.Stress {
		s += t.Warp + t.Weft + t.Shear
	}
	return !math.IsNaN(s) && !math.IsInf(s, 0)
}
