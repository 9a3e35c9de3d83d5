package fit

import (
	"fmt"
	"math"
	"strings"

	"ebbline/pva"
)

// Options say what is asked of a series. The zero value of a field is its
// default.
type Options struct {
	Threshold  float64  // abundance counted as fallen; default a tenth of the last count, in whole units
	Horizon    int      // time units ahead; default 50, at most 1000
	Confidence float64  // level of every interval; default 0.95
	Seed       uint64   // names the random numbers of those draws; default 1
	Resamples  int      // draws of drift and variance for the risk's interval; default 2000
	Zeros      ZeroRule // what a count of 0 means
}

// The defaults of Options.
const (
	defaultHorizon    = 50
	defaultConfidence = 0.95
	defaultResamples  = 2000
	mostHorizon       = 1000
)

// Result is all that a series gives.
type Result struct {
	Series  *Series
	Options Options // with the defaults in force

	First, Last float64 // dates of the first and last count used
	Counts      int     // counts used
	ZeroYears   []float64
	LastCount   float64 // abundance at the last count, corrected for effort
	MeanEffort  float64 // 0 without efforts

	Drift       *Drift
	Models      []Model
	Steps       int    // steps of one unit of time, of Drift.Intervals
	Best        string // the model of the lowest AICc, "" if none stands
	Likely      *Split // by maximum likelihood
	Split       *Split // by restricted maximum likelihood
	Risk        *Risk
	Diagnostics *Diagnostics
	Doubts      []pva.Warning

	p        *prepared
	unparted bool // the split is not followed: it would leave a case no weather
}

// Fit fits a series. It is an error if the counts have no answer at all: too
// few, zeros without a rule, no variation.
func Fit(s *Series, o Options) (*Result, error) {
	p, err := prepare(s, o.Zeros)
	if err != nil {
		return nil, err
	}
	if o, err = o.complete(p); err != nil {
		return nil, err
	}
	r := &Result{Series: s, Options: o, First: p.year[0], Last: p.year[len(p.year)-1], Counts: len(p.n), ZeroYears: p.zeros, LastCount: p.last(), MeanEffort: p.effort, p: p}
	if r.Drift, err = fitDrift(p, o.Confidence); err != nil {
		return nil, err
	}
	one := oneYearSteps(p)
	r.Steps = len(one.r)
	r.Models = fitModels(one, o.Confidence)
	for _, m := range r.Models {
		if m.Refused == "" && (r.Best == "" || m.AICc < r.model(r.Best).AICc) {
			r.Best = m.Name
		}
	}
	r.Likely = fitSplit(p, false, o.Confidence)
	r.Split = fitSplit(p, true, o.Confidence)
	r.Diagnostics = diagnose(p, r.Drift, o.Confidence)
	r.Risk = r.risk()
	r.Doubts = r.doubts()
	return r, nil
}

func (o Options) complete(p *prepared) (Options, error) {
	if o.Threshold == 0 {
		o.Threshold = p.last() / 10
		if o.Threshold >= 1 { // whole animals, as a case has them
			o.Threshold = math.Floor(o.Threshold)
		}
	}
	if o.Horizon == 0 {
		o.Horizon = defaultHorizon
	}
	if o.Confidence == 0 {
		o.Confidence = defaultConfidence
	}
	if o.Seed == 0 {
		o.Seed = 1
	}
	if o.Resamples == 0 {
		o.Resamples = defaultResamples
	}
	switch {
	case !(o.Threshold > 0) || o.Threshold > largest:
		return o, fmt.Errorf("threshold: %g is not above 0; the growth of counts never reaches 0, so give a number at which too few are left", o.Threshold)
	case o.Horizon < 1 || o.Horizon > mostHorizon:
		return o, fmt.Errorf("horizon: %d is not between 1 and %d; give the years to look ahead", o.Horizon, mostHorizon)
	case !(o.Confidence > 0.5 && o.Confidence < 1):
		return o, fmt.Errorf("confidence: %g is not between 0.5 and 1; give 0.95 for 95 %%", o.Confidence)
	case o.Resamples < 100 || o.Resamples > 1_000_000:
		return o, fmt.Errorf("resamples: %d is not between 100 and 1000000", o.Resamples)
	}
	return o, nil
}

// Model is the model of that name, nil if there is none.
func (r *Result) Model(name string) *Model { return r.model(name) }

func (r *Result) model(name string) *Model {
	for i := range r.Models {
		if r.Models[i].Name == name {
			return &r.Models[i]
		}
	}
	return nil
}

