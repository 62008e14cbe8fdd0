package sparse

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// denseInertia counts eigenvalues by gonum's dense symmetric eigensolver and
// returns the smallest magnitude relative to the largest.
func denseInertia(t testing.TB, s *system) (neg, pos int, gap float64) {
	t.Helper()
	if s.n == 0 {
		return 0, 0, 1
	}
	var eig mat.EigenSym
	if !eig.Factorize(s.dense(), false) {
		t.Fatal("dense eigenvalues failed")
	}
	least, most := math.Inf(1), 0.0
	for _, v := range eig.Values(nil) {
		if v < 0 {
			neg++
		} else {
			pos++
		}
		least, most = min(least, math.Abs(v)), max(most, math.Abs(v))
	}
	if most == 0 {
		return neg, pos, 0
	}
	return neg, pos, least / most
}

// checkLDL factors s and compares solution and inertia with the dense ones.
func checkLDL(t testing.TB, name string, s *system, o Options) {
	t.Helper()
	f := factorise(t, s, LDL, o)
	rng := rand.New(rand.NewPCG(9, uint64(s.n)))
	neg, pos, gap := denseInertia(t, s)
	n, z, p, ok := f.Inertia()
	if n+z+p != s.n {
		t.Errorf("%s: inertia %d+%d+%d does not add up to %d", name, n, z, p, s.n)
	}
	if ok && gap > 1e-11 && (n != neg || p != pos) {
		t.Errorf("%s: inertia %d %d, dense %d %d (gap %g)", name, n, p, neg, pos, gap)
	}
	if !ok && gap > 1e-9 {
		t.Errorf("%s: inertia withheld (%d perturbed) though the gap is %g", name, f.Perturbed(), gap)
	}
	if ok && gap < 1e-17 {
		t.Errorf("%s: singular, but inertia %d %d %d given", name, n, z, p)
	}
	if !ok {
		return
	}
	for _, nrhs := range []int{1, 3} {
		b := randomVector(rng, s.n*nrhs)
		x := append([]float64(nil), b...)
		if err := f.Solve(x, nrhs); err != nil {
			t.Fatal(err)
		}
		if e := s.backwardError(x, b, nrhs); !(e <= 1e-12) {
			t.Errorf("%s: backward error %g", name, e)
		}
	}
}

// indefinite has values without any structure, some of them zero.
func indefinite(rng *rand.Rand, n int, pairs [][2]int32, zeroDiagonal float64) *system {
	s := &system{n: n, pairs: pairs, values: make([]float64, n+len(pairs))}
	for i := range s.values {
		s.values[i] = rng.NormFloat64()
		if i < n && rng.Float64() < zeroDiagonal {
			s.values[i] = 0
		}
	}
	return s
}

func TestInertiaAgreesWithDenseEigenvalues(t *testing.T) {
	for _, p := range patterns() {
		if p.n > 400 {
			continue
		}
		for _, zeros := range []float64{0, 0.3, 0.9} {
			for seed := range uint64(2) {
				rng := rand.New(rand.NewPCG(seed, 17))
				s := indefinite(rng, p.n, p.pairs, zeros)
				for _, o := range []Ordering{OrderMinimumDegree, OrderDissection, OrderNatural} {
					checkLDL(t, fmt.Sprintf("%s, %v, zeros %g, seed %d", p.name, o, zeros, seed), s, Options{Ordering: o})
				}
			}
		}
	}
}

func TestZeroDiagonalPair(t *testing.T) {
	s := &system{n: 2, pairs: [][2]int32{{0, 1}}, values: []float64{0, 0, 1}}
	f := factorise(t, s, LDL, Options{})
	if neg, zero, pos, ok := f.Inertia(); neg != 1 || zero != 0 || pos != 1 || !ok {
		t.Errorf("inertia %d %d %d %v, want 1 0 1 true", neg, zero, pos, ok)
	}
	x := []float64{2, 3}
	if err := f.Solve(x, 1); err != nil || x[0] != 3 || x[1] != 2 {
		t.Errorf("solution %v, %v", x, err)
	}
}

// A net whose nodes have nothing to hold them has one vanishing eigenvalue.
func TestInertiaIsWithheldForAFreeNet(t *testing.T) {
	for _, side := range []int{5, 40} {
		n, pairs := gridPairs(side, side, false)
		rng := rand.New(rand.NewPCG(1, 1))
		s := &system{n: n, pairs: pairs, values: make([]float64, n+len(pairs))}
		for k, p := range pairs {
			q := 0.5 + rng.Float64()
			s.values[p[0]] += q
			s.values[p[1]] += q
			s.values[n+k] = -q
		}
		f := factorise(t, s, LDL, Options{})
		if neg, zero, pos, ok := f.Inertia(); ok || zero != 1 || neg != 0 || pos != n-1 {
			t.Errorf("side %d: inertia %d %d %d %v, want 0 1 %d false", side, neg, zero, pos, ok, n-1)
		}
	}
}

// Struts: some force densities are negative.
func TestNegativeForceDensities(t *testing.T) {
	for _, side := range []int{6, 18} {
		for seed := range uint64(6) {
			n, pairs := gridPairs(side, side, seed%2 == 0)
			rng := rand.New(rand.NewPCG(seed, 3))
			s := &system{n: n, pairs: pairs, values: make([]float64, n+len(pairs))}
			for k, p := range pairs {
				q := 1 + rng.Float64()
				if rng.IntN(4) == 0 {
					q = -q
				}
				s.values[p[0]] += q
				s.values[p[1]] += q
				s.values[n+k] = -q
			}
			s.values[0] += 2
			s.values[n-1] += 2
			checkLDL(t, fmt.Sprintf("side %d, seed %d", side, seed), s, Options{})
		}
	}
}

