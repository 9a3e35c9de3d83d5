package sweep

import (
	"context"
	"math"
	"path/filepath"
	"strings"
	"testing"

	"ebbline/pva"
)

// TestMeanField: in a large logistic population without noise but that of births
// and deaths, the largest constant take that is survived for long lies near
// rK/4 (M. B. Schaefer 1954; C. W. Clark 1990, chapter 1). For T years it is
// where the time from K to 0, (2/s)(atan((2rN/K - r)/s) + atan(r/s)) with
// s^2 = 4rH/K - r^2, equals T: 0.4 % above rK/4 for T = 200 and r = 0.5.
func TestMeanField(t *testing.T) {
	const r, k, years = 0.5, 1e6, 200
	timeToZero := func(h float64) float64 {
		s := math.Sqrt(4*r*h/k - r*r)
		return 2 / s * 2 * math.Atan(r/s)
	}
	lo, hi := r*k/4*1.0000001, r*k/2
	for range 200 {
		if mid := (lo + hi) / 2; timeToZero(mid) > years {
			lo = mid
		} else {
			hi = mid
		}
	}
	c := caseOf(t, "question.threshold", 0, "question.horizon", years, "question.limit", .5, "start.abundance", k, "births.breeding", "flow", "births.rate", .8, "births.crowding.form", "linear",
		"births.crowding.capacity", k, "deaths.rate", .3, "harvest.1.rule", "constant", "harvest.1.when", "through", "harvest.1.take", 1000, "run.replicates", 8, "run.substeps", "20", "run.baseline", false,
		"sweep.1.key", "harvest.1.take", "sweep.1.from", 100000, "sweep.1.to", 150000, "sweep.1.step", 50000)
	got := solve(t, c, false, SearchOptions{NoExact: true, Most: 8})
	// Near the best take the mean path lingers at K/2 for most of the 200 years,
	// where births and deaths give it a variance of about 0.6 N a year: a spread
	// in 100 years of about 0.8 % of N, which moves the take that is survived by
	// far less than 1 % of itself.
	if !got.Found || math.Abs(got.Value/lo-1) > 0.01 || math.Abs(got.Value/(r*k/4)-1) > 0.015 {
		t.Errorf("largest take %v (%v to %v), mean field %v, rK/4 %v", got.Value, got.Low(), got.High(), lo, r*k/4)
	}
	t.Logf("largest take %v, mean field %v, rK/4 %v, %d values", got.Value, lo, r*k/4, len(got.Points))
}

// TestNotMonotone: a curve that goes down before it goes up is reported as such.
// Generations that do not overlap and overshoot (W. E. Ricker 1954) crash by
// themselves: births 20 exp(-N/100) a head bring N = 100 to 736 and that to 9.
// A take of half damps the crashes, a take of 97 % ends the population.
func TestNotMonotone(t *testing.T) {
	c := caseOf(t, "question.threshold", 12, "question.horizon", 20, "question.limit", .5, "start.abundance", 100, "births.breeding", "pulse", "births.rate", 20, "births.parents", "all", "deaths.fraction", 1,
		"births.crowding.form", "ricker", "births.crowding.scale", 100, "harvest.1.rule", "fraction", "harvest.1.when", "end", "harvest.1.fraction", .5,
		"run.replicates", 500, "sweep.1.key", "harvest.1.fraction", "sweep.1.from", .001, "sweep.1.to", .991, "sweep.1.step", .09)
	s := grid(t, c)
	result := run(t, s, Options{})
	var risks []float64
	for _, o := range result.Cells {
		risks = append(risks, o.Risk.Estimate)
	}
	for name, grid := range map[string]*Result{"with its grid": result, "without": nil} {
		got, err := open(t, s, Options{}).Largest(context.Background(), grid, SearchOptions{NoExact: true})
		if err != nil {
			t.Fatal(err)
		}
		if len(got.Breaks) == 0 || got.Found || !strings.Contains(got.Reason, "even at the smallest") || !strings.Contains(got.Reason, "not steadily") {
			t.Errorf("%s: risks %v: breaks %v, %s", name, risks, got.Breaks, got.Reason)
		}
	}
	// The usual curve has none.
	if got := solve(t, takes(t), false, SearchOptions{NoExact: true}); len(got.Breaks) > 0 {
		t.Errorf("a steady curve is called unsteady: %+v", got.Breaks)
	}
}

