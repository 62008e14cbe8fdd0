package outline

import (
	"bufio"
	"bytes"
	"fmt"
	"io"
	"strconv"
	"strings"
	"unicode/utf8"

	"gonum.org/v1/gonum/spatial/r3"
)

// PlainLayer is the layer of what a file without layers shows.
const PlainLayer = "outline"

// ReadCSV reads a table of points, one in a row, that are joined to polylines.
// The header row names the columns x, y, z (0 where there is none) and layer,
// in any order, with the unit of the coordinates in brackets: x [mm]. Fields are
// separated by commas, semicolons or tabs; lines that start with # are comments.
// A blank row, or another layer, ends a polyline. One that ends where it starts
// is closed, and one of a single row is a point. What is wrong in the table is in
// Drawing.Faults; the error is one of reading r.
func ReadCSV(r io.Reader) (*Drawing, error) {
	t := &table{d: &Drawing{}}
	s := bufio.NewScanner(r)
	s.Buffer(make([]byte, 0, 4096), longest)
	line := 0
	for s.Scan() {
		line++
		b := bytes.TrimSpace(bytes.TrimPrefix(s.Bytes(), []byte("\ufeff")))
		switch {
		case len(b) > 0 && b[0] == '#':
		case bytes.IndexByte(b, 0) >= 0 || !utf8.Valid(b):
			t.d.fail(line, "save the table as UTF-8 CSV", "the row is not text")
			return t.d, nil
		case t.columns == nil && len(b) > 0:
			if !t.header(string(b), line) {
				return t.d, nil
			}
		case t.columns != nil:
			t.row(string(b), line)
		}
		if t.count > maxEntities {
			t.d.fail(line, "", "the table has more than %d rows", maxEntities)
			return t.d, nil
		}
	}
	if err := s.Err(); err == bufio.ErrTooLong {
		t.d.fail(line+1, "", "a row is longer than %d bytes", longest)
	} else if err != nil {
		return t.d, err
	}
	t.flush()
	if t.columns == nil {
		t.d.fail(0, "start with a header row such as layer,x [m],y [m],z [m]", "the table is empty")
	} else if t.count == 0 {
		t.d.fail(0, "", "the table has no points")
	}
	return t.d, nil
}

// table is a CSV of points while it is read.
type table struct {
	d       *Drawing
	sep     string
	columns []string // layer, x, y, z
	run     []Mark   // the polyline so far
	count   int
	path    int
}

func (t *table) split(s string) []string {
	f := strings.Split(s, t.sep)
	for i := range f {
		f[i] = strings.TrimSpace(f[i])
		if n := len(f[i]); n > 1 && f[i][0] == '"' && f[i][n-1] == '"' {
			f[i] = strings.ReplaceAll(f[i][1:n-1], `""`, `"`)
		}
	}
	return f
}

func (t *table) header(s string, line int) bool {
	t.sep = ","
	for _, c := range []string{";", "\t"} {
		if strings.Count(s, c) > strings.Count(s, t.sep) {
			t.sep = c
		}
	}
	const way = "the columns are layer, x, y and z, with their unit: x [mm]"
	seen := map[string]bool{}
	for _, f := range t.split(s) {
		name, unit, has := strings.Cut(f, "[")
		name = strings.ToLower(strings.TrimSpace(name))
		if name != "layer" && name != "x" && name != "y" && name != "z" {
			if _, err := strconv.ParseFloat(f, 64); err == nil {
				t.d.fail(line, "start with a header row; "+way, "the first row holds numbers, not the names of columns")
			} else {
				t.d.fail(line, way, "unknown column %q", short(f))
			}
			return false
		}
		if seen[name] {
			t.d.fail(line, "remove one of them", "column %s is here twice", name)
			return false
		}
		seen[name] = true
		t.columns = append(t.columns, name)
		if !has {
			continue
		}
		u, ok := ParseUnit(strings.TrimSpace(strings.TrimSuffix(strings.TrimSpace(unit), "]")))
		switch {
		case name == "layer":
			t.d.fail(line, "remove the unit", "column layer has a unit")
			return false
		case !ok:
			t.d.fail(line, "units are "+strings.Join(UnitNames(), ", "), "unknown unit in column %q", short(f))
			return false
		case t.d.Unit.Name != "" && t.d.Unit != u:
			t.d.fail(line, "give all coordinates in one unit", "the columns have two units, %s and %s", t.d.Unit.Name, u.Name)
			return false
		}
		t.d.Unit = u
	}
	if !seen["x"] || !seen["y"] {
		t.d.fail(line, way, "columns x and y are needed")
		return false
	}
	return true
}

func (t *table) row(s string, line int) {
	f := t.split(s)
	if strings.Join(f, "") == "" {
		t.flush()
		return
	}
	t.count++
	if len(f) != len(t.columns) {
		hint := ""
		if t.sep == "," && len(f) > len(t.columns) {
			hint = "write decimals with a point"
		}
		t.d.fail(line, hint, "the row has %d fields but the header has %d columns", len(f), len(t.columns))
		return
	}
	m := Mark{Layer: PlainLayer, Line: line}
	for i, c := range t.columns {
		if c == "layer" {
			if f[i] != "" {
				m.Layer = printable(f[i])
			}
			continue
		}
		v, err := strconv.ParseFloat(f[i], 64)
		if err != nil || !usable(v) || strings.ContainsAny(f[i], "xX_") {
			hint := ""
			if strings.Contains(f[i], ",") {
				hint = "write decimals with a point"
			}
			t.d.fail(line, hint, "%s is not a usable number: %q", c, short(f[i]))
			return
		}
		switch c {
		case "x":
			m.At.X = v
		case "y":
			m.At.Y = v
		case "z":
			m.At.Z = v
		}
	}
	if len(t.run) > 0 && t.run[0].Layer != m.Layer {
		t.flush()
	}
	t.run = append(t.run, m)
}

// flush ends the polyline.
func (t *table) flush() {
	if len(t.run) == 1 {
		t.d.Points = append(t.d.Points, t.run[0])
	}
	for i := 1; i < len(t.run); i++ {
		a, b := t.run[i-1], t.run[i]
		t.d.Segments = append(t.d.Segments, Segment{Layer: b.Layer, Path: t.path, A: a.At, B: b.At, Line: b.Line})
	}
	if len(t.run) > 1 {
		t.path++
	}
	t.run = t.run[:0]
}

// place words coordinates in metres in the unit of a drawing.
func place(v r3.Vec, u Unit) string {
	k := u.Metres
	if !(k > 0) {
		k, u.Name = 1, "m"
	}
	n := func(x float64) string {
		s := strconv.FormatFloat(x/k, 'f', 3, 64)
		s = strings.TrimRight(strings.TrimRight(s, "0"), ".")
		if s == "-0" || s == "" {
			return "0"
		}
		return s
	}
	return fmt.Sprintf("(%s, %s, %s) %s", n(v.X), n(v.Y), n(v.Z), u.Name)
}
