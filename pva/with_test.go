package pva

import (
	"reflect"
	"slices"
	"strings"
	"testing"
)

// entries makes entries from "key value" lines; texts are in quotes.
func entries(lines string) []Entry {
	var out []Entry
	for line := range strings.Lines(strings.TrimSpace(lines)) {
		key, v, _ := strings.Cut(strings.TrimSpace(line), " = ")
		out = append(out, Entry{Path: key, Value: valueOf(v), Origin: FromCase, Source: "a source"})
	}
	return out
}

func valueOf(v string) Value {
	switch {
	case v == "(list)":
		return Value{Kind: ListKind}
	case v == "true" || v == "false":
		return Flag(v == "true")
	case strings.HasPrefix(v, `"`):
		return Text(strings.Trim(v, `"`))
	}
	var n float64
	for i, r := range strings.Replace(v, ".", "", 1) {
		_ = i
		n = n*10 + float64(r-'0')
	}
	if at := strings.IndexByte(v, '.'); at >= 0 {
		for range v[at+1:] {
			n /= 10
		}
	}
	return Num(n)
}

func settings(lines ...string) []Setting {
	var out []Setting
	for _, line := range lines {
		key, v, _ := strings.Cut(line, " = ")
		out = append(out, Setting{key, valueOf(v)})
	}
	return out
}

const herons = `
question.threshold = 20
question.horizon = 50
start.abundance = 180
births.breeding = "pulse"
births.rate = 0.5
births.parents = "all"
births.offspring = "clumped"
births.clumping = 2
births.crowding.form = "theta"
births.crowding.capacity = 400
births.crowding.exponent = 2
births.by_year.1 = 1
births.by_year.2 = 0.9
births.by_year.3 = 0.8
deaths.fraction = 0.25
catastrophe.1.name = "drought"
catastrophe.1.once_in = 25
catastrophe.1.kills = 0.3
harvest.1.name = "control"
harvest.1.rule = "constant"
harvest.1.take = 8
harvest.1.when = "end"
harvest.1.survey_cv = 0.2
harvest.2.name = "eggs"
harvest.2.rule = "ladder"
harvest.2.when = "start"
harvest.2.points.1.1 = 50
harvest.2.points.1.2 = 0
harvest.2.points.2.1 = 90
harvest.2.points.2.2 = 6
`

func heronCase(t *testing.T) *Case {
	t.Helper()
	c, faults := Build(entries(herons))
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	return c
}

func mustWith(t *testing.T, c *Case, lines ...string) *Case {
	t.Helper()
	out, faults := c.With(settings(lines...))
	if len(faults) > 0 {
		t.Fatalf("%v: %v", lines, faults)
	}
	return out
}

func paths(c *Case) []string {
	var out []string
	for _, e := range c.Entries() {
		out = append(out, e.Path)
	}
	return out
}

func has(c *Case, path string) bool { return slices.Contains(paths(c), path) }

// TestWithLeavesTheCaseAlone: the case changed is as it was, and a setting to
// the same value changes only where the value comes from.
func TestWithLeavesTheCaseAlone(t *testing.T) {
	c := heronCase(t)
	before, digest := c.Entries(), c.Digest()
	other := mustWith(t, c, "harvest.control.take = 3", "births.by_year = (list)", "births.by_year.1 = 2")
	if !reflect.DeepEqual(before, c.Entries()) || c.Digest() != digest {
		t.Error("With changes the case that it starts from")
	}
	if other.Harvest[0].Take != (Optional{3, true}) || c.Harvest[0].Take != (Optional{8, true}) {
		t.Errorf("takes %v and %v, want 3 and 8", other.Harvest[0].Take, c.Harvest[0].Take)
	}
	for _, e := range other.Entries() {
		want := FromCase
		if e.Path == "harvest.1.take" || e.Path == "births.by_year.1" {
			want = FromOverride
		}
		if e.Origin != want {
			t.Errorf("%s comes from %d, want %d", e.Path, e.Origin, want)
		}
	}
}

