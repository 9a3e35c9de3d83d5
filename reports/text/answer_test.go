package text

import (
	"strings"
	"testing"
	"unicode/utf8"

	"ebbline/pva"
	"ebbline/reports"
	"ebbline/reports/internal/invented"
)

func shown(c *pva.Case, change func(*pva.Assessment)) string {
	a := invented.Assessment(c, 1000)
	if change != nil {
		change(a)
	}
	return Answer(reports.Build(a, reports.Meta{Version: "0.1.0", CaseText: "x = 1\n"}), a, false)
}

func fits(t *testing.T, s string) {
	t.Helper()
	for _, line := range strings.Split(s, "\n") {
		if utf8.RuneCountInString(line) > Width {
			t.Errorf("wider than %d columns: %s", Width, line)
		}
	}
}

// TestExactAnswerLeads: the exact risk stands first, once before the options,
// with the simulated one beside it.
func TestExactAnswerLeads(t *testing.T) {
	exact := func(a *pva.Assessment) {
		invented.Exact(a)
		a.Exact.Risk, a.Exact.Extinction, a.BaselineExact.Risk = 0.0307, 0.0211, 0.0103
	}
	out := shown(invented.Case(), exact)
	fits(t, out)
	head, _, _ := strings.Cut(out, "\n  options")
	if n := strings.Count(head, "3.07 %"); n != 1 {
		t.Errorf("the exact risk is printed %d times\n%s", n, head)
	}
	for _, want := range []string{"with the take         3.07 %       exact; simulated ", "without the take      1.03 %       exact; simulated ", "the take adds         2.04 points  exact; simulated ", "none left at the end  2.11 %       exact; simulated "} {
		if !strings.Contains(head, want) {
			t.Errorf("no %q in\n%s", want, head)
		}
	}
	// The options have no exact answers here, so that their column says so.
	if !strings.Contains(out, "options           simulated  interval") {
		t.Errorf("the options do not say that they are simulated\n%s", out)
	}
	out = shown(invented.Case(), func(a *pva.Assessment) {
		exact(a)
		for i := range a.Options {
			a.Options[i].Exact = &pva.ExactAnswer{Risk: 0.0203}
		}
	})
	fits(t, out)
	for _, want := range []string{"options           exact risk  simulated", "the case              3.07 %", "half the control      2.03 %"} {
		if !strings.Contains(out, want) {
			t.Errorf("no %q in\n%s", want, out)
		}
	}
}

// TestOptionsShowWhatApplies: the case first; no columns of a take or a verdict
// without them; as many decimals in every row.
func TestOptionsShowWhatApplies(t *testing.T) {
	out := shown(invented.Case(), nil)
	fits(t, out)
	_, table, _ := strings.Cut(out, "  options")
	rows := strings.Split(table, "\n")
	if !strings.HasPrefix(rows[1], "  the case ") || !strings.Contains(rows[0], "added") || !strings.Contains(rows[0], "taken") || !strings.Contains(rows[0], "verdict") {
		t.Errorf("the options are\n%s", table)
	}
	if !strings.Contains(strings.Join(strings.Fields(out), " "), "taken: adult females a year") {
		t.Errorf("the unit of the take is not said\n%s", out)
	}
	decimals := -1
	for _, row := range rows[1:4] {
		risk, _, _ := strings.Cut(strings.TrimSpace(row[18:]), " %")
		_, rest, _ := strings.Cut(risk, ".")
		if decimals >= 0 && len(rest) != decimals {
			t.Errorf("the risks have different decimals\n%s", table)
		}
		decimals = len(rest)
	}
	bare := shown(invented.Plain(), func(a *pva.Assessment) {
		a.Options = []pva.Alternative{{Name: "other", Outcome: a.Outcome, Difference: pva.Difference{Of: 1000}}}
	})
	_, table, _ = strings.Cut(bare, "  options")
	head, _, _ := strings.Cut(table, "\n")
	if head == "" || strings.Contains(head, "added") || strings.Contains(head, "taken") || strings.Contains(head, "verdict") {
		t.Errorf("without a take and a limit the columns are %q", head)
	}
}

// TestNumbersKeepTheirPercent: no line starts with a percent sign.
func TestNumbersKeepTheirPercent(t *testing.T) {
	s := strings.Repeat("x", 70) + " of 12345 % and more"
	if got := wrap(s, "", 0); got != strings.Repeat("x", 70)+" of\n12345 % and more\n" {
		t.Errorf("wrapped to %q", got)
	}
}

func TestExactSaysWhatItsErrorIs(t *testing.T) {
	c := invented.Plain()
	h := c.Question.Horizon
	e := &pva.ExactAnswer{Risk: 0.1, Extinction: 5e-19, Error: 3e-8, Method: "generator", States: 261, Fallen: make([]float64, h), Extinct: make([]float64, h)}
	out := Exact(c, "bee.toml", e, pva.NoVerdict, []pva.Warning{{Key: "births.year_sd", Text: "no variation"}})
	fits(t, out)
	if strings.Contains(out, "replicates") || !strings.Contains(out, "The error stated is that of the computation alone") || !strings.Contains(out, "<0.000001 %") || !strings.Contains(out, "error at most 0.000003 %") {
		t.Errorf("it says\n%s", out)
	}
	if n := strings.Count(strings.ToLower(out), "no variation"); n != 1 {
		t.Errorf("missing variation is said %d times\n%s", n, out)
	}
}

func TestCheckWords(t *testing.T) {
	for bound, want := range map[float64]string{3e-9: "by less than 0.0001", 0.0123: "by more than about 0.012", 0.5: "is not bounded", 0.97: "is not bounded"} {
		if got := boundWords(bound); !strings.Contains(got, want) {
			t.Errorf("bound %v: %s", bound, got)
		}
	}
	for _, c := range [][3]string{{"1", "animals per counting unit", "animal per counting unit"}, {"1", "heads", "head"}, {"2", "heads", "heads"}, {"1", "adult fish", "adult fish"}} {
		if got := oneOf(c[0], c[1]); got != c[2] {
			t.Errorf("%s %s, not %s", c[0], got, c[2])
		}
	}
	source := "nest survey of the whole reserve 2014-2023, table 2 of its report, with the later corrections"
	for _, value := range []string{"8", strings.Repeat("v", 60)} {
		out := hung([][]string{{"key", value, source}, {"other", "2", "stated"}}, "    ")
		fits(t, out)
		if got := strings.Join(strings.Fields(out), " "); !strings.Contains(strings.ReplaceAll(got, " other 2 stated", ""), source) {
			t.Errorf("the source is not whole:\n%s", out)
		}
	}
}
