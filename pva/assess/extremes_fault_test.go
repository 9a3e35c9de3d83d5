package assess

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"reflect"
	"strconv"
	"strings"
	"testing"
	"time"

	"ebbline/pva"
	"ebbline/pva/ensemble"
	"ebbline/pva/estimate"
	"ebbline/pva/rates"
	"ebbline/pva/year"
)

// The audit of extremes: every number of a case at the ends of what the key
// table allows, alone and in pairs. A case is refused with a fault, or a
// replicate with an error that says why; what runs gives counts that are counts
// and figures that are figures.

// extremeBases are the cases that are pushed to the ends. Between them they give
// every number that the simulation reads and every word that chooses a law.
func extremeBases() map[string][]any {
	return map[string][]any{
		"pulse, all of it": {"question.threshold", 4, "question.horizon", 4, "start.abundance", 60, "start.cv", 0.1, "start.year", 2031, "births.breeding", "pulse",
			"births.rate", 0.6, "births.per", 1, "births.year_sd", 0.2, "births.crowding.form", "theta", "births.crowding.scale", 200, "births.crowding.exponent", 2,
			"births.scarcity.form", "saturating", "births.scarcity.half_at", 5, "births.trend", 0.01, "births.steps.1.from", 2032, "births.steps.1.factor", 0.9,
			"births.cycle.amplitude", 0.1, "births.cycle.period", 5, "births.cycle.phase", 1, "births.by_year.1", 1, "births.by_year.2", 0.9,
			"deaths.fraction", 0.3, "deaths.year_sd", 0.1, "deaths.crowding.form", "linear", "deaths.crowding.scale", 900, "deaths.trend", 0.01,
			"deaths.steps.1.from", 2032, "deaths.steps.1.factor", 1.1, "deaths.cycle.amplitude", 0.1, "deaths.cycle.period", 4, "deaths.cycle.phase", 1, "deaths.by_year.1", 1, "deaths.by_year.2", 1.1,
			"weather.correlation", -0.3, "weather.memory", 0.4, "catastrophe.1.chance", 0.3, "catastrophe.1.kills", 0.3, "catastrophe.1.kills_sd", 0.1, "catastrophe.1.births_times", 0.5,
			"harvest.1.rule", "ladder", "harvest.1.points.1.1", 20, "harvest.1.points.1.2", 0, "harvest.1.points.2.1", 60, "harvest.1.points.2.2", 6, "harvest.1.when", "start",
			"harvest.1.one_year_in", 2, "harvest.1.stop_below", 10, "harvest.1.leave", 8, "harvest.1.share", 0.5, "harvest.1.survey_cv", 0.2, "harvest.1.survey_every", 2, "harvest.1.take_cv", 0.1, "harvest.1.extra_deaths", 0.2,
			"harvest.2.rule", "above", "harvest.2.fraction", 0.5, "harvest.2.spare", 50, "harvest.2.when", "end", "harvest.3.rule", "by_year", "harvest.3.takes.1", 2, "harvest.3.takes.2", 3, "harvest.3.when", "end", "harvest.3.take_noise", "poisson",
			"stocking.1.add", 2, "stocking.1.when", "start", "stocking.1.one_year_in", 2, "stocking.1.only_below", 50, "stocking.2.add", 3, "stocking.2.when", "end", "stocking.2.noise", "poisson", "ceiling.abundance", 400},
		"pulse, clumped young of all": {"question.threshold", 4, "question.horizon", 4, "start.abundance", 60, "births.breeding", "pulse", "births.rate", 0.6, "births.year_sd", 0.2, "births.parents", "all",
			"births.offspring", "clumped", "births.clumping", 2, "births.crowding.form", "ricker", "births.crowding.capacity", 200, "births.scarcity.form", "proportional", "births.scarcity.at", 40,
			"deaths.rate", 30, "deaths.per", 100, "deaths.year_sd", 10, "catastrophe.1.once_in", 3, "catastrophe.1.kills", 0.5,
			"harvest.1.rule", "fraction", "harvest.1.fraction", 0.1, "harvest.1.when", "end", "harvest.1.take_noise", "each-animal", "harvest.1.share", 2},
		"pulse, one young at most": {"question.threshold", 0, "question.horizon", 4, "start.abundance", 30, "births.breeding", "pulse", "births.rate", 0.5, "births.offspring", "at-most-one",
			"births.crowding.form", "hyperbolic", "births.crowding.scale", 90, "deaths.fraction", 0.4, "harvest.1.rule", "constant", "harvest.1.take", 3, "harvest.1.when", "start"},
		"pulse, nothing but births": {"question.threshold", 0, "question.horizon", 4, "start.abundance", 30, "births.breeding", "pulse", "births.rate", 0.5, "births.year_sd", 0.5, "deaths.rate", 0.4, "births.trend", 0.1},
		"flow, with streams": {"question.threshold", 4, "question.horizon", 3, "start.abundance", 60, "births.breeding", "flow", "births.rate", 0.6, "births.year_sd", 0.2, "births.crowding.form", "linear", "births.crowding.capacity", 200,
			"births.scarcity.form", "proportional", "births.scarcity.at", 300, "deaths.rate", 0.2, "deaths.year_sd", 0.1, "births.trend", 0.01, "deaths.trend", 0.01, "births.by_year.1", 1, "deaths.by_year.1", 1,
			"catastrophe.1.chance", 0.3, "catastrophe.1.kills", 0.3, "catastrophe.1.births_times", 0.5,
			"harvest.1.rule", "constant", "harvest.1.take", 4, "harvest.1.when", "through", "harvest.1.stop_below", 20, "harvest.1.leave", 10, "harvest.1.extra_deaths", 0.5, "harvest.1.share", 1,
			"harvest.2.rule", "fraction", "harvest.2.rate", 0.1, "harvest.2.when", "through", "harvest.2.leave", 15, "harvest.3.rule", "by_year", "harvest.3.takes.1", 2, "harvest.3.when", "through",
			"stocking.1.add", 3, "stocking.1.when", "through", "stocking.1.only_below", 90, "ceiling.abundance", 1000},
		"flow, every event watched": {"question.threshold", 4, "question.horizon", 3, "question.watch", "always", "start.abundance", 60, "births.breeding", "flow", "births.rate", 0.6, "deaths.fraction", 0.2, "deaths.year_sd", 0.05,
			"deaths.crowding.form", "theta", "deaths.crowding.scale", 90, "deaths.crowding.exponent", 2, "deaths.steps.1.from", 2, "deaths.steps.1.factor", 2, "harvest.1.rule", "constant", "harvest.1.take", 4, "harvest.1.when", "end", "run.stop_above", 2000},
		"flow, free":           {"question.threshold", 4, "question.horizon", 3, "start.abundance", 60, "births.breeding", "flow", "births.rate", 0.6, "deaths.rate", 0.5, "births.cycle.amplitude", 0.3, "births.cycle.period", 3},
		"flow, crowded deaths": {"question.threshold", 4, "question.horizon", 3, "start.abundance", 60, "births.breeding", "flow", "births.rate", 0.6, "births.year_sd", 0.1, "deaths.rate", 0.3, "deaths.crowding.form", "linear", "deaths.crowding.capacity", 90},
		"flow, outgrowing":     {"question.threshold", 4, "question.horizon", 4, "start.abundance", 9e8, "births.breeding", "flow", "births.rate", 0.6, "deaths.rate", 0.1, "harvest.1.rule", "fraction", "harvest.1.rate", 0.1, "harvest.1.when", "through", "stocking.1.add", 10, "stocking.1.when", "through"},
		"flow, in sixteen":     {"question.threshold", 4, "question.horizon", 3, "start.abundance", 5000, "births.breeding", "flow", "births.rate", 0.6, "deaths.rate", 0.5, "births.crowding.form", "hyperbolic", "births.crowding.scale", 90000, "run.substeps", "16", "harvest.1.rule", "fraction", "harvest.1.fraction", 0.1, "harvest.1.when", "through", "harvest.1.extra_deaths", 0.1, "stocking.1.add", 30, "stocking.1.when", "through", "births.scarcity.form", "saturating", "births.scarcity.half_at", 9},
		"large pulse":          {"question.threshold", 4, "question.horizon", 3, "start.abundance", 9e8, "births.breeding", "pulse", "births.rate", 0.9, "deaths.fraction", 0.4, "births.crowding.form", "linear", "births.crowding.capacity", 9.5e8, "births.year_sd", 0.2},
		"large flow":           {"question.threshold", 4, "question.horizon", 3, "start.abundance", 9e8, "births.breeding", "flow", "births.rate", 0.6, "deaths.rate", 0.4, "births.crowding.form", "linear", "births.crowding.capacity", 9.5e8, "births.year_sd", 0.2, "harvest.1.rule", "constant", "harvest.1.take", 1e6, "harvest.1.when", "through", "stocking.1.add", 1e6, "stocking.1.when", "through"},
		"pulse, steep": {"question.threshold", 4, "question.horizon", 4, "start.abundance", 1e6, "births.breeding", "pulse", "births.rate", 0.6, "births.crowding.form", "theta", "births.crowding.scale", 2e6, "births.crowding.exponent", 90,
			"deaths.rate", 0.1, "deaths.crowding.form", "theta", "deaths.crowding.scale", 10, "deaths.crowding.exponent", 90, "deaths.by_year.1", 0, "deaths.by_year.2", 1},
		"flow, steep":               {"question.threshold", 4, "question.horizon", 4, "start.abundance", 1e6, "births.breeding", "flow", "births.rate", 0.6, "deaths.rate", 0.1, "deaths.year_sd", 0.1, "deaths.crowding.form", "theta", "deaths.crowding.scale", 10, "deaths.crowding.exponent", 90, "deaths.by_year.1", 0, "deaths.by_year.2", 1},
		"flow, steep, in events":    {"question.threshold", 4, "question.horizon", 4, "start.abundance", 2000, "births.breeding", "flow", "births.rate", 0.6, "deaths.rate", 0.1, "deaths.crowding.form", "theta", "deaths.crowding.scale", 0.5, "deaths.crowding.exponent", 90, "run.substeps", "events", "harvest.1.rule", "constant", "harvest.1.take", 1, "harvest.1.when", "through"},
		"pulse, rising and falling": {"question.threshold", 4, "question.horizon", 400, "start.abundance", 100, "births.breeding", "pulse", "births.rate", 0.6, "births.trend", 10, "births.by_year.1", 0, "births.by_year.2", 1, "deaths.rate", 0.1, "deaths.trend", 10, "deaths.by_year.1", 0, "births.crowding.form", "linear", "births.crowding.scale", 100},
		"takes alone": {"question.threshold", 0, "question.horizon", 4, "start.abundance", 60, "births.breeding", "pulse", "births.rate", 0, "deaths.rate", 0, "harvest.1.rule", "constant", "harvest.1.take", 7, "harvest.1.when", "start",
			"harvest.1.extra_deaths", 0.5, "harvest.1.leave", 3, "harvest.1.stop_below", 5, "stocking.1.add", 5, "stocking.1.when", "end", "stocking.1.only_below", 70},
		"streams alone": {"question.threshold", 0, "question.horizon", 4, "start.abundance", 60, "births.breeding", "flow", "births.rate", 0, "deaths.rate", 0, "harvest.1.rule", "constant", "harvest.1.take", 7, "harvest.1.when", "through",
			"harvest.1.extra_deaths", 0.5, "harvest.1.leave", 3, "harvest.1.stop_below", 5, "stocking.1.add", 5, "stocking.1.when", "through", "stocking.1.only_below", 70},
	}
}

