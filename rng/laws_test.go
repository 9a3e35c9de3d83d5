package rng

import (
	"math"
	"sort"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"
)

// law is the exact law of a count, kept from low on. It is built from the mode
// outwards by the ratio of neighbouring probabilities and divided by its sum,
// and so shares nothing with the samplers: no logarithm, no factorial.
type law struct {
	low          int64
	prob         []float64
	mean, spread float64 // mean and standard deviation in closed form
}

// newLaw takes up(k) = P(k+1)/P(k); both sides are followed until the
// probability is 1e-30 of the mode's.
func newLaw(mode int64, up func(k float64) float64, mean, variance float64) law {
	var down []float64
	p := 1.0
	for k := mode - 1; k >= 0; k-- {
		p /= up(float64(k))
		if p < 1e-30 {
			break
		}
		down = append(down, p)
	}
	l := law{low: mode - int64(len(down)), mean: mean, spread: math.Sqrt(variance)}
	for i := len(down) - 1; i >= 0; i-- {
		l.prob = append(l.prob, down[i])
	}
	p = 1.0
	for k := mode; p > 1e-30; k++ {
		l.prob = append(l.prob, p)
		p *= up(float64(k))
	}
	sum := 0.0
	for _, q := range l.prob {
		sum += q
	}
	for i := range l.prob {
		l.prob[i] /= sum
	}
	return l
}

func binomialLaw(n int64, p float64) law {
	nf := float64(n)
	odds := p / (1 - p)
	mode := min(n, int64(math.Floor((nf+1)*p)))
	return newLaw(mode, func(k float64) float64 { return (nf - k) / (k + 1) * odds }, nf*p, nf*p*(1-p))
}

func poissonLaw(m float64) law {
	return newLaw(int64(m), func(k float64) float64 { return m / (k + 1) }, m, m)
}

func negativeLaw(m, size float64) law {
	r := m / (m + size)
	mode := int64(0)
	if size > 1 {
		mode = int64(m * (size - 1) / size)
	}
	return newLaw(mode, func(k float64) float64 { return (k + size) / (k + 1) * r }, m, m+m*m/size)
}

func (l law) at(k int64) float64 {
	if k < l.low || k >= l.low+int64(len(l.prob)) {
		return 0
	}
	return l.prob[k-l.low]
}

// bins cuts the law into runs of counts that are expected at least 25 times
// (at 5, the usual bound, the far tail of the chi-square law is not yet
// right) and at most 200 of them. It returns the last count of every bin but
// the last.
func (l law) bins(n int) (last []int64, expected []float64) {
	least := math.Max(25, float64(n)/200)
	e, done := 0.0, 0.0
	for i, p := range l.prob {
		e += p * float64(n)
		if e >= least && float64(n)-done-e >= least {
			last = append(last, l.low+int64(i))
			expected = append(expected, e)
			done += e
			e = 0
		}
	}
	return last, append(expected, float64(n)-done)
}

// fit draws n counts and gives three p-values: chi-square over runs of counts,
// chi-square of the remainder by 8 (which would show a lattice that long runs
// hide), and z of the mean. It logs the smallest bias of the mean it catches.
func fit(t *testing.T, l law, n int, draw func() int64) (shape, remainder, mean float64) {
	t.Helper()
	last, expected := l.bins(n)
	count := make([]int, len(expected))
	var rest [8]int
	sum := 0.0
	for range n {
		k := draw()
		i := sort.Search(len(last), func(i int) bool { return k <= last[i] })
		count[i]++
		rest[k&7]++
		sum += float64(k) - l.mean
	}
	shape = chiSquare(count, expected)

	var byRest [8]float64
	for i, p := range l.prob {
		byRest[(l.low+int64(i))&7] += p * float64(n)
	}
	var c []int
	var e []float64
	restCount, restExpected := 0, 0.0
	for i := range byRest {
		if byRest[i] >= 25 {
			c, e = append(c, rest[i]), append(e, byRest[i])
		} else {
			restCount, restExpected = restCount+rest[i], restExpected+byRest[i]
		}
	}
	if restExpected >= 25 {
		c, e = append(c, restCount), append(e, restExpected)
	}
	remainder = chiSquare(c, e)

	error1 := l.spread / math.Sqrt(float64(n))
	mean = 1
	// else too few events, or too few that fail, for a normal mean
	if math.Min(l.mean, l.spread*l.spread)*float64(n) >= 1000 {
		mean = twoSided(sum / float64(n) / error1)
	}
	t.Logf("%d draws, %d bins, catches a bias of the mean of %.2g of it; p %.3f %.3f %.3f",
		n, len(expected), caughtAt()*error1/l.mean, shape, remainder, mean)
	return shape, remainder, mean
}

