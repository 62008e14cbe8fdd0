// Package crew shares the parts of a pass over arrays among goroutines.
//
// Which goroutine works on which part is left to chance; results must not depend
// on it. So parts are cut by the data alone, every number is written by one part,
// and sums are formed part by part and added in the order of the parts.
package crew

import (
	"runtime"
	"sync/atomic"
)

// spins is how often a goroutine without work looks for some before it sleeps,
// some ten microseconds: waking it takes longer than many a pass.
const spins = 10_000

// Crew works on the parts of one job at a time. The zero value and nil work alone.
// It must be dismissed when it is not needed any more, and is itself not safe for
// concurrent use.
//
// Nobody waits for a helper that has not taken a part: on a busy machine it may come
// late, and then finds another job, or none.
//
// Everybody begins with a share of the parts that is the same for jobs of as many
// parts, so that the arrays worked on stay in the caches near by, and then helps
// out with what others have left.
type Crew struct {
	shares []share      // the caller's first
	done   atomic.Int32 // parts that are finished
	parts  int          // of the job: neither this nor the next changes before all are finished
	job    func(part int)

	helpers []helper
	over    atomic.Bool
	waiting atomic.Bool // the one who called Run sleeps until all parts are finished
	ready   chan struct{}
}

// share is a run of parts that one of the crew begins with.
type share struct {
	left atomic.Int32 // that nobody has taken yet
	_    [60]byte     // a cache line of its own
}

type helper struct {
	asleep atomic.Bool
	wake   chan struct{}
}

// New hires so many goroutines, the caller counted, or fewer where the program may
// not use as many processors.
func New(hands int) *Crew {
	hands = min(hands, runtime.GOMAXPROCS(0))
	if hands <= 1 {
		return &Crew{}
	}
	c := &Crew{shares: make([]share, hands), helpers: make([]helper, hands-1), ready: make(chan struct{}, 1)}
	for i := range c.helpers {
		h := &c.helpers[i]
		h.wake = make(chan struct{}, 1)
		go c.help(h, i+1)
	}
	return c
}

// Dismiss lets the goroutines go.
func (c *Crew) Dismiss() {
	if c == nil {
		return
	}
	c.over.Store(true)
	c.rouse()
	c.helpers = nil
}

// Run calls job for each of the parts 0 to parts−1.
func (c *Crew) Run(parts int, job func(part int)) {
	if c == nil || len(c.helpers) == 0 || parts < 2 {
		for k := range parts {
			job(k)
		}
		return
	}
	c.job, c.parts = job, parts
	c.done.Store(0)
	for k := range c.shares {
		c.shares[k].left.Store(int32(c.from(k+1) - c.from(k)))
	}
	c.rouse()
	for c.take(0) {
	}
	for k := 0; int(c.done.Load()) != parts; k++ {
		if k < spins {
			continue
		}
		c.waiting.Store(true)
		if int(c.done.Load()) != parts || !c.waiting.CompareAndSwap(true, false) {
			<-c.ready // perhaps for a job long over: look again
		}
	}
}

// rouse wakes the helpers that sleep.
func (c *Crew) rouse() {
	for i := range c.helpers {
		h := &c.helpers[i]
		if h.asleep.Load() && h.asleep.CompareAndSwap(true, false) {
			h.wake <- struct{}{}
		}
	}
}

// from is the first part of share k.
func (c *Crew) from(k int) int { return k * c.parts / len(c.shares) }

// take works on one part of the job at hand, of share first if there is one; false
// when none is left.
func (c *Crew) take(first int) bool {
	for i := range c.shares {
		k := first + i
		if k >= len(c.shares) {
			k -= len(c.shares)
		}
		left := &c.shares[k].left
		for n := left.Load(); n > 0; n = left.Load() {
			if !left.CompareAndSwap(n, n-1) {
				continue
			}
			// From here to the end of the part the job cannot change.
			parts := c.parts
			// Down from the end, unlike someone alone: what depends on the order
			// then shows on a single processor too.
			c.job(c.from(k) + int(n) - 1)
			if int(c.done.Add(1)) == parts && c.waiting.Load() && c.waiting.CompareAndSwap(true, false) {
				c.ready <- struct{}{}
			}
			return true
		}
	}
	return false
}

// idle reports whether no part is left to take.
func (c *Crew) idle() bool {
	for k := range c.shares {
		if c.shares[k].left.Load() > 0 {
			return false
		}
	}
	return true
}

func (c *Crew) help(h *helper, first int) {
	for {
		for k := 0; k < spins; k++ {
			if c.take(first) {
				k = 0
			}
		}
		h.asleep.Store(true)
		if c.over.Load() {
			return
		}
		if !c.idle() && h.asleep.CompareAndSwap(true, false) {
			continue
		}
		<-h.wake
	}
}
