package relax

// block is the number of nodes or elements that are worked on in one piece.
// Sums are formed block by block and then added in the order of the blocks, so
// that they do not depend on who worked on which block.
const block = 512

// blocks is the number of blocks that cover n items.
func blocks(n int) int { return (n + block - 1) / block }

// span returns the items of block b of n.
func span(b, n int) (lo, hi int) { return b * block, min((b+1)*block, n) }
