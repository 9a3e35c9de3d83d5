package fit

import (
	"fmt"
	"math"
	"strconv"

	"ebbline/pva"
	"ebbline/pva/rates"
)

// CaseOptions say how a case is made from a fit. Counts alone give neither
// births nor deaths, so Breeding must be stated, and Survival or Generation.
type CaseOptions struct {
	Breeding string // "pulse" or "flow"
	// BreedingAssumed says that nobody stated Breeding: the case tells so.
	BreedingAssumed bool

	Survival   float64 // mean share of the counted animals that survive a time unit; 0 is not stated
	Generation float64 // mean age of parents, in time units from when an animal is first counted; 0 is not stated
	// Split is the share of the environmental variance of log growth that is
	// given to births, 0 to 1; the rest goes to deaths.
	Split float64
	// Model is the model of growth; "" is the one of the lowest AICc, the
	// theta-logistic left out: its exponent and capacity are found so badly from
	// counts (F. Clark et al. 2010, Methods Ecol. Evol. 1:253-262), and without
	// standard errors, that a case would be surer than the counts are.
	Model         string
	ThresholdSaid bool // the threshold and horizon of the fit were stated, not defaults
	HorizonSaid   bool
}

// Written is a case made from a fit: its entries, ready for pva.Build, and in
// words how they were made.
type Written struct {
	Entries []pva.Entry
	How     []string
	Doubts  []pva.Warning

	Model       string
	Survival    float64 // as stated, or from the generation time
	Growth      float64 // mean log growth fitted (exponential), NaN with crowding
	Variance    float64 // of log growth, as fitted
	Demographic float64 // the part of it that single births and deaths make
	Weather     float64 // the rest
	Off         float64 // root mean squared distance from the fitted curve

	Start   float64 // mean abundance at the start, in whole units
	StartCV float64 // its coefficient of variation, 0 for none
}

// Case makes a case that reproduces the fitted mean growth, variance and
// crowding. It is an error if what counts cannot tell is not stated, if the
// fit carries no case, or if the stated survival cannot go with the fitted
// growth.
func (r *Result) Case(o CaseOptions) (*Written, error) {
	model, err := r.caseModel(o)
	if err != nil {
		return nil, err
	}
	start, cv := r.start(model)
	if start < 1 {
		return nil, fmt.Errorf("counts: the last one, %g, makes a start of less than one unit; count in smaller units", r.LastCount)
	}
	t := r.target(model, o)
	if t.survival, err = r.survival(o, t); err != nil {
		return nil, err
	}
	m, err := r.matchBest(model, t)
	if err != nil {
		return nil, err
	}
	if r.separated() && !r.Split.Stated && !m.crowded && m.weather == 0 {
		return r.together(o)
	}
	w := &Written{Model: model.Name, Survival: t.survival, Growth: math.NaN(), Variance: t.variance, Demographic: m.demography, Weather: m.weather, Off: m.off, Start: start, StartCV: cv}
	if !m.crowded {
		w.Growth = t.curve(1)
	}
	b := &caseWriter{r: r, o: o, model: model, m: m, w: w}
	b.write()
	return w, nil
}

