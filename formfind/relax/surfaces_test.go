package relax_test

import (
	"context"
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/internal/sweep"
	"anticlast/formfind/relax"
)

// farOff is the largest distance of the nodes from the exact surface.
func farOff(c *cases.Case, f *canopy.Form) float64 {
	d := 0.0
	for _, p := range f.Position {
		d = max(d, math.Abs(c.Distance(p)))
	}
	return d
}

// Published surfaces of uniform stress from the start of uniform force
// densities, which knows nothing of them; the sources are beside the cases.
// Errors of place and area fall with the square of the mesh size.
func TestSurfacesConvergeSecondOrder(t *testing.T) {
	fine := sweep.N(4, 8, 16)
	for _, k := range []struct {
		name string
		make func(m int) cases.Case
	}{
		{"catenoid h=0.1", func(m int) cases.Case { return cases.Catenoid(0.1, 64*m, 4*m, true, 1000) }},
		{"catenoid h=0.5", func(m int) cases.Case { return cases.Catenoid(0.5, 24*m, 8*m, true, 1000) }},
		{"catenoid h=0.65", func(m int) cases.Case { return cases.Catenoid(0.65, 24*m, 8*m, true, 1000) }},
		{"Scherk half=0.5", func(m int) cases.Case { return cases.Scherk(0.5, 8*m, 2500) }},
		{"Scherk half=1", func(m int) cases.Case { return cases.Scherk(1, 8*m, 2500) }},
		{"Schwarz D", func(m int) cases.Case { return cases.SchwarzD(8*m, 2500) }},
	} {
		t.Run(k.name, func(t *testing.T) {
			var area, place float64
			for _, m := range []int{fine / 2, fine} {
				c := k.make(m)
				f := relaxed(t, relax.New(), c.S, linearStart(c.S, 4), engine.Settings{})
				a := math.Abs(cases.Area(c.S, f.Position)/c.Area - 1)
				p := 0.0
				if c.Distance != nil {
					p = farOff(&c, f)
				}
				if area > 0 {
					t.Logf("area off by %.1e, order %.2f; place off by %.1e m, order %.2f", a, math.Log2(area/a), p, math.Log2(place/p))
					assert.Greater(t, math.Log2(area/a), 1.8)
					assert.Less(t, a, 2e-2)
					if p > 0 {
						assert.Greater(t, math.Log2(place/p), 1.8)
					}
				}
				area, place = a, p
			}
		})
	}
}

// Both ways of damping end on the same surface, though their nodes may have
// slid in it: nodes of one lie on the surface of the other to the square of
// the mesh size. On a cable net they are the same nodes.
func TestKineticAndViscousDampingAgree(t *testing.T) {
	for _, c := range []cases.Case{
		cases.Catenoid(0.5, 32, 12, true, 1000),
		cases.FourPoint(10, 4, 2000, 20000, 0.1, 12),
		cases.EdgeCableStrip(10, 8, 3000, 39000, 16, 12),
	} {
		start := linearStart(c.S, 4)
		a := relaxed(t, relax.New(), c.S, start, engine.Settings{})
		b := relaxed(t, &relax.Engine{Viscous: true}, c.S, start, engine.Settings{})
		assert.InEpsilon(t, cases.Area(c.S, a.Position), cases.Area(c.S, b.Position), 1e-6, c.Name)
		ra, rb := sumReactions(a), sumReactions(b)
		assert.InEpsilon(t, ra, rb, 1e-4, c.Name)
	}
}

func sumReactions(f *canopy.Form) (s float64) {
	for _, r := range f.Reaction {
		s += r3.Norm(r)
	}
	return s
}

