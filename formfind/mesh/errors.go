package mesh

import (
	"fmt"
	"strings"
)

// Reason classifies what is wrong with a model.
type Reason uint8

// Reasons for which a model is refused.
const (
	Missing     Reason = iota // a part is named that does not exist, or something needed is not given
	NotClosed                 // a boundary is not a closed loop of edges
	Conflict                  // numbers of segments contradict each other
	TooFine                   // more triangles than MaxTriangles
	RingOutside               // a ring does not lie inside the boundary of its fabric
	Degenerate                // a triangle, edge or member without size
	Unsupported               // nothing holds a point or a part
	Unbalanced                // the force of a mast or guy cannot be found from a balance
	NoWarp                    // the warp direction is undefined on the surface
	Mismatch                  // parts that do not go together
)

var reasonNames = [...]string{"missing", "not closed", "conflict", "too fine", "ring outside", "degenerate", "unsupported", "unbalanced", "no warp", "mismatch"}

func (r Reason) String() string { return reasonNames[r] }

// Error says what is wrong with one part of a model and what would help.
type Error struct {
	Part    string // "point", "edge", "cable", "fabric", "net", "ring", "mast", "guy", "node", "member", "triangle"; "" = the whole model
	Name    string
	Line    int // line in the model file, 0 = not known
	Reason  Reason
	Problem string
	WayOut  string
}

func (e *Error) Error() string {
	var b strings.Builder
	if e.Line > 0 {
		fmt.Fprintf(&b, "line %d: ", e.Line)
	}
	if e.Part != "" {
		fmt.Fprintf(&b, "%s %s: ", e.Part, e.Name)
	}
	b.WriteString(e.Problem)
	if e.WayOut != "" {
		b.WriteString("; ")
		b.WriteString(e.WayOut)
	}
	return b.String()
}

// Errors are all that is wrong with a model, in the order of its parts. Never
// empty when returned as an error.
type Errors []*Error

func (e Errors) Error() string {
	if len(e) == 0 {
		return "no errors"
	}
	lines := make([]string, len(e))
	for i, x := range e {
		lines[i] = x.Error()
	}
	return strings.Join(lines, "\n")
}

// Unwrap gives the single errors to errors.As.
func (e Errors) Unwrap() []error {
	list := make([]error, len(e))
	for i, x := range e {
		list[i] = x
	}
	return list
}

// err returns e as an error, nil when there is none.
func (e Errors) err() error {
	if len(e) == 0 {
		return nil
	}
	return e
}
