package casefile

import (
	"fmt"
	"strings"
	"testing"

	"ebbline/pva"
)

// TestParseSetting: text after --set, and what it sets or what is wrong with it.
func TestParseSetting(t *testing.T) {
	for _, c := range []struct{ text, want string }{
		{"births.rate=0.4", "births.rate 0.4"},
		{" births.rate = 1_0.5 ", "births.rate 1_0.5"},
		{"births.rate=4e-1", "births.rate 4e-1"},
		{"run.seed=18446744073709551615", "run.seed 18446744073709551615"},
		{"births.breeding=flow", `births.breeding "flow"`},
		{`births.breeding="flow"`, `births.breeding "flow"`},
		{"births.breeding='flow'", `births.breeding "flow"`},
		{"case.title=A heron = a bird", `case.title "A heron = a bird"`},
		{"case.title=true", "case.title true"}, // and Override faults it
		{"run.baseline=false", "run.baseline false"},
		{"run.substeps=20", `run.substeps "20"`},
		{"harvest.control.years=2030-", `harvest.control.years "2030-"`},
		{"harvest.the old take.take=3", "harvest.the old take.take 3"},
		{"harvest.2.take=3", "harvest.2.take 3"},
		{"births.by_year=[1, 0.9]", "births.by_year (list), births.by_year.1 1, births.by_year.2 0.9"},
		{"births.by_year=[]", "births.by_year (list)"},
		{"births.by_year.2=0.8", "births.by_year.2 0.8"},
		{"harvest.1.points=[[60,0],[90,4]]", "harvest.1.points (list), harvest.1.points.1.1 60, harvest.1.points.1.2 0, harvest.1.points.2.1 90, harvest.1.points.2.2 4"},
		{"births.crowding={form='none'}", `births.crowding.form "none"`},
		{"births.rate", "! --set births.rate: has no value; write key=value, such as harvest.1.take=4"},
		{"=4", "! --set =4: has no key; write key=value, such as harvest.1.take=4"},
		{"births.rate=", "! --set births.rate=: has no value; give a number, 0 or more: births per head (or per 100, 1000) a year"},
		{"births.rate=high", `! --set births.rate=high: births.rate: "high" is not a number; give a number, 0 or more: births per head (or per 100, 1000) a year`},
		{"births.rate=.5", `! --set births.rate=.5: births.rate: ".5" is not a number; give a number, 0 or more: births per head (or per 100, 1000) a year`},
		{"births.rate=inf", `! --set births.rate=inf: births.rate: inf is not a finite number; give a number, 0 or more: births per head (or per 100, 1000) a year`},
		{"births.rate=[1]", `! --set births.rate=[1]: births.rate: is a list; give a number, 0 or more: births per head (or per 100, 1000) a year`},
		{"births.rate={value=1,source='x'}", "! --set births.rate={value=1,source='x'}: births.rate: takes no source here; give the bare value, or write the source into the case"},
		{"births.by_year=[1\nrun.seed=4", "! --set births.by_year=[1?run.seed=4: a list has a comma between two values and ends with ]"},
		{"births.by_year=[1]\nrun.seed=4", "! --set births.by_year=[1]?run.seed=4: more than one value is given; quote the whole argument for your shell"},
		{"births.by_year=0.9", "! --set births.by_year=0.9: births.by_year: 0.9 is not a list; give a list: [ ... ]"},
		{"births.rat=1", "! --set births.rat=1: births.rat: is not a key of a case; did you mean births.rate?"},
		{"harvest.control.tak=1", "! --set harvest.control.tak=1: harvest.control.tak: is not a key of a case; did you mean harvest.control.take?"},
		{"harvst.1.take=1", "! --set harvst.1.take=1: harvst: is not a table of a case; did you mean [[harvest]]?"},
		{"births.rate=\x1b[31m1", "! --set births.rate=?[31m1: births.rate: \"\\x1b[31m1\" is not a number; give a number, 0 or more: births per head (or per 100, 1000) a year"},
	} {
		got := said(ParseSetting(c.text))
		if got != c.want {
			t.Errorf("%q\n gives %s\n  want %s", c.text, got, c.want)
		}
	}
}

func said(settings []pva.Setting, err error) string {
	if err != nil {
		return "! " + err.Error()
	}
	out := make([]string, len(settings))
	for i, s := range settings {
		v := s.Value.String()
		if s.Value.Kind == pva.TextKind {
			v = fmt.Sprintf("%q", v)
		}
		out[i] = s.Path + " " + v
	}
	return strings.Join(out, ", ")
}

const withControl = smallCase + `
[[harvest]]
name = "control"
rule = "constant"
take = 8
when = "end"

[[option]]
name = "half"
set = { "harvest.control.take" = 4 }
`

// TestOverride: settings in force, and errors that name --set.
func TestOverride(t *testing.T) {
	base := mustRead(t, "base", []byte(withControl))
	for _, c := range []struct {
		set  string
		want string // of the case, or of the errors
	}{
		{"harvest.control.take=3", ""},
		{"harvest.1.take=3", ""},
		{"deaths.rate=0.2", ""}, // its rival goes
		{"question.horizon=0", "--set: question.horizon: 0 is below 1; give a whole number from 1 to 10000: years looked ahead"},
		{"harvest.other.take=3", `--set: harvest.other.take: the case has no row "other" in [[harvest]]; it has control`},
		{"births.crowding={form='linear',capacity=900,exponent=2}", `--set: births.crowding.exponent: 2 has no use with form = "linear"; remove it, or choose form = "theta"`},
		{"births.crowding={form='linear'}", "--set: births.crowding.capacity: is missing; give either capacity or scale"},
		{"case.title=true", "--set: case.title: true is not a text; put it in quotes"},
		// The option sets a take, which a ladder has no use for.
		{"harvest.control={rule='ladder',points=[[1,2],[3,4]]}", `--set: option.half.set: harvest.control.take: 4 has no use with rule = "ladder"; remove it, or choose rule = "constant"`},
		{"births.crowding={form='ricker',capacity=1e11,exponent=2}", `--set: births.crowding.exponent: 2 has no use with form = "ricker"; remove it, or choose form = "theta"`},
	} {
		settings, err := ParseSetting(c.set)
		if err != nil {
			t.Errorf("%s: %v", c.set, err)
			continue
		}
		got, errs := Override(base, settings)
		switch {
		case c.want == "" && len(errs) > 0, c.want != "" && errs.Error() != c.want:
			t.Errorf("%s\n gives %v\n  want %s", c.set, errs, c.want)
		case c.want == "" && got.Digest() == base.Digest():
			t.Errorf("%s changes nothing", c.set)
		}
	}
	settings, err := ParseSetting("births.rate=0.01")
	if err != nil {
		t.Fatal(err)
	}
	crowded := mustRead(t, "crowded", []byte(strings.Replace(smallCase, "rate = 0.45", "rate = 0.45\ncrowding = { form = \"linear\", capacity = 900 }", 1)))
	if _, errs := Override(crowded, settings); len(errs) != 1 || !strings.HasPrefix(errs[0].Error(), "--set: births.crowding.capacity: 900 cannot be reached") {
		t.Errorf("a capacity out of reach gives %v", errs)
	}
}
