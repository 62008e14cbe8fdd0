package formfind

import (
	"context"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/newton"
	"anticlast/formfind/surface"
)

// Nodes inside fabric move along its normals only. Where the shape rises from a flat
// start into a neck or a peak, few triangles cover most of it, drawn out along the
// slope, and every refinement inherits that. So on the coarsest of several meshes the
// nodes are slid in the surface found until its sides have the proportions they were
// drawn with again: each to the mean of its neighbours, weighed by one over the length
// drawn (springs in balance), as far as that lies in the tangent plane. Seen on a cone
// of weft:warp 1:2 near its limit, 768 triangles: smallest angle 24° for 8°, estimated
// 3e-4 of the size off the smooth surface for 2e-3.

// evenSweeps is how often every node slides: some times the nodes across a coarsest mesh.
const evenSweeps = 60

const (
	// drawnOut is the smallest angle (rad) below which a form is slid: meshes better
	// than that are left as they were drawn, since regular ones are the more accurate
	// point by point (cones of 3:1 on graded rows: order 2 as drawn, 1.1 slid).
	drawnOut = 10 * math.Pi / 180
	// worthIt is by how much the angle must grow.
	worthIt = 1.25
)

// even returns the form with its nodes slid so and brought back to balance, or f where
// that does not go well.
func even(ctx context.Context, s *canopy.Structure, f *canopy.Form, set engine.Settings) (*canopy.Form, error) {
	if smallestAngle(f.Position, s.Corners) > drawnOut {
		return f, nil
	}
	slid := *f
	slid.Position = slide(s, f.Position)
	if smallestAngle(slid.Position, s.Corners) < worthIt*smallestAngle(f.Position, s.Corners) {
		return f, nil
	}
	g, out, err := newton.Engine{}.Find(ctx, s, &slid, set)
	switch {
	case err != nil && ctx.Err() != nil:
		return nil, err
	case err != nil || out.Status != engine.Converged || out.NegativePivots != 0 || unreal(s, g):
		return f, nil
	}
	return g, nil
}

func slide(s *canopy.Structure, at []r3.Vec) []r3.Vec {
	x := append([]r3.Vec(nil), at...)
	inside := make([]bool, len(x))
	for _, c := range s.Corners {
		for _, i := range c {
			inside[i] = s.FixedAt(int(i)) == 0 && s.MasterOf(int(i)) < 0
		}
	}
	for _, e := range s.Ends {
		inside[e[0]], inside[e[1]] = false, false
	}
	for range evenSweeps {
		mean := make([]r3.Vec, len(x))
		total := make([]float64, len(x))
		for _, c := range s.Corners {
			for k := range 3 {
				// Sides inside count twice, once from each triangle.
				i, j := c[k], c[(k+1)%3]
				l := r3.Norm(r3.Sub(s.Position[j], s.Position[i]))
				if l == 0 {
					continue
				}
				mean[i] = r3.Add(mean[i], r3.Scale(1/l, x[j]))
				mean[j] = r3.Add(mean[j], r3.Scale(1/l, x[i]))
				total[i] += 1 / l
				total[j] += 1 / l
			}
		}
		normal := surface.VertexNormals(x, s.Corners)
		for i := range x {
			if !inside[i] || total[i] == 0 {
				continue
			}
			d := r3.Sub(r3.Scale(1/total[i], mean[i]), x[i])
			x[i] = r3.Add(x[i], r3.Scale(0.8, r3.Sub(d, r3.Scale(r3.Dot(d, normal[i]), normal[i]))))
		}
	}
	return x
}
