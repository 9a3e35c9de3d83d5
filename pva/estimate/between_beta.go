package estimate

import (
	"fmt"
	"math"
	"sort"

	"gonum.org/v1/gonum/mathext"
	"gonum.org/v1/gonum/optimize"
	"gonum.org/v1/gonum/stat/distuv"
)

// BetaFit is a beta law of the risk over draws, fitted by maximum likelihood to
// the counts fallen of the draws, which then are beta-binomial (Skellam 1948, J.
// R. Stat. Soc. B 10:257; Griffiths 1973, Biometrics 29:637). The replicate
// noise is in the binomial part and so not in the law.
type BetaFit struct {
	Mean float64
	// Spread is 1/(alpha + beta), 0 where the counts vary no more than those of
	// one risk would.
	Spread float64
	LogLik float64 // the binomial coefficients included

	groups []group
	each   int64
}

// group is the draws with one count.
type group struct {
	fallen, draws int64
}

// least is the smallest spread told apart from none: the risk then has a
// standard deviation of a thousandth of the largest possible. At the largest that
// is looked at nearly all risks are next to 0 or 1.
const (
	least   = 1e-6
	largest = 1e4
)

// FitBeta fits the law to one count a draw, of each replicates (2 or more; with
// one, a law and its mean cannot be told apart, which is a bug of the caller).
func FitBeta(fallen []int64, each int64) BetaFit {
	if each < 2 || len(fallen) == 0 {
		panic(fmt.Sprintf("estimate: no beta law from %d draws of %d replicates", len(fallen), each))
	}
	f := BetaFit{each: each, groups: grouped(fallen, each)}
	var sum int64
	for _, x := range fallen {
		sum += x
	}
	f.Mean = float64(sum) / float64(each) / float64(len(fallen))
	f.LogLik = f.logLik(f.Mean, 0)
	if f.Mean == 0 || f.Mean == 1 {
		return f
	}
	v := SplitVariance(fallen, each)
	start := math.Min(0.5, math.Max(1e-4, v.Inputs/(f.Mean*(1-f.Mean))))
	f.climb(f.Mean, start/(1-start))
	if f.Spread > 0 { // once more, from where the first climb ended
		f.climb(f.Mean, f.Spread)
	}
	return f
}

// climb looks for the largest likelihood on the scales of the logit of the mean
// and the logarithm of the spread by the simplex method (Nelder & Mead 1965).
func (f *BetaFit) climb(mean, spread float64) {
	// Kept where the likelihood is a finite number, however far the simplex goes.
	at := func(x []float64) (mean, spread float64) {
		return 1 / (1 + math.Exp(-math.Max(-30, math.Min(30, x[0])))), math.Exp(math.Max(math.Log(least)-1, math.Min(math.Log(largest), x[1])))
	}
	problem := optimize.Problem{Func: func(x []float64) float64 { return -f.logLik(at(x)) }}
	settings := &optimize.Settings{Converger: &optimize.FunctionConverge{Absolute: 1e-11, Iterations: 60}, FuncEvaluations: 4000}
	r, err := optimize.Minimize(problem, []float64{math.Log(mean / (1 - mean)), math.Log(spread)}, settings, &optimize.NelderMead{})
	if r == nil || err != nil && math.IsNaN(r.F) {
		return
	}
	if m, s := at(r.X); s >= least && -r.F > f.LogLik {
		f.Mean, f.Spread, f.LogLik = m, s, -r.F
	}
}

func grouped(fallen []int64, each int64) []group {
	count := map[int64]int64{}
	for _, x := range fallen {
		mustCount(x, each)
		count[x]++
	}
	out := make([]group, 0, len(count))
	for x, n := range count {
		out = append(out, group{x, n})
	}
	sort.Slice(out, func(i, j int) bool { return out[i].fallen < out[j].fallen })
	return out
}

// logLik is the logarithm of the likelihood at a mean in (0, 1) and a spread of
// 0 or more: that of the binomial, and what the rising factorials of alpha, beta
// and their sum add to it.
func (f *BetaFit) logLik(mean, spread float64) float64 {
	if !(mean >= 0 && mean <= 1) {
		return math.Inf(-1)
	}
	total := 0.0
	for _, g := range f.groups {
		at := 0.0
		switch {
		case mean == 0 || mean == 1:
			if float64(g.fallen) != mean*float64(f.each) {
				return math.Inf(-1)
			}
		default:
			at = logBinomial(g.fallen, f.each, mean)
			if spread > 0 {
				a, b := mean/spread, (1-mean)/spread
				at += rise(a, g.fallen) + rise(b, f.each-g.fallen) - rise(1/spread, f.each)
			}
		}
		total += at * float64(g.draws)
	}
	return total
}

// rise is ln (a (a+1) ... (a+x-1) / a^x), without cancellation for large a.
func rise(a float64, x int64) float64 {
	k := float64(x)
	if a < 32 {
		upper, _ := math.Lgamma(a + k)
		lower, _ := math.Lgamma(a)
		return upper - lower - k*math.Log(a)
	}
	// Stirling's formula for Gamma(z+1) at z = a+x-1 and z = a-1.
	z, w := a+k-1, a-1
	return (w+0.5)*math.Log1p(k/w) + k*math.Log1p((k-1)/a) - k + stirlingRest(z) - stirlingRest(w)
}

