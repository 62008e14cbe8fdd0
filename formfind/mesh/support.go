package mesh

import (
	"anticlast/formfind/canopy"
	"gonum.org/v1/gonum/spatial/r3"
)

// supports decides for every point whether it is anchored, held or free.
//
// A point that says so itself is what it says. Otherwise, in this order:
//
//   - the point of a rigid ring that may move in some directions is supported in
//     the others;
//   - a point at no head of a mast and no upper end of a guy (Stay.To of a mast,
//     Stay.From of a guy) is anchored;
//   - a head at which the force of some mast or guy is to be found is held;
//   - a head at which every mast and guy has its force, length or stiffness is
//     free.
func (b *builder) supports() {
	m := b.m
	n := len(m.Points)
	b.fixed = make([]canopy.Freedom, n)
	b.held = make([]canopy.Freedom, n)
	heads := make([]int, n)   // masts and guys that have their head here
	unknown := make([]int, n) // those of any end whose force is to be found
	headUnknown := make([]int, n)
	for _, s := range m.Stays {
		from, to := b.point[s.From], b.point[s.To]
		head := from
		if s.Mast {
			head = to
		}
		heads[head]++
		if toFind(s) {
			unknown[from]++
			unknown[to]++
			headUnknown[head]++
		}
	}
	ringAt := make([]int, n)
	for i := range ringAt {
		ringAt[i] = -1
	}
	for i, r := range m.Rings {
		p := b.point[r.At]
		if ringAt[p] >= 0 {
			b.fail("ring", r.Name, r.Line, Mismatch, "give each ring its own point", "ring %s has the same point %s", m.Rings[ringAt[p]].Name, r.At)
		}
		ringAt[p] = i
	}
	for i, p := range m.Points {
		moves := canopy.Freedom(0) // directions of a rigid ring here
		if r := ringAt[i]; r >= 0 && m.Rings[r].Rigid {
			moves = m.Rings[r].Free
		}
		hold := p.Hold
		if hold == canopy.HoldAuto {
			switch {
			case moves != 0 || heads[i] == 0:
				hold = canopy.HoldAnchored
			case headUnknown[i] > 0:
				hold = canopy.HoldHeld
			default:
				hold = canopy.HoldFree
			}
		}
		switch hold {
		case canopy.HoldAnchored:
			b.fixed[i] = canopy.DirAll
			if p.Fixed != 0 {
				b.fixed[i] = p.Fixed
			}
			b.fixed[i] &^= moves
		case canopy.HoldHeld:
			b.held[i] = canopy.DirAll
			if moves != 0 {
				r := m.Rings[ringAt[i]]
				b.fail("ring", r.Name, r.Line, Unbalanced, "leave out what it is free in, or do not hold the point", "it may move but its point %s is held", p.Name)
			}
			if unknown[i] == 0 {
				b.fail("point", p.Name, p.Line, Unsupported, "add a mast or guy without a force, or anchor the point", "it is held, but there is no mast or guy whose force could balance it")
			}
		case canopy.HoldFree:
			if moves != 0 {
				b.fixed[i] = canopy.DirAll &^ moves
			}
		}
	}
	for i, e := range m.Edges {
		if e.Kind != canopy.EdgeFixed {
			continue
		}
		for _, p := range b.ends[i] {
			if b.fixed[p]|b.held[p] == 0 {
				q := m.Points[p]
				b.fail("point", q.Name, q.Line, Unsupported, "anchor the point, or make the edge a cable", "it is free, but ends fixed edge %s", e.Name)
			}
		}
	}
	for _, s := range m.Stays {
		if !toFind(s) {
			continue
		}
		from, to := b.point[s.From], b.point[s.To]
		if b.held[from]|b.held[to] == 0 {
			b.fail(stayPart(s), s.Name, s.Line, Unbalanced, "give its force or length, or hold the point at its head", "its force cannot be found: neither of its ends is a held point")
			continue
		}
		for _, p := range [2]int{from, to} {
			if b.fixed[p]|b.held[p] != canopy.DirAll {
				b.fail(stayPart(s), s.Name, s.Line, Unbalanced, "give its force or length, or hold the point", "its force is to be found, but its end %s may move", m.Points[p].Name)
			}
		}
	}
}

