package newton

import (
	"context"
	"errors"
	"fmt"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/fdm/sparse"
	"anticlast/formfind/canopy"
	"anticlast/formfind/element"
)

// spread carries the moves of some nodes over to others, so that a mesh
// follows what moves in it instead of being crushed: each unknown node moves
// by the weighted mean of its neighbours' moves (a discrete harmonic
// extension).
type spread struct {
	unknown  []int32 // by node, −1 where the move is given
	count    int
	edges    [][2]int32
	analysis *sparse.Analysis
	factor   *sparse.Factor
	values   []float64
	inner    []int32 // edges between two unknowns
	rim      []int32 // edges between an unknown and a given node
	x        []float64
	weights  []float64
}

// newSpread prepares a spread over the edges; unknown says which nodes follow.
func newSpread(ctx context.Context, n int, edges [][2]int32, unknown func(i int32) bool) (*spread, error) {
	p := &spread{unknown: make([]int32, n), edges: edges}
	for i := range p.unknown {
		p.unknown[i] = -1
		if unknown(int32(i)) {
			p.unknown[i] = int32(p.count)
			p.count++
		}
	}
	var pairs [][2]int32
	for k, e := range edges {
		if i, j := p.unknown[e[0]], p.unknown[e[1]]; i >= 0 && j >= 0 {
			pairs = append(pairs, [2]int32{i, j})
			p.inner = append(p.inner, int32(k))
		} else if i >= 0 || j >= 0 {
			p.rim = append(p.rim, int32(k))
		}
	}
	var err error
	if p.analysis, err = sparse.Analyze(ctx, p.count, pairs, sparse.Options{}); err != nil {
		return nil, fmt.Errorf("newton: %w", err)
	}
	if p.factor, err = p.analysis.NewFactor(sparse.Cholesky); err != nil {
		return nil, fmt.Errorf("newton: %w", err)
	}
	p.values = make([]float64, p.count+len(pairs))
	p.x = make([]float64, 3*p.count)
	return p, nil
}

// weigh sets the positive weights of the edges; nil means 1 each.
func (p *spread) weigh(ctx context.Context, w []float64) error {
	p.weights = w
	for i := range p.values {
		p.values[i] = 0
	}
	sum := 0.0
	for k, e := range p.edges {
		f := p.weight(k)
		sum += f
		for _, i := range e {
			if u := p.unknown[i]; u >= 0 {
				p.values[u] += f
			}
		}
	}
	for q, k := range p.inner {
		p.values[p.count+q] = -p.weight(int(k))
	}
	// A trace of anchorage, for parts that touch nothing that moves.
	trace := 1e-9 * sum / float64(max(len(p.edges), 1))
	for u := range p.count {
		p.values[u] += trace
		if p.values[u] == trace {
			p.values[u] = 1
		}
	}
	return p.factor.Refactor(ctx, p.values)
}

func (p *spread) weight(k int) float64 {
	if p.weights == nil {
		return 1
	}
	return p.weights[k]
}

// solve replaces the moves of the unknown nodes in move.
func (p *spread) solve(move []r3.Vec) error {
	for i := range p.x {
		p.x[i] = 0
	}
	for _, k := range p.rim {
		e, f := p.edges[k], p.weight(int(k))
		for side := range 2 {
			u := p.unknown[e[side]]
			o := e[1-side]
			if u < 0 {
				continue
			}
			p.x[3*u] += f * move[o].X
			p.x[3*u+1] += f * move[o].Y
			p.x[3*u+2] += f * move[o].Z
		}
	}
	if err := p.factor.Solve(p.x, 3); err != nil {
		return fmt.Errorf("newton: %w", err)
	}
	for i, u := range p.unknown {
		if u >= 0 {
			move[i] = r3.Vec{X: p.x[3*u], Y: p.x[3*u+1], Z: p.x[3*u+2]}
		}
	}
	return nil
}

// meshEdges are the distinct edges of triangles, and the members that take
// part, each once.
func (v *Solver) meshEdges() [][2]int32 {
	var out [][2]int32
	for _, c := range v.s.Corners {
		for k := range 3 {
			i, j := c[k], c[(k+1)%3]
			out = append(out, [2]int32{min(i, j), max(i, j)})
		}
	}
	for m, e := range v.s.Ends {
		if v.active[m] {
			out = append(out, [2]int32{min(e[0], e[1]), max(e[0], e[1])})
		}
	}
	slices.SortFunc(out, func(a, b [2]int32) int {
		if a[0] != b[0] {
			return int(a[0]) - int(b[0])
		}
		return int(a[1]) - int(b[1])
	})
	return slices.Compact(out)
}

