package plain

import (
	"math"
	"strconv"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"
)

// Exact answers of density-dependent chains, by the matrix exponential of the
// generator (uniformisation; Jensen 1953, Skand. Aktuar. 36:87) in continuous time
// and by powers of the transition matrix in annual steps (Gabriel & Bürger 1992, Theor. Popul. Biol. 41:44).
func TestChainsThroughTheYear(t *testing.T) {
	const always = "births.breeding=flow question.watch=always "
	const crowded = always + "births.rate=0.5 deaths.rate=0.3 deaths.crowding.form=linear deaths.crowding.capacity=50 start.abundance=50 "
	const taken = crowded + "question.threshold=0 harvest.1.rule=constant harvest.1.when=through "
	for i, k := range []struct {
		what, text string
		start      int
		year       int
		want       float64
	}{
		{"linear births, capacity", always + "births.rate=0.6 deaths.rate=0.4 births.crowding.form=linear births.crowding.capacity=20 start.abundance=10 question.threshold=0", 10, 20, 0.059540145},
		{"capacity on both sides", always + "births.rate=0.8 deaths.rate=0.5 births.crowding.form=linear births.crowding.capacity=15 deaths.crowding.form=linear deaths.crowding.capacity=15 start.abundance=15 question.threshold=0", 15, 20, 0.089820492},
		{"take of 3 a year", taken + "harvest.1.take=3", 50, 20, 0.23466615},
		{"take of 6 at a share of half", taken + "harvest.1.take=6 harvest.1.share=0.5", 50, 20, 0.23466615},
		{"take and extra deaths", taken + "harvest.1.take=2 harvest.1.extra_deaths=0.5", 50, 20, 0.23466615},
		{"take for ten years", taken + "harvest.1.take=3 harvest.1.years=-2036 start.year=2027", 50, 20, 0.019459771},
		{"take above 10, threshold 10", always + "births.rate=0.5 deaths.rate=0.3 deaths.crowding.form=linear deaths.crowding.scale=60 start.abundance=30 question.threshold=10 harvest.1.rule=constant harvest.1.take=1.5 harvest.1.when=through", 30, 20, 0.32230443},
		{"Allee effect", always + "births.rate=1 deaths.rate=0.6 deaths.crowding.form=linear deaths.crowding.scale=60 births.scarcity.form=saturating births.scarcity.half_at=3 start.abundance=20 question.threshold=0", 20, 20, 0.16469482},
		{"stocking as immigration", always + "births.rate=0.6 deaths.rate=0.4 deaths.crowding.form=linear deaths.crowding.scale=60 stocking.1.add=0.5 stocking.1.when=through start.abundance=12 question.threshold=2", 12, 20, 0.031936081},
		{"log-normal births", always + "births.rate=0.6 births.year_sd=" + num(0.6*math.Sqrt(math.Expm1(0.09))) + " deaths.rate=0.4 deaths.crowding.form=linear deaths.crowding.scale=40 start.abundance=20 question.threshold=1", 20, 20, 0.093832645},
		{"take of 2 at each year's end", crowded + "question.threshold=0 harvest.1.rule=constant harvest.1.take=2 harvest.1.when=end", 50, 20, 0.034911586},
	} {
		c := build(t, k.text+" question.horizon="+strconv.Itoa(k.year))
		share(t, k.what, run(t, c, 2000, uint64(100+i)), k.want, fallenBy(k.year))
	}
}

