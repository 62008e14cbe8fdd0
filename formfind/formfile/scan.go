package formfile

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"strconv"
	"unicode/utf16"
	"unicode/utf8"
)

// A SyntaxError says what is wrong with a form.json and where.
type SyntaxError struct {
	File         string
	Line, Column int    // from 1; the column counts bytes
	Thing        string // e.g. "node 17: position", "" at the top
	Problem      string
}

func (e *SyntaxError) Error() string {
	if e.Thing == "" {
		return fmt.Sprintf("%s:%d:%d: %s", e.File, e.Line, e.Column, e.Problem)
	}
	return fmt.Sprintf("%s:%d:%d: %s: %s", e.File, e.Line, e.Column, e.Thing, e.Problem)
}

const (
	longest = 1 << 20 // bytes of one string or number
	deepest = 64      // nesting of values that are skipped
)

// scanner reads JSON from a stream, a token at a time, without building trees
// and without allocating for keys and numbers.
type scanner struct {
	ctx      context.Context
	r        io.Reader
	name     string
	buf      []byte
	pos, end int
	base     int64 // offset in the stream of buf[0]
	line     int   // line of buf[pos], from 1
	lineAt   int64 // offset of the first byte of that line
	eof      bool
	readErr  error

	text    []byte // the last string that had escapes
	section string // kind of thing being read, for messages
	item    int    // its number, −1 = none
	key     []byte // last key, for messages
}

func newScanner(ctx context.Context, r io.Reader, name string) *scanner {
	return &scanner{ctx: ctx, r: r, name: name, buf: make([]byte, 1<<18), line: 1, item: -1}
}

func (s *scanner) errorf(format string, args ...any) error {
	if s.readErr != nil {
		return s.readErr
	}
	thing := s.section
	if s.item >= 0 {
		thing = fmt.Sprintf("%s %d", thing, s.item)
	}
	if len(s.key) > 0 && string(s.key) != thing {
		if thing != "" {
			thing += ": "
		}
		thing += string(s.key)
	}
	return &SyntaxError{File: s.name, Line: s.line, Column: int(s.base+int64(s.pos)-s.lineAt) + 1,
		Thing: thing, Problem: fmt.Sprintf(format, args...)}
}

// fill makes more bytes available behind s.end, keeping those from s.pos on.
// It reports whether there are any.
func (s *scanner) fill() bool {
	if s.eof {
		return false
	}
	if err := s.ctx.Err(); err != nil {
		s.readErr, s.eof = err, true
		return false
	}
	if s.pos > 0 {
		copy(s.buf, s.buf[s.pos:s.end])
		s.base += int64(s.pos)
		s.end -= s.pos
		s.pos = 0
	}
	if s.end == len(s.buf) {
		s.buf = append(s.buf, make([]byte, len(s.buf))...)
	}
	for range 100 {
		n, err := s.r.Read(s.buf[s.end:])
		s.end += n
		if err != nil {
			s.eof = true
			if !errors.Is(err, io.EOF) {
				s.readErr = fmt.Errorf("reading %s: %w", s.name, err)
			}
		}
		if n > 0 {
			return true
		}
		if s.eof {
			return false
		}
	}
	s.readErr, s.eof = fmt.Errorf("reading %s: %w", s.name, io.ErrNoProgress), true
	return false
}

// peek returns the next byte that is not white space without taking it, 0 at
// the end.
func (s *scanner) peek() byte {
	for {
		for s.pos < s.end {
			c := s.buf[s.pos]
			switch c {
			case '\n':
				s.line++
				s.lineAt = s.base + int64(s.pos) + 1
			case ' ', '\t', '\r':
			default:
				return c
			}
			s.pos++
		}
		if !s.fill() {
			return 0
		}
	}
}

func describe(c byte) string {
	switch {
	case c == 0:
		return "the end of the file"
	case c < ' ' || c >= utf8.RuneSelf:
		return fmt.Sprintf("byte 0x%02x", c)
	}
	return fmt.Sprintf("%q", c)
}

