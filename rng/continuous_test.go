package rng

import (
	"fmt"
	"math"
	"sort"
	"testing"

	"gonum.org/v1/gonum/mathext"
	"gonum.org/v1/gonum/stat/distuv"
)

// continuousLaws have their distribution function from package math or gonum.
var continuousLaws = []struct {
	name string
	draw func(*Stream) float64
	cdf  func(float64) float64
	mean float64
	sd   float64
	cuts []float64
	n    int
}{
	{"float64", (*Stream).Float64, func(x float64) float64 { return x }, 0.5, 1 / math.Sqrt(12), even(0, 1, 256), 2000000},
	// cut at the edges of the layers, where a wrong table shows first
	{"normal", Normal, distuv.UnitNormal.CDF, 0, 1, layers(normalTable.edge[1:256], true), 20000000},
	{"exponential", Exponential, func(x float64) float64 { return -math.Expm1(-x) }, 1, 1, append(layers(exponentialTable.edge[1:256], false), even(exponentialFrom, exponentialFrom+4, 80)...), 20000000},
	{"gamma 0.05", gammaOf(0.05), gammaCDF(0.05), 0.05, math.Sqrt(0.05), powersOfTwo(-60, 3), 2000000},
	{"gamma 0.7", gammaOf(0.7), gammaCDF(0.7), 0.7, math.Sqrt(0.7), even(0, 8, 256), 2000000},
	{"gamma 1", gammaOf(1), gammaCDF(1), 1, 1, even(0, 12, 256), 2000000},
	{"gamma 2", gammaOf(2), gammaCDF(2), 2, math.Sqrt2, even(0, 16, 256), 2000000},
	{"gamma 40", gammaOf(40), gammaCDF(40), 40, math.Sqrt(40), even(15, 80, 256), 2000000},
	{"gamma 1e6", gammaOf(1e6), gammaCDF(1e6), 1e6, 1e3, even(0.995e6, 1.005e6, 256), 2000000},
}

func even(low, high float64, n int) []float64 {
	out := make([]float64, n-1)
	for i := range out {
		out[i] = low + (high-low)*float64(i+1)/float64(n)
	}
	return out
}

func powersOfTwo(low, high int) (out []float64) {
	for e := low; e <= high; e++ {
		out = append(out, math.Ldexp(1, e), math.Ldexp(1.5, e))
	}
	return out
}

func layers(edge []float64, mirror bool) (out []float64) {
	for _, x := range edge {
		out = append(out, x)
		if mirror {
			out = append(out, -x)
		}
	}
	sort.Float64s(out)
	return out
}

func gammaOf(shape float64) func(*Stream) float64 {
	return func(s *Stream) float64 { return Gamma(s, shape) }
}

func gammaCDF(shape float64) func(float64) float64 {
	return func(x float64) float64 { return mathext.GammaIncReg(shape, x) }
}

// Null: the law, by chi-square between the cuts and by z of the mean. With two
// million draws a bias of the mean of 0.006 standard deviations is caught. The
// two ziggurats draw twenty million: 98.8 % of draws need no second look at their
// table, and wrong wedges would move all layers together by 0.5 %.
func TestContinuousLaws(t *testing.T) {
	for i, c := range continuousLaws {
		n := sampleSize(c.n)
		s := NewStream(25, uint64(i), Weather)
		var cuts, expected []float64
		done := 0.0
		for _, x := range c.cuts { // merge what is expected less than 25 times
			p := c.cdf(x)
			if (p-done)*float64(n) >= 25 && (1-p)*float64(n) >= 25 {
				cuts, expected = append(cuts, x), append(expected, (p-done)*float64(n))
				done = p
			}
		}
		expected = append(expected, (1-done)*float64(n))
		count := make([]int, len(expected))
		sum := 0.0
		for range n {
			x := c.draw(s)
			count[sort.SearchFloat64s(cuts, x)]++
			sum += x - c.mean
		}
		judge(t, "continuous", c.name+" shape", chiSquare(count, expected))
		error1 := c.sd / math.Sqrt(float64(n))
		judge(t, "continuous", c.name+" mean", twoSided(sum/float64(n)/error1))
		t.Logf("%s: %d bins, catches a bias of %.2g standard deviations", c.name, len(expected), caughtAt()/math.Sqrt(float64(n)))
	}
}

