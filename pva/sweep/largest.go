package sweep

import (
	"context"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"ebbline/pva"
	"ebbline/pva/estimate"
	"ebbline/pva/rates"
)

// Largest searches for the largest value of a grid's key at which the risk is
// within the case's limit: between the values of the grid too, with more
// replicates where the verdict is in doubt. With several dimensions it follows
// the take (the first one that is), and the other keys stay as the case states
// them. The grid's result, which may be nil, says where to begin.
func (r *Runner) Largest(ctx context.Context, grid *Result, opt SearchOptions) (*Crossing, error) {
	d := r.study.searched()
	dim := r.study.Dimensions[d]
	a := axis{key: dim.Key, path: dim.Path, unit: dim.Unit, tag: "largest", whole: wholeBy(dim), rising: true,
		from: slices.Min(dim.Values), to: slices.Max(dim.Values), confidence: r.study.Base.Question.Confidence,
		horizon: r.study.Base.Question.Horizon,
		model: func(x float64) (*rates.Model, string, error) {
			m, err := modelOf(r.study.Base, r.study.base, []pva.Setting{{Path: dim.Path, Value: pva.Num(x)}}, false)
			return m, "", err
		}}
	none := func(reason string) (*Crossing, error) {
		return &Crossing{Key: a.key, Path: a.path, Unit: a.unit, From: a.from, To: a.to, Rising: true, Confidence: a.confidence,
			Horizon: r.study.Base.Question.Horizon, Value: math.NaN(), Safe: math.NaN(), Other: math.NaN(), Reason: reason}, nil
	}
	switch limit := r.study.Base.Question.Limit; {
	case !limit.Set:
		return none("the case states no limit (question.limit)")
	case strings.HasPrefix(dim.Path, "question."):
		return none(dim.Key + " is part of the question and not of what is allowed")
	default:
		a.limit = limit.Value
	}
	a.scan = r.study.firstLook(d, grid, opt)
	if !isTake(dim.Path) {
		falls, err := r.falls(ctx, a, opt)
		if err != nil {
			return nil, err
		}
		a.rising = !falls
	}
	out, err := r.cross(ctx, a, opt)
	if err != nil {
		return nil, err
	}
	if len(r.study.Dimensions) == 1 && grid != nil {
		out.Breaks = append(out.Breaks, gridBreaks(grid, a.rising)...)
	}
	out.explain()
	return out, nil
}

// searched is the dimension that the search follows.
func (s *Study) searched() int {
	for d := range s.Dimensions {
		if isTake(s.Dimensions[d].Path) {
			return d
		}
	}
	return 0
}

// SweepsTake says whether a grid varies how much is taken.
func (s *Study) SweepsTake() bool {
	d := s.searched()
	return d < len(s.Dimensions) && isTake(s.Dimensions[d].Path)
}

// VariesTakesAlone says whether all keys of a grid set how much is taken. Only
// then are cells that none beats in risk and take the whole answer: a larger start
// would beat every other.
func (s *Study) VariesTakesAlone() bool {
	for _, d := range s.Dimensions {
		if !isTake(d.Path) {
			return false
		}
	}
	return len(s.Dimensions) > 0
}

// isTake says whether a key sets how much is taken, so that the risk is expected
// to rise with it.
func isTake(path string) bool {
	if !strings.HasPrefix(path, "harvest.") {
		return false
	}
	switch path[strings.LastIndexByte(path, '.')+1:] {
	case "take", "fraction", "rate", "share", "extra_deaths":
		return true
	}
	return strings.Contains(path, ".takes.")
}

// wholeBy says whether only whole values make sense: of a key that holds whole
// numbers, or of one that counts animals if the grid names whole ones only.
func wholeBy(d Dimension) bool {
	k, _ := pva.Find(d.Path)
	if k != nil && k.Whole {
		return true
	}
	if !strings.HasPrefix(d.Unit, "animals") && !strings.HasPrefix(d.Unit, "counting units") {
		return false
	}
	for _, v := range d.Values {
		if v != math.Trunc(v) {
			return false
		}
	}
	return true
}

// mostScanned is how many values of a grid are looked at before the search.
const mostScanned = 17

