// Package cases builds structures with known answers, at any mesh size, for
// the tests and benchmarks of engines, audit and front door. Each function
// states where its numbers come from.
package cases

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// Case is a structure together with what is known about its answer.
type Case struct {
	Name   string
	Source string
	// S has a rough shape in Position, as a designer would give it; fixed
	// nodes are where they belong.
	S *canopy.Structure
	// Exact, where known, are places on the exact surface that suit the mesh
	// of S; an engine may find the nodes elsewhere on the surface.
	Exact []r3.Vec
	// Distance, where known, is the signed distance of a point near the
	// exact surface from it, to first order, m.
	Distance func(p r3.Vec) float64
	// Area of the exact surface, m²; 0 = not known.
	Area float64
}

// Form returns a form of the case's structure at the given positions.
func (c *Case) Form(at []r3.Vec) *canopy.Form {
	f := canopy.NewForm(c.S)
	copy(f.Position, at)
	return f
}

// Disturbed returns the positions at with all free nodes moved by up to size
// in each direction, by a fixed sequence of numbers: smooth waves over the
// structure plus, with rough > 0, independent moves of that size.
func (c *Case) Disturbed(at []r3.Vec, size, rough float64) []r3.Vec {
	out := append([]r3.Vec(nil), at...)
	lo, hi := canopy.Bounds(at)
	l := r3.Norm(r3.Sub(hi, lo))
	state := uint64(88172645463325252)
	next := func() float64 { // xorshift64, Marsaglia 2003
		state ^= state << 13
		state ^= state >> 7
		state ^= state << 17
		return float64(state>>11)/(1<<52) - 1
	}
	for i := range out {
		u := r3.Scale(2*math.Pi/l, r3.Sub(at[i], lo))
		d := [3]float64{
			size*math.Sin(1.3*u.X+0.7*u.Y+0.3) + rough*next(),
			size*math.Sin(0.9*u.Y-1.1*u.Z+1.9) + rough*next(),
			size*math.Cos(1.7*u.X+1.2*u.Y+0.8*u.Z) + rough*next(),
		}
		f := c.S.FixedAt(i)
		if c.S.MasterOf(i) >= 0 {
			f = canopy.DirAll
		}
		for k := range 3 {
			if f.Has(k) {
				d[k] = 0
			}
		}
		out[i] = r3.Add(out[i], r3.Vec{X: d[0], Y: d[1], Z: d[2]})
	}
	return out
}

// Area returns the sum of the triangle areas of s at the given positions, m².
func Area(s *canopy.Structure, at []r3.Vec) float64 {
	sum := 0.0
	for _, c := range s.Corners {
		sum += 0.5 * r3.Norm(r3.Cross(r3.Sub(at[c[1]], at[c[0]]), r3.Sub(at[c[2]], at[c[0]])))
	}
	return sum
}

// MinAngle returns the smallest angle of all triangles in rad.
func MinAngle(s *canopy.Structure, at []r3.Vec) float64 {
	least := math.Pi
	for _, c := range s.Corners {
		for k := range 3 {
			a := r3.Sub(at[c[(k+1)%3]], at[c[k]])
			b := r3.Sub(at[c[(k+2)%3]], at[c[k]])
			least = min(least, math.Atan2(r3.Norm(r3.Cross(a, b)), r3.Dot(a, b)))
		}
	}
	return least
}

// CableLength returns the length of cable c of s at the given positions, m.
func CableLength(s *canopy.Structure, c int, at []r3.Vec) float64 {
	sum := 0.0
	for _, m := range s.Cables[c].Members {
		e := s.Ends[m]
		sum += r3.Norm(r3.Sub(at[e[1]], at[e[0]]))
	}
	return sum
}

// CableSag returns the largest distance of a node of cable c from its chord
// over the chord.
func CableSag(s *canopy.Structure, c int, at []r3.Vec) float64 {
	n := s.Cables[c].Nodes
	a, b := at[n[0]], at[n[len(n)-1]]
	chord := r3.Norm(r3.Sub(b, a))
	most := 0.0
	for _, i := range n {
		most = max(most, r3.Norm(r3.Cross(r3.Sub(at[i], a), r3.Sub(b, a)))/chord)
	}
	return most / chord
}

