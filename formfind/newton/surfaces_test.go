package newton_test

import (
	"fmt"
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/internal/sweep"
	"anticlast/formfind/newton"
)

// Published surfaces of constant stress, at mesh sizes that double: the errors
// of area and place fall with the square of the mesh size. Sources beside the
// cases; Dziuk & Hutchinson (Math. Comp. 68, 1999) for second order of
// linear triangles on minimal surfaces.
func TestSurfacesConvergeSecondOrder(t *testing.T) {
	sizes := []int{16, 32}
	if sweep.N(0, 1, 1) > 0 {
		sizes = []int{16, 32, 64, 128}
	}
	if sweep.N(0, 0, 1) > 0 {
		sizes = append(sizes, 256)
	}
	for _, k := range []struct {
		name  string
		make  func(n int) cases.Case
		shake float64
	}{
		{"catenoid h=0.1", func(n int) cases.Case { return cases.Catenoid(0.1, 8*n, n/2, true, 1000) }, 2e-4},
		{"catenoid h=0.5", func(n int) cases.Case { return cases.Catenoid(0.5, 4*n, n, true, 1000) }, 5e-3},
		{"catenoid h=0.65", func(n int) cases.Case { return cases.Catenoid(0.65, 4*n, n, true, 1000) }, 1e-3},
		{"Scherk half=0.5", func(n int) cases.Case { return cases.Scherk(0.5, n, 2500) }, 0},
		{"Scherk half=1", func(n int) cases.Case { return cases.Scherk(1, n, 2500) }, 0},
		{"Schwarz D", func(n int) cases.Case { return cases.SchwarzD(n, 2500) }, 0},
		{"cap p=1", func(n int) cases.Case { return cases.SphereCap(5, 1, 5, 4*n, n) }, 1e-2},
		{"cap p=1.6", func(n int) cases.Case { return cases.SphereCap(5, 1.6, 5, 4*n, n) }, 1e-2},
	} {
		t.Run(k.name, func(t *testing.T) {
			var area, place []float64
			for _, n := range sizes {
				c := k.make(n)
				start := c.Form(c.S.Position)
				if c.Exact != nil {
					start = c.Form(c.Disturbed(c.Exact, k.shake*16/float64(n), 0)) // the same share of the mesh size
				}
				f, out := find(t, c.S, start)
				area = append(area, math.Abs(cases.Area(c.S, f.Position)/c.Area-1))
				if c.Distance != nil {
					place = append(place, worstDistance(&c, f.Position))
				}
				t.Logf("%d triangles: %d steps, area error %.2g, place %.2g m", len(c.S.Corners), out.Iterations, area[len(area)-1], place[max(0, len(place)-1):])
			}
			for i := 1; i < len(area); i++ {
				assert.Greater(t, math.Log2(area[i-1]/area[i]), 1.8, "order of the area")
			}
			for i := 1; i < len(place); i++ {
				assert.Greater(t, math.Log2(place[i-1]/place[i]), 1.8, "order of the place")
			}
		})
	}
}

// The waist of a catenoid between rings of radius 1 at half separation 0.5 is
// 0.848337938094979 (recomputed from a·cosh(h/a) = 1), the axial force 2πaσ.
func TestCatenoidWaistAndForce(t *testing.T) {
	c := cases.Catenoid(0.5, 96, 48, true, 1000)
	f, _ := find(t, c.S, c.Form(c.Disturbed(c.Exact, 5e-3, 0)))
	waist, pull := math.Inf(1), 0.0
	for i, p := range f.Position {
		waist = min(waist, math.Hypot(p.X, p.Y))
		if c.S.Fixed[i] != 0 && p.Z > 0 {
			pull += f.Reaction[i].Z
		}
	}
	assert.InEpsilon(t, 0.848337938094979, waist, 1e-3)
	assert.InEpsilon(t, 2*math.Pi*0.848337938094979*1000, pull, 1e-3)
}

