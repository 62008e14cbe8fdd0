package sparse

import "golang.org/x/sys/cpu"

// haveStrips says that mulSubStrip and scaleStrip may be called: the processor
// has AVX2 and fused multiply-add. A variable so that tests can compare both
// paths.
var haveStrips = cpu.X86.HasAVX2 && cpu.X86.HasFMA

// haveWide says that mulSubStrip goes on to mulSubStrip512, and what else has
// AVX-512 in it: the processor has that, too. A variable for the same reason.
var haveWide = haveStrips && cpu.X86.HasAVX512F && cpu.X86.HasAVX512VL && cpu.X86.HasBMI2

// mulSubStrip512 gives the same bits as mulSubStrip, which jumps to it.
//
//lint:ignore U1000 the other assembly jumps to it
//go:noescape
func mulSubStrip512(c, a, b *float64, ldc, lda, ldb, m, n, k, step, fresh int)

// mulSubStrip does C −= A·Bᵀ (C = −A·Bᵀ if fresh is not 0) for C of m ≥ 1 rows
// and 1 ≤ n ≤ 4 columns. step is the distance between blocks of eight rows of
// A: 8, or more if A is packed. The caller keeps m·k below stripWork, since
// assembly is not preempted.
//
//go:noescape
func mulSubStrip(c, a, b *float64, ldc, lda, ldb, m, n, k, step, fresh int)

// scaleStrip solves X·Tᵀ = C in place for m ≥ 1 rows of 1 ≤ n ≤ 4 columns, T
// lower triangular with its diagonal inverted.
//
//go:noescape
func scaleStrip(c, t *float64, ldc, ldt, m, n int)

// scaleStrip512 gives the same bits as scaleStrip, which jumps to it.
//
//lint:ignore U1000 the other assembly jumps to it
//go:noescape
func scaleStrip512(c, t *float64, ldc, ldt, m, n int)

// forwardFront and backwardFront do what solveForward and solveBackward say: y
// is x at the first of the own unknowns.
//
//go:noescape
func forwardFront(p, y, x *float64, ld, cols, own int, rows *int32, below int, unit bool)

//go:noescape
func backwardFront(p, y, x *float64, ld, cols, own int, rows *int32, below int, unit bool)

// addRuns adds cols columns of the lower triangle of an update matrix, from
// column skip of the first of the runs on, to the columns of a front.
//
//go:noescape
func addRuns(dst, src *float64, ld, n, cols, skip, shift int, runs *run, count int)
