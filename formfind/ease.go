package formfind

import (
	"context"
	"math"
	"slices"

	"anticlast/formfind/audit"
	"anticlast/formfind/canopy"
)

// ease deals with unequal warp and weft that the outline does not let the fabric
// carry: where the yarn runs against the balance of the fabric in its plane,
// the stress that balances is far from the wanted ratio, and with ratios far
// from one the shape may have no firmness left. The ratio is then brought nearer
// to one in steps until the shape is stable; the report compares what is
// carried with what was asked for.
func (c *chain) ease(ctx context.Context) error {
	good, err := c.firm(ctx, c.f)
	if err != nil || good {
		return err
	}
	for _, share := range []float64{0.75, 0.5, 0.25, 0} {
		s := *c.s
		s.Stress = slices.Clone(s.Stress)
		for t, w := range s.Stress {
			mean, half := math.Sqrt(w[0]*w[1]), math.Pow(w[0]/w[1], share/2)
			s.Stress[t] = [2]float64{mean * half, mean / half}
		}
		o := c.o
		o.eased, o.Warm, o.below, o.solver, o.Listed = true, nil, nil, nil, false
		sub := &chain{s: &s, o: o}
		if err := sub.fabric(ctx); err != nil {
			if ctx.Err() != nil {
				return err
			}
			continue
		}
		good, err := c.firm(ctx, sub.f)
		if err != nil {
			return err
		}
		if good {
			c.f, c.smooth, c.use, c.eased, c.hung = sub.f, sub.smooth, sub.use, &s, sub.hung
			c.did = append(c.did, sub.did...)
			c.say("the outline does not let the fabric hold the wanted ratio of warp to weft: eased to the power %.2g of it, with which the shape is stable", share)
			return nil
		}
	}
	return nil
}

// firm reports whether a form is stable on a mesh that has not collapsed.
func (c *chain) firm(ctx context.Context, f *canopy.Form) (bool, error) {
	if smallestAngle(f.Position, c.s.Corners) < nearCollapse/4 {
		return false, nil
	}
	a, err := audit.Stability(ctx, c.s, f, audit.Options{})
	if err != nil {
		return false, err
	}
	return a.Unstable == 0, nil
}
