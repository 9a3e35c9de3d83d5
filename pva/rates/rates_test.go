package rates

import (
	"fmt"
	"math"
	"testing"

	"ebbline/pva"

	"gonum.org/v1/gonum/integrate/quad"
	"gonum.org/v1/gonum/stat/distuv"
)

func model(t *testing.T, pairs ...any) (*Model, []pva.Fault) {
	t.Helper()
	var entries []pva.Entry
	for i := 0; i < len(pairs); i += 2 {
		v := pva.Value{}
		switch x := pairs[i+1].(type) {
		case int:
			v = pva.Num(float64(x))
		case float64:
			v = pva.Num(x)
		case string:
			v = pva.Text(x)
		}
		entries = append(entries, pva.Entry{Path: pairs[i].(string), Value: v})
	}
	c, faults := pva.Build(entries)
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	return New(c)
}

func must(t *testing.T, pairs ...any) *Model {
	t.Helper()
	m, faults := model(t, pairs...)
	if len(faults) > 0 {
		t.Fatal(pva.Faults(faults))
	}
	return m
}

func basic(breeding string, more ...any) []any {
	return append([]any{"question.threshold", 0, "question.horizon", 12, "start.abundance", 100, "births.breeding", breeding}, more...)
}

// Growth is zero at a stated capacity, whatever the form, the side and the
// reading (the definition of a carrying capacity); a little below it the
// population grows, a little above it falls.
func TestCapacityIsWhereGrowthIsZero(t *testing.T) {
	const k = 250.0
	for _, breeding := range []string{"flow", "pulse"} {
		for _, parents := range []string{"survivors", "all"} {
			for _, bForm := range []string{"none", "linear", "theta", "ricker", "hyperbolic"} {
				for _, dForm := range []string{"none", "linear", "theta"} {
					for _, scarce := range []bool{false, true} {
						if bForm == "none" && dForm == "none" || breeding == "flow" && parents == "all" {
							continue
						}
						pairs := basic(breeding, "births.rate", .7, "deaths.fraction", .25)
						if breeding == "pulse" {
							pairs = append(pairs, "births.parents", parents)
						}
						for side, form := range map[string]string{"births": bForm, "deaths": dForm} {
							if form == "none" {
								continue
							}
							pairs = append(pairs, side+".crowding.form", form, side+".crowding.capacity", k)
							if form == "theta" {
								pairs = append(pairs, side+".crowding.exponent", 1.7)
							}
						}
						if scarce {
							pairs = append(pairs, "births.scarcity.form", "saturating", "births.scarcity.half_at", 9.0)
						}
						m := must(t, pairs...)
						name := fmt.Sprint(breeding, parents, bForm, dForm, scarce)
						growth := func(n float64) float64 {
							g := m.GrowthAt(n)
							if breeding == "flow" {
								return g.Flow
							}
							return g.Pulse
						}
						if g := growth(k); math.Abs(g-1) > 1e-9 {
							t.Errorf("%s: growth %v at the capacity", name, g)
						}
						if growth(k*.97) <= 1 || growth(k*1.03) >= 1 {
							t.Errorf("%s: growth %v below and %v above the capacity", name, growth(k*.97), growth(k*1.03))
						}
						rests := m.Equilibria()
						found := false
						for _, e := range rests {
							found = found || math.Abs(e.N-k) < 1e-3 && e.Stable
						}
						if !found {
							t.Errorf("%s: the capacity is not among the stable resting places %v", name, rests)
						}
					}
				}
			}
		}
	}
}

// A capacity that no scale reaches is a fault that names the cause.
func TestCapacityOutOfReach(t *testing.T) {
	for _, pairs := range [][]any{
		basic("flow", "births.rate", .2, "deaths.rate", .3, "births.crowding.form", "linear", "births.crowding.capacity", 50),
		basic("flow", "births.rate", .2, "deaths.rate", .3, "deaths.crowding.form", "linear", "deaths.crowding.capacity", 50),
		basic("flow", "births.rate", .2, "deaths.rate", 0, "births.crowding.form", "ricker", "births.crowding.capacity", 50),
		basic("flow", "births.rate", .2, "deaths.rate", 0, "deaths.crowding.form", "linear", "deaths.crowding.capacity", 50),
		basic("pulse", "births.rate", 2.0, "deaths.fraction", 1, "births.crowding.form", "linear", "births.crowding.capacity", 50),
	} {
		if _, faults := model(t, pairs...); len(faults) == 0 {
			t.Errorf("%v: no fault", pairs)
		}
	}
	// Births that reach 0 balance no deaths: the linear form's scale is K itself.
	m := must(t, basic("flow", "births.rate", .2, "deaths.rate", 0, "births.crowding.form", "linear", "births.crowding.capacity", 50)...)
	if m.BirthCrowding.L != 50 {
		t.Errorf("scale %v, want 50", m.BirthCrowding.L)
	}
}

