package estimate

import (
	"math"
	"sort"

	"ebbline/pva"
)

// bins is about how many bars a histogram of risks has.
const bins = 20

// DrawnRisk fills in what follows from the counts and the exact risks of a
// DrawnRisk (Fallen, Exact and ExactError): the pooled risk, the law of the risk
// over the draws, the chance that it is within the limit, and where the variance
// is from. each is the replicates a draw.
func DrawnRisk(r *pva.DrawnRisk, each int64, limit pva.Optional, confidence float64) {
	var s DrawSums
	for _, x := range r.Fallen {
		s.Add(x)
	}
	r.Pooled = s.Pooled(each, confidence)
	r.Spread = SplitVariance(r.Fallen, each)
	r.FitTail = 1
	switch {
	case len(r.Exact) > 0:
		exactLaw(r, each, limit, confidence)
	case each < 2:
		r.Law.Reason = "with one replicate a draw, what the inputs do cannot be told from chance"
	default:
		fittedLaw(r, each, limit, confidence)
	}
}

// exactLaw takes the exact risks of the draws as they are.
func exactLaw(r *pva.DrawnRisk, each int64, limit pva.Optional, confidence float64) {
	mean, low, high := BetweenDraws(r.Exact, confidence)
	r.Mean = pva.Chance{Estimate: mean, Low: math.Max(0, low-r.ExactError), High: math.Min(1, high+r.ExactError)}
	_, variance := moments(r.Exact)
	sorted := append([]float64(nil), r.Exact...)
	sort.Float64s(sorted)
	below := func(p float64) float64 {
		return float64(sort.Search(len(sorted), func(i int) bool { return sorted[i] > p })) / float64(len(sorted))
	}
	point := func(p float64) float64 { return sorted[max(0, int(math.Ceil(p*float64(len(sorted))-1e-9))-1)] }
	r.Law = pva.RiskLaw{Exact: true, Mean: mean, SD: math.Sqrt(variance), Percentiles: percentPoints(point)}
	r.Law.Bins = histogram(r, each, sorted[len(sorted)-1], below)
	if limit.Set {
		within := int64(math.Round(below(limit.Value) * float64(len(sorted))))
		p := Proportion(within, int64(len(sorted)), confidence)
		r.Within = &pva.Chance{Estimate: p.Estimate, Low: p.Low, High: p.High}
	}
}

// fittedLaw fits a beta law.
func fittedLaw(r *pva.DrawnRisk, each int64, limit pva.Optional, confidence float64) {
	f := FitBeta(r.Fallen, each)
	r.Law = pva.RiskLaw{Mean: f.Mean, SD: f.SD(), Alpha: math.Inf(1), Beta: math.Inf(1), Percentiles: percentPoints(f.Quantile)}
	if f.Spread > 0 {
		r.Law.Alpha, r.Law.Beta = f.Shapes()
	}
	r.Law.Bins = histogram(r, each, f.Quantile(0.999), f.Below)
	if limit.Set {
		estimate, low, high := f.Within(limit.Value, confidence)
		r.Within = &pva.Chance{Estimate: estimate, Low: low, High: high}
		r.FitTail = f.tailAt(int64(math.Floor(limit.Value*float64(each) + 1e-9)))
	}
}

func percentPoints(at func(p float64) float64) pva.Percentiles {
	return pva.Percentiles{P05: at(0.05), P25: at(0.25), P50: at(0.5), P75: at(0.75), P95: at(0.95)}
}

// histogram cuts the risks from 0 up to about most, and on to the largest share
// seen, into bars of a round width. The first bar holds 0 too; the last one ends
// at 1 at the latest.
func histogram(r *pva.DrawnRisk, each int64, most float64, below func(p float64) float64) []pva.RiskBin {
	for _, x := range r.Fallen {
		most = math.Max(most, float64(x)/float64(each))
	}
	width := roundWidth(math.Max(most, 1e-9) / bins)
	n := max(1, int(math.Ceil(most/width-1e-9)))
	out := make([]pva.RiskBin, n)
	edge := func(i int) float64 { return math.Min(1, float64(i)*width) }
	for i := range out {
		out[i] = pva.RiskBin{Low: edge(i), High: edge(i + 1)}
		out[i].Share = below(edge(i + 1))
		if i > 0 {
			out[i].Share -= below(edge(i))
		}
	}
	out[n-1].Share += 1 - below(out[n-1].High) // what little lies beyond
	for _, x := range r.Fallen {
		i := int(math.Ceil(float64(x)/float64(each)/width-1e-9)) - 1
		out[min(n-1, max(0, i))].Seen += 1 / float64(len(r.Fallen))
	}
	return out
}

// roundWidth is the least of 1, 2 and 5 times powers of ten at or above w.
func roundWidth(w float64) float64 {
	unit := math.Pow(10, math.Floor(math.Log10(w)))
	for _, f := range []float64{1, 2, 5} {
		if f*unit >= w*(1-1e-9) {
			return f * unit
		}
	}
	return 10 * unit
}
