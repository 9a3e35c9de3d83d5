package plain

import (
	"math"
	"slices"
	"testing"

	"gonum.org/v1/gonum/integrate/quad"
	"gonum.org/v1/gonum/stat/distuv"
)

// A population without births and deaths shows what the rules alone do.
const still = "births.breeding=pulse births.rate=0 deaths.rate=0 question.threshold=10 question.horizon=6 start.year=2027 "

func one(t *testing.T, text string) Path {
	t.Helper()
	return run(t, build(t, text), 1, 21)[0]
}

func same[T comparable](t *testing.T, what string, got []T, want ...T) {
	t.Helper()
	if !slices.Equal(got, want) {
		t.Errorf("%s: %v, expected %v", what, got, want)
	}
}

func TestTakeRulesInTurn(t *testing.T) {
	p := one(t, still+"start.abundance=100 harvest.1.rule=by_year harvest.1.takes.1=5 harvest.1.takes.2=7 harvest.1.takes.3=9 harvest.1.when=end harvest.1.years=2028- harvest.1.one_year_in=2 harvest.1.extra_deaths=2 "+
		"harvest.2.rule=above harvest.2.spare=80 harvest.2.fraction=0.5 harvest.2.when=end harvest.2.years=-2028")
	// 2027: half of the 20 above 80. 2028: 5 and 10 more, then nothing above 80 (75
	// left). 2030 and 2032: the third number of the list.
	same(t, "N", p.N, 90, 75, 75, 48, 48, 21)
	same(t, "take", p.Take, 10, 5, 0, 9, 0, 9)
	same(t, "extra deaths", p.Extra, 0, 10, 0, 18, 0, 18)
}

func TestLeaveStopAndShortfall(t *testing.T) {
	p := one(t, still+"start.abundance=30 harvest.1.rule=constant harvest.1.take=8 harvest.1.leave=11 harvest.1.stop_below=20 harvest.1.extra_deaths=0.25 harvest.1.when=start")
	// 30, less 8 and 2; 20, less 8 and 2; then 10 is below 20: closed.
	same(t, "N", p.N, 20, 10, 10, 10, 10, 10)
	same(t, "take", p.Take, 8, 8, 0, 0, 0, 0)
	same(t, "closed", p.Closed, false, false, true, true, true, true)
	same(t, "fallen", p.Fallen, false, true, true, true, true, true)
	p = one(t, still+"start.abundance=30 harvest.1.rule=constant harvest.1.take=8 harvest.1.leave=11 harvest.1.when=start")
	same(t, "N", p.N, 22, 14, 11, 11, 11, 11)
	same(t, "shortfall", p.Shortfall, 0, 0, 5, 8, 8, 8)
	if p.Smallest != 11 {
		t.Errorf("smallest census %d", p.Smallest)
	}
}

func TestHarvestBeforeStocking(t *testing.T) {
	p := one(t, still+"start.abundance=20 harvest.1.rule=fraction harvest.1.fraction=0.5 harvest.1.when=end stocking.1.add=10 stocking.1.when=end stocking.1.only_below=20 "+
		"stocking.2.add=6 stocking.2.when=start stocking.2.years=2029 ceiling.abundance=19.5")
	same(t, "N", p.N, 19, 19, 19, 19, 19, 19)
	// 20: 10 taken, 10 added, cut to 19. Later half of 19 or 25 is rounded at random.
	if none := one(t, still+"start.abundance=20 stocking.1.add=5 stocking.1.when=start stocking.1.only_below=20"); none.N[5] != 20 {
		t.Errorf("stocked at the very limit: %v", none.N)
	}
	if p.Stocked[0] != 10 || p.Stocked[2] != 16 || p.Take[0] != 10 {
		t.Errorf("%+v", p)
	}
}

// A survey estimate is log-normal with mean N, and kept until the next survey.
func TestSurvey(t *testing.T) {
	const take = "harvest.1.rule=constant harvest.1.take=0 harvest.1.survey_cv=0.3 harvest.1.survey_every=3 harvest.1.stop_below=900 harvest.1.when=end harvest.1.years=2028-"
	paths := run(t, build(t, still+"start.abundance=1000 "+take), 10000, 22)
	tau := math.Sqrt(math.Log1p(0.09))
	low := distuv.UnitNormal.CDF((math.Log(0.9) + tau*tau/2) / tau)
	for _, p := range paths {
		if p.Closed[0] || p.Closed[1] != p.Closed[3] || p.Closed[4] != p.Closed[5] {
			t.Fatalf("survey not kept: %v", p.Closed)
		}
	}
	share(t, "closed", paths, low, func(p Path) bool { return p.Closed[1] })
	share(t, "closed, then open", paths, low*(1-low), func(p Path) bool { return p.Closed[1] && !p.Closed[4] })
}

