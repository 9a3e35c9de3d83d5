package sweep

import (
	"context"
	"errors"
	"fmt"
	"math"

	"ebbline/pva"
	"ebbline/pva/rates"
)

// Sizes is the question of the minimum viable size as understood.
type Sizes struct {
	Vary     string // start, capacity, both
	Risk     float64
	Horizon  int
	From, To float64
	// Capacity is what a size stands for in the case as stated: the carrying
	// capacity, the resting place of the mean path if only a scale is given, or
	// the ceiling; 0 where only the start is varied.
	Capacity float64

	crowded bool // crowding holds the population, not a ceiling alone
	solved  bool // only scales are stated: those of a size are solved for
}

// NewMinimum is the question of a case's [minimum] table. It fills in what the
// table leaves open: the permit's limit, the question's horizon, sizes from just
// above the threshold to 100 times the start, but starts no further than three times
// what the population can hold, and none above a ceiling.
func NewMinimum(c *pva.Case) (*Study, *Sizes, error) {
	q := &Sizes{Vary: c.Minimum.Vary, Horizon: int(c.Minimum.Horizon.Or(float64(c.Question.Horizon)))}
	switch {
	case c.Minimum.Risk.Set:
		q.Risk = c.Minimum.Risk.Value
	case c.Question.Limit.Set:
		q.Risk = c.Question.Limit.Value
	default:
		return nil, nil, errors.New("minimum.risk is missing: give the largest risk that counts as viable (or question.limit)")
	}
	s := &Study{Kind: Minimum}
	if err := s.start(c); err != nil {
		return nil, nil, err
	}
	if q.Vary != "start" {
		k, err := capacityOf(s.base)
		if err != nil {
			return nil, nil, err
		}
		q.Capacity = k
		births, deaths := c.Births.Crowding, c.Deaths.Crowding
		q.crowded = births.Form != "none" || deaths.Form != "none"
		q.solved = q.crowded && !births.Capacity.Set && !deaths.Capacity.Set
	}
	if q.Vary == "both" && c.Start.Abundance <= 0 {
		return nil, nil, errors.New("minimum.vary: \"both\" scales the capacity with the start, which is 0 in the case; give a start.abundance above 0")
	}
	stands := c.Start.Abundance
	if q.Vary == "capacity" {
		stands = q.Capacity
	}
	q.From = math.Ceil(c.Minimum.From.Or(math.Floor(c.Question.Threshold) + 1))
	most := math.Max(1000, 100*stands)
	if q.Vary == "start" {
		// A start far above what the population can hold says nothing of size.
		if k := resting(s.base); k > 0 {
			most = math.Min(most, 3*math.Max(k, stands))
		}
		if c.Ceiling.Set {
			most = math.Min(most, math.Max(c.Ceiling.Value, stands))
		}
	}
	q.To = math.Floor(c.Minimum.To.Or(most))
	q.From = math.Max(1, q.From)
	if q.From >= q.To {
		return nil, nil, fmt.Errorf("minimum.to: %v is not above the smallest size tried, %v; give a larger one", q.To, q.From)
	}
	for _, x := range []float64{q.From, q.To} {
		if _, _, err := q.model(c, s.base, x); err != nil {
			return nil, nil, fmt.Errorf("size %v: %w", x, err)
		}
	}
	return s, q, nil
}

// Minimum is the study of the minimum viable size, which has no cells of its own.
const Minimum Kind = "minimum"

// capacityOf is the size that a case's crowding holds the population at.
func capacityOf(m *rates.Model) (float64, error) {
	c := m.Case
	switch {
	case c.Births.Crowding.Capacity.Set:
		return c.Births.Crowding.Capacity.Value, nil
	case c.Deaths.Crowding.Capacity.Set:
		return c.Deaths.Crowding.Capacity.Value, nil
	case c.Births.Crowding.Form != "none" || c.Deaths.Crowding.Form != "none":
		if k := resting(m); k > 0 {
			return k, nil
		}
		return 0, errors.New("minimum.vary: the population of this case rests nowhere, so that its capacity cannot be varied; vary the start, or give a capacity")
	case c.Ceiling.Set && c.Ceiling.Value > 0:
		return c.Ceiling.Value, nil
	}
	return 0, errors.New("minimum.vary: the case has neither crowding nor a ceiling, so that there is no capacity to vary; vary = \"start\"")
}

// within is the smallest and the largest value looked at that are shown within
// the limit.
func (c *Crossing) within() (low, high float64, any bool) {
	for _, p := range c.Points { // ascending
		if p.Verdict != pva.Within {
			continue
		}
		if !any {
			low = p.Value
		}
		high, any = p.Value, true
	}
	return low, high, any
}

// firstSizes is how many sizes are looked at before the search narrows, evenly
// spaced on a scale of ratios.
const firstSizes = 9

// Smallest searches for the smallest viable size.
func (r *Runner) Smallest(ctx context.Context, q *Sizes, opt SearchOptions) (*Crossing, error) {
	c := r.study.Base
	a := axis{key: "size", path: "size", unit: "counting units", tag: "size", whole: true, rising: false, horizon: q.Horizon,
		from: q.From, to: q.To, limit: q.Risk, confidence: c.Question.Confidence,
		model: func(x float64) (*rates.Model, string, error) { return q.model(c, r.study.base, x) }}
	last := 0.0
	for i := range firstSizes {
		x := math.Round(q.From * math.Pow(q.To/q.From, float64(i)/(firstSizes-1)))
		if x > last {
			a.scan = append(a.scan, x)
			last = x
		}
	}
	out, err := r.cross(ctx, a, opt)
	if err != nil {
		return nil, err
	}
	x := func(v float64) string { return pva.Num(v).Text }
	if out.At() == nil {
		return nil, fmt.Errorf("minimum: the population cannot rest at any of the sizes looked at, %s to %s: births do not balance deaths there; look at larger ones (minimum.to), or vary the start", x(q.From), x(q.To))
	}
	biggest := out.Points[len(out.Points)-1]
	switch {
	case !out.Found && biggest.Unreachable != "":
		out.Reason = "none up to " + x(q.To) + ", where " + biggest.Unreachable
		if at := out.At(); at.Verdict == pva.Within {
			out.Reason += "; the largest size looked at that it can have, " + x(at.Value) + ", is within the limit: look at smaller ones (minimum.to)"
		}
	case !out.Found && biggest.Verdict == pva.AboveLimit:
		out.Reason = "none up to " + x(q.To)
		if low, high, any := out.within(); any {
			out.Reason = "none from which on all are viable: of those looked at, " + x(low) + " to " + x(high) + " are within the limit, and larger ones up to " + x(q.To) + " are not"
			if q.Vary == "start" {
				out.Reason += " (a start far above what the population can hold may crash)"
			}
			out.Reason += "; look no further than minimum.to = " + x(high)
		}
	case !out.Found:
		out.Reason = "none is shown to be viable up to " + x(q.To)
	case out.Value == q.From && math.IsNaN(out.Other):
		out.Reason = "already viable at the smallest size looked at, " + x(q.From)
	case len(out.Breaks) > 0:
		out.Reason = "the risk does not fall steadily with size: all sizes from here up to " + x(q.To) + " are estimated within the limit, and some smaller ones may be"
	}
	return out, nil
}
