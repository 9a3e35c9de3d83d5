package rates

import (
	"math"
	"strconv"

	"ebbline/rng/portable"
)

// SubstepPlan says how a flow year is simulated: event by event while N is at
// or below EventsBelow, in Substeps equal parts of the year above it.
type SubstepPlan struct {
	Substeps    int
	EventsBelow float64
	Adaptive    bool // a sub-step in which rates are high is shortened
}

// eventsAYear is how many events a year auto simulates one by one: about as
// many as cost what the sub-steps of the same year would cost several times.
const eventsAYear = 1000

// PlanSubsteps chooses for a flow case. "events" is every event; a number is
// that many sub-steps at any N; "auto" is events while a mean year expects at
// most about a thousand of them, and above that sub-steps so short that the
// rates per head change by at most 2 % of the population's own response in one.
func PlanSubsteps(m *Model) SubstepPlan {
	c := m.Case
	all := SubstepPlan{Substeps: 1, EventsBelow: math.Inf(1)}
	switch s := c.Run.Substeps; {
	case s == "events" || c.Question.Watch == "always":
		return all
	case s != "auto":
		k, _ := strconv.Atoi(s)
		return SubstepPlan{Substeps: max(1, k), EventsBelow: -1}
	}
	n := 1.0
	for n < c.Run.StopAbove && m.eventRate(n) < eventsAYear {
		n *= 1.05
	}
	if n >= c.Run.StopAbove {
		return all
	}
	n = math.Floor(n)
	k := math.Ceil(50 * m.response(n))
	return SubstepPlan{Substeps: int(math.Max(8, math.Min(k, 400))), EventsBelow: n, Adaptive: true}
}

// eventRate is births, deaths, takes and additions a year at n in a mean year.
func (m *Model) eventRate(n float64) float64 {
	r := float64((m.BirthAt(m.Birth.Mean, n) + m.DeathAt(m.Death.Mean(), n)) * n)
	for i := range m.Takes {
		if t := &m.Takes[i]; t.Rule.When == "through" && t.First > 0 {
			perYear, perHead := t.Stream(t.First)
			r += float64((perYear + float64(perHead*n)) * (1 + t.Rule.ExtraDeaths))
		}
	}
	for _, s := range m.Case.Stocking {
		if s.When == "through" {
			r += s.Add
		}
	}
	return r
}

// response is the largest change of net growth per head with ln N between from
// and a population well above where the mean path rests: the rate at which a
// population off its resting place returns to it.
func (m *Model) response(from float64) float64 {
	most := 0.0
	for n := from; n < m.substepsTo(from); n *= 1.1 {
		most = math.Max(most, math.Abs(m.netGrowth(n*1.01)-m.netGrowth(n/1.01))/(2*portable.Log(1.01)))
	}
	return most
}

// substepsTo is a population that the mean path does not reach from below:
// half as much again as the largest resting place or the start.
func (m *Model) substepsTo(from float64) float64 {
	top := math.Max(2*from, 1.5*m.Case.Start.Abundance)
	for _, l := range []float64{m.BirthCrowding.L, m.DeathCrowding.L, m.Case.Births.Crowding.Capacity.Value, m.Case.Deaths.Crowding.Capacity.Value} {
		top = math.Max(top, 1.5*l)
	}
	return math.Min(top, m.Case.Run.StopAbove)
}

func (m *Model) netGrowth(n float64) float64 {
	return m.BirthAt(m.Birth.Mean, n) - m.DeathAt(m.Death.Mean(), n)
}
