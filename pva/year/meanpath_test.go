package year

import (
	"fmt"
	"math"
	"testing"

	"ebbline/pva"
)

// The mean path of a large population follows the equation
// dN/dt = (b - d) N - h + a. Each test here compares it with a published
// solution. Populations are counted in millions, so that the standard error of
// the mean of 640 replicates is far below the tolerance, which is stated by
// each: five standard errors (from the tally's own spread) plus the relative
// size of the sub-steps' own error.
const largeReplicates = 640

func meanAt(t *testing.T, c *pva.Case, year int) float64 {
	t.Helper()
	tally := run(t, c, largeReplicates, 2)
	y := &tally.Years[year-1]
	if y.Outgrown > 0 {
		t.Fatalf("%d outgrown", y.Outgrown)
	}
	return y.Sum.Float() / largeReplicates
}

func nearRelative(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if math.Abs(got/want-1) > tolerance || math.IsNaN(got) {
		t.Errorf("%s: %.8g, want %.8g (relative difference %.2g, allowed %.2g)", what, got, want, got/want-1, tolerance)
	}
}

// large is a flow case of millions without weather.
func large(t *testing.T, b, d, n0 float64, years int, more ...any) *pva.Case {
	return caseOf(t, append([]any{"question.threshold", 0, "question.horizon", years, "start.abundance", n0, "births.breeding", "flow", "births.rate", b, "deaths.rate", d,
		"run.stop_above", 1e11, "run.seed", 21}, more...)...)
}

// Malthus: N = N0 exp((b-d) t). The standard error of one path is
// sqrt((b+d)/(b-d) (1 - e^-rt) / N0), 4e-4 here, so 640 replicates give 2e-5.
func TestMeanExponential(t *testing.T) {
	nearRelative(t, "exponential growth", meanAt(t, large(t, .3, .25, 1e7, 20), 20), 1e7*math.Exp(.05*20), 1e-4)
	nearRelative(t, "exponential decline", meanAt(t, large(t, .2, .25, 1e7, 20), 20), 1e7*math.Exp(-.05*20), 1e-4)
}

// Rates quoted per 1,000 (crude rates, as in vital statistics) are the same
// rates: 13.5 and 9.2 per 1,000 are 0.0135 and 0.0092 a head.
func TestMeanPer1000(t *testing.T) {
	c := large(t, 13.5, 9.2, 1e7, 30, "births.per", 1000, "deaths.per", 1000)
	nearRelative(t, "per 1,000", meanAt(t, c, 30), 1e7*math.Exp(.0043*30), 1e-4)
}

// Counting in larger units changes the unit only: 10,000 units of 1,000 animals.
func TestMeanLargerUnits(t *testing.T) {
	c := large(t, .3, .25, 1e4, 20, "case.unit_size", 1000)
	// One path has a relative standard error of 2.5e-2 (see above), 640 give 1e-3.
	nearRelative(t, "units of 1,000", meanAt(t, c, 20)*1000, 1e7*math.Exp(.05*20), 5e-3)
}

// Verhulst's logistic, birth rate falling linearly: N(8) from 50 of K = 1000, r
// = 0.5, is 741.8413372 (closed form and high-order integration); here in units
// of a thousandth. Sub-steps of auto shift the path by well under 1e-4.
func TestMeanLogistic(t *testing.T) {
	for _, side := range []string{"births", "deaths"} {
		more := []any{side + ".crowding.form", "linear", side + ".crowding.capacity", 1e7}
		c := large(t, .8, .3, 5e5, 8, more...)
		nearRelative(t, "logistic, crowding in "+side, meanAt(t, c, 8)/1e4, 741.8413372, 3e-4)
	}
}

// The logistic under a constant take (M. B. Schaefer 1954): r = 0.5, K = 1000,
// H = 100 from 1000: N(10) = 742.6407647; with H = 150, above r K/4, from 1000
// it reaches zero at t = 20.57651204.
func TestMeanLogisticWithTake(t *testing.T) {
	logistic := func(h, n0 float64, years int) *pva.Case {
		return large(t, .8, .3, n0*1e4, years, "births.crowding.form", "linear", "births.crowding.capacity", 1e7,
			"harvest.1.rule", "constant", "harvest.1.take", h*1e4, "harvest.1.when", "through")
	}
	nearRelative(t, "take of 100", meanAt(t, logistic(100, 1000, 10), 10)/1e4, 742.6407647, 3e-4)
	tally := run(t, logistic(150, 1000, 25), largeReplicates, 2)
	for y, want := range map[int]int64{20: 0, 21: largeReplicates} {
		if got := tally.Years[y-1].Fallen; got != want {
			t.Errorf("take of 150: %d fallen by year %d, want %d (the mean path reaches 0 at 20.58)", got, y, want)
		}
	}
	// As long as there are enough: the take stops with the animals, and the
	// total taken is bounded by what was there and was born.
	last := tally.Years[24]
	if last.TakeSum.Float() != 0 {
		t.Error("animals are taken from nothing")
	}
}

