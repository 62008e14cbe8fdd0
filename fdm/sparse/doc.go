// Package sparse solves sparse symmetric linear systems A·x = b directly, fast
// enough to sit inside a Newton iteration on a million unknowns.
//
// The work is split so that what can be kept is kept:
//
//	a, err := sparse.Analyze(ctx, n, pairs, sparse.Options{}) // once per pattern
//	f, err := a.NewFactor(sparse.Cholesky)                    // takes the memory
//	err = f.Refactor(ctx, values)                             // for every new set of values
//	err = f.Solve(b, 3)                                       // for every load, in place
//
// A pattern is a number of unknowns n and a list of off-diagonal pairs (i, j),
// each given once from either triangle (or repeatedly: values add up). Values
// come as one slice of n+len(pairs) floats: the diagonal first, then one per
// pair. Right-hand sides are n×nrhs, row by row. Nothing here knows where a
// system comes from; signs and units are the caller's.
//
// # Method
//
// The unknowns are ordered by nested dissection (George 1973) where the pattern
// is large and its graph like a surface, by approximate minimum degree on the
// quotient graph elsewhere (Amestoy, Davis & Duff 1996). Unknowns with the same
// neighbours are first joined. The elimination is multifrontal (Duff & Reid
// 1983): each supernode is a small dense matrix, a front, whose update is added
// to the front of its parent in the elimination tree (Liu 1990). L·D·Lᵀ takes
// 1×1 and 2×2 pivots (Bunch & Kaufman 1977) with a threshold on the growth, and
// passes columns without an acceptable pivot to the parent.
//
// On amd64 with AVX2 and fused multiply-add the dense work and the solves run in
// a few short loops of assembly, chosen at run time, in wider registers (and to
// the same bits) with AVX-512; elsewhere in plain Go. All are tested against each
// other. Large systems use several goroutines, independent
// subtrees first, then the fronts at the top together. How the work is split
// depends on the pattern alone: the bits of a result do not depend on
// GOMAXPROCS.
//
// # Limits
//
// Indices are 32-bit: fewer than 2³¹ unknowns, 2³⁰ pairs, and 2³¹ entries in the
// columns of one front. The factor of a planar net of n unknowns has about
// 2.2·n·log₂n entries. [Options.MemoryBudget] refuses what would not fit;
// L·D·Lᵀ of a matrix that delays pivots takes memory beyond it.
//
// # References
//
// J. A. George: Nested dissection of a regular finite element mesh. SIAM J.
// Numer. Anal. 10 (1973), 345-363.
//
// J. R. Bunch & L. Kaufman: Some stable methods for calculating inertia and
// solving symmetric linear systems. Math. Comp. 31 (1977), 163-179.
//
// I. S. Duff & J. K. Reid: The multifrontal solution of indefinite sparse
// symmetric linear equations. ACM Trans. Math. Softw. 9 (1983), 302-325.
//
// J. W. H. Liu: The role of elimination trees in sparse factorization. SIAM J.
// Matrix Anal. Appl. 11 (1990), 134-172.
//
// J. R. Gilbert, E. G. Ng & B. W. Peyton: An efficient algorithm to compute row
// and column counts for sparse Cholesky factorization. SIAM J. Matrix Anal.
// Appl. 15 (1994), 1075-1091.
//
// P. R. Amestoy, T. A. Davis & I. S. Duff: An approximate minimum degree
// ordering algorithm. SIAM J. Matrix Anal. Appl. 17 (1996), 886-905.
//
// T. A. Davis: Direct Methods for Sparse Linear Systems. SIAM, 2006.
package sparse
