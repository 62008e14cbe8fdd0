package formfind_test

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"sort"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind"
	"anticlast/formfind/canopy"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/internal/sweep"
)

// randomCanopy is a canopy of our own that has an equilibrium by construction:
//
//   - 3 to 9 corners on a roundish outline, at random heights;
//   - warp:weft between 1:3 and 3:1, equal for every third;
//   - edge cables of 1.5 to 3.5 times the least force, which is the larger
//     stress times L/(2 sin(angle/2)) at the sharper of the two corners (balance
//     of a corner that closes; a ridge divides the angle);
//   - half of them with a ring, no more than 0.8 of the height limit of the cone
//     around it (sin α = (c/r)^m, vertical at the ring) above the lowest corner;
//   - of the others with an even number of corners half with a ridge cable from
//     corner to corner;
//   - every other one on an unstructured mesh (sides divided unevenly).
func randomCanopy(seed uint64) *canopy.Model {
	r := rand.New(rand.NewPCG(seed, 11))
	return drawCanopy(r, seed, 1.5, 3.5, 3, 0.8, 1)
}

// drawCanopy draws a canopy with edge forces between two factors of the least,
// stress ratios up to ratioMost, ring heights up to a share of the limit and
// corners a factor higher than usual.
func drawCanopy(r *rand.Rand, seed uint64, least, most, ratioMost, share, tall float64) *canopy.Model {
	n := 3 + r.IntN(7)
	size := math.Exp(math.Log(4) + r.Float64()*math.Log(10)) // radius 4 to 40 m
	m := &canopy.Model{Title: fmt.Sprintf("random %d", seed), MeshSize: size * (0.1 + 0.1*r.Float64())}
	free := seed%2 == 1
	ring := r.IntN(2) == 0
	ridge := !ring && n%2 == 0 && r.IntN(3) > 0
	far := r3.Vec{}
	if r.IntN(4) == 0 {
		far = r3.Vec{X: 4e4 * r.Float64(), Y: 2e5 * r.Float64(), Z: 100}
	}
	rise := 0.5 * size * r.Float64() * tall
	if ring {
		rise = 0 // see below
	}
	corner := make([]r3.Vec, n)
	step := 2 * math.Pi / float64(n)
	for i := range corner {
		a := step * (float64(i) + 0.4*(r.Float64()-0.5))
		d := size * (0.85 + 0.3*r.Float64())
		corner[i] = r3.Vec{X: d * math.Cos(a), Y: d * math.Sin(a), Z: rise * r.Float64()}
	}
	ratio := math.Pow(ratioMost, 2*r.Float64()-1)
	if seed%3 == 0 {
		ratio = 1
	}
	warp, weft := 2000*math.Sqrt(ratio), 2000/math.Sqrt(ratio)
	angle := func(i int, a, b r3.Vec) float64 {
		return math.Acos(r3.Cos(r3.Sub(a, corner[i]), r3.Sub(b, corner[i])))
	}
	for i, p := range corner {
		m.Points = append(m.Points, canopy.Point{Name: fmt.Sprintf("P%d", i), At: r3.Add(p, far)})
	}
	segments := func() int {
		if free {
			return 5 + r.IntN(6)
		}
		return 0
	}
	cable := func(name, from, to string, role canopy.Kind, force float64) {
		m.Edges = append(m.Edges, canopy.Edge{Name: name, From: from, To: to, Kind: canopy.EdgeCable, Role: role, Cable: name, Segments: segments()})
		m.Cables = append(m.Cables, canopy.ModelCable{Name: name, Edges: []string{name}, Force: force})
	}
	inner := math.Inf(1) // what is left between the middle and the edges
	for i := range corner {
		j := (i + 1) % n
		l := r3.Norm(r3.Sub(corner[j], corner[i]))
		need := 0.0
		for _, k := range []int{i, j} {
			half := angle(k, corner[(k+1)%n], corner[(k+n-1)%n]) / 2
			if o := (k + n/2) % n; ridge && k%(n/2) == 0 {
				half = min(angle(k, corner[(k+1)%n], corner[o]), angle(k, corner[(k+n-1)%n], corner[o]))
			}
			need = max(need, max(warp, weft)*l/(2*math.Sin(half)))
		}
		force := need * (least + (most-least)*r.Float64())
		cable(fmt.Sprintf("e%d", i), fmt.Sprintf("P%d", i), fmt.Sprintf("P%d", j), canopy.KindEdgeCable, force)
		bend := force / max(warp, weft)
		sag := l / 2
		if bend > l/2 {
			sag = bend - math.Sqrt(bend*bend-l*l/4)
		}
		mid := r3.Scale(0.5, r3.Add(corner[i], corner[j]))
		inner = min(inner, math.Hypot(mid.X, mid.Y)-sag)
	}
	fabric := func(name string, boundary ...string) *canopy.ModelFabric {
		dir := r.Float64() * math.Pi
		m.Fabrics = append(m.Fabrics, canopy.ModelFabric{Name: name, Boundary: boundary, Warp: warp, Weft: weft,
			WarpDir: r3.Vec{X: math.Cos(dir), Y: math.Sin(dir)}})
		return &m.Fabrics[len(m.Fabrics)-1]
	}
	names := func(from, to int) []string {
		var out []string
		for i := from; i < to; i++ {
			out = append(out, fmt.Sprintf("e%d", i))
		}
		return out
	}
	switch {
	case ring:
		inner = max(inner, 0.3*size)
		radius := inner * (0.08 + 0.17*r.Float64())
		limit := cases.ConeHeight(inner, radius, radius, weft/warp)
		for i := range corner {
			m.Points[i].At.Z += 0.3 * share * limit * tall * r.Float64()
		}
		m.Points = append(m.Points, canopy.Point{Name: "C", At: r3.Add(r3.Vec{Z: limit * share * (0.3 + 0.7*r.Float64())}, far)})
		m.Rings = []canopy.ModelRing{{Name: "top", At: "C", Radius: radius, Rigid: true}}
		f := fabric("sail", names(0, n)...)
		f.Ring, f.WarpRule = "top", canopy.WarpRadial
	case ridge:
		o := n / 2
		span := r3.Norm(r3.Sub(corner[o], corner[0]))
		cable("ridge", "P0", fmt.Sprintf("P%d", o), canopy.KindRidgeCable, max(warp, weft)*span*(0.5+r.Float64()))
		dir := r.Float64() * math.Pi
		for _, part := range [][]string{append(names(0, o), "ridge"), append(names(o, n), "ridge")} {
			fabric("sail-"+part[0], part...).WarpDir = r3.Vec{X: math.Cos(dir), Y: math.Sin(dir)}
		}
	default:
		fabric("sail", names(0, n)...)
	}
	return m
}

