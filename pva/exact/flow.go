package exact

import (
	"math"

	"ebbline/pva/rates"
)

// mover moves laws on 0..top+1 a year on, in place.
type mover interface{ move(vs batch) }

// generator is the birth-death chain of flow year y with yearly rates b and d
// (draws times calendar and catastrophes): births, deaths, takes and extra
// deaths through the year, immigration. Extra deaths run at extra_deaths times
// the take that is running. With watched, nothing moves at or below threshold.
func generator(m *rates.Model, y int, b, d float64, top int, watched bool) birthDeath {
	g := birthDeath{make([]float64, top+1), make([]float64, top+1)}
	c := m.Case
	for i := range g.up {
		n := float64(i)
		if watched && n <= c.Question.Threshold {
			continue
		}
		if i > 0 {
			g.up[i] = m.BirthAt(b, n) * n
			g.down[i] = m.DeathAt(d, n) * n
		}
		for j := range m.Takes {
			t := &m.Takes[j]
			h := &t.Rule
			if h.When != "through" || !t.Scheduled[y-1] || n <= math.Ceil(h.Leave) || n < h.StopBelow {
				continue
			}
			year, head := t.Stream(y)
			g.down[i] += (year + head*n) * (1 + h.ExtraDeaths)
		}
		for _, s := range c.Stocking {
			if s.When == "through" && s.Scheduled(c, y) && !(s.OnlyBelow.Set && n >= s.OnlyBelow.Value) {
				g.up[i] += s.Add
			}
		}
	}
	return g
}

// streams names the takes and additions through year y, for years that share them.
func streams(m *rates.Model, y int) string {
	key := ""
	for j := range m.Takes {
		if t := &m.Takes[j]; t.Rule.When == "through" && t.Scheduled[y-1] {
			year, head := t.Stream(y)
			key += keyOf("t", j, " ", year, " ", head, ";")
		}
	}
	for j, s := range m.Case.Stocking {
		if s.When == "through" && s.Scheduled(m.Case, y) {
			key += keyOf("s", j, ";")
		}
	}
	return key
}

// move moves laws by the rational approximation.
func (p *propagator) move(vs batch) {
	work := make([]complex128, p.top+2)
	for _, v := range vs {
		p.apply(v, work)
	}
}

// Costs of a state a jump, a pole and its building, in elementary operations,
// measured against each other.
const (
	jumpCost  = 2
	poleCost  = 9
	buildCost = 25
)

// costs are the operations to build and to move one law, by uniformisation and
// by the rational approximation with the given bound on a step.
func (g birthDeath) costs(bound float64) (jumps, build, step float64) {
	fastest := 0.0
	for i := range g.up {
		fastest = math.Max(fastest, g.up[i]+g.down[i])
	}
	n := float64(len(g.up))
	jumps = jumpCost * n * (fastest + 10*math.Sqrt(fastest) + 20)
	return jumps, 8 * buildCost * n, 8 * poleCost * n * float64(g.stepsFor(bound))
}

// mover chooses the cheaper way for laws many uses of the generator.
func (g birthDeath) mover(bound float64, uses int) mover {
	jumps, build, step := g.costs(bound)
	if float64(uses)*jumps < build+float64(uses)*step {
		return newUniform(g)
	}
	return newPropagator(g, g.stepsFor(bound))
}
