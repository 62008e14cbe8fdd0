package mesh

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// AngleBound is the least angle that refinement aims at away from sharper
// corners, in radians (28°): triangles whose circumradius is more than 1.065
// times their shortest side are split where that is possible.
const AngleBound = 28 * math.Pi / 180

// sharpCorner is the largest angle of an outline that can force an angle below
// the bound: a triangle between its two sides has one of at most half of it.
const sharpCorner = 2 * AngleBound

// Quality says how well an outline that was meshed freely could be filled.
type Quality struct {
	Fabric    string
	Triangles int
	// Mean and Worst are of twice the inradius over the circumradius in the
	// plane of the outline: 1 for an equilateral triangle.
	Mean, Worst float64
	LeastAngle  float64 // radians, in the plane of the outline
	// Met is set when no angle is below AngleBound but in corners sharper than
	// twice that, as far as these are narrower than the sides they are divided
	// into. Otherwise Why says what stood in the way At.
	Met bool
	At  r3.Vec // place of the least angle that Why explains
	Why string
	// Sharp counts the corners of the outline sharper than twice AngleBound,
	// Corner is the node of the sharpest and CornerAngle its angle.
	Sharp       int
	Corner      int32
	CornerAngle float64

	thin int // triangles below the bound, but for those in sharp corners
}

// verdict is what inspect finds out about a refined triangulation.
type verdict struct {
	triangles   int
	mean, worst float64
	angle       float64 // least of all
	met         bool
	thin        int
	at          xy
	why         string
	sharp       int
	corner      int32 // point of the triangulation
	cornerAngle float64
}

// inspect measures the triangles and says where and why the bound is not met.
func (r *refinement) inspect() verdict {
	d := r.d
	v := verdict{worst: 1, angle: math.Pi, met: true, corner: -1, cornerAngle: math.Pi}
	sharp := r.sharpCorners(&v)
	thinnest := AngleBound
	for t, in := range r.in {
		if !in {
			continue
		}
		c := d.v[t]
		ratio, angle := fatness(d.p[c[0]], d.p[c[1]], d.p[c[2]])
		v.triangles++
		v.mean += ratio
		v.worst, v.angle = min(v.worst, ratio), min(v.angle, angle)
		if angle >= AngleBound || r.within(sharp, c) {
			continue
		}
		v.thin++
		if angle >= thinnest {
			continue
		}
		thinnest = angle
		v.met = false
		v.at = xy{(d.p[c[0]].x + d.p[c[1]].x + d.p[c[2]].x) / 3, (d.p[c[0]].y + d.p[c[1]].y + d.p[c[2]].y) / 3}
		on := 0
		for _, i := range c {
			if int(i) < r.rim {
				on++
			}
		}
		switch {
		case on == 3:
			v.why = "what was drawn lies closer together there than the sides it is divided into; a finer mesh or more segments would help"
		case on > 0:
			v.why = "sides of very different length meet near there; more segments on the longer one would help"
		default:
			v.why = "fine and coarse parts are too near to each other there"
		}
		v.why = fmt.Sprintf("the least angle is %.1f°: %s", angle*180/math.Pi, v.why)
	}
	v.mean /= max(1, float64(v.triangles))
	if r.full {
		v.met, v.thin = false, 0
		v.why = "the greatest number of triangles was reached; a coarser mesh would be filled"
	}
	return v
}

// fatness returns 2·inradius/circumradius and the least angle of a triangle.
func fatness(a, b, c xy) (ratio, angle float64) {
	la, lb, lc := math.Hypot(b.x-c.x, b.y-c.y), math.Hypot(c.x-a.x, c.y-a.y), math.Hypot(a.x-b.x, a.y-b.y)
	area := ((b.x-a.x)*(c.y-a.y) - (b.y-a.y)*(c.x-a.x)) / 2
	if !(area > 0 && la*lb*lc > 0) {
		return 0, 0 // too small for floating point
	}
	ratio = 16 * area / (la + lb + lc) * (area / la / lb / lc)
	return ratio, math.Asin(min(1, 2*area/la/lb/lc*min(la, lb, lc)))
}

// corner is a point at which two held sides meet under less than sharpCorner.
type corner struct {
	point int32
	angle float64
	reach float64 // how far the corner is narrower than the sides there are long
}

// within reports whether all corners of a triangle lie in a sharp corner.
func (r *refinement) within(sharp []corner, c [3]int32) bool {
	p := r.d.p
	for _, s := range sharp {
		o := p[s.point]
		far := 0.0
		for _, i := range c {
			far = max(far, math.Hypot(p[i].x-o.x, p[i].y-o.y))
		}
		if far <= s.reach {
			return true
		}
	}
	return false
}

// sharpCorners lists the points at which two held sides meet under less than
// sharpCorner with triangles to be kept between them.
func (r *refinement) sharpCorners(v *verdict) []corner {
	d := r.d
	var sharp []corner
	for t, in := range r.in {
		if !in {
			continue
		}
		for k := range 3 {
			// A sector starts at a held side and is added up to the next.
			if !d.held[t][(k+2)%3] {
				continue
			}
			i := d.v[t][k]
			sum, s, long := 0.0, int32(t), 0.0
			for {
				j := d.corner(s, i)
				o, a, b := d.p[i], d.p[d.v[s][(j+1)%3]], d.p[d.v[s][(j+2)%3]]
				ux, uy, wx, wy := a.x-o.x, a.y-o.y, b.x-o.x, b.y-o.y
				sum += math.Atan2(ux*wy-uy*wx, ux*wx+uy*wy)
				long = max(long, math.Hypot(ux, uy), math.Hypot(wx, wy))
				if d.held[s][(j+1)%3] || sum > sharpCorner {
					break
				}
				s = d.n[s][(j+1)%3]
			}
			if sum > sharpCorner {
				continue
			}
			// At the distance x it is 2·x·tan(angle/2) wide.
			sharp = append(sharp, corner{i, sum, long/(2*math.Tan(sum/2)) + long})
			v.sharp++
			if sum < v.cornerAngle {
				v.corner, v.cornerAngle = i, sum
			}
		}
	}
	return sharp
}
