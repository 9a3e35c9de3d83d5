package text

import (
	"math"
	"strings"
	"testing"
	"unicode/utf8"

	"ebbline/pva/fit"
)

// counted is a fit to an invented series.
func counted(t *testing.T, bend float64) *fit.Result {
	t.Helper()
	s := &fit.Series{File: "teal-lakes.csv", TimeUnit: "year"}
	n := 300.0
	for i := 0; i < 24; i++ {
		s.Counts = append(s.Counts, fit.Count{Year: float64(1990 + i), Count: math.Round(n)})
		n *= math.Exp(0.02 + bend*math.Sin(2.3*float64(i*i)))
	}
	r, err := fit.Fit(s, fit.Options{Resamples: 100})
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// TestFitText: no line is wider than a terminal, and what matters is said.
func TestFitText(t *testing.T) {
	r := counted(t, 0.3)
	w, err := r.Case(fit.CaseOptions{Breeding: "pulse", Survival: 0.7, Split: 0.5})
	if err != nil {
		t.Fatal(err)
	}
	said := Fit(r, w)
	for _, line := range strings.Split(said, "\n") {
		if utf8.RuneCountInString(line) > Width {
			t.Errorf("wider than %d: %q", Width, line)
		}
	}
	for _, want := range []string{"teal-lakes.csv", "24 counts from 1990 to 2013", "mean log growth a year", "95 % interval", "exponential", "process variance", "How likely is a fall from", "How the case was made", "single animals", "not a forecast", "qualified biologist"} {
		if !strings.Contains(strings.Join(strings.Fields(said), " "), want) {
			t.Errorf("does not say %q:\n%s", want, said)
		}
	}
	r.Risk.Withheld = "for a reason"
	if said := Fit(r, nil); !strings.Contains(said, "Withheld: for a reason.") || strings.Contains(said, "by the drift model") || strings.Contains(said, "How the case was made") {
		t.Errorf("a withheld risk is shown:\n%s", said)
	}
}

// TestFitRiskWords: a risk of which nothing is known but that it is small is
// never printed as none.
func TestFitRiskWords(t *testing.T) {
	for p, want := range map[float64]string{0: "0 %", 1e-12: "below 0.01 %", 0.051: "5.1 %", 0.99999: "above 99.99 %", 1: "100 %"} {
		if got := risk(p); got != want {
			t.Errorf("%g is %q, want %q", p, got, want)
		}
	}
}
