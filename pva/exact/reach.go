package exact

import (
	"math"

	"ebbline/pva"
	"ebbline/pva/rates"

	"gonum.org/v1/gonum/mathext"
)

// A coarse run over bins of N, whole numbers first and then steps of 3 %,
// shows how far up the states of the fine run must go. Each year's law of the
// next N has the right mean and variance, but only about the right shape:
// log-normal where the weather makes most of the variance, gamma where chance
// does. So it only guides: the fine run measures what it cuts off and goes
// further if that is too much.
const (
	binStep  = 1.03
	binWhole = 40
	binMost  = 3e6
)

// reachMost is how many states a law may have in memory; beyond it there is no exact answer.
const reachMost = 100000

type coarse struct {
	m      *rates.Model
	at     []float64 // middle of each bin
	edge   []float64 // upper edge
	points []point
}

// reach gives the top to use where all but 1e-9 of the mass is to stay below
// it, and the top such that reaching it and falling afterwards has a chance below 3e-9; both +Inf if
// out of sight.
func reach(m *rates.Model) (allMass, forRisk float64) {
	c := &coarse{m: m}
	for n := 0.0; n < math.Min(binMost, 2*m.Case.Run.StopAbove+100); {
		c.at = append(c.at, n)
		if n < binWhole {
			n++
		} else {
			n *= binStep
		}
	}
	for i := range c.at {
		e := math.Inf(1)
		if i+1 < len(c.at) {
			e = (c.at[i] + c.at[i+1]) / 2
		}
		c.edge = append(c.edge, e)
	}
	cl := climateOf(m)
	c.points = prune(cl.grid(gauss(5)).points(), 0)
	return c.reach()
}

func (c *coarse) reach() (allMass, forRisk float64) {
	horizon := c.m.Case.Question.Horizon
	years := min(horizon, 200)
	groups := c.groups(years)
	kernels := map[int]*[2][][]float64{} // before and after the ceiling, by year
	for _, g := range groups {
		if kernels[g] == nil {
			kernels[g] = c.kernel(g)
		}
	}
	n := len(c.at)
	p := c.start()
	above := make([][]float64, years) // chance of being above each bin, within the year
	for y := 0; y < years; y++ {
		k := kernels[groups[y]]
		mid := push(p, k[0])
		tail := 0.0
		above[y] = make([]float64, n)
		for i := n - 1; i >= 0; i-- {
			above[y][i] = tail
			tail += mid[i]
		}
		p = push(p, k[1])
	}
	most := make([]float64, n)
	risk := make([]float64, n)
	u := make([]float64, n) // chance of falling in the years left
	for i, x := range c.at {
		if x <= c.m.Case.Question.Threshold {
			u[i] = 1
		}
	}
	for y := years - 1; y >= 0; y-- {
		for i := range most {
			most[i] = math.Max(most[i], above[y][i])
			risk[i] += above[y][i] * u[i]
		}
		u = pull(u, kernels[groups[y]][1])
		for i, x := range c.at {
			if x <= c.m.Case.Question.Threshold {
				u[i] = 1
			}
		}
	}
	allMass, forRisk = math.Inf(1), math.Inf(1)
	first := c.m.Case.Start.Abundance * (1 + 4*c.m.Case.Start.CV)
	first = math.Max(first, c.m.Case.Question.Threshold+1)
	for i := n - 2; i >= 0 && c.at[i] >= first; i-- {
		if most[i] < 1e-9 {
			allMass = c.at[i]
		}
		if risk[i]*float64(horizon)/float64(years) < 3e-9 || most[i] < 1e-10 {
			forRisk = c.at[i]
		} else {
			break
		}
	}
	room := func(x float64) float64 { return math.Ceil(x*1.06) + 10 }
	return room(math.Max(allMass, first)), room(math.Max(forRisk, first))
}

// groups names for each year the year whose rates stand for it: at most ten
// where the calendar changes.
func (c *coarse) groups(years int) []int {
	out := make([]int, years)
	changes := false
	for y := 0; y < years; y++ {
		changes = changes || c.m.BirthCalendar[y] != c.m.BirthCalendar[0] || c.m.DeathCalendar[y] != c.m.DeathCalendar[0]
	}
	if !changes {
		return out
	}
	size := (years + 9) / 10
	for y := range out {
		best := y / size * size
		for z := best; z < min(years, y/size*size+size); z++ {
			if c.m.BirthCalendar[z]-c.m.DeathCalendar[z] > c.m.BirthCalendar[best]-c.m.DeathCalendar[best] {
				best = z
			}
		}
		out[y] = best
	}
	return out
}

func (c *coarse) start() []float64 {
	s := c.m.Case.Start
	p := make([]float64, len(c.at))
	c.spreadOut(p, s.Abundance, math.Pow(s.CV*s.Abundance, 2), 0.25)
	return p
}