// caseModel checks what must be stated and is the model of growth to use.
func (r *Result) caseModel(o CaseOptions) (*Model, error) {
	switch {
	case o.Breeding != "pulse" && o.Breeding != "flow":
		return nil, fmt.Errorf("breeding: %q is not stated; give --breeding pulse (births once a %s) or --breeding flow (births all through it)", o.Breeding, r.unit())
	case o.Survival == 0 && o.Generation == 0:
		return nil, fmt.Errorf("survival: not stated, and counts alone cannot tell births from deaths; give --survival (mean share that survives a %s) or --generation (mean age of parents)", r.unit())
	case o.Survival != 0 && o.Generation != 0:
		return nil, fmt.Errorf("survival: given beside a generation time, which says the same; keep one of them")
	case o.Survival != 0 && !(o.Survival > 0 && o.Survival < 1):
		return nil, fmt.Errorf("survival: %g is not between 0 and 1; give the mean share that survives a %s", o.Survival, r.unit())
	case o.Generation != 0 && !(o.Generation > 0 && o.Generation <= 1000):
		return nil, fmt.Errorf("generation: %g is not between 0 and 1000; give the mean age of parents", o.Generation)
	case !(o.Split >= 0 && o.Split <= 1):
		return nil, fmt.Errorf("split: %g is not between 0 and 1; give the share of the variance that births have", o.Split)
	case r.Counts < MinimumRisk:
		return nil, fmt.Errorf("counts: %d are too few for a case (at least %d)", r.Counts, MinimumRisk)
	case len(r.ZeroYears) > 0 && r.ZeroYears[len(r.ZeroYears)-1] >= r.Last:
		return nil, fmt.Errorf("counts: the last one is 0: there is no population to start from")
	}
	name := o.Model
	if name == "" {
		name = r.modelToWrite()
	}
	m := r.model(name)
	switch {
	case m == nil:
		return nil, fmt.Errorf("model: %q is not known; give %s, %s, %s or %s", name, Exponential, RickerModel, GompertzModel, ThetaModel)
	case name != Exponential && m.Refused != "":
		return nil, fmt.Errorf("model: %s: %s; choose another model", name, m.Refused)
	case name == ThetaModel && m.Theta > 100:
		return nil, fmt.Errorf("model: %s: an exponent of %.3g is a wall and no curve; choose another model", name, m.Theta)
	}
	return m, nil
}

// modelToWrite is the model of a case whose maker names none.
func (r *Result) modelToWrite() string {
	best := (*Model)(nil)
	for i := range r.Models {
		m := &r.Models[i]
		if m.Refused == "" && m.Name != ThetaModel && (best == nil || m.AICc < best.AICc) {
			best = m
		}
	}
	if best == nil || r.Best == "" {
		return Exponential // too few steps of one time unit to compare models
	}
	return best.Name
}

// target is what the case is to reproduce, without the survival.
func (r *Result) target(model *Model, o CaseOptions) target {
	t := target{flow: o.Breeding == "flow", births: o.Split, at: r.p.n[:len(r.p.n)-1]}
	if model.Name == Exponential {
		mu := r.growth().Value
		t.curve = func(float64) float64 { return mu }
		t.variance = r.variance(model).Value
		return t
	}
	t.at = oneYearSteps(r.p).n
	t.crowded = true
	t.curve = model.At
	t.capacity = model.Capacity.Value
	t.variance = r.variance(model).Value
	t.exponent = model.Theta
	return t
}

// growth is the drift in force: that of the state-space model where it takes
// out observation error.
func (r *Result) growth() Estimate {
	if r.separated() {
		return r.Split.Mu
	}
	return r.Drift.Mu
}

// variance is the variance of log growth in force, with its interval.
func (r *Result) variance(model *Model) Estimate {
	if model.Name == Exponential {
		if r.separated() {
			return r.Split.Process
		}
		return r.Drift.Variance
	}
	v := model.ResidualSD * model.ResidualSD
	nu := float64(model.Steps - (model.Parameters - 1))
	low, high := varianceInterval(v, nu, r.Options.Confidence)
	return Estimate{v, low, high, v * math.Sqrt(2/nu)}
}

