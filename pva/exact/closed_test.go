package exact

import (
	"context"
	"math"
	"testing"

	"ebbline/pva"
	"ebbline/pva/rates"
)

func closedCase(t *testing.T, pairs ...any) *rates.Model {
	t.Helper()
	var entries []pva.Entry
	for i := 0; i < len(pairs); i += 2 {
		v := pva.Value{}
		switch x := pairs[i+1].(type) {
		case int:
			v = pva.Num(float64(x))
		case float64:
			v = pva.Num(x)
		case string:
			v = pva.Text(x)
		}
		entries = append(entries, pva.Entry{Path: pairs[i].(string), Value: v})
	}
	c, faults := pva.Build(entries)
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	m, bad := rates.New(c)
	if len(bad) > 0 {
		t.Fatal(pva.Faults(bad))
	}
	return m
}

func only(t *testing.T, m *rates.Model, name string) pva.ClosedForm {
	t.Helper()
	for _, f := range ClosedForms(m, 0, "none") {
		if f.Name == name {
			return f
		}
	}
	t.Fatalf("%q does not apply", name)
	return pva.ClosedForm{}
}

// Extinction by time of the linear birth-death process (D. G. Kendall 1948),
// and each value again from the exact solver, with rates that change by year too.
func TestLinearBirthDeathForm(t *testing.T) {
	const name = "chance of extinction, linear birth-death process"
	for _, r := range []struct {
		b, d     float64
		years, n int
		p        float64
	}{{.3, .2, 5, 3, 0.08540705151}, {.3, .2, 20, 3, 0.2543696684}, {.2, .3, 10, 5, 0.41209039}, {.25, .25, 10, 4, 0.2603082049}, {.5, .45, 20, 20, 0.03922059377}} {
		m := closedCase(t, "question.threshold", 0, "question.horizon", r.years, "start.abundance", r.n, "births.breeding", "flow", "births.rate", r.b, "deaths.rate", r.d)
		if got := only(t, m, name).Value; math.Abs(got/r.p-1) > 1e-8 {
			t.Errorf("births %v deaths %v: %.10g, want %.10g", r.b, r.d, got, r.p)
		}
	}
	m := closedCase(t, "question.threshold", 0, "question.horizon", 6, "start.abundance", 4.4, "births.breeding", "flow", "births.rate", .3, "deaths.rate", .35,
		"births.trend", -.1, "deaths.cycle.amplitude", .5, "deaths.cycle.period", 4)
	sameAsSolver(t, m, name)
}

// Branching: a generation's extinction probabilities by iterated generating
// functions (T. E. Harris 1963), and survivors that breed against the solver.
func TestBranchingForm(t *testing.T) {
	const name = "chance of extinction, branching process"
	generation := []any{"question.threshold", 0, "question.horizon", 5, "start.abundance", 1, "births.breeding", "pulse", "births.parents", "all", "deaths.fraction", 1}
	for _, r := range []struct {
		p    float64
		more []any
	}{
		{0.65787444, []any{"births.rate", 1.1}}, {0.394978569, []any{"births.rate", 1.5}},
		{0.736975921, []any{"births.rate", 1.5, "births.offspring", "clumped", "births.clumping", .5}},
	} {
		m := closedCase(t, append(append([]any{}, generation...), r.more...)...)
		if got := only(t, m, name).Value; math.Abs(got/r.p-1) > 1e-8 {
			t.Errorf("%v: %.10g, want %.10g", r.more, got, r.p)
		}
	}
	for _, law := range []string{"poisson", "at-most-one"} {
		m := closedCase(t, "question.threshold", 0, "question.horizon", 8, "start.abundance", 6, "births.breeding", "pulse", "births.rate", .4, "births.offspring", law, "births.by_year.1", 1.0, "births.by_year.2", .6, "deaths.fraction", .4)
		sameAsSolver(t, m, name)
	}
}

func sameAsSolver(t *testing.T, m *rates.Model, name string) {
	t.Helper()
	e, err := Solve(context.Background(), m, Options{})
	if err != nil || e.Reason != "" {
		t.Fatal(err, e.Reason)
	}
	if got := only(t, m, name).Value; math.Abs(got-e.Risk) > 1e-8 {
		t.Errorf("%s: %.10g, solver %.10g", name, got, e.Risk)
	}
}

// First passage of Brownian motion (B. Dennis, P. L. Munholland & J. M. Scott
// 1991; values by formula and by integrating the density).
func TestFirstPassage(t *testing.T) {
	for _, r := range []struct{ n0, ne, mu, s2, t, p float64 }{
		{100, 1, -.05, .04, 50, 0.093587078}, {100, 1, -.05, .04, 200, 0.98386833}, {100, 10, .02, .05, 10, 0.00043399091}, {100, 10, .02, .05, 100, 0.097881019},
		{50, 1, 0, .1, 50, 0.080202924}, {99, 20, .02134027, .01305092, 100, 0.0041806736}, {40, 10, -.03, .09, 1, 6.0348387e-06},
	} {
		if got := FirstPassage(math.Log(r.n0/r.ne), r.mu, r.s2, r.t); math.Abs(got/r.p-1) > 2e-8 {
			t.Errorf("%+v: %.10g", r, got)
		}
	}
}

