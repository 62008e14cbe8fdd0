package formfind

import "anticlast/formfind/canopy"

// freeMasts lists the masts and struts whose force is not a force density and
// not found from balance afterwards, with an end that may move. A linear step
// would take such a force for a force density, which grows as the mast
// shortens.
func freeMasts(s *canopy.Structure) []int32 {
	var list []int32
	for k, e := range s.Ends {
		if !s.Kind[k].Pushes() || s.Law[k] == canopy.LawForceDensity {
			continue
		}
		if s.Law[k] == canopy.LawCable && s.Cables[s.CableOf[k]].Law == canopy.CableBalance {
			continue
		}
		for _, i := range e {
			if m := s.MasterOf(int(i)); m >= 0 {
				i = m
			}
			if s.FixedAt(int(i)) != canopy.DirAll {
				list = append(list, int32(k))
				break
			}
		}
	}
	return list
}
