package newton

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/element"
)

// ulp is the spacing of numbers next to one.
const ulp = 0x1p-52

// tension is the state of member m at the given length.
func (v *Solver) tension(m int, length float64, common []float64) element.Tension {
	s := v.s
	switch s.Law[m] {
	case canopy.LawForceDensity:
		return element.GivenDensity(s.Given[m], length)
	case canopy.LawElastic:
		return element.Elastic(s.Stiffness[m], s.Unstressed[m], length, s.Kind[m].Pushes())
	case canopy.LawCable:
		return element.GivenForce(v.shareOf(m)*common[v.comOf[m]], length)
	}
	return element.GivenForce(v.shareOf(m)*s.Given[m], length)
}

// potential reports whether the residual is the gradient of the energy that
// evaluate computes: no pressure, no weight that changes with the shape, no
// unequal stress.
func (v *Solver) potential() bool {
	s := v.s
	if v.uneven {
		return false
	}
	if len(s.Enclosures) > 0 {
		return false
	}
	for f := range s.Fabrics {
		if s.Fabrics[f].Pressure != 0 || (s.SelfWeight && s.Fabrics[f].Weight != 0) {
			return false
		}
	}
	if s.SelfWeight && s.Weight != nil {
		for m, w := range s.Weight {
			if w != 0 && (s.Unstressed == nil || s.Unstressed[m] == 0) {
				return false
			}
		}
	}
	return true
}

// evaluate computes everything of st that follows from its positions and
// common forces. An element that has collapsed since the start is noted.
func (v *Solver) evaluate(st *state) {
	s := v.s
	at := st.at
	st.collapse = none
	energy, noise, noise2 := 0.0, 0.0, 0.0
	v.overNodes(func(_, lo, hi int) {
		clear(v.normalSum[lo:hi])
		if s.Load == nil {
			clear(st.pull[lo:hi])
			clear(st.size[lo:hi])
			return
		}
		for i := lo; i < hi; i++ {
			st.pull[i], st.size[i] = s.Load[i], norm(s.Load[i])
		}
	})
	if s.Load != nil {
		for i := range at {
			energy -= r3.Dot(s.Load[i], r3.Sub(at[i], s.Position[i]))
		}
	}
	for m, e := range s.Ends {
		if !v.active[m] {
			continue
		}
		t, l, ok := element.Line(at[e[0]], at[e[1]])
		if !ok || l < collapsed*v.lengthStart[m] {
			st.collapse = int32(-1 - m)
			if !ok {
				continue
			}
		}
		f := v.tensionOf(st, m, l)
		if s.Law[m] == canopy.LawElastic {
			// What rounding of positions does to the force of a stiff member.
			d := f.Stiffness * ulp * (norm(at[e[0]]) + norm(at[e[1]]))
			noise2 += d * d
			noise = max(noise, d)
		}
		energy += f.Energy
		p := r3.Scale(f.Force, t)
		st.pull[e[0]] = r3.Add(st.pull[e[0]], p)
		st.pull[e[1]] = r3.Sub(st.pull[e[1]], p)
		size := math.Abs(f.Force)
		st.size[e[0]] += size
		st.size[e[1]] += size
		if s.SelfWeight && s.Weight != nil && s.Weight[m] != 0 {
			w := s.Weight[m] * l
			if s.Unstressed != nil && s.Unstressed[m] > 0 {
				w = s.Weight[m] * s.Unstressed[m]
			}
			for _, i := range e {
				energy += 0.5 * w * at[i].Z
				st.pull[i].Z -= 0.5 * w
				st.size[i] += 0.5 * w
			}
		}
	}
	v.overFabric(func(piece int, list []corners) {
		part := &v.pieces[piece]
		part.energy, part.collapse = 0, none
		var tri element.Triangle
		for _, c := range list {
			v.pullOf(st, c, &tri, part)
		}
	})
	for k := range v.fabricPieces() {
		energy += v.pieces[k].energy
		if t := v.pieces[k].collapse; t != none {
			st.collapse = max(t, st.collapse)
		}
	}
	if s.SelfWeight {
		for r := range s.Rings {
			rg := &s.Rings[r]
			if rg.Weight == 0 {
				continue
			}
			if rg.Rigid && rg.Centre >= 0 {
				st.pull[rg.Centre].Z -= rg.Weight
				st.size[rg.Centre] += rg.Weight
				energy += rg.Weight * at[rg.Centre].Z
				continue
			}
			w := rg.Weight / float64(len(rg.Nodes))
			for _, i := range rg.Nodes {
				st.pull[i].Z -= w
				st.size[i] += w
				energy += w * at[i].Z
			}
		}
	}
	if s.Master != nil {
		for i, m := range s.Master {
			if m >= 0 {
				st.size[m] += st.size[i]
			}
		}
	}
	st.energy = energy
	v.overNodes(func(_, lo, hi int) {
		v.refreshBasis(at, st.basis, lo, hi)
	})
	clear(st.reduced)
	if s.Master == nil {
		v.overNodes(func(_, lo, hi int) { v.reduce(st, lo, hi) })
	} else {
		v.reduce(st, 0, len(at)) // nodes of a ring add to its centre's
	}
	v.conditions(st)
	v.overNodes(func(block, lo, hi int) { v.offBalance(st, &v.pieces[block], lo, hi) })
	var all partial
	for k := range (len(at) + nodeBlock - 1) / nodeBlock {
		p := &v.pieces[k]
		all.r2 += p.r2
		all.s2 += p.s2
		all.most = max(all.most, p.most)
		if p.worst > all.worst {
			all.worst, all.worstAt = p.worst, p.worstAt
		}
	}
	r2, s2, most := all.r2, all.s2, all.most
	st.worst, st.worstAt = all.worst, all.worstAt
	st.eta = ratio(math.Sqrt(r2), math.Sqrt(s2))
	st.worst = ratio(math.Sqrt(st.worst), most)
	st.noise, st.noiseWorst = 2*ratio(math.Sqrt(noise2), math.Sqrt(s2)), 4*ratio(noise, most)
	m2 := st.eta * st.eta
	for c := range v.commons {
		g := st.cond[c].gap / st.cond[c].scale
		m2 += g * g
	}
	st.merit = math.Sqrt(m2)
	if !(st.merit < math.Inf(1)) {
		st.merit = math.Inf(1)
	}
}