// object reads an object and calls field with each key; field must read the
// value. The key is valid until field reads.
func (s *scanner) object(field func(key []byte) error) error {
	if c := s.peek(); c != '{' {
		return s.errorf("want an object, found %s", describe(c))
	}
	s.pos++
	if s.peek() == '}' {
		s.pos++
		return nil
	}
	for {
		if c := s.peek(); c != '"' {
			return s.errorf("want a key in quotes, found %s", describe(c))
		}
		key, err := s.str()
		if err != nil {
			return err
		}
		s.key = append(s.key[:0], key[:min(len(key), 40)]...)
		if s.pos < s.end && s.buf[s.pos] == ':' { // as written
			s.pos++
		} else {
			// peek may move the buffer under the key.
			key = append([]byte(nil), key...)
			if c := s.peek(); c != ':' {
				return s.errorf("want ':' after the key, found %s", describe(c))
			}
			s.pos++
		}
		if err := field(key); err != nil {
			return err
		}
		switch c := s.peek(); c {
		case ',':
			s.pos++
		case '}':
			s.pos++
			s.key = s.key[:0]
			return nil
		default:
			return s.errorf("want ',' or '}', found %s", describe(c))
		}
	}
}

// array reads an array and calls element for each element, which it must read.
func (s *scanner) array(element func(i int) error) error {
	if c := s.peek(); c != '[' {
		return s.errorf("want a list, found %s", describe(c))
	}
	s.pos++
	if s.peek() == ']' {
		s.pos++
		return nil
	}
	for i := 0; ; i++ {
		if err := element(i); err != nil {
			return err
		}
		switch c := s.peek(); c {
		case ',':
			s.pos++
		case ']':
			s.pos++
			return nil
		default:
			return s.errorf("want ',' or ']', found %s", describe(c))
		}
	}
}

// str reads a string. The result is valid until the next read.
func (s *scanner) str() ([]byte, error) {
	if c := s.peek(); c != '"' {
		return nil, s.errorf("want text in quotes, found %s", describe(c))
	}
	// Look for the end in the buffer; most strings have no escapes.
	at := 1
	escaped := false
	for {
		rest := s.buf[s.pos+at : s.end]
		if i := bytes.IndexByte(rest, '"'); i >= 0 {
			// The quote counts unless an odd number of backslashes is before it.
			part := s.buf[s.pos+1 : s.pos+at+i]
			slashes := 0
			for n := len(part); n > 0 && part[n-1] == '\\'; n-- {
				slashes++
			}
			at += i + 1
			if slashes%2 == 1 {
				continue
			}
			escaped = bytes.IndexByte(part, '\\') >= 0
			break
		}
		at += len(rest)
		if at > longest {
			return nil, s.errorf("text of more than %d bytes", longest)
		}
		if !s.fill() {
			return nil, s.errorf("the text does not end")
		}
	}
	raw := s.buf[s.pos+1 : s.pos+at-1]
	plain := true
	for _, c := range raw {
		if c < ' ' {
			return nil, s.errorf("text with a bare control character 0x%02x", c)
		}
		plain = plain && c < utf8.RuneSelf
	}
	if escaped {
		var err error
		if raw, err = s.unescape(raw); err != nil {
			return nil, err
		}
	}
	if !plain && !utf8.Valid(raw) {
		return nil, s.errorf("text that is not UTF-8")
	}
	s.pos += at
	return raw, nil
}

func (s *scanner) unescape(raw []byte) ([]byte, error) {
	out := s.text[:0]
	for i := 0; i < len(raw); i++ {
		if raw[i] != '\\' {
			out = append(out, raw[i])
			continue
		}
		i++ // a backslash is never last: it would escape the closing quote
		switch raw[i] {
		case '"', '\\', '/':
			out = append(out, raw[i])
		case 'b':
			out = append(out, '\b')
		case 'f':
			out = append(out, '\f')
		case 'n':
			out = append(out, '\n')
		case 'r':
			out = append(out, '\r')
		case 't':
			out = append(out, '\t')
		case 'u':
			r, ok := hex4(raw[i+1:])
			if !ok {
				return nil, s.errorf("text with a broken \\u escape")
			}
			i += 4
			if utf16.IsSurrogate(r) {
				second := rune(-1)
				if i+2 < len(raw) && raw[i+1] == '\\' && raw[i+2] == 'u' {
					second, _ = hex4(raw[i+3:])
				}
				if r = utf16.DecodeRune(r, second); r == utf8.RuneError {
					return nil, s.errorf("text with half a surrogate pair")
				}
				i += 6
			}
			out = utf8.AppendRune(out, r)
		default:
			return nil, s.errorf("text with an unknown escape")
		}
	}
	s.text = out
	return out, nil
}