// The logit-normal has the mean and standard deviation asked for to 1e-10; its
// moments by Gauss-Legendre quadrature of gonum's normal density.
func TestFractionMatchesItsMoments(t *testing.T) {
	for _, r := range []struct{ mean, sd float64 }{{.27, .05}, {.5, .3}, {.05, .04}, {.9, .25}, {.3, .4}, {.01, .002}, {.999, .01}} {
		f, err := NewFraction(r.mean, r.sd)
		if err != nil {
			t.Fatal(err)
		}
		moment := func(p float64) float64 {
			sum := 0.0
			for z := -10.0; z < 10; z += .25 {
				sum += quad.Fixed(func(z float64) float64 {
					return math.Pow(1/(1+math.Exp(-f.U-f.V*z)), p) * distuv.UnitNormal.Prob(z)
				}, z, z+.25, 24, nil, 0)
			}
			return sum
		}
		mean := moment(1)
		if math.Abs(mean-r.mean) > 1e-10 || math.Abs(math.Sqrt(moment(2)-mean*mean)-r.sd) > 1e-9 {
			t.Errorf("%+v: mean %.12f, sd %.12f", r, mean, math.Sqrt(moment(2)-mean*mean))
		}
		if s := f.Survive(.7) + f.Draw(.7); math.Abs(s-1) > 1e-15 {
			t.Errorf("%+v: killed and spared add up to %v", r, s)
		}
	}
	for _, r := range []struct{ mean, sd float64 }{{.5, .5}, {.1, .31}} {
		if _, err := NewFraction(r.mean, r.sd); err == nil {
			t.Errorf("mean %v with sd %v is no law on 0 to 1", r.mean, r.sd)
		}
	}
}

// The log-normal year factor exp(sd z - sd^2/2) with sd 0.4: a CV of
// sqrt(exp(0.16)-1), median exp(-0.08) = 0.92311635 (Aitchison & Brown 1957).
func TestLogNormalMatchesItsMoments(t *testing.T) {
	l := NewLogNormal(2, 2*math.Sqrt(0.17351087))
	if math.Abs(l.Sigma-.4) > 1e-8 || math.Abs(l.Draw(0)-2*0.92311635) > 1e-7 {
		t.Errorf("sigma %v, median %v", l.Sigma, l.Draw(0))
	}
}

// The logistic under a constant take rests at (K/2)(1 +- sqrt(1 - 4H/(rK))),
// the lower one unstable (M. B. Schaefer 1954): r = 0.5, K = 1000, H = 100:
// 723.6067977 and 276.3932023; under a rate of 0.2 at K (1 - F/r) = 600; Ricker's
// pulse at its capacity.
func TestRestsOfTheLogistic(t *testing.T) {
	logistic := basic("flow", "births.rate", .8, "deaths.rate", .3, "births.crowding.form", "linear", "births.crowding.capacity", 1000)
	for _, r := range []struct {
		more []any
		want []Equilibrium
	}{
		{[]any{"harvest.1.rule", "constant", "harvest.1.take", 100, "harvest.1.when", "through"}, []Equilibrium{{276.3932023, false}, {723.6067977, true}}},
		{[]any{"harvest.1.rule", "fraction", "harvest.1.rate", .2, "harvest.1.when", "through"}, []Equilibrium{{600, true}}},
		{[]any{"harvest.1.rule", "constant", "harvest.1.take", 150, "harvest.1.when", "through"}, nil},
	} {
		got := must(t, append(append([]any{}, logistic...), r.more...)...).Equilibria()
		if len(got) != len(r.want) {
			t.Errorf("%v: rests %v, want %v", r.more, got, r.want)
			continue
		}
		for i := range got {
			if math.Abs(got[i].N-r.want[i].N) > 1e-4 || got[i].Stable != r.want[i].Stable {
				t.Errorf("%v: rests %v, want %v", r.more, got, r.want)
			}
		}
	}
}

// A rate of 0.4 a head is 0.40 in a pulse and exp(0.4) - 1 = 0.4918247 in a
// flow year; survival 0.75 a year is a death rate of 0.28768207.
func TestGrowthUnderBothReadings(t *testing.T) {
	g := must(t, basic("pulse", "births.rate", .4, "deaths.fraction", 0)...).GrowthAt(10)
	if math.Abs(g.Pulse-1.4) > 1e-12 || math.Abs(g.Flow-1.4918247) > 1e-7 {
		t.Errorf("growth %+v", g)
	}
	if d := must(t, basic("pulse", "births.rate", .4, "deaths.fraction", .25)...).Death.Mean(); math.Abs(d-0.28768207) > 1e-8 {
		t.Errorf("death rate %v", d)
	}
}

