package mesh

import (
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// How a new node in the middle of a side is placed on the surface found on the
// coarse mesh, not on its chords: what the chords leave out of balance along the
// normals is as much as all curvature, and a first step would only repair that.

// Prolong carries a form found on the coarse mesh to the fine one, as a start:
// positions of new nodes on the surface between their parents (on their curves
// where they are fixed, at their offsets from the centre on rigid rings), forces,
// stresses and warp of what they are part of. Reactions are left zero.
func (r *Refinement) Prolong(form *canopy.Form) *canopy.Form {
	f := canopy.NewForm(r.Fine)
	bow := r.bows(form.Position)
	normal, known := r.normals(form.Position)
	for i, p := range r.Parents {
		x := form.Position[p[0]]
		if p[0] != p[1] {
			a, b := x, form.Position[p[1]]
			x = mid(a, b)
			d, along := bow[int32(i)]
			if !along {
				d = rise(r3.Sub(b, a), normal[p[0]], normal[p[1]], known[p[0]], known[p[1]])
			}
			if r3.Norm2(d) < steepest*steepest*r3.Norm2(r3.Sub(b, a)) {
				x = r3.Add(x, d)
			}
		}
		// What is fixed stays where the structure has it.
		f.Position[i] = pick(r.Fine.FixedAt(i), r.Fine.Position[i], x)
	}
	for i := range f.Position {
		if m := r.Fine.MasterOf(i); m >= 0 {
			x := r3.Add(f.Position[m], r3.Sub(r.Fine.Position[i], r.Fine.Position[m]))
			f.Position[i] = pick(r.Fine.FixedAt(i), r.Fine.Position[i], x)
		}
	}
	for i, k := range r.MemberOf {
		f.Force[i] = form.Force[k]
	}
	copy(f.Pressure, form.Pressure)
	for i, t := range r.TriangleOf {
		f.Stress[i], f.Warp[i] = form.Stress[t], form.Warp[t]
	}
	return f
}

// steepest is the most that a new node is put beside the middle of its side, as
// a share of that: more is a fold, of which a chord is the better guess.
const steepest = 0.2

// rise is how far a curve over the side d between nodes with the given unit
// normals lies from the middle of the side: of the cubic with the tangents that
// the normals leave (as in curved triangles by point and normal; Vlachos and
// others 2001), or of the parabola where one normal is known only.
func rise(d, a, b r3.Vec, knowA, knowB bool) r3.Vec {
	switch {
	case knowA && knowB:
		return r3.Scale(0.125, r3.Sub(r3.Scale(r3.Dot(d, b), b), r3.Scale(r3.Dot(d, a), a)))
	case knowA:
		return r3.Scale(-0.25*r3.Dot(d, a), a)
	case knowB:
		return r3.Scale(0.25*r3.Dot(d, b), b)
	}
	return r3.Vec{}
}

// normals are unit normals at the coarse nodes, and where they are known: not on
// edges, seams and cables, where the triangles around a node do not surround it or
// may make a fold. The weights are right on spheres (Max, J. Graphics Tools 4
// (1999)).
func (r *Refinement) normals(at []r3.Vec) ([]r3.Vec, []bool) {
	s := r.coarse
	normal := make([]r3.Vec, len(at))
	for _, c := range s.Corners {
		e := [3]r3.Vec{r3.Sub(at[c[2]], at[c[1]]), r3.Sub(at[c[0]], at[c[2]]), r3.Sub(at[c[1]], at[c[0]])}
		n := r3.Cross(e[1], e[2])
		l := [3]float64{r3.Norm2(e[0]), r3.Norm2(e[1]), r3.Norm2(e[2])}
		for k, i := range c {
			if w := l[(k+1)%3] * l[(k+2)%3]; w > 0 {
				normal[i] = r3.Add(normal[i], r3.Scale(1/w, n))
			}
		}
	}
	known := make([]bool, len(at))
	for i := range at {
		if l := r3.Norm(normal[i]); l > 0 {
			normal[i] = r3.Scale(1/l, normal[i])
			known[i] = s.FixedAt(i) == 0 && s.MasterOf(i) < 0
		}
	}
	for _, e := range s.Ends {
		known[e[0]], known[e[1]] = false, false
	}
	for _, p := range r.folds {
		known[p[0]], known[p[1]] = false, false
	}
	return normal, known
}

// bows are how far new nodes of cables lie from the middle of their chord, across
// it: on the cubic through the four nodes around, or the parabola at an end.
func (r *Refinement) bows(at []r3.Vec) map[int32]r3.Vec {
	out := map[int32]r3.Vec{}
	for c := range r.coarse.Cables {
		old, fine := r.coarse.Cables[c].Nodes, r.Fine.Cables[c].Nodes
		if len(old) < 3 || len(fine) != 2*len(old)-1 {
			continue
		}
		for j := 1; j < len(old); j++ {
			p, q := at[old[j-1]], at[old[j]]
			var d r3.Vec
			switch {
			case j > 1 && j+1 < len(old):
				d = r3.Scale(1./16, r3.Sub(r3.Add(p, q), r3.Add(at[old[j-2]], at[old[j+1]])))
			case j > 1:
				d = r3.Scale(1./8, r3.Sub(r3.Scale(2, p), r3.Add(at[old[j-2]], q)))
			default:
				d = r3.Scale(1./8, r3.Sub(r3.Scale(2, q), r3.Add(p, at[old[j+1]])))
			}
			if chord := r3.Sub(q, p); r3.Norm2(chord) > 0 {
				d = r3.Sub(d, r3.Scale(r3.Dot(d, chord)/r3.Norm2(chord), chord))
			}
			out[fine[2*j-1]] = d
		}
	}
	return out
}
