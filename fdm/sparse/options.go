package sparse

import "fmt"

// Kind is the factorisation to make of a symmetric matrix A.
type Kind int

const (
	// Cholesky is A = L·Lᵀ, for positive definite matrices. A pivot that is
	// not positive ends the factorisation with a [PivotError].
	Cholesky Kind = iota
	// LDL is A = L·D·Lᵀ with 1×1 and 2×2 pivots, for any symmetric matrix
	// that is not singular. It counts the negative eigenvalues on the way
	// (Sylvester's law of inertia), see [Factor.Inertia].
	LDL
)

func (k Kind) String() string {
	switch k {
	case Cholesky:
		return "Cholesky"
	case LDL:
		return "LDL"
	}
	return fmt.Sprintf("Kind(%d)", int(k))
}

// Ordering chooses how the unknowns are numbered before elimination.
type Ordering int

const (
	// OrderAuto takes nested dissection where the pattern is large and looks
	// like a surface (a net or a mesh), and minimum degree elsewhere.
	OrderAuto Ordering = iota
	// OrderDissection is nested dissection (George 1973) on graph distance
	// fields, with minimum degree in the leaves.
	OrderDissection
	// OrderMinimumDegree is approximate minimum degree on the quotient graph
	// (Amestoy, Davis & Duff 1996).
	OrderMinimumDegree
	// OrderNatural keeps the caller's numbering as far as a postorder of the
	// elimination tree allows.
	OrderNatural
)

func (o Ordering) String() string {
	switch o {
	case OrderAuto:
		return "auto"
	case OrderDissection:
		return "dissection"
	case OrderMinimumDegree:
		return "minimum degree"
	case OrderNatural:
		return "natural"
	}
	return fmt.Sprintf("Ordering(%d)", int(o))
}

// Options steer an analysis. The zero value is right for most uses.
type Options struct {
	// Ordering of the unknowns; the zero value chooses by the pattern.
	Ordering Ordering
	// MemoryBudget in bytes that analysis, one factor and its working stacks
	// may take together. A system that would need more is refused with a
	// [BudgetError] before the memory is allocated. Zero means no limit.
	MemoryBudget int64
	// Workers is the most goroutines a factorisation may use at a time; zero
	// means GOMAXPROCS. The bits of the result do not depend on it.
	Workers int
}

// Cost is what one factorisation takes, known from the pattern alone.
type Cost struct {
	// Nonzeros of L including its diagonal and the explicit zeros that
	// joining supernodes has let in.
	Nonzeros int64
	// Flops of one numeric factorisation (multiplications and additions).
	Flops float64
	// Bytes of one factor together with its working stacks.
	Bytes int64
	// Fronts is the number of dense fronts (supernodes), LargestFront the
	// number of rows of the largest.
	Fronts, LargestFront int
	// Ordering that was chosen.
	Ordering Ordering
}
