package sweep

import (
	"context"
	"math"
	"math/rand/v2"
	"reflect"
	"strings"
	"testing"

	"ebbline/pva"
	"ebbline/pva/assess"
	"ebbline/pva/ensemble"
)

func takes(t testing.TB, more ...any) *pva.Case {
	return marsh(t, append([]any{"sweep.1.key", "harvest.control.take", "sweep.1.from", 0, "sweep.1.to", 6, "sweep.1.step", 1}, more...)...)
}

// TestCellsAreAssessments: a cell has the very counts that an assessment of the
// same case has: risk, extinction, takes, the risk without the take and what the
// take adds.
func TestCellsAreAssessments(t *testing.T) {
	for name, c := range map[string]*pva.Case{
		"takes":       takes(t, "harvest.1.stop_below", 30, "harvest.1.extra_deaths", .2),
		"two keys":    takes(t, "sweep.2.key", "start.abundance", "sweep.2.values.1", 30, "sweep.2.values.2", 90),
		"a rate":      marsh(t, "sweep.1.key", "births.rate", "sweep.1.values.1", .4, "sweep.1.values.2", .5),
		"the horizon": marsh(t, "sweep.1.key", "question.horizon", "sweep.1.values.1", 5, "sweep.1.values.2", 31),
		"outgrowing":  takes(t, "run.stop_above", 90),
	} {
		s := grid(t, c)
		r := run(t, s, Options{})
		for i := 0; i < s.Cells(); i += max(1, s.Cells()/4) {
			cell, faults := c.With(s.Settings(i))
			if len(faults) > 0 {
				t.Fatal(faults)
			}
			a, err := assess.Run(context.Background(), cell, assess.Options{Workers: 2, Exact: assess.ExactNever})
			if err != nil {
				t.Fatal(err)
			}
			o := r.Cells[i]
			if o.Risk != a.Outcome.Risk || o.Extinction != a.Outcome.Extinction || o.Outgrown != a.Outcome.Outgrown || *o.Baseline != a.Baseline.Risk || *o.Added != *a.Added || o.Verdict != a.Verdict {
				t.Errorf("%s, %s: %+v\nassessed: %+v", name, s.Label(i), o, a.Outcome.Risk)
			}
			for k, q := range o.ByQuarter {
				if q != a.Outcome.Years[o.QuarterAt[k]-1].Fallen {
					t.Errorf("%s, %s: year %d", name, s.Label(i), o.QuarterAt[k])
				}
			}
			pairs := [][2]float64{{o.SmallestMean, a.Outcome.SmallestMean}}
			// Means over the years of those not outgrown, from the yearly means.
			var kept, take, short, closed float64
			for _, y := range a.Outcome.Years {
				n := float64(a.Outcome.Replicates - y.Outgrown)
				if n > 0 {
					kept, take, short, closed = kept+n, take+n*y.TakeMean, short+n*y.ShortfallMean, closed+n*y.Closed.Estimate
				}
			}
			years := float64(len(a.Outcome.Years))
			pairs = append(pairs, [2]float64{o.TakeMean, take / kept}, [2]float64{o.TakeTotalMean, take / kept * years}, [2]float64{o.ShortfallMean, short / kept},
				[2]float64{o.ClosedYears, closed / kept * years}, [2]float64{o.LastMean, a.Outcome.Years[len(a.Outcome.Years)-1].Mean})
			if o.Outgrown == 0 && math.Abs(o.TakeTotalMean-a.Outcome.TakeTotalMean) > 1e-9 {
				t.Errorf("%s: taken %v, assessed %v", s.Label(i), o.TakeTotalMean, a.Outcome.TakeTotalMean)
			}
			for j, p := range pairs {
				// The two divide whole sums in another order: rounding alone.
				if math.Abs(p[0]-p[1]) > 1e-12*math.Abs(p[1]) {
					t.Errorf("%s, %s: mean %d is %v, assessed %v", name, s.Label(i), j, p[0], p[1])
				}
			}
		}
	}
}

// TestDifferencesAreOfTheCase: the cell that is the case itself differs from it
// in no replicate.
func TestDifferencesAreOfTheCase(t *testing.T) {
	r := run(t, grid(t, takes(t)), Options{})
	if o := r.Cells[3]; o.Difference.OnlyThis != 0 || o.Difference.OnlyOther != 0 || o.Risk != r.Case.Risk {
		t.Errorf("%+v", o.Difference)
	}
	if o := r.Cells[0]; o.Added.OnlyThis != 0 || o.Added.OnlyOther != 0 {
		t.Errorf("no take adds %+v", o.Added)
	}
	if d := r.Cells[6].Difference; d.Estimate <= 0 || d.Of != 1000 {
		t.Errorf("twice the take: %+v", d)
	}
}

func TestGridOrder(t *testing.T) {
	s := grid(t, marsh(t, "sweep.1.key", "births.rate", "sweep.1.from", .1, "sweep.1.to", .3, "sweep.1.step", .1, "sweep.2.key", "start.abundance", "sweep.2.values.1", 20, "sweep.2.values.2", 40))
	var got [][]float64
	for i := range s.Cells() {
		got = append(got, s.Values(i))
	}
	want := [][]float64{{.1, 20}, {.1, 40}, {.2, 20}, {.2, 40}, {.3, 20}, {.3, 40}}
	if !reflect.DeepEqual(got, want) {
		t.Errorf("%v", got)
	}
	// No capacity has a solution where births are below deaths.
	r := run(t, s, Options{})
	if r.Unsolved != 6 {
		t.Errorf("%d cells without a solution counted, want all 6", r.Unsolved)
	}
	if s := grid(t, marsh(t, "sweep.1.key", "births.rate", "sweep.1.from", .5, "sweep.1.to", .6, "sweep.1.step", .1)); run(t, s, Options{}).Unsolved != 0 {
		t.Error("cells with a solution are counted as without")
	}
}

