package reports

import (
	"math"
	"strings"
	"testing"

	"ebbline/pva"
	"ebbline/reports/internal/invented"
)

// drawn is the invented assessment with four draws of an uncertain input, made
// by hand; its figures are no results of anything.
func drawn(exact bool) *pva.Assessment {
	c := invented.Case(pva.Entry{Path: "question.limit", Value: pva.Num(0.1), Origin: pva.FromCase},
		pva.Entry{Path: "uncertain.1.key", Value: pva.Text("births.rate"), Origin: pva.FromCase},
		pva.Entry{Path: "uncertain.1.law", Value: pva.Text("uniform"), Origin: pva.FromCase},
		pva.Entry{Path: "uncertain.1.sd", Value: pva.Num(0.02), Origin: pva.FromCase})
	a := invented.Assessment(c, 400)
	a.Exact, a.BaselineExact = &pva.ExactAnswer{Reason: "inputs are uncertain"}, nil
	n := a.Outcome.Risk.Count
	a.Outcome.Risk.Low, a.Outcome.Risk.High = 0.04, 0.16
	risk := pva.DrawnRisk{Fallen: []int64{n / 8, n / 4, n / 4, n - n/8 - 2*(n/4)}, Pooled: a.Outcome.Risk, Spread: pva.VarianceParts{Total: 0.004, Inputs: 0.003, Noise: 0.001},
		Law:    pva.RiskLaw{Mean: 0.1, SD: 0.05, Alpha: 4, Beta: 36, Percentiles: pva.Percentiles{P05: 0.03, P25: 0.06, P50: 0.09, P75: 0.13, P95: 0.19}, Bins: []pva.RiskBin{{High: 0.1, Share: 0.55, Seen: 0.5}, {Low: 0.1, High: 0.2, Share: 0.45, Seen: 0.5}}},
		Within: &pva.Chance{Estimate: 0.831, Low: 0.79, High: 0.874}, ExactReason: "not asked for"}
	if exact {
		risk.Exact, risk.Law.Exact, risk.ExactReason = []float64{0.05, 0.07, 0.11, 0.17}, true, ""
		risk.Mean = pva.Chance{Estimate: 0.1, Low: 0.011, High: 0.189}
	}
	u := &pva.Uncertainty{Draws: 4, Asked: 4, Each: 100, Case: risk, Redrawn: 1, Unsolved: 2,
		Inputs: []pva.UncertainInput{{Key: "deaths.year_sd", Law: "uniform from 0.04 to 0.06", Value: 0.05, Mean: 0.05, SD: 0.006, Link: pva.Correlation{Estimate: math.NaN(), Low: -1, High: 1}},
			{Key: "births.rate", Law: "uniform, mean 0.45, standard deviation 0.02", Value: 0.45, Mean: 0.45, SD: 0.02, Outside: 1, Link: pva.Correlation{Estimate: -0.8, Low: -0.9, High: -0.6}}},
		Values: [][]float64{{0.05, 0.42}, {0.04, 0.44}, {0.06, 0.46}, {0.05, 0.48}}}
	for range a.Options {
		u.Options = append(u.Options, risk)
	}
	a.Verdict, a.ToDecide, a.Uncertainty = pva.Undecided, 1600, u
	return a
}