// TestWithDropsWhatHasNoUse: keys of the old rule, form or reading go, keys of
// other rows stay.
func TestWithDropsWhatHasNoUse(t *testing.T) {
	c := heronCase(t)
	for _, x := range []struct {
		set        []string
		gone, kept []string
	}{
		{[]string{`harvest.control.rule = "fraction"`, "harvest.control.fraction = 0.1"}, []string{"harvest.1.take"}, []string{"harvest.1.survey_cv", "harvest.2.points.1.1"}},
		{[]string{`harvest.eggs.rule = "constant"`, "harvest.eggs.take = 2"}, []string{"harvest.2.points.1.1", "harvest.2.points.2.2"}, []string{"harvest.1.take"}},
		{[]string{`births.crowding.form = "linear"`}, []string{"births.crowding.exponent"}, []string{"births.crowding.capacity"}},
		{[]string{`births.crowding.form = "none"`}, []string{"births.crowding.exponent", "births.crowding.capacity"}, nil},
		{[]string{`births.offspring = "poisson"`}, []string{"births.clumping"}, []string{"births.parents"}},
		// Without pulse the offspring law goes, and with it what it needed.
		{[]string{`births.breeding = "flow"`}, []string{"births.parents", "births.offspring", "births.clumping"}, []string{"births.rate"}},
		{[]string{`births.breeding = "flow"`, `harvest.control.when = "through"`}, []string{"harvest.1.survey_cv"}, []string{"harvest.1.take"}},
	} {
		got := mustWith(t, c, x.set...)
		for _, p := range x.gone {
			if has(got, p) {
				t.Errorf("%v: %s is still there", x.set, p)
			}
			if !has(c, p) {
				t.Errorf("%s was never there", p)
			}
		}
		for _, p := range x.kept {
			if !has(got, p) {
				t.Errorf("%v: %s is gone", x.set, p)
			}
		}
	}
}

// TestWithRefusesWhatItSetsInVain: a key that is itself set is not dropped.
func TestWithRefusesWhatItSetsInVain(t *testing.T) {
	for _, x := range []struct {
		set  []string
		want string
	}{
		{[]string{"harvest.control.spare = 50"}, `harvest.control.spare: 50 has no use with rule = "constant"; remove it, or choose rule = "above"`},
		{[]string{`births.breeding = "flow"`, `births.parents = "all"`}, `births.parents: "all" has no use with breeding = "flow"; remove it, or choose breeding = "pulse"`},
		{[]string{"harvest.control.points = (list)", "harvest.control.points.1.1 = 4", "harvest.control.points.1.2 = 4"}, `harvest.control.points: has no use with rule = "constant"; remove it, or choose rule = "ladder"`},
		{[]string{"births.crowding.form = 4"}, `births.crowding.form: 4 is not a text; give "none", "linear", "theta", "ricker" or "hyperbolic": how births change with N`},
		{[]string{"harvest.contrl.take = 4"}, `harvest.contrl.take: the case has no row "contrl" in [[harvest]]; it has control, eggs`},
		{[]string{"harvest.3.take = 4"}, `harvest.3.take: the case has no row "3" in [[harvest]]; it has control, eggs`},
		{[]string{"stocking.1.add = 4"}, `stocking.1.add: the case has no row "1" in [[stocking]]; the case has no [[stocking]]`},
		{[]string{"births.by_year.5 = 4"}, `births.by_year.4: is missing; number them 1, 2, 3 without gaps: the case has births.by_year.5`},
		{[]string{"births.by_year.999999 = 4"}, `births.by_year.4: is missing; number them 1, 2, 3 without gaps: the case has births.by_year.999999`},
		{[]string{"births = 4"}, `births: 4 is not a table; write [births] on a line of its own and its keys below`},
		{[]string{"births.by_year = 4"}, `births.by_year: 4 is not a list; write the values between [ and ]`},
		{[]string{`harvest.eggs.name = "control"`}, "harvest.2.name: \"control\" names two rows of [[harvest]]; give each its own name"},
	} {
		got, faults := heronCase(t).With(settings(x.set...))
		if got != nil || faults.Error() != x.want {
			t.Errorf("%v\n gives %v\n  want %s", x.set, faults, x.want)
		}
	}
}

