package relax

import (
	"runtime"
	"sync"
	"sync/atomic"
)

// block is the number of nodes or elements that are worked on in one piece.
// Sums are formed block by block and then added in the order of the blocks, so
// that they do not depend on who worked on which block.
const block = 512

// crew shares the blocks of a pass among goroutines. The zero value works
// alone.
type crew struct {
	hands int
	wake  []chan func(b int)
	done  sync.WaitGroup
	next  atomic.Int64
	count int64
}

// newCrew hires as many goroutines as pay for n nodes and elements.
func newCrew(n int) *crew {
	hands := min(runtime.GOMAXPROCS(0), n/(8*block))
	c := &crew{hands: max(hands, 1)}
	for range c.hands - 1 {
		w := make(chan func(int))
		c.wake = append(c.wake, w)
		go func() {
			for f := range w {
				c.take(f)
				c.done.Done()
			}
		}()
	}
	return c
}

func (c *crew) take(f func(b int)) {
	for {
		b := c.next.Add(1) - 1
		if b >= c.count {
			return
		}
		f(int(b))
	}
}

// run calls f once for each of the blocks that cover n items.
func (c *crew) run(n int, f func(b int)) {
	blocks := (n + block - 1) / block
	if c.hands <= 1 || blocks < 8 {
		for b := range blocks {
			f(b)
		}
		return
	}
	c.next.Store(0)
	c.count = int64(blocks)
	c.done.Add(len(c.wake))
	for _, w := range c.wake {
		w <- f
	}
	c.take(f)
	c.done.Wait()
}

func (c *crew) dismiss() {
	for _, w := range c.wake {
		close(w)
	}
}

// span returns the items of block b of n.
func span(b, n int) (lo, hi int) { return b * block, min((b+1)*block, n) }
