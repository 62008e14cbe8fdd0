package main

import (
	"fmt"
	"io"
	"time"

	"anticlast/formfind/engine"
)

// progress draws one line about a running iteration on a terminal, at most ten
// times a second, and nothing anywhere else.
type progress struct {
	w     io.Writer
	last  time.Time
	start time.Time
	drawn bool
}

func newProgress(s Streams, quiet bool) *progress {
	if !s.Terminal || quiet {
		return nil
	}
	now := time.Now()
	// Work that ends at once should not flicker: the first line comes late.
	return &progress{w: s.Err, start: now, last: now.Add(200 * time.Millisecond)}
}

func (p *progress) step(s engine.Step) {
	if p == nil {
		return
	}
	now := time.Now()
	if now.Sub(p.last) < 100*time.Millisecond {
		return
	}
	p.last, p.drawn = now, true
	line := s.Engine
	if s.Stage != "" {
		line += ", " + s.Stage
	}
	if s.Iteration > 0 {
		line += fmt.Sprintf(", iteration %d", s.Iteration)
	}
	if s.Residual > 0 {
		line += fmt.Sprintf(", residual %.1e", s.Residual)
		if s.Target > 0 {
			line += fmt.Sprintf(" (wanted %.0e)", s.Target)
		}
	}
	fmt.Fprintf(p.w, "\r\x1b[K%s  %.0f s", line, now.Sub(p.start).Seconds())
}

// done wipes the line.
func (p *progress) done() {
	if p != nil && p.drawn {
		fmt.Fprint(p.w, "\r\x1b[K")
		p.drawn = false
	}
}