func TestGridsThatAreRefused(t *testing.T) {
	for want, c := range map[string]*pva.Case{
		"no [[sweep]]": marsh(t),
		"says how":     marsh(t, "sweep.1.key", "run.stop_above", "sweep.1.values.1", 1e5),
		"more than":    marsh(t, "sweep.1.key", "births.rate", "sweep.1.from", .1, "sweep.1.to", 1, "sweep.1.step", .001, "sweep.2.key", "start.abundance", "sweep.2.from", 1, "sweep.2.to", 200, "sweep.2.step", 1),
		"year_sd":      marsh(t, "sweep.1.key", "deaths.fraction", "sweep.1.values.1", .27, "sweep.1.values.2", .001),
	} {
		if _, err := NewGrid(c); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%s: %v", want, err)
		}
	}
}

// TestUncertainIsSaid: uncertain inputs change no figure, and are warned of.
func TestUncertainIsSaid(t *testing.T) {
	plain, marked := grid(t, takes(t)), grid(t, takes(t, "uncertain.1.key", "births.rate", "uncertain.1.law", "normal", "uncertain.1.sd", .05))
	if bytesOf(t, run(t, plain, Options{})) != bytesOf(t, run(t, marked, Options{})) {
		t.Error("uncertain inputs change a sweep")
	}
	if w := marked.Warnings(); len(plain.Warnings()) != 0 || len(w) != 1 || !strings.Contains(w[0].Text, "births.rate") {
		t.Errorf("%v", w)
	}
}

// TestTallyBytes: a tally comes back from its record as it was, whatever the
// numbers, and a record that is cut short is an error.
func TestTallyBytes(t *testing.T) {
	g := rand.New(rand.NewPCG(1, 2))
	for range 200 {
		var a, b Tally
		for _, n := range a.numbers() {
			*n = g.Int64() >> g.IntN(64)
		}
		for _, s := range a.sums() {
			s.Hi, s.Lo = g.Int64()>>g.IntN(64), g.Uint64()
		}
		data := a.append(nil)
		rest, err := b.read(append(data, 9))
		if err != nil || len(rest) != 1 || a != b {
			t.Fatalf("%+v came back as %+v (%v)", a, b, err)
		}
		if _, err := new(Tally).read(data[:g.IntN(len(data))]); err == nil {
			t.Fatal("a short record was read")
		}
		c := a
		c.Merge(&b)
		for i, n := range c.numbers() {
			if *n != *a.numbers()[i]*2 {
				t.Fatal("a number is not merged")
			}
		}
	}
	// Every field goes into the record: none was forgotten in numbers or sums.
	if n := reflect.TypeFor[Tally]().NumField() - 1 + checkpoints; n != len(new(Tally).numbers())+len(new(Tally).sums()) {
		t.Errorf("a tally has %d numbers, its record %d", n, len(new(Tally).numbers())+len(new(Tally).sums()))
	}
}

// TestBest: the marked cells are those that no other beats, by trying all pairs.
func TestBest(t *testing.T) {
	r := run(t, grid(t, takes(t, "sweep.2.key", "harvest.control.stop_below", "sweep.2.values.1", 0, "sweep.2.values.2", 40, "sweep.2.values.3", 80)), Options{})
	some := 0
	for i, o := range r.Cells {
		beaten := false
		for j, p := range r.Cells {
			better := p.Risk.Count <= o.Risk.Count && p.TakeMean >= o.TakeMean
			same := p.Risk.Count == o.Risk.Count && p.TakeMean == o.TakeMean
			beaten = beaten || better && (!same || j < i)
		}
		if o.Best == beaten {
			t.Errorf("%s: best %v, beaten %v", r.Study.Label(i), o.Best, beaten)
		}
		if o.Best {
			some++
		}
	}
	if some < 3 || some == len(r.Cells) {
		t.Errorf("%d of %d cells are best: the test shows nothing", some, len(r.Cells))
	}
}

// TestOutgrownLanesCountForNothing: what a row holds for outgrown lanes, and for
// lanes beyond its last, has no meaning and is left out.
func TestOutgrownLanesCountForNothing(t *testing.T) {
	r := newRecorder([]int{1}, []int{-1})
	row := &ensemble.Row{Lanes: 3, Outgrown: 1 << 1, Closed: 1<<0 | 1<<1, Takes: true}
	for i := range row.N {
		row.N[i], row.Take[i], row.Shortfall[i], row.Extra[i] = 1000, 100, 10, 1
	}
	row.N[2] = 0
	r.Census(0, 1, row, 0, 0)
	if got := r.tallies[0]; got.KeptYears != 2 || got.Closed != 1 || got.Outgrown != 1 || got.Extinct != 1 || got.Take.Lo != 200 || got.Shortfall.Lo != 20 || got.Extra.Lo != 2 || got.Last.Lo != 1000 {
		t.Errorf("%+v", got)
	}
}
