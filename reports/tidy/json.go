// Package tidy renders an assessment for programs: JSON with stable keys and
// CSV tables with one observation a row, both with full precision. Nothing in
// them depends on the clock or the number of workers, so that two runs can be
// compared byte for byte. Unknown and unbounded numbers are null in JSON and
// empty in CSV.
package tidy

import (
	"encoding/json"
	"math"

	"ebbline/pva"
)

// number is a double whose NaN and infinities are written as null.
type number float64

// MarshalJSON writes the shortest literal that reads back as the same double.
func (n number) MarshalJSON() ([]byte, error) {
	if math.IsNaN(float64(n)) || math.IsInf(float64(n), 0) {
		return []byte("null"), nil
	}
	return json.Marshal(float64(n))
}

type proportion struct {
	Estimate number `json:"estimate"`
	Low      number `json:"low"`
	High     number `json:"high"`
	Count    *int64 `json:"count,omitempty"`
	Interval string `json:"interval,omitempty"`
}

func proportionOf(p pva.Proportion) *proportion {
	count := p.Count
	return &proportion{number(p.Estimate), number(p.Low), number(p.High), &count, "wilson"}
}

func plainProportion(p pva.Proportion) *proportion {
	out := proportionOf(p)
	out.Interval = ""
	return out
}

// exactly is a probability known without replicates.
func exactly(p float64) *proportion {
	return &proportion{Estimate: number(p), Low: number(p), High: number(p)}
}

type difference struct {
	Estimate    number `json:"estimate"`
	Low         number `json:"low"`
	High        number `json:"high"`
	OnlyWith    int64  `json:"only_with"`
	OnlyWithout int64  `json:"only_without"`
}

func differenceOf(d pva.Difference) *difference {
	return &difference{number(d.Estimate), number(d.Low), number(d.High), d.OnlyThis, d.OnlyOther}
}

type optionDifference struct {
	Estimate   number `json:"estimate"`
	Low        number `json:"low"`
	High       number `json:"high"`
	OnlyOption int64  `json:"only_option"`
	OnlyCase   int64  `json:"only_case"`
}

func optionDifferenceOf(d pva.Difference) *optionDifference {
	return &optionDifference{number(d.Estimate), number(d.Low), number(d.High), d.OnlyThis, d.OnlyOther}
}

type yearRow struct {
	Year       int     `json:"year"`
	Label      int     `json:"label"`
	Fallen     number  `json:"fallen"`
	FallenLow  *number `json:"fallen_low,omitempty"`
	FallenHigh *number `json:"fallen_high,omitempty"`
	Extinct    number  `json:"extinct"`
	Mean       number  `json:"mean"`
	P05        *number `json:"p05,omitempty"`
	P25        *number `json:"p25,omitempty"`
	P50        *number `json:"p50,omitempty"`
	P75        *number `json:"p75,omitempty"`
	P95        *number `json:"p95,omitempty"`
	TakeMean   *number `json:"take_mean,omitempty"`
	Shortfall  *number `json:"shortfall_mean,omitempty"`
	Closed     *number `json:"closed,omitempty"`
	Outgrown   *int64  `json:"outgrown,omitempty"`
}

func ref(v float64) *number { n := number(v); return &n }

func yearsOf(o *pva.Outcome) []yearRow {
	rows := make([]yearRow, len(o.Years))
	for i := range o.Years {
		y := &o.Years[i]
		out := y.Outgrown
		rows[i] = yearRow{Year: y.Year, Label: y.Label, Fallen: number(y.Fallen.Estimate), FallenLow: ref(y.Fallen.Low), FallenHigh: ref(y.Fallen.High),
			Extinct: number(y.Extinct.Estimate), Mean: number(y.Mean), P05: ref(y.Abundance.P05), P25: ref(y.Abundance.P25), P50: ref(y.Abundance.P50),
			P75: ref(y.Abundance.P75), P95: ref(y.Abundance.P95), TakeMean: ref(y.TakeMean), Shortfall: ref(y.ShortfallMean), Closed: ref(y.Closed.Estimate), Outgrown: &out}
	}
	return rows
}

type level struct {
	Level int64  `json:"level"`
	Risk  number `json:"risk"`
	Low   number `json:"low"`
	High  number `json:"high"`
}

