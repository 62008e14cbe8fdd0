package relax

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// sliding is a cable with one force in all its members.
//
// An elastic cable's force follows from its length at every step. For a given
// length the force is the multiplier of an augmented Lagrangian: force + stiff ·
// (length − wanted) acts, and becomes the new force when the canopy comes to
// rest (Hestenes 1969; Powell 1969). For a given sag the force is changed when
// the canopy has come near to rest, by a secant in logarithms: sag falls about
// as 1/force.
type sliding struct {
	index   int // in the structure
	law     canopy.CableLaw
	members []int32 // of the problem
	nodes   []int32
	pushes  bool
	force   float64 // acting now, N
	base    float64 // of the augmented Lagrangian, N
	stiff   float64 // N/m
	rest    float64 // unstressed or wanted length, m
	value   float64 // wanted sag over chord

	// Secant of ln(sag) over ln(force).
	lastForce, lastSag, slope float64
	changes                   int
	seenSag                   float64 // at the last place of rest
}

func (p *problem) addCables(x []r3.Vec) error {
	byIndex := make([]int, len(p.s.Cables))
	for c := range p.s.Cables {
		byIndex[c] = -1
		cable := &p.s.Cables[c]
		switch cable.Law {
		case canopy.CablePerMember, canopy.CableBalance:
			continue
		}
		if err := checkCable(cable); err != nil {
			return err
		}
		byIndex[c] = len(p.cable)
		p.cable = append(p.cable, sliding{
			index: c, law: cable.Law, pushes: cable.Kind.Pushes(), value: cable.Value, nodes: cable.Nodes, slope: -1,
		})
	}
	for m, k := range p.src {
		if p.law[m] == byCable {
			g := &p.cable[byIndex[p.s.CableOf[k]]]
			g.members = append(g.members, int32(m))
		}
	}
	kept := p.cable[:0]
	for _, g := range p.cable {
		if len(g.members) > 0 {
			kept = append(kept, g)
		}
	}
	p.cable = kept
	for c := range p.cable {
		g := &p.cable[c]
		cable := &p.s.Cables[g.index]
		length := 0.0
		for _, m := range g.members {
			length += norm(r3.Sub(x[p.ends[m][1]], x[p.ends[m][0]]))
			if g.base == 0 {
				g.base = p.s.Given[p.src[m]]
			}
		}
		if g.base == 0 {
			g.base = p.guessForce(g, length)
			if g.pushes {
				g.base = -g.base
			}
		}
		g.force = g.base
		switch g.law {
		case canopy.CableElastic:
			g.rest = cable.Unstressed
			g.stiff = cable.Stiffness / cable.Unstressed
			g.base = 0
		case canopy.CableLength:
			g.rest = cable.Value
			g.stiff = 100 * math.Abs(g.base) / g.rest
		}
	}
	return nil
}

// guessForce is a first guess of the force of a cable: the pull of the fabric
// along it on a circular arc of some 10 % sag, or the load around it.
func (p *problem) guessForce(g *sliding, length float64) float64 {
	stress, count := 0.0, 0
	load := 0.0
	for _, m := range g.members {
		for _, i := range p.ends[m] {
			for _, c := range p.around[p.cornerAt[i]:p.cornerAt[i+1]] {
				st := p.stress[c.at>>2]
				stress += (st[0] + st[1]) / 2
				count++
			}
			for _, l := range p.links[p.linkAt[i]:p.linkAt[i+1]] {
				if p.law[l.member] == byForce {
					load = max(load, math.Abs(p.given[l.member]))
				}
			}
			load += norm(p.lead[i])
		}
	}
	if count > 0 && stress > 0 {
		return 1.3 * stress / float64(count) * length
	}
	if load > 0 {
		return load
	}
	return 1000
}

// checkCable says what is missing of a cable.
func checkCable(cable *canopy.Cable) error {
	bad := func(what string, v float64) error {
		return fmt.Errorf("cable %s needs a positive %s, has %g", cable.Name, what, v)
	}
	switch cable.Law {
	case canopy.CableElastic:
		if !(cable.Stiffness > 0) {
			return bad("stiffness", cable.Stiffness)
		}
		if !(cable.Unstressed > 0) {
			return bad("unstressed length", cable.Unstressed)
		}
	case canopy.CableLength:
		if !(cable.Value > 0) {
			return bad("length", cable.Value)
		}
	case canopy.CableSag:
		if !(cable.Value > 0) {
			return bad("sag", cable.Value)
		}
		if len(cable.Nodes) < 3 {
			return fmt.Errorf("cable %s has no node between its ends that could sag", cable.Name)
		}
	}
	return nil
}