// spreadOut adds a law with a mean, and variances from weather and from chance, to the bins.
func (c *coarse) spreadOut(p []float64, mean, weather, chance float64) {
	if !(mean > 1e-9) {
		p[0]++
		return
	}
	if !(mean < c.at[len(c.at)-1]) {
		p[len(p)-1]++
		return
	}
	variance := weather + chance
	if mean < 20 || chance > weather {
		c.spreadChance(p, mean, variance)
		return
	}
	s := math.Sqrt(math.Log1p(variance / mean / mean))
	mu := math.Log(mean) - s*s/2
	if s < 1e-6 {
		s = 1e-6
	}
	low := 0.0
	from := math.Exp(mu - 9*s)
	for i, e := range c.edge {
		if e < from {
			continue
		}
		high := 1.0
		if !math.IsInf(e, 1) {
			z := (math.Log(e) - mu) / s
			if z < 9 {
				high = normalBelow(z)
			}
		}
		p[i] += high - low
		if low = high; high == 1 {
			return
		}
	}
}

// spreadChance adds a gamma law, whose tail falls like that of a birth-death
// chain, by the cube-root approximation where it is good (Wilson & Hilferty
// 1931, PNAS 17:684-688).
func (c *coarse) spreadChance(p []float64, mean, variance float64) {
	shape, scale := mean*mean/variance, variance/mean
	sd := math.Sqrt(variance)
	low := 0.0
	for i, e := range c.edge {
		high := 1.0
		switch {
		case e < mean-12*sd:
			continue
		case e > mean+60*(scale+sd):
		case shape > 5:
			if z := (math.Cbrt(e/mean) - 1 + 1/(9*shape)) * 3 * math.Sqrt(shape); z < 9 {
				high = normalBelow(z)
			}
		default:
			high = mathext.GammaIncReg(shape, e/scale)
		}
		p[i] += math.Max(0, high-low)
		if low = high; high == 1 {
			return
		}
	}
}

func push(p []float64, k [][]float64) []float64 {
	out := make([]float64, len(p))
	for i, x := range p {
		if x > 1e-30 {
			for j, v := range k[i] {
				if v != 0 {
					out[j] += x * v
				}
			}
		}
	}
	return out
}

func pull(u []float64, k [][]float64) []float64 {
	out := make([]float64, len(u))
	for i := range out {
		for j, v := range k[i] {
			if v != 0 {
				out[i] += v * u[j]
			}
		}
	}
	return out
}

// kernel is the law of N from each bin, at its height within the year and at its end.
func (c *coarse) kernel(year int) *[2][][]float64 {
	n := len(c.at)
	var out [2][][]float64
	for i, x := range c.at {
		high, last := make([]float64, n), make([]float64, n)
		c.fromBin(year+1, x, 1, 0, high, last)
		_ = i
		out[0], out[1] = append(out[0], high), append(out[1], last)
	}
	return &out
}

// fromBin adds the laws from x; the catastrophes from number k on may strike.
func (c *coarse) fromBin(y int, x, weight float64, k int, high, last []float64) {
	if k < len(c.m.Case.Catastrophe) && k < 3 {
		cat := c.m.Case.Catastrophe[k]
		c.fromBin(y, x, weight*(1-cat.Prob()), k+1, high, last)
		if cat.Prob() > 0 {
			c.fromBin(y, x*(1-cat.Kills), weight*cat.Prob(), k+1, high, last)
		}
		return
	}
	x = c.actions(y, "start", x)
	mean, weather, chance := c.moments(y, x)
	p := make([]float64, len(c.at))
	c.spreadOut(p, mean, weather, chance)
	for j, v := range p {
		if v == 0 {
			continue
		}
		high[j] += weight * v
		end := c.actions(y, "end", c.at[j])
		if end > c.at[j] { // stocking is seen before the ceiling
			high[c.bin(end)] += weight * v
		}
		if c.m.Case.Ceiling.Set {
			end = math.Min(end, c.m.Case.Ceiling.Value)
		}
		if end == c.at[j] {
			last[j] += weight * v
		} else {
			last[c.bin(end)] += weight * v
		}
	}
}

func (c *coarse) bin(x float64) int {
	lo, hi := 0, len(c.edge)-1
	for lo < hi {
		if mid := (lo + hi) / 2; c.edge[mid] < x {
			lo = mid + 1
		} else {
			hi = mid
		}
	}
	return lo
}

// actions are the takes and additions of one moment in the mean.
func (c *coarse) actions(y int, when string, x float64) float64 {
	for j := range c.m.Takes {
		t := &c.m.Takes[j]
		if t.Rule.When != when || !t.Scheduled[y-1] || x < t.Rule.StopBelow {
			continue
		}
		made := math.Min(t.Target(y, x), math.Max(0, x-t.Rule.Leave))
		x = math.Max(0, x-made*(1+t.Rule.ExtraDeaths))
	}
	for _, s := range c.m.Case.Stocking {
		if s.When == when && s.Scheduled(c.m.Case, y) && (!s.OnlyBelow.Set || x < s.OnlyBelow.Value) {
			x += s.Add
		}
	}
	return x
}

