package year

import (
	"math"

	"ebbline/pva/rates"
	"ebbline/rng"
	"ebbline/rng/portable"
)

// pulsePasses are one mortality step, then one breeding step: model section 1.
func pulsePasses(m *rates.Model) []pass {
	var passes []pass
	all := m.Case.Births.Parents == "all"
	if all {
		passes = append(passes, func(b *block, _ int) { b.breeders = b.n })
	}
	passes = append(passes, survive(m))
	if !all {
		passes = append(passes, func(b *block, _ int) { b.breeders = b.n })
	}
	// With watch = census nothing looks at N between the two steps, so that
	// they may be separate passes.
	return append(passes, breed(m))
}

// survive draws S ~ Binomial(N, exp(-d)), the crowding of deaths seen at N.
func survive(m *rates.Model) pass {
	if survivalDrawn(m) {
		return func(b *block, _ int) {
			for i := 0; i < b.lanes; i++ {
				b.n[i] = rng.Binomial(&b.demography[i], b.n[i], b.survival[i])
			}
		}
	}
	if m.DeathCrowding.Form == rates.None {
		return func(b *block, _ int) {
			for i := 0; i < b.lanes; i++ {
				b.n[i] = rng.Binomial(&b.demography[i], b.n[i], portable.Exp(-b.death[i]))
			}
		}
	}
	crowding := m.DeathCrowding
	return func(b *block, _ int) {
		for i := 0; i < b.lanes; i++ {
			d := b.death[i] * crowding.Deaths(float64(b.n[i]))
			b.n[i] = rng.Binomial(&b.demography[i], b.n[i], portable.Exp(-d))
		}
	}
}

// breed adds the young of the breeders, of the case's offspring law, with
// crowding and scarcity seen at the number of breeders.
func breed(m *rates.Model) pass {
	crowded := m.BirthCrowding.Form != rates.None || m.Scarcity.Form != rates.Plenty
	atMostOne, clumped := m.Case.Births.Offspring == "at-most-one", m.Case.Births.Offspring == "clumped"
	clumping := m.Case.Births.Clumping.Value
	return func(b *block, _ int) {
		for i := 0; i < b.lanes; i++ {
			parents := b.breeders[i]
			if parents == 0 {
				continue
			}
			f := b.birth[i]
			if crowded {
				f = m.BirthAt(f, float64(parents))
			}
			mean := f * float64(parents)
			if mean > most {
				b.n[i] = math.MaxInt64 / 2 // surely outgrown: no draw needed
				continue
			}
			switch {
			case atMostOne:
				if f > 1 {
					f = 1
					b.capped++
				}
				b.n[i] += rng.Binomial(&b.demography[i], parents, f)
			case clumped:
				// A sum of S laws of size k each is one of size k S; of a size so
				// large that its variance is its mean, it is Poisson.
				if size := clumping * float64(parents); size <= 1e12 && mean <= 1e12 {
					b.n[i] += rng.NegativeBinomial(&b.demography[i], mean, size)
				} else {
					b.n[i] += rng.Poisson(&b.demography[i], mean)
				}
			default:
				b.n[i] += rng.Poisson(&b.demography[i], mean)
			}
		}
	}
}
