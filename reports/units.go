package reports

import (
	"strings"

	"ebbline/pva"
)

// unitOf is the unit of a key in this case: counting units by what they count,
// rates by how many heads they are quoted for.
func unitOf(c *pva.Case, key *pva.Key) string {
	switch key.Path {
	case "births.rate", "births.year_sd":
		return rateUnit(c, c.Births.Per)
	case "deaths.rate":
		return rateUnit(c, c.Deaths.Per)
	case "deaths.year_sd":
		if c.Deaths.Fraction.Set {
			return "fraction a " + c.TimeUnit
		}
		return rateUnit(c, c.Deaths.Per)
	}
	unit := strings.Replace(key.Unit, "counting units", c.Counts, 1)
	if c.TimeUnit != "year" {
		unit = strings.Replace(unit, "year", c.TimeUnit, 1)
	}
	return unit
}

func rateUnit(c *pva.Case, per float64) string {
	if per == 1 {
		return "per head per " + c.TimeUnit
	}
	return "per " + Plain(per) + " heads per " + c.TimeUnit
}
