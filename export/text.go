package export

import (
	"bytes"
	"context"
	"fmt"
	"io"
	"math"
	"strconv"
)

// text is a buffered writer that remembers its first error and looks at its
// context now and then, so that the code of a text format can read like the
// format.
type text struct {
	ctx context.Context
	w   io.Writer
	b   []byte
	err error
}

func newText(ctx context.Context, w io.Writer) *text {
	return &text{ctx: ctx, w: w, b: make([]byte, 0, 1<<16)}
}

const full = 1 << 15

// line ends a line and writes out what has gathered. It reports whether to go on.
func (t *text) line() bool {
	t.b = append(t.b, '\n')
	if len(t.b) >= full {
		t.flush()
	}
	return t.err == nil
}

func (t *text) flush() {
	if t.err == nil {
		t.err = t.ctx.Err()
	}
	if t.err == nil && len(t.b) > 0 {
		_, t.err = t.w.Write(t.b)
	}
	t.b = t.b[:0]
}

// close writes the rest and returns the first error.
func (t *text) close() error {
	t.flush()
	return t.err
}

func (t *text) str(s string) *text {
	t.b = append(t.b, s...)
	return t
}

func (t *text) int(v int) *text {
	t.b = strconv.AppendInt(t.b, int64(v), 10)
	return t
}

// exact writes the shortest text that reads back to the same bits.
func (t *text) exact(v float64) *text {
	t.b = appendNumber(t.b, v, -1)
	return t
}

// num writes v with at most digits significant digits.
func (t *text) num(v float64, digits int) *text {
	t.b = appendNumber(t.b, v, digits)
	return t
}

func (t *text) printf(format string, args ...any) *text {
	t.b = fmt.Appendf(t.b, format, args...)
	return t
}

// appendNumber writes v with at most digits significant digits (-1: as many as
// its bits need), without trailing zeros, with an exponent only where plain
// digits would be long.
func appendNumber(b []byte, v float64, digits int) []byte {
	if v == 0 {
		return append(b, '0') // -0 too
	}
	a := math.Abs(v)
	if a < 1e-4 || a >= 1e15 || v-v != 0 {
		if digits > 0 {
			return strconv.AppendFloat(b, v, 'g', digits, 64)
		}
		return strconv.AppendFloat(b, v, 'e', -1, 64)
	}
	if digits < 0 {
		return strconv.AppendFloat(b, v, 'f', -1, 64)
	}
	// The library is quick at a given number of digits with an exponent, not
	// without: d.ddde±xx is turned into plain digits here.
	var buf [40]byte
	e := strconv.AppendFloat(buf[:0], a, 'e', digits-1, 64)
	if v < 0 {
		b = append(b, '-')
	}
	k := bytes.IndexByte(e, 'e')
	exponent := 0
	for _, c := range e[k+2:] {
		exponent = 10*exponent + int(c-'0')
	}
	if e[k+1] == '-' {
		exponent = -exponent
	}
	d := e[:k]
	if k > 1 {
		d = append(d[:1], d[2:]...) // without the point
	}
	for len(d) > 1 && d[len(d)-1] == '0' {
		d = d[:len(d)-1]
	}
	if exponent < 0 {
		b = append(b, "0."...)
		for ; exponent < -1; exponent++ {
			b = append(b, '0')
		}
		return append(b, d...)
	}
	for i := 0; i <= exponent || i < len(d); i++ {
		if i == exponent+1 {
			b = append(b, '.')
		}
		if i < len(d) {
			b = append(b, d[i])
		} else {
			b = append(b, '0')
		}
	}
	return b
}
