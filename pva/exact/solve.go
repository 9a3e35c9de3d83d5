// Package exact answers a case without random numbers: it carries the whole law
// of N through the years, and the law of those that have not fallen, by the
// transition matrix of a pulse year or the generator of a flow year, the weather
// integrated by quadrature. It is the check of the simulation, and the verdict
// where a case has an exact answer.
//
// It refuses cases whose state is more than N (estimates kept between surveys),
// whose inputs are uncertain, and whose states, weather grid or combinations of
// catastrophes are too many for memory or time; Cost says so beforehand, in
// words, from a count of operations and never from the clock. Package assess
// calls it. Figures here are derived, not drawn, so package math is used freely.
package exact

import (
	"context"
	"errors"
	"fmt"
	"math"

	"ebbline/pva"
	"ebbline/pva/rates"
)

// Cheap is the number of operations of about two seconds on one slow core:
// below it the exact answer is added without being asked for.
const Cheap = 2e9

// Most is the number of operations beyond which there is no exact answer,
// some ten minutes on one slow core.
const Most = 4e11

// Goal is the stated error of the risk that Solve tries to reach; with weather
// that has memory it is GoalWithMemory.
const (
	Goal           = 1e-7
	GoalWithMemory = 1e-5
)

// Options change how an exact answer is sought; the zero value is the usual way.
type Options struct {
	// Stated takes uncertain inputs at the values the case states instead of
	// refusing them: for one draw, whose values have been put into the case.
	Stated bool
	// Most is the largest number of operations; 0 stands for Most for what Cost
	// counts, and for four times that count (or Cheap, if that is more) for all
	// runs together, further ones that lower the error included.
	Most float64
	// Top is the largest state; 0 lets Solve choose.
	Top int
	// Order is the first number of quadrature points an axis; 0 lets Solve choose.
	Order int
}

// Solve computes the exact answer of a case. Where there can be none the
// answer has only its Reason. The error is that of ctx, or of a model that is nil.
//
// Answer.Error bounds the error of the risk in every year: the difference
// between two orders of quadrature (and of two steps of the exponential), and
// the chance of falling of all that was cut off above the largest state. Mean is
// over replicates not outgrown, and NaN from the year on in which more than
// 1e-6 has grown beyond the largest state without being outgrown.
func Solve(ctx context.Context, m *rates.Model, opt Options) (*pva.ExactAnswer, error) {
	if m == nil {
		return nil, errors.New("exact: no model")
	}
	p := newPlan(m, opt)
	if p.reason != "" {
		return &pva.ExactAnswer{Reason: p.reason}, nil
	}
	return p.solve(ctx)
}

// solve runs the plan at two orders of quadrature, with more states or at higher
// orders while the stated error is too large and there are operations left.
func (p *plan) solve(ctx context.Context) (*pva.ExactAnswer, error) {
	var last *found           // the run at the order below, on the same states
	var best *pva.ExactAnswer // what the runs so far say
	spent := 0.0
	for s := p.first; ; {
		spent += p.ops(s)
		f, err := newRun(p.m, s).solve(ctx)
		if err != nil {
			return nil, fmt.Errorf("exact: %w", err)
		}
		if !finite(f) {
			if best != nil {
				return best, nil // its error says how far it is to be trusted
			}
			return &pva.ExactAnswer{Reason: "the numbers of the solution leave the range of a computer's"}, nil
		}
		if f.cutting > p.goal/4 && !p.fixed {
			wider := s
			wider.top += s.top/4 + 10
			if p.affords(wider, spent) {
				s, last = wider, nil
				continue
			}
		}
		gap := 0.0
		if last != nil {
			gap = difference(f.fallen, last.fallen)
		} else if p.inexact {
			gap = 1 // nothing to compare with yet
		}
		a := p.answer(s, f, gap)
		best = a
		finer := p.finer(s)
		if a.Error <= p.goal/2 || !p.inexact || !p.affords(finer, spent) {
			return a, nil
		}
		s, last = finer, f
	}
}

// affords says whether one more run fits into the operations and the memory,
// spent operations already done. Orders and states grow by at least a quarter
// each time, so that the runs come to an end.
func (p *plan) affords(s setting, spent float64) bool {
	if p.climate.memory != 0 && s.order > mostGaussOrder {
		return false
	}
	return p.memory(s) <= mostBytes && spent+p.ops(s) <= p.further
}

// mostGaussOrder is the highest order of a grid of Gauss points: beyond it the
// Hermite polynomials that carry the weather on leave the range of doubles.
const mostGaussOrder = 200

// finite says whether every figure of a run is a number.
func finite(f *found) bool {
	for _, list := range [][]float64{f.fallen, f.extinct} {
		for _, v := range list {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				return false
			}
		}
	}
	return !math.IsNaN(f.cutting)
}

func difference(a, b []float64) float64 {
	worst := 0.0
	for i := range a {
		worst = math.Max(worst, math.Abs(a[i]-b[i]))
	}
	return worst
}

// rounding bounds what sums of positive terms and cut tails add up to in a year.
const rounding = 1e-13

func (p *plan) answer(s setting, f *found, gap float64) *pva.ExactAnswer {
	years := len(f.fallen)
	a := &pva.ExactAnswer{
		Risk: f.fallen[years-1], Extinction: f.extinct[years-1],
		Error:  gap + f.cutting + rounding*float64(years),
		Fallen: f.fallen, Extinct: f.extinct, Mean: f.mean,
		States: s.top + 1, Nodes: p.nodes(s),
	}
	way := "transition matrix"
	if p.m.Case.Births.Breeding == "flow" {
		way = "generator of the birth-death chain"
	}
	a.Method = fmt.Sprintf("%s on 0 to %d", way, s.top)
	if p.climate.memory != 0 {
		a.Method += fmt.Sprintf(", weather with memory on a grid of %d points", a.Nodes)
	} else if !p.climate.still() {
		a.Method += fmt.Sprintf(", weather integrated with %d points", a.Nodes)
	}
	return a
}
