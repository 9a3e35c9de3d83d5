package estimate

import (
	"ebbline/pva"
)

// AtEveryLook gives all probabilities of an outcome, by the horizon, by year and
// by level, the intervals of confidence sequences (Sequence): each holds however
// often one looks and whenever one stops.
func AtEveryLook(o *pva.Outcome, confidence float64) {
	again := func(p *pva.Proportion) { *p = sequenced(p.Count, p.Of, confidence) }
	for i := range o.Years {
		y := &o.Years[i]
		again(&y.Fallen)
		again(&y.Extinct)
		if y.Closed.Of > 0 {
			again(&y.Closed)
		}
	}
	for i := range o.Smallest {
		again(&o.Smallest[i].Risk)
	}
	last := o.Years[len(o.Years)-1]
	o.Risk, o.Extinction = last.Fallen, last.Extinct
}

func sequenced(count, of int64, confidence float64) pva.Proportion {
	s := NewSequence(confidence)
	s.Update(count, of)
	return s.Proportion()
}

// PairedAtEveryLook is a paired difference with an interval that holds however
// often one looks. The difference of the risks is the share of replicates fallen
// only in this less the share fallen only in the other, and each share has a
// confidence sequence at half the doubt, so that by Bonferroni's inequality both
// hold at once.
func PairedAtEveryLook(d pva.Difference, confidence float64) pva.Difference {
	half := 1 - (1-confidence)/2
	this, other := sequenced(d.OnlyThis, d.Of, half), sequenced(d.OnlyOther, d.Of, half)
	d.Low, d.High = this.Low-other.High, this.High-other.Low
	return d
}

// ToDecideAtEveryLook is about how many trials in all would settle an undecided
// verdict if the estimate stayed where it is and the interval is that of a
// confidence sequence; -1 (never) as with ToDecide.
func ToDecideAtEveryLook(limit pva.Optional, p pva.Proportion, confidence float64) int64 {
	if !limit.Set || p.Of == 0 {
		return -1
	}
	settles := func(n int64) bool {
		s := Sequence{x: int64(p.Estimate*float64(n) + 0.5), n: n, confidence: confidence}
		return divergence(s.x, n, limit.Value) >= s.reach()
	}
	const most = int64(1) << 50
	high := p.Of
	for !settles(high) {
		if high *= 2; high > most {
			return -1
		}
	}
	low := high / 2
	for high-low > max(1, high/1000) {
		if mid := low + (high-low)/2; settles(mid) {
			high = mid
		} else {
			low = mid
		}
	}
	return high
}
