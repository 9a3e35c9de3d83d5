package rates

import (
	"math"

	"ebbline/pva"
	"ebbline/rng/portable"
)

// Take is one harvest rule as formulas.
type Take struct {
	Rule pva.Harvest
	// Scheduled says in which model years the rule acts; index y-1.
	Scheduled []bool
	// Surveyed says in which model years a survey is made; index y-1.
	Surveyed []bool
	// First is the first scheduled model year, 0 if there is none: surveys begin then.
	First int
	// Begins is the model year in which the rule's span begins, from which takes
	// by year count; it lies before year 1 where the span began earlier.
	Begins int
	Survey LogNormal // factor of the survey's estimate, mean 1
	Error  LogNormal // factor of the take's error, mean 1
	// Rate is the removal rate per head of a fraction taken through the year.
	Rate float64
}

func newTake(c *pva.Case, h pva.Harvest) Take {
	t := Take{Rule: h, Survey: NewLogNormal(1, h.SurveyCV), Error: NewLogNormal(1, h.TakeCV)}
	t.Scheduled = make([]bool, c.Question.Horizon)
	t.Surveyed = make([]bool, c.Question.Horizon)
	t.First, _ = h.FirstScheduled(c)
	t.Begins = t.First
	if !h.Years.OpenFrom {
		t.Begins = h.Years.From - c.Label(1) + 1
	}
	for i := range t.Scheduled {
		y := i + 1
		t.Scheduled[i] = h.Scheduled(c, y)
		t.Surveyed[i] = t.First > 0 && y >= t.First && (y-t.First)%h.SurveyEvery == 0
	}
	if h.Rate.Set {
		t.Rate = h.Rate.Value
	} else if h.Fraction.Set {
		t.Rate = -portable.Log1p(-h.Fraction.Value)
	}
	return t
}

// Target is what the rule asks for in model year y at a population seen as
// seen, in counting units (the share applied), before error and rounding.
func (t *Take) Target(y int, seen float64) float64 {
	h := &t.Rule
	var target float64
	switch h.Rule {
	case "constant":
		target = h.Take.Value
	case "fraction":
		target = h.Fraction.Value * seen
	case "above":
		target = h.Fraction.Or(1) * math.Max(0, seen-h.Spare.Value)
	case "ladder":
		target = ladder(h.Points, seen)
	case "by_year":
		target = t.byYear(y)
	}
	return float64(target * h.Share)
}

// Stream is the rate of a take through the year in model year y while it is
// open: a number a year, or a rate per head.
func (t *Take) Stream(y int) (perYear, perHead float64) {
	switch t.Rule.Rule {
	case "constant":
		return float64(t.Rule.Take.Value * t.Rule.Share), 0
	case "by_year":
		return float64(t.byYear(y) * t.Rule.Share), 0
	}
	return 0, float64(t.Rate * t.Rule.Share)
}

func (t *Take) byYear(y int) float64 {
	n := len(t.Rule.Takes)
	if n == 0 || t.First == 0 {
		return 0
	}
	return t.Rule.Takes[max(0, min(y-t.Begins, n-1))]
}

// ladder is linear between points, flat outside them.
func ladder(points [][2]float64, x float64) float64 {
	n := len(points)
	if n == 0 {
		return 0
	}
	if x <= points[0][0] {
		return points[0][1]
	}
	for i := 1; i < n; i++ {
		a, b := points[i-1], points[i]
		if x < b[0] {
			return a[1] + float64((b[1]-a[1])*((x-a[0])/(b[0]-a[0])))
		}
	}
	return points[n-1][1]
}