// sound fails when a trusted result has numbers that are none or a collapsed
// triangle.
func sound(t *testing.T, r *canopy.Result) {
	t.Helper()
	for i, p := range r.Form.Position {
		require.False(t, math.IsNaN(p.X+p.Y+p.Z) || math.IsInf(p.X+p.Y+p.Z, 0), "node %d", i)
	}
	for _, f := range r.Form.Force {
		require.False(t, math.IsNaN(f))
	}
	if r.Audit.Trusted {
		require.Greater(t, cases.MinAngle(r.Structure, r.Form.Position), math.Pi/180)
	}
}

func describe(m *canopy.Model) string {
	what := fmt.Sprintf("%d corners", len(m.Points)-len(m.Rings))
	if len(m.Rings) > 0 {
		what += ", ring"
	}
	if len(m.Fabrics) > 1 {
		what += ", ridge"
	}
	if m.Edges[0].Segments > 0 {
		what += ", unstructured"
	}
	return fmt.Sprintf("%s, warp:weft %.2f", what, m.Fabrics[0].Warp/m.Fabrics[0].Weft)
}

// Random canopies that are feasible by construction are all found and trusted.
func TestRandomFeasibleCanopiesAreAllTrusted(t *testing.T) {
	count := sweep.N(24, 100, 400)
	var failed []string
	rings, ridges, free := 0, 0, 0
	angle := math.Inf(1)
	for seed := range uint64(count) {
		m := randomCanopy(seed)
		if len(m.Rings) > 0 {
			rings++
		}
		if len(m.Fabrics) > 1 {
			ridges++
		}
		if m.Edges[0].Segments > 0 {
			free++
		}
		r, err := formfind.Find(t.Context(), m, formfind.Options{})
		if err != nil {
			failed = append(failed, fmt.Sprintf("seed %d (%s): %v", seed, describe(m), err))
			continue
		}
		sound(t, r)
		angle = min(angle, r.Audit.MinAngle)
		if !r.Audit.Trusted {
			failed = append(failed, fmt.Sprintf("seed %d (%s): %v", seed, describe(m), r.Audit.Reasons))
		}
	}
	t.Logf("%d canopies (%d with a ring, %d with a ridge, %d on unstructured meshes): %d trusted, %d not; smallest angle %.1f°",
		count, rings, ridges, free, count-len(failed), len(failed), angle*180/math.Pi)
	require.Empty(t, failed, strings.Join(failed, "\n"))
}

