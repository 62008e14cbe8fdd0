// Package formfind is the front door: from a model to a shape in equilibrium
// that has been checked by code that did not find it.
//
//	result, err := formfind.Find(ctx, model, formfind.Options{})
//
// [Find] meshes a model and calls [Solve]; Solve chooses and chains the
// engines, balances held points with their masts and guys, asks for the audit
// and holds the limits against the result. What was done is written into the
// Form in plain words.
//
// Both return a result that may not be trusted: read Result.Audit. An error
// means that there is no shape to speak of: the model cannot be meshed or
// solved, was shown to have no equilibrium ([NoEquilibriumError],
// [BalanceError]), or ctx is done.
package formfind
