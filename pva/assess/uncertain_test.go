package assess

import (
	"context"
	"fmt"
	"math"
	"math/bits"
	"strings"
	"testing"

	"ebbline/pva"
	"ebbline/pva/casefile"
	"ebbline/pva/casefile/examples"
	"ebbline/pva/draws"
	"ebbline/pva/ensemble"
	"ebbline/pva/estimate"
	"ebbline/pva/rates"
	"ebbline/pva/year"
)

// built makes a case from numbers and words by path.
func built(t *testing.T, keys map[string]any) *pva.Case {
	t.Helper()
	var entries []pva.Entry
	for path, v := range keys {
		e := pva.Entry{Path: path, Origin: pva.FromCase}
		switch v := v.(type) {
		case float64:
			e.Value = pva.Num(v)
		case int:
			e.Value = pva.Num(float64(v))
		case string:
			e.Value = pva.Text(v)
		}
		entries = append(entries, e)
	}
	c, faults := pva.Build(entries)
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	return c
}

// one is the last animal: it dies within the one year with a chance that is
// known only to lie between 0.1 and 0.5, so that the risk is that chance and its
// mean 0.3.
func one(t *testing.T, seed, draws, replicates int) *pva.Case {
	return built(t, map[string]any{"question.threshold": 0, "question.horizon": 1, "question.limit": 0.2, "start.abundance": 1,
		"births.breeding": "pulse", "births.rate": 0, "deaths.fraction": 0.3,
		"uncertain.1.key": "deaths.fraction", "uncertain.1.law": "uniform", "uncertain.1.low": 0.1, "uncertain.1.high": 0.5,
		"run.seed": seed, "run.draws": draws, "run.replicates": replicates})
}

// herd is an invented case with most of the grammar in it and a few years.
func herd(t *testing.T, more map[string]any) *pva.Case {
	keys := map[string]any{"question.threshold": 8, "question.horizon": 12, "question.limit": 0.4, "start.abundance": 30, "start.cv": 0.1,
		"births.breeding": "pulse", "births.rate": 0.3, "births.year_sd": 0.1, "births.crowding.form": "linear", "births.crowding.capacity": 50,
		"deaths.fraction": 0.2, "deaths.year_sd": 0.06,
		"catastrophe.1.name": "flood", "catastrophe.1.chance": 0.05, "catastrophe.1.kills": 0.3,
		"harvest.1.name": "quota", "harvest.1.rule": "constant", "harvest.1.take": 2, "harvest.1.when": "end", "harvest.1.survey_cv": 0.2,
		"option.1.name": "half", "option.1.set.harvest.1.take": 1,
		"uncertain.1.key": "births.rate", "uncertain.1.law": "normal", "uncertain.1.sd": 0.04,
		"uncertain.2.key": "harvest.quota.take", "uncertain.2.law": "uniform", "uncertain.2.sd": 0.5,
		"uncertain_pair.1.keys.1": "births.rate", "uncertain_pair.1.keys.2": "harvest.quota.take", "uncertain_pair.1.rank_correlation": 0.3,
		"run.seed": 7, "run.draws": 9, "run.replicates": 9 * 70}
	for path, v := range more {
		keys[path] = v
		if v == nil {
			delete(keys, path)
		}
	}
	return built(t, keys)
}

func run(t *testing.T, c *pva.Case, opt Options) *pva.Assessment {
	t.Helper()
	a, err := Run(context.Background(), c, opt)
	if err != nil {
		t.Fatal(err)
	}
	return a
}