// Linear growth with a constant take and a constant addition: N(12) from 20,
// b = 0.2, d = 0.3, h = 1, a = 6, is 40.96417364; from 100 with b = 0.3, d =
// 0.25, h = 6, N(10) = 87.02557459 (integrating factor).
func TestMeanConstantTakeAndAddition(t *testing.T) {
	c := large(t, .2, .3, 2e6, 12, "harvest.1.rule", "constant", "harvest.1.take", 1e5, "harvest.1.when", "through", "stocking.1.add", 6e5, "stocking.1.when", "through")
	nearRelative(t, "take and addition", meanAt(t, c, 12)/1e5, 40.96417364, 3e-4)
	c = large(t, .3, .25, 1e7, 10, "harvest.1.rule", "constant", "harvest.1.take", 6e5, "harvest.1.when", "through")
	nearRelative(t, "constant take", meanAt(t, c, 10)/1e5, 87.02557459, 3e-4)
}

// Rates that change with time: with factors f_y on births the mean is N0
// exp(sum of (b f_y - d)) (D. G. Kendall 1948, time-dependent rates), here with
// a trend, a step, a cycle and factors by year at once.
func TestMeanChangingRates(t *testing.T) {
	c := large(t, .3, .25, 1e7, 12, "births.trend", -.02, "births.steps.1.from", 5, "births.steps.1.factor", .8, "births.cycle.amplitude", .3, "births.cycle.period", 6.0,
		"deaths.by_year.1", 1.0, "deaths.by_year.2", 1.2, "deaths.by_year.3", .9)
	sum := 0.0
	for y := 1; y <= 12; y++ {
		f := math.Pow(.98, float64(y-1)) * (1 + .3*math.Sin(2*math.Pi*float64(y)/6))
		if y >= 5 {
			f *= .8
		}
		g := map[int]float64{1: 1, 2: 1.2}[y]
		if y >= 3 {
			g = .9
		}
		sum += .3*f - .25*g
	}
	nearRelative(t, "changing rates", meanAt(t, c, 12), 1e7*math.Exp(sum), 1e-4)
}

// Births proportional to N: dP/dt = k P^2 has P = P0/(1 - k P0 t) and no value
// from t = 1/(k P0) on (H. von Foerster, P. M. Mora & L. W. Amiot 1960, Science
// 132:1291-1295). With k = 1e-9 and P0 = 2e7 the blow-up comes at t = 50; at t =
// 45, P = 2e8. Every replicate is caught and counted as outgrown in the year of
// the blow-up, within the noise of its time (one path: 1/sqrt(P0), 2e-4).
func TestBlowUp(t *testing.T) {
	c := large(t, 1, 0, 2e7, 60, "births.scarcity.form", "proportional", "births.scarcity.at", 1e9)
	tally := run(t, c, largeReplicates, 2)
	mean := tally.Years[44].Sum.Float() / largeReplicates
	nearRelative(t, "P at nine tenths of the blow-up time", mean, 2e8, 1e-3)
	if early := tally.Years[48].Outgrown; early != 0 {
		t.Errorf("%d outgrown by year 49: the blow-up is at 50", early)
	}
	if caught := tally.Years[50].Outgrown; caught != largeReplicates {
		t.Errorf("%d of %d outgrown by year 51", caught, largeReplicates)
	}
}

// The pulse reading: N grows by (1-m)(1+f) a year, or 1-m+f where all breed.
func TestMeanPulse(t *testing.T) {
	for parents, growth := range map[string]float64{"survivors": .7 * 1.4, "all": .7 + .4} {
		c := caseOf(t, "question.threshold", 0, "question.horizon", 10, "start.abundance", 1e7, "births.breeding", "pulse", "births.rate", .4, "births.parents", parents, "deaths.fraction", .3, "run.stop_above", 1e12)
		nearRelative(t, "pulse, "+parents, meanAt(t, c, 10), 1e7*math.Pow(growth, 10), 1e-4)
	}
}

