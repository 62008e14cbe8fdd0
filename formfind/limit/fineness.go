package limit

import (
	"fmt"

	"anticlast/formfind/canopy"
)

// fine is the estimate of the discretisation, over the size of the model, up to
// which a mesh is fine enough for places and lengths to be taken from it: 25 mm
// in a canopy of 10 m, what slack and thimbles take up. Common practice varies.
const fine = 0.0025

// WithFineness returns the findings of a form with a warning among them, in its
// order, if a finer mesh would move the surface noticeably. discretisation is
// the audit's estimate (canopy.Audit.Discretisation), NaN where it is not known;
// it cannot be told from the form itself.
func WithFineness(findings []canopy.Finding, discretisation float64) []canopy.Finding {
	if !(discretisation > fine) {
		return findings
	}
	return ordered(append(findings, canopy.Finding{ID: "mesh-coarse", Severity: canopy.Warning, Source: SourcePractice, Value: discretisation, Limit: fine, Count: 1,
		Text: fmt.Sprintf("The mesh is coarse: a finer one would move the surface by about %.2g %% of its size. Form it on a finer mesh before places and lengths are taken from it.", 100*discretisation)}))
}
