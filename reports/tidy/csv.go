package tidy

import (
	"bytes"
	"encoding/csv"
	"math"
	"strconv"
	"strings"

	"ebbline/pva"
	"ebbline/reports"
)

// guard keeps a text cell from being run as a formula by a spreadsheet that
// opens the file: an apostrophe goes before =, +, -, @, a tab or a return.
func guard(s string) string {
	if s != "" && strings.ContainsRune("=+-@\t\r", rune(s[0])) {
		return "'" + s
	}
	return s
}

func num(v float64) string {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return ""
	}
	return strconv.FormatFloat(v, 'g', -1, 64)
}

// Years is years.csv: one row a year of the case, its baseline and its options.
func Years(a *pva.Assessment) ([]byte, error) {
	rows := [][]string{{"variant", "year", "label", "replicates", "fallen_count", "fallen", "fallen_low", "fallen_high", "extinct_count", "extinct", "outgrown",
		"mean", "p05", "p25", "p50", "p75", "p95", "take_mean", "shortfall_mean", "extra_deaths_mean", "stocked_mean", "closed"}}
	add := func(name string, o *pva.Outcome) {
		for _, y := range o.Years {
			rows = append(rows, []string{guard(name), strconv.Itoa(y.Year), strconv.Itoa(y.Label), strconv.FormatInt(o.Replicates, 10),
				strconv.FormatInt(y.Fallen.Count, 10), num(y.Fallen.Estimate), num(y.Fallen.Low), num(y.Fallen.High),
				strconv.FormatInt(y.Extinct.Count, 10), num(y.Extinct.Estimate), strconv.FormatInt(y.Outgrown, 10),
				num(y.Mean), num(y.Abundance.P05), num(y.Abundance.P25), num(y.Abundance.P50), num(y.Abundance.P75), num(y.Abundance.P95),
				num(y.TakeMean), num(y.ShortfallMean), num(y.ExtraMean), num(y.StockedMean), num(y.Closed.Estimate)})
		}
	}
	add("case", a.Outcome)
	if a.Baseline != nil {
		add("baseline", a.Baseline)
	}
	for _, o := range a.Options {
		add("option: "+o.Name, o.Outcome)
	}
	return written(rows)
}

// Inputs is inputs.csv: every value in force with its unit, source, note and status.
func Inputs(t *reports.Table) ([]byte, error) {
	var head []string
	for _, c := range t.Columns {
		head = append(head, strings.ToLower(c.Head))
	}
	rows := [][]string{head}
	for _, r := range t.Rows {
		line := make([]string, len(r.Cells))
		for i, cell := range r.Cells {
			switch cell.Kind {
			case reports.NumberCell:
				line[i] = num(cell.Num)
			case reports.TextCell:
				line[i] = guard(cell.Text)
			case reports.FlagCell:
				line[i] = strconv.FormatBool(cell.Flag)
			}
		}
		rows = append(rows, line)
	}
	return written(rows)
}

func written(rows [][]string) ([]byte, error) {
	var b bytes.Buffer
	w := csv.NewWriter(&b)
	if err := w.WriteAll(rows); err != nil {
		return nil, err
	}
	return b.Bytes(), nil
}
