package spec

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"hash"
	"io"
	"os"
	"path/filepath"
	"strings"
	"unicode/utf8"

	"anticlast/formfind/canopy"

	"go.yaml.in/yaml/v4"
	"go.yaml.in/yaml/v4/plugin/loaderlimits"
)

// Source is where a model comes from.
type Source struct {
	// Name of the model file: the path to open when Reader is nil, and what
	// messages call it.
	Name string
	// Reader, if set, holds the text of the model.
	Reader io.Reader
	// Folder is where the CSV files of a listed model are. Empty: the folder
	// of Name, or the current one when Reader is set.
	Folder string
}

// File is the model file at path.
func File(path string) Source { return Source{Name: path} }

// Input is a model read from r, called "-" in messages, whose CSV files are in
// folder.
func Input(r io.Reader, folder string) Source {
	return Source{Name: "-", Reader: r, Folder: folder}
}

// Options control Read. The zero value is ready to use.
type Options struct {
	// Set changes values of the model: each entry is path=value, such as
	// points.M1.z=7.5. A path is made of keys, names and list positions
	// (from 0; also x, y, z) with dots between; a value is written as in
	// the model file.
	Set []string
	// Warn, if set, gets what is doubtful but not wrong, in order.
	Warn func(Diagnostic)
	// Beside, if set, gets the path of every CSV file or drawing that is opened.
	Beside func(path string)
	// AnyFolder permits CSV files and drawings outside the model's folder, by absolute
	// path or through "..". Without it they are refused, so that a model
	// from a stranger cannot read other files.
	AnyFolder bool
	// MaxBytes is the largest model file that is read. Zero: 4 MiB. Large
	// tables belong in CSV files.
	MaxBytes int64
	// MaxTableBytes is the largest CSV file that is read. Zero: 2 GiB.
	MaxTableBytes int64

	open func(name string) (io.ReadCloser, int64, *complaint) // in place of files, for tests
}

const (
	defaultMaxBytes      = 4 << 20
	defaultMaxTableBytes = 2 << 30
	maxDepth             = 40      // nesting of a model file; the format itself needs 8
	maxVisits            = 2000000 // values looked at, aliases counted each time
)

// Read reads a model. An error of what the model says is an *Errors that holds
// all of them; other errors are those of reading files or of ctx.
//
// The model's Digest is the SHA-256 of all bytes read: the model file, its CSV
// files in the order nodes, supports, members, triangles, loads, or the drawing
// of its outline, and each entry of o.Set.
func Read(ctx context.Context, src Source, o Options) (*canopy.Model, error) {
	if o.MaxBytes == 0 {
		o.MaxBytes = defaultMaxBytes
	}
	if o.MaxTableBytes == 0 {
		o.MaxTableBytes = defaultMaxTableBytes
	}
	r := &reader{ctx: ctx, options: o, file: src.Name, hash: sha256.New(), folder: src.Folder}
	if r.folder == "" {
		r.folder = "."
		if src.Reader == nil {
			r.folder = filepath.Dir(src.Name)
		}
	}
	text, err := r.slurp(src)
	if err != nil {
		return nil, err
	}
	r.hash.Write(text)
	m := r.read(text)
	if r.fatal != nil {
		return nil, r.fatal
	}
	if err := ctx.Err(); err != nil {
		return nil, fmt.Errorf("reading %s: %w", src.Name, err)
	}
	if o.Warn != nil {
		for _, d := range sorted(r.diags.warnings) {
			o.Warn(d)
		}
	}
	if err := r.diags.err(); err != nil {
		return nil, err
	}
	m.File = "-"
	if src.Name != "-" && src.Name != "" {
		m.File = filepath.Base(src.Name)
	}
	for _, s := range o.Set {
		io.WriteString(r.hash, "\n--set "+s)
	}
	m.Digest = "sha256:" + hex.EncodeToString(r.hash.Sum(nil))
	return m, nil
}

// reader is the state of one Read.
type reader struct {
	ctx     context.Context
	options Options
	file    string
	folder  string
	hash    hash.Hash
	lines   []string // of the model file, filled when needed
	text    []byte
	diags   diagnostics
	visits  int
	// names compared for suggestions
	compared int
	broken   map[string]bool // things whose definition is wrong
	fatal    error           // an error that is not the model's
	tables   int             // CSV files opened, for the order of messages
}

