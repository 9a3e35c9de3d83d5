package sweep

import (
	"context"
	"encoding/json"
	"math"
	"testing"

	"ebbline/pva"
)

// caseOf builds a case from key, value pairs.
func caseOf(t testing.TB, pairs ...any) *pva.Case {
	t.Helper()
	var entries []pva.Entry
	at := map[string]int{}
	for i := 0; i < len(pairs); i += 2 {
		var v pva.Value
		switch x := pairs[i+1].(type) {
		case int:
			v = pva.Num(float64(x))
		case float64:
			v = pva.Num(x)
		case string:
			v = pva.Text(x)
		case bool:
			v = pva.Flag(x)
		}
		e := pva.Entry{Path: pairs[i].(string), Value: v, Origin: pva.FromCase}
		if j, twice := at[e.Path]; twice {
			entries[j] = e
			continue
		}
		at[e.Path] = len(entries)
		entries = append(entries, e)
	}
	c, faults := pva.Build(entries)
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	return c
}

// marsh is a small invented case with weather, catastrophes and a take.
func marsh(t testing.TB, more ...any) *pva.Case {
	return caseOf(t, append([]any{"case.title", "an invented marsh", "question.threshold", 10, "question.horizon", 20, "question.limit", 0.1, "start.abundance", 60, "start.cv", .1,
		"births.breeding", "pulse", "births.rate", .45, "births.year_sd", .15, "births.crowding.form", "linear", "births.crowding.capacity", 120, "deaths.fraction", .27, "deaths.year_sd", .06,
		"catastrophe.1.chance", .05, "catastrophe.1.kills", .3, "harvest.1.name", "control", "harvest.1.rule", "constant", "harvest.1.take", 3, "harvest.1.when", "end",
		"run.replicates", 1000, "run.seed", 11}, more...)...)
}

func open(t testing.TB, s *Study, opt Options) *Runner {
	t.Helper()
	if opt.Workers == 0 {
		opt.Workers = 2
	}
	opt.Command = "sweep"
	r, err := Open(s, opt)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { r.Close() })
	return r
}

func grid(t testing.TB, c *pva.Case) *Study {
	t.Helper()
	s, err := NewGrid(c)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func run(t testing.TB, s *Study, opt Options) *Result {
	t.Helper()
	r, err := open(t, s, opt).Run(context.Background())
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// bytesOf is everything derived of a result, to the last bit.
func bytesOf(t testing.TB, r *Result) string {
	t.Helper()
	type row struct {
		O    Outcome
		Bits []uint64
	}
	var rows []row
	for _, o := range append([]*Outcome{r.Case}, r.Cells...) {
		if o == nil {
			rows = append(rows, row{})
			continue
		}
		c := *o
		var bits []uint64
		for _, f := range []*float64{&c.TakeMean, &c.TakeTotalMean, &c.ShortfallMean, &c.ExtraMean, &c.ClosedYears, &c.LastMean, &c.SmallestMean} {
			bits = append(bits, math.Float64bits(*f))
			*f = 0
		}
		rows = append(rows, row{c, bits})
	}
	out, err := json.Marshal(rows)
	if err != nil {
		t.Fatal(err)
	}
	return string(out)
}
