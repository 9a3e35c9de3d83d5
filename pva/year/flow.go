package year

import (
	"math"

	"ebbline/pva/rates"
	"ebbline/rng"
	"ebbline/rng/portable"
)

// flow is step 3 of a birth-flow year: births, deaths, takes and additions as
// events through the year, with the year's rates frozen.
type flow struct {
	m       *rates.Model
	streams []stream
	table   table
	odds    []odds // of constant rates; nil where they change
	// substeps divide the year where a lane is not simulated event by event.
	substeps int
	// eventsBelow: a lane is simulated event by event while N is at or below it.
	eventsBelow int64
	// adaptive shortens a sub-step in which rates are high (auto only).
	adaptive bool
}

// stream is a take rule, the extra deaths of one, or a stocking rule that runs
// through the year: events at a rate a year plus a rate per head, while open.
type stream struct {
	perYear, perHead func(y int) float64
	scheduled        []bool
	add              bool // stocking; otherwise a removal
	extra            bool // extra deaths: not part of the take, not held back by leave
	stopBelow        int64
	leave            int64
	onlyBelow        float64
}

// runs says whether the stream runs at n. A take that runs while N is at or
// below leave removes nothing: its events are shortfall.
func (s *stream) runs(n int64) bool {
	if s.add {
		return float64(n) < s.onlyBelow
	}
	if s.extra && n <= s.leave {
		return false // extra deaths come with a take, and none is made
	}
	return n >= s.stopBelow
}

func newFlow(m *rates.Model) *flow {
	f := &flow{m: m, streams: throughStreams(m)}
	f.table = newTable(m)
	f.odds = newOdds(m, f.table)
	plan := rates.PlanSubsteps(m)
	f.substeps, f.adaptive = plan.Substeps, plan.Adaptive
	f.eventsBelow = math.MaxInt64
	if plan.EventsBelow < math.MaxInt64/2 {
		f.eventsBelow = int64(plan.EventsBelow)
	}
	return f
}

func throughStreams(m *rates.Model) []stream {
	var out []stream
	for i := range m.Takes {
		t := &m.Takes[i]
		if t.Rule.When != "through" || t.First == 0 {
			continue
		}
		s := stream{
			scheduled: t.Scheduled,
			perYear:   func(y int) float64 { v, _ := t.Stream(y); return v },
			perHead:   func(y int) float64 { _, v := t.Stream(y); return v },
			stopBelow: int64(math.Ceil(t.Rule.StopBelow)),
			leave:     int64(math.Ceil(t.Rule.Leave)),
		}
		out = append(out, s)
		if x := t.Rule.ExtraDeaths; x > 0 {
			e := s
			e.extra = true
			e.perYear = func(y int) float64 { return x * s.perYear(y) }
			e.perHead = func(y int) float64 { return x * s.perHead(y) }
			out = append(out, e)
		}
	}
	zero := func(int) float64 { return 0 }
	for _, s := range m.Case.Stocking {
		if _, ever := s.FirstScheduled(m.Case); s.When != "through" || !ever || s.Add == 0 {
			continue
		}
		scheduled := make([]bool, m.Case.Question.Horizon)
		for i := range scheduled {
			scheduled[i] = s.Scheduled(m.Case, i+1)
		}
		out = append(out, stream{scheduled: scheduled, add: true, perHead: zero,
			perYear: func(int) float64 { return s.Add }, onlyBelow: s.OnlyBelow.Or(math.Inf(1))})
	}
	return out
}

// rate is one stream's rates in force this year.
type rate struct {
	*stream
	perYear, perHead float64
	// blocked is the number of removals expected in the time that a lane spent
	// at or below leave while the take ran: its shortfall is Poisson of it.
	blocked float64
}

