package pva

// rateKeys are the keys of births, deaths and the weather.
func rateKeys() []*Key {
	ks := []*Key{
		word("births.breeding", []string{"pulse", "flow"}, nil, "births once a year (pulse) or through the year (flow)", func(c *Case, _ []int) any { return &c.Births.Breeding }).required(),
		number("births.rate", perYear, 0, 1e6, nil, "births per head (or per 100, 1000) a year", func(c *Case, _ []int) any { return &c.Births.Rate }).required(),
		number("births.per", "heads", 1, 1000, 1.0, "how many heads the birth rate is quoted for: 1, 100 or 1000", func(c *Case, _ []int) any { return &c.Births.Per }),
		number("births.year_sd", perYear, 0, 1e6, 0.0, "standard deviation of the birth rate between years", func(c *Case, _ []int) any { return &c.Births.YearSD }),
		word("births.parents", []string{"survivors", "all"}, "survivors", "who breeds in a pulse year", func(c *Case, _ []int) any { return &c.Births.Parents }),
		word("births.offspring", []string{"poisson", "at-most-one", "clumped"}, "poisson", "law of the young in a pulse year", func(c *Case, _ []int) any { return &c.Births.Offspring }),
		number("births.clumping", "size parameter", 0.001, 1e6, nil, "size parameter of clumped young (negative binomial)", func(c *Case, _ []int) any { return &c.Births.Clumping }).when("births.offspring", "clumped"),
		word("births.scarcity.form", []string{"none", "proportional", "saturating"}, "none", "Allee effect in births", func(c *Case, _ []int) any { return &c.Births.Scarcity.Form }),
		number("births.scarcity.at", units, 0, largest, nil, "births per head reach the stated rate at this N", func(c *Case, _ []int) any { return &c.Births.Scarcity.At }).above().when("births.scarcity.form", "proportional"),
		number("births.scarcity.half_at", units, 0, largest, nil, "births per head are half the stated rate at this N", func(c *Case, _ []int) any { return &c.Births.Scarcity.HalfAt }).above().when("births.scarcity.form", "saturating"),
	}
	ks = append(ks, crowdingKeys("births", []string{"none", "linear", "theta", "ricker", "hyperbolic"}, func(c *Case) *Crowding { return &c.Births.Crowding })...)
	ks = append(ks, calendarKeys("births", func(c *Case) *Calendar { return &c.Births.Calendar })...)
	ks = append(ks,
		number("deaths.rate", perYear, 0, 1e6, nil, "deaths per head (or per 100, 1000) a year", func(c *Case, _ []int) any { return &c.Deaths.Rate }),
		number("deaths.fraction", "fraction a year", 0, 1, nil, "deaths as a fraction of those alive, a year", func(c *Case, _ []int) any { return &c.Deaths.Fraction }),
		number("deaths.per", "heads", 1, 1000, 1.0, "how many heads the death rate is quoted for: 1, 100 or 1000", func(c *Case, _ []int) any { return &c.Deaths.Per }),
		number("deaths.year_sd", "as the rate or fraction", 0, 1e6, 0.0, "standard deviation of the death rate or fraction between years", func(c *Case, _ []int) any { return &c.Deaths.YearSD }),
	)
	ks = append(ks, crowdingKeys("deaths", []string{"none", "linear", "theta"}, func(c *Case) *Crowding { return &c.Deaths.Crowding })...)
	ks = append(ks, calendarKeys("deaths", func(c *Case) *Calendar { return &c.Deaths.Calendar })...)
	return append(ks,
		number("weather.correlation", "correlation", -1, 1, 0.0, "correlation of birth and death rates between years", func(c *Case, _ []int) any { return &c.Weather.Correlation }),
		number("weather.memory", "autocorrelation", -1, 1, 0.0, "correlation of one year's weather with the last year's", func(c *Case, _ []int) any { return &c.Weather.Memory }).above().below(),
	)
}

func crowdingKeys(side string, forms []string, of func(*Case) *Crowding) []*Key {
	form := side + ".crowding.form"
	return []*Key{
		word(form, forms, "none", "how "+side+" change with N", func(c *Case, _ []int) any { return &of(c).Form }),
		number(side+".crowding.capacity", units, 0, largest, nil, "carrying capacity: growth is zero there", func(c *Case, _ []int) any { return &of(c).Capacity }).above().when(form, forms[1:]...),
		number(side+".crowding.scale", units, 0, largest, nil, "the scale L of the form", func(c *Case, _ []int) any { return &of(c).Scale }).above().when(form, forms[1:]...),
		number(side+".crowding.exponent", "exponent", 0, 100, nil, "exponent of the theta form", func(c *Case, _ []int) any { return &of(c).Exponent }).above().when(form, "theta"),
	}
}

func calendarKeys(side string, of func(*Case) *Calendar) []*Key {
	return []*Key{
		number(side+".trend", "relative change a year", -1, 10, 0.0, "steady change of the rate a year", func(c *Case, _ []int) any { return &of(c).Trend }).above(),
		number(side+".steps.*.from", "date", -latest, latest, nil, "first year of the step", func(c *Case, i []int) any { return &grow(&of(c).Steps, i[0]).From }).whole().required(),
		number(side+".steps.*.factor", "factor", 0, 1e6, nil, "factor on the rate from then on", func(c *Case, i []int) any { return &grow(&of(c).Steps, i[0]).Factor }).required(),
		number(side+".cycle.amplitude", "fraction of the rate", -1, 1, 0.0, "amplitude of a cycle in the rate", func(c *Case, _ []int) any { return &of(c).Cycle.Amplitude }),
		number(side+".cycle.period", yearWord, 0, longest, 0.0, "period of the cycle", func(c *Case, _ []int) any { return &of(c).Cycle.Period }),
		number(side+".cycle.phase", "model year", -longest, longest, 0.0, "model year at which the cycle starts to rise", func(c *Case, _ []int) any { return &of(c).Cycle.Phase }),
		number(side+".by_year.*", "factor", 0, 1e6, nil, "factor on the rate, year by year", func(c *Case, i []int) any { return grow(&of(c).ByYear, i[0]) }),
	}
}
