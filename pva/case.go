// Package pva holds the nouns of a viability assessment as plain data: the case
// (what is asked and known), the table of its keys, faults and warnings, the
// integer tallies of a run and the results made from them.
//
// It does no input or output, holds no generator and runs nothing; every other
// room of the program imports it and it imports only the standard library.
package pva

// Case is one assessment as understood: every value in force, checked. It is
// made by Build from entries and never changed afterwards; an option, an
// override or a cell of a sweep is a new Case made from changed entries.
// Rates are as quoted (per Births.Per heads); package rates turns them into
// per-head formulas.
type Case struct {
	Title, Prepared, Purpose string
	Counts                   string   // what one counting unit is
	UnitSize                 float64  // animals per counting unit, > 0
	TimeUnit                 string   // the word for one step
	CountYears               Optional // years of counts behind the rates

	Question    Question
	Start       Start
	Births      Births
	Deaths      Deaths
	Weather     Weather
	Catastrophe []Catastrophe
	Harvest     []Harvest
	Stocking    []Stocking
	Ceiling     Optional // N is cut to this at the end of a year

	Uncertain     []Uncertain
	UncertainPair []UncertainPair
	Yardsticks    Yardsticks
	Run           Run
	Option        []Option
	Sweep         []Sweep
	Minimum       Minimum

	entries []Entry // what was written, in the order written, by position
}

// Optional is a number that a case may leave out; Set says whether it is there.
type Optional struct {
	Value float64
	Set   bool
}

// Or is the value if set, and otherwise what is given.
func (o Optional) Or(v float64) float64 {
	if o.Set {
		return o.Value
	}
	return v
}

// Question is what is asked.
type Question struct {
	Threshold  float64  // fallen at the first census with N <= Threshold
	Horizon    int      // years simulated, >= 1
	Limit      Optional // largest risk the permit may carry, in (0, 1)
	Confidence float64  // level of every interval, in (0, 1)
	Watch      string   // "census" or "always" (flow only)
}

// Start is the population before year 1.
type Start struct {
	Abundance float64  // counting units
	CV        float64  // coefficient of variation of the first count
	Year      Optional // calendar label of year 1
}

// Crowding says how a rate changes with N. Form is none, linear, theta, ricker
// or hyperbolic (the last two for births only); one of Scale and Capacity is set
// unless Form is none.
type Crowding struct {
	Form            string
	Scale, Capacity Optional // counting units
	Exponent        Optional // theta only
}

// Scarcity is the Allee effect in births: none, proportional (At) or saturating (HalfAt).
type Scarcity struct {
	Form       string
	At, HalfAt Optional
}

// Step is a factor on a rate from a date on.
type Step struct {
	From   int
	Factor float64
}

// Calendar is how a rate changes with the year.
type Calendar struct {
	Trend  float64 // relative change a year
	Steps  []Step
	Cycle  Cycle
	ByYear []float64 // factors from year 1, the last one held
}

// Cycle is 1 + Amplitude sin(2 pi (y - Phase) / Period), y the model year; Period 0 means none.
type Cycle struct{ Amplitude, Period, Phase float64 }

// Births holds the birth side; Rate and YearSD are per Per heads a year.
type Births struct {
	Breeding  string // "pulse" or "flow"
	Rate      float64
	Per       float64 // 1, 100 or 1000
	YearSD    float64
	Parents   string // "survivors" or "all" (pulse)
	Offspring string // "poisson", "at-most-one" or "clumped" (pulse)
	Clumping  Optional
	Crowding  Crowding
	Scarcity  Scarcity
	Calendar
}

// Deaths holds the death side. Exactly one of Rate (per Per heads a year) and
// Fraction (of those alive, a year) is set; YearSD is in the same units.
type Deaths struct {
	Rate, Fraction Optional
	Per            float64
	YearSD         float64
	Crowding       Crowding
	Calendar
}

// Weather is the environmental noise common to all animals.
type Weather struct{ Correlation, Memory float64 }

