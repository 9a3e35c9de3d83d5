package year

import (
	"math"

	"ebbline/pva/rates"
)

// pass takes a block through one part of model year y.
type pass func(b *block, y int)

// program is a case compiled: its passes in the order of the year.
type program struct {
	model     *rates.Model
	passes    []pass
	threshold int64
	stopAbove int64
	ceiling   int64
	always    bool // watch = always
	takes     bool
	stocks    bool
	startLaw  rates.LogNormal
	flow      *flow // nil in a pulse case
}

// compile lists the passes of a case: model section 2.
func compile(m *rates.Model) *program {
	c := m.Case
	p := &program{
		model:     m,
		threshold: int64(math.Floor(c.Question.Threshold)),
		stopAbove: int64(math.Floor(c.Run.StopAbove)),
		always:    c.Question.Watch == "always",
		startLaw:  rates.NewLogNormal(1, c.Start.CV),
	}
	for i := range m.Takes {
		p.takes = p.takes || m.Takes[i].First > 0
	}
	for _, s := range c.Stocking {
		_, ever := s.FirstScheduled(c)
		p.stocks = p.stocks || (ever && s.Add > 0)
	}
	add := func(ps ...pass) {
		for _, f := range ps {
			p.passes = append(p.passes, f)
			if p.always {
				p.passes = append(p.passes, watch)
			}
		}
	}
	// 1: the year's environment, and catastrophes: those killed go first.
	p.passes = append(p.passes, weatherPasses(m)...)
	for i := range c.Catastrophe {
		if c.Catastrophe[i].Prob() > 0 {
			add(strike(m, i))
		}
	}
	// 2: harvest, then stocking, at the start.
	add(actions(m, "start")...)
	// 3: births and deaths.
	if c.Births.Breeding == "flow" {
		p.flow = newFlow(m)
		p.passes = append(p.passes, p.flow.pass(p.always), checkOutgrown) // watches within
	} else {
		add(pulsePasses(m)...)
		p.passes = append(p.passes, checkOutgrown)
	}
	// 4: harvest, then stocking, at the end.
	if end := actions(m, "end"); len(end) > 0 {
		add(end...)
		p.passes = append(p.passes, checkOutgrown)
	}
	// 5: the ceiling.
	if c.Ceiling.Set {
		p.ceiling = int64(math.Floor(c.Ceiling.Value))
		add(ceiling)
	}
	return p
}

// actions are the take rules, then the stocking rules, of one end of the year,
// in the order of the case.
func actions(m *rates.Model, when string) []pass {
	var out []pass
	for i := range m.Takes {
		if t := &m.Takes[i]; t.Rule.When == when && t.First > 0 {
			out = append(out, harvest(m, i))
		}
	}
	for _, s := range m.Case.Stocking {
		if _, ever := s.FirstScheduled(m.Case); ever && s.When == when && s.Add > 0 {
			out = append(out, stock(m, s))
		}
	}
	return out
}
