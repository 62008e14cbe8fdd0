package main

import (
	"fmt"
	"io"
	"strings"
	"time"
)

// stopwatch adds up the time of stages, which may come more than once. A nil
// stopwatch measures nothing.
type stopwatch struct {
	names []string
	sum   map[string]time.Duration
	now   string
	since time.Time
}

func newStopwatch() *stopwatch { return &stopwatch{sum: map[string]time.Duration{}} }

// begin ends the stage that runs and begins another; "" begins none.
func (w *stopwatch) begin(stage string) {
	if w == nil {
		return
	}
	t := time.Now()
	if w.now != "" {
		w.sum[w.now] += t.Sub(w.since)
	}
	w.now, w.since = stage, t
	if _, seen := w.sum[stage]; !seen && stage != "" {
		w.names = append(w.names, stage)
		w.sum[stage] = 0
	}
}

func (w *stopwatch) print(out io.Writer) {
	if w == nil {
		return
	}
	w.begin("")
	var parts []string
	for _, n := range w.names {
		parts = append(parts, fmt.Sprintf("%s %.3f s", n, w.sum[n].Seconds()))
	}
	fmt.Fprintf(out, "times: %s\n", strings.Join(parts, ", "))
}
