package exact

import (
	"fmt"
	"math"

	"ebbline/pva"
	"ebbline/pva/rates"

	"gonum.org/v1/gonum/integrate/quad"
	"gonum.org/v1/gonum/stat/distuv"
)

// ClosedForms are the published formulas that apply to a case, each with its
// conditions and source. Where the formula gives the risk itself it stands
// beside the answer that is handed in: the exact risk, or the simulated one.
func ClosedForms(m *rates.Model, risk float64, riskName string) []pva.ClosedForm {
	var out []pva.ClosedForm
	add := func(f pva.ClosedForm, ok bool) {
		if ok {
			out = append(out, f)
		}
	}
	beside := func(f pva.ClosedForm, ok bool) (pva.ClosedForm, bool) {
		f.Beside, f.BesideName = risk, riskName
		return f, ok
	}
	add(beside(linearBirthDeath(m)))
	add(beside(branching(m)))
	add(beside(diffusion(m)))
	add(blowUp(m))
	add(criticalTake(m))
	return append(out, rests(m)...)
}

// rests are the populations at which the mean path of a mean year rests, takes
// and additions included.
func rests(m *rates.Model) []pva.ClosedForm {
	var out []pva.ClosedForm
	for i, e := range m.Equilibria() {
		kind := "unstable: the mean path moves away from it"
		if e.Stable {
			kind = "stable: the mean path returns to it"
		}
		out = append(out, pva.ClosedForm{Name: fmt.Sprintf("resting place %d of the mean path", i+1), Unit: m.Case.Counts, Value: e.N,
			Note:   kind + "; no weather, no catastrophes, rules of one " + m.Case.TimeUnit + " in several averaged",
			Source: "zero of the year's mean change, by bisection"})
	}
	return out
}

// independent says whether every head lives its own life: no crowding,
// scarcity, weather, catastrophe, take, addition or ceiling. Then the risk of
// extinction from n0 heads is that of one, to the power n0.
func independent(m *rates.Model) bool {
	c := m.Case
	for i := range m.Takes {
		if m.Takes[i].First > 0 {
			return false
		}
	}
	return simple(m) && m.Birth.Sigma == 0 && !m.Death.Varies() && len(c.Catastrophe) == 0 && c.Question.Threshold < 1
}

// simple is growth that depends on the year alone.
func simple(m *rates.Model) bool {
	c := m.Case
	for _, s := range c.Stocking {
		if s.Add > 0 {
			return false
		}
	}
	return m.BirthCrowding.Form == rates.None && m.DeathCrowding.Form == rates.None && m.Scarcity.Form == rates.Plenty && !c.Ceiling.Set && c.Start.CV == 0
}

// power is q^n0, n0 rounded at random to a whole number as the start is.
func power(q, n0 float64) float64 {
	whole := math.Floor(n0)
	return math.Pow(q, whole) * (1 - (n0-whole)*(1-q))
}

// linearBirthDeath is the chance of extinction by the horizon of the linear
// birth-death process with rates constant within each year: with rho(t) the
// integral of mu - lambda and J the integral of exp(rho) mu, it is
// (J/(1+J))^n0 (D. G. Kendall 1948, Ann. Math. Statist. 19:1-15, eq. 17 on).
func linearBirthDeath(m *rates.Model) (pva.ClosedForm, bool) {
	if m.Case.Births.Breeding != "flow" || !independent(m) {
		return pva.ClosedForm{}, false
	}
	rho, j := 0.0, 0.0
	for y := range m.BirthCalendar {
		b, d := m.Birth.Mean*m.BirthCalendar[y], m.Death.Mean()*m.DeathCalendar[y]
		step := 1.0 // integral of exp((d-b) s) over the year
		if x := d - b; math.Abs(x) > 1e-12 {
			step = math.Expm1(x) / x
		}
		j += math.Exp(rho) * d * step
		rho += d - b
	}
	return pva.ClosedForm{
		Name: "chance of extinction, linear birth-death process", Unit: "probability", Value: power(j/(1+j), m.Case.Start.Abundance),
		Note:   "every head lives its own life at the stated rates; the difference is rounding and the chance of the replicates",
		Source: "D. G. Kendall 1948, Ann. Math. Statist. 19:1-15",
	}, true
}

