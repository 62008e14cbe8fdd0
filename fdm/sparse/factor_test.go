package sparse

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"runtime"
	"slices"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// bitsOf solves with so many workers and returns every bit of the solution.
func bitsOf(t *testing.T, s *system, kind Kind, workers int) []float64 {
	t.Helper()
	f := factorise(t, s, kind, Options{Workers: workers})
	x := make([]float64, 3*s.n)
	for i := range x {
		x[i] = float64(i%11) - 5
	}
	if err := f.Solve(x, 3); err != nil {
		t.Fatal(err)
	}
	return x
}

func TestSameBitsWhateverTheNumberOfWorkers(t *testing.T) {
	for _, shape := range [][2]int{{100, 100}, {400, 30}} {
		n, pairs := gridPairs(shape[0], shape[1], true)
		s := laplacian(rand.New(rand.NewPCG(1, 2)), n, pairs)
		for _, kind := range []Kind{Cholesky, LDL} {
			want := bitsOf(t, s, kind, 1)
			for _, workers := range []int{2, 3, 8} {
				for range 2 {
					if !slices.Equal(bitsOf(t, s, kind, workers), want) {
						t.Errorf("%v of %v: %d workers give other bits than one", kind, shape, workers)
					}
				}
			}
			old := runtime.GOMAXPROCS(1)
			one := bitsOf(t, s, kind, 0)
			runtime.GOMAXPROCS(4)
			four := bitsOf(t, s, kind, 0)
			runtime.GOMAXPROCS(old)
			if !slices.Equal(one, want) || !slices.Equal(four, want) {
				t.Errorf("%v of %v: the result depends on GOMAXPROCS", kind, shape)
			}
		}
	}
}

// The large fronts of a big system are packed and shared; a solution is a
// solution all the same.
func TestLargeFronts(t *testing.T) {
	n := 450
	pairs := cliquePairs(n)
	side, grid := gridPairs(40, 40, false)
	for _, p := range grid {
		pairs = append(pairs, [2]int32{p[0] + int32(n), p[1] + int32(n)})
	}
	for i := range 40 {
		pairs = append(pairs, [2]int32{int32(i), int32(n + 40*i)})
	}
	s := laplacian(rand.New(rand.NewPCG(4, 4)), n+side, pairs)
	for _, workers := range []int{1, 3} {
		for _, kind := range []Kind{Cholesky, LDL} {
			f := factorise(t, s, kind, Options{Workers: workers})
			b := randomVector(rand.New(rand.NewPCG(5, 5)), 3*s.n)
			x := slices.Clone(b)
			if err := f.Solve(x, 3); err != nil {
				t.Fatal(err)
			}
			if e := s.backwardError(x, b, 3); !(e <= 1e-14) {
				t.Errorf("%v, %d workers: backward error %g", kind, workers, e)
			}
		}
	}
}

func TestRefactorAllocatesNothing(t *testing.T) {
	n, pairs := gridPairs(60, 60, true)
	s := laplacian(rand.New(rand.NewPCG(1, 2)), n, pairs)
	ctx := context.Background()
	for _, kind := range []Kind{Cholesky, LDL} {
		f := factorise(t, s, kind, Options{Workers: 1})
		x := make([]float64, 3*n)
		if err := f.Solve(x, 3); err != nil {
			t.Fatal(err)
		}
		if got := testing.AllocsPerRun(5, func() {
			if f.Refactor(ctx, s.values) != nil || f.Solve(x, 3) != nil {
				t.Fatal("failed")
			}
		}); got != 0 {
			t.Errorf("%v: %g allocations in refactor and solve", kind, got)
		}
	}
	n, pairs = gridPairs(140, 140, true)
	s = laplacian(rand.New(rand.NewPCG(1, 2)), n, pairs)
	f := factorise(t, s, Cholesky, Options{Workers: 3})
	if len(f.crew.workers) != 3 {
		t.Fatalf("%d workers, want 3", len(f.crew.workers))
	}
	if got := testing.AllocsPerRun(5, func() {
		if f.Refactor(ctx, s.values) != nil {
			t.Fatal("failed")
		}
	}); got > 3*4 {
		t.Errorf("%g allocations with three workers", got)
	}
}

