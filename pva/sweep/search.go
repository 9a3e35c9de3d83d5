package sweep

import (
	"context"
	"math"
	"slices"
	"sort"

	"ebbline/pva"
)

// Crossing is where the risk along an axis crosses a limit: the largest take
// within it, or the smallest viable size.
type Crossing struct {
	Key   string
	Path  string
	Unit  string
	Whole bool
	// Rising says that the risk is expected to rise with the value, as with a
	// take; it falls with a size.
	Rising bool
	// From and To are the ends of what was looked at.
	From, To   float64
	Limit      float64
	Confidence float64
	Horizon    int

	// Found says that there is a value; otherwise Reason says why not.
	Found bool
	Value float64 // the last one, coming from the safe side, whose risk is estimated at most the limit
	// Safe is the last value, coming from the safe side, that is shown to be
	// within the limit, as are all values looked at before it; NaN if none is.
	// Other is the last that is not shown to be above; NaN if none is shown to
	// be, or all are. Between the two the verdict is undecided at the confidence.
	Safe, Other float64
	Risk        pva.Proportion // at Value
	Exact       *pva.ExactAnswer
	Verdict     pva.Verdict // at Value
	// Reason says why there is no value, or what is special about it.
	Reason string
	// Decided says that no value between is left undecided.
	Decided bool
	// Points are all values that were looked at, ascending.
	Points []*Point
	// Breaks are pairs of values between which the risk goes the wrong way
	// beyond chance. Where there are any the curve is not monotone, and Value is
	// the first crossing.
	Breaks     []Break
	Replicates int64 // the most that any value was given
	// SubstepShift is the most that sub-steps are estimated to shift the risk of
	// a value that was simulated; 0 without sub-steps.
	SubstepShift float64
}

// Low is the smaller of Safe and Other, High the larger; NaN where that one is not known.
func (c *Crossing) Low() float64 {
	if c.Rising {
		return c.Safe
	}
	return c.Other
}

// High is the larger end of the stretch in which the verdict is undecided.
func (c *Crossing) High() float64 {
	if c.Rising {
		return c.Other
	}
	return c.Safe
}

// At is the point of the answer; without one, the last that has a risk. There is
// always one that has.
func (c *Crossing) At() *Point {
	var last *Point
	for _, p := range c.Points {
		if c.Found && p.Value == c.Value {
			return p
		}
		if p.Unreachable == "" {
			last = p
		}
	}
	return last
}

// Settled says that no value looked at is left undecided: what is not shown to
// be within the limit is shown to be above, or all of them are within.
func (c *Crossing) Settled() bool {
	for _, p := range c.Points {
		if p.Verdict == pva.Undecided {
			return false
		}
	}
	return true
}

// Undecided is the stretch of values whose verdict is left open: Low and High,
// but for whole values without the end that is shown to be within the limit.
func (c *Crossing) Undecided() (low, high float64) {
	low, high = c.Low(), c.High()
	switch {
	case !c.Whole || low == high:
	case c.Rising:
		low++
	default:
		high--
	}
	return low, high
}

// Break is a step of a curve that goes the wrong way: the risk at Riskier, which
// should be the safer of the two, is above that at Safer by Difference.
type Break struct {
	Riskier, Safer float64
	Difference     pva.Difference
}

// SearchOptions bound a search.
type SearchOptions struct {
	NoExact bool
	// Most is the largest number of replicates of a value; 0 stands for 4 times
	// those of the case, which keeps a search cheaper than its grid.
	Most int64
}

// How finely a gap is cut at a time, and the finest step of a search over real
// numbers in parts of its range.
const (
	cuts   = 7
	finest = 1e-4
)

