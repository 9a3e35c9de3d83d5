package exact

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat/distuv"

	"ebbline/pva"
	"ebbline/pva/rates"
)

// The reference of this file: small cases straight from the model's text as
// dense matrices, the laws from gonum's distributions, every integral by the
// trapezoid rule on many points. It shares the formulas of package rates and
// nothing of this package.

// dense is the chain of one case on 0 to size-1.
type dense struct {
	m      *rates.Model
	c      *pva.Case
	size   int
	always bool
	acts   map[string]*mat.Dense   // rules that are the same every year
	lives  map[string][]*mat.Dense // births and deaths: averaged, or by weather with memory
}

// once makes the matrix of a rule the first time it is asked for.
func (d *dense) once(key string, build func() *mat.Dense) *mat.Dense {
	if d.acts[key] == nil {
		d.acts[key] = build()
	}
	return d.acts[key]
}

// normalGrid is the trapezoid rule for the standard normal law.
func normalGrid(n int) (at, weight []float64) {
	sum := 0.0
	for i := 0; i < n; i++ {
		e := -7 + 14*float64(i)/float64(n-1)
		at = append(at, e)
		weight = append(weight, math.Exp(-e*e/2))
		sum += weight[i]
	}
	for i := range weight {
		weight[i] /= sum
	}
	return at, weight
}

// matrix fills a matrix row by row; add puts mass on a state, cut to the last.
func (d *dense) matrix(row func(n int, add func(to int, p float64))) *mat.Dense {
	m := mat.NewDense(d.size, d.size, nil)
	for n := 0; n < d.size; n++ {
		row(n, func(to int, p float64) {
			to = min(max(to, 0), d.size-1)
			m.Set(n, to, m.At(n, to)+p)
		})
	}
	return m
}

// rounded calls use with the two neighbours of x and their chances.
func rounded(x float64, use func(k int, p float64)) {
	k := math.Floor(x)
	use(int(k), 1-(x-k))
	if x > k {
		use(int(k)+1, x-k)
	}
}

// averageOver calls use over a log-normal factor of mean 1, by the trapezoid
// rule on either side of a factor at which there is a jump; with 1 if cv is 0.
func averageOver(cv float64, points int, jump float64, use func(factor, w float64)) {
	if cv == 0 {
		use(1, 1)
		return
	}
	tau := math.Sqrt(math.Log(1 + cv*cv))
	ends := []float64{-7, 7}
	if jump > 0 {
		if g := math.Log(jump)/tau + tau/2; math.Abs(g) < 7 {
			ends = []float64{-7, g, 7}
		}
	}
	for s := 1; s < len(ends); s++ {
		h := (ends[s] - ends[s-1]) / float64(points-1)
		for i := 0; i < points; i++ {
			g, w := ends[s-1]+h*float64(i), h
			if i == 0 || i == points-1 {
				w /= 2
			}
			// Just inside, so that the ends belong to their own side.
			inside := g + 1e-13*(float64(points)/2-float64(i))
			use(math.Exp(tau*inside-tau*tau/2), w*math.Exp(-g*g/2)/math.Sqrt(2*math.Pi))
		}
	}
}

func chosen(n int, p float64, k int) float64 {
	if p >= 1 {
		if k == n {
			return 1
		}
		return 0
	}
	return distuv.Binomial{N: float64(n), P: p}.Prob(float64(k))
}

func (d *dense) take(t *rates.Take, y int) *mat.Dense {
	h := t.Rule
	points := 20001
	if h.TakeNoise == "poisson" {
		points = 2001 // smooth between the bends of the rule
	}
	if h.SurveyCV > 0 && h.TakeCV > 0 {
		points = 1001
	}
	return d.matrix(func(n int, add func(int, float64)) {
		if n == 0 {
			add(0, 1)
			return
		}
		intend := func(k int, w float64) {
			made := min(k, max(0, n-int(math.Ceil(h.Leave))))
			rounded(h.ExtraDeaths*float64(made), func(e int, p float64) { add(n-made-min(e, n-made), w*p) })
		}
		averageOver(h.SurveyCV, points, h.StopBelow/float64(n), func(f, w float64) {
			seen := float64(n) * f
			if seen < h.StopBelow {
				add(n, w)
				return
			}
			target := t.Target(y, seen)
			switch {
			case h.TakeNoise == "each-animal":
				for k := 0; k <= n; k++ {
					intend(k, w*chosen(n, h.Fraction.Value, k))
				}
			case h.TakeNoise == "poisson" && target > 0:
				for k := 0; k < 2*d.size; k++ {
					intend(k, w*distuv.Poisson{Lambda: target}.Prob(float64(k)))
				}
			default:
				averageOver(h.TakeCV, points, 0, func(g, v float64) {
					rounded(target*g, func(k int, p float64) { intend(k, w*v*p) })
				})
			}
		})
	})
}

