package formfile

import (
	"context"
	"fmt"
	"io"
	"math"
	"runtime"
	"strconv"
	"sync"
	"unicode/utf8"

	"gonum.org/v1/gonum/spatial/r3"
)

// text builds JSON in a byte slice. The last key and the first value that
// cannot be written are remembered, so that an error can name them.
type text struct {
	b   []byte
	key string
	bad string // what was wrong, "" when nothing
}

// sep writes the comma between two values of one object or array.
func (t *text) sep() {
	if n := len(t.b); n > 0 {
		switch t.b[n-1] {
		case '{', '[', ':', '\n':
		default:
			t.b = append(t.b, ',')
		}
	}
}

// k writes a key.
func (t *text) k(key string) *text {
	t.sep()
	t.key = key
	t.b = append(t.b, '"')
	t.b = append(t.b, key...)
	t.b = append(t.b, '"', ':')
	return t
}

func (t *text) open(c byte) {
	t.sep()
	t.b = append(t.b, c)
}

func (t *text) close(c byte) { t.b = append(t.b, c) }

func (t *text) null() {
	t.sep()
	t.b = append(t.b, "null"...)
}

func (t *text) boolean(v bool) {
	t.sep()
	t.b = strconv.AppendBool(t.b, v)
}

func (t *text) integer(v int) {
	t.sep()
	t.b = strconv.AppendInt(t.b, int64(v), 10)
}

// number writes v as the shortest text that reads back to the same bits.
func (t *text) number(v float64) {
	t.sep()
	if v-v != 0 { // NaN or infinite
		if t.bad == "" {
			t.bad = fmt.Sprintf("%s is %v", t.key, v)
		}
		t.b = append(t.b, "null"...)
		return
	}
	t.b = appendNumber(t.b, v)
}

func appendNumber(b []byte, v float64) []byte {
	if v == 0 && !math.Signbit(v) {
		return append(b, '0')
	}
	form := byte('f')
	if a := math.Abs(v); a != 0 && (a < 1e-4 || a >= 1e15) {
		form = 'e'
	}
	return strconv.AppendFloat(b, v, form, -1, 64)
}

// known writes v, or null when it is NaN: a number that was not computed.
func (t *text) known(v float64) {
	if math.IsNaN(v) {
		t.null()
		return
	}
	t.number(v)
}

// given writes v, or null when it is zero: a number that was not given.
func (t *text) given(v float64) {
	if v == 0 {
		t.null()
		return
	}
	t.number(v)
}

func (t *text) vec(v r3.Vec) {
	t.open('[')
	t.number(v.X)
	t.number(v.Y)
	t.number(v.Z)
	t.close(']')
}

func (t *text) ints(v []int32) {
	t.open('[')
	for _, i := range v {
		t.integer(int(i))
	}
	t.close(']')
}

func (t *text) strings(v []string) {
	t.open('[')
	for _, s := range v {
		t.string(s)
	}
	t.close(']')
}

func (t *text) string(s string) {
	t.sep()
	t.b = appendString(t.b, s)
}

const hex = "0123456789abcdef"

// appendString appends s as a JSON string. What is not UTF-8 becomes U+FFFD.
func appendString(b []byte, s string) []byte {
	b = append(b, '"')
	from := 0
	for i := 0; i < len(s); {
		c := s[i]
		if c >= ' ' && c != '"' && c != '\\' && c < utf8.RuneSelf {
			i++
			continue
		}
		if c < utf8.RuneSelf {
			b = append(b, s[from:i]...)
			switch c {
			case '"', '\\':
				b = append(b, '\\', c)
			case '\n':
				b = append(b, '\\', 'n')
			case '\t':
				b = append(b, '\\', 't')
			case '\r':
				b = append(b, '\\', 'r')
			default:
				b = append(b, '\\', 'u', '0', '0', hex[c>>4], hex[c&15])
			}
			i++
			from = i
			continue
		}
		r, n := utf8.DecodeRuneInString(s[i:])
		if r == utf8.RuneError && n == 1 {
			b = append(b, s[from:i]...)
			b = append(b, "\ufffd"...)
			from = i + n
		}
		i += n
	}
	b = append(b, s[from:]...)
	return append(b, '"')
}

// block is the number of list items formatted at a time. It bounds the memory
// of writing and does not influence the bytes written.
const block = 2048

// list writes a JSON array with one item a line. Blocks of items are formatted
// by several goroutines and written in order. item may run at the same time
// for different i.
func list(ctx context.Context, w io.Writer, n int, item func(t *text, i int) error) error {
	if n == 0 {
		_, err := io.WriteString(w, "[]")
		return err
	}
	type job struct {
		b    []byte
		err  error
		done chan struct{}
	}
	blocks := (n + block - 1) / block
	workers := min(runtime.GOMAXPROCS(0), blocks)
	format := func(k int, buf []byte) ([]byte, error) {
		t := text{b: buf[:0]}
		for i := k * block; i < min(n, (k+1)*block); i++ {
			if i > 0 {
				t.b = append(t.b, ',')
			} else {
				t.b = append(t.b, '[')
			}
			t.b = append(t.b, '\n')
			if err := item(&t, i); err != nil {
				return t.b, err
			}
		}
		return t.b, nil
	}
	if workers == 1 {
		var buf []byte
		for k := range blocks {
			if err := ctx.Err(); err != nil {
				return err
			}
			var err error
			if buf, err = format(k, buf); err != nil {
				return err
			}
			if _, err := w.Write(buf); err != nil {
				return err
			}
		}
	} else if err := func() error {
		ctx, stop := context.WithCancel(ctx)
		// A ring of jobs: a job is reused only after it was written.
		jobs := make([]job, 2*workers)
		for i := range jobs {
			jobs[i].done = make(chan struct{}, 1)
		}
		todo := make(chan int, len(jobs))
		var running sync.WaitGroup
		defer func() {
			stop()
			close(todo)
			running.Wait()
		}()
		for range workers {
			running.Go(func() {
				for k := range todo {
					j := &jobs[k%len(jobs)]
					if j.err = ctx.Err(); j.err == nil {
						j.b, j.err = format(k, j.b)
					}
					j.done <- struct{}{}
				}
			})
		}
		next := 0
		for k := range blocks {
			for ; next < blocks && next < k+len(jobs); next++ {
				todo <- next
			}
			j := &jobs[k%len(jobs)]
			<-j.done
			if j.err != nil {
				return j.err
			}
			if _, err := w.Write(j.b); err != nil {
				return err
			}
		}
		return nil
	}(); err != nil {
		return err
	}
	_, err := io.WriteString(w, "\n]")
	return err
}
