package estimate

import (
	"math"
	"math/big"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"
)

// bigTails sums the binomial law in 300-bit arithmetic from the definition.
func bigTails(x, n int64, p float64) (lower, upper float64) {
	const bits = 300
	num := func(v float64) *big.Float { return new(big.Float).SetPrec(bits).SetFloat64(v) }
	mul := func(z, v *big.Float) { z.Mul(z, v) }
	power := func(base *big.Float, k int64) *big.Float {
		out, square := num(1), new(big.Float).Copy(base)
		for ; k > 0; k >>= 1 {
			if k&1 == 1 {
				mul(out, square)
			}
			mul(square, square)
		}
		return out
	}
	pp := num(p)
	qq := new(big.Float).SetPrec(bits).Sub(num(1), pp)
	at := num(1)
	for i := int64(1); i <= x; i++ {
		mul(at, num(float64(n-x+i)))
		at.Quo(at, num(float64(i)))
	}
	mul(at, power(pp, x))
	mul(at, power(qq, n-x))
	odds := new(big.Float).Quo(pp, qq)
	walk := func(step int64) float64 {
		sum, term := new(big.Float).Copy(at), new(big.Float).Copy(at)
		for k := x; (step > 0 && k < n) || (step < 0 && k > 0); k += step {
			if step > 0 {
				mul(term, num(float64(n-k)))
				term.Quo(term, num(float64(k+1)))
				mul(term, odds)
			} else {
				mul(term, num(float64(k)))
				term.Quo(term, num(float64(n-k+1)))
				term.Quo(term, odds)
			}
			sum.Add(sum, term)
			if rest := new(big.Float).Quo(term, sum); rest.Cmp(num(1e-30)) < 0 {
				break
			}
		}
		out, _ := sum.Float64()
		return out
	}
	return walk(-1), walk(1)
}

// tailError is the relative error that BinomialTail promises.
const tailError = 1e-9

func TestTailsAgainstLongArithmetic(t *testing.T) {
	for _, r := range []struct {
		x, n int64
		p    float64
	}{
		{0, 1, 0.3}, {1, 1, 0.3}, {3, 10, 0.25}, {10, 10, 0.25}, {7, 20, 0.35},
		{0, 2000, 0.1}, {100, 2000, 0.1}, {200, 2000, 0.1}, {800, 2000, 0.1}, {1999, 2000, 0.9},
		{710, 10000, 0.0705}, {600, 10000, 0.0705}, {1800, 10000, 0.0705}, {3, 10000, 1e-7},
		{50000, 1000000, 0.05}, {49000, 1000000, 0.05}, {42500, 1000000, 0.05}, {58200, 1000000, 0.05},
		{40, 1000000000, 1e-9}, {0, 1000000000, 1e-9}, {150, 1000000000, 1e-9}, {20, 1000000000, 2e-7},
		{100000, 1000000000, 1e-4}, {90000, 1000000000, 1e-4}, {111500, 1000000000, 1e-4},
	} {
		lower, upper := bigTails(r.x, r.n, r.p)
		want := math.Min(1, 2*math.Min(lower, upper))
		if want < 1e-300 {
			t.Fatalf("%v: the case is beyond what is promised: %v", r, want)
		}
		near(t, "the tail over its value", BinomialTail(r.x, r.n, r.p)/want, 1, tailError)
		gotLower, gotUpper := tails(r.x, r.n, r.p)
		near(t, "the lower tail", gotLower, lower, tailError)
		near(t, "the upper tail", gotUpper, upper, tailError)
	}
}

// The regularised incomplete beta function of gonum, where it is itself sound.
func TestTailsAgainstGonum(t *testing.T) {
	for _, n := range []int64{1, 9, 200, 3000} {
		for _, p := range []float64{0.001, 0.07, 0.5, 0.93} {
			law := distuv.Binomial{N: float64(n), P: p}
			for x := int64(0); x <= n; x += 1 + n/40 {
				lower, upper := tails(x, n, p)
				near(t, "P(X <= x)", lower, law.CDF(float64(x)), 1e-10)
				near(t, "P(X >= x)", upper, 1-law.CDF(float64(x)-1), 1e-10)
			}
		}
	}
}

// Among a thousand million trials the law still adds up to 1 and its
// neighbours stand in the ratio (n-x) p / ((x+1)(1-p)).
func TestLargeBinomialAddsUp(t *testing.T) {
	const n = int64(1e9)
	for _, p := range []float64{0.5, 0.05, 1e-5} {
		mean, sd := float64(n)*p, math.Sqrt(float64(n)*p*(1-p))
		// Beyond 9 standard deviations less than 1e-16 is left, by Bernstein's
		// inequality: 2 exp(-81/2 / (1 + 9/(3 sd))), sd at least 99.
		from, to := int64(mean-9*sd), int64(mean+9*sd)
		sum := 0.0
		for x := from; x <= to; x++ {
			sum += math.Exp(logBinomial(x, n, p))
		}
		near(t, "the sum of the law", sum, 1, tailError)
		for x := from; x <= to; x += (to - from) / 50 {
			ratio := math.Exp(logBinomial(x+1, n, p) - logBinomial(x, n, p))
			near(t, "the ratio of neighbours", ratio/(float64(n-x)*p/(float64(x+1)*(1-p))), 1, 1e-11)
		}
	}
}

func TestTailsAtTheEnds(t *testing.T) {
	for _, r := range []struct {
		x, n    int64
		p, want float64
	}{
		{0, 10, 0, 1}, {1, 10, 0, 0}, {10, 10, 1, 1}, {9, 10, 1, 0}, {0, 0, 0.3, 1}, {5, 10, 0.5, 1},
		{0, 900, 0.5, 2 * math.Pow(2, -900)}, {30, 30, 1e-10, 2e-300},
	} {
		near(t, "a tail over its closed form", BinomialTail(r.x, r.n, r.p), r.want, r.want*1e-12)
	}
}

func TestWidenedTailIsTheLargest(t *testing.T) {
	for _, r := range []struct {
		x, n   int64
		p, err float64
	}{
		{40, 1000, 0.05, 0.004}, {70, 1000, 0.05, 0.004}, {50, 1000, 0.05, 0.004}, {52, 1000, 0.05, 0.0025},
		{0, 1000, 0.004, 0.01}, {1000, 1000, 0.998, 0.01}, {3, 1000, 0, 1e-3}, {40, 1000, 0.05, 0},
	} {
		largest := 0.0
		for i := 0; i <= 2000; i++ {
			p := r.p + r.err*(float64(i)/1000-1)
			if p >= 0 && p <= 1 {
				largest = math.Max(largest, BinomialTail(r.x, r.n, p))
			}
		}
		got := BinomialTailWidened(r.x, r.n, r.p, r.err)
		// The ends are on the grid (or the largest is 1, which a grid of a
		// thousandth of the error may just miss where the span is narrow).
		near(t, "the largest tail", got, largest, 1e-12)
	}
}
