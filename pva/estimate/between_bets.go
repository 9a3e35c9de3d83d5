package estimate

import (
	"fmt"
	"math"
	"sort"
)

// weighted is a value in [0, 1] that several draws have.
type weighted struct {
	value float64
	draws float64
}

// together gathers equal values in ascending order.
func together(values []float64) []weighted {
	sorted := append([]float64(nil), values...)
	sort.Float64s(sorted)
	var out []weighted
	for _, v := range sorted {
		if !(v >= 0 && v <= 1) {
			panic(fmt.Sprintf("estimate: %v is no risk of a draw", v))
		}
		if n := len(out); n > 0 && out[n-1].value == v {
			out[n-1].draws++
			continue
		}
		out = append(out, weighted{v, 1})
	}
	return out
}

// betweenBets is the interval of the mean of values in [0, 1], one a draw, by
// betting against every mean that it could be (I. Waudby-Smith & A. Ramdas 2024,
// J. R. Stat. Soc. B 86:1-27). Against a mean m one stakes the share c of a
// capital of 1 on each draw's value x lying below it: the capital becomes the
// product of 1 + c (m - x)/(1 - m), which is 1 in the mean if the mean is m, and
// less if it is larger, so that it reaches 2/(1 - confidence) with a chance of at
// most half of 1 - confidence (A. A. Markov's inequality). Means against which it
// does lie above the interval; likewise below it.
//
// Their stakes follow the values seen before; here they are laid down beforehand
// and the capitals of several added up, so that the order of the draws does not
// matter: half of the capital at the stake 1, which is the best against values
// that hardly vary, a quarter at 1/2, an eighth at 1/4 and so on. The capital
// rises with m, so that the means left over are an interval.
//
// What it guarantees: for draws that are independent, whatever the law of their
// values, the interval holds the mean in at least the share confidence of cases,
// with any number of draws, and misses it to either side in at most half of the
// rest. Draws of a Latin hypercube are negatively associated (K. Joag-Dev & F.
// Proschan 1983, Ann. Statist. 11:286-295), so that it is as safe for them where
// the risk goes one way with each input; of draws with rank correlations that is
// not proven. Values that are shares of replicates
// have the mean of the risks behind them, so that it holds for them too.
//
// The price: with n draws of next to no risk the upper end is at about 4.4/n for
// 95 %, as some draws that were not made may have all the risk there is; and
// with many draws it is 1.4 to 1.9 times as wide as Student's interval.
func betweenBets(values []weighted, confidence float64) (low, high float64) {
	twoSided(confidence)
	mirrored := make([]weighted, len(values))
	for i, v := range values {
		mirrored[len(values)-1-i] = weighted{1 - v.value, v.draws}
	}
	return 1 - upperByBets(mirrored, confidence), upperByBets(values, confidence)
}

// stakes are the stakes against means too high, with their weights, for so many
// draws: halves down to a sixteenth of the best one against values of a standard
// deviation of 1, sqrt(2 ln(1/tail)/n): smaller ones win nothing.
func stakes(draws, tail float64) (c, weight []float64) {
	least := math.Min(0.5, math.Sqrt(2*math.Log(1/tail)/draws)) / 16
	c = []float64{1}
	for s := 0.5; s > least; s /= 2 {
		c = append(c, s)
	}
	weight = append([]float64(nil), c...)
	for i := range weight {
		weight[i] /= 2
	}
	weight[len(c)-1] *= 2
	return c, weight
}

// upperByBets is the upper end: the least mean at or above that of the values
// against which the capital reaches 2/(1 - confidence).
func upperByBets(values []weighted, confidence float64) float64 {
	tail := (1 - confidence) / 2
	n, sum := 0.0, 0.0
	for _, v := range values {
		n += v.draws
		sum += v.value * v.draws
	}
	if n == 0 {
		return 1
	}
	c, weight := stakes(n, tail)
	logs := make([]float64, len(c))
	// gain is the logarithm of the capital over what it must reach.
	gain := func(m float64) float64 {
		most := math.Inf(-1)
		for k := range c {
			logs[k] = math.Log(weight[k])
			for _, v := range values {
				logs[k] += v.draws * math.Log1p(c[k]*(m-v.value)/(1-m))
			}
			most = math.Max(most, logs[k])
		}
		total := 0.0
		for _, l := range logs {
			total += math.Exp(l - most)
		}
		return most + math.Log(total) + math.Log(tail)
	}
	lo, hi := math.Min(sum/n, 1), 1.0
	below, above := gain(lo), math.Inf(1)
	if !(below < 0) { // all values at 1, or rounding
		return lo
	}
	// Halving until a capital is known above, then false position in its Illinois
	// form (M. Dowell & P. Jarratt 1971, BIT 11:168-174). The end on the far side
	// is returned, so that rounding only widens.
	side := 0
	for i := 0; i < 200 && hi-lo > 1e-13*hi; i++ {
		m := (lo*above - hi*below) / (above - below)
		if i%3 == 0 || !(m > lo && m < hi) {
			m = (lo + hi) / 2
		}
		switch g := gain(m); {
		case g < 0:
			lo, below = m, g
			if side < 0 {
				above /= 2
			}
			side = -1
		default:
			hi, above = m, g
			if side > 0 {
				below /= 2
			}
			side = 1
		}
	}
	return hi
}
