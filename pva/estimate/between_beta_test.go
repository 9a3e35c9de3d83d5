package estimate

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/stat/combin"
	"gonum.org/v1/gonum/stat/distuv"

	"ebbline/pva"
)

// saxony is the number of boys among the first 12 children of 6,115 families of
// 13 in nineteenth-century Saxony (Geissler 1889), the textbook example of the
// beta-binomial law (Edwards 1958; Lindsey & Altham 1998, Appl. Stat. 47:149).
var saxony = []int{3, 24, 104, 286, 670, 1033, 1343, 1112, 829, 478, 181, 45, 7}

// TestSaxony: the likelihood equations, sums of 1/(alpha + i) and 1/(beta + i),
// have their zero at alpha 34.10286 and beta 31.57823 (by Newton's method), where
// the logarithm of the likelihood is -12492.871. Published fits of these data give
// 34.096 and 31.572, -12492.9 (from memory), short of it by a 1,000th of the
// standard error.
func TestSaxony(t *testing.T) {
	var boys []int64
	for x, families := range saxony {
		for range families {
			boys = append(boys, int64(x))
		}
	}
	f := FitBeta(boys, 12)
	a, b := f.Shapes()
	within(t, "alpha", a, 34.10286, 0.0005)
	within(t, "beta", b, 31.57823, 0.0005)
	within(t, "log likelihood", f.LogLik, -12492.871, 0.001)
}

// TestBetaBinomialLaw: the chances of all counts add up to 1, their mean and
// variance are n m and n m (1-m) (1 + (n-1)/(a+b+1)) (Skellam 1948), and each is
// what binomial coefficients and gonum's beta functions give.
func TestBetaBinomialLaw(t *testing.T) {
	for _, c := range []struct{ mean, spread float64 }{{0.3, 0.5}, {0.02, 0.01}, {0.5, 20}, {0.9, 1e-5}} {
		const n = 40
		sum, mean, square := 0.0, 0.0, 0.0
		a, b := c.mean/c.spread, (1-c.mean)/c.spread
		for x := range int64(n + 1) {
			f := &BetaFit{groups: []group{{x, 1}}, each: n}
			l := f.logLik(c.mean, c.spread)
			want := math.Log(combin.GeneralizedBinomial(n, float64(x))) + logBeta(float64(x)+a, float64(n-x)+b) - logBeta(a, b)
			within(t, "logarithm of a chance", l, want, 1e-9*math.Max(1, 1/c.spread)) // the reference cancels for small spreads
			sum += math.Exp(l)
			mean += math.Exp(l) * float64(x)
			square += math.Exp(l) * float64(x*x)
		}
		within(t, "sum", sum, 1, 1e-11)
		within(t, "mean", mean, n*c.mean, 1e-9)
		within(t, "variance", square-mean*mean, n*c.mean*(1-c.mean)*(1+(n-1)/(a+b+1)), 1e-8)
	}
}

func logBeta(a, b float64) float64 {
	x, _ := math.Lgamma(a)
	y, _ := math.Lgamma(b)
	z, _ := math.Lgamma(a + b)
	return x + y - z
}

// TestFitRecovers: over 150 sets of 200 draws the fitted mean and the fitted
// standard deviation are those of the law that the risks are from. Maximum
// likelihood is biased by the order of one over the draws: 1 % of the standard
// deviation is allowed on top of 5.73 standard errors.
func TestFitRecovers(t *testing.T) {
	src := rand.New(rand.NewPCG(17, 4))
	for _, c := range []struct {
		a, b float64
		each int64
	}{{4, 36, 50}, {1.5, 3, 10}, {30, 20, 400}} {
		law := distuv.Beta{Alpha: c.a, Beta: c.b}
		var means, sds []float64
		for range 150 {
			f := FitBeta(counts(src, 200, c.each, c.a, c.b), c.each)
			means, sds = append(means, f.Mean), append(sds, f.SD())
		}
		m, v := moments(means)
		within(t, "mean of fitted means", m, law.Mean(), 5.73*math.Sqrt(v/150))
		m, v = moments(sds)
		within(t, "mean of fitted standard deviations", m, law.StdDev(), 0.01*law.StdDev()+5.73*math.Sqrt(v/150))
	}
}