// cross searches an axis.
func (r *Runner) cross(ctx context.Context, a axis, opt SearchOptions) (*Crossing, error) {
	c := &curve{r: r, a: a, exact: !opt.NoExact}
	start := r.study.Base.Run.Replicates
	most := opt.Most
	if most == 0 {
		most = 4 * start
	}
	most = max(most, start)
	if err := c.look(ctx, a.scan, start); err != nil {
		return nil, err
	}
	level := start
	for {
		good, bad := c.bracket()
		if gaps := c.gaps(good, bad); len(gaps) > 0 {
			if err := c.look(ctx, gaps, start); err != nil {
				return nil, err
			}
			continue
		}
		open := c.undecided(good, bad)
		if len(open) == 0 || !a.whole && c.width(good, bad) <= c.step(good, bad) && c.width(good, bad) <= finest*(a.to-a.from) {
			break
		}
		var short []*Point
		for _, p := range open {
			if p.Exact == nil && p.n < level {
				short = append(short, p)
			}
		}
		if len(short) == 0 {
			if level >= most || !anySimulated(open) {
				break
			}
			level = min(2*level, most)
			continue
		}
		if err := c.simulate(ctx, short, level); err != nil {
			return nil, err
		}
	}
	return c.answer(ctx, level)
}

func anySimulated(points []*Point) bool {
	for _, p := range points {
		if p.Exact == nil {
			return true
		}
	}
	return false
}

// bracket is the last of the points that are within the limit with all before
// them (-1 if the first is not), and the first after it that is above
// (len(points) if none is).
func (c *curve) bracket() (good, bad int) {
	good = -1
	for good+1 < len(c.points) && c.points[good+1].Verdict == pva.Within {
		good++
	}
	for bad = good + 1; bad < len(c.points) && c.points[bad].Verdict != pva.AboveLimit; bad++ {
	}
	return good, bad
}

func (c *curve) undecided(good, bad int) []*Point {
	var out []*Point
	for i := good + 1; i < bad; i++ {
		if c.points[i].Verdict == pva.Undecided {
			out = append(out, c.points[i])
		}
	}
	return out
}

// width is the distance over which the verdict is not known.
func (c *curve) width(good, bad int) float64 {
	lo, hi := max(good, 0), min(bad, len(c.points)-1)
	return c.a.u(c.points[hi].Value) - c.a.u(c.points[lo].Value)
}

// step is how near two neighbours must be to need nothing between them. While a
// stretch is undecided its ends need not be known finer than a part of it.
func (c *curve) step(good, bad int) float64 {
	fine, part := finest*(c.a.to-c.a.from), 0.0
	if good+1 < bad {
		part = c.width(good, bad) / 6
	}
	if c.a.whole {
		return math.Max(1, math.Floor(part))
	}
	return math.Max(fine, part)
}

// gaps are the values to look at next: between the last that is shown within and
// its neighbour, and between the first that is shown above and its neighbour.
func (c *curve) gaps(good, bad int) []float64 {
	step := c.step(good, bad)
	out := c.cut(good, good+1, step)
	if bad != good+1 {
		out = append(out, c.cut(bad-1, bad, step)...)
	}
	return out
}

// cut is where to look between two neighbours that are further apart than a step.
func (c *curve) cut(i, j int, step float64) []float64 {
	if i < 0 || j >= len(c.points) {
		return nil
	}
	p, q := c.points[i], c.points[j]
	lo, hi := p.Value, q.Value
	if lo > hi {
		lo, hi = hi, lo
	}
	if hi-lo <= step*(1+1e-9) {
		return nil
	}
	var at []float64
	if p.Exact != nil && q.Exact != nil {
		// A risk known to many digits: on both sides of where a straight line of
		// its logarithm crosses, and half-way lest the line mislead.
		x := lo + float64((hi-lo)*c.share(p, q))
		around := math.Max(step/2, (hi-lo)/32)
		at = []float64{x - around, lo + float64((hi-lo)/2), x + around}
		if c.a.whole {
			at[0], at[2] = math.Floor(at[0]), math.Ceil(at[2])
		}
	} else {
		n := min(cuts, int(math.Ceil((hi-lo)/step-1e-9))-1)
		for k := 1; k <= n; k++ {
			at = append(at, lo+float64((hi-lo)*float64(k)/float64(n+1)))
		}
	}
	var out []float64
	for _, x := range at {
		if c.a.whole {
			x = math.Round(x)
		}
		if x > lo && x < hi && !slices.Contains(out, x) {
			out = append(out, x)
		}
	}
	return out
}

// share is how far from the smaller value of two points to the larger the limit
// lies on a straight line of the logarithm of the risk.
func (c *curve) share(p, q *Point) float64 {
	if p.Value > q.Value {
		p, q = q, p
	}
	const floor = 1e-12
	a, b := math.Log(math.Max(p.Risk.Estimate, floor)), math.Log(math.Max(q.Risk.Estimate, floor))
	if a == b {
		return 0.5
	}
	return math.Max(0, math.Min(1, (math.Log(c.a.limit)-a)/(b-a)))
}

