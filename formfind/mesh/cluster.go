package mesh

import "container/heap"

// cluster is a place between 0 and 1 for the entries first … last−1 of a list.
type cluster struct {
	t           float64
	first, last int
}

// clusters puts places, in order, that are less than gap apart into one, the
// closest two first, until all are a gap apart from each other and from the ends 0 and
// 1, which are clusters of their own and stay where they are.
func clusters(place []float64, gap float64) []cluster {
	n := len(place)
	c := make([]cluster, 0, n+2)
	c = append(c, cluster{0, 0, 0})
	for k, t := range place {
		c = append(c, cluster{t, k, k + 1})
	}
	c = append(c, cluster{1, n, n})
	// A chain of what is left, and the distances in it; those that are no longer
	// true are passed over.
	before, after := make([]int32, n+2), make([]int32, n+2)
	var near gaps
	for k := range c {
		before[k], after[k] = int32(k-1), int32(k+1)
		if k > 0 {
			if d := c[k].t - c[k-1].t; d < gap {
				near = append(near, gapTo{d, int32(k)})
			}
		}
	}
	heap.Init(&near)
	for left := len(c); len(near) > 0 && left > 2; {
		x := heap.Pop(&near).(gapTo)
		k := x.to
		if before[k] < 0 || c[k].t-c[before[k]].t != x.d {
			continue
		}
		j := before[k]
		p, q := c[j], c[k]
		np, nq := float64(p.last-p.first), float64(q.last-q.first)
		t := (p.t*np + q.t*nq) / max(1, np+nq)
		if j == 0 {
			t = 0
		}
		if int(k) == n+1 {
			t = 1
		}
		// The later takes in the earlier; the start, which has none before it,
		// stays first by taking in the later.
		keep, gone := k, j
		if j == 0 {
			keep, gone = j, k
		}
		c[keep] = cluster{t, p.first, q.last}
		if gone == j {
			before[keep] = before[j]
			after[before[j]] = keep
		} else {
			after[keep] = after[k]
			before[after[k]] = keep
		}
		before[gone] = -2
		left--
		for _, m := range [2]int32{keep, after[keep]} {
			if int(m) < n+2 && before[m] >= 0 {
				if d := c[m].t - c[before[m]].t; d < gap {
					heap.Push(&near, gapTo{d, m})
				}
			}
		}
	}
	out := c[:0]
	for k := int32(0); int(k) < n+2; k = after[k] {
		out = append(out, c[k])
	}
	return out
}

// gapTo is the distance of a cluster from the one before it.
type gapTo struct {
	d  float64
	to int32
}

// gaps is a heap, the least first, of equal ones the first along the edge.
type gaps []gapTo

func (g gaps) Len() int           { return len(g) }
func (g gaps) Less(i, j int) bool { return g[i].d < g[j].d || g[i].d == g[j].d && g[i].to < g[j].to }
func (g gaps) Swap(i, j int)      { g[i], g[j] = g[j], g[i] }
func (g *gaps) Push(x any)        { *g = append(*g, x.(gapTo)) }
func (g *gaps) Pop() any {
	old := *g
	x := old[len(old)-1]
	*g = old[:len(old)-1]
	return x
}
