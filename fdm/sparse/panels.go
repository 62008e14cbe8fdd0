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
	data []float64
}

// newPanelStore takes the memory for panels at the places at[s] to at[s+1].
func newPanelStore(at []int64) panelStore {
	m := len(at) - 1
	if m < 1 {
		return nil
	}
	p := make(panelStore, at[m-1]>>pieceBits+1)
	for s := 0; s < m; {
		from := at[s]
		k := from >> pieceBits
		for s < m && at[s]>>pieceBits == k {
			s++
		}
		p[k] = panelPiece{from, large[float64](int(at[s]-from) + slack)}
	}
	return p
}

// panel is what stands at the places from to to.
func (p panelStore) panel(from, to int64) []float64 {
	q := &p[from>>pieceBits]
	return q.data[from-q.base : to-q.base]
}