// pullOf adds the pulls of a triangle and what acts on it at those of its corners
// that are asked for.
func (v *Solver) pullOf(st *state, which corners, tri *element.Triangle, part *partial) {
	s := v.s
	k := which.triangle()
	c := &s.Corners[k]
	ok := tri.Span(&st.at[c[0]], &st.at[c[1]], &st.at[c[2]])
	if !ok || tri.Area < collapsed*v.areaStart[k] {
		part.collapse = int32(k)
		if !ok {
			return
		}
	}
	fabric := &s.Fabrics[s.FabricOf[k]]
	stress, weftStress := v.stressOf(k)
	var f [3]r3.Vec
	if stress == weftStress {
		f = tri.FilmPull(stress)
	} else {
		warp, weft, err := v.axes(st, k, tri)
		if err != nil {
			part.collapse = int32(k)
			return
		}
		f = tri.StressPull(warp, weft, stress, weftStress, 0)
		stress = 0.5 * (stress + weftStress)
	}
	if which&1 != 0 {
		part.energy += stress * tri.Area
	}
	a, half := r3.Scale(tri.Area, tri.Normal), 0.5*stress
	for j, i := range c {
		if which>>j&1 == 0 {
			continue
		}
		add(&v.normalSum[i], &a)
		add(&st.pull[i], &f[j])
		st.size[i] += half * norm(tri.Edge[j])
	}
	if pressure := v.pressureOn(st, s.FabricOf[k]); pressure != 0 {
		p := tri.PressurePush(pressure)
		size := math.Abs(pressure) * tri.Area / 3
		for j, i := range c {
			if which>>j&1 != 0 {
				st.pull[i] = r3.Add(st.pull[i], p)
				st.size[i] += size
			}
		}
	}
	if s.SelfWeight && fabric.Weight != 0 {
		w := fabric.Weight * tri.Area / 3
		for j, i := range c {
			if which>>j&1 != 0 {
				st.pull[i].Z -= w
				st.size[i] += w
			}
		}
	}
}

// reduce adds the pulls at nodes lo to hi to their unknowns.
func (v *Solver) reduce(st *state, lo, hi int) {
	for i := lo; i < hi; i++ {
		if v.first[i] < 0 {
			continue
		}
		for a, b := range st.basis[v.start[i]:v.start[i+1]] {
			st.reduced[int(v.first[i])+a] += r3.Dot(b, st.pull[i])
		}
	}
}

