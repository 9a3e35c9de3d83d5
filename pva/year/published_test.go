package year

import (
	"fmt"
	"math"
	"testing"

	"ebbline/pva"
	"ebbline/pva/estimate"
)

// level is the false-alarm level of each comparison here; the suite's budget is
// 1e-5 and this package makes fewer than 300 comparisons. With 60,000
// replicates a true probability of 0.1 that is off by 0.0099 is caught with
// 99 % power (5.73 + 2.33 standard errors).
const level = 1e-8

const replicates = 60000

// near fails unless a count of n is likely, at the level, under probability p.
func near(t *testing.T, what string, count, n int64, p float64) {
	t.Helper()
	if tail := estimate.BinomialTail(count, n, p); tail < level {
		t.Errorf("%s: %d of %d (%.6f), but the probability is %.8g (two-sided tail %.3g)", what, count, n, float64(count)/float64(n), p, tail)
	}
}

// nearMean fails unless a mean of n values of the stated variance is within
// 5.73 standard errors (level 1e-8, normal).
func nearMean(t *testing.T, what string, mean float64, n int64, want, variance float64) {
	t.Helper()
	if z := (mean - want) / math.Sqrt(variance/float64(n)); math.Abs(z) > 5.73 || math.IsNaN(z) {
		t.Errorf("%s: mean %.6g, want %.6g (%.2f standard errors)", what, mean, want, z)
	}
}

// linear is the case of a linear birth-death process.
func linear(t testing.TB, lambda, mu, n0 float64, years int, more ...any) *pva.Case {
	return caseOf(t, append([]any{"question.threshold", 0, "question.horizon", years, "start.abundance", n0,
		"births.breeding", "flow", "births.rate", lambda, "deaths.rate", mu, "run.seed", 11}, more...)...)
}

// TestLinearBirthDeath holds the flow year against the linear birth-death
// process: extinction by time t and the law of N(t) are D. G. Kendall 1948,
// Ann. Math. Statist. 19:1-15; mean and variance N. T. J. Bailey 1964, The
// Elements of Stochastic Processes, ch. 8. The same for every event (as
// auto takes them here) and for sub-steps, whose transition is exact where rates
// don't change.
// The last two rows are pure death and pure birth (G. U. Yule 1925).
func TestLinearBirthDeath(t *testing.T) {
	rows := []struct {
		lambda, mu     float64
		years          int
		n0             float64
		extinct        float64
		mean, variance float64
		law            map[int64]float64
	}{
		{0.3, 0.2, 5, 3, 0.08540705151, 4.946163812, 16.04340837, map[int64]float64{1: 0.11051398, 5: 0.093946068, 10: 0.031742087}},
		{0.3, 0.2, 20, 3, 0.2543696684, 22.1671683, 708.136409, map[int64]float64{1: 0.021880837, 5: 0.020040168, 20: 0.013529774}},
		{0.2, 0.3, 10, 5, 0.41209039, 1.839397206, 5.813603948, map[int64]float64{1: 0.17653229, 5: 0.043317008}},
		{0.25, 0.25, 10, 4, 0.2603082049, 4, 20, map[int64]float64{1: 0.11899804, 4: 0.077965571, 12: 0.015330238}},
		{0.11, 0.1, 50, 10, 0.1038740881, 16.48721271, 224.6077171, map[int64]float64{1: 0.032448073, 10: 0.03065312, 30: 0.011874642}},
		{0.5, 0.45, 20, 20, 0.03922059377, 54.36563657, 1774.894223, map[int64]float64{1: 0.0075829909, 20: 0.010751388, 60: 0.0082297956}},
		{0, 0.2, 5, 10, 0.01018589403, 3.678794412, 2.325441579, map[int64]float64{1: 0.059279531, 4: 0.24538096}},
		{0.2, 0, 5, 2, 0, 5.436563657, 9.341548541, map[int64]float64{2: 0.13533528, 3: 0.17109643, 5: 0.13673219, 10: 0.031049375}},
	}
	for _, r := range rows {
		for _, substeps := range []string{"events", "3"} {
			name := fmt.Sprintf("births %v deaths %v from %v over %d (%s)", r.lambda, r.mu, r.n0, r.years, substeps)
			c := linear(t, r.lambda, r.mu, r.n0, r.years, "run.substeps", substeps)
			tally := run(t, c, replicates, 2)
			last := &tally.Years[r.years-1]
			near(t, name+" extinct", last.Extinct, replicates, r.extinct)
			if last.Extinct != last.Fallen {
				t.Errorf("%s: %d extinct but %d fallen: without births from nothing they are one", name, last.Extinct, last.Fallen)
			}
			// The variance of N is about four moments' worth of tail; the mean's
			// own standard error needs only the variance.
			nearMean(t, name+" mean", last.Sum.Float()/replicates, replicates, r.mean, r.variance)
			for n, p := range r.law {
				near(t, fmt.Sprintf("%s N=%d", name, n), last.Abundance.AtOrBelow(n)-last.Abundance.AtOrBelow(n-1), replicates, p)
			}
		}
	}
}

