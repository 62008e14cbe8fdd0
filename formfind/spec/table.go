package spec

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"math"
	"os"
	"path"
	"path/filepath"
	"strings"
	"unicode/utf8"

	"go.yaml.in/yaml/v4"
)

// row is one row of a table: the values of the keys of its section, by the
// position of the key.
type row struct {
	has   uint32
	value [16]float64
	text  [16][]byte
}

func (w *row) filled(k int) bool { return w.has>>uint(k)&1 != 0 }

// tableReader goes through the rows of one table, whatever it comes from.
type tableReader struct {
	r     *reader
	sec   *section
	p     *place
	row   row
	count int                             // rows so far
	where func(k int) (line, col int)     // of key k in the current row, −1 = the row
	file  string                          // for messages
	rank  int                             // of the file
	fails int                             // errors in this table
	hint  func() (rows int, certain bool) // how many rows there will be
}

// fail records an error at key k of the current row, −1 for the row.
func (t *tableReader) fail(k int, message, hint string) {
	line, col := 0, 0
	if t.where != nil {
		line, col = t.where(k)
	}
	t.failAt(line, col, k, message, hint)
}

func (t *tableReader) failAt(line, col, k int, message, hint string) {
	t.fails++
	if t.fails > maxPerTable {
		t.r.diags.more++
		return
	}
	p := t.p
	if t.count >= 0 {
		p = p.item(t.count)
	}
	d := Diagnostic{File: t.file, Line: line, Column: col, Message: message, Hint: hint}
	if k >= 0 {
		d.Path = p.down(t.sec.keys[k].name).String()
		d.Text = clip(string(t.row.text[k]))
	} else {
		d.Path = p.String()
	}
	if line < 0 {
		d.File, d.Line, d.Column = setLabel(t.r.options.Set[-line-1]), 0, 0
	}
	t.r.add(d, t.rank)
}

// cell reads the text of a cell for key k into the row.
func (t *tableReader) cell(k int, text []byte, unit *Unit) {
	key := t.sec.keys[k]
	t.row.text[k] = text
	if len(text) == 0 {
		if key.required {
			t.fail(k, fmt.Sprintf("%s is empty", key.name), "for example "+key.example)
			t.row.has |= 1 << 31 // a required cell is wrong
		}
		return
	}
	s := key.shape
	if s.form != formQuantity {
		t.row.has |= 1 << uint(k)
		return
	}
	v, n := scanNumber(text)
	if n == len(text) && finite(v) {
		if unit != nil {
			v = s.dim.value(v, *unit)
		} else {
			v = s.dim.value(v, s.dim.Units[0])
		}
		if math.Abs(v) <= s.dim.limit && (!s.lo.set || s.check(v, "", "") == nil) {
			t.row.value[k] = v
			t.row.has |= 1 << uint(k)
			return
		}
	}
	t.slowCell(k, text, unit)
}

// slowCell reads a cell that is not a plain good number.
func (t *tableReader) slowCell(k int, text []byte, unit *Unit) {
	key := t.sec.keys[k]
	d := key.shape.dim
	in := string(text)
	v, c := parseQuantity(in, d)
	if c == nil && unit != nil {
		plain, rest, _ := splitQuantity(strings.TrimSpace(in))
		if rest != "" {
			c = &complaint{fmt.Sprintf("%q has a unit, and its column has one too", clip(in)), "write the unit in one place"}
		} else {
			v = d.value(plain, *unit)
		}
	}
	if c == nil {
		c = key.shape.check(v, in, key.name)
	}
	if c != nil {
		// A leading zero is common in fixed-width tables and means nothing.
		t.fail(k, c.message, c.hint)
		t.row.has |= 1 << 31
		return
	}
	t.row.value[k] = v
	t.row.has |= 1 << uint(k)
}

// bad reports whether a required or given cell of the row could not be read.
func (t *tableReader) bad() bool { return t.row.has>>31 != 0 }

