package audit_test

import (
	"context"
	"math"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/fdm/sparse"
	"anticlast/formfind/audit"
	"anticlast/formfind/canopy"
)

// structure starts an empty structure.
func structure() *canopy.Structure { return &canopy.Structure{} }

func node(s *canopy.Structure, x, y, z float64, fixed canopy.Freedom) int32 {
	s.Position = append(s.Position, r3.Vec{X: x, Y: y, Z: z})
	s.Fixed = append(s.Fixed, fixed)
	return int32(len(s.Position) - 1)
}

func member(s *canopy.Structure, i, j int32, kind canopy.Kind, law canopy.Law, given float64) int32 {
	s.Ends = append(s.Ends, [2]int32{i, j})
	s.Kind = append(s.Kind, kind)
	s.Law = append(s.Law, law)
	s.Given = append(s.Given, given)
	return int32(len(s.Ends) - 1)
}

func triangle(s *canopy.Structure, a, b, c int32, warp r3.Vec, w, f float64) {
	s.Corners = append(s.Corners, [3]int32{a, b, c})
	s.FabricOf = append(s.FabricOf, 0)
	s.Warp = append(s.Warp, warp)
	s.Stress = append(s.Stress, [2]float64{w, f})
}

// chain makes a cable of the members in a row.
func chain(s *canopy.Structure, name string, kind canopy.Kind, law canopy.CableLaw, members ...int32) *canopy.Cable {
	for len(s.CableOf) < len(s.Ends) {
		s.CableOf = append(s.CableOf, -1)
	}
	c := canopy.Cable{Name: name, Kind: kind, Law: law, Members: members}
	c.Nodes = append(c.Nodes, s.Ends[members[0]][0])
	for _, m := range members {
		s.CableOf[m] = int32(len(s.Cables))
		c.Nodes = append(c.Nodes, s.Ends[m][1])
	}
	s.Cables = append(s.Cables, c)
	return &s.Cables[len(s.Cables)-1]
}

// settle solves the linear equilibrium of members with the given force
// densities and of triangles with the given second Piola-Kirchhoff stress on
// the positions of s as reference, for all free nodes, and returns the Form it
// carries: exact equilibrium but for rounding. This is the pass of Pauletti &
// Pimenta (2008), written here on its own.
func settle(t testing.TB, s *canopy.Structure, q []float64) *canopy.Form {
	t.Helper()
	n := len(s.Position)
	unknown := make([][3]int32, n)
	for d := range 3 {
		num := int32(0)
		var pairs [][2]int32
		var off []float64
		for i := range n {
			unknown[i][d] = -1
			if !s.FixedAt(i).Has(d) {
				unknown[i][d] = num
				num++
			}
		}
		if num == 0 {
			continue
		}
		diag := make([]float64, num)
		b := make([]float64, num)
		get := func(v r3.Vec) float64 { return [3]float64{v.X, v.Y, v.Z}[d] }
		for i := range n {
			if u := unknown[i][d]; u >= 0 {
				b[u] = get(s.LoadAt(i))
			}
		}
		spring := func(i, j int32, k float64) {
			ui, uj := unknown[i][d], unknown[j][d]
			switch {
			case ui >= 0 && uj >= 0:
				diag[ui] += k
				diag[uj] += k
				pairs = append(pairs, [2]int32{ui, uj})
				off = append(off, -k)
			case ui >= 0:
				diag[ui] += k
				b[ui] += k * get(s.Position[j])
			case uj >= 0:
				diag[uj] += k
				b[uj] += k * get(s.Position[i])
			}
		}
		for m, e := range s.Ends {
			spring(e[0], e[1], q[m])
		}
		for tr, c := range s.Corners {
			g, area, _, _ := gradients(s, tr)
			w := s.Stress[tr]
			for k := range 3 {
				i, j := (k+1)%3, (k+2)%3
				spring(c[i], c[j], -area*(g[i][0]*w[0]*g[j][0]+g[i][1]*w[1]*g[j][1]))
			}
		}
		an, err := sparse.Analyze(context.Background(), int(num), pairs, sparse.Options{})
		require.NoError(t, err)
		f, err := an.NewFactor(sparse.LDL)
		require.NoError(t, err)
		require.NoError(t, f.Refactor(context.Background(), append(diag, off...)))
		require.NoError(t, f.Solve(b, 1))
		for i := range n {
			if u := unknown[i][d]; u >= 0 {
				switch d {
				case 0:
					defer func(i int, v float64) { s.Position[i].X = v }(i, b[u])
				case 1:
					defer func(i int, v float64) { s.Position[i].Y = v }(i, b[u])
				default:
					defer func(i int, v float64) { s.Position[i].Z = v }(i, b[u])
				}
			}
		}
		if d == 2 {
			break
		}
	}
	return nil
}

// gradients of the shape functions in warp and weft axes, area, and the axes.
func gradients(s *canopy.Structure, tr int) (g [3][2]float64, area float64, w, f r3.Vec) {
	c := s.Corners[tr]
	a, b, d := s.Position[c[0]], s.Position[c[1]], s.Position[c[2]]
	n := r3.Cross(r3.Sub(b, a), r3.Sub(d, a))
	area = r3.Norm(n) / 2
	n = r3.Unit(n)
	w = r3.Unit(r3.Sub(s.Warp[tr], r3.Scale(r3.Dot(s.Warp[tr], n), n)))
	f = r3.Cross(n, w)
	e := [3]r3.Vec{r3.Sub(d, b), r3.Sub(a, d), r3.Sub(b, a)}
	for i := range 3 {
		v := r3.Scale(1/(2*area), r3.Cross(n, e[i]))
		g[i] = [2]float64{r3.Dot(v, w), r3.Dot(v, f)}
	}
	return g, area, w, f
}

