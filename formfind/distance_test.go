package formfind_test

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/surface"
)

// apart is how far two surfaces lie from each other along their normals: of some 400
// nodes of a the distance to b, less what the chords of b's triangles explain. A
// triangle with circumradius R lies up to R²κ/2 below a surface of curvature κ, 4/3 of
// the sagitta of its sides when equilateral; the sagitta of a side e is e|Δn|/8 with Δn
// the difference of the normals at its ends. Where b ends before a does, at cables
// divided otherwise, only the part along the normal counts. all is the same with the
// chords left in.
func apart(a, b *canopy.Result) (beyond, all float64) {
	normalA := surface.VertexNormals(a.Form.Position, a.Structure.Corners)
	normalB := surface.VertexNormals(b.Form.Position, b.Structure.Corners)
	used := make([]bool, len(a.Form.Position))
	for _, c := range a.Structure.Corners {
		for _, i := range c {
			used[i] = true
		}
	}
	every := max(1, len(used)/400)
	for i := 0; i < len(used); i += every {
		if !used[i] {
			continue
		}
		p := a.Form.Position[i]
		least, at := math.Inf(1), 0
		var off r3.Vec
		for t, c := range b.Structure.Corners {
			q := closest(p, b.Form.Position[c[0]], b.Form.Position[c[1]], b.Form.Position[c[2]])
			if d := r3.Norm2(r3.Sub(q, p)); d < least {
				least, at, off = d, t, r3.Sub(q, p)
			}
		}
		sag := 0.0
		c := b.Structure.Corners[at]
		for k := range 3 {
			u, v := c[k], c[(k+1)%3]
			e := r3.Norm(r3.Sub(b.Form.Position[v], b.Form.Position[u]))
			sag = math.Max(sag, e*r3.Norm(r3.Sub(normalB[v], normalB[u]))/8)
		}
		d := math.Abs(r3.Dot(off, normalA[i]))
		beyond, all = math.Max(beyond, d-4*sag/3), math.Max(all, d)
	}
	return beyond, all
}

// closest is the point of triangle abc nearest to p: by the regions of its corners,
// sides and inside (Ericson, Real-Time Collision Detection, 2005, section 5.1.5).
func closest(p, a, b, c r3.Vec) r3.Vec {
	ab, ac, ap := r3.Sub(b, a), r3.Sub(c, a), r3.Sub(p, a)
	d1, d2 := r3.Dot(ab, ap), r3.Dot(ac, ap)
	if d1 <= 0 && d2 <= 0 {
		return a
	}
	bp := r3.Sub(p, b)
	d3, d4 := r3.Dot(ab, bp), r3.Dot(ac, bp)
	if d3 >= 0 && d4 <= d3 {
		return b
	}
	if vc := d1*d4 - d3*d2; vc <= 0 && d1 >= 0 && d3 <= 0 {
		return r3.Add(a, r3.Scale(d1/(d1-d3), ab))
	}
	cp := r3.Sub(p, c)
	d5, d6 := r3.Dot(ab, cp), r3.Dot(ac, cp)
	if d6 >= 0 && d5 <= d6 {
		return c
	}
	if vb := d5*d2 - d1*d6; vb <= 0 && d2 >= 0 && d6 <= 0 {
		return r3.Add(a, r3.Scale(d2/(d2-d6), ac))
	}
	va := d3*d6 - d5*d4
	if va <= 0 && d4 >= d3 && d5 >= d6 {
		return r3.Add(b, r3.Scale((d4-d3)/((d4-d3)+(d5-d6)), r3.Sub(c, b)))
	}
	vb, vc := d5*d2-d1*d6, d1*d4-d3*d2
	s := 1 / (va + vb + vc)
	return r3.Add(a, r3.Add(r3.Scale(vb*s, ab), r3.Scale(vc*s, ac)))
}