// answer states what was found.
func (c *curve) answer(ctx context.Context, level int64) (*Crossing, error) {
	a := c.a
	out := &Crossing{Key: a.key, Path: a.path, Unit: a.unit, Whole: a.whole, Rising: a.rising, From: a.from, To: a.to, Limit: a.limit, Confidence: a.confidence,
		Horizon: a.horizon, Safe: math.NaN(), Other: math.NaN(), Value: math.NaN()}
	x, found := c.estimated(false)
	bounds := func() {
		good, bad := c.bracket()
		out.Safe, out.Other = math.NaN(), math.NaN()
		if good >= 0 {
			out.Safe = c.points[good].Value
		}
		if bad > 0 && bad < len(c.points) {
			out.Other = c.points[bad].Value
			if a.whole {
				out.Other += a.u(-1)
			}
		}
		out.Decided = bad == good+1
	}
	bounds()
	for tries := 0; found && c.at(x) == nil; tries++ {
		if err := c.look(ctx, []float64{x}, level); err != nil {
			return nil, err
		}
		// A value looked at for the first time may move a whole answer. One on
		// a continuous line lies at the limit by its making and says nothing.
		if !a.whole {
			break
		}
		// Where the risk rises steeply a straight line creeps: then the gap is
		// halved, which ends.
		x, found = c.estimated(tries >= 3)
		bounds()
	}
	out.Found = found
	if found {
		p := c.at(x)
		out.Value, out.Risk, out.Exact, out.Verdict = x, p.Risk, p.Exact, p.Verdict
	}
	out.Breaks, out.SubstepShift = c.breaks(), c.shift()
	for _, p := range c.points {
		out.Points = append(out.Points, p)
		out.Replicates = max(out.Replicates, p.n)
	}
	sort.Slice(out.Points, func(i, j int) bool { return out.Points[i].Value < out.Points[j].Value })
	return out, nil
}

// safer is the whole number next to x, or x itself, on the safe side.
func (c *curve) safer(x float64) float64 {
	if c.a.rising {
		return math.Floor(x)
	}
	return math.Ceil(x)
}

// estimated is the last value, from the safe side, before the risk is first
// estimated above the limit: between two points by a straight line, or half-way
// where that is asked for or one of them has no risk.
func (c *curve) estimated(halve bool) (x float64, found bool) {
	for i, p := range c.points {
		if p.Risk.Estimate <= c.a.limit {
			continue
		}
		if i == 0 {
			return 0, false
		}
		q := c.points[i-1]
		share := (c.a.limit - q.Risk.Estimate) / (p.Risk.Estimate - q.Risk.Estimate)
		if halve || p.Unreachable != "" {
			share = 0.5
		}
		x = q.Value + float64((p.Value-q.Value)*share)
		if c.a.whole {
			if x = c.safer(x); x == q.Value { // whole numbers between may be within the limit too
				x = c.safer((q.Value + p.Value) / 2)
			}
		}
		return x, true
	}
	return c.points[len(c.points)-1].Value, true
}

// breaks finds where the risk goes the wrong way beyond chance: each point is
// held against the riskiest before it, at a level that allows for so many tests.
func (c *curve) breaks() []Break {
	level := 1 - (1-c.a.confidence)/float64(max(1, len(c.points)-1))
	var out []Break
	var riskiest *Point
	for _, p := range c.points {
		if p.Unreachable != "" {
			continue // no risk to hold against others
		}
		if riskiest == nil || p.Risk.Estimate >= riskiest.Risk.Estimate {
			riskiest = p
			continue
		}
		var d pva.Difference
		if p.n > 0 && riskiest.n > 0 {
			d = difference(riskiest, p, level)
		} else {
			d = pva.Difference{Estimate: riskiest.Risk.Estimate - p.Risk.Estimate, Low: riskiest.Risk.Low - p.Risk.High, High: riskiest.Risk.High - p.Risk.Low}
		}
		if d.Low > 0 {
			out = append(out, Break{Riskier: riskiest.Value, Safer: p.Value, Difference: d})
		}
	}
	return out
}
