package fit

import (
	"context"
	"fmt"
	"math"
	"strings"
	"sync"
	"testing"

	"ebbline/pva"
	"ebbline/pva/casefile"
	"ebbline/pva/ensemble"
	"ebbline/pva/rates"
	"ebbline/pva/year"
	"ebbline/rng"
)

// invented is a series of counts of an invented population, around 400, without
// crowding (k = 0) or with a Ricker curve.
func invented(t *testing.T, k float64) *Result {
	t.Helper()
	s := &Series{File: "invented.csv", TimeUnit: "year"}
	stream := rng.NewStream(7, uint64(k), rng.Resample)
	n := 400.0
	for y := 1980; y < 2015; y++ {
		s.Counts = append(s.Counts, Count{Year: float64(y), Count: math.Round(n)})
		g := 0.01 + 0.2*rng.Normal(stream)
		if k > 0 {
			g = 0.6*(1-n/k) + 0.2*rng.Normal(stream)
		}
		n *= math.Exp(g)
	}
	r, err := Fit(s, Options{Resamples: 200})
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// growths gathers the log growth of the first year.
type growths struct {
	mu   sync.Mutex
	from float64
	x    []float64
	none int
}

func (g *growths) Census(_, _ int, row *ensemble.Row, _, _ uint64) {
	g.mu.Lock()
	defer g.mu.Unlock()
	for _, n := range row.N[:row.Lanes] {
		if n == 0 {
			g.none++
			continue
		}
		g.x = append(g.x, math.Log(float64(n)/g.from))
	}
}

func (g *growths) Finish(int, *ensemble.End) {}

// firstYear simulates the first year of a case from an abundance.
func firstYear(t *testing.T, entries []pva.Entry, from float64) []float64 {
	t.Helper()
	var kept []pva.Entry
	for _, e := range entries {
		switch {
		case e.Path == "start.abundance":
			e.Value = pva.Num(from)
		case e.Path == "start.cv", strings.HasPrefix(e.Path, "uncertain"):
			continue
		case e.Path == "question.horizon":
			e.Value = pva.Num(1)
		}
		kept = append(kept, e)
	}
	c, faults := pva.Build(kept)
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	m, wrong := rates.New(c)
	if len(wrong) > 0 {
		t.Fatal(pva.Faults(wrong))
	}
	e, err := year.New(77, m)
	if err != nil {
		t.Fatal(err)
	}
	g := &growths{from: from}
	if _, err := ensemble.Into(context.Background(), e, ensemble.Plan{Replicates: 40000, Workers: 1}, g); err != nil {
		t.Fatal(err)
	}
	if g.none > 0 {
		t.Fatalf("%d replicates died out in one year from %g", g.none, from)
	}
	return g.x
}

// holdMoments fails unless mean and variance of a sample are within 5.73
// standard errors (level 1e-8, normal) of what they should be.
func holdMoments(t *testing.T, what string, x []float64, wantMean, wantVariance float64) {
	t.Helper()
	n := float64(len(x))
	m, sd := mean(x), deviation(x)
	fourth := 0.0
	for _, v := range x {
		fourth += math.Pow(v-m, 4) / n
	}
	if z := (m - wantMean) / (sd / math.Sqrt(n)); !(math.Abs(z) < 5.73) {
		t.Errorf("%s: mean log growth %.6g, want %.6g (%.1f standard errors)", what, m, wantMean, z)
	}
	if z := (sd*sd - wantVariance) / math.Sqrt((fourth-sd*sd*sd*sd)/n); !(math.Abs(z) < 5.73) {
		t.Errorf("%s: variance %.6g, want %.6g (%.1f standard errors)", what, sd*sd, wantVariance, z)
	}
}

// harmonic is the harmonic mean: at that abundance demography makes of the
// variance what it makes over all the counts.
func harmonic(x []float64) float64 {
	sum := 0.0
	for _, v := range x {
		sum += 1 / v
	}
	return float64(len(x)) / sum
}

// TestCaseGivesBackGrowth: a case made from a fit, simulated, has the fitted
// mean and variance of log growth, in both readings of the year and for any
// split of the weather.
func TestCaseGivesBackGrowth(t *testing.T) {
	r := invented(t, 0)
	model := r.Model(Exponential)
	for _, breeding := range []string{"pulse", "flow"} {
		for _, split := range []float64{0, 0.5, 1} {
			w, err := r.Case(CaseOptions{Breeding: breeding, Survival: 0.75, Split: split, Model: Exponential})
			if err != nil {
				t.Fatal(err)
			}
			if w.Variance != r.variance(model).Value || !(w.Weather > 0) || w.Demographic <= 0 {
				t.Errorf("%s: variance %g parted into %g and %g", breeding, w.Variance, w.Demographic, w.Weather)
			}
			from := math.Round(harmonic(r.p.n[:len(r.p.n)-1]))
			holdMoments(t, fmt.Sprintf("%s, %g of the weather in births", breeding, split), firstYear(t, w.Entries, from), r.growth().Value, w.Variance)
		}
	}
}

// TestCaseGivesBackCrowding: with crowding, the simulated growth at each
// abundance is that of the rates matched (to sampling error), which lies near
// the fitted curve and crosses 0 at the fitted K; averaged over the counts, its
// variance is the fitted one.
func TestCaseGivesBackCrowding(t *testing.T) {
	r := invented(t, 450)
	model := r.Model(RickerModel)
	if model.Refused != "" {
		t.Fatal(model.Refused)
	}
	for _, breeding := range []string{"pulse", "flow"} {
		w, err := r.Case(CaseOptions{Breeding: breeding, Survival: 0.7, Split: 0.5, Model: RickerModel})
		if err != nil {
			t.Fatal(err)
		}
		if w.Off > model.ResidualSD/4 {
			t.Errorf("%s: the case lies %g from the curve", breeding, w.Off)
		}
		tg := r.target(model, CaseOptions{Breeding: breeding, Split: 0.5})
		tg.survival = 0.7
		m, err := r.matchBest(model, tg)
		if err != nil {
			t.Fatal(err)
		}
		variance := 0.0
		points := m.points()
		for _, n := range points {
			_, v, _, _ := m.moments(n)
			variance += (v + m.demographic(n)/n) / float64(len(points))
		}
		// The points are ten of the counts, the demographic part is over all.
		agreeTo(t, breeding+" variance over the counts", variance, w.Variance, 0.01)
		for _, n := range []float64{250, math.Round(m.capacity), 600} {
			g, v, _, _ := m.moments(n)
			x := firstYear(t, w.Entries, n)
			want := g - m.demographic(n)/(2*n)
			if !(math.Abs(want-model.At(n)) <= 3*w.Off+1e-3) {
				t.Errorf("%s at %g: matched %g, fitted %g", breeding, n, want, model.At(n))
			}
			// Seven nodes of weather and four steps of the mean path are good to
			// about 1e-4 of growth: a tenth of the sampling error allowed here.
			if breeding == "pulse" || n == math.Round(m.capacity) {
				sd := deviation(x)
				if z := (mean(x) - want) / (sd / math.Sqrt(float64(len(x)))); !(math.Abs(z) < 5.73) {
					t.Errorf("%s at %g: mean log growth %.5g, matched %.5g (%.1f standard errors)", breeding, n, mean(x), want, z)
				}
			}
			if breeding == "pulse" {
				holdMoments(t, fmt.Sprintf("%s at %g", breeding, n), x, want, v+pulseDemography(m, n))
			}
		}
	}
}

// pulseDemography is the variance of log growth that demography adds in a pulse
// year with crowding: crowding makes part of it good within the year, as fewer
// survivors breed more. For survivors S and young B given S, with h(S) = S +
// S f(S), it is (h'(S)^2 Var S + S f) / h^2 at the mean (delta method).
func pulseDemography(m *matched, n float64) float64 {
	s := n * m.survival
	f := func(s float64) float64 { return s * m.birth * m.crowding.Births(s) }
	slope := 1 + (f(s*1.0001)-f(s*0.9999))/(s*0.0002)
	return (slope*slope*n*m.survival*(1-m.survival) + f(s)) / math.Pow(s+f(s), 2)
}

// TestCaseEntries: the case is a case: it builds, is written and read back with
// the same digest, every fitted number says what it was fitted to, and the
// uncertain tables name numbers of the case.
func TestCaseEntries(t *testing.T) {
	for _, o := range []CaseOptions{
		{Breeding: "pulse", Survival: 0.75, Split: 0.5},
		{Breeding: "flow", Generation: 5, Split: 0.3, Model: Exponential},
		{Breeding: "pulse", Survival: 0.6, Split: 1, Model: RickerModel},
		{Breeding: "pulse", Survival: 0.6, Split: 0.5, Model: GompertzModel},
	} {
		r := invented(t, 450)
		w, err := r.Case(o)
		if err != nil {
			t.Fatal(err)
		}
		c, faults := pva.Build(w.Entries)
		if len(faults) > 0 {
			t.Fatalf("%+v: %v", o, faults)
		}
		again, errs := casefile.Read("fitted.toml", casefile.Write(c))
		if len(errs) > 0 {
			t.Fatalf("%+v: %v\n%s", o, errs, casefile.Write(c))
		}
		if again.Digest() != c.Digest() {
			t.Errorf("%+v: written and read back it is another case", o)
		}
		if len(c.Uncertain) == 0 {
			t.Errorf("%+v: nothing is uncertain", o)
		}
		fittedTo := map[string]bool{}
		for _, e := range w.Entries {
			fittedTo[e.Path] = e.Source == "fitted to invented.csv, 1980-2014"
		}
		for path, yes := range fittedTo {
			if fit := strings.HasPrefix(path, "births.year_sd") || strings.HasPrefix(path, "deaths.year_sd") || strings.HasSuffix(path, ".sd"); fit && !yes {
				t.Errorf("%+v: %s does not say what it was fitted to", o, path)
			}
		}
		for _, path := range []string{"births.rate", "start.abundance", "case.count_years"} {
			if !fittedTo[path] {
				t.Errorf("%+v: %s does not say what it was fitted to", o, path)
			}
		}
		if fittedTo["deaths.fraction"] {
			t.Errorf("%+v: survival is said to be fitted", o)
		}
		if c.Start.Year.Value != 2015 || c.CountYears.Value != 35 {
			t.Errorf("start %v, years of counts %v", c.Start.Year, c.CountYears)
		}
		if (o.Model == RickerModel || o.Model == GompertzModel) && c.Births.Crowding.Form == "none" {
			t.Errorf("%+v: no crowding", o)
		}
		if !strings.Contains(strings.Join(w.How, " "), "single animals") {
			t.Errorf("%+v: the demographic part is not told: %v", o, w.How)
		}
	}
}

// TestGenerationTime: survival follows from the mean age of parents. In a pulse
// year it is the mean of the age at breeding over all breedings of a cohort; in
// a flow year, over the rate exp(-(d + r) a).
func TestGenerationTime(t *testing.T) {
	r := invented(t, 0)
	w, err := r.Case(CaseOptions{Breeding: "pulse", Generation: 4, Split: 0.5, Model: Exponential})
	if err != nil {
		t.Fatal(err)
	}
	lambda := math.Exp(w.Growth) // the growth that the case is written for
	num, den := 0.0, 0.0
	for k := 1; k < 2000; k++ {
		share := math.Pow(w.Survival/lambda, float64(k))
		num += float64(k) * share
		den += share
	}
	agreeTo(t, "mean age in a pulse year", num/den, 4, 1e-9)
	w, err = r.Case(CaseOptions{Breeding: "flow", Generation: 4, Split: 0.5, Model: Exponential})
	if err != nil {
		t.Fatal(err)
	}
	agreeTo(t, "mean age in a flow year", 1/(-math.Log(w.Survival)+w.Growth), 4, 1e-9)
}

// TestCaseRefusals: what counts cannot tell is asked for, and what cannot be is
// refused with the reason.
func TestCaseRefusals(t *testing.T) {
	r := invented(t, 0)
	for want, o := range map[string]CaseOptions{
		"give --breeding pulse":          {Survival: 0.7},
		"cannot tell births from deaths": {Breeding: "pulse"},
		"which says the same":            {Breeding: "pulse", Survival: 0.7, Generation: 3},
		"survival: 1.2 is not between":   {Breeding: "pulse", Survival: 1.2},
		"generation: -1 is not between":  {Breeding: "flow", Generation: -1},
		"split: 1.5 is not between":      {Breeding: "flow", Survival: 0.7, Split: 1.5},
		"goes with no survival":          {Breeding: "pulse", Generation: 0.9},
		"is not known; give exponential": {Breeding: "pulse", Survival: 0.7, Model: "cubic"},
		"leaves no room for births":      {Breeding: "pulse", Survival: 0.9999, Split: 1, Model: Exponential},
	} {
		if w, err := r.Case(o); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%+v: %v (%v), want %s", o, err, w, want)
		}
	}
}

