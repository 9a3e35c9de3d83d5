package exact

import "testing"

// Cases that use every part of the model, against the dense chain.

func TestPulseWithEverything(t *testing.T) {
	base := set{"start.abundance": 12, "question.threshold": 2, "question.horizon": 5, "ceiling.abundance": 18,
		"births.breeding": "pulse", "births.rate": 0.5, "deaths.fraction": 0.35}
	cases := map[string]set{
		"survivors, correlated, two catastrophes, ladder seen with error": base.with(set{
			"births.year_sd": 0.15, "deaths.year_sd": 0.1, "weather.correlation": 0.6,
			"births.offspring": "clumped", "births.clumping": 0.8, "births.crowding.form": "hyperbolic", "births.crowding.scale": 60,
			"start.cv": 0.2, "start.abundance": 9.4,
			"catastrophe.1.chance": 0.2, "catastrophe.1.kills": 0.4, "catastrophe.1.kills_sd": 0.15, "catastrophe.1.births_times": 0.5,
			"catastrophe.2.once_in": 10, "catastrophe.2.kills": 0.2, "catastrophe.2.births_times": 0.5,
			"harvest.1.rule": "ladder", "harvest.1.points.1.1": 4, "harvest.1.points.1.2": 0, "harvest.1.points.2.1": 10, "harvest.1.points.2.2": 3,
			"harvest.1.when": "end", "harvest.1.survey_cv": 0.3, "harvest.1.extra_deaths": 0.3, "harvest.1.stop_below": 5, "harvest.1.leave": 3,
			"stocking.1.add": 0.8, "stocking.1.noise": "poisson", "stocking.1.only_below": 6, "stocking.1.when": "end",
		}),
		"all breed, one weather, error of the take": base.with(set{
			"births.parents": "all", "births.offspring": "at-most-one", "births.year_sd": 0.2, "deaths.year_sd": 0.1, "weather.correlation": 1,
			"births.scarcity.form": "saturating", "births.scarcity.half_at": 1.5,
			"harvest.1.rule": "fraction", "harvest.1.fraction": 0.2, "harvest.1.take_cv": 0.4, "harvest.1.when": "start", "harvest.1.share": 0.7,
			"harvest.2.rule": "fraction", "harvest.2.fraction": 0.15, "harvest.2.take_noise": "each-animal", "harvest.2.when": "end", "harvest.2.survey_cv": 0.25, "harvest.2.stop_below": 8,
			"stocking.1.add": 1.3, "stocking.1.when": "start", "stocking.1.one_year_in": 2,
		}),
		"changing years, rules by year": base.with(set{
			"births.year_sd": 0.15, "deaths.year_sd": 0.08, "births.trend": -0.05, "deaths.cycle.amplitude": 0.2, "deaths.cycle.period": 3,
			"deaths.crowding.form": "theta", "deaths.crowding.exponent": 2, "deaths.crowding.scale": 30,
			"harvest.1.rule": "by_year", "harvest.1.takes": []float64{2.5, 1, 0.7}, "harvest.1.when": "start", "harvest.1.years": "2-", "harvest.1.take_noise": "poisson",
			"harvest.2.rule": "above", "harvest.2.spare": 5, "harvest.2.fraction": 0.6, "harvest.2.when": "end", "harvest.2.one_year_in": 2, "harvest.2.stop_below": 9,
			"catastrophe.1.chance": 0.15, "catastrophe.1.kills": 0.5,
		}),
		"a survey and an error of the take": base.with(set{
			"harvest.1.rule": "above", "harvest.1.spare": 5, "harvest.1.fraction": 0.5, "harvest.1.survey_cv": 0.3, "harvest.1.take_cv": 0.2, "harvest.1.when": "end",
		}),
		"a survey and a Poisson take": base.with(set{
			"harvest.1.rule": "above", "harvest.1.spare": 5, "harvest.1.fraction": 0.5, "harvest.1.survey_cv": 0.3, "harvest.1.take_noise": "poisson", "harvest.1.stop_below": 4, "harvest.1.when": "end",
		}),
		"survivors, opposite weather": base.with(set{"births.year_sd": 0.2, "deaths.year_sd": 0.1, "weather.correlation": -1}),
		"all breed, correlated":       base.with(set{"births.parents": "all", "births.rate": 0.3, "births.year_sd": 0.2, "deaths.year_sd": 0.1, "weather.correlation": -0.5}),
	}
	for name, keys := range cases {
		t.Run(name, func(t *testing.T) {
			tolerance := 3e-7
			if name == "a survey and an error of the take" {
				tolerance = 2e-6 // fewer points on each of the two axes
			}
			points := 21
			if name == "all breed, one weather, error of the take" {
				points = 201 // births capped at one a head make a bend in the weather
			}
			agree(t, keys, 50, points, tolerance)
		})
	}
}