// Errors of the take and of the start, each by the chance of one event.
func TestErrorsOfTheTake(t *testing.T) {
	const head = still + "start.abundance=1000 harvest.1.when=end "
	const ten = head + "harvest.1.rule=constant harvest.1.take=20 harvest.1.share=0.5 "
	least := func(k int64) func(Path) bool { return func(p Path) bool { return p.Take[0] >= k } }
	paths := run(t, build(t, head+"harvest.1.rule=constant harvest.1.take=15.3"), 10000, 23)
	share(t, "rounded up", paths, 0.3, least(16))
	share(t, "rounded at all", paths, 1, func(p Path) bool { return p.Take[0] == 15 || p.Take[0] == 16 })
	share(t, "Poisson take", run(t, build(t, ten+"harvest.1.take_noise=poisson"), 10000, 24), 1-distuv.Poisson{Lambda: 10}.CDF(12), least(13))
	share(t, "each animal", run(t, build(t, head+"harvest.1.rule=fraction harvest.1.fraction=0.02 harvest.1.share=0.5 harvest.1.take_noise=each-animal"), 10000, 25),
		1-distuv.Binomial{N: 1000, P: 0.01}.CDF(12), least(13))
	// A log-normal rounded at random is at least 13 with the chance that it is above
	// 12 + a uniform number.
	tau := math.Sqrt(math.Log1p(0.04))
	above := func(x float64) float64 {
		return 1 - distuv.UnitNormal.CDF((math.Log(x/10)+tau*tau/2)/tau)
	}
	p := quad.Fixed(above, 12, 13, 20, quad.Legendre{}, 0)
	share(t, "take_cv", run(t, build(t, ten+"harvest.1.take_cv=0.2"), 10000, 26), p, least(13))
	share(t, "start.cv", run(t, build(t, still+"start.abundance=10 start.cv=0.2"), 10000, 27), p, func(p Path) bool { return p.N[0] >= 13 })
	share(t, "Poisson stocking", run(t, build(t, still+"start.abundance=10 stocking.1.add=10 stocking.1.noise=poisson stocking.1.when=start"), 10000, 28),
		1-distuv.Poisson{Lambda: 10}.CDF(12), func(p Path) bool { return p.Stocked[0] >= 13 })
}

// One animal is killed by a catastrophe with the mean of a variable fraction; two
// are both killed with the mean of its square.
func TestCatastropheWithSpread(t *testing.T) {
	c := build(t, still+"start.abundance=2 catastrophe.1.once_in=4 catastrophe.1.kills=0.6 catastrophe.1.kills_sd=0.2")
	share(t, "both killed", run(t, c, 20000, 29), 0.25*(0.36+0.04), func(p Path) bool { return p.N[0] == 0 })
}

func TestOutgrown(t *testing.T) {
	p := one(t, "births.breeding=pulse births.rate=1 births.offspring=at-most-one deaths.rate=0 start.abundance=10 question.threshold=12 question.horizon=6 run.stop_above=100 ceiling.abundance=90 "+
		"harvest.1.rule=constant harvest.1.take=3 harvest.1.when=start harvest.1.years=2-")
	// 20, 34, 62, then 118 passes 100 before the ceiling cuts it.
	same(t, "N", p.N, 20, 34, 62, 118, 118, 118)
	same(t, "take", p.Take, 0, 3, 3, 3, 0, 0)
	same(t, "fallen", p.Fallen, false, false, false, false, false, false)
	if p.Outgrown != 4 || p.Smallest != 20 {
		t.Errorf("outgrown in year %d, smallest %d", p.Outgrown, p.Smallest)
	}
	p = one(t, "births.breeding=pulse births.rate=1 births.offspring=at-most-one deaths.rate=0 start.abundance=60 question.threshold=0 question.horizon=2 run.stop_above=100 harvest.1.rule=constant harvest.1.take=50 harvest.1.when=end")
	same(t, "N outgrown before the take", p.N, 120, 120)
	p = one(t, still+"start.abundance=20 stocking.1.add=100 stocking.1.when=end stocking.1.years=2028 run.stop_above=100 ceiling.abundance=50")
	same(t, "N stocked past the limit", p.N, 20, 120, 120, 120, 120, 120)
	flow := run(t, build(t, "births.breeding=flow births.rate=1 deaths.rate=0 births.scarcity.form=proportional births.scarcity.at=10 start.abundance=10 question.threshold=0 question.horizon=5 run.stop_above=1000"), 100, 30)
	for _, p := range flow {
		// The mean-field equation blows up at 1/(k N0) = 1 year (k = 0.1).
		if p.Outgrown == 0 || p.N[4] != 1001 {
			t.Fatalf("no blow-up: %+v", p)
		}
	}
}

