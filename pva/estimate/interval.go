package estimate

import (
	"fmt"
	"math"
)

// Wilson is the score interval of a binomial proportion, x events in n trials
// (E. B. Wilson 1927, J. Am. Stat. Assoc. 22:209-212). The lower limit is
// exactly 0 at x = 0 and the upper exactly 1 at x = n; with n = 0 the interval
// is [0, 1].
func Wilson(x, n int64, confidence float64) (low, high float64) {
	mustCount(x, n)
	z := twoSided(confidence)
	if n == 0 {
		return 0, 1
	}
	k, m := float64(x), float64(n)
	low, high = 0, 1
	// The limits are the roots of (1 + z²/n) p² - (2x/n + z²/n) p + (x/n)² = 0.
	// The larger is a sum; the smaller follows from their product, so that
	// neither is a difference of near equal numbers.
	top := (k + z*z/2 + z*math.Sqrt(k*(m-k)/m+z*z/4)) / (m + z*z)
	if x < n {
		high = top
	}
	if x > 0 {
		low = k / m * (k / (m + z*z)) / top
	}
	return low, high
}

// ClopperPearson is the exact interval of a binomial proportion, never covering
// less often than it says (C. J. Clopper & E. S. Pearson 1934, Biometrika
// 26:404-413): each limit is the p at which the tail beyond x is half of
// 1 - confidence. One-sided limits at level c are those of confidence 2c - 1.
func ClopperPearson(x, n int64, confidence float64) (low, high float64) {
	mustCount(x, n)
	twoSided(confidence)
	half := (1 - confidence) / 2
	low, high = 0, 1
	if x > 0 {
		low = bisect(0, 1, func(p float64) bool {
			_, upper := tails(x, n, p)
			return upper <= half
		})
	}
	if x < n {
		high = bisect(0, 1, func(p float64) bool {
			lower, _ := tails(x, n, p)
			return lower > half
		})
	}
	return low, high
}

// Replicates is how many replicates bring the half width of the interval of a
// probability near p down to half, by the normal formula z² p (1-p) / half²,
// rounded up. half is in the units of p and must be above 0.
func Replicates(p, half, confidence float64) int64 {
	if !(p >= 0 && p <= 1 && half > 0) {
		panic(fmt.Sprintf("estimate: no number of replicates for p %v and half width %v", p, half))
	}
	z := twoSided(confidence)
	return wholeUp(z * z * p * (1 - p) / (half * half))
}

// wholeUp is v rounded up, or -1 if that is beyond 2^62 or no number.
func wholeUp(v float64) int64 {
	if !(v < 1<<62) {
		return -1
	}
	return int64(math.Ceil(v))
}

// bisect finds the point between lo and hi at which holds turns from true to
// false, to the last bit. It halves the arithmetic interval, and the geometric
// one while the ends are orders of magnitude apart, so that small limits are as
// accurate as large ones.
func bisect(lo, hi float64, holds func(float64) bool) float64 {
	for {
		mid := lo + (hi-lo)/2
		switch {
		case lo == 0 && hi > 1e-300:
			mid = hi * 1e-3
		case lo > 0 && hi > 4*lo:
			mid = math.Sqrt(lo) * math.Sqrt(hi)
		}
		if !(lo < mid && mid < hi) {
			return mid
		}
		if holds(mid) {
			lo = mid
		} else {
			hi = mid
		}
	}
}
