package estimate

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mathext"
	"gonum.org/v1/gonum/stat/distuv"
)

func sequenceOf(x, n int64, confidence float64) *Sequence {
	s := NewSequence(confidence)
	s.Update(x, n)
	return s
}

// holds says whether p is in the interval without solving for its ends.
func (s *Sequence) holds(p float64) bool { return divergence(s.x, s.n, p) < s.reach() }

// At its ends the mixture ratio, as written in the books with beta functions, is
// 1/alpha. The log gammas cancel: an error of a few 2^-52 of ln n! < 1.1e6. To it
// comes the rounding of the end itself, times the slope of the log ratio.
func TestSequenceEndsAreWhereTheRatioIsReached(t *testing.T) {
	for _, alpha := range []float64{0.2, 0.05, 0.001} {
		for _, n := range []int64{1, 2, 30, 1000, 100000} {
			for _, x := range []int64{0, 1, n / 20, n / 2, n - 1, n} {
				s := sequenceOf(x, n, 1-alpha)
				low, high := s.Interval()
				if (x == 0) != (low == 0) || (x == n) != (high == 1) {
					t.Errorf("%d in %d: %v to %v", x, n, low, high)
				}
				a, b := float64(x), float64(n-x)
				mixture := mathext.Lbeta(a+0.5, b+0.5) - mathext.Lbeta(0.5, 0.5)
				for _, p := range []float64{low, high} {
					if p > 0 && p < 1 {
						ratio := mixture - a*math.Log(p) - b*math.Log1p(-p)
						slope := math.Abs(a/p - b/(1-p))
						near(t, "the log ratio at an end", ratio, math.Log(1/alpha), 1e-8+0x1p-52*slope)
					}
				}
				if mle := a / (a + b); !(low <= mle && mle <= high) || !s.holds(mle) {
					t.Errorf("%d in %d: %v outside %v to %v", x, n, mle, low, high)
				}
			}
		}
	}
	if low, high := NewSequence(0.95).Interval(); low != 0 || high != 1 {
		t.Errorf("before the first trial: %v to %v", low, high)
	}
}

// The mixture ratio has mean 1 under any p at any n, which is what Ville's
// inequality needs: summed over the binomial law.
func TestSequenceRatioHasMeanOne(t *testing.T) {
	for _, n := range []int64{1, 7, 60, 500} {
		for _, p := range []float64{0.5, 0.05, 0.001} {
			law, mean := distuv.Binomial{N: float64(n), P: p}, 0.0
			for x := int64(0); x <= n; x++ {
				s := sequenceOf(x, n, 0.95)
				logRatio := divergence(x, n, p) - s.reach() - math.Log(0.05)
				mean += math.Exp(logRatio + law.LogProb(float64(x)))
			}
			near(t, "the mean ratio", mean, 1, 1e-9)
		}
	}
}

// The exact chance that p is ever outside, looking after every trial: a walk
// over the counts, from which those paths are taken out that have missed it.
func TestSequenceNeverMissesTooOften(t *testing.T) {
	for _, confidence := range []float64{0.8, 0.95} {
		for _, p := range []float64{0.5, 0.2, 0.05, 0.01} {
			const n = 1500
			alive := make([]float64, n+2)
			alive[0] = 1
			missed := 0.0
			for k := int64(1); k <= n; k++ {
				for x := k; x >= 0; x-- {
					alive[x] *= 1 - p
					if x > 0 {
						alive[x] += alive[x-1] * p
					}
				}
				for x := int64(0); x <= k; x++ {
					if alive[x] > 0 && !sequenceOf(x, k, confidence).holds(p) {
						missed += alive[x]
						alive[x] = 0
					}
				}
			}
			t.Logf("confidence %v, p %v: ever outside in %d trials with %.5f", confidence, p, n, missed)
			// Above 0 too: an interval that never misses would be no use.
			if missed > 1-confidence || missed < (1-confidence)/100 {
				t.Errorf("confidence %v, p %v: ever outside with chance %v", confidence, p, missed)
			}
		}
	}
}

// Two thousand sequences looked at after every batch of 10 trials, later of a
// fiftieth of those so far, up to 100,000. If each were ever outside with the
// full 0.05, more than most would be seen with a chance below 1e-8; the draws
// are gonum's and the seed fixed.
func TestSequenceUnderRepeatedLooks(t *testing.T) {
	const sequences = 2000
	most := int64(0)
	for {
		if _, upper := tails(most+1, sequences, 0.05); upper < 1e-8 {
			break
		}
		most++
	}
	for i, p := range []float64{0.5, 0.05, 0.01, 0.001} {
		source := rand.NewPCG(20, uint64(i))
		outside := int64(0)
		for range sequences {
			s, missed := NewSequence(0.95), false
			for s.n < 100000 && !missed {
				batch := max(10, s.n/50)
				s.Update(int64(distuv.Binomial{N: float64(batch), P: p, Src: source}.Rand()), batch)
				missed = !s.holds(p)
			}
			if low, high := s.Interval(); missed != !(low < p && p < high) {
				t.Fatalf("%v in %v to %v: %v", p, low, high, !missed)
			}
			if missed {
				outside++
			}
		}
		t.Logf("p %v: %d of %d ever outside (at most %d)", p, outside, sequences, most)
		if outside > most {
			t.Errorf("p %v: %d of %d sequences were ever outside, at most %d expected", p, outside, sequences, most)
		}
	}
}

// The interval depends on the totals alone, and can be used for a verdict.
func TestSequenceAddsUp(t *testing.T) {
	s := NewSequence(0.9)
	s.Update(3, 40)
	s.Update(0, 0)
	s.Update(10, 60)
	if got, want := s.Proportion(), sequenceOf(13, 100, 0.9).Proportion(); got != want {
		t.Errorf("in parts %v, at once %v", got, want)
	}
	p := s.Proportion()
	if low, high := s.Interval(); p.Count != 13 || p.Of != 100 || p.Estimate != 0.13 || p.Low != low || p.High != high {
		t.Errorf("the proportion is %v", p)
	}
	if wl, wh := Wilson(13, 100, 0.9); !(p.Low < wl && p.High > wh) {
		t.Errorf("%v to %v is no wider than Wilson's %v to %v", p.Low, p.High, wl, wh)
	}
}
