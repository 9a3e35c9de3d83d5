package sweep

import (
	"context"
	"fmt"
	"runtime/debug"
	"sync"
	"sync/atomic"

	"ebbline/pva/ensemble"
)

// Run runs the units that are not in the ledger yet, and gives what is known
// afterwards. If the context ends, the units in work are given up and the
// result holds the cells that are complete, with the context's error. If the
// ledger can't be written the run ends with its error; what it holds is good.
func (r *Runner) Run(ctx context.Context) (*Result, error) {
	var todo []int
	total := int64(0)
	for u, done := range r.done {
		if !done && r.mine(u) {
			todo = append(todo, u)
			g, _, n := r.plan.unit(u)
			total += n * int64(len(r.plan.groups[g].cells))
		}
	}
	r.announce()
	var worked atomic.Int64
	err := r.each(ctx, len(todo), func(ctx context.Context, i int) error {
		u := todo[i]
		tallies, err := r.compute(ctx, u, func(n int64) {
			if done := worked.Add(n); r.opt.Progress != nil {
				r.opt.Progress("cells", done, total)
			}
		})
		if err != nil {
			return err
		}
		return r.finish(u, tallies)
	})
	return r.result(), err
}

// announce hands out cells that the ledger held whole.
func (r *Runner) announce() {
	for g := range r.state {
		if r.state[g].ranges == r.plan.ranges {
			r.handOut(g)
		}
	}
}

func (r *Runner) handOut(g int) {
	if r.opt.Finished == nil {
		return
	}
	var out []*Outcome
	for place := range r.plan.groups[g].cells {
		out = append(out, r.outcome(g, place))
	}
	r.opt.Finished(out)
}

// each runs n pieces of work over the workers, in order of their numbers. The
// first error, or the end of the context, stops the others.
func (r *Runner) each(ctx context.Context, n int, work func(ctx context.Context, i int) error) error {
	inner, stop := context.WithCancel(ctx)
	defer stop()
	var next atomic.Int64
	var wg sync.WaitGroup
	var once sync.Once
	var failed error
	for range max(1, min(r.opt.Workers, n)) {
		wg.Add(1)
		go func() {
			defer wg.Done()
			fail := func(err error) { once.Do(func() { failed = err; stop() }) }
			defer func() {
				if p := recover(); p != nil {
					fail(fmt.Errorf("sweep: a bug in the simulation: %v\n%s", p, debug.Stack()))
				}
			}()
			for inner.Err() == nil {
				i := int(next.Add(1) - 1)
				if i >= n {
					return
				}
				if err := work(inner, i); err != nil {
					if inner.Err() == nil {
						fail(err)
					}
					return
				}
			}
		}()
	}
	wg.Wait()
	if failed != nil {
		return failed
	}
	return ctx.Err()
}

// compute simulates one unit.
func (r *Runner) compute(ctx context.Context, u int, progress func(cellReplicates int64)) ([]Tally, error) {
	g, first, replicates := r.plan.unit(u)
	c, err := r.compiledGroup(g)
	if err != nil {
		return nil, err
	}
	rec := newRecorder(c.engine.Horizons(), c.baseline)
	worker := c.engine.Worker()
	for at := int64(0); at < replicates; at += ensemble.Lanes {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		lanes := min(ensemble.Lanes, replicates-at)
		if err := worker.Block(first+at, int(lanes), rec); err != nil {
			return nil, err
		}
		progress(lanes * int64(len(r.plan.groups[g].cells)))
	}
	return rec.tallies, nil
}

// finish writes a unit into the ledger, and hands out the cells that it completes.
func (r *Runner) finish(u int, tallies []Tally) error {
	if r.ledger != nil {
		var data []byte
		for i := range tallies {
			data = tallies[i].append(data)
		}
		if err := r.ledger.Append(fmt.Sprint(unitMark, u), data); err != nil {
			return err
		}
	}
	r.mu.Lock()
	defer r.mu.Unlock()
	r.add(u, tallies)
	g := u / r.plan.ranges
	if r.state[g].ranges == r.plan.ranges {
		r.plan.forget(g)
		r.handOut(g)
	}
	return nil
}
