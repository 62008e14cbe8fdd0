package formfind

import (
	"fmt"
	"math"
	"strings"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// BalanceFault says why masts and guys cannot hold a point.
type BalanceFault uint8

// Faults of balance.
const (
	// BalanceSurplus: more masts and guys than directions; some of their
	// forces must be given. Known from the model alone.
	BalanceSurplus BalanceFault = iota + 1
	// BalanceNotSpanned: no forces in these members can resist the pull.
	BalanceNotSpanned
	// BalancePushed: a guy would have to push.
	BalancePushed
	// BalancePulled: a mast would have to pull.
	BalancePulled
	// BalanceMoving: a member whose force is to be found from balance ends at
	// a point that is neither held nor anchored.
	BalanceMoving
)

// BalanceError is returned when the masts and guys of held points cannot
// balance them.
type BalanceError struct {
	Fault   BalanceFault
	Nodes   []string
	Members []string
	Force   float64 // N, of the first member or the unbalanced rest
	Text    string
}

func (e *BalanceError) Error() string { return e.Text }

// stays gathers what the balance of held points needs: one unknown for each
// member of a CableBalance cable, one equation for each held direction.
type stays struct {
	members []int32
	names   []string
	eqNode  []int32
	eqDir   []int
	column  map[int32]int
}

func findStays(s *canopy.Structure) (*stays, error) {
	st := &stays{column: map[int32]int{}}
	for c := range s.Cables {
		cb := &s.Cables[c]
		if cb.Law != canopy.CableBalance {
			continue
		}
		for _, k := range cb.Members {
			for _, i := range s.Ends[k] {
				if s.FixedAt(int(i)) != canopy.DirAll {
					return nil, &BalanceError{Fault: BalanceMoving, Nodes: []string{s.NodeName.At(int(i))}, Members: []string{cb.Name},
						Text: fmt.Sprintf("the force of %s %s is to be found from balance, but its end %s can move: give its force or its length, or hold the point", cb.Kind, cb.Name, s.NodeName.At(int(i)))}
				}
			}
			st.column[k] = len(st.members)
			st.members = append(st.members, k)
			st.names = append(st.names, fmt.Sprintf("%s %s", cb.Kind, cb.Name))
		}
	}
	for i := range s.Held {
		// A node tied to a ring has no equation of its own: its master has.
		if s.MasterOf(i) >= 0 {
			continue
		}
		for d := 0; d < 3; d++ {
			if s.Held[i].Has(d) && !s.Fixed[i].Has(d) {
				st.eqNode = append(st.eqNode, int32(i))
				st.eqDir = append(st.eqDir, d)
			}
		}
	}
	return st, nil
}

// matrix has one row for each held direction and one column for each member:
// the force on the node by one newton of tension.
func (st *stays) matrix(s *canopy.Structure, x []r3.Vec) *mat.Dense {
	a := mat.NewDense(len(st.eqNode), len(st.members), nil)
	for j, k := range st.members {
		e := s.Ends[k]
		t := r3.Unit(r3.Sub(x[e[1]], x[e[0]]))
		for r, i := range st.eqNode {
			switch i {
			case e[0]:
				a.Set(r, j, a.At(r, j)+component(t, st.eqDir[r]))
			case e[1]:
				a.Set(r, j, a.At(r, j)-component(t, st.eqDir[r]))
			}
		}
	}
	return a
}

// checkStays refuses, before anything is solved, masts and guys whose forces
// balance cannot decide.
func checkStays(s *canopy.Structure) error {
	st, err := findStays(s)
	if err != nil || len(st.members) == 0 {
		return err
	}
	if len(st.eqNode) == 0 {
		return &BalanceError{Fault: BalanceSurplus, Members: st.names,
			Text: fmt.Sprintf("the force of %s is to be found from balance, but it ends at no held point: give its force, or hold the point", st.names[0])}
	}
	var svd mat.SVD
	if !svd.Factorize(st.matrix(s, s.Position), mat.SVDFullV) {
		return fmt.Errorf("masts and guys: the balance equations could not be analysed")
	}
	sv := svd.Values(nil)
	rank := 0
	for _, v := range sv {
		if v > 1e-9*sv[0] && v > 0 {
			rank++
		}
	}
	if rank == len(st.members) {
		return nil
	}
	var v mat.Dense
	svd.VTo(&v)
	var among []string
	for j := range st.members {
		part := 0.0
		for c := rank; c < len(st.members); c++ {
			part = math.Max(part, math.Abs(v.At(j, c)))
		}
		if part > 1e-6 {
			among = append(among, st.names[j])
		}
	}
	surplus := len(st.members) - rank
	return &BalanceError{Fault: BalanceSurplus, Members: among,
		Text: fmt.Sprintf("balance alone cannot decide the forces of %s: give the force of %d of them", list(among), surplus)}
}

// balanceHeld sets the forces of masts and guys so that held points are in
// balance with everything else that pulls at them.
func balanceHeld(s *canopy.Structure, f *canopy.Form) error {
	st, err := findStays(s)
	if err != nil {
		return err
	}
	for _, k := range st.members {
		f.Force[k] = 0
	}
	if len(st.eqNode) == 0 {
		return nil
	}
	sum, size := nodalForces(s, f)
	// Sizes follow the ties too: what a ring carries must be held at its centre.
	for i, m := range s.Master {
		if m >= 0 {
			size[m] += size[i]
		}
	}
	sum = gather(s, sum)
	b := mat.NewVecDense(len(st.eqNode), nil)
	scale := 0.0
	for r, i := range st.eqNode {
		b.SetVec(r, -component(sum[i], st.eqDir[r]))
		scale = math.Max(scale, size[i])
	}
	t := mat.NewVecDense(max(len(st.members), 1), nil)
	if len(st.members) > 0 {
		var qr mat.QR
		a := st.matrix(s, f.Position)
		if len(st.eqNode) < len(st.members) {
			return fmt.Errorf("masts and guys: %d unknown forces but %d equations", len(st.members), len(st.eqNode))
		}
		qr.Factorize(a)
		if err := qr.SolveVecTo(t, false, b); err != nil {
			return fmt.Errorf("masts and guys: %w", err)
		}
		var at mat.VecDense
		at.MulVec(a, t)
		b.SubVec(b, &at)
	}
	for r := range st.eqNode {
		if math.Abs(b.AtVec(r)) > 1e-8*scale {
			i := st.eqNode[r]
			var rest r3.Vec
			for q, j := range st.eqNode {
				if j == i {
					switch st.eqDir[q] {
					case 0:
						rest.X = -b.AtVec(q)
					case 1:
						rest.Y = -b.AtVec(q)
					default:
						rest.Z = -b.AtVec(q)
					}
				}
			}
			name := s.NodeName.At(int(i))
			return &BalanceError{Fault: BalanceNotSpanned, Nodes: []string{name}, Members: st.at(s, i), Force: r3.Norm(rest),
				Text: fmt.Sprintf("point %s is not held: %s cannot resist the rest of the pull, %.3g kN along (%.2f, %.2f, %.2f): add a guy or a mast in that direction, or anchor the point",
					name, orNothing(st.at(s, i)), r3.Norm(rest)/1e3, r3.Unit(rest).X, r3.Unit(rest).Y, r3.Unit(rest).Z)}
		}
	}
	for j, k := range st.members {
		f.Force[k] = t.AtVec(j)
		if math.Abs(f.Force[k]) <= 1e-12*scale {
			f.Force[k] = 0
		}
	}
	for j, k := range st.members {
		switch kind := s.Kind[k]; {
		case !kind.Pushes() && f.Force[k] < 0:
			return &BalanceError{Fault: BalancePushed, Members: []string{st.names[j]}, Force: f.Force[k],
				Text: fmt.Sprintf("%s would have to push with %.3g kN, which a cable cannot: move its anchor to the other side of the pull, or give it a prestress and another member to balance it", st.names[j], -f.Force[k]/1e3)}
		case kind == canopy.KindMast && f.Force[k] > 0:
			return &BalanceError{Fault: BalancePulled, Members: []string{st.names[j]}, Force: f.Force[k],
				Text: fmt.Sprintf("%s would have to pull with %.3g kN: its head is pulled up, which asks for a guy instead", st.names[j], f.Force[k]/1e3)}
		}
	}
	return nil
}

func (st *stays) at(s *canopy.Structure, node int32) []string {
	var out []string
	for j, k := range st.members {
		if s.Ends[k][0] == node || s.Ends[k][1] == node {
			out = append(out, st.names[j])
		}
	}
	return out
}

func orNothing(names []string) string {
	if len(names) == 0 {
		return "nothing there"
	}
	return list(names)
}

func list(names []string) string {
	switch len(names) {
	case 0:
		return ""
	case 1:
		return names[0]
	}
	if len(names) > 6 {
		names = append(append([]string(nil), names[:5]...), fmt.Sprintf("%d more", len(names)-5))
	}
	return strings.Join(names[:len(names)-1], ", ") + " and " + names[len(names)-1]
}
