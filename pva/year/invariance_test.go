package year

import (
	"context"
	"errors"
	"reflect"
	"sync"
	"testing"

	"ebbline/pva"
	"ebbline/pva/ensemble"
	"ebbline/pva/rates"
)

// busy is a small case that uses every stream of random numbers.
func busy(t testing.TB, more ...any) *pva.Case {
	return caseOf(t, append([]any{"question.threshold", 20, "question.horizon", 15, "start.abundance", 150, "start.cv", .1, "births.breeding", "pulse", "births.rate", .55, "births.year_sd", .1,
		"deaths.fraction", .3, "deaths.year_sd", .06, "weather.memory", .3, "weather.correlation", -.4, "births.crowding.form", "ricker", "births.crowding.capacity", 200,
		"catastrophe.1.chance", .1, "catastrophe.1.kills", .3, "catastrophe.1.kills_sd", .1, "catastrophe.1.births_times", .5,
		"harvest.1.rule", "fraction", "harvest.1.fraction", .08, "harvest.1.when", "end", "harvest.1.survey_cv", .2, "harvest.1.survey_every", 2, "harvest.1.take_cv", .2, "harvest.1.stop_below", 40,
		"harvest.1.extra_deaths", .1, "stocking.1.add", 1.5, "stocking.1.when", "start", "stocking.1.noise", "poisson", "stocking.1.only_below", 100, "run.seed", 77}, more...)...)
}

func busyFlow(t testing.TB) *pva.Case {
	return caseOf(t, "question.threshold", 10, "question.horizon", 8, "start.abundance", 600, "births.breeding", "flow", "births.rate", .9, "births.year_sd", .2, "deaths.rate", .7,
		"deaths.crowding.form", "linear", "deaths.crowding.scale", 3000, "harvest.1.rule", "constant", "harvest.1.take", 30, "harvest.1.when", "through", "harvest.1.extra_deaths", .2,
		"harvest.1.leave", 50, "stocking.1.add", 5, "stocking.1.when", "through", "run.seed", 78)
}

func engineOf(t testing.TB, cases ...*pva.Case) *Engine {
	t.Helper()
	var models []*rates.Model
	for _, c := range cases {
		m, faults := rates.New(c)
		if len(faults) > 0 {
			t.Fatal(pva.Faults(faults))
		}
		models = append(models, m)
	}
	e, err := New(cases[0].Run.Seed, models...)
	if err != nil {
		t.Fatal(err)
	}
	return e
}

// TestWorkersDoNotMatter: the tallies are the same for any number of workers.
func TestWorkersDoNotMatter(t *testing.T) {
	for _, c := range []*pva.Case{busy(t), busyFlow(t)} {
		var first []*pva.Tally
		for _, workers := range []int{1, 2, 7, 64} {
			out, err := ensemble.Run(context.Background(), engineOf(t, c, c.Baseline()), ensemble.Plan{Replicates: 1000, Workers: workers})
			if err != nil {
				t.Fatal(err)
			}
			if first == nil {
				first = out
			} else if !reflect.DeepEqual(first, out) {
				t.Errorf("%d workers give another tally than one", workers)
			}
		}
	}
}

// recorder keeps every census by replicate, for one variant.
type recorder struct {
	mu   sync.Mutex
	rows map[int64][]int64 // replicate -> N by year
	at   int64
}

func (r *recorder) Census(variant, year int, row *ensemble.Row, _, _ uint64) {
	if variant != 0 {
		return
	}
	for i := 0; i < row.Lanes; i++ {
		n := r.at + int64(i)
		r.rows[n] = append(r.rows[n], row.N[i], row.Take[i], row.Stocked[i])
	}
}

func (r *recorder) Finish(int, *ensemble.End) {}

// TestReplicateAlone: a replicate is the same in a block of many, in another
// place of a block, alone, and beside other variants.
func TestReplicateAlone(t *testing.T) {
	for _, c := range []*pva.Case{busy(t), busyFlow(t)} {
		e := engineOf(t, c)
		block := func(e *Engine, first int64, lanes int) map[int64][]int64 {
			r := &recorder{rows: map[int64][]int64{}, at: first}
			if err := e.Worker().Block(first, lanes, r); err != nil {
				t.Fatal(err)
			}
			return r.rows
		}
		all := block(e, 64, 64)
		few := block(e, 100, 3)
		beside := block(engineOf(t, c, c.Baseline(), c), 64, 64)
		for n := int64(100); n < 103; n++ {
			if !reflect.DeepEqual(all[n], few[n]) {
				t.Errorf("replicate %d differs in another block", n)
			}
		}
		if !reflect.DeepEqual(all, beside) {
			t.Error("replicates differ beside other variants")
		}
		if reflect.DeepEqual(all[64], all[65]) {
			t.Error("two replicates are the same")
		}
	}
}

