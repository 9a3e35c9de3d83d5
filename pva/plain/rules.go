package plain

import (
	"math"

	"ebbline/pva"
)

// rules lets every harvest and then every stocking of that time of the year act,
// in the order of the file.
func (r *replicate) rules(when string) {
	for i, h := range r.c.Harvest {
		if h.When == when {
			r.harvest(i, h)
			r.look()
		}
	}
	for _, s := range r.c.Stocking {
		if s.When == when && scheduled(r.c, s.Schedule, r.y) && (!s.OnlyBelow.Set || float64(r.n) < s.OnlyBelow.Value) {
			added := round(s.Add, r.src)
			if s.Noise == "poisson" {
				added = poisson(s.Add, r.src)
			}
			r.n += added
			r.path.Stocked[r.y-1] += added
			r.look()
		}
	}
}

// harvest is one take rule in one year.
func (r *replicate) harvest(i int, h pva.Harvest) {
	seen := r.see(i, h)
	if !scheduled(r.c, h.Schedule, r.y) {
		return
	}
	year := r.y - 1
	if seen < h.StopBelow {
		r.path.Closed[year] = true
		return
	}
	intended := r.intended(h, seen)
	made := min(intended, above(r.n, h.Leave))
	r.n -= made
	extra := min(r.n, round(h.ExtraDeaths*float64(made), r.src))
	r.n -= extra
	r.path.Take[year] += made
	r.path.Shortfall[year] += intended - made
	r.path.Extra[year] += extra
}

// above is how many of n may go so that at least leave stay.
func above(n int64, leave float64) int64 {
	return max(0, whole(float64(n)-leave))
}

// see is the abundance that the rule acts on: N, or the last survey of it. A
// survey is made in the first scheduled year and every survey_every years after,
// whether or not that year has a take.
func (r *replicate) see(i int, h pva.Harvest) float64 {
	first := firstScheduled(r.c, h.Schedule)
	if first > 0 && r.y >= first && (r.y-first)%max(1, h.SurveyEvery) == 0 {
		r.survey[i] = float64(r.n)
		if h.SurveyCV > 0 {
			r.survey[i] = logNormal(float64(r.n), h.SurveyCV*float64(r.n), normal(r.src))
		}
	}
	return r.survey[i]
}

// intended is the take meant: the target with its share and its error, rounded.
func (r *replicate) intended(h pva.Harvest, seen float64) int64 {
	target := h.Share * target(r.c, h, r.y, seen)
	switch {
	case h.TakeCV > 0:
		return round(logNormal(target, h.TakeCV*target, normal(r.src)), r.src)
	case h.TakeNoise == "poisson":
		return poisson(target, r.src)
	case h.TakeNoise == "each-animal":
		return binomial(r.n, h.Share*h.Fraction.Value, r.src)
	}
	return round(target, r.src)
}

// target is what the rule says for what is seen.
func target(c *pva.Case, h pva.Harvest, y int, seen float64) float64 {
	switch h.Rule {
	case "constant":
		return h.Take.Value
	case "fraction":
		return h.Fraction.Value * seen
	case "above":
		return h.Fraction.Or(1) * math.Max(0, seen-h.Spare.Value)
	case "ladder":
		return ladder(h.Points, seen)
	case "by_year":
		return byYear(c, h, y)
	}
	panic("plain: unknown harvest rule " + h.Rule)
}

// byYear is the number for year y, counted in years from the first scheduled one.
func byYear(c *pva.Case, h pva.Harvest, y int) float64 {
	begins := firstScheduled(c, h.Schedule)
	if !h.Years.OpenFrom { // the list began with the span, perhaps before year 1
		begins = h.Years.From - c.Label(1) + 1
	}
	return h.Takes[min(y-begins, len(h.Takes)-1)]
}

// ladder is piecewise linear through the points and flat outside them.
func ladder(points [][2]float64, x float64) float64 {
	last := points[len(points)-1]
	switch {
	case x <= points[0][0]:
		return points[0][1]
	case x >= last[0]:
		return last[1]
	}
	for i := 1; ; i++ {
		if a, b := points[i-1], points[i]; x < b[0] {
			return a[1] + (b[1]-a[1])*(x-a[0])/(b[0]-a[0])
		}
	}
}

// scheduled says whether a rule acts in model year y: the first year of its
// span, and then every k-th, counted from the span's own first year.
func scheduled(c *pva.Case, s pva.Schedule, y int) bool {
	d, from := date(c, y), date(c, 1)
	if !s.Years.OpenFrom {
		from = s.Years.From
	}
	if d < from || !s.Years.OpenTo && d > s.Years.To {
		return false
	}
	return (d-from)%max(1, s.OneYearIn) == 0
}

// firstScheduled is the first model year in which the rule acts, 0 if none.
func firstScheduled(c *pva.Case, s pva.Schedule) int {
	for y := 1; y <= c.Question.Horizon; y++ {
		if scheduled(c, s, y) {
			return y
		}
	}
	return 0
}
