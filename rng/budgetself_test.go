package rng

import (
	"math"
	"testing"
)

// The shares use up the level of the suite, no more; and a mean must be off by
// more than six standard errors to fail.
func TestBudget(t *testing.T) {
	total := 0
	for name, n := range shares {
		if n <= 0 {
			t.Errorf("%q has a share of %d", name, n)
		}
		total += n
	}
	if sum := float64(total) * level(); sum > suiteLevel*(1+1e-12) {
		t.Errorf("%d p-values at %v add up to %v, want at most %v", total, level(), sum, suiteLevel)
	}
	if z := caughtAt() - 2.326; twoSided(z) > level()*1.001 || z < 6 {
		t.Errorf("limit of %v standard errors for the level %v", z, level())
	}
}

// The measures themselves: on a true law the p-values of fit look uniform, and
// with a planted error of the size it says it catches, it fails.
func TestFitSeesWhatItSays(t *testing.T) {
	l := binomialLaw(50, 0.3)
	var low int
	const rounds, n = 400, 20000
	for i := range rounds {
		s := NewStream(28, uint64(i), Demography)
		last, expected := l.bins(n)
		count := make([]int, len(expected))
		for range n {
			k := Binomial(s, 50, 0.3)
			j := 0
			for j < len(last) && k > last[j] {
				j++
			}
			count[j]++
		}
		if chiSquare(count, expected) < 0.5 {
			low++
		}
	}
	judge(t, "p-values", "half of the p-values are below a half", exactBinomialP(low, rounds, 0.5))

	// P off by (6.3 + 2.3) standard errors of the mean of 250000 draws
	const draws = 250000
	off := caughtAt() * l.spread / math.Sqrt(draws) / 50
	s := NewStream(29, 0, Demography)
	_, _, mean := fit(t, l, draws, func() int64 { return Binomial(s, 50, 0.3+off) })
	if mean >= level() {
		t.Errorf("a bias of %v in p has the p-value %v, want below %v", off, mean, level())
	}
	// A law that gives even numbers only is seen in the remainders.
	_, rest, _ := fit(t, poissonLaw(1e5), draws, func() int64 { return Poisson(s, 1e5) &^ 1 })
	if rest >= level() {
		t.Errorf("even numbers only have the p-value %v, want below %v", rest, level())
	}
}
