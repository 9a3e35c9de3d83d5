package year

import (
	"math"

	"ebbline/pva/rates"
	"ebbline/rng"
)

// weatherPasses set the year's rates per head: model section 4. Rates that do
// not vary are constants times their calendar factor.
func weatherPasses(m *rates.Model) []pass {
	var out []pass
	if m.Birth.Sigma != 0 || m.Death.Varies() {
		out = append(out, series(m))
	}
	birth, death := m.Birth, m.Death
	if birth.Sigma != 0 {
		out = append(out, func(b *block, y int) {
			f := m.BirthCalendar[y-1]
			for i := 0; i < b.lanes; i++ {
				b.birth[i] = birth.Draw(b.eBirth[i]) * f
			}
		})
	} else {
		out = append(out, func(b *block, y int) { fill(&b.birth, birth.Mean*m.BirthCalendar[y-1]) })
	}
	switch {
	case survivalDrawn(m):
		out = append(out, func(b *block, _ int) {
			for i := 0; i < b.lanes; i++ {
				b.survival[i] = death.Fraction.Survive(b.eDeath[i])
			}
		})
	case death.Varies():
		out = append(out, func(b *block, y int) {
			f := m.DeathCalendar[y-1]
			for i := 0; i < b.lanes; i++ {
				b.death[i] = times(death.Draw(b.eDeath[i]), f)
			}
		})
	default:
		out = append(out, func(b *block, y int) { fill(&b.death, times(death.Mean(), m.DeathCalendar[y-1])) })
	}
	return out
}

// survivalDrawn says whether the year's chance of survival is the drawn fraction
// itself, with nothing between that would need its rate.
func survivalDrawn(m *rates.Model) bool {
	for _, f := range m.DeathCalendar {
		if f != 1 {
			return false
		}
	}
	return m.Case.Births.Breeding == "pulse" && m.Death.IsFraction && m.DeathCrowding.Form == rates.None
}

// times is a product in which no deaths at all (factor 0) win over a death
// fraction of 1 (an infinite rate).
func times(rate, factor float64) float64 {
	if factor == 0 {
		return 0
	}
	return rate * factor
}

func fill(a *[lanesMax]float64, v float64) {
	for i := range a {
		a[i] = v
	}
}

// series advances the two normal series, e_y = memory e_(y-1) +
// sqrt(1-memory^2) u_y, begun in their stationary law: in year 1 they are the
// year's innovations themselves.
func series(m *rates.Model) pass {
	rho, memory := m.Case.Weather.Correlation, m.Case.Weather.Memory
	other := math.Sqrt(math.Max(0, 1-float64(rho*rho)))
	fresh := math.Sqrt(1 - float64(memory*memory))
	return func(b *block, y int) {
		u1, u2 := &b.shared.u1, &b.shared.u2
		if y == 1 || memory == 0 {
			for i := 0; i < b.lanes; i++ {
				b.eBirth[i] = u1[i]
				b.eDeath[i] = float64(rho*u1[i]) + float64(other*u2[i])
			}
			return
		}
		for i := 0; i < b.lanes; i++ {
			ub, ud := u1[i], float64(rho*u1[i])+float64(other*u2[i])
			b.eBirth[i] = float64(memory*b.eBirth[i]) + float64(fresh*ub)
			b.eDeath[i] = float64(memory*b.eDeath[i]) + float64(fresh*ud)
		}
	}
}

// mostBirths is a birth rate beyond all that mean something: a rate is cut to it,
// so that many catastrophes that each raise births cannot make it infinite.
const mostBirths = 1e150

// strike lets one catastrophe strike: model section 5. Each animal is killed
// on its own; several catastrophes of a year multiply their effect on births.
func strike(m *rates.Model, k int) pass {
	chance, times := m.Case.Catastrophe[k].Prob(), m.Case.Catastrophe[k].BirthsTimes
	kills := m.Kills[k]
	return func(b *block, _ int) {
		strikes, normals := &b.shared.strikes[k], &b.shared.kills[k]
		for i := 0; i < b.lanes; i++ {
			if strikes[i] >= chance {
				continue
			}
			b.birth[i] = min(b.birth[i]*times, mostBirths)
			b.n[i] = rng.Binomial(&b.demography[i], b.n[i], 1-kills.Draw(normals[i]))
		}
	}
}
