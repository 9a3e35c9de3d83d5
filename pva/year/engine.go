// Package year takes a block of replicates through one year after another: it
// is the simulator. A case becomes a list of passes, each a plain loop over the
// 64 lanes of a block; a feature that the case does not use is no pass in its
// list. It draws every random number of a replicate from streams named by
// (seed, replicate, purpose) and takes every formula from package rates.
//
// It counts nothing: the rows of each census go to the sink of package
// ensemble, which runs it.
package year

import (
	"errors"

	"ebbline/pva/ensemble"
	"ebbline/pva/rates"
)

const lanesMax = ensemble.Lanes

// Engine simulates a case (variant 0) and its alternatives side by side. The
// variants share each replicate's weather, catastrophe and survey draws.
type Engine struct {
	seed     uint64
	programs []*program
	horizons []int
	horizon  int // the longest
	needs    needs
	// Replicate i of a block is replicate from + i*step of the seed's streams.
	from, step int64
}

// needs says which shared numbers any variant uses; what none uses is not drawn.
type needs struct {
	weather      bool
	catastrophes int  // one uniform each a year
	kills        bool // one normal each a year too
	surveys      int  // one normal each a year
}

// New compiles the variants. The first is the case that the others are
// compared with.
func New(seed uint64, variants ...*rates.Model) (*Engine, error) {
	if len(variants) == 0 {
		return nil, errors.New("year: no case to simulate")
	}
	e := &Engine{seed: seed, step: 1}
	for _, m := range variants {
		p := compile(m)
		e.programs = append(e.programs, p)
		h := m.Case.Question.Horizon
		e.horizons = append(e.horizons, h)
		e.horizon = max(e.horizon, h)
		e.needs.weather = e.needs.weather || m.Birth.Sigma != 0 || m.Death.Varies()
		e.needs.catastrophes = max(e.needs.catastrophes, len(m.Case.Catastrophe))
		for i := range m.Kills {
			e.needs.kills = e.needs.kills || m.Kills[i].V != 0
		}
		for i := range m.Takes {
			if m.Takes[i].Survey.Sigma != 0 {
				e.needs.surveys = max(e.needs.surveys, len(m.Takes))
			}
		}
	}
	return e, nil
}

// Numbered is the same engine with other replicate numbers: what its blocks call
// replicate i runs on the random numbers of replicate from + i*step. Draws of
// uncertain inputs share out the replicates of a run among themselves so. It
// panics unless from >= 0 and step >= 1; the engine itself stays as it is.
func (e *Engine) Numbered(from, step int64) *Engine {
	if from < 0 || step < 1 {
		panic("year: replicates are numbered upwards from 0")
	}
	n := *e
	n.from, n.step = from, step
	return &n
}

// Horizons are the years of each variant.
func (e *Engine) Horizons() []int { return e.horizons }

// Worker makes a worker with lanes of its own.
func (e *Engine) Worker() ensemble.Worker {
	w := &worker{e: e, shared: newShared(e.needs)}
	for _, p := range e.programs {
		w.blocks = append(w.blocks, newBlock(p))
	}
	return w
}

type worker struct {
	e      *Engine
	shared *shared
	blocks []*block
	end    ensemble.End
}

// Block runs one block of replicates through all years of all variants. The
// variants go through each year together, so that the year's shared numbers are
// drawn once.
func (w *worker) Block(first int64, lanes int, sink ensemble.Sink) error {
	number := w.e.from + first*w.e.step
	w.shared.begin(w.e.seed, number, w.e.step, lanes)
	for _, b := range w.blocks {
		b.begin(w.e.seed, number, w.e.step, lanes)
	}
	for y := 1; y <= w.e.horizon; y++ {
		w.shared.draw()
		for v, b := range w.blocks {
			if y > w.e.horizons[v] {
				continue
			}
			b.beginYear(w.shared)
			for _, pass := range b.program.passes {
				pass(b, y)
			}
			if b.err != nil {
				return b.err
			}
			b.census(y)
			sink.Census(v, y, &b.row, w.blocks[0].row.Fallen, w.blocks[min(1, len(w.blocks)-1)].row.Fallen)
		}
	}
	for v, b := range w.blocks {
		b.finish(&w.end)
		w.end.First = first
		sink.Finish(v, &w.end)
	}
	return nil
}