// Targets of the take rules, worked by hand.
func TestTargets(t *testing.T) {
	for _, r := range []struct {
		more       []any
		year       int
		seen, want float64
	}{
		{[]any{"harvest.1.rule", "constant", "harvest.1.take", 8, "harvest.1.share", .5}, 3, 100, 4},
		{[]any{"harvest.1.rule", "fraction", "harvest.1.fraction", .1}, 3, 95, 9.5},
		{[]any{"harvest.1.rule", "above", "harvest.1.spare", 60}, 3, 95, 35},
		{[]any{"harvest.1.rule", "above", "harvest.1.spare", 60, "harvest.1.fraction", .2}, 3, 50, 0},
		{[]any{"harvest.1.rule", "ladder", "harvest.1.points.1.1", 50, "harvest.1.points.1.2", 0, "harvest.1.points.2.1", 100, "harvest.1.points.2.2", 10}, 3, 75, 5},
		{[]any{"harvest.1.rule", "ladder", "harvest.1.points.1.1", 50, "harvest.1.points.1.2", 2, "harvest.1.points.2.1", 100, "harvest.1.points.2.2", 10}, 3, 20, 2},
		{[]any{"harvest.1.rule", "ladder", "harvest.1.points.1.1", 50, "harvest.1.points.1.2", 2, "harvest.1.points.2.1", 100, "harvest.1.points.2.2", 10}, 3, 900, 10},
		// The first scheduled year is 3: year 3 takes the first number, year 4 the second, later ones the last.
		{[]any{"harvest.1.rule", "by_year", "harvest.1.years", "3-9", "harvest.1.takes.1", 5, "harvest.1.takes.2", 7}, 3, 1, 5},
		{[]any{"harvest.1.rule", "by_year", "harvest.1.years", "3-9", "harvest.1.takes.1", 5, "harvest.1.takes.2", 7}, 4, 1, 7},
		{[]any{"harvest.1.rule", "by_year", "harvest.1.years", "3-9", "harvest.1.takes.1", 5, "harvest.1.takes.2", 7}, 9, 1, 7},
	} {
		m := must(t, basic("pulse", append([]any{"births.rate", .4, "deaths.fraction", .2, "harvest.1.when", "end"}, r.more...)...)...)
		if got := m.Takes[0].Target(r.year, r.seen); math.Abs(got-r.want) > 1e-12 {
			t.Errorf("%v in year %d at %v: %v, want %v", r.more, r.year, r.seen, got, r.want)
		}
	}
}

// Schedules and surveys, worked by hand, with calendar years.
func TestSchedules(t *testing.T) {
	m := must(t, basic("pulse", "start.year", 2030, "births.rate", .4, "deaths.fraction", .2, "harvest.1.when", "end", "harvest.1.rule", "constant", "harvest.1.take", 1,
		"harvest.1.years", "2032-2039", "harvest.1.one_year_in", 3, "harvest.1.survey_every", 4)...)
	var scheduled, surveyed []int
	for y := 1; y <= 12; y++ {
		if m.Takes[0].Scheduled[y-1] {
			scheduled = append(scheduled, m.Case.Label(y))
		}
		if m.Takes[0].Surveyed[y-1] {
			surveyed = append(surveyed, m.Case.Label(y))
		}
	}
	if fmt.Sprint(scheduled) != "[2032 2035 2038]" || fmt.Sprint(surveyed) != "[2032 2036 2040]" {
		t.Errorf("scheduled %v, surveyed %v", scheduled, surveyed)
	}
}

// More sub-steps bind the answer tighter, and a case of events needs no bound.
func TestSubstepBound(t *testing.T) {
	big := basic("flow", "births.rate", .8, "deaths.rate", .4, "births.crowding.form", "linear", "births.crowding.capacity", 20000, "births.year_sd", .1)
	last := 1.0
	for _, k := range []int{4, 16, 64} {
		b := BoundSubsteps(must(t, append(append([]any{}, big...), "run.substeps", fmt.Sprint(k))...))
		if b.Substeps != k || !(b.RiskBound < last) || !(b.RiskBound > 0) {
			t.Errorf("%d sub-steps: %+v after %v", k, b, last)
		}
		last = b.RiskBound
	}
	if b := BoundSubsteps(must(t, append(append([]any{}, big...), "run.substeps", "events")...)); b.Substeps != 0 || b.RiskBound != 0 {
		t.Errorf("events: %+v", b)
	}
	if BoundSubsteps(must(t, basic("pulse", "births.rate", .4, "deaths.fraction", .2)...)) != nil {
		t.Error("a pulse year has no sub-steps")
	}
}
