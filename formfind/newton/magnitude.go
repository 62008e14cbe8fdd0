package newton

import (
	"context"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/fdm/sparse"
	"anticlast/formfind/canopy"
	"anticlast/formfind/element"
)

// Fabric of unequal warp and weft stress. Along the normal only the ratio of
// the two matters, so the surface can hold the ratio everywhere; in its plane a
// constant magnitude is in balance only by chance (a cone in balance with the
// hoop stress m times the meridian's has stresses that vary as r^(m−1)). What
// can be chosen there is a magnitude, a factor s that varies smoothly over each
// fabric with mean 1, and along a cable bonded to the fabric, which shears
// along it, a share of the cable's force that varies with mean 1. Both are
// fitted to the balance in all directions by least squares, with a light
// penalty on the gradient of s. Two equations and one unknown a node: what is
// left over is for the pass that balances in all directions to settle.

// magnitudes is the fitted field and what is kept to fit it again.
type magnitudes struct {
	corner   [][3]int32 // by triangle, unknowns of its corners, −1 where warp = weft
	share    []int32    // by member, unknown or −1
	unknowns int
	groups   [][]int32 // unknowns whose weighted mean is one: fabrics, then cables
	fabrics  int       // how many of the groups are fabrics

	// Rows of the system: the unknowns that act on each node.
	rows     []int32 // by node, start in column
	column   []int32
	rowOf    []int32 // nodes with rows
	analysis *sparse.Analysis
	factor   *sparse.Factor
	values   []float64
	slot     [][3]int32 // by triangle, the pairs of its corners
	rowPair  []int32    // by row node, first pair

	triangle []float64 // s by triangle
	member   []float64 // share by member
	last     []float64 // the last fit by unknown
}

const (
	// smoothness weighs the gradient of the magnitude against the balance, for a
	// triangle as large as all fabric of unequal stress; smaller ones by area,
	// so that a finer mesh comes nearer to balance. The bias on 300 triangles is
	// 0.01 of the law of cones of 1:3 (0.04 with 0.3).
	smoothness = 0.1
	// traceWeight holds what the balance says nothing about where it was.
	traceWeight = 1e-10
	// leastShare keeps fitted stresses in tension.
	leastShare = 1e-3
)

// isUneven reports whether triangle t has unequal stresses.
func isUneven(p [2]float64) bool {
	d := p[0] - p[1]
	if d < 0 {
		d = -d
	}
	return d > 1e-12*p[0]
}

// reset makes all magnitudes one.
func (g *magnitudes) reset() {
	for t := range g.triangle {
		g.triangle[t] = 1
	}
	for m := range g.member {
		g.member[m] = 1
	}
	for u := range g.last {
		g.last[u] = 1
	}
}

// sheared reports whether cables bonded to the fabric have a share of their own.
func (g *magnitudes) sheared() bool { return len(g.groups) > g.fabrics }

// resume takes the magnitudes of an earlier form of the same stresses; it leaves
// them at one where the form has others. Only with a fitted magnitude is the
// symmetric tangent that of the shape: with S in balance in the surface
// S:∇∇u = div(S∇u). With s = 1 it turns singular elsewhere, for cones well below
// their height limit, and no step leads on from a shape that is close to the next.
func (v *Solver) resume(start *canopy.Form) {
	s, g := v.s, v.magnitude
	v.resumed = false
	if g == nil || start == nil || len(start.Stress) != len(s.Stress) || len(start.Force) != len(s.Ends) {
		return
	}
	for t, p := range s.Stress {
		q := start.Stress[t]
		if !(q.Warp > leastShare*p[0]) || math.Abs(q.Warp*p[1]-q.Weft*p[0]) > 1e-9*q.Warp*p[1] || q.Shear != 0 {
			return
		}
	}
	nodal, count := make([]float64, g.unknowns), make([]float64, g.unknowns)
	for t, c := range g.corner {
		if c[0] < 0 {
			continue
		}
		g.triangle[t] = start.Stress[t].Warp / s.Stress[t][0]
		v.resumed = v.resumed || math.Abs(g.triangle[t]-1) > 1e-9
		for _, u := range c {
			nodal[u] += g.triangle[t]
			count[u]++
		}
	}
	for u, n := range count {
		if n > 0 {
			g.last[u] = nodal[u] / n
		}
	}
	for c := range s.Cables {
		force, length := 0.0, 0.0
		for _, m := range s.Cables[c].Members {
			if g.share[m] >= 0 {
				l := r3.Norm(r3.Sub(start.Position[s.Ends[m][1]], start.Position[s.Ends[m][0]]))
				force, length = force+start.Force[m]*l, length+l
			}
		}
		if !(force > 0) {
			continue
		}
		for _, m := range s.Cables[c].Members {
			if u := g.share[m]; u >= 0 {
				g.member[m] = max(start.Force[m]*length/force, leastShare)
				g.last[u] = g.member[m]
			}
		}
	}
}