// Catastrophe strikes with Chance a year (or once in OnceIn years on average).
type Catastrophe struct {
	Name           string
	Chance, OnceIn Optional
	Kills, KillsSD float64 // fraction killed, each animal on its own
	BirthsTimes    float64 // factor on the year's births
}

// Prob is the chance of the catastrophe in a year.
func (c Catastrophe) Prob() float64 {
	if c.OnceIn.Set {
		return 1 / c.OnceIn.Value
	}
	return c.Chance.Value
}

// Years is a span of dates; an open end is marked. Dates are calendar years if
// the case has start.year, model years otherwise.
type Years struct {
	From, To         int
	OpenFrom, OpenTo bool
	Text             string
}

// Schedule says in which years a rule acts: the first of Years, then every OneYearIn-th.
type Schedule struct {
	Years     Years
	OneYearIn int
}

// Harvest is one take rule (model: section on harvest). Rule decides which of
// Take, Fraction or Rate, Spare, Points and Takes are in force.
type Harvest struct {
	Name     string
	Rule     string // constant, fraction, above, ladder, by_year
	Take     Optional
	Fraction Optional
	Rate     Optional // per head a year, "through" fraction rule only
	Spare    Optional
	Points   [][2]float64 // abundance, take
	Takes    []float64
	When     string // start, end, through
	Schedule
	StopBelow   float64
	Leave       float64
	Share       float64 // units lost per animal taken
	SurveyCV    float64
	SurveyEvery int
	TakeCV      float64
	TakeNoise   string // none, poisson, each-animal
	ExtraDeaths float64
	Existing    bool
}

// Stocking is one rule of additions.
type Stocking struct {
	Name string
	Add  float64
	When string // start, end, through
	Schedule
	OnlyBelow Optional
	Noise     string // none, poisson
}

// Uncertain marks one number of the case as known only by a law around its value.
type Uncertain struct {
	Key             string
	Law             string
	SD              Optional
	Low, High, Mode Optional
}

// UncertainPair is a rank correlation between two uncertain numbers.
type UncertainPair struct {
	Keys            []string
	RankCorrelation float64
}

// Yardsticks holds what published yardsticks need besides the case.
type Yardsticks struct{ GenerationLength, MaxGrowth, RecoveryFactor Optional }

// Run says how the case is run.
type Run struct {
	Replicates int64
	Draws      int
	Seed       uint64
	Substeps   string // auto, events, or a whole number
	StopAbove  float64
	Baseline   bool
}

// Option is a named alternative: the case with some keys set to other values.
type Option struct {
	Name string
	Set  []Setting
}

// Setting gives the key at Path (by name or position) a new value; lists are
// given whole, one Setting an element.
type Setting struct {
	Path  string
	Value Value
}

// Sweep is one dimension of a grid.
type Sweep struct {
	Key            string
	Values         []float64
	From, To, Step Optional
}

// Minimum asks for the minimum viable size.
type Minimum struct {
	Vary     string // start, capacity, both
	Risk     Optional
	Horizon  Optional
	From, To Optional
}

// Label is the date of model year y: the calendar year if the case has one.
func (c *Case) Label(y int) int {
	if c.Start.Year.Set {
		return int(c.Start.Year.Value) + y - 1
	}
	return y
}

// Takes says whether the case has any take that the permit would add (baseline
// differs), and whether it has any at all.
func (c *Case) Takes() (permitted, any bool) {
	for _, h := range c.Harvest {
		any = true
		if !h.Existing {
			permitted = true
		}
	}
	return permitted, any
}

// Entries is a copy of what was written: every key given, by position.
func (c *Case) Entries() []Entry { return append([]Entry(nil), c.entries...) }

// Baseline is the case without the take that the permit would add: rules not
// marked existing are never scheduled. They keep their place, so that the rules
// that stay use the same random numbers as beside them.
func (c *Case) Baseline() *Case {
	b := *c
	b.Harvest = append([]Harvest(nil), c.Harvest...)
	for i := range b.Harvest {
		if !b.Harvest[i].Existing {
			b.Harvest[i].Years = Years{From: 1, To: 0, Text: "never"}
		}
	}
	return &b
}
