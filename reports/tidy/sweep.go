package tidy

import (
	"encoding/json"
	"math"
	"strconv"

	"ebbline/pva"
	"ebbline/pva/sweep"
)

type sweepCell struct {
	Keys        map[string]any    `json:"keys"`
	Name        string            `json:"name,omitempty"`
	Risk        *proportion       `json:"risk"`
	Extinction  *proportion       `json:"extinction"`
	Verdict     any               `json:"verdict"`
	Difference  *optionDifference `json:"difference"`
	Baseline    *proportion       `json:"baseline,omitempty"`
	Added       *difference       `json:"added,omitempty"`
	TakeMean    number            `json:"take_mean"`
	TakeTotal   number            `json:"take_total_mean"`
	Shortfall   number            `json:"shortfall_mean"`
	ExtraDeaths number            `json:"extra_deaths_mean"`
	ClosedYears number            `json:"closed_years_mean"`
	LastMean    number            `json:"mean_at_horizon"`
	Smallest    number            `json:"smallest_census_mean"`
	Outgrown    int64             `json:"outgrown"`
	Unsolved    bool              `json:"capacity_unsolved,omitempty"`
	Frontier    bool              `json:"on_frontier,omitempty"`
}

type crossing struct {
	Key    string      `json:"key,omitempty"`
	Value  *number     `json:"value,omitempty"`
	Low    number      `json:"low"`
	High   number      `json:"high"`
	Risk   *proportion `json:"risk,omitempty"`
	Exact  bool        `json:"exact"`
	Reason string      `json:"reason,omitempty"`
}

type breakRow struct {
	Riskier number `json:"riskier"`
	Safer   number `json:"safer"`
	Low     number `json:"low"`
	High    number `json:"high"`
}

type pointRow struct {
	Value   number      `json:"value"`
	Risk    *proportion `json:"risk"`
	Exact   bool        `json:"exact"`
	Verdict string      `json:"verdict"`
	// Unreachable is why there is no such case and no risk.
	Unreachable string `json:"unreachable,omitempty"`
}

type influenceRow struct {
	Key      string      `json:"key"`
	Value    number      `json:"value"`
	Less     *number     `json:"less"`
	LessRisk *proportion `json:"less_risk"`
	More     *number     `json:"more"`
	MoreRisk *proportion `json:"more_risk"`
	Span     number      `json:"span"`
}

type doubtSpan struct {
	Low    number `json:"low"`
	High   number `json:"high"`
	LowBy  string `json:"low_by"`
	HighBy string `json:"high_by"`
	Cells  int    `json:"cells"`
}

type doubts struct {
	Replicates *proportion `json:"replicates"`
	Inputs     *doubtSpan  `json:"inputs"`
	Structures *doubtSpan  `json:"structures"`
}

type leftOut struct {
	What   string `json:"what"`
	Reason string `json:"reason"`
}

type sweepDocument struct {
	Program    string         `json:"program"`
	Version    string         `json:"version"`
	Command    string         `json:"command"`
	Case       caseID         `json:"case"`
	Seed       uint64         `json:"seed"`
	Replicates int64          `json:"replicates"`
	Question   question       `json:"question"`
	Risk       *proportion    `json:"risk,omitempty"`
	Cells      []sweepCell    `json:"cells,omitempty"`
	Largest    any            `json:"largest_within_limit,omitempty"`
	Reason     string         `json:"reason,omitempty"`
	Minimum    any            `json:"minimum,omitempty"`
	Trace      []pointRow     `json:"trace,omitempty"`
	Monotone   *bool          `json:"monotone,omitempty"`
	Breaks     []breakRow     `json:"breaks,omitempty"`
	Influences []influenceRow `json:"influences,omitempty"`
	Doubts     *doubts        `json:"doubts,omitempty"`
	LeftOut    []leftOut      `json:"left_out,omitempty"`
	Warnings   []string       `json:"warnings"`
}

func header(s *sweep.Study, command, version string, warnings []pva.Warning) sweepDocument {
	c := s.Base
	d := sweepDocument{Program: "ebbline", Version: version, Command: command, Case: caseID{c.Title, c.Digest()}, Seed: c.Run.Seed, Replicates: c.Run.Replicates, Question: questionOf(c), Warnings: []string{}}
	for _, w := range warnings {
		d.Warnings = append(d.Warnings, w.String())
	}
	return d
}

// null is written for an answer that there is not.
type null struct{}

// MarshalJSON writes null.
func (null) MarshalJSON() ([]byte, error) { return []byte("null"), nil }

