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
//
// The quantiles are selected (Hoare 1961), not sorted for: cost O(n).
func Spread(values, weights []float64) canopy.Spread {
	items := make([]weighted, 0, len(values))
	var total, sum float64
	for i, v := range values {
		if w := weights[i]; w > 0 && !math.IsNaN(v) {
			items = append(items, weighted{v, w})
			total += w
			sum += w * v
		}
	}
	if len(items) == 0 {
		return canopy.Spread{}
	}
	s := canopy.Spread{Min: items[0].v, Max: items[0].v, Mean: sum / total}
	for _, it := range items {
		s.Min, s.Max = min(s.Min, it.v), max(s.Max, it.v)
	}
	s.P5, s.P95 = quantile(items, 0.05*total), quantile(items, 0.95*total)
	// A mean of equal values can leave their range by rounding.
	s.Mean = min(max(s.Mean, s.Min), s.Max)
	return s
}

type weighted struct{ v, w float64 }

func byValue(a, b weighted) int {
	if c := cmp.Compare(a.v, b.v); c != 0 {
		return c
	}
	return cmp.Compare(a.w, b.w)
}

// quantile returns the value up to which the items, the smallest first, weigh
// the given weight. It reorders them.
func quantile(items []weighted, weight float64) float64 {
	below := 0.0
	for tries := 0; ; tries++ {
		n := len(items)
		if n <= 32 || tries > 60 { // after that many bad guesses sorting is safer
			slices.SortFunc(items, byValue)
			for _, it := range items {
				below += it.w
				if below >= weight {
					return it.v
				}
			}
			return items[n-1].v
		}
		p, q, r := items[n/4].v, items[n/2].v, items[3*n/4].v
		guess := max(min(p, q), min(max(p, q), r)) // the middle one
		// Smaller ones to the front, larger ones to the back.
		less, more := 0, n
		var light, same float64
		for i := 0; i < more; {
			switch it := items[i]; {
			case it.v < guess:
				items[i], items[less] = items[less], it
				light += it.w
				less++
				i++
			case it.v > guess:
				more--
				items[i], items[more] = items[more], it
			default:
				same += it.w
				i++
			}
		}
		switch {
		case less > 0 && below+light >= weight:
			items = items[:less]
		case below+light+same >= weight || more == n:
			return guess
		default:
			below += light + same
			items = items[more:]
		}
	}
}
