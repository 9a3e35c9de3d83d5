package draws

import (
	"math"
	"strconv"
	"strings"
	"testing"

	"gonum.org/v1/gonum/stat"
	"gonum.org/v1/gonum/stat/distuv"

	"ebbline/pva"
)

// falseAlarm is the chance at which a test of chance here fails though all is
// well; z is its two-sided normal limit.
const (
	falseAlarm = 1e-8
	z          = 5.73
)

// uncertain is one [[uncertain]] table of a test; NaN leaves a figure out.
type uncertain struct {
	key, law            string
	sd, low, high, mode float64
}

var none = math.NaN()

func around(key, law string, sd float64) uncertain { return uncertain{key, law, sd, none, none, none} }

type pair struct {
	a, b string
	r    float64
}

// goats is an invented case with uncertain numbers.
func goats(t *testing.T, seed, draws int, laws []uncertain, pairs []pair, more ...pva.Entry) *pva.Case {
	t.Helper()
	var entries []pva.Entry
	put := func(path string, v pva.Value) {
		entries = append(entries, pva.Entry{Path: path, Value: v, Origin: pva.FromCase})
	}
	put("question.threshold", pva.Num(15))
	put("question.horizon", pva.Num(40))
	put("start.abundance", pva.Num(85))
	put("births.breeding", pva.Text("pulse"))
	put("births.rate", pva.Num(0.3))
	put("births.trend", pva.Num(0.01))
	put("births.crowding.form", pva.Text("linear"))
	put("births.crowding.capacity", pva.Num(140))
	put("deaths.fraction", pva.Num(0.15))
	put("run.seed", pva.Num(float64(seed)))
	put("run.draws", pva.Num(float64(draws)))
	for i, u := range laws {
		row := "uncertain." + strconv.Itoa(i+1) + "."
		put(row+"key", pva.Text(u.key))
		put(row+"law", pva.Text(u.law))
		for key, v := range map[string]float64{"sd": u.sd, "low": u.low, "high": u.high, "mode": u.mode} {
			if !math.IsNaN(v) {
				put(row+key, pva.Num(v))
			}
		}
	}
	for i, p := range pairs {
		row := "uncertain_pair." + strconv.Itoa(i+1) + "."
		put(row+"keys.1", pva.Text(p.a))
		put(row+"keys.2", pva.Text(p.b))
		put(row+"rank_correlation", pva.Num(p.r))
	}
	c, faults := pva.Build(append(entries, more...))
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	return c
}

func design(t *testing.T, c *pva.Case) *Design {
	t.Helper()
	d, err := New(c)
	if err != nil {
		t.Fatal(err)
	}
	return d
}

func column(d *Design, j int) []float64 {
	out := make([]float64, d.Draws())
	for i := range out {
		out[i] = d.Values(i)[j]
	}
	return out
}

// TestLaws holds mean and standard deviation of every law against closed forms,
// and its values against gonum's own distributions.
func TestLaws(t *testing.T) {
	const v, sd = 0.3, 0.05
	shape := v*(1-v)/(sd*sd) - 1 // alpha + beta of a beta law by mean and SD
	low, high, mode := 0.1, 0.6, 0.2
	z95 := distuv.UnitNormal.Quantile(0.975) // 1.96 (Abramowitz & Stegun 1964, table 26.1)
	a, b := math.Log(low), math.Log(high)
	mu, sigma := (a+b)/2, (b-a)/2/z95
	for _, c := range []struct {
		u        pva.Uncertain
		mean, sd float64
		cdf      func(float64) float64
	}{
		{pva.Uncertain{Law: "normal", SD: set(sd)}, v, sd, distuv.Normal{Mu: v, Sigma: sd}.CDF},
		{pva.Uncertain{Law: "lognormal", SD: set(sd)}, v, sd, nil},
		{pva.Uncertain{Law: "beta", SD: set(sd)}, v, sd, distuv.Beta{Alpha: v * shape, Beta: (1 - v) * shape}.CDF},
		{pva.Uncertain{Law: "uniform", SD: set(sd)}, v, sd, distuv.Uniform{Min: v - sd*math.Sqrt(3), Max: v + sd*math.Sqrt(3)}.CDF},
		{pva.Uncertain{Law: "triangular", SD: set(sd)}, v, sd, distuv.NewTriangle(v-sd*math.Sqrt(6), v+sd*math.Sqrt(6), v, nil).CDF},
		{pva.Uncertain{Law: "normal", Low: set(low), High: set(high)}, 0.35, 0.25 / z95, distuv.Normal{Mu: 0.35, Sigma: 0.25 / z95}.CDF},
		{pva.Uncertain{Law: "lognormal", Low: set(low), High: set(high)}, math.Exp(mu + sigma*sigma/2),
			math.Exp(mu+sigma*sigma/2) * math.Sqrt(math.Expm1(sigma*sigma)), distuv.LogNormal{Mu: mu, Sigma: sigma}.CDF},
		{pva.Uncertain{Law: "uniform", Low: set(low), High: set(high)}, 0.35, 0.5 / math.Sqrt(12), distuv.Uniform{Min: low, Max: high}.CDF},
		{pva.Uncertain{Law: "triangular", Low: set(low), High: set(high), Mode: set(mode)}, (low + mode + high) / 3,
			math.Sqrt((low*low + mode*mode + high*high - low*mode - low*high - mode*high) / 18), distuv.NewTriangle(low, high, mode, nil).CDF},
		// Malcolm et al. 1959: mean (low + 4 v + high)/6; shapes 2.6 and 3.4 here, so
		// the variance is 2.6 * 3.4 / (6^2 * 7) widths squared.
		{pva.Uncertain{Law: "beta", Low: set(low), High: set(high)}, (low + 4*v + high) / 6, 0.5 * math.Sqrt(2.6*3.4/(36*7)),
			func(x float64) float64 { return distuv.Beta{Alpha: 2.6, Beta: 3.4}.CDF((x - low) / (high - low)) }},
	} {
		l, words, fault := newLaw(c.u, v)
		if fault != nil {
			t.Fatal(c.u.Law, fault)
		}
		near(t, words+": mean", l.Mean(), c.mean, 1e-12)
		near(t, words+": standard deviation", l.StdDev(), c.sd, 1e-12)
		for p := 0.001; p < 1; p += 0.0499 {
			q := l.Quantile(p)
			near(t, words+": chance of its quantile", l.CDF(q), p, 1e-9)
			if c.cdf != nil {
				near(t, words+": chance by gonum", c.cdf(q), p, 1e-9)
			}
		}
	}
	// The moments of the log-normal by mean and SD, once more, from its quantiles:
	// the mean of exp over the normal's own slices.
	l, _, _ := newLaw(pva.Uncertain{Law: "lognormal", SD: set(sd)}, v)
	sum := 0.0
	const n = 200000
	for i := range n {
		sum += l.Quantile((float64(i) + 0.5) / n)
	}
	near(t, "mean of the log-normal's quantiles", sum/n, v, 1e-5)
}

