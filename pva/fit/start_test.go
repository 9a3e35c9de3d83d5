package fit

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"ebbline/pva"
	"ebbline/rng"
)

// predictLast is the best linear unbiased prediction of the state at the last
// count, and its mean squared error, from the whole covariance matrix of the
// counts (A. S. Goldberger 1962, J. Am. Stat. Assoc. 57:369-375): the counts are
// a first state and a drift, both unknown, plus a random walk and errors.
func predictLast(p *prepared, process float64, errorOf func(i int) float64) (last, spread float64) {
	n := len(p.y)
	at := func(i int) float64 { return p.year[i] - p.year[0] }
	v := mat.NewSymDense(n, nil)
	x := mat.NewDense(n, 2, nil)
	shared := mat.NewVecDense(n, nil) // covariance of a count with the last state
	for i := range n {
		for j := i; j < n; j++ {
			v.SetSym(i, j, process*at(i))
		}
		v.SetSym(i, i, process*at(i)+errorOf(i))
		x.Set(i, 0, 1)
		x.Set(i, 1, at(i))
		shared.SetVec(i, process*at(i))
	}
	var inverse, w, xwx, covariance mat.Dense
	if err := inverse.Inverse(v); err != nil {
		panic(err)
	}
	w.Mul(x.T(), &inverse)
	xwx.Mul(&w, x)
	if err := covariance.Inverse(&xwx); err != nil {
		panic(err)
	}
	y := mat.NewVecDense(n, p.y)
	var wy, beta, fit, rest, weights mat.VecDense
	wy.MulVec(&w, y)
	beta.MulVec(&covariance, &wy)
	fit.MulVec(x, &beta)
	rest.SubVec(y, &fit)
	weights.MulVec(&inverse, shared)
	final := mat.NewVecDense(2, []float64{1, at(n - 1)})
	last = mat.Dot(final, &beta) + mat.Dot(&weights, &rest)
	var seen, off, scaled mat.VecDense
	seen.MulVec(x.T(), &weights)
	off.SubVec(final, &seen)
	scaled.MulVec(&covariance, &off)
	return last, process*at(n-1) - mat.Dot(&weights, shared) + mat.Dot(&off, &scaled)
}

// TestFilteredState holds the filter's last state against the prediction from
// the whole covariance matrix, with gaps in the dates and errors of each count.
func TestFilteredState(t *testing.T) {
	p := simulated(rng.NewStream(81, 0, rng.Resample), 15, 0.03, 0.04, 0.02)
	for i := range p.y {
		p.known = append(p.known, 0.002*float64(i+1))
	}
	for _, c := range []struct{ process, observation float64 }{{0.03, 0.015}, {0.002, 0.05}, {0, 0.02}, {0.05, 0}} {
		f := filter(p, c.process, c.observation)
		last, spread := predictLast(p, c.process, func(i int) float64 { return c.observation + p.known[i] })
		agreeTo(t, fmt.Sprintf("%+v last state", c), f.last, last, 1e-10)
		agreeTo(t, fmt.Sprintf("%+v its variance", c), f.spread, spread, 1e-9)
	}
	// Without any error the last state is the last count, and known.
	p.known = nil
	if f := filter(p, 0.03, 0); f.last != p.y[14] || f.spread != 0 {
		t.Errorf("without errors: %g (variance %g), want %g", f.last, f.spread, p.y[14])
	}
}