func (d *dense) stock(s pva.Stocking) *mat.Dense {
	return d.matrix(func(n int, add func(int, float64)) {
		switch {
		case s.OnlyBelow.Set && float64(n) >= s.OnlyBelow.Value:
			add(n, 1)
		case s.Noise == "poisson":
			for k := 0; k < d.size; k++ {
				add(n+k, distuv.Poisson{Lambda: s.Add}.Prob(float64(k)))
			}
		default:
			rounded(s.Add, func(k int, p float64) { add(n+k, p) })
		}
	})
}

func (d *dense) kill(f rates.Fraction) *mat.Dense {
	at, weight := []float64{0}, []float64{1}
	if f.V > 0 {
		at, weight = normalGrid(201)
	}
	return d.matrix(func(n int, add func(int, float64)) {
		for i, e := range at {
			for k := 0; k <= n; k++ {
				add(k, weight[i]*chosen(n, 1-f.Draw(e), k))
			}
		}
	})
}

// live is births and deaths at given yearly rates.
func (d *dense) live(y int, b, death float64, watched bool) *mat.Dense {
	if d.c.Births.Breeding == "flow" {
		g := mat.NewDense(d.size, d.size, nil)
		for n := 0; n < d.size; n++ {
			x := float64(n)
			if watched && x <= d.c.Question.Threshold {
				continue
			}
			up, down := d.m.BirthAt(b, x)*x, d.m.DeathAt(death, x)*x
			for i := range d.m.Takes {
				if t := &d.m.Takes[i]; t.Rule.When == "through" && x > t.Rule.Leave && x >= t.Rule.StopBelow {
					year, head := t.Stream(y)
					down += (year + head*x) * (1 + t.Rule.ExtraDeaths)
				}
			}
			for _, s := range d.c.Stocking {
				if s.When == "through" && (!s.OnlyBelow.Set || x < s.OnlyBelow.Value) {
					up += s.Add
				}
			}
			if n+1 < d.size {
				g.Set(n, n+1, up)
			} else {
				up = 0
			}
			if n > 0 {
				g.Set(n, n-1, down)
			}
			g.Set(n, n, -up-down)
		}
		var e mat.Dense
		e.Exp(g)
		return &e
	}
	young := func(parents int, add func(k int, p float64)) {
		x := float64(parents)
		f := d.m.BirthAt(b, x)
		if parents == 0 || f == 0 {
			add(0, 1)
			return
		}
		for k := 0; k < d.size+20; k++ {
			v := float64(k)
			switch d.c.Births.Offspring {
			case "at-most-one":
				if k <= parents {
					add(k, chosen(parents, math.Min(1, f), k))
				}
			case "clumped":
				size := d.c.Births.Clumping.Value * x
				p := f * x / (f*x + size)
				add(k, math.Exp(lgamma(v+size)-lgamma(size)-lgamma(v+1)+size*math.Log(1-p)+v*math.Log(p)))
			default:
				add(k, distuv.Poisson{Lambda: f * x}.Prob(v))
			}
		}
	}
	survive := func(n int, add func(int, float64)) {
		s := math.Exp(-d.m.DeathAt(death, float64(n)))
		for k := 0; k <= n; k++ {
			add(k, chosen(n, s, k))
		}
	}
	if d.c.Births.Parents == "all" {
		return d.matrix(func(n int, add func(int, float64)) {
			survive(n, func(s int, p float64) { young(n, func(k int, q float64) { add(s+k, p*q) }) })
		})
	}
	var out mat.Dense
	out.Mul(d.matrix(survive), d.matrix(func(s int, add func(int, float64)) {
		young(s, func(k int, q float64) { add(s+k, q) })
	}))
	return &out
}

func lgamma(x float64) float64 { v, _ := math.Lgamma(x); return v }