// branching is the same for a pulse: a year turns one head into a random
// number of heads with generating function g, and the chance of extinction from
// one after T years is g_1(g_2(...g_T(0))) (H. W. Watson & F. Galton 1875, J.
// Anthropol. Inst. 4:138-144; T. E. Harris 1963, The Theory of Branching
// Processes). Survivors breed: g(s) = 1-p + p s G(s); all breed: (1-p + p s) G(s).
func branching(m *rates.Model) (pva.ClosedForm, bool) {
	c := m.Case
	if c.Births.Breeding != "pulse" || !independent(m) {
		return pva.ClosedForm{}, false
	}
	q := 0.0
	for y := len(m.BirthCalendar) - 1; y >= 0; y-- {
		f := m.Birth.Mean * m.BirthCalendar[y]
		p := math.Exp(-m.Death.Mean() * m.DeathCalendar[y])
		if c.Births.Parents == "all" {
			q = (1 - p + p*q) * youngGF(c, f, q)
		} else {
			q = 1 - p + p*q*youngGF(c, f, q)
		}
	}
	return pva.ClosedForm{
		Name: "chance of extinction, branching process", Unit: "probability", Value: power(q, c.Start.Abundance),
		Note:   "every head leaves its own random number of heads; the difference is rounding and the chance of the replicates",
		Source: "H. W. Watson & F. Galton 1875, J. Anthropol. Inst. 4:138-144; T. E. Harris 1963, The Theory of Branching Processes",
	}, true
}

// youngGF is the generating function of one head's young, of mean f.
func youngGF(c *pva.Case, f, s float64) float64 {
	switch c.Births.Offspring {
	case "at-most-one":
		f = math.Min(f, 1)
		return 1 - f + f*s
	case "clumped":
		k := c.Births.Clumping.Value
		return math.Pow(1+f/k*(1-s), -k)
	}
	return math.Exp(f * (s - 1))
}

// diffusion is the chance that Brownian motion of ln N with the mean and
// variance of the years' log growth reaches the threshold by the horizon (R.
// Lande & S. H. Orzack 1988, PNAS 85:7418-7421; B. Dennis, P. L. Munholland &
// J. M. Scott 1991, Ecol. Monogr. 61:115-143, eq. 16), for growth that depends on
// the year alone and takes nothing.
func diffusion(m *rates.Model) (pva.ClosedForm, bool) {
	c := m.Case
	for i := range m.Takes {
		if m.Takes[i].First > 0 {
			return pva.ClosedForm{}, false
		}
	}
	varies := m.Birth.Sigma != 0 || m.Death.Varies()
	steady := c.Weather.Memory == 0 && len(c.Catastrophe) == 0 && c.Births.Trend == 0 && c.Deaths.Trend == 0
	for _, k := range [][]float64{m.BirthCalendar, m.DeathCalendar} {
		for _, f := range k {
			steady = steady && f == k[0]
		}
	}
	if !simple(m) || !varies || !steady || c.Question.Threshold < 1 || c.Start.Abundance <= c.Question.Threshold {
		return pva.ClosedForm{}, false
	}
	mu, sigma2 := logGrowth(m)
	risk := FirstPassage(math.Log(c.Start.Abundance/math.Floor(c.Question.Threshold)), mu, sigma2, float64(c.Question.Horizon))
	return pva.ClosedForm{
		Name: "risk by the diffusion approximation", Unit: "probability", Value: risk,
		Note:   fmt.Sprintf("log growth of mean %.4g and variance %.4g a year as Brownian motion, watched always and without chance in single births and deaths; looking once a year lowers the risk, and chance in births and deaths raises it (B. E. Kendall 2009, Conserv. Lett. 2:216-225)", mu, sigma2),
		Source: "B. Dennis, P. L. Munholland & J. M. Scott 1991, Ecol. Monogr. 61:115-143",
	}, true
}

// logGrowth is the mean and variance between years of ln of a year's growth
// factor, by Gauss-Hermite quadrature with 48 nodes an axis.
func logGrowth(m *rates.Model) (mu, sigma2 float64) {
	const nodes = 48
	x, w := make([]float64, nodes), make([]float64, nodes)
	quad.Hermite{}.FixedLocations(x, w, math.Inf(-1), math.Inf(1))
	rho := m.Case.Weather.Correlation
	other := math.Sqrt(math.Max(0, 1-rho*rho))
	var first, second float64
	for i := range x {
		for j := range x {
			weight := w[i] * w[j] / math.Pi
			u, v := math.Sqrt2*x[i], math.Sqrt2*x[j]
			b := m.Birth.Draw(u) * m.BirthCalendar[0]
			d := m.Death.Draw(rho*u+other*v) * m.DeathCalendar[0]
			g := b - d
			if m.Case.Births.Breeding == "pulse" {
				g = math.Log1p(b) - d
				if m.Case.Births.Parents == "all" {
					g = math.Log(math.Exp(-d) + b)
				}
			}
			first += weight * g
			second += weight * g * g
		}
	}
	return first, second - first*first
}

// FirstPassage is the chance that Brownian motion with drift mu and variance
// sigma2 a year falls by distance within t years: the inverse Gaussian
// distribution function, its second term taken through logarithms so that it
// cannot overflow.
func FirstPassage(distance, mu, sigma2, t float64) float64 {
	if distance <= 0 {
		return 1
	}
	s := math.Sqrt(sigma2 * t)
	z := distuv.UnitNormal
	second := math.Exp(-2*mu*distance/sigma2 + logPhi((-distance+mu*t)/s))
	return math.Min(1, z.CDF((-distance-mu*t)/s)+second)
}