// entriesOf makes entries of path and value pairs.
func entriesOf(pairs []any) []pva.Entry {
	var out []pva.Entry
	for i := 0; i < len(pairs); i += 2 {
		var v pva.Value
		switch x := pairs[i+1].(type) {
		case int:
			v = pva.Num(float64(x))
		case float64:
			v = pva.Num(x)
		case string:
			v = pva.Text(x)
		}
		out = append(out, pva.Entry{Path: pairs[i].(string), Value: v, Origin: pva.FromCase})
	}
	return out
}

// extremesOf are the ends of what the key table allows for a number.
func extremesOf(k *pva.Key) []float64 {
	low, high := k.Min, k.Max
	if k.OpenMin {
		low = math.Nextafter(low, math.Inf(1))
		if k.Min == 0 {
			low = 1e-30 // a case file takes nothing nearer to 0
		}
	}
	if k.OpenMax {
		high = math.Nextafter(high, math.Inf(-1))
	}
	out := []float64{low, high}
	if k.Min < 0 && k.Max > 0 && !k.Whole {
		out = append(out, 0)
	}
	if k.Min == 0 && !k.Whole { // next to nothing, and a size that divides badly
		out = append(out, 1e-30, math.Min(1e-6, high))
	}
	return out
}

// audited says whether the simulation of one case reads the key.
func audited(path string) bool {
	switch top, _, _ := strings.Cut(path, "."); top {
	case "question", "start", "births", "deaths", "weather", "catastrophe", "harvest", "stocking", "ceiling":
		return path != "question.confidence" && path != "question.limit"
	}
	return path == "run.stop_above"
}