// risk is the risk, or the reason why none is stated.
func (r *Result) risk() *Risk {
	var parted *Split
	if r.separated() {
		parted = r.Split
	}
	out := fitRisk(r.p, r.Drift, parted, r.Options)
	switch {
	case r.Counts < MinimumRisk:
		out.Withheld = fmt.Sprintf("%d counts are too few for a risk (at least %d)", r.Counts, MinimumRisk)
	case len(r.ZeroYears) > 0 && r.ZeroYears[len(r.ZeroYears)-1] >= r.Last:
		out.Withheld = "the last count is 0"
	case r.Diagnostics.correlated():
		out.Withheld = fmt.Sprintf("residuals too correlated: %s from one change to the next, and the formula takes the changes as independent", correlationText(r.Diagnostics.Autocorrelation))
	}
	return out
}

func correlationText(e Estimate) string {
	return fmt.Sprintf("%.2f (%.2f to %.2f)", e.Value, e.Low, e.High)
}

// unit is the word for one step, and units its plural.
func (r *Result) unit() string { return r.Series.TimeUnit }

func (r *Result) doubts() []pva.Warning {
	var out []pva.Warning
	doubt := func(format string, args ...any) { out = append(out, pva.Warning{Text: fmt.Sprintf(format, args...)}) }
	g := r.Diagnostics
	u := r.unit()
	if len(r.ZeroYears) > 0 {
		what := "are left out as if nobody had counted"
		if r.Options.Zeros == ZerosHalf {
			what = "are set to half of the smallest count above 0 (common practice, no source)"
		}
		doubt("counts of 0 (%s) %s; both growth and its variance depend on that choice", dates(r.ZeroYears), what)
	}
	if g.correlated() {
		if g.Autocorrelation.High < 0 {
			doubt("a rise tends to be followed by a fall (correlation %s), as errors of counting make it, or crowding", correlationText(g.Autocorrelation))
		}
		doubt("growth of one %s and the next are correlated, %s: the intervals of drift and variance take them as independent and are wrong for this series", u, correlationText(g.Autocorrelation))
	}
	if g.TrendP < 1-r.Options.Confidence {
		doubt("growth has a trend over the counts (%+.3g standard deviations a %s, p = %.2g): the future need not be like their average", g.Trend.Value, u, g.TrendP)
	}
	for _, o := range g.Outlying {
		kind := "bonanza"
		if o.Down {
			kind = "catastrophe"
		}
		how := fmt.Sprintf("p = %.2g over all", o.P)
		if o.P == 0 {
			how = "which are all alike"
		}
		doubt("the change from %s to %s (times %.3g) lies far outside the others (%s): a candidate %s, to be looked up and stated as one if it was", dateText(o.From), dateText(o.To), o.Factor, how, kind)
	}
	switch s := r.Split; {
	case s.Stated && s.Process.Value == 0:
		doubt("the stated errors of the counts explain all that they change; no process variance is left")
	case s.Stated:
	case !s.Apart:
		doubt("process and observation error cannot be told apart: observation error may be anything from %.0f to %.0f %% of the variance of a one-%s change; state the counts' own errors (column se or cv) if they are known", 100*s.Share.Low, 100*s.Share.High, u)
	case s.Observation.Value == 0:
		doubt("the counts show no observation error, which does not mean that there is none: up to %.0f %% of the variance of a one-%s change would pass unseen", 100*s.Share.High, u)
	}
	if r.Options.Threshold >= r.LastCount {
		doubt("the last count, %.4g, is at or below the threshold of %.4g: the population has fallen already, and the risk says nothing", r.LastCount, r.Options.Threshold)
	}
	if float64(r.Options.Horizon) > r.Drift.Span/5 {
		doubt("looking %d %ss ahead needs five times as many of counts (Fieberg & Ellner 2000, Ecology 81:2040-2047); these span %s", r.Options.Horizon, u, dateText(r.Drift.Span))
	}
	// Two units of the criterion are the usual line (K. P. Burnham & D. R.
	// Anderson 2002, Model Selection and Multimodel Inference, ch. 2).
	switch m := r.model(r.Best); {
	case m == nil || m.Name == Exponential:
	case r.model(Exponential).AICc-m.AICc >= 2:
		doubt("crowding is supported (%s, weight %.2f): the risk by the drift model leaves it out; write a case to assess it", m.Name, m.Weight)
	default:
		doubt("the counts do not decide whether there is crowding (%s %.2f, %s %.2f by weight): assess cases with and without it", m.Name, m.Weight, Exponential, r.model(Exponential).Weight)
	}
	if r.Counts < MinimumRisk {
		doubt("%d counts are few: the variance is likely to be underestimated", r.Counts)
	}
	for _, n := range r.p.n {
		if n != math.Trunc(n) && !r.Series.Effort && r.Options.Zeros != ZerosHalf {
			doubt("the counts are not whole numbers: say in a case how many animals one unit is (case.unit_size)")
			break
		}
	}
	return out
}

func dates(years []float64) string {
	parts := make([]string, 0, len(years))
	for i, y := range years {
		if i == 5 {
			parts = append(parts, fmt.Sprintf("and %d more", len(years)-5))
			break
		}
		parts = append(parts, dateText(y))
	}
	return strings.Join(parts, ", ")
}