// Beyond the critical separation 0.66274 no connected film exists (Goldschmidt
// 1831); just inside it one does. The engine must not call a collapse converged.
func TestCatenoidBeyondCriticalIsNotFound(t *testing.T) {
	for _, h := range []float64{0.67, 0.7, 1, 2} {
		c := cases.Catenoid(h, 48, 24, true, 1000)
		f, out, err := newton.Engine{}.Find(ctx, c.S, nil, engine.Settings{})
		require.NoError(t, err)
		assert.NotEqual(t, engine.Converged, out.Status, "h=%g", h)
		assert.NotEmpty(t, out.Why)
		assert.False(t, f.Converged)
		t.Logf("h=%g: %v after %d steps: %s", h, out.Status, out.Iterations, out.Why)
	}
	c := cases.Catenoid(0.66, 96, 48, true, 1000)
	find(t, c.S, c.Form(c.Exact))
}

// A bubble past the hemisphere does not exist at given pressure: p ≤ 2σ/a.
func TestBubblePastHemisphereIsNotFound(t *testing.T) {
	c := cases.SphereCap(5, 2.1, 5, 32, 12)
	_, out, err := newton.Engine{}.Find(ctx, c.S, nil, engine.Settings{})
	require.NoError(t, err)
	assert.NotEqual(t, engine.Converged, out.Status)
	t.Log(out.Why)
}

// Cable against a uniform film: radius T/σ. Chord 10, T = 39, σ = 3: R = 13,
// sag 1 (5-12-13 triangle), arc 26·asin(5/13).
func TestEdgeCableRadius(t *testing.T) {
	var off, long []float64
	for _, n := range []int{16, 32} {
		c := cases.EdgeCableStrip(10, 4, 3, 39, n, n/2)
		f, _ := find(t, c.S, nil)
		worst := 0.0
		for _, i := range c.S.Cables[0].Nodes {
			p := f.Position[i]
			// Ends at (±5, 0), sag 1 towards +y: centre of the circle at y = −12.
			worst = max(worst, math.Abs(math.Hypot(p.X, p.Y+12)-13))
		}
		off = append(off, worst)
		long = append(long, math.Abs(cases.CableLength(c.S, 0, f.Position)-26*math.Asin(5.0/13)))
	}
	assert.Less(t, off[1], 2e-3)
	assert.Greater(t, math.Log2(off[0]/off[1]), 1.8)
	assert.Greater(t, math.Log2(long[0]/long[1]), 1.8)
}

// A flat square of uniform stress needs edge forces above σL/√2, from the
// balance of the corner (two cables at the angle that closes to zero). The
// mesh of 24 cells a side cuts the corner short by some 3 %.
func TestWeakEdgeCablesAreFoundOut(t *testing.T) {
	for _, share := range []float64{0.75, 0.8, 1, 2} {
		force := share * 1000 * 10
		r := force / 1000
		sag := (r - math.Sqrt(r*r-25)) / 10
		c := cases.FourPoint(10, 0, 1000, force, sag, 24)
		f, _ := find(t, c.S, nil)
		assert.InEpsilon(t, sag, cases.CableSag(c.S, 1, f.Position), 0.01, "share %g", share)
	}
	for _, share := range []float64{0.3, 0.5, 0.65, 0.68} {
		c := cases.FourPoint(10, 0, 1000, share*1000*10, 0.15, 24)
		_, out, err := newton.Engine{}.Find(ctx, c.S, nil, engine.Settings{})
		require.NoError(t, err)
		assert.NotEqual(t, engine.Converged, out.Status, "share %g", share)
		assert.NotEmpty(t, out.Why)
		t.Logf("share %g: %v after %d: %s", share, out.Status, out.Iterations, out.Why)
	}
}

