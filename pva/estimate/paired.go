package estimate

import (
	"fmt"
	"math"

	"ebbline/pva"
)

// Paired is the difference of two risks seen on the same replicates, this minus
// the other, from the four counts: fallen only in this, only in the other, in
// both, in neither. The interval is R. G. Newcombe's method 10 (1998, Stat. Med.
// 17:2635-2650): Wilson's limits of the two risks, squared and added, with the
// correlation of the pairs from the fourfold table, its numerator corrected for
// continuity. With no replicates the estimate is NaN and the interval [-1, 1].
func Paired(onlyThis, onlyOther, both, neither int64, confidence float64) pva.Difference {
	if onlyThis < 0 || onlyOther < 0 || both < 0 || neither < 0 {
		panic(fmt.Sprintf("estimate: negative count among pairs: %d, %d, %d, %d", onlyThis, onlyOther, both, neither))
	}
	n := onlyThis + onlyOther + both + neither
	d := pva.Difference{
		Estimate: share(onlyThis-onlyOther, n), Low: -1, High: 1,
		OnlyThis: onlyThis, OnlyOther: onlyOther, Of: n,
	}
	thisLow, thisHigh := Wilson(both+onlyThis, n, confidence)
	otherLow, otherHigh := Wilson(both+onlyOther, n, confidence)
	if n == 0 {
		return d
	}
	this, other := share(both+onlyThis, n), share(both+onlyOther, n)
	phi := pairCorrelation(float64(both), float64(onlyThis), float64(onlyOther), float64(neither))
	d.Low = math.Max(-1, d.Estimate-squareAndAdd(this-thisLow, otherHigh-other, phi))
	d.High = math.Min(1, d.Estimate+squareAndAdd(thisHigh-this, other-otherLow, phi))
	return d
}

// Against is the paired difference of a tally's risk at the horizon from that
// of the case itself: this minus the case.
func Against(t *pva.Tally, confidence float64) pva.Difference {
	last := t.Years[len(t.Years)-1]
	both := last.Fallen - last.OnlyThis
	return Paired(last.OnlyThis, last.OnlyCase, both, t.Replicates-both-last.OnlyThis-last.OnlyCase, confidence)
}

// Reversed is the same difference the other way round: the other minus this.
func Reversed(d pva.Difference) pva.Difference {
	return pva.Difference{
		Estimate: 0 - d.Estimate, Low: 0 - d.High, High: 0 - d.Low,
		OnlyThis: d.OnlyOther, OnlyOther: d.OnlyThis, Of: d.Of,
	}
}

// pairCorrelation is the phi of a fourfold table a, b / c, d with ad - bc
// lowered by n/2, though not below 0, where it is positive (Newcombe 1998,
// method 10); 0 where a margin is empty.
func pairCorrelation(a, b, c, d float64) float64 {
	margins := math.Sqrt(a+b) * math.Sqrt(c+d) * math.Sqrt(a+c) * math.Sqrt(b+d)
	if margins == 0 {
		return 0
	}
	numerator := a*d - b*c
	if numerator > 0 {
		numerator = math.Max(0, numerator-(a+b+c+d)/2)
	}
	return numerator / margins
}

// squareAndAdd joins the distances of two limits from their estimates.
func squareAndAdd(u, v, phi float64) float64 {
	return math.Sqrt(math.Max(0, u*u-2*phi*u*v+v*v))
}
