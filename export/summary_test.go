package export

import (
	"math"
	"strings"
	"testing"
	"unicode/utf8"

	"anticlast/formfind/canopy"

	"github.com/stretchr/testify/require"
)

func summaryOf(t *testing.T, r *canopy.Result, o Options) string {
	t.Helper()
	var b strings.Builder
	require.NoError(t, Summary(&b, r, o))
	return b.String()
}

func TestSummarySaysWhatAPersonAsks(t *testing.T) {
	s := summaryOf(t, sail(10), Options{})
	for _, want := range []string{
		"Quay market sail", "the audit trusts it", "2.50 / 2.00", "1.001 (0.950 … 1.050)",
		"25.00 … 25.05", "12.0 %", "58.40 compression", "31.20 tension", "G1 anchor", "36.72",
		"edge cable 47.24 m", "warning: The flattest place", "[common practice]", "prestress only", canopy.Caution[:40],
	} {
		require.Contains(t, s, want)
	}
	require.Less(t, strings.Count(s, "\n"), 60)
}

func TestUntrustedIsSaidFirst(t *testing.T) {
	r := sail(4)
	r.Audit.Trusted = false
	r.Audit.Reasons = []string{"The shape is unstable in 2 directions."}
	r.Audit.Unstable = 2
	lines := strings.Split(summaryOf(t, r, Options{}), "\n")
	require.Contains(t, lines[1], "NOT TRUSTED")
	require.Contains(t, lines[2], "unstable in 2 directions")
}

func TestSummaryKeepsItsWidthAndColour(t *testing.T) {
	for _, width := range []int{48, 60, 80, 132} {
		for _, r := range []*canopy.Result{sail(6), cone(12), grid(6)} {
			plain := summaryOf(t, r, Options{Width: width})
			for line := range strings.Lines(plain) {
				require.LessOrEqual(t, utf8.RuneCountInString(strings.TrimSuffix(line, "\n")), width, line)
			}
			require.NotContains(t, plain, "\x1b")
			coloured := summaryOf(t, r, Options{Width: width, Colour: true})
			require.Contains(t, coloured, "\x1b[1m")
			for _, code := range []string{bold, good, bad, doubt, faint, "0"} {
				coloured = strings.ReplaceAll(coloured, "\x1b["+code+"m", "")
			}
			require.Equal(t, plain, coloured)
		}
	}
}

func TestSummaryBoundsItsRows(t *testing.T) {
	r := sail(4)
	for range 30 {
		r.Structure.Cables = append(r.Structure.Cables, r.Structure.Cables[0])
		r.Summary.Cables = append(r.Summary.Cables, r.Summary.Cables[0])
		r.Findings = append(r.Findings, r.Findings[0])
	}
	s := summaryOf(t, r, Options{})
	require.Contains(t, s, "… and 22 more in form.json")
	require.Less(t, strings.Count(s, "\n"), 90)
}

func TestSummaryOfNextToNothing(t *testing.T) {
	r := &canopy.Result{Structure: &canopy.Structure{}, Form: &canopy.Form{}}
	r.Audit.Discretisation, r.Audit.Softest = math.NaN(), math.NaN()
	require.Contains(t, summaryOf(t, r, Options{}), canopy.Caution[:40])
}