// Three films of equal stress meet at 120° (Plateau 1873), whatever the
// directions in which they are held.
func TestThreeFilmsMeetAt120Degrees(t *testing.T) {
	c := cases.ThreeFilms([3]float64{0.1, 1.9, 4.4}, 1.5, 700, 8)
	f, _ := find(t, c.S, nil)
	n := 9 // seam nodes come first
	seam := f.Position[n/2]
	for i := range n {
		assert.InDelta(t, 0, math.Hypot(f.Position[i].X-seam.X, f.Position[i].Y-seam.Y), 1e-8)
	}
	var dir []float64
	for _, a := range []float64{0.1, 1.9, 4.4} {
		dir = append(dir, math.Atan2(math.Sin(a)-seam.Y, math.Cos(a)-seam.X))
	}
	for i := range 3 {
		turn := math.Mod(dir[(i+1)%3]-dir[i]+4*math.Pi, 2*math.Pi)
		assert.InDelta(t, 2*math.Pi/3, turn, 1e-7)
	}
}

// A rigid ring sliding on a mast under an upward force F settles where
// F = 2πσc with c the parameter of the catenoid, on the lower of two heights;
// above 2π·r·σ there is none (equilibrium of the ring).
func TestRingOnMast(t *testing.T) {
	const base, top, stress, height = 5.0, 0.5, 1000.0, 1.0
	k := cases.ConeConstant(base, top, height, 1)
	var miss []float64
	for _, n := range []int{16, 32} {
		c := cases.RingOnMast(base, top, 0.8, stress, 2*math.Pi*stress*k, 3*n, n)
		f, out := find(t, c.S, nil)
		centre := c.S.Rings[0].Centre
		miss = append(miss, math.Abs(f.Position[centre].Z-height))
		for _, i := range c.S.Rings[0].Nodes {
			assert.Equal(t, f.Position[centre].Z, f.Position[i].Z)
		}
		t.Logf("n=%d: %d steps, height off by %.2g m", n, out.Iterations, miss[len(miss)-1])
	}
	assert.Less(t, miss[1], 3e-3)
	assert.Greater(t, math.Log2(miss[0]/miss[1]), 1.7)

	c := cases.RingOnMast(base, top, 1.2, stress, 2*math.Pi*stress*top*1.05, 48, 16)
	_, out, err := newton.Engine{}.Find(ctx, c.S, nil, engine.Settings{})
	require.NoError(t, err)
	assert.NotEqual(t, engine.Converged, out.Status)
	t.Log(out.Why)
}

