package spec

import (
	"bytes"
	"encoding/csv"
	"io"
	"strconv"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"
)

// The reference is strconv.ParseFloat, which rounds correctly.
func TestScanNumberRoundsAsStrconv(t *testing.T) {
	check := func(t require.TestingT, s string) {
		got, n := scanNumber([]byte(s))
		want, err := strconv.ParseFloat(s, 64)
		if err != nil && !strings.Contains(err.Error(), "range") {
			require.True(t, n == 0 || n < len(s), "%q", s)
			return
		}
		require.Equal(t, len(s), n, "%q", s)
		require.Equal(t, want, got, "%q", s)
	}
	for _, s := range []string{"0", "-0", "1", "+1.5", "9007199254740993", "9007199254740992.999999999999", "1e22", "1e23", "0.1", "18446744073709551617", "184467440737095516170", "0.18446744073709551617", "123456789012345678901234567890", "4.9e-324", "1e-400", "1e400", "0.000000000000000000000000000001", "00000000000000000000000000000012", ".5", "5.", "2.2250738585072011e-308", "1e-22", "17976931348623157e292"} {
		check(t, s)
	}
	rapid.Check(t, func(t *rapid.T) {
		check(t, rapid.StringMatching(`[-+]?[0-9]{0,25}(\.[0-9]{0,25})?([eE][-+]?[0-9]{1,3})?`).Draw(t, "s"))
	})
	rapid.Check(t, func(t *rapid.T) {
		check(t, strconv.FormatFloat(rapid.Float64().Draw(t, "v"), 'g', -1, 64))
	})
}

func TestScanNumberTakesNoOtherSpelling(t *testing.T) {
	for _, s := range []string{"", "-", ".", "e5", "inf", "nan", "_1"} {
		_, n := scanNumber([]byte(s))
		require.Zero(t, n, s)
	}
	for s, want := range map[string]int{"1_000": 1, "0x10": 1, "5e": 1, "5e+": 1, "1 2": 1, "7kN": 1, "1.5.2": 3} {
		_, n := scanNumber([]byte(s))
		require.Equal(t, want, n, s)
	}
}

func TestScanNumberAllocatesNothing(t *testing.T) {
	b := []byte("3.14159265358979312e-3")
	require.Zero(t, testing.AllocsPerRun(100, func() { scanNumber(b) }))
}

// The reference is encoding/csv on the texts both accept: no blank lines, no
// spaces around fields, no line breaks in quotes.
func TestCSVRecordsAsEncodingCSV(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		rows := rapid.SliceOfN(rapid.SliceOfN(rapid.StringMatching(`([a-z0-9]|[",;é]){0,6}[a-z]`), 2, 4), 1, 6).Draw(t, "rows")
		width := len(rows[0])
		var text bytes.Buffer
		w := csv.NewWriter(&text)
		w.UseCRLF = rapid.Bool().Draw(t, "crlf")
		for i, r := range rows {
			for len(r) < width {
				r = append(r, "x")
			}
			if i == 0 {
				r = append([]string{}, r...)
				for j := range r {
					r[j] = "h" + strconv.Itoa(j)
				}
			}
			require.NoError(t, w.Write(r[:width]))
		}
		w.Flush()
		ref := csv.NewReader(bytes.NewReader(text.Bytes()))
		size := rapid.IntRange(1, 100).Draw(t, "buffer")
		got := newCSV(iotest{bytes.NewReader(text.Bytes()), rapid.IntRange(1, 7).Draw(t, "chunk")}, size)
		for {
			want, err := ref.Read()
			if err == io.EOF {
				require.Equal(t, io.EOF, got.next())
				return
			}
			require.NoError(t, err)
			require.NoError(t, got.next())
			have := make([]string, len(got.fields))
			for i, f := range got.fields {
				have[i] = string(f)
			}
			require.Equal(t, want, have)
		}
	})
}

// iotest reads a few bytes at a time.
type iotest struct {
	r io.Reader
	n int
}

func (i iotest) Read(p []byte) (int, error) { return i.r.Read(p[:min(len(p), i.n)]) }

func TestDistanceCountsEdits(t *testing.T) {
	// "kitten" → "sitting" takes three edits (Levenshtein 1966's example in
	// common use); a swap of neighbours counts one (Damerau 1964).
	require.Equal(t, 3, distance("kitten", "sitting"))
	require.Equal(t, 1, distance("forec", "force"))
	require.Equal(t, 0, distance("", ""))
	require.Equal(t, 4, distance("", "sail"))
}
