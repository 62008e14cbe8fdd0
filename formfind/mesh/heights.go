package mesh

import (
	"math"
	"slices"
)

// heights returns the height over the plane of every point of r. Within a rim
// alone they follow from mean value coordinates (Floater 2003; Hormann and
// Floater 2006). With holes, lines or points inside, with very many points, or
// where mean values would lead out of the range of the rim (an outline that is
// not convex), each inner height is the mean of its neighbours'.
func (f *flat) heights(r *refinement) []float64 {
	h := make([]float64, len(r.d.p))
	copy(h[3:], f.h)
	inner := len(r.d.p) - r.rim
	if len(f.chains)+len(f.points) > 0 || len(f.rims) > 1 || inner*len(f.p) > 2e7 {
		r.relaxHeights(h)
		return h
	}
	// Weights may be negative where the outline is not convex.
	lo, hi := slices.Min(f.h), slices.Max(f.h)
	for i := r.rim; i < len(r.d.p); i++ {
		h[i] = f.meanValue(r.d.p[i])
		if r.used[i] && (h[i] < lo || h[i] > hi) {
			clear(h[r.rim:])
			r.relaxHeights(h)
			return h
		}
	}
	return h
}

// relaxHeights makes each height from r.rim on the mean of its neighbours', by
// conjugate gradients with a multilevel preconditioner, and returns how many steps
// that took.
func (r *refinement) relaxHeights(h []float64) (steps int) {
	n := len(h) - r.rim
	if n == 0 {
		return 0
	}
	start, near := r.neighbours()
	apply := func(out, x []float64) (dot float64) {
		for i := range n {
			s := float64(start[i+1]-start[i]) * x[i]
			for _, q := range near[start[i]:start[i+1]] {
				if int(q) >= r.rim {
					s -= x[int(q)-r.rim]
				}
			}
			out[i] = s
			dot += s * x[i]
		}
		return dot
	}
	x, res, dir, tmp := h[r.rim:], make([]float64, n), make([]float64, n), make([]float64, n)
	rr := 0.0
	for i := range n {
		for _, q := range near[start[i]:start[i+1]] {
			if int(q) < r.rim {
				res[i] += h[q]
			}
		}
		rr += res[i] * res[i]
	}
	// The preconditioned residual goes into tmp, which is free then.
	m := newMultilevel(r, start)
	rz := m.apply(tmp, res)
	copy(dir, tmp)
	for first := rr; steps < 20*int(math.Sqrt(float64(n)))+50 && rr > 1e-12*first; steps++ {
		alpha := rz / apply(tmp, dir)
		rr = 0
		for i := range n {
			x[i] += alpha * dir[i]
			res[i] -= alpha * tmp[i]
			rr += res[i] * res[i]
		}
		next := m.apply(tmp, res)
		for i := range n {
			dir[i] = tmp[i] + next/rz*dir[i]
		}
		rz = next
	}
	return steps
}

// neighbours lists the neighbours of the points from r.rim on: those of point
// r.rim+i are near[start[i]:start[i+1]].
func (r *refinement) neighbours() (start, near []int32) {
	n := len(r.d.p) - r.rim
	start = make([]int32, n+2)
	for t, in := range r.in {
		if in {
			for _, i := range r.d.v[t] {
				if int(i) >= r.rim {
					start[int(i)-r.rim+2]++
				}
			}
		}
	}
	for i := range n {
		start[i+2] += start[i+1]
	}
	near = make([]int32, start[n+1])
	for t, in := range r.in {
		if in {
			for k, i := range r.d.v[t] {
				// Around an inner point each neighbour follows it in one triangle.
				if int(i) >= r.rim {
					near[start[int(i)-r.rim+1]] = r.d.v[t][(k+1)%3]
					start[int(i)-r.rim+1]++
				}
			}
		}
	}
	return start[:n+1], near
}

// meanValue returns the height over q.
func (f *flat) meanValue(q xy) float64 {
	var sum, h float64
	for _, rim := range f.rims {
		n := len(rim)
		at := func(k int) (float64, float64, float64) {
			p := f.p[rim[k%n]]
			x, y := p.x-q.x, p.y-q.y
			return x, y, math.Hypot(x, y)
		}
		x0, y0, r0 := at(n - 1)
		x1, y1, r1 := at(0)
		t0 := halfTan(x0, y0, r0, x1, y1, r1)
		for k := range n {
			x2, y2, r2 := at(k + 1)
			if r1 == 0 {
				return f.h[rim[k]]
			}
			t1 := halfTan(x1, y1, r1, x2, y2, r2)
			w := (t0 + t1) / r1
			sum += w
			h += w * f.h[rim[k]]
			x1, y1, r1, t0 = x2, y2, r2, t1
		}
	}
	return h / sum
}

// halfTan returns the tangent of half the signed angle from one vector to
// another, given with their lengths.
func halfTan(x0, y0, r0, x1, y1, r1 float64) float64 {
	cross, dot := x0*y1-y0*x1, x0*x1+y0*y1
	if cross == 0 {
		return 0
	}
	return (r0*r1 - dot) / cross
}