// auditSink holds what every census must hold, and counts what it saw.
type auditSink struct {
	t        *testing.T
	what     string
	c        *pva.Case
	alone    bool // nothing but takes and additions changes N
	deadline time.Time
	fallen   uint64
	outgrown uint64
	before   [ensemble.Lanes]int64
	years    int
}

const slowly = "the census of a year came too late"

func (s *auditSink) Census(variant, y int, row *ensemble.Row, caseFallen, otherFallen uint64) {
	s.years++
	if time.Now().After(s.deadline) {
		panic(slowly)
	}
	bad := func(format string, args ...any) {
		s.t.Errorf("%s: year %d: %s", s.what, y, fmt.Sprintf(format, args...))
	}
	if row.Fallen&s.fallen != s.fallen || row.Outgrown&s.outgrown != s.outgrown {
		bad("a replicate is no longer fallen or outgrown")
	}
	used := ^uint64(0) >> uint(ensemble.Lanes-row.Lanes)
	if (row.Fallen|row.Outgrown|row.Closed)&^used != 0 {
		bad("a lane that is not in use is marked")
	}
	for i := 0; i < row.Lanes; i++ {
		if row.Outgrown>>uint(i)&1 != 0 {
			continue
		}
		n := row.N[i]
		if n < 0 || float64(n) > s.c.Run.StopAbove || s.c.Ceiling.Set && float64(n) > s.c.Ceiling.Value {
			bad("N is %d", n)
		}
		if row.Take[i] < 0 || row.Shortfall[i] < 0 || row.Extra[i] < 0 || row.Stocked[i] < 0 {
			bad("take %d, shortfall %d, extra deaths %d, stocked %d", row.Take[i], row.Shortfall[i], row.Extra[i], row.Stocked[i])
		}
		if fallen := row.Fallen>>uint(i)&1 != 0; !fallen && float64(n) <= s.c.Question.Threshold {
			bad("%d is at or below the threshold and not fallen", n)
		}
		if s.alone && y > 1 {
			if want := s.before[i] - row.Take[i] - row.Extra[i] + row.Stocked[i]; n != want {
				bad("N is %d; %d less takes %d and extra deaths %d, with %d added is %d", n, s.before[i], row.Take[i], row.Extra[i], row.Stocked[i], want)
			}
		}
	}
	s.before, s.fallen, s.outgrown = row.N, row.Fallen, row.Outgrown
}

