package crew_test

import (
	"fmt"
	"runtime"
	"sync/atomic"
	"testing"
	"time"

	"github.com/stretchr/testify/require"

	"anticlast/formfind/internal/crew"
)

// A crew takes no more goroutines than processors, none that stay behind, and no
// memory a job.
func TestCrewsLeaveNothingBehind(t *testing.T) {
	defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(3))
	before := runtime.NumGoroutine()
	c := crew.New(100)
	require.LessOrEqual(t, runtime.NumGoroutine(), before+2)
	var sum atomic.Int64
	job := func(k int) { sum.Add(int64(k)) }
	require.Zero(t, testing.AllocsPerRun(100, func() { c.Run(8, job) }))
	require.EqualValues(t, 101*28, sum.Load())
	c.Dismiss()
	for range 5000 { // they may be slow to notice on a busy machine
		if runtime.NumGoroutine() == before {
			break
		}
		time.Sleep(time.Millisecond)
	}
	require.Equal(t, before, runtime.NumGoroutine())
	c.Run(3, job)
	var nobody *crew.Crew
	nobody.Run(3, job)
	nobody.Dismiss()
	require.EqualValues(t, 101*28+6, sum.Load())
}

// Every part of every job is done once and before Run returns, whether helpers are
// awake, asleep or late, for jobs of one part and of many.
func TestEveryPartIsDoneOnce(t *testing.T) {
	for _, processors := range []int{1, 2, 3, 8} {
		t.Run(fmt.Sprint(processors), func(t *testing.T) {
			defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(processors))
			c := crew.New(processors)
			defer c.Dismiss()
			done := make([]int, 64)
			busy := make([]float64, 64)
			for round := range 2000 {
				parts := []int{1, 2, 7, 64, 0}[round%5]
				clear(done)
				c.Run(parts, func(k int) {
					done[k]++
					for range 20 * (round % 50) {
						busy[k] = busy[k]*0.5 + 1
					}
				})
				for k := range done {
					want := 0
					if k < parts {
						want = 1
					}
					require.Equal(t, want, done[k], "round %d, part %d", round, k)
				}
			}
		})
	}
}
