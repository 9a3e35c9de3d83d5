package reports

import (
	"math"
	"strconv"
	"strings"

	"ebbline/pva"
	"ebbline/pva/estimate"
)

// Figure is one headline figure: what is shown first in every medium.
type Figure struct {
	ID       string // risk, baseline, added, limit, extinction, exact, exact_baseline
	Label    string
	Text     string // the figure as a person reads it: "7.1 %", "3.1 points"
	Interval string // "6.6 to 7.6 %", "" if it has none
	Note     string // what else there is to say
	// Lead is the figure to show first and Beside what stands next to it: where
	// there is an exact answer, that one leads, because the verdict uses it.
	Lead, Beside string
	// Value is a probability, or for "added" a difference of two.
	Value, Low, High float64
	HasInterval      bool
	Count, Of        int64 // 0 of 0 where no replicates stand behind it
}

// Number is one of the numbers that matter beside the risk.
type Number struct {
	ID, Label, Text, Note string
	Value                 float64 // NaN where the text says all
	Format                Format
	Formula               string
	yields                float64
}

// withTake is the label of the risk asked about.
func withTake(a *pva.Assessment) string {
	if permitted, _ := a.Case.Takes(); permitted {
		return "with the take"
	}
	return "the risk"
}

// exactAnswer is the exact answer, nil where there is none.
func exactAnswer(e *pva.ExactAnswer) *pva.ExactAnswer {
	if e == nil || e.Reason != "" {
		return nil
	}
	return e
}

// errorText is the error of a computation as percent, one digit of it.
func errorText(e float64) string { return Significant(100*e, 1) + " %" }

// led puts an exact figure before the simulated one.
func (f *Figure) led(exact string) {
	f.Lead, f.Beside = exact, "exact; simulated "+strings.TrimSuffix(f.Text, " points")+", "+f.Interval
}

func proportionFigure(id, label string, p pva.Proportion) Figure {
	shown, interval := Percent(p.Estimate, p.Of), PercentRange(p.Low, p.High, p.Of)
	return Figure{ID: id, Label: label, Text: shown, Interval: interval, Lead: shown, Beside: interval,
		Value: p.Estimate, Low: p.Low, High: p.High, HasInterval: true, Count: p.Count, Of: p.Of}
}

func figures(a *pva.Assessment) []Figure {
	o := a.Outcome
	level := percentOf(a.Case.Question.Confidence)
	risk := proportionFigure("risk", withTake(a), o.Risk)
	risk.Note = level + " interval, " + counted(o.Risk.Of, "replicate")
	if a.Sequential {
		risk.Note = level + " interval that holds however often one looks (a confidence sequence); " + counted(o.Risk.Of, "replicate")
	}
	u := a.Uncertainty
	if u != nil {
		risk.Note = level + " interval of the mean risk over " + counted(int64(u.Draws), "draw") + ", " + counted(o.Risk.Of, "replicate")
	}
	exact, base := exactAnswer(a.Exact), exactAnswer(a.BaselineExact)
	if exact != nil {
		risk.led(Percent(exact.Risk, 0))
	}
	out := []Figure{risk}
	if u != nil && u.Case.Law.Reason == "" {
		// How sure one can be: the mean's own interval says little of a single
		// population, whose rates are those of one draw.
		p := u.Case.Law.Percentiles
		span := Percent(p.P05, 0) + " to " + Percent(p.P95, 0)
		out = append(out, Figure{ID: "draws", Label: "half of the draws below", Text: Percent(p.P50, 0), Lead: Percent(p.P50, 0), Beside: "nine in ten from " + span,
			Value: p.P50, Low: p.P05, High: p.P95, HasInterval: true, Note: "the risk over the draws of the uncertain inputs: nine in ten from " + span})
	}
	if a.Baseline != nil {
		f := proportionFigure("baseline", "without the take", a.Baseline.Risk)
		if base != nil {
			f.led(Percent(base.Risk, 0))
		} else if exact != nil {
			f.Beside = "simulated, " + f.Interval
		}
		out = append(out, f)
	}
	if a.Added != nil {
		f := differenceFigure(a)
		if exact != nil && base != nil {
			f.led(zeroless(Significant(100*(exact.Risk-base.Risk), 3)) + " points")
		} else if exact != nil {
			f.Beside = "simulated, " + f.Interval
		}
		out = append(out, f)
	}
	if limit := a.Case.Question.Limit; limit.Set {
		out = append(out, Figure{ID: "limit", Label: "the permit's limit", Text: percentOf(limit.Value), Lead: percentOf(limit.Value), Beside: string(a.Verdict), Value: limit.Value, Note: string(a.Verdict)})
	}
	if exact != nil {
		out = append(out, Figure{ID: "exact", Label: withTake(a) + ", exact", Text: Percent(exact.Risk, 0), Value: exact.Risk,
			Note: "without random numbers, error at most " + errorText(exact.Error)})
	}
	if base != nil {
		out = append(out, Figure{ID: "exact_baseline", Label: "without the take, exact", Text: Percent(base.Risk, 0), Value: base.Risk})
	}
	ext := proportionFigure("extinction", "none left at the last census", o.Extinction)
	ext.Note = "no " + a.Case.Counts + " at the census of " + dateWords(a.Case, a.Case.Question.Horizon)
	if exact != nil {
		ext.led(Percent(exact.Extinction, 0))
	}
	return append(out, ext)
}

