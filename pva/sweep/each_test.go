package sweep

import (
	"context"
	"math"
	"strings"
	"testing"

	"ebbline/pva"
	"ebbline/pva/assess"
	"ebbline/pva/rates"
)

// TestEach: every number about the population has its two cells and no other
// has, each cell is the case with that one number changed, and the ranking is by
// how far the risk moves.
func TestEach(t *testing.T) {
	c := marsh(t, "start.year", 2030, "case.count_years", 20, "weather.correlation", -.95, "harvest.1.extra_deaths", 0, "births.by_year.1", 1, "births.by_year.2", .9)
	s, err := NewEach(c, 0.1, false)
	if err != nil {
		t.Fatal(err)
	}
	inputs := []string{"start.abundance", "start.cv", "births.rate", "births.year_sd", "births.crowding.capacity", "births.by_year.1", "births.by_year.2", "deaths.fraction", "deaths.year_sd",
		"weather.correlation", "catastrophe.1.chance", "catastrophe.1.kills", "harvest.1.take"}
	count := map[string]int{}
	for _, ch := range s.Changes {
		count[ch.Path]++
		want := nearestDecimal(ch.From * 1.1)
		if ch.To < ch.From == (ch.From > 0) {
			want = nearestDecimal(ch.From * 0.9)
		}
		if ch.Path == "weather.correlation" && ch.To < ch.From {
			want = -1 // the end of what it may be
		}
		if ch.Path == "weather.correlation" && ch.To > ch.From {
			want = -0.855
		}
		if ch.To != want {
			t.Errorf("%s from %v to %v, want %v", ch.Path, ch.From, ch.To, want)
		}
	}
	for _, in := range inputs {
		if count[in] != 2 {
			t.Errorf("%s has %d cells", in, count[in])
		}
		delete(count, in)
	}
	if len(count) > 0 {
		t.Errorf("changed too: %v", count)
	}
	if len(s.Left) != 1 || s.Left[0].What != "harvest.control.extra_deaths" {
		t.Errorf("left out: %v", s.Left)
	}
	r := run(t, s, Options{})
	order := Influences(r)
	for i, in := range order {
		for _, o := range []*Outcome{in.Less, in.More} {
			if i > 0 && order[i-1].Span < in.Span || math.Abs(o.Risk.Estimate-r.Case.Risk.Estimate) > in.Span {
				t.Errorf("%s: %v", in.Key, in.Span)
			}
		}
	}
	if len(order) != len(inputs) || order[0].Span == 0 {
		t.Errorf("%d inputs ranked", len(order))
	}
	// One of the cells against an assessment.
	cell, _ := c.With([]pva.Setting{{Path: "deaths.fraction", Value: pva.Num(.297)}})
	a, err := assess.Run(context.Background(), cell, assess.Options{Exact: assess.ExactNever})
	if err != nil {
		t.Fatal(err)
	}
	for _, in := range order {
		if in.Path == "deaths.fraction" && (in.More.Risk != a.Outcome.Risk || in.More.Difference.Estimate <= 0) {
			t.Errorf("deaths of 0.297: %+v, assessed %+v", in.More.Risk, a.Outcome.Risk)
		}
	}
}

// TestStructures: every form has the capacity and the growth at small numbers of
// the case, and forms that cannot have are left out with a reason.
func TestStructures(t *testing.T) {
	for _, c := range []*pva.Case{
		marsh(t), // linear crowding in births, without memory
		caseOf(t, "question.threshold", 5, "question.horizon", 20, "start.abundance", 50, "births.breeding", "flow", "births.rate", .5, "births.year_sd", .1, "deaths.rate", .3,
			"deaths.crowding.form", "linear", "deaths.crowding.scale", 90, "weather.memory", .4, "run.replicates", 500),
	} {
		s, err := NewStructures(c)
		if err != nil {
			t.Fatal(err)
		}
		k := capacityOrFail(t, s.base)
		for i, ch := range s.Changes {
			m, err := s.model(i)
			if err != nil {
				t.Fatal(err)
			}
			if got := resting(m); math.Abs(got/k-1) > 1e-6 {
				t.Errorf("%s rests at %v, the case at %v", ch.Name, got, k)
			}
			a, b := m.GrowthAt(1e-6), s.base.GrowthAt(1e-6)
			if math.Abs(a.Flow/b.Flow-1) > 1e-6 || math.Abs(a.Pulse/b.Pulse-1) > 1e-6 {
				t.Errorf("%s grows by %v, the case by %v", ch.Name, a, b)
			}
		}
		// Seven forms, with and without memory, less the case itself.
		if len(s.Changes) != 13 || len(s.Left) != 0 {
			t.Errorf("%d forms, left out %v", len(s.Changes), s.Left)
		}
		d := DoubtsOf(run(t, s, Options{}))
		if d.Forms.Cells != 13 || !(d.Forms.High > d.Forms.Low) || d.Inputs.Cells != 0 {
			t.Errorf("%+v", d)
		}
	}
	// Births of a hyperbola never balance no deaths; and no crowding, no forms.
	c := caseOf(t, "question.threshold", 5, "question.horizon", 20, "start.abundance", 50, "births.breeding", "flow", "births.rate", .5, "births.year_sd", .1, "deaths.rate", .3)
	s, err := NewStructures(c)
	if err != nil || len(s.Changes) != 1 || len(s.Left) != 1 || !strings.Contains(s.Left[0].Reason, "no capacity") {
		t.Errorf("%v %v %v", err, s.Changes, s.Left)
	}
	c = caseOf(t, "question.threshold", 5, "question.horizon", 20, "start.abundance", 50, "births.breeding", "flow", "births.rate", .5, "births.crowding.form", "linear", "births.crowding.capacity", 100, "deaths.rate", 0)
	if s, err = NewStructures(c); err == nil {
		t.Errorf("no deaths, but %v; left %v", s.Changes, s.Left)
	}
	both, err := NewEach(marsh(t), 0.1, true)
	if err != nil || both.Kind != Both {
		t.Fatal(err)
	}
	if d := DoubtsOf(run(t, both, Options{})); d.Forms.Cells != 13 || d.Inputs.Cells < 15 || d.Inputs.High <= d.Inputs.Low || d.Replicates.Of != 1000 {
		t.Errorf("%+v", d)
	}
}

func capacityOrFail(t *testing.T, m *rates.Model) float64 {
	t.Helper()
	k, err := capacityOf(m)
	if err != nil {
		t.Fatal(err)
	}
	return k
}
