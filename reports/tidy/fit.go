package tidy

import (
	"encoding/json"
	"math"

	"ebbline/pva/fit"
)

type interval struct {
	Low  number `json:"low"`
	High number `json:"high"`
}

type fitModel struct {
	Name       string            `json:"name"`
	Parameters map[string]number `json:"parameters"`
	Steps      int               `json:"steps"`
	ResidualSD number            `json:"residual_sd"`
	LogLik     number            `json:"log_likelihood"`
	AICc       number            `json:"aicc"`
	Weight     number            `json:"weight"`
	LeftOut    number            `json:"left_out_error"`
	Lag1       number            `json:"residual_autocorrelation"`
	Refused    *string           `json:"refused,omitempty"`
}

type fitRisk struct {
	Threshold number       `json:"threshold"`
	Horizon   int          `json:"horizon"`
	Estimate  number       `json:"estimate"`
	Low       number       `json:"low"`
	High      number       `json:"high"`
	Ever      number       `json:"ever"`
	EverLow   number       `json:"ever_low"`
	EverHigh  number       `json:"ever_high"`
	Process   number       `json:"process_variance_alone"`
	Resamples int          `json:"resamples"`
	Withheld  *string      `json:"withheld,omitempty"`
	Years     []fitRiskRow `json:"years"`
}

type fitRiskRow struct {
	Year   int    `json:"year"`
	Fallen number `json:"fallen"`
	Low    number `json:"fallen_low"`
	High   number `json:"fallen_high"`
}

type fitOutlying struct {
	From   number `json:"from"`
	To     number `json:"to"`
	Factor number `json:"factor"`
	P      number `json:"p"`
	Kind   string `json:"kind"`
}

type fitWritten struct {
	Model       string   `json:"model"`
	Survival    number   `json:"survival"`
	Variance    number   `json:"variance"`
	Demographic number   `json:"demographic_variance"`
	Weather     number   `json:"environmental_variance"`
	Start       number   `json:"start_abundance"`
	StartCV     number   `json:"start_cv"`
	How         []string `json:"how"`
}

type fitDocument struct {
	Program   string              `json:"program"`
	Version   string              `json:"version"`
	Command   string              `json:"command"`
	Counts    fitCounts           `json:"counts"`
	Seed      uint64              `json:"seed"`
	Level     number              `json:"confidence"`
	Models    []fitModel          `json:"models"`
	Best      *string             `json:"best"`
	Drift     number              `json:"drift"`
	Variance  number              `json:"variance"`
	Intervals map[string]interval `json:"intervals"`
	Lambda    number              `json:"growth_factor_of_the_mean"`
	AICc      number              `json:"drift_aicc"`
	Split     map[string]any      `json:"process_and_observation"`
	Residuals map[string]any      `json:"residuals"`
	Risk      fitRisk             `json:"risk"`
	Case      *fitWritten         `json:"written,omitempty"`
	Warnings  []string            `json:"warnings"`
}

type fitCounts struct {
	File       string `json:"file"`
	TimeUnit   string `json:"time_unit"`
	Counts     int    `json:"counts"`
	First      number `json:"first"`
	Last       number `json:"last"`
	LastCount  number `json:"last_count"`
	NotCounted int    `json:"not_counted"`
	Zeros      int    `json:"zeros"`
	ZeroRule   string `json:"zero_rule"`
}

