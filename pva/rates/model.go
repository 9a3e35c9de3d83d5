// Package rates holds the formulas of the model as pure functions of the
// population and the year: how births and deaths depend on crowding, scarcity,
// the calendar and the weather, what a take rule asks for, how a capacity is
// turned into the scale of a form, and where the mean path rests.
//
// It draws no random numbers and loops over no replicates: packages year and
// exact do, and both take every formula from here, so that they cannot differ
// in one. Products that are added are written float64(a*b) + c, which stops
// the compiler from fusing them, so that every processor gives the same bits.
package rates

import (
	"ebbline/pva"
	"ebbline/rng/portable"
)

// Model is a case turned into formulas, with capacities solved. It is
// immutable and safe for many goroutines.
type Model struct {
	Case *pva.Case

	Birth LogNormal // births per head a year, before crowding and calendar
	Death DeathLaw

	BirthCrowding Crowding
	DeathCrowding Crowding
	Scarcity      Scarcity

	// BirthCalendar and DeathCalendar are the calendar factors; index y-1 is
	// model year y, length the horizon.
	BirthCalendar, DeathCalendar []float64

	Kills []Fraction // one a catastrophe: the fraction killed
	Takes []Take     // one a harvest rule

	// Unsolved is set by NewKeeping when a capacity has no solution and the
	// scales of another model were kept instead.
	Unsolved bool
}

// New makes the formulas of a case. Faults name a capacity that no scale
// reaches, or a spread that no law can have.
func New(c *pva.Case) (*Model, []pva.Fault) {
	m, faults := formulas(c)
	if len(faults) > 0 {
		return nil, faults
	}
	if faults := m.solveCapacity(); len(faults) > 0 {
		return nil, faults
	}
	return m, nil
}

// NewKeeping is New for a cell or a draw of a case: where its capacity has no
// solution it keeps the scales of base and sets Unsolved, to be counted.
func NewKeeping(c *pva.Case, base *Model) (*Model, []pva.Fault) {
	m, faults := formulas(c)
	if len(faults) > 0 {
		return nil, faults
	}
	if faults := m.solveCapacity(); len(faults) > 0 {
		m.BirthCrowding.L, m.DeathCrowding.L = base.BirthCrowding.L, base.DeathCrowding.L
		m.Unsolved = true
	}
	return m, nil
}

func formulas(c *pva.Case) (*Model, []pva.Fault) {
	m := &Model{
		Case:          c,
		Birth:         NewLogNormal(c.Births.Rate/c.Births.Per, c.Births.YearSD/c.Births.Per),
		BirthCrowding: newCrowding(c.Births.Crowding),
		DeathCrowding: newCrowding(c.Deaths.Crowding),
		Scarcity:      newScarcity(c.Births.Scarcity),
		BirthCalendar: calendar(c, c.Births.Calendar),
		DeathCalendar: calendar(c, c.Deaths.Calendar),
	}
	var faults []pva.Fault
	if c.Deaths.Fraction.Set {
		law, err := NewFraction(c.Deaths.Fraction.Value, c.Deaths.YearSD)
		if err != nil {
			faults = append(faults, pva.Fault{Key: "deaths.year_sd", Path: "deaths.year_sd", Want: err.Error(), Fix: "give a smaller year_sd"})
		}
		m.Death = DeathLaw{IsFraction: true, Fraction: law}
	} else {
		m.Death = DeathLaw{Rate: NewLogNormal(c.Deaths.Rate.Value/c.Deaths.Per, c.Deaths.YearSD/c.Deaths.Per)}
	}
	for i, k := range c.Catastrophe {
		law, err := NewFraction(k.Kills, k.KillsSD)
		if err != nil {
			path := "catastrophe." + itoa(i+1) + ".kills_sd"
			faults = append(faults, pva.Fault{Key: c.Display(path), Path: path, Want: err.Error(), Fix: "give a smaller kills_sd"})
		}
		m.Kills = append(m.Kills, law)
	}
	for _, h := range c.Harvest {
		m.Takes = append(m.Takes, newTake(c, h))
	}
	return m, faults
}

// BirthAt is births per head at population n, given the year's rate (its draw
// times calendar and catastrophes).
func (m *Model) BirthAt(rate, n float64) float64 {
	return float64(rate * m.BirthCrowding.Births(n) * m.Scarcity.Factor(n))
}

// DeathAt is deaths per head at population n, given the year's rate.
func (m *Model) DeathAt(rate, n float64) float64 {
	return float64(rate * m.DeathCrowding.Deaths(n))
}

// DeathLaw is the law of the year's death rate per head.
type DeathLaw struct {
	IsFraction bool
	Rate       LogNormal
	Fraction   Fraction
}

// Draw is the year's death rate for a standard normal e: the log-normal rate,
// or -ln(1-m) of the year's fraction (+Inf for a fraction of 1).
func (d DeathLaw) Draw(e float64) float64 {
	if d.IsFraction {
		return -portable.Log1p(-d.Fraction.Draw(e))
	}
	return d.Rate.Draw(e)
}

// Mean is the death rate of a mean year: the mean rate, or -ln(1-m) of the mean fraction.
func (d DeathLaw) Mean() float64 {
	if d.IsFraction {
		return -portable.Log1p(-d.Fraction.Mean)
	}
	return d.Rate.Mean
}

// Varies says whether the rate changes between years.
func (d DeathLaw) Varies() bool {
	if d.IsFraction {
		return d.Fraction.V != 0
	}
	return d.Rate.Sigma != 0
}
