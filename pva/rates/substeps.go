package rates

import (
	"math"

	"ebbline/pva"
)

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
