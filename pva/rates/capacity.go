package rates

import (
	"fmt"
	"math"

	"ebbline/pva"
	"ebbline/rng/portable"
)

// solveCapacity turns each capacity into the scale L of its form, so that
// growth is zero at the capacity with all crowding and scarcity in force there
// and every other part (weather, calendar, catastrophes) at 1. Growth is zero
// where b = d (flow), where (1-m)(1+f(S)) = 1 with S = (1-m) K (pulse, the
// survivors breed), where f(K) = m (pulse, all breed).
func (m *Model) solveCapacity() []pva.Fault {
	b, d := m.Case.Births.Crowding, m.Case.Deaths.Crowding
	onBirths := b.Form != "none" && b.Capacity.Set
	onDeaths := d.Form != "none" && d.Capacity.Set
	switch {
	case onBirths && onDeaths:
		if b.Capacity.Value != d.Capacity.Value {
			return []pva.Fault{{Key: "deaths.crowding.capacity", Path: "deaths.crowding.capacity", Value: fmt.Sprint(d.Capacity.Value),
				Want: fmt.Sprintf("differs from births.crowding.capacity (%v)", b.Capacity.Value), Fix: "a population has one carrying capacity: give both sides the same"}}
		}
		return m.solveBoth(b.Capacity.Value)
	case onBirths:
		return m.solveBirths(b.Capacity.Value)
	case onDeaths:
		return m.solveDeaths(d.Capacity.Value)
	}
	return nil
}

func capacityFault(side string, k float64, why, fix string) []pva.Fault {
	path := side + ".crowding.capacity"
	return []pva.Fault{{Key: path, Path: path, Value: fmt.Sprint(k), Want: "cannot be reached: " + why, Fix: fix}}
}

// breeders is the population whose size sets births in a year that begins at n
// with death rate d, and the births per head that make growth zero.
func (m *Model) breeders(n, d float64) (at, needed float64) {
	if m.Case.Births.Breeding == "flow" {
		return n, d
	}
	if m.Case.Births.Parents == "all" {
		return n, -portable.Expm1(-d)
	}
	return n * portable.Exp(-d), portable.Expm1(d)
}

func (m *Model) solveBirths(k float64) []pva.Fault {
	d := m.Death.Mean() * m.DeathCrowding.Deaths(k)
	return m.fitBirths("births", k, d)
}

// fitBirths sets the scale of births so that they balance a death rate d at k.
func (m *Model) fitBirths(side string, k, d float64) []pva.Fault {
	at, needed := m.breeders(k, d)
	full := m.Birth.Mean * m.Scarcity.Factor(at)
	form := m.Case.Births.Crowding.Form
	switch {
	case math.IsInf(needed, 1):
		return capacityFault(side, k, "all animals die within the year, and only survivors breed", "lower the deaths, or choose parents = \"all\"")
	case full <= needed:
		return capacityFault(side, k, fmt.Sprintf("births at that population are %.4g per head without crowding, and %.4g are needed to balance deaths", full, needed), "raise births, lower deaths, or choose a capacity on the deaths' side only if births exceed deaths")
	}
	l := m.BirthCrowding.scaleForBirths(at, needed/full)
	if l == 0 {
		return capacityFault(side, k, fmt.Sprintf("there are no deaths to balance, and births of the form %q never reach 0", form), "choose the linear or theta form, or give deaths")
	}
	m.BirthCrowding.L = l
	return nil
}

func (m *Model) solveDeaths(k float64) []pva.Fault {
	base := m.Death.Mean()
	if base == 0 {
		return capacityFault("deaths", k, "the death rate is 0, which crowding only multiplies", "give a death rate above 0, or put the capacity on births")
	}
	d, ok := m.balancingDeaths(k, base)
	if !ok {
		return capacityFault("deaths", k, fmt.Sprintf("births at that population do not exceed deaths of %.4g per head", base), "raise births or lower deaths")
	}
	l := m.DeathCrowding.scaleForDeaths(k, d/base)
	if l == 0 {
		return capacityFault("deaths", k, "births do not exceed deaths there", "raise births or lower deaths")
	}
	m.DeathCrowding.L = l
	return nil
}

// balancingDeaths is the death rate at which births at k balance deaths.
func (m *Model) balancingDeaths(k, base float64) (float64, bool) {
	if m.Case.Births.Breeding == "flow" {
		d := m.BirthAt(m.Birth.Mean, k)
		return d, d > base
	}
	if m.Case.Births.Parents == "all" {
		f := m.BirthAt(m.Birth.Mean, k)
		if f >= 1 {
			return 0, false
		}
		d := -portable.Log1p(-f)
		return d, d > base
	}
	// Survivors breed: births depend on how many survive, so the balance
	// d = ln(1 + f(S)), S = exp(-d) k, is sought upwards from the base rate.
	gap := func(d float64) float64 {
		return portable.Log1p(m.BirthAt(m.Birth.Mean, k*portable.Exp(-d))) - d
	}
	if gap(base) <= 0 {
		return 0, false
	}
	lo, hi := base, base
	for gap(hi) > 0 {
		lo, hi = hi, float64(hi*1.05)+1e-3
		if hi > 700 {
			return 0, false
		}
	}
	for i := 0; i < 200 && hi-lo > 1e-15*hi; i++ {
		if mid := (lo + hi) / 2; gap(mid) > 0 {
			lo = mid
		} else {
			hi = mid
		}
	}
	return (lo + hi) / 2, true
}

// solveBoth lets births and deaths each close half of the gap at capacity k.
// With b0 and d0 the rates there without crowding: flow, both are (b0+d0)/2;
// pulse with survivors breeding, the death rate is (d0 + ln(1+b0))/2; pulse
// with all breeding, births and the death fraction are both (b0+m0)/2.
func (m *Model) solveBoth(k float64) []pva.Fault {
	b0 := float64(m.Birth.Mean * m.Scarcity.Factor(k))
	d0 := m.Death.Mean()
	if d0 == 0 {
		return capacityFault("deaths", k, "the death rate is 0, which crowding only multiplies", "give a death rate above 0, or put the capacity on births alone")
	}
	var d float64
	switch {
	case m.Case.Births.Breeding == "flow":
		d = (b0 + d0) / 2
	case m.Case.Births.Parents == "all":
		half := (b0 - portable.Expm1(-d0)) / 2
		if half >= 1 {
			return capacityFault("deaths", k, "half-way between births and deaths more than all animals would die", "put the capacity on births alone")
		}
		d = -portable.Log1p(-half)
	default:
		d = (d0 + portable.Log1p(b0)) / 2
	}
	l := m.DeathCrowding.scaleForDeaths(k, d/d0)
	if l == 0 {
		return capacityFault("deaths", k, fmt.Sprintf("births at that population (%.4g per head) do not exceed deaths (%.4g)", b0, d0), "raise births or lower deaths")
	}
	m.DeathCrowding.L = l
	return m.fitBirths("births", k, d)
}
