package plain

import (
	"fmt"
	"math"

	"ebbline/pva"
)

// scales are the L of both crowding forms.
type scales struct{ births, deaths float64 }

// solveScales is the given scales, with those solved that are given as a
// carrying capacity: growth is zero there, with crowding and scarcity in force
// and every other part at 1.
func solveScales(c *pva.Case) (scales, error) {
	b, d := c.Births.Crowding, c.Deaths.Crowding
	s := scales{b.Scale.Value, d.Scale.Value}
	var err error
	switch {
	case b.Capacity.Set && d.Capacity.Set:
		if b.Capacity.Value != d.Capacity.Value {
			return s, fmt.Errorf("plain: capacity: %v for births and %v for deaths: give the same number", b.Capacity.Value, d.Capacity.Value)
		}
		dk := halfway(c, b.Capacity.Value)
		if s.births, err = birthsScale(c, b.Capacity.Value, dk); err == nil {
			s.deaths, err = deathsScale(c, b.Capacity.Value, dk)
		}
	case b.Capacity.Set:
		k := b.Capacity.Value
		s.births, err = birthsScale(c, k, meanDeaths(c)*crowdDeaths(d, k, s.deaths))
	case d.Capacity.Set:
		var dk float64
		if dk, err = balancingDeaths(c, d.Capacity.Value, s.births); err == nil {
			s.deaths, err = deathsScale(c, d.Capacity.Value, dk)
		}
	}
	return s, err
}

// halfway is the death rate at k when each side closes half the gap.
func halfway(c *pva.Case, k float64) float64 {
	b0, d0 := meanBirths(c)*scarcity(c.Births.Scarcity, k), meanDeaths(c)
	if c.Births.Breeding == "flow" {
		return (b0 + d0) / 2
	}
	if c.Births.Parents == "all" { // births and the death fraction meet half-way
		return -math.Log1p(-(b0 - math.Expm1(-d0)) / 2)
	}
	return (d0 + math.Log1p(b0)) / 2
}

// breeders is the number that breeds and the births a head they need, for zero
// growth at k under the death rate dk.
func breeders(c *pva.Case, k, dk float64) (n, needed float64) {
	switch {
	case c.Births.Breeding == "flow":
		return k, dk
	case c.Births.Parents == "all":
		return k, -math.Expm1(-dk)
	default:
		return k * math.Exp(-dk), math.Expm1(dk)
	}
}

// birthsScale is the L of births that gives zero growth at k under the death rate dk.
func birthsScale(c *pva.Case, k, dk float64) (float64, error) {
	n, needed := breeders(c, k, dk)
	cr := c.Births.Crowding
	factor := needed / (meanBirths(c) * scarcity(c.Births.Scarcity, n))
	switch {
	case cr.Form == "none":
		return 0, fmt.Errorf("plain: births.crowding.capacity: form none has no capacity: choose a form")
	case !(factor < 1):
		return 0, fmt.Errorf("plain: births.crowding.capacity: births do not exceed deaths at %v: raise births or lower deaths", k)
	case factor == 0 && (cr.Form == "ricker" || cr.Form == "hyperbolic"):
		return 0, fmt.Errorf("plain: births.crowding.capacity: without deaths form %s never reaches zero growth: choose linear", cr.Form)
	}
	return math.Exp(bisect(func(x float64) bool { return crowdBirths(cr, n, math.Exp(x)) > factor }, -690, 690)), nil
}

// deathsScale is the L of deaths that makes the death rate dk at k.
func deathsScale(c *pva.Case, k, dk float64) (float64, error) {
	cr, d0 := c.Deaths.Crowding, meanDeaths(c)
	factor := dk / d0
	switch {
	case cr.Form == "none":
		return 0, fmt.Errorf("plain: deaths.crowding.capacity: form none has no capacity: choose a form")
	case d0 == 0:
		return 0, fmt.Errorf("plain: deaths.crowding.capacity: there are no deaths to crowd: give deaths above 0")
	case !(factor > 1) || math.IsInf(factor, 1):
		return 0, fmt.Errorf("plain: deaths.crowding.capacity: births do not exceed deaths at %v: raise births or lower deaths", k)
	}
	return math.Exp(bisect(func(x float64) bool { return crowdDeaths(cr, k, math.Exp(x)) < factor }, -690, 690)), nil
}

// balancingDeaths is the death rate at k that gives zero growth with births as
// they are, their own crowding with the scale l in force.
func balancingDeaths(c *pva.Case, k, l float64) (float64, error) {
	f := func(n float64) float64 {
		return meanBirths(c) * crowdBirths(c.Births.Crowding, n, l) * scarcity(c.Births.Scarcity, n)
	}
	switch {
	case c.Births.Breeding == "flow":
		return f(k), nil
	case c.Births.Parents == "all":
		if f(k) >= 1 {
			return 0, fmt.Errorf("plain: deaths.crowding.capacity: %v births a head cannot be balanced by deaths: lower births", f(k))
		}
		return -math.Log1p(-f(k)), nil
	}
	// More deaths leave fewer parents, whose births depend on their number: step up
	// from the deaths without crowding to where growth first turns negative.
	shrinks := func(d float64) bool { return math.Log1p(f(k*math.Exp(-d))) < d }
	d := meanDeaths(c)
	if shrinks(d) {
		return d, nil // deathsScale says that births do not exceed deaths
	}
	const step = 1e-3
	for !shrinks(d+step) && d < 700 {
		d += step
	}
	return bisect(shrinks, d, d+step), nil
}

// bisect is where yes turns from false (at lo) to true (at hi).
func bisect(yes func(float64) bool, lo, hi float64) float64 {
	for range 200 {
		mid := lo + (hi-lo)/2
		if mid == lo || mid == hi {
			break
		}
		if yes(mid) {
			hi = mid
		} else {
			lo = mid
		}
	}
	return hi
}
