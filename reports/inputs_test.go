package reports

import (
	"slices"
	"strings"
	"testing"

	"ebbline/pva"
	"ebbline/reports/internal/invented"
)

// TestInputsMakeTheCaseAgain reads the table back as a case, leaving out the
// defaults, and must get the same case: by its digest, which covers every key,
// value, source and note.
func TestInputsMakeTheCaseAgain(t *testing.T) {
	unnamed := append(take("1", given("rule", "constant"), given("take", 3), given("name", "first")), take("2", given("rule", "constant"), given("take", 5))...)
	ladder := take("1", given("rule", "ladder"), given("points.1.1", 50), given("points.1.2", 0), given("points.2.1", 90), given("points.2.2", 12), given("existing", true))
	for name, c := range map[string]*pva.Case{
		"invented": invented.Case(), "plain": invented.Plain(), "unnamed": bare(t, unnamed...), "ladder": bare(t, ladder...),
		"large seed": bare(t, pva.Entry{Path: "run.seed", Value: pva.Value{Kind: pva.NumberKind, Num: 1 << 63, Text: "9223372036854775809"}, Origin: pva.FromCase}),
	} {
		var entries []pva.Entry
		table := InputsTable(c)
		for i, row := range table.Rows {
			cell := func(key string) Cell { return table.Rows[i].Cells[table.Column(key)] }
			if cell("status").Text == Default {
				continue
			}
			e := pva.Entry{Path: cell("key").Text, Source: cell("source").Text, Note: cell("note").Text, Origin: pva.FromCase}
			switch v := cell("value"); {
			case v.Kind == FlagCell:
				e.Value = pva.Flag(v.Flag)
			case v.Kind == NumberCell:
				e.Value = pva.Num(v.Num)
			case row.ID == "run.seed":
				e.Value = pva.Value{Kind: pva.NumberKind, Num: 1 << 63, Text: v.Text}
			default:
				e.Value = pva.Text(v.Text)
			}
			entries = append(entries, e)
		}
		again, faults := pva.Build(entries)
		if len(faults) > 0 {
			t.Errorf("%s: %v", name, faults)
			continue
		}
		if again.Digest() != c.Digest() || again.Run.Seed != c.Run.Seed {
			t.Errorf("%s: the case read back from its inputs is another one", name)
		}
	}
}

func TestProvenanceIsCounted(t *testing.T) {
	p := ProvenanceOf(invented.Case())
	want := "14 inputs: 8 sourced, 4 assumed, 2 unsourced (births.year_sd, catastrophe.summer drought.kills)"
	if got := p.Text(); got != want {
		t.Errorf("%s\nwanted %s", got, want)
	}
	if p.Inputs != len(p.Sourced)+len(p.Assumed)+len(p.Unsourced)+len(p.Overridden) {
		t.Errorf("the counts do not add up: %+v", p)
	}
	changed, faults := invented.Case().With([]pva.Setting{{Path: "harvest.control.take", Value: pva.Num(5)}})
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	if p := ProvenanceOf(changed); !slices.Equal(p.Overridden, []string{"harvest.control.take"}) || len(p.Sourced) != 7 {
		t.Errorf("an override is counted as %+v", p)
	}
	// A list is one input however long it is.
	c := bare(t, given("births.by_year.1", 1), given("births.by_year.2", 0.9), given("births.by_year.3", 0.8))
	if p := ProvenanceOf(c); !slices.Equal(p.Unsourced, []string{"start.abundance", "births.rate", "births.by_year", "deaths.rate"}) {
		t.Errorf("a list is counted as %v", p.Unsourced)
	}
}

// TestOnlyDefaultsInForceAreListed: a flow case has no parents, a pulse case no
// sub-steps, a case without uncertain inputs no draws.
func TestOnlyDefaultsInForceAreListed(t *testing.T) {
	has := func(c *pva.Case) map[string]string {
		out := map[string]string{}
		table := InputsTable(c)
		for i := range table.Rows {
			out[table.Rows[i].Cells[0].Text] = table.Rows[i].Cells[table.Column("status")].Text
		}
		return out
	}
	flow, pulse := has(bare(t)), has(invented.Case())
	for key, want := range map[string]string{"births.parents": "", "births.offspring": "", "run.substeps": Default, "run.draws": "", "deaths.per": Default, "births.cycle.period": "", "question.confidence": Default, "births.rate": Unsourced, "births.breeding": Stated, "question.threshold": Stated} {
		if flow[key] != want {
			t.Errorf("flow: %s is %q, not %q", key, flow[key], want)
		}
	}
	for key, want := range map[string]string{"births.parents": Default, "run.substeps": "", "deaths.per": "", "harvest.control.share": Default, "harvest.control.name": "", "harvest.control.take": Sourced, "births.crowding.capacity": Assumed} {
		if pulse[key] != want {
			t.Errorf("pulse: %s is %q, not %q", key, pulse[key], want)
		}
	}
	for key := range pulse {
		if strings.HasPrefix(key, "harvest.1") {
			t.Errorf("%s is listed by position although it has a name", key)
		}
	}
}