// TestDeathsLaw: the logit-normal law of deaths has the mean stated, and the
// spread written is the one that package rates makes the same law of.
func TestDeathsLaw(t *testing.T) {
	m := &matched{target: target{survival: 0.8}}
	for _, v := range []float64{0, 0.1, 0.7, 2} {
		m.deathsAt(v)
		law, err := rates.NewFraction(0.2, m.deathSD())
		if err != nil {
			t.Fatal(err)
		}
		if v > 0 && !(math.Abs(law.V-v) < 1e-6 && math.Abs(law.U-m.u) < 1e-6) {
			t.Errorf("spread %g: %g and %g, package rates has %g and %g", v, m.u, m.v, law.U, law.V)
		}
	}
}

// TestDemographicVariance: without weather and crowding, the variance of the
// population after a year over its squared mean is the demographic variance
// over n, exactly (binomial survivors with Poisson young; N. T. J. Bailey 1964
// for the flow year).
func TestDemographicVariance(t *testing.T) {
	const n = 60.0
	for _, flow := range []bool{false, true} {
		m := &matched{target: target{flow: flow, survival: 0.7}, birth: 0.5}
		m.deathsAt(0)
		breeding := map[bool]string{false: "pulse", true: "flow"}[flow]
		x := firstYear(t, []pva.Entry{
			{Path: "question.threshold", Value: pva.Num(0)}, {Path: "question.horizon", Value: pva.Num(1)}, {Path: "start.abundance", Value: pva.Num(n)},
			{Path: "births.breeding", Value: pva.Text(breeding)}, {Path: "births.rate", Value: pva.Num(0.5)}, {Path: "deaths.fraction", Value: pva.Num(0.3)},
		}, n)
		ratio := make([]float64, len(x))
		for i, v := range x {
			ratio[i] = math.Exp(v)
		}
		growth := math.Exp(m.yearLog(n, 0.5, -math.Log(0.7)))
		holdMoments(t, breeding, ratio, growth, growth*growth*m.demographic(n)/n)
	}
}