// Turning, moving, scaling and renumbering the structure turn, move, scale and
// renumber the answer. Scaling lengths by k keeps the shape when cable forces
// grow by k and fabric stress stays.
func TestInvariance(t *testing.T) {
	make := func() cases.Case { return cases.FourPoint(10, 3, 2500, 30e3, 0.1, 12) }
	c := make()
	ref, _ := find(t, c.S, nil)
	t.Run("turned and moved", func(t *testing.T) {
		rot := r3.NewRotation(1.1, r3.Vec{X: 1, Y: 2, Z: -0.5})
		move := r3.Vec{X: 12, Y: -7, Z: 3}
		c := make()
		for i, p := range c.S.Position {
			c.S.Position[i] = r3.Add(rot.Rotate(p), move)
		}
		for i, w := range c.S.Warp {
			c.S.Warp[i] = rot.Rotate(w)
		}
		f, _ := find(t, c.S, nil)
		want := []r3.Vec{}
		for _, p := range ref.Position {
			want = append(want, r3.Add(rot.Rotate(p), move))
		}
		assert.Less(t, distance(want, f.Position), 1e-8)
		for i := range f.Force {
			assert.InEpsilon(t, ref.Force[i], f.Force[i], 1e-12)
		}
	})
	t.Run("scaled", func(t *testing.T) {
		c := make()
		for i := range c.S.Position {
			c.S.Position[i] = r3.Scale(7, c.S.Position[i])
		}
		for m := range c.S.Given {
			c.S.Given[m] *= 7
		}
		f, _ := find(t, c.S, nil)
		want := []r3.Vec{}
		for _, p := range ref.Position {
			want = append(want, r3.Scale(7, p))
		}
		assert.Less(t, distance(want, f.Position), 7e-8)
	})
	t.Run("prestress doubled", func(t *testing.T) {
		c := make()
		for m := range c.S.Given {
			c.S.Given[m] *= 2
		}
		for k := range c.S.Stress {
			c.S.Stress[k] = [2]float64{5000, 5000}
		}
		f, _ := find(t, c.S, nil)
		assert.Less(t, distance(ref.Position, f.Position), 1e-8)
		for i := range f.Reaction {
			assert.InDelta(t, 0, r3.Norm(r3.Sub(f.Reaction[i], r3.Scale(2, ref.Reaction[i]))), 1e-4)
		}
	})
	t.Run("renumbered", func(t *testing.T) {
		c := make()
		n := len(c.S.Position)
		to := func(i int32) int32 { return int32((int(i)*101 + 17) % n) } // 101 is prime to n = 169
		s := *c.S
		s.Position = append([]r3.Vec(nil), c.S.Position...)
		s.Fixed = append([]canopy.Freedom(nil), c.S.Fixed...)
		for i := range n {
			s.Position[to(int32(i))], s.Fixed[to(int32(i))] = c.S.Position[i], c.S.Fixed[i]
		}
		for m, e := range s.Ends {
			s.Ends[m] = [2]int32{to(e[1]), to(e[0])} // and the other way around
		}
		for k, tr := range s.Corners {
			s.Corners[k] = [3]int32{to(tr[1]), to(tr[2]), to(tr[0])}
		}
		for k := range s.Cables {
			for i, x := range s.Cables[k].Nodes {
				s.Cables[k].Nodes[i] = to(x)
			}
		}
		f, _ := find(t, &s, nil)
		for i := range n {
			assert.Less(t, r3.Norm(r3.Sub(ref.Position[i], f.Position[to(int32(i))])), 1e-8)
		}
	})
	t.Run("turned inside out", func(t *testing.T) {
		c := make()
		for k, tr := range c.S.Corners {
			c.S.Corners[k] = [3]int32{tr[0], tr[2], tr[1]}
		}
		f, _ := find(t, c.S, nil)
		assert.Less(t, distance(ref.Position, f.Position), 1e-8)
	})
}

// Fabric that is neither supported nor held by a cable along an edge, unequal
// or no stress: refused with an error that says which.
func TestRefusals(t *testing.T) {
	c := cases.FourPoint(10, 3, 2500, 30e3, 0.1, 6)
	c.S.Ends, c.S.Kind, c.S.Law, c.S.Given, c.S.CableOf, c.S.Stiffness, c.S.Unstressed, c.S.Cables = nil, nil, nil, nil, nil, nil, nil, nil
	_, err := newton.New(ctx, c.S)
	var free *newton.FreeEdgeError
	assert.ErrorAs(t, err, &free)

	for _, v := range []struct {
		p    [2]float64
		want error
	}{{[2]float64{0, 0}, newton.ErrNotTension}, {[2]float64{-1, -1}, newton.ErrNotTension}} {
		c = cases.SchwarzD(4, 1)
		for k := range c.S.Stress {
			c.S.Stress[k] = v.p
		}
		_, _, err = newton.Engine{}.Find(ctx, c.S, nil, engine.Settings{})
		assert.ErrorIs(t, err, v.want, fmt.Sprint(v.p))
	}
	c = cases.SchwarzD(4, 1)
	c.S.Fabrics[0].Elastic = true
	_, err = newton.New(ctx, c.S)
	assert.ErrorIs(t, err, newton.ErrElasticFabric)

	c = cases.SchwarzD(4, 1)
	c.S.Position[6] = c.S.Position[7]
	_, _, err = newton.Engine{}.Find(ctx, c.S, nil, engine.Settings{})
	var thin *newton.DegenerateError
	assert.ErrorAs(t, err, &thin)
}
