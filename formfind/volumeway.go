package formfind

import (
	"fmt"
	"math"

	"anticlast/formfind/canopy"
)

// volumeWay is the way from fabric that encloses little to the volumes asked
// for, false when none are. A film of equal stress on a plane boundary has a
// shape for any volume; one between cables or of unequal stress may not.
func volumeWay(s *canopy.Structure) (way, bool) {
	name, most := "", 0.0
	for i := range s.Enclosures {
		if v := s.Enclosures[i].Volume; math.Abs(v) > math.Abs(most) {
			name, most = s.Enclosures[i].Name, v
		}
	}
	return way{
		name: "volume",
		easy: []float64{0.5, 0.1, 0.01},
		set: func(w, s *canopy.Structure, t float64) {
			for i := range w.Enclosures {
				w.Enclosures[i].Volume = t * s.Enclosures[i].Volume
			}
		},
		say: func(s *canopy.Structure, t float64) *NoEquilibriumError {
			return &NoEquilibriumError{Shown: true, Quantity: "enclosed volume", Given: most, Limit: t * most,
				Text: fmt.Sprintf("no equilibrium with %.4g m³ of air below fabric %s: with this prestress and these edges a stable shape exists up to about %.4g m³ (%.1f %% of it). Give less volume, make the edge cables stronger, or fix the edges", most, name, t*most, 100*t)}
		},
	}, most != 0
}
