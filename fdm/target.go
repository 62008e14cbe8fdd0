package fdm

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/spatial/r3"
)

// Quantity is what a [Target] is about.
type Quantity uint8

// Quantities of targets.
const (
	// Force in N: the mean of the forces of the members.
	Force Quantity = iota
	// Length in m: the sum of the lengths of the members.
	Length
	// Unstressed length in m: the sum over the members of L/(1 + force/EA),
	// with EA from [FitSettings.Stiffness].
	Unstressed
	// Sag over chord of a chain of members: the largest distance of a node of
	// the chain from the straight line between its ends, over their distance.
	Sag
)

// String gives the quantity's name.
func (q Quantity) String() string {
	switch q {
	case Force:
		return "force"
	case Length:
		return "length"
	case Unstressed:
		return "unstressed length"
	case Sag:
		return "sag"
	}
	return "unknown"
}

// Target asks for the value of one quantity of a member or of several members
// together.
type Target struct {
	Quantity Quantity
	// Members concerned, by number; for Sag in order from one end of the chain
	// to the other.
	Members []int32
	// Value wanted, in N, in m or, for Sag, as a ratio.
	Value float64
	// Weight of the target where not all can be met; 0 counts as 1.
	Weight float64
}

// goals are targets made ready: flat lists, and what they come to at one shape
// with its derivatives.
type goals struct {
	target    []Target
	ends      [][2]int32
	stiffness []float64
	weight    []float64 // of each target, over the size of its value
	chain     [][]int32 // nodes of the chain, for Sag only

	value []float64 // reached
	off   []float64 // weighted relative difference from the target

	// Derivatives of off, row by row: by node positions and by force
	// densities. Entries of target t are first[t] to first[t+1].
	nodeFirst, memberFirst []int32
	node                   []int32
	byPosition             []r3.Vec
	member                 []int32
	byDensity              []float64
}

// newGoals checks the targets.
func newGoals(target []Target, ends [][2]int32, stiffness []float64) (*goals, error) {
	g := &goals{
		target: target, ends: ends, stiffness: stiffness,
		weight:      make([]float64, len(target)),
		chain:       make([][]int32, len(target)),
		value:       make([]float64, len(target)),
		off:         make([]float64, len(target)),
		nodeFirst:   make([]int32, len(target)+1),
		memberFirst: make([]int32, len(target)+1),
	}
	if stiffness != nil && len(stiffness) != len(ends) {
		return nil, &InputError{What: "stiffness", Index: -1, Why: fmt.Sprintf("there are %d values for %d members", len(stiffness), len(ends))}
	}
	for t := range target {
		if why := g.check(t); why != "" {
			return nil, &InputError{What: "target", Index: t, Why: why}
		}
		w := target[t].Weight
		if w == 0 {
			w = 1
		}
		g.weight[t] = w / math.Abs(target[t].Value)
	}
	return g, nil
}

// check says what is wrong with target t, "" when nothing is.
func (g *goals) check(t int) string {
	p := &g.target[t]
	if len(p.Members) == 0 {
		return "it has no members"
	}
	for _, k := range p.Members {
		if k < 0 || int(k) >= len(g.ends) {
			return fmt.Sprintf("there is no member %d; they go from 0 to %d", k, len(g.ends)-1)
		}
	}
	if !usable(p.Value) || !usable(p.Weight) || p.Weight < 0 {
		return fmt.Sprintf("its value %g or weight %g is no usable number", p.Value, p.Weight)
	}
	switch p.Quantity {
	case Force:
		if p.Value == 0 {
			return "no force cannot be a target, since relative differences count; leave the member out of the network"
		}
	case Length, Unstressed:
		if p.Value <= 0 {
			return fmt.Sprintf("a length must be positive, not %g m", p.Value)
		}
	case Sag:
		if p.Value <= 0 {
			return fmt.Sprintf("a sag must be positive, not %g", p.Value)
		}
		var why string
		g.chain[t], why = chainOf(p.Members, g.ends)
		return why
	default:
		return fmt.Sprintf("unknown quantity %d", p.Quantity)
	}
	if p.Quantity == Unstressed {
		for _, k := range p.Members {
			if g.stiffness == nil || !(g.stiffness[k] > 0) || !usable(g.stiffness[k]) {
				return fmt.Sprintf("an unstressed length needs the stiffness EA of member %d", k)
			}
		}
	}
	return ""
}

// chainOf lists the nodes along a chain of members.
func chainOf(members []int32, ends [][2]int32) (nodes []int32, why string) {
	if len(members) < 2 {
		return nil, "a sag needs a chain of at least two members"
	}
	a, b := ends[members[0]], ends[members[1]]
	at := a[0]
	if a[0] == b[0] || a[0] == b[1] {
		at = a[1]
	}
	nodes = append(nodes, at)
	for _, k := range members {
		e := ends[k]
		switch at {
		case e[0]:
			at = e[1]
		case e[1]:
			at = e[0]
		default:
			return nil, fmt.Sprintf("member %d does not follow the one before it in the chain", k)
		}
		nodes = append(nodes, at)
	}
	if nodes[0] == at {
		return nil, "the chain is closed, so that it has no chord"
	}
	return nodes, ""
}