// moments are the mean of N after births and deaths of a year that starts at x,
// its variance over the weather, and its variance by chance given the weather.
func (c *coarse) moments(y int, x float64) (mean, weather, chance float64) {
	var second float64
	for _, p := range c.points {
		b := c.m.Birth.Draw(p.births) * c.m.BirthCalendar[y-1]
		d := c.m.Death.Draw(p.deaths) * c.m.DeathCalendar[y-1]
		mu, v := c.pulseMoments(b, d, x)
		if c.m.Case.Births.Breeding == "flow" {
			mu, v = c.flowMoments(y, b, d, x)
		}
		mu = math.Min(mu, 2*binMost)
		mean += p.weight * mu
		second += p.weight * mu * mu
		chance += p.weight * math.Min(v, 4*binMost*binMost)
	}
	return mean, math.Max(0, second-mean*mean), chance + 1e-9
}

func (c *coarse) pulseMoments(b, d, x float64) (mean, variance float64) {
	s := math.Exp(-c.m.DeathAt(d, x))
	parents := x
	if c.m.Case.Births.Parents == "survivors" {
		parents = s * x
	}
	f := c.m.BirthAt(b, parents)
	gain := 1.0
	if c.m.Case.Births.Parents == "survivors" {
		gain = 1 + f
	}
	young := f * parents
	if k := c.m.Case.Births.Clumping; c.m.Case.Births.Offspring == "clumped" && k.Set {
		young *= 1 + f/k.Value
	}
	return s*x + f*parents, x*s*(1-s)*gain*gain + young
}

// flowMoments follows mean and variance through the year by the linear noise
// approximation, in short steps.
func (c *coarse) flowMoments(y int, b, d, x float64) (mean, variance float64) {
	slope := func(n float64) (net, noise float64) {
		up, down := c.m.BirthAt(b, n)*n, c.m.DeathAt(d, n)*n
		for j := range c.m.Takes {
			t := &c.m.Takes[j]
			if h := &t.Rule; h.When == "through" && t.Scheduled[y-1] && n > math.Ceil(h.Leave) && n >= h.StopBelow {
				year, head := t.Stream(y)
				down += (year + head*n) * (1 + h.ExtraDeaths)
			}
		}
		for _, s := range c.m.Case.Stocking {
			if s.When == "through" && s.Scheduled(c.m.Case, y) && !(s.OnlyBelow.Set && n >= s.OnlyBelow.Value) {
				up += s.Add
			}
		}
		return up - down, up + down
	}
	for t := 0.0; t < 1 && x < binMost; {
		net, noise := slope(x)
		step := math.Min(1.0/6, 1-t)
		if net != 0 {
			step = math.Min(step, math.Max(0.2*(x+1)/math.Abs(net), 1e-3))
		}
		pull, _ := slope(x * 1.01)
		rate := 0.0
		if x > 1 {
			rate = (pull - net) / (0.01 * x)
		}
		next := math.Max(0, x+step*net)
		half, _ := slope((x + next) / 2)
		x = math.Max(0, x+step*half)
		variance = variance*math.Exp(2*math.Max(rate, -20)*step) + noise*step
		t += step
	}
	// Near 0 the linear approximation overstates the noise, which for N without
	// crowding is (b+d)/(b-d) (exp(b-d) - 1) times the mean (Bailey 1964).
	return x, math.Min(variance, x*(1+2*(b+d)*math.Exp(math.Max(0, b-d))))
}

// ceilingTop is the top that a pulse case with a ceiling needs if what is above
// the ceiling at the end of a year is never seen: the ceiling and what stocking
// at the start can add to it; false if it cannot be said.
func ceilingTop(c *pva.Case) (float64, bool) {
	if !c.Ceiling.Set || c.Births.Breeding == "flow" {
		return 0, false
	}
	for _, h := range c.Harvest {
		if h.When == "end" {
			return 0, false
		}
	}
	return math.Max(math.Floor(c.Ceiling.Value)+firstAdditions(c), startReach(c)), true
}

// firstAdditions is the most that stocking at the start of a pulse year adds,
// before anything looks at how large N is; 0 in a flow year, where that is
// looked at at once.
func firstAdditions(c *pva.Case) float64 {
	most := 0.0
	for _, s := range c.Stocking {
		if s.When == "start" && c.Births.Breeding == "pulse" {
			most += math.Ceil(s.Add)
			if s.Noise == "poisson" {
				most += 9*math.Sqrt(s.Add) + 30
			}
		}
	}
	return most
}

// startReach is a population beyond which the first one hardly ever is.
func startReach(c *pva.Case) float64 {
	if c.Start.CV == 0 {
		return c.Start.Abundance + 1
	}
	f := factor{rates.NewLogNormal(1, c.Start.CV).Sigma}
	return c.Start.Abundance*math.Exp(7*f.s-f.s*f.s/2) + 1
}