func TestRefactorTakesNewValuesAndRecovers(t *testing.T) {
	n, pairs := gridPairs(20, 20, false)
	rng := rand.New(rand.NewPCG(8, 8))
	s := laplacian(rng, n, pairs)
	for _, kind := range []Kind{Cholesky, LDL} {
		f := factorise(t, s, kind, Options{})
		for round := range 4 {
			v := laplacian(rng, n, pairs)
			if round == 2 {
				bad := indefinite(rng, n, pairs, 0.5)
				if err := f.Refactor(context.Background(), bad.values); kind == Cholesky && err == nil {
					t.Error("an indefinite matrix went through Cholesky")
				}
			}
			if err := f.Refactor(context.Background(), v.values); err != nil {
				t.Fatal(err)
			}
			b := randomVector(rng, n)
			x := slices.Clone(b)
			if err := f.Solve(x, 1); err != nil {
				t.Fatal(err)
			}
			if e := v.backwardError(x, b, 1); !(e <= 1e-14) {
				t.Errorf("%v, round %d: backward error %g", kind, round, e)
			}
		}
	}
}

func TestInputsAreCheckedAtTheDoor(t *testing.T) {
	ctx := context.Background()
	var pattern *PatternError
	for _, p := range [][2]int32{{0, 3}, {-1, 0}, {3, 3}} {
		if _, err := Analyze(ctx, 3, [][2]int32{{0, 1}, p}, Options{}); !errors.As(err, &pattern) || pattern.Entry != 1 {
			t.Errorf("pair %v: %v", p, err)
		}
	}
	if _, err := Analyze(ctx, -1, nil, Options{}); err == nil {
		t.Error("a negative number of unknowns passed")
	}
	n, pairs := gridPairs(50, 50, true)
	var budget *BudgetError
	for _, bytes := range []int64{1000, 500_000} {
		if _, err := Analyze(ctx, n, pairs, Options{MemoryBudget: bytes}); !errors.As(err, &budget) || budget.Need <= bytes {
			t.Errorf("budget %d: %v", bytes, err)
		}
	}
	a, err := Analyze(ctx, 2, [][2]int32{{0, 1}}, Options{MemoryBudget: 1 << 20})
	if err != nil {
		t.Fatal(err)
	}
	if _, err := a.NewFactor(Kind(9)); err == nil {
		t.Error("an unknown kind passed")
	}
	f, _ := a.NewFactor(Cholesky)
	if err := f.Solve([]float64{1, 1}, 1); !errors.Is(err, ErrNotFactored) {
		t.Errorf("solve before refactor: %v", err)
	}
	var size *SizeError
	if err := f.Refactor(ctx, []float64{1, 2}); !errors.As(err, &size) {
		t.Errorf("short values: %v", err)
	}
	var value *ValueError
	for _, v := range []float64{math.NaN(), math.Inf(1), math.Inf(-1)} {
		if err := f.Refactor(ctx, []float64{1, v, 0}); !errors.As(err, &value) || value.Entry != 1 {
			t.Errorf("value %g: %v", v, err)
		}
	}
	if err := f.Refactor(ctx, []float64{2, 2, 1}); err != nil {
		t.Fatal(err)
	}
	if err := f.Solve([]float64{1, math.NaN()}, 1); !errors.As(err, &value) {
		t.Errorf("right-hand side not finite: %v", err)
	}
	if err := f.Solve([]float64{1, 2, 3}, 1); !errors.As(err, &size) {
		t.Errorf("right-hand side too long: %v", err)
	}
	if err := f.Solve(nil, -1); !errors.As(err, &size) {
		t.Errorf("negative number of right-hand sides: %v", err)
	}
	if err := f.Solve(nil, 0); err != nil {
		t.Errorf("no right-hand sides: %v", err)
	}
}

