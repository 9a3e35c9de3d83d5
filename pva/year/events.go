package year

import (
	"math"

	"ebbline/pva/rates"
	"ebbline/rng"
)

// maxEvents is the number of events in one replicate's year beyond which the
// run stops: about a tenth of a second's work, so that a case whose births
// explode is found at once and not by patience.
const maxEvents = 10_000_000

// maxSubsteps is the same for the sub-steps that auto shortens where rates are
// high; a case may ask for half as many itself.
const maxSubsteps = 2_000_000

const tooManySubsteps = "more than 2,000,000 sub-steps in one year: rates so high cannot be followed; check births and deaths and what multiplies them, and the take and the additions through the year;"

// tooManyEvents is the fault of such a case, with its way out.
func (f *flow) tooManyEvents(always bool) string {
	const what = "more than 10,000,000 births, deaths, removals and additions in one year: "
	switch {
	case always:
		return what + "watch = \"always\" looks at every one of them; use watch = \"census\", or count in larger units;"
	case f.adaptive:
		return what + "rates so high next to a population so small cannot be followed; check the take and the additions through the year;"
	}
	return what + "set run.substeps = \"auto\" to take such years in sub-steps;"
}

// table holds what births and deaths of the whole population are at n for
// rates of 1, so that an event costs a look-up and not a formula.
type table struct{ birth, death []float64 }

const tableSize = 4096

func newTable(m *rates.Model) table {
	t := table{make([]float64, tableSize), make([]float64, tableSize)}
	for n := range t.birth {
		t.birth[n] = m.BirthAt(1, float64(n)) * float64(n)
		t.death[n] = m.DeathAt(1, float64(n)) * float64(n)
	}
	return t
}

// odds is what the next event is at n where rates never change: the mean wait
// for it in years, and the chance that it is a birth.
type odds struct{ wait, birth float64 }

// newOdds is the table of odds of a case whose rates are the same in all years
// of all replicates, nil for another.
func newOdds(m *rates.Model, t table) []odds {
	b, d := m.BirthCalendar[0], m.DeathCalendar[0]
	for y := range m.BirthCalendar {
		if m.BirthCalendar[y] != b || m.DeathCalendar[y] != d {
			return nil
		}
	}
	if m.Birth.Sigma != 0 || m.Death.Varies() {
		return nil
	}
	for _, k := range m.Case.Catastrophe {
		if k.Prob() > 0 && k.BirthsTimes != 1 {
			return nil
		}
	}
	out := make([]odds, tableSize)
	for n := range out {
		birth := float64(m.Birth.Mean * b * t.birth[n])
		sum := birth + float64(m.Death.Mean()*d*t.death[n])
		out[n] = oddsOf(birth, sum)
	}
	return out
}

// oddsOf is what the next event is where births and all events have these rates;
// where nothing can happen the wait has no end.
func oddsOf(birth, sum float64) odds {
	if sum == 0 {
		return odds{wait: math.Inf(1)}
	}
	return odds{1 / sum, birth / sum}
}

// total is births and deaths of the whole population at n in this year of lane i.
func (f *flow) total(b *block, i int, n int64) (birth, death float64) {
	if n < tableSize {
		return float64(b.birth[i] * f.table.birth[n]), float64(b.death[i] * f.table.death[n])
	}
	at := float64(n)
	return float64(f.m.BirthAt(b.birth[i], at) * at), float64(f.m.DeathAt(b.death[i], at) * at)
}