// TestUncertainClosedForm: with exact risks of the draws every figure is known.
// The risk of each draw is its own death fraction; their mean lies within a slice
// of 0.3; a quarter of the slices is within the limit of 0.2; and the counts
// agree with the exact risks.
func TestUncertainClosedForm(t *testing.T) {
	const draws, each = 100, 40
	a := run(t, one(t, 5, draws, draws*each), Options{Workers: 2})
	u := a.Uncertainty
	if u.Draws != draws || u.Each != each || a.Replicates != draws*each || len(u.Case.Exact) != draws {
		t.Fatalf("%d draws of %d, %d replicates, exact: %q", u.Draws, u.Each, a.Replicates, u.Case.ExactReason)
	}
	for d, p := range u.Case.Exact {
		if math.Abs(p-u.Values[d][0]) > u.Case.ExactError+1e-12 {
			t.Errorf("draw %d with death fraction %v has risk %v", d, u.Values[d][0], p)
		}
	}
	if m := u.Case.Mean; math.Abs(m.Estimate-0.3) > 0.4/draws || math.Abs(u.Case.Law.SD-0.4/math.Sqrt(12)) > 0.4/draws {
		t.Errorf("mean %+v, standard deviation %v", m, u.Case.Law.SD)
	}
	if w := u.Case.Within; math.Abs(w.Estimate-0.25) > 1.0/draws {
		t.Errorf("within the limit %+v", w)
	}
	if a.Verdict != pva.AboveLimit || a.Unreliable || a.ExactTail < 1e-8 {
		t.Errorf("verdict %q, tail %v", a.Verdict, a.ExactTail)
	}
	if l := u.Inputs[0].Link; math.Abs(l.Estimate-1) > 1e-12 {
		t.Errorf("the risk goes with its only input by %+v", l)
	}
	if u.Stated.Reason != "" || math.Abs(u.Stated.Risk-0.3) > 1e-9 {
		t.Errorf("at the stated values %+v", u.Stated)
	}
	// Without exact answers the fitted law says nearly the same. Its mean is that of
	// 4,000 replicates in even slices of risk: variance E p(1-p)/4000 = (0.21 - 0.16/12)/4000.
	b := run(t, one(t, 5, draws, draws*each), Options{Workers: 2, Exact: ExactNever}).Uncertainty
	if se := math.Sqrt((0.21 - 0.16/12) / (draws * each)); math.Abs(b.Case.Law.Mean-0.3) > 5.73*se+0.4/draws {
		t.Errorf("fitted mean %v", b.Case.Law.Mean)
	}
	if b.Case.Law.Exact || b.Case.Law.Alpha <= 0 || math.IsInf(b.Case.Law.Alpha, 1) || b.Stated != nil {
		t.Errorf("fitted law %+v", b.Case.Law)
	}
}

// TestUncertainCoverage: over 250 small assessments the interval between draws
// holds the true mean risk of 0.3 at least as often as 95 % (the slices make it
// hold more often; fewer than the binomial tail of 1e-8 allows is a fault).
func TestUncertainCoverage(t *testing.T) {
	const runs = 250
	held := 0
	for seed := range runs {
		p := run(t, one(t, seed+1, 12, 12*10), Options{Workers: 2, Exact: ExactNever}).Outcome.Risk
		if p.Low <= 0.3 && 0.3 <= p.High {
			held++
		}
	}
	if tail := estimate.BinomialTail(int64(held), runs, 0.95); float64(held) < 0.95*runs && tail < 1e-8 {
		t.Errorf("held in %d of %d", held, runs)
	}
}

// fallenBy collects which replicates of each variant have fallen by the horizon.
type fallenBy struct {
	fallen  []map[int64]bool
	horizon int
	last    []uint64
}

func (f *fallenBy) Census(v, y int, row *ensemble.Row, _, _ uint64) {
	if y == f.horizon {
		f.last[v] = row.Fallen
	}
}

func (f *fallenBy) Finish(v int, end *ensemble.End) {
	for m := f.last[v]; m != 0; m &= m - 1 {
		f.fallen[v][end.First+int64(bits.TrailingZeros64(m))] = true
	}
}

// TestReplicateBelongsToDraw: the counts of draw d are those of the replicates d,
// d + draws, d + 2 draws, ... of a plain run of the draw's own case, its baseline
// and its option, with the numbers of their own.
func TestReplicateBelongsToDraw(t *testing.T) {
	c := herd(t, nil)
	u := run(t, c, Options{Workers: 2, Exact: ExactNever}).Uncertainty
	stated, err := without(c, "uncertain", "uncertain_pair", "option")
	if err != nil {
		t.Fatal(err)
	}
	var fell [3]int64
	for _, d := range []int{0, 4, 8} {
		v := u.Values[d]
		drawn, faults := stated.With([]pva.Setting{{Path: "births.rate", Value: pva.Num(v[0])}, {Path: "harvest.quota.take", Value: pva.Num(v[1])}})
		half, more := stated.With([]pva.Setting{{Path: "births.rate", Value: pva.Num(v[0])}, {Path: "harvest.quota.take", Value: pva.Num(1)}})
		if len(faults)+len(more) > 0 {
			t.Fatal(faults, more)
		}
		var models []*rates.Model
		for _, c := range []*pva.Case{drawn, drawn.Baseline(), half} {
			m, faults := rates.New(c)
			if len(faults) > 0 {
				t.Fatal(faults)
			}
			models = append(models, m)
		}
		e, err := year.New(c.Run.Seed, models...)
		if err != nil {
			t.Fatal(err)
		}
		all := &fallenBy{horizon: 12, last: make([]uint64, 3), fallen: []map[int64]bool{{}, {}, {}}}
		if _, err := ensemble.Into(context.Background(), e, ensemble.Plan{Replicates: c.Run.Replicates, Workers: 1}, all); err != nil {
			t.Fatal(err)
		}
		for i, r := range []*pva.DrawnRisk{&u.Case, u.Baseline, &u.Options[0]} {
			var want int64
			for n := int64(d); n < c.Run.Replicates; n += 9 {
				if all.fallen[i][n] {
					want++
				}
			}
			fell[i] += want
			if r.Fallen[d] != want {
				t.Errorf("draw %d, variant %d: %d fallen, a plain run has %d", d, i, r.Fallen[d], want)
			}
		}
	}
	for i, n := range fell {
		if n == 0 {
			t.Errorf("variant %d: nothing fell, so that nothing was compared", i)
		}
	}
}