// slurp reads the model file.
func (r *reader) slurp(src Source) ([]byte, error) {
	in := src.Reader
	if in == nil {
		f, err := os.Open(src.Name)
		if err != nil {
			return nil, fmt.Errorf("reading the model: %w", err)
		}
		defer f.Close()
		if st, err := f.Stat(); err == nil && st.IsDir() {
			return nil, fmt.Errorf("reading the model: %s is a folder; give a model file", src.Name)
		}
		in = f
	}
	text, err := io.ReadAll(io.LimitReader(in, r.options.MaxBytes+1))
	if err != nil {
		return nil, fmt.Errorf("reading the model %s: %w", src.Name, err)
	}
	if int64(len(text)) > r.options.MaxBytes {
		return nil, &Errors{List: []Diagnostic{{File: r.file, Message: fmt.Sprintf("the model file is larger than %d bytes", r.options.MaxBytes), Hint: "put large tables into CSV files beside it (see listed)"}}}
	}
	return text, nil
}

// read turns the text into a model; what is wrong is in r.diags.
func (r *reader) read(text []byte) *canopy.Model {
	r.text = text
	if !r.checkText(text) {
		return nil
	}
	root := r.parse(text)
	if root == nil {
		return nil
	}
	return r.decode(r.applySets(root))
}

// checkText finds bytes that no text file holds.
func (r *reader) checkText(text []byte) bool {
	fail := func(line, col int, message, hint string) bool {
		r.add(Diagnostic{File: r.file, Line: line, Column: col, Message: message, Hint: hint}, 0)
		return false
	}
	if len(text) >= 2 && (text[0] == 0xff && text[1] == 0xfe || text[0] == 0xfe && text[1] == 0xff) {
		return fail(1, 1, "the file is UTF-16 text", "save it as UTF-8")
	}
	if len(strings.TrimSpace(string(text))) == 0 {
		return fail(1, 1, "the model file is empty", "start from a sample")
	}
	line, col := 1, 1
	for i := 0; i < len(text); {
		c := text[i]
		if c >= 0x20 && c < 0x7f {
			i++
			col++
			continue
		}
		switch {
		case c == '\n':
			line, col = line+1, 1
			i++
			continue
		case c == '\r' || c == '\t':
			i++
			col++
			continue
		case c < 0x20 || c == 0x7f:
			return fail(line, col, fmt.Sprintf("control character %#02x; this is not a YAML text file", c), "")
		}
		ch, n := utf8.DecodeRune(text[i:])
		if ch == utf8.RuneError && n == 1 {
			return fail(line, col, fmt.Sprintf("byte %#02x is not UTF-8 text", c), "save the file as UTF-8")
		}
		if ch >= 0x80 && ch < 0xa0 && ch != 0x85 || ch == 0xfffe || ch == 0xffff || ch == 0xfeff && i > 0 {
			return fail(line, col, fmt.Sprintf("character %U is not permitted in YAML", ch), "remove it")
		}
		i += n
		col++
	}
	return true
}

var depthLimit = yaml.WithPlugin(loaderlimits.New(loaderlimits.DepthValue(maxDepth)))

// parse returns the root mapping of the text, nil after an error.
func (r *reader) parse(text []byte) *yaml.Node {
	var doc yaml.Node
	if err := safeLoad(text, &doc); err != nil {
		r.add(r.syntax(err), 0)
		return nil
	}
	if doc.Kind != yaml.DocumentNode || len(doc.Content) != 1 {
		r.add(Diagnostic{File: r.file, Line: 1, Column: 1, Message: "the model file is empty", Hint: "start from a sample"}, 0)
		return nil
	}
	return doc.Content[0]
}

// safeLoad keeps a fault of the YAML library from reaching the user.
func safeLoad(text []byte, doc *yaml.Node) (err error) {
	defer func() {
		if p := recover(); p != nil {
			err = fmt.Errorf("not readable as YAML")
		}
	}()
	return yaml.Load(text, doc, depthLimit)
}

