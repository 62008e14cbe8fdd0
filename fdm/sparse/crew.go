package sparse

import (
	"context"
	"errors"
	"sync"
)

// errDelay says that a static LDL run met a front without enough pivots.
var errDelay = errors.New("sparse: pivots must be delayed")

// worker is what one goroutine needs to run fronts.
type worker struct {
	crew    *crew
	stack   []float64
	scratch []float64
	shares  bool // several workers: see plan
	alone   bool // runs a subtree beside others, so that fronts are not to be split
	block   blockJob

	badPlace int32
	badPivot float64
}

// job is the description of the work inside the front at hand.
func (w *worker) job() *blockJob {
	if w.alone {
		return &w.block
	}
	return &w.crew.block
}

// each runs the pieces of a job, with the rest of the crew if it is worth it.
func (w *worker) each(kind jobKind, pieces int, flops float64) {
	if !w.alone && pieces > 1 && flops > shareFlops {
		w.crew.split(kind, pieces)
		return
	}
	b := w.job()
	for i := range pieces {
		b.piece(kind, i)
	}
}

func (b *blockJob) piece(kind jobKind, i int) {
	if kind == jobRows {
		b.rowsPiece(i)
	} else {
		b.productPiece(i)
	}
}

// crew runs a factorisation with one or more workers.
type crew struct {
	f       *Factor
	workers []worker

	// The job at hand: parts 0 to parts-1, taken in turn under the lock. What
	// describes it does not change before all parts are finished. Nobody waits
	// for a helper that has not taken a part: on a busy machine it may come late,
	// and then finds another job, or that its run is over.
	mu                    sync.Mutex
	finishedAll           sync.Cond
	run                   int // number of the factorisation
	next, parts, finished int
	kind                  jobKind
	ctx                   context.Context
	vals                  []float64
	block                 blockJob
	wake                  chan struct{}

	badFront int32
	badPlace int32
	badPivot float64
	err      error
}

type jobKind int

const (
	jobSubtrees jobKind = iota
	jobRows
	jobProduct
)

func (c *crew) init(f *Factor, n int) {
	p := &f.a.plan
	c.f = f
	c.workers = make([]worker, n)
	for i := range c.workers {
		w := &c.workers[i]
		w.crew = c
		w.shares = n > 1
		size := p.stack
		if w.shares {
			size = p.taskStack
		}
		if i == 0 {
			// Updates and right-hand sides are never needed at the same time.
			size = max(size, int64(solveWidth*f.a.n))
		}
		w.stack = large[float64](int(size) + slack)
		w.scratch = make([]float64, p.scratch+slack)
	}
	f.x = c.workers[0].stack
	if n > 1 {
		f.store = large[float64](int(p.topStore) + slack)
		c.finishedAll.L = &c.mu
	}
}

// factor runs all fronts.
func (c *crew) factor(ctx context.Context, values []float64) error {
	a := c.f.a
	c.badFront, c.err = int32(a.fronts()), nil
	lead := &c.workers[0]
	if len(c.workers) == 1 {
		lead.alone = true
		c.eliminate(ctx, values, lead, 0, int32(a.fronts())-1)
		return c.result()
	}
	c.ctx, c.vals = ctx, values
	c.wake = make(chan struct{}, len(c.workers))
	c.mu.Lock()
	c.run++
	run := c.run
	c.mu.Unlock()
	for i := range c.workers {
		c.workers[i].alone = true
		if i > 0 {
			go c.help(&c.workers[i], c.wake, run)
		}
	}
	c.split(jobSubtrees, len(a.plan.taskRoot))
	lead.alone = false
	for _, s := range a.plan.top {
		if s > c.badFront || c.err != nil || !c.eliminate(ctx, values, lead, s, s) {
			break
		}
	}
	c.mu.Lock()
	c.run++
	c.mu.Unlock()
	close(c.wake)
	c.ctx, c.vals = nil, nil
	return c.result()
}

// eliminate runs the fronts from to to.
func (c *crew) eliminate(ctx context.Context, values []float64, w *worker, from, to int32) bool {
	for s := from; s <= to; s++ {
		if err := ctx.Err(); err != nil {
			c.mu.Lock()
			c.err = err
			c.mu.Unlock()
			return false
		}
		if !c.f.front(s, values, w) {
			c.mu.Lock()
			if s < c.badFront {
				c.badFront, c.badPlace, c.badPivot = s, w.badPlace, w.badPivot
			}
			c.mu.Unlock()
			return false
		}
	}
	return true
}

func (c *crew) result() error {
	a := c.f.a
	switch {
	case c.err != nil:
		return c.err
	case int(c.badFront) < a.fronts() && c.f.kind == LDL:
		return errDelay
	case int(c.badFront) < a.fronts():
		return &PivotError{Unknown: int(a.order[c.badPlace]), Pivot: c.badPivot}
	}
	return nil
}

// help takes part in the jobs of one run.
func (c *crew) help(w *worker, wake <-chan struct{}, run int) {
	for range wake {
		c.take(w, run)
	}
}

// split does a job of so many parts with all workers. Which worker does which
// part has no influence on the result.
func (c *crew) split(kind jobKind, parts int) {
	c.mu.Lock()
	c.kind, c.next, c.parts, c.finished = kind, 0, parts, 0
	run := c.run
	c.mu.Unlock()
	for range min(len(c.workers), parts) - 1 {
		select {
		case c.wake <- struct{}{}:
		default: // as many are on their way already
		}
	}
	c.take(&c.workers[0], run)
	c.mu.Lock()
	for c.finished < c.parts {
		c.finishedAll.Wait()
	}
	c.mu.Unlock()
}

// take works on parts of the job until none is left.
func (c *crew) take(w *worker, run int) {
	for {
		c.mu.Lock()
		if c.run != run || c.next >= c.parts {
			c.mu.Unlock()
			return
		}
		i := c.next
		c.next++
		kind := c.kind
		c.mu.Unlock()
		if kind == jobSubtrees {
			p := &c.f.a.plan
			c.eliminate(c.ctx, c.vals, w, p.taskFirst[i], p.taskRoot[i])
		} else {
			c.block.piece(kind, i)
		}
		c.mu.Lock()
		c.finished++
		if c.finished == c.parts {
			c.finishedAll.Signal()
		}
		c.mu.Unlock()
	}
}
