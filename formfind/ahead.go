package formfind

import (
	"context"
	"runtime"
	"sync"

	"anticlast/formfind/canopy"
	"anticlast/formfind/mesh"
	"anticlast/formfind/newton"
)

// ahead prepares Newton's method for the finer ones of several levels while the
// coarser ones are being solved: what depends on the topology only is a fifth of the
// work, which one processor does with nothing to share.
type ahead struct {
	stop func()
	wait sync.WaitGroup
	of   []prepared
}

type prepared struct {
	s       *canopy.Structure
	parents [][2]int32
	done    chan struct{}
	v       *newton.Solver // nil when it could not be made, which is for the level to say
}

// worthAhead is the number of triangles of the finest mesh from which another
// goroutine pays.
const worthAhead = 10_000

// lookAhead begins to prepare the levels; nil where that does not pay.
func lookAhead(ctx context.Context, steps []*mesh.Refinement, o Options) *ahead {
	if o.Method != MethodAuto || len(steps[len(steps)-1].Fine.Corners) < worthAhead || runtime.GOMAXPROCS(0) < 2 {
		return nil
	}
	a := &ahead{}
	ctx, a.stop = context.WithCancel(ctx)
	for _, r := range steps {
		// A structure far from the origin is moved before it is solved.
		if local, _ := nearOrigin(r.Fine); local != r.Fine {
			continue
		}
		a.of = append(a.of, prepared{s: r.Fine, parents: r.Parents, done: make(chan struct{})})
	}
	a.wait.Go(func() {
		var below *newton.Solver
		var before newton.Numbering
		for i := range a.of {
			p := &a.of[i]
			if ctx.Err() == nil {
				if v, err := newton.New(ctx, p.s); err == nil {
					if below != nil {
						v.Expect(below, before, p.parents)
					}
					p.v, below, before = v, v, v.Numbering()
				}
			}
			close(p.done)
		}
	})
	return a
}

// solver returns the solver prepared for s, once, or a new one.
func (a *ahead) solver(ctx context.Context, s *canopy.Structure) (*newton.Solver, error) {
	if a != nil {
		for i := range a.of {
			if p := &a.of[i]; p.s == s {
				<-p.done
				if v := p.v; v != nil {
					p.v = nil
					return v, nil
				}
			}
		}
	}
	return newton.New(ctx, s)
}

// end lets go of what was prepared. The structures are left alone from then on.
func (a *ahead) end() {
	if a != nil {
		a.stop()
		a.wait.Wait()
		a.of = nil
	}
}