// TestCaseUncertain: in a flow year births are the mean growth plus the deaths,
// and their variance between years is the weather's, so the laws of the case
// follow in closed form: the standard error of growth, and the root of the
// variance at both ends of its interval over the width of a normal one.
func TestCaseUncertain(t *testing.T) {
	r := invented(t, 0)
	w, err := r.Case(CaseOptions{Breeding: "flow", Survival: 0.8, Split: 1, Model: Exponential})
	if err != nil {
		t.Fatal(err)
	}
	sd := map[string]float64{}
	key := ""
	for _, e := range w.Entries {
		switch {
		case strings.HasPrefix(e.Path, "uncertain.") && strings.HasSuffix(e.Path, ".key"):
			key = e.Value.Text
		case strings.HasPrefix(e.Path, "uncertain.") && strings.HasSuffix(e.Path, ".sd"):
			sd[key] = e.Value.Num
		}
	}
	// Demography lowers growth by half its variance over n, which itself grows
	// a little with births: a part in a thousand at 400 animals.
	agreeTo(t, "births.rate", sd["births.rate"], r.growth().SE, 2e-3)
	v := r.variance(r.Model(Exponential))
	root := func(v float64) float64 { return math.Sqrt(math.Max(0, v-w.Demographic)) }
	agreeTo(t, "births.year_sd", sd["births.year_sd"], (root(v.High)-root(v.Low))/(2*1.959963985), 1e-5)
	if len(sd) != 2 {
		t.Errorf("uncertain: %v", sd)
	}
}