// TestImmigration: with deaths above births a stream of additions comes to rest
// in a negative binomial law (D. G. Kendall 1949, J. R. Statist. Soc. B
// 11:230-282). After 100 years the start is forgotten to below 1e-4 of a
// standard error.
func TestImmigration(t *testing.T) {
	for _, substeps := range []string{"events", "12"} {
		c := linear(t, 0.2, 0.3, 5, 60, "stocking.1.add", 0.5, "stocking.1.when", "through", "run.substeps", substeps)
		tally := run(t, c, 20000, 2)
		last := &tally.Years[59]
		laws := map[int64]float64{0: 0.0641500299, 1: 0.106916717, 5: 0.0990959567, 10: 0.0315579502}
		for n, p := range laws {
			if substeps != "events" && n == 0 {
				continue // sub-steps let additions act once a sub-step: an approximation near 0
			}
			near(t, fmt.Sprintf("immigration, %s: N=%d", substeps, n), last.Abundance.AtOrBelow(n)-last.Abundance.AtOrBelow(n-1), 20000, p)
		}
		nearMean(t, "immigration mean", last.Sum.Float()/20000, 20000, 5, 15)
	}
}

// TestConstantRemoval: births lambda, deaths mu and h removals a year while any
// are left (gambler's ruin with state-dependent rates; Karlin & Taylor 1975,
// ch. 4; values by matrix exponential and by series).
func TestConstantRemoval(t *testing.T) {
	rows := []struct {
		lambda, mu, h, n0 float64
		p                 map[int]float64
	}{
		{0.3, 0.2, 0.5, 10, map[int]float64{5: 0.0109122149, 10: 0.0722759108, 20: 0.178284185}},
		{0.3, 0.3, 0.4, 6, map[int]float64{5: 0.207584669, 10: 0.530349254, 20: 0.809816387}},
		{0.2, 0.3, 1.0, 15, map[int]float64{5: 0.116469625, 10: 0.722826099, 20: 0.993900201}},
	}
	for _, r := range rows {
		c := linear(t, r.lambda, r.mu, r.n0, 20, "harvest.1.rule", "constant", "harvest.1.take", r.h, "harvest.1.when", "through", "run.substeps", "events")
		tally := run(t, c, replicates, 2)
		for year, p := range r.p {
			near(t, fmt.Sprintf("removal of %v from %v by year %d", r.h, r.n0, year), tally.Years[year-1].Fallen, replicates, p)
		}
	}
}

