package formfind

import (
	"context"
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/relax"
	"anticlast/formfind/surface"
)

// agreement is how closely two engines must agree, over the size of the model.
const agreement = 1e-6

// crossCheck has relaxation find the shape again and compares. It returns an
// empty string when the engines agree, what disagrees otherwise.
//
// Cable nets: relaxation from disturbed nodes must end at the same nodes.
// Fabric: the force densities and reference stresses found are frozen, all free
// nodes are disturbed, and relaxation must return to the same nodes. With equal
// prestress the surface is also found anew by relaxation in the shape-changing
// directions, from a surface disturbed along its normals, and compared along
// them, since nodes may slide in it.
func crossCheck(ctx context.Context, s *canopy.Structure, found found, o Options) (string, error) {
	f := found.form
	set := engine.Settings{Progress: o.Progress, Recorder: o.Recorder, AllDirections: true}
	size := s.Size()
	second := func(e *relax.Engine, start *canopy.Form, set engine.Settings) (*canopy.Form, engine.Outcome, error) {
		g, out, err := e.Find(ctx, s, start, set)
		if err != nil {
			return nil, out, fmt.Errorf("cross-check: %w", err)
		}
		return g, out, nil
	}
	f.Engines = appendNew(f.Engines, relax.New().Name())
	if len(s.Corners) == 0 {
		g, out, err := second(&relax.Engine{}, relax.Disturb(s, f, 1, 0.01*size), set)
		if err != nil {
			return "", err
		}
		return verdict(f, out, largestMove(f.Position, g.Position)/size, "the net from disturbed nodes"), nil
	}
	if found.surface != nil && equalStress(s) {
		smooth := found.surface
		normals := surface.VertexNormals(smooth.Position, s.Corners)
		start := alongNormals(smooth, relax.Disturb(s, smooth, 2, 3e-4*size), shapeNormals(s, smooth, normals))
		set := set
		set.AllDirections = false
		g, out, err := second(&relax.Engine{}, start, set)
		if err != nil {
			return "", err
		}
		apart := 0.0
		for i, n := range normals {
			apart = math.Max(apart, math.Abs(r3.Dot(n, r3.Sub(g.Position[i], smooth.Position[i]))))
		}
		if bad := verdict(f, out, apart/size, "the surface from a disturbed one"); bad != "" {
			return bad, nil
		}
	}
	g, out, err := second(relax.Frozen(f), relax.Disturb(s, f, 1, 0.01*size), set)
	if err != nil {
		return "", err
	}
	return verdict(f, out, largestMove(f.Position, g.Position)/size, "the tension field from disturbed nodes"), nil
}

// alongNormals keeps only the part of a disturbance that changes the surface.
func alongNormals(f, disturbed *canopy.Form, normals []r3.Vec) *canopy.Form {
	out := *disturbed
	out.Position = append([]r3.Vec(nil), disturbed.Position...)
	for i, n := range normals {
		if n != (r3.Vec{}) {
			d := r3.Dot(n, r3.Sub(disturbed.Position[i], f.Position[i]))
			out.Position[i] = r3.Add(f.Position[i], r3.Scale(d, n))
		}
	}
	return &out
}

// shapeNormals are the normals of nodes, for nodes on cables made square to the
// cable: along it a node may slide, and would not come back from there.
func shapeNormals(s *canopy.Structure, f *canopy.Form, normals []r3.Vec) []r3.Vec {
	out := append([]r3.Vec(nil), normals...)
	for _, c := range s.Cables {
		for j := 1; j < len(c.Nodes)-1; j++ {
			along := r3.Sub(f.Position[c.Nodes[j+1]], f.Position[c.Nodes[j-1]])
			if l := r3.Norm(along); l > 0 {
				n := &out[c.Nodes[j]]
				*n = r3.Sub(*n, r3.Scale(r3.Dot(*n, along)/l/l, along))
			}
		}
	}
	return out
}

func verdict(f *canopy.Form, out engine.Outcome, apart float64, what string) string {
	if out.Status != engine.Converged {
		return fmt.Sprintf("cross-check: relaxation of %s %s: %s", what, out.Status, out.Why)
	}
	if apart > agreement {
		return fmt.Sprintf("cross-check: relaxation of %s ended %.1e of the size away, more than %.0e", what, apart, agreement)
	}
	f.Steps = append(f.Steps, fmt.Sprintf("cross-check: dynamic relaxation of %s agrees to %.1e of the size", what, apart))
	return ""
}

func largestMove(a, b []r3.Vec) float64 {
	m := 0.0
	for i := range a {
		m = math.Max(m, r3.Norm(r3.Sub(a[i], b[i])))
	}
	return m
}

func appendNew(list []string, name string) []string {
	for _, l := range list {
		if l == name {
			return list
		}
	}
	return append(list, name)
}