// Null: what lies beyond the last layer has the tail of the normal law. With a
// million draws in 20 bins, a bin off by 4 % is caught.
func TestNormalTail(t *testing.T) {
	n := sampleSize(1000000)
	s := NewStream(26, 0, Weather)
	beyond := math.Erfc(normalFrom / math.Sqrt2)
	count, expected := make([]int, 20), make([]float64, 20)
	for i := range expected {
		expected[i] = float64(n) / 20
	}
	for i := range n {
		side := float64(1 - 2*(i&1))
		x := normalTail(s, side)
		if x*side < normalFrom {
			t.Fatalf("a draw of %v from the tail beyond %v", x, normalFrom*side)
		}
		count[min(19, int(20*math.Erfc(x*side/math.Sqrt2)/beyond))]++
	}
	judge(t, "normal tail", "tail", chiSquare(count, expected))
}

// Null: as many draws lie beyond the last layer as should. With twenty million
// draws a count off by 9 % (exponential, 9100 expected) and 12 % (normal, 5200)
// is caught.
func TestTailCounts(t *testing.T) {
	n := sampleSize(20000000)
	s := NewStream(30, 0, Weather)
	normals, exponentials := 0, 0
	for range n {
		if math.Abs(Normal(s)) > normalFrom {
			normals++
		}
		if Exponential(s) > exponentialFrom {
			exponentials++
		}
	}
	judge(t, "tail counts", "normal", exactBinomialP(normals, n, math.Erfc(normalFrom/math.Sqrt2)))
	judge(t, "tail counts", "exponential", exactBinomialP(exponentials, n, math.Exp(-exponentialFrom)))
}

// The layers close: equal areas that end at the height 1 (within the rounding
// of 255 additions), and the base with its tail has the same area.
func TestZigguratTables(t *testing.T) {
	for _, c := range []struct {
		name    string
		z       *ziggurat
		density func(float64) float64
		tail    func(float64) float64
		area    float64
		from    float64
	}{
		{"normal", normalTable, func(x float64) float64 { return math.Exp(-x * x / 2) },
			func(x float64) float64 { return math.Sqrt(math.Pi/2) * math.Erfc(x/math.Sqrt2) }, normalArea, normalFrom},
		{"exponential", exponentialTable, func(x float64) float64 { return math.Exp(-x) },
			func(x float64) float64 { return math.Exp(-x) }, exponentialArea, exponentialFrom},
	} {
		const within = 1e-13
		if base := c.from*c.density(c.from) + c.tail(c.from); math.Abs(base/c.area-1) > within {
			t.Errorf("%s: the base has the area %v, the layers %v", c.name, base, c.area)
		}
		for i := 1; i < 256; i++ {
			if a := c.z.edge[i] * (c.z.at[i+1] - c.z.at[i]); math.Abs(a/c.area-1) > 1e-10 {
				t.Errorf("%s: layer %d has the area %v, want %v", c.name, i, a, c.area)
			}
			if d := c.density(c.z.edge[i]); math.Abs(d/c.z.at[i]-1) > within {
				t.Errorf("%s: layer %d starts at the height %v, the density there is %v", c.name, i, c.z.at[i], d)
			}
		}
	}
}

var roundCells = []float64{15.3, 0.5, 1e-3, 1 - 1e-3, -2.25, 1e9 + 0.125}

// Null: up with the chance of the fraction. With a million draws an error of
// 0.0042 at 0.5 and of 0.0003 at 0.001 is caught.
func TestRoundKeepsTheMean(t *testing.T) {
	n := sampleSize(1000000)
	for i, x := range roundCells {
		s := NewStream(27, uint64(i), Taking)
		low := int64(math.Floor(x))
		ups := 0
		for range n {
			switch Round(s, x) {
			case low:
			case low + 1:
				ups++
			default:
				t.Fatalf("Round(%v) is neither neighbour", x)
			}
		}
		judge(t, "round", fmt.Sprint(x), exactBinomialP(ups, n, x-float64(low)))
	}
}
