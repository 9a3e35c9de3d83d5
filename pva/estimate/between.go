package estimate

import (
	"math"
	"slices"
	"sort"

	"gonum.org/v1/gonum/stat/distuv"

	"ebbline/pva"
)

// BetweenDraws is the mean of one value in [0, 1] a draw, with an interval that
// holds for any law of the values and any number of draws (see betweenBets):
// risks over draws are skewed, and mean +- t SD/sqrt(n) of few of them lies too
// low too often. With no value the mean is NaN and the interval [0, 1].
func BetweenDraws(values []float64, confidence float64) (mean, low, high float64) {
	mean, _ = moments(values)
	low, high = betweenBets(together(values), confidence)
	return mean, low, high
}

// studentHalf is the half width t sqrt(variance/n).
func studentHalf(variance, n, confidence float64) float64 {
	twoSided(confidence)
	if n < 2 {
		return math.Inf(1)
	}
	t := distuv.StudentsT{Mu: 0, Sigma: 1, Nu: n - 1}.Quantile((1 + confidence) / 2)
	return t * math.Sqrt(variance/n)
}

// moments are the mean and the variance (divisor n-1) of values.
func moments(values []float64) (mean, variance float64) {
	n := float64(len(values))
	for _, v := range values {
		mean += v / n
	}
	if n == 0 {
		return math.NaN(), math.NaN()
	}
	for _, v := range values {
		variance += (v - mean) * (v - mean)
	}
	return mean, variance / math.Max(1, n-1)
}

// DrawSums gathers one count a draw, as how many draws have each count, so that
// the order of draws cannot matter.
type DrawSums struct {
	Draws  int64
	counts []group // in ascending order
}

// Add adds the count of one draw, not below 0.
func (s *DrawSums) Add(count int64) {
	s.Draws++
	i := sort.Search(len(s.counts), func(i int) bool { return s.counts[i].fallen >= count })
	if i == len(s.counts) || s.counts[i].fallen != count {
		s.counts = slices.Insert(s.counts, i, group{count, 0})
	}
	s.counts[i].draws++
}

// Pooled is the probability of an event from the counts of draws of each
// replicates, with the interval between draws of BetweenDraws from the shares of
// the draws, nowhere narrower than Wilson's of all replicates. With one replicate
// a draw the replicates are the draws, and the interval is Wilson's.
func (s *DrawSums) Pooled(each int64, confidence float64) pva.Proportion {
	var sum int64
	shares := make([]weighted, len(s.counts))
	for i, g := range s.counts {
		mustCount(g.fallen, each)
		sum += g.fallen * g.draws
		shares[i] = weighted{float64(g.fallen) / float64(each), float64(g.draws)}
	}
	p := Proportion(sum, s.Draws*each, confidence)
	if each == 1 {
		return p
	}
	low, high := betweenBets(shares, confidence)
	p.Low, p.High = math.Min(p.Low, low), math.Max(p.High, high)
	return p
}

// PooledDifference gives a paired difference of two risks its interval between
// draws, from the counts of both by draw, of each replicates: mean +- t
// SD/sqrt(draws), t the quantile of Student's law with draws-1 degrees of
// freedom. It is never narrower than the interval that the difference has from
// its replicates. No verdict rests on it: with few draws of a skewed law it holds
// the difference less often than it says.
func PooledDifference(d pva.Difference, this, other []int64, each int64, confidence float64) pva.Difference {
	values := make([]float64, len(this))
	for i := range this {
		values[i] = float64(this[i]-other[i]) / float64(each)
	}
	mean, variance := moments(values)
	half := studentHalf(variance, float64(len(values)), confidence)
	d.Low = math.Max(-1, math.Min(d.Low, mean-half))
	d.High = math.Min(1, math.Max(d.High, mean+half))
	return d
}

// Widened is an interval stretched about its estimate by a factor of 1 or more,
// cut to [0, 1]: for chances whose counts by draw are not kept, with the factor
// by which the draws widen the interval of the risk (the square root of Kish's
// design effect, 1965).
func Widened(p pva.Proportion, by float64) pva.Proportion {
	p.Low = math.Max(0, p.Estimate-(p.Estimate-p.Low)*by)
	p.High = math.Min(1, p.Estimate+(p.High-p.Estimate)*by)
	return p
}

// SplitVariance splits the variance between draws of the shares fallen: the
// noise of n replicates of risk p is p (1-p) / n, which the mean of x (n-x) /
// (n² (n-1)) over the draws estimates without bias; the rest is the inputs'
// (analysis of variance with draws as the random factor).
func SplitVariance(fallen []int64, each int64) pva.VarianceParts {
	n := float64(each)
	shares := make([]float64, len(fallen))
	noise := 0.0
	for i, x := range fallen {
		shares[i] = float64(x) / n
		noise += shares[i] * (1 - shares[i]) / (n - 1) / float64(len(fallen))
	}
	_, total := moments(shares)
	v := pva.VarianceParts{Total: total, Noise: noise, Inputs: math.Max(0, total-noise)}
	if each < 2 {
		v.Noise, v.Inputs = math.NaN(), math.NaN()
	}
	return v
}

// DrawsToDecide is about how many replicates, with as many a draw as now, would
// settle an undecided verdict if the mean stayed where it is and the interval
// narrowed with the square root of the draws; -1 (never) as with ToDecide.
func DrawsToDecide(limit pva.Optional, p pva.Proportion) int64 {
	if !limit.Set {
		return -1
	}
	gap, half := p.Estimate-limit.Value, p.High-p.Estimate
	if gap > 0 {
		half = p.Estimate - p.Low
	}
	return wholeUp(float64(p.Of) * (half / gap) * (half / gap))
}
