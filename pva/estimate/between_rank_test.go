package estimate

import (
	"math"
	"math/rand/v2"
	"testing"
)

// linear is draws of k normal inputs, the first two of which have correlation r,
// and y = sum of b x + e.
func linear(src *rand.Rand, n int, r float64, b []float64, noise float64) (x [][]float64, y []float64) {
	for range n {
		row := make([]float64, len(b))
		for j := range row {
			row[j] = src.NormFloat64()
		}
		if len(b) > 1 {
			row[1] = r*row[0] + math.Sqrt(1-r*r)*row[1]
		}
		sum := noise * src.NormFloat64()
		for j := range row {
			sum += b[j] * row[j]
		}
		x, y = append(x, row), append(y, sum)
	}
	return x, y
}

// TestPartialRanksOfALinearModel: for jointly normal numbers the rank correlation
// is 6/pi asin(rho/2) (Pearson 1907), and the partial one follows from the three
// of two inputs and outcome by Yule's formula (1907): (ry1 - ry2 r12) / sqrt((1 -
// ry2²)(1 - r12²)). The mean over 200 sets of 400 draws agrees with it within
// 5.73 standard errors and the bias of order 1/n that rank correlations have
// (Moran 1948: below 0.6/(n+1) each; five of them enter).
func TestPartialRanksOfALinearModel(t *testing.T) {
	const sets, n, r = 200, 400, 0.6
	b := []float64{1, -0.5}
	const noise = 0.8
	src := rand.New(rand.NewPCG(41, 2))
	vy := b[0]*b[0] + b[1]*b[1] + 2*b[0]*b[1]*r + noise*noise
	rank := func(rho float64) float64 { return 6 / math.Pi * math.Asin(rho/2) }
	y1, y2, r12 := rank((b[0]+b[1]*r)/math.Sqrt(vy)), rank((b[1]+b[0]*r)/math.Sqrt(vy)), rank(r)
	want := []float64{(y1 - y2*r12) / math.Sqrt((1-y2*y2)*(1-r12*r12)), (y2 - y1*r12) / math.Sqrt((1-y1*y1)*(1-r12*r12))}
	got := make([][]float64, 2)
	held := []int{0, 0}
	for range sets {
		x, y := linear(src, n, r, b, noise)
		for j, c := range PartialRanks(x, y, 0.95) {
			got[j] = append(got[j], c.Estimate)
			if c.Low <= want[j] && want[j] <= c.High {
				held[j]++
			}
		}
	}
	for j := range want {
		mean, v := moments(got[j])
		within(t, "partial rank correlation", mean, want[j], 5*0.6/(n+1)+5.73*math.Sqrt(v/sets))
		// 95 % intervals hold it: under 159 of 200 would be a false alarm of 1e-8.
		if tail := BinomialTail(int64(held[j]), sets, 0.95); tail < 1e-8 {
			t.Errorf("input %d: its interval holds the coefficient in %d of %d sets", j, held[j], sets)
		}
	}
}

// TestPartialRanksByHand: of one input it is Spearman's coefficient, with the
// mean rank for equal values: ranks 1.5, 1.5, 3, 4, 5 against 2, 1, 4, 3, 5 have
// Pearson's coefficient 8.5/sqrt(9.5*10). Fisher's interval with 1.06/2.
func TestPartialRanksByHand(t *testing.T) {
	c := PartialRanks([][]float64{{1}, {1}, {2}, {5}, {9}}, []float64{0.2, 0.1, 0.5, 0.3, 0.6}, 0.95)[0]
	want := 8.5 / math.Sqrt(9.5*10)
	within(t, "coefficient", c.Estimate, want, 1e-12)
	half := 1.959963984540054 * math.Sqrt(1.06/2)
	within(t, "low", c.Low, math.Tanh(math.Atanh(want)-half), 1e-9)
	within(t, "high", c.High, math.Tanh(math.Atanh(want)+half), 1e-9)
}

// TestPartialRanksAtTheEnds: a risk that only falls with one of two inputs goes
// with it without exception, the other held.
func TestPartialRanksAtTheEnds(t *testing.T) {
	src := rand.New(rand.NewPCG(6, 1))
	x, _ := linear(src, 40, 0.5, []float64{1, 1}, 1)
	y := make([]float64, len(x))
	for i := range x {
		y[i] = math.Exp(-x[i][1])
	}
	if c := PartialRanks(x, y, 0.95); math.Abs(c[1].Estimate+1) > 1e-9 || !math.IsNaN(c[0].Estimate) {
		t.Errorf("%+v", c)
	}
	for i := range x {
		x[i] = x[i][1:]
	}
	if c := PartialRanks(x, y, 0.95); math.Abs(c[0].Estimate+1) > 1e-12 {
		t.Errorf("%+v", c)
	}
}

// TestPartialRanksUndefined: without enough draws, with a constant, or with an
// input that repeats another there is no coefficient, and no interval is claimed.
func TestPartialRanksUndefined(t *testing.T) {
	src := rand.New(rand.NewPCG(1, 1))
	x, y := linear(src, 30, 0, []float64{1, 1}, 1)
	twice, constant := make([][]float64, 30), make([][]float64, 30)
	for i := range x {
		twice[i], constant[i] = []float64{x[i][0], 2 * x[i][0]}, []float64{x[i][0], 7}
	}
	for name, c := range map[string]struct {
		x [][]float64
		y []float64
	}{"few": {x[:3], y[:3]}, "constant input": {constant, y}, "repeated": {twice, y}, "constant risk": {x, make([]float64, 30)}} {
		for _, one := range PartialRanks(c.x, c.y, 0.95) {
			if !math.IsNaN(one.Estimate) || one.Low != -1 || one.High != 1 {
				t.Errorf("%s: %+v", name, one)
			}
		}
	}
}