func (s *auditSink) Finish(_ int, end *ensemble.End) {
	for i := 0; i < end.Lanes; i++ {
		if end.Smallest[i] < -1 {
			s.t.Errorf("%s: smallest census %d", s.what, end.Smallest[i])
		}
	}
	s.fallen, s.outgrown = 0, 0
}

// audit runs one case in few replicates and says what came of it.
func audit(t *testing.T, what string, c *pva.Case, alone bool, replicates int64) string {
	t.Helper()
	m, faults := rates.New(c)
	if len(faults) > 0 {
		return "refused"
	}
	engine, err := year.New(7, m)
	if err != nil {
		return "refused"
	}
	sink := &auditSink{t: t, what: what, c: c, alone: alone, deadline: time.Now().Add(time.Second)}
	_, err = ensemble.Into(context.Background(), engine, ensemble.Plan{Replicates: replicates, Workers: 1}, sink)
	switch {
	case err == nil:
		return "ran"
	case strings.Contains(err.Error(), slowly):
		return "slow"
	case strings.Contains(err.Error(), "a bug"):
		head, _, _ := strings.Cut(err.Error(), "\n")
		t.Errorf("%s: %s", what, head)
		return "bug"
	}
	return "stopped"
}

// figures faults every number of a result that is no number and is not said to be
// none: means over nothing, and percentiles among the outgrown.
func figures(t *testing.T, what string, o *pva.Outcome) {
	t.Helper()
	var walk func(path string, v reflect.Value)
	walk = func(path string, v reflect.Value) {
		switch v.Kind() {
		case reflect.Pointer:
			if !v.IsNil() {
				walk(path, v.Elem())
			}
		case reflect.Struct:
			for i := range v.NumField() {
				walk(path+"."+v.Type().Field(i).Name, v.Field(i))
			}
		case reflect.Slice:
			for i := range v.Len() {
				walk(path+"."+strconv.Itoa(i), v.Index(i))
			}
		case reflect.Int64, reflect.Int:
			if v.Int() < 0 {
				t.Errorf("%s: %s is %d", what, path, v.Int())
			}
		case reflect.Float64:
			f := v.Float()
			if !math.IsNaN(f) && !math.IsInf(f, 0) {
				return
			}
			none := strings.Contains(path, "LogGrowth") && o.LogPairs == 0
			none = none || strings.Contains(path, ".Take.") && o.TakeTotalMean == 0 // a case that never takes
			if !none && !(o.Outgrown > 0 && !math.IsInf(f, -1)) {
				t.Errorf("%s: %s is %v", what, path, f)
			}
		}
	}
	for i := range o.Years {
		o.Years[i].Label = 0 // a date may lie before the year 0
	}
	walk("outcome", reflect.ValueOf(o))
	for i := 1; i < len(o.Years); i++ {
		if o.Years[i].Fallen.Count < o.Years[i-1].Fallen.Count || o.Years[i].Outgrown < o.Years[i-1].Outgrown {
			t.Errorf("%s: fewer fallen or outgrown by year %d than before", what, i+1)
		}
	}
}

