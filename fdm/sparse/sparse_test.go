package sparse

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// system is a matrix in the form Refactor takes.
type system struct {
	n      int
	pairs  [][2]int32
	values []float64
}

func (s *system) dense() *mat.SymDense {
	m := mat.NewSymDense(s.n, nil)
	for i := range s.n {
		m.SetSym(i, i, s.values[i])
	}
	for k, p := range s.pairs {
		i, j := int(p[0]), int(p[1])
		m.SetSym(i, j, m.At(i, j)+s.values[s.n+k])
	}
	return m
}

// mul does y = A·x for one right-hand side.
func (s *system) mul(y, x []float64) {
	for i := range s.n {
		y[i] = s.values[i] * x[i]
	}
	for k, p := range s.pairs {
		v := s.values[s.n+k]
		y[p[0]] += v * x[p[1]]
		if p[0] != p[1] {
			y[p[1]] += v * x[p[0]]
		}
	}
}

// backwardError is ‖b−Ax‖∞ / (‖A‖∞‖x‖∞ + ‖b‖∞), x and b row by row.
func (s *system) backwardError(x, b []float64, nrhs int) float64 {
	norm := make([]float64, s.n)
	for i := range s.n {
		norm[i] = math.Abs(s.values[i])
	}
	for k, p := range s.pairs {
		v := math.Abs(s.values[s.n+k])
		norm[p[0]] += v
		if p[0] != p[1] {
			norm[p[1]] += v
		}
	}
	var normA float64
	for _, v := range norm {
		normA = max(normA, v)
	}
	worst := 0.0
	xr, br, y := make([]float64, s.n), make([]float64, s.n), make([]float64, s.n)
	for r := range nrhs {
		var nx, nb, nr float64
		for i := range s.n {
			xr[i], br[i] = x[i*nrhs+r], b[i*nrhs+r]
			nx, nb = max(nx, math.Abs(xr[i])), max(nb, math.Abs(br[i]))
		}
		s.mul(y, xr)
		for i := range s.n {
			if d := math.Abs(br[i] - y[i]); d > nr || math.IsNaN(d) {
				nr = d
			}
		}
		if den := normA*nx + nb; den > 0 {
			nr /= den
		}
		if math.IsNaN(nr) {
			return nr
		}
		worst = max(worst, nr)
	}
	return worst
}

// laplacian of a graph with weights in [0.5, 2) and a little ground at each node.
func laplacian(rng *rand.Rand, n int, pairs [][2]int32) *system {
	s := &system{n: n, pairs: pairs, values: make([]float64, n+len(pairs))}
	for i := range n {
		s.values[i] = 1e-3 + rng.Float64()
	}
	for k, p := range pairs {
		q := 0.5 + 1.5*rng.Float64()
		if p[0] == p[1] {
			s.values[n+k] = q
			continue
		}
		s.values[n+k] = -q
		s.values[p[0]] += q
		s.values[p[1]] += q
	}
	return s
}

func gridPairs(w, h int, diagonals bool) (int, [][2]int32) {
	var pairs [][2]int32
	at := func(i, j int) int32 { return int32(i*w + j) }
	for i := range h {
		for j := range w {
			if j+1 < w {
				pairs = append(pairs, [2]int32{at(i, j), at(i, j+1)})
			}
			if i+1 < h {
				pairs = append(pairs, [2]int32{at(i+1, j), at(i, j)})
			}
			if diagonals && i+1 < h && j+1 < w {
				pairs = append(pairs, [2]int32{at(i, j), at(i+1, j+1)})
			}
		}
	}
	return w * h, pairs
}

// randomPairs is a random graph with some duplicates and loops.
func randomPairs(rng *rand.Rand, n, m int) [][2]int32 {
	pairs := make([][2]int32, 0, m)
	for range m {
		p := [2]int32{rng.Int32N(int32(n)), rng.Int32N(int32(n))}
		pairs = append(pairs, p)
		if rng.IntN(10) == 0 {
			pairs = append(pairs, [2]int32{p[1], p[0]})
		}
	}
	return pairs
}

func starPairs(n int) [][2]int32 {
	var pairs [][2]int32
	for i := 1; i < n; i++ {
		pairs = append(pairs, [2]int32{0, int32(i)})
	}
	return pairs
}