// table reads the table under a key of listed, calling each for every row.
func (r *reader) table(f *fields, name string, each func(t *tableReader)) (rows int, ok bool) {
	s, n := f.shape(name), f.get(name)
	if n == nil {
		return 0, false
	}
	t := &tableReader{r: r, sec: s.sec, p: f.p.down(name), file: r.file, count: -1}
	switch {
	case n.Kind == yaml.SequenceNode:
		r.rows(t, n, each)
	case n.Kind == yaml.ScalarNode && strings.Contains(n.Value, "\n"):
		r.block(t, n, each)
	case n.Kind == yaml.ScalarNode:
		r.csvFile(t, n, each)
	default:
		r.fail(n, t.p, fmt.Sprintf("%s takes the name of a CSV file or a list of rows, not %s", name, what(n)), "for example "+name+": "+name+".csv")
		return 0, false
	}
	return t.count, t.fails == 0
}

// rows reads a table written as a list of mappings.
func (r *reader) rows(t *tableReader, n *yaml.Node, each func(t *tableReader)) {
	t.count = 0
	t.hint = func() (int, bool) { return len(n.Content), true }
	var nodes [16]*yaml.Node
	var at *yaml.Node
	t.where = func(k int) (int, int) {
		m := at
		if k >= 0 && nodes[k] != nil {
			m = nodes[k]
		}
		return m.Line, m.Column
	}
	for i, c := range n.Content {
		p := t.p.item(i)
		at = c
		if c = r.mapping(c, p, t.sec); c == nil {
			t.fails++
			t.count++
			continue
		}
		at = c
		clear(nodes[:])
		t.row = row{}
		g := r.section(c, t.sec, p)
		if !g.ok {
			t.fails++
			t.row.has |= 1 << 31
		}
		for _, e := range g.got {
			k := t.sec.index(e.name)
			nodes[k] = e.n
			if e.n.Kind != yaml.ScalarNode {
				t.fail(k, fmt.Sprintf("%s takes one value, not %s", e.name, what(e.n)), "for example "+e.name+": "+e.key.example)
				t.row.has |= 1 << 31
				continue
			}
			t.cell(k, []byte(e.n.Value), nil)
		}
		each(t)
		t.count++
	}
}

// index returns the position of the key with the given name.
func (s *section) index(name string) int {
	for i, k := range s.keys {
		if k.name == name {
			return i
		}
	}
	return -1
}

// block reads a table written as CSV text in the model file.
func (r *reader) block(t *tableReader, n *yaml.Node, each func(t *tableReader)) {
	if n.Style&yaml.LiteralStyle == 0 {
		r.fail(n, t.p, "a table of several lines is not in a literal block", "start it with | and put each row on its own line")
		return
	}
	line, indent := n.Line, 0
	for first := line + 1; line > 0 && first <= len(r.allLines()); first++ {
		if l := r.line(first); strings.TrimSpace(l) != "" {
			indent = len(l) - len(strings.TrimLeft(l, " "))
			break
		}
	}
	c := newCSV(strings.NewReader(n.Value), len(n.Value)+1)
	r.csv(t, c, func(l, col int) (int, int) {
		if line < 0 {
			return line, 0
		}
		return line + l, col + indent
	}, int64(len(n.Value)), each)
}

// csvFile reads a table from a file beside the model.
func (r *reader) csvFile(t *tableReader, n *yaml.Node, each func(t *tableReader)) {
	open := r.open
	if r.options.open != nil {
		open = r.options.open
	}
	f, size, c := open(n.Value)
	if c != nil {
		r.fail(n, t.p, c.message, c.hint)
		return
	}
	defer f.Close()
	if size > r.options.MaxTableBytes {
		r.fail(n, t.p, fmt.Sprintf("%q is larger than %d bytes", clip(n.Value), r.options.MaxTableBytes), "")
		return
	}
	r.tables++
	t.rank = r.tables
	t.file = filepath.ToSlash(filepath.Join(filepath.Dir(r.file), filepath.FromSlash(n.Value)))
	if r.file == "-" || filepath.IsAbs(n.Value) {
		t.file = n.Value
	}
	in := io.TeeReader(io.LimitReader(f, r.options.MaxTableBytes), r.hash)
	r.csv(t, newCSV(in, csvBuffer), func(l, col int) (int, int) { return l, col }, size, each)
}

