package mesh

import "math"

// smooth moves each inner point to the mean of its neighbours where that makes
// the least angle around it larger, and makes the mesh Delaunay again.
func (r *refinement) smooth(rounds int) {
	d := r.d
	var ring []xy
	for range rounds {
		for i := r.rim; i < len(d.p); i++ {
			ring = ring[:0]
			var sum xy
			d.around(int32(i), func(_, next, _ int32) {
				q := d.p[next]
				ring = append(ring, q)
				sum = xy{sum.x + q.x, sum.y + q.y}
			})
			to := xy{sum.x / float64(len(ring)), sum.y / float64(len(ring))}
			best := max(leastAngle(ring, d.p[i]), 1e-12)
			if a := leastAngle(ring, to); a > best {
				d.p[i], best = to, a
			}
			if best < poor {
				d.p[i] = search(ring, d.p[i], best)
			}
		}
		d.settle()
	}
}

// poor is the squared sine of 46°: where the least angle is smaller, more places
// are tried than the mean of the neighbours.
const poor = 0.52

// search looks around q for the place with the largest least angle, ever closer.
func search(ring []xy, q xy, best float64) xy {
	step := math.Hypot(ring[0].x-q.x, ring[0].y-q.y) / 4
	for range 6 {
		o := q
		for _, u := range [8]xy{{1, 0}, {0.7, 0.7}, {0, 1}, {-0.7, 0.7}, {-1, 0}, {-0.7, -0.7}, {0, -1}, {0.7, -0.7}} {
			to := xy{o.x + step*u.x, o.y + step*u.y}
			if a := leastAngle(ring, to); a > best {
				q, best = to, a
			}
		}
		if q == o {
			step /= 2
		}
	}
	return q
}

// leastAngle returns the squared sine of the least angle of the triangles between
// q and a ring of points around it, negative when one is turned over.
func leastAngle(ring []xy, q xy) float64 {
	worst := math.Inf(1)
	a := ring[len(ring)-1]
	ax, ay := a.x-q.x, a.y-q.y
	l0 := ax*ax + ay*ay
	for _, b := range ring {
		bx, by := b.x-q.x, b.y-q.y
		area := ax*by - ay*bx
		l1 := bx*bx + by*by
		l2 := (ax-bx)*(ax-bx) + (ay-by)*(ay-by)
		// Twice the area over the two longer sides.
		long := max(l0, l1, l2)
		worst = min(worst, area*math.Abs(area)/(long*max(min(l0, l1), min(max(l0, l1), l2))))
		ax, ay, l0 = bx, by, l1
	}
	return worst
}