// pass runs the year of every lane.
func (f *flow) pass(always bool) pass {
	return func(b *block, y int) {
		var buffer [8]rate
		open := buffer[:0]
		for s := range f.streams {
			if st := &f.streams[s]; st.scheduled[y-1] {
				open = append(open, rate{stream: st, perYear: st.perYear(y), perHead: st.perHead(y)})
			}
		}
		if len(open) == 0 && !always {
			f.together(b, y)
			return
		}
		for i := 0; i < b.lanes; i++ {
			if b.isOutgrown(i) {
				continue
			}
			if f.lane(b, i, y, 0, 0, open, always); b.err != nil {
				return
			}
			for k := range open {
				// A year is closed to a stream if N never reached stop_below in it.
				if !open[k].add && b.most < open[k].stopBelow {
					b.row.Closed |= 1 << uint(i)
				}
			}
		}
	}
}

// lane runs one replicate's year from time t on, after so many events: event by
// event while N is at or below eventsBelow, in sub-steps above.
func (f *flow) lane(b *block, i, y int, t float64, events int, streams []rate, always bool) {
	s := &b.demography[i]
	step := 1 / float64(f.substeps)
	b.most = b.n[i]
	steps := 0
	for k := 0; t < 1; {
		n := b.n[i]
		if n > b.program.stopAbove { // it comes so from a stocking or from events of all lanes
			b.outgrow(i)
			return
		}
		b.most = max(b.most, n)
		until := 1.0
		single := n <= f.eventsBelow
		if !single && f.adaptive && len(streams) > 0 && f.nearGuard(b, i, streams, step) {
			// A take or an addition opens or closes near here: a sub-step's worth
			// of events, one by one, finds the very event at which it does.
			single, until = true, math.Min(1, t+step)
		}
		if single {
			var ok bool
			t, ok = f.events(b, i, t, until, streams, always, &events)
			if !ok {
				b.fail(i, y, f.tooManyEvents(always))
				return
			}
			if b.isOutgrown(i) {
				return
			}
			continue
		}
		// The next point of the year's own grid, so that a lane that comes from
		// events meets it again.
		k = int(t/step) + 1
		dt := min(float64(k)*step, 1) - t
		if dt < 1e-12 {
			dt = min(float64(k+1)*step, 1) - t
		}
		if f.adaptive {
			if r := f.m.BirthAt(b.birth[i], float64(n)) + f.m.DeathAt(b.death[i], float64(n)); r*dt > 0.1 {
				dt = max(0.1/r, 1e-7)
			}
			// Streams move N by at most a hundredth of it in a sub-step.
			most := float64(0.01*float64(n)) + 1
			if moved := streamed(streams, n); moved*dt > most {
				dt = max(most/moved, 1e-7)
			}
		}
		if steps++; steps > maxSubsteps {
			b.fail(i, y, tooManySubsteps)
			return
		}
		if len(streams) == 0 {
			f.jump(b, i, s, dt)
		} else {
			f.jump(b, i, s, dt/2)
			if b.n[i] <= b.program.stopAbove { // nothing is taken from what has outgrown
				f.flowStreams(b, i, streams, dt)
				f.jump(b, i, s, dt/2)
			}
		}
		if b.n[i] > b.program.stopAbove {
			b.outgrow(i)
			return
		}
		t += dt
		if t > 1-1e-12 {
			return
		}
	}
}

// streamed is how many animals the streams that run at n move a year.
func streamed(streams []rate, n int64) float64 {
	sum := 0.0
	for k := range streams {
		sum += streams[k].at(n)
	}
	return sum
}

// nearMost is the number of events a year up to which a lane near a guard is
// taken event by event; beyond it a guard is kept to a hundredth of N.
const nearMost = 50000

