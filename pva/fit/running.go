package fit

import "math"

// RunningSums are drift and process variance by the slope method, a second
// opinion on the split of process from observation error: sums of three counts
// in a row have little of the errors of single counts, and the variance of the
// log ratio of sums k apart rises with k by the process variance (E. E. Holmes
// 2001, PNAS 98:5072-5077; the sums of three and the lags 1 to 4 from memory).
// Sums less than three apart share counts, so that for small variances the slope
// is in the mean 0.93 of the process variance and 0.16 of the error's. It has no
// interval; it decides nothing.
type RunningSums struct {
	Mu       float64              // mean log ratio of neighbouring sums
	Variance float64              // slope of ByLag on the lag; below 0 it says nothing
	ByLag    [runningLags]float64 // variances of the log ratios, lags 1 to 4; divisor one less than their number
}

const (
	runningLength = 3
	runningLags   = 4
)

// runningSums is nil unless the counts are a time unit apart throughout and
// there are MinimumRisk of them.
func runningSums(p *prepared) *RunningSums {
	if len(p.n) < MinimumRisk || len(oneYearSteps(p).r) != p.steps() {
		return nil
	}
	sums := make([]float64, len(p.n)-runningLength+1)
	for i := range sums {
		for _, n := range p.n[i : i+runningLength] {
			sums[i] += n
		}
	}
	out := &RunningSums{}
	lags := make([]float64, runningLags)
	for k := range lags {
		lags[k] = float64(k + 1)
		var ratios []float64
		for i := k + 1; i < len(sums); i++ {
			ratios = append(ratios, math.Log(sums[i]/sums[i-k-1]))
		}
		sd := deviation(ratios)
		out.ByLag[k] = sd * sd
		if k == 0 {
			out.Mu = mean(ratios)
		}
	}
	out.Variance = straight(lags, out.ByLag[:]).b
	return out
}
