package surface

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// Sag returns the largest distance of the given nodes from the chord between
// the first and the last of them, and the length of the chord, both in m. A
// closed line has no chord: both are zero.
func Sag(position []r3.Vec, nodes []int32) (sag, chord float64) {
	if len(nodes) < 2 {
		return 0, 0
	}
	a := position[nodes[0]]
	u := r3.Sub(position[nodes[len(nodes)-1]], a)
	chord = norm(u)
	if !(chord > 0) {
		return 0, 0
	}
	u = r3.Scale(1/chord, u)
	for _, i := range nodes {
		sag = max(sag, norm(r3.Cross(r3.Sub(position[i], a), u)))
	}
	return sag, chord
}

// SlackShare is the share of its specified force below which a cable counts as
// slack.
const SlackShare = 1e-3

// ForceScale returns the mean size of the forces of the members of s, N, by
// which slackness is judged where no force is specified.
func ForceScale(s *canopy.Structure, f *canopy.Form) float64 {
	if len(s.Ends) == 0 {
		return 0
	}
	sum := 0.0
	for _, t := range f.Force {
		sum += math.Abs(t)
	}
	return sum / float64(len(s.Ends))
}

// Specified returns the force that the law of member k asks for at the
// positions x, N, and whether it asks for one: members whose force follows
// from stiffness, balance or a cable's geometry have none.
func Specified(s *canopy.Structure, x []r3.Vec, k int) (float64, bool) {
	switch s.Law[k] {
	case canopy.LawForceDensity:
		e := s.Ends[k]
		return s.Given[k] * norm(r3.Sub(x[e[1]], x[e[0]])), true
	case canopy.LawForce:
		return s.Given[k], true
	}
	return 0, false
}

// Slack reports whether member k, a cable, carries less than [SlackShare] of
// what is specified or, where nothing is, of the mean force scale.
func Slack(s *canopy.Structure, x []r3.Vec, f *canopy.Form, k int, scale float64) bool {
	if want, ok := Specified(s, x, k); ok {
		scale = math.Abs(want)
	}
	return f.Force[k] < SlackShare*scale
}
