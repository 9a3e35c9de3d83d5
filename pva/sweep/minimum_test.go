package sweep

import (
	"context"
	"math"
	"strings"
	"testing"

	"ebbline/pva"
	"ebbline/pva/rates"
)

// scarce is an invented population with scarcity at small numbers, whose births
// crowd by a stated scale.
func scarce(t testing.TB, more ...any) *pva.Case {
	return caseOf(t, append([]any{"case.title", "an invented moor", "question.threshold", 5, "question.horizon", 20, "question.limit", .1, "start.abundance", 100,
		"births.breeding", "pulse", "births.rate", .9, "births.crowding.form", "ricker", "births.crowding.scale", 200, "births.scarcity.form", "saturating", "births.scarcity.half_at", 20,
		"deaths.fraction", .25, "run.replicates", 500, "run.seed", 5}, more...)...)
}

// TestCapacityIsWhereThePathRests: whatever makes the capacity, the case of a
// size is one whose mean year leads from that size to itself, and from either
// side towards it. The mean year is iterated here; no formula of the search is
// used.
func TestCapacityIsWhereThePathRests(t *testing.T) {
	both := []any{"deaths.crowding.form", "linear", "deaths.crowding.scale", 900}
	flow := []any{"births.breeding", "flow", "deaths.fraction", .25}
	for name, c := range map[string]*pva.Case{
		"scale on births":    scarce(t, "minimum.vary", "capacity"),
		"scale on both":      scarce(t, append(both, "minimum.vary", "capacity")...),
		"start and scale":    scarce(t, append(both, "minimum.vary", "both")...),
		"flow, scale":        scarce(t, append(flow, "minimum.vary", "capacity")...),
		"a capacity":         marsh(t, "minimum.vary", "capacity", "catastrophe.1.chance", 0),
		"a capacity and all": marsh(t, "minimum.vary", "both", "catastrophe.1.chance", 0),
	} {
		s, q, err := NewMinimum(c)
		if err != nil {
			t.Fatal(name, err)
		}
		seen := 0
		for _, size := range []float64{6, 12, 25, 50, 71, 100, 400, 3000} {
			m, unreachable, err := q.model(c, s.base, size)
			if err != nil {
				t.Fatal(name, err)
			}
			if unreachable != "" {
				if size > 71 {
					t.Errorf("%s: no case of %v: %s", name, size, unreachable)
				}
				continue
			}
			seen++
			want := q.restOf(c, size)
			if q.Vary == "both" && m.Case.Start.Abundance != size {
				t.Errorf("%s: starts at %v, want %v", name, m.Case.Start.Abundance, size)
			}
			for _, from := range []float64{.97, 1, 1.03} {
				if n := iterated(m, from*want); math.Abs(n-want) > 1e-4*want {
					t.Errorf("%s: size %v: the path from %v rests at %v, want %v", name, size, from*want, n, want)
				}
			}
		}
		if seen < 4 {
			t.Errorf("%s: only %d sizes have a case", name, seen)
		}
	}
}

// iterated follows the mean year without takes for long.
func iterated(m *rates.Model, n float64) float64 {
	m = bare(m)
	for range 3000 {
		n = m.MeanYear(n)
	}
	return n
}

// TestUnreachableSizesAreNotViable: below the size at which scarcity leaves
// births behind deaths there is no such population, and the search goes on.
func TestUnreachableSizesAreNotViable(t *testing.T) {
	c := scarce(t, "minimum.vary", "both", "minimum.from", 2, "minimum.to", 600, "minimum.risk", .05)
	s, q, err := NewMinimum(c)
	if err != nil {
		t.Fatal(err)
	}
	got, err := open(t, s, Options{}).Smallest(context.Background(), q, SearchOptions{})
	if err != nil {
		t.Fatal(err)
	}
	if !got.Found || !(got.Value > 10) || got.Value >= 600 || got.Points[0].Unreachable == "" || got.At().Unreachable != "" || got.Risk.Estimate > .05 {
		t.Errorf("%+v", got)
	}
	for i, p := range got.Points[1:] {
		if p.Unreachable != "" && got.Points[i].Unreachable == "" {
			t.Errorf("%v has no case, and %v has one", p.Value, got.Points[i].Value)
		}
	}
	// Without births enough at any size there is nothing to search.
	c = scarce(t, "minimum.vary", "capacity", "minimum.from", 2, "minimum.to", 12)
	if s, q, err = NewMinimum(c); err != nil {
		t.Fatal(err)
	}
	if got, err := open(t, s, Options{}).Smallest(context.Background(), q, SearchOptions{}); err == nil {
		t.Errorf("found %+v", got)
	}
}