// The inertia does not change when rows and columns are scaled.
func TestInertiaOfABadlyScaledMatrix(t *testing.T) {
	for seed := range uint64(10) {
		rng := rand.New(rand.NewPCG(seed, 5))
		n := 60
		s := indefinite(rng, n, randomPairs(rng, n, 200), 0.3)
		neg, pos, gap := denseInertia(t, s)
		if gap < 1e-6 {
			continue
		}
		scale := make([]float64, n)
		for i := range scale {
			scale[i] = math.Exp2(float64(rng.IntN(40) - 20))
			s.values[i] *= scale[i] * scale[i]
		}
		for k, p := range s.pairs {
			s.values[n+k] *= scale[p[0]] * scale[p[1]]
		}
		f := factorise(t, s, LDL, Options{})
		if gn, _, gp, ok := f.Inertia(); ok && (gn != neg || gp != pos) {
			t.Errorf("seed %d: inertia %d %d, unscaled %d %d", seed, gn, gp, neg, pos)
		}
	}
}

// FuzzPatterns solves random systems of up to 300 unknowns of all shapes and
// compares with dense linear algebra.
func FuzzPatterns(f *testing.F) {
	for seed := range uint64(12) {
		f.Add(seed, uint16(20+17*seed), uint8(seed), uint8(0), []byte{1, 2, 3, 4})
	}
	f.Add(uint64(1), uint16(300), uint8(255), uint8(7), []byte("connect the dots"))
	f.Fuzz(func(t *testing.T, seed uint64, size uint16, parts, flags uint8, raw []byte) {
		n := int(size) % 301
		rng := rand.New(rand.NewPCG(seed, uint64(parts)))
		var pairs [][2]int32
		add := func(i, j int) { pairs = append(pairs, [2]int32{int32(i), int32(j)}) }
		if n > 0 {
			// Bytes name pairs directly, so that the fuzzer can draw.
			for k := 0; k+1 < len(raw); k += 2 {
				add(int(raw[k])%n, int(raw[k+1])*(1+int(seed%3))%n)
			}
			span := func() (int, int) {
				a, b := rng.IntN(n), rng.IntN(n)
				return min(a, b), max(a, b)
			}
			if parts&1 != 0 { // a random graph
				for range rng.IntN(3*n + 1) {
					add(rng.IntN(n), rng.IntN(n))
				}
			}
			if parts&2 != 0 { // a clique
				lo, hi := span()
				hi = min(hi, lo+25)
				for i := lo; i <= hi; i++ {
					for j := lo; j < i; j++ {
						add(i, j)
					}
				}
			}
			if parts&4 != 0 { // a path
				lo, hi := span()
				for i := lo; i < hi; i++ {
					add(i, i+1)
				}
			}
			if parts&8 != 0 { // a star
				lo, hi := span()
				c := rng.IntN(n)
				for i := lo; i <= hi; i++ {
					add(c, i)
				}
			}
			if parts&16 != 0 { // a net
				w := 2 + rng.IntN(18)
				for i := range n {
					if i+1 < n && (i+1)%w != 0 {
						add(i, i+1)
					}
					if i+w < n {
						add(i, i+w)
					}
				}
			}
			if parts&32 != 0 { // duplicates
				for range rng.IntN(len(pairs)/2 + 1) {
					p := pairs[rng.IntN(len(pairs))]
					add(int(p[1]), int(p[0]))
				}
			}
			if parts&64 != 0 {
				rng.Shuffle(len(pairs), func(i, j int) { pairs[i], pairs[j] = pairs[j], pairs[i] })
			}
		}
		o := Options{Ordering: Ordering(flags & 3), Workers: 1 + int(flags>>2&1)}
		spd := laplacian(rng, n, pairs)
		if flags&16 != 0 {
			for i := range n {
				s := math.Exp2(float64(rng.IntN(9) - 4))
				spd.values[i] *= s // heavier ground, still positive definite
				if s < 1 {
					spd.values[i] /= s
				}
			}
		}
		fc := factorise(t, spd, Cholesky, o)
		fl := factorise(t, spd, LDL, o)
		b := randomVector(rng, 3*n)
		for _, fac := range []*Factor{fc, fl} {
			x := append([]float64(nil), b...)
			if err := fac.Solve(x, 3); err != nil {
				t.Fatal(err)
			}
			if e := spd.backwardError(x, b, 3); !(e <= 1e-14) {
				t.Errorf("positive definite, %v: backward error %g", fac.Kind(), e)
			}
		}
		if neg, _, pos, ok := fl.Inertia(); neg != 0 || pos != n || !ok {
			t.Errorf("positive definite: inertia %d, %d of %d, %v", neg, pos, n, ok)
		}
		ind := indefinite(rng, n, pairs, float64(flags>>5)/8)
		if flags&8 != 0 { // small whole numbers: many exact cancellations
			for i := range ind.values {
				ind.values[i] = float64(rng.IntN(5) - 2)
			}
		}
		checkLDL(t, "indefinite", ind, o)
		err := fc.Refactor(context.Background(), ind.values)
		if neg, _, gap := denseInertia(t, ind); gap > 1e-9 && (neg > 0) != (err != nil) {
			t.Errorf("Cholesky: %v, but %d negative eigenvalues", err, neg)
		}
	})
}