// TestWithReplacesLists: a list is given anew as a whole, one element alone
// leaves the others.
func TestWithReplacesLists(t *testing.T) {
	c := heronCase(t)
	for _, x := range []struct {
		set  []string
		want []float64
	}{
		{[]string{"births.by_year = (list)", "births.by_year.1 = 2"}, []float64{2}},
		{[]string{"births.by_year = (list)"}, nil},
		{[]string{"births.by_year.2 = 5"}, []float64{1, 5, 0.8}},
		{[]string{"births.by_year.4 = 5"}, []float64{1, 0.9, 0.8, 5}},
		// The later list wins over all of the earlier one.
		{[]string{"births.by_year = (list)", "births.by_year.1 = 2", "births.by_year.2 = 3", "births.by_year = (list)", "births.by_year.1 = 4"}, []float64{4}},
		{[]string{"births.by_year.1 = 7", "births.by_year = (list)", "births.by_year.1 = 4"}, []float64{4}},
	} {
		if got := mustWith(t, c, x.set...).Births.ByYear; !slices.Equal(got, x.want) {
			t.Errorf("%v gives %v, want %v", x.set, got, x.want)
		}
	}
	got := mustWith(t, c, "harvest.eggs.points = (list)", "harvest.eggs.points.1.1 = 40", "harvest.eggs.points.1.2 = 3")
	if want := [][2]float64{{40, 3}}; !reflect.DeepEqual(got.Harvest[1].Points, want) {
		t.Errorf("points %v, want %v", got.Harvest[1].Points, want)
	}
	// All rows of a table anew, more and fewer than there were.
	anew := []string{"catastrophe = (list)"}
	for _, n := range []string{"1", "2", "3"} {
		anew = append(anew, "catastrophe."+n+".chance = 0.1", "catastrophe."+n+".kills = 0.2")
	}
	if got := mustWith(t, c, anew...); len(got.Catastrophe) != 3 || got.Catastrophe[0].Name != "" || got.Catastrophe[0].OnceIn.Set {
		t.Errorf("catastrophes %+v", got.Catastrophe)
	}
	if got := mustWith(t, c, "catastrophe = (list)"); len(got.Catastrophe) != 0 {
		t.Errorf("catastrophes %+v, want none", got.Catastrophe)
	}
}

// TestWithRivals: of two keys that exclude each other the one that is set stays;
// if both are set that is a fault.
func TestWithRivals(t *testing.T) {
	c := heronCase(t)
	got := mustWith(t, c, "deaths.rate = 0.3", "births.crowding.scale = 500", "catastrophe.drought.chance = 0.1")
	if got.Deaths.Fraction.Set || got.Deaths.Rate != (Optional{0.3, true}) {
		t.Errorf("deaths %+v", got.Deaths)
	}
	if got.Births.Crowding.Capacity.Set || got.Births.Crowding.Scale != (Optional{500, true}) {
		t.Errorf("crowding %+v", got.Births.Crowding)
	}
	if got.Catastrophe[0].OnceIn.Set || got.Catastrophe[0].Prob() != 0.1 {
		t.Errorf("catastrophe %+v", got.Catastrophe[0])
	}
	for _, set := range [][]string{{"deaths.rate = 0.3", "deaths.fraction = 0.2"}, {"deaths.fraction = 0.2", "deaths.rate = 0.3"}} {
		if _, faults := c.With(settings(set...)); faults.Error() != "deaths.fraction: 0.2 is given beside deaths.rate; give deaths either as a rate per head or as a fraction a year" {
			t.Errorf("%v gives %v", set, faults)
		}
	}
	swept, faults := Build(append(entries(herons), entries("sweep.1.key = \"births.rate\"\nsweep.1.from = 0.4\nsweep.1.to = 0.6\nsweep.1.step = 0.1")...))
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	if got := mustWith(t, swept, "sweep.1.values = (list)", "sweep.1.values.1 = 0.5"); len(got.Sweep[0].Values) != 1 || got.Sweep[0].From.Set || got.Sweep[0].Step.Set {
		t.Errorf("sweep %+v", got.Sweep[0])
	}
}

// TestWithLastSettingWins, in either way of naming a row.
func TestWithLastSettingWins(t *testing.T) {
	c := mustWith(t, heronCase(t), "harvest.control.take = 3", "harvest.1.take = 4")
	if c.Harvest[0].Take.Value != 4 {
		t.Errorf("take %v, want 4", c.Harvest[0].Take.Value)
	}
	d := mustWith(t, heronCase(t), "harvest.1.take = 4")
	if c.Digest() != d.Digest() {
		t.Error("the digest tells of a setting that was overruled")
	}
}

// TestOptionsNeedNotFitEachOther: an option may drop what another one sets.
func TestOptionsNeedNotFitEachOther(t *testing.T) {
	c, faults := Build(append(entries(herons), entries(`
option.1.name = "fewer"
option.1.set.harvest.control.take = 4
option.2.name = "a share"
option.2.set.harvest.control.rule = "fraction"
option.2.set.harvest.control.fraction = 0.1`)...))
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	for _, o := range c.Option {
		with, faults := c.With(o.Set)
		if len(faults) > 0 {
			t.Errorf("%s: %v", o.Name, faults)
			continue
		}
		if len(with.Option) != 2 {
			t.Errorf("%s: %d options are left", o.Name, len(with.Option))
		}
	}
	with := mustWith(t, c, `harvest.control.rule = "fraction"`, "harvest.control.fraction = 0.1")
	if faults := with.CheckOptions(); !strings.HasPrefix(faults.Error(), "option.fewer.set: harvest.control.take: 4 has no use") {
		t.Errorf("an option that no longer fits gives %v", faults)
	}
}