// newMagnitudes numbers the unknowns and analyses the pattern.
func (v *Solver) newMagnitudes(ctx context.Context) (*magnitudes, error) {
	s := v.s
	n := len(s.Position)
	g := &magnitudes{corner: make([][3]int32, len(s.Corners)), share: make([]int32, len(s.Ends))}
	g.triangle = make([]float64, len(s.Corners))
	g.member = make([]float64, len(s.Ends))
	for m := range g.share {
		g.share[m] = -1
	}
	// One unknown for each node of each uneven fabric.
	fabricNode := make([]int32, n)
	for f := range s.Fabrics {
		for i := range fabricNode {
			fabricNode[i] = -1
		}
		var group []int32
		for t, c := range s.Corners {
			if int(s.FabricOf[t]) != f {
				continue
			}
			for k, i := range c {
				g.corner[t][k] = -1
				if !v.unevenFabric[f] {
					continue
				}
				if fabricNode[i] < 0 {
					fabricNode[i] = int32(g.unknowns)
					group = append(group, int32(g.unknowns))
					g.unknowns++
				}
				g.corner[t][k] = fabricNode[i]
			}
		}
		if len(group) > 0 {
			g.groups = append(g.groups, group)
			g.fabrics++
		}
	}
	// One for each member of a chain of given or common force bonded to it.
	touches := make([]bool, n)
	for t, c := range s.Corners {
		if g.corner[t][0] >= 0 {
			for _, i := range c {
				touches[i] = true
			}
		}
	}
	for c := range s.Cables {
		cb := &s.Cables[c]
		if len(cb.Members) < 2 || cb.Law == canopy.CableBalance {
			continue
		}
		var group []int32
		for _, m := range cb.Members {
			if (s.Law[m] == canopy.LawForce || s.Law[m] == canopy.LawCable) && touches[s.Ends[m][0]] && touches[s.Ends[m][1]] {
				g.share[m] = int32(g.unknowns)
				group = append(group, int32(g.unknowns))
				g.unknowns++
			}
		}
		if len(group) > 0 {
			g.groups = append(g.groups, group)
		}
	}
	// Rows.
	at := make([][]int32, n)
	for t, c := range s.Corners {
		if g.corner[t][0] < 0 {
			continue
		}
		for _, i := range c {
			at[i] = append(at[i], g.corner[t][:]...)
		}
	}
	for m, e := range s.Ends {
		if g.share[m] >= 0 {
			at[e[0]] = append(at[e[0]], g.share[m])
			at[e[1]] = append(at[e[1]], g.share[m])
		}
	}
	var pairs [][2]int32
	for i := range at {
		if len(at[i]) == 0 || s.FixedAt(i) == canopy.DirAll || s.MasterOf(i) >= 0 {
			continue
		}
		slices.Sort(at[i])
		at[i] = slices.Compact(at[i])
		g.rowOf = append(g.rowOf, int32(i))
		g.rows = append(g.rows, int32(len(g.column)))
		g.rowPair = append(g.rowPair, int32(len(pairs)))
		g.column = append(g.column, at[i]...)
		for a := range at[i] {
			for b := a + 1; b < len(at[i]); b++ {
				pairs = append(pairs, [2]int32{at[i][a], at[i][b]})
			}
		}
	}
	g.rows = append(g.rows, int32(len(g.column)))
	g.slot = make([][3]int32, len(s.Corners))
	for t := range s.Corners {
		if g.corner[t][0] < 0 {
			continue
		}
		for k := range 3 {
			g.slot[t][k] = int32(len(pairs))
			pairs = append(pairs, [2]int32{g.corner[t][k], g.corner[t][(k+1)%3]})
		}
	}
	var err error
	if g.analysis, err = sparse.Analyze(ctx, g.unknowns, pairs, sparse.Options{}); err != nil {
		return nil, fmt.Errorf("newton: %w", err)
	}
	if g.factor, err = g.analysis.NewFactor(sparse.Cholesky); err != nil {
		return nil, fmt.Errorf("newton: %w", err)
	}
	g.values = make([]float64, g.unknowns+len(pairs))
	g.last = make([]float64, g.unknowns)
	return g, nil
}

