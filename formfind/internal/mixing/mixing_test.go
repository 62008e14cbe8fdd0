package mixing_test

import (
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/mat"

	"anticlast/formfind/internal/mixing"
)

// The weights are those of a dense QR (gonum), and a difference that repeats a
// newer one is left out.
func TestWeightsAreTheLeastSquares(t *testing.T) {
	rnd := rand.New(rand.NewPCG(1, 2))
	const n, m = 12, 4
	df := make([][]float64, m)
	a := mat.NewDense(n, m, nil)
	for k := range df {
		df[k] = make([]float64, n)
		for i := range df[k] {
			df[k][i] = rnd.NormFloat64()
			a.Set(i, m-1-k, df[k][i])
		}
	}
	f := make([]float64, n)
	for i := range f {
		f[i] = rnd.NormFloat64()
	}
	var want mat.VecDense
	require.NoError(t, want.SolveVec(a, mat.NewVecDense(n, f)))
	gamma, kept := mixing.Weights(df, f, 1e-8)
	require.Equal(t, []int{3, 2, 1, 0}, kept)
	require.InDeltaSlice(t, want.RawVector().Data, gamma, 1e-12)
	_, kept = mixing.Weights(append([][]float64{df[3]}, df...), f, 1e-8)
	require.Equal(t, []int{4, 3, 2, 1}, kept)
}