// indexEdges returns the number in edges of each triangle's edge k, at
// 3·triangle + k, and then of each member.
func (v *Solver) indexEdges(edges [][2]int32) []int32 {
	find := func(i, j int32) int32 {
		k, _ := slices.BinarySearchFunc(edges, [2]int32{min(i, j), max(i, j)}, func(a, b [2]int32) int {
			if a[0] != b[0] {
				return int(a[0]) - int(b[0])
			}
			return int(a[1]) - int(b[1])
		})
		return int32(k)
	}
	out := make([]int32, 0, 3*len(v.s.Corners)+len(v.s.Ends))
	for _, c := range v.s.Corners {
		out = append(out, find(c[1], c[2]), find(c[2], c[0]), find(c[0], c[1]))
	}
	for _, e := range v.s.Ends {
		out = append(out, find(e[0], e[1]))
	}
	return out
}

// slide computes, for a Newton step u, how the nodes inside the fabric follow
// in its plane what the edges do: v.along by node. It is nil for a step small
// against the mesh. Sliding does not change the energy to first order, so that
// the step keeps its quality.
func (v *Solver) slide(ctx context.Context, st *state, u []float64) ([]r3.Vec, error) {
	move := v.slideWork
	most := 0.0
	for i := range st.at {
		move[i] = r3.Vec{}
		if v.first[i] < 0 || v.cls[i] == normal {
			continue
		}
		var d r3.Vec
		for a, b := range st.basis[v.start[i]:v.start[i+1]] {
			d = r3.Add(d, r3.Scale(u[int(v.first[i])+a], b))
		}
		move[i] = d
		if v.filmAt[i] {
			most = max(most, norm(d))
		}
	}
	if len(v.s.Corners) == 0 || most < 0.02*v.meshSize {
		return nil, nil
	}
	if v.inside == nil {
		p, err := newSpread(ctx, len(st.at), v.meshEdges(), func(i int32) bool { return v.cls[i] == normal })
		if err != nil {
			return nil, err
		}
		if err := p.weigh(ctx, nil); err != nil {
			return nil, fmt.Errorf("newton: %w", err)
		}
		v.inside = p
	}
	if err := v.inside.solve(move); err != nil {
		return nil, err
	}
	for i := range move {
		if v.cls[i] != normal {
			move[i] = r3.Vec{}
			continue
		}
		b := st.basis[v.start[i]]
		d := mask(v.s.FixedAt(i), move[i])
		move[i] = r3.Sub(d, r3.Scale(r3.Dot(d, b), b))
	}
	return move, nil
}

// carry moves the free nodes of from along with supports that have moved since
// (to has the supports' new places), as a net of the forces at from would.
func (v *Solver) carry(ctx context.Context, start *canopy.Form, to []r3.Vec) error {
	s := v.s
	from := start.Position
	move := make([]r3.Vec, len(to))
	most := 0.0
	for i := range to {
		move[i] = r3.Sub(to[i], from[i])
		most = max(most, r3.Norm2(move[i]))
	}
	if most == 0 {
		return nil
	}
	if v.everywhere == nil {
		p, err := newSpread(ctx, len(to), v.meshEdges(), func(i int32) bool {
			return s.FixedAt(int(i)) == 0 && s.MasterOf(int(i)) < 0
		})
		if err != nil {
			return err
		}
		v.everywhere = p
		v.edgeOf = v.indexEdges(p.edges)
		v.carryWeights = make([]float64, len(p.edges))
	}
	p := v.everywhere
	w := v.carryWeights
	for k := range w {
		w[k] = 0
	}
	sum := 0.0
	for t, c := range s.Corners {
		tri, ok := element.NewTriangle(from[c[0]], from[c[1]], from[c[2]])
		if !ok {
			return nil
		}
		for k := range 3 {
			// Half the cotangent of the angle at corner k weighs edge k; kept
			// positive so that the mean stays a mean.
			q := -0.25 * r3.Dot(tri.Edge[(k+1)%3], tri.Edge[(k+2)%3]) / tri.Area
			q = s.Stress[t][0] * max(q, 0.05)
			w[v.edgeOf[3*t+k]] += q
			sum += q
		}
	}
	for m, e := range s.Ends {
		if !v.active[m] {
			continue
		}
		_, l, ok := element.Line(from[e[0]], from[e[1]])
		if !ok {
			return nil
		}
		var f float64
		if len(start.Force) == len(s.Ends) && start.Force[m] != 0 {
			f = start.Force[m]
		} else if v.comOf[m] < 0 {
			f = v.tension(m, l, nil).Force
		}
		if f < 0 {
			f = -f
		}
		w[v.edgeOf[3*len(s.Corners)+m]] += f / l
		sum += f / l
	}
	for k := range w {
		w[k] = max(w[k], 1e-6*sum/float64(len(w)))
	}
	if err := p.weigh(ctx, w); err != nil {
		var pe *sparse.PivotError
		if errors.As(err, &pe) {
			return nil
		}
		return fmt.Errorf("newton: %w", err)
	}
	if err := p.solve(move); err != nil {
		return err
	}
	for i, u := range p.unknown {
		if u >= 0 {
			to[i] = r3.Add(from[i], move[i])
		}
	}
	v.follow(to)
	return nil
}
