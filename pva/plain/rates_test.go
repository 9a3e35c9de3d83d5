package plain

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"

	"ebbline/pva"
)

// Growth is zero at every solved capacity, whatever the forms and the reading of
// the year. The bound is that of doubles: the rates are of order 1.
func TestGrowthIsZeroAtCapacity(t *testing.T) {
	const k = 90.0
	births := []string{"linear", "theta births.crowding.exponent=1.7", "ricker", "hyperbolic"}
	deaths := []string{"linear", "theta deaths.crowding.exponent=2.2"}
	none := []string{"none"}
	with := func(side, form, how string) string {
		text := " " + side + ".crowding.form=" + form
		if form != "none" && how != "" {
			text += " " + side + ".crowding." + how
		}
		return text
	}
	for _, reading := range []string{"flow", "pulse births.parents=survivors", "pulse births.parents=all"} {
		for _, how := range [][2]string{{"capacity=90", "scale=400"}, {"scale=400", "capacity=90"}, {"capacity=90", "capacity=90"}} {
			for _, b := range births {
				for _, d := range append(none, deaths...) {
					if d == "none" && how[1] == "capacity=90" {
						continue
					}
					c := build(t, "births.breeding="+reading+" births.rate=0.8 births.scarcity.form=saturating births.scarcity.half_at=5 deaths.rate=0.25 start.abundance=90 question.threshold=0 question.horizon=1"+
						with("births", b, how[0])+with("deaths", d, how[1]))
					s, err := solveScales(c)
					if err != nil {
						t.Fatalf("%s %s %s: %v", reading, b, d, err)
					}
					r := replicate{c: c, scale: s, birthsY: meanBirths(c), deathsY: meanDeaths(c)}
					dk := r.deaths(k)
					m := 1 - math.Exp(-dk)
					growth := r.births(k) - dk
					switch {
					case reading == "pulse births.parents=all":
						growth = r.births(k) - m
					case reading != "flow":
						growth = (1-m)*(1+r.births((1-m)*k)) - 1
					}
					if math.Abs(growth) > 1e-12 {
						t.Errorf("%s %s %v: growth %g at capacity", reading, b+"/"+d, how, growth)
					}
					if how[0] == how[1] && reading == "flow" {
						near(t, "half the gap", dk, (0.8*90/95+0.25)/2, 1e-12)
					}
				}
			}
		}
	}
}

func TestCapacityWithoutSolution(t *testing.T) {
	const head = " start.abundance=9 question.threshold=0 question.horizon=1 "
	for _, text := range []string{
		"births.rate=0.2 deaths.rate=0.3 births.crowding.form=linear births.crowding.capacity=50",
		"births.rate=0.2 deaths.rate=0.3 deaths.crowding.form=linear deaths.crowding.capacity=50",
		"births.rate=0.2 deaths.rate=0 births.crowding.form=ricker births.crowding.capacity=50",
		"births.rate=0.2 deaths.rate=0 deaths.crowding.form=linear deaths.crowding.capacity=50",
		"births.rate=0.4 deaths.rate=0.3 deaths.crowding.form=linear deaths.crowding.capacity=50 births.crowding.form=linear births.crowding.capacity=60",
	} {
		for _, breeding := range []string{"flow", "pulse"} {
			if _, err := Replicate(build(t, "births.breeding="+breeding+head+text), rand.NewPCG(1, 1)); err == nil {
				t.Errorf("%s %s: no error", breeding, text)
			}
		}
	}
	// Linear births without deaths do reach zero, at the scale itself.
	s, err := solveScales(build(t, "births.breeding=flow"+head+"births.rate=0.2 deaths.rate=0 births.crowding.form=linear births.crowding.capacity=50"))
	if err != nil {
		t.Fatal(err)
	}
	near(t, "scale", s.births, 50, 1e-12)
}

// Mean and standard deviation of the matched fraction, by the trapezoid rule with
// steps of 1e-3 (for these v far below the width of the curve's bend).
func TestLogitNormalMatch(t *testing.T) {
	for _, k := range [][2]float64{{0.27, 0.05}, {0.3, 0.003}, {0.5, 0.3}, {0.02, 0.03}, {0.9, 0.25}, {0.35, 0.45}} {
		l := matchLogit(k[0], k[1])
		var m, q float64
		const h = 1e-3
		for i := -15000; i <= 15000; i++ {
			z := h * float64(i)
			w := h * math.Exp(-z*z/2) / math.Sqrt(2*math.Pi)
			x := 1 / (1 + math.Exp(-l.at(z)))
			m += w * x
			q += w * (x - k[0]) * (x - k[0])
		}
		near(t, "mean", m, k[0], 1e-10)
		near(t, "standard deviation", math.Sqrt(q), k[1], 1e-10)
		c := &pva.Case{Deaths: pva.Deaths{Fraction: pva.Optional{Value: k[0], Set: true}, YearSD: k[1]}}
		for _, e := range []float64{-1.5, 0.2, 2} {
			m, alive := logistic(l.at(e)), logistic(-l.at(e)) // each keeps its digits near 0
			want := -math.Log1p(-m)
			if alive < 0.5 {
				want = -math.Log(alive)
			}
			near(t, "rate of the year's fraction", deathRate(c, e), want, 1e-12)
		}
	}
}