// builder collects the flat arrays of a structure.
type builder struct{ s canopy.Structure }

func (b *builder) node(p r3.Vec, f canopy.Freedom) int32 {
	b.s.Position = append(b.s.Position, p)
	b.s.Fixed = append(b.s.Fixed, f)
	return int32(len(b.s.Position) - 1)
}

func (b *builder) triangle(i, j, k int32, fabric int32, warp r3.Vec, stress [2]float64) {
	b.s.Corners = append(b.s.Corners, [3]int32{i, j, k})
	b.s.FabricOf = append(b.s.FabricOf, fabric)
	b.s.Warp = append(b.s.Warp, warp)
	b.s.Stress = append(b.s.Stress, stress)
}

// member adds a member. Optional columns are filled for all members once one
// of them needs them.
func (b *builder) member(i, j int32, kind canopy.Kind, law canopy.Law, given float64) int32 {
	b.s.Ends = append(b.s.Ends, [2]int32{i, j})
	b.s.Kind = append(b.s.Kind, kind)
	b.s.Law = append(b.s.Law, law)
	b.s.Given = append(b.s.Given, given)
	b.s.CableOf = append(b.s.CableOf, -1)
	b.s.Stiffness = append(b.s.Stiffness, 0)
	b.s.Unstressed = append(b.s.Unstressed, 0)
	return int32(len(b.s.Ends) - 1)
}

func (b *builder) elastic(i, j int32, kind canopy.Kind, ea, unstressed float64) int32 {
	m := b.member(i, j, kind, canopy.LawElastic, 0)
	b.s.Stiffness[m], b.s.Unstressed[m] = ea, unstressed
	return m
}

// chain adds members along nodes, each of the given force, and the cable they
// make.
func (b *builder) chain(name string, nodes []int32, kind canopy.Kind, force float64) int {
	c := canopy.Cable{Name: name, Kind: kind, Nodes: append([]int32(nil), nodes...)}
	for k := 1; k < len(nodes); k++ {
		m := b.member(nodes[k-1], nodes[k], kind, canopy.LawForce, force)
		b.s.CableOf[m] = int32(len(b.s.Cables))
		c.Members = append(c.Members, m)
	}
	b.s.Cables = append(b.s.Cables, c)
	return len(b.s.Cables) - 1
}

// grid adds (nx+1)×(ny+1) nodes, or nx×(ny+1) when it closes around in the
// first direction, and two triangles per cell with diagonals that alternate
// like a chessboard. It returns the nodes, first direction fastest.
func (b *builder) grid(nx, ny int, closed bool, at func(u, v float64) r3.Vec, fixed func(i, j int) canopy.Freedom, warp func(centre r3.Vec) r3.Vec, stress [2]float64) (id func(i, j int) int32) {
	cols := nx + 1
	if closed {
		cols = nx
	}
	first := int32(len(b.s.Position))
	for j := range ny + 1 {
		for i := range cols {
			b.node(at(float64(i)/float64(nx), float64(j)/float64(ny)), fixed(i, j))
		}
	}
	id = func(i, j int) int32 { return first + int32(j*cols+i%cols) }
	fabric := int32(len(b.s.Fabrics))
	b.s.Fabrics = append(b.s.Fabrics, canopy.Fabric{Name: "fabric"})
	add := func(i, j, k int32) {
		c := r3.Scale(1.0/3, r3.Add(r3.Add(b.s.Position[i], b.s.Position[j]), b.s.Position[k]))
		b.triangle(i, j, k, fabric, warp(c), stress)
	}
	for j := range ny {
		for i := range nx {
			p, q, r, s := id(i, j), id(i+1, j), id(i+1, j+1), id(i, j+1)
			if (i+j)%2 == 0 {
				add(p, q, r)
				add(p, r, s)
			} else {
				add(p, q, s)
				add(q, r, s)
			}
		}
	}
	return id
}

// along returns a warp rule of one direction.
func along(d r3.Vec) func(r3.Vec) r3.Vec { return func(r3.Vec) r3.Vec { return d } }
