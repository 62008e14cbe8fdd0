package formfind

import (
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/fdm"
	"anticlast/formfind/canopy"
	"anticlast/formfind/load"
)

// naturalUpdates is the fixed number of natural-force-density updates between
// the first shape and Newton. Never "until converged": what is left out of
// balance falls with the mesh size, so a test on it ends too early on fine
// meshes, and a surface of uniform stress does not resist sliding in itself, so
// that many updates let nodes run together.
const naturalUpdates = 5

// soundMesh reports whether the start positions make a mesh without thin
// triangles. Natural force densities carry the proportions of such a mesh over
// to the found shape; the linear step knows only how nodes are connected and
// crushes the row of triangles next to a cable. Drawn models start sound; a
// listed one may start anywhere.
func soundMesh(s *canopy.Structure) bool {
	const thin = 0.1763 // tan 10°
	for _, c := range s.Corners {
		for k := range c {
			p := s.Position[c[k]]
			u, v := r3.Sub(s.Position[c[(k+1)%3]], p), r3.Sub(s.Position[c[(k+2)%3]], p)
			if d := r3.Dot(u, v); d > 0 && r3.Norm2(r3.Cross(u, v)) < thin*thin*d*d {
				return false
			}
		}
	}
	return true
}

// smallestAngle is the smallest angle of any triangle, rad; π without triangles.
func smallestAngle(x []r3.Vec, corners [][3]int32) float64 {
	cot := math.Inf(-1)
	for _, c := range corners {
		area := 0.0
		for k := range c {
			p := x[c[k]]
			u, v := r3.Sub(x[c[(k+1)%3]], p), r3.Sub(x[c[(k+2)%3]], p)
			if k == 0 {
				area = length(r3.Cross(u, v))
			}
			if area == 0 {
				return 0
			}
			cot = max(cot, r3.Dot(u, v)/area)
		}
	}
	return math.Pi/2 - math.Atan(cot)
}

// network hands a structure's supports, ties and members to the force density
// solver. Members whose force is found afterwards from balance stay in it with
// no force.
func network(s *canopy.Structure, loads []r3.Vec) (fdm.Network, []fdm.Panel) {
	n := fdm.Network{
		Position: s.Position,
		Fixed:    make([]fdm.Directions, len(s.Position)),
		Load:     loads,
		Master:   s.Master,
		Ends:     s.Ends,
	}
	for i := range n.Fixed {
		n.Fixed[i] = fdm.Directions(s.FixedAt(i))
	}
	panels := make([]fdm.Panel, len(s.Corners))
	for t := range panels {
		c := s.Corners[t]
		warp := s.WarpAt(t, s.Position[c[0]], s.Position[c[1]], s.Position[c[2]])
		panels[t] = fdm.Panel{Corners: c, Warp: warp, WarpStress: s.Stress[t][0], WeftStress: s.Stress[t][1]}
	}
	return n, panels
}

// startNetwork is network with the free ends of masts kept where they start. A
// strut of given force has no place of its own in a linear step: its force
// density grows as it shortens, and it would shrink to nothing. Newton's method
// moves it later. Struts of given force density stay free.
func startNetwork(s *canopy.Structure, loads []r3.Vec) (fdm.Network, []fdm.Panel) {
	n, panels := network(s, loads)
	for _, k := range freeMasts(s) {
		for _, i := range s.Ends[k] {
			if m := s.MasterOf(int(i)); m >= 0 {
				i = m
			}
			n.Fixed[i] = fdm.Directions(canopy.DirAll)
		}
	}
	return n, panels
}

