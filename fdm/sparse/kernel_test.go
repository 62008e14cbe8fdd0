package sparse

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
)

// bothPaths runs f with the portable kernels and, where there are any, with
// those in assembly, for narrow and for wide registers.
func bothPaths(t *testing.T, f func(t *testing.T)) {
	run := func(name string, strips, wide bool) {
		t.Run(name, func(t *testing.T) {
			defer func(s, w bool) { haveStrips, haveWide = s, w }(haveStrips, haveWide)
			haveStrips, haveWide = strips, wide
			f(t)
		})
	}
	strips, wide := haveStrips, haveWide
	run("portable", false, false)
	if strips {
		run("assembly", true, false)
	}
	if wide {
		run("wide", true, true)
	}
}

// naive is C − A·Bᵀ entry by entry.
func naive(c []float64, ldc int, a []float64, lda int, b []float64, ldb, i, j, k int, fresh bool) float64 {
	s := 0.0
	if !fresh {
		s = c[j*ldc+i]
	}
	for l := range k {
		s -= a[l*lda+i] * b[l*ldb+j]
	}
	return s
}

func TestProductKernelsOnEverySize(t *testing.T) {
	var sizes [][3]int
	for m := 1; m <= 50; m++ {
		for n := 1; n <= 9; n++ {
			for _, k := range []int{1, 2, 3, 4, 5, 8, 13} {
				sizes = append(sizes, [3]int{m, n, k})
			}
		}
	}
	sizes = append(sizes, [][3]int{{100, 70, 130}, {523, 9, 300}, {97, 97, 24}, {0, 3, 2}, {5, 3, 0}}...)
	bothPaths(t, func(t *testing.T) {
		rng := rand.New(rand.NewPCG(1, 1))
		for _, size := range sizes {
			m, n, k := size[0], size[1], size[2]
			for mode := range 4 {
				fresh, lower := mode&1 != 0, mode&2 != 0
				if lower && n > m {
					continue
				}
				ldc, lda, ldb := m+rng.IntN(3), m+rng.IntN(3), n+rng.IntN(3)
				const guard = 1e30
				c := make([]float64, ldc*n+slack)
				a := randomVector(rng, lda*k+slack)
				b := randomVector(rng, ldb*k+slack)
				for i := range c {
					c[i] = guard
				}
				for j := range n {
					for i := range m {
						c[j*ldc+i] = rng.NormFloat64()
					}
				}
				was := append([]float64(nil), c...)
				mulSub(c, ldc, a, lda, b, ldb, m, n, k, fresh, lower)
				for x, v := range c {
					i, j := x%max(ldc, 1), x/max(ldc, 1)
					if i >= m || j >= n {
						if v != guard {
							t.Fatalf("%d×%d×%d: wrote outside at row %d, column %d", m, n, k, i, j)
						}
						continue
					}
					if lower && i < j {
						continue
					}
					if w := naive(was, ldc, a, lda, b, ldb, i, j, k, fresh); math.Abs(v-w) > 1e-12 {
						t.Fatalf("%d×%d×%d fresh %v lower %v: (%d, %d) is %g, want %g", m, n, k, fresh, lower, i, j, v, w)
					}
				}
			}
		}
	})
}

func TestSolveKernelsOnEverySize(t *testing.T) {
	bothPaths(t, func(t *testing.T) {
		rng := rand.New(rand.NewPCG(2, 2))
		for m := 1; m <= 20; m++ {
			for n := 1; n <= 4; n++ {
				ldc := m + rng.IntN(3)
				// T with its diagonal inverted.
				tri := randomVector(rng, 16)
				for j := range n {
					tri[5*j] = 1 / (2 + rng.Float64())
				}
				c := randomVector(rng, ldc*n+slack)
				was := append([]float64(nil), c...)
				scaleRows(c, ldc, m, n, tri, 4)
				for i := range m {
					for j := range n {
						// Row i of X·Tᵀ must give back row i of C.
						s := c[j*ldc+i] / tri[5*j]
						for l := range j {
							s += c[l*ldc+i] * tri[4*l+j]
						}
						if math.Abs(s-was[j*ldc+i]) > 1e-12 {
							t.Fatalf("rows %d, columns %d: (%d, %d) gives %g, want %g", m, n, i, j, s, was[j*ldc+i])
						}
					}
				}
			}
		}
	})
}

