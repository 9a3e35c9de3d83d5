package exact

import (
	"fmt"
	"math"
	"strings"

	"ebbline/pva"
	"ebbline/pva/rates"
)

// plan is how a case will be solved, decided before anything is run.
type plan struct {
	m       *rates.Model
	climate climate
	first   setting
	goal    float64
	most    float64
	further float64 // operations up to which more runs may be made to lower the error
	// inexact says that something is integrated by quadrature or approximated,
	// so that two runs are compared.
	inexact bool
	fixed   bool   // the largest state was given
	reason  string // why there is no exact answer
}

// mostBytes is the memory that kernels and laws may take.
const mostBytes = 1.5e9

// mostFactors is the number of different products of births_times allowed for.
const mostFactors = 32

// Cost counts the operations of the exact answer of a case beforehand (about
// one nanosecond each on a slow core). Where there can be no exact answer ok is
// false and reason says exactly why not, in plain words.
func Cost(m *rates.Model) (ops float64, ok bool, reason string) { return CostWith(m, Options{}) }

// CostWith is Cost for the given options.
func CostWith(m *rates.Model, opt Options) (ops float64, ok bool, reason string) {
	p := newPlan(m, opt)
	if p.reason != "" {
		return 0, false, p.reason
	}
	return p.total(), true, ""
}

// total is the operations of the runs that are made in any case.
func (p *plan) total() float64 {
	ops := p.ops(p.first)
	if p.inexact {
		ops += p.ops(p.finer(p.first))
	}
	return ops
}

func newPlan(m *rates.Model, opt Options) *plan {
	p := &plan{m: m, climate: climateOf(m), goal: Goal, most: opt.Most}
	if p.most == 0 {
		p.most = Most
	}
	p.further = opt.Most
	if p.climate.memory != 0 {
		p.goal = GoalWithMemory
	}
	if p.reason = refusal(m, opt); p.reason != "" {
		return p
	}
	p.inexact = !p.climate.still() || m.Case.Births.Breeding == "flow" || integrates(m)
	p.first = setting{order: p.firstOrder(opt), bound: 6, keep: true}
	p.chooseTop(opt)
	if p.reason != "" {
		return p
	}
	if p.memory(p.first) > mostBytes {
		p.first.keep = false
	}
	if need := p.memory(p.first); need > mostBytes {
		p.reason = fmt.Sprintf("the law of N needs %d states%s, about %.1f GB of memory", p.first.top+1, p.perWeather(), need/1e9)
		return p
	}
	ops := p.total()
	if p.further == 0 {
		p.further = math.Min(p.most, math.Max(Cheap, 4*ops))
	}
	if ops > p.most {
		p.reason = fmt.Sprintf("the law of N needs %d states%s and about %.0e operations, more than the %.0e allowed", p.first.top+1, p.perWeather(), ops, p.most)
	}
	return p
}

func (p *plan) perWeather() string {
	if p.climate.memory == 0 {
		return ""
	}
	return fmt.Sprintf(" for each of %d states of the weather, which has memory,", p.nodes(p.first))
}

// looks says whether a rule depends on what was seen: then an old count, exact
// or not, matters in years without a survey.
func looks(h pva.Harvest) bool {
	switch h.Rule {
	case "constant", "by_year":
		return h.StopBelow > 0
	case "fraction":
		return h.StopBelow > 0 || h.TakeNoise != "each-animal"
	}
	return true
}

// mostBirths is the largest number of births a head in a year.
const mostBirths = 10000