// TestNoSpread: counts that vary less than replicates of one risk do give a law
// without spread; all draws then have one risk, on one side of any limit.
func TestNoSpread(t *testing.T) {
	var even []int64
	for i := range 100 {
		even = append(even, 10+int64(i%2))
	}
	f := FitBeta(even, 100)
	if f.Spread != 0 || f.SD() != 0 || f.Mean != 0.105 || f.Below(0.1) != 0 || f.Below(0.11) != 1 || f.Quantile(0.3) != 0.105 {
		t.Errorf("%+v", f)
	}
	// Nothing seen: the chance to be within 1 % is near to 1, and not known to be 1.
	f = FitBeta(make([]int64, 200), 50)
	estimate, low, high := f.Within(0.01, 0.95)
	if estimate != 1 || high != 1 || low > 0.9999 || low < 0.97 {
		t.Errorf("nothing seen: %v, %v to %v", estimate, low, high)
	}
}

// TestWithinCoverage: over 60 sets of 100 draws the interval of the chance to be
// within a limit holds it in 95 %, by the binomial tail at 1e-8. And intervals are no wider than they need be: their
// mean half width is under twice the spread of the estimates times 1.96.
func TestWithinCoverage(t *testing.T) {
	const sets = 60
	src := rand.New(rand.NewPCG(23, 1))
	law := distuv.Beta{Alpha: 4, Beta: 36}
	for _, limit := range []float64{0.12} {
		truth := law.CDF(limit)
		held, width := 0, 0.0
		var estimates []float64
		for range sets {
			f := FitBeta(counts(src, 100, 50, law.Alpha, law.Beta), 50)
			e, low, high := f.Within(limit, 0.95)
			if !(low <= e && e <= high) {
				t.Fatalf("%v outside %v to %v", e, low, high)
			}
			if low <= truth && truth <= high {
				held++
			}
			estimates = append(estimates, e)
			width += (high - low) / 2 / sets
		}
		if tail := BinomialTail(int64(held), sets, 0.95); float64(held) < 0.95*sets && tail < 1e-8 {
			t.Errorf("limit %v: held %d of %d", limit, held, sets)
		}
		mean, v := moments(estimates)
		if width > 2*1.96*math.Sqrt(v) {
			t.Errorf("limit %v: half width %v, estimates vary by %v", limit, width, math.Sqrt(v))
		}
		within(t, "mean chance within", mean, truth, 0.01+5.73*math.Sqrt(v/sets))
	}
}

// TestRawSharesMislead is why the chance is not read off the shares: with risks
// that are all just within the limit and 10 replicates a draw, many shares lie
// above it, and the fitted law puts the draws where they are.
func TestRawSharesMislead(t *testing.T) {
	src := rand.New(rand.NewPCG(8, 8))
	fallen := make([]int64, 1000)
	raw := 0
	for i := range fallen {
		fallen[i] = int64(distuv.Binomial{N: 10, P: 0.08, Src: src}.Rand())
		if fallen[i] > 1 {
			raw++
		}
	}
	r := &pva.DrawnRisk{Fallen: fallen}
	DrawnRisk(r, 10, pva.Optional{Value: 0.1, Set: true}, 0.95)
	if r.Within.High < 1-1e-6 || float64(raw)/1000 < 0.1 {
		t.Errorf("within by the law %+v; shares above the limit %d of 1000", r.Within, raw)
	}
}

// TestFitTail: risks from two camps, 0.02 and 0.3, are no beta law: with a limit
// between them 70 % of the draws are within it, and the tail says that the fitted
// law does not give so many. Risks of a beta law have a tail that is no alarm: of
// 50 sets none is below 1e-8/50.
func TestFitTail(t *testing.T) {
	src := rand.New(rand.NewPCG(5, 55))
	limit := pva.Optional{Value: 0.08, Set: true}
	camps := make([]int64, 400)
	for i := range camps {
		p := 0.02
		if i%10 > 6 {
			p = 0.3
		}
		camps[i] = int64(distuv.Binomial{N: 100, P: p, Src: src}.Rand())
	}
	r := &pva.DrawnRisk{Fallen: camps}
	if DrawnRisk(r, 100, limit, 0.95); r.FitTail > 1e-3 {
		t.Errorf("two camps: tail %v", r.FitTail)
	}
	for range 50 {
		r := &pva.DrawnRisk{Fallen: counts(src, 100, 50, 4, 36)}
		if DrawnRisk(r, 50, limit, 0.95); r.FitTail < 1e-8/50 || r.FitTail > 1 {
			t.Fatalf("a beta law: tail %v", r.FitTail)
		}
	}
	r = &pva.DrawnRisk{Fallen: camps}
	if DrawnRisk(r, 100, pva.Optional{}, 0.95); r.FitTail != 1 {
		t.Errorf("without a limit: %v", r.FitTail)
	}
}

