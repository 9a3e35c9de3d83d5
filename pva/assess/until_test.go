package assess

import (
	"context"
	"errors"
	"math"
	"testing"

	"ebbline/pva"
	"ebbline/pva/estimate"
)

// lastOne is one animal that dies within the year with chance p, so that the
// risk is p itself.
func lastOne(t *testing.T, p, limit float64, seed, replicates int) *pva.Case {
	t.Helper()
	var entries []pva.Entry
	for _, kv := range []struct {
		path string
		v    pva.Value
	}{{"question.threshold", pva.Num(0)}, {"question.horizon", pva.Num(1)}, {"question.limit", pva.Num(limit)}, {"start.abundance", pva.Num(1)},
		{"births.breeding", pva.Text("pulse")}, {"births.rate", pva.Num(0)}, {"deaths.fraction", pva.Num(p)}, {"run.seed", pva.Num(float64(seed))}, {"run.replicates", pva.Num(float64(replicates))}} {
		entries = append(entries, pva.Entry{Path: kv.path, Value: kv.v, Origin: pva.FromCase})
	}
	c, faults := pva.Build(entries)
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	return c
}

// TestUntilCoverage: over 2,000 runs that stop at the first look that settles
// the verdict, with a risk that lies at the limit itself (so that every verdict
// is wrong or undecided), at most 5 % ever exclude the truth. The bound on
// chance: 100 expected at most, and 5.73 standard deviations of a binomial with
// that mean (false alarm 1e-8). A single-look interval looked at as often misses
// more often than 5 %, by the same margin, so that the test can fail.
func TestUntilCoverage(t *testing.T) {
	const runs, p = 2000, 0.1
	margin := 5.73 * math.Sqrt(runs*.05*.95)
	missed, wilson, looks := 0, 0, 0
	for seed := range runs {
		s, err := UntilDecided(context.Background(), lastOne(t, p, p, seed+1, 64), Options{Workers: 1, Exact: ExactNever}, 8192)
		if err != nil {
			t.Fatal(err)
		}
		ever, single := false, false
		for _, l := range s.Looks {
			ever = ever || l.Risk.Low > p || l.Risk.High < p
			low, high := estimate.Wilson(l.Risk.Count, l.Risk.Of, .95)
			single = single || low > p || high < p
			looks++
		}
		if ever {
			missed++
		}
		if single {
			wilson++
		}
		if s.Decided != (s.Verdict != pva.Undecided) || !s.Decided && s.Replicates != 8192 {
			t.Fatalf("seed %d: decided %v, %s, %d replicates", seed+1, s.Decided, s.Verdict, s.Replicates)
		}
	}
	if float64(missed) > runs*.05+margin {
		t.Errorf("%d of %d runs excluded the truth at some look", missed, runs)
	}
	if float64(wilson) < runs*.05+margin {
		t.Errorf("single-look intervals missed in %d of %d runs only: the test shows nothing", wilson, runs)
	}
	t.Logf("%d of %d excluded the truth at some of %d looks; single-look intervals in %d", missed, runs, looks, wilson)
}

// TestUntilDecides: a risk off the limit is settled, on the right side, with the
// replicates that an ordinary run of as many would have.
func TestUntilDecides(t *testing.T) {
	for _, want := range []struct {
		p       float64
		verdict pva.Verdict
	}{{.07, pva.Within}, {.13, pva.AboveLimit}} {
		s, err := UntilDecided(context.Background(), lastOne(t, want.p, .1, 3, 100), Options{Exact: ExactNever}, 0)
		if err != nil || !s.Decided || s.Verdict != want.verdict || len(s.Looks) < 2 {
			t.Fatalf("%v: %+v %v", want, s.Looks, err)
		}
		whole, err := Run(context.Background(), lastOne(t, want.p, .1, 3, int(s.Replicates)), Options{Exact: ExactNever})
		if err != nil || whole.Outcome.Risk.Count != s.Outcome.Risk.Count || whole.Outcome.Risk.Low <= s.Outcome.Risk.Low || whole.Outcome.Risk.High >= s.Outcome.Risk.High {
			t.Errorf("%+v against an ordinary run's %+v", s.Outcome.Risk, whole.Outcome.Risk)
		}
		if s.Asked != s.Replicates || s.Replicates%64 != 0 {
			t.Errorf("%d of %d", s.Replicates, s.Asked)
		}
	}
	// The exact answer settles it at once; without a limit there is nothing to settle.
	if s, err := UntilDecided(context.Background(), lastOne(t, .0999, .1, 3, 100), Options{}, 0); err != nil || len(s.Looks) != 1 || s.Verdict != pva.Within || !s.Decided {
		t.Errorf("%+v %v", s, err)
	}
	c := lastOne(t, .1, .1, 1, 100)
	free := *c
	free.Question.Limit = pva.Optional{}
	if _, err := UntilDecided(context.Background(), &free, Options{}, 0); !errors.Is(err, ErrNoLimit) {
		t.Error(err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if s, err := UntilDecided(ctx, c, Options{}, 0); s != nil || !errors.Is(err, context.Canceled) {
		t.Error(s, err)
	}
}

// TestUntilEveryInterval: not the risk's interval alone but those of the added
// risk, of options, of what drives the risk and of extinction hold at every
// look, so that all are wider than those of an ordinary run of as many.
func TestUntilEveryInterval(t *testing.T) {
	c := built(t, map[string]any{"question.threshold": 3, "question.horizon": 3, "question.limit": .4, "start.abundance": 9,
		"births.breeding": "pulse", "births.rate": .3, "births.year_sd": .2, "deaths.fraction": .3,
		"harvest.1.name": "control", "harvest.1.rule": "constant", "harvest.1.take": 1, "harvest.1.when": "end",
		"option.1.name": "two", "option.1.set.harvest.1.take": 2, "run.seed": 3, "run.replicates": 640})
	s, err := UntilDecided(context.Background(), c, Options{Exact: ExactNever}, 640)
	if err != nil {
		t.Fatal(err)
	}
	one, err := Run(context.Background(), c, Options{Exact: ExactNever})
	if err != nil || one.Replicates != s.Replicates {
		t.Fatal(err, one.Replicates, s.Replicates)
	}
	wider := func(what string, low, high, otherLow, otherHigh float64) {
		if !(low < otherLow && high > otherHigh) {
			t.Errorf("%s: %v to %v, a single look's %v to %v", what, low, high, otherLow, otherHigh)
		}
	}
	difference := func(what string, a, b pva.Difference) {
		if a.Estimate != b.Estimate {
			t.Errorf("%s: %v, %v", what, a.Estimate, b.Estimate)
		}
		wider(what, a.Low, a.High, b.Low, b.High)
	}
	wider("extinction", s.Outcome.Extinction.Low, s.Outcome.Extinction.High, one.Outcome.Extinction.Low, one.Outcome.Extinction.High)
	difference("added", *s.Added, *one.Added)
	difference("option", s.Options[0].Difference, one.Options[0].Difference)
	difference("the option adds", *s.Options[0].Added, *one.Options[0].Added)
	for i := range s.Drivers {
		difference("without "+s.Drivers[i].Without, s.Drivers[i].Difference, one.Drivers[i].Difference)
	}
	if len(s.Drivers) != 2 {
		t.Errorf("%d drivers", len(s.Drivers))
	}
}