func pathPairs(n int) [][2]int32 {
	var pairs [][2]int32
	for i := 1; i < n; i++ {
		pairs = append(pairs, [2]int32{int32(i - 1), int32(i)})
	}
	return pairs
}

func cliquePairs(n int) [][2]int32 {
	var pairs [][2]int32
	for i := range n {
		for j := range i {
			pairs = append(pairs, [2]int32{int32(i), int32(j)})
		}
	}
	return pairs
}

type pattern struct {
	name  string
	n     int
	pairs [][2]int32
}

func patterns() []pattern {
	rng := rand.New(rand.NewPCG(1, 2))
	var all []pattern
	add := func(name string, n int, pairs [][2]int32) { all = append(all, pattern{name, n, pairs}) }
	add("empty", 0, nil)
	add("one", 1, nil)
	add("diagonal", 7, nil)
	add("loops", 3, [][2]int32{{0, 0}, {1, 1}, {1, 1}})
	add("two", 2, [][2]int32{{1, 0}, {0, 1}})
	add("path", 100, pathPairs(100))
	add("star", 300, starPairs(300))
	add("clique", 70, cliquePairs(70))
	n, p := gridPairs(30, 40, false)
	add("quad", n, p)
	n, p = gridPairs(45, 23, true)
	add("tri", n, p)
	n, p = gridPairs(300, 3, true)
	add("strip", n, p)
	for _, m := range []int{20, 150, 300, 900, 3000} {
		add(fmt.Sprintf("random%d", m), 150, randomPairs(rng, 150, m))
	}
	return all
}

func factorise(t testing.TB, s *system, kind Kind, o Options) *Factor {
	t.Helper()
	a, err := Analyze(context.Background(), s.n, s.pairs, o)
	if err != nil {
		t.Fatal(err)
	}
	f, err := a.NewFactor(kind)
	if err != nil {
		t.Fatal(err)
	}
	if err := f.Refactor(context.Background(), s.values); err != nil {
		t.Fatal(err)
	}
	return f
}

func randomVector(rng *rand.Rand, n int) []float64 {
	b := make([]float64, n)
	for i := range b {
		b[i] = rng.NormFloat64()
	}
	return b
}

func TestSolvesPositiveDefinitePatterns(t *testing.T) {
	for _, p := range patterns() {
		for _, kind := range []Kind{Cholesky, LDL} {
			for _, nrhs := range []int{1, 3, 5} {
				rng := rand.New(rand.NewPCG(3, 4))
				s := laplacian(rng, p.n, p.pairs)
				f := factorise(t, s, kind, Options{})
				b := randomVector(rng, s.n*nrhs)
				x := append([]float64(nil), b...)
				if err := f.Solve(x, nrhs); err != nil {
					t.Fatal(err)
				}
				if e := s.backwardError(x, b, nrhs); !(e <= 1e-14) {
					t.Errorf("%s, %v, %d right-hand sides: backward error %g", p.name, kind, nrhs, e)
				}
				if neg, zero, pos, ok := f.Inertia(); neg != 0 || zero != 0 || pos != s.n || !ok {
					t.Errorf("%s, %v: inertia %d %d %d %v", p.name, kind, neg, zero, pos, ok)
				}
			}
		}
	}
}

func TestCholeskyNamesTheUnknownOfABadPivot(t *testing.T) {
	n, pairs := gridPairs(12, 12, true)
	s := laplacian(rand.New(rand.NewPCG(5, 6)), n, pairs)
	s.values[77] = -3
	a, err := Analyze(context.Background(), n, pairs, Options{})
	if err != nil {
		t.Fatal(err)
	}
	f, _ := a.NewFactor(Cholesky)
	err = f.Refactor(context.Background(), s.values)
	var bad *PivotError
	if !errors.As(err, &bad) || bad.Unknown != 77 || bad.Pivot > 0 {
		t.Fatalf("got %v, want a pivot error at unknown 77", err)
	}
	if err := f.Solve(make([]float64, n), 1); !errors.Is(err, ErrNotFactored) {
		t.Errorf("solve after a failed factorisation: %v", err)
	}
}
