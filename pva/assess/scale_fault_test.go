package assess

import (
	"context"
	"fmt"
	"testing"

	"ebbline/pva"
)

// small is a case that others are grown from; more replaces what it gives.
func small(breeding string, more ...any) []any {
	base := []any{"question.threshold", 5, "question.horizon", 6, "question.limit", 0.2, "start.abundance", 80, "births.breeding", breeding,
		"births.rate", 0.5, "births.year_sd", 0.2, "deaths.rate", 0.4, "births.crowding.form", "linear", "births.crowding.scale", 500, "run.replicates", 64}
	given := map[any]bool{}
	for i := 0; i < len(more); i += 2 {
		given[more[i]] = true
	}
	var out []any
	for i := 0; i < len(base); i += 2 {
		if !given[base[i]] {
			out = append(out, base[i], base[i+1])
		}
	}
	return append(out, more...)
}

// assessed runs a case and looks at every figure of its outcomes.
func assessed(t *testing.T, what string, workers int, pairs []any) *pva.Assessment {
	t.Helper()
	c, faults := pva.Build(entriesOf(pairs))
	if len(faults) > 0 {
		t.Fatalf("%s: %v", what, faults)
	}
	a, err := Run(context.Background(), c, Options{Workers: workers, Exact: ExactNever})
	if err != nil {
		t.Fatalf("%s: %v", what, err)
	}
	figures(t, what, a.Outcome)
	for i := range a.Options {
		figures(t, what+", "+a.Options[i].Name, a.Options[i].Outcome)
	}
	return a
}

// TestManyOfEverything: as many of a thing as a case may well have, and more.
func TestManyOfEverything(t *testing.T) {
	many := 200
	if *long {
		many = 1000
	}
	for _, breeding := range []string{"pulse", "flow"} {
		var catastrophes, takes, options []any
		for i := 1; i <= 100; i++ {
			row := fmt.Sprintf("catastrophe.%d.", i)
			catastrophes = append(catastrophes, row+"chance", 0.02, row+"kills", 0.1, row+"births_times", 0.9)
			row = fmt.Sprintf("harvest.%d.", i)
			when := []string{"start", "end", "through"}[i%3]
			if breeding == "pulse" && when == "through" {
				when = "end"
			}
			takes = append(takes, row+"rule", "constant", row+"take", 0.05, row+"when", when, row+"stop_below", 10+i%7)
		}
		for i := 1; i <= many; i++ {
			row := fmt.Sprintf("option.%d.", i)
			options = append(options, row+"name", fmt.Sprint("number ", i), row+"set.births.rate", 0.3+float64(i)/5000)
		}
		assessed(t, breeding+", 100 catastrophes", 2, small(breeding, catastrophes...))
		assessed(t, breeding+", 100 takes", 2, small(breeding, takes...))
		if a := assessed(t, breeding+", 10,000 years", 2, small(breeding, "question.horizon", 10000, "births.rate", 0.6)); len(a.Outcome.Years) != 10000 {
			t.Errorf("%d years", len(a.Outcome.Years))
		}
		a := assessed(t, breeding+", many options", 2, small(breeding, append(options, "question.horizon", 2)...))
		if len(a.Options) != many {
			t.Errorf("%d options", len(a.Options))
		}
	}
}

// TestLargePopulations: at the default limit of a thousand million and at the
// largest limit that a case may have, every law of the young.
func TestLargePopulations(t *testing.T) {
	for _, at := range []float64{9.9e8, 9.99e11} {
		limit := 1e9
		if at > limit {
			limit = 1e12
		}
		large := []any{"start.abundance", at, "births.crowding.scale", at, "run.stop_above", limit, "harvest.1.rule", "constant", "harvest.1.take", at / 100}
		for _, more := range [][]any{
			{"harvest.1.when", "end", "births.offspring", "poisson"},
			{"harvest.1.when", "end", "births.offspring", "at-most-one"},
			{"harvest.1.when", "end", "births.offspring", "clumped", "births.clumping", 3},
			{"harvest.1.when", "end", "births.offspring", "clumped", "births.clumping", 0.001},
		} {
			assessed(t, fmt.Sprintf("pulse at %g, %v", at, more), 1, small("pulse", with(large, more)...))
		}
		assessed(t, fmt.Sprintf("flow at %g", at), 1, small("flow", with(large, []any{"harvest.1.when", "through", "harvest.2.rule", "fraction", "harvest.2.fraction", 0.01, "harvest.2.when", "through", "stocking.1.add", at / 100, "stocking.1.when", "through"})...))
		// One that grows through the limit, with a take that runs per head.
		assessed(t, fmt.Sprintf("flow growing from %g", at), 1, small("flow", "start.abundance", at/2, "births.crowding.scale", 1e12, "births.rate", 0.9, "deaths.rate", 0.1, "run.stop_above", limit, "harvest.1.rule", "fraction", "harvest.1.fraction", 0.05, "harvest.1.when", "through"))
	}
}

// with is two lists one after the other, in memory of their own.
func with(a, b []any) []any { return append(append([]any(nil), a...), b...) }

// TestSixtyFourWorkers: many more workers than cores give the figures of one.
func TestSixtyFourWorkers(t *testing.T) {
	for _, breeding := range []string{"pulse", "flow"} {
		pairs := small(breeding, "run.replicates", 20000, "catastrophe.1.chance", 0.1, "catastrophe.1.kills", 0.3, "harvest.1.rule", "constant", "harvest.1.take", 3, "harvest.1.when", "end")
		one, many := assessed(t, breeding, 1, pairs), assessed(t, breeding, 64, pairs)
		for what, pair := range map[string][2]any{"the case": {*one.Outcome, *many.Outcome}, "the baseline": {*one.Baseline, *many.Baseline}, "the added risk": {*one.Added, *many.Added}, "the drivers": {one.Drivers, many.Drivers}} {
			if fmt.Sprintf("%+v", pair[0]) != fmt.Sprintf("%+v", pair[1]) {
				t.Errorf("%s, %s: 64 workers give other figures than one", breeding, what)
			}
		}
	}
}
