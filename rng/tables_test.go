package rng

import (
	"fmt"
	"math"
	"math/big"
	"testing"
)

// aliasProbs reads the probabilities of all outcomes back from a table, exactly,
// in units of 2^-64.
func aliasProbs(entry []uint64, b uint) []*big.Int {
	out := make([]*big.Int, len(entry))
	for i := range out {
		out[i] = new(big.Int)
	}
	share := uint64(1) << (64 - b)
	for i, e := range entry {
		own := e >> b
		out[i].Add(out[i], new(big.Int).SetUint64(own))
		j := e & (1<<b - 1)
		out[j].Add(out[j], new(big.Int).SetUint64(share-own))
	}
	return out
}

// holdTable compares a table with exact probabilities at 200 bits.
func holdTable(t *testing.T, name string, entry []uint64, b uint, want func(k int) *big.Float) {
	t.Helper()
	off := 0.0
	unit := new(big.Float).SetMantExp(big.NewFloat(1), -64)
	for k, n := range aliasProbs(entry, b) {
		p := new(big.Float).SetPrec(200).SetInt(n)
		p.Mul(p, unit)
		d, _ := p.Sub(p, want(k)).Float64()
		off += math.Abs(d)
	}
	// 256 cells, each rounded to 2^-64 and by 2^-62 of itself, and the tail
	if off/2 > 0x1p-56 {
		t.Errorf("%s is off by %v in total variation, want at most 2^-56", name, off/2)
	}
}

func TestHalfTables(t *testing.T) {
	for j := 1; j < len(halfTables); j++ {
		n := int64(64 * j)
		holdTable(t, fmt.Sprintf("Binomial(%d, 1/2)", n), halfTables[j][:], 8, func(cell int) *big.Float {
			k := int64(cell) + halfFrom[j]
			if k > n {
				return new(big.Float)
			}
			c := new(big.Float).SetPrec(600).SetInt(new(big.Int).Binomial(n, k))
			return c.SetMantExp(c, -int(n))
		})
	}
}

func TestPoissonTables(t *testing.T) {
	at := func(num, den int64) func(k int) *big.Float {
		m := new(big.Float).SetPrec(400).Quo(big.NewFloat(float64(num)), big.NewFloat(float64(den)))
		sum, term := new(big.Float).SetPrec(400).SetInt64(1), new(big.Float).SetPrec(400).SetInt64(1)
		var terms []*big.Float
		for k := int64(1); k < 900; k++ { // exp(m) by its series: all terms positive
			terms = append(terms, new(big.Float).Set(term))
			term.Mul(term, m)
			term.Quo(term, new(big.Float).SetInt64(k))
			sum.Add(sum, term)
		}
		return func(k int) *big.Float { return new(big.Float).SetPrec(400).Quo(terms[k], sum) }
	}
	for _, j := range []int64{1, 2, 9, 15, 16} {
		holdTable(t, "Poisson(8j)", poissonCoarse[j][:], 8, at(8*j, 1))
	}
	for _, i := range []int64{1, 2, 15, 16, 17, 64, 126, 127} {
		holdTable(t, "Poisson(i/16)", poissonFine[i][:], 6, at(i, 16))
	}
}

// A word chooses as the entry says: both sides of the threshold of a cell.
func TestAliasDraw(t *testing.T) {
	for _, i := range []uint64{0, 100, 128, 255} {
		e := halfTables[4][i]
		threshold, other := e>>8, int64(e&255)
		if got := halfTables[4].draw(threshold<<8 | i); got != other {
			t.Errorf("cell %d at its threshold gives %d, want the alias %d", i, got, other)
		}
		if threshold > 0 {
			if got := halfTables[4].draw((threshold-1)<<8 | i); got != int64(i) {
				t.Errorf("cell %d below its threshold gives %d", i, got)
			}
		}
	}
}

// stirlingTail and deviance against package math's Lgamma and plain sums, where
// those have digits to show.
func TestStirlingAndDeviance(t *testing.T) {
	for k := 1.0; k < 200; k++ {
		l, _ := math.Lgamma(k + 1)
		want := l - 0.5*math.Log(2*math.Pi*k) - k*math.Log(k) + k
		if got := stirlingTail(k); math.Abs(got-want) > 1e-15*math.Max(4, 2*l) {
			t.Errorf("stirlingTail(%v) = %v, want %v", k, got, want)
		}
	}
	// exact: ln 1! = 0, ln 2! = ln 2
	if got, want := stirlingTail(1), 1-0.5*math.Log(2*math.Pi); math.Abs(got-want) > 3e-16 {
		t.Errorf("stirlingTail(1) = %v, want %v", got, want)
	}
	for _, m := range []float64{10.3, 150, 4096.7, 1e9} {
		for _, r := range []float64{-0.9, -0.5, -0.19, -0.1, -0.06, -0.01, -1e-4, 0, 1e-5, 0.01, 0.0653, 0.2, 0.23, 0.7, 5} {
			x := math.Max(1, math.Round(m*(1+r)))
			got := deviance(x, m, x-m)
			want, _ := exactDeviance(x, m).Float64()
			// four roundings of the terms x ln(x/m) and x-m, or of the sum
			if math.Abs(got-want) > 0x1p-51*(math.Abs(want)+math.Abs(x*math.Log(x/m))*far(x, m)) {
				t.Errorf("deviance(%v, %v) = %v, want %v", x, m, got, want)
			}
		}
	}
}

// far is 1 where deviance subtracts its terms, 0 where it sums a series.
func far(x, m float64) float64 {
	if math.Abs(x-m) >= 0.1*(x+m) {
		return 1
	}
	return 0
}

// exactDeviance sums x ln(x/m) + m - x at 300 bits, ln by 2 atanh.
func exactDeviance(x, m float64) *big.Float {
	f := func(v float64) *big.Float { return new(big.Float).SetPrec(300).SetFloat64(v) }
	bx, bm := f(x), f(m)
	z := new(big.Float).Quo(new(big.Float).Sub(bx, bm), new(big.Float).Add(bx, bm))
	z2 := new(big.Float).Mul(z, z)
	sum := f(0)
	for n := 801; n >= 1; n -= 2 {
		sum.Mul(sum, z2)
		sum.Add(sum, new(big.Float).Quo(f(1), f(float64(n))))
	}
	sum.Mul(sum, z)
	sum.Mul(sum, f(2))
	sum.Mul(sum, bx)
	sum.Add(sum, bm)
	return sum.Sub(sum, bx)
}
