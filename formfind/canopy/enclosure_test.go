package canopy_test

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// box is a structure of a tetrahedron, every side a fabric of its own; turned
// lists those whose triangles look inwards.
func box(turned ...int) *canopy.Structure {
	s := &canopy.Structure{Position: []r3.Vec{{}, {X: 1}, {Y: 1}, {Z: 1}}, Fixed: make([]canopy.Freedom, 4)}
	for i, c := range [][3]int32{{0, 2, 1}, {0, 1, 3}, {1, 2, 3}, {2, 0, 3}} {
		for _, k := range turned {
			if k == i {
				c[1], c[2] = c[2], c[1]
			}
		}
		s.Corners = append(s.Corners, c)
		s.FabricOf = append(s.FabricOf, int32(i))
		s.Warp, s.Stress = append(s.Warp, r3.Vec{X: 1, Y: 2, Z: 3}), append(s.Stress, [2]float64{1, 1})
		s.Fabrics = append(s.Fabrics, canopy.Fabric{Name: string(rune('a' + i))})
	}
	return s
}

func TestSidesOfAnEnclosureLookOutTogether(t *testing.T) {
	e, err := box().Enclose("a", []int32{0, 1, 2, 3}, 1, 1)
	require.NoError(t, err)
	assert.Equal(t, []int8{1, 1, 1, 1}, e.Side)
	e, err = box(1, 3).Enclose("a", []int32{0, 3, 2, 1}, -1, 1)
	require.NoError(t, err)
	assert.Equal(t, []int8{-1, 1, -1, 1}, e.Side)
}

func TestWhatCanCloseAVolume(t *testing.T) {
	for _, c := range []struct {
		name    string
		fabrics []int32
		change  func(s *canopy.Structure)
		want    string
	}{
		{"a boundary that may leave its plane", []int32{1, 2, 3}, nil, "its boundary can move out of its plane at node 0"},
		{"held in its plane", []int32{1, 2, 3}, func(s *canopy.Structure) {
			for i := range 3 {
				s.Fixed[i] = canopy.DirZ
			}
		}, ""},
		{"not in a plane", []int32{2, 3}, func(s *canopy.Structure) {
			for i := range s.Fixed {
				s.Fixed[i] = canopy.DirAll
			}
		}, "does not lie in a plane"},
		{"three films at one line", []int32{0, 1, 2, 3}, func(s *canopy.Structure) {
			s.Position = append(s.Position, r3.Vec{X: 2, Y: 2})
			s.Fixed = append(s.Fixed, 0)
			s.Corners = append(s.Corners, [3]int32{0, 1, 4})
			s.FabricOf = append(s.FabricOf, 0)
		}, "3 films of it meet between nodes 0 and 1"},
		{"one side only", []int32{0}, func(s *canopy.Structure) {
			s.Corners = append(s.Corners, [3]int32{0, 1, 3})
			s.Corners[0] = [3]int32{0, 1, 2}
			s.FabricOf = append(s.FabricOf, 0)
		}, "has its inner and its outer side on one side"},
		{"no triangles", []int32{0}, func(s *canopy.Structure) { s.Corners, s.FabricOf = nil, nil }, "no triangles"},
	} {
		s := box()
		if c.change != nil {
			c.change(s)
		}
		_, err := s.Enclose("a", c.fabrics, 1, 1)
		if c.want == "" {
			require.NoError(t, err, c.name)
			continue
		}
		var wrong *canopy.EnclosureError
		require.ErrorAs(t, err, &wrong, c.name)
		assert.Contains(t, err.Error(), c.want, c.name)
		assert.NotEmpty(t, wrong.WayOut)
	}
}

func TestValidateLooksAtEnclosures(t *testing.T) {
	s := box()
	e, err := s.Enclose("a", []int32{0, 1, 2, 3}, 1, 1)
	require.NoError(t, err)
	s.Enclosures = []canopy.Enclosure{e}
	require.NoError(t, s.Validate())
	s.Enclosures = append(s.Enclosures, e)
	require.ErrorContains(t, s.Validate(), "fabric a bounds two volumes")
	s.Enclosures = []canopy.Enclosure{e}
	s.Enclosures[0].Side = []int8{1, 1, 1, -1}
	require.ErrorContains(t, s.Validate(), "sides do not look out")
	s.Enclosures[0].Side = []int8{1}
	require.ErrorContains(t, s.Validate(), "4 fabrics and 1 sides")
	s.Enclosures[0] = e
	s.Enclosures[0].Side = []int8{1, 1, 1, 1}
	s.Enclosures[0].Base = 9
	require.ErrorContains(t, s.Validate(), "no node 9")
}
