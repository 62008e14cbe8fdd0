package fdm

import (
	"fmt"
	"strconv"
	"strings"
)

// InputError says what in the arguments cannot be used.
type InputError struct {
	// What is concerned: "network", "node", "member", "panel", "target", …
	What string
	// Index of it, counted from 0; −1 when there is none.
	Index int
	// Why it cannot be used, in plain words.
	Why string
}

func (e *InputError) Error() string {
	if e.Index < 0 {
		return fmt.Sprintf("fdm: %s: %s", e.What, e.Why)
	}
	return fmt.Sprintf("fdm: %s %d: %s", e.What, e.Index, e.Why)
}

// Cause says why a system has no single solution.
type Cause uint8

// Causes of a singular system.
const (
	// NoSupport: no chain of members with a force density other than zero
	// (or of panels with stress) leads from the nodes to a support.
	NoSupport Cause = iota
	// Cancel: tension and compression cancel, so that the nodes can be moved
	// without any change in the balance of forces.
	Cancel
	// Weak: what holds the nodes is lost in rounding beside the forces
	// around them.
	Weak
	// NotFinite: a force density is infinite, not a number, or beyond 1e70.
	NotFinite
)

// String gives the cause in a few words.
func (c Cause) String() string {
	switch c {
	case NoSupport:
		return "no support"
	case Cancel:
		return "force densities cancel"
	case Weak:
		return "too weakly held"
	case NotFinite:
		return "not finite"
	}
	return "unknown"
}

// SingularError says that the force densities do not determine a shape, where
// and why.
type SingularError struct {
	// Nodes concerned, ascending (for Cancel and Weak: those that would move
	// most, the worst first).
	Nodes []int32
	// Members concerned (only for NotFinite), ascending.
	Members []int32
	// Directions in which it happens.
	Directions Directions
	Cause      Cause
}

func (e *SingularError) Error() string {
	switch e.Cause {
	case NoSupport:
		return fmt.Sprintf("fdm: nothing holds %s along %s: no chain of members with a force density other than zero leads to a support; fix a node there, or connect it", list("node", e.Nodes), e.Directions)
	case Cancel:
		return fmt.Sprintf("fdm: the force densities around %s cancel along %s, so that any place would balance as well; change the ratio of tension to compression there", list("node", e.Nodes), e.Directions)
	case Weak:
		return fmt.Sprintf("fdm: what holds %s along %s is too weak beside the forces around to be told from nothing; bring the force densities closer together in size", list("node", e.Nodes), e.Directions)
	case NotFinite:
		return fmt.Sprintf("fdm: the force density of %s is not a finite number (or beyond 1e70)", list("member", e.Members))
	}
	return "fdm: singular system"
}

// ReferenceError says that a reference shape cannot carry natural force
// densities, because a panel or a member has no size in it or the warp of a
// panel is undefined.
type ReferenceError struct {
	// Panel or Member concerned; the other is −1.
	Panel, Member int
	// Update in which it showed, counted from 0: with no more than that many
	// updates it does not occur.
	Update int
	// Why, in plain words.
	Why string
}

func (e *ReferenceError) Error() string {
	what, index := "panel", e.Panel
	if e.Member >= 0 {
		what, index = "member", e.Member
	}
	where := "in the reference shape"
	if e.Update > 0 {
		where = fmt.Sprintf("after %d natural force density updates", e.Update)
	}
	return fmt.Sprintf("fdm: %s %d %s: %s", what, index, where, e.Why)
}

// list names the first few of many numbers: "nodes 3, 7 and 9", "nodes 1, 2, 3,
// 4, 5, 6 and 12 more".
func list(word string, index []int32) string {
	const most = 6
	if len(index) == 0 {
		return "some " + word + "s"
	}
	var b strings.Builder
	b.WriteString(word)
	if len(index) > 1 {
		b.WriteByte('s')
	}
	for k, i := range index {
		switch {
		case k == 0:
			b.WriteByte(' ')
		case k == most && len(index) > most+1:
			fmt.Fprintf(&b, " and %d more", len(index)-most)
			return b.String()
		case k == len(index)-1:
			b.WriteString(" and ")
		default:
			b.WriteString(", ")
		}
		b.WriteString(strconv.Itoa(int(i)))
	}
	return b.String()
}
