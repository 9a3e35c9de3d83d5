package plain

import (
	"math"

	"ebbline/pva"
)

// event is something that may happen.
type event struct {
	rate   float64 // events a year
	change int64   // of N
	count  *int64  // where it is counted, if anywhere
}

// flow is a year of births, deaths and streams, event by event: the next comes
// after an exponential time at the sum of all rates, and is one of them in
// proportion to its rate.
func (r *replicate) flow() {
	open := make([]bool, len(r.c.Harvest))
	var events []event
	for t := 0.0; !r.passed(); {
		events = r.possible(events[:0], open)
		total := 0.0
		for _, e := range events {
			total += e.rate
		}
		if total == 0 {
			break
		}
		if t += exponential(r.src) / total; t >= 1 {
			break
		}
		e := pick(events, total*uniform(r.src))
		r.n += e.change
		if e.count != nil {
			*e.count++
		}
		r.look()
	}
	r.closeStreams(open)
}

// pick is the event in whose stretch of the rates, laid end to end, x lies.
func pick(events []event, x float64) event {
	for _, e := range events {
		if x -= e.rate; x < 0 {
			return e
		}
	}
	// Rounding may leave x a hair past the end: the last event that can happen.
	for i := len(events) - 1; ; i-- {
		if events[i].rate > 0 {
			return events[i]
		}
	}
}

// possible appends what may happen at the present N. A take stream that is not
// shut by stop_below is marked in open.
func (r *replicate) possible(list []event, open []bool) []event {
	n, year := float64(r.n), r.y-1
	list = append(list, event{r.births(n) * n, +1, nil}, event{r.deaths(n) * n, -1, nil})
	for j, h := range r.c.Harvest {
		if h.When != "through" || !scheduled(r.c, h.Schedule, r.y) || n < h.StopBelow {
			continue
		}
		open[j] = true
		rate := h.Share * r.stream(h)
		if above(r.n, h.Leave) == 0 {
			// The removal is meant and finds none to take.
			list = append(list, event{rate, 0, &r.path.Shortfall[year]})
			continue
		}
		list = append(list, event{rate, -1, &r.path.Take[year]}, event{h.ExtraDeaths * rate, -1, &r.path.Extra[year]})
	}
	for _, s := range r.c.Stocking {
		if s.When == "through" && scheduled(r.c, s.Schedule, r.y) && (!s.OnlyBelow.Set || n < s.OnlyBelow.Value) {
			list = append(list, event{s.Add, +1, &r.path.Stocked[year]})
		}
	}
	return list
}

// stream is the rate of a take through the year at the present N, before its share.
func (r *replicate) stream(h pva.Harvest) float64 {
	switch {
	case h.Rule == "constant":
		return h.Take.Value
	case h.Rule == "by_year":
		return byYear(r.c, h, r.y)
	case h.Rate.Set:
		return h.Rate.Value * float64(r.n)
	}
	return -math.Log1p(-h.Fraction.Value) * float64(r.n)
}

// closeStreams records a year in which a scheduled stream was shut all through.
func (r *replicate) closeStreams(open []bool) {
	for j, h := range r.c.Harvest {
		if h.When == "through" && scheduled(r.c, h.Schedule, r.y) && !open[j] {
			r.path.Closed[r.y-1] = true
		}
	}
}