// The same canopies on meshes four times finer, where steps are solved with the
// help of coarser meshes instead of by a factorisation.
func TestRandomCanopiesOnFineMeshesAreAllTrusted(t *testing.T) {
	count := sweep.N(4, 12, 40)
	most := 0
	for seed := range uint64(count) {
		m := randomCanopy(seed)
		m.MeshSize /= 4
		for i := range m.Edges {
			m.Edges[i].Segments *= 4
		}
		r, err := formfind.Find(t.Context(), m, formfind.Options{})
		require.NoError(t, err, "seed %d (%s)", seed, describe(m))
		sound(t, r)
		require.True(t, r.Audit.Trusted, "seed %d (%s): %v", seed, describe(m), r.Audit.Reasons)
		most = max(most, len(r.Structure.Corners))
	}
	t.Logf("%d canopies of up to %d triangles", count, most)
}

// circleModel is a fabric inside a circle of four fixed arcs, ring optional.
func circleModel(radius, mesh float64) *canopy.Model {
	m := &canopy.Model{MeshSize: mesh}
	at := func(a float64) r3.Vec { return r3.Vec{X: radius * math.Cos(a), Y: radius * math.Sin(a)} }
	var names []string
	for i := range 4 {
		a := math.Pi / 2 * float64(i)
		m.Points = append(m.Points, canopy.Point{Name: fmt.Sprintf("P%d", i), At: at(a)})
		e := canopy.Edge{Name: fmt.Sprintf("e%d", i), From: fmt.Sprintf("P%d", i), To: fmt.Sprintf("P%d", (i+1)%4), Kind: canopy.EdgeFixed, Arc: true, Through: at(a + math.Pi/4)}
		m.Edges, names = append(m.Edges, e), append(names, e.Name)
	}
	m.Fabrics = []canopy.ModelFabric{{Name: "sail", Boundary: names}}
	return m
}

// coneModel is a cone between fixed circles, ratio = weft:warp, warp radial.
func coneModel(base, top, height, ratio, mesh float64) *canopy.Model {
	m := circleModel(base, mesh)
	m.Points = append(m.Points, canopy.Point{Name: "C", At: r3.Vec{Z: height}})
	m.Rings = []canopy.ModelRing{{Name: "top", At: "C", Radius: top, Rigid: true}}
	f := &m.Fabrics[0]
	f.Ring, f.WarpRule, f.Warp, f.Weft = "top", canopy.WarpRadial, 2000/math.Sqrt(ratio), 2000*math.Sqrt(ratio)
	return m
}

// coneLimit is the greatest height of a cone of constant ratio m = weft:warp
// between rings, a neck below the top ring included: the meridian sin α = (c/r)^m
// may go down from the top ring to its waist c and up again... that is, the
// height is H(base, c) + H(top, c), greatest over c.
func coneLimit(base, top, m float64) float64 {
	h := func(c float64) float64 { return cases.ConeHeight(base, c, c, m) + cases.ConeHeight(top, c, c, m) }
	lo, hi := 0.2*top, top
	for range 100 { // golden section
		a, b := hi-(hi-lo)*0.618033988749895, lo+(hi-lo)*0.618033988749895
		if h(a) > h(b) {
			hi = b
		} else {
			lo = a
		}
	}
	return h((lo + hi) / 2)
}

