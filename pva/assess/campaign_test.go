package assess

import (
	"context"
	"flag"
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"ebbline/pva"
	"ebbline/pva/ensemble"
	"ebbline/pva/estimate"
	"ebbline/pva/exact"
	"ebbline/pva/plain"
	"ebbline/pva/rates"
	"ebbline/pva/year"
)

var long = flag.Bool("long", false, "run the long verification campaign")

// The campaign: on random cases over the whole grammar the fast simulator, the
// plain one and the exact answer must agree. The plain simulator shares no code
// with the fast one, and the exact answer draws nothing.
//
// Null hypothesis of every comparison: both sides have one law. The false-alarm
// budget of the whole campaign is 1e-5, shared out equally over its comparisons
// (at most perCase a case). With 4,000 fast replicates a risk of 0.3 off by
// 0.062 is caught with 99 % power in a single case; a fault of a rule shows in
// many cases at once.
const (
	campaignBudget = 1e-5
	perCase        = 12
)

type campaign struct {
	cases       int
	fast, plain int64
}

var (
	shortCampaign = campaign{cases: 60, fast: 4000, plain: 800}
	longCampaign  = campaign{cases: 600, fast: 20000, plain: 4000}
)

func TestCampaign(t *testing.T) {
	k := shortCampaign
	if *long {
		k = longCampaign
	}
	level := campaignBudget / float64(k.cases*perCase)
	exactly, reasons := 0, map[string]int{}
	for i := 0; i < k.cases; i++ {
		c := randomCases.Example(i)
		faults, reason := k.agree(c, uint64(i)+1, level)
		if reason == "" {
			exactly++
		} else {
			reasons[reason]++
		}
		for _, f := range faults {
			t.Errorf("random case %d: %s", i, f)
		}
		if len(faults) > 0 {
			t.Logf("case %d:\n%s", i, entryLines(c))
		}
	}
	t.Logf("%d random cases, %d of them held against the exact answer", k.cases, exactly)
	for r, n := range reasons {
		t.Logf("no exact answer in %d: %s", n, r)
	}
	if exactly < k.cases/3 {
		t.Errorf("only %d of %d cases have an exact answer: the campaign has lost its yardstick", exactly, k.cases)
	}
}

func entryLines(c *pva.Case) string {
	var b strings.Builder
	for _, e := range c.Entries() {
		fmt.Fprintf(&b, "  %s = %s\n", e.Path, e.Value.String())
	}
	return b.String()
}

// sums are what is compared of many replicates.
type sums struct {
	n                     int64
	fallen, extinct       []int64 // by year
	outgrown              int64
	total, square         []float64 // of N in each year, over those not outgrown
	kept                  []int64
	take, takeSq, short   float64
	extra, stocked, close float64
}

// agree compares the three readings of a case and lists what does not agree;
// reason says why there is no exact answer.
func (k campaign) agree(c *pva.Case, seed uint64, level float64) (faults []string, reason string) {
	m, bad := rates.New(c)
	if len(bad) > 0 {
		return []string{pva.Faults(bad).Error()}, "no model"
	}
	tally, err := fastRun(m, seed, k.fast)
	if err != nil {
		return []string{err.Error()}, "failed"
	}
	p, err := plainRun(c, seed, k.plain)
	if err != nil {
		return []string{err.Error()}, "failed"
	}
	h := c.Question.Horizon
	say := func(format string, a ...any) { faults = append(faults, fmt.Sprintf(format, a...)) }
	last := &tally.Years[h-1]
	mid := &tally.Years[(h-1)/2]
	two := func(what string, x, n, y, mm int64) {
		if tail := twoSample(x, n, y, mm); tail < level {
			say("%s: fast %d of %d, plain %d of %d (tail %.2g)", what, x, n, y, mm, tail)
		}
	}
	two("fallen at the horizon", last.Fallen, k.fast, p.fallen[h-1], k.plain)
	two("fallen half-way", mid.Fallen, k.fast, p.fallen[(h-1)/2], k.plain)
	two("extinct at the horizon", last.Extinct, k.fast, p.extinct[h-1], k.plain)
	two("outgrown", last.Outgrown, k.fast, p.outgrown, k.plain)
	// Distribution of N at the horizon: the share at or below the plain median.
	means := func(what string, fast, plainSum float64, variance float64) {
		se := math.Sqrt(variance * (1/float64(k.fast) + 1/float64(k.plain)))
		z := (fast/float64(k.fast) - plainSum/float64(k.plain)) / se
		if se > 0 && math.Abs(z) > zLimit(level)*1.3 { // 30 % for the tails of skewed sums
			say("%s: fast %.4f, plain %.4f (%.1f standard errors)", what, fast/float64(k.fast), plainSum/float64(k.plain), z)
		}
	}
	if last.Outgrown == 0 && p.outgrown == 0 {
		v := p.square[h-1]/float64(k.plain) - math.Pow(p.total[h-1]/float64(k.plain), 2)
		means("N at the horizon", last.Sum.Float(), p.total[h-1], v)
		var take, short float64
		for y := range tally.Years {
			take += tally.Years[y].TakeSum.Float()
			short += tally.Years[y].Shortfall.Float()
		}
		means("take over the horizon", take, p.take, p.takeSq/float64(k.plain)-math.Pow(p.take/float64(k.plain), 2))
	}
	e, err := exact.Solve(context.Background(), m, exact.Options{})
	if err != nil {
		return append(faults, err.Error()), "failed"
	}
	if e.Reason != "" {
		return faults, e.Reason
	}
	one := func(what string, x, n int64, p float64) {
		if tail := estimate.BinomialTailWidened(x, n, math.Min(1, math.Max(0, p)), e.Error+1e-12); tail < level {
			say("%s: %d of %d (%.5f), exact %.7f +- %.1g (tail %.2g)", what, x, n, float64(x)/float64(n), p, e.Error, tail)
		}
	}
	one("fast, fallen at the horizon", last.Fallen, k.fast, e.Risk)
	one("fast, fallen half-way", mid.Fallen, k.fast, e.Fallen[(h-1)/2])
	one("fast, extinct at the horizon", last.Extinct, k.fast, e.Extinction)
	one("plain, fallen at the horizon", p.fallen[h-1], k.plain, e.Risk)
	one("plain, extinct at the horizon", p.extinct[h-1], k.plain, e.Extinction)
	return faults, ""
}