// open opens a CSV file named in the model and tells its size.
func (r *reader) open(name string) (io.ReadCloser, int64, *complaint) {
	bad := func(message, hint string) (io.ReadCloser, int64, *complaint) {
		return nil, 0, &complaint{message, hint}
	}
	failed := func(err error) (io.ReadCloser, int64, *complaint) {
		var pe *os.PathError
		if errors.As(err, &pe) {
			err = pe.Err
		}
		if errors.Is(err, os.ErrNotExist) {
			return bad(fmt.Sprintf("there is no file %q in the model's folder", clip(name)), r.similarFile(name))
		}
		return bad(fmt.Sprintf("cannot open %q: %v", clip(name), err), "")
	}
	if strings.ContainsAny(name, "\x00") || name == "" || len(name) > 1000 {
		return bad(fmt.Sprintf("%q is not the name of a file", clip(name)), "")
	}
	var (
		stat func() (os.FileInfo, error)
		open func() (*os.File, error)
	)
	if r.options.AnyFolder {
		local := filepath.FromSlash(name)
		if !filepath.IsAbs(local) {
			local = filepath.Join(r.folder, local)
		}
		stat = func() (os.FileInfo, error) { return os.Stat(local) }
		open = func() (*os.File, error) { return os.Open(local) }
	} else {
		if !filepath.IsLocal(filepath.FromSlash(name)) || strings.ContainsAny(name, `\:`) {
			return bad(fmt.Sprintf("%q is outside the model's folder", clip(name)), "put the CSV file beside the model file, or below it, and name it relative to that")
		}
		root, err := os.OpenRoot(r.folder)
		if err != nil {
			return failed(err)
		}
		defer root.Close()
		stat = func() (os.FileInfo, error) { return root.Stat(path.Clean(name)) }
		open = func() (*os.File, error) { return root.Open(path.Clean(name)) }
	}
	// Looked at before it is opened: a pipe would keep Open waiting.
	st, err := stat()
	if err != nil {
		return failed(err)
	}
	if !st.Mode().IsRegular() {
		return bad(fmt.Sprintf("%q is not a file", clip(name)), "name a CSV file beside the model file")
	}
	f, err := open()
	if err != nil {
		return failed(err)
	}
	if r.options.Beside != nil {
		at := filepath.FromSlash(name)
		if !filepath.IsAbs(at) {
			at = filepath.Join(r.folder, at)
		}
		r.options.Beside(at)
	}
	return f, st.Size(), nil
}

// similarFile suggests a file that was meant.
func (r *reader) similarFile(name string) string {
	dir, base := filepath.Split(filepath.FromSlash(name))
	if !filepath.IsLocal(filepath.Join(dir, ".")) {
		return ""
	}
	list, err := os.ReadDir(filepath.Join(r.folder, dir))
	if err != nil || len(list) > 1000 {
		return ""
	}
	var names []string
	for _, e := range list {
		if !e.IsDir() {
			names = append(names, e.Name())
		}
	}
	if near := nearest(base, names); near != "" {
		return fmt.Sprintf("did you mean %q?", filepath.ToSlash(dir)+near)
	}
	return "CSV files are looked for beside the model file"
}

// column is what a column of a CSV file holds.
type column struct {
	key  int
	unit *Unit
}