// TestCaseMemory: growth that goes on from year to year becomes memory of the
// weather; a rise that a fall follows, as errors of counting make it, does not.
func TestCaseMemory(t *testing.T) {
	for _, carry := range []float64{0.8, -0.8} {
		s := &Series{File: "invented.csv", TimeUnit: "year"}
		stream := rng.NewStream(91, 0, rng.Resample)
		n, e := 2e6, 0.0
		for y := 1980; y < 2020; y++ {
			s.Counts = append(s.Counts, Count{Year: float64(y), Count: math.Round(n)})
			e = carry*e + 0.15*rng.Normal(stream)
			n *= math.Exp(0.01 + e)
		}
		r, err := Fit(s, Options{Resamples: 100})
		if err != nil {
			t.Fatal(err)
		}
		if !strings.Contains(r.Risk.Withheld, "too correlated") {
			t.Errorf("carried over %g: %+v", carry, r.Diagnostics.Autocorrelation)
		}
		w, err := r.Case(CaseOptions{Breeding: "flow", Survival: 0.5, Split: 1, Model: Exponential})
		if err != nil {
			t.Fatal(err)
		}
		memory := 0.0
		for _, e := range w.Entries {
			if e.Path == "weather.memory" {
				memory = e.Value.Num
			}
		}
		if want := r.Diagnostics.Autocorrelation.Value; carry > 0 && math.Abs(memory-want) > 1e-7 || carry < 0 && memory != 0 {
			t.Errorf("carried over %g: memory %g, correlation %g", carry, memory, want)
		}
	}
}