// Log-normal births have their stated mean and standard deviation exactly: with
// huge numbers and no deaths one pulse year is N0 (1 + f), f of that law.
func TestWeatherMoments(t *testing.T) {
	c := caseOf(t, "question.threshold", 0, "question.horizon", 1, "start.abundance", 1e9, "births.breeding", "pulse", "births.rate", .5, "births.year_sd", .2, "deaths.fraction", 0, "run.stop_above", 1e12)
	tally := run(t, c, replicates, 2)
	nearMean(t, "births of a log-normal year", tally.Years[0].Sum.Float()/replicates/1e9-1, replicates, .5, .2*.2)
	var square float64
	tally.Years[0].Abundance.Each(func(bin int, n int64) {
		v := float64(pva.BinLow(bin)+pva.BinLow(bin+1)) / 2 / 1e9
		square += float64(n) * (v - 1.5) * (v - 1.5)
	})
	// The variance of the squared deviation of a log-normal with CV 0.4: kurtosis 6.3 or so.
	if got := square / replicates; math.Abs(got/.04-1) > 5.73*math.Sqrt(5.5/replicates)+1e-3 {
		t.Error(fmt.Sprintf("variance of births between years %.5f, want 0.04", got))
	}
}

// Auto and events give one answer where a take closes or an addition stops near
// where the population stands (two counts or means may differ by 5.73 standard
// errors). The first case hovers at stop_below, a few animals above the
// threshold; without care in sub-steps its risk came out as 1 instead of 0.
func TestAutoKeepsGuards(t *testing.T) {
	flow := []any{"births.breeding", "flow", "deaths.rate", .05, "births.rate", .2, "births.year_sd", .05, "births.crowding.form", "linear", "births.crowding.capacity", 9000, "run.seed", 6,
		"harvest.1.rule", "constant", "harvest.1.when", "through"}
	for name, pairs := range map[string][]any{
		"closes below": append([]any{"question.threshold", 4980, "question.horizon", 6, "start.abundance", 5000, "harvest.1.take", 600, "harvest.1.stop_below", 5000}, flow...),
		"leaves":       append([]any{"question.threshold", 4940, "question.horizon", 6, "start.abundance", 5600, "harvest.1.take", 3000, "harvest.1.leave", 4950}, flow...),
		"adds below": {"question.threshold", 96, "question.horizon", 4, "start.abundance", 100, "births.breeding", "flow", "births.rate", .1, "deaths.rate", .4, "run.seed", 6,
			"stocking.1.add", 1000, "stocking.1.only_below", 100, "stocking.1.when", "through"},
	} {
		const n = 1500
		auto := run(t, caseOf(t, append(pairs, "run.substeps", "auto")...), n, 2)
		events := run(t, caseOf(t, append(pairs, "run.substeps", "events")...), n, 2)
		last := len(auto.Years) - 1
		for _, at := range []int{0, last} {
			a, e := &auto.Years[at], &events.Years[at]
			pa, pe := float64(a.Fallen)/n, float64(e.Fallen)/n
			p := (pa + pe) / 2
			if z := math.Abs(pa-pe) / math.Sqrt(math.Max(p*(1-p), 1e-9)*2/n); z > 5.73 {
				t.Errorf("%s, year %d: %d fallen in sub-steps, %d by events (z = %.1f)", name, at+1, a.Fallen, e.Fallen, z)
			}
			va := spread(a)
			if z := math.Abs(a.Sum.Float()-e.Sum.Float()) / n / math.Sqrt(2*va/n); z > 5.73 {
				t.Errorf("%s, year %d: mean N %.3f in sub-steps, %.3f by events (z = %.1f)", name, at+1, a.Sum.Float()/n, e.Sum.Float()/n, z)
			}
		}
	}
}

// spread is the variance of a year's abundance.
func spread(y *pva.YearTally) float64 {
	var n, sum, square float64
	y.Abundance.Each(func(bin int, count int64) {
		v := float64(pva.BinLow(bin)+pva.BinLow(bin+1)-1) / 2
		n += float64(count)
		sum += float64(count) * v
		square += float64(count) * v * v
	})
	return math.Max(square/n-sum*sum/n/n, 1e-6)
}
