package sparse

// pieceBits says how many floats (2^17, 1 MiB) of panels go into one piece of a
// panelStore, about.
const pieceBits = 17

// panelStore holds the panels of all fronts, one after the other, in pieces: a
// piece fits into memory that the analysis has done with, one array for all
// would not.
type panelStore []panelPiece

// panelPiece holds the panels that start in one interval of 2^pieceBits floats.
type panelPiece struct {
	base int64 // where the first of them starts
	size int   // floats, while it is without memory
	data []float64
}

// newPanelStore takes the memory for panels at the places at[s] to at[s+1]. The
// first pieces go into spare.
func newPanelStore(at []int64, spare *[]float64) panelStore {
	m := len(at) - 1
	if m < 1 {
		return nil
	}
	var left []float64
	if spare != nil {
		left = *spare
	}
	p := make(panelStore, at[m-1]>>pieceBits+1)
	fresh := 0 // floats of the pieces that do not go into spare
	for s := 0; s < m; {
		from := at[s]
		k := from >> pieceBits
		for s < m && at[s]>>pieceBits == k {
			s++
		}
		p[k].base = from
		if need := int(at[s]-from) + slack; need <= len(left) {
			p[k].data, left = left[:need:need], left[need:]
			// Kernels may read behind a panel: let that be numbers.
			clear(p[k].data[need-slack:])
		} else {
			p[k].size = need
			fresh += need
		}
	}
	// In one array if that may have large pages.
	left = nil
	if 8*fresh < hugeArray {
		left = large[float64](fresh)
	}
	for k := range p {
		q := &p[k]
		switch {
		case q.size == 0:
		case q.size <= len(left):
			q.data, left = left[:q.size:q.size], left[q.size:]
		default:
			q.data = make([]float64, q.size)
		}
	}
	return p
}

// panel is what stands at the places from to to.
func (p panelStore) panel(from, to int64) []float64 {
	q := &p[from>>pieceBits]
	return q.data[from-q.base : to-q.base]
}
