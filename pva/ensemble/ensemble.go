// Package ensemble runs many replicates of a case over goroutine workers and
// adds them up. It knows blocks of replicates, rows of censuses and integer
// tallies, and does not know what a state is or how a year goes: an Engine
// does. Because tallies only add whole numbers, the result is the same for any
// number of workers and any order of blocks.
package ensemble

import (
	"context"
	"errors"
	"fmt"
	"runtime/debug"
	"sync"
	"sync/atomic"

	"ebbline/pva"
)

// Lanes is the number of replicates in a block.
const Lanes = 64

// Engine simulates blocks of replicates of one or more variants of a case:
// variant 0 is the case itself; every variant is compared with it and with
// variant 1 (the baseline, where there is one).
type Engine interface {
	// Horizons are the years simulated, one number a variant.
	Horizons() []int
	// Worker makes a worker with state of its own; workers run side by side.
	Worker() Worker
}

// Worker runs one block at a time.
type Worker interface {
	// Block simulates replicates first to first+lanes-1 (lanes <= Lanes) of
	// every variant to its horizon, and hands each census to the sink. It uses
	// random numbers that depend on the replicate's number alone.
	Block(first int64, lanes int, sink Sink) error
}

// Sink takes what a block produces. Rows are copied before it returns.
type Sink interface {
	// Census takes one year's row of one variant, with the masks of lanes
	// fallen by that year in variant 0 (the case) and in variant 1, with which
	// it is compared replicate by replicate.
	Census(variant, year int, row *Row, caseFallen, otherFallen uint64)
	// Finish takes what is known of a variant's lanes at the end of a block.
	Finish(variant int, end *End)
}

// Row is one census of a block. Arrays and the bits of masks are indexed by
// lane; lanes at or beyond Lanes, and outgrown lanes, hold nothing of meaning.
type Row struct {
	Lanes                              int
	N, Take, Shortfall, Extra, Stocked [Lanes]int64
	Fallen, Outgrown                   uint64 // by this year
	Closed                             uint64 // in this year
	Takes, Stocks                      bool   // whether the case ever takes or stocks
}

// End sums up a block's replicates of one variant.
type End struct {
	First     int64 // number of the block's first replicate
	Lanes     int
	Smallest  [Lanes]int64 // smallest census; -1 if there was none
	Fallen    uint64
	LogGrowth int64 // sum over lanes in steps of 2^-32
	LogPairs  int64
	Capped    int64
}

// Plan says what to run.
type Plan struct {
	First      int64 // number of the first replicate, a multiple of Lanes
	Replicates int64
	Workers    int              // at least 1
	Progress   func(done int64) // called after each block, from any worker; may be nil
}

// Run simulates the plan and returns one tally a variant. If the context ends,
// the blocks in work are finished, and the tallies hold exactly the first
// replicates up to the last finished block, with the context's error. If a
// replicate fails, nothing is returned but the error.
func Run(ctx context.Context, e Engine, p Plan) ([]*pva.Tally, error) {
	acc := newAccumulator(e.Horizons())
	done, err := Into(ctx, e, p, acc)
	if errors.As(err, new(failed)) || done == 0 && ctx.Err() == nil {
		return nil, err
	}
	for v := range acc.tallies {
		acc.tallies[v].Replicates = done
	}
	return acc.tallies, err
}

// Into is Run into a sink of the caller's, which is called from several
// goroutines at once. It returns how many replicates are complete: the first
// ones of the plan, without a gap.
func Into(ctx context.Context, e Engine, p Plan, sink Sink) (int64, error) {
	if p.First%Lanes != 0 || p.Replicates < 1 {
		return 0, fmt.Errorf("ensemble: cannot run %d replicates from number %d", p.Replicates, p.First)
	}
	blocks := (p.Replicates + Lanes - 1) / Lanes
	var next, done atomic.Int64
	var wg sync.WaitGroup
	errs := make(chan error, max(1, p.Workers))
	stop := make(chan struct{})
	var once sync.Once
	for w := 0; w < max(1, p.Workers); w++ {
		wg.Add(1)
		go func() {
			defer wg.Done()
			defer func() {
				// A panic is a bug of this program: it ends the run with the
				// place, and never takes the tallies of others with it.
				if r := recover(); r != nil {
					errs <- fmt.Errorf("ensemble: a bug in the simulation: %v\n%s", r, debug.Stack())
					once.Do(func() { close(stop) })
				}
			}()
			worker := e.Worker()
			for {
				select {
				case <-ctx.Done():
					return
				case <-stop:
					return
				default:
				}
				b := next.Add(1) - 1
				if b >= blocks {
					return
				}
				first := b * Lanes
				lanes := int(min(Lanes, p.Replicates-first))
				if err := worker.Block(p.First+first, lanes, sink); err != nil {
					errs <- err
					once.Do(func() { close(stop) })
					return
				}
				n := done.Add(int64(lanes))
				if p.Progress != nil {
					p.Progress(n)
				}
			}
		}()
	}
	wg.Wait()
	select {
	case err := <-errs:
		return 0, failed{err}
	default:
	}
	return done.Load(), ctx.Err()
}

// failed is the error of a replicate, told apart from the end of the context.
type failed struct{ error }

func (f failed) Unwrap() error { return f.error }
