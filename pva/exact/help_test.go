package exact

import (
	"context"
	"strconv"
	"testing"

	"ebbline/pva"
	"ebbline/pva/rates"
)

// set is the keys of an invented case.
type set map[string]any

// with is a copy with further keys.
func (s set) with(more set) set {
	out := set{}
	for k, v := range s {
		out[k] = v
	}
	for k, v := range more {
		out[k] = v
	}
	return out
}

// model builds the case and its formulas. Lists are given as []float64.
func model(t testing.TB, keys set) *rates.Model {
	t.Helper()
	var entries []pva.Entry
	add := func(path string, v pva.Value) {
		entries = append(entries, pva.Entry{Path: path, Value: v, Origin: pva.FromCase})
	}
	for path, v := range keys {
		switch v := v.(type) {
		case nil: // taken away
		case float64:
			add(path, pva.Num(v))
		case int:
			add(path, pva.Num(float64(v)))
		case string:
			add(path, pva.Text(v))
		case bool:
			add(path, pva.Flag(v))
		case []float64:
			for i, x := range v {
				add(path+"."+strconv.Itoa(i+1), pva.Num(x))
			}
		default:
			t.Fatalf("%s: %T", path, v)
		}
	}
	c, faults := pva.Build(entries)
	if len(faults) > 0 {
		t.Fatalf("the case has faults: %v", faults)
	}
	m, more := rates.New(c)
	if len(more) > 0 {
		t.Fatalf("the case has faults: %v", more)
	}
	return m
}

// answer solves a case that must have an exact answer.
func answer(t testing.TB, keys set) *pva.ExactAnswer {
	t.Helper()
	a, err := Solve(context.Background(), model(t, keys), Options{})
	if err != nil {
		t.Fatal(err)
	}
	if a.Reason != "" {
		t.Fatalf("no exact answer: %s", a.Reason)
	}
	return a
}

func pulse(n0, threshold float64, horizon int, births, deaths float64) set {
	return set{"start.abundance": n0, "question.threshold": threshold, "question.horizon": horizon,
		"births.breeding": "pulse", "births.rate": births, "deaths.fraction": deaths}
}

func flow(n0, threshold float64, horizon int, births, deaths float64) set {
	return set{"start.abundance": n0, "question.threshold": threshold, "question.horizon": horizon,
		"births.breeding": "flow", "births.rate": births, "deaths.rate": deaths}
}
