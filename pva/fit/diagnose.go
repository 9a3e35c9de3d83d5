package fit

import (
	"math"

	"gonum.org/v1/gonum/stat/distuv"
)

// Diagnostics look for what the drift model leaves out.
type Diagnostics struct {
	// Trend is the change, a time unit, of the residuals (in units of their
	// standard deviation); TrendP the chance of such a slope without one.
	Trend  Estimate
	TrendP float64
	// Autocorrelation is the lag-1 correlation of the residuals, with the
	// interval r +- z sqrt((1 - r^2)/n) (M. S. Bartlett 1946, J. R. Stat. Soc.
	// Suppl. 8:27-41, for a first-order process).
	Autocorrelation Estimate
	Largest         float64 // the largest residual, standardised
	Outlying        []Outlying
	// RunningSums is a second opinion on the process variance, nil for a series
	// with gaps or of few counts.
	RunningSums *RunningSums
}

// Outlying is a change far from the others: a candidate for a catastrophe
// (Down) or a bonanza.
type Outlying struct {
	From, To float64 // dates
	Factor   float64 // abundance at To over abundance at From
	T        float64 // studentised by the other residuals; infinite where they are all 0
	P        float64 // chance that the largest of all residuals is so large; 0 where T is infinite
	Down     bool
}

// outlyingLevel is the level, over all changes together, below which one is
// called outlying (common practice, no source).
const outlyingLevel = 0.05

func diagnose(p *prepared, d *Drift, confidence float64) *Diagnostics {
	out := &Diagnostics{RunningSums: runningSums(p)}
	q := d.Intervals
	n := float64(q)
	s := math.Sqrt(d.Variance.Value)
	std := make([]float64, q)
	middle := make([]float64, q)
	for i, e := range d.residual {
		std[i] = e / (s * math.Sqrt(1-d.leverage[i]))
		middle[i] = (p.year[i] + p.year[i+1]) / 2
		out.Largest = math.Max(out.Largest, math.Abs(std[i]))
	}
	r := autocorrelation(d.residual, 0)
	half := normalQuantile(confidence) * math.Sqrt(math.Max(0, 1-r*r)/n)
	out.Autocorrelation = Estimate{r, math.Max(-1, r-half), math.Min(1, r+half), half / normalQuantile(confidence)}
	nan := math.NaN()
	out.Trend, out.TrendP = Estimate{nan, nan, nan, nan}, nan
	if q >= 4 {
		l := straight(middle, std)
		t := twoSided(n-2, confidence)
		out.Trend = Estimate{l.b, l.b - t*l.sb, l.b + t*l.sb, l.sb}
		out.TrendP = twoSidedP(l.b/l.sb, n-2)
	}
	if q < 5 {
		return out
	}
	// A residual against the spread of the others has Student's law with one
	// degree of freedom less (R. D. Cook & S. Weisberg 1982, Residuals and
	// Influence in Regression, ch. 2); the largest of n is judged by n times
	// its chance (Bonferroni).
	nu := n - 2
	student := distuv.StudentsT{Mu: 0, Sigma: 1, Nu: nu}
	for i, e := range std {
		// Where all other changes are alike nothing is left of the spread, or
		// what rounding left, to either side of 0: no change lies further out.
		t, chance := math.Copysign(math.Inf(1), e), 0.0
		if rest := (n - 1 - e*e) / nu; rest > 0 {
			t = e / math.Sqrt(rest)
			chance = math.Min(1, n*2*student.CDF(-math.Abs(t)))
		}
		if chance < outlyingLevel {
			out.Outlying = append(out.Outlying, Outlying{From: p.year[i], To: p.year[i+1], Factor: p.n[i+1] / p.n[i], T: t, P: chance, Down: e < 0})
		}
	}
	return out
}

// correlated says whether the residuals are too correlated for intervals that
// take the changes as independent.
func (d *Diagnostics) correlated() bool {
	return d.Autocorrelation.Low > 0 || d.Autocorrelation.High < 0
}
