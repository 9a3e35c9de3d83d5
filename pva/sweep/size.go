package sweep

import (
	"math"

	"ebbline/pva"
	"ebbline/pva/rates"
)

// size.go turns a size into a case. A start is simply put in. A capacity is
// solved for: where the case states one, the size takes its place; where it
// states only scales, all of them are multiplied by the one factor at which the
// mean path rests at the size. A capacity and a scale go up in proportion only
// while nothing else in the case has a size of its own (scarcity has), so that a
// factor of size over capacity would miss.

// cannotRest is why a size has no case.
const cannotRest = "the population cannot rest there: births do not balance deaths at that size"

// model is the case of a size as formulas; or, without an error, why there is
// none: no scale of crowding lets the population rest at that size, or only on
// a point that it leaves.
func (q *Sizes) model(c *pva.Case, base *rates.Model, size float64) (m *rates.Model, unreachable string, err error) {
	rest := q.restOf(c, size)
	times := 1.0
	if q.Vary != "start" {
		times = rest / q.Capacity
	}
	scales := times
	if q.solved {
		var ok bool
		if scales, ok = q.scalesFor(c, base, rest); !ok {
			return nil, cannotRest, nil
		}
	}
	vc, faults := c.With(q.settings(c, size, times, scales))
	if len(faults) > 0 {
		return nil, "", faults
	}
	m, wrong := rates.New(vc)
	switch {
	case len(wrong) > 0 && q.Vary != "start" && onlyCapacity(wrong):
		return nil, cannotRest, nil
	case len(wrong) > 0:
		return nil, "", pva.Faults(wrong)
	case q.Vary != "start" && q.crowded && !q.restsAt(m, rest):
		return nil, cannotRest, nil
	}
	return m, "", nil
}

// restOf is the capacity that a size stands for.
func (q *Sizes) restOf(c *pva.Case, size float64) float64 {
	if q.Vary == "both" {
		return q.Capacity * size / c.Start.Abundance
	}
	return size
}

// onlyCapacity says whether all faults are of a capacity without a solution.
func onlyCapacity(faults []pva.Fault) bool {
	for _, f := range faults {
		if f.Path != "births.crowding.capacity" && f.Path != "deaths.crowding.capacity" {
			return false
		}
	}
	return true
}

// restsAt says whether the population returns to a size that it rests at: with
// scarcity a balance of births and deaths may be one that it leaves, downwards
// to nothing or upwards to a larger rest.
func (q *Sizes) restsAt(m *rates.Model, size float64) bool {
	if q.solved {
		return math.Abs(resting(m)-size) <= 1e-6*size
	}
	const aside = 1e-3
	g := m.GrowthAt(size * (1 - aside))
	if m.Case.Births.Breeding == "flow" {
		return g.Flow > 1
	}
	return g.Pulse > 1
}

// scalesFor is the factor on the case's scales at which the mean path rests at a
// size. Crowding eases as scales grow, so that the yearly change there rises
// with the factor and bisection finds where it is 0.
func (q *Sizes) scalesFor(c *pva.Case, base *rates.Model, size float64) (float64, bool) {
	change := func(times float64) float64 {
		m := bare(base)
		m.BirthCrowding.L *= times
		m.DeathCrowding.L *= times
		return m.MeanYear(size) - size
	}
	// The factor of plain proportion is not far off: look up to 1e4 times either way.
	guess := size / q.Capacity
	low, high := guess, guess
	for change(low) > 0 {
		if low /= 2; low < 1e-4*guess {
			return 0, false
		}
	}
	for !(change(high) > 0) {
		if high *= 2; high > 1e4*guess {
			return 0, false
		}
	}
	for i := 0; i < 200 && high-low > 1e-14*high; i++ {
		if mid := (low + high) / 2; change(mid) > 0 {
			high = mid
		} else {
			low = mid
		}
	}
	return (low + high) / 2, true
}

// settings makes the case one of a size: capacities and the ceiling times one
// factor, scales times another.
func (q *Sizes) settings(c *pva.Case, size, times, scales float64) []pva.Setting {
	out := []pva.Setting{{Path: "question.horizon", Value: pva.Num(float64(q.Horizon))}}
	put := func(path string, v float64) { out = append(out, pva.Setting{Path: path, Value: pva.Num(v)}) }
	if q.Vary != "capacity" {
		put("start.abundance", size)
	}
	if q.Vary == "start" {
		return out
	}
	scale := func(path string, v pva.Optional, by float64) {
		if v.Set {
			put(path, v.Value*by)
		}
	}
	for i, crowding := range []pva.Crowding{c.Births.Crowding, c.Deaths.Crowding} {
		if crowding.Form != "none" {
			side := []string{"births", "deaths"}[i]
			scale(side+".crowding.scale", crowding.Scale, scales)
			scale(side+".crowding.capacity", crowding.Capacity, times)
		}
	}
	scale("ceiling.abundance", c.Ceiling, times)
	return out
}

// resting is where births balance deaths without takes, stocking and ceiling: the
// largest population that the mean year brings back towards, from below at least.
// One that overshoots and cycles around it rests there too. 0 if there is none.
func resting(m *rates.Model) float64 {
	const aside = 1e-4
	m = bare(m)
	k := 0.0
	for _, e := range m.Equilibria() {
		if below := e.N * (1 - aside); m.MeanYear(below) > below {
			k = math.Max(k, e.N)
		}
	}
	return k
}

// bare is a model without takes, stocking and ceiling.
func bare(m *rates.Model) *rates.Model {
	out := *m
	c := *m.Case
	c.Harvest, c.Stocking, c.Ceiling = nil, nil, pva.Optional{}
	out.Case, out.Takes = &c, nil
	return &out
}
