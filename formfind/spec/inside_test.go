package spec_test

import (
	"testing"

	"anticlast/formfind/canopy"

	"github.com/stretchr/testify/require"
)

const courtyard = `anticlast: 1
points:
  A: [0, 0, 4]
  B: [12, 0, 5]
  C: [12, 9, 4]
  D: [0, 9, 5]
  P: [3, 4, 4]
  Q: [5, 4, 4]
  R: [4, 6, 4]
  S: [8, 3, 6]
  T: [9, 6, 6]
  X: [7, 7, 4.5]
edges:
  AB: {from: A, to: B, cable: &rim {sag: 10 %}}
  BC: {from: B, to: C, cable: *rim}
  CD: {from: C, to: D, cable: *rim}
  DA: {from: D, to: A, cable: *rim}
  PQ: {from: P, to: Q, fixed: straight}
  QR: {from: Q, to: R, fixed: straight}
  RP: {from: R, to: P, fixed: straight}
  ST: {from: S, to: T, cable: {force: 20 kN}}
fabrics:
  sail: {boundary: [AB, BC, CD, DA], holes: [[PQ, QR, RP]], lines: [ST], inside: [X], prestress: 2 kN/m}
`

func TestFabricsHaveHolesLinesAndPointsInside(t *testing.T) {
	m := read(t, courtyard)
	f := m.Fabrics[0]
	require.Equal(t, [][]string{{"PQ", "QR", "RP"}}, f.Holes)
	require.Equal(t, []string{"ST"}, f.Lines)
	require.Equal(t, []string{"X"}, f.Inside)
	require.Equal(t, canopy.KindCable, m.Edges[7].Role, "a line inside is no edge cable")
	require.NoError(t, compiled(t, "").Validate(plain(t, []byte(courtyard))))
}
