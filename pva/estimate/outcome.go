package estimate

import (
	"math"

	"ebbline/pva"
)

// Outcome is everything reported of one case, from its tally, at the case's
// confidence.
//
// Replicates that outgrew count as not fallen, not extinct and above every
// percentile of abundance, among all replicates. Means, takes, closed years and
// percentiles of the take are over the replicates not outgrown by that year, NaN
// where there are none; totals over the horizon add the yearly means.
func Outcome(c *pva.Case, t *pva.Tally) *pva.Outcome {
	n, level := t.Replicates, c.Question.Confidence
	o := &pva.Outcome{
		Replicates: n,
		Years:      make([]pva.YearResult, len(t.Years)),
		LogPairs:   t.LogPairs,
		Capped:     t.Capped,
		// NaN without pairs: 0/0.
		MeanLogGrowth: t.LogGrowth.Float() / pva.FixedPoint / float64(t.LogPairs),
		FallP25:       yearOfFall(t, 1),
		FallP50:       yearOfFall(t, 2),
		FallP75:       yearOfFall(t, 3),
	}
	for i := range t.Years {
		y := yearResult(&t.Years[i], n, level)
		y.Year, y.Label = i+1, c.Label(i+1)
		o.Years[i] = y
		o.TakeTotalMean += y.TakeMean
		o.ShortfallMean += y.ShortfallMean
		o.ClosedYears += y.Closed.Estimate
	}
	years := float64(len(t.Years))
	o.TakeMean, o.ShortfallMean = o.TakeTotalMean/years, o.ShortfallMean/years

	last := o.Years[len(o.Years)-1]
	o.Risk, o.Extinction, o.Outgrown = last.Fallen, last.Extinct, last.Outgrown
	o.SmallestMean = histogramMean(&t.Smallest)
	o.Smallest = smallestLevels(c, &t.Smallest, o.Risk)
	for _, b := range t.Batch {
		if b.Replicates > 0 {
			o.Batches = append(o.Batches, Proportion(b.Fallen, b.Replicates, level))
		}
	}
	return o
}

// yearResult is one year of an outcome, without its number and date.
func yearResult(y *pva.YearTally, n int64, level float64) pva.YearResult {
	kept := n - y.Outgrown
	mean := func(s pva.Sum) float64 { return s.Float() / float64(kept) }
	return pva.YearResult{
		Fallen:        Proportion(y.Fallen, n, level),
		Extinct:       Proportion(y.Extinct, n, level),
		Outgrown:      y.Outgrown,
		Mean:          mean(y.Sum),
		Abundance:     percentiles(&y.Abundance, n),
		TakeMean:      mean(y.TakeSum),
		Take:          percentiles(&y.Take, kept),
		ShortfallMean: mean(y.Shortfall),
		ExtraMean:     mean(y.ExtraSum),
		StockedMean:   mean(y.Stocked),
		Closed:        Proportion(y.Closed, kept, level),
	}
}

// yearOfFall is the first year by which at least quarters/4 of all replicates
// have fallen, 0 if not within the horizon.
func yearOfFall(t *pva.Tally, quarters int64) int {
	for i := range t.Years {
		if fallen := t.Years[i].Fallen; fallen > 0 && 4*fallen >= quarters*t.Replicates {
			return i + 1
		}
	}
	return 0
}

// percentiles are the smallest values with at least 5, 25, 50, 75 and 95 % of n
// at or below them, where n counts the values of the histogram and those above
// all of it: +Inf where the point lies among the latter. NaN if n is 0.
func percentiles(h *pva.Histogram, n int64) pva.Percentiles {
	point := func(percent int64) float64 {
		if n == 0 {
			return math.NaN()
		}
		if v := h.Rank((percent*n + 99) / 100); v >= 0 {
			return float64(v)
		}
		return math.Inf(1)
	}
	return pva.Percentiles{P05: point(5), P25: point(25), P50: point(50), P75: point(75), P95: point(95)}
}

// histogramMean is the mean of the values counted, each at the middle of its
// bin (exact below 4,096, within 0.025 % above); NaN if there are none.
func histogramMean(h *pva.Histogram) float64 {
	sum := 0.0
	h.Each(func(bin int, count int64) {
		low, high := pva.BinLow(bin), pva.BinLow(bin+1)-1
		sum += (float64(low) + float64(high-low)/2) * float64(count)
	})
	return sum / float64(h.Total())
}