// measure works out what the targets come to in the shape x with force
// densities q, and how far off that is. It reports whether all is finite.
func (g *goals) measure(x []r3.Vec, q []float64) bool {
	good := true
	for t := range g.target {
		p := &g.target[t]
		v := 0.0
		switch p.Quantity {
		case Force:
			for _, k := range p.Members {
				v += q[k] * g.length(x, k)
			}
			v /= float64(len(p.Members))
		case Length:
			for _, k := range p.Members {
				v += g.length(x, k)
			}
		case Unstressed:
			for _, k := range p.Members {
				l, ea := g.length(x, k), g.stiffness[k]
				share := ea / (ea + q[k]*l)
				if share <= 0 {
					share = math.NaN() // pressed together to nothing
				}
				v += l * share
			}
		case Sag:
			v, _ = sagOf(x, g.chain[t])
		}
		g.value[t] = v
		g.off[t] = (v - p.Value) * g.weight[t]
		good = good && finite(g.off[t])
	}
	return good
}

func (g *goals) length(x []r3.Vec, k int32) float64 {
	return r3.Norm(r3.Sub(x[g.ends[k][1]], x[g.ends[k][0]]))
}

// sagOf is the sag over chord of a chain, and the place in it of the node
// farthest from the chord.
func sagOf(x []r3.Vec, chain []int32) (sag float64, farthest int) {
	first, last := x[chain[0]], x[chain[len(chain)-1]]
	chord := r3.Sub(last, first)
	long := r3.Norm(chord)
	along := r3.Scale(1/long, chord)
	for i, c := range chain {
		d := r3.Sub(x[c], first)
		d = r3.Sub(d, r3.Scale(r3.Dot(d, along), along))
		if s := r3.Norm(d) / long; s > sag || !finite(s) {
			sag, farthest = s, i
		}
	}
	return sag, farthest
}

// differentiate works out the derivatives of off at the shape x.
func (g *goals) differentiate(x []r3.Vec, q []float64) {
	g.node, g.byPosition = g.node[:0], g.byPosition[:0]
	g.member, g.byDensity = g.member[:0], g.byDensity[:0]
	for t := range g.target {
		p := &g.target[t]
		w := g.weight[t]
		switch p.Quantity {
		case Force:
			w /= float64(len(p.Members))
			for _, k := range p.Members {
				l := g.stretch(x, k, w*q[k])
				g.density(k, w*l)
			}
		case Length:
			for _, k := range p.Members {
				g.stretch(x, k, w)
			}
		case Unstressed:
			for _, k := range p.Members {
				l, ea := g.length(x, k), g.stiffness[k]
				share := ea / (ea + q[k]*l)
				g.stretch(x, k, w*share*share)
				g.density(k, -w*l*l*share*share/ea)
			}
		case Sag:
			g.sag(x, g.chain[t], w)
		}
		g.nodeFirst[t+1] = int32(len(g.node))
		g.memberFirst[t+1] = int32(len(g.member))
	}
}

// stretch adds c times the derivative of the length of member k, and returns
// that length.
func (g *goals) stretch(x []r3.Vec, k int32, c float64) float64 {
	e := g.ends[k]
	d := r3.Sub(x[e[1]], x[e[0]])
	l := r3.Norm(d)
	if l == 0 {
		return 0 // the length has no derivative here; any direction lengthens it
	}
	d = r3.Scale(c/l, d)
	g.position(e[1], d)
	g.position(e[0], r3.Scale(-1, d))
	return l
}

// sag adds c times the derivative of sag over chord: that of the distance of
// the farthest node from the line through the ends, which turns with them.
func (g *goals) sag(x []r3.Vec, chain []int32, c float64) {
	sag, farthest := sagOf(x, chain)
	if farthest == 0 {
		return
	}
	a, b, p := chain[0], chain[len(chain)-1], chain[farthest]
	chord := r3.Sub(x[b], x[a])
	long := r3.Norm(chord)
	along := r3.Scale(1/long, chord)
	d := r3.Sub(x[p], x[a])
	s := r3.Dot(d, along)
	out := r3.Scale(c/long, r3.Unit(r3.Sub(d, r3.Scale(s, along))))
	share := s / long
	shorter := r3.Scale(-c*sag/long, along) // by the length of the chord
	g.position(p, out)
	g.position(a, r3.Sub(r3.Scale(share-1, out), shorter))
	g.position(b, r3.Add(r3.Scale(-share, out), shorter))
}

func (g *goals) position(i int32, d r3.Vec) {
	g.node = append(g.node, i)
	g.byPosition = append(g.byPosition, d)
}

func (g *goals) density(k int32, d float64) {
	g.member = append(g.member, k)
	g.byDensity = append(g.byDensity, d)
}
