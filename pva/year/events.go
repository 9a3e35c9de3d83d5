package year

import (
	"ebbline/pva/rates"
	"ebbline/rng"
)

// maxEvents is the number of events in one replicate's year beyond which the
// run stops: about a tenth of a second's work, so that a case whose births
// explode is found at once and not by patience.
const maxEvents = 10_000_000

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

// total is births and deaths of the whole population at n in this year of lane i.
func (f *flow) total(b *block, i int, n int64) (birth, death float64) {
	if n < tableSize {
		return float64(b.birth[i] * f.table.birth[n]), float64(b.death[i] * f.table.death[n])
	}
	at := float64(n)
	return float64(f.m.BirthAt(b.birth[i], at) * at), float64(f.m.DeathAt(b.death[i], at) * at)
}

// events runs the exact continuous-time chain of lane i from time t (Gillespie
// 1977) until the year ends or N passes eventsBelow or outgrows. It returns the
// time reached, and false if there were too many events. Each event draws an
// exponential and a uniform from the demography stream.
func (f *flow) events(b *block, i int, t float64, streams []rate, always bool, count *int) (float64, bool) {
	s := &b.demography[i]
	n := b.n[i]
	top := min(f.eventsBelow, b.program.stopAbove)
	for {
		birth, death := f.total(b, i, n)
		sum := birth + death
		other := 0.0
		for k := range streams {
			other += streams[k].at(n)
		}
		if sum+other <= 0 {
			t = 1
			break
		}
		t += rng.Exponential(s) / (sum + other)
		if t >= 1 {
			t = 1
			break
		}
		if *count++; *count > maxEvents {
			b.n[i] = n
			return t, false
		}
		u := float64(s.Float64() * (sum + other))
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
				return t, true
			}
			break
		}
	}
	b.n[i] = n
	return t, true
}

// at is the stream's rate at n.
func (r *rate) at(n int64) float64 {
	if !r.runs(n) {
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
	case n <= st.leave:
		b.row.Shortfall[i]++
		return 0
	default:
		b.row.Take[i]++
	}
	return -1
}
