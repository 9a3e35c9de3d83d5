package rates

import (
	"math"

	"ebbline/pva"
	"ebbline/rng/portable"
)

// Growth is the deterministic yearly growth factor of the stated rates at
// population n without takes, under both readings, so that a rate meant for
// the other reading is seen: Pulse is (1-m)(1+f) or 1-m+f, Flow is exp(b-d).
type Growth struct{ Pulse, Flow float64 }

// GrowthAt is the growth in a mean year at population n.
func (m *Model) GrowthAt(n float64) Growth {
	d := m.DeathAt(m.Death.Mean(), n)
	g := Growth{Flow: portable.Exp(m.BirthAt(m.Birth.Mean, n) - d)}
	s := portable.Exp(-d)
	if m.Case.Births.Parents == "all" {
		g.Pulse = s + m.BirthAt(m.Birth.Mean, n)
	} else {
		g.Pulse = s * (1 + m.BirthAt(m.Birth.Mean, n*s))
	}
	return g
}

// MeanYear is the population after one mean year that starts at n: no weather,
// no catastrophes, calendar factors 1, the take and stocking rules acting on
// the true population in every year of their cycle in proportion (a rule of one
// year in three acts at a third), no ceiling unless the case has one.
func (m *Model) MeanYear(n float64) float64 {
	c := m.Case
	n = m.meanActions(n, "start")
	if c.Births.Breeding == "flow" {
		if n = m.meanFlow(n); math.IsInf(n, 1) {
			return n // blown up: nothing brings it back
		}
	} else {
		s := n * portable.Exp(-m.DeathAt(m.Death.Mean(), n))
		parents := s
		if c.Births.Parents == "all" {
			parents = n
		}
		f := m.BirthAt(m.Birth.Mean, parents)
		if c.Births.Offspring == "at-most-one" {
			f = math.Min(f, 1)
		}
		n = s + f*parents
	}
	n = m.meanActions(n, "end")
	if c.Ceiling.Set {
		n = math.Min(n, c.Ceiling.Value)
	}
	return n
}

func (m *Model) meanActions(n float64, when string) float64 {
	for i := range m.Takes {
		t := &m.Takes[i]
		if t.Rule.When != when || t.First == 0 || n < t.Rule.StopBelow {
			continue
		}
		made := math.Min(t.Target(t.First, n)/float64(t.Rule.OneYearIn), math.Max(0, n-t.Rule.Leave))
		n = math.Max(0, n-made*(1+t.Rule.ExtraDeaths))
	}
	for _, s := range m.Case.Stocking {
		if s.When == when && (!s.OnlyBelow.Set || n < s.OnlyBelow.Value) {
			n += s.Add / float64(s.OneYearIn)
		}
	}
	return n
}

// meanFlow integrates dN/dt = (b - d) N - h + a over one year by the classical
// fourth-order Runge-Kutta rule, in steps short against the rates.
func (m *Model) meanFlow(n float64) float64 {
	slope := func(n float64) float64 {
		if n <= 0 {
			n = 0
		}
		return m.netGrowth(n)*n + m.streamSlope(n)
	}
	for t := 0.0; t < 1; {
		h := math.Min(1.0/64, 1-t)
		if r := m.BirthAt(m.Birth.Mean, n) + m.DeathAt(m.Death.Mean(), n); r*h > 0.1 {
			h = math.Max(0.1/r, 1e-9)
		}
		k1 := slope(n)
		k2 := slope(n + h/2*k1)
		k3 := slope(n + h/2*k2)
		k4 := slope(n + h*k3)
		n = math.Max(0, n+h/6*(k1+2*k2+2*k3+k4))
		if n > m.Case.Run.StopAbove {
			return math.Inf(1) // blow-up: the mean path has no value beyond
		}
		t += h
	}
	return n
}

// streamSlope is what takes and additions through a mean year change N by, a year.
func (m *Model) streamSlope(n float64) float64 {
	v := 0.0
	for i := range m.Takes {
		t := &m.Takes[i]
		if t.Rule.When != "through" || t.First == 0 || n < t.Rule.StopBelow || n <= t.Rule.Leave {
			continue
		}
		perYear, perHead := t.Stream(t.First)
		v -= (perYear + perHead*n) * (1 + t.Rule.ExtraDeaths) / float64(t.Rule.OneYearIn)
	}
	for _, s := range m.Case.Stocking {
		if s.When == "through" && (!s.OnlyBelow.Set || n < s.OnlyBelow.Value) {
			v += s.Add / float64(s.OneYearIn)
		}
	}
	return v
}

// Equilibrium is a population at which the mean path rests.
type Equilibrium struct {
	N      float64
	Stable bool
}

// Equilibria are all populations above 0 at which a mean year returns to where
// it began, found by a scan in steps of 1 % and bisection. A ceiling counts as
// a resting place if growth is upwards below it.
func (m *Model) Equilibria() []Equilibrium {
	var out []Equilibrium
	excess := func(n float64) float64 { return m.MeanYear(n) - n }
	top := m.scanTo()
	prevN, prev := 1e-3, excess(1e-3)
	for n := 1e-3 * 1.01; n < top; n *= 1.01 {
		e := excess(n)
		if (prev > 0) != (e > 0) && !math.IsInf(e, 0) && !math.IsInf(prev, 0) && !math.IsNaN(e-prev) {
			lo, hi := prevN, n
			for i := 0; i < 100; i++ {
				if mid := (lo + hi) / 2; (excess(mid) > 0) == (prev > 0) {
					lo = mid
				} else {
					hi = mid
				}
			}
			at := (lo + hi) / 2
			// A rule that opens or closes makes a jump: no rest there unless the
			// path is held between both sides.
			if math.Abs(excess(at)) < 1e-6*(1+at) || prev > 0 {
				slope := (m.MeanYear(at*(1+1e-5)) - m.MeanYear(at*(1-1e-5))) / (2e-5 * at)
				if at > 1e-2 {
					out = append(out, Equilibrium{at, math.Abs(slope) < 1 || (prev > 0 && math.Abs(excess(at)) >= 1e-6*(1+at))})
				}
			}
		}
		prevN, prev = n, e
	}
	return out
}

// scanTo is a population beyond which no rest is sought.
func (m *Model) scanTo() float64 {
	top := 100 * math.Max(m.Case.Start.Abundance, 1)
	for _, v := range []float64{m.BirthCrowding.L, m.DeathCrowding.L, m.Scarcity.A, m.Case.Ceiling.Value, m.Case.Births.Crowding.Capacity.Value} {
		top = math.Max(top, 100*v)
	}
	for _, h := range m.Case.Harvest {
		top = math.Max(top, 100*math.Max(h.StopBelow, math.Max(h.Leave, h.Spare.Value)))
	}
	return math.Min(top, m.Case.Run.StopAbove)
}

// Warnings are the doubts about a case that need its formulas: growth that is
// biologically doubtful.
func (m *Model) Warnings() []pva.Warning {
	var out []pva.Warning
	if low := m.GrowthAt(1); m.Scarcity.Form == Plenty {
		g := low.Pulse
		if m.Case.Births.Breeding == "flow" {
			g = low.Flow
		}
		if g > 2 {
			out = append(out, pva.Warning{Key: "births.rate", Text: "the population would more than double in a year without crowding, which is doubtful for a vertebrate (common practice, no source)"})
		}
	}
	return out
}