// Shapes are alpha and beta, +Inf without spread.
func (f *BetaFit) Shapes() (alpha, beta float64) { return f.Mean / f.Spread, (1 - f.Mean) / f.Spread }

// SD is the standard deviation of the risk over draws.
func (f *BetaFit) SD() float64 {
	return math.Sqrt(f.Mean * (1 - f.Mean) * f.Spread / (1 + f.Spread))
}

// Below is the chance that the risk of a draw is at or below p.
func (f *BetaFit) Below(p float64) float64 { return betaBelow(f.Mean, f.Spread, p) }

func betaBelow(mean, spread, p float64) float64 {
	switch {
	case p >= 1:
		return 1
	case p < 0:
		return 0
	case spread < least || mean <= 0 || mean >= 1:
		return toFloat(mean <= p)
	}
	return mathext.RegIncBeta(mean/spread, (1-mean)/spread, p)
}

// tailAt holds the fit against the draws where it matters: the number of draws
// with a count of at most k is binomial with the chance that the fitted
// beta-binomial gives to such a count (a little less spread than that, the law
// being fitted to the same draws), and the tail of what was seen is returned.
func (f *BetaFit) tailAt(k int64) float64 {
	var seen, draws int64
	for _, g := range f.groups {
		draws += g.draws
		if g.fallen <= k {
			seen += g.draws
		}
	}
	p := 0.0
	for x := int64(0); x <= min(k, f.each); x++ {
		one := &BetaFit{each: f.each, groups: []group{{x, 1}}}
		p += math.Exp(one.logLik(f.Mean, f.Spread))
	}
	return BinomialTail(seen, draws, math.Min(1, p))
}

// Quantile is the risk that a share p of the draws does not exceed.
func (f *BetaFit) Quantile(p float64) float64 {
	if f.Spread == 0 {
		return f.Mean
	}
	return bisect(0, 1, func(x float64) bool { return f.Below(x) < p })
}

// Within is the chance that the risk of a draw is at or below a limit, with the
// interval by profile likelihood: all chances that a mean and a spread give whose
// likelihood is within the chi-squared bound, on one degree of freedom, of the
// largest. It stays honest where no spread, or no event, was seen.
func (f *BetaFit) Within(limit, confidence float64) (estimate, low, high float64) {
	twoSided(confidence)
	bound := f.LogLik - distuv.ChiSquared{K: 1}.Quantile(confidence)/2
	estimate = f.Below(limit)
	low, high = estimate, estimate
	for _, s := range f.spreads(bound) {
		m := f.bestMean(s)
		if f.logLik(m, s) < bound {
			continue
		}
		// The chance falls with the mean: its ends are at the ends of the means.
		first, last := 0.0, 1.0
		if f.logLik(0, s) < bound {
			first = f.crossing(m, 0, s, bound)
		}
		if f.logLik(1, s) < bound {
			last = f.crossing(m, 1, s, bound)
		}
		low, high = math.Min(low, betaBelow(last, s, limit)), math.Max(high, betaBelow(first, s, limit))
	}
	return estimate, low, high
}

// crossing is the mean between one whose likelihood reaches the bound and one
// whose does not, on the side that does.
func (f *BetaFit) crossing(in, out, spread, bound float64) float64 {
	for math.Abs(out-in) > 1e-7*math.Min(in, 1-in)+1e-12 {
		if mid := (in + out) / 2; f.logLik(mid, spread) >= bound {
			in = mid
		} else {
			out = mid
		}
	}
	return in
}

// steps is the number of spreads at which the profile is looked at.
const steps = 40

// spreads are 0 (if its likelihood will do) and spreads in equal steps of the
// logarithm over those whose likelihood reaches the bound at some mean.
func (f *BetaFit) spreads(bound float64) []float64 {
	reaches := func(s float64) bool { return f.logLik(f.bestMean(s), s) >= bound }
	from, to := math.Log(least), math.Log(largest)
	peak := math.Log(math.Max(least, f.Spread))
	halve := func(in, out float64) float64 { // from a spread that reaches to one that does not
		for range 30 {
			if mid := (in + out) / 2; reaches(math.Exp(mid)) {
				in = mid
			} else {
				out = mid
			}
		}
		return in
	}
	out := []float64{}
	if reaches(0) {
		out = append(out, 0)
	}
	if !reaches(least) {
		from = halve(peak, from)
	}
	if !reaches(largest) {
		to = halve(peak, to)
	}
	for i := 0; i <= steps; i++ {
		out = append(out, math.Exp(from+(to-from)*float64(i)/steps))
	}
	return out
}

// bestMean is the mean of the largest likelihood at a spread. The logarithm of
// the likelihood is concave in the mean, being a sum of logarithms of linear
// functions; the golden section finds its top.
func (f *BetaFit) bestMean(spread float64) float64 {
	if f.Mean == 0 || f.Mean == 1 {
		return f.Mean
	}
	const golden = 0.6180339887498949
	lo, hi := 0.0, 1.0
	x, y := hi-golden, golden
	fx, fy := f.logLik(x, spread), f.logLik(y, spread)
	for hi-lo > 1e-7*math.Min(f.Mean, 1-f.Mean) && x < y {
		if fx < fy {
			lo, x, fx = x, y, fy
			y = lo + golden*(hi-lo)
			fy = f.logLik(y, spread)
		} else {
			hi, y, fy = y, x, fx
			x = hi - golden*(hi-lo)
			fx = f.logLik(x, spread)
		}
	}
	return (lo + hi) / 2
}
