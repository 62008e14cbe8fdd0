package sparse

const (
	wideBlocks  = 3   // packed blocks that a kernel for wide registers takes together
	packRows    = 8   // rows of a packed block
	packDepth   = 256 // columns packed at a time: a block of eight rows is half of the smallest first-level cache in use
	packColumns = 64  // columns of C worked on at a time: their blocks are a part of the second-level cache
	packFrom    = 96  // rows from which packing pays, in a product at least packThick deep
	packThick   = 24
)

// pack copies m rows of k columns into blocks of eight rows, each stored column
// by column, the last one filled up with zeros.
func pack(dst, a []float64, lda, m, k int) {
	i := 0
	for ; i+packRows <= m; i += packRows {
		block := dst[i*k:][:packRows*k]
		for l := range k {
			d := (*[packRows]float64)(block[packRows*l:])
			s := (*[packRows]float64)(a[l*lda+i:])
			*d = *s
		}
	}
	if i < m {
		block := dst[i*k:][:packRows*k]
		clear(block)
		for l := range k {
			copy(block[packRows*l:], a[l*lda+i:l*lda+m])
		}
	}
}

// mulSubPacked does packColumns columns from j0 on of the lower trapezoid of
// C −= A·Bᵀ (C = −A·Bᵀ if fresh), where B is the first n of the m rows of A,
// packed at p. c starts at the diagonal entry of column j0.
func mulSubPacked(c []float64, ldc int, p []float64, m, n, k, j0 int, fresh bool) {
	flag := 0
	if fresh {
		flag = 1
	}
	j1 := min(j0+packColumns, n)
	rows := packRows
	if haveWide {
		rows *= wideBlocks
	}
	for i := j0; i < m; i += rows {
		end := min(i+rows, m)
		for j := j0; j < j1 && j < end; j += 4 {
			// Blocks above the diagonal are left out.
			top := i + max(0, j-i)&^(packRows-1)
			mulSubStrip(&c[(j-j0)*ldc+top-j0], &p[top*k], &p[(j&^7)*k+j&7], ldc, packRows, packRows, end-top, min(4, j1-j), k, packRows*k, flag)
		}
	}
}
