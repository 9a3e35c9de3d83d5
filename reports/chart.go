package reports

import (
	"strconv"

	"ebbline/pva"
)

// Chart says what a chart shows in terms of a table's columns; each medium draws
// it in its own way.
type Chart struct {
	ID, Title, Alt string
	XTitle, YTitle string
	Table          string // the table it is drawn from
	X              string // key of the column along the axis
	Percent        bool   // the vertical axis is a probability
	Bars           bool   // one bar a row instead of lines over years
	// Across lays the bars on their side, those of a row over one another, to the
	// left and right of 0: a tornado chart.
	Across bool
	Series []Series
}

// Series is one curve, band or set of bars.
type Series struct {
	Name  string
	Role  Role
	Value string // column of the curve or bar
	// Low and High are the columns of a band's edges or a bar's interval.
	Low, High string
	Constant  string  // a cell, as in formulas, for a level line
	Level     float64 // the value of that cell
}

// Role is what a series stands for; a medium gives each role its own colour and
// line or shade, so that no meaning hangs on colour alone.
type Role uint8

// The roles of a series.
const (
	Main     Role = iota // the case
	Band                 // a range around the case, darker
	WideBand             // a wider range, lighter
	Compared             // the baseline
	LimitLine
	ThresholdLine
)

// riskChart is the risk by year with its interval, the baseline and the limit.
func riskChart(a *pva.Assessment) Chart {
	c := a.Case
	last := a.Outcome.Risk
	ch := Chart{ID: "risk", Title: "Risk of having fallen to " + fallenTo(c), XTitle: axisYear(c), YTitle: "Risk", Table: "years", X: "date", Percent: true}
	ch.Series = append(ch.Series, Series{Name: percentOf(c.Question.Confidence) + " interval", Role: Band, Low: "low", High: "high"},
		Series{Name: sentence(withTake(a)), Role: Main, Value: "fallen"})
	ch.Alt = "Line with an interval band: the risk of having fallen to " + fallenTo(c) + " rises to " +
		Percent(last.Estimate, last.Of) + " (" + PercentRange(last.Low, last.High, last.Of) + ") by " + dateWords(c, c.Question.Horizon)
	if a.Baseline != nil {
		ch.Series = append(ch.Series, Series{Name: "Without the take", Role: Compared, Value: "base"})
		ch.Alt += "; without the take to " + Percent(a.Baseline.Risk.Estimate, a.Baseline.Risk.Of)
	}
	ch.Series = append(ch.Series, limitSeries(a)...)
	if c.Question.Limit.Set {
		ch.Alt += "; the limit is a level line at " + percentOf(c.Question.Limit.Value)
	}
	ch.Alt += "."
	return ch
}

func limitSeries(a *pva.Assessment) []Series {
	limit := a.Case.Question.Limit
	if !limit.Set {
		return nil
	}
	return []Series{{Name: "Limit, " + percentOf(limit.Value), Role: LimitLine, Constant: cellLimit, Level: limit.Value}}
}

func axisYear(c *pva.Case) string {
	if c.Start.Year.Set {
		return sentence(c.TimeUnit)
	}
	return sentence(c.TimeUnit) + " of the model"
}

// abundanceChart is the fan of counts over the years.
func abundanceChart(a *pva.Assessment) Chart {
	c := a.Case
	last := a.Outcome.Years[c.Question.Horizon-1]
	ch := Chart{ID: "abundance", Title: "Count of " + c.Counts, XTitle: axisYear(c), YTitle: sentence(c.Counts), Table: "abundance", X: "date",
		Series: []Series{{Name: "9 in 10 replicates", Role: WideBand, Low: "p05", High: "p95"}, {Name: "Half of the replicates", Role: Band, Low: "p25", High: "p75"},
			{Name: "Median", Role: Main, Value: "p50"}}}
	ch.Alt = "Fan of the yearly count: the median goes from " + percentileText(a.Outcome.Years[0].Abundance.P50) + " to " + percentileText(last.Abundance.P50) +
		" in " + dateWords(c, c.Question.Horizon) + "; nine in ten replicates end between " + percentileText(last.Abundance.P05) + " and " + percentileText(last.Abundance.P95)
	if a.Baseline != nil {
		ch.Series = append(ch.Series, Series{Name: "Median without the take", Role: Compared, Value: "base_p50"})
		ch.Alt += "; the median without the take ends at " + percentileText(a.Baseline.Years[c.Question.Horizon-1].Abundance.P50)
	}
	if c.Question.Threshold > 0 {
		ch.Series = append(ch.Series, Series{Name: "Threshold, " + Plain(c.Question.Threshold), Role: ThresholdLine, Constant: "{settings:run:threshold}", Level: c.Question.Threshold})
	}
	ch.Alt += "."
	return ch
}

// fallChart is the law of the time to fall.
func fallChart(a *pva.Assessment) Chart {
	c := a.Case
	best, at := int64(-1), 1
	before := int64(0)
	for i, y := range a.Outcome.Years {
		if n := y.Fallen.Count - before; n > best {
			best, at = n, i+1
		}
		before = y.Fallen.Count
	}
	return Chart{ID: "fall", Title: "When replicates fall", XTitle: axisYear(c), YTitle: "Share of all replicates", Table: "years", X: "date", Percent: true, Bars: true,
		Series: []Series{{Name: "Fallen in the " + c.TimeUnit, Role: Main, Value: "newly"}},
		Alt: "Bars: the share of all replicates that falls in each " + c.TimeUnit + "; the most, " + counted(best, "replicate") + " of " + Grouped(a.Outcome.Replicates) +
			", in " + dateWords(c, at) + "."}
}

// optionsChart sets the options side by side.
func optionsChart(a *pva.Assessment) Chart {
	ch := Chart{ID: "options", Title: "The options side by side", YTitle: "Risk", Table: "options", X: "name", Percent: true, Bars: true,
		Series: append([]Series{{Name: "Risk with its " + percentOf(a.Case.Question.Confidence) + " interval", Role: Main, Value: "estimate", Low: "low", High: "high"}}, limitSeries(a)...)}
	ch.Alt = "Bars with intervals: the case " + Percent(a.Outcome.Risk.Estimate, a.Outcome.Risk.Of)
	for _, o := range a.Options {
		ch.Alt += "; " + o.Name + " " + Percent(o.Outcome.Risk.Estimate, o.Outcome.Risk.Of)
	}
	if a.Baseline != nil {
		ch.Alt += "; without the take " + Percent(a.Baseline.Risk.Estimate, a.Baseline.Risk.Of)
	}
	ch.Alt += "."
	return ch
}

// driversChart sets the case beside itself with one thing taken out.
func driversChart(a *pva.Assessment) Chart {
	ch := Chart{ID: "drivers", Title: "The risk with one thing taken out", YTitle: "Risk", Table: "drivers", X: "without", Percent: true, Bars: true,
		Series: append([]Series{{Name: "Risk with its " + percentOf(a.Case.Question.Confidence) + " interval", Role: Main, Value: "estimate", Low: "low", High: "high"}}, limitSeries(a)...)}
	ch.Alt = "Bars with intervals: the case " + Percent(a.Outcome.Risk.Estimate, a.Outcome.Risk.Of)
	for _, d := range a.Drivers {
		ch.Alt += "; without " + d.Without + " " + Percent(d.Risk.Estimate, d.Risk.Of)
	}
	ch.Alt += "."
	return ch
}

func yearID(y int) string { return strconv.Itoa(y) }