// answer carries the whole law and that of the not fallen, weather integrated
// with the given number of points an axis (one law a point where it has memory).
func (d *dense) answer(points int) (fallen, extinct, mean []float64) {
	c := d.c
	both := d.m.Birth.Sigma > 0 && d.m.Death.Varies()
	memory := c.Weather.Memory
	at, weight := normalGrid(points)
	type weather struct{ b, d, w float64 }
	var grid []weather
	second := 1
	switch {
	case d.m.Birth.Sigma == 0 && !d.m.Death.Varies():
		grid = []weather{{0, 0, 1}}
		memory = 0
	case both && math.Abs(c.Weather.Correlation) < 1:
		second = points
		for i, e := range at {
			for j, z := range at {
				grid = append(grid, weather{c.Weather.Correlation*e + math.Sqrt(1-c.Weather.Correlation*c.Weather.Correlation)*z, e, weight[i] * weight[j]})
			}
		}
	default:
		sign := 1.0
		if both {
			sign = c.Weather.Correlation
		}
		for i, e := range at {
			grid = append(grid, weather{sign * e, e, weight[i]})
		}
	}
	laws := 1
	if memory != 0 {
		laws = len(grid)
	}
	// State: for each law the whole and the alive vector.
	whole, alive := make([]*mat.VecDense, laws), make([]*mat.VecDense, laws)
	for j := range whole {
		w := 1.0
		if memory != 0 {
			w = grid[j].w
		}
		whole[j], alive[j] = mat.NewVecDense(d.size, nil), mat.NewVecDense(d.size, nil)
		averageOver(c.Start.CV, 20001, 0, func(f, p float64) {
			rounded(c.Start.Abundance*f, func(k int, q float64) {
				k = min(k, d.size-1)
				whole[j].SetVec(k, whole[j].AtVec(k)+w*p*q)
			})
		})
		alive[j].CopyVec(whole[j])
	}
	gone := 0.0
	look := func(vs []*mat.VecDense) {
		for _, v := range vs {
			for n := 0; n < d.size && float64(n) <= c.Question.Threshold; n++ {
				gone += v.AtVec(n)
				v.SetVec(n, 0)
			}
		}
	}
	times := func(vs []*mat.VecDense, m *mat.Dense) []*mat.VecDense {
		out := make([]*mat.VecDense, len(vs))
		for j, v := range vs {
			out[j] = mat.NewVecDense(d.size, nil)
			out[j].MulVec(m.T(), v)
		}
		return out
	}
	sum := func(a, b []*mat.VecDense, wa, wb float64) []*mat.VecDense {
		if a == nil {
			a = make([]*mat.VecDense, len(b))
			for j := range a {
				a[j] = mat.NewVecDense(d.size, nil)
			}
		}
		out := make([]*mat.VecDense, len(b))
		for j := range b {
			out[j] = mat.NewVecDense(d.size, nil)
			out[j].AddScaledVec(out[j], wa, a[j])
			out[j].AddScaledVec(out[j], wb, b[j])
		}
		return out
	}
	if d.always {
		look(alive)
	}
	for y := 1; y <= c.Question.Horizon; y++ {
		maps := func(f float64, watched bool) []*mat.Dense {
			bf, df := d.m.BirthCalendar[y-1]*f, d.m.DeathCalendar[y-1]
			key := keyOf(bf, df, watched)
			if d.lives[key] == nil {
				average := mat.NewDense(d.size, d.size, nil)
				for _, g := range grid {
					m := d.live(y, d.m.Birth.Draw(g.b)*bf, d.m.Death.Draw(g.d)*df, watched)
					if memory != 0 {
						d.lives[key] = append(d.lives[key], m)
					} else {
						m.Scale(g.w, m)
						average.Add(average, m)
					}
				}
				if memory == 0 {
					d.lives[key] = []*mat.Dense{average}
				}
			}
			return d.lives[key]
		}
		step := func(start []*mat.VecDense, watched bool) []*mat.VecDense {
			act := func(v []*mat.VecDense, m *mat.Dense) []*mat.VecDense {
				v = times(v, m)
				if watched {
					look(v)
				}
				return v
			}
			actions := func(v []*mat.VecDense, when string) []*mat.VecDense {
				for i := range d.m.Takes {
					if t := &d.m.Takes[i]; t.Rule.When == when && t.Scheduled[y-1] {
						v = act(v, d.once(keyOf("take", i, t.Target(y, 10)), func() *mat.Dense { return d.take(t, y) }))
					}
				}
				for i, s := range c.Stocking {
					if s.When == when && s.Scheduled(c, y) {
						v = act(v, d.once(keyOf("stock", i), func() *mat.Dense { return d.stock(s) }))
					}
				}
				return v
			}
			// Every combination of catastrophes in turn.
			var total []*mat.VecDense
			for set := 0; set < 1<<len(c.Catastrophe); set++ {
				v, chance, f := start, 1.0, 1.0
				for k, cat := range c.Catastrophe {
					if set>>k&1 == 1 {
						chance *= cat.Prob()
						f *= cat.BirthsTimes
					} else {
						chance *= 1 - cat.Prob()
					}
				}
				v = sum(nil, v, 0, chance)
				for k := range c.Catastrophe {
					if set>>k&1 == 1 {
						v = act(v, d.once(keyOf("kill", k), func() *mat.Dense { return d.kill(d.m.Kills[k]) }))
					}
				}
				v = actions(v, "start")
				next := make([]*mat.VecDense, len(v))
				for j, m := range maps(f, watched) {
					next[j] = times(v[j:j+1], m)[0]
				}
				total = sum(total, next, 1, 1)
			}
			if watched {
				look(total)
			}
			total = actions(total, "end")
			if c.Ceiling.Set {
				total = times(total, d.matrix(func(n int, add func(int, float64)) { add(min(n, int(c.Ceiling.Value)), 1) }))
			}
			if memory != 0 {
				total = carryOn(total, at, memory, second)
			}
			return total
		}
		whole, alive = step(whole, false), step(alive, d.always)
		look(alive)
		none, size := 0.0, 0.0
		for _, v := range whole {
			none += v.AtVec(0)
			for n := 0; n < d.size; n++ {
				size += float64(n) * v.AtVec(n)
			}
		}
		fallen, extinct, mean = append(fallen, gone), append(extinct, none), append(mean, size)
	}
	return fallen, extinct, mean
}