// nearGuard says whether N may pass a level at which a stream opens or closes
// within a sub-step: if the level is nearer than the sub-step's drift and six
// standard deviations of its events.
func (f *flow) nearGuard(b *block, i int, streams []rate, step float64) bool {
	n := b.n[i]
	birth, death := f.total(b, i, n)
	events := birth + death
	for k := range streams {
		events += streams[k].perYear + float64(streams[k].perHead*float64(n))
	}
	if events > nearMost {
		return false
	}
	reach := float64((math.Abs(birth-death)+streamed(streams, n))*step) + float64(6*math.Sqrt(events*step)) + 1
	for k := range streams {
		st := &streams[k]
		for _, guard := range [...]float64{float64(st.stopBelow), float64(st.leave), st.onlyBelow} {
			if guard > 0 && math.Abs(float64(n)-guard) <= reach {
				return true
			}
		}
	}
	return false
}

// jump draws the exact linear birth-death transition over tau with rates per
// head frozen at the mean path's midpoint (Kendall 1948, Ann. Math. Statist.
// 19:1, in the form without a singularity at b = d): with x = (b-d) tau and
// g = tau (e^x - 1)/x each head survives, with its offspring, with probability
// 1 - alpha, alpha = d g/(1 + b g), and then leaves a geometric number more
// with parameter beta = b g/(1 + b g).
func (f *flow) jump(b *block, i int, s *rng.Stream, tau float64) {
	n := b.n[i]
	if n == 0 {
		return
	}
	at := float64(n)
	if f.m.BirthCrowding.Form != rates.None || f.m.Scarcity.Form != rates.Plenty || f.m.DeathCrowding.Form != rates.None {
		growth := f.m.BirthAt(b.birth[i], at) - f.m.DeathAt(b.death[i], at)
		at *= 1 + max(-0.5, min(0.5, growth*tau/2))
	}
	birth, death := f.m.BirthAt(b.birth[i], at), f.m.DeathAt(b.death[i], at)
	x := (birth - death) * tau
	if x > 30 || float64(float64(n)*outgrowing(x)) > float64(b.program.stopAbove) && float64(float64(n)*portable.Exp(x)) > float64(b.program.stopAbove) {
		b.n[i] = math.MaxInt64 / 2 // its mean has outgrown: model, auto sub-steps
		return
	}
	g := tau
	if math.Abs(x) > 1e-8 {
		g = tau * portable.Expm1(x) / x
	}
	bg := float64(birth * g)
	survivors := rng.Binomial(s, n, 1-min(1, death*g/(1+bg)))
	b.n[i] = survivors
	if bg > 0 {
		b.n[i] += rng.BirthGeometrics(s, survivors, bg/(1+bg))
	}
}

// outgrowing is at least exp(x) for x up to 30, and quickly had.
func outgrowing(x float64) float64 {
	if x < 1 {
		return math.E
	}
	return 2e13
}

// flowStreams lets the streams act for tau at once, counted exactly.
func (f *flow) flowStreams(b *block, i int, streams []rate, tau float64) {
	for k := range streams {
		st := &streams[k]
		n := b.n[i]
		if !st.runs(n) {
			continue
		}
		if st.add {
			added := rng.Poisson(&b.stocking[i], st.perYear*tau)
			if float64(n+added) > st.onlyBelow { // it stops with the addition that reaches only_below
				added = int64(math.Ceil(st.onlyBelow)) - n
			}
			b.n[i] += added
			b.row.Stocked[i] += added
			continue
		}
		intended := int64(0)
		if st.perYear > 0 {
			intended = rng.Poisson(&b.taking[i], math.Min(st.perYear*tau, most))
		}
		if st.perHead > 0 {
			intended += rng.Binomial(&b.taking[i], n, -portable.Expm1(-st.perHead*tau))
		}
		if st.extra {
			removed := min(intended, n)
			b.n[i] -= removed
			b.row.Extra[i] += removed
			continue
		}
		if st.stopBelow > st.leave {
			// It stops with the removal that goes below stop_below: what would
			// have followed is closed and no shortfall.
			intended = min(intended, n-st.stopBelow+1)
		}
		made := min(intended, max(0, n-st.leave))
		b.n[i] -= made
		b.row.Take[i] += made
		b.row.Shortfall[i] += intended - made
	}
}