// offBalance sums up what is out of balance at nodes lo to hi.
func (v *Solver) offBalance(st *state, p *partial, lo, hi int) {
	*p = partial{}
	for i := lo; i < hi; i++ {
		if v.first[i] < 0 || v.cls[i] == tied {
			continue
		}
		n2 := 0.0
		for a := range v.directions(int32(i)) {
			r := st.reduced[int(v.first[i])+a]
			n2 += r * r
		}
		p.r2 += n2
		p.s2 += st.size[i] * st.size[i]
		p.most = max(p.most, st.size[i])
		if n2 > p.worst {
			p.worst, p.worstAt = n2, int32(i)
		}
	}
}

func add(to, v *r3.Vec) {
	to.X += v.X
	to.Y += v.Y
	to.Z += v.Z
}

func ratio(a, b float64) float64 {
	if a == 0 {
		return 0
	}
	return a / b
}

// assemble computes Bᵀ·H·B at st into v.values.
func (v *Solver) assemble(st *state) {
	s := v.s
	p := v.pattern
	at := st.at
	for i := range v.values {
		v.values[i] = 0
	}
	for m, e := range s.Ends {
		if !v.active[m] {
			continue
		}
		i, j := e[0], e[1]
		if v.first[i] < 0 && v.first[j] < 0 {
			continue
		}
		t, l, ok := element.Line(at[i], at[j])
		if !ok {
			continue
		}
		k := element.MemberTangent(t, l, v.tensionOf(st, m, l))
		v.addOwn(st, i, &k)
		v.addOwn(st, j, &k)
		k.Scale(-1)
		v.addPair(st, i, j, &k, p.member[m])
	}
	v.overFabric(func(_ int, list []corners) {
		var tri element.Triangle
		for _, which := range list {
			t := which.triangle()
			c := &s.Corners[t]
			if v.first[c[0]] < 0 && v.first[c[1]] < 0 && v.first[c[2]] < 0 {
				continue
			}
			if tri.Span(&at[c[0]], &at[c[1]], &at[c[2]]) {
				v.addFilm(st, which, &tri, p.triangle[t])
			}
		}
	})
	// Directions that do not exist at this shape, and those that nothing
	// resists or drives, stay where they are.
	mean := v.meanDiagonal()
	for i := range v.unknown {
		if v.values[i] == 0 && st.reduced[i] == 0 {
			v.values[i] = mean
		}
	}
}

func (v *Solver) meanDiagonal() float64 {
	sum := 0.0
	for _, d := range v.values[:v.unknown] {
		sum += math.Abs(d)
	}
	if sum == 0 {
		return 1
	}
	return sum / float64(v.unknown)
}

// addOwn adds the block h of node i with itself.
func (v *Solver) addOwn(st *state, i int32, h *element.Block) {
	f := v.first[i]
	if f < 0 {
		return
	}
	b := st.basis[v.start[i]:v.start[i+1]]
	own := v.pattern.own[i]
	for a := range b {
		ha := h.Mul(b[a])
		v.values[int(f)+a] += r3.Dot(b[a], ha)
		for c := a + 1; c < len(b); c++ {
			v.values[int(own)+a+c-1] += r3.Dot(b[c], ha)
		}
	}
}

// addPair adds the block h of node i with node j (rows i, columns j), which
// stands for its transpose as well.
func (v *Solver) addPair(st *state, i, j int32, h *element.Block, slot int32) {
	if slot == -1 {
		return
	}
	bi := st.basis[v.start[i]:v.start[i+1]]
	bj := st.basis[v.start[j]:v.start[j+1]]
	for b := range bj {
		hb := h.Mul(bj[b])
		for a := range bi {
			v.put(i, j, a, b, len(bi), len(bj), slot, r3.Dot(bi[a], hb))
		}
	}
}

// put adds x to the value of directions a of node i and b of node j.
func (v *Solver) put(i, j int32, a, b, ni, nj int, slot int32, x float64) {
	switch {
	case slot == sameNode:
		if a == b {
			v.values[int(v.first[i])+a] += 2 * x
		} else {
			v.values[int(v.pattern.own[i])+a+b-1] += x
		}
	case v.first[i] < v.first[j]:
		v.values[int(slot)+a*nj+b] += x
	default:
		v.values[int(slot)+b*ni+a] += x
	}
}

