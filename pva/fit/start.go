package fit

import (
	"fmt"
	"math"

	"ebbline/pva"
)

// State is what the counts say of the abundance itself at the last count, its
// error of counting filtered out: the logarithm of the abundance is normal.
type State struct {
	Log      float64 // mean of the logarithm
	Variance float64 // of the logarithm
}

// Mean is the mean abundance, that of the log-normal law.
func (s State) Mean() float64 { return math.Exp(s.Log + s.Variance/2) }

// CV is the coefficient of variation of the abundance.
func (s State) CV() float64 { return math.Sqrt(math.Expm1(s.Variance)) }

// State is the abundance behind the last count, nil where observation error is
// not parted from the process.
func (r *Result) State() *State {
	if !r.separated() {
		return nil
	}
	return &r.Split.Last
}

// separated says whether observation error is taken out of the variance. A
// fitted split that leaves no process variance at all is not followed: the
// likelihood often peaks there by chance (B. Dennis et al. 2006, Ecol. Monogr.
// 76:323-341), and a case without weather would be surer than the counts are.
func (r *Result) separated() bool {
	s := r.Split
	return !r.unparted && (s.Stated || s.Observation.Value > 0 && s.Process.Value > 0)
}

// together makes the case with the error of counting left in the variance. A
// fitted split whose process variance is below what single births and deaths
// make would leave no weather at all, as one of none would.
func (r *Result) together(o CaseOptions) (*Written, error) {
	whole := *r
	whole.unparted = true
	w, err := whole.Case(o)
	if err != nil {
		return nil, err
	}
	w.Doubts = append(w.Doubts, pva.Warning{Text: fmt.Sprintf("the fitted split leaves a process variance of %.2g, below what single births and deaths make, and is not followed: the error of counting stays in the variance that makes the weather; state the counts' own errors (column se or cv) if they are known", r.Split.Process.Value)})
	return w, nil
}

// mostCV is the widest start of a case.
const mostCV = 10

// start is the abundance with which a case of a model begins, in whole units,
// and its coefficient of variation. The error of the last count enters a case
// once: either it is parted from the process, and the start is the filtered
// state with what is left open of it; or it is in the variance that makes the
// weather, and the start is the last count as it is. With crowding it is always
// in the variance, even where the errors are stated. It cannot be subtracted
// there: growth is regressed on a count that has the same error in it, so that
// part of the error is in the slope, which it makes too steep, and the scatter
// is not the process variance plus twice the error's.
func (r *Result) start(model *Model) (abundance, cv float64) {
	if s := r.State(); s != nil && model.Name == Exponential {
		return math.Round(s.Mean()), math.Min(mostCV, s.CV())
	}
	return math.Round(r.LastCount), 0
}

// start writes the start of the case.
func (b *caseWriter) start() {
	note := "the last count"
	if b.filtered() {
		note = "filtered state of the last count, its error of counting taken out: mean of its log-normal law"
	}
	b.number("start.abundance", b.w.Start, b.source(), note)
	if b.w.StartCV > 0 {
		b.number("start.cv", b.w.StartCV, b.source(), "from the variance of the filtered state")
	}
}

// filtered says whether the case starts from the filtered state.
func (b *caseWriter) filtered() bool { return b.r.separated() && !b.m.crowded }

// explainStart says where the start is from.
func (b *caseWriter) explainStart() {
	switch {
	case b.filtered():
		s := b.r.State()
		b.how("The case starts from the filtered state of the last count of %.4g: a log-normal law of mean %.4g and coefficient of variation %.2g, in which the counts before it have a say.", b.r.LastCount, s.Mean(), s.CV())
	case b.r.Split.Stated || b.r.Split.Observation.Value > 0:
		b.how("The case starts from the last count as it is: its error is in the variance that makes the weather, and is not counted twice.")
	}
}
