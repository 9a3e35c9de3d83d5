package fit

import (
	"encoding/csv"
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
)

const published = "../../testdata/published/"

// readSeries reads one of the published series.
func readSeries(t testing.TB, name string) *Series {
	t.Helper()
	data, err := os.ReadFile(filepath.Join(published, "counts", name))
	if err != nil {
		t.Fatal(err)
	}
	s, err := Read(name, data)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func fitted(t testing.TB, name string, o Options) *Result {
	t.Helper()
	if o.Resamples == 0 {
		o.Resamples = 200 // the figures held here do not come from resampling
	}
	key := fmt.Sprint(name, o)
	if r := fits[key]; r != nil {
		return r
	}
	r, err := Fit(readSeries(t, name), o)
	if err != nil {
		t.Fatal(err)
	}
	fits[key] = r
	return r
}

// fits keeps what fitted has made: a result is never changed.
var fits = map[string]*Result{}

// agree fails unless two figures agree to a relative 1e-6, the accuracy to
// which two programs are asked to agree (the reference has ten digits).
func agree(t *testing.T, what string, got, want float64) {
	t.Helper()
	agreeTo(t, what, got, want, 1e-6)
}

func agreeTo(t *testing.T, what string, got, want, relative float64) {
	t.Helper()
	if !(math.Abs(got-want) <= relative*math.Abs(want)) {
		t.Errorf("%s: %.10g, want %.10g", what, got, want)
	}
}

type reference struct {
	Drift struct {
		Q            int       `json:"q"`
		Span         float64   `json:"t_q"`
		Mu           float64   `json:"mu"`
		Unbiased     float64   `json:"sigma2_unbiased"`
		ML           float64   `json:"sigma2_ml"`
		SE           float64   `json:"se_mu"`
		MuInterval   []float64 `json:"mu_ci95"`
		VarInterval  []float64 `json:"sigma2_ci95"`
		Lambda       float64   `json:"lambda_hat"`
		Lag1         float64   `json:"resid_lag1_r"`
		LargestResid float64   `json:"max_abs_std_resid"`
		LogLik       float64   `json:"logLik_logN"`
		AICc         float64   `json:"AICc"`
	} `json:"drift"`
	Tenth map[string]float64 `json:"fall_to_tenth"`
	Half  map[string]float64 `json:"fall_to_half"`
	Steps *int               `json:"n_steps"`
	None  *struct {
		Mu, SD, LogLik, AICc float64
	} `json:"density_independent"`
	Ricker   *regression `json:"ricker"`
	Gompertz *regression `json:"gompertz"`
	Theta    *struct {
		RSS, LogLik, AICc float64
	} `json:"theta_logistic"`
	Lag []float64 `json:"acf_log_growth_lag123"`
}

type regression struct {
	R       *float64 `json:"r"`
	A       *float64 `json:"a"`
	Slope   *float64 `json:"slope"`
	B       *float64 `json:"b"`
	K       float64  `json:"K"`
	Counted int      `json:"k"`
	SE      []float64
	SD      float64 `json:"resid_sd"`
	P       float64 `json:"slope_p"`
	LogLik  float64
	AICc    float64
}

func references(t *testing.T) map[string]reference {
	t.Helper()
	data, err := os.ReadFile(filepath.Join(published, "count_fits.json"))
	if err != nil {
		t.Fatal(err)
	}
	var doc struct{ Series map[string]reference }
	if err := json.Unmarshal(data, &doc); err != nil {
		t.Fatal(err)
	}
	if len(doc.Series) != 9 {
		t.Fatalf("%d series, want 9", len(doc.Series))
	}
	return doc.Series
}

// TestPublishedFits holds every series against fits made with R (sources in
// testdata/published/count_fits.json), to 1e-6.
func TestPublishedFits(t *testing.T) {
	for name, want := range references(t) {
		t.Run(name, func(t *testing.T) {
			r := fitted(t, name, Options{})
			d, w := r.Drift, want.Drift
			if d.Intervals != w.Q || d.Span != w.Span {
				t.Errorf("%d intervals over %v, want %d over %v", d.Intervals, d.Span, w.Q, w.Span)
			}
			agree(t, "mu", d.Mu.Value, w.Mu)
			agree(t, "its standard error", d.Mu.SE, w.SE)
			agree(t, "mu low", d.Mu.Low, w.MuInterval[0])
			agree(t, "mu high", d.Mu.High, w.MuInterval[1])
			agree(t, "variance", d.Variance.Value, w.Unbiased)
			agree(t, "variance by likelihood", d.VarianceML, w.ML)
			agree(t, "variance low", d.Variance.Low, w.VarInterval[0])
			agree(t, "variance high", d.Variance.High, w.VarInterval[1])
			agree(t, "lambda", d.Lambda, w.Lambda)
			agree(t, "log likelihood", d.LogLik, w.LogLik)
			agree(t, "AICc", d.AICc, w.AICc)
			agree(t, "lag-1 correlation of residuals", r.Diagnostics.Autocorrelation.Value, w.Lag1)
			agree(t, "largest residual", r.Diagnostics.Largest, w.LargestResid)
			for share, risks := range map[float64]map[string]float64{0.1: want.Tenth, 0.5: want.Half} {
				p := Passage{-math.Log(share), d.Mu.Value, d.Variance.Value}
				agree(t, "ever", p.Ever(), risks["ever"])
				for _, by := range []float64{20, 50, 100} {
					agree(t, "by "+strconv.Itoa(int(by)), p.By(by), risks["by"+strconv.Itoa(int(by))])
				}
			}
			if want.Steps == nil {
				if r.Best != "" {
					t.Errorf("%s is chosen from %d steps", r.Best, r.Steps)
				}
				return
			}
			holdModels(t, r, want)
		})
	}
}

func holdModels(t *testing.T, r *Result, want reference) {
	if r.Steps != *want.Steps {
		t.Errorf("%d steps of one unit, want %d", r.Steps, *want.Steps)
	}
	none := r.Model(Exponential)
	agree(t, "mean log growth", none.Growth.Value, want.None.Mu)
	agree(t, "its sd", none.ResidualSD, want.None.SD)
	agree(t, "exponential log likelihood", none.LogLik, want.None.LogLik)
	agree(t, "exponential AICc", none.AICc, want.None.AICc)
	agree(t, "lag-1 correlation of growth", none.Autocorrelation, want.Lag[0])
	for name, w := range map[string]*regression{RickerModel: want.Ricker, GompertzModel: want.Gompertz} {
		m := r.Model(name)
		a, b := w.A, w.B
		if name == RickerModel {
			a, b = w.R, w.Slope
		}
		agree(t, name+" growth", m.Growth.Value, *a)
		agree(t, name+" slope", m.Slope.Value, *b)
		agree(t, name+" K", m.Capacity.Value, w.K)
		if m.Parameters != w.Counted {
			t.Errorf("%s: %d parameters, want %d", name, m.Parameters, w.Counted)
		}
		agree(t, name+" standard error of growth", m.Growth.SE, w.SE[0])
		agree(t, name+" standard error of slope", m.Slope.SE, w.SE[1])
		agree(t, name+" chance of the slope", m.SlopeP, w.P)
		agree(t, name+" residual sd", m.ResidualSD, w.SD)
		agree(t, name+" log likelihood", m.LogLik, w.LogLik)
		agree(t, name+" AICc", m.AICc, w.AICc)
	}
	if want.Theta != nil {
		m := r.Model(ThetaModel)
		agree(t, "theta-logistic sum of squares", m.RSS, want.Theta.RSS)
		agree(t, "theta-logistic log likelihood", m.LogLik, want.Theta.LogLik)
		agree(t, "theta-logistic AICc", m.AICc, want.Theta.AICc)
	}
	sum := 0.0
	for _, m := range r.Models {
		sum += m.Weight
	}
	agreeTo(t, "sum of weights", sum, 1, 1e-12)
}

// TestPublishedErrors holds process and observation variance against the
// likelihood maximised in R (sources in testdata/published/count_errors.csv).
// The likelihood has nine digits there; where it is flat, the place of its top
// is known to fewer: half its last digit moves a variance by that of the adder
// series (about 1e-4 of its small observation variance) at most.
func TestPublishedErrors(t *testing.T) {
	data, err := os.ReadFile(filepath.Join(published, "count_errors.csv"))
	if err != nil {
		t.Fatal(err)
	}
	p := csv.NewReader(strings.NewReader(string(data)))
	p.Comment = '#'
	rows, err := p.ReadAll()
	if err != nil || len(rows) != 13 {
		t.Fatal(len(rows), err)
	}
	for _, row := range rows[1:] {
		num := func(i int) float64 { v, _ := strconv.ParseFloat(row[i], 64); return v }
		r := fitted(t, row[0], Options{})
		s := r.Likely
		if row[1] == "REML" {
			s = r.Split
		}
		name := row[0] + " " + row[1]
		if !(math.Abs(-s.LogLik-num(6)) <= 1e-8*math.Abs(num(6))) {
			t.Errorf("%s: -log likelihood %.10g, want %.10g", name, -s.LogLik, num(6))
		}
		agree(t, name+" mu", s.Mu.Value, num(2))
		agree(t, name+" se", s.Mu.SE, num(3))
		agreeTo(t, name+" process variance", s.Process.Value, num(4), 1e-5)
		if num(5) > 1e-12 {
			agreeTo(t, name+" observation variance", s.Observation.Value, num(5), 1e-4)
			continue
		}
		// On the edge the answer is the drift model's own.
		want := r.Drift.VarianceML
		if row[1] == "REML" {
			want = r.Drift.Variance.Value
		}
		if s.Observation.Value != 0 {
			t.Errorf("%s: observation variance %g, want 0", name, s.Observation.Value)
		}
		agreeTo(t, name+" at the edge", s.Process.Value, want, 1e-9)
		agreeTo(t, name+" drift at the edge", s.Mu.Value, r.Drift.Mu.Value, 1e-9)
	}
}

// TestRefusals: what the published series must not be used for.
func TestRefusals(t *testing.T) {
	for _, name := range []string{"grizzly.csv", "adder_1981_1995.csv"} {
		r := fitted(t, name, Options{})
		for _, model := range []string{RickerModel, GompertzModel} {
			if m := r.Model(model); !strings.Contains(m.Refused, "growth rises with abundance") || m.Weight != 0 {
				t.Errorf("%s: a slope upwards of %s is not refused: %q, weight %g", name, model, m.Refused, m.Weight)
			}
		}
		if m := r.Model(ThetaModel); !strings.Contains(m.Refused, "does not converge") {
			t.Errorf("%s: theta-logistic: %q", name, m.Refused)
		}
		if r.Best != Exponential {
			t.Errorf("%s: %s is chosen", name, r.Best)
		}
		if _, err := r.Case(CaseOptions{Breeding: "pulse", Survival: 0.5, Split: 0.5, Model: RickerModel}); err == nil || !strings.Contains(err.Error(), "growth rises") {
			t.Errorf("%s: a case with a refused model: %v", name, err)
		}
	}
	for _, name := range []string{"lynx_1821_1934.csv", "hare_1900_1920.csv", "whooping_crane_1976_1993.csv"} {
		if r := fitted(t, name, Options{}); !strings.Contains(r.Risk.Withheld, "residuals too correlated") {
			t.Errorf("%s: lag-1 correlation %.3f, and the risk is stated (%q)", name, r.Diagnostics.Autocorrelation.Value, r.Risk.Withheld)
		}
	}
	if r := fitted(t, "grizzly.csv", Options{}); r.Risk.Withheld != "" {
		t.Errorf("grizzly: the risk is withheld: %s", r.Risk.Withheld)
	}
	if v, err := AICc(-1, 3, 4); err == nil {
		t.Errorf("AICc of 3 parameters and 4 steps is %v", v)
	}
	if v, err := AICc(-1, 3, 5); err != nil || v != 2+6+24 {
		t.Errorf("AICc of 3 parameters and 5 steps is %v, %v, want 32", v, err)
	}
}

// TestLynxTheta: the theta-logistic curve of the lynx has a best exponent
// between the Gompertz line (exponent 0) and the Ricker curve (exponent 1),
// which both fit worse; the sum of squares is computed anew from the formula.
func TestLynxTheta(t *testing.T) {
	r := fitted(t, "lynx_1821_1934.csv", Options{})
	m := r.Model(ThetaModel)
	if m.Refused != "" || !(m.Theta > 0.1 && m.Theta < 1) {
		t.Fatalf("theta %g: %s", m.Theta, m.Refused)
	}
	s := oneYearSteps(r.p)
	of := func(theta float64) float64 {
		sum := 0.0
		for i := range s.r {
			e := s.r[i] - m.Growth.Value*(1-math.Pow(s.n[i]/m.Capacity.Value, theta))
			sum += e * e
		}
		return sum
	}
	agreeTo(t, "sum of squares", of(m.Theta), m.RSS, 1e-9)
	for _, other := range []string{RickerModel, GompertzModel} {
		if m.RSS >= r.Model(other).RSS {
			t.Errorf("theta-logistic %g, %s %g", m.RSS, other, r.Model(other).RSS)
		}
	}
	if of(m.Theta*1.01) < m.RSS || of(m.Theta*0.99) < m.RSS {
		t.Error("the sum of squares is lower beside the exponent found")
	}
}

// TestLeftOut holds the leave-one-out error in closed form against fits that
// leave each step out in turn.
func TestLeftOut(t *testing.T) {
	r := fitted(t, "hare_1900_1920.csv", Options{})
	s := oneYearSteps(r.p)
	for _, name := range []string{RickerModel, GompertzModel} {
		sum, turned := 0.0, 0
		for i := range s.r {
			rest := steps{append(append([]float64{}, s.n[:i]...), s.n[i+1:]...), append(append([]float64{}, s.r[:i]...), s.r[i+1:]...)}
			m := fitLine(name, rest, 0.95)
			if m.Slope.Value >= 0 {
				turned++
			}
			e := s.r[i] - m.At(s.n[i])
			sum += e * e
		}
		m := r.Model(name)
		agreeTo(t, name+" left out", m.LeftOut, math.Sqrt(sum/float64(len(s.r))), 1e-9)
		if m.Turned != turned {
			t.Errorf("%s: the slope turns in %d fits, want %d", name, m.Turned, turned)
		}
	}
}
