package exact

import (
	"context"
	"math"

	"gonum.org/v1/gonum/floats"
)

func addTo(dst []float64, w float64, src []float64) { floats.AddScaled(dst, w, src) }

// The births and deaths of a year, by what the weather lets be averaged:
//
//   - pulse, births after deaths, weather of both independent: the survivors'
//     kernel averaged over the deaths' weather, then the births' kernel averaged
//     over the births' weather;
//   - pulse, correlated: a pair of these for each point of the deaths' weather,
//     births averaged over what is left of theirs;
//   - pulse, all breed: one kernel, the sum of survivors and young from the same N;
//   - flow: the exponential of the generator, point by point;
//   - memory: each point of the weather's grid has a law and a map of its own.

func (r *run) announceYear(y int, f float64) {
	b, d := r.yearKeys(y, f)
	switch {
	case r.c.Births.Breeding == "flow":
		r.flows.need(b + "|" + d + "|" + streams(r.m, y))
	case r.c.Births.Parents == "all":
		r.whole.need(b + "|" + d)
	default:
		r.lives.need(d)
		r.young.need(b)
	}
}

func (r *run) yearKeys(y int, f float64) (births, deaths string) {
	return keyOf(r.m.BirthCalendar[y-1] * f), keyOf(r.m.DeathCalendar[y-1])
}

// live carries b through births and deaths of year y, births multiplied by f,
// and adds the result to out.
func (r *run) live(ctx context.Context, y int, f float64, out, b batch, over []float64) {
	births, deaths := r.yearKeys(y, f)
	birthFactor, deathFactor := r.m.BirthCalendar[y-1]*f, r.m.DeathCalendar[y-1]
	kernels := func(again bool, laws []law) []*kernel {
		ks := make([]*kernel, len(laws))
		for i, l := range laws {
			ks[i] = newKernel(r.top, again && r.keep, l)
		}
		return ks
	}
	var maps []yearMap
	switch {
	case r.c.Births.Breeding == "flow":
		parts := r.flows.get(births+"|"+deaths+"|"+streams(r.m, y), func(again bool) []*flowPart {
			return r.flowYear(y, birthFactor, deathFactor, again)
		})
		if r.between == nil {
			flowAverage{parts}.apply(ctx, out, b, 1, over)
			return
		}
		for _, p := range parts {
			maps = append(maps, p)
		}
	case r.c.Births.Parents == "all":
		for _, k := range r.whole.get(births+"|"+deaths, func(again bool) []*kernel {
			return kernels(again, r.wholeLaws(birthFactor, deathFactor))
		}) {
			maps = append(maps, k)
		}
	default:
		lives := r.lives.get(deaths, func(again bool) []*kernel { return kernels(again, r.lifeLaws(deathFactor)) })
		young := r.young.get(births, func(again bool) []*kernel {
			laws := r.youngLaws(birthFactor)
			for i, l := range laws {
				laws[i] = grownLaw(l)
			}
			return kernels(again, laws)
		})
		for i, k := range young {
			maps = append(maps, chain{lives[i*len(lives)/len(young)], k})
		}
	}
	switch {
	case r.between != nil:
		for p, m := range maps {
			from, to := perPoint*p, perPoint*(p+1)
			m.apply(ctx, out[from:to], b[from:to], 1, over[from:to])
		}
	case len(maps) == 1:
		maps[0].apply(ctx, out, b, 1, over)
	default:
		average{r.split.outer.weight, maps}.apply(ctx, out, b, 1, over)
	}
}

// lifeLaws are the laws of the survivors: one averaged over the weather if
// births and deaths are apart, else one for each outer point.
func (r *run) lifeLaws(factor float64) []law {
	laws := make([]law, len(r.split.outer.at))
	for i, e := range r.split.outer.at {
		laws[i] = survivorLaw(r.m, r.m.Death.Draw(e)*factor)
	}
	if r.between == nil && r.climate.apart() {
		return []law{mixture(r.split.outer.weight, laws)}
	}
	return laws
}

// youngLaws are the laws of the young: with memory one for each point; else
// averaged over what the outer point leaves open.
func (r *run) youngLaws(factor float64) []law {
	var out []law
	for _, rule := range r.split.inner {
		laws := make([]law, len(rule.at))
		for j, e := range rule.at {
			laws[j] = youngLaw(r.m, r.m.Birth.Draw(e)*factor)
		}
		if r.between != nil {
			out = append(out, laws...)
			continue
		}
		out = append(out, mixture(rule.weight, laws))
		if r.climate.apart() {
			return out
		}
	}
	return out
}

// wholeLaws are the laws of the next N where all breed: with memory one for
// each point, else one average.
func (r *run) wholeLaws(birthFactor, deathFactor float64) []law {
	lives, young := r.lifeLaws(deathFactor), r.youngLaws(birthFactor)
	laws := make([]law, len(young))
	for i, l := range young {
		laws[i] = sumLaw(lives[i*len(lives)/len(young)], l)
	}
	if r.between != nil || len(laws) == 1 {
		return laws
	}
	return []law{mixture(r.split.outer.weight, laws)}
}

// flowYear are the generators of a flow year, one for each point of the weather.
func (r *run) flowYear(y int, birthFactor, deathFactor float64, again bool) []*flowPart {
	points := r.split.points()
	if r.between == nil {
		points = prune(points, leastWeight)
	}
	parts := make([]*flowPart, len(points))
	for i, p := range points {
		b, d := r.m.Birth.Draw(p.births)*birthFactor, r.m.Death.Draw(p.deaths)*deathFactor
		parts[i] = &flowPart{weight: p.weight, always: r.always, bound: looser(r.bound, p.weight), uses: 2, generator: func(watched bool) birthDeath {
			return generator(r.m, y, b, d, r.top, watched)
		}}
		if again {
			parts[i].uses *= 10
		}
	}
	return parts
}

// looser is the bound on a step of the exponential for a point of a weight: the
// error grows about tenfold in 2 to 3 units of the bound, and counts by the weight.
func looser(bound, weight float64) float64 {
	return bound + math.Min(8, -2*math.Log10(math.Min(1, math.Max(weight, 1e-9))))
}

// leastWeight is the weight below which a point of a grid of two axes is left out.
const leastWeight = 1e-11
