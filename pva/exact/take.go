package exact

import (
	"math"
	"sort"

	"ebbline/pva/rates"
)

// takeLaw is the law of N after one harvest rule in model year y: what is
// seen, the target, its error, the rounding, the shortfall and the extra
// deaths, in the order of the model. Where a survey error and an error of the
// take come together, one of the two is integrated with as many points as order.
func takeLaw(t *rates.Take, y, order int) law {
	h := &t.Rule
	leave := math.Ceil(h.Leave)
	pieces := seenPieces(t, y)
	points := normalNodes(order)
	return func(n int, buf []float64) (int, []float64) {
		most := float64(n) - leave
		if most <= 0 || (h.SurveyCV == 0 && float64(n) < h.StopBelow) {
			return n, append(buf[:0], 1)
		}
		intended := make([]float64, int(most)+1)
		if h.TakeNoise == "each-animal" {
			eachAnimal(t, intended, n)
		} else if h.SurveyCV == 0 {
			addIntended(t, intended, t.Target(y, float64(n)))
		} else {
			surveyed(t, intended, n, pieces, points, order)
		}
		return left(n, intended, h.ExtraDeaths, buf)
	}
}

// left is the law of what remains of n once the made take has the law taken
// and each animal taken costs extra further deaths on average.
func left(n int, taken []float64, extra float64, buf []float64) (int, []float64) {
	after := lengthen(buf[:0], n+1)
	for k, p := range taken {
		if p == 0 {
			continue
		}
		rest := n - k
		more := extra * float64(k)
		whole := math.Floor(more)
		part := more - whole
		after[rest-min(rest, int(math.Min(whole, float64(rest))))] += p * (1 - part)
		if part > 0 {
			after[rest-min(rest, int(math.Min(whole+1, float64(rest))))] += p * part
		}
	}
	return trim(0, after)
}

// trim cuts zeros off both ends of a run.
func trim(lo int, row []float64) (int, []float64) {
	for len(row) > 1 && row[len(row)-1] == 0 {
		row = row[:len(row)-1]
	}
	for len(row) > 1 && row[0] == 0 {
		lo, row = lo+1, row[1:]
	}
	return lo, row
}

// addIntended adds the law of the intended take around a known target.
func addIntended(t *rates.Take, law []float64, target float64) {
	switch {
	case t.Rule.TakeCV > 0 && target > 0:
		factor{t.Error.Sigma}.addRounded(law, 1, 0, target, 0, math.Inf(1))
	case t.Rule.TakeNoise == "poisson":
		addPoisson(law, 1, target)
	default:
		addWhole(law, 1, target)
	}
}

func addPoisson(law []float64, weight, mean float64) {
	last := len(law) - 1
	if mean-12*math.Sqrt(mean)-60 > float64(last) {
		law[last] += weight
		return
	}
	lo, row := poisson(nil, mean)
	for i, p := range row {
		law[min(lo+i, last)] += weight * p
	}
}

// eachAnimal takes every animal with the same chance, while the rule is open.
func eachAnimal(t *rates.Take, law []float64, n int) {
	open := 1.0
	if t.Rule.SurveyCV > 0 {
		closed, _ := factor{t.Survey.Sigma}.below(t.Rule.StopBelow / float64(n))
		open = 1 - closed
	}
	law[0] += 1 - open
	last := len(law) - 1
	lo, row := binomial(nil, n, math.Min(1, t.Rule.Fraction.Value*t.Rule.Share))
	for i, p := range row {
		law[min(lo+i, last)] += open * p
	}
}

// piece is a stretch of the seen population on which the target is a + b seen.
type piece struct{ from, to, a, b float64 }

// seenPieces cuts the line of the seen population, from stop_below on, where
// the target bends. The target itself comes from package rates.
func seenPieces(t *rates.Take, y int) []piece {
	h := &t.Rule
	if h.SurveyCV == 0 {
		return nil
	}
	bends := []float64{h.Spare.Value}
	for _, p := range h.Points {
		bends = append(bends, p[0])
	}
	sort.Float64s(bends)
	from := h.StopBelow
	var out []piece
	add := func(to float64) {
		x0, x1 := from, to
		if math.IsInf(to, 1) {
			x1 = 2*from + 1
		}
		// Two points inside, so that a jump at an end does not matter.
		u, v := x0+(x1-x0)*0.25, x0+(x1-x0)*0.75
		tu, tv := t.Target(y, u), t.Target(y, v)
		b := (tv - tu) / (v - u)
		if math.Abs(b)*x1 <= 1e-13*math.Abs(tu) {
			b = 0
		}
		out = append(out, piece{from, to, tu - b*u, b})
		from = to
	}
	for _, x := range bends {
		if x > from {
			add(x)
		}
	}
	add(math.Inf(1))
	return out
}

// surveyed adds the law of the intended take where the population is seen with
// the error of a survey: closed below stop_below, else piece by piece.
func surveyed(t *rates.Take, law []float64, n int, pieces []piece, points nodes, order int) {
	seen := factor{t.Survey.Sigma}
	size := float64(n)
	closed, _ := seen.below(t.Rule.StopBelow / size)
	law[0] += closed
	for _, p := range pieces {
		from, to, b := p.from/size, p.to/size, p.b*size
		switch {
		case t.Rule.TakeCV == 0 && t.Rule.TakeNoise != "poisson":
			seen.addRounded(law, 1, p.a, b, from, to)
		case b == 0:
			low, _ := seen.below(from)
			high, _ := seen.below(to)
			if high > low {
				part := make([]float64, len(law))
				addIntended(t, part, p.a)
				for k, v := range part {
					law[k] += (high - low) * v
				}
			}
		case t.Rule.TakeCV > 0:
			for i, g := range points.at {
				c := t.Error.Factor(g)
				seen.addRounded(law, points.weight[i], c*p.a, c*b, from, to)
			}
		default:
			least, most := seen.reach()
			x0, x1 := math.Max(from, least), math.Min(to, most)
			if !(x0 < x1) {
				continue
			}
			s := seen.s
			r := straightNodes(order, math.Log(x0)/s+s/2, math.Log(x1)/s+s/2)
			for i, g := range r.at {
				w := r.weight[i] * math.Exp(-g*g/2) / math.Sqrt(2*math.Pi)
				addPoisson(law, w, math.Max(0, p.a+b*math.Exp(s*g-s*s/2)))
			}
		}
	}
}
