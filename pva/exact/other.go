package exact

import (
	"math"

	"ebbline/pva"
	"ebbline/pva/rates"
)

// stockLaw is the law of N after one stocking rule.
func stockLaw(s *pva.Stocking) law {
	return func(n int, buf []float64) (int, []float64) {
		if s.OnlyBelow.Set && float64(n) >= s.OnlyBelow.Value {
			return n, append(buf[:0], 1)
		}
		if s.Noise == "poisson" {
			lo, row := poisson(buf, s.Add)
			return n + lo, row
		}
		whole := math.Floor(s.Add)
		row := append(buf[:0], 1-(s.Add-whole))
		if s.Add > whole {
			row = append(row, s.Add-whole)
		}
		return n + int(whole), row
	}
}

// killLaw is the law of N after a catastrophe that struck: each animal is
// killed on its own, with the same chance for all, drawn once.
func killLaw(kills rates.Fraction, order int) law {
	points := one
	if kills.V != 0 {
		points = normalNodes(order)
	}
	laws := make([]law, len(points.at))
	for i, e := range points.at {
		spared := 1 - kills.Draw(e)
		laws[i] = func(n int, buf []float64) (int, []float64) { return binomial(buf, n, spared) }
	}
	return mixture(points.weight, laws)
}

// cutLaw is the ceiling.
func cutLaw(most int) law {
	return func(n int, buf []float64) (int, []float64) { return min(n, most), append(buf[:0], 1) }
}

// startLaw is the law of the first population on 0 to top, and the mass beyond:
// the abundance, or a log-normal law around it, rounded at random.
func startLaw(c *pva.Case, top int) (p []float64, beyond float64) {
	p = make([]float64, top+2)
	if c.Start.CV == 0 || c.Start.Abundance == 0 {
		addWhole(p, 1, c.Start.Abundance)
	} else {
		f := factor{rates.NewLogNormal(1, c.Start.CV).Sigma}
		f.addRounded(p, 1, 0, c.Start.Abundance, 0, math.Inf(1))
	}
	return p[:top+1], p[top+1]
}
