package pva

// ruleKeys are the keys of catastrophes, harvest and stocking.
func ruleKeys() []*Key {
	h := func(c *Case, i []int) *Harvest { return grow(&c.Harvest, i[0]) }
	s := func(c *Case, i []int) *Stocking { return grow(&c.Stocking, i[0]) }
	k := func(c *Case, i []int) *Catastrophe { return grow(&c.Catastrophe, i[0]) }
	const rule = "harvest.*.rule"
	ks := []*Key{
		word("catastrophe.*.name", nil, "", "what the catastrophe is called", func(c *Case, i []int) any { return &k(c, i).Name }),
		number("catastrophe.*.chance", "probability a year", 0, 1, nil, "chance in a year", func(c *Case, i []int) any { return &k(c, i).Chance }),
		number("catastrophe.*.once_in", yearWord, 1, 1e9, nil, "average years between catastrophes", func(c *Case, i []int) any { return &k(c, i).OnceIn }),
		number("catastrophe.*.kills", "fraction", 0, 1, 0.0, "fraction killed", func(c *Case, i []int) any { return &k(c, i).Kills }),
		number("catastrophe.*.kills_sd", "fraction", 0, 1, 0.0, "standard deviation of the fraction killed", func(c *Case, i []int) any { return &k(c, i).KillsSD }),
		number("catastrophe.*.births_times", "factor", 0, 1e6, 1.0, "factor on the births of that year", func(c *Case, i []int) any { return &k(c, i).BirthsTimes }),

		word("harvest.*.name", nil, "", "what the take is called", func(c *Case, i []int) any { return &h(c, i).Name }),
		word(rule, []string{"constant", "fraction", "above", "ladder", "by_year"}, nil, "how the take is set", func(c *Case, i []int) any { return &h(c, i).Rule }).required(),
		number("harvest.*.take", "animals a year", 0, largest, nil, "animals taken a scheduled year", func(c *Case, i []int) any { return &h(c, i).Take }).when(rule, "constant"),
		number("harvest.*.fraction", "fraction a year", 0, 1, nil, "fraction taken", func(c *Case, i []int) any { return &h(c, i).Fraction }).when(rule, "fraction", "above"),
		number("harvest.*.rate", perYear, 0, 1e6, nil, "removal rate per head through the year", func(c *Case, i []int) any { return &h(c, i).Rate }).when(rule, "fraction"),
		number("harvest.*.spare", units, 0, largest, nil, "number spared before any take", func(c *Case, i []int) any { return &h(c, i).Spare }).when(rule, "above"),
		number("harvest.*.points.*.*", "abundance, take", 0, largest, nil, "ladder of abundance and take", func(c *Case, i []int) any {
			p := grow(&h(c, i).Points, i[1])
			return &p[min(i[2], 1)]
		}).when(rule, "ladder"),
		number("harvest.*.takes.*", "animals a year", 0, largest, nil, "animals taken, year by year", func(c *Case, i []int) any { return grow(&h(c, i).Takes, i[1]) }).when(rule, "by_year"),
		word("harvest.*.when", []string{"start", "end", "through"}, nil, "when in the year", func(c *Case, i []int) any { return &h(c, i).When }).required(),
		word("harvest.*.years", nil, "-", "years in which it is scheduled", func(c *Case, i []int) any { return &h(c, i).Years }),
		number("harvest.*.one_year_in", yearWord, 1, longest, 1.0, "scheduled one year in so many", func(c *Case, i []int) any { return &h(c, i).OneYearIn }).whole(),
		number("harvest.*.stop_below", units, 0, largest, 0.0, "no take while fewer are seen", func(c *Case, i []int) any { return &h(c, i).StopBelow }),
		number("harvest.*.leave", units, 0, largest, 0.0, "never take below this", func(c *Case, i []int) any { return &h(c, i).Leave }),
		number("harvest.*.share", "units per animal taken", 0, 1e6, 1.0, "counting units lost per animal taken", func(c *Case, i []int) any { return &h(c, i).Share }),
		number("harvest.*.survey_cv", "coefficient of variation", 0, 10, 0.0, "error of the survey that sets the take", func(c *Case, i []int) any { return &h(c, i).SurveyCV }),
		number("harvest.*.survey_every", yearWord, 1, longest, 1.0, "years from one survey to the next", func(c *Case, i []int) any { return &h(c, i).SurveyEvery }).whole(),
		number("harvest.*.take_cv", "coefficient of variation", 0, 10, 0.0, "error of the take around its target", func(c *Case, i []int) any { return &h(c, i).TakeCV }),
		word("harvest.*.take_noise", []string{"none", "poisson", "each-animal"}, "none", "chance in the take around its target", func(c *Case, i []int) any { return &h(c, i).TakeNoise }),
		number("harvest.*.extra_deaths", "deaths per unit taken", 0, 1e6, 0.0, "further deaths for each unit taken", func(c *Case, i []int) any { return &h(c, i).ExtraDeaths }),
		flag("harvest.*.existing", false, "goes on without the permit too", func(c *Case, i []int) any { return &h(c, i).Existing }),

		word("stocking.*.name", nil, "", "what the stocking is called", func(c *Case, i []int) any { return &s(c, i).Name }),
		number("stocking.*.add", unitsYear, 0, largest, 0.0, "counting units added a scheduled year", func(c *Case, i []int) any { return &s(c, i).Add }),
		word("stocking.*.when", []string{"start", "end", "through"}, nil, "when in the year", func(c *Case, i []int) any { return &s(c, i).When }).required(),
		word("stocking.*.years", nil, "-", "years in which it is scheduled", func(c *Case, i []int) any { return &s(c, i).Years }),
		number("stocking.*.one_year_in", yearWord, 1, longest, 1.0, "scheduled one year in so many", func(c *Case, i []int) any { return &s(c, i).OneYearIn }).whole(),
		number("stocking.*.only_below", units, 0, largest, nil, "only while N is below this", func(c *Case, i []int) any { return &s(c, i).OnlyBelow }),
		word("stocking.*.noise", []string{"none", "poisson"}, "none", "chance in the number added", func(c *Case, i []int) any { return &s(c, i).Noise }),
	}
	return ks
}