// guessForces returns a force for every member to start from, in N: what is
// given, or what would hold a cable's sag against what pulls at it.
func guessForces(s *canopy.Structure, x []r3.Vec) []float64 {
	force := make([]float64, len(s.Ends))
	span := func(k int32) float64 { return length(r3.Sub(x[s.Ends[k][1]], x[s.Ends[k][0]])) }
	for k := range force {
		switch s.Law[k] {
		case canopy.LawForceDensity:
			force[k] = s.Given[k] * span(int32(k))
		case canopy.LawForce, canopy.LawCable:
			force[k] = s.Given[k]
		case canopy.LawElastic:
			ea, l0 := s.Stiffness[k], s.Unstressed[k]
			force[k] = ea * (span(int32(k)) - l0) / l0
			if !s.Kind[k].Pushes() {
				// A cable that starts slack still has to hold its place in
				// the first, linear step.
				force[k] = max(force[k], 1e-3*ea)
			}
		}
	}
	var pull []float64
	for c := range s.Cables {
		cb := &s.Cables[c]
		switch cb.Law {
		case canopy.CablePerMember:
			continue
		case canopy.CableBalance:
			for _, k := range cb.Members {
				force[k] = 0
			}
			continue
		}
		if len(cb.Members) > 0 && s.Given[cb.Members[0]] != 0 {
			continue
		}
		if pull == nil {
			pull = nodalPullSizes(s, x, force)
		}
		chord := r3.Norm(r3.Sub(x[cb.Nodes[len(cb.Nodes)-1]], x[cb.Nodes[0]]))
		sum := 0.0
		for _, i := range cb.Nodes[1 : len(cb.Nodes)-1] {
			sum += pull[i]
		}
		sag := 0.1 // common practice for an edge cable
		if cb.Law == canopy.CableSag && cb.Value > 0 {
			sag = cb.Value
		}
		t := sum * (0.25 + sag*sag) / (2 * sag) // T = w·R, R of an arc of this sag
		if t == 0 || chord == 0 {
			t = meanPull(s, force)
			if s.Kind[cb.Members[0]].Pushes() {
				t = -t
			}
		}
		for _, k := range cb.Members {
			force[k] = t
		}
	}
	return force
}

// nodalPullSizes estimates how hard each node is pulled across a cable: by
// films along their edges and by net cables that end there.
func nodalPullSizes(s *canopy.Structure, x []r3.Vec, force []float64) []float64 {
	pull := make([]float64, len(x))
	for t, c := range s.Corners {
		a := r3.Norm(r3.Cross(r3.Sub(x[c[1]], x[c[0]]), r3.Sub(x[c[2]], x[c[0]]))) / 2
		p := (s.Stress[t][0] + s.Stress[t][1]) / 2 * math.Sqrt(a) / 2
		for _, i := range c {
			pull[i] += p
		}
	}
	for k, e := range s.Ends {
		if s.Kind[k] == canopy.KindNetCable {
			pull[e[0]] += math.Abs(force[k])
			pull[e[1]] += math.Abs(force[k])
		}
	}
	return pull
}

func meanPull(s *canopy.Structure, force []float64) float64 {
	sum, n := 0.0, 0
	for _, t := range force {
		if t > 0 {
			sum += t
			n++
		}
	}
	if n > 0 {
		return sum / float64(n)
	}
	for _, st := range s.Stress {
		return st[0] * s.Size() / 4
	}
	return 1
}

// guessDensities returns force densities for the first linear step.
func guessDensities(s *canopy.Structure, x []r3.Vec, force []float64) []float64 {
	q := make([]float64, len(s.Ends))
	mean, n := 0.0, 0
	for k, e := range s.Ends {
		if s.Law[k] == canopy.LawForceDensity {
			q[k] = s.Given[k]
			continue
		}
		if l := r3.Norm(r3.Sub(x[e[1]], x[e[0]])); l > 0 {
			q[k] = force[k] / l
			mean += math.Abs(q[k])
			n++
		}
	}
	if n > 0 {
		mean /= float64(n)
	}
	for k, e := range s.Ends {
		if s.Law[k] != canopy.LawForceDensity && x[e[0]] == x[e[1]] && force[k] != 0 {
			q[k] = mean
		}
	}
	return q
}

// steadyLoads reports whether external forces do not depend on the shape.
func steadyLoads(s *canopy.Structure) bool {
	if len(s.Enclosures) > 0 {
		return false
	}
	for i := range s.Fabrics {
		if s.Fabrics[i].Pressure != 0 || s.SelfWeight && s.Fabrics[i].Weight != 0 {
			return false
		}
	}
	if s.SelfWeight {
		for k, w := range s.Weight {
			if w != 0 && (s.Unstressed == nil || s.Unstressed[k] == 0) {
				return false
			}
		}
	}
	return true
}

// startLoads are the external forces of the first linear step.
func startLoads(s *canopy.Structure) []r3.Vec {
	for i := range s.Fabrics {
		if s.Fabrics[i].Pressure != 0 {
			// Pressure on a start shape that may be flat or folded is worse
			// than none.
			c := *s
			c.Fabrics = append([]canopy.Fabric(nil), s.Fabrics...)
			for j := range c.Fabrics {
				c.Fabrics[j].Pressure = 0
			}
			return load.Nodal(&c, s.Position)
		}
	}
	return load.Nodal(s, s.Position)
}
