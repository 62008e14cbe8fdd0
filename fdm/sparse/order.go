package sparse

import "context"

// orderGraph numbers the nodes of g for elimination and says which ordering
// was taken.
func orderGraph(ctx context.Context, g graph, o Ordering, mem *pool) ([]int32, Ordering, error) {
	if o == OrderNatural {
		order := make([]int32, g.n)
		for i := range order {
			order[i] = int32(i)
		}
		return order, o, ctx.Err()
	}
	if g.n > 100 && compressible(g) {
		c := compress(g)
		order, chosen := orderNodes(ctx, c.g, c.weight, o, mem)
		return c.expand(order), chosen, ctx.Err()
	}
	order, chosen := orderNodes(ctx, g, nil, o, mem)
	return order, chosen, ctx.Err()
}

// orderNodes does it for nodes that stand for weight unknowns each (nil: one).
func orderNodes(ctx context.Context, g graph, weight []int32, o Ordering, mem *pool) ([]int32, Ordering) {
	switch {
	case o == OrderDissection:
		order, _ := dissect(ctx, g, weight, false, mem)
		return order, o
	case o == OrderAuto && g.n >= dissectFrom:
		if order, ok := dissect(ctx, g, weight, true, mem); ok {
			return order, OrderDissection
		}
	}
	return minimumDegree(g, weight, make([]int32, 0, g.n)), OrderMinimumDegree
}