func set(v float64) pva.Optional { return pva.Optional{Value: v, Set: true} }

func near(t *testing.T, what string, got, want, within float64) {
	t.Helper()
	if !(math.Abs(got-want) <= within*math.Max(1, math.Abs(want))) {
		t.Errorf("%s is %v, want %v", what, got, want)
	}
}

// TestLatin: every slice of equal chance holds one value of each input, with
// and without correlations, so that the distance of Kolmogorov between the draws
// and the law is at most 1/draws (independent draws have about 0.87/sqrt(draws)).
func TestLatin(t *testing.T) {
	const n = 500
	laws := []uncertain{around("births.rate", "normal", 0.02), {"deaths.fraction", "triangular", none, 0.12, 0.19, 0.15}, {"births.crowding.capacity", "uniform", none, 120, 160, none}}
	for _, pairs := range [][]pair{nil, {{"births.rate", "deaths.fraction", -0.4}}} {
		d := design(t, goats(t, 3, n, laws, pairs))
		for j, cdf := range []func(float64) float64{distuv.Normal{Mu: 0.3, Sigma: 0.02}.CDF, distuv.NewTriangle(0.12, 0.19, 0.15, nil).CDF, distuv.Uniform{Min: 120, Max: 160}.CDF} {
			held := map[int]bool{}
			for _, v := range column(d, j) {
				held[int(cdf(v)*n)] = true
			}
			if len(held) != n {
				t.Errorf("%s: the draws are in %d of %d slices", d.Inputs[j].Key, len(held), n)
			}
			if k := distance(column(d, j), cdf); k > 1.0/n+1e-9 {
				t.Errorf("%s: distance from the law %v, at most %v", d.Inputs[j].Key, k, 1.0/n)
			}
		}
	}
}

// distance is Kolmogorov's: the largest gap between sample and law.
func distance(values []float64, cdf func(float64) float64) float64 {
	by := ranks(len(values), func(i int) float64 { return values[i] })
	worst, n := 0.0, float64(len(values))
	for i, r := range by {
		f := cdf(values[i])
		worst = math.Max(worst, math.Max(f-float64(r)/n, float64(r+1)/n-f))
	}
	return worst
}

// limit is the distance that n independent values exceed with the chance of a
// false alarm at most (Dvoretzky, Kiefer & Wolfowitz 1956, with the constant of
// Massart 1990, Ann. Probab. 18:1269).
func limit(n int) float64 { return math.Sqrt(-math.Log(falseAlarm/2) / 2 / float64(n)) }

