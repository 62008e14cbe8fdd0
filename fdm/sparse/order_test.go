package sparse

import (
	"context"
	"math/rand/v2"
	"testing"
)

// shuffled gives the same pattern in another numbering.
func shuffled(n int, pairs [][2]int32) [][2]int32 {
	p := rand.New(rand.NewPCG(8, 15)).Perm(n)
	out := make([][2]int32, len(pairs))
	for k, q := range pairs {
		out[k] = [2]int32{int32(p[q[0]]), int32(p[q[1]])}
	}
	return out
}

// What the ordering costs must hang on the net, not on how its nodes happen to
// be numbered. Minimum degree breaks ties by the numbering, and on these nets
// takes 1.15 to 1.25 times the flops with a random one unless patterns are
// numbered breadth first.
func TestFillHardlyDependsOnTheNumbering(t *testing.T) {
	for _, side := range []int{31, 50, 100} {
		for _, diagonals := range []bool{false, true} {
			n, pairs := gridPairs(side, side, diagonals)
			for _, o := range []Ordering{OrderAuto, OrderDissection, OrderMinimumDegree} {
				var flops [2]float64
				for k, p := range [2][][2]int32{pairs, shuffled(n, pairs)} {
					a, err := Analyze(context.Background(), n, p, Options{Ordering: o})
					if err != nil {
						t.Fatal(err)
					}
					flops[k] = a.Cost().Flops
				}
				if r := flops[1] / flops[0]; r < 0.87 || r > 1.15 {
					t.Errorf("%d by %d, diagonals %v, %v: shuffled takes %.2f times the flops", side, side, diagonals, o, r)
				}
			}
		}
	}
}

// Trees and chains have no fill at all in the right order (Rose 1970, "Triangulated
// graphs and the elimination process"): L has 2n−1 entries, and a few zeros that
// joining small fronts lets in.
func TestLargeTreesHaveNoFill(t *testing.T) {
	const n = 6000
	tree := func(up func(i int32) int32) [][2]int32 {
		var p [][2]int32
		for i := int32(1); i < n; i++ {
			p = append(p, [2]int32{up(i), i})
		}
		return p
	}
	rng := rand.New(rand.NewPCG(2, 3))
	for name, pairs := range map[string][][2]int32{
		"chain":       tree(func(i int32) int32 { return i - 1 }),
		"star":        tree(func(int32) int32 { return 0 }),
		"seven stars": tree(func(i int32) int32 { return i % 7 }),
		"binary":      tree(func(i int32) int32 { return (i - 1) / 2 }),
		"random":      tree(func(i int32) int32 { return rng.Int32N(i) }),
		"caterpillar": tree(func(i int32) int32 { return max(0, i-1) / 10 * 10 }),
	} {
		for _, p := range [][][2]int32{pairs, shuffled(n, pairs)} {
			s := laplacian(rng, n, p)
			f := factorise(t, s, Cholesky, Options{})
			if z := f.Analysis().Cost().Nonzeros; z > 5*n {
				t.Errorf("%s: %d entries in L for %d unknowns", name, z, n)
			}
			b := randomVector(rng, n)
			x := append([]float64(nil), b...)
			if err := f.Solve(x, 1); err != nil {
				t.Fatal(err)
			}
			if e := s.backwardError(x, b, 1); !(e <= 1e-14) {
				t.Errorf("%s: backward error %.1e", name, e)
			}
		}
	}
}

// The first factor takes memory of the analysis over: the second must not get
// the same.
func TestFactorsOfOneAnalysisAreIndependent(t *testing.T) {
	for _, side := range []int{8, 70} {
		n, pairs := gridPairs(side, side, true)
		rng := rand.New(rand.NewPCG(5, 5))
		a, err := Analyze(context.Background(), n, pairs, Options{})
		if err != nil {
			t.Fatal(err)
		}
		var f [3]*Factor
		var s [3]*system
		for k := range f {
			s[k] = laplacian(rng, n, pairs)
			if f[k], err = a.NewFactor(Cholesky); err != nil {
				t.Fatal(err)
			}
		}
		for k := range f {
			if err := f[k].Refactor(context.Background(), s[k].values); err != nil {
				t.Fatal(err)
			}
		}
		for k := range f {
			b := randomVector(rng, n)
			x := append([]float64(nil), b...)
			if err := f[k].Solve(x, 1); err != nil {
				t.Fatal(err)
			}
			if e := s[k].backwardError(x, b, 1); !(e <= 1e-14) {
				t.Errorf("factor %d of %d unknowns: backward error %.1e", k, n, e)
			}
		}
	}
}