// cycling is an invented population that overshoots its capacity and cycles.
func cycling(t testing.TB, more ...any) *pva.Case {
	return caseOf(t, append([]any{"question.threshold", 5, "question.horizon", 10, "question.limit", .05, "start.abundance", 60, "births.breeding", "pulse", "births.parents", "all",
		"births.rate", 10, "births.year_sd", .5, "births.crowding.form", "ricker", "births.scarcity.form", "saturating", "births.scarcity.half_at", 50, "deaths.fraction", 1,
		"minimum.vary", "capacity", "minimum.from", 20, "minimum.to", 2000, "run.replicates", 500, "run.seed", 2}, more...)...)
}

// TestCyclingSizes: a population that swings around its capacity has one, by
// whichever key it is stated: with a scale that makes the same capacity the
// answers agree.
func TestCyclingSizes(t *testing.T) {
	byScale := cycling(t, "births.crowding.scale", 60)
	s, q, err := NewMinimum(byScale)
	if err != nil {
		t.Fatal(err)
	}
	if m, why, err := q.model(byScale, s.base, 1000); err != nil || why != "" || math.Abs(bare(m).MeanYear(1000)-1000) > 1e-6 {
		t.Fatal(why, err)
	}
	byCapacity := cycling(t, "births.crowding.capacity", q.Capacity)
	a, b := solve(t, byScale, true, SearchOptions{NoExact: true}), solve(t, byCapacity, true, SearchOptions{NoExact: true})
	if !a.Found || !b.Found || a.Value != b.Value || a.Value <= 20 || a.Value > 500 {
		t.Errorf("%v %s, %v %s", a.Value, a.Reason, b.Value, b.Reason)
	}
}

// TestSteepRise: where the risk is nearly level and then a cliff, a straight line
// between two values creeps; the search ends, with whole numbers next to it.
func TestSteepRise(t *testing.T) {
	c := caseOf(t, "question.threshold", 5, "question.horizon", 20, "question.limit", .05, "start.abundance", 400000, "births.breeding", "pulse", "births.rate", .42857, "deaths.fraction", .3,
		"catastrophe.1.chance", .0024, "catastrophe.1.kills", .999999, "harvest.1.rule", "constant", "harvest.1.when", "end", "harvest.1.take", 0,
		"sweep.1.key", "harvest.1.take", "sweep.1.from", 0, "sweep.1.to", 40000, "sweep.1.step", 2000, "run.replicates", 1000)
	for seed := range 6 {
		c, faults := c.With([]pva.Setting{{Path: "run.seed", Value: pva.Num(float64(seed + 1))}})
		if len(faults) > 0 {
			t.Fatal(faults)
		}
		got := solve(t, c, false, SearchOptions{NoExact: true})
		if !got.Found {
			continue
		}
		next := math.Inf(1) // the next value looked at
		for _, p := range got.Points {
			if p.Value > got.Value {
				next = math.Min(next, p.Value)
			}
		}
		if got.At() == nil || got.At().Value != got.Value || next != got.Value+1 && got.Value != got.To {
			t.Errorf("seed %d: %v, the next looked at %v", seed+1, got.Value, next)
		}
	}
}

// TestLargeStartsCrash: where a start far above the capacity crashes, the sizes
// that are within the limit are named, and a start left open goes no further than
// three times the capacity, nor beyond a ceiling.
func TestLargeStartsCrash(t *testing.T) {
	c := caseOf(t, "question.threshold", 5, "question.horizon", 10, "question.limit", .3, "start.abundance", 60, "births.breeding", "pulse", "births.parents", "all", "births.rate", 4, "births.year_sd", .5,
		"births.crowding.form", "ricker", "births.crowding.capacity", 116.8, "deaths.fraction", 1, "run.replicates", 500, "run.seed", 2, "minimum.vary", "start", "minimum.from", 6, "minimum.to", 100000)
	got := solve(t, c, true, SearchOptions{NoExact: true})
	low, high, any := got.within()
	if got.Found || !any || low < 6 || high >= 100000 || !strings.Contains(got.Reason, "are within the limit, and larger ones up to 100000 are not") {
		t.Errorf("found %v: %s", got.Found, got.Reason)
	}
	for most, c := range map[float64]*pva.Case{
		360: marsh(t), // its capacity is 120
		90:  marsh(t, "ceiling.abundance", 90),
	} {
		if _, q, err := NewMinimum(c); err != nil || math.Abs(q.To-most) > 1 {
			t.Errorf("starts up to %v, want %v (%v)", q.To, most, err)
		}
	}
}
