package tidy

import (
	"bytes"
	"encoding/json"
	"math"
	"testing"

	"ebbline/pva/fit"
)

// TestFitJSON: the stable keys are there, figures agree with the fit, unknown
// ones are null, and two fits with one seed give the same bytes.
func TestFitJSON(t *testing.T) {
	s := &fit.Series{File: "teal-lakes.csv", TimeUnit: "year"}
	n := 300.0
	for i := 0; i < 24; i++ {
		s.Counts = append(s.Counts, fit.Count{Year: float64(1990 + i), Count: math.Round(n)})
		n *= math.Exp(0.02 + 0.3*math.Sin(2.3*float64(i*i)))
	}
	doc := func(seed uint64) (*fit.Result, []byte) {
		r, err := fit.Fit(s, fit.Options{Resamples: 100, Seed: seed})
		if err != nil {
			t.Fatal(err)
		}
		w, err := r.Case(fit.CaseOptions{Breeding: "pulse", Survival: 0.7, Split: 0.5})
		if err != nil {
			t.Fatal(err)
		}
		out, err := FitJSON(r, w, "0")
		if err != nil {
			t.Fatal(err)
		}
		return r, out
	}
	r, out := doc(5)
	var got struct {
		Program, Command string
		Seed             uint64
		Models           []struct {
			Name       string
			Parameters map[string]*float64
			AICc       *float64 `json:"aicc"`
			Weight     *float64
		}
		Drift, Variance float64
		Intervals       map[string]struct{ Low, High *float64 }
		Risk            struct {
			Estimate, Low, High float64
			Years               []map[string]float64
		}
		Written *struct{ Survival float64 }
	}
	if err := json.Unmarshal(out, &got); err != nil {
		t.Fatal(err)
	}
	if got.Program != "ebbline" || got.Command != "fit" || got.Seed != 5 || len(got.Models) != 4 || got.Written == nil || got.Written.Survival != 0.7 {
		t.Errorf("head: %+v", got)
	}
	if got.Drift != r.Drift.Mu.Value || got.Variance != r.Drift.Variance.Value || *got.Intervals["drift"].Low != r.Drift.Mu.Low || *got.Intervals["variance"].High != r.Drift.Variance.High {
		t.Errorf("drift: %+v", got)
	}
	if got.Models[0].Name != fit.Exponential || got.Models[0].Parameters["mu"] == nil || len(got.Risk.Years) != r.Options.Horizon || got.Risk.High != r.Risk.ByHorizon.High {
		t.Errorf("models or risk: %+v", got.Risk)
	}
	if _, again := doc(5); !bytes.Equal(out, again) {
		t.Error("the same seed gives other bytes")
	}
	if _, other := doc(6); bytes.Equal(out, other) {
		t.Error("another seed gives the same bytes")
	}
}

// TestFitJSONOutlying: a change among others that are all alike has a studentised
// residual without bound; the document stays one, with the change in it.
func TestFitJSONOutlying(t *testing.T) {
	unbounded := false
	for counts := 8; counts < 20; counts++ {
		s := &fit.Series{File: "teal-lakes.csv", TimeUnit: "year"}
		for i := range counts {
			n := 96.0
			if i >= 5 {
				n = 24
			}
			s.Counts = append(s.Counts, fit.Count{Year: float64(1990 + i), Count: n})
		}
		r, err := fit.Fit(s, fit.Options{Resamples: 100})
		if err != nil {
			t.Fatal(err)
		}
		for _, o := range r.Diagnostics.Outlying {
			unbounded = unbounded || math.IsInf(o.T, 0)
		}
		out, err := FitJSON(r, nil, "0")
		if err != nil {
			t.Fatal(err)
		}
		var got struct {
			Residuals struct {
				Outlying []struct {
					To   float64
					P    *float64
					Kind string
				}
			}
		}
		if err := json.Unmarshal(out, &got); err != nil {
			t.Fatal(err)
		}
		if o := got.Residuals.Outlying; len(o) != 1 || o[0].To != 1995 || o[0].Kind != "catastrophe" || o[0].P == nil || *o[0].P > 1e-6 {
			t.Errorf("%d counts: %+v", counts, o)
		}
	}
	if !unbounded {
		t.Error("no residual was without bound")
	}
}
