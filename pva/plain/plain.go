// Package plain is a slow, plain second simulator of one replicate, written
// straight from the description of the model, so that two independent readings
// of that description can be compared in tests. It follows one replicate at a
// time, a flow year event by event (Gillespie 1977, J. Phys. Chem. 81:2340), and
// draws with the samplers of gonum.
//
// It refuses a case whose carrying capacity has no solution. It knows nothing of
// baselines, options, uncertain inputs or many replicates; its random numbers
// are not coupled between cases. Only tests call it.
package plain

import (
	"math"
	"math/rand/v2"

	"ebbline/pva"
)

// Path is what happened to one replicate. The lists have one element a model
// year, year y at index y-1, up to the horizon.
type Path struct {
	N         []int64 // census, counting units; from the year outgrown on the last value held
	Fallen    []bool  // has fallen in this year or before
	Outgrown  int     // model year in which N passed stop_above, 0 if never
	Take      []int64 // counting units taken, extra deaths not among them
	Shortfall []int64 // counting units intended and not taken
	Extra     []int64 // extra deaths
	Stocked   []int64 // counting units added
	Closed    []bool  // at least one scheduled take was closed by stop_below
	Smallest  int64   // smallest census of years 1 to the horizon
	Capped    int     // years in which at-most-one young had a mean above 1 and was cut to 1
}

// replicate is the state of one replicate while it runs.
type replicate struct {
	c     *pva.Case
	src   rand.Source
	scale scales
	n     int64
	y     int // model year

	weather weather
	birthsY float64   // per-head births of this year without crowding and scarcity
	deathsY float64   // per-head deaths of this year without crowding
	survey  []float64 // last estimate of each take rule
	fallen  bool
	path    Path
}

// Replicate runs one replicate of the case to its horizon. The error says why a
// carrying capacity has no solution.
func Replicate(c *pva.Case, src rand.Source) (Path, error) {
	s, err := solveScales(c)
	if err != nil {
		return Path{}, err
	}
	h := c.Question.Horizon
	r := &replicate{c: c, src: src, scale: s, survey: make([]float64, len(c.Harvest))}
	r.path = Path{N: make([]int64, h), Fallen: make([]bool, h), Take: make([]int64, h), Shortfall: make([]int64, h),
		Extra: make([]int64, h), Stocked: make([]int64, h), Closed: make([]bool, h)}
	r.start()
	for r.y = 1; r.y <= h; r.y++ {
		if r.path.Outgrown == 0 {
			r.year()
		}
		r.census()
	}
	return r.path, nil
}

// start draws the starting abundance.
func (r *replicate) start() {
	r.y = 1
	a := r.c.Start.Abundance
	if cv := r.c.Start.CV; cv > 0 {
		a = logNormal(a, cv*a, normal(r.src))
	}
	r.n = round(a, r.src)
	r.look()
}

// year is the order of a year up to its census.
func (r *replicate) year() {
	r.drawYear()
	r.catastrophes()
	r.rules("start")
	if r.c.Births.Breeding == "flow" {
		r.flow()
	} else {
		r.pulse()
	}
	if r.passed() {
		return
	}
	r.rules("end")
	if r.passed() {
		return
	}
	if r.c.Ceiling.Set {
		r.n = min(r.n, whole(r.c.Ceiling.Value))
		r.look()
	}
}

// census records N and whether the population has fallen.
func (r *replicate) census() {
	i := r.y - 1
	r.path.N[i] = r.n
	if r.path.Outgrown == 0 {
		r.fallen = r.fallen || float64(r.n) <= r.c.Question.Threshold
	}
	r.path.Fallen[i] = r.fallen
	if i == 0 || r.n < r.path.Smallest {
		r.path.Smallest = r.n
	}
}

// look looks at the threshold between censuses, where it is always watched.
func (r *replicate) look() {
	if r.c.Question.Watch == "always" && float64(r.n) <= r.c.Question.Threshold {
		r.fallen = true
	}
}

// passed says whether the replicate is outgrown, and marks the year.
func (r *replicate) passed() bool {
	if float64(r.n) > r.c.Run.StopAbove && r.path.Outgrown == 0 {
		r.path.Outgrown = r.y
	}
	return r.path.Outgrown != 0
}

// drawYear draws the weather and sets the year's rates; catastrophes may yet cut
// the births.
func (r *replicate) drawYear() {
	r.weather.next(r.c.Weather, r.y == 1, r.src)
	r.birthsY = birthRate(r.c, r.weather.births) * calendar(r.c, r.c.Births.Calendar, r.y)
	// A fraction of 1 is an infinite rate; a factor of 0 still stops all deaths.
	if f := calendar(r.c, r.c.Deaths.Calendar, r.y); f == 0 {
		r.deathsY = 0
	} else {
		r.deathsY = deathRate(r.c, r.weather.deaths) * f
	}
}

// catastrophes strikes with each catastrophe in turn, every animal on its own.
func (r *replicate) catastrophes() {
	for _, k := range r.c.Catastrophe {
		if !happens(k.Prob(), r.src) {
			continue
		}
		kills := k.Kills
		if k.KillsSD > 0 {
			kills = logistic(matchLogit(k.Kills, k.KillsSD).at(normal(r.src)))
		}
		r.n -= binomial(r.n, kills, r.src)
		r.birthsY *= k.BirthsTimes
		r.look()
	}
}

// births is b(N, y), per head a year (in a pulse year f).
func (r *replicate) births(n float64) float64 {
	return r.birthsY * crowdBirths(r.c.Births.Crowding, n, r.scale.births) * scarcity(r.c.Births.Scarcity, n)
}

// deaths is d(N, y), per head a year.
func (r *replicate) deaths(n float64) float64 {
	if r.deathsY == 0 {
		return 0 // also where the crowding factor overflows
	}
	return r.deathsY * crowdDeaths(r.c.Deaths.Crowding, n, r.scale.deaths)
}

// pulse is a mortality step and then a breeding step.
func (r *replicate) pulse() {
	entered := r.n
	survivors := binomial(entered, math.Exp(-r.deaths(float64(entered))), r.src)
	parents := survivors
	if r.c.Births.Parents == "all" {
		parents = entered
	}
	r.n = survivors + r.young(parents, r.births(float64(parents)))
}

// young draws from the offspring law, for parents with a mean of f each.
func (r *replicate) young(parents int64, f float64) int64 {
	switch mean := f * float64(parents); {
	case parents == 0:
		return 0
	case r.c.Births.Offspring == "at-most-one":
		if f > 1 {
			r.path.Capped++
			f = 1
		}
		return binomial(parents, f, r.src)
	case r.c.Births.Offspring == "clumped":
		return negBinomial(mean, r.c.Births.Clumping.Value*float64(parents), r.src)
	default:
		return poisson(mean, r.src)
	}
}
