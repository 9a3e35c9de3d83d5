package estimate

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/stat/distuv"

	"ebbline/pva"
)

// BetweenDraws is the mean of one value a draw, with the interval mean +- t
// SD/sqrt(n), t the quantile of Student's law with n-1 degrees of freedom. Draws
// that are not independent but stratified, as a Latin hypercube is, have a mean
// that varies less (McKay, Beckman & Conover 1979, Technometrics 21:239; Stein
// 1987, Technometrics 29:143), so that the interval is on the safe side for them.
// With one value the limits are infinite; with none all is NaN.
func BetweenDraws(values []float64, confidence float64) (mean, low, high float64) {
	n := float64(len(values))
	mean, variance := moments(values)
	half := studentHalf(variance, n, confidence)
	return mean, mean - half, mean + half
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

// DrawSums adds up one count a draw and its square, in whole numbers, so that
// the order of draws cannot matter.
type DrawSums struct {
	Draws         int64
	Sum, Squares  pva.Sum
	mostOfOneDraw int64
}

// Add adds the count of one draw: from 0 to 3e9.
func (s *DrawSums) Add(count int64) {
	s.Draws++
	s.Sum.Add(count)
	s.Squares.Add(count * count)
	s.mostOfOneDraw = max(s.mostOfOneDraw, count)
}

// Pooled is the probability of an event from the counts of draws of each
// replicates, with the interval between draws: the mean of the draws' shares +- t
// SD/sqrt(draws), cut to [0, 1]. To either side it is never narrower than
// Wilson's interval of all replicates: rare events that no draw, or few, have
// shown would otherwise seem known without doubt, SD being 0 or nearly so.
func (s *DrawSums) Pooled(each int64, confidence float64) pva.Proportion {
	if s.mostOfOneDraw > each {
		panic(fmt.Sprintf("estimate: a draw of %d replicates with %d events", each, s.mostOfOneDraw))
	}
	n, sum := float64(s.Draws), s.Sum.Float()
	p := Proportion(int64(sum), s.Draws*each, confidence)
	variance := math.Max(0, s.Squares.Float()-sum*sum/n) / math.Max(1, n-1) / float64(each) / float64(each)
	half := studentHalf(variance, n, confidence)
	p.Low = math.Max(0, math.Min(p.Low, p.Estimate-half))
	p.High = math.Min(1, math.Max(p.High, p.Estimate+half))
	return p
}

// PooledDifference gives a paired difference of two risks its interval between
// draws, from the counts of both by draw, of each replicates. It is never
// narrower than the interval that the difference has from its replicates.
func PooledDifference(d pva.Difference, this, other []int64, each int64, confidence float64) pva.Difference {
	values := make([]float64, len(this))
	for i := range this {
		values[i] = float64(this[i]-other[i]) / float64(each)
	}
	_, low, high := BetweenDraws(values, confidence)
	d.Low = math.Max(-1, math.Min(d.Low, low))
	d.High = math.Min(1, math.Max(d.High, high))
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