func TestCalendar(t *testing.T) {
	c := &pva.Case{Start: pva.Start{Year: pva.Optional{Value: 2027, Set: true}}}
	k := pva.Calendar{Trend: 0.1, Steps: []pva.Step{{From: 2028, Factor: 0.5}, {From: 2030, Factor: 3}},
		Cycle: pva.Cycle{Amplitude: 0.5, Period: 4, Phase: 1}, ByYear: []float64{7, 11}}
	for y, want := range map[int]float64{
		1: 7,
		2: 1.1 * 0.5 * 1.5 * 11,
		3: 1.21 * 0.5 * 11,
		4: 1.331 * 3 * 0.5 * 11,
		6: 1.61051 * 3 * 1.5 * 11,
	} {
		near(t, "calendar", calendar(c, k, y), want, 1e-12)
	}
}

// The correlation of two normal series shows in how often both have the same
// sign: 1/2 + asin(r)/pi (Sheppard 1899). Memory likewise, from year to year. In
// year 40 the series must still have that law.
func TestWeather(t *testing.T) {
	agree := func(r float64) float64 { return 0.5 + math.Asin(r)/math.Pi }
	for i, p := range []pva.Weather{{Correlation: 0.6, Memory: 0.8}, {Correlation: -0.3, Memory: -0.5}} {
		src := rand.NewPCG(uint64(i), 3)
		const n = 4000
		var first, cross, lag, small, wide int
		for range n {
			var w, last weather
			for y := 1; y <= 40; y++ {
				last = w
				w.next(p, y == 1, src)
				if y == 1 && w.births*w.deaths > 0 {
					first++
				}
				if y == 1 && math.Abs(w.births) < 1 {
					wide++
				}
			}
			if w.births*w.deaths > 0 {
				cross++
			}
			if w.deaths*last.deaths > 0 {
				lag++
			}
			if math.Abs(w.deaths) < 1 {
				small++
			}
		}
		counted(t, "correlation in year 1", first, n, agree(p.Correlation))
		counted(t, "correlation", cross, n, agree(p.Correlation))
		counted(t, "within one standard deviation in year 1", wide, n, math.Erf(1/math.Sqrt2))
		counted(t, "memory", lag, n, agree(p.Memory))
		counted(t, "within one standard deviation", small, n, math.Erf(1/math.Sqrt2))
	}
	for _, r := range []float64{1, -1} {
		var w weather
		src := rand.NewPCG(9, 9)
		for y := 1; y < 50; y++ {
			if w.next(pva.Weather{Correlation: r, Memory: 0.4}, y == 1, src); w.deaths != r*w.births {
				t.Fatalf("correlation %v: %v", r, w)
			}
		}
	}
}

func counted(t *testing.T, what string, k, n int, p float64) {
	t.Helper()
	paths := make([]Path, n)
	for i := range k {
		paths[i].Capped = 1
	}
	share(t, what, paths, p, func(p Path) bool { return p.Capped == 1 })
}

// The samplers against gonum's own distribution functions, where gonum's Poisson
// sampler alone would never give 0.
func TestSamplers(t *testing.T) {
	src := rand.NewPCG(11, 1)
	const n = 400000 // so that no 0 at all has chance 1e-8
	zero := 0
	for range n {
		if poisson(10, src) == 0 {
			zero++
		}
	}
	counted(t, "Poisson(10) = 0", zero, n, math.Exp(-10))
	low := 0
	for range 20000 {
		if negBinomial(6, 1.5, src) <= 2 {
			low++
		}
	}
	want := 0.0 // negative binomial with size 1.5 and chance 0.2
	for k := range 3 {
		g1, _ := math.Lgamma(float64(k) + 1.5)
		g2, _ := math.Lgamma(1.5)
		g3, _ := math.Lgamma(float64(k) + 1)
		want += math.Exp(g1 - g2 - g3 + 1.5*math.Log(0.2) + float64(k)*math.Log(0.8))
	}
	counted(t, "negative binomial", low, 20000, want)
	for _, p := range []float64{-1, 0} {
		if binomial(5, p, src) != 0 || binomial(0, 0.5, src) != 0 || binomial(5, 1+p*p, src) != 5 {
			t.Error("binomial at its ends")
		}
	}
	few := 0
	law := distuv.Poisson{Lambda: 30}
	for range 20000 {
		if poisson(30, src) <= 24 {
			few++
		}
	}
	counted(t, "Poisson(30)", few, 20000, law.CDF(24))
}
