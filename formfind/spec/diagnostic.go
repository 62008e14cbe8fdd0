package spec

import (
	"fmt"
	"slices"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// Diagnostic is one thing that is wrong, or doubtful, in a model file.
type Diagnostic struct {
	File    string // as given by the caller, or the CSV file's name, or "--set path=value"
	Line    int    // from 1; 0 = the file as a whole
	Column  int    // in characters, from 1; 0 = the line as a whole
	Path    string // keys from the top, e.g. "edges.AB.cable.force"
	Text    string // the offending text
	Message string // what is wrong
	Hint    string // the way out, "" = obvious
}

// String gives "file:line:col: message; hint".
func (d Diagnostic) String() string {
	var b strings.Builder
	b.WriteString(d.File)
	if d.Line > 0 {
		b.WriteByte(':')
		b.WriteString(strconv.Itoa(d.Line))
		if d.Column > 0 {
			b.WriteByte(':')
			b.WriteString(strconv.Itoa(d.Column))
		}
	}
	b.WriteString(": ")
	b.WriteString(d.Message)
	if d.Hint != "" {
		b.WriteString("; ")
		b.WriteString(d.Hint)
	}
	return b.String()
}

// Errors is everything that is wrong with a model, in the order of the files
// and lines.
type Errors struct {
	List []Diagnostic
	More int // errors found but not listed
}

// Error gives one line per error.
func (e *Errors) Error() string {
	var b strings.Builder
	for i, d := range e.List {
		if i > 0 {
			b.WriteByte('\n')
		}
		b.WriteString(d.String())
	}
	if e.More > 0 {
		fmt.Fprintf(&b, "\n… and %d more", e.More)
	}
	return b.String()
}

// Most errors that are listed, in one file and in all.
const (
	maxPerTable = 20
	maxErrors   = 200
)

// diagnostics collects errors and warnings.
type diagnostics struct {
	errors, warnings []placed
	more             int
}

// placed is a diagnostic with the rank of its file, for sorting.
type placed struct {
	Diagnostic
	rank int
}

func (d *diagnostics) failed() bool { return len(d.errors) > 0 || d.more > 0 }

func (d *diagnostics) err() error {
	if !d.failed() {
		return nil
	}
	return &Errors{List: sorted(d.errors), More: d.more}
}

// sorted orders by file, line and column, keeps the order of discovery
// otherwise, and drops what is said twice.
func sorted(p []placed) []Diagnostic {
	p = slices.Clone(p)
	slices.SortStableFunc(p, func(a, b placed) int {
		if a.rank != b.rank {
			return a.rank - b.rank
		}
		if a.Line != b.Line {
			return a.Line - b.Line
		}
		return a.Column - b.Column
	})
	out := make([]Diagnostic, 0, len(p))
	seen := make(map[Diagnostic]bool, len(p))
	for _, q := range p {
		d := q.Diagnostic
		d.Path = "" // one text, used in several places through aliases
		if seen[d] {
			continue
		}
		seen[d] = true
		out = append(out, q.Diagnostic)
	}
	return out
}

// clip shortens text for a message and makes it fit one line.
func clip(s string) string {
	const most = 60
	if i := strings.IndexAny(s, "\r\n"); i >= 0 {
		s = s[:i] + "…"
	}
	s = strings.Map(func(c rune) rune {
		if unicode.IsPrint(c) {
			return c
		}
		return '\uFFFD'
	}, s)
	if utf8.RuneCountInString(s) <= most {
		return s
	}
	r := []rune(s)
	return string(r[:most-1]) + "…"
}

// list joins words as "a, b or c".
func list(words []string, last string) string {
	switch len(words) {
	case 0:
		return ""
	case 1:
		return words[0]
	}
	n := len(words) - 1
	return strings.Join(words[:n], ", ") + " " + last + " " + words[n]
}

// quotedList joins quoted words as `"a", "b" or "c"`, at most ten of them.
func quotedList(words []string, last string) string {
	const most = 10
	more := 0
	if len(words) > most {
		more = len(words) - most
		words = words[:most]
	}
	q := make([]string, len(words))
	for i, w := range words {
		q[i] = strconv.Quote(w)
	}
	if more > 0 {
		return strings.Join(q, ", ") + fmt.Sprintf(" and %d more", more)
	}
	return list(q, last)
}

// quoted joins quoted words with commas.
func quoted(words []string) string {
	q := make([]string, len(words))
	for i, w := range words {
		q[i] = strconv.Quote(w)
	}
	return strings.Join(q, ", ")
}

// nearest returns the candidate a person most likely meant by word, or "" when
// none is close enough.
func nearest(word string, candidates []string) string {
	best, bestD := "", 1<<30
	if utf8.RuneCountInString(word) > 100 {
		return ""
	}
	w := fold(word)
	letters := utf8.RuneCountInString(w)
	for _, c := range candidates {
		if c == "" || utf8.RuneCountInString(c) > 100 {
			continue
		}
		f := fold(c)
		if f == w {
			return c // differs in case or word separators only
		}
		n := max(letters, utf8.RuneCountInString(f))
		allowed := 2 * max(1, n/3)
		if n <= 2 {
			allowed = 0 // short names are all alike
		}
		d := 2 * (2*n - letters - utf8.RuneCountInString(f)) // at least
		switch {
		case letters >= 3 && strings.HasPrefix(f, w):
			d = 2
		case d <= allowed:
			d = 2 * distance(w, f)
		}
		if d <= allowed && d < bestD {
			best, bestD = c, d
		}
	}
	return best
}

// fold makes spellings that differ in case or word separators equal.
func fold(s string) string {
	return strings.Map(func(r rune) rune {
		if r == '_' || r == '-' {
			return ' '
		}
		return r
	}, strings.ToLower(s))
}

// distance is the number of inserted, dropped, changed or swapped letters
// between two words (Damerau 1964, restricted to adjacent swaps).
func distance(a, b string) int {
	x, y := []rune(a), []rune(b)
	prev2, prev, cur := make([]int, len(y)+1), make([]int, len(y)+1), make([]int, len(y)+1)
	for j := range prev {
		prev[j] = j
	}
	for i := 1; i <= len(x); i++ {
		cur[0] = i
		for j := 1; j <= len(y); j++ {
			cost := 1
			if x[i-1] == y[j-1] {
				cost = 0
			}
			cur[j] = min(prev[j]+1, cur[j-1]+1, prev[j-1]+cost)
			if i > 1 && j > 1 && x[i-1] == y[j-2] && x[i-2] == y[j-1] {
				cur[j] = min(cur[j], prev2[j-2]+1)
			}
		}
		prev2, prev, cur = prev, cur, prev2
	}
	return prev[len(y)]
}
