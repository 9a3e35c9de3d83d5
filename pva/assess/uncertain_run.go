package assess

import (
	"errors"
	"math/bits"
	"sync"

	"ebbline/pva"
	"ebbline/pva/draws"
	"ebbline/pva/ensemble"
	"ebbline/pva/estimate"
	"ebbline/pva/rates"
	"ebbline/pva/year"
)

// drawnRun is the engine of a case with uncertain inputs. What package ensemble
// takes for block number d is the whole of draw d: its own cases are made, its
// own simulator compiled, and its replicates d, d + draws, d + 2 draws, ... run in
// blocks of 64. A draw is thus complete or not begun when a run is interrupted.
type drawnRun struct {
	design *draws.Design
	set    []variant // at the stated values
	seed   uint64
	each   int64 // replicates a draw

	bare  []*pva.Case // the variants' cases, less what a draw does not need
	takes [][]bool    // by variant and input: whether the draw's value goes into it

	// By variant and draw; a draw is written by the one worker that runs it.
	fallen   [][]int64
	unsolved []bool
	substeps []*pva.SubstepBound // of the case itself

	mu    sync.Mutex
	years [][]yearSums // by variant and year
}

// yearSums are the counts by draw of one census, added up.
type yearSums struct{ fallen, extinct, closed estimate.DrawSums }

func newDrawnRun(c *pva.Case, design *draws.Design, set []variant) *drawnRun {
	n := int64(design.Draws())
	r := &drawnRun{design: design, set: set, seed: c.Run.Seed, each: (c.Run.Replicates + n - 1) / n,
		unsolved: make([]bool, n), substeps: make([]*pva.SubstepBound, n)}
	for v := range set {
		bare, err := without(withoutBaseline(set, v), "option", "sweep")
		if err != nil {
			panic("assess: a case that is no case without its options: " + err.Error())
		}
		r.bare = append(r.bare, bare)
		r.takes = append(r.takes, takesDrawn(bare, set[v].set, design.Inputs))
		r.fallen = append(r.fallen, make([]int64, n))
		r.years = append(r.years, make([]yearSums, set[v].c.Question.Horizon))
	}
	return r
}

// withoutBaseline is a variant's case as written: a baseline is made from the
// case itself, after the draw's values are in it.
func withoutBaseline(set []variant, v int) *pva.Case {
	if set[v].role == theBaseline {
		return set[0].c
	}
	return set[v].c
}

// takesDrawn says which inputs a variant takes from a draw. One that the variant
// itself sets (an option's own rate, no catastrophes) stays as set, and one that
// it has no use for stays out.
func takesDrawn(c *pva.Case, changes []pva.Setting, inputs []draws.Input) []bool {
	out := make([]bool, len(inputs))
	for j, in := range inputs {
		out[j] = true
		for _, s := range changes {
			if at, fault := c.Lookup(s.Path); fault == nil && at == in.Path {
				out[j] = false
			}
		}
		key, positions := pva.Find(in.Path)
		if p, ok := key.At(c, positions...).(*pva.Optional); ok && !p.Set {
			out[j] = false
		}
	}
	return out
}

// models are the variants of one draw. A draw whose values cannot stand together
// is drawn anew until they can.
func (r *drawnRun) models(draw int) ([]*rates.Model, error) {
	for {
		models, faults := r.tryModels(draw)
		if len(faults) == 0 {
			return models, nil
		}
		if err := r.design.Redraw(draw); err != nil {
			return nil, errors.Join(err, faults)
		}
	}
}

func (r *drawnRun) tryModels(draw int) ([]*rates.Model, pva.Faults) {
	drawn := r.design.Settings(draw)
	models := make([]*rates.Model, len(r.set))
	r.unsolved[draw] = false
	for v := range r.set {
		settings := make([]pva.Setting, 0, len(drawn))
		for j, s := range drawn {
			if r.takes[v][j] {
				settings = append(settings, s)
			}
		}
		c, faults := r.bare[v].With(settings)
		if len(faults) > 0 {
			return nil, faults
		}
		if r.set[v].role == theBaseline {
			c = c.Baseline()
		}
		m, bad := rates.NewKeeping(c, r.set[v].model)
		if len(bad) > 0 {
			return nil, bad
		}
		models[v] = m
		r.unsolved[draw] = r.unsolved[draw] || m.Unsolved
	}
	return models, nil
}

// Horizons are the years of each variant.
func (r *drawnRun) Horizons() []int {
	out := make([]int, len(r.set))
	for v := range r.set {
		out[v] = r.set[v].c.Question.Horizon
	}
	return out
}

// Worker makes a worker that runs one draw at a time.
func (r *drawnRun) Worker() ensemble.Worker { return &drawWorker{run: r} }

type drawWorker struct {
	run  *drawnRun
	sink ensemble.Sink
	seen [][]yearCounts // of the draw in work, by variant and year
}

type yearCounts struct{ fallen, extinct, closed int64 }

// Block runs the draw of this number.
func (w *drawWorker) Block(first int64, _ int, sink ensemble.Sink) error {
	r := w.run
	draw := int(first / ensemble.Lanes)
	models, err := r.models(draw)
	if err != nil {
		return err
	}
	engine, err := year.New(r.seed, models...)
	if err != nil {
		return err
	}
	r.substeps[draw] = rates.BoundSubsteps(models[0])
	w.sink, w.seen = sink, make([][]yearCounts, len(r.set))
	for v := range w.seen {
		w.seen[v] = make([]yearCounts, r.set[v].c.Question.Horizon)
	}
	inner := engine.Numbered(int64(draw), int64(r.design.Draws())).Worker()
	for from := int64(0); from < r.each; from += ensemble.Lanes {
		if err := inner.Block(from, int(min(ensemble.Lanes, r.each-from)), w); err != nil {
			return err
		}
	}
	r.mu.Lock()
	defer r.mu.Unlock()
	for v := range w.seen {
		for y, n := range w.seen[v] {
			sums := &r.years[v][y]
			sums.fallen.Add(n.fallen)
			sums.extinct.Add(n.extinct)
			sums.closed.Add(n.closed)
		}
		r.fallen[v][draw] = w.seen[v][len(w.seen[v])-1].fallen
	}
	return nil
}

// Census counts a row for the draw and hands it on.
func (w *drawWorker) Census(variant, y int, row *ensemble.Row, caseFallen, otherFallen uint64) {
	n := &w.seen[variant][y-1]
	n.fallen += int64(bits.OnesCount64(row.Fallen))
	n.closed += int64(bits.OnesCount64(row.Closed &^ row.Outgrown))
	for i := 0; i < row.Lanes; i++ {
		if row.N[i] == 0 && row.Outgrown>>uint(i)&1 == 0 {
			n.extinct++
		}
	}
	w.sink.Census(variant, y, row, caseFallen, otherFallen)
}

// Finish hands the end of a block on. Batches are then by a replicate's number
// within its draw, so that each batch has all draws alike.
func (w *drawWorker) Finish(variant int, end *ensemble.End) { w.sink.Finish(variant, end) }
