package surface_test

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"github.com/stretchr/testify/require"

	"anticlast/formfind/surface"
)

// The quantiles found by selection are those that sorting finds, with ties, few
// different values, and orders that are hard on a guess.
func TestSpreadSelectsWhatSortingFinds(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	for trial := range 300 {
		n := 1 + rng.IntN(400)
		different := 1 + rng.IntN(2*n)
		v, w := make([]float64, n), make([]float64, n)
		for i := range v {
			v[i], w[i] = float64(rng.IntN(different)), float64(1+rng.IntN(9))
		}
		switch trial % 4 {
		case 1:
			slices.Sort(v)
		case 2:
			slices.Sort(v)
			slices.Reverse(v)
		case 3: // a roof
			slices.Sort(v)
			slices.Reverse(v[n/2:])
		}
		order := make([]int, n)
		total := 0.0
		for i := range order {
			order[i] = i
			total += w[i]
		}
		slices.SortFunc(order, func(a, b int) int { return int(v[a] - v[b]) })
		at := func(q float64) float64 {
			sum := 0.0
			for _, i := range order {
				if sum += w[i]; sum >= q*total {
					return v[i]
				}
			}
			return math.NaN()
		}
		got := surface.Spread(v, w)
		require.Equal(t, at(0.05), got.P5)
		require.Equal(t, at(0.95), got.P95)
		require.Equal(t, slices.Min(v), got.Min)
		require.Equal(t, slices.Max(v), got.Max)
	}
}
