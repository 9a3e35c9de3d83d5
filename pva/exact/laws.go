package exact

import "math"

// The laws below fill a buffer with a run of probabilities and give the first
// value of the run. Each starts at the mode and follows the ratio of
// neighbours outwards until a term is below cut, then divides by the sum: the
// ratios carry no error of a logarithm, and what is cut off is below 1e-17.
const cut = 1e-20

// binomial is the law of Binomial(n, p).
func binomial(buf []float64, n int, p float64) (lo int, row []float64) {
	switch {
	case n <= 0 || !(p > 0):
		return 0, append(buf[:0], 1)
	case p >= 1:
		return n, append(buf[:0], 1)
	}
	odds := p / (1 - p)
	mode := min(int(float64(n+1)*p), n)
	return spread(buf, mode, 0, n,
		func(k int) float64 { return float64(n-k) / float64(k+1) * odds })
}

// poisson is the law of Poisson(mean).
func poisson(buf []float64, mean float64) (lo int, row []float64) {
	if !(mean > 0) {
		return 0, append(buf[:0], 1)
	}
	return spread(buf, int(mean), 0, math.MaxInt,
		func(k int) float64 { return mean / float64(k+1) })
}

// negBinomial is the negative binomial law with a mean and a size (variance
// mean + mean^2/size).
func negBinomial(buf []float64, mean, size float64) (lo int, row []float64) {
	if !(mean > 0) {
		return 0, append(buf[:0], 1)
	}
	q := mean / (mean + size)
	mode := 0
	if size > 1 {
		mode = int((size - 1) * mean / size)
	}
	return spread(buf, mode, 0, math.MaxInt,
		func(k int) float64 { return (float64(k) + size) / float64(k+1) * q })
}

// spread runs outwards from the mode; ratio(k) is P(k+1)/P(k), which falls with k.
func spread(buf []float64, mode, least, most int, ratio func(int) float64) (lo int, row []float64) {
	buf = buf[:0]
	t := 1.0
	lo = mode
	for lo > least && t > cut {
		t /= ratio(lo - 1)
		lo--
		buf = append(buf, t)
	}
	for i, j := 0, len(buf)-1; i < j; i, j = i+1, j-1 {
		buf[i], buf[j] = buf[j], buf[i]
	}
	buf = append(buf, 1)
	t = 1
	for k := mode; k < most && t > 0; k++ {
		r := ratio(k)
		t *= r
		// The ratio falls, so what is left is below a geometric sum.
		if r < 1 && t < cut*(1-r) {
			break
		}
		buf = append(buf, t)
	}
	sum := 0.0
	for _, v := range buf {
		sum += v
	}
	inv := 1 / sum
	for i := range buf {
		buf[i] *= inv
	}
	return lo, buf
}

// normalBelow is the standard normal distribution function.
func normalBelow(z float64) float64 { return math.Erfc(-z/math.Sqrt2) / 2 }

// factor is a log-normal factor of mean 1: exp(s g - s^2/2), g standard normal.
type factor struct{ s float64 }

// below gives P(X <= x) and E[X; X <= x].
func (f factor) below(x float64) (p, mean float64) {
	if x <= 0 {
		return 0, 0
	}
	if math.IsInf(x, 1) {
		return 1, 1
	}
	z := math.Log(x)/f.s + f.s/2
	return normalBelow(z), normalBelow(z - f.s)
}

// reach is the span outside which X lies with a chance below 1e-17.
func (f factor) reach() (from, to float64) {
	return math.Exp(-8.6*f.s - f.s*f.s/2), math.Exp(8.6*f.s - f.s*f.s/2)
}

// addRounded adds to law, from 0 to its last entry, the chances of a + b X
// rounded at random to a neighbouring whole number so that the mean is kept,
// on the part of the line where X lies between from and to. All that would be
// above the last entry is added to it; what is below 0 counts as 0. The chance of
// k is the mean of the hat function at k, a difference of partial
// expectations of the log-normal law (Aitchison & Brown 1957).
func (f factor) addRounded(law []float64, weight, a, b, from, to float64) {
	lo, hi := f.reach()
	from, to = math.Max(from, lo), math.Min(to, hi)
	if !(from < to) {
		return
	}
	p0, m0 := f.below(from)
	p1, m1 := f.below(to)
	if b == 0 {
		addWhole(law, weight*(p1-p0), a)
		return
	}
	last := float64(len(law) - 1)
	// Walk the whole numbers between the values at both ends.
	x0, x1 := a+b*from, a+b*to
	if b < 0 {
		x0, x1 = x1, x0
		p0, m0, p1, m1 = p1, m1, p0, m0
	}
	if x0 >= last {
		law[len(law)-1] += weight * math.Abs(p1-p0)
		return
	}
	sign := 1.0
	if b < 0 {
		sign = -1
	}
	x, p, m := x0, p0, m0
	for k := math.Floor(x0); x < x1; k++ {
		next, pn, mn := k+1, 0.0, 0.0
		if next >= x1 {
			next, pn, mn = x1, p1, m1
		} else {
			pn, mn = f.below((next - a) / b)
		}
		// On k to k+1 the value v goes up with chance v - k.
		dp := sign * weight * (pn - p)
		dm := sign * weight * (a*(pn-p) + b*(mn-m)) // mean of the value there
		up := math.Min(math.Max(dm-k*dp, 0), dp)
		addAt(law, k, dp-up)
		addAt(law, k+1, up)
		x, p, m = next, pn, mn
		if k+1 > last && next < x1 {
			law[len(law)-1] += sign * weight * (p1 - pn)
			return
		}
	}
}

func addAt(law []float64, k, w float64) {
	i := int(math.Max(0, math.Min(k, float64(len(law)-1))))
	law[i] += w
}

// addWhole adds a value rounded at random to a neighbouring whole number.
func addWhole(law []float64, weight, v float64) {
	k := math.Floor(v)
	addAt(law, k, weight*(1-(v-k)))
	if v > k {
		addAt(law, k+1, weight*(v-k))
	}
}