func differenceFigure(a *pva.Assessment) Figure {
	d := *a.Added
	f := Figure{ID: "added", Label: "the take adds", Value: d.Estimate, Low: d.Low, High: d.High, HasInterval: true}
	// The ends have the decimals of the difference, so that they read alike.
	digits := PercentDigits(math.Abs(d.Estimate), d.Of)
	f.Text = pointsWith(d.Estimate, digits) + " points"
	f.Interval = pointsWith(d.Low, digits) + " to " + pointsWith(d.High, digits)
	f.Lead, f.Beside = f.Text, f.Interval
	f.Note = "same " + a.Case.TimeUnit + "s compared: " + Grouped(d.OnlyThis) + " fell only with the take, " + Grouped(d.OnlyOther) + " only without"
	return f
}

// dateWords is the date of a model year as words: "2076" or "year 50".
func dateWords(c *pva.Case, y int) string {
	if c.Start.Year.Set {
		return dateOf(c, y)
	}
	return c.TimeUnit + " " + strconv.Itoa(y)
}

// verdictText says in a sentence what the verdict rests on.
func verdictText(a *pva.Assessment) string {
	limit := a.Case.Question.Limit
	if !limit.Set || a.Verdict == pva.NoVerdict {
		return ""
	}
	o := a.Outcome.Risk
	has := "the interval " + PercentRange(o.Low, o.High, o.Of)
	exact := exactAnswer(a.Exact)
	if exact != nil {
		has = "the exact risk" // the figure beside it
	}
	of := " the limit of " + percentOf(limit.Value)
	var s string
	switch a.Verdict {
	case pva.Within:
		s = "Within the limit: " + has + " lies at or below" + of + "."
	case pva.AboveLimit:
		s = "Above the limit: " + has + " lies above" + of + "."
	default:
		s = "Undecided: " + has + " straddles" + of + ", so the risk is not shown to be within it."
		if a.ToDecide > 0 {
			s += " If the estimate stays where it is, about " + Grouped(roughly(a.ToDecide)) + " replicates would settle it."
		}
	}
	if a.Unreliable {
		s = "Do not rely on this answer: the simulation and the exact answer disagree beyond chance (see Checks). " + s
	}
	return s
}

// numbers are five numbers that matter beside the risk.
func numbers(a *pva.Assessment) []Number {
	c, o := a.Case, a.Outcome
	h := c.Question.Horizon
	last := o.Years[h-1]
	at := "{abundance:" + strconv.Itoa(h)
	out := []Number{{ID: "median_last", Label: "median count in " + dateWords(c, h), Value: last.Abundance.P50, Format: Format{Kind: Counts},
		Note: "nine in ten replicates between " + percentileText(last.Abundance.P05) + " and " + percentileText(last.Abundance.P95), Formula: at + ":p50}", yields: last.Abundance.P50},
		{ID: "smallest_mean", Label: "smallest count, on average", Value: o.SmallestMean, Format: Format{Decimal, 1},
			Note: "expected minimum abundance (McCarthy & Thompson 2001)"},
		{ID: "extinction", Label: "chance that none are left in " + dateWords(c, h), Value: o.Extinction.Estimate, Format: Format{Percents, tableDigits(o.Replicates)},
			Note: PercentRange(o.Extinction.Low, o.Extinction.High, o.Extinction.Of), Formula: "{years:" + strconv.Itoa(h) + ":extinct}", yields: last.Extinct.Estimate}}
	out[2].Text = Percent(o.Extinction.Estimate, o.Extinction.Of)
	fall := Number{ID: "quarter_fallen", Label: "a quarter of the replicates have fallen by", Value: math.NaN(), Format: Format{Kind: Dates}, Text: "not by " + dateWords(c, h)}
	if o.FallP25 > 0 {
		fall.Value, fall.Text = float64(c.Label(o.FallP25)), dateWords(c, o.FallP25)
	}
	fall.Note = "half: " + fallText(c, o.FallP50)
	out = append(out, fall)
	if _, any := c.Takes(); any {
		n := Number{ID: "taken", Label: "taken a " + c.TimeUnit + ", on average", Value: o.TakeMean, Format: Format{Decimal, 2}}
		n.Note = takenNote(a)
		sum := 0.0
		for _, y := range o.Years {
			sum += y.TakeMean
		}
		n.Formula, n.yields = "AVERAGE({abundance::take_mean})", sum/float64(h)
		out = append(out, n)
	} else {
		out = append(out, Number{ID: "log_growth", Label: "growth a " + c.TimeUnit + " before falling", Value: math.Expm1(o.MeanLogGrowth), Format: Format{Percents, 2},
			Note: "exp of the mean log growth " + Significant(o.MeanLogGrowth, 3) + ", less 1; high where many fall"})
	}
	for i := range out {
		if out[i].Text == "" {
			out[i].Text = out[i].Format.Show(out[i].Value)
		}
		if math.IsInf(out[i].Value, 0) {
			out[i].Text, out[i].Value = "outgrown", math.NaN()
		}
	}
	return out
}