func TestFlowWithEverything(t *testing.T) {
	base := set{"start.abundance": 10, "question.threshold": 2, "question.horizon": 4,
		"births.breeding": "flow", "births.rate": 0.4, "deaths.rate": 0.5, "deaths.crowding.form": "linear", "deaths.crowding.scale": 40,
		"harvest.1.rule": "constant", "harvest.1.take": 1.2, "harvest.1.when": "through", "harvest.1.leave": 4, "harvest.1.extra_deaths": 0.25, "harvest.1.stop_below": 6,
		"stocking.1.add": 0.6, "stocking.1.when": "through", "stocking.1.only_below": 7,
		"harvest.2.rule": "above", "harvest.2.spare": 6, "harvest.2.fraction": 0.5, "harvest.2.when": "end",
		"catastrophe.1.chance": 0.1, "catastrophe.1.kills": 0.3, "catastrophe.1.births_times": 0.4,
		"ceiling.abundance": 14}
	for name, keys := range map[string]set{
		"looked at once a year":       base.with(set{"births.year_sd": 0.15}),
		"watched always":              base.with(set{"births.year_sd": 0.15, "question.watch": "always", "stocking.2.add": 1.4, "stocking.2.when": "start"}),
		"watched always, still":       base.with(set{"question.watch": "always", "start.abundance": 2.5}),
		"a fraction through the year": base.with(set{"harvest.1.take": nil}).with(set{"harvest.1.rule": "fraction", "harvest.1.fraction": 0.2}),
		"both vary, opposite":         base.with(set{"births.year_sd": 0.15, "deaths.year_sd": 0.1, "weather.correlation": -1}),
	} {
		t.Run(name, func(t *testing.T) { agree(t, keys, 50, 21, 3e-7) })
	}
}

func TestWeatherWithMemory(t *testing.T) {
	base := set{"start.abundance": 12, "question.threshold": 2, "question.horizon": 6, "ceiling.abundance": 18,
		"births.breeding": "pulse", "births.rate": 0.5, "births.year_sd": 0.2, "deaths.fraction": 0.35, "weather.memory": 0.5}
	short := base.with(set{"question.horizon": 4, "ceiling.abundance": 12, "start.abundance": 7, "deaths.year_sd": 0.1})
	for name, c := range map[string]struct {
		keys         set
		size, points int
	}{
		"births vary":           {base, 50, 41},
		"strong memory":         {base.with(set{"weather.memory": 0.8}), 50, 61},
		"negative memory, flow": {flow(12, 2, 4, 0.4, 0.5).with(set{"births.year_sd": 0.15, "weather.memory": -0.4, "ceiling.abundance": 18}), 40, 31},
		"opposite":              {base.with(set{"deaths.year_sd": 0.1, "weather.correlation": -1}), 50, 41},
		"two axes, all breed":   {short.with(set{"births.parents": "all", "births.rate": 0.35, "weather.correlation": 0.3}), 36, 17},
		"two axes, a catastrophe": {short.with(set{"weather.correlation": -0.4, "catastrophe.1.chance": 0.2, "catastrophe.1.births_times": 0.5,
			"harvest.1.rule": "constant", "harvest.1.take": 0.5, "harvest.1.when": "end"}), 36, 17},
	} {
		t.Run(name, func(t *testing.T) { agree(t, c.keys, c.size, c.points, 1e-6) })
	}
}