type baseline struct {
	Risk       *proportion `json:"risk"`
	Extinction *proportion `json:"extinction"`
	Added      *difference `json:"added"`
}

type option struct {
	Name       string            `json:"name"`
	Set        map[string]any    `json:"set"`
	Risk       *proportion       `json:"risk"`
	Extinction *proportion       `json:"extinction"`
	Verdict    any               `json:"verdict"`
	Difference *optionDifference `json:"difference"`
	Added      *difference       `json:"added,omitempty"`
	TakeMean   number            `json:"take_mean"`
	Exact      *exactAnswer      `json:"exact,omitempty"`
}

type driver struct {
	Without    string            `json:"without"`
	Risk       *proportion       `json:"risk"`
	Difference *optionDifference `json:"difference"`
}

type exactAnswer struct {
	Risk       number `json:"risk"`
	Extinction number `json:"extinction"`
	Error      number `json:"error"`
	Method     string `json:"method"`
}

func exactOf(e *pva.ExactAnswer) *exactAnswer {
	if e == nil || e.Reason != "" {
		return nil
	}
	return &exactAnswer{number(e.Risk), number(e.Extinction), number(e.Error), e.Method}
}

type caseID struct {
	Title  string `json:"title"`
	Digest string `json:"digest"`
}

type question struct {
	Threshold  number  `json:"threshold"`
	Horizon    int     `json:"horizon"`
	Limit      *number `json:"limit"`
	Confidence number  `json:"confidence"`
}

type document struct {
	Program    string      `json:"program"`
	Version    string      `json:"version"`
	Command    string      `json:"command"`
	Case       caseID      `json:"case"`
	Seed       *uint64     `json:"seed,omitempty"`
	Replicates *int64      `json:"replicates,omitempty"`
	Asked      *int64      `json:"replicates_asked,omitempty"`
	Question   question    `json:"question"`
	Risk       *proportion `json:"risk"`
	Extinction *proportion `json:"extinction"`
	Verdict    any         `json:"verdict"`
	Years      []yearRow   `json:"years"`
	TimeToFall *struct {
		P25 *int `json:"p25"`
		P50 *int `json:"p50"`
		P75 *int `json:"p75"`
	} `json:"time_to_fall,omitempty"`
	Smallest *struct {
		Mean   number  `json:"mean"`
		Levels []level `json:"levels"`
	} `json:"smallest_census,omitempty"`
	MeanLogGrowth *number      `json:"mean_log_growth,omitempty"`
	Outgrown      *int64       `json:"outgrown,omitempty"`
	TakeTotal     *number      `json:"take_total_mean,omitempty"`
	Baseline      *baseline    `json:"baseline,omitempty"`
	Options       []option     `json:"options,omitempty"`
	Drivers       []driver     `json:"drivers,omitempty"`
	Exact         *exactAnswer `json:"exact,omitempty"`
	Uncertainty   *uncertainty `json:"uncertainty,omitempty"`
	Unreliable    bool         `json:"unreliable,omitempty"`
	Warnings      []string     `json:"warnings"`
}

func questionOf(c *pva.Case) question {
	q := question{Threshold: number(c.Question.Threshold), Horizon: c.Question.Horizon, Confidence: number(c.Question.Confidence)}
	if c.Question.Limit.Set {
		q.Limit = ref(c.Question.Limit.Value)
	}
	return q
}

func verdictOf(v pva.Verdict) any {
	if v == pva.NoVerdict {
		return nil
	}
	return string(v)
}

