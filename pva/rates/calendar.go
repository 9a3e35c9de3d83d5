package rates

import (
	"ebbline/pva"
	"ebbline/rng/portable"
)

// calendar is the factor on a rate in each model year: the product of trend,
// steps, cycle and the factors by year.
func calendar(c *pva.Case, k pva.Calendar) []float64 {
	out := make([]float64, c.Question.Horizon)
	trend := 1.0
	for i := range out {
		y := i + 1
		f := trend
		trend = min(trend*(1+k.Trend), beyond)
		step := 1.0
		for _, s := range k.Steps { // in order of date: the last one begun is in force
			if c.Label(y) >= s.From {
				step = s.Factor
			}
		}
		f *= step
		if k.Cycle.Amplitude != 0 {
			f *= 1 + float64(k.Cycle.Amplitude*portable.SinTurns((float64(y)-k.Cycle.Phase)/k.Cycle.Period))
		}
		if n := len(k.ByYear); n > 0 {
			f *= k.ByYear[min(i, n-1)]
		}
		out[i] = f
	}
	return out
}