// The diffusion form applied to a case: in a flow year the log growth has mean
// b - d and variance year_sd^2, so that the case below is drift -0.05 and
// variance 0.04.
func TestDiffusionForm(t *testing.T) {
	m := closedCase(t, "question.threshold", 1, "question.horizon", 50, "start.abundance", 100, "births.breeding", "flow", "births.rate", .45, "births.year_sd", .2, "deaths.rate", .5)
	if got := only(t, m, "risk by the diffusion approximation").Value; math.Abs(got/0.093587078-1) > 1e-6 {
		t.Errorf("diffusion risk %.9g, want 0.093587078", got)
	}
}

// Blow-up at 1/(k N0) = 50 (H. von Foerster et al. 1960); with deaths, where
// the formula's path has grown beyond 1e12 just before (integrated by rates).
func TestBlowUpForm(t *testing.T) {
	const name = "time at which the mean path blows up, without takes"
	m := closedCase(t, "question.threshold", 0, "question.horizon", 60, "start.abundance", 20, "births.breeding", "flow", "births.rate", 1, "births.scarcity.form", "proportional", "births.scarcity.at", 1000, "deaths.rate", 0)
	if got := only(t, m, name).Value; math.Abs(got-50) > 1e-9 {
		t.Errorf("blow-up at %v, want 50", got)
	}
	m = closedCase(t, "question.threshold", 0, "question.horizon", 9, "start.abundance", 200, "births.breeding", "flow", "births.rate", 1, "births.scarcity.form", "proportional", "births.scarcity.at", 1000, "deaths.rate", .1)
	at := only(t, m, name).Value // ln 2 / 0.1 = 6.93
	if math.Abs(at-math.Ln2/.1) > 1e-9 {
		t.Errorf("blow-up with deaths at %v, want %v", at, math.Ln2/.1)
	}
	n := 200.0
	for y := 1; y <= 6; y++ {
		n = m.MeanYear(n)
	}
	if math.IsInf(n, 1) || !math.IsInf(m.MeanYear(n), 1) {
		t.Errorf("the mean path is %v after 6 years and must blow up in the seventh", n)
	}
}

// The logistic under a take of 100 rests at 276.3932 (unstable) and 723.6068
// (Schaefer 1954).
func TestRestsAreListed(t *testing.T) {
	m := closedCase(t, "question.threshold", 0, "question.horizon", 10, "start.abundance", 900, "births.breeding", "flow", "births.rate", .8, "deaths.rate", .3,
		"births.crowding.form", "linear", "births.crowding.capacity", 1000, "harvest.1.rule", "constant", "harvest.1.take", 100, "harvest.1.when", "through")
	for name, want := range map[string]float64{"resting place 1 of the mean path": 276.3932023, "resting place 2 of the mean path": 723.6067977} {
		if got := only(t, m, name).Value; math.Abs(got-want) > 1e-4 {
			t.Errorf("%s: %v, want %v", name, got, want)
		}
	}
}

// Schaefer's largest take: r = 0.5, K = 1000: 125, wherever crowding acts.
func TestCriticalTakeForm(t *testing.T) {
	for _, side := range []string{"births", "deaths"} {
		m := closedCase(t, "question.threshold", 0, "question.horizon", 10, "start.abundance", 900, "births.breeding", "flow", "births.rate", .8, "deaths.rate", .3,
			side+".crowding.form", "linear", side+".crowding.capacity", 1000, "harvest.1.rule", "constant", "harvest.1.take", 100, "harvest.1.when", "through")
		f := only(t, m, "largest constant take that the mean path bears, r K/4")
		if math.Abs(f.Value-125) > 1e-9 || f.Beside != 100 {
			t.Errorf("crowding in %s: %v beside %v, want 125 beside 100", side, f.Value, f.Beside)
		}
	}
}

// Births that explode by the calendar have no exact answer, and saying so costs
// nothing: one row of their law would be longer than memory.
func TestExplosiveBirthsAreRefused(t *testing.T) {
	m := closedCase(t, "question.threshold", 5, "question.horizon", 60, "start.abundance", 50, "births.breeding", "pulse", "births.rate", .4, "births.trend", 5.0, "deaths.fraction", .3)
	if _, ok, reason := Cost(m); ok || reason == "" {
		t.Errorf("births of 6^59 times 0.4 a head: ok %v, reason %q", ok, reason)
	}
}

// An old count, exact or not, is remembered from year to year beside N: a rule
// that looks at one has no exact answer, and a rule that does not has one.
func TestOldCountsAreRefused(t *testing.T) {
	base := []any{"question.threshold", 2, "question.horizon", 4, "start.abundance", 12, "births.breeding", "pulse", "births.rate", .4, "deaths.fraction", .3,
		"harvest.1.when", "end", "harvest.1.survey_every", 2}
	for _, r := range []struct {
		more []any
		ok   bool
	}{
		{[]any{"harvest.1.rule", "fraction", "harvest.1.fraction", .2}, false},
		{[]any{"harvest.1.rule", "constant", "harvest.1.take", 1, "harvest.1.stop_below", 5}, false},
		{[]any{"harvest.1.rule", "constant", "harvest.1.take", 1}, true},
		{[]any{"harvest.1.rule", "fraction", "harvest.1.fraction", .2, "harvest.1.take_noise", "each-animal"}, true},
		{[]any{"harvest.1.rule", "fraction", "harvest.1.fraction", .2, "harvest.1.one_year_in", 2}, true},
	} {
		if _, ok, reason := Cost(closedCase(t, append(append([]any{}, base...), r.more...)...)); ok != r.ok {
			t.Errorf("%v: exact answer %v (%s), want %v", r.more, ok, reason, r.ok)
		}
	}
}