// TestExtremes puts every number at the ends of its range, alone and in pairs
// (drawn, the same in every run; -long draws twenty times as many).
func TestExtremes(t *testing.T) {
	pairs := 60
	if *long {
		pairs = 3000
	}
	count := map[string]int{}
	tried := map[string]bool{}
	bases := extremeBases()
	var names []string
	for name := range bases {
		names = append(names, name)
	}
	for _, name := range sorted(names) {
		base, faults := pva.Build(entriesOf(bases[name]))
		if len(faults) > 0 {
			t.Fatalf("%s: %v", name, faults)
		}
		alone := strings.HasSuffix(name, "alone")
		if got := audit(t, name, base, alone, 64); got != "ran" {
			t.Errorf("%s: %s", name, got)
		}
		type extreme struct {
			path string
			v    float64
		}
		var all []extreme
		for _, e := range base.Entries() {
			k, _ := pva.Find(e.Path)
			if k == nil || !k.IsNumber() || !audited(e.Path) {
				continue
			}
			tried[k.Path] = true
			for _, v := range extremesOf(k) {
				all = append(all, extreme{e.Path, v})
			}
		}
		all = append(all, extreme{"run.stop_above", 1}, extreme{"run.stop_above", 1e12}, extreme{"question.threshold", 5e8})
		run := func(what string, set ...pva.Setting) {
			c, faults := base.With(set)
			if len(faults) > 0 {
				count["refused"]++
				return
			}
			still := alone && c.Births.Rate == 0 && c.Deaths.Rate.Value == 0
			started := time.Now()
			got := audit(t, what, c, still, 4)
			count[got]++
			if took := time.Since(started); took > 2*time.Second {
				t.Logf("%s: %s after %v", what, got, took.Round(100*time.Millisecond))
			}
			if got != "ran" || len(set) > 1 {
				return
			}
			tallies := tallied(t, c)
			figures(t, what, estimate.Outcome(c, tallies))
		}
		for _, x := range all {
			run(fmt.Sprintf("%s, %s = %g", name, x.path, x.v), pva.Setting{Path: x.path, Value: pva.Num(x.v)})
		}
		g := rand.New(rand.NewPCG(11, 12))
		for range pairs {
			x, y := all[g.IntN(len(all))], all[g.IntN(len(all))]
			run(fmt.Sprintf("%s, %s = %g, %s = %g", name, x.path, x.v, y.path, y.v), pva.Setting{Path: x.path, Value: pva.Num(x.v)}, pva.Setting{Path: y.path, Value: pva.Num(y.v)})
		}
	}
	t.Logf("%v", count)
	for _, k := range pva.Keys() {
		if k.IsNumber() && audited(k.Path) && !tried[k.Path] {
			t.Errorf("%s is in no base: give it one", k.Path)
		}
	}
	if count["ran"] < 300 {
		t.Errorf("only %d runs came to an end", count["ran"])
	}
}

// tallied is the case's tally over few replicates, already known to run.
func tallied(t *testing.T, c *pva.Case) *pva.Tally {
	t.Helper()
	m, faults := rates.New(c)
	if len(faults) > 0 {
		t.Fatal(pva.Faults(faults))
	}
	engine, err := year.New(7, m)
	if err != nil {
		t.Fatal(err)
	}
	out, err := ensemble.Run(context.Background(), engine, ensemble.Plan{Replicates: 4, Workers: 1})
	if err != nil {
		t.Fatal(err)
	}
	return out[0]
}

func sorted(s []string) []string {
	out := append([]string(nil), s...)
	for i := range out {
		for j := i + 1; j < len(out); j++ {
			if out[j] < out[i] {
				out[i], out[j] = out[j], out[i]
			}
		}
	}
	return out
}