func TestChainsOfAnnualSteps(t *testing.T) {
	const pulse = "births.breeding=pulse "
	// Survival 1/(1 + exp(-(u + 0.5 z))) with mean 0.73912638 and births
	// 0.45 exp(0.4 z - 0.08) under the same z: deaths vary against births.
	sd := logitSD(-math.Log(3), 0.5)
	noisy := pulse + "births.rate=0.45 births.year_sd=" + num(0.45*math.Sqrt(math.Expm1(0.16))) +
		" deaths.fraction=0.26087362 deaths.year_sd=" + num(sd) + " weather.correlation=-1 ceiling.abundance=80 start.abundance=40 question.threshold=0 "
	ricker := pulse + "births.parents=all births.rate=" + num(math.Exp(0.4)) + " deaths.fraction=1 births.crowding.form=ricker births.crowding.scale=75 start.abundance=10 question.threshold=0 "
	for i, k := range []struct {
		what, text string
		year       int
		want       float64
	}{
		{"ceiling", pulse + "births.rate=0.4 deaths.fraction=0.3 ceiling.abundance=50 start.abundance=10 question.threshold=0", 20, 0.36589926},
		{"all breed", pulse + "births.rate=0.35 births.parents=all deaths.fraction=0.3 ceiling.abundance=50 start.abundance=10 question.threshold=0", 20, 0.065443468},
		{"weather", noisy, 20, 0.011848217},
		{"weather and a take of 1", noisy + "harvest.1.rule=constant harvest.1.take=1 harvest.1.when=end", 20, 0.12566905},
		{"weather and thinning", noisy + "harvest.1.rule=fraction harvest.1.fraction=0.06 harvest.1.take_noise=each-animal harvest.1.when=end", 20, 0.061613202},
		{"weather and a ladder", noisy + "harvest.1.rule=ladder harvest.1.points.1.1=40 harvest.1.points.1.2=0 harvest.1.points.2.1=43 harvest.1.points.2.2=3 harvest.1.when=end", 20, 0.014054407},
		{"catastrophes", pulse + "births.rate=0.35 deaths.fraction=0.2 catastrophe.1.chance=0.05 catastrophe.1.kills=0.7 catastrophe.1.births_times=0.5 ceiling.abundance=60 start.abundance=30 question.threshold=2", 20, 0.15900083},
		{"Ricker by its capacity", pulse + "births.parents=all births.rate=" + num(math.Exp(0.4)) + " deaths.fraction=1 births.crowding.form=ricker births.crowding.capacity=30 ceiling.abundance=120 start.abundance=10 question.threshold=0", 20, 0.0017873294},
		{"Ricker and weather", ricker + "births.year_sd=" + num(math.Exp(0.4)*math.Sqrt(math.Expm1(0.16))) + " ceiling.abundance=240", 20, 0.10409167},
		{"stocking", pulse + "births.rate=0.4 deaths.fraction=0.3 ceiling.abundance=40 stocking.1.add=1 stocking.1.when=end start.abundance=6 question.threshold=1", 20, 0.033877911},
	} {
		c := build(t, k.text+" question.horizon="+strconv.Itoa(k.year))
		share(t, k.what, run(t, c, 6000, uint64(200+i)), k.want, fallenBy(k.year))
	}
}

// logitSD is the standard deviation of 1/(1 + exp(-(u + v z))), by the trapezoid
// rule on 4,001 points: apart from the quadrature it checks.
func logitSD(u, v float64) float64 {
	var m, q float64
	const h = 0.005
	for i := -2000; i <= 2000; i++ {
		z := h * float64(i)
		x := 1 / (1 + math.Exp(-(u + v*z)))
		w := h * math.Exp(-z*z/2) / math.Sqrt(2*math.Pi)
		m += w * x
		q += w * x * x
	}
	return math.Sqrt(q - m*m)
}

// Extinction by powers of the transition matrix, row by row from the laws of the
// survivors and the young, for the offspring laws under crowding and a take.
func TestChainFromItsOwnRows(t *testing.T) {
	const ceiling, years, take, start = 40, 8, 2, 15
	for i, k := range []struct {
		what, text string
		young      func(parents int, f float64) func(b float64) float64
	}{
		{"poisson", "births.offspring=poisson", func(parents int, f float64) func(float64) float64 {
			return distuv.Poisson{Lambda: f * float64(parents)}.Prob
		}},
		{"at-most-one", "births.offspring=at-most-one", func(parents int, f float64) func(float64) float64 {
			return distuv.Binomial{N: float64(parents), P: f}.Prob
		}},
		{"clumped", "births.offspring=clumped births.clumping=0.7", func(parents int, f float64) func(float64) float64 {
			size, p := 0.7*float64(parents), 0.7/(0.7+f)
			gs, _ := math.Lgamma(size)
			return func(b float64) float64 {
				g1, _ := math.Lgamma(b + size)
				g2, _ := math.Lgamma(b + 1)
				return math.Exp(g1 - g2 - gs + size*math.Log(p) + b*math.Log1p(-p))
			}
		}},
	} {
		for _, all := range []bool{false, true} {
			law := make([]float64, ceiling+1)
			law[start] = 1
			for range years {
				next := make([]float64, ceiling+1)
				next[0] = law[0]
				for n := 1; n <= ceiling; n++ {
					for s := 0; s <= n; s++ {
						p := law[n] * distuv.Binomial{N: float64(n), P: 0.6}.Prob(float64(s))
						parents := s
						if all {
							parents = n
						}
						if parents == 0 {
							next[0] += p
							continue
						}
						young := k.young(parents, 0.9/(1+float64(parents)/40))
						rest := p
						for b := 0; s+b-take < ceiling; b++ {
							q := p * young(float64(b))
							next[max(0, s+b-take)] += q
							rest -= q
						}
						next[ceiling] += rest
					}
				}
				law = next
			}
			text := k.text
			if all {
				text += " births.parents=all"
			}
			c := build(t, text+" births.breeding=pulse births.rate=0.9 births.crowding.form=hyperbolic births.crowding.scale=40 deaths.fraction=0.4 ceiling.abundance=40 harvest.1.rule=constant harvest.1.take=2 harvest.1.when=end start.abundance=15 question.threshold=0 question.horizon=8")
			share(t, text, run(t, c, 5000, uint64(300+i)), law[0], fallenBy(years))
		}
	}
}