// addFilm adds triangle t. The block of corners i and its successor j is
// k·n·nᵀ − ½σ[n]ₓ, with k = σ(eᵢ·eⱼ)/(4A) for a uniform stress and
// k = hᵢ·S·hⱼ/A, h = ½n × e, for an unequal one, whose mean is the σ of the
// second term (on a surface in balance both then resist a move along the normal
// by S:∇∇u − (tr S)·K·u, K the Gaussian curvature). Left out is the turning of
// the warp. The symmetric part of the pressure's block is (p/12)[eᵢ − eⱼ]ₓ.
// Of a triangle on the border of a patch, those values are added that belong to it.
func (v *Solver) addFilm(st *state, which corners, tri *element.Triangle, slots [3]int32) {
	t := which.triangle()
	c := v.s.Corners[t]
	if which&allCorners != allCorners {
		for k := range 3 {
			l := (k + 1) % 3
			if v.first[c[l]] < v.first[c[k]] && which>>l&1 == 0 || v.first[c[k]] <= v.first[c[l]] && which>>k&1 == 0 {
				slots[k] = -1
			}
		}
	}
	pressure := v.pressureOn(st, v.s.FabricOf[t])
	n := tri.Normal
	stress, weftStress := v.stressOf(t)
	var same, next [3]float64
	if stress == weftStress {
		f := stress / (4 * tri.Area)
		for k := range 3 {
			same[k] = f * r3.Norm2(tri.Edge[k])
			next[k] = f * r3.Dot(tri.Edge[k], tri.Edge[(k+1)%3])
		}
	} else {
		warp, weft, err := v.axes(st, t, tri)
		if err != nil {
			return
		}
		var a, b [3]float64
		for k := range 3 {
			h := tri.Altitude(k)
			a[k], b[k] = r3.Dot(h, warp), r3.Dot(h, weft)
		}
		for k := range 3 {
			l := (k + 1) % 3
			same[k] = (stress*a[k]*a[k] + weftStress*b[k]*b[k]) / tri.Area
			next[k] = (stress*a[k]*a[l] + weftStress*b[k]*b[l]) / tri.Area
		}
		stress = 0.5 * (stress + weftStress)
	}
	if pressure == 0 && v.cls[c[0]] == normal && v.cls[c[1]] == normal && v.cls[c[2]] == normal {
		v.addInner(st, which, &c, n, -0.5*stress, &same, &next, &slots)
		return
	}
	for k, i := range c {
		fi := v.first[i]
		if fi < 0 {
			continue
		}
		bi := st.basis[v.start[i]:v.start[i+1]]
		w := same[k]
		own := int(v.pattern.own[i])
		for a := range bi {
			if which>>k&1 == 0 {
				break
			}
			pa := w * r3.Dot(n, bi[a])
			v.values[int(fi)+a] += pa * r3.Dot(n, bi[a])
			for b := a + 1; b < len(bi); b++ {
				v.values[own+a+b-1] += pa * r3.Dot(n, bi[b])
			}
		}
		slot := slots[k]
		if slot == -1 {
			continue
		}
		l := (k + 1) % 3
		j := c[l]
		bj := st.basis[v.start[j]:v.start[j+1]]
		w = next[k]
		skew := r3.Scale(-0.5*stress, n)
		if pressure != 0 {
			skew = r3.Add(skew, r3.Scale(pressure/12, r3.Sub(tri.Edge[k], tri.Edge[l])))
		}
		for b := range bj {
			wb := w * r3.Dot(n, bj[b])
			q := r3.Cross(skew, bj[b])
			for a := range bi {
				v.put(i, j, a, b, len(bi), len(bj), slot, wb*r3.Dot(n, bi[a])+r3.Dot(bi[a], q))
			}
		}
	}
}

// addInner is addFilm for three nodes that have their normals only: most of them.
func (v *Solver) addInner(st *state, which corners, c *[3]int32, n r3.Vec, turn float64, same, next *[3]float64, slots *[3]int32) {
	var b [3]*r3.Vec
	var along [3]float64
	for k, i := range c {
		b[k] = &st.basis[v.start[i]]
		along[k] = r3.Dot(n, *b[k])
		if which>>k&1 != 0 {
			v.values[v.first[i]] += same[k] * along[k] * along[k]
		}
	}
	for k := range 3 {
		if slots[k] < 0 {
			continue
		}
		l := (k + 1) % 3
		v.values[slots[k]] += next[k]*along[k]*along[l] + turn*r3.Dot(*b[k], r3.Cross(n, *b[l]))
	}
}
