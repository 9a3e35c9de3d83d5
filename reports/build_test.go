package reports

import (
	"math"
	"strings"
	"testing"

	"ebbline/pva"
	"ebbline/reports/internal/invented"
)

func built(t *testing.T, c *pva.Case, exact bool) (*pva.Assessment, *Report) {
	t.Helper()
	a := invented.Assessment(c, 1000)
	if exact {
		invented.Exact(a)
	}
	return a, Build(a, Meta{Version: "0.1.0", CaseText: "x = 1\n", CaseFile: "heron.toml"})
}

// TestFiguresAreTheResults: every headline figure holds the numbers of the results.
func TestFiguresAreTheResults(t *testing.T) {
	a, r := built(t, invented.Case(), true)
	want := map[string][3]float64{
		"risk":       {a.Outcome.Risk.Estimate, a.Outcome.Risk.Low, a.Outcome.Risk.High},
		"baseline":   {a.Baseline.Risk.Estimate, a.Baseline.Risk.Low, a.Baseline.Risk.High},
		"added":      {a.Added.Estimate, a.Added.Low, a.Added.High},
		"extinction": {a.Outcome.Extinction.Estimate, a.Outcome.Extinction.Low, a.Outcome.Extinction.High},
		"limit":      {0.05, 0, 0}, "exact": {a.Exact.Risk, 0, 0}, "exact_baseline": {a.BaselineExact.Risk, 0, 0},
	}
	if len(r.Figures) != len(want) {
		t.Errorf("%d figures", len(r.Figures))
	}
	for _, f := range r.Figures {
		if got := [3]float64{f.Value, f.Low, f.High}; got != want[f.ID] {
			t.Errorf("%s holds %v, the results %v", f.ID, got, want[f.ID])
		}
		scale := 1.0
		if f.ID == "added" {
			scale = 100
		}
		if got := r.Table("figures").Cell(f.ID, "estimate").Num; got != scale*f.Value {
			t.Errorf("the table holds %v for %s", got, f.ID)
		}
	}
	if len(r.Numbers) != 5 {
		t.Errorf("%d numbers that matter, not five", len(r.Numbers))
	}
}

// TestPartsThatApply: a part stands only where there is something to show.
func TestPartsThatApply(t *testing.T) {
	names := func(r *Report) string {
		var s []string
		for _, p := range r.Parts {
			s = append(s, p.Name)
		}
		return strings.Join(s, ",")
	}
	a, r := built(t, invented.Case(), false)
	if got := names(r); got != "Answer,Risk by year,Abundance,How soon, how low,Options,What matters most,Inputs,Model,Checks,Cautions,Run again" {
		t.Errorf("parts %s", got)
	}
	a.Options, a.Drivers, a.Baseline, a.Added, a.Outcome.Batches = nil, nil, nil, nil, nil
	r = Build(a, Meta{})
	if got := names(r); got != "Answer,Risk by year,Abundance,How soon, how low,Inputs,Model,Cautions,Run again" {
		t.Errorf("parts %s", got)
	}
	for _, key := range []string{"base", "base_count", "exact", "added", "outgrown"} {
		if r.Table("years").Column(key) >= 0 {
			t.Errorf("column %s has nothing to show", key)
		}
	}
}

// TestFormulaOnlyWhereItHolds: an interval made in another way, such as one
// between draws, keeps its value and gets no formula.
func TestFormulaOnlyWhereItHolds(t *testing.T) {
	a, r := built(t, invented.Case(), false)
	if c := r.Table("figures").Cell("risk", "low"); c.Formula == "" || c.Num != a.Outcome.Risk.Low {
		t.Errorf("Wilson's limit has no formula: %+v", c)
	}
	a.Outcome.Risk.Low -= 1e-9
	a.Added.High += 1e-9
	a.Verdict = pva.Within // as if an exact answer had said so
	r = Build(a, Meta{})
	for _, at := range [][2]string{{"risk", "low"}, {"added", "high"}, {"limit", "note"}} {
		if c := r.Table("figures").Cell(at[0], at[1]); c.Formula != "" {
			t.Errorf("%s %s has the formula %s, which gives another value", at[0], at[1], c.Formula)
		}
	}
	if c := r.Table("pairs").Cell("added", "high"); c.Formula != "" {
		t.Errorf("the interval of the added risk has a formula that gives another value")
	}
}

