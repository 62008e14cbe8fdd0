package main

import (
	"bytes"
	"context"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/stretchr/testify/require"
)

// said is a stream that several goroutines may use.
type said struct {
	mu sync.Mutex
	b  bytes.Buffer
}

func (s *said) Write(p []byte) (int, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.b.Write(p)
}

func (s *said) times(what string) int {
	s.mu.Lock()
	defer s.mu.Unlock()
	return strings.Count(s.b.String(), what)
}

func TestWatchFormsAgainWhenADrawingIsSaved(t *testing.T) {
	dir := t.TempDir()
	const plan = "layer,x [m],y [m],z [m]\nRIM,0,0,3\nRIM,6,0,5\nRIM,6,6,3\nRIM,0,6,5\nRIM,0,0,3\n"
	write(t, dir, "plan.csv", plan)
	m := write(t, dir, "sail.yaml", "anticlast: 1\nmesh: 1 m\noutline: {file: plan.csv, layers: {RIM: {cable: {sag: 9 %}}}, fabric: {prestress: 2}}\n")
	ctx, cancel := context.WithCancel(t.Context())
	var errs said
	done := make(chan int)
	go func() {
		done <- Run(ctx, []string{"form", m, "--watch"}, Streams{In: strings.NewReader(""), Out: &said{}, Err: &errs})
	}()
	wait := func(n int) {
		require.Eventually(t, func() bool { return errs.times("formed in") == n }, 30*time.Second, 20*time.Millisecond, "%d times", n)
	}
	wait(1)
	write(t, dir, "plan.csv", strings.Replace(plan, "6,6,3\n", "6,6,3.25\n", 1))
	wait(2)
	cancel()
	require.Equal(t, exitFine, <-done)
	b, err := os.ReadFile(filepath.Join(dir, "sail-form", "nodes.csv"))
	require.NoError(t, err)
	require.Contains(t, string(b), "3.25")
}