// TestSharedYears: cases that differ in a take share their weather and
// catastrophes: with no animals' chance left (huge numbers) the untaken paths
// coincide to rounding, so the paths' ratio is steady.
func TestSharedYears(t *testing.T) {
	c := caseOf(t, "question.threshold", 0, "question.horizon", 20, "start.abundance", 1e9, "births.breeding", "pulse", "births.rate", .4, "births.year_sd", .2, "deaths.fraction", .3,
		"deaths.year_sd", .06, "catastrophe.1.chance", .2, "catastrophe.1.kills", .3, "harvest.1.rule", "fraction", "harvest.1.fraction", .5, "harvest.1.when", "end",
		"harvest.1.years", "1", "run.stop_above", 1e12)
	e := engineOf(t, c, c.Baseline())
	var a, b recorder
	a.rows, b.rows = map[int64][]int64{}, map[int64][]int64{}
	w := e.Worker()
	both := &pairRecorder{}
	if err := w.Block(0, 64, both); err != nil {
		t.Fatal(err)
	}
	for y := range both.n[0] {
		for i := 0; i < 64; i++ {
			ratio := float64(both.n[0][y][i]) / float64(both.n[1][y][i])
			if ratio < .499 || ratio > .501 {
				t.Fatalf("year %d lane %d: half taken in year 1, but the ratio is %v", y+1, i, ratio)
			}
		}
	}
}

type pairRecorder struct{ n [2][][64]int64 }

func (r *pairRecorder) Census(variant, year int, row *ensemble.Row, _, _ uint64) {
	r.n[variant] = append(r.n[variant], row.N)
}
func (r *pairRecorder) Finish(int, *ensemble.End) {}

// TestCancelKeepsWhole: a cancelled run holds exactly its first replicates.
func TestCancelKeepsWhole(t *testing.T) {
	c := busy(t)
	ctx, cancel := context.WithCancel(context.Background())
	out, err := ensemble.Run(ctx, engineOf(t, c), ensemble.Plan{Replicates: 1 << 20, Workers: 3, Progress: func(done int64) {
		if done > 2000 {
			cancel()
		}
	}})
	if !errors.Is(err, context.Canceled) || out == nil {
		t.Fatalf("cancelled run gave %v", err)
	}
	n := out[0].Replicates
	if n%64 != 0 || n < 2000 || n > 1<<19 {
		t.Fatalf("%d replicates after a cancel", n)
	}
	again, err := ensemble.Run(context.Background(), engineOf(t, c), ensemble.Plan{Replicates: n, Workers: 1})
	if err != nil || !reflect.DeepEqual(out, again) {
		t.Errorf("the %d replicates kept are not the first %d (%v)", n, n, err)
	}
}

// TestSplitEqualsWhole: replicates run in two parts add up to the whole.
func TestSplitEqualsWhole(t *testing.T) {
	e := engineOf(t, busy(t))
	run := func(first, n int64) *pva.Tally {
		out, err := ensemble.Run(context.Background(), e, ensemble.Plan{First: first, Replicates: n, Workers: 2})
		if err != nil {
			t.Fatal(err)
		}
		return out[0]
	}
	whole, parts := run(0, 1000), run(0, 640)
	parts.Merge(run(640, 360))
	if !reflect.DeepEqual(whole, parts) {
		t.Error("parts do not add up to the whole")
	}
}

// TestNoAllocationPerYear: a block of more years allocates no more.
func TestNoAllocationPerYear(t *testing.T) {
	measure := func(c *pva.Case) float64 {
		w := engineOf(t, c).Worker()
		return testing.AllocsPerRun(20, func() {
			if err := w.Block(0, 64, discard{}); err != nil {
				t.Fatal(err)
			}
		})
	}
	if n := measure(busy(t)); n > 0 {
		t.Errorf("a block of pulse years allocates %v times", n)
	}
	if n := measure(busyFlow(t)); n > 0 {
		t.Errorf("a block of flow years allocates %v times", n)
	}
}

type discard struct{}

func (discard) Census(int, int, *ensemble.Row, uint64, uint64) {}
func (discard) Finish(int, *ensemble.End)                      {}

// TestEventsHaveALimit: births that explode stop a case of events with an
// error that names the replicate and the way out.
func TestEventsHaveALimit(t *testing.T) {
	c := caseOf(t, "question.threshold", 0, "question.horizon", 60, "start.abundance", 50, "births.breeding", "flow", "births.rate", .5, "births.scarcity.form", "proportional",
		"births.scarcity.at", 100, "deaths.rate", 0, "run.substeps", "events", "run.seed", 4)
	_, err := ensemble.Run(context.Background(), engineOf(t, c), ensemble.Plan{Replicates: 64, Workers: 1})
	if err == nil {
		t.Fatal("an explosion of events was not stopped")
	}
	for _, word := range []string{"auto", "replicate", "seed 4"} {
		if !containsWord(err.Error(), word) {
			t.Errorf("the error does not say %q: %v", word, err)
		}
	}
}

func containsWord(s, word string) bool {
	for i := 0; i+len(word) <= len(s); i++ {
		if s[i:i+len(word)] == word {
			return true
		}
	}
	return false
}