// told is all that an assessment says, for comparing two.
func told(a *pva.Assessment) string {
	var b strings.Builder
	fmt.Fprintf(&b, "%+v\n%+v\n%+v\n%+v %+v %v %v", *a.Outcome, *a.Baseline, *a.Added, a.Options[0].Difference, *a.Options[0].Outcome, a.Verdict, a.ToDecide)
	u := a.Uncertainty
	fmt.Fprintf(&b, "%+v\n%+v\n%+v\n%+v\n%v\n%v", u.Case, *u.Baseline, u.Options, u.Inputs, u.Values, a.Drivers)
	return strings.ReplaceAll(b.String(), fmt.Sprintf("%p", u.Case.Within), "")
}

// TestUncertainInvariance: the number of workers changes nothing.
func TestUncertainInvariance(t *testing.T) {
	c := herd(t, nil)
	first := run(t, c, Options{Workers: 1, Exact: ExactNever})
	for _, workers := range []int{2, 5} {
		again := run(t, c, Options{Workers: workers, Exact: ExactNever})
		x, y := *first.Uncertainty.Case.Within, *again.Uncertainty.Case.Within
		if x != y {
			t.Errorf("%d workers: within the limit %v and %v", workers, x, y)
		}
		for _, a := range []*pva.Assessment{first, again} {
			u := a.Uncertainty
			for _, r := range []*pva.DrawnRisk{&u.Case, u.Baseline, &u.Options[0]} {
				r.Within = nil // a pointer, compared above
			}
			for i := range a.Options {
				a.Options[i].Added = nil
			}
		}
		if told(first) != told(again) {
			t.Errorf("%d workers: another answer\n%s\n%s", workers, told(first), told(again))
		}
		first = run(t, c, Options{Workers: 1, Exact: ExactNever})
	}
}

// TestUncertainPooled: pooled counts add up over the draws, and what is said of
// the whole is said with the interval between draws, by year too.
func TestUncertainPooled(t *testing.T) {
	a := run(t, herd(t, map[string]any{"run.draws": 30, "run.replicates": 1000}), Options{Workers: 2, Exact: ExactNever})
	u := a.Uncertainty
	if a.Asked != 1020 || a.Replicates != 1020 || u.Each != 34 {
		t.Errorf("%d of %d replicates, %d a draw", a.Replicates, a.Asked, u.Each)
	}
	said := false
	for _, w := range a.Warnings {
		said = said || w.Key == "run.replicates" && strings.Contains(w.Text, "rounded up to 1020")
	}
	if !said {
		t.Errorf("rounding up is not said: %v", a.Warnings)
	}
	for _, c := range []struct {
		what string
		r    *pva.DrawnRisk
		o    *pva.Outcome
	}{{"case", &u.Case, a.Outcome}, {"baseline", u.Baseline, a.Baseline}, {"option", &u.Options[0], a.Options[0].Outcome}} {
		var sum int64
		shares := make([]float64, len(c.r.Fallen))
		for d, x := range c.r.Fallen {
			sum += x
			shares[d] = float64(x) / 34
		}
		_, low, high := estimate.BetweenDraws(shares, 0.95)
		wilsonLow, wilsonHigh := estimate.Wilson(sum, 1020, 0.95)
		p := c.o.Risk
		if p.Count != sum || p.Of != 1020 || math.Abs(p.Low-math.Min(low, wilsonLow)) > 1e-12 || math.Abs(p.High-math.Max(high, wilsonHigh)) > 1e-12 {
			t.Errorf("%s: %+v, draws add up to %d with %v to %v", c.what, p, sum, low, high)
		}
		if c.r.Pooled != p || c.o.Years[11].Fallen != p {
			t.Errorf("%s: three risks: %+v, %+v, %+v", c.what, p, c.r.Pooled, c.o.Years[11].Fallen)
		}
		var batches int64
		for _, b := range c.o.Batches {
			batches += b.Count
		}
		if batches != sum {
			t.Errorf("%s: batches add up to %d of %d", c.what, batches, sum)
		}
		for _, l := range c.o.Smallest {
			if l.Level == 8 && l.Risk != p {
				t.Errorf("%s: the law of the smallest census has %+v at the threshold", c.what, l.Risk)
			}
		}
	}
	if w := u.Case.Spread; w.Inputs <= 0 {
		t.Errorf("this case was to have inputs that matter: %+v", w)
	}
	if a.Added.Low > a.Added.Estimate || a.Added.High < a.Added.Estimate || a.Drivers[len(a.Drivers)-1].Risk != a.Baseline.Risk {
		t.Errorf("added %+v, drivers %+v", a.Added, a.Drivers)
	}
}