// TestCrowdedChains holds the flow year with crowding against absorption
// probabilities of density-dependent birth-death chains, watched always. The
// values were computed by uniformisation (A. Jensen 1953, Skand. Aktuar.
// 36:87-91) and by matrix exponentials. The same mean equation carries quite
// different risks with crowding in deaths, births or both.
func TestCrowdedChains(t *testing.T) {
	deaths := func(b, d, k float64) []any {
		return []any{"births.rate", b, "deaths.rate", d, "deaths.crowding.form", "linear", "deaths.crowding.capacity", k}
	}
	births := func(b, d, k float64) []any {
		return []any{"births.rate", b, "deaths.rate", d, "births.crowding.form", "linear", "births.crowding.capacity", k}
	}
	take := func(h float64) []any {
		return []any{"harvest.1.rule", "constant", "harvest.1.take", h, "harvest.1.when", "through"}
	}
	join := func(parts ...[]any) (out []any) {
		for _, p := range parts {
			out = append(out, p...)
		}
		return out
	}
	rows := []struct {
		name  string
		n0, q float64
		pairs []any
		p     map[int]float64
	}{
		{"crowding in deaths, K = 20", 20, 0, deaths(.5, .3, 20), map[int]float64{10: 0.0017443208, 20: 0.013871033, 50: 0.069239873}},
		{"crowding in births, K = 20", 10, 0, births(.6, .4, 20), map[int]float64{10: 0.025191642, 20: 0.059540145, 50: 0.12408543}},
		{"crowding in both, K = 15", 15, 0, join(deaths(.8, .5, 15), []any{"births.crowding.form", "linear", "births.crowding.capacity", 15.0}), map[int]float64{10: 0.025321016, 20: 0.089820492, 50: 0.27256227}},
		{"K = 50, take of 2", 50, 0, join(deaths(.5, .3, 50), take(2)), map[int]float64{10: 0.0013676692, 20: 0.044005142, 50: 0.33792261}},
		{"K = 50, 5 % a year per head", 50, 0, join(deaths(.5, .3, 50), []any{"harvest.1.rule", "fraction", "harvest.1.rate", 0.05, "harvest.1.when", "through"}), map[int]float64{50: 0.0075554654}},
		{"K = 50, take of 3 while more than 25", 50, 0, join(deaths(.5, .3, 50), take(3), []any{"harvest.1.leave", 25}), map[int]float64{50: 0.0010660043}},
		{"K = 40, threshold 10, take of 1.5", 30, 10, join(deaths(.5, .3, 40), take(1.5)), map[int]float64{10: 0.13713621, 20: 0.32230443, 50: 0.66859709}},
		{"K = 30, additions", 12, 2, join(deaths(.6, .4, 30), []any{"stocking.1.add", 0.5, "stocking.1.when", "through"}), map[int]float64{10: 0.022574964, 50: 0.044273617}},
		{"theta = 2, K = 30", 15, 0, []any{"births.rate", .5, "deaths.rate", .3, "deaths.crowding.form", "theta", "deaths.crowding.exponent", 2.0, "deaths.crowding.capacity", 30.0}, map[int]float64{50: 0.0025604188}},
		// The scarcity form multiplies births by n/(n+3); deaths rise to b at K =
		// 40 without it, so their scale is stated: 0.6 (1 + n/L) = 1 at 40.
		{"scarcity, half births at 3", 20, 0, []any{"births.rate", 1.0, "deaths.rate", .6, "births.scarcity.form", "saturating", "births.scarcity.half_at", 3.0, "deaths.crowding.form", "linear", "deaths.crowding.scale", 60.0}, map[int]float64{10: 0.047381998, 20: 0.16469482, 50: 0.41991273}},
		{"log-normal births between years", 20, 1, []any{"births.rate", .6, "births.year_sd", 0.6 * math.Sqrt(math.Expm1(0.09)), "deaths.rate", .4, "deaths.crowding.form", "linear", "deaths.crowding.scale", 40.0}, map[int]float64{10: 0.0247622, 20: 0.093832645, 50: 0.29118972}},
		{"take of 2 at the end of a year", 50, 0, join(deaths(.5, .3, 50), []any{"harvest.1.rule", "constant", "harvest.1.take", 2, "harvest.1.when", "end"}), map[int]float64{20: 0.034911586, 50: 0.31353446}},
		{"take of 4 at the end, 25 left", 50, 5, join(deaths(.5, .3, 50), []any{"harvest.1.rule", "constant", "harvest.1.take", 4, "harvest.1.leave", 25, "harvest.1.when", "end"}), map[int]float64{20: 0.003131943, 50: 0.017624988}},
	}
	const n = 12000
	for _, r := range rows {
		c := caseOf(t, append([]any{"question.threshold", r.q, "question.horizon", 50, "question.watch", "always", "start.abundance", r.n0, "births.breeding", "flow", "run.seed", 5}, r.pairs...)...)
		tally := run(t, c, n, 2)
		for year, p := range r.p {
			near(t, fmt.Sprintf("%s by year %d", r.name, year), tally.Years[year-1].Fallen, n, p)
		}
	}
}