// fit finds the magnitudes at st. The stresses and forces of st are those of
// the last fit; only the parts with unknowns are scaled anew.
func (v *Solver) fit(ctx context.Context, st *state) error {
	s, g := v.s, v.magnitude
	// Pulls at each node by unknown, in the order of the rows' columns.
	acts := make([]r3.Vec, len(g.column))
	rowAt := make([]int32, len(s.Position))
	for i := range rowAt {
		rowAt[i] = -1
	}
	for r, i := range g.rowOf {
		rowAt[i] = int32(r)
	}
	rest := make([]r3.Vec, len(s.Position)) // what the unknowns do not scale
	copy(rest, st.pull)
	add := func(i, unknown int32, f r3.Vec) {
		if r := rowAt[i]; r >= 0 {
			cols := g.column[g.rows[r]:g.rows[r+1]]
			k, _ := slices.BinarySearch(cols, unknown)
			acts[int(g.rows[r])+k] = r3.Add(acts[int(g.rows[r])+k], f)
		}
	}
	mean := make([]float64, g.unknowns) // weights of the mean by unknown
	values := g.values
	for k := range values {
		values[k] = 0
	}
	// Balance and gradient are weighed by the magnitude of the last fit, so
	// that they are relative where the stress is low.
	level, count := make([]float64, len(s.Position)), make([]float64, len(s.Position))
	area := 0.0
	for t, c := range s.Corners {
		if g.corner[t][0] >= 0 {
			tri, _ := element.NewTriangle(st.at[c[0]], st.at[c[1]], st.at[c[2]])
			area += tri.Area
		}
	}
	for t, c := range s.Corners {
		if g.corner[t][0] < 0 {
			continue
		}
		tri, ok := element.NewTriangle(st.at[c[0]], st.at[c[1]], st.at[c[2]])
		if !ok {
			continue
		}
		warp, weft, err := v.axes(st, t, &tri)
		if err != nil {
			return v.warpError(t, err)
		}
		p := s.Stress[t]
		f := tri.StressPull(warp, weft, p[0], p[1], 0)
		for k, i := range c {
			rest[i] = r3.Sub(rest[i], r3.Scale(g.triangle[t], f[k]))
			for _, u := range g.corner[t] {
				add(i, u, r3.Scale(1.0/3, f[k]))
			}
			mean[g.corner[t][k]] += tri.Area / 3
		}
		// Gradient penalty: smoothness·(A/ΣA)·(σA)²·|∇s/s|².
		q := 0.5 * (p[0] + p[1]) * tri.Area
		w := smoothness * tri.Area / area * q * q / (g.triangle[t] * g.triangle[t])
		for _, i := range c {
			level[i] += g.triangle[t]
			count[i]++
		}
		for k := range 3 {
			l := (k + 1) % 3
			values[g.corner[t][k]] += w * r3.Norm2(tri.Edge[k]) / (4 * tri.Area * tri.Area)
			values[g.unknowns+int(g.slot[t][k])] += w * r3.Dot(tri.Edge[k], tri.Edge[l]) / (4 * tri.Area * tri.Area)
		}
	}
	for m, e := range s.Ends {
		u := g.share[m]
		if u < 0 {
			continue
		}
		t, l, ok := element.Line(st.at[e[0]], st.at[e[1]])
		if !ok {
			continue
		}
		f := r3.Scale(v.tension(m, l, st.force).Force/g.member[m], t)
		rest[e[0]] = r3.Sub(rest[e[0]], r3.Scale(g.member[m], f))
		rest[e[1]] = r3.Add(rest[e[1]], r3.Scale(g.member[m], f))
		add(e[0], u, f)
		add(e[1], u, r3.Scale(-1, f))
		mean[u] += l
	}
	right := make([]float64, g.unknowns)
	for r, i := range g.rowOf {
		fixed := s.FixedAt(int(i))
		from, to := int(g.rows[r]), int(g.rows[r+1])
		k := g.unknowns + int(g.rowPair[r])
		b := mask(fixed, rest[i])
		weight := 1.0
		if level[i] > 0 {
			weight = count[i] / level[i]
			weight *= weight
		}
		for a := from; a < to; a++ {
			fa := r3.Scale(weight, mask(fixed, acts[a]))
			u := g.column[a]
			values[u] += r3.Dot(fa, acts[a])
			right[u] -= r3.Dot(fa, b)
			for c := a + 1; c < to; c++ {
				values[k] += r3.Dot(fa, acts[c])
				k++
			}
		}
	}
	// A pull towards the last fit, far below everything else.
	for u := range g.unknowns {
		w := traceWeight * values[u]
		values[u] += w
		right[u] += w * g.last[u]
	}
	if err := g.factor.Refactor(ctx, values); err != nil {
		return fmt.Errorf("newton: magnitude of unequal stress: %w", err)
	}
	// Means are one: M z = right + Cᵀλ, C z = d.
	m := len(g.groups)
	w := 1 + m
	x := make([]float64, g.unknowns*w)
	for u := range g.unknowns {
		x[u*w] = right[u]
	}
	total := make([]float64, m)
	for k, group := range g.groups {
		for _, u := range group {
			x[int(u)*w+1+k] = mean[u]
			total[k] += mean[u]
		}
	}
	if err := g.factor.Solve(x, w); err != nil {
		return fmt.Errorf("newton: %w", err)
	}
	a, lambda := make([]float64, m*m), make([]float64, m)
	for k, group := range g.groups {
		lambda[k] = total[k]
		for _, u := range group {
			lambda[k] -= mean[u] * x[int(u)*w]
			for l := range m {
				a[k*m+l] += mean[u] * x[int(u)*w+1+l]
			}
		}
	}
	solveDense(a, lambda, m)
	z := right
	for u := range z {
		z[u] = x[u*w]
		for k := range m {
			z[u] += x[u*w+1+k] * lambda[k]
		}
		z[u] = max(z[u], leastShare)
	}
	copy(g.last, z)
	for t := range s.Corners {
		if c := g.corner[t]; c[0] >= 0 {
			g.triangle[t] = (z[c[0]] + z[c[1]] + z[c[2]]) / 3
		}
	}
	for e := range s.Ends {
		if u := g.share[e]; u >= 0 {
			g.member[e] = z[u]
		}
	}
	return nil
}

// axes are the warp and weft directions of triangle t at st.
func (v *Solver) axes(st *state, t int, tri *element.Triangle) (warp, weft r3.Vec, err error) {
	c := v.s.Corners[t]
	return tri.ProjectWarp(v.s.WarpAt(t, st.at[c[0]], st.at[c[1]], st.at[c[2]]))
}

func (v *Solver) warpError(t int, err error) error {
	s := v.s
	c := s.Corners[t]
	p := v.now.at[c[0]]
	return fmt.Errorf("newton: triangle %d of fabric %s at (%.3f, %.3f, %.3f) m: %w", t, s.Fabrics[s.FabricOf[t]].Name, p.X, p.Y, p.Z, err)
}

// stressOf is the wanted stress of triangle t times its magnitude.
func (v *Solver) stressOf(t int) (warp, weft float64) {
	p := v.s.Stress[t]
	if v.magnitude == nil {
		return p[0], p[1]
	}
	f := v.magnitude.triangle[t]
	return f * p[0], f * p[1]
}

// shareOf is what member m carries of the force of its cable.
func (v *Solver) shareOf(m int) float64 {
	if v.magnitude == nil {
		return 1
	}
	return v.magnitude.member[m]
}
