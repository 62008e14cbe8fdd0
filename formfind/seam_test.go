package formfind_test

import (
	"math"
	"os"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind"
	"anticlast/formfind/canopy"
)

// Three films of equal stress on one free seam meet at 120° all along it
// (Plateau's law: three equal pulls across a line balance only so; Isenberg
// 1992, The Science of Soap Films), films of other stress at the angles of the
// triangle that their stresses make.
func TestThreeFilmsOnASeam(t *testing.T) {
	text, err := os.ReadFile("../examples/three-wings.yaml")
	require.NoError(t, err)
	for _, c := range []struct {
		set  []string
		want [3]float64 // angle opposite left, right and fin, in degrees
	}{
		{nil, [3]float64{120, 120, 120}},
		// cos γ = (c² − a² − b²)/2ab between the films a and b, by the law of
		// cosines in their closed triangle of pulls.
		{[]string{"fabrics.fin.prestress=1.2 kN/m"}, [3]float64{113.578, 113.578, 132.844}},
	} {
		m := read(t, string(text), c.set...)
		for i := range m.Fabrics {
			m.Fabrics[i].MeshSize = 0.2
		}
		r, err := formfind.Find(t.Context(), m, formfind.Options{})
		require.NoError(t, err)
		trusted(t, r)
		s, at := r.Structure, r.Form.Position
		var seam []int32
		for _, l := range s.Lines {
			if l.Name == "seam" {
				seam = l.Nodes
			}
		}
		require.Greater(t, len(seam), 20)
		// Across each side of the middle half of the seam: the direction of
		// each film away from it.
		var sum [3]float64
		n := 0
		for j := len(seam) / 4; j < 3*len(seam)/4; j++ {
			a, b := seam[j], seam[j+1]
			along := r3.Unit(r3.Sub(at[b], at[a]))
			var away [3]r3.Vec
			found := 0
			for k, corner := range s.Corners {
				for i := range 3 {
					p, q, o := corner[i], corner[(i+1)%3], corner[(i+2)%3]
					if p == a && q == b || p == b && q == a {
						d := r3.Sub(at[o], at[a])
						away[s.FabricOf[k]] = r3.Unit(r3.Sub(d, r3.Scale(r3.Dot(d, along), along)))
						found++
					}
				}
			}
			require.Equal(t, 3, found, "films at a side of the seam")
			for i := range 3 {
				sum[i] += math.Acos(r3.Dot(away[(i+1)%3], away[(i+2)%3])) * 180 / math.Pi
			}
			n++
		}
		for i := range 3 {
			require.InDelta(t, c.want[i], sum[i]/float64(n), 1.0)
		}
		for _, f := range r.Findings {
			require.NotEqual(t, canopy.Broken, f.Severity, f.Text)
		}
	}
}
