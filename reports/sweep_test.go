package reports

import (
	"context"
	"math"
	"strings"
	"testing"

	"ebbline/pva"
	"ebbline/pva/sweep"
)

// pond is a small invented case; more adds keys and values.
func pond(t *testing.T, more ...any) *pva.Case {
	t.Helper()
	pairs := append([]any{"case.title", "an invented pond", "case.counts", "adult females", "question.threshold", 10, "question.horizon", 12, "question.limit", .15, "start.abundance", 50,
		"births.breeding", "pulse", "births.rate", .45, "births.year_sd", .15, "births.crowding.form", "linear", "births.crowding.capacity", 110, "deaths.fraction", .27,
		"harvest.1.name", "control", "harvest.1.rule", "constant", "harvest.1.take", 3, "harvest.1.when", "end", "run.replicates", 400}, more...)
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
		}
		entries = append(entries, pva.Entry{Path: pairs[i].(string), Value: v, Origin: pva.FromCase})
	}
	c, faults := pva.Build(entries)
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	return c
}

func swept(t *testing.T, s *sweep.Study, err error) (*sweep.Result, *sweep.Crossing) {
	t.Helper()
	if err != nil {
		t.Fatal(err)
	}
	r, err := sweep.Open(s, sweep.Options{Command: "sweep"})
	if err != nil {
		t.Fatal(err)
	}
	out, err := r.Run(context.Background())
	if err != nil {
		t.Fatal(err)
	}
	var largest *sweep.Crossing
	if s.Kind == sweep.Grid {
		if largest, err = r.Largest(context.Background(), out, sweep.SearchOptions{NoExact: true, Most: 800}); err != nil {
			t.Fatal(err)
		}
	}
	return out, largest
}

// TestSweepReport: every cell stands in its row with its own figures, the map has
// the risk of each pair of values at its place, and the search's answer is on
// the first page.
func TestSweepReport(t *testing.T) {
	c := pond(t, "sweep.1.key", "harvest.control.take", "sweep.1.from", 0, "sweep.1.to", 8, "sweep.1.step", 2, "sweep.2.key", "start.abundance", "sweep.2.values.1", 30, "sweep.2.values.2", 60)
	s, err := sweep.NewGrid(c)
	out, largest := swept(t, s, err)
	r := BuildSweep(out, largest, Meta{Version: "1", Command: "ebbline sweep pond.toml", CaseText: "x = 1\n", CaseFile: "pond.toml"})
	p := r.Part(PartHarvest)
	if p == nil || r.Parts[0].Name != PartAnswer {
		t.Fatal("no sheet Harvest behind the answer")
	}
	cells, risks := r.Table("cells"), r.Table("risk_map")
	for i, o := range out.Cells {
		id := "cell_" + yearID(i+1)
		for key, want := range map[string]float64{"key_1": o.Values[0], "key_2": o.Values[1], "estimate": o.Risk.Estimate, "low": o.Risk.Low, "high": o.Risk.High, "count": float64(o.Risk.Count),
			"base": o.Baseline.Estimate, "added": 100 * o.Added.Estimate, "taken": o.TakeMean, "smallest": o.SmallestMean} {
			if got := cells.Cell(id, key).Num; got != want {
				t.Errorf("%s %s: %v, want %v", id, key, got, want)
			}
		}
		if cells.Cell(id, "verdict").Text != string(o.Verdict) || (cells.Cell(id, "best").Text == "yes") != o.Best {
			t.Errorf("%s: %+v", id, cells.Rows[i])
		}
		for _, f := range []string{"estimate", "low", "high", "added"} {
			if cells.Cell(id, f).Formula == "" {
				t.Errorf("%s %s has no formula", id, f)
			}
		}
		for row := range risks.Rows {
			if risks.Rows[row].Cells[0].Num == o.Values[0] {
				at := 1
				if o.Values[1] == 60 {
					at = 2
				}
				if got := risks.Rows[row].Cells[at].Num; got != o.Risk.Estimate {
					t.Errorf("map at %v: %v, want %v", o.Values, got, o.Risk.Estimate)
				}
			}
		}
	}
	if !largest.Found || r.Table("numbers").Cell("value", "value").Num != largest.Value || len(r.Table("trace").Rows) != len(largest.Points) {
		t.Errorf("largest %v: %+v", largest.Value, r.Table("numbers").Rows)
	}
	trade := r.Table("trade_off")
	for i := 1; i < len(trade.Rows); i++ {
		if trade.Rows[i].Cells[0].Num <= trade.Rows[i-1].Cells[0].Num || trade.Rows[i].Cells[1].Num < trade.Rows[i-1].Cells[1].Num {
			t.Errorf("the trade-off does not rise at row %d", i)
		}
	}
	for _, name := range []string{PartInputs, PartModel, PartCautions, PartRunAgain} {
		if r.Part(name) == nil {
			t.Error("no sheet " + name)
		}
	}
	// One key that is no take: a plain grid sheet.
	s, err = sweep.NewGrid(pond(t, "sweep.1.key", "births.rate", "sweep.1.values.1", .42, "sweep.1.values.2", .5))
	out, largest = swept(t, s, err)
	r = BuildSweep(out, largest, Meta{})
	if r.Part(PartGrid) == nil || r.Part(PartHarvest) != nil || len(r.Part(PartGrid).Charts) == 0 {
		t.Error("a grid over births has no plain sheet with its chart")
	}
}

// TestMattersReport: the inputs stand in the order of what they do, and the three
// sources of doubt side by side.
func TestMattersReport(t *testing.T) {
	s, err := sweep.NewEach(pond(t), .1, true)
	out, _ := swept(t, s, err)
	r := BuildSweep(out, nil, Meta{})
	rows := r.Table("influences").Rows
	for i := range rows {
		if span := rows[i].Cells[len(rows[i].Cells)-1].Num; i > 0 && span > rows[i-1].Cells[len(rows[i-1].Cells)-1].Num || math.IsNaN(span) {
			t.Errorf("row %d is out of order", i)
		}
	}
	d := sweep.DoubtsOf(out)
	if got := r.Table("doubts"); len(got.Rows) != 3 || got.Cell("forms", "high").Num != d.Forms.High || got.Cell("inputs", "low").Num != d.Inputs.Low || got.Cell("replicates", "low").Num != out.Case.Risk.Low {
		t.Errorf("%+v", got.Rows)
	}
	if n := len(r.Table("forms").Rows); n != 1+d.Forms.Cells {
		t.Errorf("%d rows of forms, want %d and the case", n, d.Forms.Cells)
	}
}

// TestMinimumReport: the size and the trace, or why there is none.
func TestMinimumReport(t *testing.T) {
	for want, c := range map[string]*pva.Case{
		"The smallest start estimated to be viable is": pond(t, "minimum.from", 12, "minimum.to", 400),
		"No minimum: none up to 40":                    pond(t, "minimum.from", 12, "minimum.to", 40, "minimum.risk", .0001),
	} {
		s, q, err := sweep.NewMinimum(c)
		if err != nil {
			t.Fatal(err)
		}
		open, err := sweep.Open(s, sweep.Options{Command: "minimum"})
		if err != nil {
			t.Fatal(err)
		}
		l, err := open.Smallest(context.Background(), q, sweep.SearchOptions{NoExact: true, Most: 800})
		if err != nil {
			t.Fatal(err)
		}
		r := BuildMinimum(s, q, l, Meta{})
		if !strings.HasPrefix(r.VerdictText, want) || len(r.Table("trace").Rows) != len(l.Points) || r.Part(PartMinimum) == nil {
			t.Errorf("%s: %s", want, r.VerdictText)
		}
	}
}
