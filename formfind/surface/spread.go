package surface

import (
	"cmp"
	"math"
	"slices"

	"anticlast/formfind/canopy"
)

// Spread describes the distribution of values with the given weights (areas):
// the 5 % and 95 % quantiles are the values below which 5 % and 95 % of the
// weight lie. Values that are not numbers and weights that are not positive
// are left out; with none left everything is zero.
func Spread(values, weights []float64) canopy.Spread {
	type item struct{ v, w float64 }
	items := make([]item, 0, len(values))
	var total, sum float64
	for i, v := range values {
		if w := weights[i]; w > 0 && !math.IsNaN(v) {
			items = append(items, item{v, w})
			total += w
			sum += w * v
		}
	}
	if len(items) == 0 {
		return canopy.Spread{}
	}
	slices.SortFunc(items, func(a, b item) int {
		switch {
		case a.v < b.v:
			return -1
		case a.v > b.v:
			return 1
		}
		return cmp.Compare(a.w, b.w)
	})
	at := func(q float64) float64 {
		var w float64
		for _, it := range items {
			w += it.w
			if w >= q*total {
				return it.v
			}
		}
		return items[len(items)-1].v
	}
	s := canopy.Spread{Min: items[0].v, P5: at(0.05), Mean: sum / total, P95: at(0.95), Max: items[len(items)-1].v}
	// A mean of equal values can leave their range by rounding.
	s.Mean = min(max(s.Mean, s.Min), s.Max)
	return s
}
