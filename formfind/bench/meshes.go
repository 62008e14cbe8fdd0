package main

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/mesh"
)

// A problem is a case on meshes from coarse to fine. Meshes are made before any
// clock starts, for every method alike; relaxation and L-BFGS see the finest one
// only, or an even one of the same size.
type problem struct {
	name   string
	coarse *canopy.Structure
	steps  []*mesh.Refinement
	fine   *canopy.Structure
	even   func() *canopy.Structure // as many triangles laid at once, node by node along rows
	area   float64                  // exact, m²; 0 when not known
}

// cells is how many cells a side the coarsest mesh has: some 250 triangles, as
// the front door would begin with.
const cells = 11

var surfaces = []struct {
	name string
	make func(n int) cases.Case // about 2n² triangles
	// onto puts a new node of a fixed edge where it belongs; nil where edges are
	// straight.
	onto func(p r3.Vec) r3.Vec
}{
	{"catenoid", func(n int) cases.Case { return cases.Catenoid(0.5, 2*n, n/2, true, 1000) }, func(p r3.Vec) r3.Vec {
		r := math.Hypot(p.X, p.Y)
		return r3.Vec{X: p.X / r, Y: p.Y / r, Z: p.Z}
	}},
	{"scherk", func(n int) cases.Case { return cases.Scherk(1, n, 1000) }, func(p r3.Vec) r3.Vec {
		p.Z = math.Log(math.Cos(p.Y) / math.Cos(p.X))
		return p
	}},
	{"schwarz-d", func(n int) cases.Case { return cases.SchwarzD(n, 1000) }, nil},
	{"canopy", func(n int) cases.Case { return cases.FourPoint(10, 3, 2500, 30e3, 0.1, n) }, nil},
}

// newProblem refines a case until it has about the given number of triangles.
func newProblem(k int, triangles int) (*problem, error) {
	c := surfaces[k].make(cells)
	p := &problem{name: surfaces[k].name, coarse: c.S, fine: c.S, area: c.Area}
	for len(p.fine.Corners)*2 < triangles {
		r, err := mesh.Refine(p.fine)
		if err != nil {
			return nil, fmt.Errorf("%s: %w", p.name, err)
		}
		if onto := surfaces[k].onto; onto != nil {
			for i := len(p.fine.Position); i < len(r.Fine.Position); i++ {
				if r.Fine.Fixed[i] != 0 {
					r.Fine.Position[i] = onto(r.Fine.Position[i])
				}
			}
		}
		p.steps, p.fine = append(p.steps, r), r.Fine
	}
	p.even = func() *canopy.Structure { return surfaces[k].make(cells << len(p.steps)).S }
	return p, nil
}