// TestNoAnswer: where there is no largest take, or no smallest size, the reason
// is given; none is an error.
func TestNoAnswer(t *testing.T) {
	for want, c := range map[string]*pva.Case{
		"above the limit even at the smallest": takes(t, "start.abundance", 12, "question.limit", .01),
		"larger ones may be":                   takes(t, "question.limit", .9999),
		"the risk falls as":                    marsh(t, "sweep.1.key", "start.abundance", "sweep.1.values.1", 12, "sweep.1.values.2", 100),
		"part of the question":                 marsh(t, "sweep.1.key", "question.threshold", "sweep.1.values.1", 5, "sweep.1.values.2", 10),
	} {
		got := solve(t, c, false, SearchOptions{NoExact: true})
		if !strings.Contains(got.Reason, want) || got.Found != (want == "larger ones may be") {
			t.Errorf("%s: found %v, %s", want, got.Found, got.Reason)
		}
	}
	for want, c := range map[string]*pva.Case{
		"none up to 300":                 marsh(t, "harvest.1.take", 60, "minimum.to", 300, "minimum.from", 20),
		"already viable at the smallest": marsh(t, "harvest.1.take", 0, "births.rate", .9, "minimum.from", 80, "minimum.to", 300),
	} {
		got := solve(t, c, true, SearchOptions{NoExact: true})
		if !strings.Contains(got.Reason, want) || got.Found != strings.HasPrefix(want, "already") {
			t.Errorf("%s: found %v, %s", want, got.Found, got.Reason)
		}
	}
}

// TestSizes: what varying the capacity, or both, does to the case.
func TestSizes(t *testing.T) {
	c := marsh(t, "ceiling.abundance", 200, "minimum.vary", "both", "minimum.horizon", 7)
	s, q, err := NewMinimum(c)
	if err != nil {
		t.Fatal(err)
	}
	m, _, err := q.model(c, s.base, 90) // one and a half times the start of 60
	if err != nil {
		t.Fatal(err)
	}
	if v := m.Case; v.Start.Abundance != 90 || v.Births.Crowding.Capacity.Value != 180 || v.Ceiling.Value != 300 || v.Question.Horizon != 7 {
		t.Errorf("%+v", v.Births.Crowding)
	}
	c = marsh(t, "minimum.vary", "capacity")
	if s, q, err = NewMinimum(c); err != nil || q.Capacity != 120 || q.From != 11 || q.To != 12000 {
		t.Fatal(q, err)
	}
	if m, _, err = q.model(c, s.base, 60); err != nil || m.Case.Start.Abundance != 60 || m.Case.Births.Crowding.Capacity.Value != 60 {
		t.Error(err)
	}
	// A scale alone: the capacity is where the mean path rests. Births
	// 0.5 (1 - N/200) balance deaths of 0.2 in a flow year at N = 120.
	flow := caseOf(t, "question.threshold", 5, "question.horizon", 10, "question.limit", .1, "start.abundance", 50, "births.breeding", "flow", "births.rate", .5,
		"births.crowding.form", "linear", "births.crowding.scale", 200, "deaths.rate", .2, "harvest.1.rule", "constant", "harvest.1.when", "end", "harvest.1.take", 5, "minimum.vary", "capacity")
	if _, q, err = NewMinimum(flow); err != nil || math.Abs(q.Capacity-120) > 1e-6 {
		t.Error(q, err)
	}
	unlimited := caseOf(t, "question.threshold", 5, "question.horizon", 10, "start.abundance", 50, "births.breeding", "flow", "births.rate", .3, "deaths.rate", .2)
	if _, _, err := NewMinimum(unlimited); err == nil || !strings.Contains(err.Error(), "minimum.risk") {
		t.Error(err)
	}
	free := caseOf(t, "question.threshold", 5, "question.horizon", 10, "question.limit", .1, "start.abundance", 50, "births.breeding", "flow", "births.rate", .3, "deaths.rate", .2, "minimum.vary", "capacity")
	if _, _, err := NewMinimum(free); err == nil || !strings.Contains(err.Error(), "no capacity to vary") {
		t.Error(err)
	}
}

// TestSearchResumes: a search that is stopped goes on from its ledger and ends
// with the same points, without simulating any of them again.
func TestSearchResumes(t *testing.T) {
	c := takes(t, "question.limit", .25)
	want := solve(t, c, false, SearchOptions{NoExact: true})
	dir := filepath.Join(t.TempDir(), "l")
	s := grid(t, c)
	ctx, cancel := context.WithCancel(context.Background())
	calls := 0
	r := open(t, s, Options{Workers: 1, Ledger: dir, Progress: func(stage string, done, total int64) {
		if calls++; calls == 12 {
			cancel()
		}
	}})
	if _, err := r.Largest(ctx, nil, SearchOptions{NoExact: true}); err == nil {
		t.Fatal("not stopped: the test shows nothing")
	}
	r.Close()
	blocks := 0
	r = open(t, s, Options{Workers: 1, Ledger: dir, Resume: true, Progress: func(string, int64, int64) { blocks++ }})
	had := len(r.points)
	got, err := r.Largest(context.Background(), nil, SearchOptions{NoExact: true})
	if err != nil {
		t.Fatal(err)
	}
	r.Close()
	if had == 0 || !got.Found || got.Value != want.Value || got.Low() != want.Low() || got.High() != want.High() || got.Risk != want.Risk || len(got.Points) != len(want.Points) {
		t.Errorf("%d records; %+v, want %+v", had, got, want)
	}
	r = open(t, s, Options{Ledger: dir, Resume: true, Progress: func(string, int64, int64) { t.Error("something is simulated again") }})
	if _, err := r.Largest(context.Background(), nil, SearchOptions{NoExact: true}); err != nil {
		t.Error(err)
	}
}