// TestNewcombeInCells works the formula for the added risk through by hand, in
// the arithmetic of the cells, against estimate.Paired, which has its own test
// against published values.
func TestNewcombeInCells(t *testing.T) {
	a, r := built(t, invented.Case(), false)
	q := newPaired(a.Outcome.Risk, a.Baseline.Risk, *a.Added)
	if phi := r.Table("pairs").Cell("added", "phi"); phi.Num != q.phi() || phi.Num <= 0 || phi.Num >= 1 {
		t.Errorf("phi is %v", phi.Num)
	}
	p1, p2 := a.Outcome.Risk, a.Baseline.Risk
	down, up := p1.Estimate-p1.Low, p2.High-p2.Estimate
	low := p1.Estimate - p2.Estimate - math.Sqrt(down*down-2*q.phi()*down*up+up*up)
	if got := r.Table("pairs").Cell("added", "low").Num / 100; math.Abs(got-low) > 1e-12 {
		t.Errorf("the lower limit is %v, by hand %v", got, low)
	}
	if !q.explains(*a.Added, newScores(0.95)) {
		t.Error("the difference is not explained by its four counts")
	}
}

func TestVerdictSaysWhatItRestsOn(t *testing.T) {
	a, r := built(t, invented.Case(), true)
	if !strings.Contains(r.VerdictText, "the exact risk lies") {
		t.Errorf("with an exact answer the verdict rests on it: %s", r.VerdictText)
	}
	a.Exact.Risk = 0.0307
	r = Build(a, Meta{})
	risk := r.Figures[0]
	if exact := Percent(a.Exact.Risk, 0); risk.Lead != exact || strings.Contains(r.VerdictText+risk.Beside+risk.Note, exact) {
		t.Errorf("the exact risk %s does not lead, said once: %q, %q, %q", exact, risk.Lead, risk.Beside, r.VerdictText)
	}
	if want := "exact; simulated " + risk.Text + ", " + risk.Interval; risk.Beside != want {
		t.Errorf("beside it stands %q, not %q", risk.Beside, want)
	}
	if f := r.Table("figures").Rows; f[0].ID != "exact" || f[1].ID != "risk" {
		t.Errorf("the table starts with %s and %s", f[0].ID, f[1].ID)
	}
	a.Exact, a.Verdict, a.ToDecide = nil, pva.Undecided, 48000
	if got := Build(a, Meta{}).VerdictText; !strings.Contains(got, "not shown to be within") || !strings.Contains(got, "48,000 replicates would settle it") {
		t.Errorf("undecided: %s", got)
	}
	a.Unreliable = true
	if got := Build(a, Meta{}).VerdictText; !strings.HasPrefix(got, "Do not rely on this answer") {
		t.Errorf("unreliable: %s", got)
	}
	_, plain := built(t, invented.Plain(), false)
	if plain.VerdictText != "" || plain.Title != "heron" {
		t.Errorf("without a limit and a title: %q, %q", plain.VerdictText, plain.Title)
	}
}

func modelText(c *pva.Case, meta Meta) string {
	var b strings.Builder
	for _, s := range modelPart(c, meta).Sections {
		b.WriteString(s.Heading + "\n")
		for _, p := range s.Paragraphs {
			b.WriteString(p.Text + "\n")
		}
	}
	return b.String()
}

