package reports

import (
	"testing"

	"ebbline/pva"
	"ebbline/reports/internal/invented"
)

func given(path string, v any) pva.Entry {
	e := pva.Entry{Path: path, Origin: pva.FromCase}
	switch v := v.(type) {
	case int:
		e.Value = pva.Num(float64(v))
	case float64:
		e.Value = pva.Num(v)
	case bool:
		e.Value = pva.Flag(v)
	case string:
		e.Value = pva.Text(v)
	}
	return e
}

// bare is a small case with further entries.
func bare(t *testing.T, more ...pva.Entry) *pva.Case {
	t.Helper()
	entries := append([]pva.Entry{
		given("question.threshold", 10), given("question.horizon", 30), given("start.abundance", 200),
		given("births.breeding", "flow"), given("births.rate", 0.4), given("deaths.rate", 0.3),
	}, more...)
	last := map[string]pva.Entry{}
	var order []string
	for _, e := range entries {
		if _, twice := last[e.Path]; !twice {
			order = append(order, e.Path)
		}
		last[e.Path] = e
	}
	var kept []pva.Entry
	for _, path := range order {
		kept = append(kept, last[path])
	}
	c, faults := pva.Build(kept)
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	return c
}

func take(n string, more ...pva.Entry) []pva.Entry {
	out := []pva.Entry{given("harvest."+n+".when", "end")}
	for _, m := range more {
		m.Path = "harvest." + n + "." + m.Path
		out = append(out, m)
	}
	return out
}

func TestQuestionInOneSentence(t *testing.T) {
	join := func(lists ...[]pva.Entry) (all []pva.Entry) {
		for _, l := range lists {
			all = append(all, l...)
		}
		return all
	}
	one := func(e ...pva.Entry) []pva.Entry { return e }
	for _, c := range []struct {
		more []pva.Entry
		want string
	}{
		{nil, "How likely is it that 10 or fewer animals are counted in some year within 30 years?"},
		{one(given("question.threshold", 0)), "How likely is it that no animals are counted in some year within 30 years?"},
		{one(given("question.watch", "always")), "How likely is it that the population stands at 10 or fewer animals at some time within 30 years?"},
		{one(given("start.year", 2027), given("case.counts", "pairs")), "How likely is it that 10 or fewer pairs are counted in some year from 2027 to 2056?"},
		{one(given("start.year", 2027), given("question.horizon", 1)), "How likely is it that 10 or fewer animals are counted in some year in 2027?"},
		{one(given("case.time_unit", "month")), "How likely is it that 10 or fewer animals are counted in some month within 30 months?"},
		{take("1", given("rule", "constant"), given("take", 8)), "How likely is it that 10 or fewer animals are counted in some year within 30 years, if 8 a year are taken?"},
		{take("1", given("rule", "constant"), given("take", 8), given("stop_below", 60), given("years", "3-10")),
			"How likely is it that 10 or fewer animals are counted in some year within 30 years, if 8 a year are taken from year 3 to year 10, none below 60?"},
		{take("1", given("rule", "fraction"), given("fraction", 0.07)), "How likely is it that 10 or fewer animals are counted in some year within 30 years, if 7 % a year are taken?"},
		{take("1", given("rule", "above"), given("spare", 100)), "How likely is it that 10 or fewer animals are counted in some year within 30 years, if all above 100 are taken every year?"},
		{join(take("1", given("rule", "constant"), given("take", 8), given("name", "control")),
			take("2", given("rule", "fraction"), given("fraction", 0.05), given("existing", true), given("name", "licences"))),
			"How likely is it that 10 or fewer animals are counted in some year within 30 years, if 8 a year (control) are taken, on top of 5 % a year (licences) in any case?"},
		{take("1", given("rule", "by_year"), given("takes.1", 4), given("takes.2", 9), given("one_year_in", 2)),
			"How likely is it that 10 or fewer animals are counted in some year within 30 years, if 4 to 9 are taken every second year by a list?"},
		{one(given("stocking.1.add", 5), given("stocking.1.when", "start"), given("stocking.1.only_below", 50)),
			"How likely is it that 10 or fewer animals are counted in some year within 30 years, if 5 a year are added while fewer than 50 stand?"},
		{take("1", given("rule", "fraction"), given("fraction", 0.25), given("one_year_in", 2), given("years", "1-6")),
			"How likely is it that 10 or fewer animals are counted in some year within 30 years, if 25 % are taken every second year from year 1 to year 6?"},
		{join(take("1", given("rule", "constant"), given("take", 8), given("share", 0.5)),
			one(given("stocking.1.add", 2), given("stocking.1.when", "start"), given("stocking.2.add", 15), given("stocking.2.when", "start"), given("stocking.2.one_year_in", 2), given("stocking.2.only_below", 40))),
			"How likely is it that 10 or fewer animals are counted in some year within 30 years, if 8 animals a year are taken, and 2 a year are added, and 15 every second year while fewer than 40 stand?"},
		{take("1", given("rule", "constant"), given("take", 1), given("existing", true)),
			"How likely is it that 10 or fewer animals are counted in some year within 30 years, if 1 a year is taken, as now?"},
		{take("1", given("rule", "constant"), given("take", 1), given("one_year_in", 12), given("share", 2)),
			"How likely is it that 10 or fewer animals are counted in some year within 30 years, if 1 animal is taken one year in 12?"},
	} {
		if got := Question(bare(t, c.more...)); got != c.want {
			t.Errorf("asked:\n  %s\nwanted:\n  %s", got, c.want)
		}
	}
	if got := Question(invented.Case()); got != "How likely is it that 20 or fewer adult females are counted in some year from 2027 to 2076, if 8 a year are taken, none below 60?" {
		t.Errorf("asked: %s", got)
	}
}
