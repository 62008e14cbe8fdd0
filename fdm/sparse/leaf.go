package sparse

import "math/bits"

// leafSize is the number of nodes below which a part is ordered by exact
// minimum degree: as many as a word has bits.
const leafSize = 64

// leafOrder orders small parts by exact minimum degree. Neighbourhoods are two
// words of bits: the nodes of the part, and those around it, which are
// eliminated later and count for the degrees (the first 64 of them).
type leafOrder struct {
	local  []int32 // place of a node in the part or among those around
	around []int32
	in     [leafSize]uint64 // neighbours in the part, not yet eliminated
	out    [leafSize]uint64 // neighbours around it
	deg    [leafSize]int32
	weight [2][leafSize]int32 // of the members, where they differ
	degree [2*leafSize + 1]uint64
	order  [leafSize]int32
}

// run reorders the part, whose nodes all have one label.
func (l *leafOrder) run(d *dissector, part []int32) {
	if len(part) == 0 {
		return
	}
	label := d.region[part[0]]
	const met = -3
	for x, i := range part {
		l.local[i] = int32(x)
	}
	around := l.around[:0]
	for x, i := range part {
		var in, out uint64
		for _, j := range d.g.row(i) {
			switch r := d.region[j]; r {
			case label:
				in |= 1 << (l.local[j] & 63)
			case none:
				d.region[j] = met
				l.local[j] = int32(len(around))
				around = append(around, j)
				fallthrough
			case met:
				if y := l.local[j]; y < leafSize {
					out |= 1 << y
				}
			}
		}
		l.in[x], l.out[x] = in, out
	}
	for _, j := range around {
		d.region[j] = none
	}
	l.around = around
	even := true
	if d.weight != nil {
		first := d.weight[part[0]]
		for x, i := range part {
			l.weight[0][x] = d.weight[i]
			even = even && d.weight[i] == first
		}
		for y, j := range around[:min(len(around), leafSize)] {
			l.weight[1][y] = d.weight[j]
			even = even && d.weight[j] == first
		}
	}
	l.eliminate(len(part), even)
	for x, y := range l.order[:len(part)] {
		l.order[x] = part[y]
	}
	copy(part, l.order[:])
	for _, i := range part {
		d.region[i] = none
	}
}

// eliminate puts the places of the k nodes of the part into l.order. Degrees
// count nodes if all have even weight, else unknowns up to a limit.
func (l *leafOrder) eliminate(k int, even bool) {
	top := len(l.degree) - 1
	degree := func(in, out uint64) int32 {
		if even {
			return int32(bits.OnesCount64(in) + bits.OnesCount64(out))
		}
		var c int32
		for ; in != 0; in &= in - 1 {
			c += l.weight[0][bits.TrailingZeros64(in)]
		}
		for ; out != 0; out &= out - 1 {
			c += l.weight[1][bits.TrailingZeros64(out)]
		}
		return min(c, int32(top))
	}
	// The nodes of each degree, as sets of bits.
	clear(l.degree[:])
	least := int32(top)
	for x := range k {
		v := degree(l.in[x], l.out[x])
		l.deg[x] = v
		l.degree[v] |= 1 << x
		least = min(least, v)
	}
	for done := 0; done < k; {
		for l.degree[least] == 0 {
			least++
		}
		p := bits.TrailingZeros64(l.degree[least])
		l.degree[least] &^= 1 << p
		l.order[done] = int32(p)
		done++
		// The neighbours become a clique. Those that have no others go at once.
		around := l.out[p]
		clique := l.in[p] | 1<<p
		gone := uint64(1) << p
		for left := l.in[p]; left != 0; left &= left - 1 {
			y := bits.TrailingZeros64(left)
			l.in[y] |= clique
			l.out[y] |= around
			if l.in[y] == clique && l.out[y] == around {
				gone |= 1 << y
				l.degree[l.deg[y]] &^= 1 << y
				l.order[done] = int32(y)
				done++
			}
		}
		for left := clique &^ gone; left != 0; left &= left - 1 {
			y := bits.TrailingZeros64(left)
			l.in[y] &^= gone | 1<<y
			if v := degree(l.in[y], l.out[y]); v != l.deg[y] {
				l.degree[l.deg[y]] &^= 1 << y
				l.degree[v] |= 1 << y
				l.deg[y] = v
				least = min(least, v)
			}
		}
	}
}
