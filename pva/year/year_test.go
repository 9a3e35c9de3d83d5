package year

import (
	"context"
	"testing"

	"ebbline/pva"
	"ebbline/pva/ensemble"
	"ebbline/pva/rates"
)

// caseOf makes a case from path and value pairs; numbers, words and flags.
func caseOf(t testing.TB, pairs ...any) *pva.Case {
	t.Helper()
	var entries []pva.Entry
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
		entries = append(entries, pva.Entry{Path: pairs[i].(string), Value: v, Origin: pva.FromCase})
	}
	c, faults := pva.Build(entries)
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	return c
}

func run(t testing.TB, c *pva.Case, replicates int64, workers int) *pva.Tally {
	t.Helper()
	m, faults := rates.New(c)
	if len(faults) > 0 {
		t.Fatal(pva.Faults(faults))
	}
	e, err := New(c.Run.Seed, m)
	if err != nil {
		t.Fatal(err)
	}
	out, err := ensemble.Run(context.Background(), e, ensemble.Plan{Replicates: replicates, Workers: workers})
	if err != nil {
		t.Fatal(err)
	}
	return out[0]
}