// toFind reports whether the force of a mast or guy is found from the balance
// of the points at its ends.
func toFind(s canopy.Stay) bool {
	return !s.HasForce && s.Force == 0 && s.Length == 0 && s.Unstressed == 0
}

// pointNodes makes a node of every point that something refers to.
func (b *builder) pointNodes() {
	m := b.m
	used := make([]bool, len(m.Points))
	for _, e := range b.ends {
		used[e[0]], used[e[1]] = true, true
	}
	for _, s := range m.Stays {
		used[b.point[s.From]], used[b.point[s.To]] = true, true
	}
	for _, r := range m.Rings {
		used[b.point[r.At]] = true
	}
	for _, l := range b.loop {
		for _, p := range l.points {
			used[p] = true
		}
	}
	b.node = make([]int32, len(m.Points))
	for i, p := range m.Points {
		b.node[i] = -1
		if !used[i] {
			if p.Load != (r3.Vec{}) || p.Hold != canopy.HoldAuto {
				b.fail("point", p.Name, p.Line, Unsupported, "end an edge, mast or guy there, or remove the point", "nothing is attached to it")
			}
			continue
		}
		v := b.addNode(p.At, p.Name)
		b.s.Fixed[v] = b.fixed[i]
		b.node[i] = v
	}
}

// finish fills what is known only when all nodes are.
func (b *builder) finish() {
	s := b.s
	n := len(s.Position)
	for i, p := range b.m.Points {
		v := b.node[i]
		if v < 0 {
			continue
		}
		if b.held[i] != 0 {
			if s.Held == nil {
				s.Held = make([]canopy.Freedom, n)
			}
			s.Held[v] = b.held[i]
		}
		if p.Load != (r3.Vec{}) {
			if s.Load == nil {
				s.Load = make([]r3.Vec, n)
			}
			s.Load[v] = p.Load
		}
	}
	for _, r := range s.Rings {
		if !r.Rigid || s.Fixed[r.Nodes[0]] == canopy.DirAll {
			continue
		}
		if s.Master == nil {
			s.Master = make([]int32, n)
			for i := range s.Master {
				s.Master[i] = -1
			}
		}
		for _, i := range r.Nodes {
			s.Master[i] = r.Centre
		}
	}
}

// verify checks that everything is carried by something and that the structure
// is sound.
func (b *builder) verify() {
	s := b.s
	n := len(s.Position)
	parent := make([]int32, n)
	touched := make([]bool, n)
	for i := range parent {
		parent[i] = int32(i)
	}
	find := func(i int32) int32 {
		for parent[i] != i {
			parent[i] = parent[parent[i]]
			i = parent[i]
		}
		return i
	}
	join := func(i, j int32) {
		touched[i], touched[j] = true, true
		if i, j = find(i), find(j); i != j {
			parent[max(i, j)] = min(i, j)
		}
	}
	for k, e := range s.Ends {
		if c := s.CableOf[k]; c >= 0 && s.Cables[c].Law == canopy.CableBalance {
			continue
		}
		join(e[0], e[1])
	}
	for _, t := range s.Corners {
		join(t[0], t[1])
		join(t[0], t[2])
	}
	for i, c := range s.Master {
		if c >= 0 {
			join(int32(i), c)
		}
	}
	carried := make([]canopy.Freedom, n)
	for i := range n {
		carried[find(int32(i))] |= s.FixedAt(i)
	}
	told := map[int32]bool{}
	for i, p := range b.m.Points {
		v := b.node[i]
		if v < 0 {
			continue
		}
		switch r := find(v); {
		case !touched[v] && s.FixedAt(int(v)) != canopy.DirAll:
			b.fail("point", p.Name, p.Line, Unsupported, "anchor it, or attach an edge or a mast or guy of given force", "it may move, and nothing is attached that could keep it in place")
		case touched[v] && carried[r] == 0 && !told[r]:
			told[r] = true
			b.fail("point", p.Name, p.Line, Unsupported, "anchor or hold a point of it", "nothing holds the part of the canopy that this point belongs to")
		}
	}
	if len(b.errs) > 0 {
		return
	}
	if err := Validate(s); err != nil {
		if list, ok := err.(Errors); ok {
			b.errs = append(b.errs, list...)
		}
	}
}
