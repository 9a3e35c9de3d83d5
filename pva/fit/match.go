package fit

import (
	"math"
	"sort"

	"ebbline/pva/rates"
)

// target is what the rates of a case are to reproduce.
type target struct {
	flow     bool
	survival float64               // mean share that survives a time unit
	curve    func(float64) float64 // mean log growth at an abundance
	crowded  bool
	capacity float64   // abundance at which the curve is 0, if crowded
	at       []float64 // abundances at which the counts were
	variance float64   // of log growth, with the demographic part
	births   float64   // share of the environmental variance given to births
	form     rates.Form
	exponent float64
}

// matched are rates that reproduce a target.
type matched struct {
	target
	birth      float64 // mean births per head
	above      float64 // with crowding, ln of births over the least that carry the capacity, less 1
	placed     bool    // above has been found once
	sigma      float64 // of the logarithm of the birth rate between years
	u, v       float64 // logit-normal law of the death fraction
	crowding   rates.Crowding
	demography float64 // part of the variance that single births and deaths make
	weather    float64 // the rest, not below 0
	off        float64 // root mean squared distance from the curve, over the counts
}

// match finds the rates. found is false where no births above 0 reproduce the
// growth, or no spread the variance.
func match(t target, rounds int) (m *matched, found bool) {
	m = &matched{target: t}
	m.crowding = rates.Crowding{Form: t.form, L: math.Inf(1), Exponent: t.exponent}
	m.deathsAt(0)
	m.birth = 0.5
	m.sigma = 0
	for i := 0; i < rounds; i++ {
		before := [3]float64{m.birth, m.sigma, m.v}
		if !m.setGrowth() {
			return m, false
		}
		if !m.setVariance() {
			return m, false
		}
		change := 0.0
		for k, now := range [3]float64{m.birth, m.sigma, m.v} {
			change = math.Max(change, math.Abs(now-before[k])/math.Max(1e-3, now))
		}
		if change < 1e-7 || m.crowded && change < 1e-4 {
			break
		}
	}
	return m, true
}

// Rounds of match: enough to compare forms of crowding, and enough to settle.
const (
	roundsToCompare = 3
	roundsToSettle  = 60
)

// setVariance moves the spreads of births and deaths towards the environmental
// variance: what is left of the whole when demography is taken out.
func (m *matched) setVariance() bool {
	m.demography = 0
	var total, births, deaths float64
	points := m.points()
	for _, n := range m.at {
		m.demography += m.demographic(n) / n / float64(len(m.at))
	}
	m.weather = math.Max(0, m.variance-m.demography)
	if m.weather == 0 {
		m.sigma = 0
		m.deathsAt(0)
		return true
	}
	begin := func(share float64, spread *float64) {
		if share > 0 && *spread == 0 {
			*spread = 1e-3
		}
	}
	begin(m.births, &m.sigma)
	v := m.v
	begin(1-m.births, &v)
	m.deathsAt(v)
	for _, n := range points {
		_, a, b, c := m.moments(n)
		total += a / float64(len(points))
		births += b / float64(len(points))
		deaths += c / float64(len(points))
	}
	whole := m.weather * (births + deaths) / total // what both make together counts too
	if m.births > 0 {
		m.sigma *= math.Sqrt(m.births * whole / births)
	} else {
		m.sigma = 0
	}
	switch v = m.v; {
	case m.births < 1:
		v *= math.Sqrt((1 - m.births) * whole / deaths)
	default:
		v = 0
	}
	if !(m.sigma < mostSigma && v < mostV) {
		return false
	}
	m.deathsAt(v)
	return true
}

// The widest laws that are still taken for weather: a birth rate with a
// standard deviation of three times its mean, a death fraction close to all or
// nothing (common practice, no source).
const (
	mostSigma = 1.517
	mostV     = 10
)

// points are the abundances at which growth and variance are compared: all
// alike without crowding, otherwise at most ten of the counts, evenly by rank.
func (m *matched) points() []float64 {
	if !m.crowded {
		return []float64{1}
	}
	sorted := append([]float64(nil), m.at...)
	sort.Float64s(sorted)
	const most = 10
	if len(sorted) <= most {
		return sorted
	}
	out := make([]float64, most)
	for i := range out {
		out[i] = sorted[i*(len(sorted)-1)/(most-1)]
	}
	return out
}

// setGrowth finds the births, and with crowding its scale, for the spreads in
// force. Demography lowers the mean log growth by half its variance over n, so
// the rates are set that much higher.
func (m *matched) setGrowth() bool {
	if !m.crowded {
		half := 0.0
		for _, n := range m.at {
			half += m.demographic(n) / (2 * n) / float64(len(m.at))
		}
		want := m.curve(1) + half
		return m.bisectBirths(func() float64 { g, _, _, _ := m.moments(1); return g - want })
	}
	// Births least for growth to rest at the capacity without any crowding.
	k := m.capacity
	rest := func() float64 { g, _, _, _ := m.moments(k); return g - m.demographic(k)/(2*k) }
	m.crowding.L = math.Inf(1)
	if !m.bisectBirths(rest) {
		return false
	}
	least := m.birth
	points := m.points()
	of := func(lnAbove float64) float64 {
		m.birth = least * (1 + math.Exp(lnAbove))
		m.crowding.L = math.Exp(root(func(x float64) float64 { m.crowding.L = math.Exp(x); return rest() }, math.Log(k)-12, math.Log(k)+25))
		sum := 0.0
		for _, n := range points {
			g, _, _, _ := m.moments(n)
			e := g - m.demographic(n)/(2*n) - m.curve(n)
			sum += e * e
		}
		return sum / float64(len(points))
	}
	if !m.placed {
		grid := make([]float64, 13)
		best := math.Inf(1)
		for i := range grid {
			grid[i] = -5 + 0.7*float64(i)
			if f := of(grid[i]); f < best {
				best, m.above = f, grid[i]
			}
		}
		m.placed = true
	}
	m.above, _ = golden(of, m.above-0.7, m.above+0.7, 18)
	m.off = math.Sqrt(of(m.above)) // and leaves birth and scale there
	return true
}

// bisectBirths finds the births at which gap, which rises with them, is 0.
func (m *matched) bisectBirths(gap func() float64) bool {
	lo, hi := math.Log(1e-6), math.Log(1e3)
	at := func(x float64) float64 { m.birth = math.Exp(x); return gap() }
	if at(lo) > 0 || at(hi) < 0 {
		return false
	}
	m.birth = math.Exp(root(at, lo, hi))
	return true
}

// rests is the abundance at which the mean rates balance: the capacity of the
// case, which lies above that of the fit as weather lowers the mean log growth.
func (m *matched) rests() float64 {
	lo, hi := math.Log(m.capacity)-8, math.Log(m.capacity)+8
	for i := 0; i < 80; i++ {
		mid := (lo + hi) / 2
		if m.yearAtMean(math.Exp(mid)) > 0 {
			lo = mid
		} else {
			hi = mid
		}
	}
	return math.Exp((lo + hi) / 2)
}

func (m *matched) yearAtMean(n float64) float64 {
	d := -math.Log(m.survival)
	if m.flow {
		return m.birth*m.crowding.Births(n) - d
	}
	return -d + math.Log1p(m.birth*m.crowding.Births(n*m.survival))
}
