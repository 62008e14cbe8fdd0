package relax_test

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// linearStart is the shape of uniform force densities (Schek 1974), which
// forgets the places that the free nodes started from, followed by a number of
// updates of natural force densities (Pauletti & Pimenta 2008). Tests use it
// instead of the solver of force densities so that nothing is shared with it:
// conjugate gradients on the graph.
func linearStart(s *canopy.Structure, updates int) *canopy.Form {
	f := canopy.NewForm(s)
	for u := 0; u <= updates; u++ {
		naturalUpdate(s, f, u > 0)
	}
	return f
}

// naturalUpdate solves for the places of all free nodes with the force
// densities that the wanted stresses and forces have on the shape of f, or with
// the same for all sides of triangles.
func naturalUpdate(s *canopy.Structure, f *canopy.Form, natural bool) {
	mean := 0.0
	for _, st := range s.Stress {
		mean += (st[0] + st[1]) / 2
	}
	if len(s.Stress) > 0 {
		mean /= float64(len(s.Stress))
	}
	var ends [][2]int32
	var q []float64
	add := func(a, b int32, w float64) {
		ends, q = append(ends, [2]int32{a, b}), append(q, w)
	}
	for _, c := range s.Corners {
		x := [3]r3.Vec{f.Position[c[0]], f.Position[c[1]], f.Position[c[2]]}
		twice := r3.Norm(r3.Cross(r3.Sub(x[1], x[0]), r3.Sub(x[2], x[0])))
		for k := range 3 {
			i, j := (k+1)%3, (k+2)%3
			w := mean / 2
			if natural {
				w = mean * r3.Dot(r3.Sub(x[i], x[k]), r3.Sub(x[j], x[k])) / (2 * twice)
			}
			add(c[i], c[j], w)
		}
	}
	for k, e := range s.Ends {
		l := r3.Norm(r3.Sub(f.Position[e[0]], f.Position[e[1]]))
		w := s.Given[k]
		switch {
		case s.Law[k] == canopy.LawElastic:
			w = s.Stiffness[k] / 100 / l
		case s.Law[k] != canopy.LawForceDensity:
			if w == 0 {
				w = 10 * mean
			}
			w /= l
		}
		add(e[0], e[1], w)
	}
	for d := range 3 {
		solveLinear(s, f.Position, ends, q, d)
	}
}

// solveLinear solves direction d of a net of force densities in place.
func solveLinear(s *canopy.Structure, x []r3.Vec, ends [][2]int32, q []float64, d int) {
	n := len(x)
	get := func(v r3.Vec) float64 { return [3]float64{v.X, v.Y, v.Z}[d] }
	lead := make([]int, n) // whose displacement a node has
	for i := range lead {
		lead[i] = i
		switch {
		case s.FixedAt(i).Has(d):
			lead[i] = -1
		case s.MasterOf(i) >= 0:
			lead[i] = int(s.MasterOf(i))
			if s.FixedAt(lead[i]).Has(d) {
				lead[i] = -1
			}
		}
	}
	move := func(u []float64, i int32) float64 {
		if lead[i] < 0 {
			return 0
		}
		return u[lead[i]]
	}
	diag := make([]float64, n)
	apply := func(u, out []float64) {
		clear(out)
		for k, e := range ends {
			g := q[k] * (move(u, e[0]) - move(u, e[1]))
			if lead[e[0]] >= 0 {
				out[lead[e[0]]] += g
			}
			if lead[e[1]] >= 0 {
				out[lead[e[1]]] -= g
			}
		}
	}
	r := make([]float64, n)
	for i := range x {
		if lead[i] >= 0 {
			r[lead[i]] += get(s.LoadAt(i))
		}
	}
	for k, e := range ends {
		g := q[k] * (get(x[e[1]]) - get(x[e[0]]))
		if lead[e[0]] >= 0 {
			r[lead[e[0]]] += g
			diag[lead[e[0]]] += math.Abs(q[k])
		}
		if lead[e[1]] >= 0 {
			r[lead[e[1]]] -= g
			diag[lead[e[1]]] += math.Abs(q[k])
		}
	}
	u, p, ap, z := make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
	dot := func(a, b []float64) (s float64) {
		for i := range a {
			s += a[i] * b[i]
		}
		return s
	}
	rz, first := 0.0, 0.0
	for it := range 5000 {
		for i := range z {
			z[i] = 0
			if diag[i] > 0 {
				z[i] = r[i] / diag[i]
			}
		}
		next := dot(r, z)
		if it == 0 {
			first = next
		}
		if next <= 1e-24*first || next == 0 {
			break
		}
		for i := range p {
			b := 0.0
			if it > 0 {
				b = next / rz
			}
			p[i] = z[i] + b*p[i]
		}
		rz = next
		apply(p, ap)
		a := rz / dot(p, ap)
		for i := range u {
			u[i] += a * p[i]
			r[i] -= a * ap[i]
		}
	}
	for i := range x {
		v := move(u, int32(i))
		switch d {
		case 0:
			x[i].X += v
		case 1:
			x[i].Y += v
		case 2:
			x[i].Z += v
		}
	}
}
