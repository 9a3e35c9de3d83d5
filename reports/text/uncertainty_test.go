package text

import (
	"math"
	"strings"
	"testing"

	"ebbline/pva"
)

// TestUncertaintyLines: where the risk lies, what is noise and what it goes with,
// the strongest first and only what is told apart from none.
func TestUncertaintyLines(t *testing.T) {
	u := &pva.Uncertainty{Draws: 200, Each: 50, Stated: &pva.ExactAnswer{Risk: 0.0934},
		Inputs: []pva.UncertainInput{{Key: "weak", Link: pva.Correlation{Estimate: 0.1, Low: -0.05, High: 0.2}}, {Key: "some", Link: pva.Correlation{Estimate: 0.4, Low: 0.2, High: 0.5}},
			{Key: "none", Link: pva.Correlation{Estimate: math.NaN(), Low: -1, High: 1}}, {Key: "much", Link: pva.Correlation{Estimate: -0.8, Low: -0.9, High: -0.7}}},
		Case: pva.DrawnRisk{Spread: pva.VarianceParts{Total: 0.01, Inputs: 0.0075, Noise: 0.0025}, Law: pva.RiskLaw{Percentiles: pva.Percentiles{P05: 0.01, P50: 0.125, P95: 0.5}}}}
	got := strings.Join(strings.Fields(uncertainty(&pva.Assessment{Uncertainty: u})), " ")
	for _, want := range []string{"over 200 draws of the uncertain inputs the risk is 1 % to 50 % in nine of ten, half of them below 12.5 %", "25 % was replicate noise",
		"it goes with much -0.80, some 0.40 (partial", "at the stated values it is exactly 9.34 %"} {
		if !strings.Contains(got, want) {
			t.Errorf("%q does not say %q", got, want)
		}
	}
	u.Case.Law = pva.RiskLaw{Reason: "for a reason"}
	if got := uncertainty(&pva.Assessment{Uncertainty: u}); !strings.Contains(got, "for a reason") || strings.Contains(got, "goes with") {
		t.Errorf("%q", got)
	}
	if got := uncertainty(&pva.Assessment{}); got != "" {
		t.Errorf("without uncertain inputs: %q", got)
	}
}