func TestCancellation(t *testing.T) {
	n, pairs := gridPairs(150, 150, true)
	s := laplacian(rand.New(rand.NewPCG(1, 2)), n, pairs)
	ctx, cancel := context.WithCancel(context.Background())
	defer cancel()
	for _, workers := range []int{1, 2} {
		f := factorise(t, s, Cholesky, Options{Workers: workers})
		cancel()
		if err := f.Refactor(ctx, s.values); !errors.Is(err, context.Canceled) {
			t.Errorf("%d workers: %v", workers, err)
		}
		if err := f.Refactor(context.Background(), s.values); err != nil {
			t.Errorf("%d workers, afterwards: %v", workers, err)
		}
	}
	if _, err := Analyze(ctx, n, pairs, Options{}); !errors.Is(err, context.Canceled) {
		t.Errorf("analysis: %v", err)
	}
}

// A bad pivot is named the same with one worker and with several.
func TestPivotErrorDoesNotDependOnWorkers(t *testing.T) {
	n, pairs := gridPairs(150, 150, true)
	s := laplacian(rand.New(rand.NewPCG(1, 2)), n, pairs)
	a, err := Analyze(context.Background(), n, pairs, Options{})
	if err != nil {
		t.Fatal(err)
	}
	for _, places := range [][]int{{10, 20000}, {22400, 22499}, {9000, 15000, 21000}} {
		bad := slices.Clone(s.values)
		for _, k := range places {
			bad[a.order[k]] = -100
		}
		var want *PivotError
		for _, workers := range []int{1, 2, 4} {
			b, err := Analyze(context.Background(), n, pairs, Options{Workers: workers})
			if err != nil {
				t.Fatal(err)
			}
			f, _ := b.NewFactor(Cholesky)
			var got *PivotError
			if err := f.Refactor(context.Background(), bad); !errors.As(err, &got) {
				t.Fatalf("%d workers: %v", workers, err)
			}
			if got.Unknown != int(a.order[places[0]]) {
				t.Errorf("%v: pivot of unknown %d, want %d", places, got.Unknown, a.order[places[0]])
			}
			if want != nil && *got != *want {
				t.Errorf("%v, %d workers: %v, one worker: %v", places, workers, got, want)
			}
			want = got
		}
	}
}

func TestRefinementAndConditionAgainstDense(t *testing.T) {
	for seed := range uint64(8) {
		rng := rand.New(rand.NewPCG(seed, 21))
		n := 80
		s := indefinite(rng, n, randomPairs(rng, n, 240), 0.2)
		var inv mat.Dense
		if err := inv.Inverse(s.dense()); err != nil {
			continue
		}
		exact := mat.Norm(s.dense(), 1) * mat.Norm(&inv, 1)
		f := factorise(t, s, LDL, Options{})
		got, err := f.Condition(s.values)
		if err != nil {
			t.Fatal(err)
		}
		// Repeated pairs may make ‖A‖ appear a little larger.
		if got < exact/4 || got > exact*3 {
			t.Errorf("seed %d: condition %g, dense %g", seed, got, exact)
		}
		b := randomVector(rng, 2*n)
		x := slices.Clone(b)
		e, err := f.SolveRefined(s.values, x, 2, 3)
		if err != nil {
			t.Fatal(err)
		}
		if own := s.backwardError(x, b, 2); e > 3e-16 || math.Abs(own-e) > 1e-16 {
			t.Errorf("seed %d: refined backward error %g, recomputed %g", seed, e, own)
		}
	}
}

func TestMatchesDenseSolution(t *testing.T) {
	for _, p := range patterns() {
		if p.n == 0 || p.n > 300 {
			continue
		}
		s := laplacian(rand.New(rand.NewPCG(2, 2)), p.n, p.pairs)
		b := randomVector(rand.New(rand.NewPCG(3, 3)), p.n)
		x := slices.Clone(b)
		if err := factorise(t, s, Cholesky, Options{}).Solve(x, 1); err != nil {
			t.Fatal(err)
		}
		var want mat.VecDense
		if err := want.SolveVec(s.dense(), mat.NewVecDense(p.n, b)); err != nil {
			t.Fatal(err)
		}
		for i := range x {
			if d := math.Abs(x[i] - want.AtVec(i)); d > 1e-9*(1+math.Abs(x[i])) {
				t.Fatalf("%s: x[%d] is %g, dense %g", p.name, i, x[i], want.AtVec(i))
			}
		}
	}
}