// The columns of a front against the triangular solves entry by entry, for all
// groups of columns, rows that are columns of the same front and rows below.
func TestFrontSolvesOnEverySize(t *testing.T) {
	bothPaths(t, func(t *testing.T) {
		rng := rand.New(rand.NewPCG(7, 7))
		for cols := 1; cols <= 10; cols++ {
			for own := cols; own <= cols+4; own++ {
				for below := 0; below <= 5; below++ {
					for _, unit := range []bool{false, true} {
						first, m := rng.IntN(3), own+below
						ld := m + rng.IntN(2)
						p := randomVector(rng, (cols-1)*ld+m)
						n := first + own + 2*below
						var rows []int32
						for k := range below {
							rows = append(rows, int32(first+own+2*k+rng.IntN(2)))
						}
						place := func(i int) int {
							if i < own {
								return first + i
							}
							return int(rows[i-own])
						}
						diagonal := func(j int) float64 {
							if unit {
								return 1
							}
							return p[j*ld+j]
						}
						x := randomVector(rng, solveWidth*n)
						forth := append([]float64(nil), x...)
						back := append([]float64(nil), x...)
						solveForward(p, ld, cols, own, first, rows, forth, unit)
						solveBackward(p, ld, cols, own, first, rows, back, unit)
						want := append([]float64(nil), x...)
						for j := range cols {
							for r := range solveWidth {
								want[solveWidth*(first+j)+r] *= diagonal(j)
								for i := j + 1; i < m; i++ {
									want[solveWidth*place(i)+r] -= p[j*ld+i] * want[solveWidth*(first+j)+r]
								}
							}
						}
						compare := func(what string, got []float64) {
							for i := range got {
								if !(math.Abs(got[i]-want[i]) <= 1e-11*(1+math.Abs(want[i]))) {
									t.Fatalf("%s, %d columns, %d own, %d below, unit %v: %d is %g, want %g", what, cols, own, below, unit, i, got[i], want[i])
								}
							}
						}
						compare("forward", forth)
						copy(want, x)
						for j := cols - 1; j >= 0; j-- {
							for r := range solveWidth {
								s := want[solveWidth*(first+j)+r]
								for i := j + 1; i < m; i++ {
									s -= p[j*ld+i] * want[solveWidth*place(i)+r]
								}
								want[solveWidth*(first+j)+r] = s * diagonal(j)
							}
						}
						compare("backward", back)
					}
				}
			}
		}
	})
}

func TestExtendAddOnRandomRows(t *testing.T) {
	bothPaths(t, func(t *testing.T) {
		rng := rand.New(rand.NewPCG(3, 3))
		for round := range 403 {
			rows := 1 + rng.IntN(40)
			if round >= 397 {
				rows += 500 // chunks, and more than one call of the kernel
			}
			cols := rng.IntN(rows + 1)
			var rel []int32
			for i := range rows {
				if rng.IntN(3) > 0 {
					rel = append(rel, int32(i))
				}
			}
			n := len(rel)
			if n == 0 {
				continue
			}
			u := randomVector(rng, n*n+slack)
			chunk := updateChunk(n)
			if rng.IntN(2) == 0 {
				chunk = n + 1 // a square
			}
			panel, update := make([]float64, rows*rows+slack), make([]float64, rows*rows+slack)
			runs := appendRuns(nil, rel, int32(cols))
			extendAdd(panel, rows, 0, u, n, chunk, runs, 0, cols)
			nu := rows - cols
			chunks := updateChunk(nu)
			if chunk > n && updateChunk(n) <= n {
				extendAdd(update[:nu*nu], nu, cols, u, n, chunk, runs, cols, rows)
				chunks = nu + 1
			} else {
				extendUpdate(update[:updateFloats(nu)], nu, u, n, runs, cols)
			}
			for j, c := range rel {
				for i := j; i < n; i++ {
					r := int(rel[i])
					at := &panel[int(c)*rows+r]
					if int(c) >= cols {
						diagonal, _ := updateAt(nu, chunks, int(c)-cols)
						at = &update[diagonal+r-int(c)]
					}
					diagonal, _ := updateAt(n, chunk, j)
					if *at != u[diagonal+i-j] {
						t.Fatalf("rows %v, cols %d: entry (%d, %d) went astray", rel, cols, r, c)
					}
					*at = 0
				}
			}
			for i := range panel {
				if panel[i] != 0 || update[i] != 0 {
					t.Fatalf("rows %v, cols %d: something was added elsewhere", rel, cols)
				}
			}
		}
	})
}

func TestPackedProducts(t *testing.T) {
	bothPaths(t, func(t *testing.T) {
		rng := rand.New(rand.NewPCG(4, 4))
		for _, s := range [][3]int{{96, 96, 24}, {101, 37, 130}, {203, 203, 300}, {130, 129, 64}} {
			m, n, k := s[0], s[1], s[2]
			for _, fresh := range []bool{false, true} {
				a, c := randomVector(rng, m*k+slack), randomVector(rng, m*n+slack)
				was := append([]float64(nil), c...)
				w := &worker{alone: true, scratch: make([]float64, (m+packRows)*packDepth)}
				w.lowerProduct(c, m, a, m, m, n, k, fresh)
				if m == n {
					// The same in chunks.
					u := make([]float64, updateFloats(m)+slack)
					for j := range m {
						at, _ := updateAt(m, packColumns, j)
						copy(u[at:at+m-j], was[j*(m+1):])
					}
					w.lowerProduct(u, 0, a, m, m, m, k, fresh)
					for j := range m {
						at, _ := updateAt(m, packColumns, j)
						for i := j; i < m; i++ {
							if u[at+i-j] != c[j*m+i] {
								t.Fatalf("%v: (%d, %d) is %g in chunks, %g in one", s, i, j, u[at+i-j], c[j*m+i])
							}
						}
					}
				}
				for j := range n {
					for i := j; i < m; i++ {
						if want := naive(was, m, a, m, a, m, i, j, k, fresh); math.Abs(c[j*m+i]-want) > 1e-11 {
							t.Fatalf("%v: (%d, %d) is %g, want %g", s, i, j, c[j*m+i], want)
						}
					}
				}
			}
		}
	})
}