// events runs the exact continuous-time chain of lane i from time t (Gillespie
// 1977) until a time at most 1, or until N passes eventsBelow or outgrows; a lane
// that begins above eventsBelow runs to that time. It returns the
// time reached, and false if there were too many events. Each event draws an
// exponential and a uniform from the demography stream.
func (f *flow) events(b *block, i int, t, until float64, streams []rate, always bool, count *int) (float64, bool) {
	s := &b.demography[i]
	n := b.n[i]
	top := min(f.eventsBelow, b.program.stopAbove)
	if n > top {
		top = b.program.stopAbove
	}
	for {
		birth, death := f.total(b, i, n)
		sum := birth + death
		other := 0.0
		for k := range streams {
			other += streams[k].at(n)
		}
		before := t
		t += rng.Exponential(s) / (sum + other)
		if !(t < until) { // also where nothing can happen any more: a rate of 0
			t = until
		}
		for k := range streams {
			streams[k].wait(n, t-before)
		}
		if t == until {
			break
		}
		if *count++; *count > maxEvents {
			b.n[i] = n
			return t, false
		}
		u := float64(uniform(s.Uint64()) * (sum + other))
		switch {
		case u < birth:
			n++
			b.most = max(b.most, n)
		case u < sum:
			n--
		default:
			n += pick(b, i, streams, n, u-sum)
			b.most = max(b.most, n)
		}
		if always && n <= b.program.threshold {
			b.watched |= 1 << uint(i)
		}
		if n > top {
			if n > b.program.stopAbove {
				b.outgrow(i)
				for k := range streams {
					streams[k].blocked = 0
				}
				return t, true
			}
			break
		}
	}
	b.n[i] = n
	for k := range streams {
		if st := &streams[k]; st.blocked > 0 {
			b.row.Shortfall[i] += rng.Poisson(&b.taking[i], math.Min(st.blocked, most))
			st.blocked = 0
		}
	}
	return t, true
}

// wait lets a take that runs but may remove nothing run up its shortfall.
func (r *rate) wait(n int64, dt float64) {
	if !r.add && n <= r.leave && r.runs(n) {
		r.blocked += float64((r.perYear + float64(r.perHead*float64(n))) * dt)
	}
}

// uniform is a word as a uniform number on [0, 1).
func uniform(word uint64) float64 { return float64(word>>11) * 0x1p-53 }

// together is events for all lanes at once where births and deaths are the only
// events: the lanes take an event each in turn, so that the processor works on
// many at a time, and a birth or death is a selection and not a jump. An event is
// mostly made of one word. A lane whose N leaves the table goes on by itself.
func (f *flow) together(b *block, y int) {
	var t [lanesMax]float64
	var racing [lanesMax]uint8
	active := racing[:0]
	top := min(f.eventsBelow, b.program.stopAbove, tableSize-1)
	for i := 0; i < b.lanes; i++ {
		switch {
		case b.isOutgrown(i) || b.n[i] == 0:
		case b.n[i] > top:
			if f.lane(b, i, y, 0, 0, nil, false); b.err != nil {
				return
			}
		default:
			active = append(active, uint8(i))
		}
	}
	births, deaths, fixed := f.table.birth, f.table.death, f.odds
	for round := 0; len(active) > 0; round++ {
		if round > maxEvents {
			b.fail(int(active[0]), y, f.tooManyEvents(false))
			return
		}
		for k := 0; k < len(active); {
			i := active[k] & (lanesMax - 1)
			n := b.n[i]
			var o odds
			if fixed != nil {
				o = fixed[n]
			} else {
				birth := float64(b.birth[i] * births[n])
				sum := birth + float64(b.death[i]*deaths[n])
				o = oddsOf(birth, sum)
			}
			wait, born := rng.Event(&b.demography[i], o.birth)
			t[i] += float64(wait * o.wait)
			if !(t[i] < 1) { // also where nothing can happen any more
				active[k] = active[len(active)-1]
				active = active[:len(active)-1]
				continue
			}
			step := int64(-1)
			if born {
				step = 1
			}
			n += step
			b.n[i] = n
			if n > top {
				active[k] = active[len(active)-1]
				active = active[:len(active)-1]
				if f.lane(b, int(i), y, t[i], round+1, nil, false); b.err != nil {
					return
				}
				continue
			}
			k++
		}
	}
}

// at is the rate of the stream's events at n.
func (r *rate) at(n int64) float64 {
	if !r.runs(n) || !r.add && n <= r.leave {
		return 0
	}
	return r.perYear + float64(r.perHead*float64(n))
}

// pick lets the stream act that u falls on, and returns the change in N. The
// last open stream takes what rounding leaves over.
func pick(b *block, i int, streams []rate, n int64, u float64) int64 {
	last := -1
	for k := range streams {
		at := streams[k].at(n)
		if at == 0 {
			continue
		}
		last = k
		if u < at {
			break
		}
		u -= at
	}
	switch st := &streams[last]; {
	case st.add:
		b.row.Stocked[i]++
		return 1
	case st.extra:
		b.row.Extra[i]++
	default:
		b.row.Take[i]++
	}
	return -1
}