// polygonModel is a flat regular polygon with cables of the given force.
func polygonModel(n int, radius, stress, force, mesh float64) *canopy.Model {
	m := &canopy.Model{MeshSize: mesh}
	var names []string
	for i := range n {
		sin, cos := math.Sincos(2 * math.Pi * float64(i) / float64(n))
		m.Points = append(m.Points, canopy.Point{Name: fmt.Sprintf("P%d", i), At: r3.Vec{X: radius * cos, Y: radius * sin}})
		e := fmt.Sprintf("e%d", i)
		m.Edges = append(m.Edges, canopy.Edge{Name: e, From: fmt.Sprintf("P%d", i), To: fmt.Sprintf("P%d", (i+1)%n), Kind: canopy.EdgeCable, Role: canopy.KindEdgeCable, Cable: e})
		m.Cables = append(m.Cables, canopy.ModelCable{Name: e, Edges: []string{e}, Force: force})
		names = append(names, e)
	}
	m.Fabrics = []canopy.ModelFabric{{Name: "sail", Boundary: names, Warp: stress, Weft: stress, WarpDir: r3.Vec{X: 1}}}
	return m
}

// Canopies beyond a known limit are all refused, for that reason:
// cones taller than the meridian sin α = (c/r)^m can reach (axisymmetric
// membrane equilibrium; catenoid for m = 1), polygons whose edge cables carry
// less than σL/(2 sin(angle/2)), bubbles past the hemisphere (p > 2σ/a), rings
// pulled along a mast by more than 2πrσ.
func TestCanopiesBeyondAKnownLimitAreAllRefused(t *testing.T) {
	count := sweep.N(8, 40, 120)
	var failed []string
	tally := map[string]int{}
	for seed := range uint64(count) {
		r := rand.New(rand.NewPCG(seed, 13))
		over := 1.04 + 0.8*r.Float64()
		size := 3 + 9*r.Float64()
		var m *canopy.Model
		var want string
		var limit float64
		switch seed % 4 {
		case 0:
			top := size * (0.08 + 0.2*r.Float64())
			ratio := math.Pow(3, 2*r.Float64()-1)
			if seed%3 == 0 {
				ratio = 1
			}
			limit = coneLimit(size, top, ratio)
			m, want = coneModel(size, top, over*limit, ratio, size/8), "height between the lowest and the highest support"
		case 1:
			n := 3 + r.IntN(5)
			side := 2 * size * math.Sin(math.Pi/float64(n))
			limit = 2000 * side / (2 * math.Sin(math.Pi*(0.5-1/float64(n))))
			m, want = polygonModel(n, size, 2000, limit/over, size/8), "edge cable force"
		case 2:
			m, want = circleModel(size, size/8), "internal pressure"
			limit = 2 * 2000 / size
			f := &m.Fabrics[0]
			f.Warp, f.Weft, f.Properties.Pressure = 2000, 2000, over*limit
		default:
			top := size * (0.08 + 0.2*r.Float64())
			limit = 2 * math.Pi * top * 2000
			m, want = coneModel(size, top, 0.3*top, 1, size/8), "pull on a ring"
			m.Points[4].Hold, m.Points[4].Fixed, m.Points[4].Load = canopy.HoldAnchored, canopy.DirX|canopy.DirY, r3.Vec{Z: over * limit}
			m.Rings[0].Free = canopy.DirZ
		}
		res, err := formfind.Find(t.Context(), m, formfind.Options{})
		var none *formfind.NoEquilibriumError
		switch {
		case err == nil && res.Audit.Trusted:
			failed = append(failed, fmt.Sprintf("seed %d: %s %.2f times the limit is trusted", seed, want, over))
		case !errors.As(err, &none):
			failed = append(failed, fmt.Sprintf("seed %d: %s %.2f times the limit: not refused as such: %v", seed, want, over, err))
		case !none.Shown || none.Quantity != want:
			failed = append(failed, fmt.Sprintf("seed %d: %s %.2f times the limit, refused for %q: %s", seed, want, over, none.Quantity, none.Text))
		default:
			tally[want]++
			t.Logf("seed %d: %s: %.2f times the limit; the refusal's number is %.3f of it", seed, want, over, none.Limit/limit)
			if d := none.Limit/limit - 1; math.Abs(d) > 0.1 {
				failed = append(failed, fmt.Sprintf("seed %d: %s: the number in the refusal is %.0f %% off", seed, want, 100*d))
			}
		}
	}
	t.Logf("%d canopies beyond a limit, %d refused for it: %v", count, count-len(failed), tally)
	require.Empty(t, failed, strings.Join(failed, "\n"))
}