func fastRun(m *rates.Model, seed uint64, n int64) (*pva.Tally, error) {
	engine, err := year.New(seed, m)
	if err != nil {
		return nil, err
	}
	out, err := ensemble.Run(context.Background(), engine, ensemble.Plan{Replicates: n, Workers: 2})
	if err != nil {
		return nil, err
	}
	return out[0], nil
}

func plainRun(c *pva.Case, seed uint64, n int64) (*sums, error) {
	h := c.Question.Horizon
	s := &sums{n: n, fallen: make([]int64, h), extinct: make([]int64, h), total: make([]float64, h), square: make([]float64, h), kept: make([]int64, h)}
	src := rand.NewPCG(seed, 0x9e3779b97f4a7c15)
	for r := int64(0); r < n; r++ {
		p, err := plain.Replicate(c, src)
		if err != nil {
			return nil, err
		}
		if p.Outgrown > 0 {
			s.outgrown++
		}
		var take float64
		for y := 0; y < h; y++ {
			if p.Fallen[y] {
				s.fallen[y]++
			}
			if p.Outgrown > 0 && y+1 >= p.Outgrown {
				continue
			}
			if p.N[y] == 0 {
				s.extinct[y]++
			}
			v := float64(p.N[y])
			s.total[y] += v
			s.square[y] += v * v
			take += float64(p.Take[y])
			s.short += float64(p.Shortfall[y])
		}
		s.take += take
		s.takeSq += take * take
	}
	return s, nil
}

// twoSample is Fisher's exact two-sided test of two binomial counts: twice the
// smaller hypergeometric tail (R. A. Fisher 1935).
func twoSample(x, n, y, m int64) float64 {
	total := x + y
	logChoose := func(n, k int64) float64 {
		a, _ := math.Lgamma(float64(n + 1))
		b, _ := math.Lgamma(float64(k + 1))
		c, _ := math.Lgamma(float64(n - k + 1))
		return a - b - c
	}
	logP := func(i int64) float64 { return logChoose(n, i) + logChoose(m, total-i) - logChoose(n+m, total) }
	lo, hi := max(0, total-m), min(n, total)
	low, high := 0.0, 0.0
	for i := lo; i <= hi; i++ {
		p := math.Exp(logP(i))
		if i <= x {
			low += p
		}
		if i >= x {
			high += p
		}
	}
	return math.Min(1, 2*math.Min(low, high))
}

// zLimit is the two-sided normal limit at a level, by bisection on erfc.
func zLimit(level float64) float64 {
	lo, hi := 0.0, 40.0
	for i := 0; i < 100; i++ {
		if mid := (lo + hi) / 2; math.Erfc(mid/math.Sqrt2) > level {
			lo = mid
		} else {
			hi = mid
		}
	}
	return hi
}