// The laws the samplers are held to, against published probabilities.
func TestLawsAgainstPublishedValues(t *testing.T) {
	for _, c := range []struct {
		name string
		l    law
		k    int64
		want float64
	}{
		// scipy 1.x stats and R dbinom, dpois, dnbinom agree on these digits
		{"Binomial(50, 0.3)", binomialLaw(50, 0.3), 10, 0.038618991},
		{"Binomial(50, 0.3)", binomialLaw(50, 0.3), 15, 0.12234686},
		{"Binomial(50, 0.3)", binomialLaw(50, 0.3), 20, 0.037038763},
		{"Binomial(1000, 0.9)", binomialLaw(1000, 0.9), 900, 0.042016791},
		{"Poisson(7.5)", poissonLaw(7.5), 0, 5.5308437e-04},
		{"Poisson(7.5)", poissonLaw(7.5), 5, 0.10937459},
		{"Poisson(7.5)", poissonLaw(7.5), 7, 0.14648383},
		{"Poisson(7.5)", poissonLaw(7.5), 12, 0.036575442},
		{"Poisson(150)", poissonLaw(150), 150, 0.032555409},
		{"Poisson(0.02)", poissonLaw(0.02), 0, 0.98019867},
		{"negative binomial, size 0.5, mean 1.5", negativeLaw(1.5, 0.5), 0, 0.5},
		{"negative binomial, size 0.5, mean 1.5", negativeLaw(1.5, 0.5), 1, 0.1875},
		{"negative binomial, size 0.5, mean 1.5", negativeLaw(1.5, 0.5), 3, 0.065917969},
	} {
		if got := c.l.at(c.k); math.Abs(got-c.want) > 0.6e-7*c.want { // eight printed digits
			t.Errorf("%s: P(%d) = %.10g, published %.10g", c.name, c.k, got, c.want)
		}
	}
}

// The same laws against gonum, away from p = 0 and 1 where it gives NaN.
func TestLawsAgainstGonum(t *testing.T) {
	// gonum's log-probabilities lose digits as counts grow: 1e-16 times the
	// log-factorial of n, here 1e6 ln 1e6.
	const within = 1e-8
	for _, n := range []int64{1, 5, 64, 257, 4096, 100000} {
		for _, p := range []float64{1e-3, 0.3, 0.9} {
			l := binomialLaw(n, p)
			g := distuv.Binomial{N: float64(n), P: p}
			for i := 0; i < len(l.prob); i += 1 + len(l.prob)/20 {
				k := l.low + int64(i)
				if got, want := l.prob[i], g.Prob(float64(k)); math.Abs(got-want) > within {
					t.Errorf("Binomial(%d, %v): P(%d) = %v, gonum has %v", n, p, k, got, want)
				}
			}
		}
	}
	for _, m := range []float64{0.02, 7.5, 150, 1e5} {
		l := poissonLaw(m)
		g := distuv.Poisson{Lambda: m}
		for i := 0; i < len(l.prob); i += 1 + len(l.prob)/20 {
			k := l.low + int64(i)
			if got, want := l.prob[i], g.Prob(float64(k)); math.Abs(got-want) > within {
				t.Errorf("Poisson(%v): P(%d) = %v, gonum has %v", m, k, got, want)
			}
		}
	}
}

// publishedDraws are single probabilities of the table above, held against the
// samplers themselves with exact binomial intervals.
var publishedDraws = []struct {
	name string
	draw func(*Stream) int64
	k    int64
	prob float64
}{
	{"Binomial(50, 0.3) = 15", func(s *Stream) int64 { return Binomial(s, 50, 0.3) }, 15, 0.12234686},
	{"Binomial(1000, 0.9) = 900", func(s *Stream) int64 { return Binomial(s, 1000, 0.9) }, 900, 0.042016791},
	{"Poisson(7.5) = 7", func(s *Stream) int64 { return Poisson(s, 7.5) }, 7, 0.14648383},
	{"Poisson(7.5) = 0", func(s *Stream) int64 { return Poisson(s, 7.5) }, 0, 5.5308437e-04},
	{"Poisson(150) = 150", func(s *Stream) int64 { return Poisson(s, 150) }, 150, 0.032555409},
	{"Poisson(0.02) = 0", func(s *Stream) int64 { return Poisson(s, 0.02) }, 0, 0.98019867},
	{"negative binomial(1.5, 0.5) = 0", func(s *Stream) int64 { return NegativeBinomial(s, 1.5, 0.5) }, 0, 0.5},
	{"negative binomial(1.5, 0.5) = 3", func(s *Stream) int64 { return NegativeBinomial(s, 1.5, 0.5) }, 3, 0.065917969},
	{"Gamma(2) x 1.5 at most 3", func(s *Stream) int64 { return atMost(1.5*Gamma(s, 2), 3) }, 1, 0.59399415},
	{"Beta(2, 5) at most 0.3", func(s *Stream) int64 {
		a, b := Gamma(s, 2), Gamma(s, 5)
		return atMost(a/(a+b), 0.3)
	}, 1, 0.57982500},
	{"standard normal at most 1.6448536", func(s *Stream) int64 { return atMost(Normal(s), 1.6448536) }, 1, 0.95},
	{"standard normal at most 3.0902323", func(s *Stream) int64 { return atMost(Normal(s), 3.0902323) }, 1, 0.999},
}

func atMost(x, limit float64) int64 {
	if x <= limit {
		return 1
	}
	return 0
}

// Null: the published probability. With a million draws it catches, in 99 of
// 100 cases, an error of about 8.4 standard errors: 0.0042 at a probability of
// 0.5, 0.0002 at 0.00055.
func TestSamplersAgainstPublishedValues(t *testing.T) {
	n := sampleSize(1000000)
	for i, c := range publishedDraws {
		s := NewStream(20, uint64(i), Demography)
		hits := 0
		for range n {
			if c.draw(s) == c.k {
				hits++
			}
		}
		judge(t, "published values", c.name, exactBinomialP(hits, n, c.prob))
	}
}

// exactBinomialP is the two-sided p-value of a count (twice the smaller tail).
func exactBinomialP(hits, n int, p float64) float64 {
	g := distuv.Binomial{N: float64(n), P: p}
	low := g.CDF(float64(hits))
	high := 1.0
	if hits > 0 {
		high = distuv.Binomial{N: float64(n), P: 1 - p}.CDF(float64(n - hits))
	}
	return math.Min(1, 2*math.Min(low, high))
}