// TestExactLaw: from exact risks all figures follow by counting.
func TestExactLaw(t *testing.T) {
	r := &pva.DrawnRisk{Fallen: []int64{0, 1, 2, 1}, Exact: []float64{0.04, 0.1, 0.26, 0.2}, ExactError: 0.001}
	DrawnRisk(r, 10, pva.Optional{Value: 0.1, Set: true}, 0.95)
	within(t, "mean", r.Law.Mean, 0.15, 1e-15)
	// Variance of 0.04, 0.1, 0.26, 0.2: (0.0121 + 0.0025 + 0.0121 + 0.0025)/3.
	within(t, "standard deviation", r.Law.SD, math.Sqrt(0.0292/3), 1e-15)
	_, low, high := BetweenDraws(r.Exact, 0.95)
	within(t, "low", r.Mean.Low, low-0.001, 1e-15)
	within(t, "high", r.Mean.High, high+0.001, 1e-15)
	low, high = Wilson(2, 4, 0.95)
	if *r.Within != (pva.Chance{Estimate: 0.5, Low: low, High: high}) {
		t.Errorf("within %+v", *r.Within)
	}
	if p := r.Law.Percentiles; p != (pva.Percentiles{P05: 0.04, P25: 0.04, P50: 0.1, P75: 0.2, P95: 0.26}) {
		t.Errorf("percentiles %+v", p)
	}
}

// TestFewDrawsDoNotDecide: 20 draws whose exact risks are all small do not show
// that the mean over all draws is within 5 %: with one draw in 14 fallen for sure
// (mean 7 %) none of 20 is such a draw in 23 of 100 runs. Of 200 draws one is.
func TestFewDrawsDoNotDecide(t *testing.T) {
	limit := pva.Optional{Value: 0.05, Set: true}
	for draws, want := range map[int]pva.Verdict{20: pva.Undecided, 200: pva.Within} {
		r := &pva.DrawnRisk{Fallen: make([]int64, draws)}
		for i := range draws {
			r.Exact = append(r.Exact, 0.001+0.0001*float64(i%7))
		}
		DrawnRisk(r, 50, limit, 0.95)
		for what, p := range map[string]pva.Proportion{"exact": {Low: r.Mean.Low, High: r.Mean.High}, "pooled": r.Pooled} {
			if got := Verdict(limit, p); got != want {
				t.Errorf("%d draws, %s: verdict %v (%g to %g), want %v", draws, what, got, p.Low, p.High, want)
			}
		}
	}
}

// TestBins: bars are of one round width, without gaps, and hold all of the law
// and all draws.
func TestBins(t *testing.T) {
	src := rand.New(rand.NewPCG(2, 2))
	cases := map[string]*pva.DrawnRisk{
		"fitted":      {Fallen: counts(src, 200, 50, 4, 36)},
		"none seen":   {Fallen: make([]int64, 20)},
		"all":         {Fallen: []int64{50, 50, 50}},
		"no spread":   {Fallen: []int64{5, 5, 5, 5}},
		"wide":        {Fallen: []int64{0, 50, 0, 50, 25}},
		"all or none": {Fallen: []int64{0, 50, 0, 50, 50, 0}},
		"exact":       {Fallen: []int64{1, 2, 3}, Exact: []float64{0.02, 0.0213, 0.07}},
	}
	for name, r := range cases {
		DrawnRisk(r, 50, pva.Optional{}, 0.95)
		share, seen := 0.0, 0.0
		for i, b := range r.Law.Bins {
			share, seen = share+b.Share, seen+b.Seen
			if i > 0 && b.Low != r.Law.Bins[i-1].High || b.High <= b.Low || b.Share < -1e-12 {
				t.Errorf("%s: bar %d is %+v", name, i, b)
			}
		}
		within(t, name+": share", share, 1, 1e-9)
		within(t, name+": seen", seen, 1, 1e-9)
		if n := len(r.Law.Bins); n < 1 || n > bins+1 {
			t.Errorf("%s: %d bars", name, n)
		}
		if r.Within != nil {
			t.Errorf("%s: a chance without a limit", name)
		}
	}
	r := &pva.DrawnRisk{Fallen: []int64{0, 1}}
	if DrawnRisk(r, 1, pva.Optional{Value: 0.1, Set: true}, 0.95); r.Law.Reason == "" || r.Within != nil {
		t.Errorf("one replicate a draw: %+v", r)
	}
}