// L·Lᵀ of the columns of a front gives the front back, whether these are one
// block, a group of blocks or several groups.
func TestPanelsOfEveryWidth(t *testing.T) {
	bothPaths(t, func(t *testing.T) {
		rng := rand.New(rand.NewPCG(8, 8))
		for _, s := range [][2]int{{9, 5}, {70, 64}, {257, 65}, {300, 193}, {300, 300}, {430, 400}} {
			m, n := s[0], s[1]
			a := make([]float64, m*n+slack)
			for j := range n {
				for i := j; i < m; i++ {
					a[j*m+i] = rng.Float64() - 0.5
				}
				a[j*(m+1)] = float64(m) // diagonally dominant
			}
			f := append([]float64(nil), a...)
			w := &worker{alone: true, scratch: make([]float64, (m+packRows)*packDepth)}
			if bad, pivot := choleskyPanel(f, m, m, n, w); bad >= 0 {
				t.Fatalf("%v: pivot %d is %g", s, bad, pivot)
			}
			for j := range n {
				f[j*(m+1)] = 1 / f[j*(m+1)]
			}
			for j := range n {
				for i := j; i < m; i++ {
					sum := 0.0
					for k := range j + 1 {
						sum += f[k*m+i] * f[k*m+j]
					}
					if !(math.Abs(sum-a[j*m+i]) <= 1e-12*float64(m)) {
						t.Fatalf("%v: (%d, %d) is %g, want %g", s, i, j, sum, a[j*m+i])
					}
				}
			}
			// The first bad pivot is named, in whatever block.
			for _, bad := range []int{0, n / 2, n - 1} {
				copy(f, a)
				f[bad*(m+1)] = -1
				if got, pivot := choleskyPanel(f, m, m, n, w); got != bad || !(pivot < 0) {
					t.Fatalf("%v: bad pivot %d found as %d, %g", s, bad, got, pivot)
				}
			}
		}
	})
}

// The same systems solved by both paths agree to rounding.
func TestPathsAgreeOnSystems(t *testing.T) {
	if !haveStrips {
		t.Skip("one path only")
	}
	for _, p := range patterns() {
		for _, kind := range []Kind{Cholesky, LDL} {
			s := laplacian(rand.New(rand.NewPCG(5, 5)), p.n, p.pairs)
			want := bitsOf(t, s, kind, 1)
			haveStrips = false
			got := bitsOf(t, s, kind, 1)
			haveStrips = true
			for i := range got {
				if math.Abs(got[i]-want[i]) > 1e-9*(1+math.Abs(want[i])) {
					t.Fatalf("%s, %v: x[%d] is %g portable, %g in assembly", p.name, kind, i, got[i], want[i])
				}
			}
		}
	}
}

// Wide registers change no bit: a result does not depend on the machine's width.
func TestWideKernelsGiveTheSameBits(t *testing.T) {
	if !haveWide {
		t.Skip("no wide kernels")
	}
	defer func() { haveWide = true }()
	for _, p := range patterns() {
		for _, kind := range []Kind{Cholesky, LDL} {
			s := laplacian(rand.New(rand.NewPCG(6, 6)), p.n, p.pairs)
			haveWide = true
			want := bitsOf(t, s, kind, 1)
			haveWide = false
			got := bitsOf(t, s, kind, 1)
			for i := range got {
				if got[i] != want[i] {
					t.Fatalf("%s, %v: x[%d] is %g with narrow, %g with wide registers", p.name, kind, i, got[i], want[i])
				}
			}
		}
	}
}

func BenchmarkProduct(b *testing.B) {
	for _, c := range [][3]int{{16, 16, 8}, {32, 32, 12}, {64, 64, 16}, {128, 128, 32}, {256, 256, 64}, {1000, 1000, 256}} {
		b.Run(fmt.Sprint(c), func(b *testing.B) {
			m, n, k := c[0], c[1], c[2]
			a := randomVector(rand.New(rand.NewPCG(1, 1)), m*k+slack)
			u := make([]float64, m*n+slack)
			w := &worker{alone: true, scratch: make([]float64, (m+packRows)*packDepth)}
			for b.Loop() {
				w.lowerProduct(u, m, a, m, m, n, k, true)
			}
			b.ReportMetric(float64(m)*float64(n)*float64(k)*float64(b.N)/b.Elapsed().Seconds()/1e9, "GF/s")
		})
	}
}