// TestModelSaysWhatTheCaseUses: the formulas of the model's description with the
// numbers in force, and nothing that the case does not use.
func TestModelSaysWhatTheCaseUses(t *testing.T) {
	text := modelText(invented.Case(), Meta{BirthsScale: pva.Optional{Value: 5063.25, Set: true}})
	for _, want := range []string{
		"dN/dt = (b(N,t) - d(N,t)) N - h(N,t)\n",
		"b(N,y) = rate_b(y) * crowding_b(N) * scarcity_b(N) * catastrophe_b(y)",
		"rate_b(y) = 0.45 * exp(sigma e_b - sigma^2/2),  sigma^2 = ln(1 + (0.12/0.45)^2)",
		"crowding_b(N) = max(0, 1 - N/5,063.25)", "growth is zero at N = 900", "scarcity_b(N) = N/(3 + N)",
		"rate_d(y) = -ln(1 - m_y),  m_y = 1/(1 + exp(-(u + v e_d)))",
		"S ~ Binomial(N, 1 - m(N,y)),  m = 1 - exp(-d)", "B ~ Poisson(b S)",
		"corr(u_b, u_d) = 0", "Summer drought: strikes with probability 0.04 a year",
		"target = 8", "Closed, with no take, while N < 60.", "made = min(intended, N)", "N = min(N, 1,500)",
		// 0.73 * 1.45 = 1.0585 and exp(0.45 + ln 0.73) = 1.14487...
		"times 1.0585 a year read as a pulse (survivors breed), times 1.1449 read as a flow",
	} {
		if !strings.Contains(text, want) {
			t.Errorf("the model does not say: %s", want)
		}
	}
	order := []string{"1. The weather", "2. Births and deaths: first deaths", "3. Take: control.", "4. The ceiling", "5. Census"}
	at := -1
	for _, step := range order {
		i := strings.Index(text, step)
		if i <= at {
			t.Errorf("the order of the year is wrong at %q", step)
		}
		at = i
	}
	plain := modelText(invented.Plain(), Meta{})
	for _, word := range []string{"Catastrophes", "crowding_", "scarcity", "Take", "h(N,t)", "a(N,t)", "e_b", "ceiling", "calendar_", "Binomial", "Take:", "stocking"} {
		if strings.Contains(plain, word) {
			t.Errorf("the model of a plain case speaks of %s", word)
		}
	}
	for _, want := range []string{"b(N,y) = 0.4\n", "d(N,y) = 0.42\n", "N -> N+1 at rate b(N,y) N;  N -> N-1 at rate d(N,y) N"} {
		if !strings.Contains(plain, want) {
			t.Errorf("the plain model does not say: %s", want)
		}
	}
}

// TestEveryFormHasItsFormula: the formulas of every form, as the model's
// description has them.
func TestEveryFormHasItsFormula(t *testing.T) {
	for _, c := range []struct {
		more []pva.Entry
		want string
	}{
		{[]pva.Entry{given("births.crowding.form", "ricker"), given("births.crowding.scale", 500)}, "crowding_b(N) = exp(-N/500)"},
		{[]pva.Entry{given("births.crowding.form", "hyperbolic"), given("births.crowding.scale", 500)}, "crowding_b(N) = 1/(1 + N/500)"},
		{[]pva.Entry{given("births.crowding.form", "theta"), given("births.crowding.scale", 500), given("births.crowding.exponent", 2)}, "crowding_b(N) = max(0, 1 - (N/500)^2)"},
		{[]pva.Entry{given("deaths.crowding.form", "theta"), given("deaths.crowding.scale", 500), given("deaths.crowding.exponent", 2)}, "crowding_d(N) = 1 + (N/500)^2"},
		{[]pva.Entry{given("births.scarcity.form", "proportional"), given("births.scarcity.at", 30)}, "scarcity_b(N) = N/30"},
		{[]pva.Entry{given("births.trend", -0.002), given("births.cycle.amplitude", 0.1), given("births.cycle.period", 10)}, "calendar_b(y) = (1 + -0.002)^(y-1) * (1 + 0.1 * sin(2 pi (y - 0)/10))"},
		{[]pva.Entry{given("births.year_sd", 0.1), given("weather.memory", 0.5)}, "e_y = 0.5 * e_{y-1} + sqrt(1 - 0.5^2) * u_y"},
		{[]pva.Entry{given("deaths.rate", 300), given("deaths.per", 1000), given("deaths.year_sd", 50)}, "rate_d(y) = 0.3 * exp(sigma e_d - sigma^2/2),  sigma^2 = ln(1 + (0.05/0.3)^2)"},
		{take("1", given("rule", "above"), given("spare", 100), given("fraction", 0.5), given("share", 0.5)), "target = 0.5 * 0.5 * max(0, N - 100)"},
		{take("1", given("rule", "fraction"), given("fraction", 0.1), given("survey_cv", 0.2)), "target = 0.1 * seen"},
		{take("1", given("rule", "fraction"), given("fraction", 0.1), given("when", "through"))[1:], "N -> N-1 at rate -ln(1 - 0.1) N"},
		{take("1", given("rule", "constant"), given("take", 5), given("extra_deaths", 0.2)), "extra deaths = 0.2 * made"},
		{[]pva.Entry{given("stocking.1.add", 5), given("stocking.1.when", "through")}, "N -> N+1 at rate 5"},
	} {
		if text := modelText(bare(t, c.more...), Meta{}); !strings.Contains(text, c.want) {
			t.Errorf("the model does not say: %s\n%s", c.want, text)
		}
	}
}

