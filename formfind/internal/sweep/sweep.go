// Package sweep gives tests one flag for their size: -sweep small (default,
// seconds), middle (what continuous integration runs) or large (an hour or
// more). A sweep is the same test at another size, never a skipped one.
//
// Import it from test files only and pass the flag after -args:
//
//	go test ./formfind/... -args -sweep=middle
//
// or set ANTICLAST_SWEEP, which also reaches packages that do not know the flag.
package sweep

import (
	"flag"
	"os"
)

var size = flag.String("sweep", defaultSize(), "size of sweeping tests: small, middle or large")

func defaultSize() string {
	if v := os.Getenv("ANTICLAST_SWEEP"); v != "" {
		return v
	}
	return "small"
}

// N returns the number that goes with the chosen size.
func N(small, middle, large int) int {
	switch *size {
	case "middle":
		return middle
	case "large":
		return large
	}
	return small
}