// TestUncertaintyPart: the sheet restates the verdict over the draws, and its
// figures are those of the results.
func TestUncertaintyPart(t *testing.T) {
	a := drawn(false)
	u := &a.Uncertainty.Case
	r := Build(a, Meta{})
	for _, want := range []string{"Undecided: the interval between draws, " + PercentRange(0.04, 0.16, 400) + ", straddles the limit of 10 %", "In 83 % (79 % to 87 %) of the draws the risk is within the limit of 10 %."} {
		if !strings.Contains(r.VerdictText, want) {
			t.Errorf("verdict %q does not say %q", r.VerdictText, want)
		}
	}
	// Four draws are too few to say how many would be enough.
	if strings.Contains(r.VerdictText, "would settle it") {
		t.Errorf("verdict %q", r.VerdictText)
	}
	for n, want := range map[int64]int64{1: 1, 99: 99, 100: 100, 101: 110, 1727: 1800, 17273: 18000} {
		if got := roughly(n); got != want {
			t.Errorf("roughly %d is %d, want %d", n, got, want)
		}
	}
	if want := "interval between 4 draws of the uncertain inputs"; !strings.Contains(r.Figures[0].Note, want) {
		t.Errorf("note %q", r.Figures[0].Note)
	}
	p := r.Part(PartUncertainty)
	if p == nil || r.Part(PartDraws) == nil {
		t.Fatal("no sheets about the draws")
	}
	if !strings.HasPrefix(p.Lead, "In 83 %") {
		t.Errorf("lead %q", p.Lead)
	}
	cells := map[string]float64{}
	for _, at := range [][3]string{{"over_draws", "case", "pooled"}, {"over_draws", "case", "inputs"}, {"over_draws", "case", "p95"}, {"risk_law", "bar_2", "share"}, {"draws", "draw_3", "share"}, {"draws", "draw_3", "input_2"}, {"uncertain_inputs", "input_1", "link"}} {
		cells[at[2]+" "+at[1]] = r.Table(at[0]).Cell(at[1], at[2]).Num
	}
	for at, want := range map[string]float64{"pooled case": a.Outcome.Risk.Estimate, "inputs case": 0.75, "p95 case": 0.19, "share bar_2": 0.45, "share draw_3": float64(u.Fallen[2]) / 100, "input_2 draw_3": 0.46, "link input_1": -0.8} {
		if math.Abs(cells[at]-want) > 1e-12 {
			t.Errorf("%s is %v, want %v", at, cells[at], want)
		}
	}
	if k := r.Table("uncertain_inputs").Cell("input_1", "key").Text; k != "births.rate" {
		t.Errorf("the strongest link comes first, not %s", k)
	}
	if f := r.Table("over_draws").Cell("case", "pooled").Formula; f != "AVERAGE({draws::share})" {
		t.Errorf("formula %q", f)
	}
	if a := r.Table("risk_law").Cell("bar_1", "against").Text; a != "within" {
		t.Errorf("a bar that ends at the limit is %q", a)
	}
	all := ""
	for _, s := range p.Sections {
		for _, g := range s.Paragraphs {
			all += g.Text + "\n"
		}
	}
	for _, want := range []string{"75 % comes from the inputs and 25 % is replicate noise", "1 draw of 4 had a value", "In 2 draws no scale", "not asked for"} {
		if !strings.Contains(all, want) {
			t.Errorf("the reading does not say %q:\n%s", want, all)
		}
	}
}

// TestUncertaintyExact: where the draws have exact risks the verdict says so.
func TestUncertaintyExact(t *testing.T) {
	a := drawn(true)
	a.Verdict = pva.Within
	r := Build(a, Meta{})
	if want := "Within the limit: the mean of the exact risks of the draws, " + PercentRange(0.011, 0.189, 400) + ", lies at or below"; !strings.Contains(r.VerdictText, want) {
		t.Errorf("verdict %q", r.VerdictText)
	}
	if e := r.Table("draws").Cell("draw_4", "exact").Num; e != 0.17 {
		t.Errorf("exact risk of draw 4 is %v", e)
	}
}

// TestNoUncertainty: a case without uncertain inputs has no such sheet.
func TestNoUncertainty(t *testing.T) {
	a := drawn(false)
	a.Uncertainty = nil
	if r := Build(a, Meta{}); r.Part(PartUncertainty) != nil || strings.Contains(r.VerdictText, "draws") {
		t.Errorf("%q", r.VerdictText)
	}
}

func TestShareText(t *testing.T) {
	for p, want := range map[float64]string{0: "0 %", 0.001: "under 1 %", 0.83: "83 %", 0.994: "99 %", 0.997: "over 99 %", 1: "100 %"} {
		if got := shareText(p); got != want {
			t.Errorf("%v is %q, want %q", p, got, want)
		}
	}
}

// TestUncertainLead: the figure that leads is the one that the verdict rests on,
// with the same ends, on the terminal and on the first sheet.
func TestUncertainLead(t *testing.T) {
	a := drawn(true)
	m := a.Uncertainty.Case.Mean
	r := Build(a, Meta{})
	f := r.Table("figures")
	if f.Cell("exact", "estimate").Num != m.Estimate || f.Cell("exact", "low").Num != m.Low || f.Cell("exact", "high").Num != m.High || !strings.HasPrefix(r.Figures[0].Beside, PercentRange(m.Low, m.High, 400)) {
		t.Errorf("%+v, beside %s", f.Cell("exact", "estimate"), r.Figures[0].Beside)
	}
	for _, r := range []*Report{r, Build(drawn(false), Meta{})} {
		for _, s := range r.Part(PartChecks).Sections {
			for _, p := range s.Paragraphs {
				if strings.Contains(p.Text, "--no-exact") {
					t.Errorf("of uncertain inputs it is said: %s", p.Text)
				}
			}
		}
	}
	if Build(drawn(false), Meta{}).Table("figures").Row("exact") >= 0 {
		t.Error("an exact figure without exact draws")
	}
}