// Whatever is asked for, the answer is a trusted shape, one that says why it is
// not trusted, or a refusal; never rubbish that is called good.
func TestUnclassifiedCanopiesAreTallied(t *testing.T) {
	count := sweep.N(5, 40, 120)
	tally := map[string]int{}
	for seed := range uint64(count) {
		r := rand.New(rand.NewPCG(seed, 17))
		m := drawCanopy(r, seed, 0.4, 2.6, 8, 2, 3)
		res, err := formfind.Find(t.Context(), m, formfind.Options{})
		var none *formfind.NoEquilibriumError
		switch {
		case errors.As(err, &none):
			if none.Shown {
				tally["refused: "+none.Quantity]++
			} else {
				tally["refused: no shape found"]++
			}
			require.NotEmpty(t, none.Text)
		case err != nil:
			tally["refused: "+strings.SplitN(err.Error(), ":", 2)[0]]++
			t.Logf("seed %d (%s): %v", seed, describe(m), err)
		default:
			sound(t, res)
			if res.Audit.Trusted {
				tally["trusted"]++
			} else {
				tally["found, not trusted"]++
				require.NotEmpty(t, res.Audit.Reasons)
				t.Logf("seed %d (%s): %v", seed, describe(m), res.Audit.Reasons)
			}
		}
	}
	keys := make([]string, 0, len(tally))
	for k := range tally {
		keys = append(keys, k)
	}
	sort.Strings(keys)
	for _, k := range keys {
		t.Logf("%4d %s", tally[k], k)
	}
	require.True(t, count < 20 || slices.Contains(keys, "trusted"))
}

// The answer depends neither on the mesh, within what discretisation explains,
// nor on the start: relaxation of a disturbed shape comes back to it.
func TestAnswersDependNeitherOnMeshNorOnStart(t *testing.T) {
	count := sweep.N(3, 10, 30)
	worst := 0.0
	for k := range uint64(count) {
		m := randomCanopy(6 * k) // equal stress, structured where the outline allows
		m.MeshSize *= 0.5
		what := describe(m)
		a, err := formfind.Find(t.Context(), m, formfind.Options{CrossCheck: true})
		require.NoError(t, err)
		require.True(t, a.Audit.Trusted, "seed %d (%s): %v", 6*k, what, a.Audit.Reasons)
		at := map[string]r3.Vec{}
		for _, p := range m.Points {
			at[p.Name] = p.At
		}
		for i := range m.Edges {
			p, q := at[m.Edges[i].From], at[m.Edges[i].To]
			m.Edges[i].Segments = max(7, int(r3.Norm(r3.Sub(q, p))/m.MeshSize)) + i%2
		}
		b, err := formfind.Find(t.Context(), m, formfind.Options{})
		require.NoError(t, err)
		require.True(t, b.Audit.Trusted, "seed %d, unstructured: %v", 6*k, b.Audit.Reasons)
		x := cases.Area(a.Structure, a.Form.Position)
		off := math.Abs(cases.Area(b.Structure, b.Form.Position)/x - 1)
		size := a.Structure.Size()
		require.False(t, math.IsNaN(a.Audit.Discretisation))
		other := b.Audit.Discretisation
		if math.IsNaN(other) { // too many triangles for one more refinement: as that of a, to second order
			other = a.Audit.Discretisation * float64(len(a.Structure.Corners)) / float64(len(b.Structure.Corners))
		}
		allowed := a.Audit.Discretisation + other + 1e-12 // rounding: triangles of corners are flat
		ab, chordsAB := apart(a, b)
		ba, chordsBA := apart(b, a)
		d := math.Max(ab, ba) / size
		t.Logf("seed %d (%s): %d and %d triangles, areas differ by %.2g, surfaces by %.2g of the size (%.2g with the chords); estimated %.2g and %.2g",
			6*k, what, len(a.Structure.Corners), len(b.Structure.Corners), off, d, math.Max(chordsAB, chordsBA)/size, a.Audit.Discretisation, other)
		assert.Less(t, d, allowed, "seed %d", 6*k)
		// Polygons of n sides cut the area under an arc short by about 1/n² of
		// it, the smooth surface between nodes a like share.
		assert.Less(t, off, 1/float64(min(len(a.Structure.Corners), len(b.Structure.Corners))), "seed %d", 6*k)
		worst = math.Max(worst, d/allowed)
	}
	t.Logf("%d canopies on two meshes each: the surfaces differ by %.2g of what their estimates allow, at most", count, worst)
}
