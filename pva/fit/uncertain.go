package fit

import (
	"math"
	"strconv"

	"ebbline/pva"
)

// explain says in words how the case was made.
func (b *caseWriter) explain() {
	m, w, r := b.m, b.w, b.r
	u := r.unit()
	if m.crowded {
		b.how("Growth follows the %s curve of the counts, with crowding on births; the case's growth lies %.2g from it, root mean square over the counts.", b.model.Name, m.off)
		if b.o.Model == "" && r.Best == ThetaModel {
			b.how("The %s has the lowest AICc but no standard errors, and its exponent is seldom found from counts (Clark et al. 2010): it is written only if --model names it.", ThetaModel)
		}
	} else {
		b.how("Growth has the fitted mean of %.4g a %s (log scale), without crowding.", w.Growth, u)
	}
	b.how("Counts alone cannot tell births from deaths: a survival of %.4g a %s is %s, and births follow from it.", w.Survival, u, map[bool]string{true: "as stated", false: "taken from the stated generation time"}[b.o.Survival != 0])
	b.how("Of the fitted variance of log growth, %.4g, births and deaths of single animals make %.4g at the abundances counted; the rest, %.4g, is weather, given to births by %.0f %% and to deaths by %.0f %%.", w.Variance, w.Demographic, w.Weather, 100*b.o.Split, 100*(1-b.o.Split))
	switch {
	case r.separated() && !m.crowded && r.Split.Stated:
		b.how("The stated errors of the counts are taken out of that variance.")
	case r.separated() && !m.crowded:
		b.how("Observation error (variance %.3g of a log count) is taken out of that variance.", r.Split.Observation.Value)
	case m.crowded:
		b.how("Observation error is not taken out: the regression does not part it from the weather, as the error of a count is in the growth from it and in the abundance beside it.")
	}
	b.explainStart()
	if b.o.BreedingAssumed {
		b.doubt("births are assumed to come once a %s: state --breeding pulse or --breeding flow", u)
	}
	if s := r.Split; !r.separated() && !m.crowded && s.Observation.Value > 0 {
		b.doubt("the split of the variance leaves nothing to the process, which is true of no population: the case keeps the whole variance, errors of counting and all; state those errors (column se or cv) if they are known")
	}
	if m.crowded && b.o.Model == "" {
		b.doubt("errors of counting alone can look like crowding (Shenk, White & Burnham 1998, Ecol. Monogr. 68:445-463), and crowding lowers the risk: write a second case with --model %s and assess both", Exponential)
	}
	if w.Weather == 0 {
		b.doubt("the counts vary no more than births and deaths of single animals would make them at a survival of %.3g: no weather is left in the case, though the interval of the variance reaches %.3g", w.Survival, r.variance(b.model).High)
	}
}

// uncertain writes the laws of the fitted numbers, with standard deviations
// from the intervals of the fit: each number is solved anew at the ends.
func (b *caseWriter) uncertain() {
	m := b.m
	row := 0
	add := func(path, law string, sd float64, note string) {
		if !(sd > 0) || math.IsInf(sd, 0) {
			return
		}
		row++
		at := "uncertain." + strconv.Itoa(row) + "."
		b.put(at+"key", pva.Text(path), "", "")
		b.put(at+"law", pva.Text(law), "", "")
		b.number(at+"sd", sd, b.source(), note)
	}
	if sd := b.birthsSD(); sd > m.birth/3 {
		add("births.rate", "lognormal", sd, "from the standard error of growth")
	} else {
		add("births.rate", "normal", sd, "from the standard error of growth")
	}
	births, deaths := b.spreadsSD()
	if m.sigma > 0 {
		add("births.year_sd", "lognormal", births, "from the interval of the variance")
	}
	if m.v > 0 {
		add("deaths.year_sd", "lognormal", deaths, "from the interval of the variance")
	}
	if m.crowded && b.model.Capacity.SE > 0 {
		k := m.rests()
		add("births.crowding.capacity", "lognormal", k*b.model.Capacity.SE/b.model.Capacity.Value, "from the standard error of K")
		if b.model.Capacity.SE > b.model.Capacity.Value {
			b.doubt("K is hardly known: its standard error (%.3g) is larger than itself (%.3g)", b.model.Capacity.SE, b.model.Capacity.Value)
		}
	}
	if m.crowded && !(b.model.Capacity.SE > 0) {
		b.doubt("K and the exponent are taken as known: this fit gives no standard errors for them")
	}
	if births > 0 && deaths > 0 && m.sigma > 0 && m.v > 0 {
		// One fitted variance stands behind both: they move together. Exactly 1
		// would leave no law of two.
		b.put("uncertain_pair.1.keys.1", pva.Text("births.year_sd"), "", "")
		b.put("uncertain_pair.1.keys.2", pva.Text("deaths.year_sd"), "", "")
		b.number("uncertain_pair.1.rank_correlation", 0.99, b.source(), "one fitted variance stands behind both")
	}
	b.doubt("the stated survival is taken as known: mark deaths.fraction as uncertain if it is not")
}

// birthsSD is the standard deviation of the birth rate: half the change from
// growth one standard error lower to one higher, the weather held.
func (b *caseWriter) birthsSD() float64 {
	solve := func(t target) float64 {
		m := *b.m
		m.target = t
		if !m.setGrowth() {
			return 0
		}
		return m.birth
	}
	t := b.m.target
	if !b.m.crowded {
		se := b.r.growth().SE
		shift := func(by float64) float64 {
			s := t
			s.curve = func(n float64) float64 { return t.curve(n) + by }
			return solve(s)
		}
		return (shift(se) - shift(-se)) / 2
	}
	// The strength of crowding is what is known badly; the rest point is held.
	e := b.model.steepness
	scale := func(by float64) float64 {
		s := t
		s.curve = func(n float64) float64 { return t.curve(n) * by }
		return solve(s)
	}
	below := math.Min(e, 0.9)
	return (scale(1+e) - scale(1-below)) / (e + below) * e
}

// spreadsSD are the standard deviations of the two between-year spreads: the
// change over the interval of the variance, over the width of a normal one.
func (b *caseWriter) spreadsSD() (births, deaths float64) {
	v := b.r.variance(b.model)
	at := func(variance float64) (float64, float64) {
		m := *b.m
		m.variance = variance
		for i := 0; i < roundsToSettle; i++ {
			if !m.setVariance() {
				return math.NaN(), math.NaN()
			}
		}
		return m.birthSD(), m.deathSD()
	}
	z := normalQuantile(b.r.Options.Confidence)
	bl, dl := at(v.Low)
	bh, dh := at(v.High)
	if math.IsNaN(bh) { // no weather is so wide: the lower half stands for both
		return (b.m.birthSD() - bl) / z, (b.m.deathSD() - dl) / z
	}
	return (bh - bl) / (2 * z), (dh - dl) / (2 * z)
}