// TestChance: over many seeds the value of one draw follows its law, and so does
// its place within its slice. Distances of 0.1 are caught.
func TestChance(t *testing.T) {
	const seeds, n = 1000, 7
	cdf := distuv.Normal{Mu: 0.3, Sigma: 0.02}.CDF
	var first, within []float64
	for seed := 1; seed <= seeds; seed++ {
		d := design(t, goats(t, seed, n, []uncertain{around("births.rate", "normal", 0.02)}, nil))
		p := cdf(d.Values(0)[0])
		first = append(first, p)
		within = append(within, p*n-math.Floor(p*n))
	}
	uniform := func(p float64) float64 { return p }
	for what, values := range map[string][]float64{"the value of draw 1": first, "its place in its slice": within} {
		if k := distance(values, uniform); k > limit(seeds) {
			t.Errorf("%s: distance from the law %v, at most %v", what, k, limit(seeds))
		}
	}
}

func spearman(x, y []float64) float64 {
	rank := func(v []float64) []float64 {
		out := make([]float64, len(v))
		for i, r := range ranks(len(v), func(i int) float64 { return v[i] }) {
			out[i] = float64(r)
		}
		return out
	}
	return stat.Correlation(rank(x), rank(y), nil)
}

// TestRankCorrelations: over 60 designs of 400 draws the mean rank correlation is
// the one asked for. Its bias in n draws is that of Moran (1948, Biometrika 35:203)
// at most: E = 6/(pi (n+1)) (asin r + (n-2) asin(r/2)) differs from 6/pi asin(r/2)
// by no more than 0.6/(n+1). And the correlations, those of 0 too, vary less from
// design to design than chance would make them (variance 1/(n-1) of rank
// correlations at 0), which is what the method is for.
func TestRankCorrelations(t *testing.T) {
	const seeds, n = 60, 400
	laws := []uncertain{around("births.rate", "normal", 0.02), around("deaths.fraction", "beta", 0.03), around("births.crowding.capacity", "lognormal", 60), around("start.abundance", "uniform", 9)}
	asked := map[[2]int]float64{{0, 1}: -0.4, {1, 2}: 0.6, {0, 2}: -0.7, {0, 3}: 0, {1, 3}: 0, {2, 3}: 0}
	pairs := []pair{{"births.rate", "deaths.fraction", -0.4}, {"births.crowding.capacity", "deaths.fraction", 0.6}, {"births.rate", "births.crowding.capacity", -0.7}}
	got := map[[2]int][]float64{}
	for seed := 1; seed <= seeds; seed++ {
		d := design(t, goats(t, seed, n, laws, pairs))
		for p := range asked {
			got[p] = append(got[p], spearman(column(d, p[0]), column(d, p[1])))
		}
	}
	low := distuv.ChiSquared{K: seeds - 1}.Quantile(falseAlarm) / (seeds - 1)
	for p, want := range asked {
		mean, sd := stat.MeanStdDev(got[p], nil)
		if within := 0.6/(n+1) + z*sd/math.Sqrt(seeds); math.Abs(mean-want) > within {
			t.Errorf("inputs %v: mean rank correlation %.4f, asked for %v (within %.4f)", p, mean, want, within)
		}
		if want == 0 && sd*sd > low/(n-1) {
			t.Errorf("inputs %v: rank correlations vary by %.4f, as chance does", p, sd)
		}
	}
}

// TestPairsAtTheEnds: correlations of 1 and -1 make the orders the same and
// opposite; three that exclude each other are refused with a factor that helps.
func TestPairsAtTheEnds(t *testing.T) {
	laws := []uncertain{around("births.rate", "normal", 0.02), around("deaths.fraction", "uniform", 0.01), around("start.abundance", "normal", 5)}
	d := design(t, goats(t, 1, 300, laws, []pair{{"births.rate", "deaths.fraction", 1}, {"births.rate", "start.abundance", -1}, {"start.abundance", "deaths.fraction", -1}}))
	near(t, "rank correlation", spearman(column(d, 0), column(d, 1)), 1, 1e-12)
	near(t, "rank correlation", spearman(column(d, 0), column(d, 2)), -1, 1e-12)
	against := func(r float64) []pair {
		return []pair{{"births.rate", "deaths.fraction", r}, {"births.rate", "start.abundance", r}, {"start.abundance", "deaths.fraction", -r}}
	}
	_, err := New(goats(t, 1, 300, laws, against(0.9)))
	if err == nil || !strings.Contains(err.Error(), "cannot hold together") {
		t.Fatalf("correlations that exclude each other: %v", err)
	}
	// Three normal scores of equal size and negative product are correlated by
	// 1/2 at most, their ranks by 6/pi asin(1/4).
	most := 6 / math.Pi * math.Asin(0.25)
	at := strings.Index(err.Error(), "about ") + len("about ")
	factor, _ := strconv.ParseFloat(strings.Fields(err.Error()[at:])[0], 64)
	if factor > most/0.9 || factor < most/0.9-0.01 { // said to two decimals, rounded down
		t.Errorf("the factor that is said to help is %v in %q", factor, err)
	}
	if _, err := New(goats(t, 1, 300, laws, against(0.9*factor))); err != nil {
		t.Errorf("correlations weakened as advised: %v", err)
	}
}
