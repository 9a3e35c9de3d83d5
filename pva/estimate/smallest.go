package estimate

import (
	"math"
	"slices"

	"ebbline/pva"
)

// allLevels is how many different smallest censuses are still listed one by
// one; shares is in how many equal parts the replicates are cut beyond that.
const (
	allLevels = 60
	shares    = 32
)

// smallestLevels is the law of the smallest census on a readable ladder of
// levels, ascending: 0, the whole part of the threshold, that of the start, and
// either every value that occurred (if they are few) or round ones, 1, 2 and 5
// times powers of ten, with one level for every 32nd of the replicates, rounded
// up to three figures.
//
// Chances are among all replicates; one that outgrew before its first census
// was at or below none of the levels. The chance at the threshold is the risk
// itself, and no level below it has more and none above it less: above 4,096 the
// histogram cannot tell values in a bin of 0.05 % apart, and the risk can; and a
// replicate watched between censuses may have fallen there and at none of them.
func smallestLevels(c *pva.Case, h *pva.Histogram, risk pva.Proportion) []pva.Level {
	threshold := wholePart(c.Question.Threshold)
	levels := append(occurring(h), 0, threshold, wholePart(c.Start.Abundance))
	slices.Sort(levels)
	levels = slices.Compact(levels)

	counts := make([]int64, len(levels))
	next, sum := 0, int64(0)
	h.Each(func(bin int, count int64) {
		for next < len(levels) && pva.BinOf(levels[next]) < bin {
			counts[next] = sum
			next++
		}
		sum += count
	})
	for ; next < len(levels); next++ {
		counts[next] = sum
	}

	out := make([]pva.Level, len(levels))
	for i, v := range levels {
		switch {
		case v < threshold:
			counts[i] = min(counts[i], risk.Count)
		case v == threshold:
			counts[i] = risk.Count
		default:
			counts[i] = max(counts[i], risk.Count)
		}
		out[i] = pva.Level{Level: v, Risk: Proportion(counts[i], risk.Of, c.Question.Confidence)}
	}
	return out
}

// occurring is every value of the histogram (the largest of its bin) if there
// are at most allLevels, and otherwise a spread of them.
func occurring(h *pva.Histogram) []int64 {
	var values []int64
	h.Each(func(bin int, _ int64) { values = append(values, pva.BinLow(bin+1)-1) })
	if len(values) <= allLevels {
		return values
	}
	most := values[len(values)-1]
	levels := []int64{most}
	for unit := int64(1); unit <= most/5; unit *= 10 {
		levels = append(levels, unit, 2*unit, 5*unit)
	}
	for k := int64(1); k < shares; k++ {
		levels = append(levels, min(most, threeFigures(h.Rank((k*h.Total()+shares-1)/shares))))
	}
	return levels
}

// threeFigures rounds up to three significant figures.
func threeFigures(v int64) int64 {
	unit := int64(1)
	for v/unit >= 1000 {
		unit *= 10
	}
	return (v + unit - 1) / unit * unit
}

// wholePart is v rounded down, held within 0 and 2^62.
func wholePart(v float64) int64 {
	return int64(math.Floor(math.Max(0, math.Min(v, 1<<62))))
}
