package plain

import (
	"math"
	"math/rand/v2"
	"strconv"
	"strings"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"

	"ebbline/pva"
)

// Each test of a probability fails by chance once in a million. There are fewer
// than 90 in this package, all with fixed seeds.
const level = 1e-6

// build makes a case from "key=value" words.
func build(t testing.TB, text string) *pva.Case {
	t.Helper()
	var entries []pva.Entry
	for _, word := range strings.Fields(text) {
		key, val, _ := strings.Cut(word, "=")
		v := pva.Text(val)
		if x, err := strconv.ParseFloat(val, 64); err == nil {
			v = pva.Num(x)
		}
		entries = append(entries, pva.Entry{Path: key, Value: v})
	}
	c, faults := pva.Build(entries)
	if len(faults) > 0 {
		t.Fatalf("%s: %v", text, faults)
	}
	return c
}

// run is many replicates of a case.
func run(t testing.TB, c *pva.Case, replicates int, seed uint64) []Path {
	t.Helper()
	src := rand.NewPCG(seed, 1)
	out := make([]Path, replicates)
	for i := range out {
		p, err := Replicate(c, src)
		if err != nil {
			t.Fatal(err)
		}
		out[i] = p
	}
	return out
}

// share fails unless the number of paths with the property is one that chance p
// allows: each exact binomial tail at least level/2.
func share(t testing.TB, what string, paths []Path, p float64, has func(Path) bool) {
	t.Helper()
	k := 0
	for _, path := range paths {
		if has(path) {
			k++
		}
	}
	law := distuv.Binomial{N: float64(len(paths)), P: p}
	if low, high := law.CDF(float64(k)), law.Survival(float64(k)-1); low < level/2 || high < level/2 {
		t.Errorf("%s: %d of %d = %.5f, expected %.5f (tails %.2g, %.2g)", what, k, len(paths), float64(k)/float64(len(paths)), p, low, high)
	}
}

func fallenBy(y int) func(Path) bool { return func(p Path) bool { return p.Fallen[y-1] } }

func near(t *testing.T, what string, got, want, relative float64) {
	t.Helper()
	if !(math.Abs(got-want) <= relative*math.Abs(want)) {
		t.Errorf("%s: %.12g, expected %.12g", what, got, want)
	}
}

// extinct is the chance that the linear birth-death process with these rates is
// extinct by t (Kendall 1948, Ann. Math. Statist. 19:1).
func extinct(births, deaths, t float64, start int) float64 {
	if births == deaths {
		return math.Pow(births*t/(1+births*t), float64(start))
	}
	e := math.Exp((births - deaths) * t)
	return math.Pow(deaths*(e-1)/(births*e-deaths), float64(start))
}

func TestLinearBirthDeath(t *testing.T) {
	for i, k := range []struct {
		b, d     float64
		t, start int
		want     float64
	}{
		{0.3, 0.2, 5, 3, 0.08540705151},
		{0.3, 0.2, 20, 3, 0.2543696684},
		{0.2, 0.3, 10, 5, 0.41209039},
		{0.25, 0.25, 10, 4, 0.2603082049},
		{0, 0.2, 5, 10, 0.01018589403},
	} {
		want := extinct(k.b, k.d, float64(k.t), k.start)
		near(t, "Kendall's formula", want, k.want, 1e-9)
		c := build(t, "births.breeding=flow births.rate="+num(k.b)+" deaths.rate="+num(k.d)+
			" start.abundance="+num(float64(k.start))+" question.threshold=0 question.horizon="+strconv.Itoa(k.t))
		share(t, "extinct in year "+strconv.Itoa(k.t), run(t, c, 10000, uint64(i)), want, func(p Path) bool { return p.N[k.t-1] == 0 })
	}
}

func num(x float64) string { return strconv.FormatFloat(x, 'g', -1, 64) }

// Ten animals that each survive a year with chance 0.2 all die with chance 0.8^10,
// in either reading of the year.
func TestPureDeath(t *testing.T) {
	for _, breeding := range []string{"pulse", "flow"} {
		c := build(t, "births.breeding="+breeding+" births.rate=0 deaths.fraction=0.8 start.abundance=10 question.threshold=0 question.horizon=2")
		paths := run(t, c, 20000, 5)
		share(t, breeding+" year 1", paths, math.Pow(0.8, 10), fallenBy(1))
		share(t, breeding+" year 2", paths, math.Pow(0.96, 10), fallenBy(2))
	}
}

// Poisson branching: q(g+1) = exp(m(q(g) - 1)), and q^start from several (Harris
// 1963, The Theory of Branching Processes); the negative binomial likewise.
func TestBranching(t *testing.T) {
	for _, k := range []struct {
		law  string
		q    map[int]float64
		mean float64
	}{
		{"poisson", map[int]float64{1: 0.332871084, 2: 0.48006114, 5: 0.65787444, 10: 0.750718183}, 1.1},
		{"clumped births.clumping=0.5", map[int]float64{1: 0.5, 2: 0.632455532, 5: 0.736975921}, 1.5},
	} {
		c := build(t, "births.breeding=pulse births.parents=all births.offspring="+k.law+" births.rate="+num(k.mean)+
			" deaths.fraction=1 start.abundance=3 question.threshold=0 question.horizon=10")
		paths := run(t, c, 10000, 6)
		for g, q := range k.q {
			share(t, k.law+" generation "+strconv.Itoa(g), paths, q*q*q, fallenBy(g))
		}
	}
	// At most one young each: with survivors all alive, one parent stays one with
	// chance 1 - f; a mean above 1 is cut to 1 and counted.
	c := build(t, "births.breeding=pulse births.offspring=at-most-one births.rate=0.3 deaths.rate=0 start.abundance=1 question.threshold=0 question.horizon=3")
	share(t, "at most one", run(t, c, 20000, 7), 0.343, func(p Path) bool { return p.N[2] == 1 })
	c = build(t, "births.breeding=pulse births.offspring=at-most-one births.rate=1.3 deaths.rate=0 start.abundance=1 question.threshold=0 question.horizon=3")
	if p := run(t, c, 1, 7)[0]; p.N[2] != 8 || p.Capped != 3 {
		t.Errorf("capped young: %+v", p)
	}
}
