// Package sparse solves sparse symmetric linear systems A·x = b directly.
//
// The work is split so that what can be kept is kept: [Analyze] looks at the
// pattern of A once, [Analysis.NewFactor] takes the memory, [Factor.Refactor]
// is repeated for every new set of values, [Factor.Solve] for every right-hand
// side. Nothing here knows where the system comes from.
package sparse
