package year

import (
	"context"
	"math"
	"testing"

	"ebbline/pva"
	"ebbline/pva/ensemble"
	"ebbline/pva/estimate"
	"ebbline/pva/exact"
	"ebbline/pva/rates"
	"ebbline/rng"
)

// The mutations: each plants one fault of a kind that simulators really have,
// and the comparison with the exact answer (the same as the campaign's and as
// every assessment's) must catch it. A mutation that lives means that the
// comparison is blind to its kind.
var mutations = []struct {
	name  string
	plant func(p *program)
}{
	{"the weather's correlation has the wrong sign", func(p *program) { setCase(p, func(c *pva.Case) { c.Weather.Correlation *= -1 }) }},
	{"the weather's memory has the wrong sign", func(p *program) { setCase(p, func(c *pva.Case) { c.Weather.Memory *= -1 }) }},
	{"births and deaths each take the other's weather", func(p *program) {
		after(p, 0, func(b *block, _ int) { b.eBirth, b.eDeath = b.eDeath, b.eBirth })
	}},
	{"the calendar is off by one year", func(p *program) {
		m := *p.model
		m.BirthCalendar = append(append([]float64(nil), m.BirthCalendar[1:]...), 1)
		replace(p, &m)
	}},
	{"harvest before births instead of after", func(p *program) {
		setCase(p, func(c *pva.Case) { c.Harvest[0].When = "start" })
	}},
	{"stocking before harvest", func(p *program) {
		n := len(p.passes)
		p.passes[n-3], p.passes[n-2] = p.passes[n-2], p.passes[n-3]
	}},
	{"a variance where a standard deviation belongs", func(p *program) {
		m := *p.model
		m.Birth.Sigma *= m.Birth.Sigma
		m.Death.Fraction.V *= m.Death.Fraction.V
		replace(p, &m)
	}},
	{"a log-normal without its mean corrected", func(p *program) {
		m := *p.model
		m.Birth.Mean *= math.Exp(m.Birth.Sigma * m.Birth.Sigma / 2)
		replace(p, &m)
	}},
	{"the weather is frozen after year 1", func(p *program) {
		first := p.passes[0]
		p.passes[0] = func(b *block, y int) {
			if y == 1 {
				first(b, y)
			}
		}
	}},
	{"deaths drawn 1 % too many", func(p *program) {
		before(p, 3, func(b *block, _ int) {
			for i := 0; i < b.lanes; i++ {
				b.n[i] = rng.Binomial(&b.demography[i], b.n[i], .99)
			}
		})
	}},
	{"a catastrophe kills without touching births", func(p *program) {
		setCase(p, func(c *pva.Case) { c.Catastrophe[0].BirthsTimes = 1 })
	}},
	{"the take is never closed", func(p *program) { setCase(p, func(c *pva.Case) { c.Harvest[0].StopBelow = 0 }) }},
	{"fallen below the threshold instead of at it", func(p *program) { p.threshold-- }},
	{"the census of the year before", func(p *program) {
		var last [lanesMax]int64
		p.passes = append(p.passes, func(b *block, y int) {
			if y == 1 {
				for i := range last {
					last[i] = 60
				}
			}
			last, b.n = b.n, last
		})
	}},
	{"the share of the take forgotten", func(p *program) { setCase(p, func(c *pva.Case) { c.Harvest[0].Share = 1 }) }},
	{"extra deaths forgotten", func(p *program) { setCase(p, func(c *pva.Case) { c.Harvest[0].ExtraDeaths = 0 }) }},
	{"a start without its spread", func(p *program) { setCase(p, func(c *pva.Case) { c.Start.CV = 0 }) }},
	{"crowding forgotten in births", func(p *program) {
		m := *p.model
		m.BirthCrowding.Form = rates.None
		replace(p, &m)
	}},
}

// setCase changes the case of a compiled program and compiles it anew.
func setCase(p *program, change func(c *pva.Case)) {
	c := *p.model.Case
	c.Harvest = append([]pva.Harvest(nil), c.Harvest...)
	c.Catastrophe = append([]pva.Catastrophe(nil), c.Catastrophe...)
	change(&c)
	m, faults := rates.New(&c)
	if len(faults) > 0 {
		panic(pva.Faults(faults))
	}
	*p = *compile(m)
}

func replace(p *program, m *rates.Model) { *p = *compile(m) }

func after(p *program, i int, f pass) { before(p, i+1, f) }

func before(p *program, i int, f pass) {
	p.passes = append(p.passes[:i:i], append([]pass{f}, p.passes[i:]...)...)
}

// mutantCase uses each part that a mutation touches, strongly enough for 60,000
// replicates to see it.
func mutantCase(t testing.TB) *pva.Case {
	return caseOf(t, "question.threshold", 25, "question.horizon", 10, "start.abundance", 60, "start.cv", .3, "births.breeding", "pulse", "births.rate", .55, "births.year_sd", .3, "births.trend", -.03,
		"births.crowding.form", "linear", "births.crowding.scale", 250, "deaths.fraction", .28, "deaths.year_sd", .1, "weather.correlation", .7, "weather.memory", .3,
		"catastrophe.1.chance", .1, "catastrophe.1.kills", .2, "catastrophe.1.births_times", .2,
		"harvest.1.rule", "constant", "harvest.1.take", 8, "harvest.1.when", "end", "harvest.1.stop_below", 40, "harvest.1.share", .6, "harvest.1.extra_deaths", .3,
		"stocking.1.add", 5, "stocking.1.when", "end", "stocking.1.only_below", 42, "run.seed", 9, "run.stop_above", 100000)
}

func TestMutationsAreCaught(t *testing.T) {
	const n, level = 60000, 1e-7
	c := mutantCase(t)
	m, faults := rates.New(c)
	if len(faults) > 0 {
		t.Fatal(pva.Faults(faults))
	}
	e, err := exact.Solve(context.Background(), m, exact.Options{})
	if err != nil || e.Reason != "" {
		t.Fatal(err, e.Reason)
	}
	t.Logf("exact risk %.6f +- %.1g", e.Risk, e.Error)
	smallest := func(plant func(p *program)) float64 {
		engine, err := New(c.Run.Seed, m)
		if err != nil {
			t.Fatal(err)
		}
		plant(engine.programs[0])
		// One worker: a planted pass may keep a state of its own.
		out, err := ensemble.Run(context.Background(), engine, ensemble.Plan{Replicates: n, Workers: 1})
		if err != nil {
			t.Fatal(err)
		}
		tail := 1.0
		for y, p := range e.Fallen {
			tail = math.Min(tail, estimate.BinomialTailWidened(out[0].Years[y].Fallen, n, p, e.Error))
		}
		return tail
	}
	if tail := smallest(func(*program) {}); tail < level {
		t.Fatalf("without any fault the simulator and the exact answer disagree (tail %.2g)", tail)
	}
	for _, mutation := range mutations {
		if tail := smallest(mutation.plant); tail >= level {
			t.Errorf("not caught: %s (smallest tail %.2g)", mutation.name, tail)
		}
	}
}
