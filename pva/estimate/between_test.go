package estimate

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"

	"ebbline/pva"
)

func within(t *testing.T, what string, got, want, by float64) {
	t.Helper()
	if !(math.Abs(got-want) <= by) {
		t.Errorf("%s is %v, want %v (within %v)", what, got, want, by)
	}
}

// TestNothingSeen: where no draw has an event the interval is that of 200 draws
// and not of 10,000 replicates, which may be those of 200 cases without risk
// where one in a hundred has much. With one replicate a draw it is Wilson's.
func TestNothingSeen(t *testing.T) {
	var s DrawSums
	for range 200 {
		s.Add(0)
	}
	p := s.Pooled(50, 0.95)
	if _, _, high := BetweenDraws(make([]float64, 200), 0.95); p.Low != 0 || p.High != high {
		t.Errorf("%v, want 0 to %v", p, high)
	}
	p = s.Pooled(1, 0.95)
	if _, high := Wilson(0, 200, 0.95); p.Low != 0 || p.High != high {
		t.Errorf("%v, want 0 to %v", p, high)
	}
}

// TestDrawSumsAreExact: counts near the most that a run can have.
func TestDrawSumsAreExact(t *testing.T) {
	var s DrawSums
	const most = 2_000_000_000
	s.Add(most)
	s.Add(0)
	p := s.Pooled(most, 0.95)
	_, low, high := BetweenDraws([]float64{1, 0}, 0.95)
	if p.Count != most || p.Of != 2*most || p.Estimate != 0.5 || p.Low != low || p.High != high {
		t.Errorf("%v", p)
	}
}

// beta draws a risk from a beta law.
func risks(src *rand.Rand, a, b float64) float64 {
	return distuv.Beta{Alpha: a, Beta: b, Src: src}.Rand()
}

func counts(src *rand.Rand, draws int, each int64, a, b float64) []int64 {
	out := make([]int64, draws)
	for i := range out {
		out[i] = int64(distuv.Binomial{N: float64(each), P: risks(src, a, b), Src: src}.Rand())
	}
	return out
}

// TestCoverage: over 4,000 sets of 20 draws of 50 replicates with risks from the
// beta law (8, 12) the interval misses the mean risk 0.4 in at most 5 % of cases,
// beyond which 5.73 standard deviations are allowed (false alarm 1e-8). Wilson's
// interval of all 1,000 replicates alone misses it far more often (the variance
// is that of 50 replicates times 1 + 49/21), so the test can fail.
func TestCoverage(t *testing.T) {
	const sets, draws, each = 4000, 20, 50
	src := rand.New(rand.NewPCG(11, 7))
	missed, wilson := 0, 0
	for range sets {
		var s DrawSums
		var total int64
		for _, x := range counts(src, draws, each, 8, 12) {
			s.Add(x)
			total += x
		}
		if p := s.Pooled(each, 0.95); !(p.Low <= 0.4 && 0.4 <= p.High) {
			missed++
		}
		if low, high := Wilson(total, draws*each, 0.95); !(low <= 0.4 && 0.4 <= high) {
			wilson++
		}
	}
	allowed := 0.05*sets + 5.73*math.Sqrt(sets*0.95*0.05)
	if float64(missed) > allowed {
		t.Errorf("%d of %d sets missed", missed, sets)
	}
	if float64(wilson) <= allowed {
		t.Errorf("Wilson's interval misses %d of %d: the test cannot tell", wilson, sets)
	}
}

// TestPooledDifference: the interval of a paired difference is that of the
// draws' differences where that is wider, and cut to [-1, 1].
func TestPooledDifference(t *testing.T) {
	this, other := []int64{9, 1, 5, 5}, []int64{3, 1, 2, 0}
	d := PooledDifference(pva.Difference{Estimate: 0.35, Low: 0.34, High: 0.36}, this, other, 10, 0.95)
	// Differences 0.6, 0, 0.3, 0.5: mean 0.35, variance 0.07.
	half := 3.182446 * math.Sqrt(0.07/4)
	within(t, "low", d.Low, 0.35-half, 1e-6)
	within(t, "high", d.High, 0.35+half, 1e-6)
	same := PooledDifference(pva.Difference{Estimate: 0, Low: -0.01, High: 0.01}, this, this, 10, 0.95)
	if same.Low != -0.01 || same.High != 0.01 {
		t.Errorf("draws without a difference: %v", same)
	}
}

// TestSplitVariance: over many sets the two parts are without bias: the risks of
// the beta law (2, 6) vary by 2*6/(64*9) = 1/48, and 5 replicates of them have
// noise (E p (1-p))/5 = (0.25*0.75 - 1/48)/5 = 1/30.
func TestSplitVariance(t *testing.T) {
	const sets = 2000
	src := rand.New(rand.NewPCG(3, 5))
	var inputs, noise []float64
	for range sets {
		v := SplitVariance(counts(src, 60, 5, 2, 6), 5)
		inputs, noise = append(inputs, v.Total-v.Noise), append(noise, v.Noise)
		if math.Abs(v.Inputs-math.Max(0, v.Total-v.Noise)) > 1e-15 {
			t.Fatalf("%v", v)
		}
	}
	for what, c := range map[string]struct {
		values []float64
		want   float64
	}{"inputs": {inputs, 1.0 / 48}, "noise": {noise, 1.0 / 30}} {
		mean, variance := moments(c.values)
		within(t, what, mean, c.want, 5.73*math.Sqrt(variance/sets))
	}
	if v := SplitVariance([]int64{1, 0, 1}, 1); !math.IsNaN(v.Inputs) || !math.IsNaN(v.Noise) {
		t.Errorf("one replicate a draw: %v", v)
	}
}

// TestDrawsToDecide: with the limit half of the interval's half width below or
// above the estimate, four times the replicates bring that end to it.
func TestDrawsToDecide(t *testing.T) {
	p := pva.Proportion{Of: 1000, Estimate: 0.5, Low: 0.25, High: 0.875}
	if got := DrawsToDecide(pva.Optional{Value: 0.375, Set: true}, p); got != 4000 {
		t.Errorf("%d", got)
	}
	if got := DrawsToDecide(pva.Optional{Value: 0.6875, Set: true}, p); got != 4000 {
		t.Errorf("%d", got)
	}
	if got := DrawsToDecide(pva.Optional{Value: 0.5, Set: true}, p); got != -1 {
		t.Errorf("%d", got)
	}
}

func TestWidened(t *testing.T) {
	p := Widened(pva.Proportion{Estimate: 0.1, Low: 0.08, High: 0.13}, 2)
	within(t, "low", p.Low, 0.06, 1e-15)
	within(t, "high", p.High, 0.16, 1e-15)
	if p := Widened(p, 100); p.Low != 0 || p.High != 1 {
		t.Errorf("%v", p)
	}
}
