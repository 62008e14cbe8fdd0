package sparse

import (
	"errors"
	"fmt"
)

var (
	// ErrNotFactored is returned by operations that need a finished
	// [Factor.Refactor] when there is none, or when the last one failed.
	ErrNotFactored = errors.New("sparse: matrix is not factored")
	// ErrTooLarge is returned for a pattern beyond the 32-bit indices.
	ErrTooLarge = errors.New("sparse: pattern is too large for 32-bit indices")
)

// PivotError says that Cholesky met a pivot that is not positive: the matrix
// is not positive definite.
type PivotError struct {
	// Unknown in the caller's numbering at whose elimination it showed.
	Unknown int
	// Pivot is the value found there (zero or negative).
	Pivot float64
}

func (e *PivotError) Error() string {
	return fmt.Sprintf("sparse: matrix is not positive definite: pivot %g at unknown %d", e.Pivot, e.Unknown)
}

// PatternError says which entry of a pattern names an unknown that is not
// there.
type PatternError struct {
	// Entry is the position in pairs.
	Entry int
	// Pair as given.
	Pair [2]int32
	// Unknowns is the number n of unknowns.
	Unknowns int
}

func (e *PatternError) Error() string {
	return fmt.Sprintf("sparse: pair %d is (%d, %d), outside the unknowns 0 to %d", e.Entry, e.Pair[0], e.Pair[1], e.Unknowns-1)
}

// ValueError says which value given to [Factor.Refactor] or [Factor.Solve]
// is not finite.
type ValueError struct {
	// Entry is the position in the slice given.
	Entry int
	// Value found there.
	Value float64
}

func (e *ValueError) Error() string {
	return fmt.Sprintf("sparse: value %d is %g, not a finite number", e.Entry, e.Value)
}

// SizeError says that a slice has the wrong length.
type SizeError struct {
	// What the slice holds.
	What string
	// Got and Want are its length and the length needed.
	Got, Want int
}

func (e *SizeError) Error() string {
	return fmt.Sprintf("sparse: %s has length %d, want %d", e.What, e.Got, e.Want)
}

// BudgetError says that a factorisation would take more memory than
// [Options.MemoryBudget] allows. Nothing of it has been allocated.
type BudgetError struct {
	// Need and Budget in bytes.
	Need, Budget int64
}

func (e *BudgetError) Error() string {
	return fmt.Sprintf("sparse: factorisation needs %d MiB, the budget is %d MiB", (e.Need+1<<20-1)>>20, e.Budget>>20)
}
