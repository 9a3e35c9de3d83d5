package estimate

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"
)

// printed is half a unit of the eighth decimal, the last of the tables below.
const printed = 5.0001e-9

func near(t *testing.T, what string, got, want, within float64) {
	t.Helper()
	if !(math.Abs(got-want) <= within) {
		t.Errorf("%s is %.12g, want %.12g within %.3g", what, got, want, within)
	}
}

// The first four are the worked examples of R. G. Newcombe 1998, Stat. Med.
// 17:857-872 (his four-digit limits, from memory, agree); eight decimals from
// the quadratic of Wilson 1927 and the beta quantiles of an independent library.
func TestIntervalsAgainstTables(t *testing.T) {
	for _, r := range []struct {
		x, n                       int64
		wilsonLow, wilsonHigh      float64
		clopperLow, clopperHighest float64
	}{
		{81, 263, 0.25528852, 0.36620958, 0.25273675, 0.36762192},
		{15, 148, 0.06238640, 0.16048724, 0.05784401, 0.16165049},
		{0, 20, 0, 0.16112516, 0, 0.16843347},
		{1, 29, 0.00611321, 0.17175522, 0.00087265, 0.17764430},
		{0, 1000, 0, 0.00382676, 0, 0.00368208},
		{3, 1000, 0.00102078, 0.00878301, 0.00061910, 0.00874202},
		{50, 1000, 0.03813026, 0.06531382, 0.03733540, 0.06539049},
		{500, 10000, 0.04589848, 0.05444712, 0.04580994, 0.05445453},
		{10000, 10000, 0.99961600, 1, 0.99963118, 1},
		{29, 29, 0.88303020, 1, 0.88055513, 1},
	} {
		low, high := Wilson(r.x, r.n, 0.95)
		near(t, "Wilson's lower limit", low, r.wilsonLow, printed)
		near(t, "Wilson's upper limit", high, r.wilsonHigh, printed)
		low, high = ClopperPearson(r.x, r.n, 0.95)
		near(t, "the exact lower limit", low, r.clopperLow, printed)
		near(t, "the exact upper limit", high, r.clopperHighest, printed)
	}
}

func TestIntervalsAreExactAtTheEnds(t *testing.T) {
	for _, n := range []int64{1, 3, 20, 9999, 1e9, 1e15} {
		if low, high := Wilson(0, n, 0.99); low != 0 || !(high > 0) {
			t.Errorf("none in %d: %v to %v", n, low, high)
		}
		if low, high := Wilson(n, n, 0.99); high != 1 || !(low < 1) {
			t.Errorf("all in %d: %v to %v", n, low, high)
		}
	}
	if low, high := Wilson(0, 0, 0.95); low != 0 || high != 1 {
		t.Errorf("no trials: %v to %v", low, high)
	}
}

// Wilson's limits are where the estimate is z standard errors from p, the
// standard error being that under p: checked by putting the limits back in. The
// rounding of a limit, 2^-52, is at most a few 1e-11 of its distance from the
// estimate for these n; near 1 it also counts against 1-p.
func TestWilsonSolvesTheScoreEquation(t *testing.T) {
	for _, confidence := range []float64{0.5, 0.8, 0.95, 0.999, 0.999999} {
		z := distuv.UnitNormal.Quantile(0.5 + confidence/2)
		for _, n := range []int64{1, 2, 17, 1000, 1e6, 1e10} {
			for _, x := range []int64{0, 1, n / 3, n - 1, n} {
				low, high := Wilson(x, n, confidence)
				for i, p := range []float64{low, high} {
					if p == 0 || p == 1 {
						continue
					}
					score := (p - float64(x)/float64(n)) / math.Sqrt(p*(1-p)/float64(n))
					near(t, "the score at a limit", score, []float64{-z, z}[i], z*(1e-10+0x1p-52/(1-p)))
				}
				// Mirror image: events and non-events change places.
				mirrorLow, mirrorHigh := Wilson(n-x, n, confidence)
				near(t, "the mirrored limits", mirrorLow+high+mirrorHigh+low, 2, 1e-14)
			}
		}
	}
}

// Limits of Clopper & Pearson are quantiles of beta distributions; gonum inverts
// the incomplete beta function by an iteration of its own, so that agreement is
// asked to 1e-8, the accuracy of the table above.
func TestClopperPearsonAgainstBetaQuantiles(t *testing.T) {
	for _, n := range []int64{1, 5, 40, 1000, 20000} {
		for _, x := range []int64{0, 1, n / 7, n / 2, n - 1, n} {
			low, high := ClopperPearson(x, n, 0.9)
			a, b := float64(x), float64(n-x)
			if x > 0 {
				near(t, "the lower limit", low, distuv.Beta{Alpha: a, Beta: b + 1}.Quantile(0.05), 1e-8)
			}
			if x < n {
				near(t, "the upper limit", high, distuv.Beta{Alpha: a + 1, Beta: b}.Quantile(0.95), 1e-8)
			}
		}
	}
}

// None in n: the one-sided 95 % upper limit is 1 - 0.05^(1/n), about 3/n (J. A.
// Hanley & A. Lippman-Hand 1983, J. Am. Med. Assoc. 249:1743-1745).
func TestNoneSeen(t *testing.T) {
	for n, want := range map[int64]float64{20: 0.13910834, 100: 0.029513050, 1000: 0.0029912495, 10000: 0.00029952836} {
		_, high := ClopperPearson(0, n, 0.9)
		near(t, "the upper limit of none", high, want, printed)
		near(t, "the upper limit of none", high, -math.Expm1(math.Log(0.05)/float64(n)), 1e-14)
	}
}