// refusal says why a case has no exact answer whatever its size.
func refusal(m *rates.Model, opt Options) string {
	c := m.Case
	if len(c.Uncertain) > 0 && !opt.Stated {
		var keys []string
		for _, u := range c.Uncertain {
			keys = append(keys, u.Key)
		}
		return "inputs are uncertain (" + strings.Join(keys, ", ") + "): each draw of them is a case of its own"
	}
	for i, t := range m.Takes {
		if t.First == 0 || t.Rule.When == "through" || !looks(t.Rule) {
			continue
		}
		for y := range t.Scheduled {
			if t.Scheduled[y] && !t.Surveyed[y] {
				name := t.Rule.Name
				if name == "" {
					name = fmt.Sprint(i + 1)
				}
				return fmt.Sprintf("the take %s keeps the estimate of its survey for %d years, so that the population's future depends on the estimate beside N", name, t.Rule.SurveyEvery)
			}
		}
	}
	for y, f := range m.BirthCalendar {
		// Beyond this a single row of the law of the young is longer than any
		// table of states.
		if births := m.Birth.Mean * f * math.Exp(5*m.Birth.Sigma); births > mostBirths {
			return fmt.Sprintf("births reach %.0e a head by year %d, more than the %d whose law is followed", births, c.Label(y+1), mostBirths)
		}
	}
	if n := len(factorsOf(c)); n > mostFactors {
		return fmt.Sprintf("catastrophes change births in %d different combinations, more than the %d allowed for", n, mostFactors)
	}
	return ""
}

// integrates says that some rule needs quadrature besides the weather.
func integrates(m *rates.Model) bool {
	for _, k := range m.Kills {
		if k.V != 0 {
			return true
		}
	}
	for _, t := range m.Takes {
		if t.Rule.SurveyCV > 0 && (t.Rule.TakeCV > 0 || t.Rule.TakeNoise == "poisson") {
			return true
		}
	}
	return false
}

// Orders of quadrature grow by half from one level to the next.
func (p *plan) firstOrder(opt Options) int {
	flow := p.m.Case.Births.Breeding == "flow"
	switch {
	case opt.Order > 0:
		return opt.Order
	case p.climate.still():
		return 12
	case p.climate.memory != 0 && p.climate.axes() == 2:
		return 5
	case p.climate.memory != 0:
		return 8
	case flow && p.climate.axes() == 2:
		return 6
	case flow:
		return 9
	case p.climate.apart() && p.different(true, true) == 1:
		return 18 // averaged once: more points cost little
	}
	return 8
}

// finer is the next setting.
func (p *plan) finer(s setting) setting {
	s.order += (s.order + 1) / 2
	s.bound = 4
	return s
}

// nodes is the number of weathers of a setting.
func (p *plan) nodes(s setting) int {
	switch p.climate.axes() {
	case 0:
		return 1
	case 1:
		return s.order
	}
	return s.order * s.order
}

// chooseTop sets the largest state: high enough that the mass beyond is
// negligible, or, where the population may grow without end, that falling from
// there is.
func (p *plan) chooseTop(opt Options) {
	c := p.m.Case
	if opt.Top > 0 {
		p.first.top, p.fixed = opt.Top, true
		return
	}
	if top, ok := ceilingTop(c); ok && top <= reachMost && top < c.Run.StopAbove {
		p.first.top = int(top)
		// The natural reach may still be lower.
		if all, _ := reach(p.m); all < top {
			p.first.top = int(all)
		}
		return
	}
	all, risk := reach(p.m)
	if c.Ceiling.Set {
		// What is above the ceiling comes back to it at the end of the year: it
		// matters only if it fell below it again before. The run measures that.
		k := math.Floor(c.Ceiling.Value)
		most := math.Max(startReach(c), math.Max(2*k, k+12*math.Sqrt(k)+40))
		all, risk = math.Min(all, most), math.Min(risk, most)
	}
	limit := math.Inf(1)
	if c.Run.StopAbove < reachMost {
		limit = math.Floor(c.Run.StopAbove) + firstAdditions(c)
	}
	all, risk = math.Min(all, limit), math.Min(risk, limit)
	if risk > reachMost {
		p.reason = fmt.Sprintf("the population can grow to more than %d, too many states, before it is safe from falling", reachMost)
		return
	}
	p.first.top = int(risk)
	if all <= risk || all > reachMost {
		return
	}
	// Some more states make the mean known, unless they make the answer dear.
	allowed := Cheap
	if all > 2*risk {
		allowed /= 10
	}
	p.first.top = int(all)
	if p.memory(p.first) > mostBytes || p.total() > allowed {
		p.first.top = int(risk)
	}
}