// TestRedrawnCases: a spread that a death fraction cannot have makes no case;
// such draws are drawn anew until they do, counted and warned of.
func TestRedrawnCases(t *testing.T) {
	c := herd(t, map[string]any{"uncertain.1.key": "deaths.fraction", "uncertain.1.law": "uniform", "uncertain.1.sd": nil, "uncertain.1.low": 0.005, "uncertain.1.high": 0.3,
		"uncertain.2.key": "deaths.year_sd", "uncertain.2.law": "uniform", "uncertain.2.sd": nil, "uncertain.2.low": 0.01, "uncertain.2.high": 0.25,
		"uncertain_pair.1.keys.1": "deaths.fraction", "uncertain_pair.1.keys.2": "deaths.year_sd", "uncertain_pair.1.rank_correlation": 0, "run.draws": 60, "run.replicates": 60})
	none := func(v []float64) bool { return v[1]*v[1] >= v[0]*(1-v[0]) }
	before, err := draws.New(c)
	if err != nil {
		t.Fatal(err)
	}
	want := 0
	for d := range before.Draws() {
		if none(before.Values(d)) {
			want++
		}
	}
	a := run(t, c, Options{Workers: 2, Exact: ExactNever})
	u := a.Uncertainty
	for d, v := range u.Values {
		if none(v) {
			t.Errorf("draw %d has mean %v and standard deviation %v", d, v[0], v[1])
		}
		if old := before.Values(d); !none(old) && old[0] != v[0] {
			t.Errorf("draw %d was drawn anew without need", d)
		}
	}
	if u.Redrawn != want || want < 4 {
		t.Errorf("%d draws redrawn, want %d (and more than 5 %%)", u.Redrawn, want)
	}
	texts := ""
	for _, w := range a.Warnings {
		texts += w.Text + "\n"
	}
	if !strings.Contains(texts, fmt.Sprintf("%d of 60 draws had a value", want)) {
		t.Errorf("redrawn %d: %s", want, texts)
	}
	if !strings.Contains(texts, "one replicate a draw") || u.Case.Law.Reason == "" {
		t.Errorf("one replicate a draw is not said: %s", texts)
	}
}

// TestUnsolvedCounted: where births stay below deaths at any N no scale reaches
// the capacity: zero growth needs (1-m)(1+f) = 1, so births of m/(1-m) = 0.25 at
// least.
func TestUnsolvedCounted(t *testing.T) {
	a := run(t, herd(t, map[string]any{"uncertain.1.law": "uniform", "uncertain.1.sd": 0.05, "run.draws": 40, "run.replicates": 40}), Options{Workers: 2, Exact: ExactNever})
	want := 0
	for _, v := range a.Uncertainty.Values {
		if v[0] <= 0.25 {
			want++
		}
	}
	if u := a.Uncertainty; u.Unsolved != want || want < 5 {
		t.Errorf("%d draws without a solution, want %d", u.Unsolved, want)
	}
}

