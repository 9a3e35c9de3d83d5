package rates

import (
	"math"
	"strconv"

	"ebbline/pva"
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
		most = math.Max(most, math.Abs(m.netGrowth(n*1.01)-m.netGrowth(n/1.01))/(2*math.Log(1.01)))
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

// BoundSubsteps estimates the most that sub-steps do to a flow case's answer; nil for a
// pulse case. Freezing the rates within a sub-step shifts the mean log growth of
// a year (LogGrowth: the largest difference between a year of sub-steps and a
// fine integration, over the populations where sub-steps are used) and lengthens
// the life of a fluctuation, which shifts the demographic variance by a fraction
// of at most response/substeps (Variance). For yearly steps near to normal, with
// variance s^2 a year, the total variation between two such walks over T years
// is at most sqrt(T) LogGrowth/(2 s) + sqrt(T/8) Variance (Pinsker's inequality
// and the Kullback-Leibler divergence of normal laws): no probability, the risk
// included, is then off by more. It rests on mean rates and on steps near to
// normal, so it is an estimate of a bound, and usually a generous one.
func BoundSubsteps(m *Model) *pva.SubstepBound {
	if m.Case.Births.Breeding != "flow" {
		return nil
	}
	plan := PlanSubsteps(m)
	if math.IsInf(plan.EventsBelow, 1) {
		return &pva.SubstepBound{EventsBelow: plan.EventsBelow}
	}
	b := &pva.SubstepBound{Substeps: plan.Substeps, EventsBelow: math.Max(0, plan.EventsBelow)}
	from := math.Max(math.Max(plan.EventsBelow, m.Case.Question.Threshold), 1)
	weather := m.weatherVariance()
	worst := 0.0
	for n := from; n < m.substepsTo(from); n *= 1.1 {
		shift := math.Abs(math.Log(m.substepYear(n, plan.Substeps) / m.meanFlow(n)))
		if math.IsNaN(shift) || math.IsInf(shift, 0) {
			continue // the mean path dies out or outgrows within the year
		}
		demographic := (m.BirthAt(m.Birth.Mean, n) + m.DeathAt(m.Death.Mean(), n)) / n
		s2 := demographic + weather
		if s2 == 0 {
			continue
		}
		eps := m.response(n) / float64(plan.Substeps) * demographic / s2
		t := float64(m.Case.Question.Horizon)
		worst = math.Max(worst, math.Sqrt(t)*shift/(2*math.Sqrt(s2))+math.Sqrt(t/8)*eps)
		b.LogGrowth = math.Max(b.LogGrowth, shift)
		b.Variance = math.Max(b.Variance, eps)
	}
	b.RiskBound = math.Min(1, worst)
	return b
}

// weatherVariance is the variance of a year's b - d that the last year's weather
// does not foretell: correlation of births and deaths taken off, memory left out.
func (m *Model) weatherVariance() float64 {
	b := m.Birth.Sigma * m.Birth.Mean
	d := math.Sqrt(m.deathVariance())
	memory := m.Case.Weather.Memory
	return math.Max(0, b*b+d*d-2*m.Case.Weather.Correlation*b*d) * (1 - memory*memory)
}

// deathVariance is the variance of the death rate between years.
func (m *Model) deathVariance() float64 {
	if !m.Death.IsFraction {
		s := m.Death.Rate.Sigma * m.Death.Rate.Mean
		return s * s
	}
	f := m.Death.Fraction
	if f.V == 0 {
		return 0
	}
	_, second := logitMoments(f.U, f.V)
	return (second - f.Mean*f.Mean) / ((1 - f.Mean) * (1 - f.Mean)) // delta method
}

// substepYear is the mean of a year of sub-steps from n, as package year takes
// them: rates frozen at the midpoint, streams between two halves.
func (m *Model) substepYear(n float64, k int) float64 {
	tau := 1 / float64(k)
	half := func(n, tau float64) float64 {
		at := n * (1 + math.Max(-0.5, math.Min(0.5, m.netGrowth(n)*tau/2)))
		return n * math.Exp(m.netGrowth(at)*tau)
	}
	streams := false
	for i := range m.Takes {
		streams = streams || m.Takes[i].Rule.When == "through"
	}
	for _, s := range m.Case.Stocking {
		streams = streams || s.When == "through"
	}
	for j := 0; j < k; j++ {
		if !streams {
			n = half(n, tau)
			continue
		}
		n = half(n, tau/2)
		n = math.Max(0, n+m.streamSlope(n)*tau)
		n = half(n, tau/2)
	}
	return n
}
