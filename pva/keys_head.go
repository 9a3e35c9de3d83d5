package pva

import "math"

// Short constructors keep one key to one line of the table.

func number(path, unit string, min, max float64, def any, doc string, at func(*Case, []int) any) *Key {
	return &Key{Path: path, Unit: unit, Min: min, Max: max, Default: def, Doc: doc, at: at}
}

func word(path string, choices []string, def any, doc string, at func(*Case, []int) any) *Key {
	return &Key{Path: path, Choices: choices, Default: def, Doc: doc, at: at}
}

func flag(path string, def bool, doc string, at func(*Case, []int) any) *Key {
	return &Key{Path: path, Default: def, Doc: doc, at: at}
}

func (k *Key) required() *Key { k.Required = true; return k }
func (k *Key) whole() *Key    { k.Whole = true; return k }
func (k *Key) above() *Key    { k.OpenMin = true; return k }
func (k *Key) below() *Key    { k.OpenMax = true; return k }
func (k *Key) when(path string, values ...string) *Key {
	k.WhenPath, k.When = path, values
	return k
}

var inf = math.Inf(1)

const (
	largest   = 1e12 // no population, take or scale beyond this: the samplers are exact to here
	latest    = 1e6  // no date beyond this
	longest   = 10000
	perYear   = "per head per year"
	units     = "counting units"
	yearWord  = "years"
	unitsYear = "counting units a year"
)

func headKeys() []*Key {
	return []*Key{
		word("case.title", nil, "", "what the assessment is called", func(c *Case, _ []int) any { return &c.Title }),
		word("case.prepared", nil, "", "who prepared it", func(c *Case, _ []int) any { return &c.Prepared }),
		word("case.purpose", nil, "", "what it is for", func(c *Case, _ []int) any { return &c.Purpose }),
		word("case.counts", nil, "animals", "what one counting unit is", func(c *Case, _ []int) any { return &c.Counts }),
		number("case.unit_size", "animals per counting unit", 0, largest, 1.0, "animals that one counting unit stands for", func(c *Case, _ []int) any { return &c.UnitSize }).above(),
		word("case.time_unit", nil, "year", "the word for one step of the model", func(c *Case, _ []int) any { return &c.TimeUnit }),
		number("case.count_years", yearWord, 0, longest, nil, "years of counts behind the rates", func(c *Case, _ []int) any { return &c.CountYears }),

		number("question.threshold", units, 0, largest, nil, "fallen (quasi-extinct) at or below this", func(c *Case, _ []int) any { return &c.Question.Threshold }).required(),
		number("question.horizon", yearWord, 1, longest, nil, "years looked ahead", func(c *Case, _ []int) any { return &c.Question.Horizon }).whole().required(),
		number("question.limit", "probability", 0, 1, nil, "the largest risk the permit may carry", func(c *Case, _ []int) any { return &c.Question.Limit }).above().below(),
		number("question.confidence", "probability", 0.5, 1, 0.95, "level of every interval", func(c *Case, _ []int) any { return &c.Question.Confidence }).below(),
		word("question.watch", []string{"census", "always"}, "census", "when the threshold is looked at", func(c *Case, _ []int) any { return &c.Question.Watch }),

		number("start.abundance", units, 0, largest, nil, "the population before year 1", func(c *Case, _ []int) any { return &c.Start.Abundance }).required(),
		number("start.cv", "coefficient of variation", 0, 10, 0.0, "uncertainty of the first count", func(c *Case, _ []int) any { return &c.Start.CV }),
		number("start.year", "date", -latest, latest, nil, "calendar label of year 1", func(c *Case, _ []int) any { return &c.Start.Year }).whole(),
	}
}