// carryOn takes the weather of each law a year on by the normal density of the
// next number given this one, along one or both axes of the grid.
func carryOn(laws []*mat.VecDense, at []float64, memory float64, second int) []*mat.VecDense {
	n := len(at)
	k := mat.NewDense(n, n, nil)
	sd := math.Sqrt(1 - memory*memory)
	for i := range at {
		sum := 0.0
		for j := range at {
			z := (at[j] - memory*at[i]) / sd
			k.Set(i, j, math.Exp(-z*z/2))
			sum += k.At(i, j)
		}
		for j := range at {
			k.Set(i, j, k.At(i, j)/sum)
		}
	}
	move := func(v []*mat.VecDense, index func(i, r int) int, rest int) []*mat.VecDense {
		out := make([]*mat.VecDense, len(v))
		for r := 0; r < rest; r++ {
			for j := 0; j < n; j++ {
				o := mat.NewVecDense(v[0].Len(), nil)
				for i := 0; i < n; i++ {
					o.AddScaledVec(o, k.At(i, j), v[index(i, r)])
				}
				out[index(j, r)] = o
			}
		}
		return out
	}
	out := move(laws, func(i, r int) int { return i*second + r }, second)
	if second > 1 {
		out = move(out, func(i, r int) int { return r*second + i }, n)
	}
	return out
}

// agree compares an answer with the dense chain. The tolerance is that of the
// trapezoid rule across the bends of a take rule, seen by doubling its points.
func agree(t *testing.T, keys set, size, points int, tolerance float64) {
	t.Helper()
	m := model(t, keys)
	a := answer(t, keys)
	d := &dense{m: m, c: m.Case, size: size, always: m.Case.Question.Watch == "always", acts: map[string]*mat.Dense{}, lives: map[string][]*mat.Dense{}}
	fallen, extinct, mean := d.answer(points)
	for y := range fallen {
		if diff := math.Abs(a.Fallen[y] - fallen[y]); !(diff <= tolerance+a.Error) {
			t.Errorf("year %d: fallen %.10g, dense chain %.10g", y+1, a.Fallen[y], fallen[y])
		}
		if diff := math.Abs(a.Extinct[y] - extinct[y]); !(diff <= tolerance+a.Error) {
			t.Errorf("year %d: extinct %.10g, dense chain %.10g", y+1, a.Extinct[y], extinct[y])
		}
		if diff := math.Abs(a.Mean[y] - mean[y]); !(diff <= 2e-5*mean[y]) && !math.IsNaN(a.Mean[y]) {
			t.Errorf("year %d: mean %.10g, dense chain %.10g", y+1, a.Mean[y], mean[y])
		}
	}
	if a.Risk < 1e-6 || a.Risk > 1-1e-6 {
		t.Errorf("risk %.3g tells nothing", a.Risk)
	}
}
