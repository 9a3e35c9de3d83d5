package estimate

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"
)

// TestBetsByHand: with one value of 1/2 the stakes are 1, 1/2, 1/4, 1/8 and 1/16
// with the weights 1/2, 1/4, 1/8, 1/16 and 1/16. With r = (m - 1/2)/(1 - m) the
// capital is 1 + r 171/256, which is 40 at r = 39*256/171, m = (r + 1/2)/(1 + r).
func TestBetsByHand(t *testing.T) {
	r := 39 * 256.0 / 171
	want := (r + 0.5) / (1 + r)
	mean, low, high := BetweenDraws([]float64{0.5}, 0.95)
	within(t, "mean", mean, 0.5, 0)
	within(t, "high", high, want, 1e-12)
	within(t, "low", low, 1-want, 1e-12)
	// Values all 0: the capital is at most (1-m)^-n and at least half of that, so
	// that the end lies between the means that make these 40.
	for _, n := range []int{2, 20, 200, 5000} {
		_, low, high := BetweenDraws(make([]float64, n), 0.95)
		if least, most := 1-math.Pow(40, -1/float64(n)), 1-math.Pow(80, -1/float64(n)); low != 0 || !(high >= least && high <= most) {
			t.Errorf("%d draws without risk: %g to %g, want an end between %g and %g", n, low, high, least, most)
		}
	}
	if mean, low, high := BetweenDraws(nil, 0.95); !math.IsNaN(mean) || low != 0 || high != 1 {
		t.Errorf("no draws: %g, %g to %g", mean, low, high)
	}
	if mean, low, high := BetweenDraws([]float64{1, 1, 1}, 0.95); mean != 1 || high != 1 || !(low < 1-math.Pow(40, -1.0/3)+1e-9 && low > 0) {
		t.Errorf("three draws that all fall: %g, %g to %g", mean, low, high)
	}
	// The order of the draws does not matter, to the last bit.
	src := rand.New(rand.NewPCG(5, 9))
	x := make([]float64, 60)
	for i := range x {
		x[i] = math.Floor(50*src.Float64()*src.Float64()) / 50
	}
	_, low, high = BetweenDraws(x, 0.95)
	src.Shuffle(len(x), func(i, j int) { x[i], x[j] = x[j], x[i] })
	if _, l, h := BetweenDraws(x, 0.95); l != low || h != high {
		t.Errorf("in another order %v to %v, was %v to %v", l, h, low, high)
	}
}

// TestBetsExactly: for draws that have the risk a with chance p and none
// otherwise the chance of missing the mean a p is a sum over the binomial law. It
// is at most half of 1 - confidence to either side, at every p.
func TestBetsExactly(t *testing.T) {
	for _, n := range []int{5, 20, 50} {
		for _, a := range []float64{0.1, 0.5, 1} {
			low, high := make([]float64, n+1), make([]float64, n+1)
			for k := range low {
				x := make([]float64, n)
				for i := range k {
					x[i] = a
				}
				_, low[k], high[k] = BetweenDraws(x, 0.95)
			}
			worst := 0.0
			for p := 0.0025; p < 1; p += 0.0025 {
				above, below := 0.0, 0.0
				for k := range low {
					chance := math.Exp(logBinomial(int64(k), int64(n), p))
					if low[k] > a*p {
						above += chance
					}
					if high[k] < a*p {
						below += chance
					}
				}
				worst = math.Max(worst, math.Max(above, below))
			}
			if worst > 0.025 || worst == 0 && a == 1 {
				t.Errorf("%d draws, risk %g or none: missed to one side with chance %.4f", n, a, worst)
			}
		}
	}
}

// TestBetsCoverage: over sets of 20, 50 and 200 draws from laws that are skewed
// the interval misses the mean to either side in at most 2.5 of 100, beyond which
// 5.73 standard deviations are allowed (false alarm 1e-8). Student's interval lies
// too low far more often with 20 draws of each, so that the test can fail.
func TestBetsCoverage(t *testing.T) {
	src := rand.New(rand.NewPCG(17, 3))
	laws := map[string]struct {
		draw func() float64
		mean float64
	}{
		"beta (0.1, 2)":  {distuv.Beta{Alpha: 0.1, Beta: 2, Src: src}.Rand, 0.1 / 2.1},
		"0.5 in 1 of 20": {func() float64 { return 0.5 * float64(src.IntN(20)/19) }, 0.025},
		// E min(1, exp(z s + u)) = exp(u + s²/2) Phi(-u/s - s) + Phi(u/s).
		"log-normal cut at 1": {func() float64 { return math.Min(1, 0.01*math.Exp(1.5*src.NormFloat64())) },
			0.01*math.Exp(1.125)*distuv.UnitNormal.CDF(-math.Log(0.01)/1.5-1.5) + distuv.UnitNormal.CDF(math.Log(0.01)/1.5)},
	}
	for name, law := range laws {
		for _, draws := range []int{20, 50, 200} {
			sets := 3000
			if draws == 200 {
				sets = 600
			}
			above, below, student := 0, 0, 0
			x := make([]float64, draws)
			width, wide := 0.0, 0.0
			for range sets {
				for i := range x {
					x[i] = law.draw()
				}
				mean, low, high := BetweenDraws(x, 0.95)
				if low > law.mean {
					above++
				}
				if high < law.mean {
					below++
				}
				_, variance := moments(x)
				half := studentHalf(variance, float64(draws), 0.95)
				if mean+half < law.mean {
					student++
				}
				width += (high - low) / float64(sets)
				wide += 2 * half / float64(sets)
			}
			allowed := int(0.025*float64(sets) + 5.73*math.Sqrt(float64(sets)*0.025*0.975))
			t.Logf("%s, %d draws: too high in %d, too low in %d of %d sets (Student's %d); width %.4f (Student's %.4f)", name, draws, above, below, sets, student, width, wide)
			if above > allowed || below > allowed {
				t.Errorf("%s, %d draws: too high in %d, too low in %d of %d sets", name, draws, above, below, sets)
			}
			if draws == 20 && student <= allowed {
				t.Errorf("%s: Student's interval lies too low in %d of %d sets: the test cannot tell", name, student, sets)
			}
		}
	}
}

// TestBetsWidth: against a mean d too high the logarithm of the capital at stake
// c, with l = c/(1-m), is about n (l d - l² s²/2), s the standard deviation of the
// values: it reaches T first for the stake at which l = d/s², where d is
// sqrt(2 T/n) s. T is ln 40 at least, so that the interval is sqrt(2 ln 40)/1.96 =
// 1.386 times Student's or wider; and at most ln(40*2/c), with halves within a
// factor of sqrt(2) of the best stake (c 0.15 here, or more), which costs 6 % of
// T: 1.865 times.
func TestBetsWidth(t *testing.T) {
	src := rand.New(rand.NewPCG(23, 1))
	x := make([]float64, 5000)
	for i := range x {
		x[i] = risks(src, 8, 12)
	}
	_, low, high := BetweenDraws(x, 0.95)
	_, variance := moments(x)
	if ratio := (high - low) / (2 * studentHalf(variance, 5000, 0.95)); !(ratio > 1.386 && ratio < 1.865) {
		t.Errorf("%.3f times Student's width", ratio)
	}
}