// syntax words an error of the YAML library.
func (r *reader) syntax(err error) Diagnostic {
	d := Diagnostic{File: r.file, Line: 1, Column: 1}
	var le *yaml.LoadError
	if !errors.As(err, &le) {
		d.Message = "not a YAML file: " + clip(err.Error())
		return d
	}
	if le.Mark.Line > 0 {
		d.Line, d.Column = le.Mark.Line, le.Mark.Column
	}
	line := r.line(d.Line)
	d.Text = clip(strings.TrimSpace(line))
	m := le.Message
	switch {
	case strings.Contains(m, "no documents"):
		d.Message, d.Hint = "the model file holds no model", "start from a sample"
	case strings.Contains(m, "found multiple"):
		d.Message, d.Hint = "the file holds several documents", "remove the line --- between them"
		for i, l := range r.allLines() {
			if i > 0 && strings.HasPrefix(l, "---") {
				d.Line, d.Column = i+1, 1
			}
		}
	case strings.Contains(m, "cannot start any token") && strings.HasPrefix(strings.TrimLeft(line, " "), "\t"):
		d.Message, d.Hint = "a tab at the start of a line", "indent with spaces"
	case strings.Contains(m, "cannot start any token"):
		d.Message, d.Hint = fmt.Sprintf("unexpected character in %q", d.Text), "put text with special characters in quotes"
	case strings.Contains(m, "mapping values are not allowed"):
		d.Message, d.Hint = fmt.Sprintf("a second colon, or a key indented too deep, in %q", d.Text), "write one key per line, indented like its neighbours; put text with a colon in quotes"
	case strings.Contains(m, "did not find expected ',' or ']'"):
		d.Message, d.Hint = fmt.Sprintf("the list that starts in line %d is not closed before %q", le.ContextMark.Line, d.Text), "add a comma or ]"
	case strings.Contains(m, "did not find expected ',' or '}'"):
		d.Message, d.Hint = fmt.Sprintf("the mapping that starts in line %d is not closed before %q", le.ContextMark.Line, d.Text), "add a comma or }"
	case strings.Contains(m, "could not find expected ':'"):
		d.Message, d.Hint = fmt.Sprintf("a key without a colon before %q", d.Text), "write key: value"
	case strings.Contains(m, "did not find expected key"):
		d.Message, d.Hint = fmt.Sprintf("%q does not fit the lines above", d.Text), "indent keys of one mapping alike"
	case strings.Contains(m, "did not find expected '-' indicator"):
		d.Message, d.Hint = fmt.Sprintf("%q does not fit the list above", d.Text), "start each entry with -, indented alike"
	case strings.Contains(m, "unexpected end of stream"):
		d.Line, d.Column = le.ContextMark.Line, le.ContextMark.Column
		d.Text = clip(strings.TrimSpace(r.line(d.Line)))
		d.Message, d.Hint = fmt.Sprintf("a quoted text in %q is not closed", d.Text), "add the closing quote"
	case strings.Contains(m, "unknown anchor"):
		d.Message, d.Hint = m, "define it with & before it is used with *"
	case strings.Contains(m, "max depth"):
		d.Message, d.Hint = fmt.Sprintf("nested deeper than %d levels", maxDepth), ""
	default:
		d.Message = "not valid YAML: " + clip(m)
		if d.Text != "" {
			d.Message += fmt.Sprintf(" near %q", d.Text)
		}
	}
	return d
}

// allLines returns the lines of the model file.
func (r *reader) allLines() []string {
	if r.lines == nil {
		r.lines = strings.Split(string(r.text), "\n")
	}
	return r.lines
}

// line returns line i of the model file, from 1.
func (r *reader) line(i int) string {
	l := r.allLines()
	if i < 1 || i > len(l) {
		return ""
	}
	return strings.TrimRight(l[i-1], "\r")
}

// add records an error; rank orders the files.
func (r *reader) add(d Diagnostic, rank int) {
	if len(r.diags.errors) >= maxErrors {
		r.diags.more++
		return
	}
	r.diags.errors = append(r.diags.errors, placed{d, rank})
}