// survival is the stated one, or that of the stated generation time. In a pulse
// year those first counted at a census breed from the next year on, so that
// parents are 1/(1 - S/lambda) years old in the mean, in a flow year 1/b, with
// b - d = ln lambda (age distribution stable at the fitted growth; H. Caswell
// 2001, Matrix Population Models, ch. 5).
func (r *Result) survival(o CaseOptions, t target) (float64, error) {
	s := o.Survival
	if s == 0 {
		g := r.growth().Value
		if t.crowded {
			g = 0 // around the capacity, in the mean
		}
		if t.flow {
			s = math.Exp(g - 1/o.Generation)
		} else {
			s = math.Exp(g) * (1 - 1/o.Generation)
		}
		if !(s > 0 && s < 1) {
			return 0, fmt.Errorf("generation: %g goes with no survival between 0 and 1 at the fitted growth of %.4g a %s; check it, or give --survival", o.Generation, g, r.unit())
		}
	}
	return s, nil
}

// matchBest matches the rates, with crowding by the form that comes closest to
// the fitted curve.
func (r *Result) matchBest(model *Model, t target) (*matched, error) {
	forms := []rates.Form{rates.None}
	switch {
	case model.Name == ThetaModel:
		forms = []rates.Form{rates.Theta}
	case t.crowded:
		forms = []rates.Form{rates.Ricker, rates.Linear, rates.Hyperbolic}
	}
	var best *matched
	for _, f := range forms {
		t.form = f
		if m, ok := match(t, roundsToCompare); ok && (best == nil || m.off < best.off) {
			best = m
		}
	}
	if best != nil {
		if m, ok := match(best.target, roundsToSettle); ok {
			return m, nil
		}
	}
	if !t.crowded {
		if need := t.curve(1); need <= math.Log(t.survival)+1e-3 {
			return nil, fmt.Errorf("survival: %.4g leaves no room for births: the fitted growth is a factor of %.4g a %s; give a survival below that", t.survival, math.Exp(need), r.unit())
		}
	}
	return nil, fmt.Errorf("split: with %.0f %% of it in births, no weather reproduces a variance of log growth of %.4g at a survival of %.4g (births may vary by three times their mean at most); give another share (--split) or survival", 100*t.births, t.variance, t.survival)
}

// caseWriter puts a case together.
type caseWriter struct {
	r     *Result
	o     CaseOptions
	model *Model
	m     *matched
	w     *Written
}

func (b *caseWriter) source() string {
	return fmt.Sprintf("fitted to %s, %s-%s", b.r.Series.File, dateText(b.r.First), dateText(b.r.Last))
}

func (b *caseWriter) put(path string, v pva.Value, source, note string) {
	b.w.Entries = append(b.w.Entries, pva.Entry{Path: path, Value: v, Source: source, Note: note, Origin: pva.FromCase})
}

func (b *caseWriter) number(path string, v float64, source, note string) {
	b.put(path, pva.Num(rounded(v)), source, note)
}

func (b *caseWriter) how(format string, args ...any) {
	b.w.How = append(b.w.How, fmt.Sprintf(format, args...))
}

func (b *caseWriter) doubt(format string, args ...any) {
	b.w.Doubts = append(b.w.Doubts, pva.Warning{Text: fmt.Sprintf(format, args...)})
}

// rounded keeps eight significant digits: far more than any series carries.
func rounded(v float64) float64 {
	out, _ := strconv.ParseFloat(strconv.FormatFloat(v, 'g', 8, 64), 64)
	return out
}

func (b *caseWriter) write() {
	r, m, src := b.r, b.m, b.source()
	u := r.unit()
	b.put("case.title", pva.Text("Fitted to "+r.Series.File), "", "")
	if u != "year" {
		b.put("case.time_unit", pva.Text(u), "", "")
	}
	b.number("case.count_years", math.Round(r.Drift.Span)+1, src, "")
	b.asked()
	b.start()
	if u == "year" && r.Last == math.Trunc(r.Last) {
		b.number("start.year", r.Last+1, src, "the year after the last count")
	}
	b.put("births.breeding", pva.Text(b.o.Breeding), "", "")
	b.number("births.rate", m.birth, src, b.birthNote())
	b.spread("births.year_sd", m.birthSD(), b.o.Split)
	b.number("deaths.fraction", 1-m.survival, b.survivalSource(), "1 - survival; counts alone cannot tell births from deaths")
	b.spread("deaths.year_sd", m.deathSD(), 1-b.o.Split)
	if m.crowded {
		b.crowding(src)
	}
	if e, ok := b.memory(); ok {
		b.number("weather.memory", e, src, "lag-1 correlation of the residuals of growth")
		b.how("The residuals are correlated from one %s to the next; the case carries that as memory of the weather (%.3g).", u, e)
	}
	b.explain()
	b.uncertain()
}