// firstLook is where the search begins: with a finished grid of one dimension,
// its ends and the cells around the limit; otherwise a thinned row of its values.
func (s *Study) firstLook(d int, grid *Result, opt SearchOptions) []float64 {
	values := slices.Clone(s.Dimensions[d].Values)
	slices.Sort(values)
	values = slices.Compact(values)
	if len(s.Dimensions) == 1 && grid != nil && grid.Whole() {
		verdict := map[float64]pva.Verdict{}
		for _, o := range grid.Cells {
			verdict[o.Values[0]] = o.Verdict
		}
		lo, hi := 0, len(values)-1
		for lo+1 < len(values) && verdict[values[lo+1]] == pva.Within {
			lo++
		}
		for hi-1 >= 0 && hi-1 > lo && verdict[values[hi-1]] == pva.AboveLimit {
			hi--
		}
		near := append([]float64{values[0]}, thin(values[lo:hi+1], mostScanned)...)
		// The search asks more of a verdict than one look does: cells a little
		// further out are wanted too.
		for _, i := range []int{lo - 4, lo - 2, hi + 2, hi + 4, len(values) - 1} {
			near = append(near, values[max(0, min(i, len(values)-1))])
		}
		slices.Sort(near)
		return slices.Compact(near)
	}
	return thin(values, mostScanned)
}

// thin keeps at most n of ascending values, both ends among them.
func thin(values []float64, n int) []float64 {
	if len(values) <= n {
		return values
	}
	out := make([]float64, n)
	for i := range out {
		out[i] = values[i*(len(values)-1)/(n-1)]
	}
	return out
}

// falls says whether the risk at the largest value is below that at the smallest.
func (r *Runner) falls(ctx context.Context, a axis, opt SearchOptions) (bool, error) {
	c := &curve{r: r, a: a, exact: !opt.NoExact}
	if err := c.look(ctx, []float64{a.from, a.to}, r.study.Base.Run.Replicates); err != nil {
		return false, err
	}
	return c.at(a.to).Risk.Estimate < c.at(a.from).Risk.Estimate, nil
}

// gridBreaks finds where a finished grid of one dimension goes the wrong way, by
// intervals that do not meet at a level that allows for so many tests. The cells
// share their weather, so that the test errs on the side of finding none.
func gridBreaks(grid *Result, rising bool) []Break {
	var cells []*Outcome
	for _, o := range grid.Cells {
		if o != nil {
			cells = append(cells, o)
		}
	}
	slices.SortFunc(cells, func(p, q *Outcome) int {
		if (p.Values[0] < q.Values[0]) == rising {
			return -1
		}
		return 1
	})
	if len(cells) < 2 {
		return nil
	}
	level := 1 - (1-grid.Study.Base.Question.Confidence)/float64(len(cells)-1)
	var out []Break
	riskiest := cells[0]
	for _, o := range cells[1:] {
		if o.Risk.Count >= riskiest.Risk.Count {
			riskiest = o
			continue
		}
		low, high := estimate.Wilson(riskiest.Risk.Count, riskiest.Risk.Of, level)
		oLow, oHigh := estimate.Wilson(o.Risk.Count, o.Risk.Of, level)
		if low > oHigh {
			out = append(out, Break{Riskier: riskiest.Values[0], Safer: o.Values[0],
				Difference: pva.Difference{Estimate: riskiest.Risk.Estimate - o.Risk.Estimate, Low: low - oHigh, High: high - oLow, Of: o.Risk.Of}})
		}
	}
	return out
}

// explain puts into words why there is no largest value, or what is special.
func (c *Crossing) explain() {
	x := func(v float64) string { return strconv.FormatFloat(v, 'g', 6, 64) }
	switch {
	case !c.Rising && c.Found:
		c.Found = false
		c.Reason = fmt.Sprintf("the risk falls as %s rises: it is within the limit from about %s up", c.Key, x(c.Value))
	case !c.Rising:
		c.Reason = fmt.Sprintf("the risk falls as %s rises, and is above the limit even at %s", c.Key, x(c.To))
	case !c.Found && c.Points[0].Verdict == pva.AboveLimit:
		c.Reason = fmt.Sprintf("the risk is above the limit even at the smallest value looked at, %s", x(c.From))
	case !c.Found:
		c.Reason = fmt.Sprintf("the risk is not shown to be within the limit even at the smallest value looked at, %s", x(c.From))
	case c.Value == c.To && math.IsNaN(c.Other):
		c.Reason = fmt.Sprintf("%s is the largest value looked at: larger ones may be within the limit too", x(c.To))
	}
	if len(c.Breaks) > 0 {
		if c.Reason != "" {
			c.Reason += "; "
		}
		c.Reason += "the risk changes not steadily with the value"
		if c.Found {
			c.Reason += ": this is where it first crosses the limit, and larger values may be within it again"
		}
	}
}
