package sparse

import "context"

const (
	// sweepFrom is the number of nodes from which a graph is numbered anew
	// before it is ordered.
	sweepFrom = 64
	// dissectFrom is the number of nodes from which nested dissection is as good
	// as approximate minimum degree, or better, and quicker: on nets with few
	// links at a node (quadrilaterals), and on nets with many (triangles), where
	// minimum degree is at its best.
	dissectFrom, dissectManyFrom = 200, 3000
	// manyLinks at a node on average. With fewLinks the graph is nearly a chain
	// or a tree, for which minimum degree is best at any size.
	manyLinks, fewLinks = 5, 2.2
)

// orderGraph numbers the nodes of g for elimination and says which ordering
// was taken. s is the sweep that gave g its numbering.
func orderGraph(ctx context.Context, g graph, s sweep, o Ordering, mem *pool) ([]int32, Ordering, error) {
	if o == OrderNatural {
		order := mem.get(g.n)
		for i := range order {
			order[i] = int32(i)
		}
		return order, o, ctx.Err()
	}
	if g.n > 100 && compressible(g) {
		c := compress(g)
		t, h := newSweep(c.g, mem)
		weight := mem.get(h.n)
		for k, i := range t.order {
			weight[k] = c.weight[i]
		}
		order, chosen := orderNodes(ctx, h, t, weight, o, mem)
		for k, i := range order {
			order[k] = t.order[i]
		}
		return c.expand(order), chosen, ctx.Err()
	}
	order, chosen := orderNodes(ctx, g, s, nil, o, mem)
	return order, chosen, ctx.Err()
}

// orderNodes does it for nodes that stand for weight unknowns each (nil: one).
func orderNodes(ctx context.Context, g graph, s sweep, weight []int32, o Ordering, mem *pool) ([]int32, Ordering) {
	from := dissectFrom
	links := float64(len(g.adj)) / float64(max(1, g.n))
	if links >= manyLinks {
		from = dissectManyFrom
	}
	switch {
	case o == OrderDissection:
		order, _ := dissect(ctx, g, s, weight, false, mem)
		return order, o
	case o == OrderAuto && s.largest() >= from && int(s.end) == g.n && links >= fewLinks:
		if order, ok := dissect(ctx, g, s, weight, true, mem); ok {
			return order, OrderDissection
		}
	}
	return minimumDegree(g, weight, mem.get(g.n)[:0], mem), OrderMinimumDegree
}