// SweepJSON is a sweep as an indented JSON document. The search may be nil where
// none was made.
func SweepJSON(r *sweep.Result, largest *sweep.Crossing, version string) ([]byte, error) {
	d := header(r.Study, "sweep", version, r.Warnings(largest))
	if r.Case != nil {
		d.Risk = proportionOf(r.Case.Risk)
	}
	for i, o := range r.Cells {
		if o != nil {
			d.Cells = append(d.Cells, cellOf(r.Study, i, o))
		}
	}
	if largest != nil {
		d.search(largest)
		if largest.Found {
			c := crossingOf(largest)
			c.Key = largest.Key
			d.Largest = c
		} else {
			d.Largest, d.Reason = null{}, largest.Reason
		}
	}
	if r.Study.Kind != sweep.Grid && r.Case != nil {
		for _, in := range sweep.Influences(r) {
			row := influenceRow{Key: in.Key, Value: number(in.Value), Span: number(in.Span)}
			if in.Less != nil {
				row.Less, row.LessRisk = ref(in.LessTo), proportionOf(in.Less.Risk)
			}
			if in.More != nil {
				row.More, row.MoreRisk = ref(in.MoreTo), proportionOf(in.More.Risk)
			}
			d.Influences = append(d.Influences, row)
		}
		all := sweep.DoubtsOf(r)
		d.Doubts = &doubts{Replicates: proportionOf(all.Replicates), Inputs: spanOf(all.Inputs), Structures: spanOf(all.Forms)}
		for _, l := range r.Study.Left {
			d.LeftOut = append(d.LeftOut, leftOut{l.What, l.Reason})
		}
	}
	return indentedSweep(d)
}

func spanOf(s sweep.Span) *doubtSpan {
	if s.Cells == 0 {
		return nil
	}
	return &doubtSpan{number(s.Low), number(s.High), s.LowBy, s.HighBy, s.Cells}
}

func cellOf(s *sweep.Study, i int, o *sweep.Outcome) sweepCell {
	out := sweepCell{Keys: map[string]any{}, Risk: proportionOf(o.Risk), Extinction: plainProportion(o.Extinction), Verdict: verdictOf(o.Verdict),
		Difference: optionDifferenceOf(o.Difference), TakeMean: number(o.TakeMean), TakeTotal: number(o.TakeTotalMean), Shortfall: number(o.ShortfallMean),
		ExtraDeaths: number(o.ExtraMean), ClosedYears: number(o.ClosedYears), LastMean: number(o.LastMean), Smallest: number(o.SmallestMean), Outgrown: o.Outgrown,
		Unsolved: o.Unsolved, Frontier: o.Best}
	if s.Kind == sweep.Grid {
		for d, v := range o.Values {
			out.Keys[s.Dimensions[d].Key] = number(v)
		}
	} else {
		out.Keys, out.Name = setOf(o.Set), s.Changes[i].Name
	}
	if o.Baseline != nil {
		out.Baseline, out.Added = proportionOf(*o.Baseline), differenceOf(*o.Added)
	}
	return out
}

func (d *sweepDocument) search(l *sweep.Crossing) {
	for _, p := range l.Points {
		row := pointRow{Value: number(p.Value), Exact: p.Exact != nil, Verdict: string(p.Verdict), Unreachable: p.Unreachable}
		if p.Unreachable == "" {
			row.Risk = pointRisk(p.Risk, p.Exact)
		}
		d.Trace = append(d.Trace, row)
	}
	monotone := len(l.Breaks) == 0
	if len(l.Points) > 0 {
		d.Monotone = &monotone
	}
	for _, b := range l.Breaks {
		d.Breaks = append(d.Breaks, breakRow{number(b.Riskier), number(b.Safer), number(b.Difference.Low), number(b.Difference.High)})
	}
}

// pointRisk is the risk of a value of a search; its interval holds at every look.
func pointRisk(p pva.Proportion, e *pva.ExactAnswer) *proportion {
	if e != nil {
		return &proportion{Estimate: number(p.Estimate), Low: number(p.Low), High: number(p.High), Interval: "exact"}
	}
	out := proportionOf(p)
	out.Interval = "sequence"
	return out
}

func crossingOf(l *sweep.Crossing) crossing {
	return crossing{Value: ref(l.Value), Low: number(l.Low()), High: number(l.High()), Risk: pointRisk(l.Risk, l.Exact), Exact: l.Exact != nil, Reason: l.Reason}
}

type minimumAnswer struct {
	Size      number      `json:"size"`
	Low       number      `json:"low"`
	High      number      `json:"high"`
	Risk      number      `json:"risk"` // the largest that counts as viable
	RiskThere *proportion `json:"risk_there"`
	Horizon   int         `json:"horizon"`
	Vary      string      `json:"vary"`
	Exact     bool        `json:"exact"`
	Reason    string      `json:"reason,omitempty"`
}