// pullCables finds the forces of all cables from their lengths and hands them
// to their members.
func (st *state) pullCables() {
	tiny := 1e-12 * st.size
	for c := range st.cable {
		g := &st.cable[c]
		if g.law != canopy.CableSag {
			length := 0.0
			for _, m := range g.members {
				length += st.length[m]
			}
			g.force = g.base + g.stiff*(length-g.rest)
			if g.force < 0 && !g.pushes {
				g.force = 0
			}
		}
		for _, m := range g.members {
			st.q[m] = g.force / max(st.length[m], tiny)
		}
	}
}

// stiffenCables adds what the length of a cable resists: its stiffness is
// k·g·gᵀ with gᵢ = ∂L/∂xᵢ, whose row sums are k·|gᵢ|·Σ|gⱼ|.
func (st *state) stiffenCables() {
	var g []float64
	for c := range st.cable {
		k := &st.cable[c]
		if k.stiff == 0 {
			continue
		}
		g = g[:0]
		total := 0.0
		seen := func(i int32) float64 {
			var sum r3.Vec
			for _, l := range st.links[st.linkAt[i]:st.linkAt[i+1]] {
				if st.law[l.member] == byCable && st.s.CableOf[st.src[l.member]] == int32(k.index) {
					sum = r3.Add(sum, unit(r3.Sub(st.x[l.other], st.x[i])))
				}
			}
			return norm(masked(sum, st.free[i]))
		}
		for _, i := range k.nodes {
			v := seen(i)
			g = append(g, v)
			total += v
		}
		for n, i := range k.nodes {
			// mᵢ = ½ΣSᵢ is enough for eigenvalues up to twice S, so half the row
			// sum does.
			st.mass[i] += 0.5 * k.stiff * g[n] * (total + g[n])
		}
	}
}

// sag is the largest distance of a node of the cable from its chord over the chord.
func (st *state) sag(g *sliding) float64 {
	a, b := st.x[g.nodes[0]], st.x[g.nodes[len(g.nodes)-1]]
	chord := r3.Sub(b, a)
	l2 := r3.Norm2(chord)
	most := 0.0
	for _, i := range g.nodes {
		d := r3.Sub(st.x[i], a)
		most = max(most, r3.Norm2(r3.Sub(d, r3.Scale(r3.Dot(d, chord)/l2, chord))))
	}
	return math.Sqrt(most / l2)
}

// cableError is the largest relative error of a given length or sag.
func (st *state) cableError() (worst float64, cable int) {
	cable = -1
	for c := range st.cable {
		g := &st.cable[c]
		e := 0.0
		switch g.law {
		case canopy.CableSag:
			e = math.Abs(st.sag(g)/g.value - 1)
		case canopy.CableLength:
			e = math.Abs(g.force-g.base) / (g.stiff * g.rest)
		}
		if e > worst || math.IsNaN(e) {
			worst, cable = e, c
		}
	}
	return worst, cable
}

// adjustCables changes the given forces at a rest of the canopy with residual eta.
func (st *state) adjustCables(eta float64) {
	for c := range st.cable {
		g := &st.cable[c]
		switch g.law {
		case canopy.CableLength:
			if g.base == 0 || math.Abs(g.force) > 5*math.Abs(g.base) {
				g.base += math.Copysign(4*math.Abs(g.base)+1e-6*g.stiff*g.rest, g.force-g.base)
				break
			}
			g.base = g.force
		case canopy.CableSag:
			sag := st.sag(g)
			e := math.Log(max(sag, 1e-6) / g.value)
			// Not before the canopy has answered to the last change.
			drift := math.Log(max(sag, 1e-6) / max(g.seenSag, 1e-6))
			g.seenSag = sag
			if eta > 0.05*math.Abs(e) || math.Abs(drift) > 0.05*math.Abs(e) {
				break
			}
			if g.changes > 0 {
				if d := math.Log(g.force / g.lastForce); math.Abs(d) > 1e-12 {
					if m := math.Log(max(sag, 1e-6)/g.lastSag) / d; !math.IsNaN(m) {
						g.slope = min(max(m, -2), -0.5)
					}
				}
			}
			g.lastForce, g.lastSag = g.force, max(sag, 1e-6)
			g.changes++
			g.force *= math.Exp(min(max(-e/g.slope, -0.4), 0.4))
		}
	}
}
