package text

import (
	"fmt"
	"math"
	"strings"

	"ebbline/pva/fit"
	"ebbline/reports"
)

// Fit is a fit to counts as terminal text: the counts, growth with drift, the
// models of growth side by side, process and observation error, the risk by the
// drift model, doubts and cautions. The case made from it, if there is one, is
// told last; w may be nil.
func Fit(r *fit.Result, w *fit.Written) string {
	var b strings.Builder
	u := r.Series.TimeUnit
	b.WriteString(wrap("Counts of "+r.Series.File, "", 0))
	b.WriteString(wrap(countWords(r), "", 0) + "\n")
	b.WriteString(driftRows(r) + "\n")
	b.WriteString("Growth against abundance, steps of one " + u + " only\n" + modelRows(r) + "\n")
	b.WriteString(splitRows(r) + "\n")
	b.WriteString(riskRows(r))
	if len(r.Doubts) > 0 {
		b.WriteString("\n")
	}
	for _, d := range r.Doubts {
		b.WriteString(wrap("Warning: "+d.String(), "", 2))
	}
	if w != nil {
		b.WriteString("\nHow the case was made\n")
		for _, h := range w.How {
			b.WriteString(wrap(h, "  ", 2))
		}
		for _, d := range w.Doubts {
			b.WriteString(wrap("Warning: "+d.String(), "", 2))
		}
	}
	b.WriteString("\n")
	b.WriteString(wrap("A risk under a model fitted to these counts, not a forecast; it takes the years ahead to be like the years counted.", "", 0))
	b.WriteString(wrap("Local law, agency guidance and a qualified biologist's judgement come first.", "", 0))
	return b.String()
}

func countWords(r *fit.Result) string {
	u := r.Series.TimeUnit
	s := fmt.Sprintf("%d counts from %s to %s; %d of %d changes are over one %s", r.Counts, plainDate(r.First), plainDate(r.Last), r.Steps, r.Drift.Intervals, u)
	if n := r.Series.NotCounted; n > 0 {
		s += fmt.Sprintf("; %d rows without a count", n)
	}
	if r.MeanEffort > 0 {
		s += fmt.Sprintf("; counts are set to the mean effort of %s, in proportion", reports.Significant(r.MeanEffort, 4))
	}
	if r.Series.Errors {
		s += "; the counts' own errors are stated"
	}
	return s + "."
}

func plainDate(v float64) string { return fmt.Sprintf("%.10g", v) }

// figure is a number with three significant digits, or a dash.
func figure(v float64) string {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return "-"
	}
	return reports.Significant(v, 3)
}

func rangeOf(e fit.Estimate) string {
	if math.IsNaN(e.Low) {
		return ""
	}
	return figure(e.Low) + " to " + figure(e.High)
}

func driftRows(r *fit.Result) string {
	d, u := r.Drift, r.Series.TimeUnit
	rows := [][]string{
		{"Growth with drift", "", fmt.Sprintf("%.10g %% interval", 100*r.Options.Confidence)},
		{"mean log growth a " + u, figure(d.Mu.Value), rangeOf(d.Mu)},
		{"its variance between " + u + "s", figure(d.Variance.Value), rangeOf(d.Variance)},
		{"growth factor of the mean", figure(d.Lambda), ""},
		{"correlation with the next change", figure(r.Diagnostics.Autocorrelation.Value), rangeOf(r.Diagnostics.Autocorrelation)},
		{"trend of the residuals a " + u, figure(r.Diagnostics.Trend.Value), rangeOf(r.Diagnostics.Trend)},
	}
	for i := 1; i < len(rows); i++ {
		rows[i][0] = "  " + rows[i][0]
	}
	return columns(rows, "", false, true)
}

