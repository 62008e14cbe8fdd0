package formfind

import (
	"context"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// enclosed is the volume that the fabrics of e enclose at x, m³.
func enclosed(s *canopy.Structure, e *canopy.Enclosure, x []r3.Vec) float64 {
	side := make(map[int32]float64, len(e.Fabrics))
	for k, f := range e.Fabrics {
		side[f] = float64(e.Side[k])
	}
	o := x[e.Base]
	sum := 0.0
	for t, c := range s.Corners {
		w, ok := side[s.FabricOf[t]]
		if !ok {
			continue
		}
		a, b, d := r3.Sub(x[c[0]], o), r3.Sub(x[c[1]], o), r3.Sub(x[c[2]], o)
		sum += w * r3.Dot(a, r3.Cross(b, d))
	}
	return sum / 6
}

// maxPasses bounds the passes of followLoads.
const maxPasses = 200

// followLoads finds where a structure is at rest under loads that depend on the
// shape, weights and pressures, and the pressures of its air at which it encloses
// the volumes that are wanted.
//
// solve returns where the structure rests under given loads, loadsAt the loads
// of a shape with given pressures. Both together make a fixed-point iteration,
// x ← solve(loads(x, p)), which alone would run away from a deep bubble: there
// a larger one is pushed by more than its tension grows. Pressures follow the
// volumes by a fixed linear response, and what is left is mixed over the last
// iterations (Anderson 1965): solve is a smoothing operator, so that few
// directions matter.
//
// It returns the pressures that belong to the last call of solve.
func followLoads(ctx context.Context, s *canopy.Structure, x []r3.Vec, p []float64,
	loadsAt func(x []r3.Vec, p []float64) []r3.Vec,
	solve func(loads []r3.Vec) ([]r3.Vec, error),
) ([]float64, error) {
	m := len(s.Enclosures)
	volumes := func(x []r3.Vec) []float64 {
		v := make([]float64, m)
		for i := range v {
			v[i] = enclosed(s, &s.Enclosures[i], x)
		}
		return v
	}
	size := s.Size()
	unit := pressureUnit(s, size)
	var inverse mat.Dense
	if m > 0 { // how pressures answer to volumes
		at, err := solve(loadsAt(x, p))
		if err != nil {
			return nil, err
		}
		v0 := volumes(at)
		response := mat.NewDense(m, m, nil)
		for j := range p {
			d := 1e-3 * max(math.Abs(p[j]), unit)
			q := append([]float64(nil), p...)
			q[j] += d
			y, err := solve(loadsAt(x, q))
			if err != nil {
				return nil, err
			}
			for i, v := range volumes(y) {
				response.Set(i, j, (v-v0[i])/d)
			}
		}
		if err := inverse.Inverse(response); err != nil {
			return nil, fmt.Errorf("the pressure of a volume cannot be found: nothing in the shape answers to it")
		}
	}
	n := len(x)
	toMetres := size / unit // pressures as lengths, for mixing
	z := make([]float64, 3*n+m)
	pack := func(z []float64, x []r3.Vec, p []float64) {
		for i, v := range x {
			z[3*i], z[3*i+1], z[3*i+2] = v.X, v.Y, v.Z
		}
		for j, v := range p {
			z[3*n+j] = v * toMetres
		}
	}
	unpack := func(z []float64, x []r3.Vec, p []float64) {
		for i := range x {
			x[i] = r3.Vec{X: z[3*i], Y: z[3*i+1], Z: z[3*i+2]}
		}
		for j := range p {
			p[j] = z[3*n+j] / toMetres
		}
	}
	x, p = append([]r3.Vec(nil), x...), append([]float64(nil), p...)
	pack(z, x, p)
	g := make([]float64, len(z))
	to := make([]float64, m)
	var mix mixer
	best, since := math.Inf(1), 0
	for pass := 1; ; pass++ {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		at, err := solve(loadsAt(x, p))
		if err != nil {
			return nil, err
		}
		off := 0.0
		copy(to, p)
		for i, v := range volumes(at) {
			gap := s.Enclosures[i].Volume - v
			off = max(off, math.Abs(gap)/(size*size*size))
			for j := range to {
				to[j] += inverse.At(j, i) * gap
			}
		}
		for i := range at {
			off = max(off, r3.Norm(r3.Sub(at[i], x[i]))/size)
		}
		if off < 0.5*best {
			best, since = off, 0
		} else {
			since++
		}
		if off <= 1e-13 || since >= 6 && off <= 1e-11 || pass >= maxPasses || math.IsNaN(off) {
			return p, nil
		}
		pack(g, at, to)
		mix.step(z, g)
		unpack(z, x, p)
	}
}

// pressureUnit is the size of pressures that matter to a structure, Pa.
func pressureUnit(s *canopy.Structure, size float64) float64 {
	sum := 0.0
	for _, st := range s.Stress {
		sum += st[0] + st[1]
	}
	if len(s.Stress) == 0 || size == 0 {
		return 1
	}
	return max(sum/float64(2*len(s.Stress))/size, math.SmallestNonzeroFloat64)
}
