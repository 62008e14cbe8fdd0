package sparse

import "context"

// orderGraph numbers the nodes of g for elimination and says which ordering
// was taken.
func orderGraph(ctx context.Context, g graph, o Ordering) ([]int32, Ordering, error) {
	order := make([]int32, 0, g.n)
	switch o {
	case OrderNatural:
		for i := range int32(g.n) {
			order = append(order, i)
		}
	case OrderMinimumDegree:
		order = minimumDegree(g, order)
	case OrderDissection:
		order = dissect(ctx, g, nil, order)
	default:
		if g.n >= dissectFrom {
			return dissect(ctx, g, nil, order), OrderDissection, ctx.Err()
		}
		return minimumDegree(g, order), OrderMinimumDegree, ctx.Err()
	}
	return order, o, ctx.Err()
}