// Renumbering the unknowns renumbers the solution.
func TestSolutionFollowsRenumbering(t *testing.T) {
	n, pairs := gridPairs(40, 37, true)
	rng := rand.New(rand.NewPCG(6, 6))
	s := laplacian(rng, n, pairs)
	b := randomVector(rng, n)
	x := slices.Clone(b)
	if err := factorise(t, s, Cholesky, Options{}).Solve(x, 1); err != nil {
		t.Fatal(err)
	}
	name := rng.Perm(n)
	r := &system{n: n, pairs: make([][2]int32, len(pairs)), values: slices.Clone(s.values)}
	y := make([]float64, n)
	for i, k := range name {
		r.values[k], y[k] = s.values[i], b[i]
	}
	for k, p := range pairs {
		r.pairs[k] = [2]int32{int32(name[p[1]]), int32(name[p[0]])}
	}
	if err := factorise(t, r, Cholesky, Options{}).Solve(y, 1); err != nil {
		t.Fatal(err)
	}
	for i, k := range name {
		if math.Abs(x[i]-y[k]) > 1e-11 {
			t.Fatalf("unknown %d: %g, renumbered %g", i, x[i], y[k])
		}
	}
}

func TestOrderingsAreCompleteAndSparse(t *testing.T) {
	for _, p := range patterns() {
		for _, o := range []Ordering{OrderAuto, OrderDissection, OrderMinimumDegree, OrderNatural} {
			a, err := Analyze(context.Background(), p.n, p.pairs, Options{Ordering: o})
			if err != nil {
				t.Fatal(err)
			}
			order := a.Order()
			slices.Sort(order)
			for i, v := range order {
				if int(v) != i {
					t.Fatalf("%s, %v: the order is not a permutation", p.name, o)
				}
			}
		}
	}
	// A path or a star has no fill in a good order; what is left are the zeros
	// that joining small supernodes lets in.
	for _, p := range []pattern{{"path", 2000, pathPairs(2000)}, {"star", 2000, starPairs(2000)}} {
		a, err := Analyze(context.Background(), p.n, p.pairs, Options{})
		if err != nil {
			t.Fatal(err)
		}
		if c := a.Cost(); c.Nonzeros > 6*int64(p.n) {
			t.Errorf("%s: %d nonzeros for %d unknowns", p.name, c.Nonzeros, p.n)
		}
	}
}

// George 1973: nested dissection of an m×m grid needs about 7.75 m² log₂ m
// nonzeros; ours must not need more.
func TestFillOfAGridIsThatOfNestedDissection(t *testing.T) {
	for _, m := range []int{64, 160} {
		n, pairs := gridPairs(m, m, false)
		a, err := Analyze(context.Background(), n, pairs, Options{})
		if err != nil {
			t.Fatal(err)
		}
		bound := 7.75 * float64(m*m) * math.Log2(float64(m))
		if c := a.Cost(); float64(c.Nonzeros) > bound || c.Ordering != OrderDissection {
			t.Errorf("grid %d: %d nonzeros by %v, bound %.0f", m, c.Nonzeros, c.Ordering, bound)
		}
	}
}

func ExampleFactor() {
	// Three nodes in a row between two supports, force density 2 in each of the
	// four cables, a load of 1 on each node: D·z = p.
	pairs := [][2]int32{{0, 1}, {1, 2}}
	a, err := Analyze(context.Background(), 3, pairs, Options{})
	if err != nil {
		fmt.Println(err)
		return
	}
	f, err := a.NewFactor(Cholesky)
	if err != nil {
		fmt.Println(err)
		return
	}
	if err := f.Refactor(context.Background(), []float64{4, 4, 4, -2, -2}); err != nil {
		fmt.Println(err)
		return
	}
	z := []float64{-1, -1, -1}
	if err := f.Solve(z, 1); err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("%.2f\n", z)
	// Output: [-0.75 -1.00 -0.75]
}
