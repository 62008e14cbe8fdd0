package formfind_test

import (
	"context"
	"fmt"
	"math"
	"strings"
	"testing"

	"anticlast/formfind"
	"anticlast/formfind/canopy"
	"anticlast/formfind/spec"
	"github.com/stretchr/testify/require"
)

func findText(t *testing.T, text string) *canopy.Result {
	t.Helper()
	m, err := spec.Read(context.Background(), spec.Input(strings.NewReader(text), "."), spec.Options{})
	require.NoError(t, err)
	r, err := formfind.Find(context.Background(), m, formfind.Options{})
	require.NoError(t, err)
	return r
}

// A ring that slides on a mast with thrust F in a film of stress σ is part of a
// catenoid with F = 2πσc, since the vertical pull of the film is the same at
// every height (closed form, Euler's catenoid): it stands
// c·(arcosh(R/c) − arcosh(r/c)) above the rim.
func TestSlidingRingStandsWhereTheCatenoidSays(t *testing.T) {
	const R, r, stress = 3.0, 0.9, 1500.0
	for _, force := range []float64{4000, 7000} {
		res := findText(t, fmt.Sprintf(`
anticlast: 1
mesh: 250 mm
points: {E: [3, 0, 2], W: [-3, 0, 2], P: [0, 0, 2.8], F: [0, 0, 0]}
edges:
  n: {from: E, to: W, fixed: {through: [0, 3, 2]}}
  s: {from: W, to: E, fixed: {through: [0, -3, 2]}}
rings: {top: {at: P, radius: 900 mm, free: [z]}}
fabrics: {cone: {boundary: [n, s], ring: top, prestress: 1.5 kN/m}}
masts: {M: {foot: F, head: P, force: %g kN}}
`, force/1e3))
		require.True(t, res.Audit.Trusted, res.Audit.Reasons)
		c := force / (2 * math.Pi * stress)
		want := 2 + c*(math.Acosh(R/c)-math.Acosh(r/c))
		got := res.Form.Position[res.Structure.Rings[0].Centre].Z
		require.InDelta(t, want, got, 0.01*(want-2))
	}
}

// A mast on a cross of cables carries a ring: nothing but cables holds it.
func TestFlyingMastKeepsItsLaw(t *testing.T) {
	const model = `
anticlast: 1
mesh: 500 mm
points:
  A: [6, 0, 3]
  B: [0, 6, 3]
  C: [-6, 0, 3]
  D: [0, -6, 3]
  P: [0, 0, 4.3]
  F: {x: 0, y: 0, z: 2.5, hold: free}
edges:
  AB: {from: A, to: B, cable: &rim {force: 20 kN}}
  BC: {from: B, to: C, cable: *rim}
  CD: {from: C, to: D, cable: *rim}
  DA: {from: D, to: A, cable: *rim}
  AF: {from: A, to: F, cable: &cross {force: 15 kN}}
  BF: {from: B, to: F, cable: *cross}
  CF: {from: C, to: F, cable: *cross}
  DF: {from: D, to: F, cable: *cross}
rings: {top: {at: P, radius: 900 mm, free: [z]}}
fabrics: {cone: {boundary: [AB, BC, CD, DA], ring: top, prestress: 1.5 kN/m}}
masts: {M: {foot: F, head: P, %s}}
`
	mast := func(r *canopy.Result) (force, length float64) {
		for i, c := range r.Structure.Cables {
			if c.Name == "M" {
				return r.Form.Force[c.Members[0]], r.Summary.Cables[i].Length
			}
		}
		t.Fatal("no mast")
		return
	}
	r := findText(t, fmt.Sprintf(model, "length: 1.8 m"))
	require.True(t, r.Audit.Trusted, r.Audit.Reasons)
	force, length := mast(r)
	require.InDelta(t, 1.8, length, 1e-9)
	// The thrust found, given, leads back to the same length.
	r = findText(t, fmt.Sprintf(model, fmt.Sprintf("force: %.12g N", -force)))
	require.True(t, r.Audit.Trusted, r.Audit.Reasons)
	again, length := mast(r)
	require.InDelta(t, force, again, 1e-9*-force)
	require.InDelta(t, 1.8, length, 1e-3)
}