// MinimumJSON is the minimum viable size as an indented JSON document.
func MinimumJSON(s *sweep.Study, q *sweep.Sizes, l *sweep.Crossing, version string) ([]byte, error) {
	d := header(s, "minimum", version, l.Warnings(s))
	d.search(l)
	if l.Found {
		d.Minimum = minimumAnswer{number(l.Value), number(l.Low()), number(l.High()), number(q.Risk), pointRisk(l.Risk, l.Exact), q.Horizon, q.Vary, l.Exact != nil, l.Reason}
	} else {
		d.Minimum, d.Reason = null{}, l.Reason
	}
	return indentedSweep(d)
}

func indentedSweep(d sweepDocument) ([]byte, error) {
	out, err := json.MarshalIndent(d, "", "  ")
	if err != nil {
		return nil, err
	}
	return append(out, '\n'), nil
}

// SweepHead is the header row of sweep.csv.
func SweepHead(s *sweep.Study) []string {
	var head []string
	if s.Kind == sweep.Grid {
		for _, d := range s.Dimensions {
			head = append(head, guard(d.Key))
		}
	} else {
		head = append(head, "change", "key", "value")
	}
	return append(head, "replicates", "fallen_count", "risk", "low", "high", "extinct_count", "extinction", "verdict", "difference", "difference_low", "difference_high",
		"baseline", "added", "added_low", "added_high", "take_mean", "take_total_mean", "shortfall_mean", "extra_deaths_mean", "closed_years_mean", "mean_at_horizon",
		"smallest_census_mean", "outgrown", "capacity_unsolved", "on_frontier")
}

// SweepRow is one cell as a row of sweep.csv. Whether it is on the frontier is
// known only when the whole sweep is, and left empty before.
func SweepRow(s *sweep.Study, o *sweep.Outcome, whole bool) []string {
	var row []string
	if s.Kind == sweep.Grid {
		for _, v := range o.Values {
			row = append(row, num(v))
		}
	} else {
		ch := s.Changes[o.Cell]
		if ch.Kind == sweep.Each {
			row = append(row, string(ch.Kind), guard(ch.Key), num(ch.To))
		} else {
			row = append(row, string(ch.Kind), guard(ch.Name), "")
		}
	}
	base, added, low, high := math.NaN(), math.NaN(), math.NaN(), math.NaN()
	if o.Baseline != nil {
		base, added, low, high = o.Baseline.Estimate, o.Added.Estimate, o.Added.Low, o.Added.High
	}
	frontier := ""
	if whole {
		frontier = strconv.FormatBool(o.Best)
	}
	return append(row, strconv.FormatInt(o.Replicates, 10), strconv.FormatInt(o.Risk.Count, 10), num(o.Risk.Estimate), num(o.Risk.Low), num(o.Risk.High),
		strconv.FormatInt(o.Extinction.Count, 10), num(o.Extinction.Estimate), string(o.Verdict), num(o.Difference.Estimate), num(o.Difference.Low), num(o.Difference.High),
		num(base), num(added), num(low), num(high), num(o.TakeMean), num(o.TakeTotalMean), num(o.ShortfallMean), num(o.ExtraMean), num(o.ClosedYears), num(o.LastMean),
		num(o.SmallestMean), strconv.FormatInt(o.Outgrown, 10), strconv.FormatBool(o.Unsolved), frontier)
}

// SweepCSV is sweep.csv of a sweep as far as it is known, cells in their order.
func SweepCSV(r *sweep.Result) ([]byte, error) {
	rows := [][]string{SweepHead(r.Study)}
	for _, o := range r.Cells {
		if o != nil {
			rows = append(rows, SweepRow(r.Study, o, r.Whole()))
		}
	}
	return written(rows)
}

// TraceCSV is the values that a search looked at, ascending.
func TraceCSV(l *sweep.Crossing) ([]byte, error) {
	rows := [][]string{{guard(l.Key), "replicates", "fallen_count", "risk", "low", "high", "exact", "verdict"}}
	for _, p := range l.Points {
		if p.Unreachable != "" { // nothing was run
			rows = append(rows, []string{num(p.Value), "0", "0", "", "", "", "false", string(p.Verdict)})
			continue
		}
		rows = append(rows, []string{num(p.Value), strconv.FormatInt(p.Risk.Of, 10), strconv.FormatInt(p.Risk.Count, 10), num(p.Risk.Estimate), num(p.Risk.Low), num(p.Risk.High),
			strconv.FormatBool(p.Exact != nil), string(p.Verdict)})
	}
	return written(rows)
}
