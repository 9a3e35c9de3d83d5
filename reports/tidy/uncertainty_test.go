package tidy

import (
	"encoding/json"
	"math"
	"testing"

	"ebbline/pva"
	"ebbline/reports/internal/invented"
)

// TestUncertaintyJSON: the key "uncertainty" holds what the draws say, unknown
// numbers are null, and risks name their interval; other documents have no such key.
func TestUncertaintyJSON(t *testing.T) {
	a := invented.Assessment(invented.Case(), 400)
	read := func() map[string]any {
		data, err := JSON(a, "0", "assess")
		if err != nil {
			t.Fatal(err)
		}
		var d map[string]any
		if err := json.Unmarshal(data, &d); err != nil {
			t.Fatal(err)
		}
		return d
	}
	plain := read()
	if plain["uncertainty"] != nil || plain["risk"].(map[string]any)["interval"] != "wilson" {
		t.Errorf("a document without draws has %v and %v", plain["uncertainty"], plain["risk"])
	}
	a.Uncertainty = &pva.Uncertainty{Draws: 2, Asked: 3, Each: 200, Redrawn: 1, Values: [][]float64{{0.4}, {0.5}},
		Inputs: []pva.UncertainInput{{Key: "births.rate", Law: "normal", Value: 0.45, Link: pva.Correlation{Estimate: math.NaN(), Low: -1, High: 1}}},
		Case: pva.DrawnRisk{Fallen: []int64{3, 4}, Within: &pva.Chance{Estimate: 0.8, Low: 0.7, High: 0.9}, Spread: pva.VarianceParts{Total: 0.1, Inputs: math.NaN(), Noise: math.NaN()},
			Law: pva.RiskLaw{Mean: 0.02, Alpha: math.Inf(1), Beta: math.Inf(1), Bins: []pva.RiskBin{{High: 0.1, Share: 1, Seen: 1}}}}}
	d := read()
	u := d["uncertainty"].(map[string]any)
	c, in := u["case"].(map[string]any), u["inputs"].([]any)[0].(map[string]any)
	for what, pair := range map[string][2]any{"draws": {u["draws"], 2.0}, "asked": {u["draws_asked"], 3.0}, "each": {u["replicates_a_draw"], 200.0}, "redrawn": {u["redrawn"], 1.0},
		"value": {u["values"].([]any)[1].([]any)[0], 0.5}, "key": {in["key"], "births.rate"}, "link": {in["partial_rank_correlation"].(map[string]any)["estimate"], nil},
		"within": {c["within_limit"].(map[string]any)["low"], 0.7}, "alpha": {c["alpha"], nil}, "noise": {c["variance_from_noise"], nil}, "method": {c["method"], "beta-binomial"},
		"fallen": {c["fallen"].([]any)[1], 4.0}, "share": {c["histogram"].([]any)[0].(map[string]any)["share"], 1.0}, "interval": {d["risk"].(map[string]any)["interval"], "between-draws"}} {
		if pair[0] != pair[1] {
			t.Errorf("%s is %v, want %v", what, pair[0], pair[1])
		}
	}
}