// JSON is an assessment as an indented JSON document.
func JSON(a *pva.Assessment, version, command string) ([]byte, error) {
	o := a.Outcome
	proportionOf := func(p pva.Proportion) *proportion {
		out := proportionOf(p)
		if a.Sequential {
			out.Interval = "sequence"
		}
		return out
	}
	d := document{Program: "ebbline", Version: version, Command: command, Case: caseID{a.Case.Title, a.Case.Digest()}, Seed: &a.Seed, Replicates: &a.Replicates,
		Question: questionOf(a.Case), Risk: proportionOf(o.Risk), Extinction: plainProportion(o.Extinction), Verdict: verdictOf(a.Verdict), Years: yearsOf(o),
		MeanLogGrowth: ref(o.MeanLogGrowth), Outgrown: &o.Outgrown, TakeTotal: ref(o.TakeTotalMean), Exact: exactOf(a.Exact), Unreliable: a.Unreliable, Warnings: []string{}}
	if a.Asked != a.Replicates {
		d.Asked = &a.Asked
	}
	d.TimeToFall = &struct {
		P25 *int `json:"p25"`
		P50 *int `json:"p50"`
		P75 *int `json:"p75"`
	}{yearOrNull(o.FallP25), yearOrNull(o.FallP50), yearOrNull(o.FallP75)}
	d.Smallest = &struct {
		Mean   number  `json:"mean"`
		Levels []level `json:"levels"`
	}{Mean: number(o.SmallestMean), Levels: []level{}}
	for _, l := range o.Smallest {
		d.Smallest.Levels = append(d.Smallest.Levels, level{l.Level, number(l.Risk.Estimate), number(l.Risk.Low), number(l.Risk.High)})
	}
	if a.Baseline != nil {
		d.Baseline = &baseline{proportionOf(a.Baseline.Risk), plainProportion(a.Baseline.Extinction), differenceOf(*a.Added)}
	}
	for _, alt := range a.Options {
		opt := option{Name: alt.Name, Set: setOf(alt.Set), Risk: proportionOf(alt.Outcome.Risk), Extinction: plainProportion(alt.Outcome.Extinction), Verdict: verdictOf(alt.Verdict),
			Difference: optionDifferenceOf(alt.Difference), TakeMean: number(alt.Outcome.TakeMean), Exact: exactOf(alt.Exact)}
		if alt.Added != nil {
			opt.Added = differenceOf(*alt.Added)
		}
		d.Options = append(d.Options, opt)
	}
	for _, v := range a.Drivers {
		d.Drivers = append(d.Drivers, driver{v.Without, proportionOf(v.Risk), optionDifferenceOf(v.Difference)})
	}
	for _, w := range a.Warnings {
		d.Warnings = append(d.Warnings, w.String())
	}
	d.carryUncertainty(a)
	return indented(d)
}

// ExactJSON is an answer without random numbers in the same shape: the risk is
// its own interval, and there is no count, no seed and no replicates.
func ExactJSON(c *pva.Case, e *pva.ExactAnswer, verdict pva.Verdict, warnings []pva.Warning, version string) ([]byte, error) {
	d := document{Program: "ebbline", Version: version, Command: "exact", Case: caseID{c.Title, c.Digest()}, Question: questionOf(c),
		Risk: exactly(e.Risk), Extinction: exactly(e.Extinction), Verdict: verdictOf(verdict), Exact: exactOf(e), Warnings: []string{}}
	for i := range e.Fallen {
		d.Years = append(d.Years, yearRow{Year: i + 1, Label: c.Label(i + 1), Fallen: number(e.Fallen[i]), Extinct: number(e.Extinct[i]), Mean: number(e.Mean[i])})
	}
	for _, w := range warnings {
		d.Warnings = append(d.Warnings, w.String())
	}
	return indented(d)
}

func indented(d document) ([]byte, error) {
	out, err := json.MarshalIndent(d, "", "  ")
	if err != nil {
		return nil, err
	}
	return append(out, '\n'), nil
}

func yearOrNull(y int) *int {
	if y == 0 {
		return nil
	}
	return &y
}

// setOf is what an option sets, lists as arrays in the order given.
func setOf(settings []pva.Setting) map[string]any {
	out := map[string]any{}
	list := ""
	for _, s := range settings {
		var v any
		switch s.Value.Kind {
		case pva.NumberKind:
			v = number(s.Value.Num)
		case pva.TextKind:
			v = s.Value.Text
		case pva.FlagKind:
			v = s.Value.Flag
		case pva.ListKind:
			list = s.Path
			out[list] = []any{}
			continue
		}
		if list != "" && len(s.Path) > len(list) && s.Path[:len(list)+1] == list+"." {
			out[list] = append(out[list].([]any), v)
			continue
		}
		out[s.Path] = v
	}
	return out
}