// TestCautionsFitTheCase: law first, and only what this case leaves out.
func TestCautionsFitTheCase(t *testing.T) {
	short, long := Cautions(invented.Case())
	if !strings.HasPrefix(short[0].Short, "Local law") || long[0].Heading != "Law and judgement come first" {
		t.Errorf("the first caution is %q", short[0].Short)
	}
	all := func(c *pva.Case) string {
		_, long := Cautions(c)
		var s []string
		for _, w := range long {
			s = append(s, w.Text)
		}
		return strings.Join(s, "\n")
	}
	full, plain := all(invented.Case()), all(invented.Plain())
	for word, inFull := range map[string]bool{"catastrophes (none": false, "no Allee effect": false, "crowding (": false, "understates the risk": false, "24 years of counts": true, "true number": true} {
		if strings.Contains(full, word) != inFull {
			t.Errorf("%q in the cautions of the full case: %v", word, !inFull)
		}
		if inFull == strings.Contains(plain, word) {
			t.Errorf("%q in the cautions of the plain case: %v", word, inFull)
		}
	}
	for _, w := range long {
		for _, ref := range w.References {
			if !strings.Contains(modelAndCautions(t), ref) {
				t.Errorf("%s is not among the references", ref)
			}
		}
	}
}

func modelAndCautions(t *testing.T) string {
	_, r := built(t, invented.Case(), false)
	var b strings.Builder
	for _, s := range r.Part(PartCautions).Sections {
		for _, p := range s.Paragraphs {
			b.WriteString(p.Text + "\n")
		}
	}
	return b.String()
}

// TestReferencesOfMethods: the report cites the methods that its intervals are
// by, and no others.
func TestReferencesOfMethods(t *testing.T) {
	cites := func(r *Report, author string) bool {
		for _, s := range r.Part(PartCautions).Sections {
			for _, p := range s.Paragraphs {
				if p.Kind == Reference && strings.HasPrefix(p.Text, author) {
					return true
				}
			}
		}
		return false
	}
	one, _ := built(t, invented.Case(), false)
	one.Sequential = false
	looks := *one
	looks.Sequential = true
	for author, in := range map[string][2]bool{"Newcombe": {true, false}, "Robbins": {false, true}, "Howard": {false, true}, "McCarthy": {true, true}} {
		if got := [2]bool{cites(Build(one, Meta{}), author), cites(Build(&looks, Meta{}), author)}; got != in {
			t.Errorf("%s: cited %v of one look and of many, want %v", author, got, in)
		}
	}
	if r := Build(drawn(false), Meta{}); !cites(r, "Waudby-Smith") || cites(r, "Newcombe") {
		t.Error("the methods of uncertain inputs are not cited")
	}
}