func takenNote(a *pva.Assessment) string {
	var notes []string
	if a.Outcome.ShortfallMean > 0 {
		notes = append(notes, Significant(a.Outcome.ShortfallMean, 3)+" a "+a.Case.TimeUnit+" wanted but not there")
	}
	if a.Outcome.ClosedYears > 0 {
		notes = append(notes, "closed in "+Significant(a.Outcome.ClosedYears, 3)+" "+a.Case.TimeUnit+"s of "+strconv.Itoa(a.Case.Question.Horizon))
	}
	if len(notes) == 0 {
		return a.Case.Counts + " taken in full"
	}
	return strings.Join(notes, "; ")
}

func percentileText(v float64) string {
	if math.IsInf(v, 1) {
		return "outgrown"
	}
	return Grouped(int64(math.Round(v)))
}

func fallText(c *pva.Case, y int) string {
	if y == 0 {
		return "not by " + dateWords(c, c.Question.Horizon)
	}
	return dateWords(c, y)
}

// tableDigits is the number of decimals, in percent, of a column of risks: those
// that a risk of 5 % deserves.
func tableDigits(replicates int64) int { return PercentDigits(0.05, replicates) }

func answerPart(a *pva.Assessment, r *Report, z scores) Part {
	p := Part{Name: PartAnswer, Lead: r.Question}
	p.Tables = []*Table{figuresTable(a, r.Figures, z), numbersTable(r.Numbers)}
	p.Charts = []Chart{riskChart(a), abundanceChart(a), fallChart(a)}
	if len(a.Options) > 0 {
		p.Charts = append(p.Charts, optionsChart(a))
	} else if len(a.Drivers) > 0 {
		p.Charts = append(p.Charts, driversChart(a))
	}
	return p
}

// figuresTable states the headline figures with where each comes from.
func figuresTable(a *pva.Assessment, figures []Figure, z scores) *Table {
	digits := tableDigits(a.Outcome.Replicates)
	pct := Format{Percents, digits}
	b := newTable("figures", "The risk").column("label", "", "", Format{}).
		column("estimate", "Risk", "", pct).column("low", "Low", "", pct).column("high", "High", "", pct).
		column("count", "Count", "", Format{Kind: Counts}).column("of", "Of", "", Format{Kind: Counts}).wide("note", "")
	horizon := strconv.Itoa(a.Case.Question.Horizon)
	for _, f := range exactFirst(figures) {
		cells := map[string]Cell{"label": text(sentence(f.Label)), "note": text(sentence(f.Note))}
		if r := f.ID; (r == "risk" || r == "baseline" || r == "extinction") && f.Lead != f.Text {
			cells["label"] = text(sentence(f.Label) + ", simulated")
		}
		switch f.ID {
		case "risk":
			z.summary(cells, a.Outcome.Risk, "{years:"+horizon+":fallen_count}")
		case "baseline":
			z.summary(cells, a.Baseline.Risk, "{years:"+horizon+":base_count}")
		case "extinction":
			z.summary(cells, a.Outcome.Extinction, "{years:"+horizon+":extinct_count}")
		case "added":
			cells["label"] = text(sentence(f.Label) + ", in points")
			z.differenceCells(cells, a)
		default:
			cells["estimate"] = num(f.Value)
			if f.ID == "exact" || f.ID == "exact_baseline" {
				cells["estimate"] = num(f.Value).as(Percents, exactDecimals(f.Value))
				if f.HasInterval { // a mean over draws
					cells["low"], cells["high"] = num(f.Low), num(f.High)
				}
			}
			if f.ID == "limit" {
				cells["estimate"] = num(f.Value).as(Percents, PercentDecimals(f.Value))
				cells["note"] = verdictCell(a)
			}
		}
		b.row(f.ID, cells)
	}
	b.t.Note = "Count is of replicates. Low and high are the ends of the " + percentOf(a.Case.Question.Confidence) + " interval."
	return b.t
}