// A film under pressure on a ring of radius 5 m with 5 kN/m: spherical caps of
// rise f with p = 4σf/(a²+f²) (Laplace-Young for one membrane).
func TestPressureMakesASphericalCap(t *testing.T) {
	for _, c := range []struct{ p, rise float64 }{{200, 0.250628144669}, {500, 0.635083268963}, {1000, 1.33974596216}, {1600, 2.5}} {
		var last float64
		radius := (25 + c.rise*c.rise) / (2 * c.rise)
		for _, rings := range []int{8, 16} {
			s := disc(5, rings, canopy.Fabric{Pressure: c.p}, 5000)
			f := relaxed(t, relax.New(), s, nil, engine.Settings{})
			off := 0.0
			for _, p := range f.Position {
				off += math.Abs(r3.Norm(r3.Sub(p, r3.Vec{Z: c.rise - radius})) - radius)
			}
			off /= float64(len(f.Position))
			// The edge carries p·a/2 per metre: in all the pressure on the disc,
			// up to what the nodes' own directions leave of it.
			up := 0.0
			for _, r := range f.Reaction {
				up += r.Z
			}
			n := float64(6 * rings)
			upOff := math.Abs(up/(-c.p*n/2*25*math.Sin(2*math.Pi/n)) - 1)
			if last > 0 {
				t.Logf("p=%g: place off by %.1e m, order %.2f; reaction off by %.1e", c.p, off, math.Log2(last/off), upOff)
				assert.Greater(t, math.Log2(last/off), 1.8, "order at p = %g", c.p)
				assert.Less(t, off, 1e-2)
				assert.Less(t, upOff, 1e-4)
			}
			last = off
		}
	}
}

// Above p = 2σ/a the bubble is past the hemisphere: there is no equilibrium.
func TestPressureBeyondTheHemisphereIsNotConverged(t *testing.T) {
	s := disc(5, 8, canopy.Fabric{Pressure: 2100}, 5000)
	for _, e := range []*relax.Engine{relax.New(), {Viscous: true}} {
		f, out, err := e.Find(context.Background(), s, nil, engine.Settings{MaxIterations: 20000})
		require.NoError(t, err)
		assert.NotEqual(t, engine.Converged, out.Status)
		assert.NotEmpty(t, out.Why)
		assertFinite(t, f)
	}
}

func assertFinite(t *testing.T, f *canopy.Form) {
	t.Helper()
	for _, p := range f.Position {
		require.False(t, math.IsNaN(p.X+p.Y+p.Z) || math.IsInf(p.X+p.Y+p.Z, 0))
	}
	for _, n := range f.Force {
		require.False(t, math.IsNaN(n) || math.IsInf(n, 0))
	}
}

// No catenoid spans rings farther apart than 1.3255 R (half separation
// 0.662743 R; Goldschmidt 1831): whatever happens must not be called a shape.
func TestCatenoidBeyondTheCriticalSeparationIsNotConverged(t *testing.T) {
	for _, h := range []float64{0.67, 0.7, 0.8, 1.2} {
		c := cases.Catenoid(h, 32, 12, true, 1000)
		for _, e := range []*relax.Engine{relax.New(), {Viscous: true}} {
			for name, start := range map[string]*canopy.Form{"rough": nil, "linear": linearStart(c.S, 4)} {
				f, out, err := e.Find(context.Background(), c.S, start, engine.Settings{MaxIterations: 50000})
				require.NoError(t, err)
				assert.NotEqual(t, engine.Converged, out.Status, "h = %g from the %s start, %s", h, name, e.Name())
				assert.NotEmpty(t, out.Why)
				assert.False(t, f.Converged)
				assertFinite(t, f)
			}
		}
	}
}

// An edge cable against a uniform film is an arc of radius T/σ: chord 10 m,
// sag 1 m, R = 13 m for 39 kN and 3 kN/m, arc length 10.2645691121938 m
// (elementary statics). The same by given sag, length and stiffness.
func TestEdgeCableAgainstAFilm(t *testing.T) {
	given := cases.EdgeCableStrip(10, 8, 3000, 39000, 40, 32)
	force := relaxed(t, relax.New(), given.S, linearStart(given.S, 4), engine.Settings{})
	arc := cases.CableLength(given.S, 0, force.Position)
	sag := cases.CableSag(given.S, 0, force.Position)
	assert.InEpsilon(t, 10.2645691121938, arc, 1e-3)
	assert.InEpsilon(t, 0.1, sag, 5e-3)

	for _, law := range []canopy.CableLaw{canopy.CableSag, canopy.CableLength, canopy.CableElastic} {
		for _, guess := range []float64{0, 25000, 60000} {
			c := cases.EdgeCableStrip(10, 8, 3000, 39000, 40, 32)
			s := c.S
			s.CableOf = make([]int32, len(s.Ends))
			for k := range s.Ends {
				s.CableOf[k] = 0
				s.Law[k] = canopy.LawCable
				s.Given[k] = guess
			}
			cable := &s.Cables[0]
			cable.Law = law
			switch law {
			case canopy.CableSag:
				cable.Value = sag
			case canopy.CableLength:
				cable.Value = arc
			case canopy.CableElastic:
				cable.Stiffness = 4e6
				cable.Unstressed = arc / (1 + 39000/4e6)
			}
			eachDamping(t, func(t *testing.T, e engine.Engine) {
				f := relaxed(t, e, s, force, engine.Settings{})
				for k := range s.Ends {
					assert.InEpsilon(t, 39000, f.Force[k], 1e-3, "law %d from %g N", law, guess)
					assert.InEpsilon(t, f.Force[0], f.Force[k], 1e-12)
				}
				switch law {
				case canopy.CableSag:
					assert.InEpsilon(t, sag, cases.CableSag(s, 0, f.Position), 2e-9)
				case canopy.CableLength:
					assert.InEpsilon(t, arc, cases.CableLength(s, 0, f.Position), 2e-9)
				}
			})
		}
	}
}

