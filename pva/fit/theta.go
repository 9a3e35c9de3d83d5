package fit

import "math"

// The exponents among which the theta-logistic curve is sought. Below the
// least it is the Gompertz line; beyond the largest it is flat up to a wall.
const (
	leastTheta = 0.01
	mostTheta  = 300
)

// fitTheta fits R = r (1 - (N/K)^theta) by least squares. For a given theta it
// is a straight line in N^theta, so one search over theta, begun at each point
// of a grid where the sum of squares dips, finds every optimum. The fit counts
// as found only if its best point lies inside the range, with r and K above 0,
// and both ends of the range are worse: such fits to census data are often
// flat ridges (L. Polansky et al. 2009, Ecology 90:2313-2320).
func fitTheta(s steps) Model {
	m := blankModel(ThetaModel, s, 4)
	n := len(s.r)
	if n < 5 {
		m.Refused = "too few steps"
		return m
	}
	theta, rss, found := bestTheta(s, leastTheta, mostTheta, 240)
	if !found {
		m.Refused = "does not converge: the sum of squares has no lowest point at an exponent between 0.01 and 300 with growth and K above 0"
		return m
	}
	m.Theta, m.RSS = theta, rss
	l, top := thetaLine(s, theta)
	k := top * math.Pow(-l.a/l.b, 1/theta)
	m.Growth.Value, m.Capacity.Value = l.a, k
	m.ResidualSD = math.Sqrt(rss / float64(n-3))
	m.Autocorrelation = autocorrelation(l.residual, 0)
	// With K and theta held, growth is a line through the origin in 1-(N/K)^theta.
	xx := 0.0
	for _, v := range s.n {
		x := 1 - math.Pow(v/k, theta)
		xx += x * x
	}
	m.Growth.SE = m.ResidualSD / math.Sqrt(xx)
	m.steepness = m.Growth.SE / l.a
	press := 0.0
	for i := range s.r {
		rest := steps{append(append([]float64{}, s.n[:i]...), s.n[i+1:]...), append(append([]float64{}, s.r[:i]...), s.r[i+1:]...)}
		near := theta
		if t, _, ok := bestTheta(rest, math.Max(theta/4, leastTheta), math.Min(theta*4, mostTheta), 8); ok {
			near = t
		}
		line, top := thetaLine(rest, near)
		if line.b >= 0 {
			m.Turned++
		}
		e := s.r[i] - line.a - line.b*math.Pow(s.n[i]/top, near)
		press += e * e
	}
	m.LeftOut = math.Sqrt(press / float64(n))
	return m
}

// thetaLine is the line of R in (N/top)^theta, top the largest N.
func thetaLine(s steps, theta float64) (line, float64) {
	top := 0.0
	for _, v := range s.n {
		top = math.Max(top, v)
	}
	x := make([]float64, len(s.n))
	for i, v := range s.n {
		x[i] = math.Pow(v/top, theta)
	}
	return straight(x, s.r), top
}

// bestTheta searches the exponent between two bounds.
func bestTheta(s steps, least, most float64, points int) (theta, rss float64, found bool) {
	of := func(lnTheta float64) float64 {
		l, _ := thetaLine(s, math.Exp(lnTheta))
		if !(l.b < 0 && l.a > 0) {
			return math.Inf(1)
		}
		return l.rss
	}
	grid := make([]float64, points+1)
	for i := range grid {
		grid[i] = math.Log(least) + (math.Log(most)-math.Log(least))*float64(i)/float64(points)
	}
	x, rss, _ := lowest(of, grid)
	edge := math.Min(of(grid[0]), of(grid[points]))
	return math.Exp(x), rss, !math.IsInf(rss, 1) && rss < edge*(1-1e-9)
}
