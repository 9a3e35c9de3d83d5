package year

import (
	"math"

	"ebbline/pva"
	"ebbline/pva/rates"
	"ebbline/rng"
)

// harvest is one take rule at the start or end of a year: model section 6, in
// its order. A lane draws from its taking stream only for an error of the take
// and for rounding.
func harvest(m *rates.Model, rule int) pass {
	t := &m.Takes[rule]
	h := t.Rule
	eachAnimal := math.Min(1, h.Fraction.Value*h.Share)
	leave := int64(math.Ceil(h.Leave))
	// A take that asks for a number whatever is seen, and makes no error.
	fixed := (h.Rule == "constant" || h.Rule == "by_year") && h.TakeNoise != "each-animal" && h.TakeNoise != "poisson" && t.Error.Sigma == 0
	intends := func(b *block, i, y int, seen float64) int64 { // 4 to 7: rule, share, error, rounding
		target := t.Target(y, seen)
		switch {
		case h.TakeNoise == "each-animal":
			return rng.Binomial(&b.taking[i], b.n[i], eachAnimal)
		case h.TakeNoise == "poisson":
			return rng.Poisson(&b.taking[i], math.Min(target, most))
		case t.Error.Sigma != 0:
			target *= t.Error.Factor(rng.Normal(&b.taking[i]))
		}
		return rng.Round(&b.taking[i], math.Min(target, most))
	}
	return func(b *block, y int) {
		seen := &b.seen[rule]
		if t.Surveyed[y-1] { // 2: seen
			if t.Survey.Sigma != 0 {
				normals := &b.shared.surveys[rule]
				for i := 0; i < b.lanes; i++ {
					seen[i] = float64(b.n[i]) * t.Survey.Factor(normals[i])
				}
			} else {
				for i := 0; i < b.lanes; i++ {
					seen[i] = float64(b.n[i])
				}
			}
		}
		if !t.Scheduled[y-1] { // 1: scheduled
			return
		}
		asked := 0.0
		if fixed { // the same for all lanes
			asked = min(t.Target(y, 0), most)
		}
		whole := fixed && asked == math.Trunc(asked)
		for i := 0; i < b.lanes; i++ {
			if b.isOutgrown(i) {
				continue
			}
			if seen[i] < h.StopBelow { // 3: closed
				b.row.Closed |= 1 << uint(i)
				continue
			}
			intended := int64(asked)
			if !whole {
				intended = intends(b, i, y, seen[i])
			}
			n := b.n[i]
			made := min(intended, max(0, n-leave)) // 8: made
			b.row.Take[i] += made
			b.row.Shortfall[i] += intended - made
			n -= made
			if h.ExtraDeaths > 0 { // 9: extra deaths
				extra := min(n, rng.Round(&b.taking[i], math.Min(h.ExtraDeaths*float64(made), most)))
				b.row.Extra[i] += extra
				n -= extra
			}
			b.n[i] = n
		}
	}
}

// most is a take beyond every population: a target is cut to it before it
// becomes a whole number.
const most = 4e12

// stock is one stocking rule at the start or end of a year.
func stock(m *rates.Model, s pva.Stocking) pass {
	scheduled := make([]bool, m.Case.Question.Horizon)
	for i := range scheduled {
		scheduled[i] = s.Scheduled(m.Case, i+1)
	}
	onlyBelow := s.OnlyBelow.Or(math.Inf(1))
	return func(b *block, y int) {
		if !scheduled[y-1] {
			return
		}
		for i := 0; i < b.lanes; i++ {
			if float64(b.n[i]) >= onlyBelow || b.isOutgrown(i) {
				continue
			}
			var added int64
			if s.Noise == "poisson" {
				added = rng.Poisson(&b.stocking[i], s.Add)
			} else {
				added = rng.Round(&b.stocking[i], s.Add)
			}
			b.n[i] += added
			b.row.Stocked[i] += added
		}
	}
}
