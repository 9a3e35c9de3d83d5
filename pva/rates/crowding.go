package rates

import (
	"math"

	"ebbline/pva"
	"ebbline/rng/portable"
)

// Form is how a rate changes with the population.
type Form uint8

// The forms of crowding; the last two are for births only.
const (
	None Form = iota
	Linear
	Theta
	Ricker
	Hyperbolic
)

// Crowding is the factor on a rate at population n; L is its scale in counting units.
type Crowding struct {
	Form     Form
	L        float64
	Exponent float64
}

func newCrowding(c pva.Crowding) Crowding {
	form := map[string]Form{"none": None, "linear": Linear, "theta": Theta, "ricker": Ricker, "hyperbolic": Hyperbolic}[c.Form]
	return Crowding{Form: form, L: c.Scale.Value, Exponent: c.Exponent.Or(1)}
}

// Births is the factor on births per head: 1; 1 - n/L (Verhulst 1838);
// 1 - (n/L)^exponent (Gilpin & Ayala 1973), both not below 0; exp(-n/L)
// (Ricker 1954); 1/(1 + n/L) (Beverton & Holt 1957).
func (c Crowding) Births(n float64) float64 {
	if c.Form == Linear { // the usual one, in line with its caller
		return max(0, 1-n/c.L)
	}
	return c.otherBirths(n)
}

func (c Crowding) otherBirths(n float64) float64 {
	switch c.Form {
	case Theta:
		return max(0, 1-portable.Pow(n/c.L, c.Exponent))
	case Ricker:
		return portable.Exp(-n / c.L)
	case Hyperbolic:
		return 1 / (1 + n/c.L)
	}
	return 1
}

// Deaths is the factor on deaths per head: 1; 1 + n/L; 1 + (n/L)^exponent.
func (c Crowding) Deaths(n float64) float64 {
	if c.Form == None {
		return 1
	}
	return c.crowdedDeaths(n)
}

func (c Crowding) crowdedDeaths(n float64) float64 {
	switch c.Form {
	case Linear:
		return 1 + n/c.L
	case Theta:
		return min(1+portable.Pow(n/c.L, c.Exponent), beyond)
	}
	return 1
}

// beyond is a factor on a rate beyond any that means something. What may pass all
// bounds is cut to it, so that no rate is infinite, and none times 0 no number.
const beyond = 1e100

// scaleForBirths is the L at which the birth factor at n is f, or 0 if there is none.
func (c Crowding) scaleForBirths(n, f float64) float64 {
	if !(f < 1) || f < 0 {
		return 0
	}
	switch c.Form {
	case Linear:
		return n / (1 - f)
	case Theta:
		return n / portable.Pow(1-f, 1/c.Exponent)
	case Ricker:
		if f > 0 {
			return n / -portable.Log(f)
		}
	case Hyperbolic:
		if f > 0 {
			return n * f / (1 - f)
		}
	}
	return 0
}

// scaleForDeaths is the L at which the death factor at n is f, or 0 if there is none.
func (c Crowding) scaleForDeaths(n, f float64) float64 {
	if !(f > 1) || math.IsInf(f, 1) {
		return 0
	}
	switch c.Form {
	case Linear:
		return n / (f - 1)
	case Theta:
		return n / portable.Pow(f-1, 1/c.Exponent)
	}
	return 0
}

// Scarcity is the Allee effect in births (Allee 1931): the factor on births
// per head at population n.
type Scarcity struct {
	Form ScarcityForm
	A    float64
}

// ScarcityForm is how births fall in a small population.
type ScarcityForm uint8

// The forms of scarcity: no effect, n/A, n/(A+n).
const (
	Plenty ScarcityForm = iota
	Proportional
	Saturating
)

func newScarcity(s pva.Scarcity) Scarcity {
	switch s.Form {
	case "proportional":
		return Scarcity{Proportional, s.At.Value}
	case "saturating":
		return Scarcity{Saturating, s.HalfAt.Value}
	}
	return Scarcity{}
}

// Factor is 1, n/A or n/(A+n).
func (s Scarcity) Factor(n float64) float64 {
	if s.Form == Plenty {
		return 1
	}
	return s.scarce(n)
}

func (s Scarcity) scarce(n float64) float64 {
	switch s.Form {
	case Proportional:
		return n / s.A
	case Saturating:
		return n / (s.A + n)
	}
	return 1
}
