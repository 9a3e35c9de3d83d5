package fit

import (
	"fmt"
	"math"
)

// The names of the models of growth, as printed and as keys of the JSON.
const (
	Exponential   = "exponential"
	RickerModel   = "ricker"
	GompertzModel = "gompertz"
	ThetaModel    = "theta-logistic"
)

// Model is a regression of yearly log growth R = ln(N(t+1)/N(t)) on N(t), over
// the steps of one time unit. Normal errors of equal variance are assumed.
//
//	exponential     R = mu
//	ricker          R = r + slope N                (Ricker 1954), K = -r/slope
//	gompertz        R = a + slope ln N             (Dennis & Taper 1994), K = exp(-a/slope)
//	theta-logistic  R = r (1 - (N/K)^theta)        (Gilpin & Ayala 1973)
type Model struct {
	Name string
	// Refused is the reason why the model is not to be used, "" if it may be.
	// The figures are those of the fit all the same where there are any.
	Refused string

	Growth   Estimate // mu, r or a: log growth at N = 0 (gompertz: at N = 1)
	Slope    Estimate // of R on N or ln N; NaN for exponential and theta-logistic
	SlopeP   float64  // two-sided chance of such a slope without crowding
	Capacity Estimate // K; SE by the delta method, no interval
	Theta    float64  // theta-logistic only, otherwise NaN

	Steps           int
	ResidualSD      float64 // divisor Steps less the parameters of the mean
	RSS             float64
	LogLik          float64
	Parameters      int // with the variance
	AICc, Weight    float64
	Autocorrelation float64 // lag 1 of the residuals

	// LeftOut is the root mean squared error of predicting each step from a fit
	// to all others. Turned is in how many of those fits the slope turns upwards.
	LeftOut float64
	Turned  int

	steepness float64 // standard error of the strength of crowding, as a share of it
}

// steps are the changes over one time unit: abundance and log growth.
type steps struct{ n, r []float64 }

func oneYearSteps(p *prepared) steps {
	var s steps
	for i := 0; i < p.steps(); i++ {
		if math.Abs(p.tau(i)-1) < 1e-9 {
			s.n = append(s.n, p.n[i])
			s.r = append(s.r, p.y[i+1]-p.y[i])
		}
	}
	return s
}

// At is the log growth that the model expects at abundance n, above 0.
func (m *Model) At(n float64) float64 {
	switch m.Name {
	case RickerModel:
		return m.Growth.Value + m.Slope.Value*n
	case GompertzModel:
		return m.Growth.Value + m.Slope.Value*math.Log(n)
	case ThetaModel:
		return m.Growth.Value * (1 - math.Pow(n/m.Capacity.Value, m.Theta))
	}
	return m.Growth.Value
}

// fitModels fits all four to the steps of one time unit.
func fitModels(s steps, confidence float64) []Model {
	models := []Model{fitConstant(s, confidence), fitLine(RickerModel, s, confidence), fitLine(GompertzModel, s, confidence), fitTheta(s)}
	for i := range models {
		m := &models[i]
		if m.RSS > 0 && len(s.r) > 0 {
			m.LogLik = gaussian(m.RSS, len(s.r))
			aicc, err := AICc(m.LogLik, m.Parameters, len(s.r))
			m.AICc = aicc
			if err != nil {
				m.AICc = math.NaN()
			}
		}
		if m.RSS < 1e-20*float64(len(s.r)) {
			m.Refused = "the counts lie on the curve without any scatter: they are figures made by a model"
		}
		if len(s.r) < MinimumSteps {
			m.Refused = fmt.Sprintf("%d steps of one unit of time are too few to compare models (%d are needed)", len(s.r), MinimumSteps)
		}
	}
	weigh(models)
	return models
}

func blankModel(name string, s steps, parameters int) Model {
	nan := math.NaN()
	none := Estimate{nan, nan, nan, nan}
	return Model{Name: name, Steps: len(s.r), Parameters: parameters, Growth: none, Slope: none, SlopeP: nan, Capacity: none, Theta: nan,
		ResidualSD: nan, RSS: nan, LogLik: nan, AICc: nan, Autocorrelation: nan, LeftOut: nan, steepness: nan}
}

func fitConstant(s steps, confidence float64) Model {
	m := blankModel(Exponential, s, 2)
	n := len(s.r)
	if n < 3 {
		return m
	}
	mu := mean(s.r)
	m.ResidualSD = deviation(s.r)
	m.RSS = m.ResidualSD * m.ResidualSD * float64(n-1)
	se := m.ResidualSD / math.Sqrt(float64(n))
	t := twoSided(float64(n-1), confidence)
	m.Growth = Estimate{mu, mu - t*se, mu + t*se, se}
	m.Autocorrelation = autocorrelation(s.r, mu)
	press := 0.0
	for _, r := range s.r {
		e := (r - mu) / (1 - 1/float64(n))
		press += e * e
	}
	m.LeftOut = math.Sqrt(press / float64(n))
	return m
}

// fitLine fits the two models that are straight lines, in N or in ln N.
func fitLine(name string, s steps, confidence float64) Model {
	m := blankModel(name, s, 3)
	n := len(s.r)
	x := s.n
	if name == GompertzModel {
		x = make([]float64, n)
		for i, v := range s.n {
			x[i] = math.Log(v)
		}
	}
	if n < 4 || deviation(x) <= 1e-12*math.Abs(mean(x)) {
		m.Refused = "abundance hardly changes, so that growth cannot be set against it"
		return m
	}
	l := straight(x, s.r)
	t := twoSided(float64(n-2), confidence)
	m.Growth = Estimate{l.a, l.a - t*l.sa, l.a + t*l.sa, l.sa}
	m.Slope = Estimate{l.b, l.b - t*l.sb, l.b + t*l.sb, l.sb}
	m.SlopeP = twoSidedP(l.b/l.sb, float64(n-2))
	m.ResidualSD, m.RSS = l.sd, l.rss
	m.steepness = l.sb / math.Abs(l.b)
	m.Autocorrelation = autocorrelation(l.residual, 0)
	k := -l.a / l.b
	// The variance of -a/b: of the height of the line at K, over the slope.
	se := l.sd * math.Sqrt(1/float64(n)+(k-mean(x))*(k-mean(x))*l.sb*l.sb/(l.sd*l.sd)) / math.Abs(l.b)
	if name == GompertzModel {
		k = math.Exp(k)
		se *= k
	}
	m.Capacity = Estimate{k, math.NaN(), math.NaN(), se}
	press := 0.0
	for i, e := range l.residual {
		left := e / (1 - l.leverage[i])
		press += left * left
		// Leaving out step i moves the slope by this (Cook & Weisberg 1982).
		if l.b-(x[i]-mean(x))*left*l.sb*l.sb/(l.sd*l.sd) >= 0 {
			m.Turned++
		}
	}
	m.LeftOut = math.Sqrt(press / float64(n))
	switch {
	case l.b >= 0:
		m.Refused = "growth rises with abundance: no crowding is supported, and K has no meaning"
	case l.a <= 0 && name == RickerModel:
		m.Refused = "growth is below 0 at every abundance: there is no population at which it rests"
	}
	return m
}