// csv reads a CSV text; place turns its lines and columns into those to show.
func (r *reader) csv(t *tableReader, c *csvReader, place func(line, col int) (int, int), size int64, each func(t *tableReader)) {
	failLine := func(e *csvError) {
		l, col := place(c.line, c.column(e.offset))
		t.failAt(l, col, -1, e.message, e.hint)
	}
	cols, ok := r.header(t, c, place)
	if !ok {
		return
	}
	keyField := [16]int{}
	for i := range keyField {
		keyField[i] = -1
	}
	for i, col := range cols {
		keyField[col.key] = i
	}
	t.where = func(k int) (int, int) {
		if k >= 0 && keyField[k] >= 0 && keyField[k] < len(c.at) {
			return place(c.line, c.column(int(c.at[keyField[k]])))
		}
		return place(c.line, c.column(int(c.at[0])))
	}
	t.hint = func() (int, bool) {
		if c.consumed == 0 {
			return 0, false
		}
		return int(float64(size) / float64(c.consumed) * float64(t.count+1)), false
	}
	t.count = 0
	for {
		if t.count&0xffff == 0xffff && r.ctx.Err() != nil {
			return
		}
		if err := c.next(); err != nil {
			if err == io.EOF {
				return
			}
			ce, ok := err.(*csvError)
			if !ok {
				r.fatal = fmt.Errorf("reading %s: %w", t.file, err)
				return
			}
			failLine(ce)
			t.count++
			continue
		}
		t.row.has = 0
		if len(c.fields) != len(cols) {
			clear(t.row.text[:])
			l, col := place(c.line, 1)
			t.failAt(l, col, -1, fmt.Sprintf("the row has %d fields but the header has %d columns", len(c.fields), len(cols)), "separate fields as in the header, and put text with separators in quotes")
			t.count++
			continue
		}
		for i, f := range c.fields {
			t.cell(cols[i].key, f, cols[i].unit)
		}
		each(t)
		t.count++
	}
}

// header reads the header row of a CSV text.
func (r *reader) header(t *tableReader, c *csvReader, place func(line, col int) (int, int)) ([]column, bool) {
	fail := func(offset int, message, hint string) {
		l, col := place(max(c.line, 1), c.column(offset))
		t.failAt(l, col, -1, message, hint)
	}
	columnHint := "the columns are " + list(t.sec.names(), "and")
	err := c.next()
	var ce *csvError
	switch {
	case err == io.EOF:
		fail(0, "the table is empty", "start with a header row; "+columnHint)
		return nil, false
	case errors.As(err, &ce):
		fail(ce.offset, ce.message, ce.hint)
		return nil, false
	case err != nil:
		r.fatal = fmt.Errorf("reading %s: %w", t.file, err)
		return nil, false
	}
	if !utf8.Valid(c.text) {
		fail(0, "the header row is not UTF-8 text", "save the file as UTF-8 CSV")
		return nil, false
	}
	cols := make([]column, 0, len(c.fields))
	seen := [16]bool{}
	ok := true
	numbers := 0
	for _, f := range c.fields {
		if _, n := scanNumber(f); n > 0 && n == len(f) {
			numbers++
		}
	}
	if numbers > 0 {
		fail(0, fmt.Sprintf("the first row holds numbers, not column names: %q", clip(string(c.text))), "start with a header row; "+columnHint)
		return nil, false
	}
	for i, f := range c.fields {
		at := int(c.at[i])
		title, unitText := string(f), ""
		if j := bytes.IndexByte(f, '['); j >= 0 && f[len(f)-1] == ']' {
			title, unitText = strings.TrimSpace(string(f[:j])), strings.TrimSpace(string(f[j+1:len(f)-1]))
		}
		k := index2(t.sec.names(), title, true)
		if k < 0 {
			hint := columnHint
			if near := nearest(title, t.sec.names()); near != "" {
				hint = fmt.Sprintf("did you mean %q?", near)
			}
			if title == "" {
				fail(at, "a column without a name", hint)
			} else {
				fail(at, fmt.Sprintf("unknown column %q", clip(title)), hint)
			}
			ok = false
			continue
		}
		if seen[k] {
			fail(at, fmt.Sprintf("column %q is here twice", title), "remove one of them")
			ok = false
			continue
		}
		seen[k] = true
		col := column{key: k}
		if unitText != "" {
			s := t.sec.keys[k].shape
			if s.form != formQuantity {
				fail(at, fmt.Sprintf("column %q has a unit but holds no quantity", title), "remove the unit")
				ok = false
				continue
			}
			u, c := s.dim.parseUnit(unitText, unitText)
			if c != nil {
				fail(at, fmt.Sprintf("column %q: %s", title, c.message), c.hint)
				ok = false
				continue
			}
			col.unit = &u
		}
		cols = append(cols, col)
	}
	if !ok {
		return nil, false
	}
	for k, key := range t.sec.keys {
		if key.required && !seen[k] {
			fail(0, fmt.Sprintf("there is no column %q", key.name), columnHint)
			ok = false
		}
	}
	return cols, ok
}