// TestWhatADrawSets: a value that an option or a driver sets itself stays, and one
// that it has no use for is left out.
func TestWhatADrawSets(t *testing.T) {
	c := herd(t, map[string]any{"catastrophe.1.chance": nil, "catastrophe.1.once_in": 20,
		"uncertain.3.key": "births.year_sd", "uncertain.3.law": "normal", "uncertain.3.sd": 0.01,
		"uncertain.4.key": "catastrophe.flood.once_in", "uncertain.4.law": "uniform", "uncertain.4.sd": 2})
	u := run(t, c, Options{Workers: 1, Exact: ExactNever}).Uncertainty
	set, err := statedVariants(c)
	if err != nil {
		t.Fatal(err)
	}
	design, err := draws.New(c)
	if err != nil {
		t.Fatal(err)
	}
	r := newDrawnRun(c, design, set)
	models, err := r.models(2)
	if err != nil {
		t.Fatal(err)
	}
	drawn := u.Values[2]
	for v, m := range models {
		if m.Case.Births.Rate != drawn[0] {
			t.Errorf("variant %d has births %v, drawn %v", v, m.Case.Births.Rate, drawn[0])
		}
		want := map[role]float64{theCase: drawn[1], theBaseline: drawn[1], aDriver: drawn[1], anOption: 1}[set[v].role]
		if take := m.Case.Harvest[0].Take; take.Value != want {
			t.Errorf("variant %d (%s) takes %+v, want %v", v, set[v].name, take, want)
		}
		if sd := m.Case.Births.YearSD; (sd == 0) != (set[v].name == "bad weather") || sd != 0 && sd != drawn[2] {
			t.Errorf("variant %d (%s) has weather %v", v, set[v].name, sd)
		}
	}
	last := models[len(models)-1].Case // without catastrophes
	if k := last.Catastrophe[0]; set[len(set)-1].name != "catastrophes" || k.OnceIn.Set || k.Prob() != 0 || models[0].Case.Catastrophe[0].OnceIn.Value != drawn[3] {
		t.Errorf("without catastrophes: %+v; in the case %+v", k, models[0].Case.Catastrophe[0])
	}
	_, err = Run(context.Background(), herd(t, map[string]any{"option.1.set.harvest.1.take": nil, "option.1.set.uncertain.1.sd": 0.01}), Options{})
	if err == nil || !strings.Contains(err.Error(), "cannot have laws of its own") {
		t.Errorf("an option with a law of its own: %v", err)
	}
}

// TestUncertainInterrupted: what is kept is whole draws, the first ones.
func TestUncertainInterrupted(t *testing.T) {
	c := herd(t, map[string]any{"run.draws": 40, "run.replicates": 400})
	full := run(t, c, Options{Workers: 2, Exact: ExactNever})
	ctx, stop := context.WithCancel(context.Background())
	a, err := Run(ctx, c, Options{Workers: 2, Progress: func(done int64) {
		if done%10 != 0 {
			t.Errorf("%d replicates are no whole draws", done)
		}
		if done >= 100 {
			stop()
		}
	}})
	if err == nil || a == nil {
		t.Fatal("not interrupted", err)
	}
	u := a.Uncertainty
	if u.Draws < 10 || u.Draws >= 40 || u.Asked != 40 || a.Replicates != int64(u.Draws)*10 || a.Asked != 400 {
		t.Errorf("%d of %d draws, %d of %d replicates", u.Draws, u.Asked, a.Replicates, a.Asked)
	}
	for d, x := range u.Case.Fallen {
		if x != full.Uncertainty.Case.Fallen[d] {
			t.Errorf("draw %d: %d fallen, in the whole run %d", d, x, full.Uncertainty.Case.Fallen[d])
		}
	}
	if a.Outcome.Risk.Of != a.Replicates {
		t.Errorf("risk of %d, %d replicates", a.Outcome.Risk.Of, a.Replicates)
	}
}

// TestUncertainExample: the built-in case with uncertain inputs runs.
func TestUncertainExample(t *testing.T) {
	text, err := examples.Get("upland-goat")
	if err != nil {
		t.Fatal(err)
	}
	c, faults := casefile.Read("upland-goat.toml", text)
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	c, bad := c.With([]pva.Setting{{Path: "run.replicates", Value: pva.Num(600)}, {Path: "run.draws", Value: pva.Num(30)}})
	if len(bad) > 0 {
		t.Fatal(bad)
	}
	u := run(t, c, Options{Workers: 2, Exact: ExactNever}).Uncertainty
	if len(u.Inputs) != 3 || u.Inputs[2].Key != "births.crowding.capacity" || u.Inputs[0].Link.Estimate > 0 || u.Inputs[1].Link.Estimate < 0 {
		t.Errorf("more births were to lower the risk and more deaths to raise it: %+v", u.Inputs)
	}
}