func tailKeys() []*Key {
	return []*Key{
		number("ceiling.abundance", units, 0, largest, nil, "N is cut to this at the end of each year", func(c *Case, _ []int) any { return &c.Ceiling }),

		word("uncertain.*.key", nil, nil, "which number is uncertain", func(c *Case, i []int) any { return &grow(&c.Uncertain, i[0]).Key }).required(),
		word("uncertain.*.law", []string{"normal", "lognormal", "beta", "uniform", "triangular"}, nil, "the law it is drawn from", func(c *Case, i []int) any { return &grow(&c.Uncertain, i[0]).Law }).required(),
		number("uncertain.*.sd", "as the key", 0, largest, nil, "standard deviation around the value of the case", func(c *Case, i []int) any { return &grow(&c.Uncertain, i[0]).SD }).above(),
		number("uncertain.*.low", "as the key", -largest, largest, nil, "lower bound", func(c *Case, i []int) any { return &grow(&c.Uncertain, i[0]).Low }),
		number("uncertain.*.high", "as the key", -largest, largest, nil, "upper bound", func(c *Case, i []int) any { return &grow(&c.Uncertain, i[0]).High }),
		number("uncertain.*.mode", "as the key", -largest, largest, nil, "the likeliest value", func(c *Case, i []int) any { return &grow(&c.Uncertain, i[0]).Mode }).when("uncertain.*.law", "triangular"),

		word("uncertain_pair.*.keys.*", nil, nil, "the two uncertain numbers", func(c *Case, i []int) any { return grow(&grow(&c.UncertainPair, i[0]).Keys, i[1]) }),
		number("uncertain_pair.*.rank_correlation", "rank correlation", -1, 1, nil, "rank correlation of the pair", func(c *Case, i []int) any { return &grow(&c.UncertainPair, i[0]).RankCorrelation }).required(),

		number("yardsticks.generation_length", yearWord, 0, longest, nil, "mean age of parents", func(c *Case, _ []int) any { return &c.Yardsticks.GenerationLength }).above(),
		number("yardsticks.max_growth", "per year", 0, 10, nil, "largest yearly growth rate", func(c *Case, _ []int) any { return &c.Yardsticks.MaxGrowth }).above(),
		number("yardsticks.recovery_factor", "factor", 0, 1, nil, "recovery factor of the potential biological removal", func(c *Case, _ []int) any { return &c.Yardsticks.RecoveryFactor }).above(),

		number("run.replicates", "replicates", 1, 4e9, 10000.0, "how often the case is simulated", func(c *Case, _ []int) any { return &c.Run.Replicates }).whole(),
		number("run.draws", "draws", 2, 1e6, 200.0, "outer draws of the uncertain inputs", func(c *Case, _ []int) any { return &c.Run.Draws }).whole(),
		number("run.seed", "", 0, math.MaxUint64, 1.0, "the seed that names the random numbers", func(c *Case, _ []int) any { return &c.Run.Seed }).whole(),
		word("run.substeps", nil, "auto", "flow: auto, a whole number of sub-steps a year, or events", func(c *Case, _ []int) any { return &c.Run.Substeps }),
		number("run.stop_above", units, 1, largest, 1e9, "a replicate that passes this is outgrown and stops", func(c *Case, _ []int) any { return &c.Run.StopAbove }),
		flag("run.baseline", true, "assess beside the same case without the take", func(c *Case, _ []int) any { return &c.Run.Baseline }),

		word("option.*.name", nil, nil, "what the option is called", func(c *Case, i []int) any { return &grow(&c.Option, i[0]).Name }).required(),

		word("sweep.*.key", nil, nil, "which number is swept", func(c *Case, i []int) any { return &grow(&c.Sweep, i[0]).Key }).required(),
		number("sweep.*.values.*", "as the key", -largest, largest, nil, "the values", func(c *Case, i []int) any { return grow(&grow(&c.Sweep, i[0]).Values, i[1]) }),
		number("sweep.*.from", "as the key", -largest, largest, nil, "first value", func(c *Case, i []int) any { return &grow(&c.Sweep, i[0]).From }),
		number("sweep.*.to", "as the key", -largest, largest, nil, "last value", func(c *Case, i []int) any { return &grow(&c.Sweep, i[0]).To }),
		number("sweep.*.step", "as the key", 0, largest, nil, "step between values", func(c *Case, i []int) any { return &grow(&c.Sweep, i[0]).Step }).above(),

		word("minimum.vary", []string{"start", "capacity", "both"}, "start", "what is varied to find the minimum viable size", func(c *Case, _ []int) any { return &c.Minimum.Vary }),
		number("minimum.risk", "probability", 0, 1, nil, "the largest risk that counts as viable", func(c *Case, _ []int) any { return &c.Minimum.Risk }).above().below(),
		number("minimum.horizon", yearWord, 1, longest, nil, "years looked ahead", func(c *Case, _ []int) any { return &c.Minimum.Horizon }).whole(),
		number("minimum.from", units, 1, largest, nil, "smallest size tried", func(c *Case, _ []int) any { return &c.Minimum.From }),
		number("minimum.to", units, 1, largest, nil, "largest size tried", func(c *Case, _ []int) any { return &c.Minimum.To }),
	}
}