// logPhi is the logarithm of the standard normal distribution function, by its
// asymptotic series far in the lower tail.
func logPhi(x float64) float64 {
	if x > -30 {
		return math.Log(0.5 * math.Erfc(-x/math.Sqrt2))
	}
	return -x*x/2 - math.Log(-x*math.Sqrt(2*math.Pi)) + math.Log1p(-1/(x*x)+3/(x*x*x*x))
}

// blowUp is the time at which the mean path has no value any more: dN/dt =
// k N^2 - d N, k = rate/A, reaches infinity at 1/(k N0) without deaths and at
// -ln(1 - d/(k N0))/d with them (H. von Foerster, P. M. Mora & L. W. Amiot 1960,
// Science 132:1291-1295, for d = 0).
func blowUp(m *rates.Model) (pva.ClosedForm, bool) {
	c := m.Case
	k := m.Birth.Mean / m.Scarcity.A
	d, n0 := m.Death.Mean(), c.Start.Abundance
	if c.Births.Breeding != "flow" || m.Scarcity.Form != rates.Proportional || m.BirthCrowding.Form != rates.None || m.DeathCrowding.Form != rates.None || k*n0 <= d {
		return pva.ClosedForm{}, false
	}
	t := 1 / (k * n0)
	if d > 0 {
		t = -math.Log1p(-d/(k*n0)) / d
	}
	for y := 0; y < len(m.BirthCalendar); y++ {
		if float64(y) < t && (m.BirthCalendar[y] != 1 || m.DeathCalendar[y] != 1) {
			return pva.ClosedForm{}, false
		}
	}
	if t > float64(len(m.BirthCalendar)) {
		return pva.ClosedForm{}, false
	}
	return pva.ClosedForm{Name: "time at which the mean path blows up, without takes", Unit: c.TimeUnit + "s", Value: t,
		Note:   "births proportional to N have no mean path beyond it; replicates that pass stop_above are counted as outgrown",
		Source: "H. von Foerster, P. M. Mora & L. W. Amiot 1960, Science 132:1291-1295"}, true
}

// criticalTake is the largest constant take that the logistic equation bears,
// r K/4 at K/2 (M. B. Schaefer 1954, Bull. Inter-Amer. Trop. Tuna Comm. 1:27-56).
func criticalTake(m *rates.Model) (pva.ClosedForm, bool) {
	c := m.Case
	constant := -1
	for i := range m.Takes {
		if m.Takes[i].First == 0 {
			continue
		}
		if constant >= 0 || m.Takes[i].Rule.Rule != "constant" {
			return pva.ClosedForm{}, false
		}
		constant = i
	}
	linear := m.BirthCrowding.Form == rates.Linear && m.DeathCrowding.Form == rates.None ||
		m.DeathCrowding.Form == rates.Linear && (m.BirthCrowding.Form == rates.None || m.BirthCrowding.Form == rates.Linear)
	steady := !c.Ceiling.Set
	for y := range m.BirthCalendar {
		steady = steady && m.BirthCalendar[y] == 1 && m.DeathCalendar[y] == 1
	}
	for _, s := range c.Stocking {
		steady = steady && s.Add == 0
	}
	if constant < 0 || !steady || m.Takes[constant].Rule.When != "through" || c.Births.Breeding != "flow" || m.Scarcity.Form != rates.Plenty || !linear {
		return pva.ClosedForm{}, false
	}
	// dN/dt = r N - s N^2, so that K = r/s and r K/4 = r^2/(4 s).
	r := m.Birth.Mean - m.Death.Mean()
	s := 0.0
	if m.BirthCrowding.Form == rates.Linear {
		s += m.Birth.Mean / m.BirthCrowding.L
	}
	if m.DeathCrowding.Form == rates.Linear {
		s += m.Death.Mean() / m.DeathCrowding.L
	}
	if r <= 0 {
		return pva.ClosedForm{}, false
	}
	rule := m.Takes[constant].Rule
	return pva.ClosedForm{Name: "largest constant take that the mean path bears, r K/4", Unit: c.Counts + " a " + c.TimeUnit, Value: r * r / (4 * s),
		Beside: rule.Take.Value * rule.Share * (1 + rule.ExtraDeaths) / float64(rule.OneYearIn), BesideName: "the take of this case",
		Note:   "without noise; with it a take well below already carries a risk, and recovery slows as the take nears it (J. R. Beddington & R. M. May 1977, Science 197:463-465)",
		Source: "M. B. Schaefer 1954, Bull. Inter-Amer. Trop. Tuna Comm. 1:27-56"}, true
}