// exactFirst sets each exact figure above the simulated one that it goes with.
func exactFirst(figures []Figure) []Figure {
	var out []Figure
	for _, f := range figures {
		if f.ID == "exact" || f.ID == "exact_baseline" {
			continue
		}
		for _, e := range figures {
			if e.ID == "exact" && f.ID == "risk" || e.ID == "exact_baseline" && f.ID == "baseline" {
				out = append(out, e)
			}
		}
		out = append(out, f)
	}
	return out
}

// exactDecimals are those of an exact risk as Percent writes it.
func exactDecimals(p float64) int {
	if 100*p < leastPercent {
		return 0
	}
	_, rest, _ := strings.Cut(Significant(100*p, 3), ".")
	return len(rest)
}

// PercentDecimals is how many decimals write a given fraction in full as percent.
func PercentDecimals(p float64) int {
	_, rest, _ := strings.Cut(Significant(100*p, 6), ".")
	return len(rest)
}

// summary is a proportion whose count stands in another table.
func (s scores) summary(cells map[string]Cell, p pva.Proportion, count string) {
	s.proportion(cells, p, "count", "estimate", "low", "high", "{of}")
	cells["of"] = num(float64(p.Of)).by(cellReplicates, float64(p.Of))
	cells["count"] = num(float64(p.Count)).by(count, float64(p.Count))
}

// differenceCells states the added risk in points; its interval is worked out
// under Checks.
func (s scores) differenceCells(cells map[string]Cell, a *pva.Assessment) {
	d := *a.Added
	digits := tableDigits(d.Of)
	this, other := a.Outcome.Risk, a.Baseline.Risk
	cells["estimate"] = num(100*d.Estimate).as(Points, digits).by("({figures:risk:estimate}-{figures:baseline:estimate})*100", 100*(this.Estimate-other.Estimate))
	low, high := num(100*d.Low).as(Points, digits), num(100*d.High).as(Points, digits)
	if newPaired(this, other, d).explains(d, s) {
		low.Formula, high.Formula = "{pairs:added:low}", "{pairs:added:high}"
	}
	cells["low"], cells["high"] = low, high
}

// verdictCell is the verdict as a formula of the figures beside it.
func verdictCell(a *pva.Assessment) Cell {
	c := text(string(a.Verdict))
	if c.Text == "" {
		return Cell{}
	}
	limit := a.Case.Question.Limit.Value
	low, high := a.Outcome.Risk.Low, a.Outcome.Risk.High
	cellLow, cellHigh := "{figures:risk:low}", "{figures:risk:high}"
	if e := exactAnswer(a.Exact); e != nil {
		low, high = e.Risk-e.Error, e.Risk+e.Error
		cellLow, cellHigh = "({figures:exact:estimate}-{exact_check:risk:error})", "({figures:exact:estimate}+{exact_check:risk:error})"
	}
	return verdictBy(c, low, high, limit, cellLow, cellHigh)
}

func verdictBy(c Cell, low, high, limit float64, cellLow, cellHigh string) Cell {
	if verdictOf(low, high, limit) == pva.Verdict(c.Text) {
		c.Formula = "IF(" + cellHigh + "<=" + cellLimit + `,"` + string(pva.Within) + `",IF(` + cellLow + ">" + cellLimit + `,"` + string(pva.AboveLimit) + `","` + string(pva.Undecided) + `"))`
	}
	return c
}

func verdictOf(low, high, limit float64) pva.Verdict {
	return estimate.Verdict(pva.Optional{Value: limit, Set: true}, pva.Proportion{Low: low, High: high})
}

func numbersTable(numbers []Number) *Table {
	b := newTable("numbers", "Numbers that matter beside it").column("label", "", "", Format{}).column("value", "Value", "", Format{}).wide("note", "")
	for _, n := range numbers {
		v := text(n.Text)
		if !math.IsNaN(n.Value) {
			v = num(n.Value)
			v.Format = n.Format
			if n.Formula != "" {
				v = v.by(n.Formula, n.yields)
			}
		}
		b.row(n.ID, map[string]Cell{"label": text(sentence(n.Label)), "value": v, "note": text(sentence(n.Note))})
	}
	return b.t
}