func hex4(b []byte) (rune, bool) {
	if len(b) < 4 {
		return -1, false
	}
	var r rune
	for _, c := range b[:4] {
		switch {
		case c >= '0' && c <= '9':
			r = r<<4 | rune(c-'0')
		case c|32 >= 'a' && c|32 <= 'f':
			r = r<<4 | rune(c|32-'a'+10)
		default:
			return -1, false
		}
	}
	return r, true
}

// literal takes the next bytes if they are word, which is null, true or false.
func (s *scanner) literal(word string) bool {
	s.peek()
	for s.end-s.pos < len(word)+1 && s.fill() {
	}
	if s.end-s.pos < len(word) || string(s.buf[s.pos:s.pos+len(word)]) != word {
		return false
	}
	s.pos += len(word)
	return true
}

// null takes a null if that is what comes.
func (s *scanner) null() bool { return s.peek() == 'n' && s.literal("null") }

func (s *scanner) boolean() (bool, error) {
	switch c := s.peek(); {
	case c == 't' && s.literal("true"):
		return true, nil
	case c == 'f' && s.literal("false"):
		return false, nil
	default:
		return false, s.errorf("want true or false, found %s", describe(c))
	}
}

// digits returns the next number as written. It is valid until the next read.
func (s *scanner) digits() ([]byte, error) {
	c := s.peek()
	if c != '-' && (c < '0' || c > '9') {
		return nil, s.errorf("want a number, found %s", describe(c))
	}
	n := 1
	for {
		for s.pos+n < s.end {
			c := s.buf[s.pos+n]
			if (c < '0' || c > '9') && c != '.' && c != 'e' && c != 'E' && c != '-' && c != '+' {
				return s.buf[s.pos : s.pos+n], nil
			}
			n++
		}
		if n > longest {
			return nil, s.errorf("number of more than %d digits", longest)
		}
		if !s.fill() {
			return s.buf[s.pos : s.pos+n], nil
		}
	}
}

// number reads a finite number.
func (s *scanner) number() (float64, error) {
	d, err := s.digits()
	if err != nil {
		return 0, err
	}
	if !isNumber(d) {
		return 0, s.errorf("%.40q is not a number", d)
	}
	v, err := strconv.ParseFloat(string(d), 64)
	if err != nil {
		return 0, s.errorf("%.40s is too large for a number", d)
	}
	s.pos += len(d)
	return v, nil
}

// isNumber reports whether d is a number of RFC 8259, section 6.
func isNumber(d []byte) bool {
	i := 0
	digits := func() bool {
		from := i
		for i < len(d) && d[i] >= '0' && d[i] <= '9' {
			i++
		}
		return i > from
	}
	if i < len(d) && d[i] == '-' {
		i++
	}
	from := i
	if !digits() || (d[from] == '0' && i > from+1) {
		return false
	}
	if i < len(d) && d[i] == '.' {
		i++
		if !digits() {
			return false
		}
	}
	if i < len(d) && (d[i] == 'e' || d[i] == 'E') {
		i++
		if i < len(d) && (d[i] == '+' || d[i] == '-') {
			i++
		}
		if !digits() {
			return false
		}
	}
	return i == len(d)
}

// integer reads a whole number in the range of int32.
func (s *scanner) integer() (int, error) {
	d, err := s.digits()
	if err != nil {
		return 0, err
	}
	v, err := strconv.ParseInt(string(d), 10, 32)
	if err != nil || !isNumber(d) {
		return 0, s.errorf("want a whole number of at most 32 bits, found %.40s", d)
	}
	s.pos += len(d)
	return int(v), nil
}

// skip reads any value and forgets it.
func (s *scanner) skip() error { return s.skipDeep(0) }

func (s *scanner) skipDeep(depth int) error {
	if depth > deepest {
		return s.errorf("nested more than %d deep", deepest)
	}
	switch c := s.peek(); c {
	case '{':
		return s.object(func([]byte) error { return s.skipDeep(depth + 1) })
	case '[':
		return s.array(func(int) error { return s.skipDeep(depth + 1) })
	case '"':
		_, err := s.str()
		return err
	case 'n':
		if s.null() {
			return nil
		}
		return s.errorf("not a JSON value")
	case 't', 'f':
		_, err := s.boolean()
		return err
	default:
		d, err := s.digits()
		if err != nil {
			return err
		}
		if !isNumber(d) {
			return s.errorf("%.40q is not a number", d)
		}
		s.pos += len(d)
		return nil
	}
}
