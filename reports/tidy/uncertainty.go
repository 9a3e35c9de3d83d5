package tidy

import "ebbline/pva"

type chance struct {
	Estimate number `json:"estimate"`
	Low      number `json:"low"`
	High     number `json:"high"`
}

func chanceOf(c *pva.Chance) *chance {
	if c == nil {
		return nil
	}
	return &chance{number(c.Estimate), number(c.Low), number(c.High)}
}

type uncertainInput struct {
	Key         string `json:"key"`
	Law         string `json:"law"`
	Value       number `json:"value"`
	Mean        number `json:"mean"`
	SD          number `json:"sd"`
	Outside     int    `json:"outside"`
	Correlation chance `json:"partial_rank_correlation"`
}

type riskBin struct {
	Low   number `json:"low"`
	High  number `json:"high"`
	Share number `json:"share"`
	Seen  number `json:"seen"`
}

// drawnRisk is the risk of one variant over the draws. The method of its law is
// "exact" or "beta-binomial"; the shapes are null where the counts vary no more
// than replicates of one risk do.
type drawnRisk struct {
	Name        string    `json:"name,omitempty"`
	Fallen      []int64   `json:"fallen"`
	Exact       []number  `json:"exact,omitempty"`
	ExactError  *number   `json:"exact_error,omitempty"`
	ExactMean   *chance   `json:"exact_mean,omitempty"`
	Method      string    `json:"method,omitempty"`
	Reason      string    `json:"reason,omitempty"`
	Mean        *number   `json:"mean,omitempty"`
	SD          *number   `json:"sd,omitempty"`
	Alpha       *number   `json:"alpha,omitempty"`
	Beta        *number   `json:"beta,omitempty"`
	P05         *number   `json:"p05,omitempty"`
	P25         *number   `json:"p25,omitempty"`
	P50         *number   `json:"p50,omitempty"`
	P75         *number   `json:"p75,omitempty"`
	P95         *number   `json:"p95,omitempty"`
	Within      *chance   `json:"within_limit,omitempty"`
	Variance    number    `json:"variance"`
	FromInputs  number    `json:"variance_from_inputs"`
	FromNoise   number    `json:"variance_from_noise"`
	RiskOverAll []riskBin `json:"histogram,omitempty"`
}

func drawnRiskOf(r *pva.DrawnRisk) *drawnRisk {
	if r == nil {
		return nil
	}
	out := &drawnRisk{Name: r.Name, Fallen: r.Fallen, Within: chanceOf(r.Within),
		Variance: number(r.Spread.Total), FromInputs: number(r.Spread.Inputs), FromNoise: number(r.Spread.Noise)}
	for _, p := range r.Exact {
		out.Exact = append(out.Exact, number(p))
	}
	l := r.Law
	if out.Reason = l.Reason; l.Reason != "" {
		return out
	}
	out.Method = "beta-binomial"
	if l.Exact {
		out.Method = "exact"
		out.ExactError, out.ExactMean = ref(r.ExactError), chanceOf(&r.Mean)
	} else {
		out.Alpha, out.Beta = ref(l.Alpha), ref(l.Beta)
	}
	out.Mean, out.SD = ref(l.Mean), ref(l.SD)
	q := l.Percentiles
	out.P05, out.P25, out.P50, out.P75, out.P95 = ref(q.P05), ref(q.P25), ref(q.P50), ref(q.P75), ref(q.P95)
	for _, b := range l.Bins {
		out.RiskOverAll = append(out.RiskOverAll, riskBin{number(b.Low), number(b.High), number(b.Share), number(b.Seen)})
	}
	return out
}

type uncertainty struct {
	Draws    int              `json:"draws"`
	Asked    int              `json:"draws_asked"`
	Each     int64            `json:"replicates_a_draw"`
	Redrawn  int              `json:"redrawn"`
	Unsolved int              `json:"unsolved"`
	Inputs   []uncertainInput `json:"inputs"`
	Values   [][]number       `json:"values"` // by draw and input
	Case     *drawnRisk       `json:"case"`
	Baseline *drawnRisk       `json:"baseline,omitempty"`
	Options  []*drawnRisk     `json:"options,omitempty"`
	Stated   *exactAnswer     `json:"at_stated_values,omitempty"`
}

// carryUncertainty adds what the draws say, and names the intervals of risks for
// what they then are. Documents of other cases stay as they are.
func (d *document) carryUncertainty(a *pva.Assessment) {
	u := a.Uncertainty
	if u == nil {
		return
	}
	out := &uncertainty{Draws: u.Draws, Asked: u.Asked, Each: u.Each, Redrawn: u.Redrawn, Unsolved: u.Unsolved, Inputs: []uncertainInput{},
		Values: make([][]number, len(u.Values)), Case: drawnRiskOf(&u.Case), Baseline: drawnRiskOf(u.Baseline), Stated: exactOf(u.Stated)}
	for _, in := range u.Inputs {
		out.Inputs = append(out.Inputs, uncertainInput{in.Key, in.Law, number(in.Value), number(in.Mean), number(in.SD), in.Outside,
			chance{number(in.Link.Estimate), number(in.Link.Low), number(in.Link.High)}})
	}
	for i, row := range u.Values {
		out.Values[i] = make([]number, len(row))
		for j, v := range row {
			out.Values[i][j] = number(v)
		}
	}
	for i := range u.Options {
		out.Options = append(out.Options, drawnRiskOf(&u.Options[i]))
	}
	d.Uncertainty = out
	risks := []*proportion{d.Risk}
	if d.Baseline != nil {
		risks = append(risks, d.Baseline.Risk)
	}
	for i := range d.Options {
		risks = append(risks, d.Options[i].Risk)
	}
	for i := range d.Drivers {
		risks = append(risks, d.Drivers[i].Risk)
	}
	for _, p := range risks {
		p.Interval = "between-draws"
	}
}
