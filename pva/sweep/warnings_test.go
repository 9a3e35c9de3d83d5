package sweep

import (
	"context"
	"strings"
	"testing"

	"ebbline/pva"
	"ebbline/pva/assess"
)

// coarse is an invented flow population in one sub-step a year, which is too few.
func coarse(t testing.TB, more ...any) *pva.Case {
	return caseOf(t, append([]any{"question.threshold", 50, "question.horizon", 20, "question.limit", .1, "start.abundance", 3000, "births.breeding", "flow", "births.rate", .8, "births.year_sd", .1,
		"births.crowding.form", "linear", "births.crowding.capacity", 4000, "deaths.rate", .5, "run.substeps", 1, "run.replicates", 64, "run.seed", 3,
		"harvest.1.name", "quota", "harvest.1.rule", "constant", "harvest.1.when", "end", "harvest.1.take", 10, "sweep.1.key", "harvest.quota.take", "sweep.1.from", 0, "sweep.1.to", 60, "sweep.1.step", 20}, more...)...)
}

func warned(of []pva.Warning, what string) bool {
	for _, w := range of {
		if strings.Contains(w.Text, what) {
			return true
		}
	}
	return false
}

// TestSweepsWarnOfSubsteps: what an assessment of the case warns of, a sweep, a
// search and a minimum do too; none does where there are sub-steps enough.
func TestSweepsWarnOfSubsteps(t *testing.T) {
	for steps, want := range map[int]bool{1: true, 200: false} {
		c := coarse(t, "run.substeps", steps, "minimum.from", 60, "minimum.to", 90)
		a, err := assess.Run(context.Background(), c, assess.Options{Exact: assess.ExactNever})
		if err != nil || warned(a.Warnings, "sub-steps may shift") != want {
			t.Fatal(err, a.Warnings)
		}
		r := run(t, grid(t, c), Options{})
		l := solve(t, c, false, SearchOptions{NoExact: true})
		s, q, err := NewMinimum(c)
		if err != nil {
			t.Fatal(err)
		}
		m, err := open(t, s, Options{}).Smallest(context.Background(), q, SearchOptions{NoExact: true})
		if err != nil {
			t.Fatal(err)
		}
		for what, ws := range map[string][]pva.Warning{"a sweep": r.Warnings(nil), "a search": (&Result{Study: r.Study}).Warnings(l), "a minimum": m.Warnings(s)} {
			if warned(ws, "sub-steps may shift") != want {
				t.Errorf("%d sub-steps: %s: %v", steps, what, ws)
			}
		}
	}
}

// TestSweepsTellOfOutgrown: means of takes leave out what outgrew, and say so.
func TestSweepsTellOfOutgrown(t *testing.T) {
	c := coarse(t, "run.stop_above", 3800, "run.substeps", 20)
	if r := run(t, grid(t, c), Options{}); !warned(r.Warnings(nil), "outgrew 3800") {
		t.Errorf("%v", r.Warnings(nil))
	}
	if r := run(t, grid(t, coarse(t)), Options{}); warned(r.Warnings(nil), "outgrew") {
		t.Errorf("%v", r.Warnings(nil))
	}
}