// A rigid ring that slides on a mast under a given force F is in balance where
// F = 2πσc, c the parameter of the catenoid between ring and base; of two
// heights the lower one is stable.
func TestRingSlidesToItsHeight(t *testing.T) {
	const rBase, rTop, stress, force = 5.0, 0.5, 2000.0, 2500.0
	c := force / (2 * math.Pi * stress)
	want := cases.ConeHeight(rBase, rTop, c, 1)
	var last float64
	for _, m := range []int{1, 2} {
		k := cases.RingOnMast(rBase, rTop, 0.3, stress, force, 32*m, 10*m)
		f := relaxed(t, relax.New(), k.S, linearStart(k.S, 4), engine.Settings{})
		centre := k.S.Rings[0].Centre
		off := math.Abs(f.Position[centre].Z/want - 1)
		for _, i := range k.S.Rings[0].Nodes {
			assert.InDelta(t, f.Position[centre].Z, f.Position[i].Z, 1e-12)
			assert.InDelta(t, rTop, math.Hypot(f.Position[i].X, f.Position[i].Y), 1e-9)
		}
		if last > 0 {
			t.Logf("height %g, exact %g, order %.2f", f.Position[centre].Z, want, math.Log2(last/off))
			assert.Greater(t, math.Log2(last/off), 1.7)
			assert.Less(t, off, 1e-2)
		}
		last = off
	}
}

// Three films of equal stress meet at 120° (Plateau 1873; J. Taylor 1976): the
// seam goes to the Fermat point of the three lines that hold the films.
func TestThreeFilmsMeetAt120Degrees(t *testing.T) {
	eachDamping(t, func(t *testing.T, e engine.Engine) {
		c := cases.ThreeFilms([3]float64{0, 2, 4}, 1, 1000, 6)
		f := relaxed(t, e, c.S, c.Form(c.Disturbed(c.S.Position, 0.02, 0)), engine.Settings{})
		// Nodes that belong to all three films are those of the seam.
		in := make([]map[int32]bool, len(f.Position))
		for k, tri := range c.S.Corners {
			for _, i := range tri {
				if in[i] == nil {
					in[i] = map[int32]bool{}
				}
				in[i][c.S.FabricOf[k]] = true
			}
		}
		seam := 0
		for i, m := range in {
			if len(m) != 3 {
				continue
			}
			seam++
			var u [3]r3.Vec
			for k, a := range []float64{0, 2, 4} {
				sin, cos := math.Sincos(a)
				d := r3.Sub(r3.Vec{X: cos, Y: sin}, f.Position[i])
				d.Z = 0
				u[k] = r3.Unit(d)
			}
			assert.InDelta(t, -0.5, r3.Dot(u[0], u[1]), 1e-6)
			assert.InDelta(t, -0.5, r3.Dot(u[1], u[2]), 1e-6)
		}
		assert.Equal(t, 7, seam)
	})
}

// A film whose border nothing holds shrinks away; it must not pass for a shape
// because its inside is smooth.
func TestFilmWithAFreeBorderIsNotConverged(t *testing.T) {
	c := cases.EdgeCableStrip(10, 8, 3000, 39000, 12, 8)
	s := *c.S
	s.Ends, s.Kind, s.Law, s.Given, s.Cables, s.CableOf = nil, nil, nil, nil, nil, nil
	for _, e := range []*relax.Engine{relax.New(), {Viscous: true}} {
		_, out, err := e.Find(context.Background(), &s, nil, engine.Settings{MaxIterations: 20000})
		require.NoError(t, err)
		assert.NotEqual(t, engine.Converged, out.Status, e.Name())
	}
}