// The largest count whose one-sided exact 95 % upper limit is not above a limit.
func TestLargestCountWithinALimit(t *testing.T) {
	for _, r := range []struct {
		n     int64
		limit float64
		most  int64
	}{{100, 0.05, 1}, {1000, 0.05, 38}, {10000, 0.05, 463}, {1000, 0.01, 4}, {10000, 0.01, 83}} {
		_, at := ClopperPearson(r.most, r.n, 0.9)
		_, beyond := ClopperPearson(r.most+1, r.n, 0.9)
		if !(at <= r.limit && beyond > r.limit) {
			t.Errorf("%d and one more in %d have upper limits %v and %v, around %v", r.most, r.n, at, beyond, r.limit)
		}
	}
}

// Common practice, no source; the numbers are z² p (1-p) / half² rounded up.
func TestReplicates(t *testing.T) {
	for _, r := range []struct {
		p, half float64
		want    int64
	}{{0.5, 0.05, 385}, {0.05, 0.01, 1825}, {0.1, 0.01, 3458}, {0.05, 0.005, 7299}, {0.01, 0.002, 9508}, {0.5, 0.01, 9604}} {
		if got := Replicates(r.p, r.half, 0.95); got != r.want {
			t.Errorf("p %v to %v needs %d, want %d", r.p, r.half, got, r.want)
		}
	}
	if got := Replicates(0.5, 1e-12, 0.95); got != -1 {
		t.Errorf("more replicates than can be counted: %d", got)
	}
}

// Replicates so that an event of chance p is seen at least once with 95 %.
func TestSeenAtLeastOnce(t *testing.T) {
	for p, n := range map[float64]int64{0.05: 59, 0.01: 299, 0.001: 2995} {
		_, at := tails(1, n, p)
		_, before := tails(1, n-1, p)
		if !(at >= 0.95 && before < 0.95) {
			t.Errorf("an event of chance %v is seen in %d trials with %v, in one fewer with %v", p, n, at, before)
		}
	}
}

// coverage is the exact chance that an interval holds the true p.
func coverage(n int64, p float64, interval func(x, n int64, confidence float64) (float64, float64)) float64 {
	law, sum := distuv.Binomial{N: float64(n), P: p}, 0.0
	for x := int64(0); x <= n; x++ {
		if low, high := interval(x, n, 0.95); low <= p && p <= high {
			sum += law.Prob(float64(x))
		}
	}
	return sum
}

// The exact coverage of Wilson's 95 % interval, summed from the binomial law;
// the table keeps what was found, so that a change is seen. Coverage of a score
// interval goes below its level in dips (L. D. Brown, T. T. Cai & A. DasGupta
// 2001, Stat. Sci. 16:101-133), the deepest just below the lower limit of one
// event, where only no event covers p: (1-p)^n, near exp(-0.1765) = 0.838.
func TestCoverageOfWilson(t *testing.T) {
	for _, r := range []struct {
		n    int64
		p    float64
		want float64
	}{
		{100, 1e-6, 0.999900}, {100, 1e-4, 0.990049}, {100, 0.001, 0.904792}, {100, 0.01, 0.920627}, {100, 0.05, 0.965891}, {100, 0.2, 0.940520}, {100, 0.5, 0.943112},
		{1000, 1e-6, 0.999000}, {1000, 1e-4, 0.904833}, {1000, 0.001, 0.919791}, {1000, 0.01, 0.963536}, {1000, 0.05, 0.950417}, {1000, 0.2, 0.947364}, {1000, 0.5, 0.946322},
		{10000, 1e-6, 0.990050}, {10000, 1e-4, 0.919708}, {10000, 0.001, 0.962714}, {10000, 0.01, 0.950272}, {10000, 0.05, 0.948884}, {10000, 0.2, 0.950308}, {10000, 0.5, 0.948829},
	} {
		got := coverage(r.n, r.p, Wilson)
		t.Logf("n %d, p %v: %.6f", r.n, r.p, got)
		near(t, "the coverage", got, r.want, 1e-6)
		if got < 0.838 {
			t.Errorf("n %d, p %v: Wilson's interval covers in %v only", r.n, r.p, got)
		}
		if r.n > 100 {
			continue
		}
		if exact := coverage(r.n, r.p, ClopperPearson); exact < 0.95 {
			t.Errorf("n %d, p %v: the exact interval covers in %v only", r.n, r.p, exact)
		}
	}
	for _, n := range []int64{100, 2000} {
		low, _ := Wilson(1, n, 0.95)
		p := low * (1 - 1e-9)
		near(t, "the coverage in the deepest dip", coverage(n, p, Wilson), math.Pow(1-p, float64(n)), 1e-9)
	}
	// (1 + z²/2) - z sqrt(1 + z²/4) events are the lower limit of one in the
	// limit of many trials.
	z := distuv.UnitNormal.Quantile(0.975)
	low, _ := Wilson(1, 1e9, 0.95)
	near(t, "the events at that limit", low*1e9, 1+z*z/2-z*math.Sqrt(1+z*z/4), 1e-8)
}