// Twenty of 20 are taken and 20 stocked at once: only a population that is always
// watched has fallen.
func TestWatch(t *testing.T) {
	const head = "births.breeding=flow births.rate=0 deaths.rate=0 start.abundance=20 question.threshold=5 question.horizon=2 harvest.1.rule=constant harvest.1.take=20 harvest.1.when=start harvest.1.years=2 stocking.1.add=20 stocking.1.when=start stocking.1.years=2 question.watch="
	same(t, "always", one(t, head+"always").Fallen, false, true)
	same(t, "census", one(t, head+"census").Fallen, false, false)
	const start = "births.breeding=flow births.rate=0 question.horizon=1 stocking.1.add=5 stocking.1.when="
	same(t, "at the start", one(t, start+"start deaths.rate=0 start.abundance=2 question.threshold=2 question.watch=always").Fallen, true)
	within := run(t, build(t, start+"end deaths.fraction=0.8 start.abundance=1 question.threshold=0 question.watch=always"), 10000, 34)
	share(t, "within the year", within, 0.8, fallenBy(1))
}

// A stream of 3 a year over animals that neither breed nor die: the numbers taken
// and missed are Poisson, and nothing is taken once 10 are left.
func TestStreams(t *testing.T) {
	const head = "births.breeding=flow births.rate=0 deaths.rate=0 start.abundance=12 question.threshold=0 question.horizon=2 harvest.1.rule=constant harvest.1.take=3 harvest.1.when=through "
	paths := run(t, build(t, head+"harvest.1.leave=10"), 10000, 31)
	share(t, "none taken", paths, math.Exp(-3), func(p Path) bool { return p.Take[0] == 0 })
	share(t, "taken and missed", paths, distuv.Poisson{Lambda: 6}.CDF(5), func(p Path) bool {
		return p.Take[0]+p.Take[1]+p.Shortfall[0]+p.Shortfall[1] <= 5
	})
	share(t, "left alone", paths, 1, func(p Path) bool { return p.N[1] >= 10 && p.Take[0]+p.Take[1] == 12-p.N[1] })
	paths = run(t, build(t, head+"harvest.1.stop_below=12"), 10000, 32)
	share(t, "closed after the first", paths, 1-math.Exp(-3), func(p Path) bool { return p.Closed[1] && p.N[1] == 11 && !p.Closed[0] })
	paths = run(t, build(t, "births.breeding=flow births.rate=0 deaths.rate=0 start.abundance=0 question.threshold=0 question.horizon=1 stocking.1.add=4 stocking.1.when=through stocking.1.only_below=3"), 10000, 35)
	share(t, "immigration", paths, distuv.Poisson{Lambda: 4}.Prob(2), func(p Path) bool { return p.N[0] == 2 && p.Stocked[0] == 2 })
	share(t, "immigration stops", paths, distuv.Poisson{Lambda: 4}.Survival(2), func(p Path) bool { return p.N[0] == 3 })
	paths = run(t, build(t, "births.breeding=flow births.rate=0 deaths.rate=0 start.abundance=12 question.threshold=0 question.horizon=1 harvest.1.rule=fraction harvest.1.fraction=0.4 harvest.1.when=through"), 10000, 33)
	share(t, "fraction", paths, distuv.Binomial{N: 12, P: 0.4}.CDF(4), func(p Path) bool { return p.Take[0] <= 4 })
}
