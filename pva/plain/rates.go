package plain

import (
	"math"

	"ebbline/pva"
)

// meanBirths is the birth rate as quoted, per head a year.
func meanBirths(c *pva.Case) float64 { return c.Births.Rate / c.Births.Per }

// meanDeaths is the death rate per head a year in a year without noise; infinite
// for a fraction of 1.
func meanDeaths(c *pva.Case) float64 {
	if c.Deaths.Fraction.Set {
		return -math.Log1p(-c.Deaths.Fraction.Value)
	}
	return c.Deaths.Rate.Value / c.Deaths.Per
}

// birthRate is the year's birth rate for the weather e.
func birthRate(c *pva.Case, e float64) float64 {
	return logNormal(meanBirths(c), c.Births.YearSD/c.Births.Per, e)
}

// deathRate is the year's death rate for the weather e: log-normal for a rate,
// -ln(1 - m) of a logit-normal m for a fraction.
func deathRate(c *pva.Case, e float64) float64 {
	switch {
	case !c.Deaths.Fraction.Set:
		return logNormal(meanDeaths(c), c.Deaths.YearSD/c.Deaths.Per, e)
	case c.Deaths.YearSD == 0:
		return meanDeaths(c)
	}
	// With m = logistic(x), -ln(1 - m) = ln(1 + exp x), which loses nothing near m = 1.
	x := matchLogit(c.Deaths.Fraction.Value, c.Deaths.YearSD).at(e)
	if x > 0 {
		return x + math.Log1p(math.Exp(-x))
	}
	return math.Log1p(math.Exp(x))
}

// crowdBirths is the factor on births at n for the scale l.
func crowdBirths(cr pva.Crowding, n, l float64) float64 {
	switch cr.Form {
	case "linear":
		return math.Max(0, 1-n/l)
	case "theta":
		return math.Max(0, 1-math.Pow(n/l, cr.Exponent.Value))
	case "ricker":
		return math.Exp(-n / l)
	case "hyperbolic":
		return 1 / (1 + n/l)
	}
	return 1
}

// crowdDeaths is the factor on deaths at n for the scale l.
func crowdDeaths(cr pva.Crowding, n, l float64) float64 {
	switch cr.Form {
	case "linear":
		return 1 + n/l
	case "theta":
		return 1 + math.Pow(n/l, cr.Exponent.Value)
	}
	return 1
}

// scarcity is the Allee factor on births at n.
func scarcity(s pva.Scarcity, n float64) float64 {
	switch s.Form {
	case "proportional":
		return n / s.At.Value
	case "saturating":
		return n / (s.HalfAt.Value + n)
	}
	return 1
}

// calendar is the product of trend, steps, cycle and by_year in model year y.
func calendar(c *pva.Case, k pva.Calendar, y int) float64 {
	f := math.Pow(1+k.Trend, float64(y-1))
	step := 1.0
	for _, s := range k.Steps {
		if date(c, y) >= s.From {
			step = s.Factor
		}
	}
	f *= step
	if k.Cycle.Period > 0 {
		f *= 1 + k.Cycle.Amplitude*math.Sin(2*math.Pi*(float64(y)-k.Cycle.Phase)/k.Cycle.Period)
	}
	if len(k.ByYear) > 0 {
		f *= k.ByYear[min(y, len(k.ByYear))-1]
	}
	return f
}

// date is the date of model year y: a calendar year if the case has one.
func date(c *pva.Case, y int) int {
	if c.Start.Year.Set {
		return int(c.Start.Year.Value) + y - 1
	}
	return y
}
