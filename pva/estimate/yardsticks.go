package estimate

import (
	"fmt"
	"math"
)

// YearRisk is the risk by the end of a year with its interval.
type YearRisk struct {
	Year                int // from 1
	Estimate, Low, High float64
}

// Standing is whether a risk reaches a yardstick's threshold.
type Standing string

// The standings: the whole interval reaches the threshold, none of it does, or
// the interval straddles it; or the risk is not known far enough ahead.
const (
	Reached    Standing = "reached"
	NotReached Standing = "not reached"
	Straddles  Standing = "undecided"
	Unknown    Standing = "unknown"
)

// Category is one row of criterion E of the Red List.
type Category struct {
	Name      string   // in the words of the Red List
	Threshold float64  // risk of extinction in the wild, at least
	Horizon   float64  // years ahead that the criterion looks
	Year      int      // last year of the curve within the horizon
	Risk      YearRisk // by that year
	Standing  Standing
	Reason    string // why Standing is Unknown
}

// CriterionESource cites the yardstick.
const CriterionESource = "IUCN 2001, IUCN Red List Categories and Criteria, version 3.1 (second edition 2012), section V, criterion E"

// CriterionEConditions are what a reader must know before using the rows.
const CriterionEConditions = "counts extinction itself (none left), not a fall to a threshold, and of the whole taxon, not of one population"

// CriterionE compares a curve of extinction risk by year with the quantitative
// thresholds of the Red List, version 3.1 (IUCN 2001, section V, criterion E):
// at least 50 % within 10 years or three generations, 20 % within 20 years or
// five generations, 10 % within 100 years; the longer of years and generations,
// at most 100 years. The curve holds the risk by each year from 1 without gaps
// and never falls; generation is the generation length in years, above 0. Where
// the curve ends before a horizon, the standing is known only if the risk
// reaches the threshold already.
func CriterionE(curve []YearRisk, generation float64) ([]Category, error) {
	if !(generation > 0) || math.IsInf(generation, 0) {
		return nil, fmt.Errorf("estimate: a generation length of %v years is not above 0; give the mean age of parents", generation)
	}
	for i, y := range curve {
		if y.Year != i+1 {
			return nil, fmt.Errorf("estimate: the risk by year has %d where year %d should be; give every year from 1", y.Year, i+1)
		}
	}
	out := []Category{
		{Name: "Critically Endangered", Threshold: 0.5, Horizon: math.Min(100, math.Max(10, 3*generation))},
		{Name: "Endangered", Threshold: 0.2, Horizon: math.Min(100, math.Max(20, 5*generation))},
		{Name: "Vulnerable", Threshold: 0.1, Horizon: 100},
	}
	for i := range out {
		out[i].place(curve)
	}
	return out, nil
}

func (c *Category) place(curve []YearRisk) {
	// A horizon between two years is looked at in the last year within it.
	c.Year = min(int(c.Horizon), len(curve))
	if c.Year < 1 {
		c.Standing, c.Reason = Unknown, "no risk is known"
		return
	}
	c.Risk = curve[c.Year-1]
	short := c.Year < int(c.Horizon)
	switch {
	case c.Risk.Low >= c.Threshold:
		c.Standing = Reached
	case short:
		c.Standing, c.Reason = Unknown, fmt.Sprintf("the risk is known to year %d, and the criterion looks %g years ahead", c.Year, c.Horizon)
	case c.Risk.High < c.Threshold:
		c.Standing = NotReached
	default:
		c.Standing = Straddles
	}
}

// RemovalSource cites the yardstick.
const RemovalSource = "P. R. Wade 1998, Mar. Mamm. Sci. 14:1-37; 16 U.S.C. 1362(20)"

// RemovalConditions are what a reader must know before using the figure.
const RemovalConditions = "made for marine mammals; counts every death by people in a year, not the permit's take alone; animals of the whole stock"

// Removal is the potential biological removal.
type Removal struct {
	LeastAbundance float64 // 20th percentile of a log-normal abundance
	Animals        float64 // a year
}

// PotentialRemoval is the potential biological removal of P. R. Wade 1998 (Mar.
// Mamm. Sci. 14:1-37): least abundance times half of the largest yearly growth
// times the recovery factor, the least abundance being the 20th percentile of a
// log-normal law with the stated abundance and coefficient of variation:
// abundance exp(-0.842 sqrt(ln(1 + cv^2))). The quantile 0.842 is rounded as
// printed there, so that published levels come out to the unit.
func PotentialRemoval(abundance, cv, maxGrowth, recovery float64) (Removal, error) {
	for _, v := range []struct {
		name      string
		v         float64
		low, high float64
	}{{"abundance", abundance, 0, math.MaxFloat64}, {"coefficient of variation", cv, 0, 10}, {"largest yearly growth", maxGrowth, 0, 10}, {"recovery factor", recovery, 0, 1}} {
		if !(v.v >= v.low && v.v <= v.high) {
			return Removal{}, fmt.Errorf("estimate: a %s of %v is not between %g and %g; give one that is", v.name, v.v, v.low, v.high)
		}
	}
	least := abundance * math.Exp(-0.842*math.Sqrt(math.Log1p(cv*cv)))
	return Removal{least, least * maxGrowth / 2 * recovery}, nil
}