// TestBranching: with all breeding and none surviving, generations are a
// branching process (H. W. Watson & F. Galton 1875; T. E. Harris 1963, The
// Theory of Branching Processes), whose extinction probabilities follow by
// iterating the generating function of the offspring law.
func TestBranching(t *testing.T) {
	rows := []struct {
		name string
		mean float64
		more []any
		q    map[int]float64
	}{
		{"poisson 1.1", 1.1, nil, map[int]float64{1: 0.332871084, 2: 0.48006114, 5: 0.65787444, 10: 0.750718183, 20: 0.802363162}},
		{"poisson 0.9", 0.9, nil, map[int]float64{1: 0.40656966, 2: 0.586204071, 5: 0.802771307, 10: 0.91508284, 20: 0.976331137}},
		{"poisson 1.5", 1.5, nil, map[int]float64{1: 0.22313016, 2: 0.311827615, 5: 0.394978569, 10: 0.415139718}},
		{"negative binomial 1.5, size 0.5", 1.5, []any{"births.offspring", "clumped", "births.clumping", 0.5}, map[int]float64{1: 0.5, 2: 0.632455532, 5: 0.736975921, 10: 0.76362072}},
		{"geometric 1.1", 1.1, []any{"births.offspring", "clumped", "births.clumping", 1}, map[int]float64{1: 0.476190476, 2: 0.634441088, 5: 0.791266018, 20: 0.894886918}},
	}
	for _, r := range rows {
		for _, n0 := range []float64{1, 3} {
			c := caseOf(t, append([]any{"question.threshold", 0, "question.horizon", 20, "start.abundance", n0, "births.breeding", "pulse", "births.rate", r.mean, "births.parents", "all",
				"deaths.fraction", 1, "run.seed", 3}, r.more...)...)
			tally := run(t, c, replicates, 2)
			for g, q := range r.q {
				near(t, fmt.Sprintf("%s from %v, generation %d", r.name, n0, g), tally.Years[g-1].Fallen, replicates, math.Pow(q, n0))
			}
		}
	}
}

// TestPulseChains: survivors breed, with a ceiling, a quota and additions; the
// values are from transition matrices (W. Gabriel & R. Bürger 1992, Theor.
// Popul. Biol. 41:44-71, for the method).
func TestPulseChains(t *testing.T) {
	rows := []struct {
		name    string
		n0, q   float64
		s, f, k float64
		more    []any
		p       map[int]float64
		smaller map[int64]float64 // chance of a census at or below, 50 years
	}{
		{"ceiling 50", 10, 0, .7, .4, 50, nil, map[int]float64{10: 0.12565842, 20: 0.36589926, 50: 0.73927151},
			map[int64]float64{2: 0.84070399, 5: 0.92391309, 10: 0.98800932}},
		{"all breed", 10, 0, .7, .35, 50, []any{"births.parents", "all"}, map[int]float64{10: 0.018054321, 20: 0.065443468, 50: 0.13803876}, nil},
		{"additions of 1", 6, 1, .7, .4, 40, []any{"stocking.1.add", 1, "stocking.1.when", "end"}, map[int]float64{10: 0.023720232, 20: 0.033877911, 50: 0.044271776}, nil},
		{"catastrophes", 30, 2, .8, .35, 60, []any{"catastrophe.1.chance", .05, "catastrophe.1.kills", .7, "catastrophe.1.births_times", .5}, map[int]float64{10: 0.063859944, 20: 0.15900083, 50: 0.40721681}, nil},
	}
	for _, r := range rows {
		c := caseOf(t, append([]any{"question.threshold", r.q, "question.horizon", 50, "start.abundance", r.n0, "births.breeding", "pulse", "births.rate", r.f, "deaths.fraction", 1 - r.s,
			"ceiling.abundance", r.k, "run.seed", 8}, r.more...)...)
		tally := run(t, c, replicates, 2)
		for year, p := range r.p {
			near(t, fmt.Sprintf("%s by year %d", r.name, year), tally.Years[year-1].Fallen, replicates, p)
		}
		for n, p := range r.smaller {
			near(t, fmt.Sprintf("%s smallest census at or below %d", r.name, n), tally.Smallest.AtOrBelow(n), replicates, p)
		}
	}
}