// solveForm settles s, then reports the form at the new positions.
func solveForm(t testing.TB, s *canopy.Structure, q []float64) *canopy.Form {
	t.Helper()
	ref := append([]r3.Vec(nil), s.Position...)
	type axis struct {
		g    [3][2]float64
		area float64
	}
	ax := make([]axis, len(s.Corners))
	for tr := range s.Corners {
		ax[tr].g, ax[tr].area, _, _ = gradients(s, tr)
	}
	settle(t, s, q)
	found := append([]r3.Vec(nil), s.Position...)
	copy(s.Position, ref)
	copy(s.Position, found)
	f := canopy.NewForm(s)
	for m, e := range s.Ends {
		f.Force[m] = q[m] * r3.Norm(r3.Sub(f.Position[e[1]], f.Position[e[0]]))
	}
	for tr, c := range s.Corners {
		var w, v r3.Vec // images of warp and weft
		for k, i := range c {
			w = r3.Add(w, r3.Scale(ax[tr].g[k][0], f.Position[i]))
			v = r3.Add(v, r3.Scale(ax[tr].g[k][1], f.Position[i]))
		}
		n := r3.Cross(w, v)
		j := r3.Norm(n)
		u := r3.Unit(w)
		p := r3.Cross(r3.Unit(n), u)
		s1, s2 := s.Stress[tr][0], s.Stress[tr][1]
		sig := func(a, b r3.Vec) float64 {
			return (s1*r3.Dot(w, a)*r3.Dot(w, b) + s2*r3.Dot(v, a)*r3.Dot(v, b)) / j
		}
		f.Warp[tr] = u
		f.Stress[tr] = canopy.Stress{Warp: sig(u, u), Weft: sig(p, p), Shear: sig(u, p)}
	}
	react(s, f)
	f.Converged = true
	return f
}

// react fills in the reactions of nodes without ties.
func react(s *canopy.Structure, f *canopy.Form) {
	sum := make([]r3.Vec, len(f.Position))
	for i := range sum {
		sum[i] = s.LoadAt(i)
	}
	for m, e := range s.Ends {
		v := r3.Scale(f.Force[m], r3.Unit(r3.Sub(f.Position[e[1]], f.Position[e[0]])))
		sum[e[0]] = r3.Add(sum[e[0]], v)
		sum[e[1]] = r3.Sub(sum[e[1]], v)
	}
	for tr, c := range s.Corners {
		x := [3]r3.Vec{f.Position[c[0]], f.Position[c[1]], f.Position[c[2]]}
		n := r3.Unit(r3.Cross(r3.Sub(x[1], x[0]), r3.Sub(x[2], x[0])))
		w := f.Warp[tr]
		v := r3.Cross(n, w)
		st := f.Stress[tr]
		for k, i := range c {
			m := r3.Cross(n, r3.Sub(x[(k+2)%3], x[(k+1)%3]))
			mw, mv := r3.Dot(m, w), r3.Dot(m, v)
			sum[i] = r3.Sub(sum[i], r3.Scale(0.5, r3.Add(r3.Scale(st.Warp*mw+st.Shear*mv, w), r3.Scale(st.Shear*mw+st.Weft*mv, v))))
		}
	}
	for i := range sum {
		r := r3.Scale(-1, sum[i])
		if !s.Fixed[i].Has(0) {
			r.X = 0
		}
		if !s.Fixed[i].Has(1) {
			r.Y = 0
		}
		if !s.Fixed[i].Has(2) {
			r.Z = 0
		}
		f.Reaction[i] = r
	}
}

func run(t testing.TB, s *canopy.Structure, f *canopy.Form) canopy.Audit {
	t.Helper()
	require.NoError(t, s.Validate())
	a, err := audit.Run(context.Background(), s, f, audit.Options{})
	require.NoError(t, err)
	return a
}

// catenoid meshes r = waist·cosh(z/waist) between rings at ±h with rows × around
// quadrilaterals, halved by alternating diagonals, stress sigma, warp along
// the meridian. Nodes lie on the exact surface.
func catenoid(waist, h float64, rows, around int, sigma float64) *canopy.Structure {
	s := structure()
	s.Fabrics = []canopy.Fabric{{Name: "film"}}
	for i := 0; i <= rows; i++ {
		// Equal steps of arc length, sinh(z/waist)·waist.
		l := waist * math.Sinh(h/waist) * (2*float64(i)/float64(rows) - 1)
		z := waist * math.Asinh(l/waist)
		r := waist * math.Cosh(z/waist)
		fixed := canopy.Freedom(0)
		if i == 0 || i == rows {
			fixed = canopy.DirAll
		}
		for j := range around {
			a := 2 * math.Pi * float64(j) / float64(around)
			node(s, r*math.Cos(a), r*math.Sin(a), z, fixed)
		}
	}
	up := r3.Vec{Z: 1}
	for i := range rows {
		for j := range around {
			k := (j + 1) % around
			a, b := int32(i*around+j), int32(i*around+k)
			d, c := int32((i+1)*around+j), int32((i+1)*around+k)
			if (i+j)%2 == 0 {
				triangle(s, a, b, c, up, sigma, sigma)
				triangle(s, a, c, d, up, sigma, sigma)
			} else {
				triangle(s, a, b, d, up, sigma, sigma)
				triangle(s, b, c, d, up, sigma, sigma)
			}
		}
	}
	return s
}