// modelRows are the models side by side; a refused one says why below.
func modelRows(r *fit.Result) string {
	rows := [][]string{{"model", "growth", "K", "theta", "scatter", "left out", "AICc", "weight"}}
	var why []string
	for _, m := range r.Models {
		if m.Refused != "" {
			why = append(why, m.Name+" is refused: "+m.Refused)
			continue
		}
		rows = append(rows, []string{m.Name, figure(m.Growth.Value), figure(m.Capacity.Value), figure(m.Theta), figure(m.ResidualSD), figure(m.LeftOut), fmt.Sprintf("%.1f", m.AICc), fmt.Sprintf("%.2f", m.Weight)})
	}
	out := ""
	if len(rows) > 1 {
		out = columns(rows, "  ", false, true, true, true, true, true, true, true)
		out += wrap("(scatter: standard deviation of the residuals; left out: root mean squared error of each step from a fit to the others; log growth)", "  ", 0)
	}
	if r.Steps < fit.MinimumSteps {
		why = []string{fmt.Sprintf("%d such steps are too few to compare models (%d are needed)", r.Steps, fit.MinimumSteps)}
	}
	for _, s := range why {
		out += wrap(s, "  ", 2)
	}
	return out
}

func splitRows(r *fit.Result) string {
	s := r.Split
	rows := [][]string{{"Process and observation error", "", "interval by profile likelihood"}}
	rows = append(rows, []string{"  process variance a " + r.Series.TimeUnit, figure(s.Process.Value), rangeOf(s.Process)})
	if s.Stated {
		rows = append(rows, []string{"  observation variance", "stated", ""})
	} else {
		rows = append(rows, []string{"  observation variance", figure(s.Observation.Value), rangeOf(s.Observation)})
	}
	note := "(of log counts, by " + s.Method + ")"
	if at := r.State(); at != nil {
		z := math.Sqrt2 * math.Erfinv(r.Options.Confidence) * math.Sqrt(at.Variance)
		rows = append(rows, []string{"  abundance behind the last count", figure(at.Mean()), rangeOf(fit.Estimate{Low: math.Exp(at.Log - z), High: math.Exp(at.Log + z)})})
		note = "(variances of log counts, by " + s.Method + "; the abundance by the Kalman filter)"
	}
	if g := r.Diagnostics.RunningSums; g != nil {
		rows = append(rows, []string{"  process variance by running sums", figure(g.Variance), ""})
	}
	return columns(rows, "", false, true) + wrap(note, "  ", 0)
}

func riskRows(r *fit.Result) string {
	k, u := r.Risk, r.Series.TimeUnit
	head := fmt.Sprintf("How likely is a fall from %s to %s or fewer within %d %ss?", reports.Significant(k.Start, 6), reports.Significant(k.Threshold, 6), k.Horizon, u)
	if k.Withheld != "" {
		return wrap(head, "", 0) + wrap("Withheld: "+k.Withheld+".", "  ", 2)
	}
	rows := [][]string{{"by the drift model", risk(k.ByHorizon.Value), risk(k.ByHorizon.Low) + " to " + risk(k.ByHorizon.High)}}
	if !math.IsNaN(k.Process) {
		rows = append(rows, []string{"without the errors of counting", risk(k.Process), ""})
	}
	rows = append(rows, []string{"ever", risk(k.Ever.Value), risk(k.Ever.Low) + " to " + risk(k.Ever.High)})
	return wrap(head, "", 0) + columns(rows, "  ", false, true) +
		wrap(fmt.Sprintf("(%.10g %% interval from %s draws of drift and variance; the formula watches at every moment and so overstates the risk of a population counted once a %s: Kendall 2009)", 100*r.Options.Confidence, reports.Grouped(int64(k.Resamples)), u), "  ", 0)
}

// risk is a probability as percent in three digits; what no series can tell
// from none or from certain is said so.
func risk(p float64) string {
	switch {
	case p > 0 && p < 1e-4:
		return "below 0.01 %"
	case p < 1 && p > 1-1e-4:
		return "above 99.99 %"
	}
	return reports.Percent(p, 0)
}
