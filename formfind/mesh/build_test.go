package mesh_test

import (
	"context"
	"math"
	"reflect"
	"testing"

	"anticlast/formfind/canopy"
	"anticlast/formfind/mesh"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

func build(t testing.TB, m *canopy.Model) *canopy.Structure {
	t.Helper()
	s, err := mesh.Build(context.Background(), m)
	require.NoError(t, err)
	return s
}

// topology counts vertices, edges and triangles and checks that the surface is
// sound: every side has one or two triangles that pass it in opposite directions.
func topology(t interface {
	require.TestingT
	Helper()
}, s *canopy.Structure) (v, e, f int) {
	t.Helper()
	type side struct{ a, b int32 }
	seen := map[side]int{}
	vertex := map[int32]bool{}
	for _, c := range s.Corners {
		for k := range 3 {
			a, b := c[k], c[(k+1)%3]
			vertex[a] = true
			seen[side{a, b}]++
			require.LessOrEqual(t, seen[side{a, b}], 1, "side %d-%d passed twice in one direction", a, b)
		}
	}
	for d := range seen {
		if d.a < d.b || seen[side{d.b, d.a}] == 0 {
			e++
		}
	}
	return len(vertex), e, len(s.Corners)
}

func angles(s *canopy.Structure) (least float64) {
	least = math.Pi
	for _, c := range s.Corners {
		for k := range 3 {
			p, q, r := s.Position[c[k]], s.Position[c[(k+1)%3]], s.Position[c[(k+2)%3]]
			u, v := r3.Sub(q, p), r3.Sub(r, p)
			least = min(least, math.Atan2(r3.Norm(r3.Cross(u, v)), r3.Dot(u, v)))
		}
	}
	return least
}

func TestModelsMeshSoundly(t *testing.T) {
	euler := map[string]int{"cone": 0} // a ring is a hole
	for name, model := range all {
		t.Run(name, func(t *testing.T) {
			s := build(t, model())
			require.NoError(t, mesh.Validate(s))
			seen := map[r3.Vec]int{}
			for i, p := range s.Position {
				if j, twice := seen[p]; twice {
					t.Errorf("nodes %s and %s at the same place", s.NodeName.At(i), s.NodeName.At(j))
				}
				seen[p] = i
			}
			names := map[string]bool{}
			for i := range s.Position {
				require.False(t, names[s.NodeName.At(i)], s.NodeName.At(i))
				names[s.NodeName.At(i)] = true
			}
			names = map[string]bool{}
			for i := range s.Ends {
				require.False(t, names[s.MemberName.At(i)], s.MemberName.At(i))
				names[s.MemberName.At(i)] = true
			}
			v, e, f := topology(t, s)
			t.Logf("%d nodes, %d members, %d triangles, least angle %.1f°", len(s.Position), len(s.Ends), f, angles(s)*180/math.Pi)
			if f == 0 {
				return
			}
			want, ok := euler[name]
			if !ok {
				want = 1
			}
			require.Equal(t, want, v-e+f, "Euler characteristic")
			require.Greater(t, angles(s), 15*math.Pi/180)
			require.Greater(t, f, 800)
			require.Less(t, f, 4000)
			for _, c := range s.Corners { // the positive side looks up
				n := r3.Cross(r3.Sub(s.Position[c[1]], s.Position[c[0]]), r3.Sub(s.Position[c[2]], s.Position[c[0]]))
				require.Greater(t, n.Z, 0.0)
			}
			again := build(t, model())
			require.True(t, reflect.DeepEqual(s, again), "same model, same structure")
		})
	}
}

// mirrored reports whether the mesh is its own image under f.
func mirrored(t testing.TB, s *canopy.Structure, f func(r3.Vec) r3.Vec) {
	t.Helper()
	key := func(p r3.Vec) [3]int64 {
		return [3]int64{int64(math.Round(p.X * 1e6)), int64(math.Round(p.Y * 1e6)), int64(math.Round(p.Z * 1e6))}
	}
	at := map[[3]int64]int32{}
	for i, p := range s.Position {
		at[key(p)] = int32(i)
	}
	sorted := func(c [3]int32) [3]int32 {
		a, b, d := min(c[0], c[1], c[2]), max(c[0], c[1], c[2]), c[0]+c[1]+c[2]
		return [3]int32{a, d - a - b, b}
	}
	tri := map[[3]int32]bool{}
	for _, c := range s.Corners {
		tri[sorted(c)] = true
	}
	for _, c := range s.Corners {
		var im [3]int32
		for k, i := range c {
			j, ok := at[key(f(s.Position[i]))]
			require.True(t, ok, "node %s has no image", s.NodeName.At(int(i)))
			im[k] = j
		}
		require.True(t, tri[sorted(im)], "triangle %v has no image", c)
	}
}

func TestSymmetricModelsHaveSymmetricMeshes(t *testing.T) {
	flipX := func(p r3.Vec) r3.Vec { p.X = -p.X; return p }
	flipY := func(p r3.Vec) r3.Vec { p.Y = -p.Y; return p }
	turn := func(p r3.Vec) r3.Vec { return r3.Vec{X: -p.Y, Y: p.X, Z: p.Z} }
	mirrored(t, build(t, polygon(4)), flipX)
	mirrored(t, build(t, polygon(4)), flipY)
	flat := func(n int) *canopy.Model {
		m := polygon(n)
		for i := range m.Points {
			m.Points[i].At.Z = 2
		}
		return m
	}
	mirrored(t, build(t, flat(5)), flipY)
	mirrored(t, build(t, polygon(6)), flipY)
	mirrored(t, build(t, flat(7)), flipY)
	mirrored(t, build(t, flat(3)), flipY)
	mirrored(t, build(t, ridges()), flipX)
	c := cone()
	mirrored(t, build(t, c), turn)
	mirrored(t, build(t, c), flipX)
	mirrored(t, build(t, vault()), func(p r3.Vec) r3.Vec { p.Y = 10 - p.Y; return p })
	mirrored(t, build(t, vault()), func(p r3.Vec) r3.Vec { p.X = 12 - p.X; return p })
	mirrored(t, build(t, lens()), flipY)
	mirrored(t, build(t, lens()), func(p r3.Vec) r3.Vec { p.X = 10 - p.X; return p })
}
