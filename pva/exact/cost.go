package exact

import (
	"math"
)

// ops counts the operations of one run with a setting: rows built and applied,
// sampled at some states between 0 and top, times years.
func (p *plan) ops(s setting) float64 {
	c := p.m.Case
	years := float64(c.Question.Horizon)
	states := float64(s.top + 1)
	factors := float64(len(factorsOf(c)))
	weathers := 1.0
	if p.climate.memory != 0 {
		weathers = float64(p.nodes(s))
	}
	total := 0.0
	if c.Births.Breeding == "flow" {
		total = p.flowOps(s)
	} else {
		total = p.pulseOps(s)
	}
	// Rules: a kernel of rows of one state or more, applied to three laws.
	for j := range p.m.Takes {
		t := &p.m.Takes[j]
		if t.Rule.When == "through" || t.First == 0 {
			continue
		}
		kernels := 1.0
		if t.Rule.Rule == "by_year" {
			kernels = float64(len(t.Rule.Takes))
		}
		width := 4.0
		if t.Rule.SurveyCV > 0 || t.Rule.TakeCV > 0 || t.Rule.TakeNoise != "none" {
			width = states / 4
			each := 40.0
			if t.Rule.SurveyCV > 0 && (t.Rule.TakeCV > 0 || t.Rule.TakeNoise == "poisson") {
				each *= float64(max(30, 2*s.order))
			}
			total += kernels * states * width * each
		}
		total += kernels*states*states/2 + years*factors*weathers*states*(width+40)*perPoint/2
	}
	for i, k := range c.Catastrophe {
		if k.Kills == 0 {
			continue
		}
		width := 12 * math.Sqrt(states*k.Kills*(1-k.Kills)+1)
		build := width
		if p.m.Kills[i].V != 0 {
			build *= float64(max(30, 2*s.order))
			width = math.Max(width, states/3)
		}
		total += states*build*rowCost + years*factors*weathers*states*width*perPoint/2
	}
	if weathers > 1 { // carrying the weather on
		total += years * weathers * float64(s.order*p.climate.axes()) * states * perPoint / 2
	}
	return total + years*weathers*states*perPoint*20
}

// rowCost is the operations of one entry of a row of a law, measured against
// one of adding a row.
const rowCost = 4

// pulseOps samples the rows of a year's kernels.
func (p *plan) pulseOps(s setting) float64 {
	r := newRun(p.m, s)
	c := p.m.Case
	states := float64(s.top + 1)
	var lives, young []law
	if c.Births.Parents == "all" {
		lives = r.wholeLaws(1, 1)
	} else {
		lives, young = r.lifeLaws(1), r.youngLaws(1)
	}
	years := float64(c.Question.Horizon)
	factors := float64(len(r.factors))
	sum := func(laws []law, births, deaths bool) float64 {
		build, move, _ := p.sample(s, laws)
		built := float64(p.different(births, deaths)) // years whose kernels must be built anew
		if !s.keep {
			built = years
		}
		return states * factors * (built*build + years*move*perPoint*2/3)
	}
	if c.Births.Parents == "all" {
		return sum(lives, true, true)
	}
	return sum(lives, false, true) + sum(young, true, false)
}

// different counts the years whose rates differ from those of all before.
func (p *plan) different(births, deaths bool) int {
	seen := map[[2]float64]bool{}
	for y := range p.m.BirthCalendar {
		var key [2]float64
		if births {
			key[0] = p.m.BirthCalendar[y]
		}
		if deaths {
			key[1] = p.m.DeathCalendar[y]
		}
		seen[key] = true
	}
	return len(seen)
}

// sample is the mean over the states of the operations to build and to apply
// the rows of laws, and of their length.
func (p *plan) sample(s setting, laws []law) (build, move, length float64) {
	if len(laws) == 0 {
		return
	}
	const at = 4
	step := max(1, len(laws)/4)
	count := 0
	var buf []float64
	for i := step / 2; i < len(laws); i += step {
		for k := 1; k <= at; k++ {
			n := s.top * (2*k - 1) / (2 * at)
			lo, row := laws[i](n, buf)
			buf = row
			in := math.Max(1, math.Min(float64(len(row)), float64(s.top-lo+1)))
			length += in
			count++
		}
	}
	length /= float64(count)
	n := float64(len(laws))
	// A row averaged over the weather is built from one row a point; how many
	// entries those have is about what one point's would have.
	return n * length * rowCost * p.pointsARow(s), n * length / 2, n * length
}

// pointsARow is about the work of building one averaged row in terms of its length.
func (p *plan) pointsARow(s setting) float64 {
	if p.climate.still() {
		return 1
	}
	points := float64(s.order)
	if p.m.Case.Births.Parents == "all" {
		points *= 4
	}
	return points / 2
}

// flowOps counts moves of three laws by the generators of the weather's points.
func (p *plan) flowOps(s setting) float64 {
	r := newRun(p.m, s)
	years := float64(p.m.Case.Question.Horizon)
	factors := float64(len(r.factors))
	parts := r.flowYear(1, p.m.BirthCalendar[0], p.m.DeathCalendar[0], false)
	built := float64(p.different(true, true))
	total := 0.0
	step := max(1, len(parts)/8)
	count := 0.0
	for i := step / 2; i < len(parts); i += step {
		jumps, build, move := parts[i].generator(false).costs(parts[i].bound)
		total += math.Min(built*build+2*years*move, 2*years*jumps)
		count++
	}
	return factors * float64(len(parts)) * total / count
}

// memory is the bytes that kernels kept and laws take.
func (p *plan) memory(s setting) float64 {
	c := p.m.Case
	states := float64(s.top + 1)
	weathers := 1.0
	if p.climate.memory != 0 {
		weathers = float64(p.nodes(s))
	}
	laws := weathers * perPoint * states * 8 * 6
	if c.Births.Breeding == "flow" {
		return laws + float64(p.nodes(s))*8*2*16*states*float64(len(factorsOf(c)))
	}
	r := newRun(p.m, s)
	entries := 0.0
	if s.keep {
		if c.Births.Parents == "all" {
			_, _, entries = p.sample(s, r.wholeLaws(1, 1))
		} else {
			_, _, a := p.sample(s, r.lifeLaws(1))
			_, _, b := p.sample(s, r.youngLaws(1))
			entries = a + b*float64(len(r.factors))
		}
	}
	for _, h := range c.Harvest { // a noisy take reaches far down from every state
		if h.SurveyCV > 0 || h.TakeCV > 0 || h.TakeNoise != "none" {
			entries += states / 3
		}
	}
	for _, k := range c.Catastrophe {
		if k.KillsSD > 0 {
			entries += states / 3
		}
	}
	return laws + entries*states*8
}