func (b *caseWriter) asked() {
	o := b.r.Options
	said := func(said bool) (string, string) {
		if said {
			return "stated for the fit", ""
		}
		return "assumed", "set by default: state your own"
	}
	source, note := said(b.o.ThresholdSaid)
	threshold := o.Threshold
	if !b.o.ThresholdSaid {
		threshold = math.Max(1, math.Round(threshold))
	}
	b.number("question.threshold", threshold, source, note)
	source, note = said(b.o.HorizonSaid)
	b.number("question.horizon", float64(o.Horizon), source, note)
	if o.Confidence != defaultConfidence {
		b.number("question.confidence", o.Confidence, "stated for the fit", "")
	}
}

func (b *caseWriter) survivalSource() string {
	if b.o.Survival != 0 {
		return "stated for the fit (survival " + strconv.FormatFloat(b.o.Survival, 'g', -1, 64) + ")"
	}
	return "from the stated generation time of " + strconv.FormatFloat(b.o.Generation, 'g', -1, 64)
}

func (b *caseWriter) birthNote() string {
	note := fmt.Sprintf("solved for a mean log growth of %.4g at the stated survival", b.w.Growth)
	if b.m.crowded {
		note = fmt.Sprintf("solved for the %s curve of growth at the stated survival", b.model.Name)
	}
	if b.o.BreedingAssumed {
		note += fmt.Sprintf("; births once a %s are assumed", b.r.unit())
	}
	return note
}

// spread writes a between-year standard deviation, unless it is none.
func (b *caseWriter) spread(path string, v, share float64) {
	if v > 0 {
		b.number(path, v, b.source(), fmt.Sprintf("%.0f %% of the environmental variance of log growth, %.4g", 100*share, b.m.weather))
	}
}

func (b *caseWriter) crowding(src string) {
	m := b.m
	name := map[rates.Form]string{rates.Linear: "linear", rates.Ricker: "ricker", rates.Hyperbolic: "hyperbolic", rates.Theta: "theta"}[m.form]
	b.put("births.crowding.form", pva.Text(name), "", "")
	b.number("births.crowding.capacity", m.rests(), src, fmt.Sprintf("the mean rates balance here; with weather the mean log growth is 0 at the fitted %.4g; crowding is put on births, as counts cannot say which side crowds", m.capacity))
	if m.form == rates.Theta {
		b.number("births.crowding.exponent", m.exponent, src, "")
	}
	if m.off > b.model.ResidualSD/4 {
		b.doubt("the case's growth lies %.3g from the fitted curve over the counts, root mean square; the scatter of the counts around it is %.3g", m.off, b.model.ResidualSD)
	}
}

// memory is the lag-1 correlation that goes into the case, if the counts show
// one from each time unit to the next. One below 0 is left out: errors of
// counting make such a correlation, and they are none of the weather's.
func (b *caseWriter) memory() (float64, bool) {
	if b.r.Steps != b.r.Drift.Intervals || b.m.weather == 0 {
		return 0, false
	}
	e := b.r.Diagnostics.Autocorrelation
	if b.m.crowded {
		r := b.model.Autocorrelation
		half := normalQuantile(b.r.Options.Confidence) * math.Sqrt((1-r*r)/float64(b.model.Steps))
		e = Estimate{r, r - half, r + half, math.NaN()}
	}
	return math.Min(0.99, e.Value), e.Low > 0
}
