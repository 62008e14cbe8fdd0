package surface

import (
	"math"

	"anticlast/formfind/canopy"
)

// Principal returns the principal stresses of s, N/m, the larger first, and
// the angle from the warp towards the weft at which the larger acts, rad, in
// (−π/2, π/2].
func Principal(s canopy.Stress) (major, minor, angle float64) {
	mean, half := (s.Warp+s.Weft)/2, (s.Warp-s.Weft)/2
	r := math.Hypot(half, s.Shear)
	return mean + r, mean - r, math.Atan2(s.Shear, half) / 2
}
