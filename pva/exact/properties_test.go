package exact

import (
	"context"
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// For a chain with one-step jumps the risk never falls when the threshold, the
// take or deaths rise, and never rises with the start, births or capacity (coupling).
func TestRiskIsMonotone(t *testing.T) {
	base := always(20, 3, 0.5, 0.35, 40, "deaths").with(set{"question.horizon": 40, "harvest.1.rule": "constant", "harvest.1.take": 1, "harvest.1.when": "through"})
	risk := func(more set) []float64 { return answer(t, base.with(more)).Fallen }
	at := risk(nil)
	for y := 1; y < len(at); y++ {
		if at[y] < at[y-1] {
			t.Errorf("the risk falls in year %d", y+1)
		}
	}
	for name, more := range map[string]set{"threshold": {"question.threshold": 4}, "take": {"harvest.1.take": 1.2}, "fewer": {"start.abundance": 18},
		"deaths": {"deaths.rate": 0.36, "deaths.crowding.capacity": nil, "deaths.crowding.scale": 0.35 * 40 / 0.15}, "births": {"births.rate": 0.49, "deaths.crowding.capacity": nil, "deaths.crowding.scale": 0.35 * 40 / 0.15},
		"capacity": {"deaths.crowding.capacity": 38}} {
		worse := risk(more)
		for y := range at {
			if worse[y] < at[y]-1e-11 || (y > 10 && worse[y] <= at[y]) {
				t.Errorf("%s: year %d: risk %.12g, before %.12g", name, y+1, worse[y], at[y])
			}
		}
	}
}

// Without takes, additions and shared noise the lines of the first animals are
// independent: P(t; N0) = P(t; 1)^N0.
func TestLinesAreIndependent(t *testing.T) {
	for name, make := range map[string]func(n float64) set{
		"flow":  func(n float64) set { return flow(n, 0, 15, 0.3, 0.25) },
		"pulse": func(n float64) set { return pulse(n, 0, 15, 0.35, 0.3) },
		"clumped": func(n float64) set {
			return pulse(n, 0, 15, 0.35, 0.3).with(set{"births.offspring": "clumped", "births.clumping": 0.4})
		},
	} {
		one, seven := answer(t, make(1)), answer(t, make(7))
		for y := range one.Fallen {
			if want := math.Pow(one.Fallen[y], 7); !(math.Abs(seven.Fallen[y]-want) < 1e-10+seven.Error+7*one.Error) {
				t.Errorf("%s: year %d: %.12g, seventh power %.12g", name, y+1, seven.Fallen[y], want)
			}
		}
	}
}

// The two ways of counting agree: those fallen by t, and one minus those whose
// every census was above the threshold. Fallen and not fallen make all.
func TestFallenAndStandingAreAll(t *testing.T) {
	for _, keys := range []set{
		pulse(20, 5, 20, 0.4, 0.3).with(set{"births.year_sd": 0.2, "ceiling.abundance": 40}),
		always(20, 5, 0.5, 0.4, 30, "deaths").with(set{"births.year_sd": 0.1}),
		pulse(20, 5, 10, 0.4, 0.3).with(set{"births.year_sd": 0.2, "weather.memory": 0.3, "ceiling.abundance": 40}),
	} {
		m := model(t, keys)
		f, err := newRun(m, newPlan(m, Options{}).first).solve(context.Background())
		if err != nil {
			t.Fatal(err)
		}
		standing, all := 0.0, 0.0
		for i, v := range f.last {
			for _, p := range v {
				if i%perPoint != 0 {
					standing += p
				} else {
					all += p
				}
			}
		}
		if last := f.fallen[len(f.fallen)-1]; !(math.Abs(last+standing-1) < 1e-11) || !(math.Abs(all-1) < 1e-11) {
			t.Errorf("fallen %.15g, standing %.15g, all %.15g", last, standing, all)
		}
	}
}

// A linear process has the mean N0 exp((b-d) t) in a flow year, and
// N0 ((1-m)(1+f))^t in a pulse year, weather of births and deaths independent.
func TestMeanOfLinearProcess(t *testing.T) {
	a := answer(t, flow(20, 0, 6, 0.3, 0.35))
	b := answer(t, pulse(20, 0, 6, 0.3, 0.28).with(set{"births.year_sd": 0.1, "deaths.year_sd": 0.05}))
	for y := range a.Mean {
		year := float64(y + 1)
		if want := 20 * math.Exp(-0.05*year); !(math.Abs(a.Mean[y]/want-1) < 1e-8) {
			t.Errorf("flow, year %v: %.12g, formula %.12g", year, a.Mean[y], want)
		}
		if want := 20 * math.Pow(0.72*1.3, year); !(math.Abs(b.Mean[y]/want-1) < 1e-6) {
			t.Errorf("pulse, year %v: %.12g, formula %.12g", year, b.Mean[y], want)
		}
	}
}

// Rates twice as high over half the time give the same chances.
func TestTimeScales(t *testing.T) {
	slow, fast := always(10, 2, 0.3, 0.2, 15, "deaths").with(set{"question.horizon": 40}), always(10, 2, 0.6, 0.4, 15, "deaths").with(set{"question.horizon": 20})
	if a, b := answer(t, slow), answer(t, fast); !(math.Abs(a.Risk-b.Risk) < 1e-10) {
		t.Errorf("risk %.12g in 40 years, %.12g in 20 at twice the rates", a.Risk, b.Risk)
	}
	if a, b := answer(t, slow.with(set{"question.threshold": 2.5})), answer(t, slow); a.Risk != b.Risk {
		t.Errorf("threshold 2.5: %.12g, 2: %.12g", a.Risk, b.Risk)
	}
}

// A replicate that passes stop_above has not fallen, and never falls after:
// the gambler's ruin between 0 and M at long times (Karlin & Taylor 1975, ch. 4):
// 1 - P = (1 - q^n)/(1 - q^M), q = d/b, for a linear chain absorbed at M = stop_above+1.
func TestOutgrown(t *testing.T) {
	a := answer(t, flow(4, 0, 2000, 0.3, 0.27).with(set{"run.stop_above": 29, "question.watch": "always"}))
	q := 0.27 / 0.3
	if want := 1 - (1-math.Pow(q, 4))/(1-math.Pow(q, 30)); !(math.Abs(a.Risk-want) < 1e-9+a.Error) {
		t.Errorf("risk %.12g, gambler's ruin %.12g", a.Risk, want)
	}
	// A pulse year: the dense chain, everything above 29 taken out after births.
	// Stocking at the start may lift N above it, which is not yet looked at.
	keys := pulse(4, 0, 30, 0.5, 0.3).with(set{"stocking.1.add": 3, "stocking.1.when": "start", "stocking.1.years": "20-"})
	m := model(t, keys)
	d := &dense{m: m, c: m.Case, size: 90}
	year := d.live(1, 0.5, -math.Log(0.7), false)
	v := mat.NewVecDense(90, nil)
	v.SetVec(4, 1)
	for y := 0; y < 30; y++ {
		next := mat.NewVecDense(90, nil)
		if y >= 19 {
			next.MulVec(d.stock(m.Case.Stocking[0]).T(), v)
			v, next = next, mat.NewVecDense(90, nil)
		}
		next.MulVec(year.T(), v)
		for n := 30; n < 90; n++ {
			next.SetVec(n, 0)
		}
		v = next
	}
	b := answer(t, keys.with(set{"run.stop_above": 29}))
	if want := v.AtVec(0); !(math.Abs(b.Extinction-want) < 1e-10+b.Error) {
		t.Errorf("pulse: extinct %.12g, dense chain %.12g", b.Extinction, want)
	}
	mean, mass := 0.0, 0.0
	for n := 0; n < 30; n++ {
		mean, mass = mean+float64(n)*v.AtVec(n), mass+v.AtVec(n)
	}
	if got := b.Mean[29]; !(math.Abs(got-mean/mass) < 1e-8) {
		t.Errorf("pulse: mean of those not outgrown %.12g, dense chain %.12g", got, mean/mass)
	}
}

func TestRefusals(t *testing.T) {
	base := pulse(50, 5, 20, 0.4, 0.3)
	for want, keys := range map[string]set{
		"inputs are uncertain (births.rate)": base.with(set{"uncertain.1.key": "births.rate", "uncertain.1.law": "normal", "uncertain.1.sd": 0.05}),
		"keeps the estimate of its survey for 3 years": base.with(set{"harvest.1.name": "control", "harvest.1.rule": "fraction", "harvest.1.fraction": 0.1, "harvest.1.when": "end",
			"harvest.1.survey_cv": 0.2, "harvest.1.survey_every": 3}),
		"can grow to more than":     base.with(set{"start.abundance": 1e7}),
		"for each of 25 states":     base.with(set{"start.abundance": 20000, "question.threshold": 15000, "births.year_sd": 0.1, "deaths.year_sd": 0.05, "weather.memory": 0.5, "births.crowding.form": "linear", "births.crowding.capacity": 20000, "births.rate": 0.5}),
		"in 64 different":           manyCatastrophes(base, 6),
		"operations, more than the": base.with(set{"start.abundance": 20000, "question.threshold": 15000, "births.rate": 0.5, "births.year_sd": 0.1, "deaths.year_sd": 0.1, "weather.correlation": 0.5, "births.crowding.form": "linear", "births.crowding.capacity": 20000}),
	} {
		m := model(t, keys)
		ops, ok, reason := Cost(m)
		if ok || ops != 0 || !strings.Contains(reason, want) {
			t.Errorf("%q: %v %v %q", want, ops, ok, reason)
			continue
		}
		a, err := Solve(context.Background(), m, Options{})
		if err != nil || a.Reason != reason || a.Fallen != nil || a.Risk != 0 {
			t.Errorf("%q: answer %+v, error %v", want, a, err)
		}
	}
	// Surveys made in every scheduled year keep nothing, and stated values may be asked for.
	every := base.with(set{"harvest.1.rule": "fraction", "harvest.1.fraction": 0.1, "harvest.1.when": "end", "harvest.1.survey_cv": 0.2, "harvest.1.survey_every": 3, "harvest.1.one_year_in": 3})
	if _, ok, reason := Cost(model(t, every)); !ok {
		t.Errorf("surveyed whenever taken: %s", reason)
	}
	uncertain := base.with(set{"uncertain.1.key": "births.rate", "uncertain.1.law": "normal", "uncertain.1.sd": 0.05})
	stated, err := Solve(context.Background(), model(t, uncertain), Options{Stated: true})
	if err != nil || stated.Risk != answer(t, base).Risk {
		t.Errorf("at stated values: %+v %v", stated, err)
	}
	if a, _ := Solve(context.Background(), model(t, base), Options{Most: 1000}); !strings.Contains(a.Reason, "more than the 1e+03 allowed") {
		t.Errorf("with few operations: %q", a.Reason)
	}
	stopped, cancel := context.WithCancel(context.Background())
	cancel()
	if a, err := Solve(stopped, model(t, base), Options{}); err == nil || a != nil {
		t.Errorf("cancelled: %v %v", a, err)
	}
	if _, err := Solve(context.Background(), nil, Options{}); err == nil {
		t.Error("no model, no error")
	}
}

func manyCatastrophes(s set, n int) set {
	out := s.with(nil)
	for i := 1; i <= n; i++ {
		row := "catastrophe." + string(rune('0'+i)) + "."
		out[row+"chance"], out[row+"births_times"] = 0.1, 1-0.1*float64(i)-0.001*float64(i*i)
	}
	return out
}

// The count of operations does not depend on anything but the case, and what
// it calls cheap is added unasked.
func TestCost(t *testing.T) {
	keys := pulse(100, 10, 50, 0.45, 0.25).with(set{"births.year_sd": 0.1, "births.crowding.form": "linear", "births.crowding.capacity": 120})
	m := model(t, keys)
	a, ok, _ := Cost(m)
	b, _, _ := Cost(m)
	if !ok || a != b || a > Cheap || a <= 0 {
		t.Errorf("cost %v, again %v, ok %v", a, b, ok)
	}
	longer, _, _ := Cost(model(t, keys.with(set{"question.horizon": 500})))
	dense, _, _ := Cost(model(t, keys.with(set{"weather.memory": 0.5})))
	if longer <= a || dense <= a {
		t.Errorf("cost %v, of ten times the years %v, with memory %v", a, longer, dense)
	}
}

// The stated error covers the true one where the states or the points are too
// few on purpose, and no operations are left to do better.
func TestStatedErrorCovers(t *testing.T) {
	for name, c := range map[string]struct {
		keys set
		opt  Options
	}{
		"few states, flow":  {always(20, 3, 0.5, 0.4, 30, "deaths"), Options{Top: 42}},
		"few states, pulse": {pulse(20, 3, 40, 0.5, 0.35).with(set{"births.crowding.form": "linear", "births.crowding.scale": 150}), Options{Top: 45}},
		"few points":        {pulse(60, 20, 20, 0.5, 0.3).with(set{"births.year_sd": 0.3, "deaths.year_sd": 0.15, "ceiling.abundance": 100}), Options{Order: 3}},
		"few points, flow":  {flow(30, 10, 10, 0.5, 0.5).with(set{"births.year_sd": 0.3, "ceiling.abundance": 60}), Options{Order: 2}},
	} {
		good := answer(t, c.keys)
		m := model(t, c.keys)
		ops, _, _ := CostWith(m, c.opt)
		c.opt.Most = ops
		a, err := Solve(context.Background(), m, c.opt)
		if err != nil || a.Reason != "" {
			t.Fatal(err, a.Reason)
		}
		off := 0.0
		for y := range a.Fallen {
			off = math.Max(off, math.Abs(a.Fallen[y]-good.Fallen[y]))
		}
		if off < 1e-7 {
			t.Errorf("%s: off by %.2g only: the case shows nothing", name, off)
		}
		if off > a.Error+good.Error {
			t.Errorf("%s: off by %.3g, stated error %.3g", name, off, a.Error)
		}
	}
}