// FitJSON is a fit as an indented JSON document; w, the case made from it, may
// be nil. Figures of a withheld risk and of refused models stand beside the
// reason why they are not to be used.
func FitJSON(r *fit.Result, w *fit.Written, version string) ([]byte, error) {
	d := fitDocument{Program: "ebbline", Version: version, Command: "fit", Seed: r.Options.Seed, Level: number(r.Options.Confidence),
		Counts: fitCounts{r.Series.File, r.Series.TimeUnit, r.Counts, number(r.First), number(r.Last), number(r.LastCount), r.Series.NotCounted, len(r.ZeroYears), string(r.Options.Zeros)},
		Drift:  number(r.Drift.Mu.Value), Variance: number(r.Drift.Variance.Value), Lambda: number(r.Drift.Lambda), AICc: number(r.Drift.AICc),
		Intervals: map[string]interval{
			"drift": intervalOf(r.Drift.Mu), "variance": intervalOf(r.Drift.Variance),
			"process_variance": intervalOf(r.Split.Process), "observation_variance": intervalOf(r.Split.Observation),
			"residual_autocorrelation": intervalOf(r.Diagnostics.Autocorrelation), "residual_trend": intervalOf(r.Diagnostics.Trend),
		},
		Split: map[string]any{"method": r.Split.Method, "drift": number(r.Split.Mu.Value), "process_variance": number(r.Split.Process.Value),
			"observation_variance": number(r.Split.Observation.Value), "log_likelihood": number(r.Split.LogLik), "stated_errors": r.Split.Stated, "told_apart": r.Split.Apart},
		Warnings: []string{}}
	for _, key := range []string{"last_abundance", "last_abundance_cv", "running_sums_variance"} {
		d.Split[key] = nil
	}
	if at := r.State(); at != nil {
		d.Split["last_abundance"], d.Split["last_abundance_cv"] = number(at.Mean()), number(at.CV())
	}
	if g := r.Diagnostics.RunningSums; g != nil {
		d.Split["running_sums_variance"] = number(g.Variance)
	}
	if r.Best != "" {
		d.Best = &r.Best
	}
	for _, m := range r.Models {
		d.Models = append(d.Models, modelOf(m))
	}
	outlying := []fitOutlying{}
	for _, o := range r.Diagnostics.Outlying {
		kind := "bonanza"
		if o.Down {
			kind = "catastrophe"
		}
		outlying = append(outlying, fitOutlying{number(o.From), number(o.To), number(o.Factor), number(o.P), kind})
	}
	d.Residuals = map[string]any{"autocorrelation": number(r.Diagnostics.Autocorrelation.Value), "trend": number(r.Diagnostics.Trend.Value),
		"trend_p": number(r.Diagnostics.TrendP), "largest": number(r.Diagnostics.Largest), "outlying": outlying}
	k := r.Risk
	d.Risk = fitRisk{number(k.Threshold), k.Horizon, number(k.ByHorizon.Value), number(k.ByHorizon.Low), number(k.ByHorizon.High),
		number(k.Ever.Value), number(k.Ever.Low), number(k.Ever.High), number(k.Process), k.Resamples, reason(k.Withheld), []fitRiskRow{}}
	for _, y := range k.Years {
		d.Risk.Years = append(d.Risk.Years, fitRiskRow{y.Year, number(y.Estimate), number(y.Low), number(y.High)})
	}
	for _, doubt := range r.Doubts {
		d.Warnings = append(d.Warnings, doubt.String())
	}
	if w != nil {
		d.Case = &fitWritten{w.Model, number(w.Survival), number(w.Variance), number(w.Demographic), number(w.Weather), number(w.Start), number(w.StartCV), w.How}
		for _, doubt := range w.Doubts {
			d.Warnings = append(d.Warnings, doubt.String())
		}
	}
	out, err := json.MarshalIndent(d, "", "  ")
	if err != nil {
		return nil, err
	}
	return append(out, '\n'), nil
}

func intervalOf(e fit.Estimate) interval { return interval{number(e.Low), number(e.High)} }

// reason is nil where there is none.
func reason(s string) *string {
	if s == "" {
		return nil
	}
	return &s
}

// modelOf names the parameters as the model writes them.
func modelOf(m fit.Model) fitModel {
	names := map[string][2]string{fit.Exponential: {"mu", ""}, fit.RickerModel: {"r", "slope"}, fit.GompertzModel: {"a", "slope"}, fit.ThetaModel: {"r", ""}}[m.Name]
	p := map[string]number{}
	put := func(name string, v float64) {
		if name != "" && !math.IsNaN(v) {
			p[name] = number(v)
		}
	}
	put(names[0], m.Growth.Value)
	put(names[0]+"_se", m.Growth.SE)
	put(names[1], m.Slope.Value)
	if names[1] != "" {
		put("slope_se", m.Slope.SE)
		put("slope_p", m.SlopeP)
	}
	if m.Name != fit.Exponential {
		put("capacity", m.Capacity.Value)
		put("theta", m.Theta)
	}
	return fitModel{m.Name, p, m.Steps, number(m.ResidualSD), number(m.LogLik), number(m.AICc), number(m.Weight), number(m.LeftOut), number(m.Autocorrelation), reason(m.Refused)}
}