// declining is an invented series of 25 counts, drawn with a mean log growth of
// -0.02, a process standard deviation of 0.14 and a counting error of 8 %. By
// chance its likelihood leaves nothing to the process, and the theta-logistic
// has the lowest AICc.
func declining(t *testing.T) *Result {
	t.Helper()
	s := &Series{File: "fen.csv", TimeUnit: "year"}
	for i, n := range []float64{136, 168, 127, 143, 142, 136, 152, 150, 175, 126, 113, 109, 112, 129, 103, 115, 109, 113, 159, 127, 94, 103, 108, 96, 93} {
		s.Counts = append(s.Counts, Count{Year: float64(2000 + i), Count: n})
	}
	r, err := Fit(s, Options{Threshold: 20, Horizon: 30, Resamples: 100})
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// TestCaseIsNoSurerThanTheCounts: a case of which nobody named the model is not
// the theta-logistic, and one whose split leaves no process variance keeps the
// variance of the drift model; both are told, and so is an assumed breeding.
func TestCaseIsNoSurerThanTheCounts(t *testing.T) {
	r := declining(t)
	if r.Best != ThetaModel || r.Split.Process.Value != 0 || !(r.Split.Observation.Value > 0) {
		t.Fatalf("the series shows nothing: best %s, split %+v", r.Best, r.Split)
	}
	o := CaseOptions{Breeding: "pulse", BreedingAssumed: true, Survival: 0.8, Split: 0.5, ThresholdSaid: true, HorizonSaid: true}
	w, err := r.Case(o)
	if err != nil {
		t.Fatal(err)
	}
	if w.Model != RickerModel {
		t.Errorf("the case is %s", w.Model)
	}
	told := strings.Join(w.How, " ")
	for _, d := range w.Doubts {
		told += " " + d.Text
	}
	for _, want := range []string{"only if --model names it", "can look like crowding", "assumed to come once a year"} {
		if !strings.Contains(told, want) {
			t.Errorf("does not tell %q: %s", want, told)
		}
	}
	o.Model, o.BreedingAssumed = Exponential, false
	if w, err = r.Case(o); err != nil {
		t.Fatal(err)
	}
	if !(w.Variance == r.Drift.Variance.Value && w.Weather > 0) {
		t.Errorf("variance %g with weather %g, want the whole %g", w.Variance, w.Weather, r.Drift.Variance.Value)
	}
	if !strings.Contains(w.Doubts[0].Text, "leaves nothing to the process") {
		t.Errorf("the variance kept is not told: %v", w.Doubts)
	}
	for _, e := range w.Entries {
		if e.Value.Kind == pva.NumberKind && e.Source == "" {
			t.Errorf("%s has no source", e.Path)
		}
	}
}