// stated is an invented series of counts with errors of 40 %, its last count
// far below what the counts before it let expect.
func stated(t *testing.T, scale, last float64) *Result {
	t.Helper()
	s := &Series{File: "stated.csv", TimeUnit: "year", Errors: true}
	for i, n := range []float64{52, 71, 44, 60, 81, 55, 47, 66, 90, 58, 49, 75, 62, 53, last / scale} {
		s.Counts = append(s.Counts, Count{Year: float64(2000 + i), Count: scale * n, CV: 0.4})
	}
	r, err := Fit(s, Options{Resamples: 100, Threshold: scale * 10, Horizon: 20})
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func number(w *Written, path string) float64 {
	for _, e := range w.Entries {
		if e.Path == path {
			return e.Value.Num
		}
	}
	return math.NaN()
}

// TestCaseStart: where observation error is parted from the process, the case
// starts from the filtered state, as the log-normal law whose logarithm is
// normal with the state's mean and variance; where the error is in the variance
// that makes the weather, it starts from the last count without an error.
func TestCaseStart(t *testing.T) {
	r := stated(t, 1, 24)
	o := CaseOptions{Breeding: "pulse", Survival: 0.7, Split: 0.5, Model: Exponential}
	w, err := r.Case(o)
	if err != nil {
		t.Fatal(err)
	}
	last, spread := predictLast(r.p, r.Split.Process.Value, func(int) float64 { return math.Log1p(0.4 * 0.4) })
	mean, cv := math.Exp(last+spread/2), math.Sqrt(math.Expm1(spread))
	if got := number(w, "start.abundance"); got != math.Round(mean) || got < 40 {
		t.Errorf("starts at %g, want %.4g (last count 24)", got, mean)
	}
	agreeTo(t, "start.cv", number(w, "start.cv"), cv, 1e-7)
	if !(cv < 0.35) {
		t.Errorf("a coefficient of variation of %.3g: the counts before the last add nothing to its 0.4", cv)
	}
	// The law of the case has that mean of the logarithm and that variance.
	agreeTo(t, "mean of the logarithm", math.Log(mean)-math.Log1p(cv*cv)/2, last, 1e-9)
	if told := strings.Join(w.How, " "); !strings.Contains(told, "filtered state of the last count") || strings.Contains(told, "not counted twice") {
		t.Errorf("told: %s", told)
	}
	if _, faults := pva.Build(w.Entries); len(faults) > 0 {
		t.Error(faults)
	}

	// The same counts with crowding: the stated errors are in the residuals.
	o.Model = RickerModel
	once := func(what string, r *Result, o CaseOptions) {
		t.Helper()
		w, err := r.Case(o)
		if err != nil {
			t.Fatal(what, err)
		}
		if got, cv := number(w, "start.abundance"), number(w, "start.cv"); got != math.Round(r.LastCount) || !math.IsNaN(cv) || w.StartCV != 0 {
			t.Errorf("%s: starts at %g with a coefficient of variation of %g beside the error in the weather", what, got, cv)
		}
		if told := strings.Join(w.How, " "); !strings.Contains(told, "not counted twice") {
			t.Errorf("%s: not told: %s", what, told)
		}
	}
	once("crowding", r, o)
	// An error that is fitted but not followed stays in the drift's variance.
	once("nothing left to the process", declining(t), CaseOptions{Breeding: "pulse", Survival: 0.8, Split: 0.5, Model: Exponential})
}

// TestStartOfLessThanOne: what is refused is a start of less than one unit, not
// a last count of less.
func TestStartOfLessThanOne(t *testing.T) {
	o := CaseOptions{Breeding: "pulse", Survival: 0.7, Split: 0.5, Model: Exponential}
	for _, c := range []struct {
		scale, last float64
		refused     bool
	}{{0.05, 0.45, false}, {0.005, 0.55, true}} {
		r := stated(t, c.scale, c.last)
		w, err := r.Case(o)
		if refused := err != nil && strings.Contains(err.Error(), "less than one unit"); refused != c.refused || err == nil && w.Start < 1 {
			t.Errorf("last count %g, filtered %.3g: refused %v (%v)", c.last, r.State().Mean(), refused, err)
		}
	}
}

// TestRiskWithoutErrors: the risk without the errors of counting is the first
// passage averaged over the filtered state: here by the rectangle rule, with
// what lies at or below the threshold fallen. Where the errors are not parted
// there is none.
func TestRiskWithoutErrors(t *testing.T) {
	r := stated(t, 1, 24)
	s := r.State()
	const steps = 200000
	sum := 0.0
	for i := 0; i < steps; i++ {
		z := -9 + 18*(float64(i)+0.5)/steps
		x := s.Log + z*math.Sqrt(s.Variance) - math.Log(10)
		fall := 1.0
		if x > 0 {
			fall = Passage{x, r.Split.Mu.Value, r.Split.Process.Value}.By(20)
		}
		sum += fall * math.Exp(-z*z/2) / math.Sqrt(2*math.Pi) * 18 / steps
	}
	agreeTo(t, "risk without errors of counting", r.Risk.Process, sum, 1e-7)
	if r := declining(t); !math.IsNaN(r.Risk.Process) {
		t.Errorf("a risk of %g without errors that are not parted", r.Risk.Process)
	}
}

// TestPassageFrom: the average over an unknown start against closed forms. With
// all time ahead and a drift upwards a start x above the threshold falls with
// chance exp(-2 mu x/variance), whose average is a shifted normal's; without
// drift and with the mean start at the threshold it is 1/2 + atan(s/sd)/pi, by
// the chance of a quadrant (W. F. Sheppard 1899, Phil. Trans. R. Soc. A
// 192:101-167); without variance a start below -mu t has fallen.
func TestPassageFrom(t *testing.T) {
	phi := func(z float64) float64 { return 0.5 * math.Erfc(-z/math.Sqrt2) }
	for _, c := range []struct{ x, mu, variance, spread float64 }{
		{1, 0.1, 0.05, 0.2}, {3, 0.02, 0.3, 0.5}, {0.5, 0.5, 0.01, 0.1}, {-0.4, 0.2, 0.1, 0.3}, {2, 0.01, 0.05, 1e-6}, {6, 0.3, 0.2, 4},
	} {
		sd := math.Sqrt(c.spread)
		k := 2 * c.mu / c.variance
		want := phi(-c.x/sd) + math.Exp(-k*c.x+k*k*c.spread/2)*phi((c.x-k*c.spread)/sd)
		agreeTo(t, fmt.Sprintf("%+v ever", c), Passage{c.x, c.mu, c.variance}.ByFrom(1e7, c.spread), want, 1e-9)
		agreeTo(t, fmt.Sprintf("%+v without drift", c), Passage{0, 0, c.variance}.ByFrom(7, c.spread), 0.5+math.Atan(math.Sqrt(c.variance*7)/sd)/math.Pi, 1e-10)
		agreeTo(t, fmt.Sprintf("%+v without variance", c), Passage{c.x, -c.mu, 0}.ByFrom(7, c.spread), phi((7*c.mu-c.x)/sd), 1e-10)
		agreeTo(t, fmt.Sprintf("%+v at once", c), Passage{c.x, c.mu, c.variance}.ByFrom(0, c.spread), phi(-c.x/sd), 1e-10)
		agreeTo(t, fmt.Sprintf("%+v known start", c), Passage{c.x, c.mu, c.variance}.ByFrom(7, 1e-16), Passage{c.x, c.mu, c.variance}.By(7), 1e-6)
	}
}
