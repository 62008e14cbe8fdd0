package export

import (
	"flag"
	"os"
)

// The size of sweeping tests, by the same flag and variable as those of the
// packages under formfind, whose internal helper cannot be imported here.
var sweepSize = flag.String("sweep", os.Getenv("ANTICLAST_SWEEP"), "size of sweeping tests: small, middle or large")

func sweepN(small, middle, large int) int {
	switch *sweepSize {
	case "middle":
		return middle
	case "large":
		return large
	}
	return small
}
