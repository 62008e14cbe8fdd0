package spec

import (
	"bytes"
	"fmt"
	"io"
	"unicode/utf8"
)

// csvReader reads records of a CSV text (RFC 4180, with comment lines that
// start with # and blank lines left out) without allocating per record. The
// separator is a comma, a semicolon or a tab, by the first record. A quoted
// field stays on one line.
type csvReader struct {
	in         io.Reader
	buf        []byte
	start, end int   // unread part of buf
	err        error // of in, io.EOF included
	line       int   // number of the line last read
	text       []byte
	sep        byte
	fields     [][]byte
	at         []int32 // where each field starts in text, in bytes
	consumed   int64   // bytes of all lines read
}

const (
	csvBuffer  = 1 << 18
	csvMaxLine = 1 << 20
)

// newCSV returns a reader with a buffer of size bytes, or less.
func newCSV(in io.Reader, size int) *csvReader {
	return &csvReader{in: in, buf: make([]byte, min(max(size, 64), csvBuffer))}
}

// csvError is a fault of the text at a place in the current line.
type csvError struct {
	offset        int // in bytes from the start of the line
	message, hint string
}

func (e *csvError) Error() string { return e.message }

// nextLine reads a line without its end into c.text. It returns io.EOF at the
// end.
func (c *csvReader) nextLine() error {
	for {
		if i := bytes.IndexByte(c.buf[c.start:c.end], '\n'); i >= 0 {
			c.text = c.buf[c.start : c.start+i]
			c.start += i + 1
			c.consumed += int64(i) + 1
			break
		}
		if c.err != nil {
			if c.err != io.EOF {
				return c.err
			}
			if c.start == c.end {
				return io.EOF
			}
			c.text = c.buf[c.start:c.end]
			c.consumed += int64(len(c.text))
			c.start = c.end
			break
		}
		if c.start > 0 {
			c.end = copy(c.buf, c.buf[c.start:c.end])
			c.start = 0
		}
		if c.end == len(c.buf) {
			if len(c.buf) >= csvMaxLine {
				c.line++
				c.text = c.buf[:0]
				c.err = io.EOF
				c.start = c.end
				return &csvError{0, fmt.Sprintf("a line is longer than %d bytes", csvMaxLine), "this is not a CSV table"}
			}
			c.buf = append(c.buf, make([]byte, len(c.buf))...)
		}
		n, err := c.in.Read(c.buf[c.end:])
		c.end += n
		c.err = err
	}
	c.line++
	if n := len(c.text); n > 0 && c.text[n-1] == '\r' {
		c.text = c.text[:n-1]
	}
	if c.line == 1 {
		c.text = bytes.TrimPrefix(c.text, []byte("\xef\xbb\xbf"))
	}
	return nil
}

// next reads the next record into c.fields. It returns io.EOF at the end and a
// *csvError for a faulty line, after which reading may go on.
func (c *csvReader) next() error {
	for {
		if err := c.nextLine(); err != nil {
			return err
		}
		i := 0
		for i < len(c.text) && (c.text[i] == ' ' || c.text[i] == '\t' && c.sep != '\t') {
			i++
		}
		if i == len(c.text) || c.text[i] == '#' {
			continue
		}
		break
	}
	if c.sep == 0 {
		c.sep = ','
		if bytes.IndexByte(c.text, ',') < 0 {
			if bytes.IndexByte(c.text, ';') >= 0 {
				c.sep = ';'
			} else if bytes.IndexByte(c.text, '\t') >= 0 {
				c.sep = '\t'
			}
		}
	}
	return c.split()
}

// split cuts c.text into fields.
func (c *csvReader) split() error {
	c.fields, c.at = c.fields[:0], c.at[:0]
	t, sep := c.text, c.sep
	for i := 0; ; {
		for i < len(t) && (t[i] == ' ' || t[i] == '\t' && sep != '\t') {
			i++
		}
		if i < len(t) && t[i] == '"' {
			field, next, err := quotedField(t, i, sep)
			if err != nil {
				return err
			}
			c.fields = append(c.fields, field)
			c.at = append(c.at, int32(i))
			if next < 0 {
				return nil
			}
			i = next
			continue
		}
		j := i
		for j < len(t) && t[j] != sep {
			j++
		}
		k := j
		for k > i && (t[k-1] == ' ' || t[k-1] == '\t') {
			k--
		}
		c.fields = append(c.fields, t[i:k])
		c.at = append(c.at, int32(i))
		if j == len(t) {
			return nil
		}
		i = j + 1
	}
}

// quotedField reads the field in quotes that starts at t[i]. next is where the
// next field starts, −1 at the end of the line.
func quotedField(t []byte, i int, sep byte) (field []byte, next int, err error) {
	j, doubled := i+1, false
	for {
		k := bytes.IndexByte(t[j:], '"')
		if k < 0 {
			return nil, 0, &csvError{i, "a quoted field is not closed in this line", "add the closing quote"}
		}
		j += k + 1
		if j < len(t) && t[j] == '"' {
			doubled = true
			j++
			continue
		}
		break
	}
	field = t[i+1 : j-1]
	if doubled {
		field = bytes.ReplaceAll(field, []byte(`""`), []byte(`"`))
	}
	for j < len(t) && (t[j] == ' ' || t[j] == '\t' && sep != '\t') {
		j++
	}
	if j == len(t) {
		return field, -1, nil
	}
	if t[j] != sep {
		return nil, 0, &csvError{j, "text after the closing quote of a field", "put the whole field in quotes"}
	}
	return field, j + 1, nil
}

// column turns an offset into the current line into a column in characters,
// from 1.
func (c *csvReader) column(offset int) int {
	return utf8.RuneCount(c.text[:min(max(offset, 0), len(c.text))]) + 1
}
